"""One set of dimensions, drawn and solved over a span of frequencies: what sizing looks at.

Boards of one effort are meshed with the same step, so that they can be compared to a fraction of the mesh's own error.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from planar.copper.board import PlannedBoard, plan_board
from planar.copper.drawing import DrawingRequest
from planar.copper.families import FAMILIES
from planar.copper.tabs import PAIRS
from planar.design.choices import Choices
from planar.errors import GeometryError, SynthesisError
from planar.field.band import BandSolution
from planar.field.solver import FieldProblem, default_settings

Array = NDArray[np.float64]
Complex = NDArray[np.complex128]

MIRRORED = "circular-right"
"""Sense toward the top side that is drawn as the mirror image: with the second gap counter-clockwise from the feed gap,
seen from the top, the current turns clockwise, which is left-handed toward the top (IEEE Std 145)."""


@dataclass(frozen=True, eq=False)
class Trial:
    """`dimensions` (name -> m), the board they draw and the field solution over a span of frequencies."""

    dimensions: Mapping[str, float]
    planned: PlannedBoard
    band: BandSolution


@dataclass(frozen=True)
class Effort:
    """How a trial is solved: `coarser` than the default mesh by a factor, `nodes` over the `span` (low, high) Hz."""

    coarser: float
    nodes: int
    span: tuple[float, float]


def drawing_request(choices: Choices) -> DrawingRequest:
    """What the drawing functions need of `choices`."""
    return DrawingRequest(
        name=choices.brief.name,
        end=choices.end,
        mirrored=choices.brief.target.polarisation == MIRRORED,
        connector=choices.connector,
        fab=choices.fab,
        masked=choices.masked,
        size_limit=choices.brief.board.size_limit,
    )


def draw(
    choices: Choices, dimensions: Mapping[str, float], *, lettered_board: bool = True, tabs: int = PAIRS
) -> PlannedBoard:
    """The board of `dimensions` with `tabs` pairs of trim tabs left, where it has any. Raises `SynthesisError` where
    they cannot be drawn."""
    request = replace(drawing_request(choices), tabs=tabs)
    try:
        drawing = FAMILIES[choices.family.key](dimensions, request)
        return plan_board(drawing, request, choices.levels, lettered_board=lettered_board)
    except GeometryError as error:
        raise SynthesisError(f"the copper cannot be drawn: {error}") from error


def solve_trial(choices: Choices, dimensions: Mapping[str, float], effort: Effort, *, tabs: int = PAIRS) -> Trial:
    """Draw and solve `dimensions` with `tabs` pairs of trim tabs left, where there are any. Raises `SynthesisError`
    where they cannot be drawn or meshed."""
    planned = draw(choices, dimensions, lettered_board=False, tabs=tabs)
    low, high = effort.span
    settings = default_settings(planned.layout, choices.stackup, choices.centre, coarser=effort.coarser)
    if effort.coarser > 1.0:
        settings = replace(settings, crossed=False)
    try:
        problem = FieldProblem.prepare(planned.layout, choices.stackup, high, settings)
    except GeometryError as error:
        raise SynthesisError(f"the copper cannot be solved: {error}") from error
    return Trial(dimensions, planned, BandSolution.between(problem, low, high, effort.nodes))

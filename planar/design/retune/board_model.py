"""The design as a function of everything that varies, over the frequencies a measurement is compared at.

Boards at the ends of all tolerances are solved once; what the fine mesh says of the board as designed is put below
their differences. Where the two meshes disagree they tell how far the solver may be off.
"""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from planar.design.choices import Choices
from planar.design.design import Design
from planar.design.retune.moving import response_shift
from planar.design.retune.unknowns import SOLVER_SHIFT
from planar.design.sizing import verifying_effort
from planar.design.spread_boards import AXIAL_POINTS, Question, solved_surface, solved_terms
from planar.design.spread_model import SurfaceModel
from planar.design.tolerances import COVER, COVER_GAP, board_with, varied_quantities
from planar.design.workers import Workers
from planar.errors import SynthesisError

Array = NDArray[np.float64]
Complex = NDArray[np.complex128]

HALF_SPAN, BESIDE, POINTS = 0.15, 0.05, 61
"""Of the centre, how far round the middle of the band a measurement is compared at least and how far beyond a wide
band; frequencies in between."""


NEARER = 0.4
"""Of the air below a cover that is much nearer than designed."""


@dataclass(frozen=True, eq=False)
class BoardModel:
    """`surface` of the terms of `question` over its quantities, its nominal from the fine mesh. `mesh_error`: rms
    difference of the reflection between two meshes once moved onto each other by `mesh_shift`, a fraction. `other` (j,)
    are the terms of the design where the surroundings here are not those it was made for."""

    question: Question
    surface: SurfaceModel
    mesh_error: float
    mesh_shift: float
    other: Complex | None = None

    @property
    def designed(self) -> Complex:
        """Terms (j,) of the board as designed: what it shall be again."""
        return self.surface.nominal if self.other is None else self.other

    @property
    def choices(self) -> Choices:
        """Those of the design."""
        return self.question.choices

    @property
    def grid(self) -> Array:
        """Frequencies (j,) of the reflections, Hz."""
        return self.question.frequencies

    @property
    def reflections(self) -> SurfaceModel:
        """The surface without the ratios of the senses."""
        return reflections_of(self.surface, len(self.grid))

    @property
    def solver_shift(self) -> float:
        """Standard deviation of the solver's error in frequency, a fraction."""
        return math.hypot(SOLVER_SHIFT, self.mesh_shift)

    def exact(self, deviations: Array) -> Complex | None:
        """Terms (j,) of the board at `deviations` (d,) on the fine mesh, None where it cannot be drawn or solved."""
        made = board_with(self.choices, self.question.dimensions, self.question.quantities, deviations)
        return solved_terms((*made, verifying_effort(self.choices), self.question))


def reflections_of(surface: SurfaceModel, count: int) -> SurfaceModel:
    """`surface` with its first `count` terms only."""
    return SurfaceModel(
        surface.nominal[:count],
        surface.slopes[:, :count],
        surface.squares[:, :count],
        surface.pairs,
        surface.crossed[:, :count],
    )


def board_model(design: Design, workers: Workers) -> BoardModel:
    """The boards solved. Raises `SynthesisError` where one within its tolerances cannot be made or solved."""
    return _solved(design.choices, design.dimensions, workers)


def other_surroundings(choices: Choices) -> tuple[tuple[str, Choices], ...]:
    """What else a board may have been measured in, in words, with the choices as they are then."""
    stackup = choices.stackup
    if stackup.find(COVER) is None:
        return ()

    def without(*names: str) -> Choices:
        kept = tuple(layer for layer in stackup.layers if layer.name not in names)
        return replace(choices, stackup=replace(stackup, layers=kept))

    missing = ("it was measured without its cover", without(COVER, COVER_GAP))
    gap = stackup.find(COVER_GAP)
    if gap is None:
        return (missing,)
    nearer = replace(gap, thickness=NEARER * gap.thickness)
    layers = tuple(nearer if layer is gap else layer for layer in stackup.layers)
    close = replace(choices, stackup=replace(stackup, layers=layers))
    return (
        ("its cover touches the board", without(COVER_GAP)),
        ("its cover is much nearer than designed", close),
        missing,
    )


def surrounded(model: BoardModel, choices: Choices, workers: Workers) -> BoardModel:
    """The board of `model` in the surroundings of `choices`, to be what it was designed as. Raises `SynthesisError`."""
    return replace(_solved(choices, model.question.dimensions, workers), other=model.designed)


def _solved(choices: Choices, dimensions: Mapping[str, float], workers: Workers) -> BoardModel:
    question = compared(choices, dimensions)
    fine = workers.beside(solved_terms, (choices, dimensions, verifying_effort(choices), question))
    surface = solved_surface(question, workers)
    nominal = fine()
    if nominal is None:
        raise SynthesisError(f"{choices.brief.name}: the board as designed cannot be solved")
    count = len(question.frequencies)
    moved = response_shift(question.frequencies, nominal[:count], surface.here[:count])
    left = surface.here[:count] - _moved(question.frequencies, nominal[:count], moved)
    rms = float(np.sqrt(np.mean(np.abs(left) ** 2)))
    return BoardModel(question, surface.model.on(nominal), rms, abs(moved))


def compared(choices: Choices, dimensions: Mapping[str, float]) -> Question:
    """What boards are asked that a measurement is compared with."""
    low, high = choices.brief.target.band
    half = max(HALF_SPAN, 0.5 * (high - low) / choices.centre + BESIDE)
    frequencies = choices.centre * (1.0 + np.linspace(-half, half, POINTS))
    axial = np.linspace(low, high, AXIAL_POINTS) if choices.circular else np.zeros(0)
    return Question(choices, dimensions, varied_quantities(choices, dimensions), frequencies, axial)


def _moved(grid: Array, reflected: Complex, moved: float) -> Complex:
    """`reflected` (j,) moved up along the `grid` (j,) by a fraction."""
    at = grid * (1.0 - moved)
    parts = [np.interp(at, grid, part) for part in (reflected.real, reflected.imag)]
    result: Complex = parts[0] + 1j * parts[1]
    return result

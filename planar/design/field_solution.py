"""A design solved: its copper as it ships, and its bare loop, at given frequencies and over a sweep.

Every solution carries how much it still moves with the mesh: the middle frequency is solved again on
a mesh half again as coarse. What moves too much is refused, not shown.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass

import numpy as np

from planar.design.accuracy import COARSER, moved, power_findings
from planar.design.bare_loop import bare_loop_layout
from planar.design.design import Design
from planar.errors import Finding
from planar.field.band import checked_band
from planar.field.result import PointResult, point_result
from planar.field.solver import FieldProblem, default_settings
from planar.network.response import Response

SAME_MESH = 1.4
"""Highest frequency over the centre up to which the mesh is that of the prediction."""
Progress = Callable[[str], None]


@dataclass(frozen=True)
class Solution:
    """What the field solver says of a design.

    `points` at the frequencies asked for, `gap_impedance_ohm` of the bare loop at each (line and strips
    removed, an ideal source across the gap), `sweep` over the band asked for or None. `convergence` is the
    change of the input impedance from the coarser mesh, of its magnitude, at the middle frequency.
    """

    points: tuple[PointResult, ...]
    gap_impedance_ohm: tuple[complex, ...]
    unknowns: int
    convergence: float
    sweep: Response | None
    findings: tuple[Finding, ...]


def solve_design(
    design: Design,
    frequencies: Sequence[float],
    *,
    sweep: tuple[float, float, int] | None = None,
    progress: Progress = lambda stage: None,
) -> Solution:
    """Solve `design` at `frequencies` Hz and, where asked, over a `sweep` (low Hz, high Hz, points).

    Raises `GeometryError` for copper the solver does not take and `RangeError` where the result is not
    accurate enough.
    """
    stackup, layout = design.choices.stackup, design.layout
    highest = max([*frequencies, *(sweep[:2] if sweep else ())])
    progress("meshing")
    meshed_for = design.choices.centre if highest < SAME_MESH * design.choices.centre else highest
    problem = FieldProblem.prepare(layout, stackup, highest, default_settings(layout, stackup, meshed_for))
    progress(f"solving {len(frequencies)} frequencies, {problem.basis.count} unknowns")
    points = tuple(point_result(problem.reaching(frequency).solve(frequency)) for frequency in frequencies)
    progress("solving the bare loop and the coarser mesh")
    gap = tuple(point.input_impedance_ohm for point in points)
    if design.lines:  # without a line the board is the bare loop
        bare = FieldProblem.prepare(bare_loop_layout(design.choices, design.dimensions, layout), stackup, highest)
        gap = tuple(bare.reaching(frequency).solve(frequency).impedance for frequency in frequencies)
    convergence = _convergence(design, points[len(points) // 2], meshed_for)
    response = None
    if sweep is not None:
        progress("sweeping")
        response = _sweep(problem, sweep, design.choices.brief.target.impedance)
    findings = tuple(power_findings(points))
    return Solution(points, gap, problem.basis.count, convergence, response, findings)


def _convergence(design: Design, middle: PointResult, meshed_for: float) -> float:
    stackup = design.choices.stackup
    coarse = default_settings(design.layout, stackup, meshed_for, coarser=COARSER)
    other = (
        FieldProblem.prepare(design.layout, stackup, middle.frequency_hz, coarse).solve(middle.frequency_hz).impedance
    )
    return moved(middle.input_impedance_ohm, other)


def _sweep(problem: FieldProblem, sweep: tuple[float, float, int], reference: float) -> Response:
    low, high, count = sweep
    frequency = np.linspace(low, high, count)
    band = checked_band(problem, low, high, reference=reference)
    return Response.from_impedance(frequency, band.impedance(frequency), z0=reference)

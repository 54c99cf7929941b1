"""What the field solver says of the board that ships: match, margin, gain, polarisation, and the circuit for it.

The fine mesh is asked round the band, a sixth of the frequency to either side or more for a wide band. From nearly DC
to over twice the frequency the sizing mesh answers: there nothing is promised, it shows what else the antenna does.
Where the two meet they are blended.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, replace
from typing import Any

import numpy as np
from numpy.typing import NDArray

from planar.design import accuracy
from planar.design.bare_loop import bare_loop_layout, has_line
from planar.design.choices import Choices
from planar.design.equivalent import fitted_circuit
from planar.design.goal import Goal
from planar.design.sizing import COARSER, verifying_effort
from planar.design.trial import Effort, Trial, draw, solve_trial
from planar.errors import Finding, Severity
from planar.field.band import BandSolution, axial_ratio_db
from planar.field.result import PointResult, point_result
from planar.field.solver import LARGEST_EXTENT, FieldProblem, default_settings
from planar.network.circuit import Circuit
from planar.network.quality import Margins, margins, quality_factor
from planar.network.response import Response, reflection
from planar.units import SPEED_OF_LIGHT, show

Array = NDArray[np.float64]
Complex = NDArray[np.complex128]

BLEND = 0.04
"""Of the centre frequency, the outermost part of its span in which it hands over to the sizing mesh."""
LOWEST, HIGHEST, WIDE_NODES = 0.05, 2.2, 14
"""Ends of the wide response over the centre frequency, and the solutions it rests on."""
GAP_COARSER = 1.5
"""Step of the bare loop's mesh over the default."""
FINE_POINTS, WIDE_POINTS = 161, 173
"""Frequencies inside the trusted span and over the whole."""
AXIAL_RATIO_DB = 3.0
"""dB, axial ratio up to which polarisation counts as circular (common practice, no source)."""


@dataclass(frozen=True, eq=False)
class Prediction:
    """The solved board at the connector's reference plane.

    `response` from 0.05 to 2.2 times the centre, by the fine mesh inside `trusted` (low, high) Hz. `centre` at the
    middle of the band, `gap_impedance_ohm` of the bare loop there. `worst_axial_ratio_db` over the band, `axial_band`
    (low, high) Hz in which it is below 3 dB; both None for linear polarisation. `quality` of the port by Yaghjian and
    Best. `convergence` is the change of the input impedance from a mesh half again as coarse, of its magnitude.
    """

    response: Response
    trusted: tuple[float, float]
    centre: PointResult
    gap_impedance_ohm: complex
    margins: Margins
    worst_axial_ratio_db: float | None
    axial_band: tuple[float, float] | None
    quality: float
    circuit: Circuit
    unknowns: int
    convergence: float

    @property
    def best_match(self) -> float:
        """Frequency of least reflection inside the trusted span, Hz."""
        low, high = self.trusted
        inside = (self.response.frequency >= low) & (self.response.frequency <= high)
        place = np.argmin(np.where(inside, np.abs(self.response.s[:, 0, 0]), np.inf))
        return float(self.response.frequency[place])


@dataclass(frozen=True, eq=False)
class Wide:
    """The same board on other meshes: `impedance` (f,) ohm at `shares` (f,) of the centre on the sizing mesh, and
    `at_centre` on one half again as coarse as the fine one."""

    dimensions: Mapping[str, float]
    shares: Array
    impedance: Complex
    at_centre: complex


def wide_response(task: tuple[Choices, Mapping[str, float]]) -> Wide:
    """The board of these dimensions from nearly DC to over twice the frequency, or as far as the solver takes it."""
    choices, dimensions = task
    centre = choices.centre
    layout = draw(choices, dimensions, lettered_board=False).layout
    x0, y0, x1, y1 = layout.copper_bounds
    around = 2.0 * (x1 - x0 + y1 - y0) * centre / SPEED_OF_LIGHT
    highest = min(HIGHEST, 0.98 * LARGEST_EXTENT / around)
    band = solve_trial(choices, dimensions, Effort(COARSER, WIDE_NODES, (LOWEST * centre, highest * centre))).band
    half = _solved_half(choices)
    near = np.linspace(1.0 - half, min(1.0 + half, highest), FINE_POINTS)
    shares = np.unique(np.round(np.concatenate([np.linspace(LOWEST, highest, WIDE_POINTS), near]), 6))
    settings = default_settings(layout, choices.stackup, centre, coarser=accuracy.COARSER)
    other = FieldProblem.prepare(layout, choices.stackup, centre, settings).solve(centre).impedance
    return Wide(dimensions, shares, band.impedance(centre * shares), other)


def _solved_half(choices: Choices) -> float:
    """Half the span the fine mesh is solved over, of the centre frequency."""
    low, high = verifying_effort(choices).span
    return 0.5 * (high - low) / choices.centre


def predict(choices: Choices, fine: Trial, wide: Wide) -> Prediction:
    """Prediction for the board of `fine`, with the `wide` response of the same board on another mesh.

    Raises `RangeError` where the two meshes differ too much to be believed.
    """
    goal, target = Goal.of(choices), choices.brief.target
    centre = choices.centre
    half = _solved_half(choices)
    trusted = (centre * (1.0 - half + BLEND), centre * (1.0 + half - BLEND))
    inside = np.linspace(centre * (1.0 - half), centre * (1.0 + half), FINE_POINTS)
    impedance = fine.band.impedance(inside)
    response = _blended(fine.band, wide, choices)
    axial = None if goal.sense is None else axial_ratio_db(fine.band.circular_ratio(inside))
    low, high = target.band
    in_band = np.linspace(low, high, 21)
    worst = None if axial is None else float(np.max(axial_ratio_db(fine.band.circular_ratio(in_band))))
    return Prediction(
        response,
        trusted,
        point_result(fine.band.solution(centre)),
        _gap_impedance(choices, fine),
        margins(response, target.band, target.match_db),
        worst,
        None if axial is None else _band_below(inside, axial, AXIAL_RATIO_DB, centre),
        quality_factor(inside, impedance, centre),
        fitted_circuit(choices, fine.dimensions, inside[::4], impedance[::4]),
        fine.band.problem.basis.count,
        accuracy.moved(complex(fine.band.impedance(np.array([centre]))[0]), wide.at_centre),
    )


def _gap_impedance(choices: Choices, fine: Trial) -> complex:
    """What an ideal source across the gap of the bare loop sees at the centre; without a line that is the board."""
    if not has_line(fine.dimensions):
        return complex(fine.band.impedance(np.array([choices.centre]))[0])
    bare = bare_loop_layout(choices, fine.dimensions, fine.planned.layout)
    settings = replace(default_settings(bare, choices.stackup, choices.centre, coarser=GAP_COARSER), crossed=False)
    return FieldProblem.prepare(bare, choices.stackup, choices.centre, settings).solve(choices.centre).impedance


def _blended(fine: BandSolution, wide: Wide, choices: Choices) -> Response:
    """Reflection over the whole range: that of the fine mesh inside, blended into that of the coarse one outside."""
    reference, half = choices.brief.target.impedance, _solved_half(choices)
    frequency = choices.centre * wide.shares
    outside = np.clip((np.abs(wide.shares - 1.0) - half + BLEND) / BLEND, 0.0, 1.0)
    weight = 0.5 * (1.0 + np.cos(np.pi * outside))
    reflected = (1.0 - weight) * reflection(wide.impedance, reference)
    used = weight > 0.0
    reflected[used] += weight[used] * reflection(fine.impedance(frequency[used]), reference)
    return Response(frequency, reflected, reference)


def _band_below(frequency: Array, values: Array, limit: float, centre: float) -> tuple[float, float] | None:
    """The band (low, high) Hz round `centre` in which `values` stay below `limit`, linear between samples."""
    place = int(np.argmin(np.abs(frequency - centre)))
    if values[place] > limit:
        return None
    ends = []
    for step in (-1, 1):
        at = place
        while 0 <= at + step < len(values) and values[at + step] <= limit:
            at += step
        if 0 <= at + step < len(values):
            rise = (limit - values[at]) / (values[at + step] - values[at])
            ends.append(float(frequency[at] + rise * (frequency[at + step] - frequency[at])))
        else:
            ends.append(float(frequency[at]))
    return ends[0], ends[1]


def unmet(choices: Choices, prediction: Prediction, severity: Severity) -> list[Finding]:
    """What of the brief's target the prediction misses, with what this copper does reach."""
    target, found = choices.brief.target, []
    spare = prediction.margins
    if spare.spare_db < 0.0:
        got = f"{spare.worst_db:.1f} dB at {show(spare.worst_at, 'frequency', 4)}"
        band = spare.band
        reached = "this copper reaches it nowhere near the band" if band is None else _spoken(band.low, band.high)
        found.append(Finding("match over the band", "target.match", got, f"{target.match_db:g} dB", reached, severity))
    if prediction.worst_axial_ratio_db is None:
        return found
    if prediction.worst_axial_ratio_db > AXIAL_RATIO_DB:
        band3 = prediction.axial_band
        reached = "it is above 3 dB all over" if band3 is None else _spoken(*band3)
        got = f"{prediction.worst_axial_ratio_db:.1f} dB over the band"
        found.append(Finding("axial ratio", "target.polarisation", got, f"{AXIAL_RATIO_DB:g} dB", reached, severity))
    if not target.polarisation.endswith(prediction.centre.sense):
        got = f"{prediction.centre.sense} toward the top"
        found.append(Finding("sense", "target.polarisation", got, target.polarisation, "", severity))
    return found


def _spoken(low: float, high: float) -> str:
    return f"this copper reaches it from {show(low, 'frequency', 4)} to {show(high, 'frequency', 4)}"


def prediction_facts(prediction: Prediction) -> Mapping[str, Any]:
    """The prediction in plain types, units in the names."""
    point, spare = prediction.centre, prediction.margins
    z = point.input_impedance_ohm
    return {
        "input_impedance_ohm": [z.real, z.imag],
        "gap_impedance_ohm": [prediction.gap_impedance_ohm.real, prediction.gap_impedance_ohm.imag],
        "worst_reflection_db": spare.worst_db,
        "matched_band_hz": None if spare.band is None else [spare.band.low, spare.band.high],
        "margin_hz": None if spare.below is None else [spare.below, spare.above],
        "best_match_hz": prediction.best_match,
        "gain_dbi": point.gain_dbi,
        "gain_below_dbi": point.gain_below_dbi,
        "efficiency": point.efficiency,
        "axial_ratio_db": None if prediction.worst_axial_ratio_db is None else point.axial_ratio_db,
        "worst_axial_ratio_db": prediction.worst_axial_ratio_db,
        "axial_ratio_band_hz": None if prediction.axial_band is None else list(prediction.axial_band),
        "sense": "linear" if prediction.worst_axial_ratio_db is None else point.sense,
        "quality": prediction.quality,
        "power_balance": point.power_balance,
        "unknowns": prediction.unknowns,
        "convergence": prediction.convergence,
        "trusted_hz": list(prediction.trusted),
        "circuit_deviation": prediction.circuit.deviation,
    }

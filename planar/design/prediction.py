"""What the field solver says of the board that ships: match, margin, gain, polarisation, and the circuit for it.

The fine mesh is asked over a fifth of the frequency to either side. From DC to twice the frequency the sizing mesh
answers: there nothing is promised, it shows what else the antenna does. Where the two meet they are blended.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, replace
from typing import Any

import numpy as np
from numpy.typing import NDArray

from planar.design.bare_loop import bare_loop_layout
from planar.design.choices import Choices
from planar.design.equivalent import fitted_circuit
from planar.design.goal import Goal
from planar.design.sizing import COARSER, verifying_effort
from planar.design.trial import Effort, Trial, solve_trial
from planar.errors import Finding, RangeError, Severity
from planar.field.band import BandSolution, axial_ratio_db
from planar.field.result import PointResult, point_result
from planar.field.solver import FieldProblem, default_settings
from planar.network.circuit import Circuit
from planar.network.quality import Margins, margins, quality_factor
from planar.network.response import Response
from planar.units import show

Array = NDArray[np.float64]
Complex = NDArray[np.complex128]

BLEND = 0.04
"""Of the centre frequency, the width over which it hands over to the sizing mesh."""
LOWEST, HIGHEST, WIDE_NODES = 0.05, 2.2, 14
"""Ends of the wide response over the centre frequency, and the solutions it rests on."""
GAP_COARSER = 1.5
"""Step of the bare loop's mesh over the default."""
FINE_POINTS, WIDE_POINTS = 161, 173
"""Frequencies inside the trusted span and over the whole."""
AXIAL_RATIO_DB = 3.0
"""dB, axial ratio up to which polarisation counts as circular (common practice, no source)."""
LOW_EFFICIENCY = 0.5
"""Efficiency below which a finding says so."""
LEAST_CONVERGENCE = 0.15
"""Change of the input impedance between two meshes, of its magnitude, above which nothing is shown."""


@dataclass(frozen=True, eq=False)
class Prediction:
    """The solved board at the connector's reference plane.

    `response` from nearly DC to 2.2 times the centre, by the fine mesh inside `trusted` (low, high) Hz. `centre` at the
    middle of the band, `gap_impedance_ohm` of the bare loop there. `worst_axial_ratio_db` over the band, `axial_band`
    (low, high) Hz in which it is below 3 dB; both None for linear polarisation. `quality` of the port by Yaghjian and
    Best. `convergence` is the change of the input impedance from the mesh used for sizing, of its magnitude.
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
    """What the sizing mesh says of the board of `dimensions`: `impedance` (f,) ohm at `wide_frequencies`, and at the
    centre."""

    dimensions: Mapping[str, float]
    impedance: Complex
    at_centre: complex


def wide_response(task: tuple[Choices, Mapping[str, float]]) -> Wide:
    """The board of these dimensions on the sizing mesh, from nearly DC to over twice the frequency."""
    choices, dimensions = task
    centre = choices.centre
    band = solve_trial(choices, dimensions, Effort(COARSER, WIDE_NODES, (LOWEST * centre, HIGHEST * centre))).band
    frequencies = centre * _shares(_trusted(choices))
    return Wide(dimensions, band.impedance(frequencies), complex(band.impedance(np.array([centre]))[0]))


def _trusted(choices: Choices) -> float:
    """Half the span the fine mesh is asked over, of the centre frequency."""
    low, high = verifying_effort(choices).span
    return 0.5 * (high - low) / choices.centre


def _shares(trusted: float) -> Array:
    """Frequencies of the wide response over the centre: close inside the trusted span."""
    near = np.linspace(1.0 - trusted, 1.0 + trusted, FINE_POINTS)
    shares: Array = np.unique(np.round(np.concatenate([np.linspace(LOWEST, HIGHEST, WIDE_POINTS), near]), 9))
    return shares


def predict(choices: Choices, fine: Trial, wide: Wide) -> Prediction:
    """Prediction for the board of `fine`, with the `wide` response of the same board on another mesh.

    Raises `RangeError` where the two meshes differ too much to be believed.
    """
    goal, target = Goal.of(choices), choices.brief.target
    centre = choices.centre
    half = _trusted(choices)
    trusted = (centre * (1.0 - half), centre * (1.0 + half))
    inside = np.linspace(*trusted, FINE_POINTS)
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
        _convergence(complex(fine.band.impedance(np.array([centre]))[0]), wide.at_centre),
    )


def _gap_impedance(choices: Choices, fine: Trial) -> complex:
    """What an ideal source across the gap of the bare loop sees at the centre; without a line that is the board."""
    if not {"line_width", "strip_width"} & set(fine.dimensions):
        return complex(fine.band.impedance(np.array([choices.centre]))[0])
    bare = bare_loop_layout(choices, fine.dimensions, fine.planned.layout)
    settings = replace(default_settings(bare, choices.stackup, choices.centre, coarser=GAP_COARSER), crossed=False)
    return FieldProblem.prepare(bare, choices.stackup, choices.centre, settings).solve(choices.centre).impedance


def _convergence(fine: complex, coarse: complex) -> float:
    convergence = abs(coarse - fine) / abs(fine)
    if convergence > LEAST_CONVERGENCE:
        raise RangeError(
            f"the input impedance moves by {100 * convergence:.0f} % between two meshes, at most "
            f"{100 * LEAST_CONVERGENCE:.0f} % is accepted: this copper needs a finer mesh than the default"
        )
    return convergence


def _blended(fine: BandSolution, wide: Wide, choices: Choices) -> Response:
    """Reflection over the whole range: that of the fine mesh inside, blended into that of the coarse one outside."""
    reference, trusted = choices.brief.target.impedance, _trusted(choices)
    shares = _shares(trusted)
    frequency = choices.centre * shares
    outside = np.clip((np.abs(shares - 1.0) - trusted) / BLEND, 0.0, 1.0)
    weight = 0.5 * (1.0 + np.cos(np.pi * outside))
    reflection = (1.0 - weight) * (wide.impedance - reference) / (wide.impedance + reference)
    used = weight > 0.0
    near = fine.impedance(frequency[used])
    reflection[used] += weight[used] * (near - reference) / (near + reference)
    return Response(frequency, reflection, reference)


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


def solver_findings(prediction: Prediction) -> list[Finding]:
    """What the user must know of the numbers: efficiency, what the endless slab hides."""
    point, found = prediction.centre, []
    if point.efficiency < LOW_EFFICIENCY:
        got = f"about {100.0 * point.efficiency:.0f} %"
        advice = "a metal plane close behind the loop or a lossy laminate takes the rest: move it away or change it"
        found.append(Finding("efficiency", "antenna", got, f"{100.0 * LOW_EFFICIENCY:.0f} %", advice))
    got = f"{100.0 * point.surface_wave_share:.1f} % of the power is guided in the slab"
    advice = "the slab is taken as endless; on the board this part leaves at the edge and fills in the pattern"
    return [*found, Finding("board edge", "board", got, "endless slab", advice, Severity.NOTE)]


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
        "axial_ratio_db": None if point.sense == "linear" else point.axial_ratio_db,
        "worst_axial_ratio_db": prediction.worst_axial_ratio_db,
        "axial_ratio_band_hz": None if prediction.axial_band is None else list(prediction.axial_band),
        "sense": point.sense,
        "quality": prediction.quality,
        "power_balance": point.power_balance,
        "unknowns": prediction.unknowns,
        "convergence": prediction.convergence,
        "trusted_hz": list(prediction.trusted),
        "circuit_deviation": prediction.circuit.deviation,
    }

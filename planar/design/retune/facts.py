"""A retuned board in plain types, units in the names: what `--json` and the report say."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import asdict
from typing import Any

import numpy as np
from numpy.typing import NDArray

from planar.design.retune.advice import advice_sentences
from planar.design.retune.built import Outlook
from planar.design.retune.cuts import Cut
from planar.design.retune.retuned import Retuned
from planar.design.retune.spin import Respin
from planar.design.retune.told import Value

Complex = NDArray[np.complex128]

UNITS: dict[str, tuple[str, float]] = {
    "": ("", 1.0),
    "m": ("_mm", 1e3),
    "s": ("_ps", 1e12),
    "dB": ("_db", 1.0),
    "H": ("_nh", 1e9),
    "F": ("_pf", 1e12),
}
"""Unit of an unknown -> what its name ends in, and the factor."""


def retune_facts(retuned: Retuned) -> dict[str, Any]:
    """Everything of a retuned board in plain types."""
    found, advice = retuned.inferred, retuned.advice
    low, high = found.effect.interval
    return {
        "name": retuned.design.name,
        "measurement": _measurement_facts(retuned),
        "shift": found.effect.shift,
        "shift_interval_95": [low, high],
        "values": [_value_facts(each) for each in found.values],
        "directions": [{"narrowed": each.narrowed, "weights": dict(each.weights)} for each in found.directions],
        "surroundings": retuned.surroundings,
        "told": list(found.said),
        "residual_rms": found.fit.estimate.rms,
        "misfit_per_degree_of_freedom": found.fit.estimate.reduced,
        "advice": list(advice_sentences(advice)),
        "sure": advice.sure,
        "board": _outlook_facts(advice.board),
        "cut_now": [_cut_facts(each) for each in advice.cut.ways],
        "next_spin": [_spin_facts(each) for each in advice.spin.ways],
        "not_advised": [{"what": what, "why": why} for what, why in (*advice.cut.others, *advice.spin.others)],
        "curves": _curve_facts(retuned),
        "findings": [asdict(each) for each in retuned.findings],
    }


def _measurement_facts(retuned: Retuned) -> dict[str, Any]:
    frequency, graded = retuned.measured.response.frequency, retuned.grade
    comparison = retuned.comparison
    return {
        "points": len(frequency),
        "from_hz": float(frequency[0]),
        "to_hz": float(frequency[-1]),
        "reference_ohm": retuned.measured.response.z0,
        "noise": graded.noise,
        "round_trip_delay_ns": graded.delay * 1e9,
        "assumed": [*retuned.measured.assumed, retuned.plane.said],
        "plane_known": retuned.plane.known,
        "sweeps_differ_by": None if comparison is None else comparison.difference,
    }


def _value_facts(value: Value) -> dict[str, Any]:
    ending, factor = UNITS[value.unit]
    numbers = {"nominal": value.nominal, "value": value.value, "low_95": value.low, "high_95": value.high}
    return {"name": value.name} | {f"{key}{ending}": each * factor for key, each in numbers.items()} | {
        "told": value.told,
        "outside_tolerance": value.outside,
        "narrowed": value.narrowed,
        "standard_deviations_away": value.away,
        "shift": value.shift,
    }  # fmt: skip


def _outlook_facts(outlook: Outlook) -> dict[str, Any]:
    return {
        "shift": outlook.shift,
        "best_match_hz": outlook.best_match,
        "worst_reflection_db": outlook.worst_db,
        "matched_band_hz": None if outlook.matched is None else list(outlook.matched),
        "worst_axial_ratio_db": outlook.axial_db,
        "distance": outlook.distance,
        "confidence": outlook.confidence,
    }


def _cut_facts(cut: Cut) -> dict[str, Any]:
    def mm(length: float | None) -> float | None:
        return None if length is None else length * 1e3

    return {
        "what": cut.what,
        "begin_with": cut.begin,
        "first_cut_mm": mm(cut.first),
        "whole_cut_mm": mm(cut.amount),
        "most_mm": mm(cut.spare),
        "tab_pairs_left": cut.artwork.tabs if cut.amount is None else None,
        "after_first": _outlook_facts(cut.after_first),
        "after_whole": _outlook_facts(cut.outlook),
    }


def _spin_facts(way: Respin) -> dict[str, Any]:
    return {
        "what": way.what,
        "moves_mm": {name: [old * 1e3, new * 1e3] for name, (old, new) in way.moves.items()},
        "dimensions_mm": {name: round(value * 1e3, 6) for name, value in way.dimensions.items()},
        "outlook": _outlook_facts(way.outlook),
    }


def _curve_facts(retuned: Retuned) -> Mapping[str, Any]:
    """Reflections of the board itself, nothing in front, against the design's reference; and as the instrument saw."""
    found = retuned.inferred
    count = len(found.model.grid)
    return {
        "reference_ohm": found.model.question.reference,
        "measured_hz": found.sweep.frequency.tolist(),
        "measured": _pairs(found.antenna),
        "seen": _pairs(found.sweep.reflection),
        "seen_by_model": _pairs(found.seen),
        "model_hz": found.model.grid.tolist(),
        "designed": _pairs(found.model.designed[:count]),
        "inferred": _pairs(found.here[:count]),
        "after_next_spin": _pairs(retuned.advice.best.outlook.reflected),
    }


def _pairs(values: Complex) -> list[list[float]]:
    return [[value.real, value.imag] for value in values.tolist()]

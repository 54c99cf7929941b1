"""A spread in plain types, units in the names: what `--json`, `spread.json` and the report page say, and the way back.

Numbers are rounded to what a Monte Carlo of so many boards can hold, so that two runs agree in every byte.
"""

from __future__ import annotations

import json
import math
from collections.abc import Mapping
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray

from planar import __version__
from planar.design.recentre import Recentred
from planar.design.spread import Contributor, Corner, ModelError, Spread
from planar.design.spread_sampling import OTHER_SENSE, Outcome, yield_interval
from planar.design.tolerances import SIGMAS, UNMODELLED, Quantity
from planar.errors import BriefError, Fault

Array = NDArray[np.float64]

DIGITS = 5
"""Of every number."""
PERCENTILES = (1.0, 5.0, 50.0, 95.0, 99.0)
ENVELOPES = (5.0, 50.0, 95.0)
"""Percentiles told of each result, and of the reflection at each frequency."""
FLOOR = 1e-6
"""Least reflection told in dB: -120."""
LAWS_SAID = (
    f"truncated-normal: a bell, its ends at {SIGMAS:g} standard deviations are the tolerance: no board lies beyond; "
    "uniform: even between its ends; triangular: peak at the nominal; either-end: half of the boards at either end. "
    "Mask runs from none, as over edges of copper, to its upper tolerance. "
    "Which law fits which quantity: common practice, no source. All quantities are independent."
)
NEEDED = ("name", "yield", "envelope", "contributors", "samples", "seed")
"""Keys without which a file is no spread."""


def spread_facts(spread: Spread) -> dict[str, Any]:
    """The spread in plain types, units in the names."""
    request = spread.request
    facts: dict[str, Any] = {
        "name": spread.name,
        "planar_version": __version__,
        "samples": request.samples,
        "seed": request.seed,
        "tolerance_factor": request.tolerance,
        "half_uncovered": request.uncovered,
        "band_hz": list(spread.reader.band),
        "match_db": spread.question.choices.brief.target.match_db,
        "axial_ratio_limit_db": spread.limits.axial_db,
        "yield": _yields(spread),
        "nominal": _results(spread.nominal),
        "percentiles": _percentiles(spread.outcome),
        "envelope": _envelope(spread),
        "contributors": [_contributor(each) for each in spread.contributors],
        "interactions": dict(zip(("match_share", "frequency_share", "axial_ratio_share"), spread.rest, strict=True)),
        "corners": [_corner(each, spread.question.quantities) for each in spread.corners],
        "model_error": None if spread.error is None else _error(spread.error),
        "quantities": [_quantity(each) for each in spread.question.quantities],
        "laws": LAWS_SAID,
        "not_varied": [{"what": what, "why": why} for what, why in UNMODELLED],
        "boards_solved": spread.boards,
        "field_solutions": spread.solutions,
    }
    rounded: dict[str, Any] = _rounded(facts)
    return rounded


def recentred_facts(recentred: Recentred) -> dict[str, Any]:
    """What re-centring did, in plain types: dimensions, yields and both spreads."""
    facts = {
        "moved": recentred.moved,
        "changes_mm": {name: [old * 1e3, new * 1e3] for name, (old, new) in recentred.changes.items()},
        "yield_before": recentred.before.total_yield,
        "yield_expected": recentred.expected_yield,
        "yield_after": recentred.after.total_yield,
        "remark": recentred.remark,
        "field_solutions": recentred.solutions,
    }
    rounded: dict[str, Any] = _rounded(facts)
    return rounded | {"before": spread_facts(recentred.before), "after": spread_facts(recentred.after)}


def write_spread(facts: Mapping[str, Any], path: Path) -> None:
    """Write `facts` of a spread to `path` as JSON."""
    path.write_bytes((json.dumps(facts, indent=2, ensure_ascii=False, allow_nan=False) + "\n").encode("utf-8"))


def read_spread(path: Path) -> dict[str, Any]:
    """The facts of a spread in the file `path`. Raises `BriefError` for a file that holds none."""
    try:
        facts = json.loads(path.read_bytes())
    except OSError as error:
        raise _no_spread(path, "file", (error.strerror or "unreadable").lower()) from error
    except (ValueError, RecursionError) as error:
        raise _no_spread(path, "file", "no JSON") from error
    missing = [key for key in NEEDED if not isinstance(facts, dict) or key not in facts]
    if missing:
        raise _no_spread(path, missing[0], "(not given)")
    found: dict[str, Any] = facts
    return found


def _no_spread(path: Path, key: str, value: str) -> BriefError:
    return BriefError([Fault(str(path), key, value, "a spread.json as planar spread writes it")])


def _rounded(value: Any) -> Any:
    """Numbers to so many digits, frequencies and counts too; what is not finite becomes None."""
    if isinstance(value, float):
        return float(f"{value:.{DIGITS}g}") if math.isfinite(value) else None
    if isinstance(value, dict):
        return {key: _exact(each) if key.endswith("_hz") else _rounded(each) for key, each in value.items()}
    return [_rounded(each) for each in value] if isinstance(value, list | tuple) else value


def _exact(value: Any) -> Any:
    """Frequencies to the kilohertz."""
    if isinstance(value, list):
        return [_exact(each) for each in value]
    return value if value is None else float(round(value, -3))


def _decibels(size: Array) -> Array:
    return np.asarray(20.0 * np.log10(np.maximum(size, FLOOR)), dtype=np.float64)


def _yields(spread: Spread) -> dict[str, Any]:
    samples = len(spread.deviations)
    good = int(np.sum(spread.limits.met(spread.outcome)))
    return {
        "total": spread.total_yield,
        "match": spread.match_yield,
        "axial_ratio": spread.axial_yield,
        "total_95_percent": list(yield_interval(good, samples)),
        "total_if_model_errs": list(spread.doubtful_yield),
    }


def _error(error: ModelError) -> dict[str, Any]:
    return {
        "boards_checked": error.checks,
        "reflection": error.reflection,
        "reflection_in_band": error.in_band,
        "axial_ratio_db": error.axial_db,
    }


def _results(outcome: Outcome) -> dict[str, Any]:
    """Results of one board."""
    worst_axial = outcome.worst_axial
    return {
        "worst_reflection_db": float(_decibels(outcome.worst)[0]),
        "shift_percent": 100.0 * float(outcome.shift[0]),
        "worst_axial_ratio_db": None if worst_axial is None else float(worst_axial[0]),
    }


def _percentiles(outcome: Outcome) -> dict[str, Any]:
    """Percentiles of every result."""
    counted = outcome.counted_axial

    def told(values: Array) -> list[float]:
        return [float(each) for each in np.percentile(values, PERCENTILES)]

    return {
        "at_percent": list(PERCENTILES),
        "worst_reflection_db": told(_decibels(outcome.worst)),
        "shift_percent": told(100.0 * outcome.shift),
        "worst_axial_ratio_db": None if counted is None else [_in_sense(each) for each in told(counted)],
    }


def _envelope(spread: Spread) -> dict[str, Any]:
    """Reflection over frequency: percentiles of the boards, one list each, and the board as designed."""
    outcome, question = spread.outcome, spread.question
    axial = outcome.axial
    facts: dict[str, Any] = {
        "frequency_hz": question.frequencies.tolist(),
        "at_percent": list(ENVELOPES),
        "reflection_db": np.percentile(_decibels(outcome.size), ENVELOPES, axis=0).tolist(),
        "nominal_reflection_db": _decibels(spread.nominal.size[0]).tolist(),
        "axial_frequency_hz": None if axial is None else question.axial_frequencies.tolist(),
        "axial_ratio_db": None if axial is None else _axial_envelope(axial),
    }
    return facts


def _axial_envelope(axial: Array) -> list[list[float | None]]:
    """Percentiles of axial ratios (n, a) dB at each frequency; None where they are of the other sense."""
    found = np.percentile(np.minimum(axial, OTHER_SENSE), ENVELOPES, axis=0)
    return [[_in_sense(each) for each in curve] for curve in found.tolist()]


def _in_sense(counted_db: float) -> float | None:
    return counted_db if counted_db < OTHER_SENSE else None


def _contributor(each: Contributor) -> dict[str, Any]:
    low, high = _decibels(np.array(each.worst)).tolist()
    return {
        "name": each.quantity.name,
        "match_share": each.match_share,
        "frequency_share": each.shift_share,
        "axial_ratio_share": each.axial_share,
        "at_low_end": {"worst_reflection_db": low, "shift_percent": 100.0 * each.shift[0]},
        "at_high_end": {"worst_reflection_db": high, "shift_percent": 100.0 * each.shift[1]},
    }


def _corner(corner: Corner, quantities: tuple[Quantity, ...]) -> dict[str, Any]:
    values = zip(quantities, corner.deviations.tolist(), strict=True)
    return {
        "name": corner.name,
        "solved": None if corner.solved is None else _results(corner.solved),
        "modelled": _results(corner.modelled),
        "at": {_unit_name(each): _scaled(each, each.value(place)) for each, place in values},
    }


def _quantity(each: Quantity) -> dict[str, Any]:
    return {
        "name": each.name,
        "unit": "mm" if each.unit else "",
        "nominal": _scaled(each, each.nominal),
        "low": _scaled(each, each.low),
        "high": _scaled(each, each.high),
        "distribution": each.law,
        "source": each.source,
    }


def _unit_name(each: Quantity) -> str:
    return f"{each.name.replace(' ', '_')}{'_mm' if each.unit else ''}"


def _scaled(each: Quantity, value: float) -> float:
    return value * 1e3 if each.unit else value

"""What the page tells beyond design.json: figures that follow from its facts by one subtraction or product."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from planar.report.safety import safety_facts
from planar.units import SPEED_OF_LIGHT


def page_facts(
    facts: Mapping[str, Any], spread: Mapping[str, Any] | None = None, peak_gain_dbi: float | None = None
) -> dict[str, Any]:
    """`facts` (the content of a design.json) with `derived`, `safety` and `spread` added: everything the page shows.

    `spread` is the content of a spread.json, `peak_gain_dbi` the largest gain of the field data, dBi.
    """
    safety = safety_facts(facts, peak_gain_dbi)
    return dict(facts) | {"derived": _derived(facts), "safety": safety, "spread": spread}


def _derived(facts: Mapping[str, Any]) -> dict[str, Any]:
    low, high = facts["band_hz"]
    centre = 0.5 * (low + high)
    told = {
        "centre_hz": centre,
        "mean_line_wavelengths": facts["mean_line_mm"] / 1e3 * centre / SPEED_OF_LIGHT,
        "tolerance_shift_mhz": _tolerance_shifts(facts),
    }
    return told | ({} if facts["prediction"] is None else _margins(facts, centre))


def _margins(facts: Mapping[str, Any], centre: float) -> dict[str, Any]:
    """dB and Hz to spare, fractions of the centre frequency, and whether the match ends outside the trusted span."""
    prediction, target = facts["prediction"], facts["target"]
    matched, axial, margin = prediction["matched_band_hz"], prediction["axial_ratio_band_hz"], prediction["margin_hz"]
    low, high = prediction["trusted_hz"]
    worst_ratio = prediction["worst_axial_ratio_db"]
    return {
        "spare_db": target["match_db"] - prediction["worst_reflection_db"],
        "axial_ratio_spare_db": None if worst_ratio is None else target["axial_ratio_db"] - worst_ratio,
        "matched_fraction": None if matched is None else 2.0 * (matched[1] - matched[0]) / (matched[0] + matched[1]),
        "axial_ratio_fraction": None if axial is None else (axial[1] - axial[0]) / centre,
        "least_margin_hz": None if margin is None else min(margin),
        "beyond_trusted": matched is not None and (matched[0] < low or matched[1] > high),
        "guided_share": max(0.0, 1.0 - prediction["power_balance"]),
    }


def _tolerance_shifts(facts: Mapping[str, Any]) -> dict[str, float]:
    """Dimension, or layer and property -> MHz by which its tolerance alone moves the response either way."""
    tolerances = dict(facts["dimension_tolerances_mm"])
    slopes = {each["name"]: abs(each.get("mhz_per_mm", each.get("mhz_per_unit"))) for each in facts["sensitivities"]}
    for layer in facts["layers"]:
        tolerances[f"{layer['name']} thickness"] = layer["thickness_mm"] * layer["thickness_tolerance"]
        if layer["eps_r"] is not None:
            tolerances[f"{layer['name']} permittivity"] = layer["eps_r"] * layer["eps_r_tolerance"]
    return {name: slope * tolerances[name] for name, slope in slopes.items() if tolerances.get(name)}

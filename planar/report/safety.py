"""Exposure figures of a transmitting antenna: radiated power, reference levels, and the distance at which they are met.

Far-field sums for a person in free space in the direction of the highest gain, all of the stated power accepted by the
antenna and sent without pause. Close to the loop they do not hold: `near_field_floor` is the least distance that is
ever told. Levels with edition and source stand in `exposure_limits.toml`. Rules and tests of a country are not here.
"""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

import numpy as np

from planar.design.portrait import Portrait
from planar.errors import RangeError
from planar.report.page_files import page_table
from planar.report.plots_polar import peak_gain
from planar.units import SPEED_OF_LIGHT

DIPOLE_DBI = 2.15
"""dBi, gain of a half-wave dipole, 1.64: what e.r.p. is counted against (ITU-R BS.561)."""
ROUNDED = 0.005
"""dB by which a gain of the pattern cuts may be off for being rounded."""
REFLECTED = 2.0
"""Field over that of free space where all is reflected by ground or wall (OET Bulletin 65, section 2)."""


@dataclass(frozen=True)
class Level:
    """A reference level from `from_mhz` to `to_mhz`: `w_m2` + `w_m2_per_mhz` times the frequency in MHz, W/m2."""

    from_mhz: float
    to_mhz: float
    w_m2: float
    w_m2_per_mhz: float


@dataclass(frozen=True)
class Limit:
    """Reference levels for the public, their `edition` in words and where they stand (`source`)."""

    name: str
    edition: str
    averaged: str
    source: str
    levels: tuple[Level, ...]

    def reference_level(self, frequency: float) -> float:
        """Power density allowed at `frequency` Hz, W/m2. Raises `RangeError` where the edition states none."""
        mhz = frequency / 1e6
        found = [each for each in self.levels if each.from_mhz <= mhz <= each.to_mhz]
        if not found:
            raise RangeError(f"{self.name} states no power density at {mhz:g} MHz")
        return min(each.w_m2 + each.w_m2_per_mhz * mhz for each in found)


def exposure_limits() -> tuple[Limit, ...]:
    """The limits of `exposure_limits.toml`."""
    return tuple(
        Limit(**{**entry, "levels": tuple(Level(**level) for level in entry["levels"])})
        for entry in page_table("exposure_limits.toml")["limit"]
    )


def power_density(power: float, gain_dbi: float, distance: float) -> float:
    """S = P G / (4 pi r^2), W/m2: `power` W accepted, `gain_dbi` dBi, `distance` m (OET Bulletin 65, section 2)."""
    return eirp(power, gain_dbi) / (4.0 * math.pi * distance**2)


def compliance_distance(power: float, gain_dbi: float, level: float) -> float:
    """Distance at which `power_density` falls to `level` W/m2, m."""
    return math.sqrt(eirp(power, gain_dbi) / (4.0 * math.pi * level))


def eirp(power: float, gain_dbi: float) -> float:
    """Equivalent isotropically radiated power, W, of `power` W accepted."""
    return power * math.pow(10.0, gain_dbi / 10.0)


def erp(power: float, gain_dbi: float) -> float:
    """Effective radiated power, W: against a half-wave dipole, 2.15 dB below `eirp`."""
    return eirp(power, gain_dbi - DIPOLE_DBI)


def dbm(power: float) -> float:
    """`power` W in dB over a milliwatt."""
    return 10.0 * math.log10(power / 1e-3)


def near_field_floor(diameter: float, frequency: float) -> float:
    """Distance inside which the far-field sum does not hold, m: the loop's `diameter` m, or the reach of its stored
    field, wavelength / 2 pi (ICNIRP 2020, reactive near field), whichever is larger; a full-wave loop has the former.
    """
    return max(diameter, SPEED_OF_LIGHT / frequency / (2.0 * math.pi))


def safety_facts(facts: Mapping[str, Any], peak_gain_dbi: float | None = None) -> dict[str, Any] | None:
    """Exposure figures for the content of a design.json, units in the names; None for a receiving antenna, and where
    no gain is predicted. Levels are those of the low end of the band, the strictest in it.

    The gain is the largest known, `direction` says where: at right angles to the board at the centre of the band, or
    among what `peak_gain_dbi`, the `known_gain` of the field data in dBi, is the largest of.
    """
    power, prediction = facts["target"]["power_w"], facts["prediction"]
    if not facts["target"]["transmit"] or prediction is None:
        return None
    gain, direction = _largest_gain(prediction, peak_gain_dbi)
    frequency = facts["band_hz"][0]
    floor = near_field_floor(_diameter_mm(facts) / 1e3, frequency)
    return {
        "power_w": power,
        "gain_dbi": gain,
        "direction": direction,
        "eirp_w": eirp(power, gain),
        "eirp_dbm": dbm(eirp(power, gain)),
        "erp_w": erp(power, gain),
        "erp_dbm": dbm(erp(power, gain)),
        "floor_mm": floor * 1e3,
        "limits": [_limit_facts(limit, (power, gain), frequency, floor) for limit in exposure_limits()],
    }


def known_gain(portrait: Portrait, band: tuple[float, float]) -> float:
    """The largest gain in `portrait`, dBi: in its pattern cuts, and toward the top inside the `band` (low, high) Hz."""
    low, high = band
    inside = portrait.gain_dbi[(portrait.frequency > low) & (portrait.frequency < high)]
    edges = np.interp(band, portrait.frequency, portrait.gain_dbi)
    return float(max([peak_gain(portrait), *inside.tolist(), *edges.tolist()]))


def _largest_gain(prediction: Mapping[str, Any], peak_gain_dbi: float | None) -> tuple[float, str]:
    """The largest gain known in dBi, and in which direction."""
    normal = "at right angles to the board, toward the"
    gain, direction = prediction["gain_dbi"], f"{normal} top"
    below = prediction["gain_below_dbi"]
    if below is not None and below > gain:
        gain, direction = below, f"{normal} bottom"
    if peak_gain_dbi is not None and peak_gain_dbi > gain + ROUNDED:
        return peak_gain_dbi, "of the two pattern cuts, and toward the top of all the band"
    return gain, direction


def _diameter_mm(facts: Mapping[str, Any]) -> float:
    """Outer size of the loop, the larger of width and height, mm."""
    sizes = facts["dimensions_mm"]
    return float(max(sizes["loop_width"], sizes.get("loop_height", 0.0)) + sizes["trace_width"])


def _limit_facts(limit: Limit, source: tuple[float, float], frequency: float, floor: float) -> dict[str, Any]:
    told: dict[str, Any] = {
        "name": limit.name,
        "edition": limit.edition,
        "averaged": limit.averaged,
        "source": limit.source,
    }
    try:
        level = limit.reference_level(frequency)
    except RangeError:
        empty = ("level_w_m2", "far_field_mm", "distance_mm", "reflected_mm", "floor_holds")
        return told | dict.fromkeys(empty)
    reach = compliance_distance(*source, level)
    return told | {
        "level_w_m2": level,
        "far_field_mm": reach * 1e3,
        "distance_mm": max(reach, floor) * 1e3,
        "reflected_mm": max(REFLECTED * reach, floor) * 1e3,
        "floor_holds": reach < floor,
    }

"""Radiated power and public exposure levels against the published levels and sums.

ICNIRP 2020, Health Physics 118, 483, table 5, general public; 47 CFR 1.1310, table 1 (B): both from memory. e.r.p. is
counted against the half-wave dipole, whose directivity follows from the cosine integral (Balanis, Antenna Theory, eq.
4-91; from memory).
"""

import math
from collections.abc import Callable

import numpy as np
import pytest
from scipy.special import sici

from planar.report import safety

ICNIRP, FCC = safety.exposure_limits()
LEVELS = [
    ("ICNIRP 2020, whole body (M)", ICNIRP, 434.0, 2.17, "W/m2", 1.0),
    ("ICNIRP 2020, whole body (M)", ICNIRP, 868.0, 4.34, "W/m2", 1.0),
    ("ICNIRP 2020, whole body (M)", ICNIRP, 2450.0, 10.0, "W/m2", 1.0),
    ("47 CFR 1.1310 (M)", FCC, 434.0, 0.289, "mW/cm2", 0.1),
    ("47 CFR 1.1310 (M)", FCC, 868.0, 0.579, "mW/cm2", 0.1),
    ("47 CFR 1.1310 (M)", FCC, 2450.0, 1.0, "mW/cm2", 0.1),
]
"""Source, limit, MHz, level, its unit, and that unit in W/m2 inverted."""


@pytest.mark.parametrize("row", LEVELS, ids=lambda row: f"{row[0][:4]} {row[2]:g} MHz")
def test_public_levels(row: tuple[str, safety.Limit, float, float, str, float], evidence: Callable[..., None]) -> None:
    source, limit, mhz, theirs, unit, scale = row
    evidence(
        f"public level at {mhz:g} MHz",
        source=source,
        theirs=theirs,
        ours=scale * limit.reference_level(1e6 * mhz),
        unit=unit,
        allowed="5e-4",
        why="half a unit of the last printed digit",
    )


def test_power_density(evidence: Callable[..., None]) -> None:
    evidence(
        "power density of 1 W, 3.4 dBi, at 0.2 m",
        source="P G/(4 pi r^2) (C)",
        theirs=4.3524,
        ours=safety.power_density(1.0, 3.4, 0.2),
        unit="W/m2",
        allowed="5e-5",
        why="half a unit of the last printed digit",
    )


def test_dipole_gain(evidence: Callable[..., None]) -> None:
    """D = 4/Cin(2 pi), Cin(x) = gamma + ln x - Ci(x)."""
    cin = np.euler_gamma + math.log(2.0 * math.pi) - sici(2.0 * math.pi)[1]
    evidence(
        "gain of the half-wave dipole, e.r.p. below e.i.r.p.",
        source="4/Cin(2 pi) by scipy, Balanis (M)",
        theirs=10.0 * math.log10(4.0 / cin),
        ours=10.0 * math.log10(safety.eirp(1.0, 3.4) / safety.erp(1.0, 3.4)),
        unit="dB",
        allowed="5e-3",
        why="2.15 is the rounded figure of ITU-R BS.561",
    )


def test_twenty_five_milliwatts(evidence: Callable[..., None]) -> None:
    """The usual limit of the 868 MHz band, 25 mW e.r.p., is 14 dBm e.r.p. and 16.15 dBm e.i.r.p. (trade, no source)."""
    power = 0.025
    evidence(
        "25 mW into a half-wave dipole: e.r.p. and e.i.r.p.",
        source="common practice, no source (T)",
        theirs=[14.0, 16.15],
        ours=[safety.dbm(safety.erp(power, 2.15)), safety.dbm(safety.eirp(power, 2.15))],
        unit="dBm",
        allowed="0.03",
        why="25 mW is 13.98 dBm",
    )

"""Tabulated line values from outside the project, each with its source beside it."""

import math
from collections.abc import Callable

import pytest

from planar.errors import SynthesisError
from planar.lines.coplanar import coplanar_strips_conformal
from planar.lines.microstrip import quasi_static
from planar.lines.quarter_wave import quarter_wave_bandwidth, quarter_wave_section
from planar.lines.static_spectral import DielectricLayer, coplanar_strips_static, microstrip_static
from planar.lines.surface import roughness_factor, skin_depth, surface_resistance
from planar.units import WAVE_IMPEDANCE

MM = 1e-3
GALERKIN = "spectral Galerkin, zero thickness (C)"
STATIC_PAIR = "static solution of two strips on a slab (C)"

# eps_r, w/h, ohm, eps_eff: zero thickness, spectral Galerkin computed independently of this project.
MICROSTRIP = [
    (4.4, 0.5, 95.414, 3.0524),
    (4.4, 1.0, 71.015, 3.1693),
    (4.4, 2.0, 48.680, 3.3447),
    (4.4, 5.0, 25.863, 3.6433),
    (2.2, 1.0, 94.908, 1.7744),
    (9.9, 1.0, 49.071, 6.6375),
]

# eps_r, height, width, gap (mm), ohm, eps_eff, error of the conformal formula in eps_eff: computed independently.
COPLANAR = [
    (4.4, 1.6, 1.0, 1.0, 152.36, 2.5015, 0.003),
    (4.4, 1.6, 1.0, 0.5, 123.59, 2.5722, 0.002),
    (4.4, 1.6, 3.0, 0.2, 79.09, 2.4112, -0.024),
    (3.38, 0.813, 3.0, 0.2, 90.71, 1.8331, -0.078),
]


@pytest.mark.parametrize(("eps_r", "ratio", "impedance", "eps_eff"), MICROSTRIP)
def test_exact_microstrip(
    eps_r: float, ratio: float, impedance: float, eps_eff: float, evidence: Callable[..., None]
) -> None:
    """Tolerance: the last printed digit."""
    line = microstrip_static(ratio * MM, below=[DielectricLayer(MM, eps_r)])
    name, why = f"exact static microstrip, eps_r {eps_r:g}, w/h {ratio:g}", "the last printed digit"
    evidence(
        f"{name}: impedance",
        source=GALERKIN,
        theirs=impedance,
        ours=line.impedance,
        unit="ohm",
        allowed="2e-3 %",
        why=why,
    )
    evidence(f"{name}: eps_eff", source=GALERKIN, theirs=eps_eff, ours=line.eps_eff, allowed="3e-3 %", why=why)


@pytest.mark.parametrize(("eps_r", "ratio", "impedance", "eps_eff"), MICROSTRIP)
def test_closed_microstrip_formula(
    eps_r: float, ratio: float, impedance: float, eps_eff: float, evidence: Callable[..., None]
) -> None:
    """Hammerstad & Jensen state 0.2 % in permittivity."""
    line = quasi_static(ratio, 0.0, eps_r)
    name, why = f"Hammerstad-Jensen microstrip, eps_r {eps_r:g}, w/h {ratio:g}", "they state 0.2 % in permittivity"
    evidence(
        f"{name}: impedance",
        source=GALERKIN,
        theirs=impedance,
        ours=line.impedance,
        unit="ohm",
        allowed="0.3 %",
        why=why,
    )
    evidence(f"{name}: eps_eff", source=GALERKIN, theirs=eps_eff, ours=line.eps_eff, allowed="0.3 %", why=why)


@pytest.mark.parametrize("row", COPLANAR, ids=str)
def test_coplanar_strips(row: tuple[float, ...], evidence: Callable[..., None]) -> None:
    """0.05 %: the table's impedance of the two narrow gaps is that much off the exact air line (see the unit tests)."""
    eps_r, height, width, gap, impedance, eps_eff, formula_error = row
    line = coplanar_strips_static(width * MM, gap * MM, below=[DielectricLayer(height * MM, eps_r)])
    conformal = coplanar_strips_conformal(width * MM, gap * MM, height * MM, eps_r)
    name = f"coplanar strips {width:g} mm, gap {gap:g} mm on {height:g} mm, eps_r {eps_r:g}"
    evidence(
        f"{name}: impedance",
        source=STATIC_PAIR,
        theirs=impedance,
        ours=line.impedance,
        unit="ohm",
        allowed="0.05 %",
        why="as far as the source is off the exact air line",
    )
    evidence(
        f"{name}: eps_eff",
        source=STATIC_PAIR,
        theirs=eps_eff,
        ours=line.eps_eff,
        allowed="5e-3 %",
        why="the last printed digit",
    )
    evidence(
        f"{name}: error of the sinh formula in eps_eff",
        source=STATIC_PAIR,
        theirs=100.0 * formula_error,
        ours=100.0 * (conformal.eps_eff / line.eps_eff - 1.0),
        unit="%",
        allowed="0.06",
        why="the last printed digit",
    )


def test_wide_pair_with_a_narrow_gap(evidence: Callable[..., None]) -> None:
    """About 86 ohm and 2.4 for w 3, s 0.3 mm on 1.6 mm of 4.4 (independent computation, rounded so)."""
    line = coplanar_strips_static(3 * MM, 0.3 * MM, below=[DielectricLayer(1.6 * MM, 4.4)])
    name, why = "coplanar strips 3 mm, gap 0.3 mm on 1.6 mm, eps_r 4.4", "rounded so"
    source = "conformal mapping, rounded (C)"
    evidence(f"{name}: impedance", source=source, theirs=86.0, ours=line.impedance, unit="ohm", allowed="0.6", why=why)
    evidence(f"{name}: eps_eff", source=source, theirs=2.4, ours=line.eps_eff, allowed="0.05", why=why)


@pytest.mark.parametrize(
    ("frequency", "depth", "resistance", "factor"),
    [(1e9, 2.0873e-6, 8.2403e-3, 1.1979), (2.45e9, 1.3335e-6, 12.8981e-3, 1.4246)],
)
def test_copper_surface(
    frequency: float, depth: float, resistance: float, factor: float, evidence: Callable[..., None]
) -> None:
    """Hammerstad & Bekkadal 1975, at 1.72e-8 ohm m and 1.0 um roughness; tolerance: the last printed digit."""
    conductivity = 1.0 / 1.72e-8
    rows = (
        ("skin depth", 1e6 * depth, 1e6 * skin_depth(frequency, conductivity), "um", "3e-3 %"),
        ("resistance", 1e3 * resistance, 1e3 * surface_resistance(frequency, conductivity), "mohm", "1e-3 %"),
        ("factor of 1 um roughness", factor, roughness_factor(frequency, conductivity, 1e-6), "", "5e-3 %"),
    )
    for name, theirs, ours, unit, allowed in rows:
        evidence(
            f"copper surface, {1e-9 * frequency:g} GHz: {name}",
            source="Hammerstad & Bekkadal 1975 (P, C)",
            theirs=theirs,
            ours=ours,
            unit=unit,
            allowed=allowed,
            why="the last printed digit",
        )


@pytest.mark.parametrize(
    ("load", "impedance", "degrees"), [(115 + 30j, 80.264, 106.04), (340 + 6j, 130.41, 90.45), (500 + 0j, 158.0, 90.0)]
)
def test_quarter_wave_section(load: complex, impedance: float, degrees: float, evidence: Callable[..., None]) -> None:
    """Computed independently; the last row is common practice ("about 158 ohm"), no source."""
    got, angle = quarter_wave_section(50.0, load)
    rough = load == 500
    rows = (
        ("impedance", impedance, got, "ohm", "0.1 %" if rough else "4e-3 %", "the last stated digit"),
        ("length", degrees, math.degrees(angle), "degrees", "0.006", "the last printed digit"),
    )
    for name, theirs, ours, unit, allowed, why in rows:
        evidence(
            f"section from 50 ohm to {load.real:g}{load.imag:+g}j ohm: {name}",
            source="common practice, no source (T)" if rough else "solved for Zin = Z0 (C)",
            theirs=theirs,
            ours=ours,
            unit=unit,
            allowed=allowed,
            why=why,
        )


@pytest.mark.parametrize(("load", "bandwidth"), [(110.0, 1.354), (140.0, 0.913)])
def test_quarter_wave_bandwidth(load: float, bandwidth: float, evidence: Callable[..., None]) -> None:
    """Pozar, Microwave Engineering, 3rd ed., eq. 5.33, VSWR 2 at 50 ohm."""
    evidence(
        f"bandwidth of a quarter-wave line, 50 to {load:g} ohm, VSWR 2",
        source="Pozar, Microwave Engineering, 3rd ed., eq. 5.33 (P)",
        theirs=bandwidth,
        ours=quarter_wave_bandwidth(50.0, load, 2.0),
        allowed="5e-4",
        why="half a unit of the last printed digit",
    )


def test_wave_impedance(evidence: Callable[..., None]) -> None:
    """CODATA 2022: 376.730 ohm."""
    evidence(
        "wave impedance of free space",
        source="CODATA 2022 (P)",
        theirs=376.730,
        ours=WAVE_IMPEDANCE,
        unit="ohm",
        allowed="5e-4",
        why="half a unit of the last printed digit",
    )


def test_unmatchable_load_is_refused() -> None:
    """From Z_t^2 <= 0: 30 + j40 ohm needs its reactance within sqrt(30 x 20) ohm (hand calculation)."""
    with pytest.raises(SynthesisError, match=r"by more than 20 ohm.*within \+-24\.49 ohm"):
        quarter_wave_section(50.0, 30 + 40j)

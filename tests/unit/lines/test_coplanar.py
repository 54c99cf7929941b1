"""Coplanar strips: thickness and loss against Wheeler's rule and exact limits; refusals."""

import math
from dataclasses import replace

import pytest
from scipy import integrate, special

from planar.errors import RangeError
from planar.lines.coplanar import (
    air_capacitance,
    coplanar_strips_conformal,
    stopping_distance,
    strip_resistance,
)
from planar.lines.line import Conductor, Line, Substrate, analyse
from planar.lines.static_spectral import DielectricLayer, coplanar_strips_static
from planar.lines.surface import surface_resistance
from planar.lines.thick_pair import thick_pair_capacitance
from planar.units import SPEED_OF_LIGHT, VACUUM_PERMITTIVITY

MM = 1e-3
FR4 = Substrate(height=1.6e-3, eps_r=4.4, tan_d=0.02)
COPPER = Conductor(thickness=35e-6, conductivity=5.8e7)
THIN = Conductor(thickness=0.0, conductivity=5.8e7)


def solve(
    width: float, gap: float, substrate: Substrate = FR4, conductor: Conductor = COPPER, frequency: float = 0.9e9
) -> Line:
    return analyse("coplanar-strips", width, gap=gap, substrate=substrate, conductor=conductor, frequency=frequency)


def test_zero_thickness_is_the_static_solution() -> None:
    exact = coplanar_strips_static(MM, 0.5 * MM, below=[DielectricLayer(1.6 * MM, 4.4)])
    line = solve(MM, 0.5 * MM, conductor=THIN)
    assert line.impedance == pytest.approx(exact.impedance, rel=1e-12)
    assert line.eps_eff == pytest.approx(exact.eps_eff, rel=1e-12)


@pytest.mark.parametrize("panels", [24, 40, 80])
def test_square_wires_in_air(panels: int) -> None:
    """Two square wires far apart: each acts as a round one of radius 0.59017 a, G(1/4)^2/(4 pi^1.5) (exact map)."""
    radius = special.gamma(0.25) ** 2 / (4.0 * math.pi**1.5)
    exact = math.pi * VACUUM_PERMITTIVITY / math.acosh(41.0 / (2.0 * radius))
    assert thick_pair_capacitance(1.0, 40.0, 1.0, panels=panels) == pytest.approx(exact, rel=0.03 / panels**2 + 1e-6)


def test_isolated_thick_strip_widens_as_published() -> None:
    """(t/pi) (1 + ln(4 pi w/t)) wider in free space (Wheeler; Cohn, from memory), gap far larger than width."""
    width, gap, thickness = 1.0, 31.0, 0.035
    widening = thickness / math.pi * (1.0 + math.log(4.0 * math.pi * width / thickness))
    widened = air_capacitance(width + widening, gap - widening)
    assert thick_pair_capacitance(width, gap, thickness) == pytest.approx(widened, rel=5e-4)


@pytest.mark.parametrize(("width", "gap"), [(1.14, 0.27), (3.0, 0.2), (1.0, 1.0)])
def test_default_panels_have_converged(width: float, gap: float) -> None:
    fine = thick_pair_capacitance(width, gap, 0.035, panels=160)
    assert thick_pair_capacitance(width, gap, 0.035) == pytest.approx(fine, rel=2.5e-4)


def test_thickness_adds_more_than_the_facing_plates() -> None:
    """Lower bound: the facing side walls alone are a plate capacitor t/s."""
    added = thick_pair_capacitance(1.14, 0.27, 0.035) - air_capacitance(1.14, 0.27)
    assert VACUUM_PERMITTIVITY * 0.035 / 0.27 < added < 1.5 * VACUUM_PERMITTIVITY * 0.035 / 0.27
    assert solve(1.14 * MM, 0.27 * MM).impedance < solve(1.14 * MM, 0.27 * MM, conductor=THIN).impedance


def test_strip_resistance_is_the_integral() -> None:
    """Closed form against numerical quadrature of the exact thin-strip current (conformal mapping)."""
    width, gap, stop = 1.3, 0.4, 1e-3
    a, b = gap / 2, gap / 2 + width
    amplitude = b / special.ellipk(1 - (a / b) ** 2)
    value, _ = integrate.quad(
        lambda x: amplitude**2 / ((x * x - a * a) * (b * b - x * x)), a + stop, b - stop, limit=400
    )
    assert strip_resistance(width, gap, stop) == pytest.approx(value, rel=1e-8)


@pytest.mark.parametrize(
    ("width", "gap", "thickness"), [(1.14, 0.27, 0.035), (1.0, 1.0, 0.035), (1.0, 1.0, 0.018), (3.0, 0.2, 0.035)]
)
def test_conductor_loss_against_wheelers_rule(width: float, gap: float, thickness: float) -> None:
    """Wheeler, Proc. IRE 30 (1942) 412, on the boundary-element inductance. Two approximations: within 8 %."""
    step = 0.02 * thickness

    def inductance(recede: float) -> float:
        return VACUUM_PERMITTIVITY / thick_pair_capacitance(
            width - 2 * recede, gap + 2 * recede, thickness - 2 * recede, panels=80
        )

    wheeler = (inductance(step) - inductance(-step)) / (2 * step)
    assert strip_resistance(width, gap, stopping_distance(thickness)) == pytest.approx(wheeler, rel=8e-2)


def test_conductor_loss_is_resistance_over_twice_impedance() -> None:
    line = solve(MM, MM)
    resistance = surface_resistance(0.9e9, 5.8e7) * strip_resistance(MM, MM, stopping_distance(35e-6))
    assert line.alpha_conductor == pytest.approx(resistance / (2 * line.impedance), rel=1e-12)


def test_half_space_dielectric_loss() -> None:
    """Exact: on a half space the filling factor is 1/2, alpha = k0 eps_r tan_d/(4 sqrt((eps_r + 1)/2))."""
    deep = Substrate(height=20 * MM, eps_r=4.4, tan_d=0.02)
    line = solve(0.5 * MM, 0.2 * MM, substrate=deep, conductor=THIN, frequency=0.1e9)
    wavenumber = 2 * math.pi * 0.1e9 / SPEED_OF_LIGHT
    assert line.alpha_dielectric == pytest.approx(wavenumber * 4.4 * 0.02 / (4 * math.sqrt(2.7)), rel=2e-3)


def test_filling_factor_lies_just_below_the_conformal_one() -> None:
    """The conformal formula (Ghione & Naldi 1984, good at w = s, h > w) is linear in eps_r: mean slope.

    The exact permittivity is concave in eps_r (energy is a minimum over fields), so its slope here is a little less.
    """
    line = solve(MM, MM, conductor=THIN)
    formula = (coplanar_strips_conformal(MM, MM, 1.6 * MM, 4.4).eps_eff - 1) / 3.4
    expected = math.pi * 0.9e9 / SPEED_OF_LIGHT * 4.4 * 0.02 * formula / math.sqrt(line.eps_eff)
    assert 0.95 * expected < line.alpha_dielectric < expected


def test_conformal_formula_survives_thin_slabs_and_is_exact_on_thick_ones() -> None:
    assert coplanar_strips_conformal(20 * MM, 31 * MM, 0.05 * MM, 4.4).eps_eff == pytest.approx(1.0, abs=1e-2)
    assert coplanar_strips_conformal(MM, MM, 1.0, 4.4).eps_eff == pytest.approx(2.7, rel=1e-5)


def test_loss_of_unstated_thickness_is_the_higher_one() -> None:
    """Thickness zero takes the thinnest strip the loss formula covers: more loss than any thicker strip."""
    assert solve(MM, MM, conductor=THIN).alpha_conductor > solve(MM, MM).alpha_conductor


def test_mask_lowers_impedance() -> None:
    masked = replace(FR4, cover=(DielectricLayer(25e-6, 3.5, 0.03),))
    bare, covered = solve(MM, 0.3 * MM), solve(MM, 0.3 * MM, substrate=masked)
    assert 0.90 < covered.impedance / bare.impedance < 0.99
    assert covered.eps_eff > bare.eps_eff
    assert covered.alpha_dielectric > bare.alpha_dielectric


def test_lossless_scaling() -> None:
    """Twice every length at half the frequency: the same line."""
    line = solve(MM, 0.3 * MM)
    double = solve(2 * MM, 0.6 * MM, replace(FR4, height=3.2 * MM), replace(COPPER, thickness=70e-6), frequency=0.45e9)
    assert (double.impedance, double.eps_eff) == pytest.approx((line.impedance, line.eps_eff), rel=1e-9)


@pytest.mark.parametrize(
    ("width", "gap", "frequency", "message"),
    [
        (10 * MM, MM, 2.45e9, "copper extent, gap .* is 21 mm, the formula covers 0 mm to 7.447 mm"),
        (0.2 * MM, 0.1 * MM, 8e9, "slab height is 1.6 mm"),
        (MM, 0.05 * MM, 0.9e9, "copper thickness"),
        (MM, None, 0.9e9, "need a gap"),
    ],
)
def test_refusals(width: float, gap: float, frequency: float, message: str) -> None:
    with pytest.raises(RangeError, match=message):
        solve(width, gap, frequency=frequency)

"""The thin-loop series against integrals worked out here by other means.

Authority: the definitions of King & Smith 1981 (N_n as a Fourier coefficient of the thin-wire
kernel), evaluated by adaptive quadrature; image theory; quasi-static limits.
"""

from __future__ import annotations

import math
from collections.abc import Callable

import pytest
from scipy.integrate import quad

from planar.design.thin_loop import LoopSetting, mode_impedance, resonance, series_kernel, slab_relief
from planar.errors import RangeError
from planar.lines.static_spectral import DielectricLayer

MM = 1e-3


def kernel_by_quadrature(order: int, ka: float, slenderness: float) -> complex:
    """(1/pi) int_0^pi exp(-j ka r)/r cos(n phi) dphi, averaged round the wire.

    r (in loop radii) joins two points of the wire's surface: along the loop 2 sin(phi/2), across it the chord
    2 (b/a) sin(rim/2), as in the definition of the kernel.
    """

    def distance(phi: float, rim: float) -> float:
        return math.sqrt(4.0 * math.sin(0.5 * phi) ** 2 + 4.0 * math.sin(0.5 * rim) ** 2 / slenderness**2)

    def part(rim: float, wave: Callable[[float], float]) -> float:
        def integrand(phi: float) -> float:
            r = distance(phi, rim)
            return wave(ka * r) / r * math.cos(order * phi)

        nearest = [2.0 / slenderness, 20.0 / slenderness]
        return float(quad(integrand, 0.0, math.pi, limit=400, points=nearest, epsabs=1e-7)[0]) / math.pi

    count = 24  # midpoints over half the rim; the logarithm at rim = 0 is integrable
    rims = [math.pi * (i + 0.5) / count for i in range(count)]
    return sum((complex(part(rim, math.cos), -part(rim, math.sin)) for rim in rims), 0j) / count


@pytest.mark.parametrize(("order", "ka"), [(0, 1.0), (1, 1.0), (1, 0.5), (2, 1.1)])
def test_series_kernel_is_the_fourier_coefficient(order: int, ka: float) -> None:
    """Within 1 % of its magnitude: midpoints over the rim's logarithm leave log 2 / (pi count), 0.9 %."""
    slenderness = 200.0
    found = series_kernel(order, ka, LoopSetting(slenderness))
    expected = kernel_by_quadrature(order, ka, slenderness)
    assert abs(found - expected) < 0.012 * abs(expected)
    assert found.imag == pytest.approx(expected.imag, rel=1e-3, abs=1e-4)


def test_orders_of_either_sign_are_one() -> None:
    setting = LoopSetting(100.0, 0.0, 1.5)
    assert series_kernel(-2, 1.0, setting) == series_kernel(2, 1.0, setting)


def test_a_small_loop_is_an_inductor_that_hardly_radiates() -> None:
    """Radiation resistance 20 pi^2 (C/lambda)^4 and inductance mu0 a (ln(8 a/b) - 2): textbook, uniform current."""
    ka, slenderness = 0.02, 100.0
    z = mode_impedance(0, ka, LoopSetting(slenderness))
    reactance = 376.730 * ka * (math.log(8.0 * slenderness) - 2.0)  # omega mu0 a = eta0 ka
    assert z.imag == pytest.approx(reactance, rel=0.01)
    assert z.real == pytest.approx(20.0 * math.pi**2 * ka**4, rel=0.01)


@pytest.mark.parametrize("height", [0.2, 0.6, 1.6])
def test_the_plane_is_an_image_with_opposite_current(height: float) -> None:
    """The kernel's change is the Fourier coefficient of exp(-j ka r)/r to a loop 2h away, by adaptive quadrature."""
    with_plane = series_kernel(1, 1.0, LoopSetting(64.0, 0.0, height))
    alone = series_kernel(1, 1.0, LoopSetting(64.0))

    def part(phase: float) -> float:
        def integrand(phi: float) -> float:
            r = 2.0 * math.sqrt(math.sin(0.5 * phi) ** 2 + height**2)
            return math.cos(r + phase) / r * math.cos(phi)

        return quad(integrand, 0.0, math.pi, epsabs=1e-11)[0] / math.pi

    image = complex(part(0.0), part(0.5 * math.pi))
    assert alone - with_plane == pytest.approx(image, abs=1e-9)


def test_a_near_plane_quenches_the_radiation() -> None:
    """Opposite images cancel as the square of the height: a quarter of the resistance at half the height."""
    low, high = (mode_impedance(1, 1.0, LoopSetting(400.0, 0.0, h)).real for h in (0.05, 0.1))
    assert high / low == pytest.approx(4.0, rel=0.05)


def test_a_thick_slab_is_the_half_space() -> None:
    """Quasi-static limit: a strip on a half-space of eps has (1 + eps)/2; a slab on both sides has eps."""
    radius, width = 16 * MM, 1 * MM
    thick = DielectricLayer(500 * MM, 4.4)
    one = LoopSetting(radius / (0.25 * width), slab_relief(radius, width, below=[thick]))
    both = LoopSetting(radius / (0.25 * width), slab_relief(radius, width, below=[thick], above=[thick]))
    # the near part takes the wire's kernel and the relief a strip's: they differ by 0.5 % here
    assert one.eps_eff == pytest.approx(2.7, rel=0.02)
    assert both.eps_eff == pytest.approx(4.4, rel=0.03)


def test_relief_grows_with_permittivity_and_thickness() -> None:
    def relief(eps_r: float, height: float) -> float:
        return slab_relief(16 * MM, 1 * MM, below=[DielectricLayer(height, eps_r)])

    assert relief(1.0, 1.6 * MM) == pytest.approx(0.0, abs=1e-12)
    assert 0.0 < relief(2.2, 0.8 * MM) < relief(2.2, 1.6 * MM) < relief(4.4, 1.6 * MM)


def test_relief_does_not_care_for_scale() -> None:
    one = slab_relief(16 * MM, 1 * MM, below=[DielectricLayer(1.6 * MM, 4.4)])
    ten = slab_relief(160 * MM, 10 * MM, below=[DielectricLayer(16 * MM, 4.4)])
    assert ten == pytest.approx(one, rel=1e-9)


def test_no_resonance_is_said_so() -> None:
    """On a slab that lowers the charges' potential far enough the loop resonates below the searched range."""
    with pytest.raises(RangeError, match="no full-wave resonance"):
        resonance(LoopSetting(64.0, 0.97 * (series_kernel(1, 1e-9, LoopSetting(64.0)).real)))

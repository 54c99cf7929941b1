"""The spectral solution against exact conformal maps, an independent space-domain solution, and its own convergence."""

import math
import time

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy import special

from planar.errors import RangeError
from planar.lines import static_spectral
from planar.lines.static_spectral import DielectricLayer, coplanar_strips_static, microstrip_static
from planar.units import SPEED_OF_LIGHT, VACUUM_PERMITTIVITY, WAVE_IMPEDANCE

MM = 1e-3
SLAB = DielectricLayer(1.6 * MM, 4.4)
MASK = DielectricLayer(0.025 * MM, 3.5)


def modulus_ratio(k: float) -> float:
    return float(special.ellipk(k * k) / special.ellipk(1.0 - k * k))


@pytest.mark.parametrize(("width", "gap"), [(1, 1), (3, 0.2), (20, 0.05), (0.05, 5), (1, 31)])
def test_pair_in_air_is_exact(width: float, gap: float) -> None:
    """Two coplanar strips in air, Z = eta0 K(k)/K(k') exactly (conformal mapping, any textbook)."""
    line = coplanar_strips_static(width * MM, gap * MM)
    assert line.impedance == pytest.approx(WAVE_IMPEDANCE * modulus_ratio(gap / (gap + 2 * width)), rel=1e-8)
    assert line.eps_eff == pytest.approx(1.0, rel=1e-12)


@pytest.mark.parametrize("m", [0.1, 0.5, 0.8, 0.97])
def test_strip_over_plane_in_air_is_exact(m: float) -> None:
    """Broadside pair (Love 1923; Palmer 1937; from memory), the strip and its image 2h away.

    w/2h = (2/pi) (K E(phi) - E F(phi)), sin^2 phi = (K - E)/(m K), and Z = (eta0/2) K'/K, parameter m.
    """
    big_k, big_e = float(special.ellipk(m)), float(special.ellipe(m))
    phi = math.asin(math.sqrt((big_k - big_e) / (m * big_k)))
    ratio = 4.0 / math.pi * (big_k * float(special.ellipeinc(phi, m)) - big_e * float(special.ellipkinc(phi, m)))
    exact = WAVE_IMPEDANCE * float(special.ellipkm1(m)) / (2.0 * big_k)
    line = microstrip_static(ratio * MM, below=[DielectricLayer(MM, 1.0)])
    assert line.impedance == pytest.approx(exact, rel=1e-8)


def slab_pair_eps_eff(width: float, gap: float, height: float, eps_r: float, panels: int) -> float:
    """Independent solution: constant panels, point matching, images of a charge on a slab summed in space.

    On the surface of a slab 1/(1 + Y) = (1 + sum_n g^(2n-1) (1 + g) exp(-2 k h n))/(1 + eps_r)
    with g = (eps_r - 1)/(eps_r + 1).
    """
    angle = np.linspace(0.0, math.pi, panels + 1)
    edge = (gap + width) / 2.0 - width / 2.0 * np.cos(angle)
    point, length = 0.5 * (edge[1:] + edge[:-1]), np.diff(edge)

    def potential(depth: float) -> np.ndarray:
        def primitive(u: np.ndarray) -> np.ndarray:
            return u - 0.5 * u * np.log(u * u + depth * depth) - depth * np.arctan2(u, depth or 1.0)

        def seen(x: np.ndarray) -> np.ndarray:
            return primitive(x[:, None] - edge[None, :-1]) - primitive(x[:, None] - edge[None, 1:])

        return seen(point) - seen(-point)

    def capacitance(total: np.ndarray) -> float:
        return float(np.linalg.solve(total, np.ones(panels)) @ length)

    air = potential(0.0)
    g = (eps_r - 1.0) / (eps_r + 1.0)
    slab = air + sum(g ** (2 * n - 1) * (1.0 + g) * potential(2.0 * height * n) for n in range(1, 120))
    return capacitance(slab / (1.0 + eps_r)) / capacitance(air / 2.0)


@pytest.mark.parametrize(
    ("width", "gap", "height", "eps_r"), [(1, 1, 1.6, 4.4), (1, 31, 1.6, 4.4), (3, 0.2, 1.6, 4.4), (1, 1, 0.2, 10.2)]
)
def test_pair_on_slab_agrees_with_images_in_space(width: float, gap: float, height: float, eps_r: float) -> None:
    """Second-order panels: the finest of 100, 200 is within 2e-5 and the error falls from one to the other."""
    line = coplanar_strips_static(width * MM, gap * MM, below=[DielectricLayer(height * MM, eps_r)])
    coarse, fine = (slab_pair_eps_eff(width, gap, height, eps_r, panels) for panels in (100, 200))
    assert line.eps_eff == pytest.approx(fine, rel=2e-5)
    assert abs(fine - line.eps_eff) < abs(coarse - line.eps_eff) + 1e-7


def solve_case(case: tuple[float, float | None, tuple[DielectricLayer, ...]]) -> static_spectral.StaticLine:
    width, gap, cover = case
    if gap is None:
        return microstrip_static(width * MM, below=[SLAB], above=cover)
    return coplanar_strips_static(width * MM, gap * MM, below=[SLAB], above=cover)


CASES = [
    (width, gap, cover)
    for width, gap in [(0.1, None), (3, None), (20, None), (1, 1), (3, 0.2), (0.1, 0.1), (20, 0.05), (1, 31), (10, 10)]
    for cover in [(), (MASK,)]
]


@pytest.mark.parametrize("case", CASES, ids=str)
def test_converged(
    monkeypatch: pytest.MonkeyPatch, case: tuple[float, float | None, tuple[DielectricLayer, ...]]
) -> None:
    """Twice the functions, half the panel length and a tail of 1e-13 change nothing beyond 1e-5 (1e-7 without mask)."""
    shipped = solve_case(case)
    terms = static_spectral._terms
    monkeypatch.setattr(static_spectral, "_terms", lambda decay: 2 * terms(decay) + 10)
    monkeypatch.setattr(static_spectral, "_MOST_LAYER_TERMS", 60)
    monkeypatch.setattr(static_spectral, "_PANEL_PHASE", 2.5)
    monkeypatch.setattr(static_spectral, "_PANEL_GROWTH", 1.22)
    monkeypatch.setattr(static_spectral, "_TAIL", 1e-13)
    finer = solve_case(case)
    tolerance = 1e-5 if case[2] else 1e-7
    assert shipped.impedance == pytest.approx(finer.impedance, rel=tolerance)
    assert shipped.eps_eff == pytest.approx(finer.eps_eff, rel=tolerance)


def test_more_functions_raise_the_capacitance(monkeypatch: pytest.MonkeyPatch) -> None:
    """Thomson's theorem: a trial charge bounds the capacitance from below, so the error has one sign; it falls fast."""
    impedances = []
    for count in (2, 4, 8, 16):
        monkeypatch.setattr(static_spectral, "_terms", lambda decay, count=count: count)
        monkeypatch.setattr(static_spectral, "_MOST_LAYER_TERMS", 0)
        impedances.append(coplanar_strips_static(3 * MM, 0.1 * MM, below=[SLAB]).impedance)
    steps = -np.diff(impedances)
    assert np.all(steps > 0.0)
    assert np.all(steps[1:] < 0.2 * steps[:-1])


@pytest.mark.parametrize("highest", [1, 6, 40, 120])
def test_bessel_functions(highest: int) -> None:
    """Against scipy's general-order routine."""
    z = np.geomspace(1e-6, 800.0, 3000)
    expected = special.jv(np.arange(highest + 1)[:, None], z[None, :])
    np.testing.assert_allclose(static_spectral._bessel(highest, z), expected, atol=5e-12)


lengths = st.floats(0.05, 20.0)
permittivities = st.floats(1.0, 12.0)


@settings(max_examples=40, deadline=None)
@given(width=lengths, height=st.floats(0.7, 10.0), eps_r=permittivities, factor=st.floats(1.1, 3.0))
def test_microstrip_invariants(width: float, height: float, eps_r: float, factor: float) -> None:
    """Wider is lower in impedance; permittivity between air and slab; only ratios of lengths matter; mask lowers Z."""
    below = [DielectricLayer(height * MM, eps_r)]
    line = microstrip_static(width * MM, below=below)
    assert 1.0 - 1e-9 <= line.eps_eff <= eps_r + 1e-9
    assert line.eps_eff >= 0.5 * (1.0 + eps_r) - 1e-9
    assert microstrip_static(factor * width * MM, below=below).impedance < line.impedance
    scaled = microstrip_static(factor * width * MM, below=[DielectricLayer(factor * height * MM, eps_r)])
    assert scaled.impedance == pytest.approx(line.impedance, rel=1e-9)
    masked = microstrip_static(width * MM, below=below, above=[MASK])
    assert masked.impedance < line.impedance
    assert masked.eps_eff > line.eps_eff


@settings(max_examples=40, deadline=None)
@given(width=st.floats(0.1, 5.0), gap=st.floats(0.1, 5.0), eps_r=permittivities)
def test_pair_invariants(width: float, gap: float, eps_r: float) -> None:
    """Permittivity at most that of a half space; a slab above equals one below; layers of air change nothing."""
    slab = DielectricLayer(1.6 * MM, eps_r)
    line = coplanar_strips_static(width * MM, gap * MM, below=[slab])
    assert 1.0 - 1e-9 <= line.eps_eff <= 0.5 * (1.0 + eps_r) + 1e-9
    upside_down = coplanar_strips_static(width * MM, gap * MM, above=[slab])
    assert upside_down.impedance == pytest.approx(line.impedance, rel=1e-9)
    split = [DielectricLayer(0.9 * MM, eps_r), DielectricLayer(0.7 * MM, eps_r), DielectricLayer(MM, 1.0)]
    assert coplanar_strips_static(width * MM, gap * MM, below=split).impedance == pytest.approx(
        line.impedance, rel=1e-6
    )
    assert coplanar_strips_static(width * MM, 1.2 * gap * MM, below=[slab]).impedance > line.impedance


def test_thick_slab_is_a_half_space() -> None:
    """Limit: strips between two half spaces see their mean permittivity."""
    line = coplanar_strips_static(MM, MM, below=[DielectricLayer(1.0, 6.0)], above=[DielectricLayer(1.0, 2.0)])
    assert line.eps_eff == pytest.approx(4.0, rel=1e-5)


def test_wide_strip_is_a_plate_capacitor() -> None:
    """Limit: C -> eps w/h plus fringes that grow as the logarithm of w/h only."""
    line = microstrip_static(100 * MM, below=[DielectricLayer(MM, 4.4)])
    capacitance = math.sqrt(line.eps_eff) / (SPEED_OF_LIGHT * line.impedance)
    assert 1.01 < capacitance / (4.4 * VACUUM_PERMITTIVITY * 100.0) < 1.03


def test_fast_enough() -> None:
    """The usual case is meant to take well under 15 ms; the best of five leaves out a busy machine."""
    times = []
    for _ in range(5):
        start = time.perf_counter()
        microstrip_static(3 * MM, below=[SLAB], above=[MASK])
        coplanar_strips_static(MM, 0.2 * MM, below=[SLAB], above=[MASK])
        times.append(time.perf_counter() - start)
    assert min(times) < 0.03


@pytest.mark.parametrize(
    ("width", "layer"),
    [(1.0, DielectricLayer(MM, 4.4)), (MM, DielectricLayer(MM, 0.5)), (MM, DielectricLayer(0.0, 4.4))],
)
def test_refusals(width: float, layer: DielectricLayer) -> None:
    with pytest.raises(RangeError, match="the formula covers"):
        microstrip_static(width, below=[layer])


def test_microstrip_needs_a_layer() -> None:
    with pytest.raises(RangeError, match="no layer"):
        microstrip_static(MM, below=[])


def test_pair_refuses_extreme_gap() -> None:
    with pytest.raises(RangeError, match=r"gap / width is 0\.001"):
        coplanar_strips_static(MM, 1e-6)

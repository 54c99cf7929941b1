"""Responses against scikit-rf's conversions, textbook values and closed forms of a series resonator."""

import dataclasses
import math

import numpy as np
import pytest
import skrf

from planar.errors import RangeError
from planar.network.response import Response

F = np.array([0.8e9, 0.9e9, 1.0e9])


def random_impedance(ports: int) -> np.ndarray:
    rng = np.random.default_rng(ports)
    z = rng.normal(0.0, 40.0, (len(F), ports, ports)) + 1j * rng.normal(0.0, 40.0, (len(F), ports, ports))
    return z + 60.0 * np.eye(ports)


@pytest.mark.parametrize("ports", [1, 2, 3])
@pytest.mark.parametrize("z0", [50.0, 75.0])
def test_conversions_agree_with_scikit_rf(ports: int, z0: float) -> None:
    """Two codings of the same exact formulas: rounding only, of matrices that are no worse than 1e3 conditioned."""
    z = random_impedance(ports)
    response = Response.from_impedance(F, z, z0=z0)
    np.testing.assert_allclose(response.s, skrf.network.z2s(z, z0), rtol=0, atol=1e-12)
    np.testing.assert_allclose(response.z, skrf.network.s2z(response.s.copy(), z0), rtol=1e-10)
    np.testing.assert_allclose(response.z, z, rtol=0, atol=1e-9)


def test_one_port_may_be_given_as_a_row() -> None:
    response = Response.from_impedance(F, np.array([50.0, 100.0, 25.0]), z0=50.0)
    assert response.s.shape == (3, 1, 1)
    np.testing.assert_allclose(response.s[:, 0, 0], [0.0, 1 / 3, -1 / 3], atol=1e-15)


def test_vswr_and_decibels_of_the_textbook() -> None:
    """By definition: 2:1 is |S11| = 1/3 or 9.542 dB return loss; a match is 1:1, total reflection infinite."""
    response = Response(np.arange(1.0, 5.0), np.array([0.0, 1 / 3, -1.0, 1.1j]), 50.0)
    np.testing.assert_allclose(response.vswr, [1.0, 2.0, math.inf, math.inf])
    np.testing.assert_allclose(response.reflection_db, [-math.inf, -9.542425, 0.0, 0.827854], atol=1e-6)


def test_reflection_of_several_ports_is_that_of_the_first() -> None:
    s = np.array([[[0.1, 0.9], [0.9, 0.5]]])
    assert Response(np.array([1e9]), s, 50.0).reflection_db == pytest.approx([-20.0])


def test_best_match_is_the_lowest_of_equals() -> None:
    assert Response(F, np.array([0.5, -0.1, 0.1j]), 50.0).best_match == 0.9e9


def test_band_of_a_series_resonator() -> None:
    """R = z0 = 50 ohm in series with X: |S11| = |X|/sqrt(4 z0^2 + X^2), so X = 2 z0 g/sqrt(1 - g^2) at the ends.

    X = omega L - 1/(omega C) is solved for omega in closed form. Linear interpolation between samples 1 MHz apart
    is off by about (1 MHz)^2 |S11|''/(8 |S11|'), a few hundred Hz here.
    """
    f0, inductance, z0 = 900e6, 60e-9, 50.0
    capacitance = 1.0 / ((2 * math.pi * f0) ** 2 * inductance)
    f = np.arange(700e6, 1100.5e6, 1e6)
    omega = 2 * math.pi * f
    response = Response.from_impedance(f, z0 + 1j * (omega * inductance - 1 / (omega * capacitance)), z0=z0)
    g = 10 ** (-10 / 20)
    reactance = 2 * z0 * g / math.sqrt(1 - g * g)
    root = math.sqrt(reactance**2 + 4 * inductance / capacitance)
    ends = [(sign * reactance + root) / (4 * math.pi * inductance) for sign in (-1, 1)]
    [band] = response.band(-10.0)
    assert band == pytest.approx(ends, abs=1e3)
    assert response.best_match == f0


@pytest.mark.parametrize(
    ("sizes", "bands"),
    [
        ([0.9, 0.5, 0.1, 0.5, 0.9], [(2.5, 3.5)]),  # half way from 0.5 to 0.1 stands 0.3
        ([0.1, 0.5, 0.5, 0.1, 0.1], [(1.0, 1.5), (3.5, 5.0)]),  # runs into both ends
        ([0.1, 0.1, 0.0, 0.1, 0.1], [(1.0, 5.0)]),
        ([0.9, 0.3, 0.3, 0.9, 0.9], []),  # touching the level is not below it
        ([0.9, 0.9, 0.0, 0.9, 0.9], [(8 / 3, 10 / 3)]),  # a perfect match is -inf dB
    ],
)
def test_bands_by_hand(sizes: list[float], bands: list[tuple[float, float]]) -> None:
    response = Response(np.arange(1.0, 6.0), np.array(sizes), 50.0)
    found = response.band(20 * math.log10(0.3))
    assert len(found) == len(bands)
    np.testing.assert_allclose(np.array(found).reshape(-1, 2), np.array(bands).reshape(-1, 2), rtol=1e-12)


def test_band_of_a_single_frequency() -> None:
    assert Response(np.array([1e9]), np.array([0.1]), 50.0).band(-10.0) == [(1e9, 1e9)]


def test_record_cannot_be_changed_and_leaves_its_input_alone() -> None:
    f, s = F.copy(), np.array([0.1, 0.2, 0.3])
    response = Response(f, s, 50.0)
    s[0] = f[0] = 0.9
    assert response.s[0, 0, 0] == 0.1
    assert response.frequency[0] == 0.8e9
    for array in (response.frequency, response.s):
        with pytest.raises(ValueError, match="read-only"):
            array[0] = 1.0
    with pytest.raises(dataclasses.FrozenInstanceError):
        response.z0 = 75.0  # type: ignore[misc]


@pytest.mark.parametrize(
    ("frequency", "s", "z0", "words"),
    [
        (F, np.zeros(2), 50.0, r"s has shape \(2,\), \(3, p, p\)"),
        (F, np.zeros((3, 1, 2)), 50.0, "s has shape"),
        (F, np.zeros((3, 0, 0)), 50.0, "s has shape"),
        (F[:, None], np.zeros(3), 50.0, "frequency has shape"),
        (np.array([]), np.array([]), 50.0, "frequency has shape"),
        (F[::-1], np.zeros(3), 50.0, "rise"),
        (F - 1e9, np.zeros(3), 50.0, "not negative"),
        (np.array([1.0, 1.0]), np.zeros(2), 50.0, "rise"),
        (np.array([1.0, math.nan]), np.zeros(2), 50.0, "finite"),
        (F, np.array([0.0, math.nan, 0.0]), 50.0, "not finite at 900 MHz"),
        (F, np.zeros(3), 0.0, "reference impedance is 0 ohm"),
        (F, np.zeros(3), math.nan, "reference impedance"),
    ],
)
def test_what_is_no_response_is_refused(frequency: np.ndarray, s: np.ndarray, z0: float, words: str) -> None:
    with pytest.raises(RangeError, match=words):
        Response(frequency, s, z0)


def test_open_has_no_impedance_and_a_short_has() -> None:
    assert Response(F, -np.ones(3), 50.0).z == pytest.approx(np.zeros((3, 1, 1)))
    with pytest.raises(RangeError, match="at 900 MHz"):
        _ = Response(F, np.array([0.0, 1.0, 0.0]), 50.0).z


def test_series_element_alone_has_no_impedance_matrix() -> None:
    """A two-port of one series element: open-circuit parameters do not exist (Pozar, Table 4.1)."""
    normalised = 0.7 + 0.3j
    s11, s21 = normalised / (normalised + 2), 2 / (normalised + 2)
    with pytest.raises(RangeError, match="cannot be inverted at 1 GHz"):
        _ = Response(np.array([1e9]), np.array([[[s11, s21], [s21, s11]]]), 50.0).z


def test_active_impedance_of_minus_z0_is_refused() -> None:
    with pytest.raises(RangeError, match=r"Z \+ z0 cannot be inverted at 1 GHz"):
        Response.from_impedance(F, np.array([1.0, 1.0, -50.0]), z0=50.0)


def test_level_must_be_finite() -> None:
    with pytest.raises(RangeError, match="level is nan dB"):
        Response(F, np.zeros(3), 50.0).band(math.nan)

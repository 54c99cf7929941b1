"""Quality factor and bands of ports known in closed form, and of the textbook's quarter-wave line."""

import math

import numpy as np
import pytest

from planar.errors import RangeError
from planar.network.circuit import LineSection
from planar.network.quality import margins, matched_bands, matched_bandwidth, quality_factor
from planar.network.response import Response

F0, R, Q = 1e9, 50.0, 20.0
L, C = Q * R / (2 * math.pi * F0), 1.0 / (2 * math.pi * F0 * Q * R)
VSWR_2_DB = 20.0 * math.log10(1.0 / 3.0)


def series(frequency: np.ndarray) -> np.ndarray:
    s = 2j * np.pi * frequency
    return R + s * L + 1.0 / (s * C)


def series_response() -> Response:
    frequency = np.linspace(0.9e9, 1.1e9, 2001)
    return Response.from_impedance(frequency, series(frequency), z0=R)


@pytest.mark.parametrize("place", [0.85, 1.0, 1.15])
def test_quality_of_a_series_circuit(place: float) -> None:
    """Exact: for a series R-L-C the equation gives omega L/R above resonance and 1/(omega C R) below it."""
    frequency = np.linspace(0.8e9, 1.2e9, 41)
    at = place * F0
    expected = Q * max(place, 1.0 / place)
    assert quality_factor(frequency, series(frequency), at) == pytest.approx(expected, rel=1e-6)


def test_quality_of_a_parallel_circuit() -> None:
    """Exact at resonance, by duality: R/(omega L) of a parallel R-L-C, whose resistance does change with frequency."""
    frequency = np.linspace(0.8e9, 1.2e9, 41)
    assert quality_factor(frequency, R**2 / series(frequency), F0) == pytest.approx(Q, rel=1e-6)


def test_quality_is_that_of_a_resistance_that_slopes() -> None:
    """Z = R f/f0, written out by hand: omega/(2 R) R' = 1/2."""
    frequency = np.linspace(0.8e9, 1.2e9, 5)
    assert quality_factor(frequency, R * frequency / F0, F0) == pytest.approx(0.5, rel=1e-9)


def test_quality_is_refused_where_it_means_nothing() -> None:
    frequency = np.linspace(0.8e9, 1.2e9, 41)
    with pytest.raises(RangeError, match=r"known from 800 MHz to 1\.2 GHz"):
        quality_factor(frequency, series(frequency), 1.3e9)
    with pytest.raises(RangeError, match="needs a loss"):
        quality_factor(frequency, series(frequency) - R, F0)
    noise = np.random.default_rng(1).normal(0.0, 1.0, 41)
    with pytest.raises(RangeError, match="rational model"):
        quality_factor(frequency, series(frequency) + noise, F0)


def test_bandwidth_of_a_quality_factor() -> None:
    """Yaghjian & Best 2005, FBW Q = (s - 1)/sqrt(s), from memory: Q 20 and a ratio of 2 give 0.035355."""
    assert matched_bandwidth(20.0, 2.0) == pytest.approx(0.035355, abs=5e-7)
    assert matched_bandwidth(1.0, 2.0) == pytest.approx(0.7071, abs=5e-5)


def test_bandwidth_is_that_of_the_response() -> None:
    """Exact for a series R-L-C: Q (f/f0 - f0/f) = +-(s - 1)/sqrt(s) has edges that differ by FBW f0."""
    (band,) = matched_bands(series_response(), VSWR_2_DB)
    assert band.high - band.low == pytest.approx(matched_bandwidth(Q, 2.0) * F0, rel=1e-5)
    assert math.sqrt(band.low * band.high) == pytest.approx(F0, rel=1e-6)
    assert not band.low_open
    assert not band.high_open


@pytest.mark.parametrize(("quality", "vswr"), [(0.3, 2.0), (-5.0, 2.0), (math.nan, 2.0), (5.0, 1.0), (5.0, math.inf)])
def test_bandwidth_is_refused_out_of_range(quality: float, vswr: float) -> None:
    with pytest.raises(RangeError):
        matched_bandwidth(quality, vswr)


@pytest.mark.parametrize(("load", "expected"), [(110.0, 1.354), (140.0, 0.913)])
def test_quarter_wave_bandwidth(load: float, expected: float) -> None:
    """Pozar, Microwave Engineering, eq. 5.33: 50 ohm, standing-wave ratio 2; three decimals."""
    frequency = F0 * np.linspace(0.1, 1.9, 3601)
    line = LineSection(math.sqrt(50.0 * load), 0.25 / F0)
    response = Response.from_impedance(frequency, line.seen_through(np.full(3601, load), frequency), z0=50.0)
    (band,) = matched_bands(response, VSWR_2_DB)
    assert band.fraction == pytest.approx(expected, abs=5e-4)
    assert band.centre == pytest.approx(F0, rel=1e-6)


def test_bands_cut_off_by_the_data_are_flagged() -> None:
    """|S| of 0.1, 0.5, 0.1: matched at both ends of the data, edges half way by |S| 0.3."""
    response = Response(np.array([1e9, 2e9, 3e9]), np.array([0.1, 0.5, 0.1]), 50.0)
    low, high = matched_bands(response, 20.0 * math.log10(0.3))
    assert (low.low_open, low.high_open, high.low_open, high.high_open) == (True, False, False, True)
    assert (low.low, low.high, high.low, high.high) == pytest.approx((1e9, 1.5e9, 2.5e9, 3e9))


def notch() -> Response:
    """|S| of 0.5 but for a straight notch down to 0.1 at 2 GHz, 1 GHz wide on either side."""
    return Response(np.array([0.5e9, 1e9, 2e9, 3e9, 3.5e9]), np.array([0.5, 0.5, 0.1, 0.5, 0.5]), 50.0)


def test_margins_of_a_band_that_is_matched() -> None:
    """The notch is below 0.3 from 1.5 to 2.5 GHz; the worst inside 1.8 to 2.1 GHz is 0.18 at its lower edge."""
    found = margins(notch(), (1.8e9, 2.1e9), 20.0 * math.log10(0.3))
    assert (found.below, found.above) == pytest.approx((0.3e9, 0.4e9))
    assert found.worst_at == 1.8e9
    assert found.worst_db == pytest.approx(20.0 * math.log10(0.18))
    assert found.spare_db == pytest.approx(20.0 * math.log10(0.3 / 0.18))


def test_margins_of_a_band_that_is_missed() -> None:
    """Half outside: the lower edge of the match is 0.2 GHz too high. All outside: both tell how far it must move."""
    level = 20.0 * math.log10(0.3)
    half = margins(notch(), (1.3e9, 2.0e9), level)
    assert (half.below, half.above) == pytest.approx((-0.2e9, 0.5e9))
    assert half.spare_db == pytest.approx(20.0 * math.log10(0.3 / 0.38))
    outside = margins(notch(), (2.7e9, 2.9e9), level)
    assert (outside.below, outside.above) == pytest.approx((1.2e9, -0.4e9))


def test_margins_where_nothing_is_matched() -> None:
    found = margins(notch(), (1.8e9, 2.2e9), 20.0 * math.log10(0.05))
    assert (found.band, found.below, found.above) == (None, None, None)
    assert found.spare_db == pytest.approx(20.0 * math.log10(0.05 / 0.18))


def test_margins_are_taken_from_the_band_that_shares_most() -> None:
    """Two matches, 1 to 1.5 and 2.5 to 3 GHz at 0.3: the wanted band lies mostly in the upper one."""
    response = Response(np.array([1e9, 2e9, 3e9]), np.array([0.1, 0.5, 0.1]), 50.0)
    found = margins(response, (2.3e9, 2.9e9), 20.0 * math.log10(0.3))
    assert found.band is not None
    assert found.band.high_open
    assert (found.below, found.above) == pytest.approx((-0.2e9, 0.1e9))


@pytest.mark.parametrize("band", [(2e9, 1.9e9), (0.4e9, 1e9), (3e9, 4e9), (math.nan, 1e9)])
def test_margins_are_refused_outside_the_response(band: tuple[float, float]) -> None:
    with pytest.raises(RangeError, match=r"must rise and lie between 500 MHz and 3\.5 GHz"):
        margins(notch(), band, -10.0)

"""Adaptive sampling of circuits with the port behaviour of loop antennas, against the circuits themselves.

The circuits follow the known make-up of such a port: an inductive branch (the loop shorts direct current), one
series R-L-C per full-wave mode, a static capacitance, and a line in front. Their impedance is exact circuit theory.
"""

import math
from collections.abc import Callable

import numpy as np
import pytest

from planar.errors import RangeError
from planar.network.rational import sampled_rational

CENTRE = 0.9e9
BAND = (0.85 * CENTRE, 1.15 * CENTRE)
DENSE = np.linspace(*BAND, 4999)
TOLERANCE = 0.002
"""Error of S11 the antenna is to be known to."""


def mode(f: np.ndarray, resonance: float, q: float, resistance: float) -> np.ndarray:
    """Admittance of a series R-L-C."""
    x = f / resonance
    return 1.0 / (resistance * (1.0 + 1j * q * (x - 1.0 / x)))


def loop(f: np.ndarray, q: float = 8.0) -> np.ndarray:
    """Impedance of a loop across its gap: two modes, 60 nH with 2 ohm, 0.5 pF."""
    omega = 2.0 * np.pi * f
    modes = mode(f, CENTRE, q, 110.0) + mode(f, 2.1 * CENTRE, 12.0, 200.0)
    return 1.0 / (modes + 1.0 / (2.0 + 60e-9j * omega) + 0.5e-12j * omega)


def through_line(z: np.ndarray, f: np.ndarray, impedance: float, waves: float) -> np.ndarray:
    """`z` seen through a lossless line, `waves` wavelengths long at the centre: Pozar, eq. 2.44."""
    tangent = 1j * np.tan(2.0 * np.pi * waves * f / CENTRE)
    return impedance * (z + impedance * tangent) / (impedance + z * tangent)


def two_modes_apart(f: np.ndarray) -> np.ndarray:
    """Two neighbouring modes, as a loop for circular polarisation has them."""
    return 1.0 / (mode(f, 0.93 * CENTRE, 7.0, 500.0) + mode(f, 1.07 * CENTRE, 7.0, 500.0) + 1.0 / (3.0 + 5e-7j * f))


CIRCUITS: dict[str, Callable[[np.ndarray], np.ndarray]] = {
    "loop": loop,
    "loop behind a quarter-wave line": lambda f: through_line(loop(f), f, 75.0, 0.25),
    "loop behind nearly a whole wave of line": lambda f: through_line(loop(f), f, 75.0, 0.9),
    "sharp loop behind a quarter-wave line": lambda f: through_line(loop(f, q=40.0), f, 75.0, 0.25),
    "series capacitance behind a line": lambda f: through_line(loop(f) - 1j / (1.5e-11 * f), f, 110.0, 0.25),
    "circular polarisation": lambda f: through_line(two_modes_apart(f), f, 130.0, 0.25),
}


def reflection(z: np.ndarray) -> np.ndarray:
    return (z - 50.0) / (z + 50.0)


@pytest.mark.parametrize("circuit", CIRCUITS.values(), ids=CIRCUITS)
def test_a_dozen_evaluations_are_enough_for_a_loop(circuit: Callable[[np.ndarray], np.ndarray]) -> None:
    asked: list[float] = []

    def evaluated(frequency: float) -> complex:
        asked.append(frequency)
        return complex(circuit(np.array([frequency]))[0])

    sampled = sampled_rational(evaluated, BAND, tolerance=TOLERANCE, judged=reflection)
    error = np.abs(reflection(sampled.model(DENSE)) - reflection(circuit(DENSE))).max()
    assert len(asked) <= 12
    assert error <= sampled.error <= TOLERANCE
    assert sorted(asked) == list(sampled.frequency)  # each frequency evaluated once
    np.testing.assert_array_equal(sampled.values, [circuit(np.array([f]))[0] for f in sampled.frequency])


def test_admittance_may_be_sampled_instead() -> None:
    circuit = CIRCUITS["loop behind a quarter-wave line"]
    sampled = sampled_rational(
        lambda f: complex(1.0 / circuit(np.array([f]))[0]),
        BAND,
        tolerance=TOLERANCE,
        judged=lambda y: (1.0 - 50.0 * y) / (1.0 + 50.0 * y),
    )
    assert len(sampled.frequency) <= 12
    assert np.abs(reflection(1.0 / sampled.model(DENSE)) - reflection(circuit(DENSE))).max() < TOLERANCE


def test_narrow_resonance_the_first_samples_miss_is_found() -> None:
    """Q of 300 between the first samples: its skirt is what they see, at most 15 % of its peak."""
    at = 0.8137e9

    def spiked(f: float) -> complex:
        return complex(mode(np.array([f]), at, 300.0, 1.0)[0])

    sampled = sampled_rational(spiked, BAND, tolerance=1e-3)
    assert np.abs(sampled.model(DENSE) - mode(DENSE, at, 300.0, 1.0)).max() < 1e-3
    assert min(np.abs(sampled.model.poles - at * (1.0 + 0.5j / 300.0))) < 1e-5 * at


def test_entire_function_converges_without_a_judge() -> None:
    sampled = sampled_rational(lambda x: complex(math.exp(x)), (-1.0, 1.0), tolerance=1e-9)
    x = np.linspace(-1.0, 1.0, 997)
    assert np.abs(sampled.model(x) - np.exp(x)).max() <= 1e-9
    assert sampled.error <= 1e-9


def test_error_not_reached_is_refused() -> None:
    noise = np.random.default_rng(0)
    with pytest.raises(RangeError, match=r"after 20 evaluations from 765 MHz to 1\.035 GHz .* moves by"):
        sampled_rational(lambda f: complex(noise.normal()), BAND, tolerance=1e-3, most=20)


def test_value_that_is_not_finite_is_refused() -> None:
    with pytest.raises(RangeError, match=r"sampled is .* at 765 MHz"):
        sampled_rational(lambda f: complex(math.nan), BAND, tolerance=1e-3)


@pytest.mark.parametrize(
    ("band", "tolerance", "most"),
    [((2.0, 1.0), 0.1, 20), ((1.0, math.inf), 0.1, 20), ((1.0, 2.0), 0.0, 20), ((1.0, 2.0), 0.1, 5)],
)
def test_senseless_requests_are_refused(band: tuple[float, float], tolerance: float, most: int) -> None:
    with pytest.raises(RangeError, match="must be"):
        sampled_rational(lambda f: 1.0 + 0.0j, band, tolerance=tolerance, most=most)

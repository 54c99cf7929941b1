"""What lies in front of the antenna, put on and taken off, against cascades by scikit-rf."""

import numpy as np
import pytest
import skrf

from planar.errors import RangeError
from planar.network.plane import Launch, check_passive, from_standards

F = np.linspace(0.8e9, 0.95e9, 31)
ANTENNA = 0.7 * np.exp(1j * np.linspace(2.0, -2.5, 31))
MEDIA = skrf.media.DefinedGammaZ0(skrf.Frequency.from_f(F, unit="Hz"), gamma=2j * np.pi * F / 299792458.0, z0=50.0)


def network(reflection: np.ndarray) -> skrf.Network:
    return skrf.Network(frequency=MEDIA.frequency, s=reflection.reshape(-1, 1, 1), z0=50.0)


def test_a_launch_is_the_cascade_of_its_parts() -> None:
    launch = Launch(delay=0.15 / 299792458.0, inductance=1.2e-9, capacitance=0.3e-12)
    cascade = MEDIA.line(0.15, "m") ** MEDIA.inductor(1.2e-9) ** MEDIA.shunt_capacitor(0.3e-12) ** network(ANTENNA)
    np.testing.assert_allclose(launch.seen(F, ANTENNA, 50.0), cascade.s[:, 0, 0], atol=1e-12)


def test_loss_comes_off_twice_and_grows_with_the_root_of_frequency() -> None:
    seen = Launch(loss_db=0.5, loss_at=0.8e9).seen(F, ANTENNA, 50.0)
    decibels = 20.0 * np.log10(np.abs(seen) / 0.7)
    np.testing.assert_allclose(decibels, -2.0 * 0.5 * np.sqrt(F / 0.8e9), atol=1e-12)


def test_what_was_put_on_comes_off() -> None:
    launch = Launch(0.3e-9, 0.2, 1e9, 2e-9, 0.5e-12)
    np.testing.assert_allclose(launch.removed(F, launch.seen(F, ANTENNA, 50.0), 50.0), ANTENNA, atol=1e-12)


@pytest.mark.parametrize("loaded", [True, False])
def test_standards_take_off_whatever_is_in_front(loaded: bool) -> None:
    """Without a load only for a symmetric front: here a line between two equal capacitors."""
    box = MEDIA.shunt_capacitor(0.4e-12) ** MEDIA.line(0.07, "m") ** MEDIA.shunt_capacitor(0.4e-12)
    if loaded:
        box = box ** MEDIA.inductor(2e-9)
    short, opened, load, seen = (
        (box ** network(np.full(31, value))).s[:, 0, 0] if np.isscalar(value) else (box ** network(value)).s[:, 0, 0]
        for value in (-1.0 + 0j, 1.0 + 0j, 0.0 + 0j, ANTENNA)
    )
    found = from_standards(seen, short, opened, load if loaded else None)
    np.testing.assert_allclose(found, ANTENNA, atol=1e-11)


def test_one_standard_measured_twice_is_refused() -> None:
    with pytest.raises(RangeError, match="measured twice"):
        from_standards(ANTENNA, ANTENNA, ANTENNA)


def test_standards_taken_for_each_other_are_refused() -> None:
    ideal = np.ones(31, dtype=np.complex128)
    with pytest.raises(RangeError, match="taken for each other at 31"):
        from_standards(ANTENNA, ideal, -ideal)


def test_more_taken_off_than_there_was_is_refused() -> None:
    with pytest.raises(RangeError, match="do not fit"):
        check_passive(F, Launch(loss_db=3.0).removed(F, ANTENNA, 50.0), 1.05)
    with pytest.raises(RangeError, match="do not fit"):
        check_passive(F, np.where(F > 0.9e9, np.nan, ANTENNA), 1.05)

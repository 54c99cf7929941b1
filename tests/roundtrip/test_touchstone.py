"""Touchstone files written, read back, and read by scikit-rf; files of scikit-rf read by us."""

from pathlib import Path

import numpy as np
import pytest
import skrf

from planar.network.response import Response
from planar.network.touchstone import read_touchstone, write_touchstone

DIGITS = 1e-12
"""S is written to 12 decimals of a number below one."""


def response(z0: float = 50.0, count: int = 201) -> Response:
    """A series resonator at frequencies that are no round numbers."""
    f = np.linspace(0.765e9, 1.035e9, count) + 1.0 / 3.0
    x = f / 0.9e9
    return Response.from_impedance(f, 70.0 * (1.0 + 8.0j * (x - 1.0 / x)), z0=z0)


@pytest.mark.parametrize("z0", [50.0, 75.0, 33.3])
def test_read_back(tmp_path: Path, z0: float) -> None:
    path = tmp_path / "port.s1p"
    write_touchstone(response(z0), path, comments=["a loop"])
    again = read_touchstone(path)
    np.testing.assert_array_equal(again.frequency, response(z0).frequency)
    np.testing.assert_allclose(again.s, response(z0).s, rtol=0, atol=DIGITS)
    assert again.z0 == z0


@pytest.mark.parametrize("z0", [50.0, 75.0])
def test_scikit_rf_reads_the_same(tmp_path: Path, z0: float) -> None:
    path = tmp_path / "port.s1p"
    write_touchstone(response(z0), path, comments=["a loop", "of copper"])
    network = skrf.Network(str(path))
    np.testing.assert_allclose(network.f, response(z0).frequency, rtol=1e-15)
    np.testing.assert_allclose(network.s, response(z0).s, rtol=0, atol=DIGITS)
    np.testing.assert_array_equal(network.z0, z0)


def test_same_response_gives_the_same_bytes(tmp_path: Path) -> None:
    for name in ("a.s1p", "b.s1p"):
        write_touchstone(response(), tmp_path / name, comments=["a loop"])
    assert (tmp_path / "a.s1p").read_bytes() == (tmp_path / "b.s1p").read_bytes()
    write_touchstone(read_touchstone(tmp_path / "a.s1p"), tmp_path / "c.s1p", comments=["a loop"])
    assert (tmp_path / "c.s1p").read_bytes() == (tmp_path / "a.s1p").read_bytes()


@pytest.mark.parametrize("ports", [1, 2])
@pytest.mark.parametrize("form", ["ri", "ma", "db"])
@pytest.mark.parametrize("unit", ["Hz", "kHz", "MHz", "GHz"])
def test_files_of_scikit_rf_are_read(tmp_path: Path, ports: int, form: str, unit: str) -> None:
    """Every unit and number format, asymmetric two-ports included; scikit-rf writes 16 digits by default."""
    rng = np.random.default_rng(ports)
    s = rng.uniform(-0.7, 0.7, (11, ports, ports)) + 1j * rng.uniform(-0.7, 0.7, (11, ports, ports))
    f = np.linspace(0.8e9, 1.0e9, 11)
    network = skrf.Network(frequency=skrf.Frequency.from_f(f, unit="Hz"), s=s, z0=75.0)
    network.frequency.unit = unit
    network.write_touchstone(f"other.s{ports}p", dir=str(tmp_path), form=form)
    found = read_touchstone(tmp_path / f"other.s{ports}p")
    np.testing.assert_allclose(found.frequency, f, rtol=1e-14)
    np.testing.assert_allclose(found.s, s, rtol=0, atol=1e-13)
    assert found.z0 == 75.0

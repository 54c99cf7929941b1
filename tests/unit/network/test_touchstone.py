"""What the Touchstone writer and reader refuse, by file and line, and the forms the specification allows.

Authority: Touchstone File Format Specification, version 1.1 (its examples quoted from memory).
"""

import cmath
import math
from pathlib import Path

import numpy as np
import pytest

from planar.errors import FaultyInputError, RangeError
from planar.network.response import Response
from planar.network.touchstone import read_touchstone, write_touchstone


def file_of(folder: Path, text: str, name: str = "port.s1p") -> Path:
    path = folder / name
    path.write_text(text, encoding="utf-8")
    return path


def test_written_form_is_the_one_stated(tmp_path: Path) -> None:
    response = Response(np.array([0.0, 868.3e6]), np.array([-1.0, 0.25 - 0.5j]), 50.0)
    write_touchstone(response, tmp_path / "a.s1p", comments=["gap ±0.1\nsecond line", ""])
    assert (tmp_path / "a.s1p").read_bytes() == (
        b"! gap \\xb10.1\n! second line\n!\n# HZ S RI R 50\n"
        b"0 -1.000000000000e+00 0.000000000000e+00\n"
        b"868300000 2.500000000000e-01 -5.000000000000e-01\n"
    )


def test_example_of_the_specification_in_magnitude_and_angle(tmp_path: Path) -> None:
    """One-port, single frequency: `2.000 0.894 -12.136`."""
    text = "! 1-port S-parameter file\n# MHz S MA R 50\n! freq magS11 angS11\n  2.000 0.894 -12.136 ! the only line\n"
    response = read_touchstone(file_of(tmp_path, text))
    assert response.frequency == pytest.approx([2e6])
    assert response.s[0, 0, 0] == pytest.approx(cmath.rect(0.894, math.radians(-12.136)))
    assert response.z0 == 50.0


def test_two_port_line_runs_column_by_column(tmp_path: Path) -> None:
    """S11 S21 S12 S22: the one size that runs down the columns."""
    text = "# GHZ S RI R 50.0\n1.0000 0.11 -0.1 0.21 -0.2 0.12 -0.3 0.22 -0.4\n"
    s = read_touchstone(file_of(tmp_path, text, "line.S2P")).s
    np.testing.assert_allclose(s, [[[0.11 - 0.1j, 0.12 - 0.3j], [0.21 - 0.2j, 0.22 - 0.4j]]])


@pytest.mark.parametrize(
    ("options", "frequency", "value", "z0"),
    [
        ("#", 1e9, 0.5j, 50.0),  # the defaults: GHz, S, MA, 50 ohm
        ("# ri R 75 khz s", 1e3, 0.5 + 90j, 75.0),  # any order, any case
        ("#HZ S DB R 12.5", 1.0, 10 ** (0.5 / 20) * 1j, 12.5),
    ],
)
def test_option_line(tmp_path: Path, options: str, frequency: float, value: complex, z0: float) -> None:
    response = read_touchstone(file_of(tmp_path, f"{options}\n1 0.5 90\n"))
    assert response.frequency[0] == frequency
    assert response.s[0, 0, 0] == pytest.approx(value, abs=1e-15)
    assert response.z0 == z0


def test_byte_order_mark_tabs_and_foreign_line_ends_are_read(tmp_path: Path) -> None:
    path = tmp_path / "port.s1p"
    path.write_bytes(b"\xef\xbb\xbf! \xb5\r\n# HZ S RI R 50\r\n1\t.5\t-1.e-1\r\n\r\n2 5E-1 +0\r\n")
    np.testing.assert_allclose(read_touchstone(path).s[:, 0, 0], [0.5 - 0.1j, 0.5])


@pytest.mark.parametrize(
    ("text", "where", "words"),
    [
        ("1 0 0\n", "port.s1p", "before the numbers"),
        ("1 0 0\n# HZ S RI R 50\n", "port.s1p", "before the numbers"),
        ("! nothing\n# HZ S RI R 50\n", "port.s1p", "lines of 3 numbers"),
        ("# HZ S RI R 50\n# HZ S RI R 50\n1 0 0\n", "line 2", "one option line"),
        ("# HZ Z RI R 50\n1 0 0\n", "line 1", "Z does not fit"),
        ("# HZ S RI R\n1 0 0\n", "line 1", "R does not fit"),
        ("# HZ S RI R -50\n1 0 0\n", "line 1", "R -50 does not fit"),
        ("# HZ MHZ S RI R 50\n1 0 0\n", "line 1", "MHZ does not fit"),
        ("[Version] 2.0\n# HZ S RI R 50\n1 0 0\n", "line 1", "version 1"),
        ("# HZ S DB R 50\n1 9999 0\n", "line 2", "decibels"),
        ("# HZ S RI R 50\n1 0 0\n2 0,1 0\n", "line 3", "decimal points"),
        ("# HZ S RI R 50\n1 nan 0\n", "line 2", "decimal points"),
        ("# HZ S RI R 50\n1 1e999 0\n", "line 2", "decimal points"),
        ("# HZ S RI R 50\n1 1_0 0\n", "line 2", "decimal points"),
        ("# HZ S RI R 50\n1 0\n", "line 2", "3 numbers, here are 2"),
        ("# HZ S RI R 50\n2 0 0\n1 0 0\n", "line 3", "above the frequency before it"),
        ("# HZ S RI R 50\n2 0 0\n2 0 0\n", "line 3", "above the frequency before it"),
        ("# HZ S RI R 50\n-2 0 0\n", "line 2", "not negative"),
    ],
)
def test_what_is_not_understood_is_refused_with_its_line(tmp_path: Path, text: str, where: str, words: str) -> None:
    with pytest.raises(FaultyInputError) as raised:
        read_touchstone(file_of(tmp_path, text))
    [fault] = raised.value.faults
    assert fault.where.endswith(where)
    assert words in str(fault)


def test_noise_data_behind_a_two_port_are_refused(tmp_path: Path) -> None:
    text = "# GHZ S RI R 50\n2 0 0 0 0 0 0 0 0\n1 0.7 0.6 70 0.4\n"
    with pytest.raises(FaultyInputError, match=r"line 3: numbers = 1 0\.7 0\.6 70 0\.4: 9 numbers, here are 5"):
        read_touchstone(file_of(tmp_path, text, "amplifier.s2p"))


def test_all_faults_are_found_at_once_but_not_endlessly_many(tmp_path: Path) -> None:
    with pytest.raises(FaultyInputError) as raised:
        read_touchstone(file_of(tmp_path, "# HZ S XX R 50\n1 0\n2 0 0\n3 a 0\n"))
    assert [fault.where[-1] for fault in raised.value.faults] == ["1", "2", "4"]
    with pytest.raises(FaultyInputError) as raised:
        read_touchstone(file_of(tmp_path, "# HZ S RI R 50\n" + "1 0,5 0\n" * 200))
    assert len(raised.value.faults) == 21
    assert raised.value.faults[-1].value == "180 more"


def test_files_that_cannot_be_read_or_written(tmp_path: Path) -> None:
    with pytest.raises(FaultyInputError, match="No such file"):
        read_touchstone(tmp_path / "none.s1p")
    with pytest.raises(FaultyInputError, match=r"an ending \.s1p or \.s2p"):
        read_touchstone(file_of(tmp_path, "", "port.s3p"))
    one, two = (Response(np.array([1e9]), np.zeros((1, p, p)), 50.0) for p in (1, 2))
    for response, name in ((one, "a.txt"), (one, "a.s2p"), (two, "a.s1p"), (two, "a.s2p")):
        with pytest.raises(RangeError, match="one port is written"):
            write_touchstone(response, tmp_path / name)
        assert not (tmp_path / name).exists()

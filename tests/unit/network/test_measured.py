"""Measurement files as found: each is read right or refused with its line.

Authority: the Touchstone file format specification, versions 1.1 and 2.0, for what the numbers mean; the odd forms are
slips seen in files of instruments and spreadsheets (common practice, no source). All hold one resonator by formula.
"""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

import numpy as np
import pytest

from planar.errors import FaultyInputError, Severity
from planar.network.grade import grade
from planar.network.measured import read_measured

F = np.linspace(0.8e9, 0.9e9, 21)
S = (0.2 + 1j * 20.0 * (F / 0.85e9 - 1.0)) / (1.0 + 1j * 20.0 * (F / 0.85e9 - 1.0)) * np.exp(-2j * np.pi * F * 0.4e-9)
BAND = (0.84e9, 0.86e9)


def rows(
    form: str = "RI", scale: float = 1e9, separator: str = " ", *, f: np.ndarray = F, s: np.ndarray = S
) -> list[str]:
    pairs: dict[str, Callable[[complex], tuple[float, float]]] = {
        "RI": lambda v: (v.real, v.imag),
        "MA": lambda v: (abs(v), float(np.degrees(np.angle(v)))),
        "DB": lambda v: (20.0 * np.log10(abs(v)), float(np.degrees(np.angle(v)))),
    }
    return [
        separator.join(f"{x:.12g}" for x in (a / scale, *pairs[form](complex(b)))) for a, b in zip(f, s, strict=True)
    ]


def two_ports(value: str) -> str:
    f, a, b = value.split()
    return f"{f} {a} {b} 0.1 0.1 0.1 0.1 0.5 0.5"


def with_exponents(listed: list[str], separator: str) -> list[str]:
    """Every number as old programs write it: -1.234D-01."""
    return [separator.join(f"{float(x):.12E}".replace("E", "D") for x in row.split(separator)) for row in listed]


def swapped(listed: list[str], i: int, j: int) -> list[str]:
    listed[i], listed[j] = listed[j], listed[i]
    return listed


V2 = ["[Version] 2.0", "# MHz S RI R 50", "[Number of Ports] 1", "[Number of Frequencies] 21", "[Network Data]"]

READ: dict[str, tuple[str, list[str] | bytes]] = {
    "hz, real and imaginary": ("a.s1p", ["# HZ S RI R 50", *rows(scale=1.0)]),
    "ghz, magnitude and angle": ("a.s1p", ["# GHZ S MA R 50", *rows("MA")]),
    "mhz, decibels, lower case": ("a.s1p", ["# mhz s db r 50", *rows("DB", 1e6)]),
    "khz, words in another order": ("a.s1p", ["# R 50 RI S kHz", *rows(scale=1e3)]),
    "a space before the option line": ("a.s1p", [" # MHZ S RI R 50", *rows(scale=1e6)]),
    "unit glued to the sign": ("a.s1p", ["#MHz S RI R 50", *rows(scale=1e6)]),
    "reference glued": ("a.s1p", ["# MHZ S RI R50", *rows(scale=1e6)]),
    "no reference": ("a.s1p", ["# MHZ S RI", *rows(scale=1e6)]),
    "no option line": ("a.s1p", rows("MA")),
    "tabs": ("a.s1p", ["#\tMHZ\tS\tRI\tR\t50", *rows(scale=1e6, separator="\t")]),
    "commas": ("a.s1p", ["# MHZ S RI R 50", *rows(scale=1e6, separator=", ")]),
    "comments and empty lines": (
        "a.s1p", ["! board 3", "", "# MHZ S RI R 50 ! cal 2", *[f"{r} ! x" for r in rows(scale=1e6)], ""]
    ),
    "old line ends": ("a.s1p", "\r".join(["# MHZ S RI R 50", *rows(scale=1e6)]).encode()),
    "windows line ends": ("a.s1p", "\r\n".join(["# MHZ S RI R 50", *rows(scale=1e6)]).encode()),
    "utf-8 with a mark": ("a.s1p", "\n".join(["# MHZ S RI R 50", *rows(scale=1e6)]).encode("utf-8-sig")),
    "utf-16": ("a.s1p", "\n".join(["# MHZ S RI R 50", *rows(scale=1e6)]).encode("utf-16")),
    "comment in latin-1": ("a.s1p", "\n".join(["! Gehäuse", "# MHZ S RI R 50", *rows(scale=1e6)]).encode("latin-1")),
    "exponents with d": ("a.s1p", ["# HZ S RI R 50", *with_exponents(rows(scale=1.0), " ")]),
    "falling frequencies": ("a.s1p", ["# MHZ S RI R 50", *rows(scale=1e6)[::-1]]),
    "two points exchanged": ("a.s1p", ["# MHZ S RI R 50", *swapped(rows(scale=1e6), 4, 9)]),
    "a point twice": ("a.s1p", ["# MHZ S RI R 50", *rows(scale=1e6), rows(scale=1e6)[7]]),
    "two ports": ("a.s2p", ["# MHZ S RI R 50", *[two_ports(r) for r in rows(scale=1e6)]]),
    "one port named as two": ("a.s2p", ["# MHZ S RI R 50", *rows(scale=1e6)]),
    "two ports named as one": ("a.s1p", ["# MHZ S RI R 50", *[two_ports(r) for r in rows(scale=1e6)]]),
    "last line cut": ("a.s1p", ["# MHZ S RI R 50", *rows(scale=1e6), "905.0 0.1"]),
    "version 2": ("a.ts", [*V2, *rows(scale=1e6), "[End]"]),
    "version 2 with information": (
        "a.ts",
        [*V2[:4], "[Begin Information]", "any words 1 2", "[End Information]", V2[4], *rows(scale=1e6), "[End]"],
    ),
    "table, real and imaginary": ("a.csv", ["Frequency (MHz),S11 Re,S11 Im", *rows(scale=1e6, separator=",")]),
    "table, exponents with a D": (
        "a.csv", ["freq [Hz];re;im", *with_exponents(rows(scale=1.0, separator=";"), ";")]
    ),
    "table, decibels": ("a.csv", ["freq [Hz];S11 (dB);S11 phase (deg)", *rows("DB", 1.0, ";")]),
    "table, magnitude": ("a.txt", ["freq_ghz\tmag\tangle", *rows("MA", 1e9, "\t")]),
    "table, decimal commas": (
        "a.csv", ["f (GHz);Real;Imag", *[r.replace(".", ",") for r in rows(scale=1e9, separator=";")]]
    ),
    "table with a title above": ("a.csv", ["12.5", "frequency hz,s11 real,s11 imag", *rows(scale=1.0, separator=",")]),
    "other columns": (
        "a.csv",
        ["freq (Hz),s22 re,s22 im,s11 re,s11 im", *[r.replace(",", ",9,9,", 1) for r in rows("RI", 1.0, ",")]],
    ),
}  # fmt: skip

REFUSED: dict[str, tuple[str, list[str], str]] = {
    "impedances": ("a.s1p", ["# MHZ Z RI R 50", *rows(scale=1e6)], "line 1"),
    "a word among numbers": ("a.s1p", ["# MHZ S RI R 50", "850 zero 0.1", *rows(scale=1e6)], "line 2"),
    "decimal commas in touchstone": ("a.s1p", ["# MHZ S RI R 50", "850,1 0,1 0,2 0,1", *rows(scale=1e6)], "line 2"),
    "a number missing": ("a.s1p", ["# MHZ S RI R 50", "800 0.1", *rows(scale=1e6)], "line 2"),
    "two option lines": ("a.s1p", ["# MHZ S RI R 50", *rows(scale=1e6), "# GHZ S RI R 50"], "line 23"),
    "option line after numbers": ("a.s1p", ["850 0.1 0.1", "# MHZ S RI R 50", *rows(scale=1e6)], "line 2"),
    "two values for a frequency": ("a.s1p", ["# MHZ S RI R 50", *rows(scale=1e6), "850 0.9 0.9"], "line 23"),
    "zero frequency": ("a.s1p", ["# MHZ S RI R 50", "0 1 0", *rows(scale=1e6)], "line 2"),
    "hertz taken for gigahertz": ("a.s1p", ["# GHZ S RI R 50", *rows(scale=1.0)], "is the unit right"),
    "noise data": ("a.ts", [*V2, *rows(scale=1e6), "[Noise Data]", "850 1 0.1 0.2 0.3", "[End]"], "keyword"),
    "decibels beyond all numbers": ("a.s1p", ["# MHZ S DB R 50", "850 9e9 0", *rows("DB", 1e6)], "line 2"),
    "nothing": ("a.s1p", ["# MHZ S RI R 50"], "data"),
    "no angle": ("a.csv", ["freq (MHz),s11 (dB)", "850,-10"], "header"),
    "no header": ("a.csv", rows(scale=1e6, separator=","), "line 1"),
    "ragged": ("a.csv", ["freq,re,im", "850,1,2", "851,1", "852,1,2"], "line 3"),
}


@pytest.mark.parametrize("name", READ)
def test_odd_files_are_read_right(name: str, tmp_path: Path) -> None:
    file, content = READ[name]
    path = tmp_path / file
    path.write_bytes(content if isinstance(content, bytes) else "\n".join(content).encode())
    measured = read_measured(path)
    np.testing.assert_allclose(measured.response.frequency, F, rtol=1e-10)
    np.testing.assert_allclose(measured.reflection, S, atol=1e-9)
    assert measured.response.z0 == 50.0


@pytest.mark.parametrize("name", REFUSED)
def test_what_cannot_be_trusted_is_refused_with_its_line(name: str, tmp_path: Path) -> None:
    file, lines, said = REFUSED[name]
    path = tmp_path / file
    path.write_text("\n".join(lines))
    with pytest.raises(FaultyInputError, match=said):
        read_measured(path)


@pytest.mark.parametrize(
    ("name", "said"),
    [
        ("no option line", "no option line"),
        ("falling frequencies", "sorted"),
        ("utf-16", "UTF-16"),
        ("two ports", "S11"),
    ],
)
def test_what_was_taken_for_granted_is_said(name: str, said: str, tmp_path: Path) -> None:
    file, content = READ[name]
    path = tmp_path / file
    path.write_bytes(content if isinstance(content, bytes) else "\n".join(content).encode())
    assert any(said in text for text in read_measured(path).assumed)


def graded(tmp_path: Path, f: np.ndarray, s: np.ndarray) -> tuple[list[str], float, float]:
    path = tmp_path / "m.s1p"
    path.write_text("\n".join(["# HZ S RI R 50", *rows(scale=1.0, f=f, s=s)]))
    found = grade(read_measured(path), BAND)
    return [each.rule for each in found.findings if each.severity is Severity.REFUSE], found.noise, found.delay


FINE = np.linspace(0.8e9, 0.9e9, 401)
SMOOTH = 0.8 * np.exp(-2j * np.pi * FINE * 2e-9)


def test_a_clean_sweep_is_usable_and_its_delay_and_noise_are_found(tmp_path: Path) -> None:
    rng = np.random.default_rng(1)
    noise = 0.005 * (rng.standard_normal(401) + 1j * rng.standard_normal(401)) / np.sqrt(2.0)
    refused, level, delay = graded(tmp_path, FINE, SMOOTH + noise)
    assert refused == []
    assert level == pytest.approx(0.005, rel=0.15)  # the median of 398 dependent third differences
    assert delay == pytest.approx(2e-9, rel=0.02)


@pytest.mark.parametrize(
    ("f", "s", "rule"),
    [
        (FINE, SMOOTH * 1.5, "size of the reflection"),
        (FINE, np.conj(SMOOTH), "delay"),
        (FINE[::100], SMOOTH[::100], "points"),
        (FINE * 1e-3, SMOOTH, "band"),
        (FINE + 2e9, SMOOTH, "band"),
        (FINE, 0.8 * np.exp(-2j * np.pi * FINE * 1.7e-6), "resolution"),
    ],
    ids=["gain", "backwards", "few points", "wrong unit", "elsewhere", "long cable"],
)
def test_what_no_antenna_shows_is_refused(f: np.ndarray, s: np.ndarray, rule: str, tmp_path: Path) -> None:
    assert graded(tmp_path, f, s)[0] == [rule]

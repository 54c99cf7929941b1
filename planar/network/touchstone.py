"""Touchstone 1.x files of one and two ports: text, a `#` option line, then one line of numbers per frequency.

Touchstone File Format Specification, version 1.1. The writer knows one form, `# HZ S RI R`, and gives
the same bytes for the same response. The reader knows every unit and number format of S-parameters and
refuses, with the line number, whatever it does not understand; every fault of a file is found before any is reported.
"""

from __future__ import annotations

import math
import re
from collections.abc import Callable, Iterable
from dataclasses import dataclass
from pathlib import Path

import numpy as np

from planar.errors import Fault, FaultyInputError, RangeError
from planar.network.response import Response

PORTS = {".s1p": 1, ".s2p": 2}
"""Ending of a file -> its number of ports."""
UNITS = {"HZ": 1.0, "KHZ": 1e3, "MHZ": 1e6, "GHZ": 1e9}
"""Frequency unit of the option line -> Hz."""
FORMATS: dict[str, Callable[[float, float], complex]] = {
    "RI": complex,
    "MA": lambda size, degrees: size * _turned(degrees),
    "DB": lambda decibels, degrees: 10.0 ** (decibels / 20.0) * _turned(degrees),
}
"""Number format of the option line -> value of a pair of numbers."""
MOST_FAULTS = 20
"""Faults reported of one file: a wrong decimal sign makes one on every line."""
_NUMBER = re.compile(r"[+-]?(\d+\.?\d*|\.\d+)([eE][+-]?\d+)?", re.ASCII)
_OPTIONS = "# HZ S RI R 50, where HZ may be KHZ, MHZ or GHZ and RI may be MA or DB"


@dataclass(frozen=True)
class _Options:
    """What the option line says; the defaults are those of the specification."""

    unit: str = "GHZ"
    form: str = "MA"
    z0: float = 50.0


@dataclass(frozen=True)
class _Line:
    """One line with its number, comment taken off."""

    number: int
    text: str


def write_touchstone(response: Response, path: Path, *, comments: Iterable[str] = ()) -> None:
    """Write a one-port `response` to `path` (.s1p): `comments`, one line each, then `# HZ S RI R` and the numbers.

    S to 13 significant digits, frequency and reference impedance exactly. The format is ASCII: other characters of
    a comment are written as escapes. Raises `RangeError` for more than one port or another ending.
    """
    if response.s.shape[1] != 1 or path.suffix.lower() != ".s1p":
        raise RangeError(f"{path.name}: one port is written, into a file named .s1p; here are {response.s.shape[1]}")
    lines = [f"! {line}".rstrip() for comment in comments for line in comment.splitlines() or [""]]
    lines.append(f"# HZ S RI R {_exact(response.z0)}")
    for frequency, value in zip(response.frequency, response.s[:, 0, 0] + 0.0, strict=True):
        lines.append(f"{_exact(frequency)} {value.real:.12e} {value.imag:.12e}")
    path.write_bytes("".join(f"{line}\n" for line in lines).encode("ascii", "backslashreplace"))


def read_touchstone(path: Path) -> Response:
    """The response in the Touchstone 1.x file at `path`, ending .s1p or .s2p: S-parameters, RI, MA or DB, Hz to GHz.

    Raises `FaultyInputError` with file and line for everything not understood: other endings, parameters other
    than S, version 2 keywords, noise data, a second option line, numbers missing, too many or malformed,
    frequencies that do not rise.
    """
    ports = PORTS.get(path.suffix.lower())
    if ports is None:
        raise FaultyInputError([Fault(str(path), "file name", path.name, f"an ending {' or '.join(PORTS)}")])
    try:
        text = path.read_bytes().decode("utf-8-sig", "replace")  # comments may be in any encoding
    except OSError as error:
        raise FaultyInputError([Fault(str(path), "file", error.strerror or "unreadable", "a readable file")]) from error
    stripped = (_Line(number, line.split("!")[0].strip()) for number, line in enumerate(text.splitlines(), 1))
    lines = [line for line in stripped if line.text]
    faults: list[Fault] = []
    options = _options(lines, str(path), faults)
    rows = _rows([line for line in lines if line.text[0] != "#"], _count(ports), str(path), faults)
    values = _values(rows, options, str(path), faults)
    if not rows and not faults:
        faults.append(Fault(str(path), "data", "(none)", f"lines of {_count(ports)} numbers"))
    raise_faults(faults, str(path))
    # A two-port line runs S11 S21 S12 S22: column by column.
    s = np.array(values).reshape(-1, ports, ports).transpose(0, 2, 1)
    return Response(np.array([numbers[0] for _, numbers in rows]) * UNITS[options.unit], s, options.z0)


def raise_faults(faults: list[Fault], where: str) -> None:
    """Raise `FaultyInputError` with the first `MOST_FAULTS` of the faults of the file `where`, when there are any."""
    if faults:
        left = len(faults) - MOST_FAULTS
        more = [Fault(where, "lines", f"{left} more", "as above")] if left > 0 else []
        raise FaultyInputError(faults[:MOST_FAULTS] + more)


def _options(lines: list[_Line], where: str, faults: list[Fault]) -> _Options:
    """What the option line says; what is wrong with it, or with there being none or two, is added to `faults`."""
    found = [line for line in lines if line.text[0] == "#"]
    others = [line for line in lines if line.text[0] not in "[#"]  # a keyword is a fault of its own
    if not found or (others and others[0].number < found[0].number):
        faults.append(Fault(where, "option line", "(not first)", f"{_OPTIONS}, before the numbers"))
    for line in found[1:]:
        faults.append(_fault(where, line, "option line", "one option line"))
    return _read_options(found[0], where, faults) if found else _Options()


def _read_options(line: _Line, where: str, faults: list[Fault]) -> _Options:
    """The option line's words, in any order and case."""
    words = line.text[1:].upper().split()
    given: dict[str, str] = {}
    while words:
        word = words.pop(0)
        kind = "unit" if word in UNITS else "form" if word in FORMATS else {"S": "parameter", "R": "z0"}.get(word)
        value = (words.pop(0) if words else "") if kind == "z0" else word
        if kind is None or kind in given or (kind == "z0" and not (_is_number(value) and float(value) > 0.0)):
            faults.append(_fault(where, line, "option line", f"{_OPTIONS}; {word} {value}".rstrip() + " does not fit"))
            return _Options()
        given[kind] = value
    return _Options(given.get("unit", "GHZ"), given.get("form", "MA"), float(given.get("z0", "50")))


def _rows(lines: list[_Line], count: int, where: str, faults: list[Fault]) -> list[tuple[_Line, list[float]]]:
    """Each line that holds `count` numbers, with them; what is wrong with the others is added to `faults`."""
    rows: list[tuple[_Line, list[float]]] = []
    for line in lines:
        words = line.text.split()
        if line.text[0] == "[":
            faults.append(_fault(where, line, "keyword", "a file of version 1, which has no keywords"))
        elif not all(_is_number(word) for word in words):
            faults.append(_fault(where, line, "numbers", f"{count} numbers with decimal points, and no words"))
        elif len(words) != count:
            faults.append(_fault(where, line, "numbers", f"{count} numbers, here are {len(words)}"))
        else:
            numbers = [float(word) for word in words]
            if numbers[0] < 0.0 or (rows and numbers[0] <= rows[-1][1][0]):
                faults.append(_fault(where, line, "frequency", "not negative and above the frequency before it"))
            rows.append((line, numbers))
    return rows


def _values(
    rows: list[tuple[_Line, list[float]]], options: _Options, where: str, faults: list[Fault]
) -> list[list[complex]]:
    """The S-parameters of each row in the order of the file."""
    value = FORMATS[options.form]
    values = []
    for line, numbers in rows:
        try:
            values.append([value(a, b) for a, b in zip(numbers[1::2], numbers[2::2], strict=True)])
        except OverflowError:
            faults.append(_fault(where, line, "numbers", "decibels of a number that can be held"))
    return values


def _turned(degrees: float) -> complex:
    return complex(math.cos(math.radians(degrees)), math.sin(math.radians(degrees)))


def _count(ports: int) -> int:
    """Numbers on a line: a frequency and p^2 pairs."""
    return 1 + 2 * ports * ports


def _is_number(word: str) -> bool:
    return _NUMBER.fullmatch(word) is not None and math.isfinite(float(word))


def _exact(number: float) -> str:
    """The shortest decimal that reads back as `number`, without exponent."""
    return np.format_float_positional(number, trim="-")


def _fault(where: str, line: _Line, key: str, expected: str) -> Fault:
    text = line.text if len(line.text) <= 60 else f"{line.text[:57]}..."
    return Fault(f"{where}, line {line.number}", key, text, expected)

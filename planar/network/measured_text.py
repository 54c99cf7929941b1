"""Text of a measurement as instruments and spreadsheets write it, turned into a table of numbers with line numbers.

Touchstone 1.x and 2.0 with the slips seen in real files (a space before the option line, a unit glued to its #, tabs,
commas, any line ending, any common encoding) and tables with a header. What is taken for granted is said; what can be
read in two ways is refused with its line.
"""

from __future__ import annotations

import re
from collections.abc import Iterator
from dataclasses import dataclass, field
from pathlib import Path

from planar.errors import Fault
from planar.network.touchstone import FORMATS, UNITS, raise_faults

_NUMBER = re.compile(r"[+-]?(\d+\.?\d*|\.\d+)([eEdD][+-]?\d+)?", re.ASCII)
_DECIMAL_COMMA = re.compile(r"(?<=\d),(?=\d)")
_KEYWORD = re.compile(r"\s*\[([^\]]+)\]\s*(.*)")
_OPTION_WORDS = re.compile(r"[A-Za-z]+|[+-]?(?:\d+\.?\d*|\.\d+)(?:[eE][+-]?\d+)?")
_UNUSED_KEYWORDS = {
    "version", "number of ports", "two-port data order", "number of frequencies", "matrix format",
    "network data", "begin information", "end information", "mixed-mode order", "end",
}  # fmt: skip


@dataclass(frozen=True)
class Line:
    """A line of the file with its number, counted from 1."""

    number: int
    text: str


@dataclass(frozen=True)
class Table:
    """Rows of numbers, each with its line, under what a Touchstone file says of them: frequency `unit` in Hz, number
    `form` ("RI", "MA", "DB"), reference `z0` ohm. `heads` are the column names of a table instead, empty otherwise."""

    rows: tuple[tuple[Line, tuple[float, ...]], ...]
    unit: float
    form: str
    z0: float
    heads: tuple[str, ...] = ()


@dataclass
class Reading:
    """What is noticed while a file is read: faults, and what was taken for granted."""

    where: str
    faults: list[Fault] = field(default_factory=list)
    assumed: list[str] = field(default_factory=list)

    def fault(self, line: Line, key: str, expected: str) -> None:
        """Note that `line` cannot be trusted and what would be right."""
        text = line.text.strip()
        shown = text if len(text) <= 60 else f"{text[:57]}..."
        self.faults.append(Fault(f"{self.where}, line {line.number}", key, shown, expected))

    def whole(self, key: str, value: str, expected: str) -> None:
        """Note a fault of the file as a whole."""
        self.faults.append(Fault(self.where, key, value, expected))

    def assume(self, text: str) -> None:
        """Note what was taken for granted, once."""
        if text not in self.assumed:
            self.assumed.append(text)

    def raise_faults(self) -> None:
        """Raise `FaultyInputError` when there are any."""
        raise_faults(self.faults, self.where)


def read_table(path: Path, reading: Reading) -> Table:
    """The table of numbers in the file at `path`. Raises `FaultyInputError` with every line that cannot be trusted."""
    lines = [line for line in _lines(path, reading) if line.text.strip()]
    first = next((line for line in lines if line.text.lstrip()[0] not in "!;*"), None)
    if first is None:
        reading.whole("data", "(none)", "lines of frequency and reflection")
        reading.raise_faults()
        raise AssertionError  # the line above raises
    spreadsheet = path.suffix.lower() not in {".s1p", ".s2p", ".ts"} and first.text.lstrip()[0] not in "#["
    table = _spreadsheet(lines, reading) if spreadsheet else _touchstone(lines, reading)
    if not table.rows and not reading.faults:
        reading.whole("data", "(none)", "lines of frequency and reflection")
    reading.raise_faults()
    return table


def _lines(path: Path, reading: Reading) -> Iterator[Line]:
    try:
        raw = path.read_bytes()
    except OSError as error:
        reading.whole("file", (error.strerror or "unreadable").lower(), "a readable file")
        reading.raise_faults()
        raise AssertionError from error  # the line above raises
    if raw[:2] in (b"\xff\xfe", b"\xfe\xff"):
        text = raw.decode("utf-16", "replace")
        reading.assume("the text is UTF-16")
    elif b"\0" in raw:
        reading.whole("file", "binary data", "a text file: Touchstone or a table")
        reading.raise_faults()
        raise AssertionError  # the line above raises
    else:
        text = raw.decode("utf-8-sig", "replace")
    return (Line(number, line) for number, line in enumerate(text.splitlines(), start=1))


def _touchstone(lines: list[Line], reading: Reading) -> Table:
    keywords = {match[1].strip().lower(): (line, match[2]) for line in lines if (match := _KEYWORD.match(line.text))}
    body = [line for line in lines if not _KEYWORD.match(line.text)]
    inside = _without_information(lines)
    options: Line | None = None
    rows: list[tuple[Line, tuple[float, ...]]] = []
    for line in body:
        text = line.text.split("!")[0].strip()
        if not text or line.number in inside:
            continue
        if text[0] == "#":
            if options is None:
                options = line
                if rows:
                    reading.fault(line, "option line", "before the numbers, not after some of them")
            else:
                reading.fault(line, "option line", "one option line")
        else:
            numbers = _numbers(text, line, reading, last=line is body[-1])
            if numbers:
                rows.append((line, numbers))
    unit, form, z0 = _options(options, reading)
    if "reference" in keywords:
        z0 = _reference(*keywords["reference"], reading)
    for name, (line, _) in keywords.items():
        if name not in _UNUSED_KEYWORDS | {"reference"}:
            reading.fault(line, "keyword", "a file of S-parameters without noise data")
    return Table(tuple(rows), unit, form, z0)


def _without_information(lines: list[Line]) -> set[int]:
    """Numbers of the lines between [Begin Information] and [End Information]: free text."""
    inside, found = False, set()
    for line in lines:
        keyword = _KEYWORD.match(line.text)
        name = keyword[1].strip().lower() if keyword else ""
        inside = name == "begin information" or (inside and name != "end information")
        if inside:
            found.add(line.number)
    return found


def _options(line: Line | None, reading: Reading) -> tuple[float, str, float]:
    """Frequency unit (Hz), number format and reference (ohm) of the option line, or of the specification."""
    if line is None:
        reading.assume("no option line: GHz, magnitude and angle, 50 ohm, as the specification has it")
        return 1e9, "MA", 50.0
    text = line.text.split("!")[0].strip()
    if line.text[0] != "#" or not re.match(r"#\s", text):
        reading.assume(f"line {line.number} is the option line, though not written as it should be")
    words = [word.upper() for word in _OPTION_WORDS.findall(text[1:])]
    unit, form, z0 = "GHZ", "MA", 50.0
    while words:
        word = words.pop(0)
        if word in UNITS:
            unit = word
        elif word in FORMATS:
            form = word
        elif word == "R" and words and _NUMBER.fullmatch(words[0]) and float(words[0]) > 0.0:
            z0 = float(words.pop(0))
        elif word in {"Y", "Z", "G", "H"}:
            reading.fault(line, "option line", "S-parameters (S)")
        elif word not in {"S", "R"}:
            reading.fault(line, "option line", "# HZ S RI R 50, where HZ may be KHZ, MHZ, GHZ and RI may be MA or DB")
    if not set(UNITS) & set(re.findall(r"[A-Z]+", text.upper())):
        reading.assume("no frequency unit in the option line: GHz, as the specification has it")
    return UNITS[unit], form, z0


def _reference(line: Line, text: str, reading: Reading) -> float:
    first = text.split()[:1]
    if first and _NUMBER.fullmatch(first[0]) and float(first[0]) > 0.0:
        return float(first[0])
    reading.fault(line, "[Reference]", "a resistance in ohm")
    return 50.0


def _numbers(text: str, line: Line, reading: Reading, *, last: bool) -> tuple[float, ...]:
    """The numbers of a row; none, and a fault, where it holds anything else."""
    words = [word for word in re.split(r"[\s;,]+", text) if word]
    if all(_NUMBER.fullmatch(word) for word in words) and len(words) in {3, 5, 9}:
        return tuple(map(_number, words))
    if last and len(words) < 3:
        reading.assume(f"line {line.number}, the last one, is cut short and left out")
        return ()
    reading.fault(line, "numbers", "a frequency and 1 or 4 pairs of numbers with decimal points")
    return ()


def _spreadsheet(lines: list[Line], reading: Reading) -> Table:
    """A table with a header: the separator is the one the header has."""
    kept = [line for line in lines if line.text.lstrip()[0] not in "!#*"]
    head = next((i for i, line in enumerate(kept) if re.search(r"[A-Za-z]", _without_exponents(line.text))), None)
    if head is None:
        reading.fault(kept[0], "header", "a first line that names the columns, with the unit of the frequency")
        return Table((), 1.0, "RI", 50.0)
    separator = next((s for s in ("\t", ";", ",") if s in kept[head].text), None)
    names = tuple(cell.strip().strip('"').lower() for cell in _cells(kept[head].text, separator))
    if head > 0:
        reading.assume(f"the {head} lines above the header say nothing of the numbers")
    rows = []
    for line in kept[head + 1 :]:
        text = line.text
        if separator != "," and _DECIMAL_COMMA.search(text):
            reading.assume("the decimal sign is a comma")
            text = _DECIMAL_COMMA.sub(".", text)
        cells = [cell.strip().strip('"') for cell in _cells(text, separator)]
        if len(cells) == len(names) and all(_NUMBER.fullmatch(cell) for cell in cells if cell):
            rows.append((line, tuple(_number(cell) if cell else float("nan") for cell in cells)))
        elif line is kept[-1] and len(cells) < len(names):
            reading.assume(f"line {line.number}, the last one, is cut short and left out")
        else:
            reading.fault(line, "numbers", f"{len(names)} numbers with decimal points, as the header names columns")
    return Table(tuple(rows), 1.0, "RI", 50.0, names)


def _number(word: str) -> float:
    """The number a word that fits `_NUMBER` stands for; some programs write its exponent with a D."""
    return float(word.upper().replace("D", "E"))


def _without_exponents(text: str) -> str:
    return re.sub(r"\d[eEdD][+-]?\d", "0", text)


def _cells(text: str, separator: str | None) -> list[str]:
    return text.split(separator) if separator else text.split()

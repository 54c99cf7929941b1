"""The axes of a sweep: which keys of a brief take which values, and the briefs that come of them.

`--vary board.thickness=0.8 mm,1.6 mm` lists values, `--vary board.thickness=0.8 mm:1.6 mm:3` spaces them evenly. Any
key of a brief may vary; a value is read as the brief file would read it. A value the brief does not allow for its key
is a fault of the command, found before anything is solved; what only a combination forbids is a refused row.
"""

from __future__ import annotations

import copy
import itertools
import re
import tomllib
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass
from typing import Any

from planar.brief import check_brief
from planar.errors import BriefError, Fault
from planar.library import Library

MOST_ROWS = 10_000
"""Rows beyond which a sweep is refused: a slip in a count, not a plan."""
_RANGE = re.compile(
    r"\s*([+-]?(?:\d+\.?\d*|\.\d+)(?:[eE][+-]?\d+)?)\s*([^:]*?)\s*:"
    r"\s*([+-]?(?:\d+\.?\d*|\.\d+)(?:[eE][+-]?\d+)?)\s*([^:]*?)\s*:\s*(\d+)\s*"
)
_BARE = re.compile(r"[+-]?(\d+\.?\d*|\.\d+)([eE][+-]?\d+)?|true|false|[\[{].*", re.DOTALL)
"""Values that stand in a brief without quotes."""
_EXAMPLE = '"board.thickness=0.8 mm,1.6 mm" or "board.thickness=0.8 mm:1.6 mm:3"'


@dataclass(frozen=True)
class Axis:
    """A dotted `key` of the brief and its values: `texts` as given, `values` as TOML would give them."""

    key: str
    texts: tuple[str, ...]
    values: tuple[Any, ...]


@dataclass(frozen=True)
class Row:
    """A row of a sweep: its `number` from 1, the text each axis has there, and the brief's tables."""

    number: int
    settings: Mapping[str, str]
    data: Mapping[str, Any]


def read_axes(texts: Sequence[str]) -> tuple[Axis, ...]:
    """Axes from `KEY=VALUES` texts. Raises `BriefError` with the faults of all of them."""
    faults: list[Fault] = []
    axes = []
    for text in texts:
        key, equals, listed = text.partition("=")
        found = _values(listed) if equals and key.strip() else []
        if not found:
            faults.append(Fault("command line", "--vary", text, f"KEY=VALUES such as {_EXAMPLE}"))
            continue
        try:
            axes.append(Axis(key.strip(), tuple(found), tuple(_read(each) for each in found)))
        except tomllib.TOMLDecodeError:
            faults.append(Fault("command line", "--vary", text, "values written as in a brief"))
    twice = sorted({axis.key for axis in axes if sum(each.key == axis.key for each in axes) > 1})
    faults += [Fault("command line", "--vary", key, "each key once, with all its values") for key in twice]
    if not texts:
        faults.append(Fault("command line", "--vary", "(not given)", f"at least one axis such as {_EXAMPLE}"))
    if faults:
        raise BriefError(faults)
    return tuple(axes)


def sweep_rows(base: Mapping[str, Any], axes: Sequence[Axis], where: str, library: Library) -> tuple[Row, ...]:
    """Every combination of the axes, the last one varying fastest, on the tables of the brief `base` read from `where`.

    Raises `BriefError` for values that the brief does not allow for their key, and for too many rows.
    """
    faults = [fault for axis in axes for fault in _axis_faults(base, axis, where, library)]
    count = 1
    for axis in axes:
        count *= len(axis.values)
    if count > MOST_ROWS:
        faults.append(Fault("command line", "--vary", f"{count} rows", f"at most {MOST_ROWS}"))
    if faults:
        raise BriefError(list(dict.fromkeys(faults)))
    choices = [tuple(zip(axis.texts, axis.values, strict=True)) for axis in axes]
    rows = []
    for number, chosen in enumerate(itertools.product(*choices), start=1):
        data = copy.deepcopy(dict(base))
        for axis, (_, value) in zip(axes, chosen, strict=True):
            _put(data, axis.key, value)
        settings = {axis.key: text for axis, (text, _) in zip(axes, chosen, strict=True)}
        rows.append(Row(number, settings, data))
    return tuple(rows)


def _axis_faults(base: Mapping[str, Any], axis: Axis, where: str, library: Library) -> Iterator[Fault]:
    """Faults of the axis' own key when it alone takes each of its values."""
    for text, value in zip(axis.texts, axis.values, strict=True):
        data = copy.deepcopy(dict(base))
        try:
            _put(data, axis.key, value)
            check_brief(data, where, library)
        except BriefError as error:
            for fault in error.faults:
                if fault.key == axis.key or fault.key.startswith((f"{axis.key}.", f"{axis.key}[")):
                    yield Fault("command line", f"--vary {axis.key}", text, fault.expected)


def _put(data: dict[str, Any], key: str, value: Any) -> None:
    """Set the dotted `key`, making tables on the way; a text in the way (a laminate by name) is a fault of the key."""
    *tables, last = key.split(".")
    place = data
    for name in tables:
        inner = place.setdefault(name, {})
        if not isinstance(inner, dict):
            expected = f"a key of a table; {name} is {inner!r} in the brief"
            raise BriefError([Fault("command line", key, str(value), expected)])
        place = inner
    place[last] = value


def _values(listed: str) -> list[str]:
    """The texts of a list or a range; none when it is neither."""
    spaced = _RANGE.fullmatch(listed)
    if spaced is None:
        return [each for each in (part.strip() for part in _split(listed)) if each]
    low, unit_low, high, unit_high, count = spaced.groups()
    unit, steps = unit_high or unit_low, int(count)
    if steps < 2 or steps > MOST_ROWS or (unit_low and unit_low != unit):
        return []
    first, last = float(low), float(high)
    points = [first + (last - first) * i / (steps - 1) for i in range(steps)]
    return [f"{point:.10g} {unit}".strip() for point in points]


def _split(listed: str) -> Iterator[str]:
    """`listed` at its commas, but not inside brackets, braces or quotes."""
    depth, quoted, part = 0, False, ""
    for character in listed:
        quoted ^= character == '"'
        depth += (character in "[{") - (character in "]}") if not quoted else 0
        if character == "," and depth == 0 and not quoted:
            yield part
            part = ""
        else:
            part += character
    yield part


def _read(text: str) -> Any:
    """The value a brief would hold: a bare number, true, false, a list or table as they are, else a text."""
    if _BARE.fullmatch(text) or text.startswith('"'):
        return tomllib.loads(f"value = {text}")["value"]
    return text

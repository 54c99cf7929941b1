"""Checked reading of a TOML entry against a declared shape, all faults of a file at once.

A shape is a tree of three nodes: `Key` (one value and its conversion), `Table` (named nodes) and `Rows` (an array
of alike tables). `read` walks shape and file together, converts every value to SI and collects a `Fault` for each
key that is missing, unknown or wrong. Conversions are plain functions that raise `UnitError` or `ValueError` with
the words for what would be right.
"""

from __future__ import annotations

import difflib
import json
import tomllib
from collections.abc import Callable, Iterable, Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from planar.errors import Fault, LibraryError, UnitError
from planar.units import quantity, show

Convert = Callable[[object], Any]


@dataclass(frozen=True)
class Key:
    """One value: how to convert it, and whether it must be there."""

    convert: Convert
    required: bool = True


@dataclass(frozen=True)
class Table:
    """Named nodes."""

    nodes: Mapping[str, Key | Table | Rows]
    required: bool = True


@dataclass(frozen=True)
class Rows:
    """An array of tables of one shape; may be absent."""

    row: Table
    required: bool = False


Node = Key | Table | Rows


def text(value: object) -> str:
    """A text that is not blank."""
    if not isinstance(value, str) or not value.strip():
        raise ValueError('a text is needed, such as "common practice, no source"')
    return value


def boolean(value: object) -> bool:
    """true or false."""
    if not isinstance(value, bool):
        raise ValueError("write true or false")
    return value


def number(low: float, high: float) -> Convert:
    """Conversion of a number without unit from `low` to `high`."""

    def convert(value: object) -> float:
        if isinstance(value, bool) or not isinstance(value, int | float) or not low <= value <= high:
            raise ValueError(f"a number from {low:g} to {high:g} is needed, without unit and quotes")
        return float(value)

    return convert


def count(low: int, high: int) -> Convert:
    """Conversion of a whole number from `low` to `high`."""

    def convert(value: object) -> int:
        if isinstance(value, bool) or not isinstance(value, int) or not low <= value <= high:
            raise ValueError(f"a whole number from {low} to {high} is needed")
        return value

    return convert


def measure(kind: str, low: float, high: float) -> Convert:
    """Conversion of a quantity of `kind` (see `planar.units`) from `low` to `high` in SI units."""

    def convert(value: object) -> float:
        si = quantity(value, kind)
        # Unit conversion rounds: without slack a value at the end of the range could fall outside.
        slack = 1e-11 * max(abs(low), abs(high))
        if not low - slack <= si <= high + slack:
            raise ValueError(f"out of range, from {show(low, kind)} to {show(high, kind)} is possible")
        return si

    return convert


def choice(*names: str) -> Convert:
    """Conversion of one of the texts `names`."""

    def convert(value: object) -> str:
        if not isinstance(value, str) or value not in names:
            raise ValueError(f"one of {', '.join(names)}{nearest(value, names)}")
        return value

    return convert


def list_of(convert_one: Convert) -> Convert:
    """Conversion of a list with at least one member."""

    def convert(value: object) -> tuple[Any, ...]:
        if not isinstance(value, list) or not value:
            raise ValueError("a list with at least one member is needed")
        return tuple(convert_one(member) for member in value)

    return convert


def pair_of(convert_one: Convert) -> Convert:
    """Conversion of a list of two, such as x and y."""

    def convert(value: object) -> tuple[Any, Any]:
        if not isinstance(value, list) or len(value) != 2:
            raise ValueError("a list of two values is needed")
        return convert_one(value[0]), convert_one(value[1])

    return convert


def nearest(value: object, names: Iterable[str]) -> str:
    """`, nearest is "..."` for the member of `names` closest to `value`; empty where nothing is close."""
    close = difflib.get_close_matches(str(value), list(names), n=1)
    return f', nearest is "{close[0]}"' if close else ""


def parse(path: Path) -> dict[str, Any]:
    """Raw mapping of the TOML file `path`. Raises `LibraryError` if it cannot be read or is no TOML."""
    try:
        return tomllib.loads(path.read_text(encoding="utf-8"))
    except tomllib.TOMLDecodeError as error:
        raise LibraryError([Fault(str(path), "file", "malformed", f"valid TOML is needed: {error}")]) from error
    except (OSError, UnicodeDecodeError) as error:
        raise LibraryError([Fault(str(path), "file", "unreadable", f"a UTF-8 text file is needed: {error}")]) from error


def read(raw: Mapping[str, Any], shape: Table, where: str) -> dict[str, Any]:
    """Converted values of `raw`, nested as in `shape`; absent optional keys are None, absent rows are empty.

    `where` names the file. Raises `LibraryError` with every fault.
    """
    faults: list[Fault] = []
    values = _table(raw, shape, _Place(where, "", faults))
    if faults:
        raise LibraryError(faults)
    return values


def source_list(raw: Mapping[str, Any]) -> tuple[tuple[str, str], ...]:
    """(key, source) of every table of a file that `read` has accepted; rows are named `key[1]`, `key[2]`, ..."""
    pairs: list[tuple[str, str]] = []
    for name, value in raw.items():
        rows = value if isinstance(value, list) else [value]
        for index, row in enumerate(rows, start=1):
            if isinstance(row, dict) and "source" in row:
                pairs.append((f"{name}[{index}]" if isinstance(value, list) else name, str(row["source"])))
    return tuple(pairs)


@dataclass(frozen=True)
class _Place:
    where: str
    prefix: str
    faults: list[Fault]

    def below(self, name: str) -> _Place:
        return _Place(self.where, f"{self.prefix}{name}.", self.faults)

    def own_fault(self, value: object, expected: str) -> None:
        self.faults.append(Fault(self.where, self.prefix.rstrip("."), _as_written(value), expected))

    def fault(self, name: str, value: object, expected: str) -> None:
        self.faults.append(Fault(self.where, self.prefix + name, _as_written(value), expected))


_ABSENT = object()


def _table(raw: object, shape: Table, place: _Place) -> dict[str, Any]:
    if not isinstance(raw, Mapping):
        place.own_fault(raw, f"a table is needed with the keys {', '.join(shape.nodes)}")
        return {}
    for name in raw:
        if name not in shape.nodes:
            place.fault(name, raw[name], f"unknown key{nearest(name, shape.nodes)}; known: {', '.join(shape.nodes)}")
    return {name: _node(name, raw.get(name, _ABSENT), node, place) for name, node in shape.nodes.items()}


def _node(name: str, value: object, node: Node, place: _Place) -> Any:
    if value is _ABSENT:
        if node.required:
            place.fault(name, _ABSENT, "this key is needed")
        return [] if isinstance(node, Rows) else None
    if isinstance(node, Table):
        return _table(value, node, place.below(name))
    if isinstance(node, Rows):
        return _rows(name, value, node, place)
    try:
        return node.convert(value)
    except (UnitError, ValueError) as error:
        place.fault(name, value, str(error))
        return None


def _rows(name: str, value: object, node: Rows, place: _Place) -> list[dict[str, Any]]:
    if not isinstance(value, list):
        place.fault(name, value, f"rows are needed, each under [[{name}]]")
        return []
    return [_table(row, node.row, place.below(f"{name}[{index}]")) for index, row in enumerate(value, start=1)]


def _as_written(value: object) -> str:
    return "(not given)" if value is _ABSENT else json.dumps(value, ensure_ascii=False, default=str)

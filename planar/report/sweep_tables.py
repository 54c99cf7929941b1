"""The tables on the page of a sweep: every row of it, the dimensions of each kind of board, what was found.

A table here is made to be sorted: plain cells in plain columns, so that a thousand rows stay a small page.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass
from typing import Any

from planar.design.sweep_axes import Axis
from planar.report.sweep_columns import is_number, numeric_columns, quantity
from planar.report.sweep_curves import axis_numbers
from planar.report.sweep_facts import MEETS, MISSES, SweptRow, row_ranges
from planar.report.tables import SEVERITIES, Table, table

KINDS = ("family", "end", "shape")
MAIN = (
    "worst_reflection_db", "spare_db", "matched_from_mhz", "matched_to_mhz", "matched_percent", "gain_dbi",
    "efficiency_percent", "worst_axial_ratio_db", "input_resistance_ohm", "input_reactance_ohm", "board_width_mm",
    "board_height_mm", "board_area_cm2",
)  # fmt: skip
"""Columns of numbers in the table of all rows."""
REST = ("best_match_mhz", "axial_ratio_db", "quality")
"""Columns that stand beside the dimensions."""
MOST_FINDINGS = 100
"""Different findings that are listed; a sweep with more is read from its files."""
LONG = 28
"""Letters of a setting beyond which it is broken in lines."""
MOST_VALUES = 12
"""Values of an axis that are listed; of more the first and the last are."""


@dataclass(frozen=True)
class Head:
    """Head of a column: its name in the tables, what the page calls it, its unit, whether it holds numbers."""

    column: str
    words: str
    unit: str = ""
    number: bool = False


@dataclass(frozen=True)
class Cell:
    """A cell: its text, classes for its style, how many columns it spans."""

    text: str
    style: str = ""
    span: int = 1


@dataclass(frozen=True)
class SortedTable:
    """A table that can be sorted; the first cell of a row is its number."""

    title: str
    heads: tuple[Head, ...]
    rows: tuple[tuple[Cell, ...], ...]


def rows_table(axes: Sequence[Axis], rows: Sequence[SweptRow]) -> SortedTable:
    """Every row: its settings, how it ended, its numbers; where there are none, the reason in their place."""
    tables = [row.columns for row in rows]
    kinds = [name for name in KINDS if len({each.get(name) for each in tables if "family" in each}) > 1]
    there = numeric_columns(tables)
    numbers = [name for name in MAIN if name in there]
    heads = (*_axis_heads(axes), Head("result", "result"), *(Head(name, name) for name in kinds), *_heads(numbers))
    span = len(kinds) + len(numbers)
    if not span:
        heads, span = (*heads, Head("reason", "reason")), 1
    axis_cells = _AxisCells(axes)
    made = []
    for row in rows:
        style = "good" if row.result == MEETS else "bad" if row.result.startswith(MISSES) else ""
        cells = [*axis_cells.of(row), Cell(row.result, style)]
        if row.reason:
            made.append((*cells, Cell(row.reason, "reason", span)))
            continue
        cells += [Cell(str(row.columns.get(name) or "")) for name in kinds]
        made.append((*cells, *(_number_cell(row, name) for name in numbers)))
    return SortedTable("All rows", heads, tuple(made))


def dimension_tables(axes: Sequence[Axis], rows: Sequence[SweptRow]) -> list[SortedTable]:
    """Dimensions and lines of the designed rows, a table for each kind of board."""
    groups: dict[str, list[SweptRow]] = {}
    for row in rows:
        if "family" in row.columns:
            groups.setdefault(", ".join(str(row.columns[name]) for name in KINDS if row.columns[name]), []).append(row)
    tables = []
    for kind, group in groups.items():
        there = numeric_columns([row.columns for row in group])
        names = [name for name in there if name not in MAIN and name not in REST]
        names += [name for name in REST if name in there]
        cells = _AxisCells(axes)
        made = tuple((*cells.of(row), *(_number_cell(row, name) for name in names)) for row in group)
        tables.append(SortedTable(f"Dimensions: {kind}", (*_axis_heads(axes), *_heads(names)), made))
    return tables


def axis_table(axes: Sequence[Axis]) -> Table | None:
    """What was varied and over what."""
    rows = []
    for axis in axes:
        few = len(axis.texts) <= MOST_VALUES
        told = "; ".join(axis.texts) if few else f"{axis.texts[0]} to {axis.texts[-1]}"
        rows.append((axis.key, told, str(len(axis.texts))))
    return table("Axes", ("key of the brief", "values", "how many #"), rows)


def finding_table(told: Sequence[Mapping[str, Any]]) -> Table | None:
    """What was found about designed rows of a sweep.json, each finding once with the rows it is about."""
    found: dict[tuple[str, ...], list[int]] = {}
    for row in told:
        for each in row["design"]["findings"] if row.get("design") else ():
            key = tuple(str(each[name]) for name in ("severity", "rule", "where", "got", "limit"))
            found.setdefault(key, []).append(row["row"])
    order = list(SEVERITIES)
    listed = sorted(found.items(), key=lambda item: order.index(item[0][0]))[:MOST_FINDINGS]
    rows = [(SEVERITIES[key[0]], *key[1:], row_ranges(numbers)) for key, numbers in listed]
    left = len(found) - len(rows)
    note = f"{left} further findings stand in sweep.csv, row by row." if left else ""
    return table("Findings", ("", "rule", "at", "got", "limit", "rows"), rows, note)


def _axis_heads(axes: Sequence[Axis]) -> Iterator[Head]:
    yield Head("row", "row", number=True)
    for axis in axes:
        numbers = axis_numbers(axis)
        yield Head(axis.key, axis.key, numbers[1] if numbers else "", numbers is not None)


def _heads(columns: Sequence[str]) -> Iterator[Head]:
    for each in map(quantity, columns):
        yield Head(each.column, each.words, each.unit, True)


class _AxisCells:
    """Number and settings of a row as cells; an axis of numbers has its unit in the head."""

    def __init__(self, axes: Sequence[Axis]) -> None:
        self._numbers = {axis.key: numbers[0] for axis in axes if (numbers := axis_numbers(axis)) is not None}

    def of(self, row: SweptRow) -> Iterator[Cell]:
        yield Cell(str(row.number))
        for key, text in row.settings.items():
            if key in self._numbers:
                yield Cell(self._numbers[key][text], "number")
            else:
                yield Cell(text, "long" if len(text) > LONG else "")


def _number_cell(row: SweptRow, column: str) -> Cell:
    value = row.columns.get(column)
    text = quantity(column).written(value) if is_number(value) else ""
    return Cell(text, "number missed" if column in row.missed else "number")

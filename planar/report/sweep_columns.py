"""Columns of a sweep as people read them: words, unit and decimals from the column's name, numbers in one way."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any, TypeGuard

from planar.report.page_figures import Form

_UNITS = {
    "db": ("dB", 1), "dbi": ("dBi", 2), "mhz": ("MHz", 1), "mm": ("mm", 3), "cm2": ("cm\N{SUPERSCRIPT TWO}", 1),
    "ohm": ("ohm", 1), "percent": ("%", 1),
}  # fmt: skip
"""Last part of a column's name -> unit, decimals."""
_WORDS = {
    "spare_db": "match to spare",
    "matched_percent": "matched width",
    "axial_ratio_db": "axial ratio in the middle",
    "worst_axial_ratio_db": "worst axial ratio",
}
_DECIMALS = {"board_width_mm": 1, "board_height_mm": 1, "axial_ratio_db": 2, "worst_axial_ratio_db": 2, "quality": 2}


@dataclass(frozen=True)
class Quantity:
    """A column of numbers: its name in the tables, words, unit, and how its numbers are written."""

    column: str
    words: str
    unit: str
    form: Form

    def written(self, value: float) -> str:
        """A number of the column without its unit."""
        return self.form.written(value)

    @property
    def title(self) -> str:
        """Words as a heading begins."""
        return f"{self.words[:1].upper()}{self.words[1:]}"

    @property
    def titled(self) -> str:
        """Words with the unit, as a scale is named."""
        return f"{self.words} ({self.unit})" if self.unit else self.words


def quantity(column: str) -> Quantity:
    """The quantity in `column`, a name as `row_columns` gives it."""
    name, _, last = column.rpartition("_")
    unit, decimals = _UNITS.get(last, ("", 2))
    words = _WORDS.get(column, (name if unit else column).replace("_", " "))
    return Quantity(column, words, unit, Form(unit, decimals=_DECIMALS.get(column, decimals)))


def numeric_columns(table: Sequence[Mapping[str, Any]]) -> list[str]:
    """Columns in which any row has a number, in their order, without the number of the row."""
    names = dict.fromkeys(name for row in table for name, value in row.items() if is_number(value))
    return [name for name in names if name != "row"]


def is_number(value: object) -> TypeGuard[float]:
    """Whether it is one, for a table: no truth value."""
    return isinstance(value, int | float) and not isinstance(value, bool)

"""What the commands that look at many boards print."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from pathlib import Path
from typing import Any

from planar.design.sweep_axes import Axis
from planar.report.console import terminal, text_table

SHOWN = {
    "row": "row",
    "status": "",
    "family": "family",
    "board_width_mm": "board\nmm",
    "board_height_mm": "\nmm",
    "worst_reflection_db": "worst\ndB",
    "matched_percent": "matched\n%",
    "gain_dbi": "gain\ndBi",
    "efficiency_percent": "efficiency\n%",
    "worst_axial_ratio_db": "axial ratio\ndB",
    "reason": "reason",
}
"""Columns of the table on a terminal; the files have all."""
REASON = 70
"""Letters of a reason that a row has room for; the files have the whole."""


def print_sweep(axes: Sequence[Axis], table: Sequence[Mapping[str, Any]], folder: Path) -> None:
    """Print a row a design, its axes first, and where the files are."""
    names = ["row", *(axis.key for axis in axes), *(name for name in SHOWN if name != "row")]
    names = [name for name in names if any(_cell(row, name) for row in table)]
    heads = [SHOWN.get(name, name.replace(".", ".\n")) for name in names]
    right = [i for i, name in enumerate(names) if any(isinstance(row.get(name), float) for row in table)]
    console = terminal()
    console.print(text_table(heads, [[_cell(row, name) for name in names] for row in table], right=right))
    console.print(f"written to {folder}", highlight=False, soft_wrap=True)


def _cell(row: Mapping[str, Any], name: str) -> str:
    value = row.get(name)
    if isinstance(value, float):
        return f"{value:.1f}" if name.endswith(("_mm", "_percent")) else f"{value:.2f}"
    text = "" if value is None else str(value)
    return f"{text[:REASON]} ..." if len(text) > REASON else text

"""The plots of a sweep as files: which quantities can be asked for, and one SVG for each."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from pathlib import Path
from typing import Any

from planar.design.sweep_axes import Axis
from planar.design.sweep_rows import NUMBERS
from planar.errors import BriefError, Fault
from planar.report.sweep_columns import numeric_columns
from planar.report.sweep_pictures import sweep_plot_alone

PLOTTED = ("worst_reflection_db", "matched_percent", "gain_dbi", "board_area_cm2")
"""Columns that are plotted unless others are asked for."""

Table = Sequence[Mapping[str, Any]]


def check_plots(quantities: Sequence[str]) -> None:
    """Raise `BriefError` for a quantity no row can have: dimensions and line impedances depend on the family."""
    wrong = [name for name in quantities if name not in NUMBERS and not name.endswith(("_mm", "_ohm"))]
    right = f"one of {', '.join(NUMBERS)}, a dimension such as loop_width_mm, a line such as transformer_ohm"
    if wrong:
        raise BriefError([Fault("command line", "--plot", name, right) for name in wrong])


def write_sweep_plots(
    axes: Sequence[Axis], table: Table, folder: Path, quantities: Sequence[str], *, asked: Mapping[str, float]
) -> None:
    """Write `<quantity>.svg` into `folder` for each of `quantities` that any row has a number for, with a line at what
    is `asked` of it."""
    there = numeric_columns(table)
    for name in quantities:
        if name in there:
            drawn = sweep_plot_alone(axes, table, name, asked.get(name))
            (folder / f"{name}.svg").write_bytes(drawn.encode("utf-8"))

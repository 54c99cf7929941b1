"""One quantity of a sweep over its first numeric axis, a curve for each setting of the others, as an SVG."""

from __future__ import annotations

import os
import re
from collections import defaultdict
from collections.abc import Mapping, Sequence
from pathlib import Path
from typing import Any

import matplotlib as mpl
from matplotlib.axes import Axes
from matplotlib.backends.backend_svg import FigureCanvasSVG
from matplotlib.figure import Figure

from planar.design.sweep_axes import Axis
from planar.design.sweep_rows import NUMBERS
from planar.errors import BriefError, Fault
from planar.report.line_plot import COLOURS, STYLES

PLOTTED = ("worst_reflection_db", "matched_percent", "gain_dbi", "board_area_cm2")
"""Columns that are plotted unless others are asked for."""
_NUMBER = re.compile(r"([+-]?[\d.]+(?:[eE][+-]?\d+)?)\s*(.*)")

Table = Sequence[Mapping[str, Any]]


def check_plots(quantities: Sequence[str]) -> None:
    """Raise `BriefError` for a quantity no row can have: dimensions and line impedances depend on the family."""
    wrong = [name for name in quantities if name not in NUMBERS and not name.endswith(("_mm", "_ohm"))]
    right = f"one of {', '.join(NUMBERS)}, a dimension such as loop_width_mm, a line such as transformer_ohm"
    if wrong:
        raise BriefError([Fault("command line", "--plot", name, right) for name in wrong])


def write_sweep_plots(axes: Sequence[Axis], table: Table, folder: Path, quantities: Sequence[str]) -> None:
    """Write `<quantity>.svg` into `folder` for each of `quantities` that any row has a number for."""
    numeric = {name for row in table for name, value in row.items() if isinstance(value, int | float)} - {"row"}
    for name in quantities:
        if name in numeric:
            _write(axes, table, name, folder / f"{name}.svg")


def _write(axes: Sequence[Axis], table: Table, quantity: str, path: Path) -> None:
    figure = Figure(figsize=(7.5, 5.0), layout="constrained")
    plot = figure.add_subplot()
    along = next((axis for axis in axes if _numbers(axis) is not None), axes[0])
    others = [axis for axis in axes if axis is not along]
    curves: dict[str, list[tuple[str, float]]] = defaultdict(list)
    for row in table:
        if isinstance(row.get(quantity), int | float):
            label = ", ".join(f"{axis.key.split('.')[-1]} {row[axis.key]}" for axis in others)
            curves[label].append((row[along.key], row[quantity]))
    _draw(plot, along, curves)
    plot.set_ylabel(_named(quantity))
    if others:
        plot.legend(frameon=False, fontsize=8)
    plot.grid(True, linewidth=0.4, color="#c8c8c8")
    # a fixed salt and no date: two runs write the same bytes
    with mpl.rc_context({"svg.hashsalt": "planar", "svg.fonttype": "path"}):
        FigureCanvasSVG(figure).print_svg(os.fspath(path), metadata={"Date": None})  # type: ignore[no-untyped-call]


def _draw(plot: Axes, along: Axis, curves: Mapping[str, Sequence[tuple[str, float]]]) -> None:
    """Curves over numbers where the axis has them, over its texts in their order where it has none."""
    numbers = _numbers(along)
    places = numbers[0] if numbers else {text: float(i) for i, text in enumerate(along.texts)}
    for i, (label, points) in enumerate(curves.items()):
        drawn = sorted((places[text], value) for text, value in points)
        style, colour = STYLES[i // len(COLOURS) % len(STYLES)], COLOURS[i % len(COLOURS)]
        x, y = zip(*drawn, strict=True)
        plot.plot(x, y, style, color=colour, marker="o", markersize=3, label=label)
    if numbers is None:
        plot.set_xticks(range(len(along.texts)), along.texts, rotation=30, ha="right")
    plot.set_xlabel(along.key + (f" ({numbers[1]})" if numbers and numbers[1] else ""))


def _numbers(axis: Axis) -> tuple[dict[str, float], str] | None:
    """Text -> number and their common unit; None unless every value is a number with the same unit."""
    found = [_NUMBER.fullmatch(text) for text in axis.texts]
    units = {match[2] for match in found if match}
    if not all(found) or len(units) != 1:
        return None
    return {text: float(match[1]) for text, match in zip(axis.texts, found, strict=True) if match}, units.pop()


def _named(quantity: str) -> str:
    """A column name as a person writes it: gain (dBi)."""
    units = {"db": "dB", "dbi": "dBi", "mhz": "MHz", "mm": "mm", "cm2": "cm2", "ohm": "ohm", "percent": "%"}
    name, _, unit = quantity.rpartition("_")
    return f"{name.replace('_', ' ')} ({units[unit]})" if unit in units else quantity.replace("_", " ")

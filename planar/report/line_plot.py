"""Trace width against impedance, one curve per laminate and height, as an SVG that is the same twice."""

from __future__ import annotations

import os
from collections import defaultdict
from collections.abc import Iterable
from pathlib import Path

import matplotlib as mpl
from matplotlib.backends.backend_svg import FigureCanvasSVG
from matplotlib.figure import Figure

from planar.design.line_table import LineRow
from planar.errors import HandoffError

STYLES = ("-", "--", "-.", ":")
COLOURS = ("#1f6f8b", "#b5541c", "#5b7f2b", "#7a4b94", "#8a6d00", "#3c3c3c")
"""A palette of our own, told apart without colour vision by the line styles that go with it."""


def write_line_plot(rows: Iterable[LineRow], path: Path) -> None:
    """Write an SVG of width over impedance. Rows without a width are left out.

    Raises `HandoffError` when no row has a width, for another suffix than .svg, or when it cannot be written.
    """
    if path.suffix.lower() != ".svg":
        raise HandoffError(f"{path}: the plot is an SVG, name it with .svg")
    curves: dict[tuple[str, float], list[tuple[float, float]]] = defaultdict(list)
    for row in rows:
        if row.width_mm is not None:
            curves[(row.laminate, row.height_mm)].append((row.impedance_ohm, row.width_mm))
    if not curves:
        raise HandoffError("no line has a width: there is nothing to plot")
    figure = Figure(figsize=(7.5, 5.0), layout="constrained")
    axes = figure.add_subplot()
    for i, ((laminate, height), points) in enumerate(sorted(curves.items())):
        ohm, width = zip(*sorted(points), strict=True)
        style, colour = STYLES[i // len(COLOURS) % len(STYLES)], COLOURS[i % len(COLOURS)]
        axes.plot(ohm, width, style, color=colour, marker="o", markersize=3, label=f"{laminate}, {height:g} mm")
    axes.set_xlabel("impedance (ohm)")
    axes.set_ylabel("trace width (mm)")
    axes.set_yscale("log")
    axes.legend(frameon=False, fontsize=8)
    axes.grid(True, which="both", linewidth=0.4, color="#c8c8c8")
    # a fixed salt and no date: two runs write the same bytes
    with mpl.rc_context({"svg.hashsalt": "planar", "svg.fonttype": "path"}):
        try:
            FigureCanvasSVG(figure).print_svg(os.fspath(path), metadata={"Date": None})  # type: ignore[no-untyped-call]
        except OSError as error:
            raise HandoffError(f"cannot write {path}: {error.strerror}") from error

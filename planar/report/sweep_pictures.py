"""One quantity of a sweep as a small plot, a point for each row and a curve for each setting of the other axes.

The same drawing stands on the page, beside others and with one legend for all, and in a file of its own with the legend
beside it. Where a row has no number its curve is broken.
"""

from __future__ import annotations

import math
from collections.abc import Iterator, Mapping, Sequence
from typing import Any

import numpy as np

from planar.design.sweep_axes import Axis
from planar.report.page_palette import PALETTE
from planar.report.plots_axes import (
    BELOW,
    DASHES,
    MARKERS,
    RIGHT,
    SIZE,
    Panel,
    Stroke,
    hovers,
    legend,
    line,
    number,
    round_ticks,
    swatch,
)
from planar.report.plots_axes import Axis as Scale
from planar.report.svg import Box, Lettering, element, group, svg_document, text, text_width
from planar.report.sweep_columns import Quantity, is_number, quantity
from planar.report.sweep_curves import Curves, Look, Setting, sweep_curves

Table = Sequence[Mapping[str, Any]]

WIDTH, PANEL, LEFT = 330.0, 190.0, 64.0
"""Width of a plot, height of its panel, what is left of that, px: three stand beside each other on the page, one on a
phone."""
ALONE = 1.6
"""How much larger it is shown as a file of its own."""
ASKED = Stroke("asked", 1.8, "dashed")
MOST_MARKED = 200
"""Rows beyond which a point is a dot and says nothing on hovering, so that the page stays small."""
LETTERS = 18
"""Letters of a category that have room below its place."""
SLANT = 50.0
"""Degrees, of words that have no room side by side."""
LEAST_SPAN = 0.05
"""Of the middle value: a scale shows at least this much to either side, so that what hardly changes looks so."""

Points = dict[Setting, list[tuple[float, float, str]]]


def sweep_plot(axes: Sequence[Axis], table: Table, column: str, asked: float | None = None) -> str:
    """SVG of `column` of the `table` without a legend, with a line at what is `asked`. The column has a number."""
    return _document(axes, table, quantity(column), asked, alone=False)


def sweep_plot_alone(axes: Sequence[Axis], table: Table, column: str, asked: float | None = None) -> str:
    """The same with its legend beside it and larger: a file of its own."""
    return _document(axes, table, quantity(column), asked, alone=True)


def legend_entries(curves: Curves) -> list[tuple[str, str]]:
    """Symbol, from (0, 0) to (26, 0) px, and words of every entry of the legend."""
    return [(_symbol(look, curves.unit is not None), words) for look, words in curves.legend]


def asked_symbol() -> str:
    """The symbol of what is asked, as in `legend_entries`."""
    return swatch(ASKED)


def _document(axes: Sequence[Axis], table: Table, shown: Quantity, asked: float | None, *, alone: bool) -> str:
    curves = sweep_curves(axes)
    points = _points(curves, table, shown)
    panel = _panel(12.0, curves, _scale(points, shown, asked))
    marks, depth = _categories(panel, curves) if curves.unit is None else ([], BELOW)
    body = [*panel.frame(), *marks]
    body += [panel.level(asked, ASKED)] if asked is not None else []
    marked = len(table) <= MOST_MARKED
    for setting, along in points.items():
        body += _curve(panel, curves.looks[setting], along, joined=curves.unit is not None, marked=marked)
    if marked:
        every = [point for along in points.values() for point in along if not math.isnan(point[1])]
        spots = np.array([(float(panel.across(x)), float(panel.down(y))) for x, y, _ in every])
        body += hovers(spots, [words for _, _, words in every])
    view, scale = Box(0.0, 0.0, WIDTH, panel.box.y1 + depth), 1.0
    if alone:
        beside, reach = _legend(curves, shown, asked)
        body, view, scale = [*body, beside], view.joined(reach), ALONE
    size = (f"{scale * view.width:.0f}", f"{scale * view.height:.0f}")
    return svg_document(view, size, plot_words(table, shown, curves), body)


def plot_words(table: Table, shown: Quantity, curves: Curves) -> tuple[str, str]:
    """Title, and what a reader who cannot see the plot is told: what is drawn, where it is lowest and highest."""
    found = sorted((row[shown.column], row["row"]) for row in table if is_number(row.get(shown.column)))
    (low, first), (high, last) = found[0], found[-1]
    count = len(curves.looks)
    many = f", {count} curves, one a setting of {' and '.join(axis.key for axis in curves.others)}" if count > 1 else ""
    ends = f"Lowest {shown.written(low)} in row {first}, highest {shown.written(high)} in row {last}."
    return shown.title, f"{shown.titled} over {curves.along.key}{many}. {ends}"


def _legend(curves: Curves, shown: Quantity, asked: float | None) -> tuple[str, Box]:
    """The legend right of a plot of its own, an entry a line, and the room it takes."""
    entries = legend_entries(curves)
    if asked is not None:
        entries.append((asked_symbol(), f"asked {number(asked)} {shown.unit}".rstrip()))
    by = [text((8.0, SIZE + 2.0), curves.named_by, Lettering(SIZE, colour="muted"))] if curves.legend else []
    parts, bottom = legend(entries, 1.5 * SIZE if by else 0.0, width=0.0)
    widest = max((text_width(words, SIZE) for words in (curves.named_by, *(each for _, each in entries))), default=0.0)
    drawn = group("legend", {"transform": f"translate({WIDTH:.0f} 0)"}, [*by, *parts])
    return drawn, Box(0.0, 0.0, WIDTH + (50.0 + widest if entries else 0.0), bottom)


def _points(curves: Curves, table: Table, shown: Quantity) -> Points:
    """Place, value (NaN where a row has none) and words of every row, curve by curve from left to right.

    Over words the curves stand beside each other, so that none hides another.
    """
    points: Points = {setting: [] for setting in curves.looks}
    beside = {setting: _beside(curves, i) for i, setting in enumerate(curves.looks)}
    for row in table:
        setting = tuple(str(row[axis.key]) for axis in curves.others)
        place, value = curves.places[row[curves.along.key]], row.get(shown.column)
        told = ", ".join(str(row[axis.key]) for axis in (curves.along, *curves.others))
        words = f"row {row['row']}: {told}: {shown.written(value)} {shown.unit}".rstrip() if is_number(value) else ""
        points[setting].append((place + beside[setting], float(value) if is_number(value) else math.nan, words))
    return {setting: sorted(along, key=lambda point: point[0]) for setting, along in points.items()}


def _beside(curves: Curves, i: int) -> float:
    count = len(curves.looks)
    return 0.0 if curves.unit is not None else 0.6 * ((i + 0.5) / count - 0.5)


def _panel(top: float, curves: Curves, down: Scale) -> Panel:
    box = Box(LEFT, top, WIDTH - RIGHT, top + PANEL)
    low, high = min(curves.places.values()), max(curves.places.values())
    if curves.unit is None:
        return Panel(box, Scale(low - 0.5, high + 0.5, (), ""), down)
    pad = 0.05 * (high - low) or max(0.1 * abs(high), 0.1)
    low, high = low - pad, high + pad
    name = f"{curves.along.key} ({curves.unit})" if curves.unit else curves.along.key
    return Panel(box, Scale(low, high, round_ticks(low, high, 5), name), down)


def _scale(points: Points, shown: Quantity, asked: float | None) -> Scale:
    values = [value for along in points.values() for _, value, _ in along if not math.isnan(value)]
    values += [asked] if asked is not None else []
    middle = 0.5 * (min(values) + max(values))
    half = max(0.55 * (max(values) - min(values)), LEAST_SPAN * abs(middle)) or 1.0
    low, high = middle - half, middle + half
    ticks = round_ticks(low, high, 5)
    step = ticks[1] - ticks[0] if len(ticks) > 1 else 2.0 * half
    low, high = step * math.floor(low / step + 1e-9), step * math.ceil(high / step - 1e-9)
    if min(values) >= 0.0:
        low = max(low, 0.0)
    if shown.unit == "%" and max(values) <= 100.0:
        high = min(high, 100.0)
    return Scale(low, high, round_ticks(low, high, 6), shown.titled)


def _categories(panel: Panel, curves: Curves) -> tuple[list[str], float]:
    """Words below the panel at the places of an axis without numbers, slanted where they have no room, and how far
    they reach, px. Where there are too many every second, third ... is named."""
    box, names = panel.box, list(curves.places)
    short = [name if len(name) <= LETTERS else f"{name[: LETTERS - 1]}\N{HORIZONTAL ELLIPSIS}" for name in names]
    every = math.ceil(1.3 * SIZE * len(names) / box.width)
    widths = [text_width(name, SIZE) for name in short]
    level = max(widths) < box.width / len(names)
    reach = 22.0 if level else 12.0 + math.sin(math.radians(SLANT)) * max(widths)
    parts = [
        line((at, box.y0), (at, box.y1), Stroke("grid", 0.7))
        for at in (float(panel.across(i + 0.5)) for i in range(len(names) - 1))
    ]
    for i in range(0, len(names), every):
        at = float(panel.across(curves.places[names[i]]))
        if level:
            parts.append(text((at, box.y1 + 17.0), short[i], Lettering(SIZE, "middle", "muted")))
            continue
        turn = f"translate({at + 4.0:.1f} {box.y1 + 14.0:.1f}) rotate({-SLANT:g})"
        parts.append(element("g", {"transform": turn}, text((0.0, 0.0), short[i], Lettering(SIZE, "end", "muted"))))
    middle = 0.5 * (box.x0 + box.x1)
    parts.append(text((middle, box.y1 + reach + SIZE), curves.along.key, Lettering(SIZE, "middle")))
    return parts, reach + 1.5 * SIZE


def _curve(
    panel: Panel, look: Look, along: Sequence[tuple[float, float, str]], *, joined: bool, marked: bool
) -> Iterator[str]:
    """Line and points of a curve."""
    spots = [(float(panel.across(x)), float(panel.down(y)), math.isnan(y)) for x, y, _ in along]
    colour = _accent(look)
    if joined:
        words, pen = "", "M"
        for x, y, gone in spots:
            words, pen = (words, "M") if gone else (f"{words}{pen}{x:.1f} {y:.1f}", "L")
        if "L" in words:
            yield _drawn(words, look)
    there = [(x, y) for x, y, gone in spots if not gone]
    if there and marked:
        yield _mark(there, look)
    elif there:
        dots = "".join(f"M{x:.1f} {y:.1f}h0" for x, y in there)
        yield element("path", {"d": dots, "stroke": colour, "stroke-width": 4.0, "stroke-linecap": "round"})


def _mark(spots: Sequence[tuple[float, float]], look: Look) -> str:
    """The marks of a curve as one path."""
    corners = [[(x + 3.8 * u, y + 3.8 * v) for u, v in MARKERS[look.mark]] for x, y in spots]
    words = "".join("M" + "L".join(f"{x:.1f} {y:.1f}" for x, y in each) + "Z" for each in corners)
    ground = f"var(--paper, {PALETTE['paper'][0]})"
    return element("path", {"d": words, "fill": ground, "stroke": _accent(look), "stroke-width": 1.6})


def _symbol(look: Look, joined: bool) -> str:
    return (_drawn("M0 0L26 0", look) if joined else "") + _mark([(13.0, 0.0)], look)


def _drawn(path: str, look: Look) -> str:
    """A line along `path`."""
    style: dict[str, str | float] = {"d": path, "fill": "none", "stroke": _accent(look), "stroke-width": look.width}
    return element("path", style | ({"stroke-dasharray": DASHES[look.dash]} if DASHES[look.dash] else {}))


def _accent(look: Look) -> str:
    name = f"accent-{look.accent}"
    return f"var(--{name}, {PALETTE[name][0]})"

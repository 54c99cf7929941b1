"""One copper level on a sheet, seen from the top: copper, board, holes, keepout, dimensions, scale bar, drill table.

The figure is true size where it fits, otherwise at the largest reducing scale of ISO 5455 that does. Below it stand
the scale bar, where the origin lies, what each line means and the table of drills.
"""

from __future__ import annotations

import math
from collections.abc import Iterator, Sequence
from dataclasses import dataclass

from planar.copper.arc import Point
from planar.copper.layout import Layout, Level, bounds_of
from planar.copper.shapes import circle
from planar.errors import HandoffError
from planar.handoff.content import scale_bar_length
from planar.handoff.drill_file import drill_tools
from planar.handoff.paper import BLACK, BOLD, PLAIN, Paper, Pen, View, text_width

A4 = (210.0, 297.0)
REDUCTIONS = (1, 2, 5, 10, 20, 50)
"""The figure is one to this many (ISO 5455, reduction scales)."""
COPPER = {Level.TOP: "#e2ab7c", Level.BOTTOM: "#93c0cc"}
"""Fill of the copper by level, pale enough for lines and letters on top of it."""
_DIMENSION_ROOM = 13.0
_HEAD_ROOM = 4.0
_ROW = 4.6
_SMALL, _LETTER = 7.0, 6.5
_LETTER_ROOM = 7.0
_EDGE = Pen(0.35)
_KEEPOUT = Pen(0.9, "#e88b99", None, (2.5, 1.2))
_BEYOND = Pen(0.15, "#5a5f66", None, (0.8, 0.6))
_OPENING = Pen(0.2, "#8a6d00", None, (0.4, 0.4))
_THIN = Pen(0.13)
_HOLE = Pen(0.15, BLACK, "#ffffff")
_COLUMNS = (12.0, 14.0, 30.0, 24.0, 24.0, 40.0)
_HEAD = ("drill", "count", "finished diameter", "tolerance", "plating", "function")
_FUNCTIONS = {
    "ViaDrill": "via",
    "ComponentDrill": "soldered leg of a part",
    "MechanicalDrill": "mounting hole",
}


@dataclass(frozen=True)
class Figure:
    """How a level is drawn: page `size` and `margin` outside the frame (mm), one to `reduction`."""

    size: tuple[float, float]
    margin: float
    reduction: int

    @property
    def scale_text(self) -> str:
        """The scale as a drawing states it."""
        return f"1:{self.reduction}"


@dataclass(frozen=True)
class DrillRow:
    """A row of the drill table: `letter` beside each hole at `centres` (m), finished `diameter` m."""

    letter: str
    diameter: float
    plated: bool
    function: str
    centres: tuple[Point, ...]


def drill_rows(layout: Layout) -> tuple[DrillRow, ...]:
    """Every tool of the two drill files with a letter, plated ones first, in the order of the files."""
    tools = [(plated, *tool) for plated in (True, False) for tool in drill_tools(layout, plated=plated)]
    return tuple(
        DrillRow(_letter(i), diameter, plated, function, tuple(hole.centre for hole in holes))
        for i, (plated, function, diameter, holes) in enumerate(tools)
    )


def _letter(index: int) -> str:
    return chr(ord("A") + index % 26) * (1 + index // 26)


def fitting_figure(layout: Layout, title_height: float, margin: float) -> Figure:
    """The largest figure that fits a sheet of A4, upright or across, above a title block of `title_height` mm.

    Raises `HandoffError` when the board is too large for the smallest scale.
    """
    x0, y0, x1, y1 = _extent(layout)
    below = _strip_height(layout) + title_height + 2.0 * margin + _DIMENSION_ROOM + _HEAD_ROOM
    for reduction in REDUCTIONS:
        for width, height in (A4, A4[::-1]):
            room_x, room_y = width - 2.0 * margin - _DIMENSION_ROOM - 4.0, height - below
            if 1e3 * (x1 - x0) / reduction <= room_x and 1e3 * (y1 - y0) / reduction <= room_y:
                return Figure((width, height), margin, reduction)
    raise HandoffError(f"the board is too large for a drawing on A4 at 1:{REDUCTIONS[-1]}")


def _extent(layout: Layout) -> tuple[float, float, float, float]:
    """x_min, y_min, x_max, y_max (m) of everything the figure shows."""
    return bounds_of([layout.edge, *layout.keepout, *(island.outline for island in layout.islands)])


def _strip_height(layout: Layout) -> float:
    """Height (mm) of what stands below the figure."""
    return 30.0 + _ROW * (1 + max(1, len(drill_rows(layout))))


def figure_view(layout: Layout, figure: Figure, base: float) -> View:
    """Where the board lies on the sheet when the strip below the figure begins `base` mm above its lower edge."""
    x0, y0, x1, y1 = _extent(layout)
    scale = 1.0 / figure.reduction
    floor = base + _strip_height(layout) + _DIMENSION_ROOM
    slack = figure.size[1] - floor - figure.margin - _HEAD_ROOM - 1e3 * scale * (y1 - y0)
    middle = 0.5 * (figure.size[0] + _DIMENSION_ROOM)
    origin_x = middle - 500.0 * scale * (x0 + x1)
    origin_y = floor + 0.5 * slack - 1e3 * scale * y0
    return View(scale, (origin_x, origin_y))


def draw_level(
    paper: Paper, layout: Layout, level: Level, *, figure: Figure, corner: Point, hole_tolerance: float
) -> None:
    """Draw `level` with its strip; `corner` (mm) is the lower left of the room for it, `hole_tolerance` in m."""
    view = figure_view(layout, figure, corner[1])
    paper.outlines(layout.copper(level), view, Pen(0.0, BLACK, COPPER[level]))
    paper.outlines([i.outline for i in layout.islands if i.level != level], view, _BEYOND)
    paper.outlines([m.outline for m in layout.mask_openings if m.level == level], view, _OPENING)
    paper.outlines(layout.keepout, view, _KEEPOUT)
    paper.outlines([layout.edge], view, _EDGE)  # often on the keepout's line: the thin line over the broad one
    _draw_holes(paper, layout, view)
    _draw_origin(paper, view)
    _draw_dimensions(paper, layout, view)
    top = corner[1] + _strip_height(layout)
    _draw_scale_bar(paper, layout, (corner[0], top - 9.0), figure)
    _draw_remarks(paper, layout, level, (corner[0], top - 14.5))
    _draw_drill_table(paper, layout, (corner[0], top - 28.0), hole_tolerance)


def _draw_holes(paper: Paper, layout: Layout, view: View) -> None:
    """Holes at their size; letters beside them toward the middle of the board, one for holes close together."""
    left, _, right, _ = layout.edge.bounds
    middle, _ = view.place((0.5 * (left + right), 0.0))
    for row in drill_rows(layout):
        radius = 500.0 * view.scale * row.diameter
        for centre in row.centres:
            paper.outlines([circle(centre, row.diameter)], view, _HOLE)
        for places in _clusters([view.place(centre) for centre in row.centres]):
            text = row.letter if len(places) == 1 else f"{len(places)}×{row.letter}"
            width = text_width(text, _LETTER, font=BOLD)
            y = sum(place[1] for place in places) / len(places) + 0.5
            inward = min(x for x, _ in places) < middle
            x = max(x for x, _ in places) + radius + 0.8 if inward else min(x for x, _ in places) - radius - 0.8 - width
            paper.text((x, y), text, _LETTER, font=BOLD)


def _clusters(places: Sequence[Point]) -> list[list[Point]]:
    """`places` (mm) in groups whose members are nearer to another member than a letter needs."""
    groups: list[list[Point]] = []
    for place in places:
        near = [group for group in groups if any(math.dist(place, other) < _LETTER_ROOM for other in group)]
        groups = [group for group in groups if group not in near]
        groups.append([place, *(other for group in near for other in group)])
    return groups


def _draw_origin(paper: Paper, view: View) -> None:
    x, y = view.origin
    paper.lines([((x - 2.5, y), (x + 2.5, y)), ((x, y - 2.5), (x, y + 2.5))], _THIN)


def _draw_dimensions(paper: Paper, layout: Layout, view: View) -> None:
    """Width below and height left of everything drawn, measured on the board's edge."""
    x0, y0, x1, y1 = layout.edge.bounds
    left, low, _, _ = _extent(layout)
    (a, bottom), (b, top) = view.place((x0, y0)), view.place((x1, y1))
    line_x, line_y = view.place((left, low))
    line_x, line_y = line_x - 7.0, line_y - 7.0
    pairs = [((x, bottom - 1.0), (x, line_y - 1.5)) for x in (a, b)]
    pairs += [((a - 1.0, y), (line_x - 1.5, y)) for y in (bottom, top)]
    pairs += [((a, line_y), (b, line_y)), ((line_x, bottom), (line_x, top))]
    pairs += [line for x, s in ((a, 1.0), (b, -1.0)) for line in _arrow((x, line_y), (s, 0.0))]
    pairs += [line for y, s in ((bottom, 1.0), (top, -1.0)) for line in _arrow((line_x, y), (0.0, s))]
    paper.lines(pairs, _THIN)
    width, height = layout.size
    paper.text((0.5 * (a + b), line_y + 1.0), f"{1e3 * width:.3f}", 8.0, anchor="centre")
    paper.upright_text((line_x - 1.0, 0.5 * (bottom + top)), f"{1e3 * height:.3f}", 8.0)


def _arrow(tip: Point, along: Point) -> Iterator[tuple[Point, Point]]:
    (x, y), (ux, uy) = tip, along
    for side in (-0.6, 0.6):
        yield tip, (x + 2.2 * ux - side * uy, y + 2.2 * uy + side * ux)


def _draw_scale_bar(paper: Paper, layout: Layout, at: Point, figure: Figure) -> None:
    """Ten parts, black and white in turn, and what the whole measures."""
    board_mm = 1e3 * scale_bar_length(layout)
    part = 0.1 * board_mm / figure.reduction
    for i in range(10):
        paper.box((at[0] + i * part, at[1]), (part, 1.6), Pen(0.13, BLACK, BLACK if i % 2 else "#ffffff"))
    on_paper = f"{board_mm / figure.reduction:.0f} mm on paper printed at 100 %"
    paper.text((at[0] + 10.0 * part + 3.0, at[1] + 0.2), f"{board_mm:.0f} mm = {on_paper}", _SMALL)


def _draw_remarks(paper: Paper, layout: Layout, level: Level, at: Point) -> None:
    x0, y0, _, _ = layout.edge.bounds
    where = f"{-1e3 * x0:.3f} mm from the left and {-1e3 * y0:.3f} mm from the lower side of the board outline"
    paper.text(at, f"Cross: origin of every file and the feed, {where}. Dimensions in mm.", _SMALL)
    swatches = [(f"{level} copper", Pen(0.0, BLACK, COPPER[level])), ("board outline", _EDGE)]
    if len(layout.levels) > 1:
        swatches.append(("copper of the other level", _BEYOND))
    swatches.append(("mask opening", _OPENING))
    swatches.append(("keepout on every level: the antenna window", _KEEPOUT))
    x, y = at[0], at[1] - 5.0
    for text, pen in swatches:
        paper.box((x, y - 0.3), (5.0, 2.4), pen)
        paper.text((x + 6.6, y), text, _SMALL)
        x += 6.6 + text_width(text, _SMALL) + 4.0


def _draw_drill_table(paper: Paper, layout: Layout, at: Point, tolerance: float) -> None:
    rows = [
        (
            row.letter,
            str(len(row.centres)),
            f"{1e3 * row.diameter:.3f} mm",
            f"±{1e3 * tolerance:.3f} mm",
            "plated" if row.plated else "unplated",
            _FUNCTIONS[row.function],
        )
        for row in drill_rows(layout)
    ] or [("none", "0", "", "", "", "no hole on this board")]
    for i, cells in enumerate([_HEAD, *rows]):
        x, y = at[0], at[1] - _ROW * i
        for cell, width in zip(cells, _COLUMNS, strict=True):
            paper.text((x + 1.0, y + 1.3), cell, _SMALL, font=PLAIN if i else BOLD)
            x += width
        paper.lines([((at[0], y), (at[0] + sum(_COLUMNS), y))], _THIN)

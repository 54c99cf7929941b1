"""One level of a board at true scale: its copper as it is, a grid to read places from, and its dimensions named.

One unit of the picture is one millimetre and the picture says its size in mm, y downwards; the origin is the feed, all
views are from the top. Copper of the other level is a thin outline. On hovering, islands, pads, holes and gaps say what
they are. `beside` and `keyed` of `planar.report.callouts` are the two ways to place the dimensions.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, replace

from planar.copper.arc import Edge
from planar.copper.layout import Layout, Level, bounds_of
from planar.copper.outline import Outline
from planar.copper.path import Path
from planar.copper.shapes import circle
from planar.copper.svg_path import decimal
from planar.report.board_copper import board_copper, grid_ticks, picture_box, picture_point, port_mark
from planar.report.callouts import Callout, Placing, beside, keyed
from planar.report.details import Detail, detail_drawing, detail_place, details_of, place_box
from planar.report.dimension_marks import BoardMarks, Mark, millimetres
from planar.report.measured_lines import measured_line, over_copper
from planar.report.svg import (
    Box,
    Lettering,
    Point,
    group,
    pen,
    svg_document,
    text,
    text_width,
    wrapped,
)

LEAST_TEXT = 3.2
"""mm, font size on a board of usual size: 12 px at true scale."""
TEXT_SHARES: Mapping[Placing, float] = {beside: 0.0225, keyed: 0.048}
"""Font size over the width of a large board, so that the words stay legible when the picture is scaled to a page: about
12 px in a column of 900 px, and 11 px on a phone of 360 px."""
NARROWEST = 86.0
"""mm, least width of a picture with its words below: that of a phone's screen at true scale."""
LEAST_SHOWN = 70.0
"""mm, a narrower board is hard to read at true scale."""
FINE_GRID_BELOW = 60.0
"""mm, boards smaller than this have a grid of 5 mm, others one of 10 mm."""
NOTHING_TO_SAY = BoardMarks()


def board_picture(
    layout: Layout, level: Level, *, marks: BoardMarks = NOTHING_TO_SAY, placing: Placing = beside, scale: int = 1
) -> str:
    """Picture of `level` of a snapped `layout` with its `marks`, the words placed by `placing`: SVG text.

    One unit is 1 mm of board, shown `scale` mm large: 1 is true scale, more an enlargement that the picture states.
    """
    sheet = _sheet(layout, level, marks, (placing, scale))
    size, plan = sheet.size, sheet.plan
    callouts = [Callout(m.name, m.label, m.value, sheet.spot(m), sheet.lift(m)) for m in marks.dimensions]
    margins = placing(callouts, plan, size)
    extent = margins.extent.grown(0.5 * size)
    width = max(extent.width, NARROWEST / scale)
    words = wrapped(_caption(sheet), width - size, 0.9 * size)
    base = extent.y1 + 0.9 * size
    caption = [
        text((extent.x0 + 0.5 * size, base + 1.2 * i * size), line, Lettering(0.9 * size, "start", "muted"))
        for i, line in enumerate(words)
    ]
    view = Box(extent.x0, extent.y0, extent.x0 + width, base + 1.2 * (len(words) - 1) * size + 0.6 * size)
    body = [
        *_plan(sheet),
        *_windows(sheet),
        *margins.leaders,
        *_measured(sheet),
        group("callouts", {}, margins.words),
        group("caption", {}, caption),
    ]
    shown = (f"{decimal(scale * view.width)}mm", f"{decimal(scale * view.height)}mm")
    return svg_document(view, shown, (f"{layout.name}, {level} copper", _description(layout, level, marks)), body)


@dataclass(frozen=True)
class _Sheet:
    """What is drawn and how large: the `board`'s box in mm, font `size`, `pen` size, `grid` step, windows, `plan`."""

    layout: Layout
    level: Level
    marks: BoardMarks
    board: Box
    size: float
    grid: int
    scale: int
    details: tuple[Detail, ...]
    plan: Box

    @property
    def pen(self) -> float:
        """Size of arrow heads and frames over that of the letters' sheet: smaller on a small board."""
        return max(0.6 * self.size, min(self.size, 0.035 * self.board.width))

    @property
    def line(self) -> float:
        """Width of a thin line of the board, mm."""
        return 0.06 * self.size

    def detail(self, mark: Mark) -> Detail | None:
        """The window `mark` is drawn in."""
        return next((each for each in self.details if mark.name in each.names), None)

    def spot(self, mark: Mark) -> Point:
        """Where the callout of `mark` points."""
        at, detail = picture_point(mark.spot), self.detail(mark)
        return at if detail is None else detail.shown(at)

    def lift(self, mark: Mark) -> float:
        """How far above its spot a callout wants to be: a leader must not run along the line it points at."""
        if mark.measure is None:
            return 0.0
        (x0, y0), (x1, y1) = mark.measure.edges[0].start, mark.measure.edges[-1].end
        return 2.0 * self.size if abs(y1 - y0) < 0.2 * abs(x1 - x0) else 0.0


def _sheet(layout: Layout, level: Level, marks: BoardMarks, way: tuple[Placing, int]) -> _Sheet:
    placing, scale = way
    board = picture_box(bounds_of([layout.edge, *layout.keepout, *layout.copper(level)]))
    size = max(LEAST_TEXT / scale, TEXT_SHARES.get(placing, 0.0) * board.width)
    base = Box(board.x0 - 2.6 * size, board.y0 - 0.6 * size, board.x1 + 0.6 * size, board.y1 + 3.8 * size)
    details = details_of(marks.dimensions, base, size)
    plan = base
    for detail in details:
        plan = plan.joined(detail.box).joined(place_box(detail, size))
    grid = 5 if board.width < FINE_GRID_BELOW else 10
    return _Sheet(layout, level, marks, board, size, grid, scale, details, plan)


def _plan(sheet: _Sheet) -> list[str]:
    """The board, its axes and its size."""
    return [
        *board_copper(sheet.layout, sheet.level, (sheet.board, sheet.grid), sheet.line),
        *_axes(sheet.board, sheet.grid, sheet.size),
        *_board_size(sheet),
    ]


def _measured(sheet: _Sheet) -> list[str]:
    """What is measured at true scale, where the windows look, and the feed."""
    measured = [mark for mark in sheet.marks.dimensions if sheet.detail(mark) is None]
    return [
        *over_copper(sheet.marks, measured, sheet.pen),
        *(part for detail in sheet.details for part in detail_place(detail, sheet.size)),
        group("feed", pen("feed", 0.12 * sheet.pen), _feed(sheet)),
    ]


def _windows(sheet: _Sheet) -> list[str]:
    """The magnified windows."""
    drawn = []
    for detail in sheet.details:
        measured = [mark for mark in sheet.marks.dimensions if mark.name in detail.names]

        def inside(source: Box, size: float, measured: list[Mark] = measured) -> list[str]:
            near = _near(sheet.layout, source)
            return [
                *board_copper(near, sheet.level, (source, 1), 0.06 * size),
                *over_copper(sheet.marks, measured, size),
            ]

        drawn += detail_drawing(detail, sheet.size, inside)
    return [group("details", {}, drawn)]


def _near(layout: Layout, source: Box) -> Layout:
    """What of the `layout` may be seen in a window on `source`; nothing that would only hide the copper."""

    def seen(outline: Outline) -> bool:
        return source.overlaps(picture_box(outline.bounds))

    return replace(
        layout,
        islands=tuple(island for island in layout.islands if seen(island.outline)),
        holes=tuple(hole for hole in layout.holes if seen(circle(hole.centre, hole.diameter))),
        pads=(),
        mask_openings=(),
        keepout=(),
    )


def fitting_scale(layout: Layout) -> int:
    """The least enlargement of ISO 5455 that shows the board `LEAST_SHOWN` mm wide, 1 for one that is."""
    return next((s for s in (1, 2, 5) if 1e3 * s * layout.size[0] >= LEAST_SHOWN), 10)


def _caption(sheet: _Sheet) -> str:
    layout, level, grid = sheet.layout, sheet.level, sheet.grid
    through = ", through the board" if level is Level.BOTTOM else ""
    beyond = " Thin outline: copper of the other level." if len(layout.levels) > 1 else ""
    windows = " Windows: magnified, grid 1 mm." if sheet.details else ""
    width, height = layout.size
    return (
        f"{level.capitalize()} copper of a board of {millimetres(width)} by {millimetres(height)}, seen from the top"
        f"{through}. Scale {sheet.scale}:1, grid {grid} mm counted from the feed. Ticked border: keepout."
        f"{beyond}{windows}"
    )


def _description(layout: Layout, level: Level, marks: BoardMarks) -> str:
    dimensions = "; ".join(f"{mark.label} {mark.value}" for mark in marks.dimensions)
    islands = len(layout.copper(level))
    return (
        f"Drawing to scale of {islands} copper island{'s' * (islands != 1)}, {1e6 * layout.area(level):.1f} square mm, "
        f"on the {level} level, with {len(layout.holes)} holes. {dimensions}"
    )


def _axes(board: Box, grid: int, size: float) -> list[str]:
    """Numbers of the grid lines below and left of the board, in mm from the origin, upwards positive."""
    style = Lettering(0.78 * size, "middle", "muted")
    step = next(s for s in (grid, 10, 20, 50, 100) if s >= grid and s > text_width("-100", 0.78 * size))
    numbers = [text((x, board.y1 + 1.0 * size), _signed(x), style) for x in grid_ticks(board.x0, board.x1, step)]
    left = Lettering(0.78 * size, "end", "muted")
    numbers += [
        text((board.x0 - 0.35 * size, y + 0.25 * size), _signed(-y), left) for y in grid_ticks(board.y0, board.y1, step)
    ]
    return [group("axes", {}, numbers)]


def _signed(number: int) -> str:
    return str(number).replace("-", "\N{MINUS SIGN}")


def _board_size(sheet: _Sheet) -> list[str]:
    """The board's width below it, between arrow heads."""
    layout, board, size = sheet.layout, sheet.board, sheet.size
    x0, _, x1, _ = layout.edge.bounds
    low = -1e-3 * (board.y1 + 2.4 * size)
    measure = Mark("board width", "", "", (0.0, 0.0), Path((Edge((x0, low), (x1, low)),)))
    width, height = layout.size
    words = f"board {millimetres(width)} × {millimetres(height)}"
    below = text((500.0 * (x0 + x1), board.y1 + 3.3 * size), words, Lettering(0.92 * size, "middle", "ink", bold=True))
    return [*measured_line(measure, sheet.pen), below]


def _feed(sheet: _Sheet) -> list[str]:
    """A ring with four ticks round each port of the level."""
    ports = [port for port in sheet.layout.ports if port.level == sheet.level]
    return [part for port in ports for part in port_mark(port)]

"""One copper level on a sheet, seen from the top: copper, board, holes, keepout, dimensions, and below it what explains
it; and for a panel the array by itself.

The figure has the largest scale of ISO 5455 that fits a sheet of A4, up to five times true size.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from planar.copper.arc import Point
from planar.copper.boolean import contains
from planar.copper.layout import Layout, Level, Role
from planar.copper.outline import Outline
from planar.errors import HandoffError
from planar.handoff import drawing_pens as pens
from planar.handoff.corridor import open_ways
from planar.handoff.drawing_dimensions import HEAD_ROOM, dimension_room, draw_dimensions, extent
from planar.handoff.drawing_holes import draw_holes, draw_letters
from planar.handoff.drawing_strip import Key, Strip
from planar.handoff.kind_words import KIND_WORDS
from planar.handoff.net_tie import net_ties
from planar.handoff.paper import BLACK, BOLD, Paper, Pen, View, text_width

A4 = (210.0, 297.0)
SCALES = {"5:1": 5.0, "2:1": 2.0, "1:1": 1.0, "1:2": 0.5, "1:5": 0.2, "1:10": 0.1, "1:20": 0.05, "1:50": 0.02}
"""Scales of a figure (ISO 5455: enlargement, full size, reduction), the largest first."""
_PAPER = Pen(0.0, BLACK, "#ffffff")


@dataclass(frozen=True)
class Sheet:
    """What a sheet shows of a `layout`: a copper `level`, None for the array; `hole_tolerance` in m."""

    layout: Layout
    level: Level | None
    hole_tolerance: float

    @property
    def title(self) -> str:
        """What the title block calls it."""
        return f"{'array' if self.level is None else f'{self.level} copper'}, seen from the top"

    @property
    def key(self) -> Key:
        """What each line and fill means; nothing that is not drawn."""
        return _array_key(self.layout) if self.level is None else _level_key(self.layout, self.level)


@dataclass(frozen=True)
class Figure:
    """How a figure is drawn: page `size` and `margin` outside the frame (mm), name of its scale, see `SCALES`."""

    size: tuple[float, float]
    margin: float
    scale_text: str

    @property
    def scale(self) -> float:
        """1 is true size."""
        return SCALES[self.scale_text]

    def strip(self, sheet: Sheet) -> Strip:
        """What stands below the figure."""
        width = self.size[0] - 2.0 * self.margin - 6.0
        return Strip(sheet.layout, sheet.key, self.scale, width, sheet.hole_tolerance)


def fitting_figure(sheets: Sequence[Sheet], title_height: float, margin: float) -> Figure:
    """The largest figure that fits a sheet of A4, upright or across, above a title block of `title_height` mm, on every
    one of the `sheets` of a layout.

    Raises `HandoffError` when the board is too large for the smallest scale.
    """
    layout = sheets[0].layout
    x0, y0, x1, y1 = extent(layout)
    room = dimension_room(layout)
    for text, scale in SCALES.items():
        for size in (A4, A4[::-1]):
            figure = Figure(size, margin, text)
            strip = max(figure.strip(sheet).height for sheet in sheets)
            room_x = size[0] - 2.0 * margin - room - 4.0
            room_y = size[1] - strip - title_height - 2.0 * margin - room - HEAD_ROOM
            if 1e3 * (x1 - x0) * scale <= room_x and 1e3 * (y1 - y0) * scale <= room_y:
                return figure
    raise HandoffError(f"the board is too large for a drawing on A4 at {list(SCALES)[-1]}")


def figure_view(layout: Layout, figure: Figure, floor: float) -> View:
    """Where the board lies on the sheet when what stands below the figure ends `floor` mm above the sheet's edge."""
    x0, y0, x1, y1 = extent(layout)
    room = dimension_room(layout)
    slack = figure.size[1] - floor - room - figure.margin - HEAD_ROOM - 1e3 * figure.scale * (y1 - y0)
    middle = 0.5 * (figure.size[0] + room)
    origin_x = middle - 500.0 * figure.scale * (x0 + x1)
    origin_y = floor + room + 0.5 * slack - 1e3 * figure.scale * y0
    return View(figure.scale, (origin_x, origin_y))


def draw_figure(paper: Paper, sheet: Sheet, *, figure: Figure, corner: Point) -> None:
    """Draw a sheet's figure and what stands below it; `corner` (mm) is the lower left of the room for it."""
    strip = figure.strip(sheet)
    view = figure_view(sheet.layout, figure, corner[1] + strip.height)
    if sheet.level is None:
        _draw_array(paper, sheet.layout, view)
    else:
        _draw_level(paper, sheet.layout, sheet.level, view)
    _draw_origin(paper, view)
    draw_dimensions(paper, sheet.layout, view)
    strip.draw(paper, corner)


def _draw_level(paper: Paper, layout: Layout, level: Level, view: View) -> None:
    if layout.keepout:  # what keepout leaves open stays tinted
        paper.outlines(layout.boards or (layout.edge,), view, pens.CORRIDOR)
        paper.outlines(layout.keepout, view, _PAPER)
    paper.outlines(layout.copper(level), view, pens.copper_pen(level))
    paper.outlines(_beyond(layout, level), view, pens.BEYOND)
    paper.outlines(_openings(layout, level), view, pens.OPENING)
    paper.outlines(layout.keepout, view, pens.KEEPOUT, inside=True)
    paper.outlines([layout.edge], view, pens.EDGE)
    _draw_cuts(paper, layout, view)
    ties = _ties(layout)
    paper.outlines(ties, view, pens.TIE)
    draw_holes(paper, layout, view)
    if not layout.boards:  # the letters of a panel stand on the sheet of the array
        islands = (island.outline for island in layout.islands)
        draw_letters(paper, layout, view, (*islands, layout.edge, *layout.keepout, *ties, *_openings(layout, level)))


def _draw_array(paper: Paper, layout: Layout, view: View) -> None:
    """A panel without its boards' copper: boards with their parts, cutouts, scores, holes, what cameras look for."""
    paper.outlines([layout.edge], view, pens.EDGE)
    paper.outlines(layout.boards, view, pens.FLOOR)
    _draw_cuts(paper, layout, view)
    discs = [island.outline for island in layout.islands if island.role in (Role.FIDUCIAL, Role.MARK)]
    paper.outlines(discs, view, pens.DISC)
    draw_holes(paper, layout, view)
    texts = []
    for board in layout.boards:
        x0, y0, x1, y1 = board.bounds
        x, y = view.place((0.5 * (x0 + x1), 0.5 * (y0 + y1)))
        parts = ", ".join(_parts_on(board, layout))
        paper.text((x, y - 1.0), parts, 8.0, font=BOLD, anchor="centre")
        half = 0.5 * text_width(parts, 8.0, font=BOLD)
        texts.append((x - half, y - 1.0, x + half, y + 1.5))
    draw_letters(paper, layout, view, (layout.edge, *layout.cutouts, *layout.boards, *discs), texts=texts)


def _beyond(layout: Layout, level: Level) -> list[Outline]:
    return [island.outline for island in layout.islands if island.level != level]


def _openings(layout: Layout, level: Level) -> list[Outline]:
    return [marking.outline for marking in layout.mask_openings if marking.level == level]


def _ties(layout: Layout) -> list[Outline]:
    """Round each hole in which signal and return meet, along each island that is both."""
    ties = net_ties(layout)
    return [outline for tie in ties for outline in ([tie.outline] if tie.hole else [i.outline for i in tie.islands])]


def _parts_on(board: Outline, layout: Layout) -> list[str]:
    """Designators of the etched parts on a board, in the layout's order."""
    antennas = [island for island in layout.islands if island.role is Role.RADIATOR]
    return list(dict.fromkeys(i.part for i in antennas if contains(board, i.outline.edges[0].start)))


def _draw_cuts(paper: Paper, layout: Layout, view: View) -> None:
    """Cutouts, outlines of the boards in a panel, score lines."""
    paper.outlines(layout.boards, view, pens.BOARD)
    paper.outlines(layout.cutouts, view, pens.CUTOUT)
    if layout.scores:
        paper.lines([(view.place(score.start), view.place(score.end)) for score in layout.scores], pens.SCORE)


def _draw_origin(paper: Paper, view: View) -> None:
    x, y = view.origin
    paper.lines([((x - 2.5, y), (x + 2.5, y)), ((x, y - 2.5), (x, y + 2.5))], pens.THIN)


def _level_key(layout: Layout, level: Level) -> Key:
    entries = [
        (layout.copper(level), f"{level} copper", pens.copper_pen(level)),
        ([layout.edge], f"{KIND_WORDS[layout.kind].thing} outline", pens.EDGE),
        (_beyond(layout, level), "copper of the other level", pens.BEYOND),
        (_openings(layout, level), "mask opening", pens.OPENING),
        (layout.keepout, "keepout on every level: the antenna window", pens.KEEPOUT),
        (layout.keepout and open_ways(layout), "open for the feed", pens.CORRIDOR),
        (_ties(layout), "signal meets return here, intended", pens.TIE),
    ]
    return [(text, pen) for drawn, text, pen in entries if drawn] + _cut_key(layout)


def _array_key(layout: Layout) -> Key:
    discs = any(island.role in (Role.FIDUCIAL, Role.MARK) for island in layout.islands)
    marks = [("fiducial or mark", pens.DISC)] if discs else []
    return [("board", pens.FLOOR), ("panel outline", pens.EDGE), *marks, *_cut_key(layout)]


def _cut_key(layout: Layout) -> list[tuple[str, Pen]]:
    entries = [
        (layout.cutouts, "cutout", pens.CUTOUT),
        (layout.boards, "outline of a board", pens.BOARD),
        (layout.scores, "score line", pens.SCORE),
    ]
    return [(text, pen) for drawn, text, pen in entries if drawn]

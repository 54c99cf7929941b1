"""What goes and what stays on a trim drawing: its pens, its hatching, and an enlarged detail with dimensions."""

from __future__ import annotations

import math
from collections.abc import Iterator, Sequence
from dataclasses import dataclass, replace

from shapely import affinity
from shapely.geometry import LineString, MultiLineString, Polygon, box
from shapely.geometry.base import BaseGeometry
from shapely.ops import unary_union

from planar.copper.arc import Point
from planar.copper.cut_off import CutMark
from planar.copper.outline import Outline
from planar.handoff.canvas import Canvas
from planar.handoff.paper import BLACK, BOLD, Pen, View, text_width

COPPER = Pen(0.0, BLACK, "#e8d3bd")
REST, FIRST = Pen(0.0, BLACK, "#f6b8ae"), Pen(0.0, BLACK, "#d8402f")
_HATCH = Pen(0.12, "#5c0f08")
_FRAME, _DIMENSION, _THROUGH = Pen(0.25), Pen(0.18), Pen(0.09)
SCALES = (50.0, 20.0, 10.0, 5.0, 2.0, 1.0)
"""Of a detail (ISO 5455), the largest first."""
_PITCH = 1.1
"""mm between hatching lines."""
_LONGEST = 15.0
"""mm, a whole cut in the detail."""
_PAD, _TITLE = 2.0, 6.0
_OVER = 3.0
"""mm by which a dimension's line goes on beyond what it measures."""
_SMALL = 7.5


@dataclass(frozen=True, eq=False)
class Marked:
    """Copper of a level and what goes of it, at first and in all, as seen from its side: `side` is 1 from the top, -1
    from the bottom, by which `marks` of the layout are mirrored."""

    copper: Sequence[Outline]
    first: Sequence[Outline]
    whole: Sequence[Outline]
    laid: Sequence[CutMark]
    side: float

    @property
    def marks(self) -> list[CutMark]:
        """Where the cut is dimensioned, as seen from the side that is cut."""
        return [
            replace(each, start=self._seen(each.start), along=self._seen(each.along), aside=self._seen(each.aside))
            for each in self.laid
        ]

    def _seen(self, point: Point) -> Point:
        return self.side * point[0], point[1]


def hatched(paper: Canvas, marked: Marked, view: View) -> None:
    """Hatch what goes: one way, and both ways where it goes at first."""
    _hatch(paper, _placed(marked.whole, view), 1.0)
    _hatch(paper, _placed(marked.first, view), -1.0)


def draw_detail(paper: Canvas, marked: Marked, place: tuple[Point, Point], labels: tuple[str, str]) -> None:
    """The first of the marks enlarged in the box at `place` (corner, size in mm), with `labels` for the first cut and
    the whole one."""
    corner, size = place
    mark = marked.marks[0]
    scale = next((each for each in SCALES if 1e3 * mark.whole * each <= _LONGEST), SCALES[-1])
    middle = corner[0] + 0.5 * size[0], corner[1] + 0.5 * (size[1] - _TITLE)
    x, y = (m - 1e3 * scale * c for m, c in zip(middle, mark.start, strict=True))
    view = View(scale, (x, y))
    window = box(corner[0], corner[1], corner[0] + size[0], corner[1] + size[1] - _TITLE)
    for outlines, pen in ((marked.copper, COPPER), (marked.whole, REST), (marked.first, FIRST)):
        _fill(paper, _placed(outlines, view).intersection(window), pen)
    _hatch(paper, _placed(marked.whole, view).intersection(window), 1.0)
    _hatch(paper, _placed(marked.first, view).intersection(window), -1.0)
    paper.box(corner, (size[0], size[1] - _TITLE), _FRAME)
    paper.text((corner[0], corner[1] + size[1] - _TITLE + 1.5), f"A, {scale:g}:1", 9.0, font=BOLD)
    _draw_key(paper, (corner[0] + 18.0, corner[1] + size[1] - _TITLE + 1.5))
    apart = 9.0 if abs(mark.along[0]) > abs(mark.along[1]) else 19.0  # side by side two labels need more room
    for length, offset, label in ((mark.first, apart, labels[0]), (mark.whole, -apart, labels[1])):
        if length > 0.0:
            _draw_dimension(paper, (middle, mark.along), (1e3 * scale * length, offset), (label, window))


def _draw_key(paper: Canvas, at: Point) -> None:
    x, y = at
    for words, pen, slopes in (("goes at first", FIRST, (1.0, -1.0)), ("later, if needed", REST, (1.0,))):
        paper.box((x, y - 0.3), (5.0, 2.8), pen)
        for slope in slopes:
            _hatch(paper, box(x, y - 0.3, x + 5.0, y + 2.5), slope)
        paper.text((x + 6.2, y), words, _SMALL)
        x += 6.2 + text_width(words, _SMALL) + 4.0


def _draw_dimension(
    paper: Canvas, at: tuple[Point, Point], measured: tuple[float, float], named: tuple[str, Polygon]
) -> None:
    """From `at` (place and way) `measured` (length, how far aside) mm, with a label kept inside a window."""
    (x, y), (ux, uy) = at
    length, offset = measured
    foot = (x - offset * uy, y + offset * ux)
    tips = [foot, (foot[0] + length * ux, foot[1] + length * uy)]
    reach = math.copysign(2.0, offset)
    across = [((tx + offset * uy, ty - offset * ux), (tx - reach * uy, ty + reach * ux)) for tx, ty in tips]
    run = [((foot[0] - _OVER * ux, foot[1] - _OVER * uy), (tips[1][0] + _OVER * ux, tips[1][1] + _OVER * uy))]
    sx, sy = 0.9 * (ux + uy), 0.9 * (uy - ux)
    slashes = [((tx - sx, ty - sy), (tx + sx, ty + sy)) for tx, ty in tips]
    paper.lines(across, _THROUGH)
    paper.lines(run + slashes, _DIMENSION)
    label, window = named
    wide = text_width(label, _SMALL, font=BOLD)
    left, low, right, high = window.bounds
    back = _OVER + 1.5
    place = [foot[0] - back * ux, foot[1] - back * uy - 1.0]
    place[0] += -wide if ux > 0.3 else 0.0 if ux < -0.3 else -0.5 * wide
    place[1] += 0.0 if abs(ux) > 0.3 else -math.copysign(1.5, uy)
    place[0] = min(max(place[0], left + 1.0), right - wide - 1.0)
    place[1] = min(max(place[1], low + 1.0), high - 3.0)
    paper.text((place[0], place[1]), label, _SMALL, font=BOLD, halo=True)


def _placed(outlines: Sequence[Outline], view: View) -> BaseGeometry:
    """The outlines on the sheet, mm."""
    factor = 1e3 * view.scale
    shape = unary_union([outline.shape() for outline in outlines])
    return affinity.affine_transform(shape, [factor, 0.0, 0.0, factor, *view.origin])


def _fill(paper: Canvas, shape: BaseGeometry, pen: Pen) -> None:
    on_sheet = View(1.0, (0.0, 0.0))
    for part in getattr(shape, "geoms", [shape]):
        if isinstance(part, Polygon) and not part.is_empty:
            corners = [(1e-3 * x, 1e-3 * y) for x, y in part.exterior.coords[:-1]]
            paper.outlines([Outline.polygon(corners)], on_sheet, pen)


def _hatch(paper: Canvas, shape: BaseGeometry, slope: float) -> None:
    """Lines at 45 degrees across `shape`, rising for a positive `slope`."""
    if shape.is_empty:
        return
    x0, y0, x1, y1 = shape.bounds
    height, step = y1 - y0, _PITCH * math.sqrt(2.0)
    first = math.floor((x0 - height) / step)
    count = math.ceil((x1 + height) / step) - first
    rising = [((first + i) * step, (first + i) * step + height) for i in range(count + 1)]
    rows = [LineString([(a, y0 if slope > 0.0 else y1), (b, y1 if slope > 0.0 else y0)]) for a, b in rising]
    cut = MultiLineString(rows).intersection(shape)
    paper.lines(list(_pairs(cut)), _HATCH)


def _pairs(lines: BaseGeometry) -> Iterator[tuple[Point, Point]]:
    for part in getattr(lines, "geoms", [lines]):
        if isinstance(part, LineString) and not part.is_empty:
            (x0, y0), (x1, y1) = part.coords[0], part.coords[-1]
            yield (x0, y0), (x1, y1)

"""The slots between routed boards as closed outlines, with the tabs that interrupt them and the holes along these.

Slots are put together from rectangles on whole nanometres and only then get round corners: an outward corner by the
router, an inward one, which is the corner of a board, by that board. Every slot is simply connected, because the
tabs cut each way round a board at least once.
"""

from __future__ import annotations

import itertools
from collections.abc import Iterator
from dataclasses import dataclass

import shapely

from planar.copper.arc import Point
from planar.copper.layout import Hole
from planar.copper.outline import Outline
from planar.copper.panel_copies import Box, metres
from planar.copper.panel_tabs import Places, TabRule
from planar.copper.shapes import QUARTER, rectangle
from planar.errors import GeometryError


@dataclass(frozen=True)
class Window:
    """An opening in the panel with `counts` (columns, rows) boards of `cell` nm, a slot before, between and after them.

    `corner` is the lower left corner of the opening, `board_corner` the radius of the boards' corners, nm.
    """

    corner: tuple[int, int]
    counts: tuple[int, int]
    cell: tuple[int, int]
    board_corner: int


@dataclass(frozen=True)
class Routing:
    """Slots, tabs (rectangles across the slots) and perforations of a window, m."""

    cutouts: tuple[Outline, ...]
    tabs: tuple[Outline, ...]
    perforations: tuple[Hole, ...]


@dataclass(frozen=True)
class _Side:
    """A stretch of slot between two crossings: `box`, the `axis` its tabs cross it along, the middles of the `tabs`
    along it, and whether there is a board `before` and `after` it."""

    box: Box
    axis: int
    tabs: tuple[int, ...]
    before: bool
    after: bool


def routed(window: Window, places: Places, rule: TabRule) -> Routing:
    """Slots round the boards of `window` with tabs at `places`. Raises `GeometryError` when a slot closes round a
    board, which places from `tab_places` never make."""
    sides = list(_sides(window, places, rule))
    boxes = [*_crossings(window, rule), *(piece for side in sides for piece in _pieces(side, rule))]
    united = shapely.union_all([shapely.box(*box) for box in boxes], grid_size=1.0)
    slots = sorted(getattr(united, "geoms", [united]), key=lambda slot: (slot.bounds[1], slot.bounds[0]))
    return Routing(
        tuple(_rounded(slot, rule.slot // 2, window.board_corner) for slot in slots),
        tuple(_tab(side, middle, rule) for side in sides for middle in side.tabs),
        tuple(hole for side in sides for middle in side.tabs for hole in _perforations(side, middle, rule)),
    )


def _starts(window: Window, rule: TabRule, axis: int) -> list[int]:
    """Where each slot across `axis` begins, nm."""
    pitch = window.cell[axis] + rule.slot
    return [window.corner[axis] + i * pitch for i in range(window.counts[axis] + 1)]


def _crossings(window: Window, rule: TabRule) -> Iterator[Box]:
    for x, y in itertools.product(_starts(window, rule, 0), _starts(window, rule, 1)):
        yield x, y, x + rule.slot, y + rule.slot


def _sides(window: Window, places: Places, rule: TabRule) -> Iterator[_Side]:
    for axis in (0, 1):
        across, along = _starts(window, rule, axis), _starts(window, rule, 1 - axis)[:-1]
        last = len(across) - 1
        for (number, start), low in itertools.product(enumerate(across), along):
            which = {0: "first", last: "last"}.get(number, "inner")
            low_end = low + rule.slot
            high_end = low_end + window.cell[1 - axis]
            box = (start, low_end, start + rule.slot, high_end)
            if axis == 1:
                box = (low_end, start, high_end, start + rule.slot)
            tabs = tuple(low_end + middle for middle in places[(axis, which)])
            yield _Side(box, axis, tabs, number > 0, number < last)


def _pieces(side: _Side, rule: TabRule) -> Iterator[Box]:
    """The stretch less its tabs."""
    along = 1 - side.axis
    ends = [side.box[along], *(m + s * rule.neck // 2 for m in side.tabs for s in (-1, 1)), side.box[along + 2]]
    for low, high in zip(ends[::2], ends[1::2], strict=True):
        x0, y0, x1, y1 = side.box
        yield (x0, low, x1, high) if side.axis == 0 else (low, y0, high, y1)


def _tab(side: _Side, middle: int, rule: TabRule) -> Outline:
    low, high = middle - rule.neck // 2, middle + rule.neck // 2
    x0, y0, x1, y1 = side.box
    box = (x0, low, x1, high) if side.axis == 0 else (low, y0, high, y1)
    return rectangle(*(metres(value) for value in box)).normalised()


def _perforations(side: _Side, middle: int, rule: TabRule) -> Iterator[Hole]:
    """A row of holes along the edge of each board the tab meets."""
    before, after = side.box[side.axis] + rule.offset, side.box[side.axis + 2] - rule.offset
    lines = [before] * side.before + [after] * side.after
    for line, number in itertools.product(lines, range(rule.count)):
        along = middle + (2 * number - rule.count + 1) * rule.pitch // 2
        centre = (line, along) if side.axis == 0 else (along, line)
        yield Hole((metres(centre[0]), metres(centre[1])), metres(rule.hole), False, "perforation")


def _rounded(slot: shapely.Polygon, router: int, board_corner: int) -> Outline:
    """The slot with its outward corners rounded by the router and its inward ones like the boards' corners."""
    if len(slot.interiors):
        raise GeometryError("a slot runs all round a board, which then falls out of the panel")
    corners = _corners(slot)
    rows: list[tuple[float, float, float]] = []
    for before, here, after in zip([corners[-1], *corners[:-1]], corners, [*corners[1:], corners[0]], strict=True):
        turn = (here[0] - before[0]) * (after[1] - here[1]) - (here[1] - before[1]) * (after[0] - here[0])
        radius, bulge = (router, QUARTER) if turn > 0 else (board_corner, -QUARTER)
        rows.append((*_toward(here, before, radius), bulge if radius else 0.0))
        rows.append((*_toward(here, after, radius), 0.0))
    return Outline.closed(rows).normalised()


def _corners(slot: shapely.Polygon) -> list[tuple[int, int]]:
    """Corners counter-clockwise from the lowest left one, points along straight lines left out, nm."""
    ring = [(round(x), round(y)) for x, y in shapely.orient_polygons(slot).exterior.coords[:-1]]
    around = zip([ring[-1], *ring[:-1]], ring, [*ring[1:], ring[0]], strict=True)
    corners = [b for a, b, c in around if not (a[0] == b[0] == c[0] or a[1] == b[1] == c[1])]
    first = corners.index(min(corners, key=lambda corner: (corner[1], corner[0])))
    return corners[first:] + corners[:first]


def _toward(start: tuple[int, int], end: tuple[int, int], distance: int) -> Point:
    """The point `distance` nm from `start` on the way to `end`, along an axis, m."""
    dx, dy = ((b > a) - (b < a) for a, b in zip(start, end, strict=True))
    return metres(start[0] + dx * distance), metres(start[1] + dy * distance)

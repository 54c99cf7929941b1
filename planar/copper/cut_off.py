"""Copper that a knife takes off a finished board: the board as built without the board as it is after the cut.

Both are drawn in loop coordinates, where what is not cut stays in place though the feed may lie elsewhere; of what
differs only the copper of the loop or of the line's end counts, since a narrower loop redraws the line above it too.
"""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Mapping
from dataclasses import dataclass, replace
from functools import cached_property

from planar.copper.arc import Point
from planar.copper.boolean import contains, difference
from planar.copper.drawing import Dimensions, Drawing, DrawingRequest, loop_copper, mean_line
from planar.copper.families import FAMILIES
from planar.copper.layout import Level, Role
from planar.copper.outline import Outline
from planar.copper.path import Path
from planar.copper.tabs import PAIRS, tab_places
from planar.errors import GeometryError

SPECK = 1e-12
"""m2, pieces smaller than this are rounding."""
ROOM = 3e-3
"""m along the loop from the place of a dimension to the next tab or gap."""


@dataclass(frozen=True)
class Board:
    """A board of a `family` as it is drawn: `dimensions` name -> m, and what drawing needs beside them."""

    family: str
    dimensions: Dimensions
    request: DrawingRequest

    @cached_property
    def drawing(self) -> Drawing:
        """What the family draws. Raises `GeometryError`."""
        return FAMILIES[self.family](self.dimensions, self.request)

    def loop(self, tabs: int) -> tuple[Outline, ...]:
        """The loop trace alone, with its gaps and so many pairs of `tabs`, in loop coordinates."""
        gap = self.dimensions.get("gap", self.dimensions.get("strip_gap", 0.0))
        outlines = loop_copper(self.dimensions, gap, tabs=tabs)
        return tuple(outline.mirrored() for outline in outlines) if self.request.mirrored else outlines

    def changed(self, dimensions: Mapping[str, float], tabs: int = PAIRS) -> Board:
        """The same with other `dimensions` and `tabs` pairs of tabs left."""
        return replace(self, dimensions=dimensions, request=replace(self.request, tabs=tabs))


@dataclass(frozen=True)
class CutMark:
    """Where a cut is dimensioned: from `start` on the edge of the copper as built `whole` m along the unit vector
    `along` into it, of which the `first` m go at first; `aside` points to where nothing lies on the cut."""

    start: Point
    along: Point
    aside: Point
    first: float
    whole: float


@dataclass(frozen=True, eq=False)
class CutOff:
    """What a cut of `what` takes off `level`, in the layout's coordinates: outlines of the `first` cut and of the
    `whole`, and the `marks` it is dimensioned at."""

    what: str
    level: Level
    first: tuple[Outline, ...]
    whole: tuple[Outline, ...]
    marks: tuple[CutMark, ...]


def cut_off(what: str, before: Board, first: Board, whole: Board) -> CutOff:
    """What is gone from the board `before` once it is the board `first`, and once it is the board `whole`.

    Raises `GeometryError` where one of them cannot be drawn or nothing is cut.
    """
    level, pieces = _gone(before, whole)
    begun = [each for each in _gone(before, first)[1] if any(contains(piece, _inside(each)) for piece in pieces)]
    if not begun:
        raise GeometryError(f"nothing is cut off: {what}")
    shift = (-before.drawing.feed[0], -before.drawing.feed[1])
    marks = tuple(_moved(mark, shift, mirrored=before.request.mirrored) for mark in _marks(before, first, whole))
    return CutOff(what, level, _translated(begun, shift), _translated(pieces, shift), marks)


def _translated(outlines: Iterable[Outline], shift: Point) -> tuple[Outline, ...]:
    return tuple(outline.translated(*shift) for outline in outlines)


def _inside(outline: Outline) -> Point:
    """A point inside."""
    x, y = outline.shape().representative_point().coords[0]
    return x, y


def _gone(before: Board, after: Board) -> tuple[Level, list[Outline]]:
    """Level and outlines of what is cut, in loop coordinates."""
    here, there = before.drawing, after.drawing
    role = Role.LINE if _is_line_end(before, after) else Role.RADIATOR
    level = next(island.level for island in here.islands if island.role is role)
    left = [island.outline for island in there.islands if island.level is level]
    if role is Role.LINE:
        pieces = [island.outline for island in here.islands if island.role is role]
    else:
        pieces = _without(*(board.loop(tabs) for board, tabs in _looked_at(before, after)))
    return level, [each for each in _without(pieces, left) if each.area > SPECK]


def _looked_at(before: Board, after: Board) -> tuple[tuple[Board, int], tuple[Board, int]]:
    """Both boards with the tabs that are compared: none where the trace is cut, since its tabs are only redrawn."""
    tabs = before.request.tabs, after.request.tabs
    shorter = before.dimensions.get("tab_length") != after.dimensions.get("tab_length")
    left = tabs if tabs[0] != tabs[1] or shorter else (0, 0)
    return (before, left[0]), (after, left[1])


def _is_line_end(before: Board, after: Board) -> bool:
    """Whether the line's end is cut and not the loop: with the loop every length along it changes."""
    moved = {name for name, value in before.dimensions.items() if after.dimensions[name] != value}
    return moved == {"end_length"}


def _without(outlines: Iterable[Outline], others: Iterable[Outline]) -> list[Outline]:
    """`outlines` less each of the `others`."""
    pieces = list(outlines)
    for other in others:
        pieces = [part for piece in pieces for part in difference(piece, other)]
    return pieces


def _marks(before: Board, first: Board, whole: Board) -> Iterator[CutMark]:
    """Where the cut is dimensioned, in loop coordinates before mirroring."""
    was, line = before.dimensions, mean_line(before.dimensions)
    taken = [{name: was[name] - board.dimensions[name] for name in was} for board in (first, whole)]
    if before.request.tabs != whole.request.tabs:
        yield from _tab_marks(before, first, whole, line)
    elif taken[1]["trace_width"]:
        yield _edge_mark(before, line, taken[0]["trace_width"], taken[1])
    elif "end_length" in was and taken[1]["end_length"]:
        end, along = line.at(was["end_length"])
        outward = (along[1], -along[0])
        yield CutMark(end, _back(along), outward, taken[0]["end_length"], taken[1]["end_length"])
    for name, position in (("gap", 0.0), ("second_gap", was.get("second_gap_position", 0.0))):
        if name in was and taken[1][name] < 0.0:
            (x, y), (ux, uy) = line.at(position)
            half = 0.5 * was[name]
            for side in (1.0, -1.0):
                way = (side * ux, side * uy)
                start = (x + half * way[0], y + half * way[1])
                yield CutMark(start, way, (uy, -ux), -0.5 * taken[0][name], -0.5 * taken[1][name])


def _edge_mark(before: Board, line: Path, first: float, taken: Mapping[str, float]) -> CutMark:
    """On the outer edge where the mean line goes inward, else on the inner one; clear of tabs and gaps."""
    (x, y), (ux, uy) = line.at(_clear_place(before, line))
    side = 1.0 if taken["loop_width"] > 0.0 else -1.0
    into, half = (-side * uy, side * ux), 0.5 * before.dimensions["trace_width"]  # the inside lies on the left
    return CutMark((x - half * into[0], y - half * into[1]), into, _back(into), first, taken["trace_width"])


def _clear_place(before: Board, line: Path) -> float:
    """Near a quarter of the mean line, m along it, where neither tab nor gap is."""
    was = before.dimensions
    taken = [0.0, was.get("second_gap_position", 0.0)]
    taken += tab_places(line, was["tab_spacing"]) if "tab_length" in was else []
    places = [(0.25 + 0.005 * step) * line.length for step in (0, 1, -1, 2, -2, 3, -3, 4, -4, 5, -5, 6, -6)]
    free = [min(abs(place - each) for each in taken) for place in places]
    return next((place for place, room in zip(places, free, strict=True) if room > ROOM), places[free.index(max(free))])


def _tab_marks(before: Board, first: Board, whole: Board, line: Path) -> Iterator[CutMark]:
    """At the end of each tab that goes: all of it is to be cut, at first a half or nothing of some."""
    was = before.dimensions
    kept = [set(tab_places(line, was["tab_spacing"], board.request.tabs)) for board in (first, whole)]
    length, half = was["tab_length"], was["tab_length"] - first.dimensions["tab_length"]
    reach = 0.5 * was["trace_width"] + length
    for place in tab_places(line, was["tab_spacing"], before.request.tabs):
        if place in kept[1]:
            continue
        (x, y), (ux, uy) = line.at(place)
        start, into = (x - reach * uy, y + reach * ux), (uy, -ux)
        yield CutMark(start, into, _back(into), half if place in kept[0] else length, length)


def _back(along: Point) -> Point:
    return -along[0], -along[1]


def _moved(mark: CutMark, shift: Point, *, mirrored: bool) -> CutMark:
    """The mark in the layout's coordinates."""
    side = -1.0 if mirrored else 1.0
    start = (side * mark.start[0] + shift[0], mark.start[1] + shift[1])
    along, aside = ((side * way[0], way[1]) for way in (mark.along, mark.aside))
    return replace(mark, start=start, along=along, aside=aside)

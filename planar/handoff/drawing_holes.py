"""Holes in a figure and the letters that lead to the drill table, set where they cover no line.

A letter goes beside its hole, first toward the middle of the board; holes close together share one. Where every place
near a hole is crossed by a line, a white halo keeps the letter readable.
"""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass

import numpy as np
from shapely import prepare
from shapely.geometry import LineString, MultiLineString, box
from shapely.geometry.base import BaseGeometry
from shapely.ops import unary_union

from planar.copper.arc import Point
from planar.copper.layout import Layout
from planar.copper.outline import Outline
from planar.handoff.drawing_pens import HOLE, LETTER
from planar.handoff.drill_file import drill_tools
from planar.handoff.paper import BOLD, Paper, View, text_width

_CHORD = 0.05e-3
"""m, chord error of the copies letters are kept clear of."""
_ROOM = 7.0
"""mm: holes nearer than this share a letter."""
_CLEAR = 0.8
"""mm, from a hole to its letter."""
_HEIGHT = 1.7
"""mm, of a letter."""
_WAYS = ((1, 0), (-1, 0), (0, 1), (0, -1), (1, 1), (-1, 1), (1, -1), (-1, -1))
_FARTHER = (0.0, 2.0, 4.0)
"""mm, beyond the nearest place a letter may go."""
_MOST_LETTERED = 40
"""Holes of one tool that get letters; more (perforations, vias of a panel) are known by their size and number."""

_Box = tuple[float, float, float, float]
"""Lowest x and y, highest x and y."""


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


def draw_holes(paper: Paper, layout: Layout, view: View) -> None:
    """Holes at their size."""
    for row in drill_rows(layout):
        paper.discs([view.place(centre) for centre in row.centres], 1e3 * view.scale * row.diameter, HOLE)


def draw_letters(
    paper: Paper, layout: Layout, view: View, lines: Iterable[Outline], *, texts: Iterable[_Box] = ()
) -> None:
    """A letter for each hole or group of holes, inside the edge, off the `texts` (boxes in mm on the sheet) and off the
    `lines` drawn where there is room."""
    rows = drill_rows(layout)
    x0, y0, x1, y1 = layout.edge.bounds
    board = (*view.place((x0, y0)), *view.place((x1, y1)))
    taken = _Taken(_lines(lines, view), _discs(rows, view), [box(*text) for text in texts])
    for row in rows:
        if len(row.centres) > _MOST_LETTERED:
            continue
        for places in clusters([view.place(centre) for centre in row.centres]):
            text = row.letter if len(places) == 1 else f"{len(places)}×{row.letter}"
            size = (text_width(text, LETTER, font=BOLD), _HEIGHT)
            at = _free_place(_around(places, 500.0 * view.scale * row.diameter), size, board, taken)
            taken.letters.append(box(*at, at[0] + size[0], at[1] + size[1]))
            paper.text(at, text, LETTER, font=BOLD, halo=True)


@dataclass(frozen=True)
class _Taken:
    """What letters keep off, in mm on the sheet: `lines` where they can, `discs` and other `letters` always."""

    lines: BaseGeometry
    discs: BaseGeometry
    letters: list[BaseGeometry]


def _discs(rows: Sequence[DrillRow], view: View) -> BaseGeometry:
    """The holes of a figure as squares."""
    squares = []
    for row in rows:
        r = 500.0 * view.scale * row.diameter
        squares += [box(x - r, y - r, x + r, y + r) for x, y in map(view.place, row.centres)]
    drawn = unary_union(squares)
    prepare(drawn)
    return drawn


def _lines(lines: Iterable[Outline], view: View) -> BaseGeometry:
    """The lines of a figure in mm on the sheet."""
    chains = []
    for outline in lines:
        points = [view.place((x, y)) for x, y in outline.flattened(_CHORD).tolist()]
        chains.append(LineString([*points, points[0]]))
    drawn = MultiLineString(chains)
    prepare(drawn)
    return drawn


def _around(places: Sequence[Point], radius: float) -> _Box:
    xs, ys = zip(*places, strict=True)
    return min(xs) - radius, min(ys) - radius, max(xs) + radius, max(ys) + radius


def _free_place(hole: _Box, size: Point, board: _Box, taken: _Taken) -> Point:
    """Lower left corner (mm) of a letter of `size` beside the box `hole`: the first of the places near it, those toward
    the middle of the `board` first, that nothing `taken` crosses; else one that only lines cross."""
    inward = (
        1 if board[0] + board[2] >= hole[0] + hole[2] else -1,
        1 if board[1] + board[3] >= hole[1] + hole[3] else -1,
    )
    crossed: list[Point] = []
    whole = box(*board)
    for farther in _FARTHER:
        for way in _WAYS:
            corner = _beside(hole, size, (way[0] * inward[0], way[1] * inward[1]), _CLEAR + farther)
            room = box(corner[0] - 0.2, corner[1] - 0.2, corner[0] + size[0] + 0.2, corner[1] + size[1] + 0.2)
            if not whole.contains(room) or taken.discs.intersects(room) or any(map(room.intersects, taken.letters)):
                continue
            if not taken.lines.intersects(room):
                return corner
            crossed.append(corner)
    return crossed[0] if crossed else _beside(hole, size, (inward[0], 0), _CLEAR)


def _beside(hole: _Box, size: Point, way: tuple[int, int], clear: float) -> Point:
    """Lower left corner of a box of `size` on the side `way` of the box `hole`, `clear` mm away."""
    corner = []
    for low, high, length, sign in zip(hole[:2], hole[2:], size, way, strict=True):
        beyond = {1: high + clear, 0: 0.5 * (low + high - length), -1: low - clear - length}
        corner.append(beyond[sign])
    return corner[0], corner[1]


def clusters(places: Sequence[Point]) -> list[list[Point]]:
    """`places` (mm) in groups whose members are nearer to another member than a letter needs."""
    points = np.array(places)
    near = np.hypot(*(points[:, None, :] - points[None, :, :]).transpose(2, 0, 1)) < _ROOM
    left = np.ones(len(points), dtype=bool)
    groups = []
    for first in range(len(points)):
        if not left[first]:
            continue
        left[first] = False
        group = [first]
        for member in group:  # grows while it is walked
            found = np.flatnonzero(near[member] & left)
            left[found] = False
            group += found.tolist()
        groups.append([places[i] for i in group])
    return groups

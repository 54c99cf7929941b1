"""Boards scored apart: whether a board may be, and the lines along its edges.

A score line runs from edge to edge of the panel and is cut from both sides, so boards lie edge to edge and get square
corners. It needs copper to keep away, board thick enough to cut into, and a panel large enough for the machine.
"""

from __future__ import annotations

from collections.abc import Iterator

from planar.copper.layout import Layout, Score
from planar.copper.outline import GRID
from planar.copper.panel_copies import Blank, metres
from planar.copper.panel_grid import Array
from planar.copper.panel_tabs import SIDES
from planar.errors import Finding, Severity
from planar.library.records import Fab, Panelling
from planar.units import show

TABS = "choose tabs"


def score_obstacles(board: Layout, blank: Blank, fab: Fab, *, way: Panelling, thickness: float) -> tuple[Finding, ...]:
    """Why `board` of `thickness` m cannot be scored out of a panel of `fab`; empty when it can."""
    return tuple(_obstacles(board, blank, fab, way, thickness))


def _obstacles(board: Layout, blank: Blank, fab: Fab, way: Panelling, thickness: float) -> Iterator[Finding]:
    if not way.score:
        yield _refusal("score", "panel", "score lines", "this fab cuts none")
        return
    if thickness < way.score_least_thickness - GRID:
        yield _refusal("score", "board", f"{_mm(thickness)} thick", f"at least {_mm(way.score_least_thickness)}")
    x0, y0, x1, y1 = (metres(value) for value in blank.box)
    for i, side in enumerate(SIDES):
        rooms = [
            (island.outline.bounds[0] - x0, x1 - island.outline.bounds[2],
             island.outline.bounds[1] - y0, y1 - island.outline.bounds[3])[i]
            for island in board.islands
        ]  # fmt: skip
        room = min(rooms, default=fab.copper_to_score)
        if room < fab.copper_to_score - GRID:
            yield _refusal("copper to score", f"{side} edge of the board", _mm(room), _mm(fab.copper_to_score))


def size_obstacles(array: Array, way: Panelling) -> tuple[Finding, ...]:
    """Why a panel of that size cannot be scored; empty when it can."""
    size = tuple(metres(side) for side in array.size)
    least = way.score_least_panel
    long, short = max(size), min(size)
    if long >= max(least) - GRID and short >= min(least) - GRID:
        return ()
    got, limit = (f"{_mm(pair[0])} x {_mm(pair[1])}" for pair in (size, least))
    return (_refusal("score", "panel", got, f"at least {limit}"),)


def _refusal(rule: str, where: str, got: str, limit: str) -> Finding:
    return Finding(rule, where, got, limit, TABS, Severity.REFUSE)


def _mm(length: float) -> str:
    return show(length, "length", 4)


def score_lines(array: Array) -> tuple[Score, ...]:
    """Along every edge of every board, from edge to edge of the panel: first those that run upwards, from the left."""
    width, height = (metres(side) for side in array.size)
    (xs, ys) = score_places(array)
    upwards = [Score((metres(x), 0.0), (metres(x), height)) for x in xs]
    return (*upwards, *(Score((0.0, metres(y)), (width, metres(y))) for y in ys))


def score_places(array: Array) -> tuple[list[int], list[int]]:
    """x of the lines that run upwards and y of the others, nm."""
    xs, ys = (
        [array.rail + i * side for i in range(count + 1)]
        for count, side in zip((array.columns, array.rows), array.cell, strict=True)
    )
    return xs, ys

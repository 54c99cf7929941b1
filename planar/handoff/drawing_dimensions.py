"""Dimensions of a figure: width, height, corner radius of the edge, in a panel the places of the boards.

They stand left of everything drawn, below it and, the radius, above it.
"""

from __future__ import annotations

import math
from collections.abc import Iterator, Sequence

from planar.copper.arc import Edge, Point
from planar.copper.layout import Layout, bounds_of
from planar.handoff.drawing_pens import LETTER, THIN
from planar.handoff.paper import Paper, View

HEAD_ROOM = 6.0
"""mm, above a figure."""
_ROOM = 13.0
_STATION_ROOM = 13.0
"""mm, for the places of the boards in a panel between the figure and its overall dimensions."""
_STATION_STEP = 2.8


def dimension_room(layout: Layout) -> float:
    """Room (mm) below the figure and left of it for dimensions."""
    return _ROOM + _STATION_ROOM * bool(layout.boards)


def extent(layout: Layout) -> tuple[float, float, float, float]:
    """x_min, y_min, x_max, y_max (m) of everything the figure shows."""
    return bounds_of([layout.edge, *layout.keepout, *(island.outline for island in layout.islands)])


def draw_dimensions(paper: Paper, layout: Layout, view: View) -> None:
    """Width below and height left of everything drawn, measured on the edge; in a panel the boards' places too."""
    x0, y0, x1, y1 = layout.edge.bounds
    left, low, _, _ = extent(layout)
    (a, bottom), (b, top) = view.place((x0, y0)), view.place((x1, y1))
    line_x, line_y = view.place((left, low))
    _draw_stations(paper, layout, view, (line_x, line_y))
    reach = 7.0 + _STATION_ROOM * bool(layout.boards)
    line_x, line_y = line_x - reach, line_y - reach
    pairs = [((x, bottom - 1.0), (x, line_y - 1.5)) for x in (a, b)]
    pairs += [((a - 1.0, y), (line_x - 1.5, y)) for y in (bottom, top)]
    pairs += [((a, line_y), (b, line_y)), ((line_x, bottom), (line_x, top))]
    pairs += [line for x, s in ((a, 1.0), (b, -1.0)) for line in _arrow((x, line_y), (s, 0.0))]
    pairs += [line for y, s in ((bottom, 1.0), (top, -1.0)) for line in _arrow((line_x, y), (0.0, s))]
    paper.lines(pairs, THIN)
    width, height = layout.size
    paper.text((0.5 * (a + b), line_y + 1.0), f"{1e3 * width:.3f}", 8.0, anchor="centre")
    paper.upright_text((line_x - 1.0, 0.5 * (bottom + top)), f"{1e3 * height:.3f}", 8.0)
    _draw_radius(paper, layout, view)


def _draw_radius(paper: Paper, layout: Layout, view: View) -> None:
    """Radius of the edge's corner at the upper right, with the number of corners of that radius."""
    corners = [edge for edge in layout.edge.edges if edge.bulge > 0.0]
    if not corners:
        return
    shown = max(corners, key=lambda edge: sum(edge.point(0.5)))
    alike = sum(_same_radius(edge, shown) for edge in corners)
    x, y = view.place(shown.point(0.5))
    _, top = view.place((0.0, extent(layout)[3]))
    start = (x - 3.0, top + 2.6)
    length = math.dist(start, (x, y))
    along = ((start[0] - x) / length, (start[1] - y) / length)
    paper.lines([(start, (x, y)), *_arrow((x, y), along)], THIN)
    count = f"{alike} × " if alike > 1 else ""
    paper.text((start[0] - 0.6, start[1] - 0.4), f"{count}R {1e3 * shown.radius:.3f}", 8.0, anchor="right")


def _same_radius(one: Edge, other: Edge) -> bool:
    return abs(one.radius - other.radius) < 1e-6  # a micrometre: less is not dimensioned


def _draw_stations(paper: Paper, layout: Layout, view: View, low: Point) -> None:
    """How far each side of each board lies from the panel's lower left corner; `low` (mm) is that of all drawn."""
    corner = layout.edge.bounds[:2]
    a, b = view.place(corner)
    for axis in (0, 1):
        sides = sorted({round(1e6 * board.bounds[i]) for board in layout.boards for i in (axis, axis + 2)})
        places = [view.place((1e-6 * side, 1e-6 * side))[axis] for side in sides]
        for side, place, label in zip(sides, places, spread(places, _STATION_STEP), strict=True):
            text = f"{1e-3 * side - 1e3 * corner[axis]:.3f}"
            if axis == 0:
                paper.lines([((place, b - 1.0), (label, low[1] - 3.0))], THIN)
                paper.upright_text((label + 0.8, low[1] - 8.5), text, LETTER)
            else:
                paper.lines([((a - 1.0, place), (low[0] - 3.0, label))], THIN)
                paper.text((low[0] - 3.6, label - 0.8), text, LETTER, anchor="right")


def spread(places: Sequence[float], step: float) -> list[float]:
    """`places` in rising order, moved apart to `step` or more with the least sum of squared moves.

    Less `step` times their number they need only not fall: pools of neighbours that do take their mean (Ayer et al.
    1955).
    """
    pools: list[tuple[float, int]] = []
    for i, place in enumerate(places):
        total, count = place - i * step, 1
        while pools and pools[-1][0] / pools[-1][1] >= total / count:
            before, members = pools.pop()
            total, count = total + before, count + members
        pools.append((total, count))
    levels = [total / count for total, count in pools for _ in range(count)]
    return [level + i * step for i, level in enumerate(levels)]


def _arrow(tip: Point, along: Point) -> Iterator[tuple[Point, Point]]:
    (x, y), (ux, uy) = tip, along
    for side in (-0.6, 0.6):
        yield tip, (x + 2.2 * ux - side * uy, y + 2.2 * uy + side * ux)

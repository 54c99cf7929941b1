"""Union, difference and intersection of two outlines, arcs kept.

Each outline is cut where it meets the other; the pieces are sorted into those inside, outside or on
the border of the other; the pieces an operation wants are stitched into closed outlines. Shared
edges are allowed (a pad flush with a trace), touching in a single point is refused. Work in
unsnapped coordinates and snap the result: arcs that share a circle do so only before rounding.
"""

from __future__ import annotations

import itertools
import math
from collections.abc import Callable, Iterator, Sequence
from enum import Enum

from planar.copper.arc import Edge, Point
from planar.copper.outline import Outline
from planar.errors import GeometryError

TOLERANCE = 1e-12
"""m, points closer than this are one; far below the grid, far above rounding."""
_NUDGE = (0.3 * TOLERANCE * math.cos(1.0), 0.3 * TOLERANCE * math.sin(1.0))


class _Side(Enum):
    INSIDE = 0
    OUTSIDE = 1
    ALONG = 2  # on the border, same direction
    AGAINST = 3  # on the border, opposite direction


def union(first: Outline, second: Outline) -> tuple[Outline, ...]:
    """Outlines of the copper in either; two when they do not meet. Both counter-clockwise."""
    return _combine((first, second), (_Side.OUTSIDE, _Side.ALONG), (_Side.OUTSIDE,), flip=False)


def difference(first: Outline, second: Outline) -> tuple[Outline, ...]:
    """Outlines of the copper in `first` and not in `second`. Both counter-clockwise."""
    return _combine((first, second), (_Side.OUTSIDE, _Side.AGAINST), (_Side.INSIDE,), flip=True)


def intersection(first: Outline, second: Outline) -> tuple[Outline, ...]:
    """Outlines of the copper in both. Both counter-clockwise."""
    return _combine((first, second), (_Side.INSIDE, _Side.ALONG), (_Side.INSIDE,), flip=False)


def united(outlines: Sequence[Outline]) -> tuple[Outline, ...]:
    """All `outlines` with those that meet merged into one."""
    islands: list[Outline] = []
    for outline in outlines:
        merged = outline
        apart = []
        for island in islands:
            result = union(merged, island)
            if len(result) == 1:
                merged = result[0]
            else:
                apart.append(island)
        islands = [*apart, merged]
    return tuple(islands)


def contains(outline: Outline, point: Point) -> bool:
    """Whether `point` (m) lies inside `outline`; undefined within the tolerance of its border."""
    x, y = point[0] + _NUDGE[0], point[1] + _NUDGE[1]
    winding = 0
    for edge in outline.edges:
        (x0, y0), (x1, y1) = edge.start, edge.end
        left_of_chord = (x1 - x0) * (y - y0) - (y1 - y0) * (x - x0) > 0.0
        if y0 <= y < y1 and left_of_chord:
            winding += 1
        elif y1 <= y < y0 and not left_of_chord:
            winding -= 1
        if edge.bulge != 0.0 and _between_chord_and_arc(edge, (x, y), left_of_chord):
            winding += 1 if edge.bulge > 0.0 else -1
    return winding != 0


def _between_chord_and_arc(edge: Edge, point: Point, left_of_chord: bool) -> bool:
    return left_of_chord != (edge.bulge > 0.0) and math.dist(edge.centre, point) < edge.radius


def _combine(
    pair: tuple[Outline, Outline], from_first: tuple[_Side, ...], from_second: tuple[_Side, ...], *, flip: bool
) -> tuple[Outline, ...]:
    first, second = pair
    pieces = [p for p in _pieces(first, second) if _side(p, second) in from_first]
    others = [p for p in _pieces(second, first) if _side(p, first) in from_second]
    pieces += [p.reversed() for p in others] if flip else others
    outlines = tuple(_stitched(pieces))
    if any(outline.area < 0.0 for outline in outlines):
        raise GeometryError("combining two outlines leaves a hole; islands must be simply connected")
    return outlines


def _pieces(outline: Outline, other: Outline) -> Iterator[Edge]:
    """Edges of `outline`, cut where they meet `other`."""
    for edge in outline.edges:
        cuts = {0.0, 1.0}
        for opposite in other.edges:
            for point in meeting_points(edge, opposite):
                cuts.add(edge.fraction_of(point))
        ordered = [f for f in sorted(cuts) if 0.0 <= f <= 1.0]
        smallest = TOLERANCE / edge.length
        kept = [0.0]
        for f in ordered:
            if f - kept[-1] > smallest and (f == 1.0 or 1.0 - f > smallest):
                kept.append(f)
        for low, high in itertools.pairwise(kept):
            yield edge.part(low, high)


def meeting_points(edge: Edge, other: Edge) -> list[Point]:
    """Points of both edges: crossings, and end points of one that lie on the other."""
    points = [p for p in (other.start, other.end) if _on(edge, p)]
    points += [p for p in (edge.start, edge.end) if _on(other, p)]
    crossings = _CROSSINGS[(edge.bulge != 0.0, other.bulge != 0.0)](edge, other)
    points += [p for p in crossings if _on(edge, p) and _on(other, p)]
    return points


def _on(edge: Edge, point: Point) -> bool:
    fraction = edge.fraction_of(point)
    nearest = edge.point(min(1.0, max(0.0, fraction)))
    return math.dist(nearest, point) < TOLERANCE


def _line_line(a: Edge, b: Edge) -> list[Point]:
    ax, ay = a.end[0] - a.start[0], a.end[1] - a.start[1]
    bx, by = b.end[0] - b.start[0], b.end[1] - b.start[1]
    cross = ax * by - ay * bx
    if abs(cross) < 1e-14 * a.chord * b.chord:
        return []
    t = ((b.start[0] - a.start[0]) * by - (b.start[1] - a.start[1]) * bx) / cross
    return [(a.start[0] + t * ax, a.start[1] + t * ay)]


def _line_arc(line: Edge, arc: Edge) -> list[Point]:
    cx, cy = arc.centre
    ux, uy = (line.end[0] - line.start[0]) / line.chord, (line.end[1] - line.start[1]) / line.chord
    along = (cx - line.start[0]) * ux + (cy - line.start[1]) * uy
    foot = line.start[0] + along * ux, line.start[1] + along * uy
    away = math.dist(foot, (cx, cy))
    if away > arc.radius + TOLERANCE:
        return []
    half = _half_chord(arc.radius, away)
    return [(foot[0] + s * half * ux, foot[1] + s * half * uy) for s in (-1.0, 1.0)]


def _arc_arc(a: Edge, b: Edge) -> list[Point]:
    if a.radius > b.radius:  # from the smaller circle the points are exact to rounding of the smaller radius
        a, b = b, a
    (ax, ay), (bx, by) = a.centre, b.centre
    d = math.dist(a.centre, b.centre)
    if d < TOLERANCE or d > a.radius + b.radius + TOLERANCE or d < abs(a.radius - b.radius) - TOLERANCE:
        return []
    along = (d * d + (a.radius - b.radius) * (a.radius + b.radius)) / (2.0 * d)
    half = _half_chord(a.radius, along)
    ux, uy = (bx - ax) / d, (by - ay) / d
    return [(ax + along * ux - s * half * uy, ay + along * uy + s * half * ux) for s in (-1.0, 1.0)]


def _half_chord(radius: float, away: float) -> float:
    """Half the chord `away` m from the centre of a circle; 0 where it only touches, which rounding would split."""
    squared = (radius - away) * (radius + away)
    return math.sqrt(squared) if squared > 2.0 * TOLERANCE * radius else 0.0


_CROSSINGS: dict[tuple[bool, bool], Callable[[Edge, Edge], list[Point]]] = {
    (False, False): _line_line,
    (False, True): _line_arc,
    (True, False): lambda arc, line: _line_arc(line, arc),
    (True, True): _arc_arc,
}


def _side(piece: Edge, other: Outline) -> _Side:
    middle = piece.point(0.5)
    for edge in other.edges:
        if _on(edge, middle):
            (ux, uy), (vx, vy) = piece.tangent(0.5), edge.tangent(edge.fraction_of(middle))
            return _Side.ALONG if ux * vx + uy * vy > 0.0 else _Side.AGAINST
    return _Side.INSIDE if contains(other, middle) else _Side.OUTSIDE


def _stitched(pieces: list[Edge]) -> Iterator[Outline]:
    left = list(pieces)
    while left:
        chain = [left.pop()]
        while math.dist(chain[-1].end, chain[0].start) > 4.0 * TOLERANCE:
            following = [p for p in left if math.dist(p.start, chain[-1].end) < 4.0 * TOLERANCE]
            if len(following) != 1:
                raise GeometryError("two outlines touch in a point or do not close")
            left.remove(following[0])
            chain.append(following[0])
        yield _joined(chain)


def _joined(chain: list[Edge]) -> Outline:
    """Outline of `chain` with edges that continue each other on one line or circle merged."""
    start = next((i for i in range(len(chain)) if not _continues(chain[i - 1], chain[i])), 0)
    merged: list[Edge] = []
    for edge in chain[start:] + chain[:start]:
        if merged and _continues(merged[-1], edge):
            last = merged.pop()
            merged.append(Edge(last.start, edge.end, math.tan((last.angle + edge.angle) / 4.0)))
        else:
            merged.append(edge)
    return Outline.from_edges(merged)


def _continues(first: Edge, second: Edge) -> bool:
    straight = first.bulge == 0.0, second.bulge == 0.0
    if straight[0] != straight[1]:
        return False
    (ux, uy), (vx, vy) = first.tangent(1.0), second.tangent(0.0)
    if abs(ux * vy - uy * vx) > 1e-9 or ux * vx + uy * vy < 0.0:
        return False
    if straight[0]:
        return True
    same_circle = math.dist(first.centre, second.centre) < TOLERANCE
    return same_circle and first.bulge * second.bulge > 0.0 and abs(first.angle + second.angle) <= math.pi

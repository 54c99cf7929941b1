"""One region of copper as a mesh: a ladder of rungs, each divided across.

The boundary points alone are triangulated (constrained Delaunay): on a strip that gives rungs from
edge to edge. Where two triangles make a quadrangle of the strip their shared rung is left out. Every
rung is divided so that cells are thin at both edges, where current crowds, whatever the width. Rungs
are shared by the cells beside them, so the mesh conforms by construction. Copper much wider than the
step is halved along chords first.
"""

from __future__ import annotations

import itertools
import math
from collections.abc import Sequence
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray
from shapely import constrained_delaunay_triangles, get_coordinates
from shapely.geometry import LineString, Polygon

from planar.copper.arc import Point
from planar.errors import GeometryError
from planar.field.rungs import MeshSettings, Shadow, rung_points

Points = NDArray[np.float64]
NEAR = 1e-10
"""m, slack of a chord that follows the boundary."""
FATTEST = 1.25
"""Half-width of copper in steps above which a region is halved before it is meshed as ladders."""


Corners = tuple[Point, Point, Point]


def region_triangles(boundary: Sequence[Point], settings: MeshSettings, shadow: Shadow | None = None) -> list[Corners]:
    """Cells of the region inside `boundary`, each three points. Raises `GeometryError` when it touches itself."""
    polygon = Polygon(boundary)
    if not polygon.is_valid:
        raise GeometryError("a sampled outline touches itself: the mesh step is too coarse for this copper")
    if not polygon.buffer(-FATTEST * settings.step).is_empty:
        halves = _halved(boundary, polygon, settings.step)
        return [corners for half in halves for corners in region_triangles(half, settings, shadow)]
    coarse = _coarse_triangles(boundary, polygon)
    ladder = _Ladder(boundary, settings, shadow)
    pairs = _pairs(coarse, ladder)
    single = set(coarse) - {triangle for pair in pairs for triangle in pair}
    cells = [cell for pair in pairs for cell in ladder.quadrangle(*pair)]
    return cells + [cell for triangle in sorted(single) for cell in ladder.triangle(triangle)]


Triple = tuple[int, int, int]


def _coarse_triangles(boundary: Sequence[Point], polygon: Polygon) -> list[Triple]:
    """Constrained Delaunay triangles of the boundary points alone, as their numbers."""
    corners = get_coordinates(list(constrained_delaunay_triangles(polygon).geoms)).reshape(-1, 4, 2)[:, :3]
    place = {_key(point): i for i, point in enumerate(boundary)}
    return [(place[_key(a)], place[_key(b)], place[_key(c)]) for a, b, c in corners.tolist()]


@dataclass(frozen=True)
class _Ladder:
    """Cells of coarse triangles and of pairs of them, from the boundary points and the settings."""

    boundary: Sequence[Point]
    settings: MeshSettings
    shadow: Shadow | None
    known: dict[tuple[int, int], list[Point]] = field(default_factory=dict)

    def is_rung(self, a: int, b: int) -> bool:
        """Whether the side between two boundary points crosses the copper."""
        return (a - b) % len(self.boundary) not in {1, len(self.boundary) - 1}

    def length(self, a: int, b: int) -> float:
        return math.dist(self.boundary[a], self.boundary[b])

    def divided(self, a: int, b: int) -> list[Point]:
        """Points from `a` up to, not including, `b`: inner ones on rungs only."""
        inner = self.inner(a, b) if self.is_rung(a, b) else []
        return [self.boundary[a], *inner]

    def inner(self, a: int, b: int) -> list[Point]:
        """Inner points of the rung from boundary point `a` to `b`, worked out once for both ways."""
        if (a, b) not in self.known:
            points = rung_points(self.boundary[a], self.boundary[b], self.settings, self.shadow)
            self.known[a, b], self.known[b, a] = points, points[::-1]
        return self.known[a, b]

    def triangle(self, triple: Triple) -> list[Corners]:
        """Cells of a coarse triangle."""
        corners = [self.boundary[i] for i in triple]
        return _divided_triangle(corners, [self.divided(triple[i], triple[(i + 1) % 3]) for i in range(3)])

    def quadrangle(self, one: Triple, other: Triple) -> list[Corners]:
        """Cells between the two rungs that remain when the side two coarse triangles share is left out."""
        shared = set(one) & set(other)
        (first,), (second,) = set(one) - shared, set(other) - shared
        start = next(i for i in shared if not self.is_rung(first, i))
        end = next(i for i in shared if i != start)
        left = [*self.divided(first, end), self.boundary[end]]
        right = [*self.divided(start, second), self.boundary[second]]
        if len(left) != len(right):
            return _zipped(left, right)
        return _lanes(left, right, crossed=self.settings.crossed)


def _pairs(coarse: Sequence[Triple], ladder: _Ladder) -> list[tuple[Triple, Triple]]:
    """Pairs of triangles with one boundary side each, on opposite edges, that share the longest rung of both."""
    waiting: dict[frozenset[int], Triple] = {}
    pairs = []
    for triple in coarse:
        rungs = [(a, b) for a, b in zip(triple, (*triple[1:], triple[0]), strict=True) if ladder.is_rung(a, b)]
        if len(rungs) != 2:
            continue
        longest = frozenset(max(rungs, key=lambda rung: (round(ladder.length(*rung), 12), rung)))
        partner = waiting.pop(longest, None)
        if partner is None:
            waiting[longest] = triple
        elif _opposite(triple, partner, longest, ladder):
            pairs.append((partner, triple))
    return pairs


def _opposite(one: Triple, other: Triple, shared: frozenset[int], ladder: _Ladder) -> bool:
    """Whether the boundary sides of two triangles that share a rung meet it at different ends."""
    ends = [next(i for i in shared if not ladder.is_rung(next(iter(set(t) - shared)), i)) for t in (one, other)]
    return ends[0] != ends[1]


def _lanes(left: Sequence[Point], right: Sequence[Point], *, crossed: bool) -> list[Corners]:
    """Cells between two rungs with equally many points.

    The middle lane, and with `crossed` every lane, is divided by both diagonals; the diagonals of the others
    are mirrored about the middle of the strip.
    """
    cells: list[Corners] = []
    count = len(left) - 1
    for k in range(count):
        a, b, c, d = left[k], left[k + 1], right[k + 1], right[k]
        if crossed or 2 * k + 1 == count:
            middle = (0.25 * (a[0] + b[0] + c[0] + d[0]), 0.25 * (a[1] + b[1] + c[1] + d[1]))
            cells += [(a, b, middle), (b, c, middle), (c, d, middle), (d, a, middle)]
        elif 2 * k + 1 < count:
            cells += [(a, b, c), (a, c, d)]
        else:
            cells += [(a, b, d), (b, c, d)]
    return cells


def _halved(boundary: Sequence[Point], polygon: Polygon, step: float) -> tuple[list[Point], list[Point]]:
    """Two parts of a region too wide for a ladder, along the chord that best halves it.

    The chord joins two boundary points, so that neighbours of the region see no new point.
    """
    points = np.array(boundary)
    count = len(points)
    following = np.roll(points, -1, axis=0)
    swept = np.concatenate([[0.0], np.cumsum(0.5 * (points[:, 0] * following[:, 1] - following[:, 0] * points[:, 1]))])
    i, j = np.triu_indices(count, 2)
    closing = 0.5 * (points[j, 0] * points[i, 1] - points[i, 0] * points[j, 1])
    part = swept[j] - swept[i] + closing
    smaller = np.minimum(part, polygon.area - part)
    length = np.linalg.norm(points[i] - points[j], axis=1)
    with np.errstate(divide="ignore"):
        score = np.where(smaller > 0.0, length**2 / smaller, np.inf)
    inside = polygon.buffer(NEAR)
    for best in np.argsort(score):
        a, b = int(i[best]), int(j[best])
        middle = LineString([points[a], points[b]])
        if not np.isfinite(score[best]):
            break
        if inside.contains(middle) and middle.interpolate(0.5, normalized=True).distance(polygon.exterior) > 0.1 * step:
            pieces = max(1, math.ceil(float(length[best]) / step - 1e-9))
            chord = [tuple(points[a] + k / pieces * (points[b] - points[a])) for k in range(1, pieces)]
            one = [*boundary[a : b + 1], *reversed(chord)]
            other = [*boundary[b:], *boundary[: a + 1], *chord]
            return one, other
    raise GeometryError("a wide piece of copper cannot be divided for the mesh")


def _key(point: Sequence[float]) -> tuple[int, int]:
    return round(point[0] / 1e-11), round(point[1] / 1e-11)


def _divided_triangle(corners: Sequence[Point], sides: Sequence[list[Point]]) -> list[Corners]:
    """Cells of a triangle whose sides carry division points (each list leaves out its end)."""
    divided = [len(side) > 1 for side in sides]
    if sum(divided) == 3:  # rungs on all sides: fan from the centroid
        middle = (sum(c[0] for c in corners) / 3.0, sum(c[1] for c in corners) / 3.0)
        ring = [*sides[0], *sides[1], *sides[2]]
        return [(a, b, middle) for a, b in zip(ring, [*ring[1:], ring[0]], strict=True)]
    if sum(divided) == 1:  # one rung: fan from the corner opposite
        i = divided.index(True)
        rung = [*sides[i], corners[(i + 1) % 3]]
        return [(a, b, corners[(i + 2) % 3]) for a, b in itertools.pairwise(rung)]
    if sum(divided) == 0:
        return [(corners[0], corners[1], corners[2])]
    i = divided.index(False)  # two rungs meet in the corner opposite the undivided side
    apex = corners[(i + 2) % 3]
    first = [apex, *reversed(sides[(i + 1) % 3][1:]), corners[(i + 1) % 3]]
    second = [apex, *sides[(i + 2) % 3][1:], corners[i]]
    return _zipped(first, second)


def _zipped(first: Sequence[Point], second: Sequence[Point]) -> list[Corners]:
    """Triangles between two rungs, which may start in one point, joined in the order of places along the rungs."""
    places = [[math.dist(rung[0], point) / math.dist(rung[0], rung[-1]) for point in rung] for rung in (first, second)]
    joined = first[0] == second[0]
    cells: list[Corners] = [(first[0], first[1], second[1])] if joined else []
    i, j = (1, 1) if joined else (0, 0)
    while i < len(first) - 1 or j < len(second) - 1:
        ahead = places[0][i + 1] if i < len(first) - 1 else math.inf
        across = places[1][j + 1] if j < len(second) - 1 else math.inf
        if math.isclose(ahead, across, rel_tol=1e-6):  # the shorter diagonal
            ahead, across = math.dist(first[i + 1], second[j]), math.dist(first[i], second[j + 1])
        if ahead <= across:
            cells.append((first[i], first[i + 1], second[j]))
            i += 1
        else:
            cells.append((first[i], second[j + 1], second[j]))
            j += 1
    return cells

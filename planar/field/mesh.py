"""Triangles on the copper, fine toward its edges.

The outline of an island is sampled along its length and triangulated without inner points
(constrained Delaunay): on strips that gives a ladder of rungs from edge to edge. Every rung is then
divided by the cosine rule, so that cells are thin at both edges, where current crowds, whatever the
width. Rungs are shared by the triangles beside them, so the mesh conforms by construction. Copper
much wider than the step is halved along chords first.
"""

from __future__ import annotations

import itertools
import math
from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import NDArray
from shapely import constrained_delaunay_triangles, get_coordinates
from shapely.geometry import LineString, Polygon

from planar.copper.arc import Edge, Point
from planar.copper.outline import Outline
from planar.errors import GeometryError

Points = NDArray[np.float64]
Indices = NDArray[np.int64]
FATTEST = 1.25
"""Half-width of copper in steps above which a region is halved before it is meshed as ladders."""
STEEPEST = math.pi / 8.0
"""rad, an arc turns no further than this between two points."""
MERGE = 1e-10
"""m, points closer than this are one."""


@dataclass(frozen=True)
class MeshSettings:
    """`step` m along edges, at least `across` cells across a strip, none wider than `widest` m."""

    step: float
    across: int = 3
    widest: float = math.inf


@dataclass(frozen=True, eq=False)
class Mesh:
    """Triangles of one or more levels.

    `points` (n, 2) m, `triangles` (m, 3) indices counter-clockwise, `level` (m,) number of the level
    of each triangle, `source` (m,) true where a triangle fills a gap port and is no copper.
    """

    points: Points
    triangles: Indices
    level: Indices
    source: NDArray[np.bool_]

    @cached_property
    def corners(self) -> Points:
        """Corner points, (m, 3, 2) m."""
        corners: Points = self.points[self.triangles]
        return corners

    @cached_property
    def areas(self) -> Points:
        """Areas, (m,) m2."""
        return triangle_areas(self.corners)

    @cached_property
    def centroids(self) -> Points:
        """Centroids, (m, 2) m."""
        centroids: Points = self.corners.mean(axis=1)
        return centroids


def triangle_areas(corners: Points) -> Points:
    """Signed areas of triangles (m, 3, 2)."""
    a, b = corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0]
    areas: Points = 0.5 * (a[:, 0] * b[:, 1] - a[:, 1] * b[:, 0])
    return areas


@dataclass(frozen=True)
class Region:
    """A piece to be meshed: the boundary as points in order, counter-clockwise, already sampled."""

    boundary: tuple[Point, ...]
    level: int
    source: bool = False


def sampled(outline: Outline, settings: MeshSettings, marks: Iterable[Point] = ()) -> list[Point]:
    """Points along `outline` no further apart than the step, corners and `marks` (on its edges) among them.

    Points inside arcs lie outside the arc by so much that the chords are together as long as the arc.
    """
    points: list[Point] = []
    found = [tuple(mark) for mark in marks]
    for edge in outline.edges:
        inner = sorted({0.0, *(_fraction(edge, mark) for mark in found)} - {-1.0})
        for low, high in itertools.pairwise([*inner, 1.0]):
            if (high - low) * edge.length > MERGE:
                points += _along(edge.part(low, high), settings.step)
    return points


def _fraction(edge: Edge, mark: tuple[float, ...]) -> float:
    """Where `mark` lies on `edge`, strictly inside it; -1 when it does not."""
    point = (mark[0], mark[1])
    fraction = edge.fraction_of(point)
    inside = MERGE < fraction * edge.length < edge.length - MERGE
    return fraction if inside and math.dist(edge.point(fraction), point) < 5e-9 else -1.0


def _along(edge: Edge, step: float) -> list[Point]:
    """The start of `edge` and points along it, its end left out."""
    count = max(1, math.ceil(edge.length / step - 1e-9), math.ceil(abs(edge.angle) / STEEPEST - 1e-9))
    if edge.bulge == 0.0 or count == 1:
        return [edge.point(i / count) for i in range(count)]
    half = 0.5 * abs(edge.angle) / count
    push = half / math.sin(half)
    cx, cy = edge.centre
    inner = [edge.point(i / count) for i in range(1, count)]
    return [edge.start, *((cx + push * (x - cx), cy + push * (y - cy)) for x, y in inner)]


def cosine_fractions(cells: int) -> Points:
    """Inner division points of a rung into `cells`, finest at both ends."""
    return 0.5 * (1.0 - np.cos(np.pi * np.arange(1, cells) / cells))


def mesh_regions(regions: Sequence[Region], settings: MeshSettings) -> Mesh:
    """Mesh of `regions`. Regions of one level that share sampled boundary points are joined there."""
    points: list[Point] = []
    triangles: list[tuple[int, int, int]] = []
    level: list[int] = []
    source: list[bool] = []
    number: dict[tuple[int, int, int], int] = {}

    def index(point: Point, on: int) -> int:
        key = (on, round(point[0] / MERGE / 10.0), round(point[1] / MERGE / 10.0))
        if key not in number:
            number[key] = len(points)
            points.append(point)
        return number[key]

    for region in regions:
        for corners in _region_triangles(region.boundary, settings):
            a, b, c = (index(corner, region.level) for corner in corners)
            if len({a, b, c}) == 3:
                triangles.append((a, b, c))
                level.append(region.level)
                source.append(region.source)
    mesh = Mesh(np.array(points), np.array(triangles), np.array(level), np.array(source))
    flipped = triangle_areas(mesh.corners) < 0.0
    ordered = np.where(flipped[:, None], mesh.triangles[:, ::-1], mesh.triangles)
    return Mesh(mesh.points, ordered, mesh.level, mesh.source)


Corners = tuple[Point, Point, Point]


def _region_triangles(boundary: Sequence[Point], settings: MeshSettings) -> list[Corners]:
    polygon = Polygon(boundary)
    if not polygon.is_valid:
        raise GeometryError("a sampled outline touches itself: the mesh step is too coarse for this copper")
    if not polygon.buffer(-FATTEST * settings.step).is_empty:
        halves = _halved(boundary, polygon, settings.step)
        return [corners for half in halves for corners in _region_triangles(half, settings)]
    coarse = get_coordinates(list(constrained_delaunay_triangles(polygon).geoms)).reshape(-1, 4, 2)[:, :3]
    place = {_key(point): i for i, point in enumerate(boundary)}
    count = len(boundary)
    cells: list[Corners] = []
    for triangle in coarse:
        corners = [(float(x), float(y)) for x, y in triangle]
        order = [place[_key(corner)] for corner in corners]
        sides = []
        for i in range(3):
            a, b = order[i], order[(i + 1) % 3]
            on_boundary = (a - b) % count in {1, count - 1}
            sides.append(_divided(corners[i], corners[(i + 1) % 3], 1 if on_boundary else _cells(corners, i, settings)))
        cells += _divided_triangle(corners, sides)
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
    inside = polygon.buffer(MERGE)
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


def _cells(corners: Sequence[Point], side: int, settings: MeshSettings) -> int:
    length = math.dist(corners[side], corners[(side + 1) % 3])
    cells = settings.across
    while length * math.sin(0.5 * math.pi / cells) > min(settings.step, settings.widest):  # the widest cell
        cells += 1
    return cells


def _divided(start: Point, end: Point, cells: int) -> list[Point]:
    """`start` and the inner points of a rung, computed alike from either end."""
    swap = end < start
    (x0, y0), (x1, y1) = (end, start) if swap else (start, end)
    inner = [(x0 + f * (x1 - x0), y0 + f * (y1 - y0)) for f in cosine_fractions(cells)]
    return [start, *(reversed(inner) if swap else inner)]


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
    """Triangles between two rungs that start in one point, always along the shorter diagonal."""
    cells: list[Corners] = [(first[0], first[1], second[1])]
    i, j = 1, 1
    while i < len(first) - 1 or j < len(second) - 1:
        ahead = math.dist(first[i + 1], second[j]) if i < len(first) - 1 else math.inf
        across = math.dist(first[i], second[j + 1]) if j < len(second) - 1 else math.inf
        if ahead <= across:
            cells.append((first[i], first[i + 1], second[j]))
            i += 1
        else:
            cells.append((first[i], second[j + 1], second[j]))
            j += 1
    return cells

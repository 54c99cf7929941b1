"""Triangles on the copper: boundaries sampled, regions meshed as ladders, all joined.

Boundaries are sampled so that chords are as long as the arcs they stand for and the two edges of a
bent strip keep in step. Regions that share sampled points are joined there.
"""

from __future__ import annotations

import itertools
import math
from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from planar.copper.arc import Edge, Point
from planar.copper.outline import Outline
from planar.field.ladder import region_triangles
from planar.field.rungs import MeshSettings, Shadow

__all__ = ["Mesh", "MeshSettings", "Region", "mesh_regions", "sampled", "triangle_areas"]

Points = NDArray[np.float64]
Indices = NDArray[np.int64]
STEEPEST = math.pi / 8.0
"""rad, an arc turns no further than this between two points."""
ON_EDGE = 5e-9
"""m, a few grid steps: a mark this near to an edge lies on it, this near to a corner is the corner."""
MERGE = 1e-10
"""m, points closer than this are one."""


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
    """A piece to be meshed: the boundary as points in order, counter-clockwise, already sampled.

    `shadow` of the lines on another level, below which return current gathers.
    """

    boundary: tuple[Point, ...]
    level: int
    source: bool = False
    shadow: Shadow | None = None


def sampled(outline: Outline, settings: MeshSettings, marks: Iterable[Point] = ()) -> list[Point]:
    """Points along `outline` no further apart than the step, corners and `marks` (on its edges) among them.

    Points inside arcs lie outside the arc by so much that the chords are together as long as the arc.
    """
    points: list[Point] = []
    found = [tuple(mark) for mark in marks]
    steps = _steps_per_radian(outline, settings.step)
    for edge in outline.edges:
        inner = sorted({0.0, *(_fraction(edge, mark) for mark in found)} - {-1.0})
        for low, high in itertools.pairwise([*inner, 1.0]):
            if (high - low) * edge.length > MERGE:
                points += _along(edge.part(low, high), settings.step, steps.get(_centre(edge), 0.0))
    return points


def _centre(edge: Edge) -> tuple[int, int] | None:
    """Centre of an arc to 1 um, None of a segment."""
    return None if edge.bulge == 0.0 else (round(edge.centre[0] / 1e-6), round(edge.centre[1] / 1e-6))


def _steps_per_radian(outline: Outline, step: float) -> dict[tuple[int, int] | None, float]:
    """Points per radian by centre: arcs about one centre are the two edges of a bent strip and keep in step."""
    steps: dict[tuple[int, int] | None, float] = {}
    for edge in outline.edges:
        if edge.bulge != 0.0:
            centre = _centre(edge)
            steps[centre] = max(steps.get(centre, 1.0 / STEEPEST), edge.radius / step)
    return steps


def _fraction(edge: Edge, mark: tuple[float, ...]) -> float:
    """Where `mark` lies on `edge`, strictly inside it; -1 when it does not."""
    point = (mark[0], mark[1])
    fraction = edge.fraction_of(point)
    inside = ON_EDGE < fraction * edge.length < edge.length - ON_EDGE
    return fraction if inside and math.dist(edge.point(fraction), point) < ON_EDGE else -1.0


def _along(edge: Edge, step: float, steps_per_radian: float) -> list[Point]:
    """The start of `edge` and points along it, its end left out."""
    count = max(1, math.ceil(edge.length / step - 1e-9), math.ceil(abs(edge.angle) * steps_per_radian - 1e-6))
    if edge.bulge == 0.0 or count == 1:
        return [edge.point(i / count) for i in range(count)]
    half = 0.5 * abs(edge.angle) / count
    push = half / math.sin(half)
    cx, cy = edge.centre
    inner = [edge.point(i / count) for i in range(1, count)]
    return [edge.start, *((cx + push * (x - cx), cy + push * (y - cy)) for x, y in inner)]


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
        for corners in region_triangles(region.boundary, settings, region.shadow):
            a, b, c = (index(corner, region.level) for corner in corners)
            if len({a, b, c}) == 3:
                triangles.append((a, b, c))
                level.append(region.level)
                source.append(region.source)
    mesh = Mesh(np.array(points), np.array(triangles), np.array(level), np.array(source))
    flipped = triangle_areas(mesh.corners) < 0.0
    ordered = np.where(flipped[:, None], mesh.triangles[:, ::-1], mesh.triangles)
    return Mesh(mesh.points, ordered, mesh.level, mesh.source)

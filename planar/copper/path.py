"""Centre lines, and the copper that follows them.

A `Path` is an open chain of edges that run smoothly into each other (or meet in a straight-sided
corner). Copper of a given width along a path is two offset copies of it: offsetting moves every
vertex along its normal and leaves bulges alone, because concentric arcs turn through equal angles.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from functools import cached_property

from planar.copper.arc import Edge, Point
from planar.copper.outline import NOTHING, Outline
from planar.copper.shapes import QUARTER
from planar.errors import GeometryError

SMOOTH = 1e-7
"""rad, edges that meet under a smaller angle run smoothly into each other."""


@dataclass(frozen=True)
class Path:
    """An open chain of `edges`, each starting where the one before ends."""

    edges: tuple[Edge, ...]

    @cached_property
    def length(self) -> float:
        """Length, m."""
        return math.fsum(edge.length for edge in self.edges)

    def at(self, distance: float) -> tuple[Point, Point]:
        """Point and unit tangent at `distance` m from the start."""
        for edge in self.edges:
            if distance <= edge.length or edge is self.edges[-1]:
                return edge.point(distance / edge.length), edge.tangent(distance / edge.length)
            distance -= edge.length
        raise GeometryError("a path without edges")

    def between(self, first: float, last: float) -> Path:
        """The part from `first` to `last` m along the path."""
        if not 0.0 <= first < last <= self.length * (1.0 + 1e-12):
            raise GeometryError(f"no path from {first} m to {last} m on one of {self.length} m")
        parts: list[Edge] = []
        position = 0.0
        for edge in self.edges:
            low, high = (first - position) / edge.length, (last - position) / edge.length
            low, high = max(0.0, low), min(1.0, high)
            if (high - low) * edge.length > 1e-12:
                parts.append(edge.part(low, high))
            position += edge.length
        return Path(tuple(parts))

    def reversed(self) -> Path:
        """The path walked backwards."""
        return Path(tuple(edge.reversed() for edge in reversed(self.edges)))

    def followed_by(self, other: Path) -> Path:
        """This path and then `other`, which starts where this one ends."""
        return Path(self.edges + other.edges)

    def offset(self, distance: float) -> list[Edge]:
        """Edges `distance` m to the left of the path. Raises `GeometryError` past an arc's centre."""
        for edge in self.edges:
            # left of a counter-clockwise arc lies its centre
            if edge.bulge != 0.0 and edge.radius - math.copysign(distance, distance * edge.bulge) < -NOTHING:
                raise GeometryError(f"a bend of radius {edge.radius * 1e3:.3f} mm is too tight for its copper")
        points = [self._offset_point(i, distance) for i in range(len(self.edges) + 1)]
        return [Edge(a, b, e.bulge) for a, b, e in zip(points, points[1:], self.edges, strict=False)]

    def _offset_point(self, index: int, distance: float) -> Point:
        before = self.edges[index - 1] if index > 0 else self.edges[0]
        after = self.edges[index] if index < len(self.edges) else self.edges[-1]
        x, y = after.start if index < len(self.edges) else before.end
        ux, uy = after.tangent(0.0) if index < len(self.edges) else before.tangent(1.0)
        if 0 < index < len(self.edges):
            vx, vy = before.tangent(1.0)
            turn = math.atan2(vx * uy - vy * ux, vx * ux + vy * uy)
            if abs(turn) > SMOOTH:  # a mitred corner: both offset lines meet on the bisector
                if before.bulge != 0.0 or after.bulge != 0.0:
                    raise GeometryError("only straight edges may meet in a corner")
                nx, ny = -(uy + vy), ux + vx
                scale = distance / (nx * -uy + ny * ux)
                return x + scale * nx, y + scale * ny
        return x - distance * uy, y + distance * ux


def band(path: Path, width: float) -> Outline:
    """Copper of `width` m along `path`, square ends."""
    return stepped_band([(path, width)])


def stepped_band(sections: Sequence[tuple[Path, float]]) -> Outline:
    """Copper along paths that follow each other, each with its own width m; widths change in steps."""
    right = [e for path, width in sections for e in _with_step(path.offset(-0.5 * width))]
    left = [e for path, width in reversed(sections) for e in _with_step(path.reversed().offset(-0.5 * width))]
    walk = right + left
    return Outline.closed((*edge.start, edge.bulge) for edge in walk)


def _with_step(edges: list[Edge]) -> list[Edge]:
    """`edges` and their last point, from which a straight step leads to what follows."""
    end = edges[-1].end
    return [edge for edge in edges if edge.chord > 0.0] + [Edge(end, end)]


def loop_path(width: float, height: float, corner_radius: float) -> Path:
    """Mean line of a loop `width` by `height` m about the origin, corners rounded to `corner_radius` m.

    It starts at the middle of the top side and runs counter-clockwise. A corner radius of half the
    smaller side makes a circle of a square; zero makes sharp corners.
    """
    a, b, r = 0.5 * width, 0.5 * height, corner_radius
    if not 0.0 <= r <= min(a, b) * (1.0 + 1e-12):
        raise GeometryError(
            f"a corner radius of {r * 1e3:.3f} mm does not fit {width * 1e3:.3f} by {height * 1e3:.3f} mm"
        )
    corners = [(-a, b), (-a, -b), (a, -b), (a, b)]
    along = [(-1.0, 0.0), (0.0, -1.0), (1.0, 0.0), (0.0, 1.0)]
    position: Point = (0.0, b)
    edges: list[Edge] = []
    for i, (x, y) in enumerate(corners):
        (ux, uy), (vx, vy) = along[i], along[(i + 1) % 4]
        enter, leave = (x - r * ux, y - r * uy), (x + r * vx, y + r * vy)
        edges += [Edge(position, enter), Edge(enter, leave, QUARTER)]
        position = leave
    edges.append(Edge(position, (0.0, b)))
    return Path(tuple(edge for edge in edges if edge.chord > 1e-12))

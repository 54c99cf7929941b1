"""A closed outline of straight segments and circular arcs: the only geometry of a board.

An `Outline` holds one row (x, y, bulge) per vertex, in metres; the bulge belongs to the edge that
starts there. Arcs stay arcs until a format forbids them. `normalised()` puts an outline on the
integer-nanometre grid in the one form every writer and the mesh use.
"""

from __future__ import annotations

import math
from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import NDArray
from shapely.geometry import Polygon
from shapely.validation import explain_validity

from planar.copper.arc import Edge, Point
from planar.errors import GeometryError

GRID = 1e-9
"""m, the grid every shipped outline lies on."""
NOTHING = 1e-12
"""m, edges shorter than this are none."""
SHORTEST_ARC = 2e-6
"""m, arcs shorter than this become chords: fabrication tools stumble over them, nobody sees them."""
CHECK_CHORD = 1e-6
"""m, chord error of the flattened copies that validity and distances are checked on."""


@dataclass(frozen=True, eq=False)
class Outline:
    """A closed outline. `vertices` (n, 3): x m, y m, bulge of the edge starting at the vertex."""

    vertices: NDArray[np.float64]

    def __post_init__(self) -> None:
        vertices = np.array(self.vertices, dtype=np.float64)
        if vertices.ndim != 2 or vertices.shape[1] != 3 or len(vertices) < 2:
            raise GeometryError(f"an outline needs rows of x, y, bulge, got shape {vertices.shape}")
        if not np.all(np.isfinite(vertices)):
            raise GeometryError("an outline has a vertex that is not finite")
        vertices.setflags(write=False)
        object.__setattr__(self, "vertices", vertices)

    @classmethod
    def closed(cls, rows: Iterable[Sequence[float]]) -> Outline:
        """Outline of vertex `rows` (x, y, bulge), those that repeat the place of the next one left out."""
        walk = [tuple(row) for row in rows]
        following = [*walk[1:], walk[0]]
        return cls(np.array([a for a, b in zip(walk, following, strict=True) if math.dist(a[:2], b[:2]) > NOTHING]))

    @classmethod
    def from_edges(cls, edges: Iterable[Edge]) -> Outline:
        """Outline through the start points of `edges`, which follow each other and close."""
        return cls(np.array([(*edge.start, edge.bulge) for edge in edges]))

    @classmethod
    def polygon(cls, points: Sequence[Point] | NDArray[np.float64]) -> Outline:
        """Outline of straight segments through `points` (n, 2), m."""
        corners = np.asarray(points, dtype=np.float64)
        return cls(np.column_stack([corners, np.zeros(len(corners))]))

    def __len__(self) -> int:
        return len(self.vertices)

    @cached_property
    def edges(self) -> tuple[Edge, ...]:
        """The edges in order."""
        rows = self.vertices.tolist()
        following = [*rows[1:], rows[0]]
        return tuple(Edge((x, y), (u, v), b) for (x, y, b), (u, v, _) in zip(rows, following, strict=True))

    @cached_property
    def area(self) -> float:
        """Signed area, m2, exact for arcs; positive when counter-clockwise."""
        x, y = (self.vertices[:, 0] - self.vertices[0, 0], self.vertices[:, 1] - self.vertices[0, 1])
        polygon = 0.5 * float(np.sum(x * np.roll(y, -1) - np.roll(x, -1) * y))
        return polygon + math.fsum(edge.segment_area for edge in self.edges)

    @cached_property
    def perimeter(self) -> float:
        """Length of the outline, m."""
        return math.fsum(edge.length for edge in self.edges)

    @cached_property
    def bounds(self) -> tuple[float, float, float, float]:
        """x_min, y_min, x_max, y_max in m, arcs included."""
        points = np.array([point for edge in self.edges for point in edge.extremes()])
        (x0, y0), (x1, y1) = points.min(axis=0), points.max(axis=0)
        return float(x0), float(y0), float(x1), float(y1)

    def reversed(self) -> Outline:
        """The outline walked the other way round."""
        return Outline.from_edges(edge.reversed() for edge in reversed(self.edges))

    def translated(self, dx: float, dy: float) -> Outline:
        """Moved by (dx, dy) m."""
        return Outline(self.vertices + np.array([dx, dy, 0.0]))

    def rotated(self, angle: float) -> Outline:
        """Turned counter-clockwise about the origin by `angle` rad."""
        c, s = math.cos(angle), math.sin(angle)
        x, y, bulge = self.vertices.T
        return Outline(np.column_stack([c * x - s * y, s * x + c * y, bulge]))

    def mirrored(self) -> Outline:
        """Left and right exchanged (x -> -x); the sense of rotation is kept."""
        return Outline(self.vertices * (-1.0, 1.0, -1.0)).reversed()

    def flattened(self, chord_error: float) -> NDArray[np.float64]:
        """Points (m, 2), m, of a polygon whose vertices lie on the outline.

        No chord is further than `chord_error` m from its arc; the first point is not repeated.
        """
        points: list[Point] = []
        fewest = 2 if len(self) == 2 else 1  # two arcs alone must not collapse onto their common chord
        for edge in self.edges:
            count = 1
            if edge.bulge != 0.0:
                half_step = math.acos(max(0.0, 1.0 - chord_error / edge.radius))
                count = max(fewest, math.ceil(abs(edge.angle) / (2.0 * half_step)))
            points += [edge.point(i / count) for i in range(count)]
        return np.array(points)

    def shape(self, chord_error: float = CHECK_CHORD) -> Polygon:
        """Flattened copy, in m, for checks of validity, distance and containment."""
        return Polygon(self.flattened(chord_error))

    def normalised(self) -> Outline:
        """The outline on the nanometre grid in its one form; normalising again changes nothing.

        Vertices are rounded to 1 nm, zero-length edges dropped, arcs shorter than 2 um turned into
        chords, arcs above a half circle split, and the sense made counter-clockwise. Raises
        `GeometryError` when no area is left or the outline touches itself.
        """
        edges = [half for edge in self.edges for half in _halves(edge)]
        rows = [[*(on_grid(c) for c in edge.start), edge.bulge] for edge in edges]
        rows = [row for row, nxt in zip(rows, [*rows[1:], rows[0]], strict=True) if row[:2] != nxt[:2]]
        if len(rows) < 2:
            raise GeometryError("an outline vanishes on the nanometre grid")
        snapped = Outline(np.array(rows))
        kept = [e if e.bulge == 0.0 or e.length >= SHORTEST_ARC else Edge(e.start, e.end) for e in snapped.edges]
        outline = Outline.from_edges(kept)
        if outline.area < 0.0:
            outline = outline.reversed()
        outline.check()
        return outline

    def check(self) -> None:
        """Raise `GeometryError` when the outline encloses nothing or touches itself."""
        if abs(self.area) < 1e-15:
            raise GeometryError("an outline encloses no area")
        flat = self.shape()
        if not flat.is_valid:
            raise GeometryError(f"an outline touches itself (metres): {explain_validity(flat)}")


def on_grid(length: float) -> float:
    """`length` m on the nanometre grid."""
    return round(length / GRID) * GRID


def _halves(edge: Edge) -> tuple[Edge, ...]:
    """The edge, or its two halves when it turns more than half a circle."""
    if abs(edge.bulge) <= 1.0:
        return (edge,)
    return edge.part(0.0, 0.5), edge.part(0.5, 1.0)

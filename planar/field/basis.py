"""Current functions on a mesh: edge functions, and vertical currents between levels.

On every triangle a function is c (r - v) with its own density c and anchor v, and its divergence is
2 c; so three sparse matrices, c, c v_x and c v_y by (function, triangle), say everything. An edge
function (Rao, Wilton & Glisson, IEEE Trans. AP-30 (1982) 409) lives on the two triangles of an edge.
A vertical function carries 1 A from one level to another: it leaves through a row of edges and
enters through another, half an edge function at each, its charge continuous.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy import sparse

from planar.copper.arc import Point
from planar.errors import GeometryError
from planar.field.mesh import Mesh


@dataclass(frozen=True)
class Row:
    """A straight row of triangle edges on `level` from `start` to `end` (m); the current uses the triangles on the
    side that `inward` points to."""

    level: int
    start: Point
    end: Point
    inward: Point


@dataclass(frozen=True)
class Vertical:
    """A current between two rows, `inductance` H in series."""

    upper: Row
    lower: Row
    inductance: float = 0.0


@dataclass(frozen=True, eq=False)
class Basis:
    """Functions on a mesh. `density`, `anchor_x`, `anchor_y` (n, triangles): c, c v_x, c v_y.

    The last `len(inductances)` functions are vertical currents with `inductances` H in series.
    """

    density: sparse.csr_array
    anchor_x: sparse.csr_array
    anchor_y: sparse.csr_array
    inductances: tuple[float, ...]

    @property
    def count(self) -> int:
        """Number of unknowns."""
        return int(self.density.shape[0])


def edges_of(mesh: Mesh) -> tuple[NDArray[np.int64], NDArray[np.int64], NDArray[np.int64]]:
    """Sides of all triangles: end points sorted (3 m, 2), triangle (3 m,), opposite corner (3 m,)."""
    count = len(mesh.triangles)
    sides = np.concatenate([mesh.triangles[:, [1, 2]], mesh.triangles[:, [2, 0]], mesh.triangles[:, [0, 1]]])
    opposite = mesh.triangles.T.ravel()
    return np.sort(sides, axis=1), np.tile(np.arange(count), 3), opposite


def build_basis(mesh: Mesh, verticals: Sequence[Vertical] = ()) -> Basis:
    """Edge functions of every inner edge of `mesh` and the `verticals`.

    Raises `GeometryError` for an edge with more than two triangles or a row without edges.
    """
    sides, triangle, opposite = edges_of(mesh)
    order = np.lexsort((triangle, sides[:, 1], sides[:, 0]))
    sides, triangle, opposite = sides[order], triangle[order], opposite[order]
    same = np.all(sides[1:] == sides[:-1], axis=1)
    if np.any(same[1:] & same[:-1]):
        raise GeometryError("an edge has more than two triangles: copper overlaps itself on one level")
    plus, minus = np.flatnonzero(same), np.flatnonzero(same) + 1
    count = len(plus)
    length = np.linalg.norm(mesh.points[sides[plus, 0]] - mesh.points[sides[plus, 1]], axis=1)
    entries = [
        (np.arange(count), triangle[side], sign * 0.5 * length / mesh.areas[triangle[side]], opposite[side])
        for side, sign in ((plus, 1.0), (minus, -1.0))
    ]
    for number, vertical in enumerate(verticals):
        for row, sign in ((vertical.upper, 1.0), (vertical.lower, -1.0)):
            chosen = _row_sides(mesh, sides, triangle, row)
            lengths = np.linalg.norm(mesh.points[sides[chosen, 0]] - mesh.points[sides[chosen, 1]], axis=1)
            density = sign * 0.5 * lengths / mesh.areas[triangle[chosen]] / lengths.sum()
            entries.append((np.full(len(chosen), count + number), triangle[chosen], density, opposite[chosen]))
    rows, columns, density, corner = (np.concatenate(parts) for parts in zip(*entries, strict=True))
    shape = (count + len(verticals), len(mesh.triangles))
    anchor = mesh.points[corner]

    def matrix(values: NDArray[np.float64]) -> sparse.csr_array:
        return sparse.coo_array((values, (rows, columns)), shape=shape).tocsr()

    return Basis(
        matrix(density),
        matrix(density * anchor[:, 0]),
        matrix(density * anchor[:, 1]),
        tuple(vertical.inductance for vertical in verticals),
    )


def _row_sides(mesh: Mesh, sides: NDArray[np.int64], triangle: NDArray[np.int64], row: Row) -> NDArray[np.int64]:
    """Sides that lie on `row` and belong to triangles on its inward side."""
    start, end = np.array(row.start), np.array(row.end)
    along = (end - start) / np.linalg.norm(end - start)
    normal = np.array([-along[1], along[0]])
    relative = mesh.points[sides] - start  # (n, 2, 2)
    on_line = np.all(np.abs(relative @ normal) < 1e-8, axis=1)
    place = relative @ along
    within = np.all((place > -1e-8) & (place < np.linalg.norm(end - start) + 1e-8), axis=1)
    inward = (mesh.centroids[triangle] - start) @ np.array(row.inward) > 0.0
    chosen = np.flatnonzero(on_line & within & inward & (mesh.level[triangle] == row.level))
    if not len(chosen):
        raise GeometryError(f"no copper edge for a vertical current at ({start[0] * 1e3:.3f}, {start[1] * 1e3:.3f}) mm")
    return chosen

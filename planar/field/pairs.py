"""Geometry of all pairs of triangles, worked out once per mesh and used at every frequency.

Near pairs: static images in closed form, the smooth rest by 3 by 3 points. Pairs a little apart: the
whole kernel by 3 by 3 points. Far pairs: one point each. What depends on frequency is a table over
the horizontal distance; what is kept here are interpolation weights into that table.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy import sparse

from planar.field.kernels import RhoGrid, SpatialKernel
from planar.field.mesh import Mesh
from planar.field.potentials import THREE_POINTS, static_moments

Array = NDArray[np.float64]
Complex = NDArray[np.complex128]
Indices = NDArray[np.int64]

NEAR = 1.5
"""Pairs with centroids closer than this many sums of triangle radii are near."""
MIDDLE = 3.0
"""Up to this many sums the 3 by 3 rule is used."""


@dataclass(frozen=True, eq=False)
class Samples:
    """Kernel samples of n pairs of triangles (p, q), s points a pair.

    `interpolation` (n s, count) takes a table over distance to the kernel at the points, times the product of the
    areas over s.
    """

    p: Indices
    q: Indices
    interpolation: sparse.csr_array

    def values(self, tables: Array) -> Complex:
        """Vector and scalar kernel at the points, times areas over s, (n s, 2), from `tables` (count, 4)."""
        return np.asarray((self.interpolation @ tables).view(np.complex128))


@dataclass(frozen=True, eq=False)
class WeightedSamples(Samples):
    """Samples with `weights` (n, 6, s): 1, x, y, x', y' and r . r' at the points, r in p and r' in q."""

    weights: Array

    def moments(self, tables: Array) -> tuple[Complex, Complex]:
        """The six moments of the vector kernel, (6, n), and the integral of the scalar kernel, (n,)."""
        pairs, _, points = self.weights.shape
        values = self.values(tables).view(np.float64).reshape(pairs, points, 4)
        moments = (self.weights @ values).view(np.complex128)
        return moments[..., 0].T, moments[:, 0, 1]


@dataclass(frozen=True, eq=False)
class LevelPairs:
    """All pairs of the triangles of two levels (p <= q on one level).

    `statics` (heights, 6, near): moments of the static images of the near pairs.
    """

    levels: tuple[int, int]
    near: WeightedSamples
    middle: WeightedSamples
    far: Samples
    statics: Array


def level_pairs(mesh: Mesh, levels: tuple[int, int], heights: Sequence[float], grid: RhoGrid) -> LevelPairs:
    """Pairs of triangles of two `levels` of `mesh`, for images at `heights` m and tables on `grid`."""
    ids = [np.flatnonzero(mesh.level == level) for level in levels]
    if levels[0] == levels[1]:
        i, j = np.triu_indices(len(ids[0]))
        p, q = ids[0][i], ids[0][j]
    else:
        p, q = (grid_side.ravel() for grid_side in np.meshgrid(ids[0], ids[1], indexing="ij"))
    radius = np.linalg.norm(mesh.corners - mesh.centroids[:, None], axis=2).max(axis=1)
    x, y = mesh.centroids.T
    apart = np.hypot(x[p] - x[q], y[p] - y[q]) / (radius[p] + radius[q])
    near, far = apart < NEAR, apart >= MIDDLE
    middle = ~near & ~far
    return LevelPairs(
        levels,
        _weighted_samples(mesh, p[near], q[near], grid),
        _weighted_samples(mesh, p[middle], q[middle], grid),
        _samples(mesh, p[far], q[far], mesh.centroids[:, None], grid),
        static_moments(mesh.corners[p[near]], mesh.corners[q[near]], heights),
    )


def _samples(mesh: Mesh, p: Indices, q: Indices, points: Array, grid: RhoGrid) -> Samples:
    """Each of the `points` (triangles, k, 2), equally weighted, in p against each in q."""
    x, y = points[..., 0], points[..., 1]
    rho = np.hypot(x[p][:, :, None] - x[q][:, None], y[p][:, :, None] - y[q][:, None])
    indices, weights = grid.weights(rho.ravel())
    count = points.shape[1] ** 2
    weights *= np.repeat(mesh.areas[p] * mesh.areas[q] / count, count)[:, None]
    starts = np.arange(0, indices.size + 1, indices.shape[1], dtype=np.int32)
    shape = (rho.size, grid.count)
    return Samples(p, q, sparse.csr_array((weights.ravel(), indices.ravel(), starts), shape=shape))


def _weighted_samples(mesh: Mesh, p: Indices, q: Indices, grid: RhoGrid) -> WeightedSamples:
    """Three points in p against three in q."""
    points = np.einsum("kc,tcd->tkd", THREE_POINTS, mesh.corners)
    count = len(THREE_POINTS)
    weights = np.ones((len(p), 6, count, count))
    weights[:, 1:3] = points[p].swapaxes(1, 2)[..., None]
    weights[:, 3:5] = points[q].swapaxes(1, 2)[:, :, None]
    weights[:, 5] = points[p] @ points[q].swapaxes(1, 2)
    samples = _samples(mesh, p, q, points, grid)
    return WeightedSamples(p, q, samples.interpolation, weights.reshape(len(p), 6, count**2))


@dataclass(frozen=True, eq=False)
class TriangleMatrices:
    """Kernel moments between all triangles, each (t, t) complex.

    `zero`, `second_x`, `second_y`, `product` of the vector kernel (second: weighted with the column's point),
    `scalar` of the scalar kernel.
    """

    zero: Complex
    second_x: Complex
    second_y: Complex
    product: Complex
    scalar: Complex


def triangle_matrices(
    centroids: Array, pairs: Sequence[LevelPairs], kernels: Sequence[SpatialKernel], grid: RhoGrid
) -> TriangleMatrices:
    """Moments between all triangles, with `centroids` (t, 2), from the `pairs` and their `kernels` at one frequency."""
    count = len(centroids)
    zero, scalar = (np.zeros((count, count), dtype=np.complex128) for _ in range(2))
    tables = [_tables(kernel, grid) for kernel in kernels]
    # far pairs are one point each: their moments follow from the kernel between centroids
    for each, (_, whole) in zip(pairs, tables, strict=True):
        values = each.far.values(whole)
        _put_both_ways(zero, each.far, values[:, 0])
        _put_both_ways(scalar, each.far, values[:, 1])
    second_x, second_y = (zero * each for each in centroids.T)
    product = zero * (centroids @ centroids.T)
    for each, kernel, (smooth, whole) in zip(pairs, kernels, tables, strict=True):
        near, near_charges = each.near.moments(smooth)
        images, image_charges = _image_moments(each.statics, kernel)
        for samples, moments, charges in (
            (each.near, near + images, near_charges + image_charges),
            (each.middle, *each.middle.moments(whole)),
        ):
            p, q = samples.p, samples.q
            for matrix, values in ((zero, moments[0]), (product, moments[5]), (scalar, charges)):
                _put_both_ways(matrix, samples, values)
            second_x[q, p], second_y[q, p], second_x[p, q], second_y[p, q] = moments[1:5]
    return TriangleMatrices(zero, second_x, second_y, product, scalar)


def _put_both_ways(matrix: Complex, samples: Samples, values: Complex) -> None:
    matrix[samples.p, samples.q] = values
    matrix[samples.q, samples.p] = values


def _tables(kernel: SpatialKernel, grid: RhoGrid) -> tuple[Array, Array]:
    """Real tables (count, 4) of the smooth rest and of the whole kernel: vector re, im, scalar re, im."""
    rho = np.maximum(grid.points, 1e-9)
    vector, scalar = kernel.vector_table.copy(), kernel.scalar_table.copy()
    for height, a, phi in zip(kernel.heights, kernel.vector_images, kernel.scalar_images, strict=True):
        image = 1.0 / (4.0 * np.pi * np.sqrt(rho**2 + height**2))
        vector = vector + a * image
        scalar = scalar + phi * image

    def columns(a: Complex, phi: Complex) -> Array:
        return np.column_stack([a.real, a.imag, phi.real, phi.imag])

    return columns(kernel.vector_table, kernel.scalar_table), columns(vector, scalar)


def _image_moments(statics: Array, kernel: SpatialKernel) -> tuple[Complex, Complex]:
    """The six moments of the vector kernel's images, (6, n), and the integral of the scalar kernel's, (n,)."""
    vector, scalar = kernel.vector_images / (4.0 * np.pi), kernel.scalar_images / (4.0 * np.pi)
    return np.tensordot(vector, statics, axes=1), scalar @ statics[:, 0]

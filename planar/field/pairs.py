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

from planar.field.kernels import RhoGrid, SpatialKernel
from planar.field.mesh import Mesh
from planar.field.potentials import THREE_POINTS, PairMoments, static_moments

Array = NDArray[np.float64]
Complex = NDArray[np.complex128]
Indices = NDArray[np.int64]

NEAR = 1.5
"""Pairs with centroids closer than this many sums of triangle radii are near."""
MIDDLE = 3.0
"""Up to this many sums the 3 by 3 rule is used."""


@dataclass(frozen=True, eq=False)
class Samples:
    """Kernel samples of pairs: table indices and weights (n, s, 4) for s points a pair, and the points used.

    `first`, `second` (n, s, 2) points in p and q; `share` (n,) product of areas over s.
    """

    p: Indices
    q: Indices
    indices: NDArray[np.int32]
    weights: Array
    first: Array
    second: Array
    share: Array

    def values(self, tables: Array) -> tuple[Complex, Complex]:
        """Vector and scalar kernel at the points, (n, s) each, times the areas, from `tables` (count, 4)."""
        values = np.einsum("nsq,nsqk->nsk", self.weights, tables[self.indices]) * self.share[:, None, None]
        pairs = values.view(np.complex128)
        return pairs[..., 0], pairs[..., 1]

    def moments(self, tables: Array) -> tuple[PairMoments, Complex]:
        """Moments of the vector kernel and `zero` of the scalar kernel from `tables` (count, 4)."""
        vector, charges = self.values(tables)
        scalar = charges.sum(axis=1)
        zero = vector.sum(axis=1)
        first = np.einsum("ns,nsk->nk", vector, self.first)
        second = np.einsum("ns,nsk->nk", vector, self.second)
        product = np.einsum("ns,ns->n", vector, np.einsum("nsk,nsk->ns", self.first, self.second))
        return PairMoments(zero, first, second, product), scalar


@dataclass(frozen=True, eq=False)
class LevelPairs:
    """All pairs of the triangles of two levels (p <= q on one level)."""

    levels: tuple[int, int]
    near: Samples
    middle: Samples
    far: Samples
    heights: tuple[float, ...]
    statics: tuple[PairMoments, ...]


def level_pairs(mesh: Mesh, levels: tuple[int, int], heights: Sequence[float], grid: RhoGrid) -> LevelPairs:
    """Pairs of triangles of two `levels` of `mesh`, for images at `heights` m and tables on `grid`."""
    ids = [np.flatnonzero(mesh.level == level) for level in levels]
    if levels[0] == levels[1]:
        i, j = np.triu_indices(len(ids[0]))
        p, q = ids[0][i], ids[0][j]
    else:
        p, q = (grid_side.ravel() for grid_side in np.meshgrid(ids[0], ids[1], indexing="ij"))
    radius = np.linalg.norm(mesh.corners - mesh.centroids[:, None], axis=2).max(axis=1)
    apart = np.linalg.norm(mesh.centroids[p] - mesh.centroids[q], axis=1) / (radius[p] + radius[q])
    near, far = apart < NEAR, apart >= MIDDLE
    middle = ~near & ~far
    statics = tuple(static_moments(mesh.corners[p[near]], mesh.corners[q[near]], h) for h in heights)
    return LevelPairs(
        levels,
        _samples(mesh, p[near], q[near], THREE_POINTS, grid),
        _samples(mesh, p[middle], q[middle], THREE_POINTS, grid),
        _samples(mesh, p[far], q[far], np.full((1, 3), 1.0 / 3.0), grid),
        tuple(heights),
        statics,
    )


def _samples(mesh: Mesh, p: Indices, q: Indices, rule: Array, grid: RhoGrid) -> Samples:
    """Every point of `rule` (equal weights) in p against every one in q."""
    count = len(rule)
    points = np.einsum("sc,tck->tsk", rule, mesh.corners)
    first = np.repeat(points[p], count, axis=1)
    second = np.tile(points[q], (1, count, 1))
    rho = np.linalg.norm(first - second, axis=2)
    indices, weights = grid.weights(rho.ravel())
    shape = (*rho.shape, 4)
    share = mesh.areas[p] * mesh.areas[q] / count**2
    return Samples(p, q, indices.reshape(shape), weights.reshape(shape), first, second, share)


@dataclass(frozen=True, eq=False)
class TriangleMatrices:
    """Kernel moments between all triangles, each (t, t) complex.

    `zero`, `first_x`, `first_y`, `product` of the vector kernel (first: weighted with the row's point),
    `scalar` of the scalar kernel.
    """

    zero: Complex
    first_x: Complex
    first_y: Complex
    product: Complex
    scalar: Complex


def triangle_matrices(
    centroids: Array, pairs: Sequence[LevelPairs], kernels: Sequence[SpatialKernel], grid: RhoGrid
) -> TriangleMatrices:
    """Moments between all triangles, with `centroids` (t, 2), from the `pairs` and their `kernels` at one frequency."""
    count = len(centroids)
    zero, scalar = (np.zeros((count, count), dtype=np.complex128) for _ in range(2))

    def put(samples: Samples, moments: PairMoments, charges: Complex) -> None:
        p, q = samples.p, samples.q
        zero[p, q] = moments.zero
        zero[q, p] = moments.zero
        product[p, q] = moments.product
        product[q, p] = moments.product
        scalar[p, q] = charges
        scalar[q, p] = charges
        for matrix, axis in ((first_x, 0), (first_y, 1)):
            matrix[p, q] = moments.first[:, axis]
            matrix[q, p] = moments.second[:, axis]

    # far pairs are one point each: their moments follow from the kernel between centroids
    tables = [_tables(kernel, grid) for kernel in kernels]
    for each, (_, whole) in zip(pairs, tables, strict=True):
        vector, charges = each.far.values(whole)
        for matrix, values in ((zero, vector[:, 0]), (scalar, charges[:, 0])):
            matrix[each.far.p, each.far.q] = values
            matrix[each.far.q, each.far.p] = values
    x, y = centroids.T
    first_x, first_y = zero * x[:, None], zero * y[:, None]
    product = first_x * x + first_y * y
    for each, kernel, (smooth, whole) in zip(pairs, kernels, tables, strict=True):
        put(each.near, *_with_images(each, kernel, each.near.moments(smooth)))
        put(each.middle, *each.middle.moments(whole))
    return TriangleMatrices(zero, first_x, first_y, product, scalar)


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


def _with_images(
    pairs: LevelPairs, kernel: SpatialKernel, smooth: tuple[PairMoments, Complex]
) -> tuple[PairMoments, Complex]:
    moments, scalar = smooth
    zero, first, second, product = moments.zero, moments.first, moments.second, moments.product
    for static, a, phi in zip(pairs.statics, kernel.vector_images, kernel.scalar_images, strict=True):
        vector = a / (4.0 * np.pi)
        zero = zero + vector * static.zero
        first = first + vector * static.first
        second = second + vector * static.second
        product = product + vector * static.product
        scalar = scalar + phi / (4.0 * np.pi) * static.zero
    return PairMoments(zero, first, second, product), scalar

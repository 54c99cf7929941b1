"""Moments between all triangles for kernels whose integrals are known."""

import numpy as np
import pytest
from numpy.typing import NDArray

from planar.field.kernels import RhoGrid, SpatialKernel
from planar.field.mesh import Mesh
from planar.field.pairs import TriangleMatrices, level_pairs, triangle_matrices
from planar.field.potentials import static_moments

GRID = RhoGrid(15.0)
VECTOR, SCALAR = 2.0 - 1.0j, 3.0j


def strip(cells: int) -> Mesh:
    """Unit squares in a row, halved, on each of two levels."""
    x = np.arange(cells + 1.0)
    points = np.concatenate([np.column_stack([x, np.zeros_like(x)]), np.column_stack([x, np.ones_like(x)])])
    low = np.arange(cells)
    high = low + cells + 1
    halves = [np.column_stack([low, low + 1, high]), np.column_stack([low + 1, high + 1, high])]
    triangles = np.concatenate([*halves, *halves])
    return Mesh(points, triangles, np.repeat([0, 1], 2 * cells), np.zeros(4 * cells, dtype=bool))


def matrices(mesh: Mesh, images: tuple[complex, complex], table: tuple[complex, complex]) -> TriangleMatrices:
    """Of a kernel that is an image 1/R half a unit below plus a constant, the same between all levels."""
    vector, scalar = (np.array([4.0 * np.pi * image]) for image in images)
    kernel = SpatialKernel((0.5,), vector, scalar, *(np.full(GRID.count, value, dtype=complex) for value in table))
    pairs = [level_pairs(mesh, levels, kernel.heights, GRID) for levels in ((0, 0), (0, 1), (1, 1))]
    return triangle_matrices(mesh.centroids, pairs, [kernel] * 3, GRID)


@pytest.mark.parametrize("cells", [1, 12], ids=["all near", "near, middle and far"])
def test_constant_kernel(cells: int) -> None:
    """Exact: a constant times areas and first moments, whatever the distance."""
    mesh = strip(cells)
    found = matrices(mesh, (0.0, 0.0), (VECTOR, SCALAR))
    x, y = mesh.centroids.T
    areas: NDArray[np.float64] = np.outer(mesh.areas, mesh.areas)
    for matrix, expected in (
        (found.zero, VECTOR * areas),
        (found.second_x, VECTOR * areas * x),
        (found.second_y, VECTOR * areas * y),
        (found.product, VECTOR * areas * (np.outer(x, x) + np.outer(y, y))),
        (found.scalar, SCALAR * areas),
    ):
        np.testing.assert_allclose(matrix, expected, rtol=1e-12)


def test_image_alone() -> None:
    """Near pairs are the closed form. The others are a rule of 3 by 3 points or 1 by 1: from 4.5 units on the latter
    leaves out the second moments, (1/9 + 1/9)/4.5^2 of the kernel or 1 %."""
    mesh = strip(12)
    found = matrices(mesh, (VECTOR, SCALAR), (0.0, 0.0))
    p, q = (grid.ravel() for grid in np.indices(found.zero.shape))
    zero, _, _, x, y, product = static_moments(mesh.corners[p], mesh.corners[q], [0.5])[0]
    near = np.linalg.norm(mesh.centroids[p] - mesh.centroids[q], axis=1) < 2.0
    for matrix, factor, expected in (
        (found.zero, VECTOR, zero),
        (found.second_x, VECTOR, x),
        (found.second_y, VECTOR, y),
        (found.product, VECTOR, product),
        (found.scalar, SCALAR, zero),
    ):
        np.testing.assert_allclose(matrix[p, q][near], factor * expected[near], rtol=1e-12)
    np.testing.assert_allclose(found.zero[p, q], VECTOR * zero, rtol=1e-2)
    np.testing.assert_allclose(found.scalar[p, q], SCALAR * zero, rtol=1e-2)

"""The moment matrix, and its solution for a port.

Z = j omega <f_m, G_A f_n> + 1/(j omega) <div f_m, K_phi div f_n> + <f_m, Z_s f_n> (Michalski & Mosig
1997, formulation C), with the pair integrals of `pairs` and the functions of `basis`. Vertical
currents add their own partial inductance in series.
"""

from __future__ import annotations

import math

import numpy as np
from numpy.typing import NDArray
from scipy import sparse

from planar.field.basis import Basis
from planar.field.mesh import Mesh
from planar.field.pairs import TriangleMatrices

Complex = NDArray[np.complex128]
BLOCK = 64
"""Functions worked on at a time, so that intermediate results stay in cache."""


def moment_matrix(basis: Basis, moments: TriangleMatrices, frequency: float) -> Complex:
    """Field part of the moment matrix, (n, n) ohm, without conductor loss. `frequency` in Hz."""
    omega = 2.0 * math.pi * frequency
    density, x, y = basis.density, basis.anchor_x, basis.anchor_y
    left = sparse.hstack([density, x, y], format="csr")
    # the divergence is 2 c, so charges weigh like r . r' and join that term
    product = 0.5 * moments.product - 2.0 / omega**2 * moments.scalar
    # half of each symmetric term and one of the two mixed ones: the transpose adds the rest
    half = np.empty((basis.count, basis.count), dtype=np.complex128)
    for start in range(0, basis.count, BLOCK):
        block = slice(start, start + BLOCK)
        c, c_x, c_y = density[block], x[block], y[block]
        on_density = _times(c, product) - _times(c_x, moments.second_x) - _times(c_y, moments.second_y)
        on_anchors = (0.5 * _times(each, moments.zero) for each in (c_x, c_y))
        half[:, block] = _times(left, np.concatenate([on_density, *on_anchors], axis=1).T)
    half *= 1j * omega
    matrix: Complex = half + half.T
    for i, inductance in enumerate(basis.inductances, start=basis.count - len(basis.inductances)):
        matrix[i, i] += 1j * omega * inductance
    return matrix


def _times(sparse_matrix: sparse.csr_array, dense: Complex) -> Complex:
    """Product of a real sparse and a complex dense matrix, real and imaginary parts side by side."""
    columns = np.ascontiguousarray(dense).view(np.float64)
    product: Complex = (sparse_matrix @ columns).view(np.complex128)
    return product


def overlap_matrix(basis: Basis, mesh: Mesh) -> sparse.csr_array:
    """<f_m, f_n> over the copper, (n, n), dimensionless for edge functions; source cells are no copper."""
    area = np.where(mesh.source, 0.0, mesh.areas)
    corners = mesh.corners
    centroid = mesh.centroids
    square = area * (np.sum(corners**2, axis=(1, 2)) + 9.0 * np.sum(centroid**2, axis=1)) / 12.0
    density, x, y = basis.density, basis.anchor_x, basis.anchor_y

    def weighted(left: sparse.csr_array, weight: NDArray[np.float64], right: sparse.csr_array) -> sparse.csr_array:
        return (left @ sparse.diags_array(weight) @ right.T).tocsr()

    cross = weighted(density, area * centroid[:, 0], x) + weighted(density, area * centroid[:, 1], y)
    overlap = weighted(density, square, density) - cross - cross.T + weighted(x, area, x) + weighted(y, area, y)
    return sparse.csr_array(overlap)


def gap_excitation(basis: Basis, mesh: Mesh, cells: NDArray[np.bool_], field: NDArray[np.float64]) -> Complex:
    """<f_m, E> for a uniform `field` (x, y) V/m over the source `cells`, (n,) V."""
    area = np.where(cells, mesh.areas, 0.0)
    first = mesh.centroids * area[:, None]
    moment_x = basis.density @ first[:, 0] - basis.anchor_x @ area
    moment_y = basis.density @ first[:, 1] - basis.anchor_y @ area
    return np.asarray(field[0] * moment_x + field[1] * moment_y, dtype=np.complex128)

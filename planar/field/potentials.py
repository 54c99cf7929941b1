"""Static potentials of triangles, in closed form, and the pair integrals made from them.

A static image is 1/R with R^2 = rho^2 + h^2. Its integral over a triangle, alone and weighted with
the source point, is known (Wilton et al., IEEE Trans. AP-32 (1984) 276); the outer integral over the
other triangle is a 7-point rule, taken both ways round and averaged, so that pairs stay symmetric.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]

# Points and weights on the unit triangle (barycentric), exact to degree 2 and 5 (Dunavant 1985).
THREE_POINTS = np.array([[2 / 3, 1 / 6, 1 / 6], [1 / 6, 2 / 3, 1 / 6], [1 / 6, 1 / 6, 2 / 3]])
THREE_WEIGHTS = np.full(3, 1 / 3)
_A, _B = (6.0 - np.sqrt(15.0)) / 21.0, (6.0 + np.sqrt(15.0)) / 21.0
SEVEN_POINTS = np.array(
    [[1 / 3] * 3]
    + [[1 - 2 * _A if i == j else _A for j in range(3)] for i in range(3)]
    + [[1 - 2 * _B if i == j else _B for j in range(3)] for i in range(3)]
)
SEVEN_WEIGHTS = np.array([9 / 40] + [(155.0 - np.sqrt(15.0)) / 1200.0] * 3 + [(155.0 + np.sqrt(15.0)) / 1200.0] * 3)


@dataclass(frozen=True, eq=False)
class PairMoments:
    """Double integrals over triangle pairs (p, q) of a kernel G, each (n,) or (n, 2).

    `zero` of G, `first` of r G, `second` of r' G, `product` of r . r' G; r runs over p, r' over q.
    """

    zero: NDArray[Any]
    first: NDArray[Any]
    second: NDArray[Any]
    product: NDArray[Any]


def triangle_potentials(points: Array, corners: Array, height: float) -> tuple[Array, Array]:
    """Integrals of 1/R and r'/R over triangles, seen from points `height` above their plane.

    `points` (n, 2), `corners` (n, 3, 2) counter-clockwise; returns (n,) in m and (n, 2) in m2. Wilton
    et al. 1984, eqs. 5 and 6.
    """
    d2 = height * height
    zero = np.zeros(len(points))
    linear = np.zeros_like(points)
    for side in range(3):
        start, end = corners[:, side], corners[:, (side + 1) % 3]
        along = end - start
        along = along / np.linalg.norm(along, axis=1)[:, None]
        outward = np.column_stack([along[:, 1], -along[:, 0]])
        low = np.einsum("nk,nk->n", start - points, along)
        high = np.einsum("nk,nk->n", end - points, along)
        away = np.einsum("nk,nk->n", start - points, outward)
        r0_squared = away * away + d2
        r_low, r_high = np.sqrt(r0_squared + low * low), np.sqrt(r0_squared + high * high)
        # (R+ + l+)/(R- + l-), turned round where l is negative so that nothing cancels
        forward = low + high >= 0.0
        top = np.where(forward, r_high + high, r_low - low)
        base = np.where(forward, r_low + low, r_high - high)
        on_line = r0_squared <= 1e-30
        logarithm = np.log(np.where(on_line, 1.0, top) / np.where(on_line, 1.0, np.maximum(base, 1e-300)))
        zero += np.where(on_line, 0.0, away * logarithm)
        if height > 0.0:
            zero -= height * (
                np.arctan2(away * high, r0_squared + height * r_high)
                - np.arctan2(away * low, r0_squared + height * r_low)
            )
        edge = 0.5 * (np.where(on_line, 0.0, r0_squared * logarithm) + high * r_high - low * r_low)
        linear += edge[:, None] * outward
    return zero, linear + zero[:, None] * points


def static_moments(first: Array, second: Array, height: float) -> PairMoments:
    """Moments of 1/R over pairs of triangles, corners (n, 3, 2) each, `height` m apart."""
    one = _one_way(first, second, height)
    other = _one_way(second, first, height)
    return PairMoments(
        0.5 * (one.zero + other.zero),
        0.5 * (one.first + other.second),
        0.5 * (one.second + other.first),
        0.5 * (one.product + other.product),
    )


def _one_way(first: Array, second: Array, height: float) -> PairMoments:
    """Outer rule over `first`, closed form over `second`."""
    count = len(first)
    area = 0.5 * np.abs(_cross(first[:, 1] - first[:, 0], first[:, 2] - first[:, 0]))
    zero, into_first = np.zeros(count), np.zeros((count, 2))
    into_second, product = np.zeros((count, 2)), np.zeros(count)
    for barycentric, weight in zip(SEVEN_POINTS, SEVEN_WEIGHTS, strict=True):
        points = np.einsum("c,nck->nk", barycentric, first)
        potential, linear = triangle_potentials(points, second, height)
        w = weight * area
        zero += w * potential
        into_first += (w * potential)[:, None] * points
        into_second += w[:, None] * linear
        product += w * np.einsum("nk,nk->n", points, linear)
    return PairMoments(zero, into_first, into_second, product)


def _cross(a: Array, b: Array) -> Array:
    return a[:, 0] * b[:, 1] - a[:, 1] * b[:, 0]

"""Static potentials of triangles, in closed form, and the pair integrals made from them.

A static image is 1/R with R^2 = rho^2 + h^2. Its integral over a triangle, alone and weighted with
the source point, is known (Wilton et al., IEEE Trans. AP-32 (1984) 276); the outer integral over the
other triangle is a 7-point rule, taken both ways round and averaged, so that pairs stay symmetric.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

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

EXCHANGED = [0, 3, 4, 1, 2, 5]
"""Order of the six moments (1, x, y, x', y', r . r') with the two triangles exchanged."""
BLOCK = 1024
"""Pairs worked on at a time, so that intermediate results stay in cache."""


def triangle_potentials(points: Array, corners: Array, heights: Sequence[float]) -> Array:
    """Integrals of 1/R, x'/R and y'/R over triangles, seen from points at `heights` (h,) m above their plane.

    `points` (..., n, 2), `corners` (n, 3, 2) counter-clockwise; returns (h, 3, ..., n), the first in m, the others in
    m2. Wilton et al. 1984, eqs. 5 and 6; their arc tangents together are the solid angle, here by Van Oosterom &
    Strackee, IEEE Trans. Biomed. Eng. BME-30 (1983) 125.
    """
    view = _View.of(points, corners)
    potentials = np.empty((len(heights), 3, *points.shape[:-1]))
    for at, height in zip(potentials, heights, strict=True):
        at[:] = view.potentials(height)
        at[1] += at[0] * points[..., 0]
        at[2] += at[0] * points[..., 1]
    return potentials


@dataclass(frozen=True, eq=False)
class _View:
    """Triangles seen from points in their plane: what potentials at all heights share. Lists are over the three sides.

    `lengths`, `outward_x`, `outward_y` (n,) of the sides; `low` and `away` (..., n), their starts along and across
    them from the point; `squares` and `products` (..., n) of the vectors to the starts, with themselves and with the
    next; `double_area` (n,).
    """

    lengths: list[Array]
    outward_x: list[Array]
    outward_y: list[Array]
    low: list[Array]
    away: list[Array]
    squares: list[Array]
    products: list[Array]
    double_area: Array

    @classmethod
    def of(cls, points: Array, corners: Array) -> _View:
        x, y = ([corners[:, i, axis] - points[..., axis] for i in range(3)] for axis in (0, 1))
        sides = np.roll(corners, -1, axis=1) - corners
        lengths = list(np.hypot(sides[..., 0], sides[..., 1]).T)
        outward_x = [sides[:, i, 1] / lengths[i] for i in range(3)]
        outward_y = [-sides[:, i, 0] / lengths[i] for i in range(3)]
        return cls(
            lengths,
            outward_x,
            outward_y,
            [y[i] * outward_x[i] - x[i] * outward_y[i] for i in range(3)],
            [x[i] * outward_x[i] + y[i] * outward_y[i] for i in range(3)],
            [x[i] ** 2 + y[i] ** 2 for i in range(3)],
            [x[i] * x[i - 2] + y[i] * y[i - 2] for i in range(3)],
            sides[:, 0, 0] * sides[:, 1, 1] - sides[:, 0, 1] * sides[:, 1, 0],
        )

    def potentials(self, height: float) -> tuple[Array, Array, Array]:
        """Integrals of 1/R, (x' - x)/R and (y' - y)/R from `height` above the points."""
        d2 = height * height
        r = [np.sqrt(square + d2) for square in self.squares]
        zero, linear_x, linear_y = (np.zeros_like(r[0]) for _ in range(3))
        for i in range(3):
            start, end, length, low, away = r[i], r[i - 2], self.lengths[i], self.low[i], self.away[i]
            both = start + end
            # log((both + length)/(both - length)); the floor acts only on the side itself, where its factors vanish
            logarithm = np.log1p(2.0 * length / np.maximum(both - length, 1e-16 * length))
            zero += away * logarithm
            # high end - low start, where end - start = length (low + high)/both, so that nothing cancels far away
            rest = length * (end + low * (2.0 * low + length) / both)
            edge = 0.5 * ((away * away + d2) * logarithm + rest)
            linear_x += edge * self.outward_x[i]
            linear_y += edge * self.outward_y[i]
        if height > 0.0:
            across = r[0] * r[1] * r[2] + sum((self.products[i] + d2) * r[i - 1] for i in range(3))
            zero -= 2.0 * height * np.arctan2(height * self.double_area, across)
        return zero, linear_x, linear_y


def static_moments(first: Array, second: Array, heights: Sequence[float]) -> Array:
    """Moments of 1/R over pairs of triangles, corners (n, 3, 2) each, `heights` (h,) m apart.

    Returns (h, 6, n): double integrals of 1, x, y, x', y' and r . r' over R, with r over the first and r' over the
    second triangle.
    """
    moments = np.empty((len(heights), 6, len(first)))
    for start in range(0, len(first), BLOCK):
        block = slice(start, start + BLOCK)
        one = _one_way(first[block], second[block], heights)
        other = _one_way(second[block], first[block], heights)
        moments[..., block] = 0.5 * (one + other[:, EXCHANGED])
    return moments


def _one_way(first: Array, second: Array, heights: Sequence[float]) -> Array:
    """Outer rule over `first`, closed form over `second`."""
    points = np.einsum("kc,ncd->knd", SEVEN_POINTS, first)
    x, y = points[..., 0], points[..., 1]
    (ux, uy), (vx, vy) = (first[:, 1] - first[:, 0]).T, (first[:, 2] - first[:, 0]).T
    weights = 0.5 * np.abs(ux * vy - uy * vx) * SEVEN_WEIGHTS[:, None]
    zero, linear_x, linear_y = np.moveaxis(weights * triangle_potentials(points, second, heights), 1, 0)
    terms = (zero, zero * x, zero * y, linear_x, linear_y, linear_x * x + linear_y * y)
    return np.stack([term.sum(axis=1) for term in terms], axis=1)

"""Potentials of triangles against numeric quadrature, and the symmetries of pair integrals."""

import math

import numpy as np
import pytest
from numpy.typing import NDArray
from scipy.integrate import dblquad, quad

from planar.field.potentials import (
    BLOCK,
    SEVEN_POINTS,
    SEVEN_WEIGHTS,
    THREE_POINTS,
    THREE_WEIGHTS,
    static_moments,
    triangle_potentials,
)

Array = NDArray[np.float64]

TRIANGLE = np.array([[0.2, -0.1], [1.3, 0.3], [0.5, 0.9]])
SLIVER = np.array([[0.0, 0.0], [1.0, 0.0], [1.0, 0.08]])


def over_triangle(corners: Array, point: Array, height: float) -> tuple[float, Array]:
    """int dS'/R and int r' dS'/R by scipy's adaptive rule on the unit triangle."""
    a, u, v = corners[0], corners[1] - corners[0], corners[2] - corners[0]
    jacobian = abs(u[0] * v[1] - u[1] * v[0])

    def kernel(t: float, s: float, axis: int) -> float:
        source = a + s * u + t * v
        weight = 1.0 if axis < 0 else float(source[axis])
        return jacobian * weight / math.hypot(*(source - point), height)

    values = [dblquad(kernel, 0.0, 1.0, 0.0, lambda s: 1.0 - s, args=(axis,))[0] for axis in (-1, 0, 1)]
    return values[0], np.array(values[1:])


@pytest.mark.parametrize("corners", [TRIANGLE, SLIVER], ids=["triangle", "sliver"])
@pytest.mark.parametrize(
    ("point", "height"), [((2.0, 1.0), 0.0), ((0.6, 0.03), 0.3), ((0.2, -0.1), 0.2), ((-1.0, 0.0), 0.05)]
)
def test_potentials(corners: Array, point: tuple[float, float], height: float) -> None:
    """From outside and from above; the numeric rule is good to about 1e-8."""
    zero, *linear = triangle_potentials(np.array([point]), corners[None], [height])[0, :, 0]
    expected, weighted = over_triangle(corners, np.array(point), height)
    assert zero == pytest.approx(expected, rel=1e-7)
    assert linear == pytest.approx(weighted, rel=1e-7, abs=1e-9)


@pytest.mark.parametrize("corners", [TRIANGLE, SLIVER], ids=["triangle", "sliver"])
def test_potential_inside_its_own_triangle(corners: Array) -> None:
    """In polar coordinates about the point 1/R cancels: int dS/R is the integral of the distance to the rim."""
    point = np.array([0.5, 0.2, 0.3]) @ corners
    expected = 0.0
    for start, end in zip(corners, np.roll(corners, -1, axis=0), strict=True):
        along = (end - start) / np.linalg.norm(end - start)
        away = abs(float((start - point) @ [along[1], -along[0]]))
        low, high = (math.atan2(float((p - point) @ along), away) for p in (start, end))
        expected += quad(lambda angle, away=away: away / math.cos(angle), low, high)[0]
    potentials = triangle_potentials(point[None], corners[None], [0.0])
    assert potentials[0, 0, 0] == pytest.approx(expected, rel=1e-10)


def test_height_zero_is_the_limit() -> None:
    """Exact limit, also at points on an edge and on a corner."""
    points = np.array([[0.6, 0.2], TRIANGLE[0], 0.5 * (TRIANGLE[0] + TRIANGLE[1])])
    corners = np.repeat(TRIANGLE[None], 3, axis=0)
    flat, low = triangle_potentials(points, corners, [0.0, 1e-9])
    assert flat == pytest.approx(low, rel=1e-6)


def test_potential_under_the_middle_of_a_square() -> None:
    """Exact, four triangles about their common corner: the solid angle of a square of half side a seen from height a
    is 2 pi/3, a sixth of the sphere; its potential is 8 a asinh(1/sqrt 2) less a times that."""
    rim = np.array([[1.0, -1.0], [1.0, 1.0], [-1.0, 1.0], [-1.0, -1.0]])
    corners = np.stack([np.zeros((4, 2)), rim, np.roll(rim, -1, axis=0)], axis=1)
    potentials = triangle_potentials(np.zeros((4, 2)), corners, [1.0])[0]
    expected = 8.0 * math.asinh(1.0 / math.sqrt(2.0)) - 2.0 * math.pi / 3.0
    assert potentials[0].sum() == pytest.approx(expected, rel=1e-14)
    assert potentials[1:].sum(axis=1) == pytest.approx(np.zeros(2), abs=1e-14)


@pytest.mark.parametrize("height", [0.0, 0.5], ids=["flat", "above"])
def test_small_triangles_far_away(height: float) -> None:
    """A triangle a thousandth of the distance away, against its multipole series: with the second moments of area
    the next term is 1e-9 of the first, with an allowance of ten."""
    middle = np.array([0.8, -0.6])
    corners = middle + 1e-3 * (SLIVER - SLIVER.mean(axis=0))
    (ux, uy), (vx, vy) = corners[1] - corners[0], corners[2] - corners[0]
    area = 0.5 * (ux * vy - uy * vx)
    offsets = corners - middle
    spread = offsets.T @ offsets / 12.0
    distance = math.hypot(*middle, height)
    series = 1.0 / distance + 0.5 * (3.0 * middle @ spread @ middle / distance**5 - np.trace(spread) / distance**3)
    zero, *linear = triangle_potentials(np.zeros((1, 2)), corners[None], [height])[0, :, 0]
    assert zero == pytest.approx(area * series, rel=1e-8)
    assert linear == pytest.approx(area * (middle * series - spread @ middle / distance**3), rel=1e-8)


def test_moments_are_symmetric() -> None:
    """Exchanging the triangles exchanges r and r'."""
    zero, x, y, other_x, other_y, product = static_moments(TRIANGLE[None], SLIVER[None], [0.1])[0]
    exchanged = static_moments(SLIVER[None], TRIANGLE[None], [0.1])[0]
    assert np.array([zero, other_x, other_y, x, y, product]) == pytest.approx(exchanged, rel=1e-14)


def test_moments_of_triangles_apart() -> None:
    """Against the 7-point rule on both sides, each triangle divided in 16, which is exact enough 3 sizes away."""
    far = TRIANGLE + np.array([3.0, 1.0])
    moments = static_moments(TRIANGLE[None], far[None], [0.5, 0.2])[..., 0]
    (p, w), (q, v) = (fine_rule(corners) for corners in (TRIANGLE, far))
    for height, (zero, x, y, other_x, other_y, product) in zip((0.5, 0.2), moments, strict=True):
        kernel = np.outer(w, v) / np.sqrt(np.sum((p[:, None] - q[None]) ** 2, axis=2) + height**2)
        assert zero == pytest.approx(kernel.sum(), rel=1e-6)
        assert [x, y] == pytest.approx(kernel.sum(axis=1) @ p, rel=1e-6)
        assert [other_x, other_y] == pytest.approx(kernel.sum(axis=0) @ q, rel=1e-6)
        assert product == pytest.approx(np.sum(kernel * (p @ q.T)), rel=1e-6)


def test_blocks_of_pairs_join() -> None:
    """Each of many pairs is what it is alone, up to rounding."""
    count = BLOCK + 3
    first = TRIANGLE + np.linspace(0.0, 2.0, count)[:, None, None]
    second = np.repeat(SLIVER[None], count, axis=0)
    together = static_moments(first, second, [0.1, 0.3])
    for i in (0, BLOCK - 1, BLOCK, count - 1):
        alone = static_moments(first[i : i + 1], second[i : i + 1], [0.1, 0.3])
        assert together[..., i] == pytest.approx(alone[..., 0], rel=1e-12)


def fine_rule(corners: Array) -> tuple[Array, Array]:
    pieces = [corners]
    for _ in range(2):
        pieces = [
            part
            for a, b, c in pieces
            for part in (
                np.array([a, (a + b) / 2, (a + c) / 2]),
                np.array([b, (b + c) / 2, (a + b) / 2]),
                np.array([c, (a + c) / 2, (b + c) / 2]),
                np.array([(a + b) / 2, (b + c) / 2, (a + c) / 2]),
            )
        ]
    (ux, uy), (vx, vy) = corners[1] - corners[0], corners[2] - corners[0]
    area = 0.5 * abs(ux * vy - uy * vx) / len(pieces)
    return np.concatenate([SEVEN_POINTS @ piece for piece in pieces]), np.tile(area * SEVEN_WEIGHTS, len(pieces))


@pytest.mark.parametrize(
    ("points", "weights", "degree"), [(THREE_POINTS, THREE_WEIGHTS, 2), (SEVEN_POINTS, SEVEN_WEIGHTS, 5)]
)
def test_rules_are_exact_to_their_degree(points: Array, weights: Array, degree: int) -> None:
    """Mean of L1^i L2^j L3^k over a triangle is 2 i! j! k!/(i + j + k + 2)!, exact."""
    for i in range(degree + 1):
        for j in range(degree + 1 - i):
            k = degree - i - j
            exact = 2.0 * math.prod(math.factorial(n) for n in (i, j, k)) / math.factorial(degree + 2)
            found = weights @ np.prod(points ** np.array([i, j, k]), axis=1)
            assert found == pytest.approx(exact, rel=1e-12)

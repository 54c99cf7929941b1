"""Static images: the part of a layered kernel that varies faster than the mesh.

For k >> k0 the kernels become those of electrostatics, rational functions of exp(-2 k t) of the layers; each term of
their power series is an image at a height fixed by the thicknesses alone. Which terms are kept:
- layers up to 0.3 mm thin that touch source or observer, all combinations up to the third order, everything beyond
  taken as unbounded, where source and observer have only such layers between them;
- of the thicker layers the first order up to an image height of 10 mm and the second up to 3 mm, with the thin
  layers taken away: at that distance a mask shifts an image by a per cent or two, which is smooth.
What the terms left out sum to varies no faster than the lowest of them, and is tabulated.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from functools import lru_cache

import numpy as np
from numpy.typing import NDArray

from planar.field.medium import LayeredMedium, require_interface
from planar.units import VACUUM_PERMEABILITY, VACUUM_PERMITTIVITY

THIN = 0.3e-3
_THIN_ORDER = 3
_THICK_ORDER = 2
_FIRST_ORDER_HEIGHT = 10e-3
_SECOND_ORDER_HEIGHT = 3e-3
_SAME_HEIGHT = 1e-9

Exponents = tuple[int, ...]
Coefficients = NDArray[np.complex128]


@dataclass(frozen=True)
class _Group:
    """Terms of one reduced medium: the numbers of its `layers`, whether it ends on metal, the layers whose material
    bounds it below and above (None: air), its interfaces of source and observer, lower first, and the exponents of
    exp(-2 k t) kept; without the direct term if another group has it."""

    layers: tuple[int, ...]
    metal_backed: bool
    bounds: tuple[int | None, int | None]
    pair: tuple[int, int]
    algebra: tuple[Exponents, ...]
    with_direct: bool

    @property
    def terms(self) -> tuple[Exponents, ...]:
        """Exponents of images that can exist."""
        reached = [term for term in self.algebra if _reached(term, self.pair)]
        return tuple(term for term in reached if any(term) or self.with_direct)


def image_heights(medium: LayeredMedium, i: int, j: int) -> tuple[float, ...]:
    """Image heights in m, ascending, of source interface i seen at interface j, common to both kernels.

    They depend on the thicknesses and on the metal plane, not on frequency or permittivity. Raises `GeometryError` for
    an interface that carries no current.
    """
    return tuple(height for height, _ in _placed(medium, i, j))


def image_amplitudes(medium: LayeredMedium, i: int, j: int) -> tuple[Coefficients, Coefficients]:
    """c_i of G_A (H/m) and of K_phi (m/F) for each of `image_heights`: sum of c_i/(4 pi sqrt(rho^2 + h_i^2)).

    Source: static limit of Michalski & Mosig 1997, formulation C, expanded in reflections. The layers are
    non-magnetic, so G_A has only the direct term and that of the metal plane.
    """
    placed = _placed(medium, i, j)
    groups = _groups(medium, i, j)
    eps = tuple(complex(each) for each in medium.eps_r)
    scalar = [_series(group, eps) for group in groups]
    vector = [_series(group, (1.0 + 0.0j,) * len(eps)) for group in groups]

    def gathered(series: list[dict[Exponents, complex]]) -> Coefficients:
        return np.array([sum(series[group][term] for group, term in terms) for _, terms in placed], dtype=np.complex128)

    return VACUUM_PERMEABILITY * gathered(vector), gathered(scalar) / VACUUM_PERMITTIVITY


def lowest_left_out(medium: LayeredMedium) -> float:
    """Height in m below which no image is left out, infinite without layers: sets how far the rest reaches in k."""
    thin = [2.0 * (_THIN_ORDER + 1) * t for t in medium.thicknesses if t <= THIN]
    thick = [t for t in medium.thicknesses if t > THIN]
    return min([*thin, *thick], default=np.inf)


def _placed(medium: LayeredMedium, i: int, j: int) -> list[tuple[float, list[tuple[int, Exponents]]]]:
    """Heights in ascending order with the terms (group, exponents) of each; equal heights are one."""
    distance = sum(medium.thicknesses[min(i, j) : max(i, j)])
    terms = []
    for number, group in enumerate(_groups(medium, i, j)):
        for term in group.terms:
            path = sum(m * medium.thicknesses[layer] for m, layer in zip(term, group.layers, strict=True))
            terms.append((distance + 2.0 * path, (number, term)))
    placed: list[tuple[float, list[tuple[int, Exponents]]]] = []
    for height, numbered in sorted(terms):
        if placed and height - placed[-1][0] <= _SAME_HEIGHT * height:
            placed[-1][1].append(numbered)
        else:
            placed.append((height, [numbered]))
    return placed


def _groups(medium: LayeredMedium, i: int, j: int) -> list[_Group]:
    require_interface(medium, i)
    require_interface(medium, j)
    low, high = min(i, j), max(i, j)
    thin = [t <= THIN for t in medium.thicknesses]
    close = all(thin[low:high])
    near = [_near_group(medium, thin, (low, high))] if close else []
    on_metal = medium.metal_backed and all(thin[:low])  # once the thin layers are taken away
    far = [] if on_metal else [_far_group(medium, thin, (low, high), with_direct=not close)]
    return near + far


def _near_group(medium: LayeredMedium, thin: list[bool], pair: tuple[int, int]) -> _Group:
    """Unbroken run of thin layers around the pair between half spaces, or down to the metal plane."""
    first, last = pair
    while first > 0 and thin[first - 1]:
        first -= 1
    while last < medium.top and thin[last]:
        last += 1
    bounds = (first - 1 if first > 0 else None, last if last < medium.top else None)
    algebra = _lower_set(last - first, _THIN_ORDER, lambda term: True)
    inside = (pair[0] - first, pair[1] - first)
    return _Group(tuple(range(first, last)), medium.metal_backed and first == 0, bounds, inside, algebra, True)


def _far_group(medium: LayeredMedium, thin: list[bool], pair: tuple[int, int], *, with_direct: bool) -> _Group:
    """The medium without its thin layers; the direct term is left to the near group where there is one."""
    layers = tuple(number for number, is_thin in enumerate(thin) if not is_thin)
    inside = (thin[: pair[0]].count(False), thin[: pair[1]].count(False))

    def wanted(term: Exponents) -> bool:
        height = 2.0 * sum(m * medium.thicknesses[layer] for m, layer in zip(term, layers, strict=True))
        return height <= (_FIRST_ORDER_HEIGHT if sum(term) <= 1 else _SECOND_ORDER_HEIGHT)

    algebra = _lower_set(len(layers), _THICK_ORDER, wanted)
    return _Group(layers, medium.metal_backed, (None, None), inside, algebra, with_direct)


@lru_cache(maxsize=64)
def _exponents(count: int, order: int) -> tuple[Exponents, ...]:
    """All exponents of `count` layers with a sum up to `order`, lowest first."""
    if count == 0:
        return ((),)
    terms = [(m, *rest) for m in range(order + 1) for rest in _exponents(count - 1, order - m)]
    return tuple(sorted(terms, key=lambda term: (sum(term), term)))


def _lower_set(count: int, order: int, wanted: Callable[[Exponents], bool]) -> tuple[Exponents, ...]:
    """The `wanted` exponents up to `order`. All smaller ones are among them, so series cut to them stay exact."""
    return tuple(term for term in _exponents(count, order) if wanted(term))


def _reached(term: Exponents, pair: tuple[int, int]) -> bool:
    """Whether a wave gets there: to a layer only through all those between."""
    low, high = pair
    used = [layer for layer, m in enumerate(term) if m]
    lowest, highest = min([low, *used]), max([high - 1, *used])
    return all(term[lowest:low]) and all(term[high : highest + 1])


def _series(group: _Group, eps: tuple[complex, ...]) -> dict[Exponents, complex]:
    """Coefficients of 2 k V(k) exp(k d), d the distance of the pair, for the exponents of the group.

    A series cut to the group's exponents is stored as the matrix that multiplies by it, so that the admittance
    recursion of the medium reads as it is, with k taken out; the first column holds the coefficients.
    """
    values = [eps[layer] for layer in group.layers]
    below, above = (1.0 if bound is None else eps[bound] for bound in group.bounds)
    one = np.eye(len(group.algebra), dtype=np.complex128)
    shifts = [_shift(group.algebra, layer) for layer in range(len(values))]
    low, high = group.pair
    seen = np.asarray(above * one)
    transfer = one
    for layer in range(len(values) - 1, low - 1, -1):
        backward, forward = one + shifts[layer], (one - shifts[layer]) / values[layer]
        inverse = np.linalg.inv(backward + seen @ forward)
        if layer < high:
            transfer = 2.0 * transfer @ inverse
        seen = inverse @ (seen @ backward + values[layer] ** 2 * forward)
    total, seen = seen, np.asarray(below * one)
    for layer in range(low):
        backward, forward = one + shifts[layer], (one - shifts[layer]) / values[layer]
        if layer == 0 and group.metal_backed:
            seen = np.linalg.inv(forward) @ backward
        else:
            seen = np.linalg.inv(backward + seen @ forward) @ (seen @ backward + values[layer] ** 2 * forward)
    column = (2.0 * transfer @ np.linalg.inv(total + seen))[:, 0]
    return dict(zip(group.algebra, column.tolist(), strict=True))


def _shift(algebra: tuple[Exponents, ...], layer: int) -> Coefficients:
    """Matrix that multiplies a cut series by exp(-2 k t) of `layer`."""
    place = {term: number for number, term in enumerate(algebra)}
    matrix = np.zeros((len(algebra), len(algebra)), dtype=np.complex128)
    for number, term in enumerate(algebra):
        raised = (*term[:layer], term[layer] + 1, *term[layer + 1 :])
        if raised in place:
            matrix[place[raised], number] = 1.0
    return matrix

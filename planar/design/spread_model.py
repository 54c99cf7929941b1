"""A second-order model of what a board does, as a function of all that varies at once.

Every complex term (a reflection at one frequency, a ratio of senses) is a polynomial of the deviations: linear and
square in each quantity from boards solved at both ends of its range, cross terms of the strongest from boards with two
quantities at an end (a response surface after Box & Wilson, J. R. Stat. Soc. B 13 (1951) 1). Differences are taken on
one mesh and added to the nominal terms of a finer one, so that the nominal board is exactly what was predicted.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]
Complex = NDArray[np.complex128]
Pair = tuple[int, int]


@dataclass(frozen=True, eq=False)
class SurfaceModel:
    """Terms `nominal` (j,), their `slopes` and `squares` (d, j) in the deviations of d quantities, and `crossed` (p, j)
    in the products of the `pairs` of them."""

    nominal: Complex
    slopes: Complex
    squares: Complex
    pairs: tuple[Pair, ...]
    crossed: Complex

    def at(self, deviations: Array) -> Complex:
        """Terms (n, j) of boards at `deviations` (n, d)."""
        terms: Complex = self.nominal + deviations @ self.slopes + deviations**2 @ self.squares
        if self.pairs:
            first, second = np.array(self.pairs).T
            terms = terms + (deviations[:, first] * deviations[:, second]) @ self.crossed
        return terms

    def on(self, nominal: Complex) -> SurfaceModel:
        """The same differences on other `nominal` terms (j,)."""
        return replace(self, nominal=nominal)


Changes = Sequence[Mapping[float, Complex]]
"""For every quantity: its deviation, not 0 -> change of the terms (j,) there; one deviation or two."""


def fitted_surface(nominal: Complex, changes: Changes, crossed: Mapping[Pair, tuple[Array, Complex]]) -> SurfaceModel:
    """Model that goes through everything solved.

    `crossed`: the numbers of two quantities -> their deviations (2,) and the change of the terms (j,) with both there.
    A quantity solved at one deviation only is linear.
    """
    shape = (len(changes), len(nominal))
    slopes, squares = np.zeros(shape, dtype=np.complex128), np.zeros(shape, dtype=np.complex128)
    for number, seen in enumerate(changes):
        places = np.array(list(seen))
        powers = places[:, None] ** np.arange(1, len(places) + 1)
        found = np.linalg.solve(powers, np.array(list(seen.values())))
        slopes[number] = found[0]
        if len(places) > 1:
            squares[number] = found[1]
    model = SurfaceModel(nominal, slopes, squares, (), np.zeros((0, len(nominal)), dtype=np.complex128))
    if not crossed:
        return model
    products = [_product(model, pair, *seen) for pair, seen in crossed.items()]
    return replace(model, pairs=tuple(crossed), crossed=np.array(products))


def _product(model: SurfaceModel, pair: Pair, places: Array, change: Complex) -> Complex:
    """Coefficient of the product of two deviations: what both do beyond what each does."""
    alone = sum(place * model.slopes[i] + place**2 * model.squares[i] for i, place in zip(pair, places, strict=True))
    coefficient: Complex = (change - alone) / (places[0] * places[1])
    return coefficient

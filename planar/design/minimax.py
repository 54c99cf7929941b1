"""The best step of a linear model in the worst-case sense, inside a box.

Minimax fitting by a sequence of linear models in a trust region: Madsen, J. Inst. Maths Applics 16 (1975) 321.
The terms here are complex (reflections, field ratios), each with a limit its magnitude is held against; the sub-problem
min over x of max_j |a_j + B_j x| / limit_j is convex and small.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.optimize import minimize

Array = NDArray[np.float64]
Complex = NDArray[np.complex128]

SHARPNESS = (6.0, 24.0)
"""Exponents of the smooth maximum, one after the other: each starts where the last one ended."""
EASE = 0.05
"""Price of a step to the edge of the box, of the worst term before it: what does not help stays where it is."""
TEACHING = 0.2
"""Length of a step of which half is believed."""


@dataclass(frozen=True)
class LinearModel:
    """Terms `values` (j,) at a point and their derivatives `slopes` (j, x)."""

    values: Complex
    slopes: Complex

    def at(self, step: Array) -> Complex:
        """Terms after `step` (x,)."""
        terms: Complex = self.values + self.slopes @ step
        return terms

    def learned(self, step: Array, values: Complex) -> LinearModel:
        """The model moved by `step` to where the terms are `values`, its slopes corrected (Broyden 1965).

        A short step teaches little: what it misses is as much the mesh's own error.
        """
        missed = values - self.at(step)
        return LinearModel(values, self.slopes + np.outer(missed, step) / (float(step @ step) + TEACHING**2))


def worst(values: Complex, limits: Array) -> float:
    """Largest magnitude of `values` over its limit."""
    return float(np.max(np.abs(values) / limits))


def best_step(model: LinearModel, limits: Array, low: Array, high: Array) -> Array:
    """Step (x,) between `low` and `high` (x,) that makes the worst term of `model` over its limit smallest."""
    step = np.clip(np.zeros(len(low)), low, high)
    values, slopes = model.values / limits, model.slopes / limits[:, None]
    price = EASE * worst(model.values, limits) / len(low)
    scale = np.maximum(1e-9, np.maximum(-low, high))
    for sharpness in SHARPNESS:

        def smooth_maximum(x: Array, power: float = sharpness) -> tuple[float, Array]:
            terms = values + slopes @ x
            square = np.abs(terms) ** 2 + 1e-12
            top = square.max()
            shares = (square / top) ** (0.5 * power)
            total = shares.sum()
            value = np.sqrt(top) * total ** (1.0 / power)
            gradient = (shares / square) @ np.real(terms.conj()[:, None] * slopes) / total * value
            value += price * float(np.sum((x / scale) ** 2))
            gradient = gradient + 2.0 * price * x / scale**2
            return float(value), np.asarray(gradient, dtype=np.float64)

        found = minimize(smooth_maximum, step, jac=True, method="L-BFGS-B", bounds=list(zip(low, high, strict=True)))
        step = np.clip(found.x, low, high)
    return step

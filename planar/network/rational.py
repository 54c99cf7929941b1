"""Rational models of a response by the AAA algorithm.

Y. Nakatsukasa, O. Sete, L. N. Trefethen, SIAM J. Sci. Comput. 40 (2018) A1494: the model is a quotient of
partial fractions in barycentric form, r = n/d with n = sum w_j f_j/(z - z_j), d = sum w_j/(z - z_j). It
meets the data at its support points z_j, picked one by one where it errs most; the weights w_j make
f d - n least on all other samples. A port needs about as many support points as it has resonances near the band.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from functools import cached_property

import numpy as np
import scipy.linalg
from numpy.typing import ArrayLike, NDArray

from planar.errors import RangeError

Array = NDArray[np.float64]
Complex = NDArray[np.complex128]

_AT_INFINITY = 1e6
"""Half-widths of the support beyond which a pole or zero is the rounding of one at infinity."""


@dataclass(frozen=True, eq=False)
class RationalModel:
    """A rational function of frequency through `values` (m,) at `support` (m,) Hz with barycentric `weights` (m,).

    The values keep the unit of the data. Arrays are read-only.
    """

    support: Array
    values: Complex
    weights: Complex

    def __post_init__(self) -> None:
        for name, kind in (("support", np.float64), ("values", np.complex128), ("weights", np.complex128)):
            array = np.array(getattr(self, name), dtype=kind)
            array.setflags(write=False)
            object.__setattr__(self, name, array)

    def __call__(self, frequency: ArrayLike) -> Complex:
        """The model at `frequency`, Hz, real or complex; same shape; infinite or nan on a pole."""
        z = np.asarray(frequency)
        gap = z.reshape(-1, 1) - self.support
        at_support = gap == 0.0
        cauchy = 1.0 / np.where(at_support, 1.0, gap)
        with np.errstate(divide="ignore", invalid="ignore"):
            result: Complex = (cauchy @ (self.weights * self.values)) / (cauchy @ self.weights)
        row, column = np.nonzero(at_support)
        result[row] = self.values[column]
        return result.reshape(z.shape)

    @cached_property
    def poles(self) -> Complex:
        """Poles, (k,) Hz with k < m, the most nearly real first."""
        return self._roots(self.weights)

    @cached_property
    def residues(self) -> Complex:
        """Residue at each of the poles, (k,), unit of the values times Hz: n(p)/d'(p), the poles being simple."""
        gap = self.poles[:, None] - self.support
        at_support = gap == 0.0  # a weight of zero: the pole is cancelled by a zero
        cauchy = 1.0 / np.where(at_support, 1.0, gap)
        residues: Complex = (cauchy @ (self.weights * self.values)) / -(cauchy**2 @ self.weights)
        residues[at_support.any(axis=1)] = 0.0
        residues.setflags(write=False)
        return residues

    @cached_property
    def zeros(self) -> Complex:
        """Zeros, (k,) Hz with k < m, the most nearly real first."""
        return self._roots(self.weights * self.values)

    def _roots(self, weights: Complex) -> Complex:
        """Roots of sum weights_j/(z - z_j), as finite eigenvalues of an arrowhead pencil, as the paper has it."""
        middle = 0.5 * (self.support.max() + self.support.min())
        half = 0.5 * (self.support.max() - self.support.min()) or 1.0
        m = len(self.support)
        if not weights.any():  # the zero function has no poles and no isolated zeros
            return np.empty(0, dtype=np.complex128)
        arrow = np.zeros((m + 1, m + 1), dtype=np.complex128)
        arrow[0, 1:] = weights / np.abs(weights).max()
        arrow[1:, 0] = 1.0
        arrow[1:, 1:] = np.diag((self.support - middle) / half)
        right = np.diag([0.0, *np.ones(m)])
        alpha, beta = scipy.linalg.eigvals(arrow, right, homogeneous_eigvals=True)
        finite = np.abs(alpha) < _AT_INFINITY * np.abs(beta)
        roots = alpha[finite] / beta[finite]
        ordered: Complex = middle + half * roots[np.argsort(np.abs(roots.imag), kind="stable")]
        ordered.setflags(write=False)
        return ordered


def fit_rational(frequency: ArrayLike, values: ArrayLike, *, tolerance: float = 1e-6, most: int = 40) -> RationalModel:
    """The rational model of `values` (n,), real or complex, at distinct real `frequency` (n,) Hz.

    `tolerance` is the largest error on the samples over the largest abs(value); `most` the largest number of
    support points, and no more than (n + 1)/2 are used, beyond which the weights are not determined. Pairs of
    a pole and a zero that cancel to within the tolerance are removed. Raises `RangeError` for samples that are
    no such pair and where the tolerance is not reached.
    Source: the core algorithm and the removal of Froissart doublets of the paper in the module docstring.
    """
    x, f = np.array(frequency, dtype=np.float64), np.array(values, dtype=np.complex128)
    if x.ndim != 1 or f.shape != x.shape or len(x) == 0 or len(np.unique(x)) < len(x):
        raise RangeError(f"frequency {x.shape} and values {f.shape} must be rows of one length, frequencies distinct")
    if not (np.isfinite(x).all() and np.isfinite(f).all()):
        raise RangeError("frequency and values must be finite")
    if not (tolerance > 0.0 and most >= 1):
        raise RangeError(f"tolerance is {tolerance:.3g}, at most {most} support points: both must be positive")
    model, error = _greedy(x, f, tolerance, most)
    if error > tolerance:
        raise RangeError(
            f"the rational model of {len(x)} samples is off by {error:.2e} of the largest with {len(model.support)} "
            f"support points, {tolerance:.2e} was asked for"
        )
    return model


def _greedy(x: Array, f: Complex, tolerance: float, most: int) -> tuple[RationalModel, float]:
    """The paper's core algorithm, and the largest error of its model over the largest abs(f)."""
    scale = float(np.abs(f).max()) or 1.0
    fitted = np.full_like(f, f.mean())
    chosen: list[int] = []
    while True:
        miss = np.abs(f - fitted)
        miss[chosen] = -1.0
        chosen.append(int(np.argmax(miss)))
        model = _interpolant(x, f, chosen)
        fitted = model(x)
        error = _largest(f - fitted) / scale
        if error <= tolerance:
            model = _without_doublets(model, x, f, tolerance * scale)
            return model, _largest(f - model(x)) / scale
        if len(chosen) >= min(most, (len(x) + 1) // 2):
            return model, error


def _interpolant(x: Array, f: Complex, chosen: list[int]) -> RationalModel:
    """The model on the support x[chosen]: weights of norm one for which f d - n is least off the support."""
    others = np.setdiff1d(np.arange(len(x)), chosen)
    loewner = (f[others, None] - f[chosen]) / (x[others, None] - x[chosen])
    # A matrix with fewer rows than columns has its null vector only among the full right singular vectors.
    _, _, right = np.linalg.svd(loewner, full_matrices=len(others) < len(chosen))
    return RationalModel(x[chosen], f[chosen], right[-1].conj())


def _without_doublets(model: RationalModel, x: Array, f: Complex, allowed: float) -> RationalModel:
    """The model without its spurious pole-zero pairs, if it then still meets the samples to `allowed`.

    Removal of numerical Froissart doublets: a pole whose residue moves no sample off the support by as much as
    `allowed` is spurious; the support point nearest to it goes, and the weights are found anew.
    """
    others = np.setdiff1d(x, model.support)
    distance = np.abs(model.poles[:, None] - others).min(axis=1, initial=math.inf)
    spurious = model.poles[np.abs(model.residues) < allowed * distance]
    nearest = np.abs(spurious[:, None] - model.support).argmin(axis=1)
    kept = np.flatnonzero(np.isin(x, np.delete(model.support, nearest)))
    if len(spurious) == 0 or len(kept) == 0:
        return model
    cleaner = _interpolant(x, f, list(kept))
    return cleaner if _largest(f - cleaner(x)) <= allowed else model


def _largest(miss: Complex) -> float:
    """Largest magnitude, infinite where the model has no value."""
    size = np.abs(miss)
    return math.inf if np.isnan(size).any() else float(size.max())

"""Permittivity against frequency from the one data point a laminate comes with.

The wideband Debye model spreads relaxations evenly over the decades between two corner frequencies. Its loss
tangent is nearly flat there and its permittivity falls by a constant amount per decade, as causality demands of a
flat loss. One measured permittivity and loss tangent fix it; no loss gives a constant.
"""

from __future__ import annotations

import math
from dataclasses import dataclass, replace
from typing import Self, overload

import numpy as np
from numpy.typing import NDArray

from planar.errors import RangeError
from planar.units import show


@dataclass(frozen=True)
class WidebandDebye:
    """eps(f) = eps_inf + delta_eps ln((f2 + jf)/(f1 + jf)) / ln(f2/f1), for exp(+j omega t).

    `eps_inf` is the relative permittivity far above the `upper` corner f2, `delta_eps` how far it rises toward the
    `lower` corner f1 (both corners in Hz).
    Source: Djordjevic, Biljic, Likar-Smiljanic, Sarkar, IEEE Trans. EMC 43 (2001) 662. Range: `lower` to `upper`.
    """

    eps_inf: float
    delta_eps: float
    lower: float
    upper: float

    @classmethod
    def from_point(cls, eps_r: float, tan_d: float, *, at: float, lower: float = 1e3, upper: float = 1e12) -> Self:
        """Model through relative permittivity `eps_r` and loss tangent `tan_d` at the frequency `at` (Hz).

        `lower` and `upper` are the corner frequencies in Hz. Raises `RangeError` for a permittivity below 1, a
        negative loss, a frequency outside the corners, or a loss so high that the permittivity would fall below 1.
        """
        if not eps_r >= 1.0 or not tan_d >= 0.0:
            raise RangeError(f"permittivity {eps_r:g} and loss tangent {tan_d:g}: at least 1 and at least 0 are needed")
        if not 0.0 < lower < at < upper:
            raise RangeError(
                f"data point at {show(at, 'frequency')}: it must lie between {show(lower, 'frequency')} and "
                f"{show(upper, 'frequency')}"
            )
        slope = _relaxation(np.asarray(at), lower, upper)
        delta_eps = -eps_r * tan_d / float(slope.imag)
        eps_inf = eps_r - delta_eps * float(slope.real)
        if eps_inf < 1.0:
            raise RangeError(
                f"loss tangent {tan_d:g} is too high for permittivity {eps_r:g}: the wideband Debye model would fall "
                f"to {eps_inf:.3g} below {show(upper, 'frequency')}"
            )
        return cls(eps_inf, delta_eps, lower, upper)

    def scaled(self, factor: float) -> Self:
        """The model with its permittivity times `factor` at every frequency, the loss tangent as it is."""
        return replace(self, eps_inf=self.eps_inf * factor, delta_eps=self.delta_eps * factor)

    @overload
    def permittivity(self, frequency: float) -> complex: ...
    @overload
    def permittivity(self, frequency: NDArray[np.float64]) -> NDArray[np.complex128]: ...
    def permittivity(self, frequency: float | NDArray[np.float64]) -> complex | NDArray[np.complex128]:
        """Relative permittivity eps' - j eps'' at `frequency` (Hz; a number, or an array of any shape).

        Raises `RangeError` outside the corner frequencies.
        """
        f = np.asarray(frequency, dtype=np.float64)
        outside = f[~((f >= self.lower) & (f <= self.upper))]
        if outside.size:
            raise RangeError(
                f"permittivity at {show(float(outside.flat[0]), 'frequency')}: the wideband Debye model holds from "
                f"{show(self.lower, 'frequency')} to {show(self.upper, 'frequency')}"
            )
        eps = self.eps_inf + self.delta_eps * _relaxation(f, self.lower, self.upper)
        return complex(eps) if f.ndim == 0 else eps


def _relaxation(f: NDArray[np.float64], lower: float, upper: float) -> NDArray[np.complex128]:
    """Normalised relaxation ln((f2 + jf)/(f1 + jf)) / ln(f2/f1): 1 far below `lower`, 0 far above `upper`."""
    return np.asarray((np.log(upper + 1j * f) - np.log(lower + 1j * f)) / math.log(upper / lower), dtype=np.complex128)

"""A response: scattering parameters over frequency, predicted and measured alike.

Only frequency, S and the reference impedance are stored; impedance, decibels, standing-wave ratio
and matched bands are derived. One real reference impedance serves all ports.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from planar.errors import RangeError
from planar.units import show

Array = NDArray[np.float64]
Complex = NDArray[np.complex128]

_SINGULAR = 1e14
"""Condition number beyond which no digit of an inverse is left."""


@dataclass(frozen=True, eq=False)
class Response:
    """Scattering parameters `s` (n, p, p) at `frequency` (n,) Hz against `z0` ohm at every port.

    `s` of shape (n,) is taken as one port. The arrays are copied and made read-only. Raises `RangeError` for
    shapes that do not fit, frequencies that do not rise from 0 Hz or more, numbers that are not finite and a
    `z0` that is not positive.
    """

    frequency: Array
    s: Complex
    z0: float

    def __post_init__(self) -> None:
        frequency, s = _checked(self.frequency, self.s, "s")
        if not (math.isfinite(self.z0) and self.z0 > 0.0):
            raise RangeError(f"reference impedance is {self.z0:.6g} ohm, it must be positive")
        for array in (frequency, s):
            array.setflags(write=False)
        object.__setattr__(self, "frequency", frequency)
        object.__setattr__(self, "s", s)
        object.__setattr__(self, "z0", float(self.z0))

    @classmethod
    def from_impedance(cls, frequency: ArrayLike, z: ArrayLike, *, z0: float) -> Response:
        """The response of ports of impedance `z`, (n,) or (n, p, p) ohm, at `frequency` (n,) Hz against `z0` ohm.

        S = (Z + z0)^-1 (Z - z0): Pozar, Microwave Engineering, 3rd ed., eq. 4.44. Raises `RangeError` as the
        record does, and where Z + z0 cannot be inverted (an active port of exactly -z0).
        """
        points, impedance = _checked(frequency, z, "z")
        identity = np.eye(impedance.shape[1])
        s = _solved(impedance + z0 * identity, impedance - z0 * identity, points, "Z + z0")
        return cls(points, s, z0)

    @property
    def z(self) -> Complex:
        """Impedance matrix, (n, p, p) ohm: Z = z0 (1 - S)^-1 (1 + S), Pozar, 3rd ed., eq. 4.45.

        Raises `RangeError` where it has no finite value, as for a port that is exactly open.
        """
        identity = np.eye(self.s.shape[1])
        z: Complex = self.z0 * _solved(identity - self.s, identity + self.s, self.frequency, "1 - S")
        return z

    @property
    def reflection_db(self) -> Array:
        """Reflection at port 1 with every other port terminated in z0, 20 log10 |S11|, (n,) dB; -inf if none."""
        with np.errstate(divide="ignore"):
            decibels: Array = 20.0 * np.log10(self._reflection)
        return decibels

    @property
    def vswr(self) -> Array:
        """Voltage standing-wave ratio at port 1, (n,); infinite where as much or more comes back than went in."""
        size = self._reflection
        back = np.minimum(size, 1.0)
        with np.errstate(divide="ignore"):
            ratio: Array = (1.0 + back) / (1.0 - back)
        return ratio

    @property
    def best_match(self) -> float:
        """The frequency, Hz, among those held at which port 1 reflects least; the lowest of equals."""
        return float(self.frequency[np.argmin(self._reflection)])

    def band(self, level_db: float) -> list[tuple[float, float]]:
        """Every band (low, high), Hz, in which port 1 reflects less than `level_db`, lowest first.

        Between frequencies held, |S11| is taken as linear: near a match it is, its decibels are not. A band that
        runs into the first or last frequency ends there. Raises `RangeError` for a level that is not finite.
        """
        if not math.isfinite(level_db):
            raise RangeError(f"level is {level_db} dB, a finite one is needed")
        level, size, f = 10.0 ** (level_db / 20.0), self._reflection, self.frequency
        below = size < level
        step = np.flatnonzero(below[1:] != below[:-1])
        crossing = f[step] + (f[step + 1] - f[step]) * (level - size[step]) / (size[step + 1] - size[step])
        ends = [*f[:1][below[:1]], *crossing, *f[-1:][below[-1:]]]
        return [(float(low), float(high)) for low, high in zip(ends[::2], ends[1::2], strict=True)]

    @property
    def _reflection(self) -> Array:
        size: Array = np.abs(self.s[:, 0, 0])
        return size


def reflection(impedance: ArrayLike, reference: float) -> Complex:
    """Reflection (n,) of `impedance` (n,) ohm at a port of real `reference` ohm, (Z - z0)/(Z + z0)."""
    z = np.asarray(impedance, dtype=np.complex128)
    result: Complex = (z - reference) / (z + reference)
    return result


def _checked(frequency: ArrayLike, matrix: ArrayLike, name: str) -> tuple[Array, Complex]:
    """Copies of `frequency` (n,) and `matrix` as (n, p, p); raises `RangeError` where they are no response."""
    points = np.array(frequency, dtype=np.float64)
    square = np.array(matrix, dtype=np.complex128)
    if square.ndim == 1:
        square = square[:, None, None]
    if points.ndim != 1 or len(points) == 0:
        raise RangeError(f"frequency has shape {points.shape}, one row of at least one is needed")
    if square.ndim != 3 or square.shape != (len(points), square.shape[1], square.shape[1]) or square.shape[1] == 0:
        raise RangeError(f"{name} has shape {np.shape(matrix)}, ({len(points)}, p, p) is needed")
    if not (np.isfinite(points).all() and points[0] >= 0.0 and (np.diff(points) > 0.0).all()):
        raise RangeError("frequencies must be finite, not negative, and rise")
    if not np.isfinite(square).all():
        bad = points[~np.isfinite(square).all(axis=(1, 2))][0]
        raise RangeError(f"{name} is not finite at {show(float(bad), 'frequency')}")
    return points, square


def _solved(left: Complex, right: Complex, frequency: Array, name: str) -> Complex:
    """`left`^-1 `right` at every frequency; raises `RangeError` naming the first at which `left` is singular."""
    values = np.linalg.svd(left, compute_uv=False)
    # Against 1 as well as against the largest: a 1 x 1 matrix is always well conditioned.
    size = np.maximum(values[:, 0], np.abs(right).max(axis=(1, 2)))
    singular = values[:, -1] * _SINGULAR <= size
    if singular.any():
        raise RangeError(f"{name} cannot be inverted at {show(float(frequency[singular][0]), 'frequency')}")
    return np.asarray(np.linalg.solve(left, right), dtype=np.complex128)

"""The part of a measurement that is compared: inside the span of the model, no denser than a smooth curve needs."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from planar.errors import RangeError
from planar.network.measured import FEWEST, Measured
from planar.units import show

Array = NDArray[np.float64]
Complex = NDArray[np.complex128]

MOST_POINTS = 201
"""Of a sweep that are used; more tell nothing new of a smooth curve."""


@dataclass(frozen=True, eq=False)
class Sweep:
    """What is compared of a measurement: `reflection` (m,) at `frequency` (m,) Hz against `z0` ohm."""

    frequency: Array
    reflection: Complex
    z0: float


def swept(measured: Measured, grid: Array) -> Sweep:
    """The part of a measurement inside the `grid` (j,) Hz, thinned. Raises `RangeError` where that is too little."""
    frequency = measured.response.frequency
    inside = np.flatnonzero((frequency >= grid[0]) & (frequency <= grid[-1]))
    if len(inside) < FEWEST:
        span = f"{show(float(grid[0]), 'frequency', 4)} to {show(float(grid[-1]), 'frequency', 4)}"
        raise RangeError(f"only {len(inside)} points lie from {span}: at least {FEWEST} are needed, 101 are good")
    if len(inside) > MOST_POINTS:
        inside = inside[np.round(np.linspace(0, len(inside) - 1, MOST_POINTS)).astype(int)]
    return Sweep(frequency[inside], measured.reflection[inside], measured.response.z0)

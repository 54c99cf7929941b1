"""How far a response lies from another one along the frequency axis, on the frequencies of a model.

The same shift as `planar.design.shift`, by least squares of the change of the reflection against the mean slope of both
over frequency, from reflections that are held at many frequencies instead of solved beside each. Both are the board's
own, nothing in front. What is left over is a change of impedance.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray
from scipy.interpolate import CubicSpline

from planar.design.shift import SPAN

Array = NDArray[np.float64]
Complex = NDArray[np.complex128]


def response_shift(grid: Array, nominal: Complex, reflected: Complex) -> float:
    """Fraction by which `reflected` (j,) lies above `nominal` (j,) in frequency, both at `grid` (j,) Hz about its
    middle."""
    slope, inside = _mean_slope(grid, nominal, reflected)
    change = (nominal - reflected)[inside]
    return float(np.real(np.vdot(slope, change)) / np.real(np.vdot(slope, slope)))


def shift_slopes(grid: Array, nominal: Complex, reflected: Complex, changes: Complex) -> Array:
    """Derivatives (p,) of that shift in what changes `reflected` by `changes` (j, p) a unit."""
    slope, inside = _mean_slope(grid, nominal, reflected)
    found: Array = -np.real(slope.conj() @ changes[inside]) / float(np.real(np.vdot(slope, slope)))
    return found


def _mean_slope(grid: Array, nominal: Complex, reflected: Complex) -> tuple[Complex, NDArray[np.bool_]]:
    """Mean slope (s,) of both over frequency as a fraction of the middle, and where the span is, (j,)."""
    middle = 0.5 * float(grid[0] + grid[-1])
    inside = np.abs(grid / middle - 1.0) <= SPAN * (1.0 + 1e-9)
    slope: Complex = CubicSpline(grid / middle, 0.5 * (nominal + reflected))(grid[inside] / middle, 1)
    return slope, inside


def best_match(grid: Array, reflected: Complex) -> float | None:
    """Frequency (Hz) of least reflection (j,) at `grid` (j,) Hz, None where that is at an end: no dip there."""
    fine = np.linspace(grid[0], grid[-1], 20 * len(grid))
    size = np.abs(CubicSpline(grid, reflected)(fine))
    place = int(np.argmin(size))
    return float(fine[place]) if 0 < place < len(fine) - 1 else None

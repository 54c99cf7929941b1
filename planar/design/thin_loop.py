"""The circular thin-wire loop by its Fourier series, and how a slab changes its full-wave mode.

A current cos(n phi) on a thin circular loop sees its own impedance, independent of the others
(Storer, AIEE Trans. 75 (1956) 606; Wu, J. Math. Phys. 3 (1962) 1301; King & Smith, Antennas in
Matter, 1981). Mode 1, one wave round the loop, is the one a full-wave loop works on. A thin slab
leaves the magnetic part of its impedance alone and divides the near electric part by the effective
permittivity of the strip; what radiates sees free space.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from functools import lru_cache

import numpy as np
from scipy.optimize import brentq
from scipy.special import iv, jv, kv

from planar.errors import RangeError
from planar.units import SPEED_OF_LIGHT, WAVE_IMPEDANCE

STRIP_TO_WIRE = 0.25
"""Radius of the wire equivalent to a flat strip, in strip widths (Butler, IEEE T-AP 30 (1982) 755, from memory)."""
THICKEST = 8.0
"""Least thickness parameter 2 ln(2 pi a / b) the series is used for; thicker loops have no resonance."""
_EULER = 0.577_215_664_901_532_9
_NODES, _WEIGHTS = np.polynomial.legendre.leggauss(48)


@dataclass(frozen=True)
class LoopResonance:
    """Mode 1 at its resonance: `perimeter` of the mean line in free-space wavelengths, `resistance` in ohm."""

    perimeter: float
    resistance: float


def thickness_parameter(radius: float, wire_radius: float) -> float:
    """2 ln(2 pi a / b) of a loop of mean `radius` a and `wire_radius` b, both m."""
    return 2.0 * math.log(2.0 * math.pi * radius / wire_radius)


@lru_cache(maxsize=4096)
def _radiating_part(order: int, ka: float) -> complex:
    """Integral of Lommel-Weber and Bessel functions, -(1/2) int_0^2ka [Omega_2n(x) + j J_2n(x)] dx."""
    x = ka * (1.0 + _NODES)
    theta = 0.5 * math.pi * (1.0 + _NODES)
    kernel = np.sin(np.outer(x, np.sin(theta)) - 2.0 * order * theta)
    lommel_weber = 0.5 * kernel @ _WEIGHTS  # (1/pi) int_0^pi sin(x sin t - 2 n t) dt
    return complex(-0.5 * ka * np.sum(_WEIGHTS * (lommel_weber + 1j * jv(2 * order, x))))


def _near_part(order: int, slenderness: float) -> float:
    """Static part of N_n for a loop of radius over wire radius `slenderness`; order 0 and higher."""
    if order == 0:
        return math.log(8.0 * slenderness) / math.pi
    n = abs(order)
    constant = math.log(4.0 * n) + _EULER - 2.0 * sum(1.0 / (2 * m + 1) for m in range(n))
    return (float(kv(0, n / slenderness) * iv(0, n / slenderness)) + constant) / math.pi


def series_kernel(order: int, ka: float, slenderness: float) -> complex:
    """N_n of King & Smith: the n-th Fourier coefficient of exp(-jkR)/R round the loop, times its radius."""
    n = abs(order)
    return _near_part(n, slenderness) + _radiating_part(n, ka)


def mode_impedance(order: int, ka: float, slenderness: float, *, eps_eff: float = 1.0) -> complex:
    """Impedance of mode `order` seen by a voltage across a gap, ohm: V / I_n with I = I_n cos(n phi).

    `ka` is the perimeter of the mean line in free-space wavelengths, `slenderness` loop radius over
    wire radius, `eps_eff` the effective permittivity of the strip on its slab. For order 0 it is the
    impedance of the uniform current. The admittance of the gap is the sum of 1 / mode_impedance.
    """
    n = order
    magnetic = 0.5 * ka * (series_kernel(n + 1, ka, slenderness) + series_kernel(n - 1, ka, slenderness))
    electric = 0.0j
    if n:
        electric = n * n / ka * (_near_part(n, slenderness) / eps_eff + _radiating_part(n, ka))
    whole = 1j * math.pi * WAVE_IMPEDANCE * (magnetic - electric)
    return whole if n == 0 else 0.5 * whole


def resonance(slenderness: float, *, eps_eff: float = 1.0) -> LoopResonance:
    """First resonance of mode 1. Raises `RangeError` when the loop is too thick to have one."""
    omega = 2.0 * math.log(2.0 * math.pi * slenderness)
    if omega < THICKEST:
        raise RangeError(
            f"the trace is too wide for a thin loop: thickness parameter {omega:.2f}, must be at least {THICKEST:g} "
            f"(trace width at most {4.0 * 2.0 * math.pi / math.exp(0.5 * THICKEST):.2f} of the mean radius)"
        )

    def reactance(ka: float) -> float:
        return mode_impedance(1, ka, slenderness, eps_eff=eps_eff).imag

    grid = np.linspace(0.9 / math.sqrt(eps_eff), 1.45, 24)
    values = [reactance(float(ka)) for ka in grid]
    for low, high, x_low, x_high in zip(grid, grid[1:], values, values[1:], strict=False):
        if x_low < 0.0 <= x_high:
            ka = float(brentq(reactance, low, high, xtol=1e-10))
            return LoopResonance(ka, mode_impedance(1, ka, slenderness, eps_eff=eps_eff).real)
    raise RangeError(f"a loop of thickness parameter {omega:.2f} has no full-wave resonance")


def square_perimeter(wire_diameter: float, frequency: float) -> float:
    """Resonant perimeter of a square loop in free space, wavelengths.

    Fit by L. B. Cebik to computed loops, within 1 %: 1.0413 + 0.0128 [log10(1e5 d / lambda)]^2 for a
    wire of diameter d, m.
    """
    return 1.0413 + 0.0128 * math.log10(1e5 * wire_diameter * frequency / SPEED_OF_LIGHT) ** 2

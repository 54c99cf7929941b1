"""The circular thin-wire loop by its Fourier series: alone, on a slab, in front of a metal plane.

A current cos(n phi) on a thin circular loop sees its own impedance, independent of the others
(Storer, AIEE Trans. 75 (1956) 606; Wu, J. Math. Phys. 3 (1962) 1301; King & Smith, Antennas in
Matter, 1981). Mode 1, one wave round the loop, is the one a full-wave loop works on. Layers of
dielectric lower the quasi-static potential of its charges; they leave the magnetic part and, to
this order, the radiation alone. A metal plane is an image with the opposite current.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from functools import lru_cache

import numpy as np
from scipy.optimize import brentq
from scipy.special import iv, j0, j1, jv, kv

from planar.errors import RangeError
from planar.lines.static_spectral import DielectricLayer, static_admittance
from planar.units import SPEED_OF_LIGHT, WAVE_IMPEDANCE

STRIP_TO_WIRE = 0.25
"""Radius of the wire equivalent to a flat strip, in strip widths (Butler, IEEE T-AP 30 (1982) 755, from memory)."""
THICKEST = 8.0
"""Least thickness parameter 2 ln(2 pi a / b) the series is used for; thicker loops have no resonance."""
_EULER = 0.577_215_664_901_532_9
_NODES, _WEIGHTS = np.polynomial.legendre.leggauss(48)
_LAST = 200.0  # wavenumber in 1/width up to which the relief is integrated; the rest is a closed tail
_PHASE = 20.0  # rad of J_1 per panel of 48 points


@dataclass(frozen=True)
class LoopResonance:
    """Mode 1 at its resonance: `perimeter` of the mean line in free-space wavelengths, `resistance` in ohm."""

    perimeter: float
    resistance: float


@dataclass(frozen=True)
class LoopSetting:
    """What mode 1 sees. `slenderness` is loop radius over wire radius.

    `slab_relief` is what `slab_relief` returns, 0 in air; `height_ratio` the height over a metal
    plane in loop radii, None without one.
    """

    slenderness: float
    slab_relief: float = 0.0
    height_ratio: float | None = None

    @property
    def eps_eff(self) -> float:
        """Effective permittivity of the strip for the charges of mode 1."""
        near = _near_part(1, self.slenderness)
        return near / (near - self.slab_relief)


def slab_relief(
    radius: float, width: float, *, below: Sequence[DielectricLayer] = (), above: Sequence[DielectricLayer] = ()
) -> float:
    """By how much layers lower the static kernel N_1 of a strip ring; dimensionless.

    `radius` of the mean line and strip `width` in m, layers from the strip outward, open air behind.
    Static potential of the charge cos(phi) with an edge-singular profile,
    a int_0^inf J_1(ka)^2 J_0(kw/2)^2 [1 - 2/(Y_below + Y_above)] dk, with the layers' static
    admittances (Yamashita & Mittra 1968); in air Y_below + Y_above = 2 and the relief is none.
    """
    last = _LAST / width
    panels = math.ceil(last * radius / _PHASE)
    half = 0.5 * last / panels
    k = (half * (2.0 * np.arange(panels)[:, None] + 1.0 + _NODES[None, :])).ravel()
    admittance = static_admittance(k, below) + static_admittance(k, above)
    part = 1.0 - 2.0 / admittance
    integrand = j1(k * radius) ** 2 * j0(0.5 * k * width) ** 2 * part
    # beyond the last panel both squared Bessel functions are their means, 1 / (pi x)
    tail = float(part[-1]) * 2.0 / (math.pi**2 * radius * width * last)
    return radius * (float(np.sum(np.tile(half * _WEIGHTS, panels) * integrand)) + tail)


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


def _image_part(order: int, ka: float, height_ratio: float) -> complex:
    """(1/pi) int_0^pi exp(-j ka r)/r cos(n phi) dphi, r from loop to image, `height_ratio` h / a above the plane."""
    pieces = max(2, math.ceil(2.0 / height_ratio))  # the kernel is as narrow as the image is near
    edges = math.pi * np.linspace(0.0, 1.0, pieces + 1)
    phi = (0.5 * (edges[:-1] + edges[1:])[:, None] + 0.5 * math.pi / pieces * _NODES[None, :]).ravel()
    weights = np.tile(0.5 * _WEIGHTS / pieces, pieces)
    r = np.sqrt(4.0 * np.sin(0.5 * phi) ** 2 + 4.0 * height_ratio**2)
    return complex(np.sum(weights * np.exp(-1j * ka * r) / r * np.cos(order * phi)))


def widest_trace(radius: float) -> float:
    """Widest strip, m, on a loop of mean `radius` m that the series is used for."""
    return 2.0 * math.pi * radius / math.exp(0.5 * THICKEST) / STRIP_TO_WIRE


def series_kernel(order: int, ka: float, setting: LoopSetting) -> complex:
    """N_n of King & Smith, of the current: the n-th Fourier coefficient of a exp(-jkR)/R round the loop."""
    n = abs(order)
    alone = _near_part(n, setting.slenderness) + _radiating_part(n, ka)
    return alone if setting.height_ratio is None else alone - _image_part(n, ka, setting.height_ratio)


def mode_impedance(order: int, ka: float, setting: LoopSetting) -> complex:
    """Impedance of mode `order` seen by a voltage across a gap, ohm: V / I_n with I = I_n cos(n phi).

    `ka` is the perimeter of the mean line in wavelengths. For order 0 it is the impedance of the
    uniform current. In air the admittance of the gap is the sum of 1 / mode_impedance. King & Smith,
    eq. 3.16 (from memory). Raises `RangeError` for another order than 1 on a slab.
    """
    if setting.slab_relief and order != 1:
        raise RangeError(f"the slab is worked out for mode 1, not for mode {order}")
    coefficient = 0.5 * ka * (series_kernel(order + 1, ka, setting) + series_kernel(order - 1, ka, setting))
    if order:
        coefficient -= order**2 / ka * (series_kernel(order, ka, setting) - setting.slab_relief)
    whole = 1j * math.pi * WAVE_IMPEDANCE * coefficient
    return whole if order == 0 else 0.5 * whole


def resonance(setting: LoopSetting) -> LoopResonance:
    """First resonance of mode 1. Raises `RangeError` when the loop is too thick to have one."""
    omega = 2.0 * math.log(2.0 * math.pi * setting.slenderness)
    if omega < THICKEST:
        raise RangeError(f"thickness parameter {omega:.2f} of the loop is below {THICKEST:g}: too thick to resonate")

    def reactance(ka: float) -> float:
        return mode_impedance(1, ka, setting).imag

    grid = np.linspace(0.3, 1.45, 47)
    values = [reactance(float(ka)) for ka in grid]
    for low, high, x_low, x_high in zip(grid, grid[1:], values, values[1:], strict=False):
        if x_low < 0.0 <= x_high:
            ka = float(brentq(reactance, low, high, xtol=1e-10))
            return LoopResonance(ka, mode_impedance(1, ka, setting).real)
    raise RangeError(f"a loop of thickness parameter {omega:.2f} has no full-wave resonance here")


def square_perimeter(wire_diameter: float, frequency: float) -> float:
    """Resonant perimeter of a square loop in free space, wavelengths.

    Fit by L. B. Cebik to computed loops, within 1 %: 1.0413 + 0.0128 [log10(1e5 d / lambda)]^2 for a
    wire of diameter d, m.
    """
    return 1.0413 + 0.0128 * math.log10(1e5 * wire_diameter * frequency / SPEED_OF_LIGHT) ** 2

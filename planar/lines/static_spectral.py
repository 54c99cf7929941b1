"""Quasi-static strip lines in any stack of dielectrics, solved to convergence.

The charge on a strip is a Chebyshev series over the edge weight 1/sqrt(1 - t^2); its transform is
a Bessel function, and Galerkin's method in the spectral domain gives the capacitance as a bound.
The static kernel is 1/(eps0 k (Y_below + Y_above)). What it tends to for large k, a homogeneous
half-and-half medium, is a logarithm in space and is integrated exactly; the rest decays with the
thickness of the layers touching the strip and is summed by Gauss panels.
"""

from __future__ import annotations

import itertools
import math
from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray
from scipy import special

from planar.errors import RangeError
from planar.lines.ranges import require
from planar.units import SPEED_OF_LIGHT, VACUUM_PERMITTIVITY

Array = NDArray[np.float64]

_POINTS, _WEIGHTS = special.roots_legendre(8)
_PANEL_PHASE = 5.0  # rad of the fastest oscillation per 8-point panel: error below 1e-9
_PANEL_GROWTH = 1.5  # ratio of panel ends: resolves tanh(kh) of every thickness alike
_TAIL = 1e-6  # part of the kernel left beyond the last panel
_MOST_TERMS = 80
_MOST_LAYER_TERMS = 16


@dataclass(frozen=True)
class DielectricLayer:
    """One layer: `thickness` in m, relative permittivity `eps_r`, loss tangent `tan_d`.

    The static solution uses thickness and permittivity; the loss formulas use `tan_d` as well.
    """

    thickness: float
    eps_r: float
    tan_d: float = 0.0


@dataclass(frozen=True)
class StaticLine:
    """Quasi-static line: `impedance` in ohm, relative `eps_eff`."""

    impedance: float
    eps_eff: float


@dataclass(frozen=True)
class _Stack:
    """Layers from the strip downward and upward; below them a metal plane or open air."""

    below: tuple[DielectricLayer, ...]
    above: tuple[DielectricLayer, ...]
    grounded: bool

    def as_air(self) -> _Stack:
        """The same stack with every permittivity 1."""
        return replace(
            self,
            below=tuple(replace(layer, eps_r=1.0) for layer in self.below),
            above=tuple(replace(layer, eps_r=1.0) for layer in self.above),
        )

    @property
    def eps_sum(self) -> float:
        """Sum of the permittivities touching the strip: what Y_below + Y_above tends to."""
        return sum(side[0].eps_r if side else 1.0 for side in (self.below, self.above))

    @property
    def height(self) -> float:
        """Thickness below the strip in m."""
        return sum(layer.thickness for layer in self.below)


def static_admittance(wavenumber: Array, layers: Sequence[DielectricLayer], *, grounded: bool = False) -> Array:
    """Static admittance Y(k), relative to eps0 k, of a half space seen from the strip; shape of `wavenumber`.

    `wavenumber` in 1/m, positive; `layers` in order from the strip outward, ended by a metal plane
    if `grounded`, else by open air. Y = eps (Y_next + eps tanh kh)/(eps + Y_next tanh kh), on metal
    eps coth kh: the transmission-line form of Yamashita & Mittra, IEEE Trans. MTT-16 (1968) 251.
    """
    outward = list(layers)
    admittance = np.ones_like(wavenumber)
    if grounded:
        last = outward.pop()
        admittance = last.eps_r / np.tanh(wavenumber * last.thickness)
    for layer in reversed(outward):
        tanh = np.tanh(wavenumber * layer.thickness)
        eps = layer.eps_r
        admittance = eps * (admittance + eps * tanh) / (eps + admittance * tanh)
    return admittance


def microstrip_static(
    width: float, *, below: Sequence[DielectricLayer], above: Sequence[DielectricLayer] = ()
) -> StaticLine:
    """Impedance and effective permittivity of a zero-thickness strip over a metal plane.

    `width` in m; `below` from the strip down to the plane (at least one layer), `above` from the
    strip upward, then open air. Relative accuracy better than 1e-5, without thin covers 1e-8.
    Raises `RangeError` for a width over height outside 0.005 to 100, a layer thinner than 0.1 um or
    with eps_r below 1. Yamashita & Mittra, IEEE Trans. MTT-16 (1968) 251; edge-weighted
    Galerkin basis of Itoh & Mittra, IEEE Trans. MTT-21 (1973) 496 (from memory).
    """
    stack = _Stack(tuple(below), tuple(above), grounded=True)
    _check_layers(stack)
    if not stack.below:
        raise RangeError("microstrip: no layer between strip and plane, one is needed")
    require("width / height", width / stack.height, (0.005, 100.0))
    # The image in the plane lies 4H/w strip halves off and sets how fast the series converges.
    terms = max(_terms(math.asinh(4.0 * stack.height / width)), _layer_terms(stack, width)) // 2 + 3
    return _static_line(stack, lambda each: _single_capacitance(width, each, terms))


def coplanar_strips_static(
    width: float,
    gap: float,
    *,
    below: Sequence[DielectricLayer] = (),
    above: Sequence[DielectricLayer] = (),
) -> StaticLine:
    """Impedance and effective permittivity of two equal zero-thickness strips, driven against each other.

    `width` of each strip and `gap` between them in m; `below` and `above` from the strips outward,
    each ended by open air. Relative accuracy better than 1e-5, without thin covers 1e-8. Raises
    `RangeError` for a gap over width outside 0.002 to 200, a layer thinner than 0.1 um or with eps_r
    below 1. Sources as `microstrip_static`; the pair's transform carries sin(k c + n pi/2), c half the pitch.
    """
    stack = _Stack(tuple(below), tuple(above), grounded=False)
    _check_layers(stack)
    require("width", width, (1e-6, 1.0), "length")
    require("gap / width", gap / width, (0.002, 200.0))
    # The other strip's edge lies 2s/w strip halves beyond this one's.
    terms = max(_terms(math.acosh(1.0 + 2.0 * gap / width)), _layer_terms(stack, width)) + 3
    return _static_line(stack, lambda each: _pair_capacitance(width, gap, each, terms))


def _static_line(stack: _Stack, capacitance: Callable[[_Stack], float]) -> StaticLine:
    """Impedance and permittivity from the capacitance with the dielectrics and with air instead."""
    filled, empty = capacitance(stack), capacitance(stack.as_air())
    return StaticLine(
        impedance=1.0 / (SPEED_OF_LIGHT * math.sqrt(filled * empty)),
        eps_eff=filled / empty,
    )


def _single_capacitance(width: float, stack: _Stack, terms: int) -> float:
    """Capacitance in F/m of one strip over the plane, from `terms` even basis functions."""
    half = width / 2.0
    orders = 2 * np.arange(terms)
    # Homogeneous part with its image: kernel (1 - exp(-2kH))/k, in space ln(sqrt(x^2 + 4H^2)/|x|).
    image = _chebyshev_moments(
        lambda t, u: 0.5 * np.log((half * (t - u)) ** 2 + 4.0 * stack.height**2),
        2 * terms,
        math.asinh(4.0 * stack.height / width),
    )[::2, ::2]
    matrix = (_log_moments(half, orders) + image) / stack.eps_sum
    wavenumber, weight = _panels(stack, width)
    if len(wavenumber):
        homogeneous = -np.expm1(-2.0 * wavenumber * stack.height) / stack.eps_sum
        signs = np.where(orders % 4 == 0, 1.0, -1.0)[:, None]
        basis = signs * _bessel(2 * terms - 1, half * wavenumber)[orders]
        matrix += (basis * (weight * (_kernel(stack, wavenumber) - homogeneous))) @ basis.T
    return _capacitance(matrix)


def _pair_capacitance(width: float, gap: float, stack: _Stack, terms: int) -> float:
    """Capacitance in F/m between the two strips, from `terms` basis functions on each."""
    half, centre = width / 2.0, (width + gap) / 2.0
    orders = np.arange(terms)
    distance = 2.0 * gap / width
    mirror = _chebyshev_moments(lambda t, u: np.log(2.0 * centre + half * (t + u)), terms, math.acosh(1.0 + distance))
    matrix = 2.0 * (_log_moments(half, orders) + mirror) / stack.eps_sum
    wavenumber, weight = _panels(stack, gap + 2.0 * width)
    if len(wavenumber):
        phase = wavenumber * centre
        waves = (np.sin(phase), np.cos(phase), -np.sin(phase), -np.cos(phase))
        basis = 2.0 * _bessel(terms - 1, half * wavenumber)
        for order in range(terms):
            basis[order] *= waves[order % 4]
        difference = _kernel(stack, wavenumber) - 1.0 / stack.eps_sum
        matrix += (basis * (weight * difference)) @ basis.T
    return _capacitance(matrix)


def _kernel(stack: _Stack, wavenumber: Array) -> Array:
    """1/(Y_below + Y_above), the Green's function times eps0 k."""
    below = static_admittance(wavenumber, stack.below, grounded=stack.grounded)
    return 1.0 / (below + static_admittance(wavenumber, stack.above))


def _capacitance(matrix: Array) -> float:
    """Charge per volt: the strip's potential is constant, so only its zeroth moment is excited."""
    excitation = np.zeros(len(matrix))
    excitation[0] = 1.0
    charge = np.linalg.solve(matrix / (math.pi * VACUUM_PERMITTIVITY), excitation)
    return float(charge[0])


def _log_moments(half: float, orders: NDArray[np.int_]) -> Array:
    """Moments of -ln|x - x'| between edge-weighted Chebyshev functions on one strip: diagonal.

    -ln|t - t'| = ln 2 + sum 2 T_n(t) T_n(t')/n; each function is T_n/(pi sqrt(1 - t^2)).
    """
    diagonal = 1.0 / (2.0 * np.maximum(orders, 1))
    diagonal[0] = math.log(2.0 / half)
    return np.diag(diagonal)


def _chebyshev_moments(kernel: Callable[[Array, Array], Array], terms: int, decay: float) -> Array:
    """Moments of a smooth `kernel(t, t')` between edge-weighted Chebyshev functions, (terms, terms).

    Gauss-Chebyshev rule; `decay` is the rate at which the kernel's Chebyshev series falls.
    """
    count = terms + min(400, max(8, math.ceil(18.0 / decay)))
    angle = (np.arange(count) + 0.5) * math.pi / count
    node = np.cos(angle)
    cosines = np.cos(np.outer(np.arange(terms), angle)) / count
    moments: Array = cosines @ kernel(node[:, None], node[None, :]) @ cosines.T
    return moments


def _panels(stack: _Stack, extent: float) -> tuple[Array, Array]:
    """Wavenumbers in 1/m and weights of dk/k, up to where the kernel has become homogeneous.

    `extent` in m is the largest distance between two points of the copper: exp(j k extent) is the
    fastest oscillation. Empty if the medium is homogeneous.
    """
    layers = (*stack.below, *stack.above)
    if all(layer.eps_r == 1.0 for layer in layers):
        return np.empty(0), np.empty(0)
    thinnest, total = _touching(stack), sum(layer.thickness for layer in layers)
    last = -0.5 * math.log(_TAIL) / thinnest
    ends = [0.0, 0.25 / total]
    while ends[-1] < last:
        ends.append(ends[-1] * _PANEL_GROWTH)
    cuts = [
        np.linspace(low, high, math.ceil((high - low) * extent / _PANEL_PHASE) + 1)[:-1]
        for low, high in itertools.pairwise(ends)
    ]
    edges = np.append(np.concatenate(cuts), ends[-1])
    lengths = np.diff(edges)[:, None]
    wavenumber = (edges[:-1, None] + 0.5 * lengths * (1.0 + _POINTS)).ravel()
    return wavenumber, (0.5 * lengths * _WEIGHTS).ravel() / wavenumber


def _touching(stack: _Stack) -> float:
    """Thickness in m of the thinnest layer touching the strip."""
    return min(side[0].thickness for side in (stack.below, stack.above) if side)


def _bessel(highest: int, argument: Array) -> Array:
    """J_0 to J_highest of a positive `argument` (n,), shape (highest + 1, n).

    Upward recurrence where the argument exceeds the order, else downward in the ratios
    J_n/J_(n-1) (Miller's algorithm; Numerical Recipes, section 5.5): each is stable in its region.
    """
    orders = np.empty((highest + 1, len(argument)))
    large = argument > highest
    z = argument[large]
    previous, current = special.j0(z), special.j1(z)
    for order in range(highest + 1):
        orders[order, large] = previous
        previous, current = current, 2.0 * (order + 1) / z * current - previous
    z = argument[~large]
    start = highest + 20 + highest // 2
    ratios = np.zeros((start + 1, len(z)))
    for order in range(start - 1, 0, -1):
        ratios[order] = 1.0 / (2.0 * order / z - ratios[order + 1])
    ratios[0] = special.j0(z)
    orders[:, ~large] = np.cumprod(ratios[: highest + 1], axis=0)
    return orders


def _terms(decay: float) -> int:
    """Basis functions for a charge whose coefficients fall as exp(-decay n): energy as exp(-2 decay n)."""
    return min(_MOST_TERMS, math.ceil(8.0 / decay))


def _layer_terms(stack: _Stack, width: float) -> int:
    """Basis functions for images in a thin layer touching the strip.

    They are close but weak: the factor 4 on their distance and the ceiling were set where more
    functions change the capacitance by less than 1e-5.
    """
    if not (stack.below or stack.above):
        return 0
    return min(_MOST_LAYER_TERMS, _terms(math.asinh(16.0 * _touching(stack) / width)))


def _check_layers(stack: _Stack) -> None:
    for layer in (*stack.below, *stack.above):
        require("layer thickness", layer.thickness, (1e-7, 1.0), "length")
        require("layer eps_r", layer.eps_r, (1.0, 200.0))

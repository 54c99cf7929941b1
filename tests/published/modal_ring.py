"""Current modes of a printed circular strip ring on a stack of layers, as an oracle for the field solver.

Nothing of planar is used. The formulas are those of the section "Printed circular strip loop on an infinite slab:
modal solution (C) and how to rebuild it as a test oracle" of the project's check values, where C reads: "computed
independently of this project from published equations with separate throw-away code; agrees with at least one
other method". The current flows along phi with the edge profile f = 1/(pi sqrt((w/2)^2 - (rho - a)^2)); its modes
cos(n phi) decouple:

    zeta_n = int_0^inf k [V^h F_h^2 + V^e F_e^2] dk
    F_h = int rho f J_n'(k rho) d rho,   F_e = (n/k) int f J_n(k rho) d rho
    Y = (1/2 pi) sum over all n of sinc^2(n gamma/2)/zeta_n

with V^e, V^h of Michalski & Mosig, IEEE T-AP 45 (1997) 508 (time factor exp(+j omega t)). The integrand falls only as
1/k^2. Its limit for large k, the static field of the two media that touch the ring, is therefore taken out and
integrated exactly: int_0^inf J_m(k r) J_m(k s) dk = Q_{m-1/2}((r^2 + s^2)/(2 r s))/(pi sqrt(r s)) (Watson, Theory of
Bessel Functions, 13.22). What remains falls as 1/k^4 and is integrated along a path above the poles.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass
from functools import cache
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray
from scipy.constants import epsilon_0, mu_0, speed_of_light
from scipy.optimize import brentq
from scipy.special import gammaln, hyp2f1, jv

Complex = NDArray[np.complex128]
Real = NDArray[np.float64]
Layer = tuple[float, complex]


@dataclass(frozen=True)
class Ring:
    """A flat ring without thickness or loss: `radius` of its centre line and `width` of its strip, both in m."""

    radius: float
    width: float


@dataclass(frozen=True)
class Stack:
    """Dielectric layers, bottom to top, each `(thickness in m, complex relative permittivity)`, open above.

    Below is a metal plane, or air where `metal_backed` is false. The ring lies on top of the first `interface` layers.
    """

    layers: tuple[Layer, ...] = ()
    metal_backed: bool = False
    interface: int = 0

    def __post_init__(self) -> None:
        lowest = 1 if self.metal_backed else 0
        if not lowest <= self.interface <= len(self.layers):
            raise ValueError(f"interface {self.interface}: must be {lowest} to {len(self.layers)}")

    @property
    def neighbours(self) -> tuple[Layer, Layer]:
        """The layers that touch the ring from below and from above; open air is infinitely thick."""
        air = (math.inf, 1.0 + 0.0j)
        padded = (air, *self.layers, air)
        return padded[self.interface], padded[self.interface + 1]


class Resonance(NamedTuple):
    """`frequency` in Hz, `impedance` in ohm of mode 1 there, and `quality` = f abs(dZ/df)/(2 R).

    The Q is that of Yaghjian & Best, IEEE T-AP 53 (2005) 1298, eq. 96, at resonance.
    """

    frequency: float
    impedance: complex
    quality: float


class Path(NamedTuple):
    """Nodes in rad/m and weights of the integration over k: a bent part, then the real axis."""

    bent: Complex
    bent_weights: Complex
    straight: Real
    straight_weights: Real


def mode_impedance(order: int, frequency: float, ring: Ring, stack: Stack, *, reach: float = 1.0) -> complex:
    """V/I_n in ohm of the current I_n cos(n phi) at `frequency` in Hz: pi zeta_n, or 2 pi zeta_0 for order 0.

    Good to about 3e-6 of its magnitude with the default end of the integral, which `reach` multiplies. Raises
    ValueError for orders outside 0 to 160: scipy's hypergeometric function overflows at 170.
    """
    if not 0 <= order <= 160:
        raise ValueError(f"order {order}: must be 0 to 160")
    omega = 2.0 * math.pi * frequency
    path = integration_path(order, frequency, ring, stack, reach)
    below, above = (layer[1] for layer in stack.neighbours)
    inductive = 0.5j * omega * mu_0
    capacitive = 1.0 / (1j * omega * epsilon_0 * (below + above))
    transforms, charge = static_integrals(order, ring)
    zeta: complex = inductive * transforms + capacitive * charge
    pieces = ((path.bent, path.bent_weights), (path.straight, path.straight_weights))
    for k, weights in pieces:
        f_h, f_e = strip_transforms(order, k, ring)
        v_e, v_h = interface_voltages(k, frequency, stack)
        dynamic = k * (v_h * f_h**2 + v_e * f_e**2)
        static = inductive * (f_h**2 + f_e**2) + capacitive * (k * f_e) ** 2
        zeta += complex(np.sum(weights * (dynamic - static)))
    return zeta * math.pi * (1 if order else 2)


def resonance(ring: Ring, stack: Stack, bracket: tuple[float, float]) -> Resonance:
    """First frequency in `bracket` (Hz) at which mode 1 is real, with its impedance and Q.

    Raises ValueError if the reactance does not change sign over the bracket.
    """

    def impedance(frequency: float) -> complex:
        return mode_impedance(1, frequency, ring, stack)

    found = float(brentq(lambda trial: impedance(trial).imag, *bracket, xtol=1.0, rtol=1e-8))
    step = 1e-3 * found
    slope = float(abs(impedance(found + step) - impedance(found - step))) / (2.0 * step)
    there = impedance(found)
    return Resonance(found, there, found * slope / (2.0 * there.real))


def gap_admittance(frequency: float, ring: Ring, stack: Stack, gap: float, *, highest_order: int = 60) -> complex:
    """Admittance in S at `frequency` (Hz) of a source that fills a gap of `gap` m along the centre line evenly.

    The conductance converges after a few orders, the susceptance beyond 2 pi radius/gap. Where n width/radius passes 1
    the assumed profile is no longer that of the true current, so the last percent of the susceptance is the model's.
    """
    gamma = gap / ring.radius
    admittance = 0.0j
    for n in range(highest_order + 1):
        spread = float(np.sinc(n * gamma / (2.0 * math.pi)))
        admittance += spread**2 / mode_impedance(n, frequency, ring, stack)
    return admittance


def strip_transforms(order: int, k: NDArray[np.inexact], ring: Ring) -> tuple[Complex, Complex]:
    """F_h and F_e in m at the wavenumbers `k` (K,) rad/m, by Gauss-Chebyshev quadrature over the strip.

    From J_n' = (J_{n-1} - J_{n+1})/2 and n J_n(x)/x = (J_{n-1} + J_{n+1})/2.
    """
    count = 12 + math.ceil(0.5 * float(np.max(np.abs(k))) * ring.width)
    rho = ring.radius + 0.5 * ring.width * np.cos((np.arange(count) + 0.5) * math.pi / count)
    argument = np.multiply.outer(k, rho)
    lower = jv(order - 1, argument) @ rho / count
    upper = jv(order + 1, argument) @ rho / count
    return 0.5 * (lower - upper), 0.5 * (lower + upper)


def interface_voltages(k: NDArray[np.inexact], frequency: float, stack: Stack) -> tuple[Complex, Complex]:
    """V^e and V^h in ohm at the wavenumbers `k` (K,): 1/(Y_up + Y_down) at the interface of the ring."""
    tm_down, tm_up = wave_admittances(k, frequency, stack, tm_admittance)
    te_down, te_up = wave_admittances(k, frequency, stack, te_admittance)
    return 1.0 / (tm_down + tm_up), 1.0 / (te_down + te_up)


def wave_admittances(
    k: NDArray[np.inexact], frequency: float, stack: Stack, wave: Callable[[Complex, complex, float], Complex]
) -> tuple[Complex, Complex]:
    """Admittances in S looking down and up from the ring, by the transmission-line recursion through each layer."""
    omega = 2.0 * math.pi * frequency
    squared = (omega / speed_of_light) ** 2

    def looking(layers: tuple[Layer, ...], metal: bool) -> Complex:
        open_air = wave(normal_wavenumber(k, squared), 1.0, omega)
        seen: Complex | None = None if metal else open_air
        for thickness, eps in layers:
            kz = normal_wavenumber(k, squared * eps)
            own, tangent = wave(kz, eps, omega), np.tanh(1j * kz * thickness)
            seen = own / tangent if seen is None else own * (seen + own * tangent) / (own + seen * tangent)
        assert seen is not None  # Stack refuses a ring that lies on the metal itself
        return seen

    down = looking(stack.layers[: stack.interface], stack.metal_backed)
    up = looking(stack.layers[stack.interface :][::-1], False)
    return down, up


def normal_wavenumber(k: NDArray[np.inexact], squared: complex) -> Complex:
    """k_z in rad/m of a medium whose wavenumber squared is given; decays outward, on and above the real axis of k."""
    return np.asarray(-1j * np.sqrt(k**2 - squared + 0.0j))


def tm_admittance(kz: Complex, eps: complex, omega: float) -> Complex:
    """omega eps/k_z, in S."""
    return np.asarray(omega * epsilon_0 * eps / kz)


def te_admittance(kz: Complex, _eps: complex, omega: float) -> Complex:
    """k_z/(omega mu0), in S."""
    return np.asarray(kz / (omega * mu_0))


def integration_path(order: int, frequency: float, ring: Ring, stack: Stack, reach: float) -> Path:
    """The path over k: an arch over branch points and poles, then the real axis.

    Images in the layers that touch the ring fade as exp(-2 k h); the end is where that is below 1e-6. Modes of high
    order begin near k = n/a. Panels of 12 Gauss points span 1.5 periods of the squared Bessel functions.
    """
    k0 = 2.0 * math.pi * frequency / speed_of_light
    outer = ring.radius + 0.5 * ring.width
    index = math.sqrt(max([1.0, *(abs(eps) for _, eps in stack.layers)]))
    arch = (1.3 * index + 0.2) * k0
    height = min(0.35 * k0, 1.0 / outer)
    thinnest = min(thickness for thickness, _ in stack.neighbours)
    end = reach * max(7.0 / thinnest, 80.0 * index * k0, 4.0 * order / ring.radius, 2.0 * arch)
    longest = 1.5 * math.pi / outer
    t, weights = gauss_panels(0.0, arch, longest / 2.0)
    bent = t + 1j * height * np.sin(math.pi * t / arch)
    turn = 1.0 + 1j * height * math.pi / arch * np.cos(math.pi * t / arch)
    straight, straight_weights = gauss_panels(arch, end, longest)
    return Path(bent, weights * turn, straight, straight_weights)


def gauss_panels(start: float, end: float, longest: float) -> tuple[Real, Real]:
    """Nodes and weights, both (P * 12,), of a composite Gauss rule with panels no longer than `longest`."""
    edges = np.linspace(start, end, math.ceil((end - start) / longest) + 1)
    node, weight = np.polynomial.legendre.leggauss(12)
    half = 0.5 * np.diff(edges)
    middle = 0.5 * (edges[1:] + edges[:-1])
    return (middle[:, None] + half[:, None] * node).ravel(), (half[:, None] * weight).ravel()


@cache
def static_integrals(order: int, ring: Ring) -> tuple[float, float]:
    """int (F_h^2 + F_e^2) dk in m and int (k F_e)^2 dk in 1/m, over k from 0 to infinity.

    F_h^2 + F_e^2 is half the sum of the squared transforms of rho J_{n-1} and rho J_{n+1}.
    """
    transforms = 0.5 * (strip_average(abs(order - 1), ring, 0.5) + strip_average(order + 1, ring, 0.5))
    return transforms, order**2 * strip_average(order, ring, -0.5)


def strip_average(order: int, ring: Ring, power: float) -> float:
    """Average of (r s)^power Q_{order-1/2}((r^2 + s^2)/(2 r s))/pi over r and s, both with the edge profile.

    The two sets of nodes interleave, so the sum never meets the logarithm's singularity at r = s. Its error on
    -ln|r - s| is exactly -ln(2)/count (from ln|cos u - cos v| = -ln 2 - sum 2 cos(m u) cos(m v)/m) and is added back.
    """
    count = 64 + order
    half = 0.5 * ring.width
    r = ring.radius + half * np.cos((np.arange(count) + 0.5) * math.pi / count)
    s = ring.radius + half * np.cos(np.arange(count + 1) * math.pi / count)
    weights = np.full(count + 1, 1.0 / count)
    weights[[0, -1]] *= 0.5
    product = np.multiply.outer(r, s)
    ratio = np.subtract.outer(r, s) ** 2 / (2.0 * product)
    total = float(np.mean((product**power * toroidal_q(order, ratio)) @ weights))
    return (total + math.log(2.0) / count * float(np.mean(r ** (2.0 * power)))) / math.pi


def toroidal_q(order: int, excess: Real) -> Real:
    """Legendre function Q_{order-1/2}(1 + excess) (Abramowitz & Stegun 8.13; DLMF 14.3.7 in exp(-eta))."""
    eta = 2.0 * np.arcsinh(np.sqrt(0.5 * excess))
    factor = math.sqrt(math.pi) * math.exp(gammaln(order + 0.5) - gammaln(order + 1.0))
    series = hyp2f1(0.5, order + 0.5, order + 1.0, np.exp(-2.0 * eta))
    return np.asarray(factor * np.exp(-(order + 0.5) * eta) * series)

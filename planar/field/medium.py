"""The layered medium as two transmission lines: spectral kernels and surface voltages.

A horizontal current at an interface sees one line of TM and one of TE waves along z (Michalski & Mosig 1997). Written
with the decay constant gamma = j kz of each layer, its admittances are jw eps0 times eps/gamma and gamma/(jw mu0), so
both lines run through the same recursion on eps/gamma and on gamma, which stays exact down to zero frequency.
Layers are numbered bottom to top, interface i is the lower face of layer i, air lies above the last one. Time factor
exp(+jwt): permittivities are eps' - j eps'' and fields decay with Re gamma >= 0.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from planar.errors import GeometryError, RangeError
from planar.stackup import LayerKind, Stackup
from planar.units import SPEED_OF_LIGHT, VACUUM_PERMEABILITY, VACUUM_PERMITTIVITY

Spectrum = NDArray[np.complex128]
Wavenumbers = NDArray[np.float64] | NDArray[np.complex128]

_ELECTRICAL = (LayerKind.AIR, LayerKind.MASK, LayerKind.DIELECTRIC, LayerKind.COVER)
_GRAZING = 1e-14
_CIRCLE_RADIUS = 0.01
_CIRCLE_POINTS = 24
_INSIDE_CIRCLE = 0.2


@dataclass(frozen=True)
class LayeredMedium:
    """Uniform non-magnetic layers bottom to top between open air above and air or a metal plane below.

    `thicknesses` in m, `eps_r` complex relative permittivities eps' - j eps''. No layers at all: free space with the
    one interface 0. Raises `GeometryError` for layers that do not exist so.
    """

    thicknesses: tuple[float, ...]
    eps_r: tuple[complex, ...]
    metal_backed: bool

    def __post_init__(self) -> None:
        if len(self.thicknesses) != len(self.eps_r):
            raise GeometryError(f"{len(self.thicknesses)} thicknesses for {len(self.eps_r)} permittivities")
        if any(not 0.0 < thickness < math.inf for thickness in self.thicknesses):
            raise GeometryError(f"layer thicknesses are {self.thicknesses} m, must be positive")
        if any(not (complex(eps).real > 0.0 and complex(eps).imag <= 0.0) for eps in self.eps_r):
            raise GeometryError(f"permittivities are {self.eps_r}, must be eps' - j eps'' with eps' > 0, eps'' >= 0")
        if self.metal_backed and not self.thicknesses:
            raise GeometryError("copper lies right on the metal plane: no layer between")

    @property
    def top(self) -> int:
        """Number of the topmost interface."""
        return len(self.thicknesses)

    @property
    def eps_max(self) -> float:
        """Largest real part of the permittivities, at least 1 (air)."""
        return max([1.0, *(complex(eps).real for eps in self.eps_r)])


@dataclass(frozen=True)
class SurfaceVoltages:
    """Voltages (V^e, V^h) in ohm at the topmost and the bottommost interface; `bottom` is None over a metal plane."""

    top: tuple[Spectrum, Spectrum]
    bottom: tuple[Spectrum, Spectrum] | None


@dataclass(frozen=True)
class _Line:
    """One transmission line at many k: admittances `ends` (below, above) and of the `layers`, and per layer
    `decay` = exp(-gamma t) and `loss` = 1 - exp(-2 gamma t), which keeps its digits where the layer is thin."""

    ends: tuple[Spectrum, Spectrum]
    layers: tuple[Spectrum, ...]
    decay: tuple[Spectrum, ...]
    loss: tuple[Spectrum, ...]
    metal_backed: bool


def medium_of(stackup: Stackup, frequency: float) -> tuple[LayeredMedium, dict[str, int]]:
    """The electrical layers of `stackup` at `frequency` (Hz), and the interface number of each copper level.

    Copper has no thickness, mask lies flat; legend and layers of no thickness are left out. Raises `GeometryError`
    for a metal plane above copper and `RangeError` outside the range of a layer's model.
    """
    thicknesses: list[float] = []
    eps_r: list[complex] = []
    interfaces: dict[str, int] = {}
    metal_backed = False
    for layer in stackup.layers:
        if layer.kind is LayerKind.METAL_PLANE:
            if thicknesses or interfaces:
                raise GeometryError(f"metal plane {layer.name} lies above other layers; only a lowest one is solved")
            metal_backed = True
        elif layer.kind is LayerKind.COPPER:
            interfaces[layer.name.removeprefix("copper-")] = len(thicknesses)
        elif layer.kind in _ELECTRICAL and layer.thickness > 0.0:
            thicknesses.append(layer.thickness)
            eps_r.append(layer.permittivity(frequency))
    return LayeredMedium(tuple(thicknesses), tuple(eps_r), metal_backed), interfaces


def wavenumber(frequency: float) -> float:
    """Free-space wavenumber in rad/m at `frequency` (Hz). Raises `RangeError` unless it is positive and finite."""
    if not 0.0 < frequency < math.inf:
        raise RangeError(f"frequency is {frequency} Hz, must be positive")
    return 2.0 * math.pi * frequency / SPEED_OF_LIGHT


def require_interface(medium: LayeredMedium, interface: int) -> None:
    """Raise `GeometryError` unless currents can flow at `interface`: it exists and is not the metal plane."""
    if not 0 <= interface <= medium.top:
        raise GeometryError(f"no interface {interface}; there are 0 to {medium.top}")
    if interface == 0 and medium.metal_backed:
        raise GeometryError("interface 0 is the metal plane; no current can be impressed there")


def spectral_kernels(
    medium: LayeredMedium, frequency: float, k: Wavenumbers, i: int, j: int
) -> tuple[Spectrum, Spectrum]:
    """Spectral G_A (H) and K_phi (m/F, both still to be transformed) of a source at interface i seen at interface j.

    `k` are radial wavenumbers in rad/m, any shape, real or just above the real axis; the results have its shape.
    G_A = V^h/(jw), K_phi = jw (V^e - V^h)/k^2: Michalski & Mosig, IEEE T-AP 45 (1997) 508, formulation C. Near k = 0,
    where V^e - V^h cancels, K_phi is taken from its values on a circle in k^2 (Cauchy's integral formula).
    Raises `GeometryError` for an interface that carries no current and `RangeError` for a bad frequency.
    """
    require_interface(medium, i)
    require_interface(medium, j)
    k0 = wavenumber(frequency)
    shape = np.shape(k)
    squared = np.asarray(k, dtype=np.complex128).reshape(-1) ** 2
    electric, magnetic = _voltages(medium, k0, squared, i, j)
    central = np.abs(squared) < _INSIDE_CIRCLE * _CIRCLE_RADIUS * k0**2
    scalar = (electric + k0**2 * magnetic) / np.where(central, k0**2, squared)
    if central.any():
        angles = 2.0 * np.pi * (np.arange(_CIRCLE_POINTS) + 0.5) / _CIRCLE_POINTS
        circle = _CIRCLE_RADIUS * k0**2 * np.exp(1j * angles)
        electric, around = _voltages(medium, k0, circle, i, j)
        values = (electric + k0**2 * around) / _CIRCLE_POINTS
        scalar[central] = (values / (circle - squared[central][..., None])).sum(axis=-1)
    vector, scalar = VACUUM_PERMEABILITY * magnetic, scalar / VACUUM_PERMITTIVITY
    return vector.reshape(shape), scalar.reshape(shape)


def surface_voltages(medium: LayeredMedium, frequency: float, k: Wavenumbers, i: int) -> SurfaceVoltages:
    """V^e and V^h (ohm) at both outer interfaces for a unit shunt current at interface i: the far field needs them.

    `k` = k0 sin(theta) in rad/m, any shape. In free space V^e = eta0 cos(theta)/2 and V^h = eta0/(2 cos(theta)), which
    grows without bound at grazing. Source: Michalski & Mosig 1997. Raises as `spectral_kernels`.
    """
    require_interface(medium, i)
    k0 = wavenumber(frequency)
    omega = k0 * SPEED_OF_LIGHT
    squared = np.asarray(k, dtype=np.complex128) ** 2

    def ohms(j: int) -> tuple[Spectrum, Spectrum]:
        electric, magnetic = _voltages(medium, k0, squared, i, j)
        return electric / (1j * omega * VACUUM_PERMITTIVITY), 1j * omega * VACUUM_PERMEABILITY * magnetic

    return SurfaceVoltages(ohms(medium.top), None if medium.metal_backed else ohms(0))


def _voltages(medium: LayeredMedium, k0: float, squared: Spectrum, i: int, j: int) -> tuple[Spectrum, Spectrum]:
    """jw eps0 V^e (1/m) and V^h/(jw mu0) (m) for squared wavenumbers."""
    inner = tuple(_decay_constant(complex(eps) * k0**2 - squared, k0) for eps in medium.eps_r)
    outer = _decay_constant(k0**2 - squared, k0)
    decay = tuple(np.exp(-gamma * t) for gamma, t in zip(inner, medium.thicknesses, strict=True))
    loss = tuple(-np.expm1(-2.0 * t * gamma) for gamma, t in zip(inner, medium.thicknesses, strict=True))
    tm = tuple(complex(eps) / gamma for eps, gamma in zip(medium.eps_r, inner, strict=True))
    lines = (
        _Line((1.0 / outer, 1.0 / outer), tm, decay, loss, medium.metal_backed),
        _Line((outer, outer), inner, decay, loss, medium.metal_backed),
    )
    electric, magnetic = (_voltage(line, i, j) for line in lines)
    return electric, magnetic


def _decay_constant(kz_squared: Spectrum, k0: float) -> Spectrum:
    """gamma = j kz with Re kz > 0 where the wave propagates and Im kz < 0 where it decays.

    Exactly at grazing it is replaced by a value far below any that matters, so that 1/gamma exists.
    """
    kz = np.sqrt(kz_squared)
    kz = np.where((kz.imag > 0.0) & (kz_squared.real < 0.0), -kz, kz)
    return np.asarray(1j * np.where(kz == 0.0, _GRAZING * k0, kz), dtype=np.complex128)


def _voltage(line: _Line, i: int, j: int) -> Spectrum:
    """Voltage at interface j for a unit shunt current at interface i."""
    down = _admittances_down(line, i)
    up = _admittances_up(line, i)
    voltage = 1.0 / (down[i] + up[0])
    crossed, beyond = (range(i, j), up[1:]) if j >= i else (range(i - 1, j - 1, -1), down[i - 1 :: -1])
    for layer, admittance in zip(crossed, beyond, strict=False):
        ratio = admittance / line.layers[layer]
        loss = line.loss[layer]
        voltage = voltage * 2.0 * line.decay[layer] / ((2.0 - loss) + ratio * loss)
    return np.asarray(voltage, dtype=np.complex128)


def _admittances_up(line: _Line, i: int) -> Sequence[Spectrum]:
    """Admittances seen upward from interfaces i, i + 1, ... to the top."""
    seen = [line.ends[1]]
    for layer in range(len(line.layers) - 1, i - 1, -1):
        seen.append(_through(line, layer, seen[-1]))
    return seen[::-1]


def _admittances_down(line: _Line, i: int) -> Sequence[Spectrum]:
    """Admittances seen downward from interfaces 0, 1, ... i; infinite at a metal plane."""
    seen = [np.full_like(line.ends[0], np.inf) if line.metal_backed else line.ends[0]]
    for layer in range(i):
        if layer == 0 and line.metal_backed:
            seen.append(line.layers[0] * (2.0 - line.loss[0]) / line.loss[0])
        else:
            seen.append(_through(line, layer, seen[-1]))
    return seen


def _through(line: _Line, layer: int, behind: Spectrum) -> Spectrum:
    """Admittance seen through `layer` with `behind` at its far face: Y (r + T)/(1 + r T), T = tanh(gamma t)."""
    own, loss = line.layers[layer], line.loss[layer]
    ratio = behind / own
    return np.asarray(own * (ratio * (2.0 - loss) + loss) / ((2.0 - loss) + ratio * loss), dtype=np.complex128)

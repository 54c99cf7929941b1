"""The far field of currents on interfaces, by stationary phase, and what follows from it.

E_theta = -(j k0 / 2 pi r) V^e J_rho and E_phi = -(j k0 cos(theta) / 2 pi r) V^h J_phi with the
transform of the current at k = k0 sin(theta), exp(-j k0 r)/r left out; V^e and V^h are the voltages
at the outer surface. The lower half space is the same seen from below. Angles and the sense of
polarisation follow IEEE Std 145.
"""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from planar.field.basis import Basis
from planar.field.medium import LayeredMedium, surface_voltages
from planar.field.mesh import Mesh
from planar.field.potentials import THREE_POINTS
from planar.units import SPEED_OF_LIGHT, WAVE_IMPEDANCE

Array = NDArray[np.float64]
Complex = NDArray[np.complex128]


@dataclass(frozen=True)
class Radiator:
    """Currents to radiate: `mesh` and `basis`, `currents` (n,) of its functions, and the `interface` of each level."""

    mesh: Mesh
    basis: Basis
    currents: Complex
    medium: LayeredMedium
    interfaces: Mapping[int, int]
    frequency: float


@dataclass(frozen=True, eq=False)
class FarField:
    """Field at directions `theta`, `phi` (n,) rad: `e_theta`, `e_phi` (n,) V, times exp(-j k0 r)/r."""

    theta: Array
    phi: Array
    e_theta: Complex
    e_phi: Complex

    @cached_property
    def intensity(self) -> Array:
        """Radiation intensity, (n,) W/sr."""
        intensity: Array = (np.abs(self.e_theta) ** 2 + np.abs(self.e_phi) ** 2) / (2.0 * WAVE_IMPEDANCE)
        return intensity

    @cached_property
    def circular(self) -> tuple[Complex, Complex]:
        """Right- and left-hand circular components, (n,) V; right turns clockwise seen along propagation."""
        right = (self.e_theta + 1j * self.e_phi) / math.sqrt(2.0)
        left = (self.e_theta - 1j * self.e_phi) / math.sqrt(2.0)
        return right, left

    @cached_property
    def axial_ratio_db(self) -> Array:
        """Axial ratio, (n,) dB; infinite where linear and where there is no field."""
        right, left = (np.abs(part) for part in self.circular)
        ratio = np.full(right.shape, np.inf)
        np.divide(right + left, np.abs(right - left), out=ratio, where=right != left)
        decibels: Array = 20.0 * np.log10(ratio)
        return decibels

    def sense(self, index: int) -> str:
        """ "right", "left" or "linear" (axial ratio above 40 dB) at one direction."""
        right, left = self.circular
        if self.axial_ratio_db[index] > 40.0:
            return "linear"
        return "right" if abs(right[index]) > abs(left[index]) else "left"


def far_field(radiator: Radiator, theta: Array, phi: Array) -> FarField:
    """Far field at directions `theta`, `phi` (n,) rad, theta from the top side's normal; zero below a metal plane."""
    k0 = 2.0 * math.pi * radiator.frequency / SPEED_OF_LIGHT
    e_theta = np.zeros(len(theta), dtype=np.complex128)
    e_phi = np.zeros(len(theta), dtype=np.complex128)
    top = np.cos(theta) > 0.0
    cosine, sine = np.abs(np.cos(theta)), np.sin(theta)
    k = k0 * sine
    transforms = _transforms(radiator, k, phi)
    for level, (jx, jy) in transforms.items():
        j_rho = jx * np.cos(phi) + jy * np.sin(phi)
        j_phi = jy * np.cos(phi) - jx * np.sin(phi)
        outer = surface_voltages(radiator.medium, radiator.frequency, k, radiator.interfaces[level])
        for half, voltages, turn in ((top, outer.top, 1.0), (~top, outer.bottom, -1.0)):
            if voltages is None:
                continue
            v_e, v_h = voltages
            # seen from below, theta runs the other way: the tangential part of e_theta changes sign
            e_theta[half] += (-1j * k0 / (2.0 * math.pi) * turn * v_e * j_rho)[half]
            e_phi[half] += (-1j * k0 * cosine / (2.0 * math.pi) * v_h * j_phi)[half]
    return FarField(theta, phi, e_theta, e_phi)


def radiated_power(radiator: Radiator, *, polar: int = 24, around: int = 24) -> float:
    """Power through the far sphere, W, by Gauss-Legendre in cos(theta) on each half and even steps in phi."""
    nodes, weights = np.polynomial.legendre.leggauss(polar)
    cosine = 0.5 * (nodes + 1.0)
    half_weights = 0.5 * weights
    theta = np.concatenate([np.arccos(cosine), np.pi - np.arccos(cosine)])
    ring = np.linspace(0.0, 2.0 * np.pi, around, endpoint=False)
    field = far_field(radiator, np.repeat(theta, around), np.tile(ring, 2 * polar))
    weight = np.repeat(np.concatenate([half_weights, half_weights]), around) * 2.0 * np.pi / around
    return float(np.sum(field.intensity * weight))


def _transforms(radiator: Radiator, k: Array, phi: Array) -> dict[int, tuple[Complex, Complex]]:
    """Transforms int J exp(j k . r) dS by level, each (n,) A m."""
    mesh, basis, currents = radiator.mesh, radiator.basis, radiator.currents
    density = basis.density.T @ currents
    anchor = np.column_stack([basis.anchor_x.T @ currents, basis.anchor_y.T @ currents])
    points = np.einsum("sc,tck->tsk", THREE_POINTS, mesh.corners)
    flow = density[:, None, None] * points - anchor[:, None, :]  # (t, 3, 2) A/m
    weighted = flow * (mesh.areas / 3.0)[:, None, None]
    wave = np.column_stack([k * np.cos(phi), k * np.sin(phi)])
    transforms = {}
    for level in np.unique(mesh.level):
        here = mesh.level == level
        at, amount = points[here].reshape(-1, 2), weighted[here].reshape(-1, 2)
        phase = np.exp(1j * wave @ at.T)
        transforms[int(level)] = (phase @ amount[:, 0], phase @ amount[:, 1])
    return transforms

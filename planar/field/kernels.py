"""Kernels over distance: static images to be integrated exactly, and a smooth rest to be interpolated.

G(rho) = sum of c_i/(4 pi sqrt(rho^2 + h_i^2)) + table. The images (kernel_images) hold all that varies faster than a
mesh cell; the rest is what the inverse Hankel transform (kernel_path) gives of the spectral kernel less its images,
on distances spaced evenly in sqrt(rho). A plan is made once for a grid and a sweep; then a frequency costs one
evaluation of the spectrum and a few matrix products.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from planar.errors import RangeError
from planar.field.kernel_images import image_amplitudes, image_heights, lowest_left_out
from planar.field.kernel_path import Path, PathLimits, hankel_path
from planar.field.medium import LayeredMedium, spectral_kernels, wavenumber

Floats = NDArray[np.float64]
Complexes = NDArray[np.complex128]

_LEAST_POINTS = 8
_STENCIL = 4
_LOWEST_SHARE = 0.5
_INDEX_SLACK = 1.05
_DECAY = 28.0
_FREE_REACH = 1e4


@dataclass(frozen=True)
class RhoGrid:
    """Distances from 0 to `rho_max` (m), `count` of them, evenly spaced in sqrt(rho).

    Raises `RangeError` unless `rho_max` is positive and there are at least 8 points.
    """

    rho_max: float
    count: int = 400

    def __post_init__(self) -> None:
        if not 0.0 < self.rho_max < math.inf:
            raise RangeError(f"largest distance is {self.rho_max} m, must be positive")
        if self.count < _LEAST_POINTS:
            raise RangeError(f"grid has {self.count} points, needs at least {_LEAST_POINTS}")

    @cached_property
    def points(self) -> Floats:
        """Distances (count,) in m, ascending, the first 0."""
        points = self.rho_max * np.linspace(0.0, 1.0, self.count) ** 2
        points.setflags(write=False)
        return points

    def weights(self, rho: Floats) -> tuple[NDArray[np.int32], Floats]:
        """Indices (m, 4) and weights (m, 4) of distances `rho` (m,) in m.

        A table f on the points has the value (weights * f[indices]).sum(1) there: Lagrange's cubic in sqrt(rho)
        through the four nearest points. Raises `RangeError` outside the grid.
        """
        if rho.size and not (rho.min() >= 0.0 and rho.max() <= self.rho_max * (1.0 + 1e-12)):
            raise RangeError(f"distances {rho.min()} to {rho.max()} m, the grid covers 0 to {self.rho_max} m")
        place = np.sqrt(rho / self.rho_max) * (self.count - 1)
        first = np.clip(np.floor(place) - 1.0, 0.0, self.count - float(_STENCIL))
        x = place - first
        a, b, c = x - 1.0, x - 2.0, x - 3.0
        bc, xa = b * c, x * a
        weights = np.stack([a * bc / -6.0, x * bc / 2.0, xa * c / -2.0, xa * b / 6.0], axis=-1)
        return first.astype(np.int32)[:, None] + np.arange(_STENCIL, dtype=np.int32), weights


@dataclass(frozen=True, eq=False)
class SpatialKernel:
    """Both kernels of one pair of interfaces at one frequency.

    `heights` of the images in m; `vector_images` (m,) of G_A in H/m and `scalar_images` (m,) of K_phi in m/F, each
    image being c/(4 pi sqrt(rho^2 + h^2)); `vector_table` and `scalar_table` (count,) of the rest on the grid.
    """

    heights: tuple[float, ...]
    vector_images: Complexes
    scalar_images: Complexes
    vector_table: Complexes
    scalar_table: Complexes


@dataclass(frozen=True, eq=False)
class SommerfeldPlan:
    """Everything of the transform that does not depend on frequency. Made by `SommerfeldPlan.of`.

    `frequency` in Hz is the highest it serves, `lowest_frequency` the lowest.
    """

    frequency: float
    thicknesses: tuple[float, ...]
    metal_backed: bool
    limits: PathLimits
    path: Path

    @classmethod
    def of(cls, medium: LayeredMedium, frequency: float, grid: RhoGrid) -> SommerfeldPlan:
        """Plan for kernels on `grid` in media layered like `medium`, from half of `frequency` (Hz) up to it.

        `medium` is that of the highest frequency; permittivities may differ at others by what dispersion brings.
        """
        return _plan(grid.points, medium, frequency, refinement=1.0)

    @property
    def lowest_frequency(self) -> float:
        """Lowest frequency the nodes resolve, Hz."""
        return _LOWEST_SHARE * self.frequency


def spatial_kernel(plan: SommerfeldPlan, medium: LayeredMedium, frequency: float, i: int, j: int) -> SpatialKernel:
    """Kernels of source interface i seen at interface j at `frequency` (Hz).

    Relative error of images and table together below 1e-6 up to two wavelengths, and 1e-5 between the 400 points of a
    table; more only where a metal plane a thousand times nearer has cancelled the kernel to a trifle. Source:
    Michalski & Mosig, IEEE T-AP 45 (1997) 508, formulation C. Raises `RangeError` where the plan was made for another
    medium or frequency, `GeometryError` for an interface that carries no current.
    """
    _require_fit(plan, medium, frequency)
    heights = image_heights(medium, i, j)
    vector, scalar = image_amplitudes(medium, i, j)
    k = plan.path.nodes
    images = 0.5 * np.exp(-k[:, None] * np.array(heights))
    kernels = np.stack(spectral_kernels(medium, frequency, k, i, j), axis=1)
    tables = plan.path.transformed(k[:, None] * kernels - images @ np.stack([vector, scalar], axis=1))
    return SpatialKernel(heights, vector, scalar, tables[:, 0].copy(), tables[:, 1].copy())


def exact_kernels(medium: LayeredMedium, frequency: float, i: int, j: int, rho: Floats) -> tuple[Complexes, Complexes]:
    """G_A (H/m^2) and K_phi (1/F) at distances `rho` (m,) in m, all positive, without a table and with twice the nodes.

    For checks: it costs a plan at every call. Raises as `spatial_kernel`.
    """
    if not (rho.size and rho.min() > 0.0):
        raise RangeError("distances must be positive")
    ascending = np.unique(rho)
    kernel = spatial_kernel(_plan(ascending, medium, frequency, refinement=2.0), medium, frequency, i, j)
    inverse = 1.0 / (4.0 * np.pi * np.sqrt(ascending[:, None] ** 2 + np.array(kernel.heights) ** 2))
    places = np.searchsorted(ascending, rho)
    vector = kernel.vector_table + inverse @ kernel.vector_images
    scalar = kernel.scalar_table + inverse @ kernel.scalar_images
    return vector[places], scalar[places]


def _plan(rho: Floats, medium: LayeredMedium, frequency: float, *, refinement: float) -> SommerfeldPlan:
    k0 = wavenumber(frequency)
    reach = max(_FREE_REACH * k0, _DECAY / lowest_left_out(medium))
    limits = PathLimits(k0, _INDEX_SLACK * math.sqrt(medium.eps_max), reach, refinement)
    return SommerfeldPlan(frequency, medium.thicknesses, medium.metal_backed, limits, hankel_path(rho, limits))


def _require_fit(plan: SommerfeldPlan, medium: LayeredMedium, frequency: float) -> None:
    if (plan.thicknesses, plan.metal_backed) != (medium.thicknesses, medium.metal_backed):
        raise RangeError("the plan was made for layers of other thickness")
    if not plan.lowest_frequency <= frequency <= plan.frequency * (1.0 + 1e-12):
        raise RangeError(f"frequency is {frequency} Hz, the plan serves {plan.lowest_frequency} to {plan.frequency} Hz")
    if wavenumber(frequency) * math.sqrt(medium.eps_max) > plan.limits.k0 * plan.limits.index:
        raise RangeError(f"permittivity {medium.eps_max} is above what the plan was made for")

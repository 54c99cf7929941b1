"""Kernels over distance: images, table, grid and plan.

Authorities: a mask of permittivity 1 is air; reciprocity; electrostatic images of a dielectric half space and slab
(Smythe, Static and Dynamic Electricity, from memory); Lagrange's interpolation is exact for cubics. The table is
checked against the same integral with twice the nodes and without interpolation, whose own authority is
tests/published/test_layered_kernels.py.
"""

import dataclasses

import numpy as np
import pytest

from planar.errors import GeometryError, RangeError
from planar.field.kernel_images import image_amplitudes
from planar.field.kernels import (
    RhoGrid,
    SommerfeldPlan,
    SpatialKernel,
    exact_kernels,
    image_heights,
    spatial_kernel,
)
from planar.field.medium import LayeredMedium, spectral_kernels, wavenumber
from planar.units import VACUUM_PERMEABILITY, VACUUM_PERMITTIVITY

F = 2.45e9
K0 = wavenumber(F)
GRID = RhoGrid(0.12)
FR4 = 4.4 * (1.0 - 0.02j)
MASK = 3.5 * (1.0 - 0.025j)
FREE = LayeredMedium((), (), metal_backed=False)
BARE = LayeredMedium((1.6e-3,), (FR4,), metal_backed=False)
GROUNDED = LayeredMedium((1.6e-3,), (FR4,), metal_backed=True)
MASKED = LayeredMedium((25e-6, 1.6e-3, 25e-6), (MASK, FR4, MASK), metal_backed=False)
BOXED = LayeredMedium(
    (40e-3, 25e-6, 1.6e-3, 25e-6, 6e-3, 2.5e-3), (1.0, MASK, FR4, MASK, 1.0, 2.8 - 0.02j), metal_backed=True
)
CLOSE = LayeredMedium(
    (10e-3, 25e-6, 0.8e-3, 10e-6, 0.5e-3, 2.5e-3), (1.0, MASK, 10.0, MASK, 1.0, 2.8 - 0.02j), metal_backed=True
)
THIN = LayeredMedium((0.1e-3,), (FR4,), metal_backed=False)
PAIRS = [
    (FREE, 0, 0),
    (BARE, 1, 1),
    (BARE, 0, 1),
    (GROUNDED, 1, 1),
    (MASKED, 2, 2),
    (MASKED, 1, 1),
    (MASKED, 1, 2),
    (BOXED, 3, 3),
    (BOXED, 2, 2),
    (BOXED, 2, 3),
    (CLOSE, 3, 3),
    (CLOSE, 2, 3),
    (THIN, 1, 1),
    (THIN, 0, 1),
]
each_pair = pytest.mark.parametrize(("medium", "i", "j"), PAIRS)


def interpolated(kernel: SpatialKernel, rho: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """Both kernels as the assembly sees them: images, and the table between its points."""
    indices, weights = GRID.weights(rho)
    images = 1.0 / (4.0 * np.pi * np.sqrt(rho[:, None] ** 2 + np.array(kernel.heights) ** 2))
    return (
        images @ kernel.vector_images + (weights * kernel.vector_table[indices]).sum(axis=1),
        images @ kernel.scalar_images + (weights * kernel.scalar_table[indices]).sum(axis=1),
    )


@each_pair
def test_table_and_images_make_the_kernel(medium: LayeredMedium, i: int, j: int) -> None:
    """1e-5 of the kernel at any distance from 1 um on: a slip there shows in the power balance."""
    rho = np.exp(np.random.default_rng(7).uniform(np.log(1e-6), np.log(GRID.rho_max), 300))
    kernel = spatial_kernel(SommerfeldPlan.of(medium, F, GRID), medium, F, i, j)
    for found, exact in zip(interpolated(kernel, rho), exact_kernels(medium, F, i, j, rho), strict=True):
        np.testing.assert_allclose(found, exact, rtol=1e-5)


@pytest.mark.parametrize(("medium", "i", "j"), [(MASKED, 2, 2), (MASKED, 1, 2), (BOXED, 2, 3), (CLOSE, 3, 3)])
def test_table_is_smooth_on_the_scale_of_cells(medium: LayeredMedium, i: int, j: int) -> None:
    """What the images leave changes little over 0.1 mm, four masks: less than 2 % of the kernel at that distance."""
    kernel = spatial_kernel(SommerfeldPlan.of(medium, F, GRID), medium, F, i, j)
    rho = np.array([1e-6, 0.1e-3])
    indices, weights = GRID.weights(rho)
    exact = exact_kernels(medium, F, i, j, rho[1:])
    for table, whole in zip((kernel.vector_table, kernel.scalar_table), exact, strict=True):
        near, far = (weights * table[indices]).sum(axis=1)
        assert abs(far - near) < 0.02 * abs(whole[0])


@each_pair
def test_reciprocity(medium: LayeredMedium, i: int, j: int) -> None:
    plan = SommerfeldPlan.of(medium, F, GRID)
    one, other = spatial_kernel(plan, medium, F, i, j), spatial_kernel(plan, medium, F, j, i)
    assert one.heights == other.heights
    np.testing.assert_allclose(one.scalar_images, other.scalar_images, rtol=1e-12)
    np.testing.assert_allclose(one.scalar_table, other.scalar_table, rtol=1e-10)
    np.testing.assert_allclose(one.vector_table, other.vector_table, rtol=1e-10)


@pytest.mark.parametrize(("i", "j"), [(1, 1), (0, 1)])
def test_mask_of_air_is_no_mask(i: int, j: int) -> None:
    masked = LayeredMedium((25e-6, 1.6e-3, 25e-6), (1.0, FR4, 1.0), metal_backed=False)
    rho = np.geomspace(1e-6, 0.12, 50)
    kernel = spatial_kernel(SommerfeldPlan.of(masked, F, GRID), masked, F, i + 1, j + 1)
    for found, exact in zip(interpolated(kernel, rho), exact_kernels(BARE, F, i, j, rho), strict=True):
        np.testing.assert_allclose(found, exact, rtol=1e-6)  # interpolation


def test_thin_mask_converges() -> None:
    """A mask thinner and thinner comes to no mask in proportion to its thickness, at any distance far above it."""
    rho = np.geomspace(1e-3, 0.12, 20)
    bare = exact_kernels(BARE, F, 1, 1, rho)[1]
    changes = []
    for thickness in (20e-6, 10e-6, 5e-6):
        masked = LayeredMedium((1.6e-3, thickness), (FR4, MASK), metal_backed=False)
        changes.append(np.abs(exact_kernels(masked, F, 1, 1, rho)[1] / bare - 1.0))
    np.testing.assert_allclose(changes[0] / changes[1], 2.0, rtol=0.05)
    np.testing.assert_allclose(changes[1] / changes[2], 2.0, rtol=0.03)


def test_images_of_half_space_and_slab() -> None:
    """Charge on a slab, q = (eps - 1)/(eps + 1): 1 - q as on a half space, then q (1 - q^2) from the far face."""
    q = (FR4 - 1.0) / (FR4 + 1.0)
    vector, scalar = image_amplitudes(BARE, 1, 1)
    assert image_heights(BARE, 1, 1) == pytest.approx((0.0, 3.2e-3))
    direct, first = 1.0 - q, q * (1.0 - q * q)
    np.testing.assert_allclose(scalar * VACUUM_PERMITTIVITY, [direct, first], rtol=1e-13)
    np.testing.assert_allclose(vector / VACUUM_PERMEABILITY, [1.0, 0.0], atol=1e-15)


def test_images_of_a_grounded_slab() -> None:
    """Charge on a slab over metal: 1 - q as on a half space, then -(1 - q^2) from the plane."""
    q = (FR4 - 1.0) / (FR4 + 1.0)
    vector, scalar = image_amplitudes(GROUNDED, 1, 1)
    np.testing.assert_allclose(scalar * VACUUM_PERMITTIVITY, [1.0 - q, -(1.0 - q) * (1.0 + q)], rtol=1e-13)
    np.testing.assert_allclose(vector / VACUUM_PERMEABILITY, [1.0, -1.0], rtol=1e-13)


def test_images_are_the_static_limit() -> None:
    """For k far above k0 and 1/thickness of slab the spectrum of K_phi under a mask is that of its images."""
    k = np.array([1.0, 2.0, 4.0]) / 25e-6
    heights, (vector, scalar) = np.array(image_heights(MASKED, 2, 2)), image_amplitudes(MASKED, 2, 2)
    spectra = np.exp(-k[:, None] * heights) / (2.0 * k[:, None])
    exact = spectral_kernels(MASKED, F, k, 2, 2)
    np.testing.assert_allclose(spectra @ vector, exact[0], rtol=1e-5)  # eps (k0/k)^2
    np.testing.assert_allclose(spectra @ scalar, exact[1], rtol=1e-5)


def test_heights_depend_on_thickness_only() -> None:
    other = dataclasses.replace(MASKED, eps_r=(1.0, 10.0, 2.0 - 0.1j))
    for pair in ((2, 2), (1, 2)):
        assert image_heights(MASKED, *pair) == image_heights(other, *pair)
    assert image_heights(FREE, 0, 0) == (0.0,)


@pytest.mark.parametrize("share", [0.5, 0.7, 0.85])
@pytest.mark.parametrize(("medium", "i", "j"), [(GROUNDED, 1, 1), (MASKED, 1, 2), (BOXED, 3, 3)])
def test_one_plan_serves_a_sweep(medium: LayeredMedium, i: int, j: int, share: float) -> None:
    rho = GRID.points[1:]
    kernel = spatial_kernel(SommerfeldPlan.of(medium, F, GRID), medium, share * F, i, j)
    for found, exact in zip(interpolated(kernel, rho), exact_kernels(medium, share * F, i, j, rho), strict=True):
        np.testing.assert_allclose(found, exact, rtol=1e-7)


def test_plan_for_something_else_is_refused() -> None:
    plan = SommerfeldPlan.of(BARE, F, GRID)
    for medium, frequency in ((GROUNDED, F), (THIN, F), (BARE, 1.01 * F), (BARE, 0.49 * F)):
        with pytest.raises(RangeError):
            spatial_kernel(plan, medium, frequency, 1, 1)
    with pytest.raises(RangeError, match="permittivity"):
        spatial_kernel(plan, dataclasses.replace(BARE, eps_r=(9.0,)), F, 1, 1)
    with pytest.raises(GeometryError):
        spatial_kernel(SommerfeldPlan.of(GROUNDED, F, GRID), GROUNDED, F, 0, 1)


def test_grid_is_exact_for_cubics_in_the_root() -> None:
    rho = np.random.default_rng(3).uniform(0.0, GRID.rho_max, 200)
    rho[:2] = 0.0, GRID.rho_max
    indices, weights = GRID.weights(rho)
    assert (indices.dtype, weights.dtype) == (np.int32, np.float64)
    assert (indices.shape, weights.shape) == ((200, 4), (200, 4))
    cubic = np.polynomial.Polynomial([1.0, -20.0, 300.0, -500.0])
    found = (weights * cubic(np.sqrt(GRID.points))[indices]).sum(axis=1)
    np.testing.assert_allclose(found, cubic(np.sqrt(rho)), rtol=1e-11)


def test_grid_refuses_what_it_does_not_cover() -> None:
    for rho in (np.array([-1e-6]), np.array([0.121]), np.array([np.nan])):
        with pytest.raises(RangeError):
            GRID.weights(rho)
    for rho_max, count in ((0.0, 400), (0.1, 7), (np.inf, 400)):
        with pytest.raises(RangeError):
            RhoGrid(rho_max, count)
    with pytest.raises(RangeError):
        exact_kernels(BARE, F, 1, 1, np.array([0.0]))

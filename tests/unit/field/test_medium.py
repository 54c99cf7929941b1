"""The layered medium and its spectral kernels.

Authorities: closed forms of free space and of air over a metal plane (plane waves and images), reciprocity of a
passive line, and that a layer cut in two is the same layer. Spectral tolerances are rounding.
"""

import dataclasses
import math

import numpy as np
import pytest

from planar.errors import GeometryError, RangeError
from planar.field.medium import LayeredMedium, medium_of, spectral_kernels, surface_voltages, wavenumber
from planar.library import Library, inline_laminate
from planar.stackup import BoardChoice, CoverChoice, Surroundings, build_stackup
from planar.units import VACUUM_PERMEABILITY, VACUUM_PERMITTIVITY, WAVE_IMPEDANCE

F = 2.45e9
K0 = wavenumber(F)
FR4 = 4.4 * (1.0 - 0.02j)
MASK = 3.5 * (1.0 - 0.025j)
FREE = LayeredMedium((), (), metal_backed=False)
MASKED = LayeredMedium((25e-6, 1.6e-3, 25e-6), (MASK, FR4, MASK), metal_backed=False)
BOXED = LayeredMedium(
    (40e-3, 25e-6, 1.6e-3, 25e-6, 6e-3, 2.5e-3), (1.0, MASK, FR4, MASK, 1.0, 2.8 - 0.02j), metal_backed=True
)
K = np.concatenate([np.geomspace(1e-4, 3e4, 60), np.linspace(0.2, 4.0, 40) + 0.1j]) * K0
SPLIT = 1e-12
"""Relative: some hundred roundings."""


def test_layers_and_levels_of_a_stackup() -> None:
    """The layers of the stackup that are neither copper, legend nor metal, and the copper between them."""
    library = Library.open()
    board = BoardChoice(inline_laminate(4.4, 0.02, at=1e9), 1.6e-3, 35e-6, levels=2, mask="both")
    around = Surroundings(CoverChoice(library.cover("abs"), 6e-3, 2.5e-3), reflector=40e-3)
    fab = library.fab("pool-two-layer")
    stackup = build_stackup(board, fab, surroundings=around)
    medium, levels = medium_of(stackup, F)
    assert medium.thicknesses == (40e-3, fab.mask_thickness, 1.6e-3, fab.mask_thickness, 6e-3, 2.5e-3)
    assert medium.eps_r[2] == stackup.substrate.permittivity(F)
    assert medium.metal_backed
    assert levels == {"bottom": 2, "top": 3}


def test_levels_of_a_single_sided_board_in_air() -> None:
    board = BoardChoice(inline_laminate(4.4, 0.02, at=1e9), 1.6e-3, 35e-6, levels=1, mask="none")
    medium, levels = medium_of(build_stackup(board, Library.open().fab("pool-two-layer")), F)
    assert (medium.thicknesses, medium.metal_backed, levels) == ((1.6e-3,), False, {"top": 1})


def test_metal_plane_over_copper_is_refused() -> None:
    board = BoardChoice(inline_laminate(4.4, 0.02, at=1e9), 1.6e-3, 35e-6, levels=1, mask="none")
    stackup = build_stackup(board, Library.open().fab("pool-two-layer"), surroundings=Surroundings(reflector=10e-3))
    upside_down = dataclasses.replace(stackup, layers=stackup.layers[::-1])
    with pytest.raises(GeometryError, match="reflector"):
        medium_of(upside_down, F)


def test_free_space() -> None:
    """1/(2 gamma) times mu0 and 1/eps0: Weyl's plane-wave expansion of exp(-jkR)/(4 pi R)."""
    vector, scalar = spectral_kernels(FREE, F, K, 0, 0)
    exact = 0.5 / (1j * decaying(K0**2 - K**2))
    np.testing.assert_allclose(vector, VACUUM_PERMEABILITY * exact, rtol=1e-13)
    np.testing.assert_allclose(scalar, exact / VACUUM_PERMITTIVITY, rtol=1e-12)


def decaying(squared: np.ndarray) -> np.ndarray:
    root = np.sqrt(squared)
    return np.where(root.imag > 1e-300, -root, root)


@pytest.mark.parametrize("parts", [(2.0e-3,), (10e-6, 1.99e-3), (0.5e-3, 20e-6, 1.48e-3)])
def test_air_over_metal(parts: tuple[float, ...]) -> None:
    """Source at d1, observer at d2 over the plane: the direct wave less that of the image, however the air is cut."""
    medium = LayeredMedium((*parts, 0.7e-3), (1.0,) * (len(parts) + 1), metal_backed=True)
    gamma = 1j * decaying(K0**2 - K**2)
    exact = 0.5 * (np.exp(-gamma * 0.7e-3) - np.exp(-gamma * 4.7e-3)) / gamma
    vector, scalar = spectral_kernels(medium, F, K, len(parts), len(parts) + 1)
    np.testing.assert_allclose(vector, VACUUM_PERMEABILITY * exact, rtol=1e-11, atol=1e-300)
    np.testing.assert_allclose(scalar, exact / VACUUM_PERMITTIVITY, rtol=1e-11, atol=1e-300)


@pytest.mark.parametrize(("medium", "i", "j"), [(MASKED, 0, 3), (MASKED, 1, 2), (BOXED, 2, 3), (BOXED, 1, 6)])
def test_reciprocity(medium: LayeredMedium, i: int, j: int) -> None:
    """Source and observer change places: nothing changes (passive reciprocal line)."""
    forth, back = spectral_kernels(medium, F, K, i, j), spectral_kernels(medium, F, K, j, i)
    for one, other in zip(forth, back, strict=True):
        np.testing.assert_allclose(one, other, rtol=SPLIT, atol=1e-200)


@pytest.mark.parametrize("share", [0.5, 0.01])
def test_a_layer_cut_in_two(share: float) -> None:
    for number in range(len(BOXED.thicknesses)):
        thick, eps = BOXED.thicknesses[number], BOXED.eps_r[number]
        cut = LayeredMedium(
            (*BOXED.thicknesses[:number], share * thick, (1.0 - share) * thick, *BOXED.thicknesses[number + 1 :]),
            (*BOXED.eps_r[:number], eps, eps, *BOXED.eps_r[number + 1 :]),
            metal_backed=True,
        )
        moved = tuple(interface + (interface > number) for interface in (2, 3))
        for one, other in zip(spectral_kernels(BOXED, F, K, 2, 3), spectral_kernels(cut, F, K, *moved), strict=True):
            np.testing.assert_allclose(one, other, rtol=SPLIT, atol=1e-200)


def test_small_wavenumbers() -> None:
    """K_phi is analytic in k^2: its parabola through points well outside the cancelling region goes on inside."""
    outside = np.array([0.05, 0.06, 0.07, 0.08]) * K0
    inside = np.array([0.0, 1e-9, 1e-3, 0.03, 0.0446]) * K0
    for medium, i, j in ((MASKED, 2, 1), (BOXED, 3, 3)):
        _, reference = spectral_kernels(medium, F, outside, i, j)
        _, scalar = spectral_kernels(medium, F, inside, i, j)
        polynomial = np.polynomial.Polynomial.fit((outside / K0) ** 2, reference, 3)
        np.testing.assert_allclose(scalar, polynomial((inside / K0) ** 2), rtol=1e-8)  # the fifth term of the series


def test_thick_layers_do_not_overflow() -> None:
    """A lossy layer of 30 wavelengths hides what is behind: like a half space of its material on both sides."""
    thick = LayeredMedium((30.0 / (K0 / 6.28), 1e-3), (4.0 - 1.0j, 4.0 - 1.0j), metal_backed=True)
    other = dataclasses.replace(thick, thicknesses=(60.0 / (K0 / 6.28), 1e-3))
    for one, two in zip(spectral_kernels(thick, F, K, 1, 2), spectral_kernels(other, F, K, 1, 2), strict=True):
        assert np.isfinite(one).all()
        np.testing.assert_allclose(one, two, rtol=1e-12, atol=1e-200)


def test_surface_voltages_in_free_space() -> None:
    """V^e = eta0 cos(theta)/2 and V^h = eta0/(2 cos(theta)): a plane wave from a current sheet."""
    theta = np.linspace(0.0, 1.5, 7)
    voltages = surface_voltages(FREE, F, K0 * np.sin(theta), 0)
    assert voltages.bottom is not None
    for electric, magnetic in (voltages.top, voltages.bottom):
        np.testing.assert_allclose(electric, 0.5 * WAVE_IMPEDANCE * np.cos(theta), rtol=1e-10)
        np.testing.assert_allclose(magnetic, 0.5 * WAVE_IMPEDANCE / np.cos(theta), rtol=1e-10)


def test_surface_voltages_across_air() -> None:
    """Air below is phase only, exp(-j kz h); over a metal plane there is no lower half space."""
    theta = np.linspace(0.0, 1.5, 7)
    k = K0 * np.sin(theta)
    open_air = surface_voltages(LayeredMedium((5e-3,), (1.0,), metal_backed=False), F, k, 1)
    assert open_air.bottom is not None
    expected = 0.5 * WAVE_IMPEDANCE * np.cos(theta) * np.exp(-1j * K0 * np.cos(theta) * 5e-3)
    np.testing.assert_allclose(open_air.bottom[0], expected, rtol=1e-10)
    backed = surface_voltages(LayeredMedium((5e-3,), (1.0,), metal_backed=True), F, k, 1)
    assert backed.bottom is None
    image = 1.0 - np.exp(-2j * K0 * np.cos(theta) * 5e-3)
    np.testing.assert_allclose(backed.top[0], 0.5 * WAVE_IMPEDANCE * np.cos(theta) * image, rtol=1e-10)


@pytest.mark.parametrize(
    ("thicknesses", "eps_r", "metal_backed"),
    [
        ((1e-3,), (), False),
        ((0.0,), (2.0,), False),
        ((math.inf,), (2.0,), False),
        ((1e-3,), (2.0 + 0.1j,), False),
        ((1e-3,), (-2.0,), False),
        ((), (), True),
    ],
)
def test_impossible_layers_are_refused(
    thicknesses: tuple[float, ...], eps_r: tuple[complex, ...], metal_backed: bool
) -> None:
    with pytest.raises(GeometryError):
        LayeredMedium(thicknesses, eps_r, metal_backed)


def test_currents_in_the_metal_plane_or_nowhere_are_refused() -> None:
    for i, j in ((0, 1), (1, 0), (7, 1), (1, -1)):
        with pytest.raises(GeometryError):
            spectral_kernels(BOXED, F, K, i, j)
    with pytest.raises(RangeError):
        spectral_kernels(BOXED, 0.0, K, 1, 1)

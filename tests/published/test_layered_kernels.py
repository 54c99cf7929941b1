"""Layered kernels and surface-wave poles against values from outside the project.

Table and poles: computed independently from Michalski & Mosig, IEEE T-AP 45 (1997) 508, formulation C, by separate
code with a 1e-12 integrator; printed to six digits. Exact: permittivity 1 is free space, over metal less its image.
"""

from collections.abc import Callable

import numpy as np
import pytest

from planar.errors import RangeError
from planar.field.kernel_poles import tm0_pole
from planar.field.kernels import RhoGrid, SommerfeldPlan, exact_kernels, spatial_kernel
from planar.field.medium import LayeredMedium, wavenumber
from planar.units import VACUUM_PERMEABILITY, VACUUM_PERMITTIVITY

SOURCE = "1e-12 integrator after Michalski & Mosig 1997, formulation C (C)"

F = 2.45e9
K0 = wavenumber(F)
WAVELENGTH = 2.0 * np.pi / K0
FR4 = 4.4 * (1.0 - 0.02j)
AT = np.array([0.01, 0.1, 1.0, 10.0]) / K0
TABLE = {
    True: (
        [0.940809 - 0.000066j, 0.487779 - 0.000536j, 0.018606 - 0.004130j, -0.000862 - 0.001075j],
        [0.341638 + 0.005718j, 0.131500 + 0.003483j, -0.003094 + 0.007331j, 0.006894 - 0.006846j],
    ),
    False: (
        [1.002853 - 0.012312j, 1.017488 - 0.122722j, 0.493053 - 1.004936j, -0.763401 + 1.220804j],
        [0.400266 - 0.005938j, 0.630620 - 0.113534j, 0.447755 - 0.973898j, -0.747119 + 1.198593j],
    ),
}


@pytest.mark.parametrize("grounded", [True, False])
def test_table(grounded: bool, evidence: Callable[..., None]) -> None:
    """4 pi rho G_A/mu0 and 4 pi rho eps0 K_phi, to the half unit of the last printed digit."""
    medium = LayeredMedium((1.6e-3,), (FR4,), grounded)
    vector, scalar = exact_kernels(medium, F, 1, 1, AT)
    found = (4.0 * np.pi * AT * vector / VACUUM_PERMEABILITY, 4.0 * np.pi * AT * scalar * VACUUM_PERMITTIVITY)
    for name, values, expected in zip(("G_A/mu0", "eps0 K_phi"), found, TABLE[grounded], strict=True):
        evidence(
            f"{slab(grounded)}: 4 pi rho {name}, real and imaginary part",
            source=SOURCE,
            theirs=[np.real(expected), np.imag(expected)],
            ours=[values.real, values.imag],
            allowed="5.2e-7",
            why="half a unit of the last printed digit",
        )


def slab(grounded: bool) -> str:
    return f"{'grounded' if grounded else 'bare'} slab 4.4/0.02, 1.6 mm, 2.45 GHz, k0 rho 0.01 to 10"


@pytest.mark.parametrize("grounded", [True, False])
def test_table_through_the_grid(grounded: bool, evidence: Callable[..., None]) -> None:
    """The same with the kernel as a solution uses it, within 1e-4."""
    medium, grid = LayeredMedium((1.6e-3,), (FR4,), grounded), RhoGrid(2.0 * WAVELENGTH)
    kernel = spatial_kernel(SommerfeldPlan.of(medium, F, grid), medium, F, 1, 1)
    indices, weights = grid.weights(AT)
    images = AT[:, None] / np.sqrt(AT[:, None] ** 2 + np.array(kernel.heights) ** 2)
    for name, table, amplitudes, unit, expected in (
        ("G_A/mu0", kernel.vector_table, kernel.vector_images, VACUUM_PERMEABILITY, TABLE[grounded][0]),
        ("eps0 K_phi", kernel.scalar_table, kernel.scalar_images, 1.0 / VACUUM_PERMITTIVITY, TABLE[grounded][1]),
    ):
        smooth = 4.0 * np.pi * AT * (weights * table[indices]).sum(axis=1)
        for theirs, ours in zip(expected, (smooth + images @ amplitudes) / unit, strict=True):
            evidence(
                f"{slab(grounded)}: 4 pi rho {name} as a solution uses it",
                source=SOURCE,
                theirs=theirs,
                ours=ours,
                allowed=f"{1e-4 * abs(theirs) + 7e-7:g}",
                why="0.01 % for the table's interpolation, and the printed digits",
            )


@pytest.mark.parametrize("grounded", [True, False])
@pytest.mark.parametrize(("height", "cut"), [(1.6e-3, False), (1.6e-3, True), (25e-3, False)])
def test_permittivity_one_is_exact(grounded: bool, height: float, cut: bool, evidence: Callable[..., None]) -> None:
    """exp(-jkR)/(4 pi R), less the image at 2h over metal: 1e-6 from 0.001 to 2 wavelengths."""
    rho = WAVELENGTH * np.geomspace(1e-3, 2.0, 41)
    parts = (height - 25e-6, 25e-6) if cut else (height,)
    medium = LayeredMedium(parts, (1.0,) * len(parts), grounded)

    def wave(distance: float) -> np.ndarray:
        length = np.hypot(rho, distance)
        return np.exp(-1j * K0 * length) / (4.0 * np.pi * length)

    exact = wave(0.0) - (wave(2.0 * height) if grounded else 0.0)
    vector, scalar = exact_kernels(medium, F, len(parts), len(parts), rho)
    pairs = {"G_A": (VACUUM_PERMEABILITY * exact, vector), "K_phi": (exact / VACUUM_PERMITTIVITY, scalar)}
    if not grounded:
        across, _ = exact_kernels(medium, F, len(parts), 0, rho)
        pairs["G_A from side to side"] = (VACUUM_PERMEABILITY * wave(height), across)
    for name, (theirs, ours) in pairs.items():
        evidence(
            f"slab of permittivity 1{' over metal' if grounded else ''}, 0.001 to 2 wavelengths: {name}",
            source="free space less its image, exact",
            theirs=theirs,
            ours=ours,
            allowed="1e-4 %",
            why="what the integration promises",
        )


@pytest.mark.parametrize(("eps", "share", "pole"), [(4.4, 0.05, 1.035188935), (2.2, 0.1, 1.062179955)])
def test_tm0_pole(eps: float, share: float, pole: float, evidence: Callable[..., None]) -> None:
    """Grounded slab of h = share of a wavelength; a bare slab of twice that has the same by mirror symmetry."""
    height = share * WAVELENGTH
    grounded = LayeredMedium((height,), (eps,), metal_backed=True)
    bare = LayeredMedium((0.7 * height, 1.3 * height), (eps, eps), metal_backed=False)
    for name, medium in ((f"grounded slab, h = {share:g}", grounded), (f"bare slab, d = {2.0 * share:g}", bare)):
        evidence(
            f"TM0 pole over k0, {name} wavelengths, eps_r {eps:g}",
            source="root of the dispersion equation (C)",
            theirs=pole,
            ours=tm0_pole(medium, F) / K0,
            allowed="1e-9",
            why="the printed digits",
        )


def test_tm0_pole_needs_a_lossless_guide() -> None:
    for medium in (LayeredMedium((1.6e-3,), (FR4,), True), LayeredMedium((1.6e-3,), (1.0,), True)):
        with pytest.raises(RangeError):
            tm0_pole(medium, F)

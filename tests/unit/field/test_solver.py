"""The field solver: invariants, losses, convergence and refusals.

Authorities: reciprocity, mirror symmetry, scaling of Maxwell's equations and conservation of energy, all exact; for
convergence the aims set for the solver (Z within 1 %, resonance within 0.2 % on a mesh twice as fine); for the mask
the modal solution of tests/published/modal_ring.py and, as common practice, -0.2 to -0.4 % for 25 um on the copper.
"""

from collections.abc import Mapping
from dataclasses import replace
from types import ModuleType

import numpy as np
import pytest

from planar.copper.boolean import difference
from planar.copper.layout import Island, Layout, Level, Role
from planar.copper.shapes import rectangle
from planar.errors import GeometryError
from planar.field.mesh import MeshSettings
from planar.field.solver import STEPS_PER_WAVELENGTH, FieldProblem, default_settings
from planar.stackup import Stackup
from planar.units import SPEED_OF_LIGHT

HEIGHT = 1.6e-3


@pytest.fixture(scope="module")
def two_level(field_cases: ModuleType) -> FieldProblem:
    """The ring with its guided line: two ports, 862 unknowns."""
    slab = field_cases.stackup(field_cases.Slab(HEIGHT, field_cases.FR4), two_sided=True)
    problem: FieldProblem = field_cases.prepared(field_cases.guided_ring(), slab, 0.9e9, step=9e-3)
    return problem


def test_reciprocity(two_level: FieldProblem) -> None:
    """The matrix is symmetric and both transfer admittances are one, 1e-10."""
    solution = two_level.solve(0.9e9)
    matrix = two_level.matrix(0.9e9, solution.medium)
    assert np.max(np.abs(matrix - matrix.T)) < 1e-10 * np.max(np.abs(matrix))
    forward, backward = solution.admittance[0, 1], solution.admittance[1, 0]
    assert abs(forward - backward) < 1e-10 * abs(forward)


def test_passivity(two_level: FieldProblem) -> None:
    """The real part of the port admittances has no negative eigenvalue: no excitation gets power out."""
    assert np.linalg.eigvalsh(two_level.solve(0.9e9).admittance.real).min() > 0.0


def with_second_gap(board: Layout) -> Layout:
    """The loop cut once more, on its right."""
    cut = rectangle(30e-3, 5e-3, 50e-3, 7e-3)
    islands = [
        replace(island, outline=outline) for island in board.islands for outline in difference(island.outline, cut)
    ]
    return replace(board, islands=tuple(islands))


@pytest.mark.parametrize("shape", ["round", "square", "rounded square", "second gap"])
def test_mirror_symmetry(shape: str, field_cases: ModuleType) -> None:
    """A mirrored board has the same impedance, 1e-6."""
    corner_radius = {"square": 0.0, "rounded square": 6e-3}.get(shape)
    board = field_cases.loop(40e-3, 4e-3, 2e-3, corner_radius=corner_radius)
    if shape == "second gap":
        board = with_second_gap(board)
    air = field_cases.stackup(field_cases.AIR)
    original, mirror = (
        field_cases.prepared(each, air, 1e9, step=8e-3, crossed=True).solve(1e9).impedance
        for each in (board, field_cases.mirrored(board))
    )
    assert abs(mirror - original) < 1e-6 * abs(original)


def test_mirror_symmetry_of_two_levels(field_cases: ModuleType, two_level: FieldProblem) -> None:
    """The ring with its line is no mirror image of itself; both ports of its mirrored board see the same, 1e-6."""
    board = field_cases.mirrored(field_cases.guided_ring())
    mirror = field_cases.prepared(board, two_level.stackup, 0.9e9, step=9e-3).solve(0.9e9).admittance
    original = two_level.solve(0.9e9).admittance
    assert np.abs(mirror - original).max() < 1e-6 * np.abs(original).max()


def test_all_lengths_doubled(field_cases: ModuleType) -> None:
    """Half the frequency gives the same impedance, 1e-9."""
    board = field_cases.loop(23e-3, 3e-3, 2e-3)
    small, large = (field_cases.stackup(field_cases.Slab(height, 4.4)) for height in (HEIGHT, 2.0 * HEIGHT))
    first = field_cases.prepared(board, small, 2e9, step=6e-3).solve(2e9, lossless=True).impedance
    doubled = field_cases.enlarged(board, 2.0)
    second = field_cases.prepared(doubled, large, 1e9, step=12e-3).solve(1e9, lossless=True).impedance
    assert abs(second - first) < 1e-9 * abs(first)


def test_power_balance_in_free_space(field_cases: ModuleType) -> None:
    """Accepted = radiated within 0.2 % without loss; with copper loss added within 1 %."""
    copper = field_cases.stackup(field_cases.AIR, conductor=field_cases.SMOOTH_COPPER)
    problem = field_cases.prepared(field_cases.loop(46e-3, 5e-3, 2e-3), copper, 1e9, step=6e-3)
    quiet, lossy = problem.solve(1e9, lossless=True), problem.solve(1e9)
    assert quiet.copper_loss == 0.0
    assert quiet.dielectric_loss == 0.0
    assert quiet.radiated == pytest.approx(quiet.accepted_power, rel=2e-3)
    assert lossy.copper_loss > 0.0
    assert lossy.radiated + lossy.copper_loss + lossy.dielectric_loss == pytest.approx(lossy.accepted_power, rel=1e-2)


def test_nothing_leaves_downward_through_a_metal_plane(field_cases: ModuleType) -> None:
    """Air over a plane carries no surface wave, so without loss all power is radiated upward: 0.2 %."""
    stack = field_cases.stackup(field_cases.Slab(25e-3, 1.0), metal=True)
    solution = field_cases.prepared(field_cases.loop(16e-3, 1e-3, 0.5e-3), stack, 3e9, step=2e-3).solve(
        3e9, lossless=True
    )
    assert solution.radiated == pytest.approx(solution.accepted_power, rel=2e-3)


def test_surface_wave_is_what_is_left_on_a_slab(field_cases: ModuleType) -> None:
    """Without loss a slab keeps a share of the power, more of it the thicker it is; none comes from nowhere."""
    shares = []
    for height in (0.4e-3, 1.6e-3):
        stack = field_cases.stackup(field_cases.Slab(height, 4.4))
        solution = field_cases.prepared(field_cases.loop(16e-3, 1e-3, 0.5e-3), stack, 2.4e9, step=2e-3)
        solution = solution.solve(2.4e9, lossless=True)
        shares.append(1.0 - solution.radiated / solution.accepted_power)
    assert 0.0 < shares[0] < shares[1] < 0.25


@pytest.mark.parametrize("width", [2e-3, 3e-3, 6e-3], ids=["2 mm", "3 mm", "6 mm"])
def test_twice_as_fine(width: float, field_cases: ModuleType) -> None:
    """Half the default step, a loop for about 0.86 GHz on a bare slab: Z changes by < 1 %, resonance by < 0.2 %."""
    board, frequency = field_cases.loop(50e-3, width, 2e-3), 0.8e9
    stack = field_cases.stackup(field_cases.Slab(HEIGHT, field_cases.FR4), conductor=field_cases.SMOOTH_COPPER)
    step = SPEED_OF_LIGHT / frequency / STEPS_PER_WAVELENGTH
    coarse, fine = (field_cases.prepared(board, stack, 0.96e9, step=each, crossed=True) for each in (step, 0.5 * step))
    first, second = (problem.solve(frequency).impedance for problem in (coarse, fine))
    assert abs(second - first) < 0.01 * abs(second)
    lower, upper = (field_cases.mode_resonance(problem, 0.04, 0.87e9) for problem in (coarse, fine))
    assert abs(upper - lower) < 2e-3 * upper


@pytest.fixture(scope="module")
def guided_ring_by_default(field_cases: ModuleType) -> tuple[MeshSettings, complex, float]:
    """The default mesh of the guided ring for 1 GHz, its impedance at 0.9 GHz in ohm and its resonance in Hz."""
    settings = default_settings(field_cases.guided_ring(), guided_ring_stack(field_cases), 1e9)
    return settings, *guided_ring_on(settings, field_cases)


def guided_ring_stack(field_cases: ModuleType) -> Stackup:
    slab = field_cases.Slab(HEIGHT, 4.3 * (1.0 - 0.02j))
    stack: Stackup = field_cases.stackup(slab, two_sided=True, conductor=field_cases.SMOOTH_COPPER)
    return stack


def guided_ring_on(settings: MeshSettings, field_cases: ModuleType) -> tuple[complex, float]:
    """Impedance in ohm at 0.9 GHz and resonance in Hz of the guided ring on such a mesh."""
    problem = FieldProblem.prepare(field_cases.guided_ring(), guided_ring_stack(field_cases), 1e9, settings)
    low, high, z = (problem.solve(frequency).impedance for frequency in (0.8e9, 0.83e9, 0.9e9))
    return z, 0.8e9 - 0.03e9 * low.imag / (high.imag - low.imag)


@pytest.mark.parametrize(
    "finer", [{"step": 0.5}, {"across": 5, "grain": 0.5}], ids=["half the step", "cells across twice as fine"]
)
def test_guided_ring_twice_as_fine(
    finer: Mapping[str, float],
    field_cases: ModuleType,
    guided_ring_by_default: tuple[MeshSettings, complex, float],
) -> None:
    """The default mesh of a guided ring against one twice as fine along the copper, and one twice as fine across it:
    Z changes by < 1 %, resonance by < 0.2 %. Both at once are not solved here, 3742 unknowns take half a minute; they
    change Z by 0.2 % at 0.9 GHz, 0.7 % at 1 GHz and the resonance by 0.1 %.
    """
    default, first, lower = guided_ring_by_default
    other = MeshSettings(default.step * finer.get("step", 1.0), int(finer.get("across", 3)), finer.get("grain", 1.0))
    second, upper = guided_ring_on(other, field_cases)
    assert abs(second - first) < 0.01 * abs(second)
    assert abs(upper - lower) < 2e-3 * upper


def mask_shifts(field_cases: ModuleType, width: float, mesh: tuple[float, int]) -> tuple[float, float]:
    """Relative shift of mode 1 of a ring of 50 mm by 25 um of mask on the copper, and by more of it on the far side."""
    board = field_cases.loop(50e-3, width, 1e-3)
    mask, slab = field_cases.Slab(25e-6, field_cases.MASK), field_cases.Slab(HEIGHT, field_cases.FR4)
    stacks = (
        field_cases.stackup(slab),
        field_cases.stackup(slab, above=(mask,)),
        field_cases.stackup(mask, slab, above=(mask,)),
    )
    found = [
        field_cases.mode_resonance(
            field_cases.prepared(board, stack, 0.9e9, step=mesh[0], across=mesh[1]), 0.02, 0.85e9
        )
        for stack in stacks
    ]
    return found[1] / found[0] - 1.0, found[2] / found[1] - 1.0


def test_mask(field_cases: ModuleType) -> None:
    """25 um of mask on the copper of an 868 MHz type loop, trace 2 mm: -0.2 to -0.4 %, and a finer mesh changes that by
    less than 5 %. The far side is further from the copper: its mask weighs half as much (see the next test).
    """
    coarse, fine = (mask_shifts(field_cases, 2e-3, mesh) for mesh in ((10e-3, 3), (6e-3, 4)))
    for near, far in (coarse, fine):
        assert -0.004 < near < -0.002
        assert near < far < 0.0
    assert abs(fine[0] - coarse[0]) < 0.05 * abs(fine[0])
    assert abs(fine[1] - coarse[1]) < 0.05 * abs(fine[1])


def test_mask_on_the_far_side(field_cases: ModuleType) -> None:
    """Trace 3 mm: the modal solution goes from 860.898 to 859.976 MHz, -0.107 %, when the far side is masked too.

    Recipe: modal_ring.resonance(Ring(50e-3, 3e-3), Stack(((1.6e-3, 4.4 - 0.088j), (25e-6, 3.5 - 0.0875j)), False, 1)),
    the same with (25e-6, 3.5 - 0.0875j) in front and interface 2, bracket 0.8 to 0.9 GHz; it takes a minute. 15 % of a
    shift that is a thousandth.
    """
    _, far = mask_shifts(field_cases, 3e-3, (6e-3, 3))
    assert far == pytest.approx(859.975514 / 860.897703 - 1.0, rel=0.15)


def test_overlapping_copper_is_refused(field_cases: ModuleType) -> None:
    """Two islands of one level that cover each other are no board."""
    board = field_cases.loop(46e-3, 5e-3, 2e-3)
    patch = Island(Level.TOP, rectangle(-3e-3, -50e-3, 4e-3, -40e-3), Role.RADIATOR)
    overlapping = field_cases.layout((*board.islands, patch), board.ports)
    with pytest.raises(GeometryError, match="overlap"):
        field_cases.prepared(overlapping, field_cases.stackup(field_cases.AIR), 1e9, step=8e-3)


def test_port_without_copper_on_both_sides_is_refused(field_cases: ModuleType) -> None:
    strip = Island(Level.TOP, rectangle(1e-3, -1e-3, 30e-3, 1e-3), Role.RADIATOR)
    port = field_cases.loop(46e-3, 2e-3, 2e-3).ports[0]
    lonely = field_cases.layout([strip], [replace(port, centre=(0.0, 0.0))])
    with pytest.raises(GeometryError, match="no copper on both sides"):
        field_cases.prepared(lonely, field_cases.stackup(field_cases.AIR), 1e9, step=8e-3)


def test_vertical_port_without_copper_below_is_refused(field_cases: ModuleType) -> None:
    strip = Island(Level.TOP, rectangle(0.0, -1e-3, 30e-3, 1e-3), Role.LINE)
    below = Island(Level.BOTTOM, rectangle(10e-3, -5e-3, 40e-3, 5e-3), Role.RADIATOR)
    board = field_cases.layout(
        [strip, below], [field_cases.drop("feed", (0.0, 0.0), (-1.0, 0.0), 2e-3)], field_cases.BOTH
    )
    slab = field_cases.stackup(field_cases.Slab(HEIGHT, field_cases.FR4), two_sided=True)
    with pytest.raises(GeometryError, match="copper"):
        field_cases.prepared(board, slab, 1e9, step=8e-3)


def test_loop_larger_than_four_wavelengths_is_refused(field_cases: ModuleType) -> None:
    """A square of 8 x 45 mm mean and 8 x 46 mm outer side is 4 wavelengths round at 3.26 GHz."""
    board = field_cases.loop(45e-3, 2e-3, 1e-3, corner_radius=0.0)
    with pytest.raises(GeometryError, match="wavelengths round"):
        field_cases.prepared(board, field_cases.stackup(field_cases.AIR), 3.27e9, step=5e-3)
    field_cases.prepared(board, field_cases.stackup(field_cases.AIR), 3.25e9, step=20e-3)


def test_too_many_unknowns_are_refused(field_cases: ModuleType) -> None:
    board = field_cases.loop(46e-3, 5e-3, 2e-3)
    with pytest.raises(GeometryError, match="unknowns, at most"):
        field_cases.prepared(board, field_cases.stackup(field_cases.AIR), 1e9, step=1e-3)


def test_layout_without_port_is_refused(field_cases: ModuleType) -> None:
    board = field_cases.loop(46e-3, 5e-3, 2e-3)
    with pytest.raises(GeometryError, match="no port"):
        field_cases.prepared(
            field_cases.layout(board.islands, ()), field_cases.stackup(field_cases.AIR), 1e9, step=8e-3
        )


def test_frequency_above_the_prepared_range_is_refused(two_level: FieldProblem) -> None:
    with pytest.raises(GeometryError, match="prepared for up to 900 MHz"):
        two_level.solve(0.91e9)

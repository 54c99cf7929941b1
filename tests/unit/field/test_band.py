"""Sweeps against point-by-point solutions, results against the definitions of the powers they state.

Authority: the direct solution at the same frequency (interpolation and rational model may not change it),
conservation of power, and the agreement of both outputs on one quantity.
"""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np
import pytest

from planar.copper.boolean import difference
from planar.copper.layout import Island, Layout, Level, Port, Role
from planar.copper.path import band, loop_path
from planar.copper.shapes import rectangle
from planar.errors import GeometryError
from planar.field.band import BandSolution, axial_ratio_db, checked_band
from planar.field.mesh import MeshSettings
from planar.field.result import point_result
from planar.field.solver import FieldProblem, default_settings
from planar.library import Library, inline_laminate
from planar.stackup import BoardChoice, Stackup, build_stackup

RADIUS, TRACE, GAP = 46e-3, 5e-3, 2e-3
LOW, HIGH = 0.85e9, 1.15e9


@pytest.fixture(scope="module")
def stackup() -> Stackup:
    board = BoardChoice(inline_laminate(4.4, 0.02, at=1e9), 1.6e-3, 35e-6, 1, "none")
    return build_stackup(board, Library.open().fab("pool-two-layer"))


@pytest.fixture(scope="module")
def layout() -> Layout:
    line = loop_path(2.0 * RADIUS, 2.0 * RADIUS, RADIUS)
    ring = band(line.between(0.25 * GAP, line.length - 0.25 * GAP), TRACE)
    (cut,) = difference(ring, rectangle(-0.5 * GAP, RADIUS - TRACE, 0.5 * GAP, RADIUS + TRACE))
    port = Port("feed", "gap", Level.TOP, (0.0, RADIUS), (1.0, 0.0), GAP, TRACE)
    edge = rectangle(-0.06, -0.06, 0.06, 0.06)
    islands = (Island(Level.TOP, cut, Role.RADIATOR),)
    return Layout("ring", (Level.TOP,), islands, (), (), (port,), (), (), edge, ())


@pytest.fixture(scope="module")
def problem(layout: Layout, stackup: Stackup) -> FieldProblem:
    return FieldProblem.prepare(layout, stackup, HIGH, MeshSettings(14e-3))


def reflection(z: complex | np.ndarray, reference: float = 100.0) -> complex | np.ndarray:
    return (z - reference) / (z + reference)


def test_band_is_that_of_the_points(problem: FieldProblem) -> None:
    """Reflection within 0.002 of point by point is asked; at a node it is the direct solution."""
    solved = BandSolution.between(problem, LOW, HIGH, 5)
    frequency = np.array([0.86e9, 0.9e9, 0.97e9, 1.03e9, 1.12e9, solved.nodes[1]])
    direct = np.array([problem.solve(float(f)).impedance for f in frequency])
    error = np.abs(reflection(solved.impedance(frequency)) - reflection(direct))
    assert error.max() < 2e-5
    assert error[-1] < 1e-9


def test_fewer_nodes_are_worse_and_found_out(problem: FieldProblem) -> None:
    """Two nodes cannot hold a resonance between them; the check of a band sees what the band cannot."""
    f = np.array([LOW + 0.05 * (HIGH - LOW)])
    direct = problem.solve(float(f[0])).impedance
    errors = [
        abs(reflection(complex(BandSolution.between(problem, LOW, HIGH, n).impedance(f)[0])) - reflection(direct))
        for n in (2, 3, 5)
    ]
    assert errors[0] > 1e-3 > errors[1] > errors[2]


def test_checked_band_serves_over_an_octave(problem: FieldProblem) -> None:
    solved = checked_band(problem, 0.3e9, HIGH, reference=100.0)
    frequency = np.array([0.33e9, 0.61e9, 0.9e9])
    direct = np.array([problem.reaching(float(f)).solve(float(f)).impedance for f in frequency])
    assert np.abs(reflection(solved.impedance(frequency)) - reflection(direct)).max() < 1e-3


def test_band_rebuilds_currents_and_polarisation(layout: Layout, stackup: Stackup) -> None:
    """A second gap makes the field elliptical; its axial ratio and losses are those of the direct solution."""
    cut = difference(layout.islands[0].outline, rectangle(-0.06, -2e-3, 0.0, -1e-3))
    islands = tuple(Island(Level.TOP, each, Role.RADIATOR) for each in cut)
    problem = FieldProblem.prepare(replace(layout, islands=islands), stackup, HIGH, MeshSettings(14e-3))
    solved = BandSolution.between(problem, LOW, HIGH, 5)
    for frequency in (0.9e9, 1.0e9):
        direct, rebuilt = point_result(problem.solve(frequency)), point_result(solved.solution(frequency))
        ratio = float(axial_ratio_db(solved.circular_ratio(np.array([frequency])))[0])
        assert direct.sense != "linear"
        assert rebuilt.sense == direct.sense
        assert ratio == pytest.approx(direct.axial_ratio_db, abs=0.02)
        assert rebuilt.axial_ratio_db == pytest.approx(direct.axial_ratio_db, abs=0.02)
        assert rebuilt.dielectric_share == pytest.approx(direct.dielectric_share, rel=1e-3)
        assert rebuilt.gain_dbi == pytest.approx(direct.gain_dbi, abs=1e-3)


def test_sense_of_the_ratio(layout: Layout, stackup: Stackup) -> None:
    """Left over right is below one where the direct solution calls the sense right."""
    cut = difference(layout.islands[0].outline, rectangle(-0.06, -2e-3, 0.0, -1e-3))
    islands = tuple(Island(Level.TOP, each, Role.RADIATOR) for each in cut)
    problem = FieldProblem.prepare(replace(layout, islands=islands), stackup, HIGH, MeshSettings(14e-3))
    ratio = abs(BandSolution.between(problem, LOW, HIGH, 4).circular_ratio(np.array([1e9]))[0])
    assert (ratio < 1.0) == (point_result(problem.solve(1e9)).sense == "right")


def test_result_states_the_impedance_and_shares_that_add_up(problem: FieldProblem) -> None:
    solution = problem.solve(1e9)
    point = point_result(solution)
    assert point.input_impedance_ohm == solution.impedance
    shares = (point.copper_share, point.dielectric_share, point.radiated_share, point.surface_wave_share)
    assert all(0.0 < share < 1.0 for share in shares)
    assert math.fsum(shares) == pytest.approx(1.0, abs=1e-12)
    assert point.efficiency == pytest.approx(point.radiated_share + point.surface_wave_share, abs=1e-12)
    assert point.gain_dbi == pytest.approx(point.directivity_dbi + 10.0 * math.log10(point.radiated_share), abs=1e-9)
    assert point.sense == "linear"
    expected = 20.0 * math.log10(abs(reflection(solution.impedance)))
    assert point.reflection_db(100.0) == pytest.approx(expected)


def test_thin_slab_radiates_alike_to_both_sides(problem: FieldProblem) -> None:
    """A loop on a slab of 0.005 wavelengths: the two sides differ by hundredths of a decibel (mirror symmetry)."""
    point = point_result(problem.solve(1e9))
    assert point.gain_below_dbi == pytest.approx(point.gain_dbi, abs=0.05)


def test_dielectric_loss_grows_with_the_loss_tangent(layout: Layout) -> None:
    """First order in the loss tangent: ten times the tangent, ten times the loss within a few per cent."""
    shares = []
    for tangent in (0.0005, 0.005):
        board = BoardChoice(inline_laminate(4.4, tangent, at=1e9), 1.6e-3, 35e-6, 1, "none")
        lossy = build_stackup(board, Library.open().fab("pool-two-layer"))
        shares.append(point_result(FieldProblem.prepare(layout, lossy, 1e9, MeshSettings(20e-3)).solve(1e9)))
    assert shares[1].dielectric_share / shares[0].dielectric_share == pytest.approx(10.0, rel=0.05)


def test_not_above_the_frequency_prepared_for(problem: FieldProblem) -> None:
    with pytest.raises(GeometryError, match="prepared for up to 1150 MHz, asked for 1200 MHz"):
        problem.solve(1.2e9)


def test_default_mesh_has_forty_steps_in_a_wavelength(layout: Layout, stackup: Stackup) -> None:
    settings = default_settings(layout, stackup, 1e9)
    assert settings.step == pytest.approx(299_792_458.0 / 1e9 / 40.0)
    assert default_settings(layout, stackup, 1e9, coarser=1.5).step == pytest.approx(1.5 * settings.step)

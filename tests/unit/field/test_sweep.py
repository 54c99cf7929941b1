"""Sweeps against point-by-point solutions, results against the definitions of the powers they state.

Authority: the direct solution at the same frequency (interpolation and rational model may not change it),
conservation of power, and the agreement of both outputs on one quantity.
"""

from __future__ import annotations

import math

import numpy as np
import pytest

from planar.copper.boolean import difference
from planar.copper.layout import Island, Layout, Level, Port, Role
from planar.copper.path import band, loop_path
from planar.copper.shapes import rectangle
from planar.errors import GeometryError, RangeError
from planar.field.mesh import MeshSettings
from planar.field.result import point_result
from planar.field.solver import FieldProblem, default_settings
from planar.field.sweep import MatrixSegment, port_model
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


def test_interpolated_matrix_is_the_filled_one(problem: FieldProblem) -> None:
    """The stated check plus frequencies it never saw; twice the stated tolerance of 3e-4 would fail."""
    segment = MatrixSegment.between(problem, LOW, HIGH)
    assert 0.0 < segment.error < 3e-4
    for frequency in (0.87e9, 0.999e9, 1.14e9):
        direct = problem.solve(frequency).admittance[0, 0]
        assert abs(segment.admittance(frequency) - direct) < 1e-4 * abs(direct)


def test_a_node_gives_its_own_matrix(problem: FieldProblem) -> None:
    segment = MatrixSegment.between(problem, LOW, HIGH)
    node = float(segment.nodes[2])
    assert np.array_equal(segment.matrix(node), segment.matrices[2] / node)


def test_sweep_over_15_percent_agrees_with_points(problem: FieldProblem) -> None:
    """Demanded: reflection within 0.002 of point-by-point, from about a dozen solved frequencies."""
    model = port_model(problem, LOW, HIGH, reference=100.0)
    assert len(model.model.frequency) <= 14
    frequency = np.linspace(LOW, HIGH, 7)
    direct = np.array([problem.solve(float(f)).impedance for f in frequency])
    assert np.abs(reflection(model.impedance(frequency)) - reflection(direct)).max() < 2e-4


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


def test_sweep_wider_than_its_tables_is_refused(problem: FieldProblem) -> None:
    with pytest.raises(RangeError):
        port_model(problem, 0.4e9, HIGH, reference=50.0)


def test_default_mesh_has_forty_steps_in_a_wavelength(layout: Layout, stackup: Stackup) -> None:
    settings = default_settings(layout, stackup, 1e9)
    assert settings.step == pytest.approx(299_792_458.0 / 1e9 / 40.0)
    assert default_settings(layout, stackup, 1e9, coarser=1.5).step == pytest.approx(1.5 * settings.step)

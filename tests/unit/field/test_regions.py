"""From a layout to regions, gap sources and rows of vertical currents.

Authorities: geometry; Neumann's double integral for the inductance of a via.
"""

import math
from dataclasses import replace
from types import ModuleType

import numpy as np
import pytest
from scipy.integrate import quad

from planar.copper.layout import Hole, Island, Layout, Level, Role
from planar.copper.shapes import rectangle
from planar.errors import GeometryError
from planar.field.basis import Row, build_basis
from planar.field.mesh import Mesh, MeshSettings, mesh_regions
from planar.field.regions import Pieces, pieces_of, via_inductance

HEIGHT = 1.6e-3
SETTINGS = MeshSettings(7e-3)


def pieces(board: Layout) -> Pieces:
    return pieces_of(board, {level: number for number, level in enumerate(board.levels)}, SETTINGS, HEIGHT)


def row_length(mesh: Mesh, row: Row) -> float:
    """Length of the mesh sides that lie on `row`, each counted once, m."""
    start, end = np.array(row.start), np.array(row.end)
    length = np.linalg.norm(end - start)
    along = (end - start) / length
    found = {}
    for triangle in mesh.triangles[mesh.level == row.level]:
        for i in range(3):
            a, b = sorted((triangle[i], triangle[(i + 1) % 3]))
            offsets = mesh.points[[a, b]] - start
            away = np.abs(offsets @ [-along[1], along[0]]).max()
            place = offsets @ along
            if away < 1e-8 and place.min() > -1e-8 and place.max() < length + 1e-8:
                found[a, b] = float(np.ptp(place))
    return sum(found.values())


def test_gap_port_fills_the_gap(field_cases: ModuleType) -> None:
    """One source patch, gap by trace width; it joins the faces of the copper, so the mesh is one ring."""
    result = pieces(field_cases.loop(46e-3, 5e-3, 2e-3))
    sources = [region for region in result.regions if region.source]
    assert len(sources) == 1
    mesh = mesh_regions(result.regions, SETTINGS)
    assert mesh.areas[mesh.source].sum() == pytest.approx(5e-3 * 2e-3, rel=2e-3)  # faces of a bent trace: a little less
    triangles, points = len(mesh.triangles), len(np.unique(mesh.triangles))
    sides = 3 * triangles - build_basis(mesh).count  # an inner side belongs to two triangles
    assert points - sides + triangles == 0  # Euler's number of a ring; 1 if the source were not joined


def test_vertical_rows_exist_on_both_levels(field_cases: ModuleType) -> None:
    """The mesh has sides exactly along both rows, together as long as the row."""
    result = pieces(field_cases.guided_ring())
    mesh = mesh_regions(result.regions, SETTINGS)
    assert result.vertical_ports == len(result.verticals) == 2
    for vertical in result.verticals:
        assert {vertical.upper.level, vertical.lower.level} == {0, 1}
        for row in (vertical.upper, vertical.lower):
            assert math.dist(row.start, row.end) == pytest.approx(1.6e-3, abs=2e-8)
            assert row_length(mesh, row) == pytest.approx(1.6e-3, abs=4e-8)
    build_basis(mesh, result.verticals)


def via_board() -> Layout:
    top = Island(Level.TOP, rectangle(-10e-3, -1e-3, 10e-3, 1e-3), Role.RADIATOR)
    bottom = Island(Level.BOTTOM, rectangle(-10e-3, -3e-3, 10e-3, 3e-3), Role.RADIATOR)
    hole = Hole((2e-3, 0.0), 0.5e-3, plated=True, purpose="via")
    unplated = Hole((5e-3, 0.0), 0.5e-3, plated=False, purpose="mounting")
    edge = rectangle(-20e-3, -20e-3, 20e-3, 20e-3)
    return Layout("via", (Level.TOP, Level.BOTTOM), (top, bottom), (hole, unplated), (), (), (), (), edge, ())


def test_via_is_a_row_across_the_narrow_copper() -> None:
    """The row stands across the strip, as wide as it; only the plated hole counts."""
    result = pieces(via_board())
    assert len(result.verticals) == 1
    vertical = result.verticals[0]
    assert vertical.inductance == via_inductance(0.5e-3, HEIGHT)
    mesh = mesh_regions(result.regions, SETTINGS)
    for row in (vertical.upper, vertical.lower):
        assert row.start[0] == pytest.approx(2e-3, abs=1e-9)
        assert row.end[0] == pytest.approx(2e-3, abs=1e-9)
        assert row_length(mesh, row) == pytest.approx(2e-3, abs=1e-8)


@pytest.mark.parametrize(("diameter", "height"), [(0.3e-3, 1.6e-3), (0.5e-3, 0.8e-3), (1e-3, 1.6e-3)])
def test_via_inductance(diameter: float, height: float) -> None:
    """Neumann's integral of two parallel filaments one radius apart (current on the surface, seen from the axis)."""
    radius = 0.5 * diameter

    def inner(z: float) -> float:  # int dz'/sqrt((z - z')^2 + r^2) over the height
        return math.asinh((height - z) / radius) + math.asinh(z / radius)

    neumann = 1e-7 * quad(inner, 0.0, height)[0]
    assert via_inductance(diameter, height) == pytest.approx(neumann, rel=1e-5)


def test_gap_port_without_copper_on_one_side_is_refused(field_cases: ModuleType) -> None:
    board = field_cases.loop(46e-3, 5e-3, 2e-3)
    half = Island(Level.TOP, rectangle(1e-3, 43.5e-3, 20e-3, 48.5e-3), Role.RADIATOR)
    with pytest.raises(GeometryError, match="no copper on both sides"):
        pieces(field_cases.layout([half], board.ports))


def test_two_ports_across_gaps_are_refused(field_cases: ModuleType) -> None:
    """Their source cells would be driven together, and both impedances would be wrong."""
    board = field_cases.loop(46e-3, 5e-3, 2e-3)
    twice = replace(board, ports=(*board.ports, replace(board.ports[0], name="other")))
    with pytest.raises(GeometryError, match="2 ports across gaps, the solver drives one"):
        pieces(twice)

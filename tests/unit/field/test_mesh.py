"""The mesh: area, boundary, conformity, grading.

Authorities: geometry. On arcs the points lie outside by so much that chords are together as long as the arc, so no
point of the mesh's edge is further than step^2/(8 r) from the outline and area errs by less than that times the edge.
"""

import math
from collections import Counter
from types import ModuleType

import numpy as np
import pytest

from planar.copper.layout import Layout, Level
from planar.copper.shapes import rectangle
from planar.errors import GeometryError
from planar.field.mesh import Mesh, MeshSettings, Region, mesh_regions, sampled, triangle_areas
from planar.field.regions import pieces_of
from planar.field.rungs import CROWDING, rung_points

HEIGHT = 1.6e-3


def meshed(board: Layout, step: float, across: int = 3) -> Mesh:
    numbers = {level: number for number, level in enumerate(board.levels)}
    settings = MeshSettings(step, across)
    return mesh_regions(pieces_of(board, numbers, settings, HEIGHT).regions, settings)


def sides(mesh: Mesh) -> Counter[tuple[int, int]]:
    """How many triangles each side belongs to."""
    found: Counter[tuple[int, int]] = Counter()
    for triangle in mesh.triangles.tolist():
        for i in range(3):
            a, b = sorted((triangle[i], triangle[(i + 1) % 3]))
            found[a, b] += 1
    return found


def rim(mesh: Mesh) -> float:
    """Length of the sides that belong to one triangle, m."""
    single = np.array([pair for pair, count in sides(mesh).items() if count == 1])
    return float(np.linalg.norm(mesh.points[single[:, 0]] - mesh.points[single[:, 1]], axis=1).sum())


@pytest.mark.parametrize("step", [8e-3, 4e-3, 2e-3])
def test_area_of_a_ring(step: float, field_cases: ModuleType) -> None:
    """Copper area within the chord error, the gap's source cells apart."""
    radius, width = 46e-3, 5e-3
    board = field_cases.loop(radius, width, 2e-3)
    mesh = meshed(board, step)
    chord_error = step**2 / (8.0 * (radius - 0.5 * width))
    assert abs(mesh.areas[~mesh.source].sum() - board.area(Level.TOP)) < chord_error * 4.0 * math.pi * radius


def test_area_converges_with_the_square_of_the_step(field_cases: ModuleType) -> None:
    board = field_cases.loop(46e-3, 5e-3, 2e-3)
    errors = []
    for step in (8e-3, 2e-3):
        mesh = meshed(board, step)
        errors.append(abs(mesh.areas[~mesh.source].sum() / board.area(Level.TOP) - 1.0))
    assert errors[1] < errors[0] / 8.0  # 16 but for where the steps happen to end


def test_area_of_a_square_is_exact(field_cases: ModuleType) -> None:
    board = field_cases.loop(40e-3, 4e-3, 2e-3, corner_radius=0.0)
    mesh = meshed(board, 7e-3)
    assert mesh.areas[~mesh.source].sum() == pytest.approx(board.area(Level.TOP), rel=1e-12)
    assert mesh.areas[mesh.source].sum() == pytest.approx(4e-3 * 2e-3, rel=1e-12)
    assert rim(mesh) == pytest.approx(8.0 * 42e-3 + 8.0 * 38e-3, rel=1e-12)  # the source closes the ring


def test_area_of_two_levels(field_cases: ModuleType) -> None:
    """Chord error of the wider copper, step 6 mm, on both levels."""
    board = field_cases.guided_ring()
    mesh = meshed(board, 6e-3)
    chord_error = 6e-3**2 / (8.0 * 43e-3)
    for number, level in enumerate(board.levels):
        around = sum(outline.perimeter for outline in board.copper(level))
        assert abs(mesh.areas[mesh.level == number].sum() - board.area(level)) < chord_error * around


@pytest.mark.parametrize("across", [2, 3, 5])
def test_mesh_conforms(across: int, field_cases: ModuleType) -> None:
    """No side has more than two triangles, none is a line, all turn one way, and no point is there twice."""
    for board in (
        field_cases.loop(46e-3, 5e-3, 2e-3),
        field_cases.loop(40e-3, 4e-3, 2e-3, corner_radius=6e-3),
        field_cases.guided_ring(),
    ):
        mesh = meshed(board, 7e-3, across)
        assert set(sides(mesh).values()) == {1, 2}
        assert mesh.areas.min() > 0.0
        for number in range(len(board.levels)):
            used = np.unique(mesh.triangles[mesh.level == number])
            assert len(np.unique(np.round(mesh.points[used], 9), axis=0)) == len(used)


def test_rim_of_a_ring_is_its_outline(field_cases: ModuleType) -> None:
    """Chords are together as long as the arcs, so nothing hangs inside: both circles, closed by the source patch."""
    mesh = meshed(field_cases.loop(46e-3, 5e-3, 2e-3), 4e-3)
    assert rim(mesh) == pytest.approx(4.0 * math.pi * 46e-3, rel=1e-3)


def edge_fractions(cells: int) -> list[float]:
    """Inner division points of a strip of width 1."""
    return [x for x, _ in rung_points((0.0, 0.0), (1.0, 0.0), MeshSettings(math.inf, cells))]


def test_division_of_a_strip() -> None:
    """(2 i/(n + 1))^p/2 from either edge to the middle cell, which is whole for odd n; worked out by hand."""
    thirds = [0.5 * (2.0 * i / 6.0) ** CROWDING for i in (1, 2)]
    assert edge_fractions(1) == pytest.approx([])
    assert edge_fractions(2) == pytest.approx([0.5])
    assert edge_fractions(3) == pytest.approx([0.5**4.6, 1.0 - 0.5**4.6])
    assert edge_fractions(5) == pytest.approx([*thirds, 1.0 - thirds[1], 1.0 - thirds[0]])


def test_cells_are_finest_at_the_edges() -> None:
    """A strip 1 mm wide and 10 mm long: its points across are the fractions of its width."""
    settings = MeshSettings(2e-3, 4)
    boundary = sampled(rectangle(0.0, 0.0, 10e-3, 1e-3), settings)
    mesh = mesh_regions([Region(tuple(boundary), 0)], settings)
    heights = np.unique(np.round(mesh.points[:, 1], 9))
    assert heights == pytest.approx([0.0, *(1e-3 * f for f in edge_fractions(4)), 1e-3], abs=1e-9)


def test_no_cell_across_is_wider_than_the_step() -> None:
    """A strip 12 mm wide with steps of 5 mm."""
    settings = MeshSettings(5e-3)
    boundary = sampled(rectangle(0.0, 0.0, 80e-3, 12e-3), settings)
    mesh = mesh_regions([Region(tuple(boundary), 0)], settings)
    inside = np.array([p for p in mesh.points if 20e-3 < p[0] < 60e-3])
    assert np.diff(np.unique(np.round(inside[:, 1], 9))).max() <= 5e-3


def test_samples_are_no_further_apart_than_the_step() -> None:
    outline = rectangle(0.0, 0.0, 10e-3, 3e-3)
    points = np.array(sampled(outline, MeshSettings(0.7e-3), marks=[(4.05e-3, 0.0)]))
    assert np.linalg.norm(points - np.roll(points, -1, axis=0), axis=1).max() <= 0.7e-3 * (1.0 + 1e-9)
    for wanted in ((4.05e-3, 0.0), (10e-3, 3e-3)):
        assert np.linalg.norm(points - wanted, axis=1).min() < 1e-12


def test_regions_that_share_points_are_joined() -> None:
    """Two squares side by side have one common side, on one level only."""
    left, right = (
        ((0.0, 0.0), (1e-3, 0.0), (1e-3, 1e-3), (0.0, 1e-3)),
        ((1e-3, 0.0), (2e-3, 0.0), (2e-3, 1e-3), (1e-3, 1e-3)),
    )
    settings = MeshSettings(1e-3)
    joined = mesh_regions([Region(left, 0), Region(right, 0)], settings)
    assert rim(joined) == pytest.approx(6e-3)
    apart = mesh_regions([Region(left, 0), Region(right, 1)], settings)
    assert rim(apart) == pytest.approx(8e-3)


def test_outline_that_crosses_itself_is_refused() -> None:
    bow = ((0.0, 0.0), (1e-3, 1e-3), (1e-3, 0.0), (0.0, 1e-3))
    with pytest.raises(GeometryError, match="touches itself"):
        mesh_regions([Region(bow, 0)], MeshSettings(1e-3))


def test_signed_areas() -> None:
    corners = np.array([[[0.0, 0.0], [3.0, 0.0], [0.0, 4.0]], [[0.0, 0.0], [0.0, 4.0], [3.0, 0.0]]])
    assert triangle_areas(corners) == pytest.approx([6.0, -6.0])

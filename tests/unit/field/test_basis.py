"""Current functions: charge, continuity across edges, rows of vertical currents. Authority: the divergence theorem."""

from types import ModuleType

import numpy as np
import pytest

from planar.errors import GeometryError
from planar.field.basis import Basis, Row, build_basis
from planar.field.mesh import Mesh, MeshSettings, Region, mesh_regions
from planar.field.regions import pieces_of

SETTINGS = MeshSettings(8e-3)


@pytest.fixture(scope="module")
def two_level(field_cases: ModuleType) -> tuple[Mesh, Basis]:
    board = field_cases.guided_ring()
    pieces = pieces_of(board, {level: number for number, level in enumerate(board.levels)}, SETTINGS, 1.6e-3)
    mesh = mesh_regions(pieces.regions, SETTINGS)
    return mesh, build_basis(mesh, pieces.verticals)


def flux(mesh: Mesh, basis: Basis, function: int, triangle: int) -> list[float]:
    """Current of a function out of the three sides of a triangle (side i opposite corner i), A."""
    corners = mesh.corners[triangle]
    density = basis.density[[function], [triangle]][0]
    anchor = np.array([basis.anchor_x[[function], [triangle]][0], basis.anchor_y[[function], [triangle]][0]])
    out = []
    for i in range(3):
        start, end = corners[(i + 1) % 3], corners[(i + 2) % 3]
        middle = density * 0.5 * (start + end) - anchor  # linear along the side, so the middle is the mean
        out.append(float(middle @ [end[1] - start[1], start[0] - end[0]]))
    return out


def test_charge_of_every_function_is_zero(two_level: tuple[Mesh, Basis]) -> None:
    """int div f dS = 0: an edge function on its two triangles, a vertical one on its two levels together."""
    mesh, basis = two_level
    charge = 2.0 * basis.density @ mesh.areas
    scale = 2.0 * abs(basis.density) @ mesh.areas
    assert np.all(np.abs(charge) < 1e-12 * scale)


def test_vertical_current_is_one_ampere(two_level: tuple[Mesh, Basis]) -> None:
    """Out of one level and into the other goes 1 A."""
    mesh, basis = two_level
    for function in (basis.count - 2, basis.count - 1):
        row = basis.density[[function]].toarray()[0] * mesh.areas * 2.0
        assert sorted(row[mesh.level == level].sum() for level in (0, 1)) == pytest.approx([-1.0, 1.0], rel=1e-12)


def test_current_crosses_its_edge_only(two_level: tuple[Mesh, Basis]) -> None:
    """What leaves one triangle enters the other through the common edge; no other side is crossed."""
    mesh, basis = two_level
    for function in range(0, basis.count - 2, 37):
        triangles = basis.density[[function]].nonzero()[1]
        assert len(triangles) == 2
        out = [flux(mesh, basis, function, int(triangle)) for triangle in triangles]
        crossed = [max(sides, key=abs) for sides in out]
        length = abs(crossed[0])
        assert crossed[0] == pytest.approx(-crossed[1], rel=1e-9)
        shared = np.intersect1d(*mesh.triangles[triangles])
        assert length == pytest.approx(np.linalg.norm(mesh.points[shared[0]] - mesh.points[shared[1]]), rel=1e-9)
        for sides in out:
            assert sum(abs(value) for value in sides) == pytest.approx(length, rel=1e-9)


def test_number_of_functions(two_level: tuple[Mesh, Basis]) -> None:
    """One for every side between two triangles, one for every vertical current."""
    mesh, basis = two_level
    sides = np.sort(
        np.concatenate([mesh.triangles[:, [0, 1]], mesh.triangles[:, [1, 2]], mesh.triangles[:, [2, 0]]]), 1
    )
    _, counts = np.unique(sides, axis=0, return_counts=True)
    assert basis.count == np.sum(counts == 2) + 2
    assert basis.inductances == (0.0, 0.0)


def test_edge_with_three_triangles_is_refused() -> None:
    """Copper that lies on copper: the same square twice."""
    square = ((0.0, 0.0), (1e-3, 0.0), (1e-3, 1e-3), (0.0, 1e-3))
    mesh = mesh_regions([Region(square, 0), Region(square, 0)], MeshSettings(1e-3))
    with pytest.raises(GeometryError, match="overlaps"):
        build_basis(mesh)


def test_row_without_copper_is_refused(two_level: tuple[Mesh, Basis], field_cases: ModuleType) -> None:
    mesh, _ = two_level
    vertical = pieces_of(
        field_cases.guided_ring(), dict(zip(field_cases.BOTH, (0, 1), strict=True)), SETTINGS, 1.6e-3
    ).verticals[0]
    nowhere = Row(0, (1.0, 1.0), (1.0, 1.1), (1.0, 0.0))
    with pytest.raises(GeometryError, match="no copper edge"):
        build_basis(mesh, [type(vertical)(nowhere, vertical.lower)])

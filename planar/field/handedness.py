"""Mirrored copper gets the mirrored mesh.

Triangulation has a sense of its own: points on one circle may be joined either way. So of a board and its mirror
image only one is meshed, that which leans to the right, and its mesh is mirrored back where the other was given.
"""

from __future__ import annotations

from dataclasses import replace

from planar.copper.arc import Point
from planar.copper.layout import Island, Layout, Level, Port
from planar.field.basis import Row, Vertical
from planar.field.mesh import Mesh, mesh_regions
from planar.field.regions import pieces_of
from planar.field.rungs import MeshSettings

UPRIGHT = 1e-7
"""Lean, as a share of what it could be, below which a board is its own mirror image: the grid is this fine."""


def meshed(
    layout: Layout, numbers: dict[Level, int], settings: MeshSettings, height: float
) -> tuple[Mesh, tuple[Vertical, ...], int]:
    """Mesh of `layout`, its vertical currents and how many of them, the last ones, are ports.

    `numbers` are level numbers, `height` m between two levels. Raises what `pieces_of` raises.
    """
    turned = lean(layout) < 0.0
    pieces = pieces_of(mirrored_layout(layout) if turned else layout, numbers, settings, height)
    mesh = mesh_regions(pieces.regions, settings)
    if not turned:
        return mesh, pieces.verticals, pieces.vertical_ports
    verticals = tuple(
        replace(each, upper=_mirrored_row(each.upper), lower=_mirrored_row(each.lower)) for each in pieces.verticals
    )
    return mirrored_mesh(mesh), verticals, pieces.vertical_ports


def lean(layout: Layout) -> float:
    """Which way copper, ports and holes of `layout` lean, -1 to 1: of opposite sign for the mirror image (x -> -x),
    0 for a board that is its own mirror image."""
    x0, y0, x1, y1 = layout.copper_bounds
    total = size = 0.0
    for weight, (x, y) in _weighted_points(layout):
        u, v = (2.0 * x - x0 - x1) / (x1 - x0), (2.0 * y - y0 - y1) / (y1 - y0)
        term = weight * u * (1.0 + 0.5 * v + 0.3 * v * v + 0.2 * u * u)
        total += term
        size += abs(term)
    return 0.0 if abs(total) <= UPRIGHT * size else total / size


def _weighted_points(layout: Layout) -> list[tuple[float, Point]]:
    """What tells a board from its mirror image: points with weights that differ for levels and kinds."""
    levels = {level: 1.0 + 0.7 * number for number, level in enumerate(layout.levels)}
    found = [
        (levels[island.level], edge.point(part))
        for island in layout.islands
        for edge in island.outline.edges
        for part in (0.0, 0.5)
    ]
    x0, _, x1, _ = layout.copper_bounds
    for port in layout.ports:
        (x, y), (ux, uy), reach = port.centre, port.direction, 0.1 * (x1 - x0)
        found += [(2.3 * levels[port.level], (x, y)), (2.7, (x + reach * ux, y + reach * uy))]
    return found + [(3.1, hole.centre) for hole in layout.holes if hole.plated]


def mirrored_layout(layout: Layout) -> Layout:
    """Copper, ports and holes of `layout` with left and right exchanged (x -> -x); the rest is left as it is."""
    return replace(
        layout,
        islands=tuple(_mirrored_island(each) for each in layout.islands),
        holes=tuple(replace(each, centre=_mirrored(each.centre)) for each in layout.holes),
        ports=tuple(_mirrored_port(each) for each in layout.ports),
    )


def mirrored_mesh(mesh: Mesh) -> Mesh:
    """`mesh` with left and right exchanged, triangles still counter-clockwise.

    Swapping the first two corners leaves every sum over three corners what it was, to the last digit.
    """
    return replace(mesh, points=mesh.points * (-1.0, 1.0), triangles=mesh.triangles[:, [1, 0, 2]])


def _mirrored(point: Point) -> Point:
    return -point[0], point[1]


def _mirrored_island(island: Island) -> Island:
    return replace(island, outline=island.outline.mirrored())


def _mirrored_port(port: Port) -> Port:
    return replace(port, centre=_mirrored(port.centre), direction=_mirrored(port.direction))


def _mirrored_row(row: Row) -> Row:
    return replace(row, start=_mirrored(row.start), end=_mirrored(row.end), inward=_mirrored(row.inward))

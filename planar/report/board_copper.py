"""The board of a picture: its ground, grid, copper, openings, pads, holes and keepout, each with what hovering tells.

Pictures count mm of board, y downwards; layouts count m, y upwards.
"""

from __future__ import annotations

import math
from collections.abc import Iterator, Sequence

from planar.copper.arc import Edge
from planar.copper.arc import Point as BoardPoint
from planar.copper.layout import Hole, Island, Layout, Level, Pad, Port, Role
from planar.copper.outline import Outline
from planar.copper.svg_path import chain_data, path_data, place
from planar.report.dimension_marks import millimetres
from planar.report.svg import Box, Point, colour, element, group, pen, tooltip

ROLES = {
    Role.RADIATOR: "loop",
    Role.LINE: "line",
    Role.GROUND: "ground land",
    Role.FIDUCIAL: "fiducial",
    Role.MARK: "mark",
}


def picture_box(bounds: tuple[float, float, float, float]) -> Box:
    """Box in mm of the picture from x_min, y_min, x_max, y_max in m of the board."""
    x0, y0, x1, y1 = (1e3 * value for value in bounds)
    return Box(x0, -y1, x1, -y0)


def picture_point(point: BoardPoint) -> Point:
    """A point of the board (m) in mm of the picture."""
    return 1e3 * point[0], -1e3 * point[1]


def board_copper(layout: Layout, level: Level, grid: tuple[Box, int], line: float) -> list[str]:
    """Board, `grid` in a box with its step, copper, the other level, openings, pads, holes, keepout: each over the one
    before, with lines `line` mm wide."""
    openings = [marking.outline for marking in layout.mask_openings if marking.level == level]
    here = [island for island in layout.islands if island.level == level]
    beyond = [island.outline for island in layout.islands if island.level != level]
    board = pen("board-edge", 1.5 * line, {"fill": colour("board")})
    copper = {"fill": colour(f"copper-{level}")}
    dotted = pen("ink", 0.6 * line, {"stroke-dasharray": "0.4 0.4"})
    pads = {"fill": colour("ink"), "fill-opacity": "0.16"}
    hole = pen("board-edge", line, {"fill": colour("hole")})
    return [
        group("board", board, _filled([layout.edge])),
        _grid(*grid, 0.5 * line),
        group("copper", copper, [_island(each) for each in here]),
        group("copper-beyond", pen("copper-beyond", line), _filled(beyond)),
        group("mask-openings", dotted, _filled(openings)),
        group("pads", pads, [_pad(each) for each in layout.pads if each.level == level]),
        group("holes", hole, [_hole(each) for each in layout.holes]),
        _keepout(layout.keepout, line),
    ]


def _filled(outlines: Sequence[Outline]) -> list[str]:
    return [element("path", {"d": path_data(outline)}) for outline in outlines]


def _island(island: Island) -> str:
    x0, y0, x1, y1 = island.outline.bounds
    words = (
        f"{ROLES[island.role]}, {island.level} copper, net {island.net or 'none'}: {millimetres(x1 - x0)} by "
        f"{millimetres(y1 - y0)} over all, {1e6 * island.outline.area:.5g} mm²"
    )
    return element("path", {"d": path_data(island.outline)}, tooltip(words))


def _pad(pad: Pad) -> str:
    x0, y0, x1, y1 = pad.outline.bounds
    words = f"pad {pad.name}, {pad.terminal}, net {pad.net}: {millimetres(x1 - x0)} by {millimetres(y1 - y0)}"
    return element("path", {"d": path_data(pad.outline)}, tooltip(words))


def _hole(hole: Hole) -> str:
    x, y = picture_point(hole.centre)
    net = f", net {hole.net}" if hole.net else ""
    plated = "plated" if hole.plated else "not plated"
    words = f"{hole.purpose} hole, {plated}{net}: {millimetres(hole.diameter)} across"
    return element("circle", {"cx": x, "cy": y, "r": 500.0 * hole.diameter}, tooltip(words))


def grid_ticks(low: float, high: float, step: int) -> range:
    """The multiples of `step` mm from `low` to `high` mm."""
    return range(math.ceil(low / step) * step, math.floor(high / step) * step + 1, step)


def _grid(board: Box, step: int, line: float) -> str:
    across = [f"M{x} {board.y0:.6g}V{board.y1:.6g}" for x in grid_ticks(board.x0, board.x1, step)]
    along = [f"M{board.x0:.6g} {y}H{board.x1:.6g}" for y in grid_ticks(board.y0, board.y1, step)]
    return element("path", pen("grid", line, {"class": "grid", "d": "".join(across + along)}))


def _keepout(outlines: Sequence[Outline], line: float) -> str:
    """The border of the keepout, ticked on its inner side as a map's boundary is; not the seam between two pieces."""
    edges = [edge for outline in outlines for edge in outline.edges]
    walked = {(edge.start, edge.end) for edge in edges}
    border = [edge for edge in edges if (edge.end, edge.start) not in walked]
    ticks = "".join(f"M{place(*a)}L{place(*b)}" for edge in border for a, b in _border_ticks(edge, 1e-2 * line))
    way = "".join(chain_data([edge]) for edge in border)
    drawn = [element("path", {"d": way}, tooltip("keepout on every level")), element("path", {"d": ticks})]
    return group("keepout", pen("keepout", line, {"pointer-events": "visibleStroke"}), drawn if border else [])


def _border_ticks(edge: Edge, size: float) -> Iterator[tuple[BoardPoint, BoardPoint]]:
    """Short slanted lines to the left of an `edge`, `size` m apart."""
    count = round(edge.length / size)
    for i in range(count):
        (x, y), (ux, uy) = edge.point((i + 0.5) / count), edge.tangent((i + 0.5) / count)
        yield (x, y), (x + 0.45 * size * (ux - uy), y + 0.45 * size * (uy + ux))


def port_mark(port: Port) -> Iterator[str]:
    """A ring with four ticks round a port."""
    (x, y), (ux, uy) = port.centre, port.direction
    words = f"port {port.name}, {port.kind}, {millimetres(port.width)} wide"
    radius = max(0.75 * port.width, 0.75 * port.length, 0.8e-3)
    centre = picture_point((x, y))
    ring = {"cx": centre[0], "cy": centre[1], "r": 1e3 * radius}
    yield element("circle", ring | {"pointer-events": "visible"}, tooltip(words))
    arms = [((x - s * radius * a, y - s * radius * b), (x - s * 1.6 * radius * a, y - s * 1.6 * radius * b))
            for s in (1.0, -1.0) for a, b in ((ux, uy), (-uy, ux))]  # fmt: skip
    yield element("path", {"d": "".join(f"M{place(*a)}L{place(*b)}" for a, b in arms)})

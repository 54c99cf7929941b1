"""From a layout to the pieces that are meshed: islands, gap sources, and the rows of vertical currents.

A gap port becomes a source patch between the two faces of the gap, its field uniform over the real
gap. A via or a vertical port is a row of edges across the copper of both levels: the islands are cut
along it, so that the mesh has that line exactly.
"""

from __future__ import annotations

import itertools
import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from shapely import unary_union

from planar.copper.arc import Edge, Point
from planar.copper.boolean import contains, meeting_points
from planar.copper.layout import Hole, Island, Layout, Level, Port, Role
from planar.copper.outline import Outline
from planar.errors import GeometryError
from planar.field.basis import Row, Vertical
from planar.field.mesh import ON_EDGE, MeshSettings, Region, sampled
from planar.field.rungs import Shadow, edge_distances, points_beside, rung_points
from planar.units import VACUUM_PERMEABILITY

OVERLAP = 1e-11
"""m2, more than the chord error of flattened outlines that only touch."""

CORNER = 1.0
"""rad, the least turn between two edges that is a corner."""
CROWDED_END = 0.8
"""Length beside the end of a strip, over its width, that is divided as beside an edge."""


@dataclass(frozen=True)
class Cut:
    """A row across copper at `centre` along the unit vector `direction`, `width` m wide, on the island around it."""

    centre: Point
    direction: Point
    width: float


@dataclass(frozen=True)
class Pieces:
    """What is meshed and what drives it.

    `verticals` holds the vias first, then the vertical ports in the order of the layout.
    """

    regions: tuple[Region, ...]
    verticals: tuple[Vertical, ...]
    vertical_ports: int


def pieces_of(layout: Layout, numbers: dict[Level, int], settings: MeshSettings, height: float) -> Pieces:
    """Regions, ports and vias of `layout`; `numbers` are level numbers, `height` m between two levels.

    Ground lands of the connector on top are left out: they are tied to the ground below them by
    their own vias. Raises `GeometryError` for a port or via without copper.
    """
    islands = [i for i in layout.islands if not (i.role is Role.GROUND and len(numbers) > 1)]
    _check_apart(islands)
    vias = [h for h in layout.holes if h.plated and all(_around(islands, level, h.centre) for level in numbers)]
    drops = [_via_cut(hole, islands) for hole in vias]
    ports = [port for port in layout.ports if port.kind == "vertical"]
    drops += [Cut(p.centre, (-p.direction[1], p.direction[0]), p.width) for p in ports]
    gaps = tuple(port for port in layout.ports if port.kind == "gap")
    if len(gaps) > 1:  # the source cells of several would be driven together
        raise GeometryError(f"{len(gaps)} ports across gaps, the solver drives one")
    regions: list[Region] = []
    for island in islands:
        marks = [m for port in gaps if port.level == island.level for m in _gap_marks(port, island, settings)]
        if not any(_touch(island, other) for other in islands):  # pieces that touch are joined at points of both
            marks += _end_marks(island.outline, settings)
        loops = _cut_island(island, drops, marks, settings, height)
        shadow = _shadow_on(island, islands, height)
        regions += [Region(tuple(loop), numbers[island.level], shadow=shadow) for loop in loops]
    for port in gaps:
        regions.append(_source_patch(port, [i for i in islands if i.level == port.level], numbers, settings))
    inductances = [via_inductance(hole.diameter, height) for hole in vias] + [0.0] * len(ports)
    verticals = [_vertical(cut, value, islands, numbers) for cut, value in zip(drops, inductances, strict=True)]
    return Pieces(tuple(regions), tuple(verticals), len(ports))


def _check_apart(islands: Sequence[Island]) -> None:
    """Raise `GeometryError` where two islands of one level overlap."""
    for one, other in itertools.combinations(islands, 2):
        if one.level == other.level and one.outline.shape().intersection(other.outline.shape()).area > OVERLAP:
            raise GeometryError(f"two pieces of copper overlap on the {one.level.value} level: unite them first")


def _touch(island: Island, other: Island) -> bool:
    if island is other or island.level != other.level:
        return False
    return bool(island.outline.shape().distance(other.outline.shape()) < ON_EDGE)


def via_inductance(diameter: float, height: float) -> float:
    """Partial self-inductance of a round via, H; lengths in m.

    Rosa, Bulletin of the Bureau of Standards 4 (1908) 301, with the current on the surface (from memory).
    """
    ratio = 2.0 * height / diameter
    shape = math.asinh(ratio) - math.hypot(1.0, 1.0 / ratio) + 1.0 / ratio
    return VACUUM_PERMEABILITY * height / (2.0 * math.pi) * shape


def _around(islands: Sequence[Island], level: Level, point: Point) -> Island | None:
    for island in islands:
        if island.level == level and contains(island.outline, point):
            return island
    return None


def _crossings(outline: Outline, centre: Point, direction: Point) -> tuple[float, float] | None:
    """Where the line through `centre` leaves the copper on either side, as signed distances; None off the copper."""
    reach = 2.0 * max(abs(c) for c in outline.bounds) + 1.0
    ends = [(centre[0] + s * reach * direction[0], centre[1] + s * reach * direction[1]) for s in (-1.0, 1.0)]
    line = Edge(ends[0], ends[1])
    along = sorted(
        (x - centre[0]) * direction[0] + (y - centre[1]) * direction[1]
        for edge in outline.edges
        for x, y in meeting_points(line, edge)
    )
    before, after = [t for t in along if t < -ON_EDGE], [t for t in along if t > ON_EDGE]
    if not before or not after or not contains(outline, centre):
        return None
    return before[-1], after[0]


def _via_cut(hole: Hole, islands: Sequence[Island]) -> Cut:
    """Row through a via along the narrowest way across the upper copper."""
    upper = _around(islands, Level.TOP, hole.centre)
    if upper is None:
        raise GeometryError("a via has no copper on top")
    best: tuple[float, Cut] | None = None
    for angle in np.linspace(0.0, math.pi, 36, endpoint=False):
        direction = (math.cos(angle), math.sin(angle))
        ends = _crossings(upper.outline, hole.centre, direction)
        if ends is not None and (best is None or ends[1] - ends[0] < best[0] - ON_EDGE):
            width = 2.0 * min(-ends[0], ends[1])
            best = (ends[1] - ends[0], Cut(hole.centre, direction, width))
    if best is None:
        raise GeometryError("a via lies on the edge of its copper")
    return best[1]


def _shadow_on(island: Island, islands: Sequence[Island], height: float) -> Shadow | None:
    """Lines over or under `island`; a line itself lies over copper that is wider."""
    lines = [other.outline.shape() for other in islands if other.role is Role.LINE and other.level != island.level]
    return Shadow(unary_union(lines), height) if lines and island.role is not Role.LINE else None


def _cut_island(
    island: Island, drops: Sequence[Cut], marks: list[Point], settings: MeshSettings, height: float
) -> list[list[Point]]:
    """The island's boundary, cut along every row that crosses it."""
    rows = []
    for cut in drops:
        if _on_boundary(island.outline, cut.centre):
            marks = [*marks, *_row_points(cut, (-0.5 * cut.width, 0.5 * cut.width), settings, height)]
            continue
        ends = _crossings(island.outline, cut.centre, cut.direction)
        if ends is not None:
            row = _row_points(cut, ends, settings, height)
            rows.append(row)
            marks = [*marks, row[0], row[-1]]
    loops = [sampled(island.outline, settings, marks)]
    for row in rows:
        loops = [part for loop in loops for part in _split(loop, row)]
    return loops


def _end_marks(outline: Outline, settings: MeshSettings) -> list[Point]:
    """Points on both sides of every end of a strip, close to it: current and charge crowd there as they do at edges.

    An end is a straight edge between two corners, shorter than the edges beside it.
    """
    edges = outline.edges
    marks = []
    for before, end, after in zip(edges[-1:] + edges[:-1], edges, edges[1:] + edges[:1], strict=True):
        corners = min(_turn(before, end), _turn(end, after)) > CORNER
        if end.bulge == 0.0 and corners and end.length < min(before.length, after.length):
            for away in edge_distances(CROWDED_END * end.length, settings):
                marks += [before.point(1.0 - away / before.length), after.point(away / after.length)]
    return marks


def _turn(one: Edge, other: Edge) -> float:
    """Angle from the end of one edge to the start of the other, rad, positive to the left."""
    a, b = one.tangent(1.0), other.tangent(0.0)
    return math.atan2(a[0] * b[1] - a[1] * b[0], a[0] * b[0] + a[1] * b[1])


def _row_points(cut: Cut, ends: tuple[float, float], settings: MeshSettings, height: float) -> list[Point]:
    """Points from one end of a row to the other: divided across the cut's width, growing cells beside it."""

    def at(place: float) -> Point:
        return cut.centre[0] + place * cut.direction[0], cut.centre[1] + place * cut.direction[1]

    half = 0.5 * cut.width
    low, high = max(-half, ends[0]), min(half, ends[1])
    row = [at(low), *rung_points(at(low), at(high), settings), at(high)]
    if ends[0] < low - ON_EDGE:
        row = [at(ends[0]), *reversed(points_beside(at(low), at(ends[0]), settings, height)), *row]
    if ends[1] > high + ON_EDGE:
        row = [*row, *points_beside(at(high), at(ends[1]), settings, height), at(ends[1])]
    return row


def _on_boundary(outline: Outline, point: Point) -> bool:
    probes = (edge.point(min(1.0, max(0.0, edge.fraction_of(point)))) for edge in outline.edges)
    return any(math.dist(probe, point) < ON_EDGE for probe in probes)


def _split(loop: list[Point], row: list[Point]) -> list[list[Point]]:
    """`loop` cut in two along `row`, whose ends are points of it; unchanged when they are not."""
    places = [next((i for i, p in enumerate(loop) if math.dist(p, end) < ON_EDGE), -1) for end in (row[0], row[-1])]
    if -1 in places:
        return [loop]
    first, last = places
    turned = loop[first:] + loop[:first]
    last = (last - first) % len(loop)
    one = [*turned[: last + 1], *reversed(row[1:-1])]
    other = [*turned[last:], turned[0], *row[1:-1]]
    return [one, other]


def _faces(port: Port, outline: Outline) -> list[tuple[float, float, float]]:
    """Straight edges of `outline` along a face of the gap: side (+-1), and range across within the port's width."""
    (ux, uy), (cx, cy) = port.direction, port.centre
    found = []
    for edge in outline.edges:
        if edge.bulge != 0.0:
            continue
        (a, s), (b, t) = (
            ((x - cx) * ux + (y - cy) * uy, -(x - cx) * uy + (y - cy) * ux) for x, y in (edge.start, edge.end)
        )
        side = 1.0 if a > 0.0 else -1.0
        if abs(a - b) > ON_EDGE or abs(abs(a) - 0.5 * port.length) > ON_EDGE:
            continue
        slack = 0.05 * port.width  # the face of a bent trace is a little lower than its middle
        low, high = max(min(s, t), -0.5 * port.width - slack), min(max(s, t), 0.5 * port.width + slack)
        whole = max(s, t) - min(s, t) > port.width * 1.2
        if whole:
            low, high = max(low, -0.5 * port.width), min(high, 0.5 * port.width)
        if high - low > 0.5 * port.width:
            found.append((side, low, high))
    return found


def _across(port: Port, side: float, low: float, high: float, settings: MeshSettings) -> list[Point]:
    (ux, uy), (cx, cy) = port.direction, port.centre
    a = side * 0.5 * port.length
    ends = [(cx + a * ux - t * uy, cy + a * uy + t * ux) for t in (low, high)]
    return [ends[0], *rung_points(ends[0], ends[1], settings), ends[1]]


def _gap_marks(port: Port, island: Island, settings: MeshSettings) -> list[Point]:
    return [p for side, low, high in _faces(port, island.outline) for p in _across(port, side, low, high, settings)]


def _source_patch(port: Port, islands: Sequence[Island], numbers: dict[Level, int], settings: MeshSettings) -> Region:
    faces = {side: (low, high) for i in islands for side, low, high in _faces(port, i.outline)}
    if set(faces) != {-1.0, 1.0}:
        raise GeometryError(f"port {port.name} has no copper on both sides of its gap")
    left = _across(port, -1.0, *faces[-1.0], settings)
    right = _across(port, 1.0, *faces[1.0], settings)
    return Region((*reversed(left), *right), numbers[port.level], source=True)


def _vertical(cut: Cut, inductance: float, islands: Sequence[Island], numbers: dict[Level, int]) -> Vertical:
    half = 0.5 * cut.width
    ends = [(cut.centre[0] + s * half * cut.direction[0], cut.centre[1] + s * half * cut.direction[1]) for s in (-1, 1)]
    normal = (-cut.direction[1], cut.direction[0])
    rows = [Row(numbers[level], ends[0], ends[1], _inward(cut, normal, level, islands)) for level in numbers]
    return Vertical(rows[0], rows[1], inductance)


def _inward(cut: Cut, normal: Point, level: Level, islands: Sequence[Island]) -> Point:
    """The side of a row that has the longer copper."""

    def reach(sign: float) -> float:
        near = (cut.centre[0] + sign * 1e-7 * normal[0], cut.centre[1] + sign * 1e-7 * normal[1])
        island = _around(islands, level, near)
        if island is None:
            return 0.0
        ends = _crossings(island.outline, near, normal)
        return 0.0 if ends is None else (ends[1] if sign > 0 else -ends[0])

    sign = 1.0 if reach(1.0) >= reach(-1.0) else -1.0
    return sign * normal[0], sign * normal[1]

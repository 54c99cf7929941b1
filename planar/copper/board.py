"""A board round a drawing: edge, mounting holes, keepout with its feed corridor, legend.

The drawing's feed becomes the origin. What does not fit (a hole with no clear place) is left out and
`plan_board` says so; nothing is squeezed in against a rule.
"""

from __future__ import annotations

import math
from dataclasses import dataclass, replace

from shapely.geometry import Point as ShapelyPoint
from shapely.geometry.base import BaseGeometry
from shapely.ops import unary_union

from planar.copper.arc import Point
from planar.copper.boolean import difference, intersection
from planar.copper.drawing import Drawing, DrawingRequest
from planar.copper.layout import Hole, Layout, Level, Marking, bounds_of
from planar.copper.lettering import lettered, text_width
from planar.copper.outline import Outline
from planar.copper.shapes import capsule, circle, rectangle, rounded_rectangle
from planar.errors import Finding, Severity

MARGIN = 3e-3
"""m of board beyond the copper where nothing asks for less."""
BOARD_CORNER = 2e-3
"""m, corner radius of the board: a corner that does not cut fingers."""
CORRIDOR = 6e-3
"""m, width of the way to the feed left open in the keepout where no connector body is wider."""
HOLE_SIZES = ((60e-3, 3.2e-3), (0.0, 2.2e-3))
"""(smallest board side, mounting hole diameter), m: M3 screws on boards of 60 mm, M2 below, nylon: they stand in the
keepout."""
HOLE_CLEARANCE = 1e-3
"""m, from a mounting hole to copper and to the board edge, beyond the fab's own rule."""
FEED_CLEARANCE = 1e-3
"""m, from pads and connector to the keepout."""
FEED_KEPT_CLEAR = 5e-3
"""m below a feed inside the loop that the legend leaves to what is soldered there."""
LETTER_HEIGHTS = (2.5e-3, 2e-3, 1.5e-3, 1.2e-3, 1e-3)
"""m, tried from the largest."""


@dataclass(frozen=True)
class PlannedBoard:
    """A snapped layout, and what could not be placed on it."""

    layout: Layout
    findings: tuple[Finding, ...]


def plan_board(
    drawing: Drawing, request: DrawingRequest, levels: tuple[Level, ...], *, lettered_board: bool = True
) -> PlannedBoard:
    """Layout of `drawing` on a board of its own, the feed at the origin; the legend is left out when only its copper
    is looked at."""
    centred = drawing.translated(-drawing.feed[0], -drawing.feed[1])
    loop_centre = (-drawing.feed[0], -drawing.feed[1])
    x0, y0, x1, y1 = edge_box(centred, request)
    for island in centred.islands:
        island.outline.check()
    copper = unary_union([island.outline.shape() for island in centred.islands])
    mounting = _mounting_holes((x0, y0, x1, y1), copper, loop_centre, request)
    holes = centred.holes + mounting
    openings = centred.mask_openings + _hole_openings(holes, request)
    edge = rounded_rectangle(x0, y0, x1, y1, radius=BOARD_CORNER)
    layout = Layout(
        name=request.name,
        levels=levels,
        islands=centred.islands,
        holes=holes,
        pads=centred.pads,
        ports=centred.ports,
        mask_openings=tuple(opening for opening in openings if opening.level in request.masked),
        legend=(),
        edge=edge,
        keepout=_keepout(edge, centred, request),
    ).snapped()
    findings = () if len(mounting) == 4 else (_missing_holes(len(mounting)),)
    if not lettered_board:
        return PlannedBoard(layout, findings)
    legend = _legend(layout, (*loop_centre, *drawing.inner_size), request)
    return PlannedBoard(_with_legend(layout, legend), findings)


def edge_box(drawing: Drawing, request: DrawingRequest) -> tuple[float, float, float, float]:
    """x_min, y_min, x_max, y_max of the board, m.

    The margin shrinks down to what the fab needs where the size limit asks for it; a connector on
    the edge sets the lower side.
    """
    x0, y0, x1, y1 = bounds_of(island.outline for island in drawing.islands)
    least = request.fab.copper_to_routed_edge + request.fab.outline_tolerance
    lower = request.connector.edge_distance
    margins = []
    for i, span in enumerate((x1 - x0, y1 - y0)):
        sides = 1.0 if i == 1 and lower is not None else 2.0
        taken = span if sides == 2.0 else y1 + (lower or 0.0)
        free = math.inf if request.size_limit is None else (request.size_limit[i] - taken) / sides
        margins.append(max(least, min(MARGIN, free)))
    bottom = y0 - margins[1] if lower is None else -lower
    return x0 - margins[0], bottom, x1 + margins[0], y1 + margins[1]


def _mounting_holes(
    box: tuple[float, float, float, float], copper: BaseGeometry, centre: Point, request: DrawingRequest
) -> tuple[Hole, ...]:
    """One hole toward each board corner, as far out as copper, edge and connector allow."""
    x0, y0, x1, y1 = box
    side = min(x1 - x0, y1 - y0)
    diameter = next(d for least, d in HOLE_SIZES if side >= least)
    radius = 0.5 * diameter
    inset = radius + max(request.fab.hole_to_edge, HOLE_CLEARANCE)
    taken = copper.union(_body(request).shape())
    holes = []
    for x, y in ((x0, y0), (x1, y0), (x1, y1), (x0, y1)):
        start = (x + math.copysign(inset, centre[0] - x), y + math.copysign(inset, centre[1] - y))
        way = math.dist(start, centre)
        steps = int(0.8 * way / 0.25e-3)
        for i in range(steps):
            share = i * 0.25e-3 / way
            place = (start[0] + share * (centre[0] - start[0]), start[1] + share * (centre[1] - start[1]))
            if taken.distance(ShapelyPoint(place)) >= radius + HOLE_CLEARANCE:
                holes.append(Hole(place, diameter, False, "mounting"))
                taken = taken.union(ShapelyPoint(place).buffer(radius))
                break
    return tuple(holes)


def _missing_holes(placed: int) -> Finding:
    return Finding(
        rule="mounting holes",
        where="board",
        got=f"{placed} placed",
        limit="4",
        advice="clamp the board by its edge, or allow a larger board",
        severity=Severity.NOTE,
    )


def _body(request: DrawingRequest) -> Outline:
    """Rectangle over the connector with the feed at the origin; a small one where there is no connector."""
    body = request.connector.body
    if body is None:
        half = 0.5 * CORRIDOR
        return rectangle(-half, -half, half, half)
    (cx, cy), (length, width) = body.centre, body.size
    return rectangle(-cy - 0.5 * width, cx - 0.5 * length, -cy + 0.5 * width, cx + 0.5 * length)


def _keepout(edge: Outline, drawing: Drawing, request: DrawingRequest) -> tuple[Outline, ...]:
    """The whole board on every level, less the way to the feed.

    A feed at the rim has a corridor to the nearest edge. A feed inside the loop has a pocket round
    its pads; the keepout is then two halves, so that each is one closed outline without a hole.
    """
    x0, y0, x1, y1 = bounds_of([_body(request), *(pad.outline for pad in drawing.pads)])
    half = max(0.5 * CORRIDOR, abs(x0), abs(x1)) + FEED_CLEARANCE
    left, low, right, high = edge.bounds
    if drawing.corridor > 0:
        return difference(edge, rectangle(-half, 0.0, half, high + MARGIN))
    if drawing.corridor < 0:
        return difference(edge, rectangle(-half, 0.0, half, low - MARGIN))
    pocket = rectangle(-half, y0 - FEED_CLEARANCE, half, y1 + FEED_CLEARANCE)
    sides = (
        rectangle(left - MARGIN, low - MARGIN, 0.0, high + MARGIN),
        rectangle(0.0, low - MARGIN, right + MARGIN, high + MARGIN),
    )
    return tuple(part for side in sides for piece in intersection(edge, side) for part in difference(piece, pocket))


def _hole_openings(holes: tuple[Hole, ...], request: DrawingRequest) -> tuple[Marking, ...]:
    """Mask openings round unplated holes, on every masked side; vias stay covered."""
    grow = 2.0 * request.fab.mask_expansion
    return tuple(
        Marking(level, circle(hole.centre, hole.diameter + grow))
        for hole in holes
        if not hole.plated
        for level in request.masked
    )


def _legend(
    layout: Layout, inside: tuple[float, float, float, float], request: DrawingRequest
) -> dict[Level, list[list[Outline]]]:
    """Texts and marks of the legend by level, each a list of capsules; empty where the fab prints none.

    `inside` is centre and size (x, y, width, height) of the loop's inside.
    """
    if not request.fab.legend:
        return {}
    x, y, width, height = inside
    bottom = y - 0.5 * height
    feed_inside = bottom < 0.0 < y + 0.5 * height
    middle = 0.5 * (bottom - FEED_KEPT_CLEAR) if feed_inside else y - 0.2 * height
    # the two sides apart, so that they can be read with all layers shown
    height_of = {Level.TOP: middle, Level.BOTTOM: y + 0.2 * height}
    stroke = request.fab.legend_min_stroke
    path = "DC SHORT INTENDED" if layout.dc_short else "NO DC SHORT"
    texts = {Level.TOP: [request.name, "TOP", path, "ORIGIN AT FEED"], Level.BOTTOM: [request.name, "BOTTOM", path]}
    legend: dict[Level, list[list[Outline]]] = {}
    for level in layout.levels:
        lines = texts[level]
        size = next(
            (h for h in LETTER_HEIGHTS if max(text_width(t, h, stroke=stroke) for t in lines) < 0.7 * width), None
        )
        legend[level] = []
        if size is None:
            lines, size = [level.value], LETTER_HEIGHTS[-1]
        for i, line in enumerate(lines):
            place = (x, height_of[level] - 1.8 * size * (i - 0.5 * (len(lines) - 1)))
            pen = max(stroke, size / 10.0)
            legend[level].append(lettered(line, place, size, stroke=pen, mirrored=level is Level.BOTTOM))
    legend[Level.TOP] += [[mark] for mark in _origin_marks(stroke)]
    return legend


def _origin_marks(stroke: float) -> list[Outline]:
    """Ticks left and right of the feed that point at the origin."""
    near, far = 0.5 * CORRIDOR + 1e-3, 0.5 * CORRIDOR + 3e-3
    return [capsule((side * near, 0.0), (side * far, 0.0), stroke) for side in (-1.0, 1.0)]


def _with_legend(layout: Layout, legend: dict[Level, list[list[Outline]]]) -> Layout:
    """The layout with those texts that stay on the board and clear of mask openings and holes."""
    board = layout.edge.shape().buffer(-0.2e-3)
    kept = []
    for level, texts in legend.items():
        openings = [m.outline.shape() for m in layout.mask_openings if m.level == level]
        openings += [pad.outline.shape() for pad in layout.pads if pad.level == level]
        drills = [ShapelyPoint(hole.centre).buffer(0.5 * hole.diameter) for hole in layout.holes]
        taken = unary_union([*openings, *drills]).buffer(0.1e-3)
        for text in texts:
            written = unary_union([stroke.shape() for stroke in text])
            if board.contains(written) and not taken.intersects(written):
                kept += [Marking(level, stroke.normalised()) for stroke in text]
    return replace(layout, legend=tuple(kept))

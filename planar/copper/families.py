"""The antenna families as copper: `plain`, `ring-guided`, `coplanar`.

Each function turns dimensions into a `Drawing` in loop coordinates; `FAMILIES` is the one table that
knows them all. Dimension names are those of templates/families; every value is in metres.
"""

from __future__ import annotations

import math
from collections.abc import Callable

from planar.copper.arc import Edge, Point
from planar.copper.boolean import intersection, united
from planar.copper.drawing import Dimensions, Drawing, DrawingRequest, loop_copper, loop_height, mean_line, trim_tabs
from planar.copper.lands import ground_tab, land_holes, land_openings, land_pads
from planar.copper.layout import Hole, Island, Level, Marking, Pad, Port, Role
from planar.copper.outline import Outline
from planar.copper.path import Path, stepped_band
from planar.copper.shapes import circle, rectangle
from planar.copper.tabs import check_clear
from planar.errors import GeometryError
from planar.library.records import Connector

NECK = 0.6e-3
"""m, length of the neck with which a line wider than the room between ground lands starts."""
BEND_WIDTHS = 1.5
"""Radius of the bend onto the loop in line widths: a bend this gentle needs no mitre."""


def plain(dimensions: Dimensions, request: DrawingRequest) -> Drawing:
    """Loop with a gap and two pads on the trace's ends."""
    gap, trace, length = dimensions["gap"], dimensions["trace_width"], dimensions["pad_length"]
    islands = _handed(loop_copper(dimensions, gap, tabs=request.tabs), request)
    top = 0.5 * loop_height(dimensions)
    reach = 0.5 * gap + length
    pads = []
    for name, terminal, side in (("FEED-P", "signal", 1.0), ("FEED-N", "return", -1.0)):
        window = rectangle(0.0, top - trace, side * reach, top + trace)
        ends = [part for island in islands for part in intersection(island, window)]
        pads += [Pad(name, Level.TOP, end, terminal) for end in ends]
    height = (top - 0.5 * trace, top + 0.5 * trace)
    return Drawing(
        tuple(Island(Level.TOP, outline, Role.RADIATOR) for outline in islands),
        (),
        tuple(pads),
        (Port("feed", "gap", Level.TOP, (0.0, top), (1.0, 0.0), gap, trace),),
        _pair_openings(gap, reach, height, request),
        (0.0, top),
        1,
        _inner_size(dimensions),
    )


def coplanar(dimensions: Dimensions, request: DrawingRequest) -> Drawing:
    """Loop whose gap runs inward between two strips, the quarter-wave line, to two pads."""
    gap, top = dimensions["strip_gap"], 0.5 * loop_height(dimensions)
    pad_width, pad_length = dimensions["pad_width"], dimensions["pad_length"]
    feed = (0.0, top - dimensions["strip_length"])
    end = feed[1] - 0.5 * pad_length
    clear = end - (-top + 0.5 * dimensions["trace_width"])
    if clear < dimensions["trace_width"]:
        raise GeometryError(
            f"the strips end {clear * 1e3:.2f} mm from the far side of the loop, less than a trace width"
        )
    strips: list[Outline] = []
    pads = []
    for name, terminal, side in (("FEED-P", "signal", 1.0), ("FEED-N", "return", -1.0)):
        inner = side * 0.5 * gap
        pad = rectangle(inner, end, inner + side * pad_width, end + pad_length)
        strips += [rectangle(inner, end, inner + side * dimensions["strip_width"], top), pad]
        pads.append(Pad(name, Level.TOP, pad, terminal))
    check_clear(trim_tabs(dimensions), tuple(strips), "the strips")
    copper = [*_handed(loop_copper(dimensions, gap, tabs=request.tabs), request), *strips]
    return Drawing(
        tuple(Island(Level.TOP, outline, Role.RADIATOR) for outline in united(copper)),
        (),
        tuple(pads),
        (Port("feed", "gap", Level.TOP, feed, (1.0, 0.0), gap, pad_length),),
        _pair_openings(gap, 0.5 * gap + pad_width, (end, end + pad_length), request),
        feed,
        0,
        _inner_size(dimensions),
    )


def ring_guided(dimensions: Dimensions, request: DrawingRequest) -> Drawing:
    """Loop on the bottom, guiding a line on top from the coax opposite the gap to past the gap."""
    half_height = 0.5 * loop_height(dimensions)
    feed = (0.0, -half_height - dimensions["feed_length"])
    connector = request.connector
    lands = land_pads(connector, feed)
    tab = ground_tab(connector, feed, -half_height)
    bottom = [*_handed(loop_copper(dimensions, dimensions["gap"], tabs=request.tabs), request), *([tab] if tab else [])]
    bottom += [pad.outline for pad in lands if pad.level is Level.BOTTOM and pad.terminal == "return"]
    _check_second_gap(dimensions, connector)
    line, line_end = _guided_line(dimensions, feed, _room_between_grounds(request))
    top = [*_handed((line,), request), *(p.outline for p in lands if p.level is Level.TOP and p.terminal == "signal")]
    holes = list(land_holes(connector, feed))
    if request.end == "via":
        drill = dimensions["via_drill"]
        centre = (-line_end[0] if request.mirrored else line_end[0], line_end[1])
        top.append(circle(centre, drill + 2.0 * dimensions["via_ring"]))
        holes.append(Hole(centre, drill, True, "via"))
    islands = [Island(Level.TOP, outline, Role.LINE) for outline in united(top)]
    islands += [
        Island(Level.TOP, p.outline, Role.GROUND) for p in lands if p.level is Level.TOP and p.terminal == "return"
    ]
    islands += [Island(Level.BOTTOM, outline, Role.RADIATOR) for outline in united(bottom)]
    openings = land_openings(connector, feed, request.fab.mask_expansion)
    port = Port("feed", "vertical", Level.TOP, feed, (0.0, -1.0), 0.0, dimensions["line_width"])
    return Drawing(tuple(islands), tuple(holes), lands, (port,), openings, feed, -1, _inner_size(dimensions))


FAMILIES: dict[str, Callable[[Dimensions, DrawingRequest], Drawing]] = {
    "plain": plain,
    "ring-guided": ring_guided,
    "coplanar": coplanar,
}
"""Family key -> drawing function. A new family is a function here and a file in templates/families."""


def _handed(outlines: tuple[Outline, ...], request: DrawingRequest) -> tuple[Outline, ...]:
    return tuple(outline.mirrored() for outline in outlines) if request.mirrored else outlines


def _inner_size(dimensions: Dimensions) -> tuple[float, float]:
    trace = dimensions["trace_width"]
    return dimensions["loop_width"] - trace, loop_height(dimensions) - trace


def _pair_openings(
    gap: float, reach: float, height: tuple[float, float], request: DrawingRequest
) -> tuple[Marking, ...]:
    """Mask openings over a pair of pads, one for both where the web between two could not be printed."""
    grow, fab = request.fab.mask_expansion, request.fab
    low, high = height[0] - grow, height[1] + grow
    inner = 0.5 * gap - grow
    if 2.0 * inner < fab.mask_web:
        return (Marking(Level.TOP, rectangle(-reach - grow, low, reach + grow, high)),)
    sides = (1.0, -1.0)
    return tuple(Marking(Level.TOP, rectangle(s * inner, low, s * (reach + grow), high)) for s in sides)


def _check_second_gap(dimensions: Dimensions, connector: Connector) -> None:
    """The second gap lies on the half without the line, clear of the line's end and of the connector's ground."""
    if "second_gap" not in dimensions:
        return
    half = 0.5 * dimensions["second_gap"]
    tab = connector.ground_tab.half_width if connector.ground_tab else 0.0
    low = dimensions["end_length"] + half
    high = 0.5 * mean_line(dimensions).length - tab - half
    if not low < dimensions["second_gap_position"] < high:
        raise GeometryError(
            f"second_gap_position is {dimensions['second_gap_position'] * 1e3:.2f} mm; on the half without the line it "
            f"is from {low * 1e3:.2f} to {high * 1e3:.2f} mm"
        )


def _room_between_grounds(request: DrawingRequest) -> float:
    """Widest line, m, that starts between the connector's ground lands at the fab's smallest gap."""
    lands = [p for p in request.connector.pads if p.net == "ground" and p.level == Level.TOP.value]
    if not lands:
        return math.inf
    return 2.0 * (min(abs(p.centre[1]) - 0.5 * p.size[1] for p in lands) - request.fab.min_gap)


def _guided_line(dimensions: Dimensions, feed: Point, room: float) -> tuple[Outline, Point]:
    """Outline of the guided line from `feed` to past the gap, and the point where it ends.

    Where the line is wider than the `room` m between the connector's grounds it starts with a neck.
    """
    loop = mean_line(dimensions)
    width = dimensions["line_width"]
    narrow_from = loop.length - dimensions["transformer_length"]
    lead, joins_at = _lead(dimensions, feed)
    if narrow_from <= joins_at:
        raise GeometryError(
            f"the transformer of {dimensions['transformer_length'] * 1e3:.2f} mm is longer than the line on the loop"
        )
    past = loop.between(0.0, dimensions["end_length"])
    start = lead.followed_by(loop.between(joins_at, narrow_from))
    neck = [(start.between(0.0, NECK), room)] if room < width else []
    sections = [
        *neck,
        (start.between(NECK, start.length) if neck else start, width),
        (loop.between(narrow_from, loop.length), dimensions["transformer_width"]),
        (past, dimensions["end_width"]),
    ]
    return stepped_band(sections), past.at(past.length)[0]


def _lead(dimensions: Dimensions, feed: Point) -> tuple[Path, float]:
    """Path from `feed` straight up and round a bend onto the loop's mean line, and where it joins (m along it)."""
    radius = BEND_WIDTHS * dimensions["line_width"]
    loop = mean_line(dimensions)
    half_width, bottom = 0.5 * dimensions["loop_width"], -0.5 * loop_height(dimensions)
    corner = dimensions.get("corner_radius", half_width)
    flat = half_width - corner
    if radius >= half_width:
        raise GeometryError(f"a line of {dimensions['line_width'] * 1e3:.2f} mm is too wide for so small a loop")
    if radius <= flat:
        centre, landing = (radius, bottom - radius), (radius, bottom)
        joins_at = 0.5 * loop.length + radius
    else:  # the bend meets the rounded corner: two circles that touch
        rise = math.sqrt((corner + radius) ** 2 - (radius - flat) ** 2)
        centre = (radius, bottom + corner - rise)
        share = corner / (corner + radius)
        landing = (flat + share * (radius - flat), bottom + corner - share * rise)
        joins_at = 0.5 * loop.length + flat + corner * math.asin((landing[0] - flat) / corner)
    start = (0.0, centre[1])
    if feed[1] >= start[1]:
        shortest = bottom - start[1]
        raise GeometryError(f"feed_length is too short for the bend, it must exceed {shortest * 1e3:.2f} mm")
    bend = math.acos(_cosine(centre, start, landing))
    lead = Path((Edge(feed, start), Edge(start, landing, -math.tan(bend / 4.0))))
    return lead, joins_at


def _cosine(centre: Point, first: Point, second: Point) -> float:
    (ux, uy), (vx, vy) = (first[0] - centre[0], first[1] - centre[1]), (second[0] - centre[0], second[1] - centre[1])
    return (ux * vx + uy * vy) / (math.hypot(ux, uy) * math.hypot(vx, vy))

"""A board to measure the laminate on: two lines, a ring, an impedance trace, open, short and load.

All of it lies over one ground plane. The two lines differ in one straight length only, between the same bends and
the same launches, so that everything else cancels. Lines and ring are bare of solder mask: what is measured is the
laminate. The impedance trace is masked like the antenna's own line. The board is a rectangle, so that it also fits
a strip of a panel; the origin is its lower left corner.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

from shapely.geometry import Point as ShapelyPoint
from shapely.ops import unary_union

from planar.copper.arc import Edge, Point
from planar.copper.board import LETTER_HEIGHTS
from planar.copper.boolean import united
from planar.copper.coupon_parts import (
    GROUND,
    LEFT,
    RIGHT,
    UP,
    Launch,
    LaunchKit,
    Part,
    line_between,
    loaded_end,
    merged_openings,
    open_end,
    ring_between,
    ring_openings,
    shorted_end,
    staple_opening,
    staple_path,
)
from planar.copper.drawing import Dimensions
from planar.copper.layout import Hole, Island, Kind, Layout, Level, Marking, Role
from planar.copper.lettering import lettered, text_width
from planar.copper.outline import Outline, on_grid
from planar.copper.path import Path
from planar.copper.shapes import rectangle
from planar.errors import Finding, Severity, SynthesisError
from planar.library.records import Connector, Fab

SMALL_TEXT = 1.2e-3
"""m, height of the names of connectors and end pieces."""
TEXT_CLEARANCE, TEXT_CHORD = 0.1e-3, 20e-6
"""m, from legend to mask openings, pads and holes, and the chord error that will do for it."""


@dataclass(frozen=True)
class CouponRequest:
    """What drawing needs beside the dimensions: `connector` of every launch, `fab`, the levels under mask, and the
    `trace_impedance` in ohm that is printed beside the impedance trace."""

    name: str
    connector: Connector
    fab: Fab
    masked: tuple[Level, ...]
    trace_impedance: float


@dataclass(frozen=True)
class _Text:
    """A line of legend about `centre` (m), as large as fits `room` m and not above `largest` m."""

    text: str
    level: Level
    centre: Point
    room: float
    largest: float = LETTER_HEIGHTS[0]


def coupon_layout(dimensions: Dimensions, request: CouponRequest) -> Layout:
    """The measuring board of `dimensions` (m, the names `planar.design.coupon` gives them), on the nanometre grid.

    Nets: LONG_LINE, SHORT_LINE, RING, RING_IN, RING_OUT, TRACE, OPEN, LOAD, and GROUND, to which the short belongs.
    Connectors are J1 to J11, resistors R1 and R2. Raises `SynthesisError` for a fab that makes one copper level or
    plates no holes and for a connector that cannot be used, `GeometryError` for dimensions that make no valid copper.
    """
    _check(request)
    kit = LaunchKit(request.connector, request.fab)
    launches = _launches(dimensions)
    part = _lines_part(dimensions, launches, kit).joined(_ends_part(dimensions, launches, kit))
    windows = _windows(dimensions, launches)
    width, height = dimensions["board_width"], dimensions["board_height"]
    plane = _ground_plane(part, dimensions)
    openings = merged_openings(part.openings, windows)
    layout = Layout(
        name=f"{request.name}-coupon",
        levels=(Level.TOP, Level.BOTTOM),
        islands=tuple(replace(i, outline=i.outline.normalised()) for i in (*part.islands, plane)),
        holes=tuple(_on_grid(hole) for hole in part.holes),
        pads=tuple(replace(pad, outline=pad.outline.normalised()) for pad in part.pads),
        ports=(),
        mask_openings=tuple(_normalised(o) for o in openings if o.level in request.masked),
        legend=(),
        edge=rectangle(0.0, 0.0, width, height).normalised(),
        keepout=(),
        kind=Kind.COUPON,
    )
    return replace(layout, legend=_legend(layout, dimensions, request, launches))


def _check(request: CouponRequest) -> None:
    connector, fab = request.connector, request.fab
    findings = []
    if fab.levels < 2:
        advice = "a fab that makes two copper levels"
        findings.append(
            Finding("copper levels", "make.fab", f"{fab.levels} at {fab.key}", "2", advice, Severity.REFUSE)
        )
    elif not fab.plated_holes:
        advice = "a fab that plates holes: the launches' ground goes through vias"
        findings.append(Finding("plated holes", "make.fab", f"none at {fab.key}", "plated", advice, Severity.REFUSE))
    if connector.balanced or not connector.pads or any(not hole.plated for hole in connector.holes):
        advice = "a coax connector without unplated holes, such as edge-coax or pigtail-pads"
        got, limit = connector.key, "a coax launch on an unbroken ground plane"
        findings.append(Finding("connector", "make.connector", got, limit, advice, Severity.REFUSE))
    if findings:
        reason = "the coupon needs lines over a ground plane and a coax on either end of them:"
        raise SynthesisError(reason, tuple(findings))


def _launches(dimensions: Dimensions) -> dict[str, Launch]:
    """Name of a launch -> where it is; connectors are numbered from left to right, then upwards."""
    width, depth = dimensions["board_width"], dimensions["launch_depth"]
    long, short, pitch = dimensions["long_span"], dimensions["short_span"], dimensions["launch_pitch"]
    x = 0.5 * (width - long - pitch - short)
    places = [x, x + 0.25 * long, x + 0.5 * long, x + 0.75 * long, x + long]
    places += [places[-1] + pitch, places[-1] + pitch + short]
    names = ("long-1", "open", "short", "load", "long-2", "short-1", "short-2")
    found = {
        name: Launch(f"J{i}", (place, depth), UP) for i, (name, place) in enumerate(zip(names, places, strict=True), 1)
    }
    for first, name, row in ((8, "ring", "ring_row"), (10, "trace", "trace_row")):
        y = dimensions[row]
        found[f"{name}-1"] = Launch(f"J{first}", (depth, y), RIGHT)
        found[f"{name}-2"] = Launch(f"J{first + 1}", (width - depth, y), LEFT)
    return found


def _pair(launches: dict[str, Launch], name: str) -> tuple[Launch, Launch]:
    return launches[f"{name}-1"], launches[f"{name}-2"]


def _ring_centre(dimensions: Dimensions) -> Point:
    return 0.5 * dimensions["board_width"], dimensions["ring_row"]


def _lines_part(dimensions: Dimensions, launches: dict[str, Launch], kit: LaunchKit) -> Part:
    """Both lines, the ring and the impedance trace."""
    width, rise, bend = dimensions["line_width"], dimensions["rise"], dimensions["bend_radius"]
    part = Part()
    for name, net in (("long", "LONG_LINE"), ("short", "SHORT_LINE")):
        ends = _pair(launches, name)
        path = staple_path(ends[0].plane, ends[1].plane, rise, bend)
        part = part.joined(line_between(ends, path, width, net, kit))
    part = part.joined(ring_between(_pair(launches, "ring"), _ring_centre(dimensions), dimensions, kit))
    ends = _pair(launches, "trace")
    path = Path((Edge(ends[0].plane, ends[1].plane),))
    return part.joined(line_between(ends, path, dimensions["trace_width"], "TRACE", kit))


def _ends_part(dimensions: Dimensions, launches: dict[str, Launch], kit: LaunchKit) -> Part:
    """Open, short and load."""
    part = open_end(launches["open"], kit)
    part = part.joined(shorted_end(launches["short"], dimensions, kit))
    return part.joined(loaded_end(launches["load"], dimensions, kit))


def _windows(dimensions: Dimensions, launches: dict[str, Launch]) -> list[Outline]:
    """Windows in the mask over both lines and the ring."""
    half = 0.5 * dimensions["line_width"] + dimensions["mask_clearance"]
    staples = [
        staple_opening(ends[0].plane, ends[1].plane, dimensions["rise"], half)
        for ends in (_pair(launches, "long"), _pair(launches, "short"))
    ]
    return [*staples, *ring_openings(_pair(launches, "ring"), _ring_centre(dimensions), dimensions)]


def _ground_plane(part: Part, dimensions: Dimensions) -> Island:
    """The whole bottom but a margin; ground lands on the bottom may come nearer to the edge."""
    margin = dimensions["ground_margin"]
    width, height = dimensions["board_width"], dimensions["board_height"]
    plane = rectangle(margin, margin, width - margin, height - margin)
    (outline,) = united([plane, *(pad.outline for pad in part.pads if pad.level is Level.BOTTOM)])
    return Island(Level.BOTTOM, outline, Role.GROUND, GROUND, "")


def _on_grid(hole: Hole) -> Hole:
    return replace(hole, centre=(on_grid(hole.centre[0]), on_grid(hole.centre[1])))


def _normalised(marking: Marking) -> Marking:
    return replace(marking, outline=marking.outline.normalised())


def _legend(
    layout: Layout, dimensions: Dimensions, request: CouponRequest, launches: dict[str, Launch]
) -> tuple[Marking, ...]:
    """Every text that stays on the board and clear of openings, pads and holes."""
    if not request.fab.legend:
        return ()
    board = layout.edge.shape().buffer(-0.2e-3)
    taken = {}
    for level in layout.levels:
        covered = [o.outline.shape() for o in layout.mask_openings if o.level == level]
        covered += [pad.outline.shape() for pad in layout.pads if pad.level == level]
        covered += [ShapelyPoint(hole.centre).buffer(0.5 * hole.diameter) for hole in layout.holes]
        taken[level] = unary_union(covered).buffer(TEXT_CLEARANCE)
    kept: list[Marking] = []
    for text in (*_names(dimensions, request, launches), *_titles(dimensions, request)):
        strokes = _written(text, request.fab.legend_min_stroke)
        written = unary_union([stroke.shape(TEXT_CHORD) for stroke in strokes])
        if strokes and board.contains(written) and not taken[text.level].intersects(written):
            kept += [Marking(text.level, stroke.normalised()) for stroke in strokes]
    return tuple(kept)


def _written(text: _Text, stroke: float) -> list[Outline]:
    heights = [height for height in LETTER_HEIGHTS if height <= text.largest]
    size = next((h for h in heights if text_width(text.text, h, stroke=max(stroke, 0.1 * h)) <= text.room), None)
    if size is None:
        return []
    pen = max(stroke, 0.1 * size)
    return lettered(text.text, text.centre, size, stroke=pen, mirrored=text.level is Level.BOTTOM)


def _names(dimensions: Dimensions, request: CouponRequest, launches: dict[str, Launch]) -> list[_Text]:
    """Names of connectors and end pieces, lengths of lines and ring."""
    width, depth, pitch = dimensions["board_width"], dimensions["launch_depth"], dimensions["launch_pitch"]
    aside = 0.5 * request.connector.reach + 1.5e-3
    texts = []
    for launch in launches.values():
        left = 1.0 if launch.direction != LEFT else -1.0  # above on both sides of the board
        texts.append(_Text(launch.reference, Level.TOP, launch.point(-0.5 * depth, left * aside), pitch, SMALL_TEXT))
    for name, label in (("open", "OPEN"), ("short", "SHORT"), ("load", "LOAD 2X100")):
        room = 0.25 * dimensions["long_span"] - 1.5e-3
        texts.append(_Text(label, Level.TOP, launches[name].point(2.6e-3, 0.0), room, SMALL_TEXT))
    half = 0.5 * dimensions["line_width"] + dimensions["mask_clearance"]
    rows = (depth + dimensions["rise"] + half + 2.2e-3, dimensions["ring_row"] - half - 2.2e-3)
    free = 0.5 * width - dimensions["ring_radius"] - 0.5 * dimensions["ring_width"] - dimensions["mask_clearance"]
    left_x, right_x, room = 0.5 * free + 0.5e-3, width - 0.5 * free - 0.5e-3, free - 2e-3
    texts += [
        _Text("LONG LINE", Level.TOP, (left_x, rows[0] + 2.4e-3), room, 1.5e-3),
        _Text(_mm(dimensions["long_length"]), Level.TOP, (left_x, rows[0]), room, 1.5e-3),
        _Text("SHORT LINE", Level.TOP, (right_x, rows[0] + 2.4e-3), room, 1.5e-3),
        _Text(_mm(dimensions["short_length"]), Level.TOP, (right_x, rows[0]), room, 1.5e-3),
        _Text("RING", Level.TOP, (left_x, rows[1]), room, 1.5e-3),
        _Text(f"MEAN R {_mm(dimensions['ring_radius'])}", Level.TOP, (right_x, rows[1]), room, 1.5e-3),
    ]
    return texts


def _titles(dimensions: Dimensions, request: CouponRequest) -> list[_Text]:
    """Name, side and the impedance trace's label, above and below the trace."""
    width, height = dimensions["board_width"], dimensions["board_height"]
    room, middle = width - 2.0 * (dimensions["launch_depth"] + 0.5 * request.connector.reach), 0.5 * width
    label = f"IMPEDANCE TRACE {request.trace_impedance:.1f} OHM, WIDTH {_mm(dimensions['trace_width'])}"
    above = dimensions["trace_row"] + 0.5 * dimensions["trace_width"]
    return [
        _Text(label, Level.TOP, (middle, above + 1.3e-3), room, 1.5e-3),
        _Text(f"{request.name} COUPON TOP", Level.TOP, (middle, above + 3.7e-3), room, 2e-3),
        _Text(f"{request.name} COUPON", Level.BOTTOM, (middle, 0.5 * height + 2.5e-3), room),
        _Text("BOTTOM, GROUND PLANE", Level.BOTTOM, (middle, 0.5 * height - 2.5e-3), room),
    ]


def _mm(length: float) -> str:
    return f"{1e3 * length:.2f} MM"

"""Where on the board each dimension of a design is: the line it is measured along, and the spot its callout points at.

Places are worked out from the mean line and the dimensions in loop coordinates (see `planar.copper.drawing`), as the
family's drawing function does, then turned, mirrored and moved with the copper. One row of a table per dimension.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping
from dataclasses import dataclass, replace

from planar.copper.arc import Edge, Point
from planar.copper.drawing import loop_height, mean_line
from planar.copper.families import FAMILIES
from planar.copper.layout import Level
from planar.copper.outline import Outline
from planar.copper.path import Path
from planar.copper.shapes import turned_rectangle
from planar.copper.svg_path import decimal
from planar.copper.tabs import tab_places
from planar.design.design import Design
from planar.design.trial import drawing_request
from planar.units import show

ROOM = 2.2e-3
"""m, from the copper to a length measured beside it."""
SHORT = 8e-3
"""m, a shorter length along the loop is measured further inside: it has its arrows outside, where others end."""
LINE_DIMENSIONS = frozenset(
    {
        "feed_length",
        "line_width",
        "transformer_width",
        "transformer_length",
        "end_width",
        "end_length",
        "via_drill",
        "via_ring",
    }
)
"""Dimensions of the line on top; the others are those of the loop, on the lowest level."""
DIAMETERS, RADII = frozenset({"via_drill"}), frozenset({"corner_radius"})


@dataclass(frozen=True)
class Mark:
    """A dimension on the board: `name` as in the design, `label` and `value` as they are read.

    `spot` is where its callout points; `measure` the line it is measured along, with arrow heads at its end and, where
    it is no radius, at its start; `witnesses` lead from the copper to it. All in m, in board coordinates.
    """

    name: str
    label: str
    value: str
    spot: Point
    measure: Path | None = None
    witnesses: tuple[tuple[Point, Point], ...] = ()

    @property
    def is_radius(self) -> bool:
        """Whether it is measured from a centre."""
        return self.name in RADII


@dataclass(frozen=True)
class Zone:
    """A part of the board with a name: `title` says which and how large, `outline` is where, in m."""

    title: str
    outline: Outline


@dataclass(frozen=True)
class BoardMarks:
    """What is to be said about one level: its dimensions, the gaps of its loop and the loop's mean line."""

    dimensions: tuple[Mark, ...] = ()
    gaps: tuple[Zone, ...] = ()
    mean_line: Path | None = None


@dataclass(frozen=True)
class _Loop:
    """The loop in loop coordinates: its `line`, its `top`, and how far `inside` the mean line a length is measured."""

    dimensions: Mapping[str, float]
    line: Path
    top: float
    inside: float

    def __getitem__(self, name: str) -> float:
        return self.dimensions[name]


Found = tuple[Path, Point, tuple[tuple[Point, Point], ...]]
"""Measure, spot and witnesses."""


def board_marks(design: Design, level: Level) -> BoardMarks:
    """What there is to say about the copper of `design` on `level`."""
    dimensions = design.dimensions
    family = design.choices.family
    request = drawing_request(design.choices)
    loop = _loop(dimensions)
    feed = FAMILIES[family.key](dimensions, request).feed
    move = _Move(feed, request.mirrored)
    loop_level = design.layout.levels[-1]
    needed = family.needed(design.choices.traits)
    names = [name for name in needed if level == (Level.TOP if name in LINE_DIMENSIONS else loop_level)]
    marks = [_mark(name, loop, move) for name in names if name in PLACES]
    if level == Level.TOP:
        marks.append(_feed_mark(design))
    if level != loop_level:
        return BoardMarks(tuple(marks))
    marks.append(_round_the_loop(loop, move))
    return BoardMarks(tuple(marks), tuple(_gaps(loop, move)), move.path(loop.line))


@dataclass(frozen=True)
class _Move:
    """From loop coordinates to the board's."""

    feed: Point
    mirrored: bool

    def point(self, point: Point) -> Point:
        """Where `point` is on the board."""
        return (-point[0] if self.mirrored else point[0]) - self.feed[0], point[1] - self.feed[1]

    def path(self, path: Path) -> Path:
        """Where `path` is on the board."""
        sense = -1.0 if self.mirrored else 1.0
        return Path(tuple(Edge(self.point(e.start), self.point(e.end), sense * e.bulge) for e in path.edges))


def millimetres(length: float) -> str:
    """`length` m as a drawing writes it: mm, to the micrometre."""
    return f"{decimal(round(1e3 * length, 3))} mm"


def _loop(dimensions: Mapping[str, float]) -> _Loop:
    inside = 0.5 * dimensions["trace_width"] + max(ROOM, 0.025 * dimensions["loop_width"])
    return _Loop(dimensions, mean_line(dimensions), 0.5 * loop_height(dimensions), inside)


def _mark(name: str, loop: _Loop, move: _Move) -> Mark:
    measure, spot, witnesses = PLACES[name](loop)
    moved = tuple((move.point(a), move.point(b)) for a, b in witnesses)
    label = name.replace("_", " ")
    return Mark(name, label, _value(name, loop), move.point(spot), move.path(measure), moved)


def _value(name: str, loop: _Loop) -> str:
    written = millimetres(loop[name])
    if name == "second_gap_position":
        return f"{written}, {_angle_round(loop, loop[name]):.2f}°"
    round_one = name == "loop_width" and "corner_radius" not in loop.dimensions
    sign = "Ø " if round_one or name in DIAMETERS else "R " if name in RADII else ""
    return sign + written


def _angle_round(loop: _Loop, position: float) -> float:
    """Degrees round the loop's centre from the gap to `position` m along the mean line."""
    (x, y), _ = loop.line.at(position)
    return math.degrees(math.atan2(-x, y)) % 360.0


def _feed_mark(design: Design) -> Mark:
    choices = design.choices
    value = f"{show(choices.brief.target.impedance, 'impedance')}, {choices.connector.key}"
    return Mark("feed", "feed, origin", value, (0.0, 0.0))


def _round_the_loop(loop: _Loop, move: _Move) -> Mark:
    spot = move.point(loop.line.at(0.58 * loop.line.length)[0])
    return Mark("mean_line", "mean line, once round", millimetres(loop.line.length), spot)


def _gaps(loop: _Loop, move: _Move) -> list[Zone]:
    """The feed gap and, where there is one, the second gap, as the copper leaves them."""
    trace = loop["trace_width"]
    lengths = {"gap": loop.dimensions.get("gap", loop.dimensions.get("strip_gap", 0.0))}
    lengths |= {"second gap": loop["second_gap"]} if "second_gap" in loop.dimensions else {}
    places = {"gap": 0.0, "second gap": loop.dimensions.get("second_gap_position", 0.0)}
    zones = []
    for name, length in lengths.items():
        path = loop.line.at(places[name])
        (x, y), (ux, uy) = move.point(path[0]), path[1]
        along = (-ux if move.mirrored else ux, uy)
        title = f"{name}, {millimetres(length)} long, {millimetres(trace)} wide"
        zones.append(Zone(title, turned_rectangle((x, y), along, length=length, width=trace)))
    return zones


def _straight(start: Point, end: Point) -> Path:
    return Path((Edge(start, end),))


def _beside(at: tuple[Point, Point], left: float) -> Point:
    """The point `left` m to the left of a point with its tangent, which is toward the loop's inside."""
    (x, y), (ux, uy) = at
    return x - left * uy, y + left * ux


def _across(loop: _Loop, place: float, width: float) -> Found:
    """A width across the mean line at `place` m along it."""
    at = loop.line.at(place)
    inner, outer = _beside(at, 0.5 * width), _beside(at, -0.5 * width)
    return _straight(inner, outer), at[0], ()


def _along(loop: _Loop, first: float, last: float, copper: float) -> Found:
    """A length along the mean line, measured inside the loop; `copper` m is the width it leads away from."""
    part = loop.line.between(first, last)
    away = loop.inside if last - first > SHORT else loop.inside + ROOM
    if any(edge.bulge > 0.0 and edge.radius < away + 0.5 * ROOM for edge in part.edges):
        away = -0.5 * loop["trace_width"] - ROOM  # a corner too tight to be followed inside it
    measure = Path(tuple(part.offset(away)))
    near, beyond = math.copysign(0.5 * copper, away), away + math.copysign(0.5e-3, away)
    ends = [loop.line.at(first), loop.line.at(last)]
    witnesses = tuple((_beside(end, near), _beside(end, beyond)) for end in ends)
    return measure, measure.at(0.5 * measure.length)[0], witnesses


def _loop_width(loop: _Loop) -> Found:
    """Across a circle on a slant, so that it crosses neither feed nor line; level across other shapes."""
    half = 0.5 * loop["loop_width"]
    if "corner_radius" in loop.dimensions:
        y = -0.42 * loop.top
        measure = _straight((-half, y), (half, y))
    else:
        turn = math.radians(-22.0)
        end = (half * math.cos(turn), half * math.sin(turn))
        measure = _straight((-end[0], -end[1]), end)
    return measure, measure.at(0.82 * measure.length)[0], ()


def _loop_height(loop: _Loop) -> Found:
    x = -0.24 * loop["loop_width"]
    measure = _straight((x, -loop.top), (x, loop.top))
    return measure, measure.at(0.62 * measure.length)[0], ()


def _corner_radius(loop: _Loop) -> Found:
    """From the centre of the lower left corner to the mean line."""
    arcs = [edge for edge in loop.line.edges if edge.bulge != 0.0]
    if not arcs:
        corner = (-0.5 * loop["loop_width"], -loop.top)
        return _straight(corner, (corner[0] + 1e-6, corner[1])), corner, ()
    measure = _straight(arcs[1].centre, arcs[1].point(0.5))
    return measure, measure.at(0.3 * measure.length)[0], ()


def _gap(loop: _Loop, place: float, length: float) -> Found:
    """A gap across the mean line at `place`, measured just outside the trace."""
    (x, y), (ux, uy) = loop.line.at(place)
    half, edge = 0.5 * length, 0.5 * loop["trace_width"]
    sides = [((x + s * half * ux, y + s * half * uy), (ux, uy)) for s in (-1.0, 1.0)]
    start, end = (_beside(side, -edge - 0.55 * ROOM) for side in sides)
    witnesses = tuple((_beside(side, -edge), _beside(side, -edge - 0.75 * ROOM)) for side in sides)
    return _straight(start, end), (0.5 * (start[0] + end[0]), 0.5 * (start[1] + end[1])), witnesses


def _upright(x: float, low: float, high: float, reach: tuple[float, float]) -> Found:
    """A height at `x` from `low` to `high`; the witnesses start at `reach[0]` and `reach[1]`."""
    beyond = math.copysign(0.5e-3, x)
    witnesses = (((reach[0], low), (x + beyond, low)), ((reach[1], high), (x + beyond, high)))
    return _straight((x, low), (x, high)), (x, 0.5 * (low + high)), witnesses


def _feed_length(loop: _Loop) -> Found:
    low = -loop.top - loop["feed_length"]
    return _upright(-0.5 * loop["line_width"] - 2.5 * ROOM, low, -loop.top, (-0.5 * loop["line_width"], 0.0))


def _strip_edge(loop: _Loop) -> float:
    return 0.5 * loop["strip_gap"] + loop["strip_width"]


def _strip_length(loop: _Loop) -> Found:
    edge = _strip_edge(loop)
    pad = 0.5 * loop["strip_gap"] + loop["pad_width"]
    return _upright(-max(edge, pad) - 1.5 * ROOM, loop.top - loop["strip_length"], loop.top, (-pad, -edge))


def _strip_width(loop: _Loop) -> Found:
    y = loop.top - 0.35 * loop["strip_length"]
    start, end = (0.5 * loop["strip_gap"], y), (_strip_edge(loop), y)
    return _straight(start, end), (0.5 * (start[0] + end[0]), y), ()


def _strip_gap(loop: _Loop) -> Found:
    y, half = loop.top - 0.6 * loop["strip_length"], 0.5 * loop["strip_gap"]
    return _straight((-half, y), (half, y)), (0.0, y), ()


def _pad_width(loop: _Loop) -> Found:
    low = loop.top - loop["strip_length"] - 0.5 * loop["pad_length"]
    near, far = 0.5 * loop["strip_gap"], 0.5 * loop["strip_gap"] + loop["pad_width"]
    y = low - 0.7 * ROOM
    witnesses = tuple(((x, low), (x, y - 0.5e-3)) for x in (near, far))
    return _straight((near, y), (far, y)), (0.5 * (near + far), y), witnesses


def _pad_length(loop: _Loop) -> Found:
    """Beside the pad of coplanar strips; below that at the end of a plain loop's trace."""
    length = loop["pad_length"]
    if "strip_gap" in loop.dimensions:
        middle, edge = loop.top - loop["strip_length"], 0.5 * loop["strip_gap"] + loop["pad_width"]
        return _upright(edge + ROOM, middle - 0.5 * length, middle + 0.5 * length, (edge, edge))
    near, far = 0.5 * loop["gap"], 0.5 * loop["gap"] + length
    low = loop.top - 0.5 * loop["trace_width"]
    y = low - 0.7 * ROOM
    witnesses = tuple(((x, low), (x, y - 0.5e-3)) for x in (near, far))
    return _straight((near, y), (far, y)), (0.5 * (near + far), y), witnesses


def _via(loop: _Loop, size: str) -> Found:
    """The via at the line's end: its bore across the line, or the ring beyond it along the line."""
    at = loop.line.at(loop["end_length"])
    half, ring = 0.5 * loop["via_drill"], loop["via_ring"]
    if size == "via_drill":
        return _straight(_beside(at, half), _beside(at, -half)), at[0], ()
    (x, y), (ux, uy) = at
    start, end = (x + half * ux, y + half * uy), (x + (half + ring) * ux, y + (half + ring) * uy)
    return _straight(start, end), end, ()


def _tab(loop: _Loop, name: str) -> Found:
    """On the tabs left of the gap as the mean line runs."""
    middle = 0.25 * loop.line.length
    edge, tip = 0.5 * loop["trace_width"], 0.5 * loop["trace_width"] + loop["tab_length"]
    if name == "tab_spacing":
        first, second = sorted(tab_places(loop.line, loop["tab_spacing"]))[:2]
        further = replace(loop, inside=tip + ROOM)
        return _along(further, first, second, 2.0 * tip)
    half, aside = 0.5 * loop["tab_width"], 0.5 * ROOM
    if name == "tab_length":
        corner, side = loop.line.at(middle + half), loop.line.at(middle + half + aside)
        lead = (_beside(corner, tip), _beside(side, tip))
        return _straight(_beside(side, edge), _beside(side, tip)), _beside(side, tip), (lead,)
    ends = [loop.line.at(middle - half), loop.line.at(middle + half)]
    start, end = (_beside(each, tip + aside) for each in ends)
    leads = tuple((_beside(each, tip), _beside(each, tip + 1.3 * aside)) for each in ends)
    return _straight(start, end), (0.5 * (start[0] + end[0]), 0.5 * (start[1] + end[1])), leads


PLACES: Mapping[str, Callable[[_Loop], Found]] = {
    "loop_width": _loop_width,
    "loop_height": _loop_height,
    "corner_radius": _corner_radius,
    "trace_width": lambda loop: _across(loop, 0.4 * loop.line.length, loop["trace_width"]),
    "gap": lambda loop: _gap(loop, 0.0, loop["gap"]),
    "second_gap": lambda loop: _gap(loop, loop["second_gap_position"], loop["second_gap"]),
    "second_gap_position": lambda loop: _along(loop, 0.0, loop["second_gap_position"], loop["trace_width"]),
    "feed_length": _feed_length,
    "line_width": lambda loop: _across(loop, 0.66 * loop.line.length, loop["line_width"]),
    "transformer_width": lambda loop: _across(
        loop, loop.line.length - 0.7 * loop["transformer_length"], loop["transformer_width"]
    ),
    "transformer_length": lambda loop: _along(
        loop, loop.line.length - loop["transformer_length"], loop.line.length, loop["line_width"]
    ),
    "end_width": lambda loop: _across(loop, 0.5 * loop["end_length"], loop["end_width"]),
    "end_length": lambda loop: _along(loop, 0.0, loop["end_length"], loop["end_width"]),
    "via_drill": lambda loop: _via(loop, "via_drill"),
    "via_ring": lambda loop: _via(loop, "via_ring"),
    "strip_width": _strip_width,
    "strip_gap": _strip_gap,
    "strip_length": _strip_length,
    "pad_width": _pad_width,
    "pad_length": _pad_length,
    "tab_length": lambda loop: _tab(loop, "tab_length"),
    "tab_width": lambda loop: _tab(loop, "tab_width"),
    "tab_spacing": lambda loop: _tab(loop, "tab_spacing"),
}
"""Name of a dimension -> where it is in loop coordinates. A new dimension is one row here."""

"""Every family's copper against the same copper built another way.

Authority: shapely, which builds loop, line, strips and lands here from mean lines and boxes alone
(buffers of a finely divided line); distances and gaps are measured between faces on the drawing.
"""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np
import pytest
from scipy.optimize import brentq
from shapely import LinearRing, LineString, Polygon, box, symmetric_difference
from shapely.affinity import rotate, scale, translate
from shapely.geometry import Point
from shapely.geometry.base import BaseGeometry
from shapely.ops import substring, unary_union

from planar.copper.drawing import Drawing, DrawingRequest
from planar.copper.families import BEND_WIDTHS, FAMILIES
from planar.copper.layout import Level, Role
from planar.errors import GeometryError
from planar.library import Library

MM = 1e-3
FINE = 2e-7
"""m, chord error of every flattened curve here."""
Case = tuple[str, str, str, str | None, bool]


def quarter(x: float, y: float, radius: float, first: float) -> np.ndarray:
    """Points of a quarter circle, counter-clockwise from angle `first`."""
    count = math.ceil(0.25 * math.pi / math.acos(1.0 - FINE / radius)) + 1
    angles = first + np.linspace(0.0, 0.5 * math.pi, count)
    return np.column_stack([x + radius * np.cos(angles), y + radius * np.sin(angles)])


def half_sides(dimensions: dict[str, float]) -> tuple[float, float, float]:
    a = 0.5 * dimensions["loop_width"]
    b = 0.5 * dimensions.get("loop_height", dimensions["loop_width"])
    return a, b, dimensions.get("corner_radius", a)


def mean_line(dimensions: dict[str, float]) -> LineString:
    """From the middle of the top counter-clockwise, closed."""
    a, b, r = half_sides(dimensions)
    corners = [
        quarter(r - a, b - r, r, 0.5 * math.pi), quarter(r - a, r - b, r, math.pi),
        quarter(a - r, r - b, r, 1.5 * math.pi), quarter(a - r, b - r, r, 0.0),
    ]  # fmt: skip
    points = np.vstack([[(0.0, b)], *corners, [(0.0, b)]])
    apart = np.hypot(*np.diff(points, axis=0).T) > 1e-9  # quarters of a circle share their end points
    return LineString(points[np.append(True, apart)])


def strip(line: LineString, width: float) -> BaseGeometry:
    return line.buffer(0.5 * width, cap_style="flat", join_style="mitre")


def cut_at(line: LineString, position: float, length: float) -> BaseGeometry:
    """Window with parallel sides over a gap of `length` at `position` along the line."""
    here, ahead = line.interpolate(position), line.interpolate(position + 1e-6)
    window = box(-0.5 * length, -10 * MM, 0.5 * length, 10 * MM)
    angle = math.degrees(math.atan2(ahead.y - here.y, ahead.x - here.x))
    return translate(rotate(window, angle, origin=(0.0, 0.0)), here.x, here.y)


def loop(dimensions: dict[str, float], gap: float) -> BaseGeometry:
    line, half = mean_line(dimensions), 0.5 * dimensions["trace_width"]
    ring = Polygon(LinearRing(line)).exterior.buffer(half, join_style="mitre")
    ring = ring.difference(cut_at(line, 0.0, gap))
    if "second_gap" in dimensions:
        ring = ring.difference(cut_at(line, dimensions["second_gap_position"], dimensions["second_gap"]))
    return ring


def lead(dimensions: dict[str, float], line: LineString) -> tuple[LineString, float]:
    """Straight up from the feed, then a bend of given radius that touches the loop; where it lands on the loop.

    The bend's centre is found by search: its distance from the mean line, on the outside, is its radius.
    """
    _, b, _ = half_sides(dimensions)
    radius = BEND_WIDTHS * dimensions["line_width"]
    height = brentq(lambda y: line.distance(Point(radius, y)) - radius, -b - 3 * radius, -b, xtol=1e-13)
    landed = line.project(Point(radius, height))
    landing = line.interpolate(landed)
    last = math.atan2(landing.y - height, landing.x - radius)
    angles = np.linspace(math.pi, last, 400)
    bend = np.column_stack([radius + radius * np.cos(angles), height + radius * np.sin(angles)])
    return LineString(np.vstack([[(0.0, -b - dimensions["feed_length"])], bend])), landed


def guided_line(dimensions: dict[str, float], asked: DrawingRequest) -> BaseGeometry:
    line = mean_line(dimensions)
    way, landed = lead(dimensions, line)
    narrow = line.length - dimensions["transformer_length"]
    end = dimensions["end_length"]
    parts = [
        strip(way, dimensions["line_width"]),
        strip(substring(line, landed, narrow), dimensions["line_width"]),
        strip(substring(line, narrow, line.length), dimensions["transformer_width"]),
        strip(substring(line, 0.0, end), dimensions["end_width"]),
    ]
    if asked.end == "via":
        radius = 0.5 * dimensions["via_drill"] + dimensions["via_ring"]
        parts.append(line.interpolate(end).buffer(radius, quad_segs=200))
    return unary_union(parts)


def lands(asked: DrawingRequest, feed: tuple[float, float], level: str, net: str) -> list[BaseGeometry]:
    """Land pattern turned so that its +x points up."""
    shapes = [
        rotate(translate(box(-0.5 * p.size[0], -0.5 * p.size[1], 0.5 * p.size[0], 0.5 * p.size[1]), *p.centre),
               90.0, origin=(0.0, 0.0))
        for p in asked.connector.pads if p.level == level and p.net == net
    ]  # fmt: skip
    return [translate(shape, *feed) for shape in shapes]


def expected_copper(family: str, dimensions: dict[str, float], asked: DrawingRequest) -> dict[Level, BaseGeometry]:
    """Copper by level, in loop coordinates, of the drawing that is not mirrored."""
    _, b, _ = half_sides(dimensions)
    if family == "plain":
        return {Level.TOP: loop(dimensions, dimensions["gap"])}
    if family == "coplanar":
        gap, half = dimensions["strip_gap"], 0.5 * dimensions["strip_gap"]
        end = b - dimensions["strip_length"]
        long = 0.5 * dimensions["pad_length"]
        right = [
            box(half, end, half + dimensions["strip_width"], b),
            box(half, end - long, half + dimensions["pad_width"], end + long),
        ]
        left = [scale(part, -1.0, 1.0, origin=(0.0, 0.0)) for part in right]
        return {Level.TOP: unary_union([loop(dimensions, gap), *right, *left])}
    feed = (0.0, -b - dimensions["feed_length"])
    tab = asked.connector.ground_tab
    assert tab is not None
    ground = box(-tab.half_width, feed[1] - tab.length, tab.half_width, -b)
    grounds = lands(asked, feed, "bottom", "ground")
    top = [guided_line(dimensions, asked), *lands(asked, feed, "top", "signal"), *lands(asked, feed, "top", "ground")]
    return {
        Level.TOP: unary_union(top),
        Level.BOTTOM: unary_union([loop(dimensions, dimensions["gap"]), ground, *grounds]),
    }


def copper(drawing: Drawing, level: Level) -> BaseGeometry:
    return unary_union([i.outline.shape(FINE) for i in drawing.islands if i.level is level])


def apart(first: BaseGeometry, second: BaseGeometry) -> float:
    """Area of the symmetric difference, m2; snapped to 0.1 nm, since shapely slips on edges that nearly coincide."""
    return float(symmetric_difference(first, second, grid_size=1e-10).area)


def test_copper_is_that_of_mean_line_and_width(
    drawing: Drawing, family: str, dimensions: dict[str, float], asked: DrawingRequest
) -> None:
    for level, expected in expected_copper(family, dimensions, asked).items():
        wanted = scale(expected, -1.0, 1.0, origin=(0.0, 0.0)) if asked.mirrored else expected
        area = math.fsum(i.outline.area for i in drawing.islands if i.level is level)
        budget = 4.0 * FINE * wanted.length
        assert apart(copper(drawing, level), wanted) < budget
        assert area == pytest.approx(wanted.area, abs=budget)


def test_every_island_is_simple_and_islands_lie_apart(drawing: Drawing) -> None:
    for level in Level:
        shapes = [i.outline.normalised().shape() for i in drawing.islands if i.level is level]
        assert all(shape.is_valid and not shape.interiors for shape in shapes)
        assert all(a.distance(b) > 0.1 * MM for i, a in enumerate(shapes) for b in shapes[:i])


def test_number_of_radiator_islands(drawing: Drawing, case: Case) -> None:
    """An uncut loop is one piece, a second gap makes two."""
    radiators = [i for i in drawing.islands if i.role is Role.RADIATOR]
    assert len(radiators) == (2 if case[2] == "circular" else 1)


def test_gaps_are_as_wide_as_their_dimension(drawing: Drawing, dimensions: dict[str, float], case: Case) -> None:
    """Distance between the two faces, measured in a window round the gap."""
    family, _, polarisation, _, mirrored = case
    level = Level.BOTTOM if family == "ring-guided" else Level.TOP
    line, metal = mean_line(dimensions), copper(drawing, level)
    wanted = [(0.0, dimensions["strip_gap" if family == "coplanar" else "gap"])]
    if polarisation == "circular":
        wanted.append((dimensions["second_gap_position"], dimensions["second_gap"]))
    for position, length in wanted:
        middle = line.interpolate(position)
        place = Point(-middle.x, middle.y) if mirrored else middle
        nearby = metal.intersection(place.buffer(length + 0.4 * dimensions["trace_width"]))
        faces = [part for part in nearby.geoms if part.distance(place) < 0.51 * length]
        assert len(faces) == 2
        assert faces[0].distance(faces[1]) == pytest.approx(length, abs=1e-8)
        # the place is up to 1 um off: the divided line is that much shorter than its arcs
        assert [face.distance(place) for face in faces] == pytest.approx([0.5 * length] * 2, abs=1e-6)


def test_pads_lie_on_copper_of_their_level(drawing: Drawing) -> None:
    for pad in drawing.pads:
        bare = pad.outline.shape(FINE).difference(copper(drawing, pad.level).buffer(2 * FINE))
        assert bare.area < 1e-15


def test_handedness_mirrors_the_copper_about_the_axis(
    drawing: Drawing, family: str, dimensions: dict[str, float], asked: DrawingRequest
) -> None:
    """The lands are not mirrored, they are symmetric themselves; nor are pads, whose polarity stays."""
    other = FAMILIES[family](dimensions, replace(asked, mirrored=not asked.mirrored))
    for level in Level:
        image = scale(copper(other, level), -1.0, 1.0, origin=(0.0, 0.0))
        here = copper(drawing, level)
        assert apart(image, here) <= 4.0 * FINE * here.length
    places = [[(abs(hole.centre[0]), hole.centre[1]) for hole in each.holes] for each in (drawing, other)]
    assert places[0] == places[1]
    for pad, same in zip(drawing.pads, other.pads, strict=True):
        assert (pad.name, pad.terminal) == (same.name, same.terminal)
        assert pad.outline.bounds == pytest.approx(same.outline.bounds, abs=1e-9)


def test_the_line_ends_over_the_far_side_of_the_gap(
    drawing: Drawing, family: str, dimensions: dict[str, float], asked: DrawingRequest
) -> None:
    """Both levels have copper where the line ends; a via joins them there and nowhere else on the loop."""
    if family != "ring-guided":
        assert drawing.holes == ()
        return
    end = mean_line(dimensions).interpolate(dimensions["end_length"])
    end = Point(-end.x, end.y) if asked.mirrored else end
    for level in Level:
        assert copper(drawing, level).buffer(1e-6).contains(end)
    vias = [Point(h.centre) for h in drawing.holes if h.plated and h.centre[1] > 0.0]
    assert len(vias) == (1 if asked.end == "via" else 0)
    assert all(via.distance(end) < 1e-6 for via in vias)


def test_port_spans_the_gap_or_stands_at_the_start_of_the_line(
    drawing: Drawing, family: str, dimensions: dict[str, float], asked: DrawingRequest
) -> None:
    (port,) = drawing.ports
    assert port.centre == drawing.feed
    if family == "ring-guided":
        assert (port.kind, port.length, port.width) == ("vertical", 0.0, dimensions["line_width"])
        assert port.direction == (0.0, -1.0)
    else:
        gap = dimensions["strip_gap" if family == "coplanar" else "gap"]
        assert (port.kind, port.length, port.direction) == ("gap", gap, (1.0, 0.0))
        sides = {pad.terminal: pad.outline.shape().centroid.x for pad in drawing.pads}
        assert sides["return"] < 0.0 < sides["signal"]


PLAIN = {"loop_width": 100 * MM, "trace_width": 3 * MM, "gap": 2 * MM, "pad_length": 2 * MM}
COPLANAR = {
    "loop_width": 100 * MM, "trace_width": 3 * MM, "strip_width": MM, "strip_gap": 0.3 * MM,
    "strip_length": 42 * MM, "pad_width": 1.5 * MM, "pad_length": 2 * MM,
}  # fmt: skip
GUIDED = {
    "loop_width": 100 * MM, "trace_width": 8 * MM, "gap": 2 * MM, "feed_length": 6 * MM, "line_width": 3 * MM,
    "transformer_width": 0.3 * MM, "transformer_length": 40 * MM, "end_width": 3 * MM, "end_length": 40 * MM,
}  # fmt: skip


@pytest.mark.parametrize(
    ("family", "dimensions", "message"),
    [
        ("plain", PLAIN | {"trace_width": 50 * MM}, "fills the loop"),
        ("plain", PLAIN | {"second_gap": MM, "second_gap_position": 4 * MM}, "nearer than a trace width"),
        ("plain", PLAIN | {"second_gap": MM, "second_gap_position": 400 * MM}, "nearer than a trace width"),
        ("plain", PLAIN | {"corner_radius": MM}, "too tight"),
        ("plain", PLAIN | {"corner_radius": 51 * MM}, "does not fit"),
        ("coplanar", COPLANAR | {"strip_length": 96 * MM}, "far side of the loop"),
        ("ring-guided", GUIDED | {"feed_length": 4 * MM}, "feed_length is too short"),
        ("ring-guided", GUIDED | {"transformer_length": 155 * MM}, "transformer"),
        ("ring-guided", GUIDED | {"line_width": 34 * MM}, "too wide"),
    ],
)
def test_copper_that_cannot_be_drawn_is_refused(
    family: str, dimensions: dict[str, float], message: str, library: Library
) -> None:
    connector = library.connector("edge-coax" if family == "ring-guided" else "bare-pads")
    end = "open" if family == "ring-guided" else None
    asked = DrawingRequest("refused", end, False, connector, library.fab("pool-two-layer"), ())
    with pytest.raises(GeometryError, match=message):
        FAMILIES[family](dimensions, asked)

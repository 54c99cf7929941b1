"""Trim tabs on every loop shape and family.

Authority: plane geometry (areas of rectangles and of the strip between a chord and an arc; places from angles and
sides), shapely for distances, mirror symmetry. That the middle pair belongs a quarter of the mean line from the gap
follows from the current of a full-wave loop, a cosine with its maxima at the gap and opposite (common practice, no
source).
"""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np
import pytest
from shapely import symmetric_difference, unary_union
from shapely.geometry import Point, box
from shapely.geometry.base import BaseGeometry

from planar.copper.board import PlannedBoard, plan_board
from planar.copper.drawing import DrawingRequest, loop_copper, trim_tabs
from planar.copper.families import FAMILIES
from planar.copper.layout import Level
from planar.copper.rules import fab_findings
from planar.errors import GeometryError
from planar.library import Library

MM = 1e-3
LIBRARY = Library.open()
LENGTH, WIDTH, SPACING, TRACE, GAP = 5 * MM, 2 * MM, 7 * MM, 6 * MM, 2 * MM
TABS = {"tab_length": LENGTH, "tab_width": WIDTH, "tab_spacing": SPACING}
SHAPES = {
    "circle": {"loop_width": 104 * MM},
    "square": {"loop_width": 90 * MM, "corner_radius": 12 * MM},
    "rectangle": {"loop_width": 110 * MM, "loop_height": 70 * MM, "corner_radius": 8 * MM},
    "upright rectangle": {"loop_width": 60 * MM, "loop_height": 120 * MM, "corner_radius": 8 * MM},
}
COPPER = {
    "plain": {"gap": GAP, "pad_length": 2 * MM},
    "coplanar": {
        "strip_width": 1.1 * MM, "strip_gap": 0.3 * MM, "strip_length": 45 * MM, "pad_width": 1.5 * MM,
        "pad_length": 2 * MM,
    },
    "ring-guided": {
        "gap": GAP, "feed_length": 6 * MM, "line_width": 2 * MM, "transformer_width": 0.25 * MM,
        "transformer_length": 35 * MM,
    },
}  # fmt: skip
ENDS = {
    None: {},
    "via": {"end_width": 0.9 * MM, "end_length": 2.5 * MM, "via_drill": 0.3 * MM, "via_ring": 0.3 * MM},
    "open": {"end_width": 2 * MM, "end_length": 40 * MM},
}
REALISATIONS = [("plain", None), ("coplanar", None), ("ring-guided", "via"), ("ring-guided", "open")]
CONNECTORS = {"plain": "bare-pads", "coplanar": "bare-pads", "ring-guided": "edge-coax"}


def loop(shape: str, **changed: float) -> dict[str, float]:
    return SHAPES[shape] | {"trace_width": TRACE} | TABS | changed


def copper(dimensions: dict[str, float], tabs: int = 3) -> BaseGeometry:
    return unary_union([outline.shape() for outline in loop_copper(dimensions, GAP, tabs=tabs)])


def area(dimensions: dict[str, float], tabs: int) -> float:
    return math.fsum(outline.area for outline in loop_copper(dimensions, GAP, tabs=tabs))


def board(family: str, end: str | None, dimensions: dict[str, float], tabs: int = 3) -> PlannedBoard:
    levels = (Level.TOP, Level.BOTTOM) if family == "ring-guided" else (Level.TOP,)
    fab, connector = LIBRARY.fab("pool-two-layer"), LIBRARY.connector(CONNECTORS[family])
    request = DrawingRequest("trimmed", end, False, connector, fab, levels, tabs=tabs)
    return plan_board(FAMILIES[family](dimensions, request), request, levels, lettered_board=False)


@pytest.mark.parametrize("shape", ["square", "rectangle", "upright rectangle"])
@pytest.mark.parametrize("tabs", [1, 2, 3])
def test_area_on_straight_sides_is_that_of_rectangles(shape, tabs):
    dimensions = loop(shape)
    # a difference of areas some hundred times larger: double precision leaves twelve digits of them
    assert area(dimensions, tabs) - area(dimensions, 0) == pytest.approx(2 * tabs * LENGTH * WIDTH, rel=1e-9)


@pytest.mark.parametrize("tabs", [1, 2, 3])
def test_area_on_a_circle_adds_the_segment_under_the_arc(tabs):
    dimensions = loop("circle")
    radius, half = 0.5 * (dimensions["loop_width"] - TRACE), 0.5 * WIDTH
    under_arc = half * math.sqrt(radius**2 - half**2) + radius**2 * math.asin(half / radius)
    each = under_arc - WIDTH * (radius - LENGTH)
    assert area(dimensions, tabs) - area(dimensions, 0) == pytest.approx(2 * tabs * each, rel=1e-9)


@pytest.mark.parametrize("shape", SHAPES)
@pytest.mark.parametrize("tabs", [0, 1, 2, 3])
def test_left_and_right_are_mirror_images(shape, tabs):
    outlines = loop_copper(loop(shape), GAP, tabs=tabs)
    mirrored = unary_union([outline.mirrored().shape() for outline in outlines])
    # flattened arcs of a mirror image have the same points but for rounding
    assert symmetric_difference(copper(loop(shape), tabs), mirrored).area < 1e-9 * area(loop(shape), 0)


@pytest.mark.parametrize("shape", ["square", "rectangle", "upright rectangle"])
@pytest.mark.parametrize(("tabs", "heights"), [(3, (1, 0, -1)), (2, (0, -1)), (1, (-1,)), (0, ())])
def test_tabs_stand_at_the_middle_of_the_sides_and_the_upper_go_first(shape, tabs, heights):
    inner = 0.5 * (SHAPES[shape]["loop_width"] - TRACE)
    inside = copper(loop(shape), tabs).intersection(box(-inner, -15 * MM, inner, 15 * MM))
    expected = unary_union(
        [
            box(side * inner, height * SPACING - 0.5 * WIDTH, side * (inner - LENGTH), height * SPACING + 0.5 * WIDTH)
            for side in (-1, 1)
            for height in heights
        ]
    )
    assert symmetric_difference(inside, expected).area < 1e-9 * LENGTH * WIDTH


@pytest.mark.parametrize(("tabs", "turns"), [(3, (1, 0, -1)), (2, (0, -1)), (1, (-1,)), (0, ())])
def test_tabs_stand_at_the_sides_of_a_circle(tabs, turns):
    mean = 0.5 * SHAPES["circle"]["loop_width"]
    shape = copper(loop("circle"), tabs)
    depth = mean - 0.5 * TRACE - 0.5 * LENGTH
    for turn in (1, 0, -1):
        for side in (-1, 1):
            angle = turn * SPACING / mean  # up from the side, an arc of the mean line
            middle = Point(side * depth * math.cos(angle), depth * math.sin(angle))
            assert shape.contains(middle) == (turn in turns)


def test_tabs_leave_a_bent_trace_at_right_angles():
    dimensions = loop("circle")
    (outline,) = loop_copper(dimensions, GAP)
    mean = 0.5 * dimensions["loop_width"]
    tips = [e for e in outline.edges if e.bulge == 0.0 and e.length == pytest.approx(WIDTH, rel=1e-9)]
    assert len(tips) == 6
    for tip in tips:
        place = outline.edges.index(tip)
        before, after = outline.edges[place - 1], outline.edges[(place + 1) % len(outline.edges)]
        for side in (before, after):
            (ux, uy), (vx, vy) = side.tangent(0.5), tip.tangent(0.5)
            assert side.bulge == 0.0
            assert abs(ux * vx + uy * vy) < 1e-9
        x, y = tip.point(0.5)
        assert math.hypot(x, y) == pytest.approx(mean - 0.5 * TRACE - LENGTH, rel=1e-9)
        (ux, uy) = tip.tangent(0.5)
        assert abs(ux * x + uy * y) < 1e-9 * mean


@pytest.mark.parametrize("shape", SHAPES)
@pytest.mark.parametrize(("family", "end"), REALISATIONS)
def test_tabs_change_no_net_and_break_no_rule(family, end, shape):
    fits = {"line_width": 1.2 * MM, "transformer_length": 30 * MM} if shape == "upright rectangle" else {}
    bare = SHAPES[shape] | {"trace_width": TRACE} | COPPER[family] | ENDS[end]
    bare |= {name: value for name, value in fits.items() if name in bare}
    without = board(family, end, bare).layout
    left = {tabs: board(family, end, bare | TABS, tabs).layout for tabs in (0, 1, 2, 3)}
    for layout in left.values():
        assert [(i.level, i.role, i.net) for i in layout.islands] == [(i.level, i.role, i.net) for i in without.islands]
        assert layout.dc_short == without.dc_short
        assert layout.copper_bounds == pytest.approx(without.copper_bounds, abs=1e-9)  # one step of the grid
    fab = LIBRARY.fab("pool-two-layer")
    assert fab_findings(left[3], fab) == fab_findings(without, fab)
    none = [i.outline.shape() for i in left[0].islands]
    # snapping to whole nanometres moves every edge by half a nanometre at most
    assert (
        symmetric_difference(unary_union(none), unary_union([i.outline.shape() for i in without.islands])).area < 1e-11
    )
    areas = [math.fsum(i.outline.area for i in left[tabs].islands) for tabs in (0, 1, 2, 3)]
    assert areas == sorted(areas)
    assert areas[3] - areas[0] == pytest.approx(6 * LENGTH * WIDTH, rel=0.01)  # a circle's arc adds 0.2 %


def test_mirrored_board_has_the_same_tabs():
    dimensions = SHAPES["square"] | {"trace_width": TRACE} | COPPER["plain"] | TABS
    fab, connector = LIBRARY.fab("pool-two-layer"), LIBRARY.connector("bare-pads")
    request = DrawingRequest("trimmed", None, False, connector, fab, (Level.TOP,), tabs=2)
    one, other = (
        unary_union([i.outline.shape() for i in FAMILIES["plain"](dimensions, each).islands])
        for each in (request, replace(request, mirrored=True))
    )
    assert symmetric_difference(one, other).area < 1e-12


def test_loop_without_tabs_has_none_to_cut():
    dimensions = SHAPES["square"] | {"trace_width": TRACE}
    assert trim_tabs(dimensions) == ()
    (one,), (other,) = loop_copper(dimensions, GAP, tabs=0), loop_copper(dimensions, GAP)
    assert np.array_equal(one.vertices, other.vertices)


WRONG = {
    "tabs side by side": (loop("square", tab_spacing=WIDTH), "meet each other"),
    "tips meet on a bend": (loop("circle", tab_spacing=1.1 * WIDTH, tab_length=9 * MM), "meet each other"),
    "tabs of both sides": (loop("square", tab_length=42.1 * MM), "meet each other"),
    "upper tab in the gap": (loop("circle", tab_spacing=80 * MM), "meets the gap"),
    "tab beside the far side": (loop("rectangle", corner_radius=3 * MM, tab_spacing=31.5 * MM), "another part"),
    "tab in the second gap": (
        loop("square", second_gap=1 * MM, second_gap_position=91 * MM),
        "meets the gap at 91.00 mm",
    ),
}


@pytest.mark.parametrize("case", WRONG)
def test_tabs_that_meet_other_copper_are_refused(case):
    dimensions, says = WRONG[case]
    with pytest.raises(GeometryError, match=says):
        loop_copper(dimensions, GAP)


def test_tabs_clear_of_each_other_on_a_bend_by_little_are_drawn():
    # on a radius of 52 mm tips 12 mm inside are 40 / 52 as far apart as on the mean line, sides less by the turn
    least = WIDTH / (1.0 - (0.5 * TRACE + 9 * MM) / (52 * MM))
    assert len(loop_copper(loop("circle", tab_spacing=1.02 * least, tab_length=9 * MM), GAP)) == 1
    with pytest.raises(GeometryError, match="meet each other"):
        loop_copper(loop("circle", tab_spacing=0.98 * least, tab_length=9 * MM), GAP)


@pytest.mark.parametrize("length", [38.5, 40.3])
def test_tabs_that_reach_the_strips_are_refused(length):
    dimensions = SHAPES["square"] | {"trace_width": TRACE} | COPPER["coplanar"] | TABS | {"tab_length": length * MM}
    # the inner edge is 42 mm from the axis, strips reach 1.25 mm and pads 1.65 mm from it
    clear = length < 42.0 - 1.65
    if clear:
        board("coplanar", None, dimensions)
        return
    with pytest.raises(GeometryError, match="the strips"):
        board("coplanar", None, dimensions)


@pytest.mark.parametrize("tabs", [-1, 4])
def test_pairs_that_do_not_exist_are_refused(tabs):
    with pytest.raises(GeometryError, match="0 to 3"):
        loop_copper(loop("square"), GAP, tabs=tabs)

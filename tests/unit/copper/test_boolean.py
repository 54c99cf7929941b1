"""Union, difference and intersection with arcs against shapely on finely flattened copies.

Authority: shapely's own overlay (polygons only, so each side is within chord error times perimeter),
and inclusion-exclusion, area(A) + area(B) = area(A or B) + area(A and B), on the exact areas of arcs.
"""

from __future__ import annotations

import math
from collections.abc import Callable

import pytest
from hypothesis import assume, given, settings
from hypothesis import strategies as st
from shapely import symmetric_difference
from shapely.geometry import Point
from shapely.geometry.base import BaseGeometry
from shapely.ops import unary_union

from planar.copper.boolean import contains, difference, intersection, union, united
from planar.copper.outline import Outline
from planar.copper.path import band, loop_path
from planar.copper.shapes import circle, rectangle, rounded_rectangle, turned_rectangle
from planar.errors import GeometryError

MM = 1e-3
CHORD = 1e-6
STEADY = settings(derandomize=True, max_examples=60, deadline=None)
Operation = Callable[[Outline, Outline], tuple[Outline, ...]]
OPERATIONS: dict[str, Operation] = {"union": union, "difference": difference, "intersection": intersection}
NEAR = st.tuples(st.floats(-12 * MM, 12 * MM), st.floats(-12 * MM, 12 * MM))
LENGTH = st.floats(2 * MM, 25 * MM)


@st.composite
def rectangles(draw: st.DrawFn) -> Outline:
    angle = draw(st.floats(0.0, math.pi))
    return turned_rectangle(draw(NEAR), (math.cos(angle), math.sin(angle)), length=draw(LENGTH), width=draw(LENGTH))


@st.composite
def open_rings(draw: st.DrawFn) -> Outline:
    line = loop_path(24 * MM, 20 * MM, draw(st.floats(3 * MM, 10 * MM)))
    return band(line.between(draw(st.floats(0.2 * MM, 5 * MM)), line.length - 1 * MM), draw(st.floats(1 * MM, 4 * MM)))


@st.composite
def circles(draw: st.DrawFn) -> Outline:
    return circle(draw(NEAR), draw(LENGTH))


OUTLINES = st.one_of(rectangles(), circles(), open_rings())


def apart(first: BaseGeometry, second: BaseGeometry) -> float:
    """Area of the symmetric difference, m2; snapped to 0.1 nm, since shapely slips on edges that nearly coincide."""
    return float(symmetric_difference(first, second, grid_size=1e-10).area)


def tangent(first: BaseGeometry, second: BaseGeometry) -> bool:
    """Whether the borders touch somewhere without crossing: grown or shrunk a little, the meeting places are
    more or fewer."""
    grown = [second.buffer(step * 3.0 * CHORD) for step in (-1, 1)]
    moved = [first.exterior.intersection(each.exterior) for each in grown]
    return len({len(getattr(met, "geoms", [met] * (not met.is_empty))) for met in moved}) > 1


def agrees_with_shapely(name: str, first: Outline, second: Outline) -> None:
    """The result as shapely has it, or a refusal where shapely finds a hole or mere touching."""
    a, b = first.shape(CHORD), second.shape(CHORD)
    expected = getattr(a, name)(b)
    budget = 2.0 * CHORD * (first.perimeter + second.perimeter)
    try:
        found = OPERATIONS[name](first, second)
    except GeometryError:
        holed = any(part.interiors for part in getattr(expected, "geoms", [expected]))
        meeting = a.exterior.distance(b.exterior) <= 2.0 * CHORD
        touching = meeting and min(a.intersection(b).area, a.difference(b).area, b.difference(a).area) <= budget
        assert holed or touching or tangent(a, b)
        return
    shape = unary_union([outline.shape(CHORD) for outline in found])
    assert apart(shape, expected) <= budget
    assert all(outline.area > 0.0 for outline in found)


@pytest.mark.parametrize("name", OPERATIONS)
@STEADY
@given(first=OUTLINES, second=OUTLINES)
def test_random_outlines_as_shapely_has_them(name: str, first: Outline, second: Outline) -> None:
    agrees_with_shapely(name, first, second)


@pytest.mark.parametrize("name", OPERATIONS)
def test_a_circle_as_wide_as_the_rectangle_it_crosses(name: str) -> None:
    """It crosses two sides and touches the two others: refused, or right."""
    agrees_with_shapely(name, rectangle(-8 * MM, -4 * MM, 8 * MM, 4 * MM), circle((0.0, 0.0), 16 * MM))


def test_what_counts_as_tangent() -> None:
    """A disc in a strip as wide as it is touches both sides; one that sticks out crosses them, however it is nudged."""
    strip = rectangle(-8 * MM, -20 * MM, 8 * MM, 20 * MM).shape(CHORD)
    assert tangent(strip, circle((0.0, 0.0), 16 * MM).shape(CHORD))
    assert not tangent(strip, circle((0.0, 0.0), 18 * MM).shape(CHORD))


@STEADY
@given(OUTLINES, OUTLINES)
def test_inclusion_and_exclusion(first: Outline, second: Outline) -> None:
    try:
        joined, common = union(first, second), intersection(first, second)
        left = difference(first, second)
    except GeometryError:
        assume(False)
    total = first.area + second.area
    parts = [*joined, *common]
    assert math.fsum(part.area for part in parts) == pytest.approx(total, rel=1e-12)
    assert math.fsum(part.area for part in (*left, *common)) == pytest.approx(first.area, abs=1e-12 * total)


SQUARE = rectangle(0.0, 0.0, 10 * MM, 10 * MM)
SHARED = {
    "flush pad": rectangle(10 * MM, 2 * MM, 13 * MM, 6 * MM),
    "flush over a whole side": rectangle(10 * MM, 0.0, 13 * MM, 10 * MM),
    "corner on corner, inside": rectangle(0.0, 0.0, 4 * MM, 3 * MM),
    "the same": rectangle(0.0, 0.0, 10 * MM, 10 * MM),
    "overhanging along a side": rectangle(-2 * MM, 5 * MM, 12 * MM, 10 * MM),
    "half circle on a side": circle((5 * MM, 10 * MM), 4 * MM),
    "disc touching a side from within": circle((8 * MM, 5 * MM), 4 * MM),
    "rounded corners on three sides": rounded_rectangle(0.0, 0.0, 10 * MM, 12 * MM, radius=3 * MM),
}


@pytest.mark.parametrize("second", SHARED.values(), ids=SHARED)
@pytest.mark.parametrize("name", ["union", "intersection"])
def test_shared_edges(name: str, second: Outline) -> None:
    agrees_with_shapely(name, SQUARE, second)
    agrees_with_shapely(name, second, SQUARE)


def test_arcs_that_share_a_circle() -> None:
    """Two bands of one ring that overlap, and two that meet end to end: the ring's area is width times length."""
    line = loop_path(40 * MM, 40 * MM, 20 * MM)
    low, high = 0.1 * line.length, 0.8 * line.length
    whole = band(line.between(low, high), 3 * MM)
    for first, second in ((0.5, 0.4), (0.45, 0.45)):
        one, two = (
            band(line.between(a, b), 3 * MM) for a, b in ((low, first * line.length), (second * line.length, high))
        )
        (joined,) = union(one, two)
        assert joined.area == pytest.approx(3 * MM * (high - low), rel=1e-12)
        assert apart(joined.shape(CHORD), whole.shape(CHORD)) < 2 * CHORD * whole.perimeter


@pytest.mark.parametrize("end", [0.9 * MM, 3 * MM])
@pytest.mark.parametrize("radius", [8 * MM, 25 * MM, 52 * MM, 300 * MM])
def test_a_via_pad_as_wide_as_the_bent_line_it_ends(radius: float, end: float) -> None:
    """The pad's circle touches both sides of the line at its end corners without crossing them.

    Exact area: width times length, and half the pad beyond the end face.
    """
    line = loop_path(2 * radius, 2 * radius, radius)
    stub = line.between(0.0, 0.1 * line.length)
    pad = circle(stub.at(stub.length)[0], end)
    for first, second in ((band(stub, end), pad), (pad, band(stub, end))):
        (joined,) = union(first, second)
        assert joined.area == pytest.approx(end * stub.length + math.pi * end**2 / 8.0, rel=1e-9)


def test_contained_and_disjoint() -> None:
    inner, apart = circle((5 * MM, 5 * MM), 3 * MM), circle((30 * MM, 0.0), 3 * MM)
    assert [o.area for o in union(SQUARE, inner)] == pytest.approx([SQUARE.area])
    assert [o.area for o in intersection(SQUARE, inner)] == pytest.approx([inner.area])
    assert difference(inner, SQUARE) == ()
    assert sorted(o.area for o in union(SQUARE, apart)) == pytest.approx([apart.area, SQUARE.area])
    assert intersection(SQUARE, apart) == ()
    assert [o.area for o in difference(SQUARE, apart)] == pytest.approx([SQUARE.area])


def test_a_hole_is_refused() -> None:
    with pytest.raises(GeometryError, match="touch"):
        difference(SQUARE, circle((8 * MM, 5 * MM), 4 * MM))
    with pytest.raises(GeometryError, match="hole"):
        difference(SQUARE, circle((5 * MM, 5 * MM), 3 * MM))
    closing = rectangle(-1 * MM, 8 * MM, 1 * MM, 14 * MM)
    line = loop_path(24 * MM, 20 * MM, 5 * MM)
    with pytest.raises(GeometryError, match="hole"):
        union(band(line.between(0.5 * MM, line.length - 0.5 * MM), 3 * MM), closing)


@pytest.mark.parametrize(
    "second",
    [rectangle(10 * MM, 10 * MM, 12 * MM, 12 * MM), circle((12 * MM, 5 * MM), 4 * MM)],
    ids=["corner on corner", "disc on a side"],
)
def test_outlines_that_touch_in_a_point_stay_two_or_are_refused(second: Outline) -> None:
    """A point is no connection: never one outline that touches itself."""
    try:
        result = union(SQUARE, second)
    except GeometryError:
        return
    assert sorted(o.area for o in result) == pytest.approx([second.area, SQUARE.area])


@STEADY
@given(OUTLINES, NEAR)
def test_contains_as_shapely_has_it(outline: Outline, point: tuple[float, float]) -> None:
    shape = outline.shape(CHORD)
    assume(shape.exterior.distance(Point(point)) > 2 * CHORD)
    assert contains(outline, point) == shape.contains(Point(point))


def test_united_merges_chains_and_keeps_what_lies_apart() -> None:
    """A middle piece that joins two earlier ones: the order of the pieces does not matter."""
    left, right, middle = (rectangle(x * MM, 0.0, (x + 3) * MM, 2 * MM) for x in (0, 5, 2.5))
    apart = circle((20 * MM, 0.0), MM)
    islands = united([left, right, apart, middle])
    assert sorted(island.area for island in islands) == pytest.approx([apart.area, 16 * MM**2])

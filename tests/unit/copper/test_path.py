"""Centre lines and the copper along them, against plane geometry.

Authority: concentric arcs turn through equal angles, so copper along a smooth line has the area
width times length exactly; a mitred corner adds and takes the same triangle on either side.
"""

from __future__ import annotations

import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from shapely import LineString, symmetric_difference

from planar.copper.arc import Edge
from planar.copper.path import Path, band, loop_path, stepped_band
from planar.errors import GeometryError

MM = 1e-3
STEADY = settings(derandomize=True, max_examples=60, deadline=None)


@st.composite
def loops(draw: st.DrawFn) -> Path:
    width, height = draw(st.floats(20 * MM, 120 * MM)), draw(st.floats(20 * MM, 120 * MM))
    return loop_path(width, height, draw(st.floats(0.2, 1.0)) * 0.5 * min(width, height))


@STEADY
@given(loops(), st.floats(0.1 * MM, 3.9 * MM), st.floats(0.01, 0.4), st.floats(0.5, 0.99))
def test_copper_along_a_smooth_line_has_area_width_times_length(
    line: Path, width: float, first: float, last: float
) -> None:
    part = line.between(first * line.length, last * line.length)
    copper = band(part, width)
    assert copper.area == pytest.approx(width * (last - first) * line.length, rel=1e-11)
    assert copper.perimeter == pytest.approx(2.0 * (part.length + width), rel=0.7)
    copper.normalised()


@STEADY
@given(loops(), st.floats(-1.9 * MM, 1.9 * MM))
def test_offset_arcs_are_concentric(line: Path, distance: float) -> None:
    """The loop runs counter-clockwise: left is inward, every radius shrinks by the distance, no centre moves."""
    for edge, moved in zip(line.edges, line.offset(distance), strict=True):
        if edge.bulge:
            assert moved.centre == pytest.approx(edge.centre, abs=1e-12)
            assert moved.radius == pytest.approx(edge.radius - distance, rel=1e-9)
        else:
            assert moved.length == pytest.approx(edge.length, abs=1e-15)


@STEADY
@given(loops(), st.floats(0.05, 0.4), st.floats(0.45, 0.95))
def test_parts_and_reversal_keep_length(line: Path, first: float, last: float) -> None:
    low, high = first * line.length, last * line.length
    part = line.between(low, high)
    assert part.length == pytest.approx(high - low, rel=1e-11)
    assert part.at(0.0)[0] == pytest.approx(line.at(low)[0], abs=1e-14)
    assert part.reversed().at(0.0)[0] == pytest.approx(line.at(high)[0], abs=1e-14)
    whole = line.between(0.0, low).followed_by(part)
    assert whole.length == pytest.approx(high, rel=1e-11)


def test_position_and_direction_on_a_loop() -> None:
    """Counter-clockwise from the middle of the top: left, down, right, up."""
    line = loop_path(40 * MM, 20 * MM, 4 * MM)
    assert line.length == pytest.approx((120 - (8 - 2 * math.pi) * 4) * MM, rel=1e-13)
    quarter = line.length / 4.0
    for share, point, along in (
        (0, (0.0, 10), (-1, 0)), (1, (-20, 0), (0, -1)), (2, (0, -10), (1, 0)), (3, (20, 0), (0, 1)),
    ):  # fmt: skip
        place, tangent = line.at(share * quarter)
        assert np.array(place) / MM == pytest.approx(point, abs=1e-9)
        assert tangent == pytest.approx(along, abs=1e-12)


@pytest.mark.parametrize("turn", [30.0, 90.0, -60.0, 120.0])
def test_corners_are_mitred(turn: float) -> None:
    """Both offset lines meet on the bisector; shapely draws the same with its mitre join."""
    bend = 10 * MM, 0.0
    end = bend[0] + 8 * MM * math.cos(math.radians(turn)), 8 * MM * math.sin(math.radians(turn))
    path = Path((Edge((0.0, 0.0), bend), Edge(bend, end)))
    copper = band(path, 2 * MM)
    expected = LineString([(0.0, 0.0), bend, end]).buffer(1 * MM, cap_style="flat", join_style="mitre")
    assert symmetric_difference(copper.shape(), expected, grid_size=1e-12).area < 1e-9 * copper.area
    assert copper.area == pytest.approx(2 * MM * path.length, rel=1e-12)


def test_widths_change_in_steps() -> None:
    """Sharp-cornered loop: area is the sum over sections, ends are square."""
    line = loop_path(40 * MM, 40 * MM, 8 * MM)
    ends = [0.0, 20 * MM, 45 * MM, 60 * MM]
    widths = [3 * MM, 0.25 * MM, 1 * MM]
    sections = [(line.between(a, b), w) for a, b, w in zip(ends, ends[1:], widths, strict=False)]
    copper = stepped_band(sections)
    assert copper.area == pytest.approx((3 * 20 + 0.25 * 25 + 15) * MM**2, rel=1e-12)
    copper.normalised()


def test_steps_of_equal_width_leave_no_trace() -> None:
    line = loop_path(40 * MM, 40 * MM, 20 * MM)
    split = stepped_band([(line.between(0.0, 20 * MM), MM), (line.between(20 * MM, 50 * MM), MM)])
    whole = band(line.between(0.0, 50 * MM), MM)
    assert symmetric_difference(split.shape(), whole.shape(), grid_size=1e-10).area < 3e-6 * whole.perimeter
    assert len(split.normalised()) <= len(whole.normalised()) + 2


def test_a_bend_too_tight_for_its_copper_is_refused() -> None:
    line = loop_path(40 * MM, 40 * MM, 2 * MM)
    assert band(line.between(MM, 100 * MM), 3.9 * MM).area > 0.0
    with pytest.raises(GeometryError, match=r"radius 2\.000 mm is too tight"):
        band(line.between(MM, 100 * MM), 4.1 * MM)


def test_an_arc_does_not_end_in_a_corner() -> None:
    arc, stray = Edge((0.0, 0.0), (2 * MM, 0.0), 1.0), Edge((2 * MM, 0.0), (9 * MM, 0.0))
    with pytest.raises(GeometryError, match="only straight edges"):
        band(Path((arc, stray)), 0.2 * MM)


@pytest.mark.parametrize("radius", [-1 * MM, 11 * MM])
def test_a_corner_radius_that_does_not_fit_is_refused(radius: float) -> None:
    with pytest.raises(GeometryError, match="does not fit"):
        loop_path(40 * MM, 20 * MM, radius)


@pytest.mark.parametrize(("first", "last"), [(-1 * MM, 5 * MM), (5 * MM, 5 * MM), (0.0, 1.0)])
def test_a_part_beyond_the_line_is_refused(first: float, last: float) -> None:
    with pytest.raises(GeometryError, match="no path from"):
        loop_path(40 * MM, 20 * MM, 5 * MM).between(first, last)

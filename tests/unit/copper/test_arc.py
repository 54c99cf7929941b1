"""One edge against the plane geometry of a circle, computed here through centre and angles."""

from __future__ import annotations

import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from planar.copper.arc import Edge

STEADY = settings(derandomize=True, max_examples=80, deadline=None)
Made = tuple[Edge, tuple[float, float], float, float, float]
"""An edge, and the centre, radius, first angle and turn it was made from."""


@st.composite
def arcs(draw: st.DrawFn) -> Made:
    """An arc made from its centre, radius, first angle and turn; radii of 0.1 mm to 0.2 m."""
    centre = draw(st.tuples(st.floats(-0.1, 0.1), st.floats(-0.1, 0.1)))
    radius, first = draw(st.floats(1e-4, 0.2)), draw(st.floats(-math.pi, math.pi))
    turn = draw(st.floats(0.01, 1.9 * math.pi)) * draw(st.sampled_from([1.0, -1.0]))
    start, end = ((centre[0] + radius * math.cos(a), centre[1] + radius * math.sin(a)) for a in (first, first + turn))
    return Edge(start, end, math.tan(turn / 4.0)), centre, radius, first, turn


@STEADY
@given(arcs(), st.floats(0.0, 1.0))
def test_an_arc_is_its_circle(made: Made, fraction: float) -> None:
    edge, centre, radius, first, turn = made
    assert edge.angle == pytest.approx(turn, rel=1e-12)
    assert edge.radius == pytest.approx(radius, rel=1e-8)
    assert edge.centre == pytest.approx(centre, abs=1e-8 * radius + 1e-11)
    assert edge.length == pytest.approx(radius * abs(turn), rel=1e-8)
    there = first + fraction * turn
    expected = centre[0] + radius * math.cos(there), centre[1] + radius * math.sin(there)
    assert edge.point(fraction) == pytest.approx(expected, abs=1e-11)
    ahead = math.copysign(1.0, turn)
    assert edge.tangent(fraction) == pytest.approx((-ahead * math.sin(there), ahead * math.cos(there)), abs=1e-8)
    assert edge.fraction_of(expected) == pytest.approx(fraction, abs=1e-7)


@STEADY
@given(arcs())
def test_segment_area_is_that_of_the_circle_segment(made: Made) -> None:
    """r^2 (turn - sin turn) / 2, signed with the turn; that cancels for small turns, hence the absolute part."""
    edge, _, radius, _, turn = made
    exact = 0.5 * radius**2 * (turn - math.sin(turn))
    assert edge.segment_area == pytest.approx(exact, rel=1e-7, abs=1e-10 * radius**2)


@pytest.mark.parametrize("bulge", [9.99e-4, 1.001e-3, 1e-6, -9.99e-4])
def test_segment_area_of_flat_arcs(bulge: float) -> None:
    """Power series of the exact expression, chord^2 (b/3 + b^3/15 - ...), on both sides of the switch."""
    assert Edge((0.0, 0.0), (1.0, 0.0), bulge).segment_area == pytest.approx(bulge / 3 + bulge**3 / 15, rel=1e-9)


@STEADY
@given(arcs(), st.floats(0.05, 0.45), st.floats(0.55, 0.95))
def test_parts_make_the_whole(made: Made, first: float, last: float) -> None:
    edge, _, radius, _, _ = made
    parts = [edge.part(0.0, first), edge.part(first, last), edge.part(last, 1.0)]
    assert math.fsum(part.length for part in parts) == pytest.approx(edge.length, rel=1e-8)
    assert all(part.radius == pytest.approx(radius, rel=1e-6) for part in parts)
    back = edge.reversed()
    assert back.length == edge.length
    assert back.point(0.25) == pytest.approx(edge.point(0.75), abs=1e-11)


@STEADY
@given(arcs())
def test_extremes_bound_the_arc(made: Made) -> None:
    edge, _, radius, _, _ = made
    corners = np.array(edge.extremes())
    points = np.array([edge.point(f) for f in np.linspace(0.0, 1.0, 2001)])
    for bound, reached in ((corners.min(0), points.min(0)), (corners.max(0), points.max(0))):
        assert bound == pytest.approx(reached, abs=1e-5 * radius)


def test_a_segment_is_straight() -> None:
    edge = Edge((1.0, 1.0), (4.0, 5.0))
    assert (edge.chord, edge.length, edge.angle, edge.radius) == (5.0, 5.0, 0.0, math.inf)
    assert edge.point(0.5) == (2.5, 3.0)
    assert edge.tangent(0.3) == pytest.approx((0.6, 0.8), rel=1e-15)
    assert edge.fraction_of((5.5, 7.0)) == pytest.approx(1.5, rel=1e-15)

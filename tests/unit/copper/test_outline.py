"""Outlines against exact geometry: invariants, order of convergence, and the one normal form.

Authority: plane geometry (areas of circles, rings and rounded rectangles; invariance under motions;
a chord's sagitta is quadratic in its length, so area error is linear in the chord error allowed).
"""

from __future__ import annotations

import itertools
import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from shapely import symmetric_difference

from planar.copper.boolean import difference, intersection, union
from planar.copper.outline import GRID, SHORTEST_ARC, Outline
from planar.copper.path import band, loop_path
from planar.copper.shapes import capsule, circle, rectangle, rounded_rectangle
from planar.errors import GeometryError

MM = 1e-3
STEADY = settings(derandomize=True, max_examples=40, deadline=None)
PLACE = st.tuples(st.floats(-80 * MM, 80 * MM), st.floats(-80 * MM, 80 * MM))
ANGLE = st.floats(-math.pi, math.pi)


@st.composite
def circles(draw: st.DrawFn) -> Outline:
    return circle(draw(PLACE), draw(st.floats(0.2 * MM, 150 * MM)))


@st.composite
def rounded_rectangles(draw: st.DrawFn) -> Outline:
    x, y = draw(PLACE)
    width, height = draw(st.floats(1 * MM, 90 * MM)), draw(st.floats(1 * MM, 90 * MM))
    radius = draw(st.floats(0.01, 0.49)) * min(width, height)
    return rounded_rectangle(x, y, x + width, y + height, radius=radius).rotated(draw(ANGLE))


@st.composite
def bands(draw: st.DrawFn) -> Outline:
    """A ring with a gap, sometimes nearly closed."""
    width, height = draw(st.floats(20 * MM, 90 * MM)), draw(st.floats(20 * MM, 90 * MM))
    radius = draw(st.floats(0.2, 0.99)) * 0.5 * min(width, height)
    line = loop_path(width, height, radius)
    first = draw(st.floats(0.1 * MM, 0.3 * line.length))
    last = draw(st.floats(0.6, 0.999)) * line.length
    return band(line.between(first, last), draw(st.floats(0.2 * MM, 1.9 * MM))).rotated(draw(ANGLE))


@st.composite
def capsules(draw: st.DrawFn) -> Outline:
    (x, y), angle, length = draw(PLACE), draw(ANGLE), draw(st.floats(0.1 * MM, 20 * MM))
    return capsule((x, y), (x + length * math.cos(angle), y + length * math.sin(angle)), draw(st.floats(0.1 * MM, MM)))


OUTLINES = st.one_of(circles(), rounded_rectangles(), bands(), capsules())


def test_closed_forms() -> None:
    """Circle, rounded rectangle and stroke with round ends: area and perimeter of school geometry."""
    disc = circle((3 * MM, -2 * MM), 10 * MM)
    assert disc.area == pytest.approx(math.pi * (5 * MM) ** 2, rel=1e-14)
    assert disc.perimeter == pytest.approx(math.pi * 10 * MM, rel=1e-14)
    assert disc.bounds == pytest.approx((-2 * MM, -7 * MM, 8 * MM, 3 * MM), abs=1e-17)
    plate = rounded_rectangle(0.0, 0.0, 40 * MM, 30 * MM, radius=5 * MM)
    assert plate.area == pytest.approx((1200 - (4 - math.pi) * 25) * MM**2, rel=1e-14)
    assert plate.perimeter == pytest.approx((140 - (8 - 2 * math.pi) * 5) * MM, rel=1e-14)
    stroke = capsule((0.0, 0.0), (6 * MM, 8 * MM), 2 * MM)
    assert stroke.area == pytest.approx((20 + math.pi) * MM**2, rel=1e-13)


@STEADY
@given(OUTLINES, ANGLE, PLACE)
def test_motions_keep_area_and_perimeter(outline: Outline, angle: float, move: tuple[float, float]) -> None:
    """A rigid motion keeps both; a mirror image too, since its sense of rotation is kept."""
    for moved in (outline.rotated(angle), outline.translated(*move), outline.mirrored()):
        assert moved.area == pytest.approx(outline.area, rel=1e-11)
        assert moved.perimeter == pytest.approx(outline.perimeter, rel=1e-11)
    assert outline.reversed().area == pytest.approx(-outline.area, rel=1e-12)


@STEADY
@given(OUTLINES)
def test_mirroring_twice_is_the_outline_itself(outline: Outline) -> None:
    again = outline.mirrored().mirrored().shape(1e-5)
    assert symmetric_difference(again, outline.shape(1e-5), grid_size=1e-12).area <= 1e-9 * outline.area


@STEADY
@given(OUTLINES)
def test_flattened_points_lie_on_the_outline_within_the_chord_error(outline: Outline) -> None:
    """No polygon is further off in area than chord error times perimeter."""
    for chord_error in (1e-4, 1e-6):
        polygon = outline.shape(chord_error)
        assert abs(polygon.area - outline.area) <= chord_error * outline.perimeter
        assert polygon.length <= outline.perimeter * (1.0 + 1e-12)


@STEADY
@given(st.one_of(circles(), rounded_rectangles()))
def test_flattening_converges_in_first_order_of_the_chord_error(outline: Outline) -> None:
    """Area error of inscribed chords is 2/3 of the sagitta times length: four times less for a quarter of it.

    The number of chords is whole, so the ratio is exact only in the limit.
    """
    finest = 2e-4 * min(edge.radius for edge in outline.edges if edge.bulge)
    errors = [outline.area - outline.shape(finest / 4**i).area for i in range(3)]
    ratios = [coarse / fine for coarse, fine in itertools.pairwise(errors)]
    assert ratios == pytest.approx([4.0, 4.0], rel=0.12)


@STEADY
@given(OUTLINES)
def test_bounds_contain_the_outline_and_are_tight(outline: Outline) -> None:
    points = outline.flattened(1e-7)
    x0, y0, x1, y1 = outline.bounds
    low, high = points.min(axis=0), points.max(axis=0)
    assert np.all(low >= np.array([x0, y0]) - 1e-15)
    assert np.all(high <= np.array([x1, y1]) + 1e-15)
    assert [*low, *high] == pytest.approx([x0, y0, x1, y1], abs=1.1e-7)


@STEADY
@given(OUTLINES)
def test_normal_form_is_reached_once(outline: Outline) -> None:
    """Byte-equal the second time, on the grid, counter-clockwise, no arc above a half circle, area kept."""
    once = outline.normalised()
    assert once.normalised().vertices.tobytes() == once.vertices.tobytes()
    steps = once.vertices[:, :2] / GRID
    assert np.max(np.abs(steps - np.round(steps))) < 1e-6
    assert np.max(np.abs(once.vertices[:, 2])) <= 1.0
    # each vertex moves by at most 0.71 nm, and dropped arcs are shorter than 2 um
    assert once.area == pytest.approx(abs(outline.area), abs=1e-9 * outline.perimeter + len(outline) * SHORTEST_ARC**2)
    assert all(edge.chord > 0.0 for edge in once.edges)


@STEADY
@given(rounded_rectangles(), circles())
def test_normal_form_is_reached_once_after_booleans(first: Outline, second: Outline) -> None:
    for operation in (union, difference, intersection):
        try:
            results = operation(first, second)
        except GeometryError:  # a hole, refused
            continue
        for result in results:
            once = result.normalised()
            assert once.normalised().vertices.tobytes() == once.vertices.tobytes()


def test_an_arc_above_half_a_circle_is_split() -> None:
    """Three quarters of a circle of radius 10 mm and its chord: area 3/4 pi r^2 + r^2 / 2."""
    r = 10 * MM
    pac = Outline(np.array([[r, 0.0, math.tan(1.5 * math.pi / 4.0)], [0.0, -r, 0.0]]))
    split = pac.normalised()
    assert len(split) == 3
    assert np.max(np.abs(split.vertices[:, 2])) <= 1.0
    for outline in (pac, split):
        assert outline.area == pytest.approx((0.75 * math.pi + 0.5) * r * r, rel=1e-6)


def test_an_arc_shorter_than_two_microns_becomes_a_chord() -> None:
    short, long = (rounded_rectangle(0.0, 0.0, MM, MM, radius=r).normalised() for r in (1.2e-6, 1.4e-6))
    assert np.count_nonzero(short.vertices[:, 2]) == 0  # quarter circles of 1.9 um
    assert np.count_nonzero(long.vertices[:, 2]) == 4  # and of 2.2 um
    assert len(short) == len(long) == 8


def test_clockwise_is_turned_round() -> None:
    ring = circle((0.0, 0.0), 4 * MM)
    assert ring.reversed().area < 0.0
    assert ring.reversed().normalised().area == pytest.approx(ring.area, rel=1e-9)


def test_a_tiny_circle_stays_a_polygon() -> None:
    """Two half circles of which each is within the chord error of its chord: still no line."""
    speck = circle((0.0, 0.0), 2e-6)
    assert len(speck.flattened(1e-6)) == 4
    assert speck.normalised().area == pytest.approx(math.pi * 1e-12, rel=1e-2)


def test_edges_of_no_length_are_dropped() -> None:
    corners = [(0.0, 0.0), (MM, 0.0), (MM + 0.3e-9, 0.2e-9), (MM, MM), (0.0, MM), (0.0, MM)]
    assert len(Outline.polygon(corners).normalised()) == 4


@pytest.mark.parametrize(
    "corners",
    [
        [(0.0, 0.0), (2.0, 2.0), (2.0, 0.0), (0.0, 2.0)],  # crosses itself
        [(0.0, 0.0), (4.0, 0.0), (4.0, 2.0), (2.0, 0.0), (0.0, 2.0)],  # a corner touches a side
        [(0.0, 0.0), (2.0, 0.0), (1.0, 1.0), (2.0, 2.0), (0.0, 2.0), (1.0, 1.0)],  # two corners meet
    ],
    ids=["crossing", "touching a side", "touching a corner"],
)
def test_touching_itself_is_refused(corners: list[tuple[float, float]]) -> None:
    outline = Outline.polygon(np.array(corners) * MM)
    with pytest.raises(GeometryError, match=r"touches itself|no area"):
        outline.normalised()


@pytest.mark.parametrize(
    ("corners", "message"),
    [
        ([(0.0, 0.0), (MM, 0.0), (2 * MM, 0.0)], "no area"),
        ([(0.0, 0.0), (0.2e-9, 0.0), (0.2e-9, 0.2e-9)], "vanishes"),
    ],
)
def test_what_encloses_nothing_is_refused(corners: list[tuple[float, float]], message: str) -> None:
    with pytest.raises(GeometryError, match=message):
        Outline.polygon(corners).normalised()


@pytest.mark.parametrize(
    ("vertices", "message"),
    [
        (np.zeros((3, 2)), "rows of x, y, bulge"),
        (np.zeros((1, 3)), "rows of x, y, bulge"),
        (np.array([[0.0, 0.0, 0.0], [math.nan, 0.0, 0.0], [0.0, 1.0, 0.0]]), "not finite"),
        (np.array([[0.0, 0.0, 0.0], [1.0, 0.0, math.inf], [0.0, 1.0, 0.0]]), "not finite"),
    ],
)
def test_malformed_vertices_are_refused(vertices: np.ndarray, message: str) -> None:
    with pytest.raises(GeometryError, match=message):
        Outline(vertices)


def test_vertices_cannot_be_changed() -> None:
    rows = np.array([[0.0, 0.0, 0.0], [MM, 0.0, 0.0], [0.0, MM, 0.0]])
    outline = Outline(rows)
    rows[0, 0] = 7.0
    assert outline.vertices[0, 0] == 0.0
    with pytest.raises(ValueError, match="read-only"):
        outline.vertices[0, 0] = 1.0


def test_a_square_stays_a_square() -> None:
    assert rectangle(MM, 2 * MM, 0.0, 0.0).normalised().vertices.tolist() == [
        [0.0, 0.0, 0.0], [MM, 0.0, 0.0], [MM, 2 * MM, 0.0], [0.0, 2 * MM, 0.0],
    ]  # fmt: skip

"""The layout record: nets from what touches what, and refusals. Small boards drawn by hand."""

from __future__ import annotations

from dataclasses import replace

import pytest

from planar.copper.layout import Hole, Island, Layout, Level, Pad, Role
from planar.copper.outline import Outline
from planar.copper.shapes import circle, rectangle
from planar.errors import GeometryError

MM = 1e-3


def square(x: float, y: float, side: float = 2.0) -> Outline:
    return rectangle(x * MM, y * MM, (x + side) * MM, (y + side) * MM)


TWO_LEVELS = Layout(
    name="nets",
    levels=(Level.TOP, Level.BOTTOM),
    islands=(
        Island(Level.TOP, square(0, 0), Role.LINE),
        Island(Level.TOP, square(4, 0), Role.GROUND),
        Island(Level.BOTTOM, square(0, 0, 8), Role.RADIATOR),
        Island(Level.BOTTOM, square(10, 0), Role.RADIATOR),
        Island(Level.BOTTOM, square(14, 0), Role.RADIATOR),
    ),
    holes=(Hole((5 * MM, 1 * MM), 0.3 * MM, True, "via"),),
    pads=(Pad("P", Level.TOP, square(0, 0), "signal"), Pad("G", Level.TOP, square(4, 0), "return")),
    ports=(),
    mask_openings=(),
    legend=(),
    edge=square(-2, -2, 22),
    keepout=(),
)


def test_plated_holes_join_levels_and_the_rest_floats() -> None:
    layout = TWO_LEVELS.snapped()
    assert [island.net for island in layout.islands] == ["SIGNAL", "RETURN", "RETURN", "ELEMENT1", "ELEMENT2"]
    assert layout.holes[0].net == "RETURN"
    assert [pad.net for pad in layout.pads] == ["SIGNAL", "RETURN"]
    assert not layout.dc_short


def test_a_second_via_makes_the_short() -> None:
    via = Hole((1 * MM, 1 * MM), 0.3 * MM, True, "via")
    layout = replace(TWO_LEVELS, holes=(*TWO_LEVELS.holes, via)).snapped()
    assert [island.net for island in layout.islands[:3]] == ["ANT"] * 3
    assert layout.dc_short


def test_an_unplated_hole_joins_nothing() -> None:
    hole = Hole((1 * MM, 1 * MM), 0.3 * MM, False, "mounting")
    layout = replace(TWO_LEVELS, holes=(*TWO_LEVELS.holes, hole)).snapped()
    assert not layout.dc_short
    assert layout.holes[1].net == ""


def test_copper_off_the_grid_is_put_on_it() -> None:
    moved = replace(TWO_LEVELS, holes=(Hole((5.000_000_4 * MM, 1 * MM), 0.3 * MM, True, "via"),))
    assert moved.snapped().holes[0].centre[0] == pytest.approx(5 * MM, abs=1e-15)


def test_areas_and_bounds() -> None:
    layout = TWO_LEVELS.snapped()
    assert layout.area(Level.TOP) == pytest.approx(8 * MM**2, rel=1e-12)
    assert layout.area(Level.BOTTOM) == pytest.approx(72 * MM**2, rel=1e-12)
    assert layout.copper_bounds == pytest.approx((0.0, 0.0, 16 * MM, 8 * MM), abs=1e-15)
    assert layout.size == pytest.approx((22 * MM, 22 * MM), rel=1e-12)


def test_a_pad_or_plated_hole_without_copper_is_refused() -> None:
    stray = Pad("S", Level.TOP, circle((12 * MM, 12 * MM), MM), "signal")
    with pytest.raises(GeometryError, match="pad S has no copper"):
        replace(TWO_LEVELS, pads=(stray,)).snapped()
    hole = Hole((15 * MM, 12 * MM), 0.3 * MM, True, "via")
    with pytest.raises(GeometryError, match="meets no copper"):
        replace(TWO_LEVELS, holes=(hole,)).snapped()

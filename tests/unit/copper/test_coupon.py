"""The measuring board as copper: nets, lengths, mask, legend and refusals."""

import itertools
import math
from dataclasses import replace

import pytest
from shapely.geometry import Point
from shapely.ops import unary_union

from planar.copper.coupon import CouponRequest, coupon_layout
from planar.copper.coupon_parts import staple_path
from planar.copper.layout import Kind, Layout, Level
from planar.copper.lettering import lettered
from planar.copper.path import band
from planar.errors import SynthesisError
from planar.library import Library

LIBRARY = Library.open()
MM = 1e-3
DRAWN = {
    "line_width": 3 * MM, "ring_width": 3 * MM, "ring_slit": 0.2 * MM, "trace_width": 2.5 * MM, "bend_radius": 4.5 * MM,
    "mask_clearance": 2.4 * MM, "rise": 7.5 * MM, "launch_pitch": 12 * MM, "launch_depth": 4.5 * MM,
    "ground_margin": 0.5 * MM, "via_drill": 0.3 * MM, "via_ring": 0.15 * MM, "short_span": 14 * MM,
    "long_span": 60 * MM, "short_length": (6 + 14 + (math.pi - 2) * 4.5) * MM,
    "long_length": (6 + 60 + (math.pi - 2) * 4.5) * MM, "ring_radius": 20 * MM, "ring_gap": 0.5 * MM,
    "ring_row": 41 * MM, "trace_row": 70 * MM, "board_width": 100 * MM, "board_height": 78 * MM,
}  # fmt: skip
"""Written here, no sizing: rough dimensions for 1.6 mm."""


@pytest.fixture(scope="module")
def request_() -> CouponRequest:
    levels = (Level.TOP, Level.BOTTOM)
    return CouponRequest("test", LIBRARY.connector("edge-coax"), LIBRARY.fab("pool-two-layer"), levels, 55.0)


@pytest.fixture(scope="module")
def layout(request_: CouponRequest) -> Layout:
    return coupon_layout(DRAWN, request_)


def test_nets_are_what_hangs_together(layout: Layout) -> None:
    """Every pad lies on copper of its net; every via joins ground to ground; each net but ground is one island."""
    assert layout.kind is Kind.COUPON
    for pad in layout.pads:
        under = [i for i in layout.islands if i.level == pad.level and i.outline.shape().covers(pad.outline.shape())]
        assert [i.net for i in under] == [pad.net], pad.name
    for hole in layout.holes:
        for level in layout.levels:
            under = [i for i in layout.islands if i.level == level and i.outline.shape().contains(Point(hole.centre))]
            assert [i.net for i in under] == ["GROUND"] == [hole.net]
    nets = [island.net for island in layout.islands if island.net != "GROUND"]
    assert sorted(nets) == ["LOAD", "LONG_LINE", "OPEN", "RING", "RING_IN", "RING_OUT", "SHORT_LINE", "TRACE"]
    ends = {net: {pad.part for pad in layout.pads if pad.net == net} for net in nets}
    assert ends["LONG_LINE"] == {"J1", "J5"}
    assert ends["LOAD"] == {"J4", "R1", "R2"}
    assert ends["RING"] == set()


def test_launches_are_alike(layout: Layout) -> None:
    """Each connector has the same lands in number and size, so that launches cancel."""
    sizes = {}
    for part in {pad.part for pad in layout.pads if pad.part.startswith("J")}:
        pads = [pad for pad in layout.pads if pad.part == part]
        sizes[part] = sorted((pad.name, round(pad.outline.area * 1e12), pad.level.value) for pad in pads)
    assert len(sizes) == 11
    assert all(each == sizes["J1"] for each in sizes.values())


@pytest.mark.parametrize(("span", "name"), [(14 * MM, "short"), (60 * MM, "long")])
def test_length_of_a_line_is_that_of_its_middle(span: float, name: str) -> None:
    """Two straights, two quarter circles, one span; copper area is length times width for any smooth band (Pappus)."""
    path = staple_path((0.0, 0.0), (span, 0.0), DRAWN["rise"], DRAWN["bend_radius"])
    assert path.length == pytest.approx(DRAWN[f"{name}_length"], rel=1e-12)
    assert band(path, 3 * MM).area == pytest.approx(3 * MM * DRAWN[f"{name}_length"], rel=1e-12)


def test_lines_differ_by_one_straight_piece(layout: Layout) -> None:
    area = {island.net: island.outline.area for island in layout.islands}
    extra = DRAWN["long_length"] - DRAWN["short_length"]
    assert area["LONG_LINE"] - area["SHORT_LINE"] == pytest.approx(extra * DRAWN["line_width"], rel=1e-6)


def test_ring_and_gaps_are_as_drawn(layout: Layout) -> None:
    """Area of the annulus less its slit; both feeds a gap away."""
    shapes = {island.net: island.outline.shape() for island in layout.islands if island.net != "GROUND"}
    whole = 2.0 * math.pi * DRAWN["ring_radius"] * DRAWN["ring_width"] - DRAWN["ring_slit"] * DRAWN["ring_width"]
    area = next(island.outline.area for island in layout.islands if island.net == "RING")
    assert area == pytest.approx(whole, rel=1e-4)
    for feed in ("RING_IN", "RING_OUT"):
        # the slit faces the first feed, so the nearest copper is a little beside its axis
        assert shapes[feed].distance(shapes["RING"]) == pytest.approx(DRAWN["ring_gap"], abs=2e-6)


def test_bare_lines_and_masked_trace(layout: Layout) -> None:
    """No mask over ring, feeds and lines nor beside them; the impedance trace is covered but for its lands."""
    top = unary_union([o.outline.shape() for o in layout.mask_openings if o.level is Level.TOP])
    shapes = {island.net: island.outline.shape() for island in layout.islands if island.net != "GROUND"}
    for net in ("RING", "LONG_LINE", "SHORT_LINE", "RING_IN", "RING_OUT"):
        assert shapes[net].difference(top).area < 1e-12, net
    assert top.covers(shapes["RING"].buffer(0.99 * DRAWN["mask_clearance"]))
    lands = sum(pad.outline.area for pad in layout.pads if pad.net == "TRACE")
    assert shapes["TRACE"].intersection(top).area == pytest.approx(lands, rel=0.1)
    for level in layout.levels:
        openings = [o.outline.shape() for o in layout.mask_openings if o.level is level]
        assert all(not a.intersects(b) for a, b in itertools.combinations(openings, 2))


def test_every_land_is_open(layout: Layout) -> None:
    for pad in layout.pads:
        openings = unary_union([o.outline.shape() for o in layout.mask_openings if o.level is pad.level])
        assert openings.covers(pad.outline.shape()), pad


def test_legend_is_complete_and_clear(layout: Layout) -> None:
    """As many strokes as all the texts have: none was dropped; bottom text on the bottom."""
    texts = {
        Level.TOP: [
            *(f"J{i}" for i in range(1, 12)), "OPEN", "SHORT", "LOAD 2X100", "LONG LINE", "71.14 MM", "SHORT LINE",
            "25.14 MM", "RING", "MEAN R 20.00 MM", "IMPEDANCE TRACE 55.0 OHM, WIDTH 2.50 MM", "TEST COUPON TOP",
        ],
        Level.BOTTOM: ["TEST COUPON", "BOTTOM, GROUND PLANE"],
    }  # fmt: skip
    for level, lines in texts.items():
        strokes = sum(len(lettered(line, (0.0, 0.0), 2 * MM, stroke=0.2 * MM)) for line in lines)
        assert len([m for m in layout.legend if m.level is level]) == strokes


def test_everything_is_on_the_grid(layout: Layout) -> None:
    for outline in (layout.edge, *(i.outline for i in layout.islands), *(p.outline for p in layout.pads)):
        assert abs(outline.vertices[:, :2] / 1e-9 - (outline.vertices[:, :2] / 1e-9).round()).max() < 1e-3


def test_one_level_is_refused(request_: CouponRequest) -> None:
    fab = LIBRARY.fab("milled-single-sided")
    with pytest.raises(SynthesisError, match="a fab that makes two copper levels"):
        coupon_layout(DRAWN, replace(request_, fab=fab))


def test_pads_without_a_coax_are_refused(request_: CouponRequest) -> None:
    with pytest.raises(SynthesisError, match="a coax connector"):
        coupon_layout(DRAWN, replace(request_, connector=LIBRARY.connector("bare-pads")))


def test_no_mask_no_openings(request_: CouponRequest) -> None:
    assert coupon_layout(DRAWN, replace(request_, masked=())).mask_openings == ()

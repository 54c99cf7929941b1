"""The board round every family's drawing: nets, origin, edge, keepout, mask and legend.

Authority: the design notes (origin at the feed, mirror symmetry, what is joined at direct current),
the land pattern's and the fab's own numbers; shapes are measured with shapely.
"""

from __future__ import annotations

from dataclasses import replace

import pytest
from shapely import LineString, box, symmetric_difference
from shapely.geometry import Point
from shapely.ops import unary_union

from planar.copper.board import CORRIDOR, FEED_CLEARANCE, MARGIN, PlannedBoard, edge_box, plan_board
from planar.copper.drawing import Drawing, DrawingRequest
from planar.copper.layout import Layout, Level, Role, bounds_of
from planar.copper.rules import fab_findings

MM = 1e-3
Case = tuple[str, str, str, str | None, bool]


def nets(layout: Layout, role: Role) -> list[str]:
    return sorted(island.net for island in layout.islands if island.role is role)


def test_nets_say_what_is_joined_at_direct_current(layout: Layout, case: Case) -> None:
    """An uncut loop joins both terminals unless a line ends open over it; a second gap parts them again."""
    family, _, polarisation, end, _ = case
    cut = polarisation == "circular"
    loop = {
        (None, False): ["ANT"], (None, True): ["RETURN", "SIGNAL"], ("via", False): ["ANT"],
        ("via", True): ["RETURN", "SIGNAL"], ("open", False): ["RETURN"], ("open", True): ["ELEMENT1", "RETURN"],
    }  # fmt: skip
    assert nets(layout, Role.RADIATOR) == loop[(end, cut)]
    assert layout.dc_short == (not cut and end != "open")
    if family == "ring-guided":
        joined = end == "via" and not cut
        assert nets(layout, Role.LINE) == ["ANT" if joined else "SIGNAL"]
        assert set(nets(layout, Role.GROUND)) == {"ANT" if joined else "RETURN"}


def test_holes_and_pads_carry_the_net_of_their_copper(layout: Layout) -> None:
    for hole in layout.holes:
        around = {i.net for i in layout.islands if i.outline.shape().contains(Point(hole.centre))}
        assert {hole.net} == (around if hole.plated else {""})
        assert len(around) == int(hole.plated)
    for pad in layout.pads:
        middle = pad.outline.shape().centroid
        under = [i.net for i in layout.islands if i.level is pad.level and i.outline.shape().contains(middle)]
        assert under == [pad.net]


def test_origin_is_the_feed(layout: Layout, family: str) -> None:
    """Balanced: the pads lie evenly about it. Coax: the signal land begins there, symmetric to the axis."""
    assert layout.ports[0].centre == (0.0, 0.0)
    boxes = {pad.terminal: pad.outline.bounds for pad in layout.pads if pad.level is Level.TOP}
    if family == "ring-guided":
        x0, _, x1, y1 = boxes["signal"]
        assert (x0 + x1, y1) == pytest.approx((0.0, 0.0), abs=2e-9)
    else:
        (a0, a1, a2, a3), (b0, b1, b2, b3) = boxes["signal"], boxes["return"]
        assert (a0, a2) == pytest.approx((-b2, -b0), abs=2e-9)
        assert a0 > 0.0
        assert (a1, a3) == pytest.approx((b1, b3), abs=2e-9)
        assert a1 < 0.0 < a3


def test_edge_lies_where_margin_and_connector_put_it(layout: Layout, family: str, asked: DrawingRequest) -> None:
    x0, y0, x1, y1 = layout.copper_bounds
    bottom = y0 - MARGIN if asked.connector.edge_distance is None else -asked.connector.edge_distance
    assert layout.edge.bounds == pytest.approx((x0 - MARGIN, bottom, x1 + MARGIN, y1 + MARGIN), abs=2e-9)
    if family == "ring-guided":
        assert layout.edge.bounds[1] == pytest.approx(-4.5 * MM, abs=1e-9)


def test_keepout_is_the_board_less_the_way_to_the_feed(layout: Layout, family: str, asked: DrawingRequest) -> None:
    """At the rim a corridor to the nearest edge, inside the loop a pocket; both clear of pads and connector body."""
    keepout, board = unary_union([outline.shape() for outline in layout.keepout]), layout.edge.shape()
    body = asked.connector.body
    boxes = [pad.outline.bounds for pad in layout.pads]
    reach = max(abs(x) for x0, _, x1, _ in boxes for x in (x0, x1))
    half = max(0.5 * CORRIDOR, reach, 0.5 * body.size[1] if body else 0.0) + FEED_CLEARANCE
    low, high = layout.edge.bounds[1], layout.edge.bounds[3]
    if family == "coplanar":
        lowest, highest = min(y for _, y, _, _ in boxes), max(y for *_, y in boxes)
        tall = max(highest - lowest, CORRIDOR) + 2.0 * FEED_CLEARANCE
        free = box(-half, -0.5 * tall, half, 0.5 * tall)
    else:
        free = box(-half, 0.0, half, high) if family == "plain" else box(-half, low, half, 0.0)
    assert symmetric_difference(keepout, board.difference(free), grid_size=1e-9).area < 2e-6 * board.length
    assert all(outline.shape().is_valid for outline in layout.keepout)


def test_legend_is_on_the_board_and_clear_of_openings_and_holes(layout: Layout) -> None:
    assert layout.legend
    board = layout.edge.shape()
    for level in layout.levels:
        ink = unary_union([m.outline.shape() for m in layout.legend if m.level is level])
        bare = [m.outline.shape() for m in layout.mask_openings if m.level is level]
        drilled = [Point(h.centre).buffer(0.5 * h.diameter) for h in layout.holes]
        assert board.contains(ink)
        assert unary_union([*bare, *drilled]).distance(ink) >= 0.09 * MM


def test_openings_uncover_every_pad_and_unplated_hole_and_leave_vias_covered(
    layout: Layout, asked: DrawingRequest
) -> None:
    grow = asked.fab.mask_expansion
    for level in asked.masked:
        bare = unary_union([m.outline.shape() for m in layout.mask_openings if m.level is level])
        for pad in (p for p in layout.pads if p.level is level):
            x0, y0, x1, y1 = pad.outline.bounds
            middle = LineString([(x0, 0.5 * (y0 + y1)), (x1, 0.5 * (y0 + y1))])
            assert bare.buffer(1e-6).contains(middle)
        for hole in layout.holes:
            if not hole.plated:
                assert bare.contains(Point(hole.centre).buffer(0.5 * hole.diameter + 0.98 * grow))


def test_four_mounting_holes_clear_of_copper(planned: PlannedBoard, asked: DrawingRequest) -> None:
    mounting = [h for h in planned.layout.holes if h.purpose == "mounting"]
    assert len(mounting) == 4
    assert planned.findings == ()
    metal = unary_union([i.outline.shape() for i in planned.layout.islands])
    for hole in mounting:
        assert hole.diameter == 3.2 * MM  # M3 on a board above 60 mm
        assert metal.distance(Point(hole.centre)) >= 0.5 * hole.diameter + 0.99 * MM


def test_the_fab_can_make_it(layout: Layout, asked: DrawingRequest) -> None:
    """Only the price step is said of a board above 100 mm."""
    assert {finding.rule for finding in fab_findings(layout, asked.fab)} <= {"price step"}


def test_planning_twice_gives_the_same_bytes(drawing: Drawing, asked: DrawingRequest, layout: Layout) -> None:
    again = plan_board(drawing, asked, asked.masked).layout
    for one, two in zip(again.islands, layout.islands, strict=True):
        assert one.outline.vertices.tobytes() == two.outline.vertices.tobytes()
    assert again.holes == layout.holes


def test_the_margin_gives_way_to_the_size_limit_but_not_to_the_rules(drawing: Drawing, asked: DrawingRequest) -> None:
    """Down to copper-to-edge plus the outline's tolerance, 0.45 mm at this fab."""
    moved = drawing.translated(-drawing.feed[0], -drawing.feed[1])
    x0, y0, x1, y1 = bounds_of(island.outline for island in moved.islands)
    lower = asked.connector.edge_distance
    for spare, margin in ((4 * MM, 2 * MM), (0.2 * MM, 0.45 * MM), (40 * MM, MARGIN)):
        height = y1 - y0 + spare if lower is None else y1 + lower + 0.5 * spare
        left, bottom, right, top = edge_box(moved, replace(asked, size_limit=(x1 - x0 + spare, height)))
        assert (right - x1, x0 - left, top - y1) == pytest.approx((margin, margin, margin), abs=1e-12)
        assert bottom == pytest.approx(y0 - margin if lower is None else -lower, abs=1e-12)

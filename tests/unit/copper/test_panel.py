"""Panels planned from boards drawn without a field solution.

Authority: the demands on a panel (explicit copies, rails, tabs away from copper), the fab's own numbers, hand
calculation where a comment shows it, and plane geometry measured with shapely.
"""

from __future__ import annotations

import math
from dataclasses import replace
from itertools import combinations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from numpy.typing import NDArray
from shapely import box, symmetric_difference
from shapely.geometry import LineString, Point
from shapely.geometry.base import BaseGeometry
from shapely.ops import unary_union

from planar.copper.board import plan_board
from planar.copper.drawing import DrawingRequest
from planar.copper.families import FAMILIES
from planar.copper.layout import Hole, Island, Kind, Layout, Level, Role
from planar.copper.outline import Outline
from planar.copper.panel import PanelRequest, PlannedPanel, connector_box, plan_panel
from planar.copper.panel_copies import column_letters
from planar.copper.shapes import circle, rectangle, rounded_rectangle
from planar.errors import Severity, SynthesisError
from planar.library import Fab, Library

MM = 1e-3
NM = 1e-9
LIBRARY = Library.open()
POOL = LIBRARY.fab("pool-two-layer")
MILLED = LIBRARY.fab("milled-single-sided")
EDGE_COAX = LIBRARY.connector("edge-coax")
ONE, TWO = (Level.TOP,), (Level.TOP, Level.BOTTOM)


def drawn(family: str, dimensions: dict[str, float], levels: tuple[Level, ...], fab: Fab = POOL) -> Layout:
    connector = EDGE_COAX if family == "ring-guided" else LIBRARY.connector("bare-pads")
    request = DrawingRequest(
        "demo", "via" if family == "ring-guided" else None, False, connector, fab, levels if fab.mask else ()
    )
    return plan_board(FAMILIES[family](dimensions, request), request, levels).layout


PLAIN_SIZES = {"corner_radius": 8 * MM, "trace_width": 3 * MM, "gap": 2 * MM, "pad_length": 2 * MM}
PLAIN = drawn("plain", {"loop_width": 60 * MM} | PLAIN_SIZES, ONE)
"""69 by 69 mm: the loop's 60 mm, half a trace and 3 mm of margin on each side. No copper near the edge."""
RING = drawn(
    "ring-guided",
    {
        "loop_width": 90 * MM, "corner_radius": 12 * MM, "trace_width": 8 * MM, "gap": 2 * MM, "feed_length": 6 * MM,
        "line_width": 3 * MM, "transformer_width": 0.25 * MM, "transformer_length": 40 * MM, "end_width": 0.9 * MM,
        "end_length": 2.5 * MM, "via_drill": 0.3 * MM, "via_ring": 0.3 * MM,
    },
    TWO,
)  # fmt: skip
"""Two levels, an edge connector in the middle of the lower side with lands 0.3 mm off the edge."""
BOARDS = {"plain": (PLAIN, None), "ring": (RING, connector_box(EDGE_COAX))}


def asked(board: Layout, **changes: object) -> PanelRequest:
    body = connector_box(EDGE_COAX) if board is RING else None
    request = PanelRequest("orchard", "A", "1a2b3c4d5e6f7081", 1.6 * MM, board.levels, body=body)
    return replace(request, **changes)  # type: ignore[arg-type]


def planned(
    board: Layout, count: tuple[int, int] | None, separation: str | None = None, fab: Fab = POOL
) -> PlannedPanel:
    return plan_panel(board, fab, asked(board, count=count, separation=separation))


TABBED = planned(RING, (3, 2))
SCORED = planned(PLAIN, (3, 2))


def shapes(outlines: tuple[Outline, ...]) -> list[BaseGeometry]:
    return [outline.shape() for outline in outlines]


def disc(hole: Hole) -> BaseGeometry:
    return Point(hole.centre).buffer(0.5 * hole.diameter, quad_segs=64)


def whole(outline: Outline) -> NDArray[np.int64]:
    found = np.rint(outline.vertices[:, :2] / NM)
    assert np.array_equal(found * NM, outline.vertices[:, :2])  # on the grid already, not brought there by rounding
    return found.astype(np.int64)


def rails(panel: PlannedPanel) -> BaseGeometry:
    """The frame round the boards and slots, 7 mm on each side without a coupon."""
    width, height = panel.layout.size
    return box(0, 0, width, height) - box(7 * MM, 7 * MM, width - 7 * MM, height - 7 * MM)


class TestSize:
    """By hand: rails of 7 mm, boards of 69 mm, slots of twice the router's radius of 1 mm; a panel of 457 by 610 mm
    less 25 mm on each side is 407 by 560 mm."""

    def test_scored_boards_lie_edge_to_edge(self) -> None:
        assert SCORED.separation == "score"
        assert SCORED.layout.size == pytest.approx((14 * MM + 3 * 69 * MM, 14 * MM + 2 * 69 * MM), abs=NM)
        assert SCORED.spacing == 0.0

    def test_routed_boards_lie_a_router_apart(self) -> None:
        panel = planned(PLAIN, (3, 2), "tabs")
        assert panel.layout.size == pytest.approx(
            (14 * MM + 3 * 69 * MM + 4 * 2 * MM, 14 * MM + 2 * 69 * MM + 3 * 2 * MM), abs=NM
        )
        assert panel.spacing == pytest.approx(2 * MM)

    def test_fit(self) -> None:
        """(407 - 14) / 69 = 5.7 and (560 - 14) / 69 = 7.9 scored; (407 - 16) / 71 = 5.5, (560 - 16) / 71 = 7.7."""
        for separation in ("score", "tabs"):
            panel = planned(PLAIN, None, separation)
            assert (panel.columns, panel.rows, panel.boards_per_fab_panel) == (5, 7, 35)
        assert panel.used_share == pytest.approx(35 * PLAIN.edge.area / (0.457 * 0.610), rel=1e-12)

    def test_fit_turns_the_board_where_that_holds_more(self) -> None:
        """60 by 90 mm, scored: 6 x 6 = 36 upright (393 / 60, 546 / 90), 4 x 9 = 36 turned; on 380 by 560 mm 6 x 6 and
        4 x 9 again; at 50 by 130 mm 7 x 4 = 28 upright, 3 x 10 = 30 turned."""
        blank = replace(PLAIN, edge=rectangle(-25 * MM, -65 * MM, 25 * MM, 65 * MM), islands=(), pads=(), holes=())
        panel = planned(replace(blank, ports=(), mask_openings=(), legend=(), keepout=()), None, "score")
        assert (panel.columns, panel.rows, panel.turned) == (3, 10, True)
        assert panel.layout.size == pytest.approx((404 * MM, 514 * MM), abs=NM)

    def test_panels_per_fab_panel(self) -> None:
        """221 by 152 mm: one beside the other needs 2 mm between. 407 / 223 = 1.8, 562 / 154 = 3.6: 3 upright;
        409 / 154 = 2.6, 562 / 223 = 2.5: 4 turned."""
        assert SCORED.arrays_per_fab_panel == 4
        assert SCORED.boards_per_fab_panel == 24

    def test_count_beyond_the_panel_is_refused_with_what_fits(self) -> None:
        with pytest.raises(SynthesisError, match="at most 5 x 7 boards"):
            planned(PLAIN, (9, 9), "score")
        assert planned(PLAIN, (7, 5), "score").boards == 35  # the panel may lie turned

    def test_columns_go_on_after_z(self) -> None:
        assert [column_letters(i) for i in (0, 25, 26, 27, 51, 52)] == ["A", "Z", "AA", "AB", "AZ", "BA"]


class TestCopies:
    @pytest.mark.parametrize("turned", [False, True])
    def test_a_copy_is_the_board_to_the_nanometre(self, turned: bool) -> None:
        """Put back by whole nanometres (and the exact quarter turn) every vertex is the board's; so is every bulge."""
        panel = planned(RING, None) if turned else TABBED
        assert panel.turned == turned
        count = len(RING.islands)
        for i in range(panel.boards):
            copy = panel.layout.islands[i * count : (i + 1) * count]
            moves = set()
            for island, original in zip(copy, RING.islands, strict=True):
                here, there = whole(island.outline), whole(original.outline)
                there = np.column_stack([-there[:, 1], there[:, 0]]) if turned else there
                moves |= {tuple(move) for move in (here - there).tolist()}
                assert np.array_equal(island.outline.vertices[:, 2], original.outline.vertices[:, 2])
                assert (island.level, island.role) == (original.level, original.role)
            assert len(moves) == 1

    def test_everything_of_a_board_moves_with_it(self) -> None:
        dx, dy = (np.array(TABBED.layout.ports[4].centre) - RING.ports[0].centre).tolist()  # B2
        for name in ("pads", "mask_openings", "legend"):
            many, single = getattr(TABBED.layout, name), getattr(RING, name)
            for a, b in zip(many[4 * len(single) : 5 * len(single)], single, strict=True):
                assert np.allclose(a.outline.vertices, b.outline.translated(dx, dy).vertices, atol=NM / 10, rtol=0)
        count = len(RING.holes)
        for hole, single in zip(TABBED.layout.holes[4 * count : 5 * count], RING.holes, strict=True):
            assert np.allclose(hole.centre, np.add(single.centre, (dx, dy)), atol=NM / 10, rtol=0)
            assert (hole.diameter, hole.plated, hole.purpose) == (single.diameter, single.plated, single.purpose)
        one = unary_union(shapes(RING.keepout[:])).area
        assert unary_union(shapes(TABBED.layout.keepout)).area == pytest.approx(6 * one, rel=1e-9)

    def test_nets_and_parts_are_each_boards_own(self) -> None:
        assert TABBED.places == ("A1", "B1", "C1", "A2", "B2", "C2")
        by_part: dict[str, set[str]] = {}
        for pad in TABBED.layout.pads:
            by_part.setdefault(pad.part, set()).add(pad.net)
        assert by_part == {f"ANT{i}": {f"ANT_{place}"} for i, place in enumerate(TABBED.places, start=1)}
        nets = {i.net for i in TABBED.layout.islands if i.role not in (Role.FIDUCIAL, Role.MARK)}
        assert nets == {f"{i.net}_{place}" for i in RING.islands for place in TABBED.places}
        assert {hole.net for hole in TABBED.layout.holes if not hole.plated} == {""}

    def test_places_are_counted_from_the_lower_left(self) -> None:
        (a1, b1, _, a2, _, _) = [port.centre for port in TABBED.layout.ports]
        assert b1[0] > a1[0]
        assert b1[1] == a1[1]
        assert a2[1] > a1[1]
        assert a2[0] == a1[0]

    def test_boards_are_the_copies_edges(self) -> None:
        assert TABBED.layout.kind is Kind.ARRAY
        assert TABBED.layout.edge.bounds[:2] == (0.0, 0.0)
        assert [edge.area for edge in TABBED.layout.boards] == pytest.approx([RING.edge.area] * 6, rel=1e-12)
        square = SCORED.layout.boards[0]
        assert len(square) == 4
        assert [f.rule for f in SCORED.findings] == ["corners"]


class TestScore:
    def test_lines_run_along_every_edge_from_edge_to_edge(self) -> None:
        width, height = SCORED.layout.size
        lines = [LineString([score.start, score.end]) for score in SCORED.layout.scores]
        assert len(lines) == 4 + 3
        assert {round(line.length, 9) for line in lines} == {round(width, 9), round(height, 9)}
        edges = unary_union([shape.exterior for shape in shapes(SCORED.layout.boards)])
        assert unary_union(lines).buffer(NM).covers(edges)
        assert SCORED.layout.cutouts == ()

    def test_web_is_a_third_of_the_thickness(self) -> None:
        """Common practice, no source."""
        assert SCORED.score_web == pytest.approx(1 / 3, rel=2e-3)
        assert (TABBED.score_web, SCORED.tab_width, TABBED.tab_width) == (None, None, pytest.approx(3.7 * MM))

    def test_lands_near_the_edge_ask_for_tabs(self) -> None:
        """The connector's lands are 0.3 mm from the routed edge, a score line needs 0.5 mm."""
        assert TABBED.separation == "tabs"
        reason = TABBED.findings[0]
        assert (reason.rule, reason.got, reason.limit) == ("copper to score", "0.3 mm", "0.5 mm")
        assert reason.severity is Severity.NOTE
        with pytest.raises(SynthesisError, match="ask for tabs"):
            planned(RING, (3, 2), "score")

    @pytest.mark.parametrize("gap", [0.5, 0.4999])
    def test_each_side_is_measured(self, gap: float) -> None:
        for turn in range(4):
            strip = (
                rectangle(-30 * MM, -34.5 * MM + gap * MM, 30 * MM, -33 * MM).rotated(turn * math.pi / 2).normalised()
            )
            board = replace(PLAIN, islands=(Island(Level.TOP, strip, Role.GROUND, "G"),), edge=square_edge())
            assert planned(board, (2, 2)).separation == ("score" if gap == 0.5 else "tabs")

    def test_thin_boards_and_small_panels_are_routed(self) -> None:
        """0.8 mm and 70 by 70 mm are the fab's least."""
        assert plan_panel(PLAIN, POOL, asked(PLAIN, count=(2, 2), thickness=0.79 * MM)).separation == "tabs"
        assert plan_panel(PLAIN, POOL, asked(PLAIN, count=(2, 2), thickness=0.8 * MM)).separation == "score"
        small = drawn("plain", {"loop_width": 20 * MM} | PLAIN_SIZES, ONE)
        assert [planned(small, (n, n)).separation for n in (1, 2)] == ["tabs", "score"]  # 43 mm, 72 mm


def square_edge() -> Outline:
    return rectangle(-34.5 * MM, -34.5 * MM, 34.5 * MM, 34.5 * MM)


def check_slots(panel: PlannedPanel, board: Layout) -> None:
    """Slots, tabs and boards share the opening in the frame between them, and nothing is lost or doubled."""
    layout = panel.layout
    width, height = layout.size
    slots, boards, tabs = (shapes(each) for each in (layout.cutouts, layout.boards, panel.tabs))
    assert all(slot.is_valid for slot in slots)
    assert min((a.distance(b) for a, b in combinations(slots, 2)), default=1.0) > 3.6 * MM  # a tab is 3.7 mm at least
    opening = rounded_rectangle(7 * MM, 7 * MM, width - 7 * MM, height - 7 * MM, radius=POOL.edge_radius).shape()
    left = opening - unary_union(slots) - unary_union(boards)
    # what is left are the tabs with the feet that the round ends of the slots give them: 2 r^2 (1 - pi / 4) each side
    feet = 2 * 2 * POOL.edge_radius**2 * (1 - math.pi / 4)
    expected = len(tabs) * (3.7 * MM * 2 * MM + feet)
    assert left.area == pytest.approx(expected, rel=1e-3)
    assert left.buffer(NM).covers(unary_union(tabs))
    copper = unary_union([island.outline.shape() for island in layout.islands])
    edge = board.edge.shape().exterior
    nearest = min(edge.distance(i.outline.shape()) for i in board.islands)  # a slot comes no nearer than the edge did
    assert unary_union(slots).distance(copper) >= min(nearest, POOL.copper_to_score) - 2e-6
    assert unary_union(slots).intersection(unary_union(boards)).area < 1e-12


class TestTabs:
    def test_slots(self) -> None:
        check_slots(TABBED, RING)

    def test_slots_follow_the_boards_corners(self) -> None:
        """Where slots cross, four boards' corners of 2 mm stand round the crossing."""
        crossing = (TABBED.layout.boards[0].bounds[2] + 1 * MM, TABBED.layout.boards[0].bounds[3] + 1 * MM)
        (slot,) = [s for s in shapes(TABBED.layout.cutouts) if s.contains(Point(crossing))]
        around = Point(crossing).buffer(3 * MM, quad_segs=256)
        boards = unary_union(shapes(TABBED.layout.boards))
        assert symmetric_difference(slot & around, around - boards).area < 1e-10

    def test_every_board_is_held_on_every_side_and_only_by_tabs(self) -> None:
        """With the tabs sawn through all boards fall out; with them the panel is one piece."""
        material = TABBED.layout.edge.shape() - unary_union(shapes(TABBED.layout.cutouts))
        assert material.geom_type == "Polygon"
        sawn = material - unary_union([tab.buffer(1.1 * MM) for tab in shapes(TABBED.tabs)])
        assert sum(part.area > 0.5 * RING.edge.area for part in sawn.geoms) == 6 + 1
        for board in shapes(TABBED.layout.boards):
            assert sum(tab.distance(board) < NM for tab in shapes(TABBED.tabs)) == 8

    def test_tabs_keep_away_from_copper(self) -> None:
        copper = unary_union(
            [i.outline.shape() for i in TABBED.layout.islands if i.role not in (Role.FIDUCIAL, Role.MARK)]
        )
        holes = unary_union([disc(hole) for hole in TABBED.layout.holes if hole.purpose == "perforation"])
        assert holes.distance(copper) >= POOL.copper_to_routed_edge
        # The loop keeps 3 mm from the sides, the lands 0.3 mm; the loop bends away at the corners, where tabs stand.
        assert unary_union(shapes(TABBED.tabs)).distance(copper) > 4 * MM

    def test_tabs_avoid_the_connectors_body(self) -> None:
        """With bare copper nowhere else, the free middle of the lower side is the body's."""
        lands = tuple(Island(Level.TOP, circle((x, 0.0), 20 * MM), Role.GROUND, "G") for x in (-24 * MM, 24 * MM))
        board = replace(PLAIN, islands=lands, holes=(), edge=square_edge().translated(0.0, 24 * MM))
        free = plan_panel(board, POOL, asked(board, count=(1, 1), separation="tabs"))
        body = (-4 * MM, -20 * MM, 4 * MM, -5 * MM)
        blocked = plan_panel(board, POOL, asked(board, count=(1, 1), separation="tabs", body=body))
        x, y, _, _ = blocked.layout.boards[0].bounds
        middle = box(x + 34.5 * MM - 4 * MM, y - 2 * MM, x + 34.5 * MM + 4 * MM, y)
        assert any(tab.intersects(middle) for tab in shapes(free.tabs))
        assert min(tab.distance(middle) for tab in shapes(blocked.tabs)) >= 1 * MM
        assert "connector overhang" in [f.rule for f in blocked.findings]

    def test_overhang_is_told_with_its_reach(self) -> None:
        """The edge connector reaches 10 mm beyond the edge (its file), the slot is 2 mm wide."""
        (finding,) = [f for f in TABBED.findings if f.rule == "connector overhang"]
        assert finding.got == "10 mm beyond the lower edge"
        assert "after separating" in finding.advice

    def test_perforations_stand_on_the_break_line_inside_the_tab(self) -> None:
        holes = [hole for hole in TABBED.layout.holes if hole.purpose == "perforation"]
        boards = unary_union(shapes(TABBED.layout.boards))
        edges = boards.boundary
        slots, tabs = unary_union(shapes(TABBED.layout.cutouts)), shapes(TABBED.tabs)
        rows = sum(sum(tab.distance(board) < NM for board in shapes(TABBED.layout.boards)) for tab in tabs)
        assert len(holes) == 5 * rows
        assert {(round(hole.diameter, 9), hole.plated) for hole in holes} == {(0.5e-3, False)}
        for hole in holes:
            assert edges.distance(Point(hole.centre)) == pytest.approx(0.125 * MM)  # a quarter of the hole
            assert boards.distance(Point(hole.centre)) == pytest.approx(0.125 * MM)  # outside the board
            assert slots.distance(disc(hole)) >= 0.25 * MM
            assert min(tab.distance(Point(hole.centre)) for tab in tabs) < 0.5 * MM
        near = min(math.dist(a.centre, b.centre) for a, b in combinations(holes[:60], 2))
        assert near == pytest.approx(0.8 * MM)

    def test_weak_perforation_is_refused_with_the_width_that_works(self) -> None:
        """By hand: the last hole stands 1.6 mm from the tab's middle and 0.875 mm below the slot's, whose end of 1 mm
        radius it must miss by 0.25 mm and its own 0.25 mm: half the neck is sqrt(1.5^2 - 0.875^2) - 1 + 1.6 = 1.818 mm.
        """
        assert POOL.panelling is not None
        narrow = replace(POOL, panelling=replace(POOL.panelling, tab_width=2.8 * MM))
        with pytest.raises(SynthesisError, match=r"at least 3\.64 mm in panelling.tab_width"):
            planned(RING, (1, 1), "tabs", narrow)
        right = replace(POOL, panelling=replace(POOL.panelling, tab_width=3.64 * MM))
        assert planned(RING, (1, 1), "tabs", right).boards == 1
        dense = replace(POOL, panelling=replace(POOL.panelling, perforation_pitch=0.7 * MM))
        with pytest.raises(SynthesisError, match=r"a pitch of 0\.75 mm"):
            planned(RING, (1, 1), "tabs", dense)

    def test_copper_along_every_edge_leaves_no_place(self) -> None:
        ring = rectangle(-34.1 * MM, -34.1 * MM, 34.1 * MM, 34.1 * MM)
        board = replace(PLAIN, islands=(Island(Level.TOP, ring, Role.GROUND, "G"),), edge=square_edge())
        with pytest.raises(SynthesisError, match="no place for tabs"):
            planned(board, (1, 1), "tabs")  # 0.4 mm from copper to the edge, 0.5 mm are needed

    def test_two_tabs_on_two_opposite_sides_are_enough(self) -> None:
        """Copper 0.4 mm from the left and right edges: tabs below and above only."""
        sides = tuple(
            Island(
                Level.TOP, rectangle(x * MM, -34 * MM, (x - math.copysign(2, x)) * MM, 34 * MM), Role.GROUND, f"G{x}"
            )
            for x in (-34.1, 34.1)
        )
        board = replace(PLAIN, islands=sides, holes=(), edge=square_edge())
        panel = planned(board, (2, 2), "tabs")
        tabs = shapes(panel.tabs)
        assert len(tabs) == 2 * 2 * 3
        assert all(tab.bounds[2] - tab.bounds[0] > 3 * MM for tab in tabs)
        check = [slot.is_valid and slot.geom_type == "Polygon" for slot in shapes(panel.layout.cutouts)]
        assert all(check)


class TestRails:
    @pytest.mark.parametrize("panel", [SCORED, TABBED, planned(PLAIN, None, "tabs")], ids=["scored", "routed", "full"])
    def test_everything_lies_on_the_rails_and_apart(self, panel: PlannedPanel) -> None:
        layout, frame = panel.layout, rails(panel)
        copper = [i for i in layout.islands if i.role in (Role.FIDUCIAL, Role.MARK) and i.level is Level.TOP]
        tooling = [disc(hole) for hole in layout.holes if hole.purpose == "tooling"]
        discs = [island.outline.shape() for island in copper]
        scores = unary_union([LineString([s.start, s.end]) for s in layout.scores])
        lettering = [
            m.outline.shape() for m in layout.legend if frame.covers(m.outline.shape()) and m.level is Level.TOP
        ]
        assert len(lettering) > 20
        assert all(frame.covers(shape) for shape in (*tooling, *discs))
        assert all(a.distance(b) >= 1 * MM for a, b in combinations([*tooling, *discs], 2))
        assert all(frame.boundary.distance(shape) >= POOL.copper_to_routed_edge for shape in discs)
        assert all(layout.edge.shape().exterior.distance(hole) >= POOL.hole_to_edge for hole in tooling)
        text = unary_union(lettering)
        assert min(text.distance(shape) for shape in (*tooling, *discs)) >= 0.3 * MM
        if layout.scores:
            assert all(scores.distance(shape) >= POOL.copper_to_score for shape in (*discs, *tooling, text))

    @pytest.mark.parametrize("count", [(1, 1), (2, 2), (3, 2)])
    @pytest.mark.parametrize("purpose", ["tooling", "fiducial"])
    def test_turned_or_mirrored_panels_show(self, count: tuple[int, int], purpose: str) -> None:
        """None of the seven other ways to lay the panel brings three holes (or fiducials) onto three holes."""
        panel = planned(PLAIN, count, "tabs")
        layout = panel.layout
        places = [h.centre for h in layout.holes if h.purpose == purpose]
        if purpose == "fiducial":
            discs = [i.outline for i in layout.islands if i.role is Role.FIDUCIAL and i.level is Level.TOP]
            places = [tuple(disc.shape().centroid.coords[0]) for disc in discs]
        assert len(places) == 3
        here = np.array(places) - 0.5 * np.array(layout.size)
        for flip in (False, True):
            for turn in range(4):
                there = here * (-1, 1) if flip else here
                for _ in range(turn):
                    there = np.column_stack([-there[:, 1], there[:, 0]])
                off = max(np.min(np.hypot(*(here - place).T)) for place in there)
                assert (off > 2 * MM) == (flip or turn > 0)

    def test_fiducials_are_bare_on_each_level(self) -> None:
        layout = TABBED.layout
        for level in TWO:
            discs = [i.outline for i in layout.islands if i.role is Role.FIDUCIAL and i.level is level]
            assert [disc.area for disc in discs] == pytest.approx([math.pi * (0.5 * MM) ** 2] * 3, rel=1e-6)
            openings = unary_union([m.outline.shape() for m in layout.mask_openings if m.level is level])
            for fiducial in discs:
                around = fiducial.shape().centroid.buffer(0.99 * MM)
                assert openings.covers(around)

    def test_one_bare_mark_per_board_in_their_order(self) -> None:
        marks = [i for i in TABBED.layout.islands if i.role is Role.MARK]
        assert {mark.level for mark in marks} == {Level.TOP}
        middles = [mark.outline.shape().centroid for mark in marks]
        assert len(middles) == TABBED.boards
        assert [m.x for m in middles] == sorted(m.x for m in middles)
        openings = unary_union([m.outline.shape() for m in TABBED.layout.mask_openings if m.level is Level.TOP])
        assert all(openings.covers(mark.outline.shape()) for mark in marks)

    def test_marks_go_round_the_rails_where_there_are_many(self) -> None:
        small = drawn("plain", {"loop_width": 20 * MM} | PLAIN_SIZES, ONE)
        panel = planned(small, (13, 18), "score")
        marks = [i.outline.shape().centroid for i in panel.layout.islands if i.role is Role.MARK]
        assert len(marks) == 234
        width, height = panel.layout.size
        assert {m.y < 7 * MM for m in marks} == {True, False}
        first = [m.x for m in marks if m.y < 7 * MM]
        assert first == sorted(first)
        assert len({(round(m.x, 9), round(m.y, 9)) for m in marks}) == len(marks)
        assert all(rails(panel).covers(m) for m in marks)
        assert max(m.x for m in marks) > width - 7 * MM
        assert max(m.y for m in marks) > height - 7 * MM

    def test_bottom_text_is_mirrored_and_says_bottom(self) -> None:
        frame = rails(TABBED)
        strokes = {
            level: [m.outline for m in TABBED.layout.legend if m.level is level and frame.covers(m.outline.shape())]
            for level in TWO
        }
        # BOTTOM has three letters more than TOP; mirrored, the text's first letter O is at its right end
        bottom = unary_union(shapes(tuple(strokes[Level.BOTTOM])))
        right = [o for o in strokes[Level.BOTTOM] if o.bounds[2] > bottom.bounds[2] - 1.4 * MM]
        assert len(right) == 8  # the eight strokes of the O
        assert bottom.bounds[3] - bottom.bounds[1] == pytest.approx(2 * MM, rel=0.01)

    def test_rail_too_narrow_is_told(self) -> None:
        assert POOL.panelling is not None
        narrow = replace(POOL, panelling=replace(POOL.panelling, rail_width=3 * MM))
        panel = planned(PLAIN, (2, 2), "tabs", narrow)
        assert {f.rule for f in panel.findings} >= {"tooling holes"}
        assert not any(hole.purpose == "tooling" for hole in panel.layout.holes)


class TestCoupon:
    COUPON = replace(drawn("plain", {"loop_width": 30 * MM} | PLAIN_SIZES, ONE), name="coupon", kind=Kind.COUPON)

    @pytest.mark.parametrize("separation", ["score", "tabs"])
    def test_it_lies_above_the_boards_routed_all_round(self, separation: str) -> None:
        """By hand: 39 mm of coupon, 2 mm of slot on both sides, 5 mm of web above the boards."""
        plain = planned(PLAIN, (2, 1), separation)
        panel = plan_panel(PLAIN, POOL, asked(PLAIN, count=(2, 1), separation=separation, coupon=self.COUPON))
        grown = np.array(panel.layout.size) - plain.layout.size
        assert grown == pytest.approx((0.0, (39 + 4 + 5) * MM), abs=NM)
        assert panel.coupon is not None
        coupon = panel.coupon.shape()
        assert panel.boards == len(panel.layout.boards) == 2
        assert all(coupon.distance(board) >= 7 * MM - NM for board in shapes(panel.layout.boards))
        lines = [LineString([s.start, s.end]) for s in panel.layout.scores]
        slots = unary_union(shapes(panel.layout.cutouts))
        assert all(line.distance(slots) >= 1 * MM for line in lines)
        assert {pad.part for pad in panel.layout.pads} == {"ANT1", "ANT2", "CPN1"}
        assert {pad.net for pad in panel.layout.pads if pad.part == "CPN1"} == {"ANT_CPN"}

    def test_too_wide_for_the_strip(self) -> None:
        wide = drawn("plain", {"loop_width": 70 * MM} | PLAIN_SIZES, ONE)
        panel = plan_panel(PLAIN, POOL, asked(PLAIN, count=(2, 1), coupon=wide))
        assert panel.separation == "tabs"
        with pytest.raises(SynthesisError, match="order the coupon alone"):
            plan_panel(PLAIN, POOL, asked(PLAIN, count=(1, 1), coupon=wide))


class TestMilled:
    """No score, no legend, no mask, no perforation, one level."""

    BOARD = drawn("plain", {"loop_width": 50 * MM} | PLAIN_SIZES, ONE, MILLED)

    def test_panel(self) -> None:
        panel = plan_panel(self.BOARD, MILLED, asked(self.BOARD, masked=(), count=(2, 2)))
        assert panel.separation == "tabs"
        assert panel.layout.legend == ()
        assert len(panel.layout.mask_openings) == 4 * len(self.BOARD.mask_openings)
        assert not any(hole.purpose == "perforation" for hole in panel.layout.holes)
        assert {f.rule for f in panel.findings} == {"score", "perforation", "bad-board marks"}
        assert all(f.severity is Severity.NOTE for f in panel.findings)

    def test_score_is_refused(self) -> None:
        with pytest.raises(SynthesisError, match="ask for tabs"):
            plan_panel(self.BOARD, MILLED, asked(self.BOARD, masked=(), separation="score"))


@pytest.mark.parametrize(
    ("board", "fab", "changes", "message"),
    [
        (PLAIN, replace(POOL, panelling=None), {}, "has no \\[panelling\\]"),
        (replace(PLAIN, edge=circle((0.0, 0.0), 90 * MM).normalised()), POOL, {}, "only rectangles"),
        (PLAIN, POOL, {"count": (0, 2)}, "at least 1 x 1"),
        (PLAIN, POOL, {"separation": "laser"}, "score or tabs"),
        (PLAIN, POOL, {"coupon": RING}, "levels the board has not"),
        (PLAIN, replace(POOL, panel=(0.1, 0.1)), {}, "not one board fits"),
    ],
)
def test_refusals(board: Layout, fab: Fab, changes: dict[str, object], message: str) -> None:
    with pytest.raises(SynthesisError, match=message):
        plan_panel(board, fab, asked(board, **changes))


def test_connector_box_is_where_the_body_is() -> None:
    """Edge coax: 14.5 mm by 8 mm about 7.25 mm before the line's start, which looks up on a board."""
    assert connector_box(EDGE_COAX) == pytest.approx((-4 * MM, -14.5 * MM, 4 * MM, 0.0))
    assert connector_box(LIBRARY.connector("bare-pads")) is None


@settings(max_examples=8, deadline=None)
@given(
    columns=st.integers(1, 4),
    rows=st.integers(1, 4),
    which=st.sampled_from(["plain", "ring"]),
    separation=st.sampled_from(["score", "tabs"]),
)
def test_any_count(columns: int, rows: int, which: str, separation: str) -> None:
    board, body = BOARDS[which]
    request = asked(board, count=(columns, rows), separation="tabs" if which == "ring" else separation, body=body)
    if which == "ring" and (columns > 3 and rows > 3):
        with pytest.raises(SynthesisError, match="do not fit"):
            plan_panel(board, POOL, request)
        return
    panel = plan_panel(board, POOL, request)
    boards = shapes(panel.layout.boards)
    assert panel.board_size == pytest.approx(board.size, abs=NM)
    assert len(boards) == panel.boards == columns * rows
    gaps = [a.distance(b) for a, b in combinations(boards, 2)]
    assert min(gaps, default=panel.spacing) == pytest.approx(panel.spacing, abs=NM)
    assert len({pad.part for pad in panel.layout.pads}) == columns * rows
    if panel.separation == "tabs":
        check_slots(panel, board)
    else:
        assert len(panel.layout.scores) == columns + rows + 2

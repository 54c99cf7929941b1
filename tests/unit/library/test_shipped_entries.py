"""Every shipped entry loads, states its sources and tolerances, and is physically possible.

Authorities: the classes a library must cover (demand of the design); limits of nature; ranges of common practice,
from memory where marked. Land patterns are held against the fabs' own limits.
"""

import tomllib

import pytest
from shapely.geometry import Point, box

from planar.library import Connector, LandPad, Library

LIBRARY = Library.open()
LAMINATES = LIBRARY.keys("laminates")
FABS = LIBRARY.keys("fabs")
CONNECTORS = LIBRARY.keys("connectors")
COVERS = LIBRARY.keys("covers")
CHECKED = [(kind, key) for kind in ("laminates", "fabs", "connectors", "covers") for key in LIBRARY.keys(kind)]

TOLERANCED = {"laminates": ("eps_r", "tan_d", "thickness", "copper"), "covers": ("eps_r", "tan_d")}


def rectangle(pad: LandPad):
    (x, y), (w, h) = pad.centre, pad.size
    return box(x - w / 2, y - h / 2, x + w / 2, y + h / 2)


def printed_connectors() -> list[Connector]:
    return [c for key in CONNECTORS if (c := LIBRARY.connector(key)).pads]


def test_the_demanded_classes_are_there() -> None:
    classes = {LIBRARY.laminate(key).material_class for key in LAMINATES}
    assert len(LAMINATES) >= 12
    assert {
        "glass-epoxy",
        "ptfe-glass",
        "hydrocarbon-ceramic",
        "ceramic-ptfe",
        "polyimide",
        "alumina",
        "foam",
    } <= classes
    assert {"fr4-general", "fr4-high-tg", "hydrocarbon-ceramic-3-0", "hydrocarbon-ceramic-3-5"} <= set(LAMINATES)
    assert {LIBRARY.laminate(f"ceramic-ptfe-{key}").eps_r for key in ("6-15", "10-2")} == {6.15, 10.2}
    assert len(FABS) >= 3
    assert {"edge-coax", "miniature-coax", "pigtail-pads", "bare-pads"} <= set(CONNECTORS)


@pytest.mark.parametrize(("kind", "key"), CHECKED)
def test_every_value_has_its_source_and_tolerance(kind: str, key: str) -> None:
    raw = tomllib.loads(LIBRARY.source(kind, key).read_text(encoding="utf-8"))
    tables = [(name, row) for name, value in raw.items() for row in (value if isinstance(value, list) else [value])]
    tables += [(name, row) for _, value in tables if "rail_width" in value for name, row in value.items()]
    facts = [(name, table) for name, table in tables if name not in ("title", "class", "specification", "panelling")]
    assert facts
    assert [name for name, table in facts if not table["source"].strip()] == []
    assert [name for name in TOLERANCED.get(kind, ()) if "tolerance" not in raw[name]] == []


@pytest.mark.parametrize(("kind", "key"), CHECKED)
def test_record_carries_every_source(kind: str, key: str) -> None:
    record = getattr(LIBRARY, kind.removesuffix("s"))(key)
    written = LIBRARY.source(kind, key).read_text(encoding="utf-8").count("source =")
    assert len(record.sources) == written
    assert record.key == key


@pytest.mark.parametrize("key", LAMINATES)
def test_laminate_is_possible(key: str) -> None:
    """Foam at the low end, alumina near the high end; foil no better than annealed copper (5.80e7 S/m, IACS)."""
    laminate = LIBRARY.laminate(key)
    assert 1.0 < laminate.eps_r < 11.0
    assert 0.0 < laminate.tan_d < 0.05
    assert 0.0 < laminate.eps_r_tolerance <= 0.1
    assert 0.0 < laminate.tan_d_tolerance <= 0.5
    assert laminate.thicknesses == tuple(sorted(set(laminate.thicknesses)))
    assert laminate.conductivity <= 5.8001e7
    assert laminate.roughness_rq < min(laminate.base_coppers)


def test_ranking_of_loss_is_the_trades() -> None:
    """Common practice, no source: paper, then woven glass and epoxy, then low-loss resins, then PTFE and glass."""
    keys = ("paper-phenolic", "fr4-general", "fr4-high-tg", "polyphenylene-ether-glass", "ptfe-glass-2-2")
    losses = [LIBRARY.laminate(key).tan_d for key in keys]
    assert losses == sorted(losses, reverse=True)


@pytest.mark.parametrize("key", ["fr4-general", "hydrocarbon-ceramic-3-5"])
def test_laminate_model_goes_through_its_point(key: str) -> None:
    """Exact: the wideband Debye model (Djordjevic et al. 2001) is fixed by that point."""
    laminate = LIBRARY.laminate(key)
    eps = laminate.model.permittivity(laminate.at)
    assert eps.real == pytest.approx(laminate.eps_r, rel=1e-12)
    assert -eps.imag / eps.real == pytest.approx(laminate.tan_d, rel=1e-9)


@pytest.mark.parametrize("key", COVERS)
def test_cover_is_a_plastic(key: str) -> None:
    """From memory: unfilled thermoplastics lie between 2 and 3.5, loss below 0.02."""
    cover = LIBRARY.cover(key)
    assert 2.0 < cover.model.permittivity(2.4e9).real < 3.5
    assert cover.tan_d < 0.02


def test_fab_limits_are_the_trades() -> None:
    """Common practice, no source: track and gap 0.15 mm pooled, 0.1 mm better; hole 0.3, ring 0.15, edge 0.3 mm."""
    pool, fine = LIBRARY.fab("pool-two-layer"), LIBRARY.fab("fine-two-layer")
    got = (pool.min_track, pool.min_gap, fine.min_track, fine.min_gap, pool.min_hole, pool.min_annular_ring)
    assert got == pytest.approx((0.15e-3, 0.15e-3, 0.1e-3, 0.1e-3, 0.3e-3, 0.15e-3), rel=1e-9)
    assert pool.copper_to_routed_edge == pytest.approx(0.3e-3)
    assert pool.copper_to_score == pytest.approx(0.5e-3)
    assert pool.price_step == pytest.approx((0.1, 0.1))
    assert pool.panel == pytest.approx((0.457, 0.610))


@pytest.mark.parametrize("key", FABS)
def test_fab_does_not_contradict_itself(key: str) -> None:
    fab = LIBRARY.fab(key)
    usable = tuple(side - 2 * fab.panel_border for side in fab.panel)
    assert all(board <= side + 1e-9 for board, side in zip(fab.max_board, usable, strict=True))
    assert all(step <= board for step, board in zip(fab.price_step, fab.max_board, strict=True))
    assert 2 * fab.etch_tolerance < fab.min_track
    assert 2 * fab.etch_tolerance < fab.min_gap
    assert fab.plated_holes == (fab.plating > 0.0)


@pytest.mark.parametrize("key", FABS)
def test_panelling_is_the_trades(key: str) -> None:
    """Common practice, no source: rails of 5 to 10 mm, tooling holes of 2.0 or 3.2 mm, fiducials of 1 mm in an opening
    of 2 to 3 mm, a third of the thickness left under a score, five holes of 0.5 mm at 0.8 mm on a tab."""
    fab = LIBRARY.fab(key)
    way = fab.panelling
    assert way is not None
    assert 5e-3 <= way.rail_width <= 10e-3
    assert any(way.tooling_hole == pytest.approx(size) for size in (2.0e-3, 3.2e-3))
    assert fab.min_hole <= way.tooling_hole <= fab.max_hole
    assert way.fiducial == pytest.approx(1e-3)
    assert 2e-3 <= way.fiducial_opening <= 3e-3
    if way.score:
        assert way.score_web == pytest.approx(1 / 3, rel=2e-3)
    if way.perforation_count:
        got = (way.perforation_count, way.perforation_hole, way.perforation_pitch)
        assert got == pytest.approx((5, 0.5e-3, 0.8e-3))
        assert way.perforation_pitch - way.perforation_hole >= way.perforation_wall


def test_milled_board_has_neither_mask_nor_legend_nor_plating() -> None:
    milled = LIBRARY.fab("milled-single-sided")
    assert (milled.levels, milled.mask, milled.legend, milled.plated_holes) == (1, False, False, False)
    assert (milled.mask_thickness, milled.mask_model.permittivity(1e9), milled.legend_min_stroke) == (0.0, 1.0, 0.0)


@pytest.mark.parametrize("connector", printed_connectors(), ids=lambda c: c.key)
class TestLandPattern:
    """Authority: the pooled fab's limits, and plane geometry."""

    pool = LIBRARY.fab("pool-two-layer")

    def test_vias_keep_their_ring_inside_a_pad_of_their_net(self, connector: Connector) -> None:
        for hole in connector.holes:
            assert self.pool.min_hole * (1 - 1e-9) <= hole.diameter <= self.pool.max_hole
            ring = Point(hole.centre).buffer(hole.diameter / 2 + self.pool.min_annular_ring)
            pads = [p for p in connector.pads if p.net == hole.net and rectangle(p).contains(ring)]
            assert "top" in {pad.level for pad in pads}

    def test_top_ground_pads_each_have_a_via_into_the_tab(self, connector: Connector) -> None:
        tab = connector.ground_tab
        assert tab is not None
        area = box(-tab.length, -tab.half_width, 0, tab.half_width)
        assert all(area.buffer(1e-9).contains(rectangle(p)) for p in connector.pads if p.net == "ground")
        for pad in (p for p in connector.pads if (p.net, p.level) == ("ground", "top")):
            assert any(rectangle(pad).contains(Point(hole.centre)) for hole in connector.holes if hole.plated)

    def test_pads_of_different_nets_keep_the_gap(self, connector: Connector) -> None:
        signal = [p for p in connector.pads if p.net == "signal"]
        for a in signal:
            for b in (p for p in connector.pads if p.net == "ground" and p.level == a.level):
                assert rectangle(a).distance(rectangle(b)) >= self.pool.min_gap

    def test_line_starts_at_the_end_of_one_narrow_signal_pad(self, connector: Connector) -> None:
        """A 50 ohm line on 1.6 mm FR-4 is about 3 mm wide (common practice, no source)."""
        (signal,) = (p for p in connector.pads if p.net == "signal")
        assert rectangle(signal).bounds[2] == pytest.approx(0.0, abs=1e-9)
        assert signal.centre[1] == 0.0
        assert signal.size[1] <= 3e-3
        assert connector.impedance == 50.0

    def test_body_covers_every_pad(self, connector: Connector) -> None:
        assert connector.body is not None
        (x, y), (w, h) = connector.body.centre, connector.body.size
        outline = box(x - w / 2, y - h / 2, x + w / 2, y + h / 2).buffer(1e-9)
        assert all(outline.contains(rectangle(pad)) for pad in connector.pads)


@pytest.mark.parametrize("key", ["edge-coax"])
def test_copper_of_an_edge_connector_keeps_off_the_edge(key: str) -> None:
    """Common practice, no source: 0.3 mm to a routed edge."""
    connector = LIBRARY.connector(key)
    assert connector.edge_distance is not None
    assert connector.ground_tab is not None
    starts = [rectangle(pad).bounds[0] for pad in connector.pads] + [-connector.ground_tab.length]
    assert connector.edge_distance + min(starts) >= 0.3e-3 * (1 - 1e-9)


def test_bare_pads_bring_no_copper() -> None:
    bare = LIBRARY.connector("bare-pads")
    assert bare.balanced
    assert (bare.pads, bare.holes, bare.body, bare.ground_tab, bare.impedance) == ((), (), None, None, None)

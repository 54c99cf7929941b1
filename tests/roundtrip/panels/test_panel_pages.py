"""What is said of panels and coupons in words, what their layers hold beyond those of a board, what is refused.

Authority: the hand-drawn layouts, whose numbers are in the text; common practice of board fabrication.
"""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path
from typing import Any

import ezdxf
import pytest

from planar.copper.layout import Hole, Layout, Score
from planar.copper.outline import Outline
from planar.copper.shapes import rectangle
from planar.errors import GeometryError, HandoffError
from planar.handoff import GerberFacts, check_fabrication_files, fabrication_names, layout_names, read_gds
from planar.handoff.check import outline_mismatches
from planar.handoff.gerber_content import gerber_content, gerber_files
from planar.handoff.netlist import netlist_records
from planar.handoff.page import PAGE_LINES, WIDTH

Job = Any


def flowing(path: Path) -> str:
    return " ".join(path.read_text(encoding="utf-8").split())


def test_pages_are_short_and_fit_the_kind(name: str, jobs: dict[str, Job], folders: dict[str, Path]) -> None:
    folder = folders[name]
    for page in ("layout/README.txt", "fabrication/README-cam.txt"):
        lines = (folder / page).read_text(encoding="utf-8").splitlines()
        assert max(map(len, lines)) <= WIDTH
    assert len((folder / "layout" / "README.txt").read_text(encoding="utf-8").splitlines()) <= PAGE_LINES
    assert not (folder / "fabrication" / "README-build.txt").exists()  # nobody builds from a panel
    layout, cam = flowing(folder / "layout" / "README.txt"), flowing(folder / "fabrication" / "README-cam.txt")
    if name == "coupon":
        assert "antenna" not in layout.split("LAYERS")[0] + cam  # the table of layers is that of every file
        assert "coupon to measure the laminate on" in layout
        assert "J3: 1 signal land and 1 return land, GND; -14.000, 7.500 mm on top" in layout
        assert "They meet in plated holes at (-11.000, 7.500) mm" in layout
        assert "Delivery: single coupons" in cam
    else:
        size = {"tabbed": "125.000 by 110.000 mm", "scored": "40.000 by 40.000 mm"}[name]
        assert f"2 x 1 = 2 boards of {size}" in cam
        assert "2 copies of one board" in layout
        assert "ANT1" in layout
        assert "ANT2" in layout
        assert "array.gbr the panel as a drawing" in cam
    assert "feed of the antenna" not in cam  # the origin of a panel is none
    assert ("score.gbr score lines" in cam) == (name == "scored")


def test_names_are_those_of_the_files_written(name: str, jobs: dict[str, Job], folders: dict[str, Path]) -> None:
    job, folder = jobs[name], folders[name]
    assert {path.name for path in (folder / "layout").iterdir()} == layout_names(job.layout)
    assert {path.name for path in (folder / "fabrication").iterdir()} == fabrication_names(job.layout, job.facts)


def test_net_tie_of_each_board_has_a_layer(folders: dict[str, Path]) -> None:
    """The loops are 33 mm wide and 32.93 mm high about the middles of boards of 40 by 40 mm behind rails of 7 mm; the
    outline is 1 mm outside. The loop of the other panel is cut: no tie. On the coupon it is the via of the short."""
    middles = (27.0, 67.0)
    document = ezdxf.readfile(folders["scored"] / "layout" / "board.dxf")
    ties = document.modelspace().query('LWPOLYLINE[layer=="NET_TIE"]')
    found = sorted(min(x for x, *_ in tie.get_points()) for tie in ties)
    assert found == pytest.approx([x - 17.5 for x in middles], abs=1e-6)
    other = read_gds(folders["scored"] / "layout" / "board.gds").outlines["NET_TIE"]
    assert sorted(1e3 * tie.bounds[0] for tie in other) == pytest.approx(found, abs=1e-6)
    assert "NET_TIE" not in read_gds(folders["tabbed"] / "layout" / "board.gds").outlines
    (via,) = read_gds(folders["coupon"] / "layout" / "board.gds").outlines["NET_TIE"]
    assert [1e3 * c for c in via.bounds] == pytest.approx([-12.15, 6.35, -9.85, 8.65], abs=1e-6)
    assert "NET_TIE,52,0," in (folders["coupon"] / "layout" / "layers.csv").read_text(encoding="utf-8")


def test_score_line_without_length_is_refused() -> None:
    with pytest.raises(GeometryError, match=r"score line at \(1\.000, 2\.000\) mm has no length"):
        Score((1e-3, 2e-3), (1e-3, 2e-3 + 1e-10))
    Score((1e-3, 2e-3), (1e-3, 2.1e-3))


def test_snapping_a_panel_takes_cutouts_and_boards_along(one_level: Layout) -> None:
    slot = Outline(rectangle(0.4e-9, 0.0, 1e-3, 2e-3).vertices).reversed()
    panel = replace(one_level, cutouts=(slot,), boards=(slot,)).snapped()
    for outline in (*panel.cutouts, *panel.boards):
        assert outline.area > 0.0
        assert 1e3 * outline.bounds[0] == pytest.approx(0.0, abs=1e-9)


def test_outlines_in_another_order_agree_and_one_that_moved_does_not() -> None:
    """A hundred squares of 1 mm: the nanometre allowed along all of them hides in the sum that one moved by ten."""
    squares = [rectangle(2e-3 * i, 0.0, 2e-3 * i + 1e-3, 1e-3) for i in range(100)]
    assert outline_mismatches(squares[::-1], squares, 1e-9) == []
    moved = [*squares[:50], squares[50].translated(10e-9, 0.0), *squares[51:]]
    text, *_ = outline_mismatches(moved, squares, 1e-9)
    assert text.startswith("outline at (100.000000")
    assert "51 outlines, expected 100" in outline_mismatches(moved[:51], squares, 0.0)[0]


def test_ring_of_a_coupon_beside_the_boards_is_its_own(jobs: dict[str, Job]) -> None:
    """Vias of the boards show 0.3 mm holes with rings of 0.15 mm, one on the rail a ring of 0.3 mm: 0.6 and 0.9 mm."""
    job = jobs["tabbed"]
    beside = Hole((60e-3, 5e-3), 0.3e-3, True, "via", "GND_CPN")
    layout = replace(job.layout, holes=(*job.layout.holes, beside))
    facts: GerberFacts = replace(job.facts.gerber, coupon_ring_m=0.3e-3)
    rings = {(r.net, round(1e3 * r.size[0], 3)) for r in netlist_records(layout, facts) if r.code == "317"}
    assert rings == {("SIGNAL_A1", 0.6), ("SIGNAL_B1", 0.6), ("GND_CPN", 0.9)}
    top = next(file for file in gerber_files(job.layout, facts) if file.name == "copper-top.gbr")
    vias = [f for f in gerber_content(job.layout, top, facts).flashes if f.tags.function == "ViaPad"]
    assert [f.aperture.size for f in vias] == [(pytest.approx(0.6e-3),)] * 2


def test_everything_wrong_is_said_at_once(jobs: dict[str, Job], folders: dict[str, Path], tmp_path: Path) -> None:
    """An empty folder lacks every file there is to be, each of them named."""
    job = jobs["scored"]
    with pytest.raises(HandoffError) as caught:
        check_fabrication_files(job.layout, job.sheet, tmp_path, facts=job.facts)
    text = str(caught.value)
    assert all(name in text for name in fabrication_names(job.layout, job.facts))

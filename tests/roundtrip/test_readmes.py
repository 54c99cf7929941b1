"""The pages for CAM operator, layout engineer and builder: true to the board, one page, nothing left open.

Authority: the layout's own lengths, the list of what fabs ask (common practice), the geometry of the drawn board.
"""

from __future__ import annotations

import hashlib
import math
from dataclasses import replace
from pathlib import Path

import pytest

from planar.copper.boolean import contains
from planar.copper.layout import Layout, Level
from planar.errors import HandoffError
from planar.handoff import GerberFacts, ProjectFacts, SheetFacts, StackupSheet, creation_date, stackup_sheet
from planar.handoff.drill_file import write_drills
from planar.handoff.fab_notes import DrawingFacts
from planar.handoff.fresh import fresh_mismatches
from planar.handoff.gerber import write_gerber_files
from planar.handoff.net_tie import net_ties
from planar.handoff.page import PAGE_LINES, WIDTH, listed, wrapped
from planar.handoff.readme import write_layout_readme
from planar.handoff.readme_build import BuildFacts, Expected
from planar.handoff.readmes import ReadmeFacts, write_fabrication_readmes
from planar.library import WidebandDebye
from planar.stackup import Conductor, Layer, LayerKind, Stackup

STATUS = "first-order, not field-solved: expect the resonance a few per cent off"
PAGES = ("README-cam.txt", "README-build.txt")
EXPECTED = Expected(867.2e6, -14.2, (851e6, 889e6), 46.0 - 7.0j)
BUILD = BuildFacts("Edge coax: a socket", False, 50.0, (863e6, 870e6), -10.0, True, STATUS)


def sheet_of(layout: Layout) -> StackupSheet:
    laminate = WidebandDebye.from_point(4.3, 0.02, at=866e6)
    coppers = [Layer(f"copper-{level}", LayerKind.COPPER, "copper", 43e-6) for level in layout.levels]
    core = Layer("dielectric", LayerKind.DIELECTRIC, "glass epoxy", 1.6e-3, laminate)
    conductor = Conductor(base_thickness=35e-6, plating=8e-6, conductivity=5.8e7, roughness_rq=0.4e-6)
    facts = SheetFacts(layout.name, 866e6, "immersion tin", None, 0.15e-3, dc_short=layout.dc_short)
    return stackup_sheet(Stackup((*coppers[1:], core, coppers[0]), conductor, 0.1), (), facts=facts)


def facts_of(layout: Layout, build: BuildFacts = BUILD) -> ReadmeFacts:
    project = ProjectFacts(layout.name, "A", hashlib.sha256(b"a design").hexdigest(), creation_date())
    return ReadmeFacts(
        GerberFacts(project, layout.levels, 0.15e-3), DrawingFacts(project, "netlist.ipc", 0.1e-3), build
    )


def pages(layout: Layout, folder: Path, build: BuildFacts = BUILD) -> dict[str, str]:
    """Text of each page by file name, its lines run together."""
    write_fabrication_readmes(layout, sheet_of(layout), folder, facts=facts_of(layout, build))
    write_layout_readme(layout, folder / "README.txt", status=STATUS)
    return {path.name: " ".join(path.read_text(encoding="utf-8").split()) for path in folder.glob("README*.txt")}


def readme_mismatches(layout: Layout, sheet: StackupSheet, folder: Path, *, facts: ReadmeFacts) -> list[str]:
    return fresh_mismatches(folder, lambda fresh: write_fabrication_readmes(layout, sheet, fresh, facts=facts))


@pytest.mark.parametrize("name", ["two_level", "one_level", "drawn"])
def test_one_page_of_plain_text_each(name: str, tmp_path: Path, request: pytest.FixtureRequest) -> None:
    pages(request.getfixturevalue(name), tmp_path, replace(BUILD, expected=EXPECTED, cuts=(("upper tabs", 8e6),)))
    for page in ("README.txt", *PAGES):
        lines = (tmp_path / page).read_text(encoding="utf-8").splitlines()
        assert len(lines) <= PAGE_LINES, page
        assert max(map(len, lines)) <= WIDTH, page
        assert not any(line != line.rstrip() for line in lines)


def test_same_bytes_twice_and_read_back(drawn: Layout, tmp_path: Path) -> None:
    sheet, facts = sheet_of(drawn), facts_of(drawn)
    for name in ("one", "two"):
        (tmp_path / name).mkdir()
        write_fabrication_readmes(drawn, sheet, tmp_path / name, facts=facts)
        assert readme_mismatches(drawn, sheet, tmp_path / name, facts=facts) == []
    for page in PAGES:
        assert (tmp_path / "one" / page).read_bytes() == (tmp_path / "two" / page).read_bytes()


def test_stale_or_missing_page_is_reported(drawn: Layout, two_level: Layout, tmp_path: Path) -> None:
    pages(two_level, tmp_path)
    found = readme_mismatches(drawn, sheet_of(drawn), tmp_path, facts=facts_of(drawn))
    assert [text.split(":")[0] for text in found] == sorted(PAGES)
    assert "'two level, 868 MHz, revision A" in found[1]
    (tmp_path / "README-cam.txt").unlink()
    (text,) = readme_mismatches(two_level, sheet_of(two_level), tmp_path, facts=facts_of(two_level))
    assert text.startswith("README-cam.txt cannot be read")
    whole = (tmp_path / "README-build.txt").read_text(encoding="utf-8")
    pages(two_level, tmp_path)
    (tmp_path / "README-build.txt").write_text(whole[:-40], encoding="utf-8")
    assert len(readme_mismatches(two_level, sheet_of(two_level), tmp_path, facts=facts_of(two_level))) == 1


def test_cam_page_names_every_file_and_every_tool(drawn: Layout, tmp_path: Path) -> None:
    text = pages(drawn, tmp_path)["README-cam.txt"]
    facts = facts_of(drawn).gerber
    write_gerber_files(drawn, tmp_path, facts=facts)
    write_drills(drawn, tmp_path, facts=facts.project)
    written = {path.name for path in tmp_path.iterdir()} - {"README.txt", "README-cam.txt"}
    assert len(written) >= 5
    assert all(name in text for name in written)
    vias = sum(hole.plated for hole in drawn.holes)
    assert f"plated T1 {1e3 * next(h.diameter for h in drawn.holes if h.plated):.3f} mm {vias} ViaDrill" in text
    assert "0 ohm" in text
    assert "one net with every land an end point" in text


def test_cam_page_without_an_answer_is_refused(drawn: Layout, tmp_path: Path) -> None:
    facts = facts_of(drawn)
    blank = replace(facts, drawing=replace(facts.drawing, netlist=" "))
    with pytest.raises(HandoffError, match="netlist is blank"):
        write_fabrication_readmes(drawn, sheet_of(drawn), tmp_path, facts=blank)


def test_net_tie_of_a_guided_ring_is_the_via_at_the_end_of_its_line(drawn: Layout, tmp_path: Path) -> None:
    """That via and no other reaches the line: the others join ground to ground."""
    (tie,) = net_ties(drawn)
    assert tie.hole is not None
    line = next(island for island in drawn.islands if island.role == "line")
    assert [hole for hole in drawn.holes if contains(line.outline, hole.centre) and hole.plated] == [tie.hole]
    assert {(island.role.value, island.level) for island in tie.islands} == {
        ("line", Level.TOP),
        ("radiator", Level.BOTTOM),
    }
    assert contains(tie.outline, tie.hole.centre)
    x, y = (1e3 * c for c in tie.hole.centre)
    assert f"plated hole at {x:.3f}, {y:.3f} mm" in pages(drawn, tmp_path)["README.txt"]


def test_net_tie_of_a_plain_loop_is_the_loop(one_level: Layout, two_level: Layout, tmp_path: Path) -> None:
    (tie,) = net_ties(one_level)
    assert (tie.hole, tie.net, tie.islands) == (None, "ANT", one_level.islands)
    upper = 16.5 * math.cos(1.0 / 15.0)  # a trace of radius 15 and width 3 ends 1 mm of mean line from the gap's centre
    assert [1e3 * c for c in tie.outline.bounds] == pytest.approx([-17.5, -17.5, 17.5, upper + 1.0], abs=1e-6)
    assert f"from -16.500, -16.500 to 16.500, {upper:.3f} mm" in pages(one_level, tmp_path)["README.txt"]
    assert net_ties(two_level) == ()
    assert "no net tie, do not join them" in pages(two_level, tmp_path)["README.txt"]


def test_way_to_the_feed_is_said_in_mm(drawn: Layout, two_level: Layout, tmp_path: Path) -> None:
    """The keepout of the drawn board leaves a slot as wide as connector and 1 mm on each side, from the edge to y 0."""
    _, low, _, _ = drawn.edge.bounds
    assert f"x -5.000 to 5.000 mm, y {1e3 * low:.3f} to 0.000 mm" in pages(drawn, tmp_path)["README.txt"]
    assert "No way to the feed is left open" in pages(two_level, tmp_path)["README.txt"]


def test_builder_is_told_what_to_expect_only_where_it_was_predicted(drawn: Layout, tmp_path: Path) -> None:
    bare = pages(drawn, tmp_path)["README-build.txt"]
    assert "Expected" not in bare
    assert "0 ohm (below 1 ohm) between signal and return" in bare
    assert "Asked: -10 dB or less from 863 MHz to 870 MHz" in bare
    assert "by the lower edge of the board, seen from the top, which is 4.50 mm from the feed" in bare
    assert "Transmitting: only in a band" in bare
    assert "quarter wavelength (87 mm)" in bare  # 299.792 / 866 / 4 m
    told = pages(drawn, tmp_path, replace(BUILD, expected=EXPECTED, transmit=False))["README-build.txt"]
    assert "least reflection at 867.2 MHz, at most -14.2 dB in the band" in told
    assert "from 851 MHz to 889 MHz; 46 - j7 ohm" in told
    assert "not meant to transmit" in told


def test_builder_of_a_cut_loop_measures_no_short(two_level: Layout, tmp_path: Path) -> None:
    text = pages(two_level, tmp_path, replace(BUILD, balanced=True))["README-build.txt"]
    assert "no connection between signal and return" in text
    assert "neither is ground" in text
    assert "3.2 mm" in text
    assert "2.5 mm" in text


def test_numbers_stay_with_their_units() -> None:
    line = "x" * (WIDTH - 6)
    assert wrapped(f"{line} 0.7 %") == [line, "0.7 %"]
    assert listed(["1."], [f"{line[2:]} 12 MHz wide"])[-1] == "   12 MHz wide"

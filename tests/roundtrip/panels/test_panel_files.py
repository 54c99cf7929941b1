"""Panels and a coupon through every writer, read again by our reader and by others.

Authority: the Gerber layer format specification, revision 2023.08 (file functions Vcut and ArrayDrawing, aperture
functions FiducialPad, NonConductor, MechanicalDrill), IPC-D-356A, and readers that know nothing of this program:
pygerber (strict grammar), gerbonara, gdstk, pypdfium2. The layouts are drawn by hand; their numbers are in the text.
"""

from __future__ import annotations

import hashlib
import json
import re
import warnings
from collections import Counter
from dataclasses import replace
from pathlib import Path
from types import SimpleNamespace
from typing import Any
from xml.etree import ElementTree

import gdstk
import pypdfium2
import pytest
from shapely import symmetric_difference
from shapely.geometry import Polygon
from shapely.ops import unary_union

from planar.copper.layout import Kind, Layout, Level, Role
from planar.copper.shapes import rectangle
from planar.errors import HandoffError
from planar.handoff import (
    LAYERS,
    check_fabrication_files,
    check_files,
    read_dxf,
)
from planar.handoff.drawing_dimensions import spread
from planar.handoff.fab_notes import fab_notes, questions
from planar.handoff.gerber_reader import read_gerber
from planar.handoff.netlist import write_netlist
from planar.handoff.readme import write_layout_readme
from planar.handoff.readme_cam import cam_readme

with warnings.catch_warnings():
    warnings.simplefilter("ignore", DeprecationWarning)  # raised inside the readers' own imports
    from gerbonara import GerberFile as OtherFile
    from gerbonara.excellon import ExcellonFile
    from gerbonara.ipc356 import Netlist as OtherNetlist
    from gerbonara.ipc356 import PadType
    from gerbonara.utils import MM
    from pygerber.gerberx3.parser2.parser2 import Parser2, Parser2OnErrorAction, Parser2Options
    from pygerber.gerberx3.tokenizer.tokenizer import Tokenizer

    TOKENIZER = Tokenizer()

HASH = hashlib.sha256(b"a panel").hexdigest()
FREQUENCY = 868.3e6
TOOLING, PERFORATION, PITCH, FIDUCIAL, OPENING, MARK = 3.2e-3, 0.5e-3, 0.8e-3, 1e-3, 2e-3, 1.5e-3
BOTH = (Level.TOP, Level.BOTTOM)


Job = Any


# what is written


def test_checks_find_no_fault_and_bytes_are_the_same_twice(
    name: str, jobs: dict[str, Job], folders: dict[str, Path], tmp_path: Path
) -> None:
    job, folder = jobs[name], folders[name]
    check_fabrication_files(job.layout, job.sheet, folder / "fabrication", facts=job.facts)
    check_files(job.layout, folder / "layout")
    again = job.write(tmp_path)
    files = [path.relative_to(folder) for path in sorted(folder.rglob("*")) if path.is_file()]
    assert len(files) > 15
    assert all((folder / path).read_bytes() == (again / path).read_bytes() for path in files)


def test_layer_files_present_only_where_needed(folders: dict[str, Path]) -> None:
    for name, expected in {"tabbed": {"array.gbr"}, "scored": {"array.gbr", "score.gbr"}, "coupon": set()}.items():
        names = {path.name for path in (folders[name] / "fabrication").glob("*.gbr")}
        assert names & {"array.gbr", "score.gbr"} == expected
        assert {"copper-top.gbr", "mask-top.gbr", "profile.gbr"} <= names


# layers, as other readers see them


def parsed(path: Path) -> tuple[list[Any], Any]:
    """Objects and file attributes by the strict grammar and parser of pygerber; raises on anything it does not know."""
    tree = TOKENIZER.tokenize(path.read_text(encoding="ascii"))
    parser = Parser2(Parser2Options(on_update_drawing_state_error=Parser2OnErrorAction.Raise))
    return list(parser.parse(tree).commands), parser.context.file_attributes


def objects(path: Path, kind: str) -> list[Any]:
    return [command for command in parsed(path)[0] if type(command).__name__ == kind]


def place_of(vector: Any) -> tuple[float, float]:
    """mm, to 0.01 um."""
    return round(float(vector.x.as_millimeters()), 5), round(float(vector.y.as_millimeters()), 5)


def test_file_functions_and_parts(name: str, folders: dict[str, Path]) -> None:
    part = {"tabbed": "Array", "scored": "Array", "coupon": "Coupon"}[name]
    functions = {"score.gbr": ("Vcut",), "array.gbr": ("ArrayDrawing",), "profile.gbr": ("Profile", "NP")}
    for path in sorted((folders[name] / "fabrication").glob("*.gbr")):
        other = OtherFile.open(path)  # warnings are errors: it must have none
        _, attributes = parsed(path)
        assert other.file_attrs[".Part"] == (part,)
        assert attributes.get(".Part") == part
        if path.name in functions:
            assert other.file_attrs[".FileFunction"] == functions[path.name]
            assert attributes.get(".FileFunction") == ",".join(functions[path.name])
            assert attributes.get(".FilePolarity") == "Positive"
    for path in (folders[name] / "fabrication").glob("*.xnc"):
        assert f"; #@! TF.Part,{part}\n" in path.read_text(encoding="ascii")


@pytest.mark.parametrize("name", ["tabbed", "scored"])
def test_fiducials_are_flashes_alone_and_marks_belong_to_no_net(name: str, folders: dict[str, Path]) -> None:
    panel = {"tabbed": (273.0, 130.0, 10.0), "scored": (94.0, 54.0, 7.0)}[name]  # width, height, rail in mm
    width, height, half = panel[0], panel[1], 0.5 * panel[2]
    expected = {(half + 6.0, half), (width - half - 6.0, half), (half + 6.0, height - half)}
    for level in BOTH if name == "tabbed" else BOTH[:1]:
        path = folders[name] / "fabrication" / f"copper-{level}.gbr"
        flashes = [f for f in objects(path, "Flash2") if "Fiducial" in f.aperture.attributes.get(".AperFunction")]
        assert {place_of(f.flash_point) for f in flashes} == expected
        assert {f.aperture.attributes.get(".AperFunction") for f in flashes} == {"FiducialPad,Panel"}
        assert {float(f.aperture.diameter.as_millimeters()) for f in flashes} == {1e3 * FIDUCIAL}
        assert not any(f.attributes.N or f.attributes.C or f.attributes.P for f in flashes)
        regions = objects(path, "Region2")
        bare = [r for r in regions if r.aperture_attributes.get(".AperFunction") == "NonConductor"]
        assert len(bare) == (2 if level is Level.TOP else 0)
        assert not any(r.object_attributes.N or r.object_attributes.C for r in bare)
        boards = [r for r in regions if r not in bare]
        assert all(r.object_attributes.N.endswith(("_A1", "_B1")) for r in boards)
        # a region over a fiducial would be a second object where a camera looks for one
        centres = {place_of(r.command_buffer.commands[0].start_point) for r in regions}
        assert not {(x - 0.5, y) for x, y in expected} & centres


def test_designators_of_copies_and_of_a_coupon(folders: dict[str, Path]) -> None:
    path = folders["tabbed"] / "fabrication" / "copper-bottom.gbr"
    regions = [r for r in objects(path, "Region2") if r.aperture_attributes.get(".AperFunction") == "EtchedComponent"]
    assert Counter((r.object_attributes.C, r.object_attributes.N) for r in regions) == Counter(
        (part, f"{net}_{place}") for part, place in (("ANT1", "A1"), ("ANT2", "B1")) for net in ("SIGNAL", "RETURN")
    )
    path = folders["coupon"] / "fabrication" / "copper-top.gbr"
    assert not any(r.object_attributes.C for r in objects(path, "Region2"))
    assert {r.aperture_attributes.get(".AperFunction") for r in objects(path, "Region2")} == {"Conductor"}
    lands = [f for f in objects(path, "Flash2") if f.attributes.P]
    assert sorted((f.attributes.P.refdes, f.attributes.P.number, f.attributes.N) for f in lands) == [
        ("J1", "1", "LINE"), ("J3", "1", "GND"), ("LAUNCH_RIGHT", "1", "LINE"),
    ]  # fmt: skip


def test_profile_has_a_closed_line_for_the_edge_and_one_for_each_cutout(folders: dict[str, Path]) -> None:
    """Chains of draws that end where they begin: 273 by 130 mm, and two slots 3 mm wide."""
    chains: list[list[tuple[float, float]]] = []
    for draw in parsed(folders["tabbed"] / "fabrication" / "profile.gbr")[0]:
        assert draw.aperture.attributes.get(".AperFunction") == "Profile"
        if not chains or chains[-1][-1] != place_of(draw.start_point):
            chains.append([place_of(draw.start_point)])
        chains[-1].append(place_of(draw.end_point))
    assert len(chains) == 3
    assert all(chain[0] == chain[-1] for chain in chains)
    spans = [[max(c) - min(c) for c in zip(*chain, strict=True)] for chain in chains]
    assert spans[0] == pytest.approx([273.0, 130.0])
    assert [span[0] for span in spans[1:]] == pytest.approx([3.0, 3.0])


def test_scores_are_single_lines_from_edge_to_edge(folders: dict[str, Path]) -> None:
    lines = parsed(folders["scored"] / "fabrication" / "score.gbr")[0]
    assert {type(line).__name__ for line in lines} == {"Line2"}
    ends = {(place_of(line.start_point), place_of(line.end_point)) for line in lines}
    assert ends == {((x, 0.0), (x, 54.0)) for x in (7.0, 47.0, 87.0)} | {((0.0, y), (94.0, y)) for y in (7.0, 47.0)}
    assert len(list(OtherFile.open(folders["scored"] / "fabrication" / "score.gbr").objects)) == 5


def test_array_drawing_holds_edge_boards_and_scores_but_no_copper(folders: dict[str, Path]) -> None:
    commands, _ = parsed(folders["scored"] / "fabrication" / "array.gbr")
    assert {type(command).__name__ for command in commands} <= {"Line2", "Arc2", "CCArc2"}
    counts = Counter(command.aperture.attributes.get(".AperFunction") for command in commands)
    assert counts == {"Profile": 8, "Other,BoardOutline": 16, "Other,ScoreLine": 5}  # rounded rectangles: 8 edges
    own = read_gerber(folders["tabbed"] / "fabrication" / "array.gbr")
    assert Counter(track.tags.function for track in own.tracks) == {"Profile": 3, "Other,BoardOutline": 2}
    assert (own.regions, own.flashes, own.strokes, own.faults) == ((), (), (), ())


# holes, nets, job, exchange files, papers


def test_drill_functions_one_tool_each(folders: dict[str, Path]) -> None:
    path = folders["tabbed"] / "fabrication" / "drill-unplated.xnc"
    tools = re.findall(r"TA\.AperFunction,(\S+)\n^T\d+C(\S+)$", path.read_text(encoding="ascii"), re.MULTILINE)
    assert tools == [
        ("MechanicalDrill,Breakout", "0.500"), ("MechanicalDrill", "2.500"),
        ("MechanicalDrill", "3.200"), ("MechanicalDrill,Tooling", "3.200"),
    ]  # fmt: skip
    hits = Counter(round(hit.tool.equivalent_width(MM), 6) for hit in ExcellonFile.open(path).drills())
    assert hits == {0.5: 10, 2.5: 2, 3.2: 5}  # a board has one hole of 3.2 mm and one of 2.5 mm


def test_netlist_of_copies(jobs: dict[str, Job], folders: dict[str, Path]) -> None:
    path = folders["tabbed"] / "fabrication" / "netlist.ipc"
    netlist = OtherNetlist.open(path)
    lands = [r for r in netlist.test_records if r.pad_type is PadType.SMD_PAD]
    assert [(r.ref_des, r.pin, r.net_name) for r in lands] == [
        ("ANT1", "1", "SIGNAL_A1"), ("ANT1", "2", "RETURN_A1"), ("ANT2", "1", "SIGNAL_B1"), ("ANT2", "2", "RETURN_B1"),
    ]  # fmt: skip
    bare = [r for r in netlist.test_records if r.pad_type is PadType.NONPLATED_HOLE]
    assert Counter(round(r.hole_dia, 3) for r in bare) == {0.5: 10, 2.5: 2, 3.2: 5}
    assert not any(r.net_name or r.is_plated for r in bare)
    assert len(netlist.test_records) == 4 + 2 + 17  # lands, vias, unplated holes: no fiducials, no marks
    text = (folders["scored"] / "fabrication" / "netlist.ipc").read_text(encoding="ascii")
    assert jobs["scored"].layout.dc_short
    for net in ("ANT_A1", "ANT_B1"):
        assert f"C  {net} joins feed and ground at DC: 0 ohm between its end points is intended" in text


def test_netlist_of_a_coupon_maps_long_designators(folders: dict[str, Path]) -> None:
    path = folders["coupon"] / "fabrication" / "netlist.ipc"
    text = path.read_text(encoding="ascii")
    assert 'C  P00001 = "LAUNCH_RIGHT"' in text
    assert "feed" not in text
    assert "GND joins signal and return at DC" in text
    lands = [r for r in OtherNetlist.open(path).test_records if r.pad_type is PadType.SMD_PAD]
    assert [(r.ref_des, r.pin) for r in lands] == [
        ("J1", "1"), ("P00001", "1"), ("J1", "2"), ("P00001", "2"), ("J3", "1"), ("J3", "2"),
    ]  # fmt: skip


def test_short_on_a_coupon_in_a_panel_is_not_the_antennas(
    drawing_tools: SimpleNamespace, jobs: dict[str, Job], coupon: Layout, tmp_path: Path
) -> None:
    """The loops of this panel are cut: only the coupon's ground, measured shorted, joins signal and return."""
    job = jobs["tabbed"]
    beside = drawing_tools.moved(coupon, 0.1, 0.2, "CPN", "")
    pads = tuple(replace(pad, part=own.part) for pad, own in zip(beside.pads, coupon.pads, strict=True))
    holes = job.layout.holes + beside.holes
    both = replace(job.layout, islands=job.layout.islands + beside.islands, holes=holes, pads=job.layout.pads + pads)
    assert both.dc_short
    facts = replace(job.drawing, panel=replace(job.facts.panel, coupon_size_m=(40e-3, 26e-3)))
    notes = fab_notes(both, job.sheet, facts=facts)
    assert "Feed and ground are not connected at DC." in notes
    assert any("and a coupon of 40.000 by 26.000 mm, not taken apart" in note for note in notes)
    write_netlist(both, tmp_path / "netlist.ipc", facts=job.facts.gerber)
    text = (tmp_path / "netlist.ipc").read_text(encoding="ascii")
    assert "GND_CPN joins signal and return at DC" in text
    assert "feed and ground" not in text
    page = cam_readme(both, job.sheet, gerber=job.facts.gerber, drawing=facts)
    assert "Feed and ground are not connected at DC." in page
    assert "0 ohm" not in page
    write_layout_readme(both, tmp_path / "README.txt", status="a test")
    page = " ".join((tmp_path / "README.txt").read_text(encoding="utf-8").split())
    assert "Signal and return of the boards are not connected at DC" in page
    assert "on the coupon: 1 net tie." in page


def test_job_file_has_the_panel_and_its_files(folders: dict[str, Path]) -> None:
    for name, size in {"tabbed": (273.0, 130.0), "scored": (94.0, 54.0), "coupon": (40.0, 26.0)}.items():
        folder = folders[name] / "fabrication"
        job = json.loads((folder / "job.gbrjob").read_text(encoding="utf-8"))
        assert (job["GeneralSpecs"]["Size"]["X"], job["GeneralSpecs"]["Size"]["Y"]) == pytest.approx(size)
        functions = {row["Path"]: row["FileFunction"] for row in job["FilesAttributes"]}
        assert set(functions) == {path.name for path in folder.iterdir() if path.suffix in (".gbr", ".xnc")}
        assert functions.get("array.gbr", "ArrayDrawing") == "ArrayDrawing"
        assert functions.get("score.gbr", "Vcut") == "Vcut"


def test_the_three_geometries_are_one(name: str, jobs: dict[str, Job], folders: dict[str, Path]) -> None:
    """Area of the symmetric difference of DXF, GDS and layer files below what chords of 1 um allow, by level."""
    job, folder = jobs[name], folders[name]
    dxf = read_dxf(folder / "layout" / "board.dxf").outlines
    (cell,) = gdstk.read_gds(folder / "layout" / "board.gds").cells
    for level in job.layout.levels:
        layer = next(layer for layer in LAYERS if layer.name == f"COPPER_{level.name}")
        right = unary_union([outline.shape(0.1e-6) for outline in dxf[layer.name]])
        chords = [Polygon(1e-6 * p.points) for p in cell.polygons if p.layer == layer.gds_layer]
        own = read_gerber(folder / "fabrication" / f"copper-{level}.gbr")
        for shape in (unary_union(chords), unary_union([outline.shape(0.1e-6) for outline in own.filled])):
            assert symmetric_difference(shape, right, grid_size=1e-10).area < 1e-6 * right.length
        assert len(dxf[layer.name]) == len(job.layout.copper(level))
    assert len(dxf["OUTLINE"]) == 1 + len(job.layout.cutouts)
    for score, outline in zip(job.layout.scores, dxf.get("SCORE", ()), strict=True):
        x0, y0, x1, y1 = outline.bounds
        assert sorted((x1 - x0, y1 - y0))[0] == pytest.approx(0.1e-3, abs=1e-9)
        assert (0.5 * (x0 + x1), 0.5 * (y0 + y1)) == pytest.approx(
            [0.5 * (a + b) for a, b in zip(score.start, score.end, strict=True)], abs=1e-9
        )


def test_pictures_show_cutouts_and_scores(folders: dict[str, Path]) -> None:
    space = "{http://www.w3.org/2000/svg}"
    for name, cutouts, scores in (("tabbed", 2, 0), ("scored", 0, 5), ("coupon", 0, 0)):
        root = ElementTree.parse(folders[name] / "layout" / "preview-top.svg").getroot()
        groups = {each.get("class"): each for each in root if each.get("class")}
        assert len(groups["cutouts"].findall(f"{space}path") if cutouts else []) == cutouts
        assert (groups["scores"].get("d").count("M") if scores else 0) == scores
        assert ("cutouts" in groups, "scores" in groups) == (cutouts > 0, scores > 0)
        words = root.find(f"{space}desc").text
        assert "the origin is the feed" not in words
        assert words.startswith("Coupon" if name == "coupon" else "Panel")


def text_of(folder: Path) -> str:
    """All text of the drawing, line breaks as blanks."""
    document = pypdfium2.PdfDocument(folder / "fabrication" / "drawing.pdf")
    return re.sub(r"\s+", " ", " ".join(page.get_textpage().get_text_bounded() for page in document))


def test_drawing_of_a_panel_with_tabs(jobs: dict[str, Job], folders: dict[str, Path]) -> None:
    text = text_of(folders["tabbed"])
    for words in (
        "array, seen from the top", "panel, stackup, impedance, notes", " 0.000 mm from the left",
        "ANT1", "ANT2", "273.000", "130.000",
        "135.000", "138.000", "263.000",  # sides of the boards from the panel's left: 10 + 125, + 3, + 125 mm
        "2 x 1 = 2 boards of 125.000 by 110.000 mm", "left 10 mm, right 10 mm, bottom 10 mm, top 10 mm",
        "columns 3 mm", "tabs 5 mm wide bridge the routed slots", "10 unplated holes of 0.5 mm at 0.8 mm, 2 rows of 5",
        "0.500 mm ±0.100 mm unplated perforation of a tab", "3.200 mm ±0.100 mm unplated tooling hole",
        "3 of 3.2 mm, unplated, at (5.000, 5.000) (268.000, 5.000) (5.000, 125.000) mm from the origin",
        "top 3 of 1 mm, mask opening 2 mm", "bottom 3 of 1 mm, mask opening 2 mm",
        "Bad boards: allowed, crossed out on the rail mark; state the number",
    ):  # fmt: skip
        assert words in text, words
    assert "and the feed" not in text
    assert len(questions(Kind.ARRAY)) > len(questions(Kind.SINGLE))


def test_drawing_of_a_scored_panel(folders: dict[str, Path]) -> None:
    """Thickness 1.6 + 0.043 mm: a third is 0.548 mm, and so is what each of the two cuts takes."""
    text = text_of(folders["scored"])
    for words in (
        "scored along 5 straight lines from both sides", "depth 0.548 mm from each; remaining web 0.548 mm, 33.3 % of",
        "x 47.000 mm from the left side", "y 7.000 mm from the lower side", "columns 0 mm", "Bad boards: none allowed",
    ):  # fmt: skip
        assert words in text, words
    assert "perforation of a tab" not in text


def test_papers_of_a_coupon_speak_of_no_antenna(folders: dict[str, Path]) -> None:
    assert "bare of it on purpose" in text_of(folders["coupon"])
    folder = folders["coupon"] / "fabrication"
    pages = [
        text_of(folders["coupon"]),
        *((folder / n).read_text(encoding="utf-8") for n in ("stackup.md", "stackup.json")),
    ]
    for text in pages:
        assert not re.search(r"antenna|\bfeed\b(?! between)|keepout", text.replace("between_feed", ""))


def test_stations_keep_apart_and_move_least() -> None:
    """Two close ones part about their middle; one far off stays."""
    assert spread([0.0, 1.0, 10.0], 3.0) == pytest.approx([-1.0, 2.0, 10.0])
    assert spread([0.0, 0.0, 0.0], 2.0) == pytest.approx([-2.0, 0.0, 2.0])
    assert spread([], 2.0) == []


# refusals


@pytest.mark.parametrize(
    ("name", "change", "words"),
    [
        ("tabbed", {"columns": 3}, "2 boards in 2 columns and 1 rows, the facts say 3 x 1"),
        ("tabbed", {"board_size_m": (125e-3, 111e-3)}, "a board of 125.000 by 110.000 mm, the facts say"),
        ("tabbed", {"tab_width_m": None}, "perforations, but no width of the tabs"),
        ("tabbed", {"score_web": 0.3}, "0 score lines, the facts say a remaining web of 0.3"),
        ("scored", {"score_web": None}, "5 score lines, the facts say a remaining web of None"),
        ("scored", {"score_web": 1.5}, "expected a fraction between 0 and 1"),
    ],
)
def test_facts_that_contradict_the_panel(name: str, change: dict[str, Any], words: str, jobs: dict[str, Job]) -> None:
    job = jobs[name]
    with pytest.raises(HandoffError, match=re.escape(words)):
        fab_notes(job.layout, job.sheet, facts=replace(job.drawing, panel=replace(job.facts.panel, **change)))


def test_what_a_panel_must_be_told(drawing_tools: SimpleNamespace, jobs: dict[str, Job]) -> None:
    job = jobs["tabbed"]
    with pytest.raises(HandoffError, match="facts of a panel missing"):
        fab_notes(job.layout, job.sheet, facts=replace(job.drawing, panel=None))
    coupon = jobs["coupon"]
    with pytest.raises(HandoffError, match="facts of a panel given"):
        fab_notes(coupon.layout, coupon.sheet, facts=replace(coupon.drawing, panel=drawing_tools.panels["scored"]))
    unmarked = replace(job.layout, islands=tuple(i for i in job.layout.islands if i.role is not Role.MARK))
    with pytest.raises(HandoffError, match="no mark on the rail"):
        fab_notes(unmarked, job.sheet, facts=job.drawing)
    single = replace(job.sheet, facts=replace(job.sheet.facts, kind=Kind.SINGLE))
    with pytest.raises(HandoffError, match="the stackup sheet is of kind single, the layout array"):
        fab_notes(job.layout, single, facts=job.drawing)


def test_layouts_the_formats_cannot_say(drawing_tools: SimpleNamespace, jobs: dict[str, Job], tmp_path: Path) -> None:
    job = jobs["tabbed"]
    holes = tuple(replace(h, plated=h.plated or h.purpose == "perforation") for h in job.layout.holes)
    with pytest.raises(HandoffError, match="a plated perforation hole"):
        drawing_tools.job_of(replace(job.layout, holes=holes), job.facts.panel).write(tmp_path)
    square = tuple(
        replace(i, outline=rectangle(4e-3, 4e-3, 5e-3, 5e-3)) if i.role is Role.FIDUCIAL else i
        for i in job.layout.islands
    )
    with pytest.raises(HandoffError, match="is no disc"):
        drawing_tools.job_of(replace(job.layout, islands=square), job.facts.panel).write(tmp_path)

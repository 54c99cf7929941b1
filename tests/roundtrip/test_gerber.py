"""Layer files written, read again by our reader and by two others, and measured.

Authority: the Gerber layer format specification, revision 2023.08 (commands, regions, attributes, signature), Green's
theorem for areas, and the readers pygerber (strict grammar) and gerbonara, which know nothing of this program.
Coordinates end at the nanometre and so does an arc's centre: outlines may be off by that along their length.
"""

from __future__ import annotations

import hashlib
import itertools
import math
import re
import warnings
from dataclasses import replace
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from hypothesis import assume, given, settings
from hypothesis import strategies as st

from planar.copper.layout import Layout, Level
from planar.copper.outline import Outline
from planar.errors import HandoffError
from planar.handoff.dxf import read_dxf, write_dxf
from planar.handoff.gerber import gerber_text, write_gerber_files
from planar.handoff.gerber_attributes import ProjectFacts, attribute_fields, attribute_text, creation_date
from planar.handoff.gerber_check import gerber_mismatches
from planar.handoff.gerber_content import (
    GERBER_FILES,
    GerberContent,
    GerberFacts,
    GerberFile,
    Region,
    Tags,
    gerber_files,
)
from planar.handoff.gerber_reader import gerber_from_text, read_gerber

with warnings.catch_warnings():
    warnings.simplefilter("ignore", DeprecationWarning)  # raised inside the readers' own imports
    from gerbonara import GerberFile as OtherFile
    from pygerber.gerberx3.parser2.parser2 import Parser2, Parser2OnErrorAction, Parser2Options
    from pygerber.gerberx3.tokenizer.tokenizer import Tokenizer

    TOKENIZER = Tokenizer()

RING = 0.15e-3
NM = 1e-9
HASH = hashlib.sha256(b"a design").hexdigest()


def facts_of(layout: Layout, **changed: Any) -> GerberFacts:
    project = ProjectFacts(layout.name, "A", HASH, creation_date())
    opened = {marking.level for marking in layout.mask_openings}
    masked = tuple(level for level in Level if level in opened | set(layout.levels))
    return replace(GerberFacts(project, masked, RING), **changed)


@pytest.fixture(params=["two_level", "one_level", "ring_guided", "plain", "coplanar"])
def board(request: pytest.FixtureRequest) -> Layout:
    """The hand-drawn boards and three designs."""
    layout: Layout = request.getfixturevalue(request.param)
    return layout


def written(layout: Layout, folder: Path) -> Path:
    write_gerber_files(layout, folder, facts=facts_of(layout))
    return folder


def mismatches(layout: Layout, folder: Path) -> str:
    return "\n".join(gerber_mismatches(layout, folder, facts=facts_of(layout)))


def segment(start: np.ndarray, end: np.ndarray, centre: np.ndarray | None, clockwise: bool) -> float:
    """Integral of (x dy - y dx) / 2 along an edge: chord, and r^2 (angle - sin angle) / 2 for an arc."""
    area = 0.5 * (start[0] * end[1] - start[1] * end[0])
    if centre is not None:
        a, b = start - centre, end - centre
        turn = math.atan2(a[0] * b[1] - a[1] * b[0], a @ b) % math.tau
        turn = turn - math.tau if clockwise else turn
        area += 0.5 * math.hypot(*a) * math.hypot(*b) * (turn - math.sin(turn))
    return float(area)


def area_by_gerbonara(region: Any) -> float:
    """mm2; the outline repeats its first point."""
    points = [np.array(point) for point in region.outline]
    arcs = region.arc_centers or [None] * (len(points) - 1)
    total = 0.0
    for start, end, arc in zip(points, points[1:], arcs, strict=False):
        clockwise, centre = arc if arc else (False, None)
        total += segment(start, end, None if centre is None else np.array(centre), bool(clockwise))
    return total


def parsed(path: Path) -> tuple[list[Any], Any]:
    """Objects and file attributes by the strict grammar and parser of pygerber; raises on anything it does not know."""
    tree = TOKENIZER.tokenize(path.read_text(encoding="ascii"))
    parser = Parser2(Parser2Options(on_update_drawing_state_error=Parser2OnErrorAction.Raise))
    commands = parser.parse(tree).commands
    return list(commands), parser.context.file_attributes


def area_by_pygerber(region: Any) -> float:
    """mm2."""

    def place(vector: Any) -> np.ndarray:
        return np.array([float(vector.x.as_millimeters()), float(vector.y.as_millimeters())])

    total = 0.0
    for edge in region.command_buffer.commands:
        kind = type(edge).__name__
        centre = None if kind == "Line2" else place(edge.center_point)
        total += segment(place(edge.start_point), place(edge.end_point), centre, kind == "Arc2")
    return total


def objects(path: Path, kind: str) -> list[Any]:
    return [command for command in parsed(path)[0] if type(command).__name__ == kind]


def arc_length(outlines: tuple[Outline, ...]) -> float:
    return sum(edge.length for outline in outlines for edge in outline.edges if edge.bulge)


# what is written


def test_same_bytes_twice_and_nothing_but_ascii(board: Layout, tmp_path: Path) -> None:
    for name in ("one", "two"):
        (tmp_path / name).mkdir()
        written(board, tmp_path / name)
    for path in sorted((tmp_path / "one").iterdir()):
        assert path.read_bytes() == (tmp_path / "two" / path.name).read_bytes()
        assert path.read_bytes().isascii()


def test_files_of_a_board(two_level: Layout, one_level: Layout) -> None:
    assert gerber_files(two_level, facts_of(two_level)) == GERBER_FILES
    names = [file.name for file in gerber_files(one_level, facts_of(one_level))]
    assert names == ["copper-top.gbr", "mask-top.gbr", "profile.gbr"]
    bare = replace(one_level, mask_openings=())
    names = [file.name for file in gerber_files(bare, facts_of(bare, masked=()))]
    assert names == ["copper-top.gbr", "profile.gbr"]  # an empty mask file would cover the board
    with pytest.raises(HandoffError, match="top side, which has none"):
        gerber_files(one_level, facts_of(one_level, masked=()))


def test_commands_of_the_standard_in_their_order(board: Layout, tmp_path: Path) -> None:
    """Sections on the file structure, regions and deprecated commands of the specification."""
    for path in sorted(written(board, tmp_path).iterdir()):
        lines = path.read_text(encoding="ascii").splitlines()
        assert lines.count("%FSLAX46Y46*%") == lines.count("%MOMM*%") == lines.count("G75*") == 1
        assert lines[-1] == "M02*"
        assert lines[-2].startswith("%TF.MD5,")
        assert not [line for line in lines if re.match(r"%?(G54|G55|G70|G71|G74|G90|G91|IP|AS|MI|SF|LN|SR|LPC)", line)]
        first_arc = min((i for i, line in enumerate(lines) if line in ("G02*", "G03*")), default=len(lines))
        assert lines.index("G75*") < first_arc
        regions = re.findall(r"^G36\*$(.*?)^G37\*$", "\n".join(lines), re.MULTILINE | re.DOTALL)
        assert all("%" not in region and region.count("D02*") == 1 for region in regions)
        for region in regions:
            places = re.findall(r"(X-?\d+Y-?\d+)(?:I-?\d+J-?\d+)?D0", region)
            assert places[0] == places[-1]
            assert all(a != b for a, b in itertools.pairwise(places))


def test_header(two_level: Layout, tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.delenv("SOURCE_DATE_EPOCH", raising=False)
    folder = written(two_level, tmp_path)
    for file in GERBER_FILES:
        attributes = read_gerber(folder / file.name).attributes
        assert attributes[".FileFunction"] == file.function
        assert attributes[".FilePolarity"] == (file.polarity,)
        assert attributes[".Part"] == ("Single",)
        name, guid, revision = attributes[".ProjectId"]
        assert (name, revision) == (two_level.name, "A")
        # RFC 4122, section 4.4: version 4 and the variant bits
        assert re.fullmatch(r"[0-9a-f]{8}-[0-9a-f]{4}-4[0-9a-f]{3}-[89ab][0-9a-f]{3}-[0-9a-f]{12}", guid)
        assert re.fullmatch(r"\d{4}-\d\d-\d\dT\d\d:\d\d:\d\d[+-]\d\d:\d\d", attributes[".CreationDate"][0])
    assert {file.polarity for file in GERBER_FILES if file.holds == "mask"} == {"Negative"}


def test_creation_date(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setenv("SOURCE_DATE_EPOCH", "1700000000")
    assert creation_date() == "2023-11-14T22:13:20+00:00"  # date -u -d @1700000000
    monkeypatch.setenv("SOURCE_DATE_EPOCH", "yesterday")
    with pytest.raises(HandoffError, match="SOURCE_DATE_EPOCH"):
        creation_date()
    with pytest.raises(HandoffError, match="with zone"):
        ProjectFacts("a", "1", HASH, "2023-11-14T22:13:20")
    with pytest.raises(HandoffError, match="design hash"):
        ProjectFacts("a", "1", "abc", "2023-11-14T22:13:20+00:00")


def test_other_alphabets_and_reserved_characters_are_escaped() -> None:
    r"""The specification writes them as \uXXXX; U+1F4E1 by its two UTF-16 units D83D DCE1 (Unicode, section 3.9)."""
    assert attribute_text(".N", ("50%,*\\",)) == r".N,50\u0025\u002C\u002A\u005C"
    assert attribute_text(".N", ("Ø\U0001f4e1",)) == r".N,\u00D8\uD83D\uDCE1"


@given(st.lists(st.text(st.characters(exclude_categories=["Cs"])), min_size=1, max_size=3))
def test_attributes_come_back(fields: list[str]) -> None:
    assert attribute_fields(attribute_text(".ProjectId", tuple(fields))) == (".ProjectId", tuple(fields))


# what the readers say


def test_our_reader_finds_no_difference(board: Layout, tmp_path: Path) -> None:
    assert gerber_mismatches(board, written(board, tmp_path), facts=facts_of(board)) == []


def test_area_of_the_copper_comes_back(board: Layout, tmp_path: Path) -> None:
    folder = written(board, tmp_path)
    for level in board.levels:
        regions = read_gerber(folder / f"copper-{level}.gbr").regions
        assert len(regions) == len(board.copper(level))
        area = sum(region.outline.area for region in regions)
        assert area == pytest.approx(board.area(level), rel=1e-12, abs=NM * arc_length(board.copper(level)))


@pytest.mark.parametrize("name", ["two_level", "one_level"])
def test_area_to_a_part_in_1e9_where_the_centres_lie_near_the_grid(
    name: str, tmp_path: Path, request: pytest.FixtureRequest
) -> None:
    layout: Layout = request.getfixturevalue(name)
    folder = written(layout, tmp_path)
    for level in layout.levels:
        area = sum(region.outline.area for region in read_gerber(folder / f"copper-{level}.gbr").regions)
        assert area == pytest.approx(layout.area(level), rel=1e-9)


def test_other_readers_take_every_file_without_a_warning_and_measure_the_same(board: Layout, tmp_path: Path) -> None:
    """Areas by their geometry and Green's theorem against those of the DXF twin and the layout, to 1e-6."""
    folder = written(board, tmp_path)
    write_dxf(board, tmp_path / "board.dxf")
    dxf = read_dxf(tmp_path / "board.dxf").outlines
    for file in gerber_files(board, facts_of(board)):
        other = OtherFile.open(folder / file.name)
        commands, attributes = parsed(folder / file.name)
        assert other.file_attrs[".FileFunction"] == file.function
        assert attributes.get(".FileFunction") == ",".join(file.function)
        assert attributes.get(".FilePolarity") == file.polarity
        if file.holds in ("copper", "legend"):
            expected = 1e6 * sum(outline.area for outline in dxf[f"{file.holds.upper()}_{file.level.name}"])
            regions = [each for each in other.objects if type(each).__name__ == "Region"]
            assert sum(map(area_by_gerbonara, regions)) == pytest.approx(expected, rel=1e-6)
            again = [command for command in commands if type(command).__name__ == "Region2"]
            assert sum(map(area_by_pygerber, again)) == pytest.approx(expected, rel=1e-6)
            assert len(regions) == len(again) == len(dxf[f"{file.holds.upper()}_{file.level.name}"])


def test_profile_is_one_closed_line(board: Layout, tmp_path: Path) -> None:
    commands, _ = parsed(written(board, tmp_path) / "profile.gbr")
    assert all(command.start_point == before.end_point for before, command in itertools.pairwise(commands))
    assert commands[0].start_point == commands[-1].end_point
    assert {float(command.aperture.diameter.as_millimeters()) for command in commands} == {0.1}
    assert {command.aperture.attributes.get(".AperFunction") for command in commands} == {"Profile"}
    (x0, y0, x1, y1) = (
        OtherFile.open(tmp_path / "profile.gbr").bounding_box()[0]
        + (OtherFile.open(tmp_path / "profile.gbr").bounding_box()[1])
    )
    width, height = board.size
    assert (x1 - x0 - 0.1, y1 - y0 - 0.1) == pytest.approx((1e3 * width, 1e3 * height), abs=1e-5)


def test_nets_and_functions_as_another_reader_sees_them(ring_guided: Layout, tmp_path: Path) -> None:
    """The loop shorts feed and ground: radiator, line and every land are one net, the radiator a component."""
    assert ring_guided.dc_short
    folder = written(ring_guided, tmp_path)
    bottom = objects(folder / "copper-bottom.gbr", "Region2")
    assert {(r.aperture_attributes.get(".AperFunction"), r.object_attributes.N) for r in bottom} == {
        ("EtchedComponent", "ANT")
    }
    assert {r.object_attributes.C for r in bottom} == {"ANT1"}
    top = objects(folder / "copper-top.gbr", "Region2")
    assert {(r.aperture_attributes.get(".AperFunction"), r.object_attributes.N) for r in top} == {("Conductor", "ANT")}
    assert not any(r.object_attributes.C for r in top)
    for level in Level:
        flashes = objects(folder / f"copper-{level}.gbr", "Flash2")
        seen = [
            (
                round(float(flash.flash_point.x.as_millimeters()), 5),
                round(float(flash.flash_point.y.as_millimeters()), 5),
                flash.aperture.attributes.get(".AperFunction"),
                flash.attributes.N,
                flash.attributes.P.number if flash.attributes.P else None,
            )
            for flash in flashes
        ]
        pads = [pad for pad in ring_guided.pads if pad.level is level]
        lands = [(*middle(pad.outline), "SMDPad,CuDef", "ANT", pad.name) for pad in pads]
        vias = [hole for hole in ring_guided.holes if hole.plated]
        rings = [(*(round(1e3 * c, 5) for c in hole.centre), "ViaPad", "ANT", None) for hole in vias]
        assert sorted(seen, key=str) == sorted([*lands, *rings], key=str)
        assert vias


def middle(outline: Outline) -> tuple[float, float]:
    x0, y0, x1, y1 = outline.bounds
    return round(500.0 * (x0 + x1), 5), round(500.0 * (y0 + y1), 5)


def test_nets_where_the_loop_is_cut(two_level: Layout, tmp_path: Path) -> None:
    folder = written(two_level, tmp_path)
    nets = [region.object_attributes.N for region in objects(folder / "copper-bottom.gbr", "Region2")]
    assert sorted(nets) == ["RETURN", "SIGNAL"]
    assert [r.object_attributes.N for r in objects(folder / "copper-top.gbr", "Region2")] == ["SIGNAL"]


def test_lands_with_curved_sides_are_flashed_as_polygons(plain: Layout, tmp_path: Path) -> None:
    """Area by the bounding polygon another reader makes of the macro, against the land; chords are 0.1 um off."""
    assert any(np.any(pad.outline.vertices[:, 2]) for pad in plain.pads)
    path = written(plain, tmp_path) / "copper-top.gbr"
    lands = [each for each in OtherFile.open(path).objects if type(each).__name__ == "Flash"]
    assert len(lands) == len(plain.pads) == len(objects(path, "Flash2"))
    for land, pad in zip(lands, plain.pads, strict=True):
        (primitive,) = land.to_primitives()
        points = np.array(primitive.outline)
        following = np.roll(points, -1, axis=0)
        area = 0.5 * abs(np.sum(points[:, 0] * following[:, 1] - points[:, 1] * following[:, 0]))
        allowed = 1e6 * 1e-7 * pad.outline.perimeter
        assert area == pytest.approx(1e6 * pad.outline.area, abs=allowed)
        centre = 0.5 * (points.max(axis=0) + points.min(axis=0))
        assert tuple(centre) == pytest.approx(middle(pad.outline), abs=2e-4)


def test_mask_openings_of_lands_are_flashes_on_their_centres(two_level: Layout, tmp_path: Path) -> None:
    (flash,) = objects(written(two_level, tmp_path) / "mask-top.gbr", "Flash2")
    assert float(flash.aperture.diameter.as_millimeters()) == 1.7
    assert (float(flash.flash_point.x.as_millimeters()), float(flash.flash_point.y.as_millimeters())) == (-25.0, 45.0)
    assert len(objects(tmp_path / "mask-bottom.gbr", "Region2")) == 1  # rounded corners are no rectangle


# arcs


lengths = st.integers(min_value=-(10**8), max_value=10**8).map(lambda n: n * NM)
bulges = st.floats(min_value=1e-6, max_value=30.0).flatmap(lambda b: st.sampled_from([b, -b]))


def of_one_region(outline: Outline) -> str:
    return gerber_text(GerberContent({}, (Region(outline, Tags()),)))


@settings(max_examples=400)
@given(lengths, lengths, lengths, lengths, bulges)
def test_any_arc_keeps_its_ends_its_shape_and_the_rules(a: float, b: float, c: float, d: float, bulge: float) -> None:
    """Ends to the nanometre; radii within 2 nm; at most half a circle; the area within 3 nm along the outline."""
    assume(math.dist((a, b), (c, d)) > 1e-5)
    side = math.copysign(0.5, bulge)  # the third corner lies away from the arc
    corner = (0.5 * (a + c) - side * (d - b), 0.5 * (b + d) + side * (c - a))
    outline = Outline(np.array([(a, b, bulge), (c, d, 0.0), (*corner, 0.0)]))
    assume(max(map(abs, outline.bounds)) < 5.0)
    text = of_one_region(outline)
    start = np.array([float(n) for n in re.findall(r"X(-?\d+)Y(-?\d+)D02", text)[0]])
    for x, y, i, j in re.findall(r"X(-?\d+)Y(-?\d+)(?:I(-?\d+)J(-?\d+))?D01", text):
        end = np.array([float(x), float(y)])
        if i:
            first, last = np.array([-float(i), -float(j)]), end - start - np.array([float(i), float(j)])
            assert abs(math.hypot(*first) - math.hypot(*last)) <= 2.0
        start = end
    content = gerber_from_text(text)
    assert content.faults == ()
    (region,) = content.regions
    assert region.outline.vertices[0, :2].tolist() == pytest.approx([a, b], abs=1e-15)
    assert all(abs(edge.bulge) <= 1.0 + 1e-3 for edge in region.outline.edges)
    assert region.outline.area == pytest.approx(outline.area, abs=3.0 * NM * outline.perimeter)


def test_flattest_arcs_become_chords_a_nanometre_from_them() -> None:
    """A chord of 20 mm that rises 100 nm lies on a circle of 500 m, which ten metres of format cannot hold."""
    outline = Outline(np.array([(0.0, 0.0, 0.0), (0.02, 0.0, 1e-5), (0.02, 0.02, 0.0), (0.0, 0.02, 0.0)]))
    (region,) = gerber_from_text(of_one_region(outline)).regions
    assert all(edge.bulge == 0.0 for edge in region.outline.edges)
    expected = 4e-4 + 0.02 * 1e-7 * 2.0 / 3.0  # a flat arc holds two thirds of its rectangle
    assert region.outline.area == pytest.approx(expected, abs=2.0 * NM * 0.02)
    with pytest.raises(HandoffError, match="ends at 10 m"):
        of_one_region(outline.translated(9.99, 0.0))


def test_table_names_every_file_once() -> None:
    assert len({file.name for file in GERBER_FILES}) == len({file.function for file in GERBER_FILES}) == 7
    assert all(isinstance(file, GerberFile) and file.name.endswith(".gbr") for file in GERBER_FILES)

"""Netlists written, read again by our reader and by another, and spoilt one fault at a time.

Authority: IPC-D-356A (columns, units, record types, mask and access codes) as its published samples show it, and the
reader of gerbonara, which knows nothing of this program. Tolerance: the format counts thousandths of a millimetre.
"""

from __future__ import annotations

import re
import warnings
from collections.abc import Callable
from dataclasses import replace
from pathlib import Path

import pytest

from planar.copper.boolean import contains
from planar.copper.layout import Hole, Island, Layout, Level, Marking, Pad
from planar.copper.shapes import circle, rectangle
from planar.errors import HandoffError
from planar.handoff.gerber_attributes import ProjectFacts, creation_date
from planar.handoff.gerber_content import GerberFacts
from planar.handoff.netlist import NETLIST, netlist_mismatches, netlist_records, read_netlist, write_netlist
from planar.handoff.netlist_record import record_line

with warnings.catch_warnings():
    warnings.simplefilter("ignore", DeprecationWarning)  # raised inside the reader's own imports
    from gerbonara.ipc356 import Netlist as OtherNetlist
    from gerbonara.ipc356 import PadType, SoldermaskInfo
    from gerbonara.utils import MM

PROJECT = ProjectFacts("orchard", "A", "0123456789abcdef" * 4, creation_date())
FACTS = GerberFacts(PROJECT, (Level.TOP, Level.BOTTOM), 0.15e-3)
HALF_STEP = 0.501e-3
"""mm, half the format's step."""


@pytest.fixture(params=["two_level", "one_level", "drawn"])
def board(request: pytest.FixtureRequest) -> Layout:
    layout: Layout = request.getfixturevalue(request.param)
    return layout


@pytest.fixture
def folder(board: Layout, tmp_path: Path) -> Path:
    write_netlist(board, tmp_path / NETLIST, facts=FACTS)
    return tmp_path


def records(folder: Path) -> list[str]:
    return [line for line in (folder / NETLIST).read_text(encoding="ascii").splitlines() if line.startswith("3")]


def test_same_bytes_twice(board: Layout, folder: Path) -> None:
    write_netlist(board, folder / "again", facts=FACTS)
    assert (folder / NETLIST).read_bytes() == (folder / "again").read_bytes()


def test_other_reader_sees_lands_holes_and_nets(board: Layout, folder: Path) -> None:
    netlist = OtherNetlist.open(folder / NETLIST)  # warnings are errors: it must have none
    assert netlist.import_settings.unit == MM
    assert netlist.params["JOB"] == "orchard"
    lands = [r for r in netlist.test_records if r.pad_type is PadType.SMD_PAD]
    assert [(r.net_name, r.ref_des, r.pin) for r in lands] == [
        (pad.net, "ANT1", str(i)) for i, pad in enumerate(board.pads, 1)
    ]
    for record, pad in zip(lands, board.pads, strict=True):
        assert record.access_layer == {Level.TOP: 1, Level.BOTTOM: 2}[pad.level]
        assert contains(pad.outline, (1e-3 * record.x, 1e-3 * record.y))
        assert not record.is_middle
    vias = [r for r in netlist.test_records if r.pad_type is PadType.THROUGH_HOLE]
    bare = [r for r in netlist.test_records if r.pad_type is PadType.NONPLATED_HOLE]
    for found, plated in ((vias, True), (bare, False)):
        holes = [hole for hole in board.holes if hole.plated == plated]
        assert len(found) == len(holes)
        for record, hole in zip(found, holes, strict=True):
            assert record.is_plated == plated
            assert record.net_name == (hole.net or None)
            assert record.hole_dia == pytest.approx(1e3 * hole.diameter, abs=HALF_STEP)
            assert (record.x, record.y) == pytest.approx([1e3 * c for c in hole.centre], abs=HALF_STEP)


def test_rectangular_land_has_its_sides_and_its_middle(drawn: Layout, tmp_path: Path) -> None:
    write_netlist(drawn, tmp_path / NETLIST, facts=FACTS)
    for record, pad in zip(OtherNetlist.open(tmp_path / NETLIST).test_records, drawn.pads, strict=False):
        x0, y0, x1, y1 = (1e3 * c for c in pad.outline.bounds)
        expected = (0.5 * (x0 + x1), 0.5 * (y0 + y1), x1 - x0, y1 - y0)
        assert (record.x, record.y, record.w, record.h) == pytest.approx(expected, abs=HALF_STEP)


def test_round_land_has_its_diameter(two_level: Layout, tmp_path: Path) -> None:
    write_netlist(two_level, tmp_path / NETLIST, facts=FACTS)
    first, second = OtherNetlist.open(tmp_path / NETLIST).test_records[:2]
    assert (first.w, first.h, second.w, second.h) == pytest.approx((1.5, 0.0, 3.0, 0.0), abs=HALF_STEP)


def test_loop_is_one_net_with_two_end_points(drawn: Layout, tmp_path: Path) -> None:
    """Its continuity is then tested; vias lie between the ends."""
    assert drawn.dc_short
    write_netlist(drawn, tmp_path / NETLIST, facts=FACTS)
    netlist = OtherNetlist.open(tmp_path / NETLIST)
    assert netlist.net_names() == {"ANT"}
    ends = [r for r in netlist.records_by_net_name("ANT") if not r.is_middle]
    assert len(ends) >= 2
    assert {r.pin for r in ends} >= {"1", "2"}
    assert all(r.is_middle for r in netlist.vias())


def test_mask_code_names_the_covered_sides(two_level: Layout, one_level: Layout, tmp_path: Path) -> None:
    """S1 top, S2 bottom, S3 both covered: the land opened on the top keeps mask below it, the via under it too."""
    write_netlist(two_level, tmp_path / NETLIST, facts=FACTS)
    signal, back, via, *_ = OtherNetlist.open(tmp_path / NETLIST).test_records
    assert signal.solder_mask is SoldermaskInfo.SECONDARY
    assert via.solder_mask is SoldermaskInfo.SECONDARY
    assert back.solder_mask is SoldermaskInfo.BOTH
    for masked, code in (((Level.TOP,), 0), ((), 0), ((Level.TOP, Level.BOTTOM), 2)):
        facts = replace(FACTS, masked=masked)
        write_netlist(one_level, tmp_path / NETLIST, facts=facts)
        assert {r.solder_mask.value for r in OtherNetlist.open(tmp_path / NETLIST).test_records} == {code}
        assert netlist_mismatches(one_level, tmp_path, facts=facts) == []


def test_columns_are_those_of_the_published_sample() -> None:
    """Three lines of a sample known to be read everywhere; trailing blanks fill the 80 columns."""
    sample = [
        "327RF               ANT1  -1          A01X+000000Y-008000X1000Y0600R000 S2",
        "317GND              VIA        MD0300PA00X-008000Y-008000X0600Y0000R000 S3",
        "367                             D3200UA00X+010000Y+010000",
    ]
    edge = rectangle(-0.02, -0.02, 0.02, 0.02)
    land, back = rectangle(-0.5e-3, -8.3e-3, 0.5e-3, -7.7e-3), rectangle(-8.5e-3, -8.5e-3, -7.5e-3, -7.5e-3)
    layout = Layout(
        "sample", (Level.TOP, Level.BOTTOM),
        (Island(Level.TOP, land, "line", "RF"), Island(Level.TOP, back, "ground", "GND")),
        (Hole((-8e-3, -8e-3), 0.3e-3, True, "via", "GND"), Hole((10e-3, 10e-3), 3.2e-3, False, "mounting")),
        (Pad("1", Level.TOP, land, "signal", "RF"), *(
            Pad(str(i), Level.TOP, back.translated(0.0, 0.0), "return", "GND") for i in (2, 3)
        )),
        (), (Marking(Level.TOP, land),), (), edge, (),
    )  # fmt: skip
    lines = [record_line(r, {}) for r in netlist_records(layout, FACTS)]
    assert all(len(line) == 80 for line in lines)
    assert [lines[i].rstrip() for i in (0, 3, 4)] == sample


def test_lines_keep_to_80_columns(folder: Path) -> None:
    lines = (folder / NETLIST).read_text(encoding="ascii").splitlines()
    assert max(len(line) for line in lines) <= 80
    assert all(len(line) == 80 for line in records(folder))
    assert [line for line in lines if line.startswith("P")] == ["P  JOB orchard", "P  UNITS CUST 1"]
    assert lines[-1] == "999"


def test_long_names_are_mapped_and_listed(one_level: Layout, tmp_path: Path) -> None:
    """Names of more than 14 letters, with blanks or other alphabets: one short name each, read back in full."""
    names = {"signal": "the loop, signal side " + "x" * 120, "return": "Schleife, Rückseite \\ 2"}
    pads = tuple(replace(pad, net=names[pad.terminal], name=f"{pad.name} ü") for pad in one_level.pads)
    layout = replace(one_level, pads=pads)
    write_netlist(layout, tmp_path / NETLIST, facts=FACTS)
    other = OtherNetlist.open(tmp_path / NETLIST)
    assert len(other.net_names()) == len(set(names.values()))
    assert all(len(name) <= 14 for name in other.net_names())
    assert [r.net for r in read_netlist(tmp_path / NETLIST).records] == [pad.net for pad in pads]
    assert netlist_mismatches(layout, tmp_path, facts=FACTS) == []
    assert max(len(line) for line in (tmp_path / NETLIST).read_text(encoding="ascii").splitlines()) <= 80


def test_what_six_or_four_digits_cannot_hold(one_level: Layout, tmp_path: Path) -> None:
    far = replace(one_level, holes=(Hole((1.0, 0.0), 3e-3, False, "mounting"),))
    with pytest.raises(HandoffError, match=r"999\.999 mm"):
        write_netlist(far, tmp_path / NETLIST, facts=FACTS)
    wide = replace(one_level, holes=(Hole((0.0, 0.0), 10e-3, False, "mounting"),))
    with pytest.raises(HandoffError, match=r"9\.999 mm"):
        write_netlist(wide, tmp_path / NETLIST, facts=FACTS)
    large = replace(one_level.pads[0], outline=rectangle(-6e-3, 0.0, 6e-3, 2e-3))
    layout = replace(one_level, pads=(large, one_level.pads[1]))
    write_netlist(layout, tmp_path / NETLIST, facts=FACTS)
    assert "larger than the columns hold" in (tmp_path / NETLIST).read_text(encoding="ascii")
    assert netlist_mismatches(layout, tmp_path, facts=FACTS) == []


def test_netlist_of_another_board_is_reported(drawn: Layout, tmp_path: Path) -> None:
    """One land alone leaves nothing to measure the loop between."""
    one = next(pad for pad in drawn.pads if pad.terminal == "signal")
    write_netlist(replace(drawn, pads=(one,), holes=()), tmp_path / NETLIST, facts=FACTS)
    assert any("1 end points, expected at least 2" in text for text in netlist_mismatches(drawn, tmp_path, facts=FACTS))


def test_own_reader_finds_what_was_written(board: Layout, folder: Path) -> None:
    netlist = read_netlist(folder / NETLIST)
    assert netlist.faults == ()
    assert (netlist.job, netlist.units) == ("orchard", "CUST 1")
    assert [netlist.named[f"ANT1-{i}"] for i in range(1, len(board.pads) + 1)] == [pad.name for pad in board.pads]
    assert netlist_mismatches(board, folder, facts=FACTS) == []


def in_text(pattern: str, replacement: str) -> Callable[[str], str]:
    def plant(text: str) -> str:
        return re.sub(pattern, replacement, text, flags=re.MULTILINE)

    return plant


def moved(text: str) -> str:
    """Every land 0.1 mm to the right."""
    return re.sub(
        r"^(327.{38}X)([+-]\d{6})", lambda match: f"{match[1]}{int(match[2]) + 100:+07d}", text, flags=re.MULTILINE
    )


FAULTS: dict[str, tuple[Callable[[str], str], str]] = {
    "net removed": (in_text(r"^327ANT .*\n", ""), "land ANT1-1 .* is missing"),
    "net renamed": (in_text(r"^327ANT ", "327XYZ "), r"net XYZ, expected ANT"),
    "every record of the net removed": (in_text(r"^3[12]7.*\n", ""), "net ANT is missing"),
    "end point missing": (in_text(r"^(327.*ANT1  -[2-9].*)\n", ""), r"ANT: 1 end points, expected at least 2"),
    "end points made midpoints": (in_text(r"^(327.{28}) ", r"\1M"), r"ANT: 0 end points"),
    "land moved by 0.1 mm": (moved, r"land ANT1-1 .* is moved to"),
    "inches": (in_text("^P  UNITS CUST 1$", "P  UNITS CUST 0"), r"UNITS CUST 0, expected CUST 1"),
    "no units": (in_text("^P  UNITS CUST 1\n", ""), "UNITS missing"),
    "unplated hole lost": (in_text(r"^367.*\n", ""), "unplated hole at .* is missing"),
    "plated as unplated": (in_text(r"^(317.{34})P", r"\1U"), "plating U, expected P"),
    "via lost": (in_text(r"^317.*\n", ""), "plated hole at .* is missing"),
    "hole of another diameter": (in_text("D0300", "D0350"), r"hole 0\.350 mm, expected 0\.300 mm"),
    "other side": (in_text("A01X", "A02X"), "access 2, expected 1"),
    "covered land": (in_text(r"S[012](?= {6}$)", "S3"), r"solder mask 3, expected"),
    "land of another size": (in_text(r"X1500Y4200", "X1500Y0420"), r"height 0\.420 mm, expected 4\.200 mm"),
    "pin called otherwise": (in_text(r'ANT1-1 = "signal"', 'ANT1-1 = "ground"'), "is called ground"),
    "column slipped": (in_text(r"^327(.*) $", r"327 \1"), "expected a record of 80 columns"),
    "end cut off": (in_text("^999\n", ""), "no 999"),
    "record invented": (in_text(r"^(367.*\n)", r"\1\1"), "expected none"),
}


@pytest.mark.parametrize("fault", FAULTS)
def test_planted_fault_is_reported(drawn: Layout, tmp_path: Path, fault: str) -> None:
    path = tmp_path / NETLIST
    write_netlist(drawn, path, facts=FACTS)
    assert netlist_mismatches(drawn, tmp_path, facts=FACTS) == []
    plant, words = FAULTS[fault]
    text = path.read_text(encoding="ascii")
    spoilt = plant(text)
    assert spoilt != text
    path.write_text(spoilt, encoding="ascii")
    assert re.search(words, "\n".join(netlist_mismatches(drawn, tmp_path, facts=FACTS)))


def test_records_in_another_order_are_the_same_board(drawn: Layout, tmp_path: Path) -> None:
    write_netlist(drawn, tmp_path / NETLIST, facts=FACTS)
    lines = (tmp_path / NETLIST).read_text(encoding="ascii").splitlines()
    records = [line for line in lines if line[:3] in ("317", "327", "367")]
    others = [line for line in lines[:-1] if line not in records]
    (tmp_path / NETLIST).write_text("\n".join([*others, *records[::-1], "999"]) + "\n", encoding="ascii")
    assert netlist_mismatches(drawn, tmp_path, facts=FACTS) == []


def test_file_that_is_gone_is_reported(drawn: Layout, tmp_path: Path) -> None:
    assert "cannot be read" in netlist_mismatches(drawn, tmp_path, facts=FACTS)[0]


def test_rounded_middle_of_an_arc_land_stays_on_copper(one_level: Layout, tmp_path: Path) -> None:
    """A land that is neither rectangle nor circle is probed where a circle of the stated diameter fits."""
    ring = one_level.islands[0].outline
    pads = (replace(one_level.pads[0], outline=ring), one_level.pads[1])
    write_netlist(replace(one_level, pads=pads), tmp_path / NETLIST, facts=FACTS)
    record = OtherNetlist.open(tmp_path / NETLIST).test_records[0]
    spot = circle((1e-3 * record.x, 1e-3 * record.y), 1e-3 * record.w - 2e-6)
    assert ring.shape().contains(spot.shape())
    assert record.h == 0.0

"""Drill files written, read again by our reader and by another, and spoilt one fault at a time.

Authority: the XNC format specification (head, tools, holes, attributes in comments), the Gerber layer format
specification, revision 2023.08, for the attributes' values, and the reader of gerbonara, which knows nothing of this
program. Tolerance: coordinates are whole nanometres, so that 1 nm covers rounding.
"""

from __future__ import annotations

import re
import warnings
from collections.abc import Callable
from dataclasses import replace
from pathlib import Path

import pytest

from planar.copper.layout import Hole, Layout
from planar.errors import HandoffError
from planar.handoff.drill_file import DRILL_FILES, drill_mismatches, drill_names, read_drill, write_drill, write_drills
from planar.handoff.gerber_attributes import ProjectFacts, creation_date

with warnings.catch_warnings():
    warnings.simplefilter("ignore", DeprecationWarning)  # raised inside the reader's own imports
    from gerbonara.excellon import ExcellonFile
    from gerbonara.utils import MM

PROJECT = ProjectFacts("two level, 868 MHz", "A", "0123456789abcdef" * 4, creation_date())
PLATED, UNPLATED = DRILL_FILES[True], DRILL_FILES[False]


@pytest.fixture(params=["two_level", "drawn"])
def board(request: pytest.FixtureRequest) -> Layout:
    layout: Layout = request.getfixturevalue(request.param)
    return layout


@pytest.fixture
def folder(board: Layout, tmp_path: Path) -> Path:
    write_drills(board, tmp_path, facts=PROJECT)
    return tmp_path


def test_same_bytes_twice(board: Layout, folder: Path) -> None:
    again = folder / "again"
    again.mkdir()
    write_drills(board, again, facts=PROJECT)
    for name in DRILL_FILES.values():
        assert (folder / name).read_bytes() == (again / name).read_bytes()


def test_other_reader_sees_the_same_holes(board: Layout, folder: Path) -> None:
    for plated, name in DRILL_FILES.items():
        file = ExcellonFile.open(folder / name)  # warnings are errors: it must have none
        assert not list(file.slots())
        got = sorted((hit.x, hit.y, hit.tool.equivalent_width(MM)) for hit in file.drills())
        expected = sorted(
            (1e3 * h.centre[0], 1e3 * h.centre[1], 1e3 * h.diameter) for h in board.holes if h.plated == plated
        )
        assert len(got) == len(expected)
        for here, right in zip(got, expected, strict=True):
            assert here == pytest.approx(right, abs=1e-6)


def test_own_reader_finds_what_was_written(board: Layout, folder: Path) -> None:
    for plated, name in DRILL_FILES.items():
        file = read_drill(folder / name)
        assert file.faults == ()
        assert file.attributes[".ProjectId"] == (PROJECT.name, PROJECT.guid, "A")
        assert {hit.function for hit in file.hits} == ({"ViaDrill"} if plated else {"MechanicalDrill"})
    assert read_drill(folder / PLATED).attributes[".FileFunction"] == ("Plated", "1", "2", "PTH")
    assert read_drill(folder / UNPLATED).attributes[".FileFunction"] == ("NonPlated", "1", "2", "NPTH")
    assert drill_mismatches(board, folder, facts=PROJECT) == []


def test_lines_are_those_of_the_format(folder: Path) -> None:
    """The form that fabs take: head, tools, %, G05, numbers with decimal points, M30; no zero suppression, no G90."""
    for name in DRILL_FILES.values():
        lines = (folder / name).read_text(encoding="ascii").splitlines()
        assert lines[0] == "M48"
        assert lines[-1] == "M30"
        code = [line for line in lines if not line.startswith(";")]
        tools = [line for line in code if re.fullmatch(r"T\d+C\d+\.\d{3,6}", line)]
        assert code[: 3 + len(tools) + 1] == ["M48", "METRIC", *tools, "%", "G05"]
        rest = code[4 + len(tools) : -1]
        assert all(re.fullmatch(r"T\d+|X-?\d+\.\d{3,6}Y-?\d+\.\d{3,6}", line) for line in rest)


def test_one_tool_for_each_function_and_diameter_sorted(two_level: Layout, tmp_path: Path) -> None:
    extra = (
        Hole((0.0, -0.045), 0.3e-3, True, "mounting"),
        Hole((0.01, -0.045), 0.25e-3, True, "via"),
        Hole((0.012, -0.045), 0.3e-3, True, "via"),
    )
    layout = replace(two_level, holes=two_level.holes + extra).snapped()
    write_drill(layout, tmp_path / PLATED, plated=True, facts=PROJECT)
    file = ExcellonFile.open(tmp_path / PLATED)
    assert sorted((tool.diameter, count) for tool, count in file.hit_count().items()) == [(0.25, 1), (0.3, 3)]
    text = (tmp_path / PLATED).read_text(encoding="ascii")
    assert re.findall(r"^T(\d)C(.*)$", text, re.MULTILINE) == [("1", "0.250"), ("2", "0.300"), ("3", "0.300")]
    assert re.findall(r"TA\.AperFunction,(\w+)", text) == ["ViaDrill", "ComponentDrill", "ViaDrill"]
    own = read_drill(tmp_path / PLATED)
    assert own.faults == ()
    assert sorted(hit.function for hit in own.hits) == ["ComponentDrill", "ViaDrill", "ViaDrill", "ViaDrill"]


def test_holes_in_another_order_are_the_same_board(two_level: Layout, tmp_path: Path) -> None:
    extra = (Hole((0.012, -0.045), 0.3e-3, True, "via"), Hole((0.02, -0.045), 0.3e-3, True, "via"))
    layout = replace(two_level, holes=two_level.holes + extra)
    write_drill(replace(layout, holes=layout.holes[::-1]), tmp_path / PLATED, plated=True, facts=PROJECT)
    write_drill(layout, tmp_path / UNPLATED, plated=False, facts=PROJECT)
    texts = drill_mismatches(layout, tmp_path, facts=PROJECT)
    assert [text for text in texts if "meets no copper" not in text and "cuts the edge" not in text] == []


def test_board_without_holes_has_no_file(one_level: Layout, tmp_path: Path) -> None:
    write_drills(one_level, tmp_path, facts=PROJECT)
    assert list(tmp_path.iterdir()) == []
    assert drill_mismatches(one_level, tmp_path, facts=PROJECT) == []
    with pytest.raises(HandoffError, match="0 tools"):
        write_drill(one_level, tmp_path / PLATED, plated=True, facts=PROJECT)


def test_names_are_those_of_the_files_written(two_level: Layout, one_level: Layout, tmp_path: Path) -> None:
    write_drills(two_level, tmp_path, facts=PROJECT)
    assert {path.name for path in tmp_path.iterdir()} == set(drill_names(two_level)) == set(DRILL_FILES.values())
    assert drill_names(one_level) == ()


def in_text(name: str, pattern: str, replacement: str | Callable[[re.Match[str]], str]) -> Callable[[Path], None]:
    """A fault: a change of the text of a file."""

    def plant(folder: Path) -> None:
        path = folder / name
        text = path.read_text(encoding="ascii")
        changed = re.sub(pattern, replacement, text, flags=re.MULTILINE)
        assert changed != text
        path.write_text(changed, encoding="ascii")

    return plant


def shifted(match: re.Match[str]) -> str:
    return f"X{float(match[1]) + 0.1:.6f}"


def swapped(folder: Path) -> None:
    plated = (folder / PLATED).read_bytes()
    (folder / PLATED).write_bytes((folder / UNPLATED).read_bytes())
    (folder / UNPLATED).write_bytes(plated)


FAULTS = {
    "plated holes shifted by 0.1 mm": (in_text(PLATED, r"^X([-\d.]+)", shifted), "hole at .* expected"),
    "unplated holes shifted by 0.1 mm": (in_text(UNPLATED, r"^X([-\d.]+)", shifted), "hole at .* expected"),
    "files swapped": (swapped, r"\.FileFunction NonPlated,1,2,NPTH, expected Plated,1,2,PTH"),
    "hole lost": (in_text(UNPLATED, r"^X.*\n", ""), r"\d holes, expected \d"),
    "wrong diameter": (in_text(PLATED, r"C0\.300$", "C0.350"), r"of 0\.350 mm, expected 0\.300 mm"),
    "inches": (in_text(PLATED, "^METRIC$", "INCH"), "no METRIC"),
    "no unit": (in_text(PLATED, "^METRIC\n", ""), "no METRIC"),
    "no decimal point": (in_text(PLATED, r"^X(-?\d+)\.\d+", r"X\1"), "among the holes"),
    "off the copper": (in_text(PLATED, r"Y-?[\d.]+$", "Y300.000"), "meets no copper"),
    "function lost": (in_text(PLATED, r"^; #@! TA.*\n", ""), "no function"),
    "another function": (in_text(PLATED, "ViaDrill", "ComponentDrill"), "is ComponentDrill, expected ViaDrill"),
    "end cut off": (in_text(UNPLATED, "^M30\n", ""), "no M30"),
    "head not begun": (in_text(UNPLATED, "^M48\n", ""), "not M48"),
    "tool not declared": (in_text(UNPLATED, r"^T1C.*\n", ""), "'T1' among the holes"),
    "routed": (in_text(UNPLATED, r"^G05$", "G00X1.000Y1.000"), "no G05"),
    "plated file gone": (lambda folder: (folder / PLATED).unlink(), "cannot be read"),
}


@pytest.mark.parametrize("fault", FAULTS)
def test_planted_fault_is_reported(board: Layout, folder: Path, fault: str) -> None:
    plant, words = FAULTS[fault]
    plant(folder)
    assert re.search(words, "\n".join(drill_mismatches(board, folder, facts=PROJECT)))


def test_mirrored_holes_are_reported(board: Layout, folder: Path) -> None:
    """A via on the axis of symmetry would not show; the via at the line's end lies off it."""
    mirrored = tuple(replace(hole, centre=(-hole.centre[0], hole.centre[1])) for hole in board.holes)
    write_drill(replace(board, holes=mirrored), folder / PLATED, plated=True, facts=PROJECT)
    assert any("expected (" in text for text in drill_mismatches(board, folder, facts=PROJECT))


def test_hole_that_cuts_its_copper_is_reported(two_level: Layout, tmp_path: Path) -> None:
    """The line over the ring is 2.1 mm wide: a hole 0.95 mm off its middle, 0.15 mm in radius, leaves it by 0.05 mm."""
    via, *others = two_level.holes
    spoilt = replace(two_level, holes=(replace(via, centre=(via.centre[0], via.centre[1] + 0.95e-3)), *others))
    write_drills(spoilt, tmp_path, facts=PROJECT)
    assert [
        text
        for text in drill_mismatches(spoilt, tmp_path, facts=PROJECT)
        if "cuts the edge of its copper by 0.050 mm" in text
    ]

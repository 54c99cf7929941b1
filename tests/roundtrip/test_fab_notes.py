"""What the fabrication drawing is refused for: a question without an answer, a sheet that belongs to another board.

Authority: the list of what every fabrication sheet must answer (common practice).
"""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import pytest

from planar.copper.layout import Layout
from planar.errors import HandoffError
from planar.handoff.drawing_pdf import write_drawing
from planar.handoff.fab_notes import QUESTIONS, DrawingFacts, fab_notes
from planar.handoff.stackup_sheet import SheetFacts, StackupSheet
from tests.roundtrip.sheets import facts_for, sheet_for

MM_PER_POINT = 25.4 / 72.0


def blank(layout: Layout, sheet: StackupSheet, **changes: object) -> tuple[StackupSheet, DrawingFacts]:
    """The sheet and the facts with one answer changed."""
    facts = facts_for(layout.name)
    project = {k: v for k, v in changes.items() if k in ("revision", "name_of_project")}
    if project:
        named = {"name": project.get("name_of_project", layout.name), "revision": project.get("revision", "A")}
        facts = replace(facts, project=replace(facts.project, **named))
    own = {k: v for k, v in changes.items() if k in ("netlist", "hole_tolerance_m")}
    facts = replace(facts, **own)
    of_facts = {k: v for k, v in changes.items() if k in SheetFacts.__dataclass_fields__}
    sheet = replace(sheet, facts=replace(sheet.facts, **of_facts))
    rest = {k: v for k, v in changes.items() if k in ("notes", "layers", "thickness_tolerance")}
    return replace(sheet, **rest), facts


BLANKS: dict[str, tuple[dict[str, object], str]] = {
    "revision": ({"revision": " "}, "revision is blank"),
    "finish": ({"finish": ""}, "finish is blank"),
    "specification": ({"specification": ""}, "laminate specification is blank"),
    "netlist": ({"netlist": ""}, "netlist is blank"),
    "outline tolerance": ({"outline_tolerance_m": 0.0}, "outline tolerance"),
    "hole tolerance": ({"hole_tolerance_m": 0.0}, "no answer to: hole tolerance"),
    "thickness tolerance": ({"thickness_tolerance": 0.0}, "no answer to: board thickness"),
    "every note": ({"notes": ()}, "no answer to: mask over the antenna"),
    "another project": ({"name_of_project": "other"}, "is called 'other'"),
}


@pytest.mark.parametrize("answer", BLANKS)
def test_blank_answer_is_refused(two_level: Layout, tmp_path: Path, answer: str) -> None:
    changes, words = BLANKS[answer]
    sheet, facts = blank(two_level, sheet_for(two_level), **changes)
    with pytest.raises(HandoffError, match=words):
        write_drawing(two_level, sheet, tmp_path / "drawing.pdf", facts=facts)
    assert not (tmp_path / "drawing.pdf").exists()


def test_each_note_left_out_is_missed(two_level: Layout) -> None:
    """Every note of the stackup sheet answers a question nobody else answers."""
    sheet = sheet_for(two_level)
    for note in sheet.notes:
        rest = tuple(other for other in sheet.notes if other != note)
        with pytest.raises(HandoffError, match="no answer to"):
            fab_notes(two_level, replace(sheet, notes=rest), facts=facts_for(two_level.name))
    assert len(QUESTIONS) >= len(sheet.notes)


def test_layers_without_numbers_are_refused(two_level: Layout) -> None:
    sheet = sheet_for(two_level)
    for change, words in (
        ({"base_copper_m": None}, "base copper of copper-top is blank"),
        ({"thickness_m": 0.0}, "thickness of copper-top is blank"),
        ({"material": " "}, "material of copper-top is blank"),
    ):
        layers = tuple(replace(a, **change) if a.name == "copper-top" else a for a in sheet.layers)
        with pytest.raises(HandoffError, match=words):
            fab_notes(two_level, replace(sheet, layers=layers), facts=facts_for(two_level.name))


def test_sheet_of_another_board_is_refused(two_level: Layout, one_level: Layout) -> None:
    with pytest.raises(HandoffError, match="1 copper layers, the layout 2"):
        fab_notes(two_level, replace(sheet_for(one_level)), facts=facts_for(one_level.name))
    other = sheet_for(two_level)
    other = replace(other, facts=replace(other.facts, dc_short=not two_level.dc_short))
    with pytest.raises(HandoffError, match="DC short"):
        fab_notes(two_level, other, facts=facts_for(two_level.name))

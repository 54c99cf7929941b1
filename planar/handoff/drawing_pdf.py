"""The fabrication drawing: each copper level with dimensions and drills, then stackup, impedance and notes.

Every sheet carries the same title block (name, revision, hash, scale, sheet of how many). The tables say what
`stackup.json` says. A drawing with a blank answer is refused, see `fab_notes`.
"""

from __future__ import annotations

import re
from collections.abc import Callable, Iterable, Iterator, Sequence
from dataclasses import dataclass
from pathlib import Path

from planar.copper.layout import Kind, Layout, Level
from planar.handoff.drawing_figure import A4, Sheet, draw_figure, fitting_figure
from planar.handoff.fab_notes import DrawingFacts, fab_notes
from planar.handoff.kind_words import KIND_WORDS
from planar.handoff.panel_notes import panel_rows
from planar.handoff.paper import BOLD, PLAIN, Paper, Pen, text_width, wrapped
from planar.handoff.sheet_cells import layer_cells, line_cells, with_spread
from planar.handoff.stackup_sheet import StackupSheet
from planar.units import show

MARGIN = 8.0
"""mm, between the sheet's edge and its frame."""
TITLE_HEIGHT = 22.0
"""mm, of the title block at the foot of each sheet."""
_FRAME, _RULE = Pen(0.35), Pen(0.13)
_BODY, _HEADING = 7.5, 10.0
_LINE = 3.7
_CELL_PAD = 1.2
_WIDTH = A4[0] - 2.0 * MARGIN - 6.0
_LEAST = 4.5

_MICRO, _OHM = re.compile(r"(?<=\d) um\b"), re.compile(r"(?<=\d) ohm\b")
_LAYER_HEAD = ("layer", "material", "thickness", "base copper", "εr", "tan δ")
_LAYER_COLUMNS = (26.0, 54.0, 34.0, 24.0, 26.0, 24.0)
_PANEL_HEAD = ("panel", "what the files hold")
_PANEL_COLUMNS = (40.0, 148.0)
_LINE_HEAD = ("line", "kind", "width", "gap", "level", "reference", "impedance", "instruction")
_LINE_COLUMNS = (32.0, 24.0, 18.0, 17.0, 14.0, 27.0, 25.0, 31.0)


@dataclass(frozen=True)
class _Block:
    """Something `height` mm high that `draw(paper, x, top)` draws; `keep` mm of what follows stay with it."""

    height: float
    draw: Callable[[Paper, float, float], None]
    keep: float = 0.0


@dataclass(frozen=True)
class _Page:
    """A sheet: what the title block calls it, its size in mm, what draws it above the title block."""

    title: str
    scale: str
    size: tuple[float, float]
    draw: Callable[[Paper], None]


def write_drawing(layout: Layout, sheet: StackupSheet, path: Path, *, facts: DrawingFacts) -> None:
    """Write the drawing of a snapped `layout` as PDF on A4. The same arguments give the same bytes.

    Raises `HandoffError` when a question of the fab is left without an answer, when sheet and layout disagree,
    when the board is too large for A4 at 1:50, or when the font is missing.
    """
    notes = fab_notes(layout, sheet, facts=facts)
    paper = Paper(path, title=f"{sheet.facts.name}, fabrication drawing", creator=_made_with(facts))
    title = "stackup, impedance, notes" if facts.panel is None else "panel, stackup, impedance, notes"
    sheets = [*_figures(layout, facts), *_text_sheets(title, _blocks(layout, sheet, facts, notes))]
    for number, page in enumerate(sheets, 1):
        paper.sheet(*page.size)
        page.draw(paper)
        _draw_title_block(paper, page, (number, len(sheets)), sheet, facts)
        paper.end_sheet()
    paper.save()


def _made_with(facts: DrawingFacts) -> str:
    _, application, version = facts.project.software
    return f"{application} {version}"


def _figures(layout: Layout, facts: DrawingFacts) -> Iterator[_Page]:
    levels: tuple[Level | None, ...] = ((None,) if layout.kind is Kind.ARRAY else ()) + layout.levels
    sheets = [Sheet(layout, level, facts.hole_tolerance_m) for level in levels]
    figure = fitting_figure(sheets, TITLE_HEIGHT, MARGIN)
    corner = (MARGIN + 3.0, MARGIN + TITLE_HEIGHT)
    for sheet in sheets:

        def draw(paper: Paper, sheet: Sheet = sheet) -> None:
            draw_figure(paper, sheet, figure=figure, corner=corner)

        yield _Page(sheet.title, figure.scale_text, figure.size, draw)


def _blocks(layout: Layout, sheet: StackupSheet, facts: DrawingFacts, notes: Sequence[str]) -> Iterator[_Block]:
    if facts.panel is not None:
        yield _heading("Panel")
        yield from _table(_PANEL_HEAD, tuple(panel_rows(layout, facts.panel)), _PANEL_COLUMNS)
    yield from _stackup_blocks(sheet)
    yield from _impedance_blocks(sheet)
    yield from _note_blocks(notes)


def _text_sheets(title: str, blocks: Iterable[_Block]) -> Iterator[_Page]:
    """Tables and notes, as many sheets as they need."""
    room = A4[1] - 2.0 * MARGIN - TITLE_HEIGHT - 4.0
    pages: list[list[_Block]] = [[]]
    used = 0.0
    for block in blocks:
        if pages[-1] and used + block.height + block.keep > room:
            pages.append([])
            used = 0.0
        pages[-1].append(block)
        used += block.height
    for page in pages:

        def draw(paper: Paper, page: list[_Block] = page) -> None:
            top = A4[1] - MARGIN - 2.0
            for block in page:
                block.draw(paper, MARGIN + 3.0, top)
                top -= block.height

        yield _Page(title, "none", A4, draw)


def _stackup_blocks(sheet: StackupSheet) -> Iterator[_Block]:
    at = show(sheet.facts.frequency_hz, "frequency")
    yield _heading(f"Stackup, top to bottom; permittivity εr and loss tangent tan δ at {at}")
    yield from _table(_LAYER_HEAD, [layer_cells(layer, _length, "±") for layer in sheet.layers], _LAYER_COLUMNS)
    total = with_spread(_length(sheet.total_thickness_m), sheet.thickness_tolerance, "±")
    masked = _length(sheet.masked_thickness_m)
    yield _paragraph(f"Total {total} with copper, without mask; {masked} with mask. Copper thickness is finished.")
    if sheet.surroundings:
        yield _heading(f"Around the board: not made by the fab, {KIND_WORDS[sheet.facts.kind].around}")
        around = [layer_cells(layer, _length, "±") for layer in sheet.surroundings]
        yield from _table(_LAYER_HEAD, around, _LAYER_COLUMNS)


def _impedance_blocks(sheet: StackupSheet) -> Iterator[_Block]:
    yield _heading("Impedance")
    if sheet.impedance_lines:
        yield from _table(_LINE_HEAD, [line_cells(line, "±", "Ω") for line in sheet.impedance_lines], _LINE_COLUMNS)
    else:
        yield _paragraph("No line on this board has a stated impedance.")


def _note_blocks(notes: Sequence[str]) -> Iterator[_Block]:
    yield _heading("Notes")
    for number, note in enumerate(notes, 1):
        yield _paragraph(note, mark=f"{number}.")


def _length(length: float) -> str:
    return _signed(show(length, "length"))


def _signed(text: str) -> str:
    """`text` with the signs the font has where plain text has letters: plus-minus, micro, ohm."""
    return _OHM.sub(" Ω", _MICRO.sub(" µm", text.replace("+-", "±")))


def _heading(text: str) -> _Block:
    def draw(paper: Paper, x: float, top: float) -> None:
        paper.text((x, top - 7.5), text, _HEADING, font=BOLD)

    return _Block(10.0, draw, keep=14.0)


def _paragraph(text: str, *, mark: str = "") -> _Block:
    indent = 7.0 if mark else 0.0
    lines = wrapped(_signed(text), _BODY, _WIDTH - indent)

    def draw(paper: Paper, x: float, top: float) -> None:
        paper.text((x, top - 3.6), mark, _BODY)
        for i, line in enumerate(lines):
            paper.text((x + indent, top - 3.6 - _LINE * i), line, _BODY)

    return _Block(_LINE * len(lines) + 1.6, draw)


def _table(head: Sequence[str], rows: Sequence[Sequence[str]], columns: Sequence[float]) -> Iterator[_Block]:
    yield _row(head, columns, font=BOLD)
    for row in rows:
        yield _row(row, columns, font=PLAIN)


def _row(cells: Sequence[str], columns: Sequence[float], *, font: str) -> _Block:
    pairs = zip(cells, columns, strict=True)
    texts = [wrapped(_signed(cell), _BODY, width - 2.0 * _CELL_PAD, font=font) for cell, width in pairs]
    height = _LINE * max(len(lines) for lines in texts) + 1.8

    def draw(paper: Paper, x: float, top: float) -> None:
        left = x
        for lines, width in zip(texts, columns, strict=True):
            for i, line in enumerate(lines):
                paper.text((left + _CELL_PAD, top - 3.6 - _LINE * i), line, _BODY, font=font)
            left += width
        paper.lines([((x, top - height), (left, top - height))], _RULE)

    return _Block(height, draw, keep=6.0 if font == BOLD else 0.0)


def _draw_title_block(
    paper: Paper, page: _Page, number: tuple[int, int], sheet: StackupSheet, facts: DrawingFacts
) -> None:
    """Frame of the sheet and two rows of cells at its foot."""
    width, height = page.size[0] - 2.0 * MARGIN, page.size[1] - 2.0 * MARGIN
    paper.box((MARGIN, MARGIN), (width, height), _FRAME)
    first = (
        ("name", sheet.facts.name, 0.38),
        ("sheet", page.title, 0.36),
        ("scale", page.scale, 0.11),
        ("sheet number", f"{number[0]} of {number[1]}", 0.15),
    )
    second = (
        ("revision", facts.project.revision, 0.14),
        ("design hash (SHA-256)", facts.project.design_hash, 0.60),
        ("made with", _made_with(facts), 0.26),
    )
    half = 0.5 * TITLE_HEIGHT
    for bottom, cells in ((MARGIN + half, first), (MARGIN, second)):
        left = MARGIN
        for label, text, share in cells:
            _draw_cell(paper, (left, bottom), (share * width, half), label, text)
            left += share * width


def _draw_cell(paper: Paper, corner: tuple[float, float], size: tuple[float, float], label: str, text: str) -> None:
    paper.box(corner, size, _RULE)
    paper.text((corner[0] + 1.2, corner[1] + size[1] - 3.0), label, 5.5)
    room = size[0] - 2.4
    points = max(_LEAST, min(10.0, 10.0 * room / max(1e-9, text_width(text, 10.0))))
    lines = wrapped(text, points, room)
    for i, line in enumerate(lines[:2]):
        paper.text((corner[0] + 1.2, corner[1] + (2.4 if len(lines) == 1 else 4.4) - 2.4 * i), line, points)

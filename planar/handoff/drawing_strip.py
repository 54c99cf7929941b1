"""What stands below a figure: scale bar, where the origin lies, what each line means, the table of drills.

The key lists what the figure shows and nothing else. The table gives the places of the few holes a mechanic needs;
those of vias and perforations stand in the drill files.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from planar.copper.layout import Layout
from planar.handoff.content import scale_bar_length
from planar.handoff.drawing_holes import DrillRow, drill_rows
from planar.handoff.drawing_pens import SMALL, THIN
from planar.handoff.kind_words import KIND_WORDS
from planar.handoff.paper import BLACK, BOLD, PLAIN, Paper, Pen, text_width

_ROW, _KEY_ROW, _PLACE_ROW = 4.6, 4.0, 3.4
_KEY_GAP, _SWATCH = 4.0, 6.6
_MOST_PLACES = 24
"""Holes of one tool whose places are listed; more are a matter for the drill file."""
_COLUMNS = (12.0, 14.0, 30.0, 24.0, 24.0, 40.0)
_HEAD = ("drill", "count", "finished diameter", "tolerance", "plating", "function")
_FUNCTIONS = {
    "ViaDrill": "via",
    "ComponentDrill": "soldered leg of a part",
    "MechanicalDrill": "mounting hole",
    "MechanicalDrill,Tooling": "tooling hole",
    "MechanicalDrill,Breakout": "perforation of a tab",
}
_PLACED = frozenset({"ComponentDrill", "MechanicalDrill", "MechanicalDrill,Tooling"})

Key = Sequence[tuple[str, Pen]]
"""What is drawn in words, and how."""


@dataclass(frozen=True)
class Strip:
    """What stands below a figure of a `layout` drawn to `scale` (1 is true size): its `key`, the `width` (mm) there is,
    `hole_tolerance` in m."""

    layout: Layout
    key: Key
    scale: float
    width: float
    hole_tolerance: float

    @property
    def height(self) -> float:
        """mm."""
        table = _ROW * (1 + max(1, len(drill_rows(self.layout)))) + _PLACE_ROW * len(self._place_lines)
        return 27.0 + _KEY_ROW * len(self._key_rows) + table

    def draw(self, paper: Paper, corner: tuple[float, float]) -> None:
        """Draw it with its lower left corner at `corner`, mm."""
        left, top = corner[0], corner[1] + self.height
        self._draw_scale_bar(paper, (left, top - 9.0))
        paper.text((left, top - 14.5), self._origin_text, SMALL)
        top -= 19.5
        for row in self._key_rows:
            _draw_key(paper, row, (left, top))
            top -= _KEY_ROW
        top -= 4.5
        for cells in [_HEAD, *self._cells]:
            _draw_row(paper, cells, (left, top))
            top -= _ROW
        for i, line in enumerate(self._place_lines):
            paper.text((left + 1.0, top + 1.0 - _PLACE_ROW * i), line, SMALL)

    @property
    def _key_rows(self) -> list[list[tuple[str, Pen]]]:
        """The key in rows no wider than there is room."""
        rows: list[list[tuple[str, Pen]]] = [[]]
        used = 0.0
        for text, pen in self.key:
            needed = _SWATCH + text_width(text, SMALL) + _KEY_GAP
            if rows[-1] and used + needed - _KEY_GAP > self.width:
                rows.append([])
                used = 0.0
            rows[-1].append((text, pen))
            used += needed
        return rows

    def _draw_scale_bar(self, paper: Paper, at: tuple[float, float]) -> None:
        """Ten parts, black and white in turn, and what the whole measures."""
        board_mm = 1e3 * scale_bar_length(self.layout)
        part = 0.1 * board_mm * self.scale
        for i in range(10):
            paper.box((at[0] + i * part, at[1]), (part, 1.6), Pen(0.13, BLACK, BLACK if i % 2 else "#ffffff"))
        on_paper = f"{board_mm * self.scale:.0f} mm on paper printed at 100 %"
        paper.text((at[0] + 10.0 * part + 3.0, at[1] + 0.2), f"{board_mm:.0f} mm = {on_paper}", SMALL)

    @property
    def _origin_text(self) -> str:
        x0, y0, _, _ = self.layout.edge.bounds
        words = KIND_WORDS[self.layout.kind]
        feed = " and the feed" if words.origin == "feed" else ""
        where = f"{_mm(-x0)} mm from the left and {_mm(-y0)} mm from the lower side of the {words.thing} outline"
        return f"Cross: origin of every file{feed}, {where}. Dimensions in mm."

    @property
    def _cells(self) -> list[tuple[str, ...]]:
        return [
            (
                row.letter,
                str(len(row.centres)),
                f"{_mm(row.diameter)} mm",
                f"±{_mm(self.hole_tolerance)} mm",
                "plated" if row.plated else "unplated",
                _FUNCTIONS[row.function],
            )
            for row in drill_rows(self.layout)
        ] or [("none", "0", "", "", "", f"no hole on this {KIND_WORDS[self.layout.kind].thing}")]

    @property
    def _place_lines(self) -> list[str]:
        """Places of the holes something is mounted or located in, wrapped."""
        rows = [row for row in drill_rows(self.layout) if row.function in _PLACED]
        return [line for row in rows for line in _places(row, self.width)]


def _places(row: DrillRow, width: float) -> list[str]:
    """Lines no wider than `width` mm with the places of a tool, none of which is broken."""
    if len(row.centres) > _MOST_PLACES:
        return [f"{row.letter}: {len(row.centres)} places, see the drill file"]
    lines = [f"{row.letter} at x, y from the origin:"]
    for x, y in row.centres:
        longer = f"{lines[-1]}  ({_mm(x)}, {_mm(y)})"
        if text_width(longer, SMALL) > width:
            lines.append(f"({_mm(x)}, {_mm(y)})")
        else:
            lines[-1] = longer
    return lines


def _draw_key(paper: Paper, row: Key, at: tuple[float, float]) -> None:
    x, y = at
    for text, pen in row:
        shown = Pen(0.5 * pen.width, pen.stroke, pen.fill, pen.dash) if pen.width > 1.0 else pen
        paper.box((x, y - 0.3), (5.0, 2.4), shown)
        paper.text((x + _SWATCH, y), text, SMALL)
        x += _SWATCH + text_width(text, SMALL) + _KEY_GAP


def _draw_row(paper: Paper, cells: Sequence[str], at: tuple[float, float]) -> None:
    x, y = at
    for cell, width in zip(cells, _COLUMNS, strict=True):
        paper.text((x + 1.0, y + 1.3), cell, SMALL, font=BOLD if cells is _HEAD else PLAIN)
        x += width
    paper.lines([((at[0], y), (x, y))], THIN)


def _mm(length: float) -> str:
    """A length in mm to the micrometre; no minus before a zero."""
    return f"{round(1e3 * length, 3) + 0.0:.3f}"

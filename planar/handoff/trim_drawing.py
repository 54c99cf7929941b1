"""The trim drawing: what to cut off a finished board, at true scale, to lay the board on and mark the copper.

A sheet a way to cut; each is seen from the side that is cut, so a cut on the bottom is mirrored against every other
file. What goes at first is hatched both ways, the rest one way; a detail is enlarged and dimensioned.
"""

from __future__ import annotations

import math
import re
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from planar.copper.arc import Point
from planar.copper.cut_off import CutOff
from planar.copper.layout import Layout, Level
from planar.copper.outline import Outline
from planar.errors import HandoffError
from planar.handoff.canvas import Canvas
from planar.handoff.paper import BLACK, BOLD, PLAIN, Paper, Pen, View, wrapped
from planar.handoff.svg_paper import SvgPaper
from planar.handoff.trim_detail import COPPER, FIRST, REST, Marked, draw_detail, hatched
from planar.units import show

A4, A3, A2, A1 = (210.0, 297.0), (297.0, 420.0), (420.0, 594.0), (594.0, 841.0)
SHEETS = {"A4": A4, "A3": A3, "A2": A2, "A1": A1}
"""Sheets of ISO 216, mm, the smallest first."""
MARGIN = 10.0
"""mm that no printer reaches."""
BAR = 50.0
"""mm, what is to be measured on the print."""
_HEAD, _STRIP, _AROUND = 17.0, 84.0, 7.0
"""mm: above the board, below it, and round it for what points at a cut."""
_DETAIL = (76.0, 62.0)
_EDGE, _THIN, _HOLE = Pen(0.35), Pen(0.13), Pen(0.15, BLACK, "#ffffff")
_ARROW = Pen(0.3)
_SMALL, _BODY, _LINE = 7.0, 8.0, 3.7
WARNINGS = (
    "A cut cannot be taken back: cut the first amount, measure again, then go on.",
    "Cut copper only, not the board below it; a sharp knife, a steel rule, many light strokes; take off the burr.",
    "Copper and glass dust: cut wet or with extraction, eye protection on.",
)


@dataclass(frozen=True)
class Way:
    """A way to cut: the copper that goes, `off`, and its entry among the `cut_now` of a retune.json."""

    off: CutOff
    told: Mapping[str, Any]


def write_trim_drawing(layout: Layout, ways: Sequence[Way], path: Path, *, made_with: str) -> None:
    """Write the PDF of all `ways` to cut the board of a snapped `layout`, a sheet each, the best first; `made_with`
    names the program. The same arguments give the same bytes.

    Raises `HandoffError` without a way, for a board larger than A1, and when the font is missing.
    """
    sheets = _sheets(layout, ways)
    paper = Paper(path, title=f"{layout.name}, trim drawing", creator=made_with)
    for sheet in sheets:
        paper.sheet(*sheet.size)
        sheet.draw(paper)
        paper.end_sheet()
    paper.save()


def write_trim_svg(layout: Layout, ways: Sequence[Way], path: Path) -> None:
    """Write the sheet of the best of the `ways` as SVG. The same arguments give the same bytes.

    Raises `HandoffError` as `write_trim_drawing`.
    """
    sheet = _sheets(layout, ways)[0]
    told = f"Where to cut the board at true scale: {sheet.way.told['begin_with']}. {sheet.seen}"
    paper = SvgPaper(path, sheet.size, (f"{layout.name}, trim drawing", told))
    sheet.draw(paper)
    paper.save()


def _sheets(layout: Layout, ways: Sequence[Way]) -> list[_Sheet]:
    if not ways:
        raise HandoffError("nothing can be cut off this board that helps: there is no trim drawing")
    return [_Sheet(layout, way, (number, len(ways)), *_fitting(layout)) for number, way in enumerate(ways, 1)]


def _fitting(layout: Layout) -> tuple[str, tuple[float, float]]:
    """Name and size of the smallest sheet that takes the board at true scale."""
    width, height = (1e3 * side for side in layout.size)
    for name, upright in SHEETS.items():
        for size in (upright, upright[::-1]):
            room = size[0] - 2.0 * (MARGIN + _AROUND), size[1] - 2.0 * MARGIN - _HEAD - _STRIP - 2.0 * _AROUND
            if width <= room[0] and height <= room[1]:
                return name, size
    raise HandoffError(f"the board of {width:.0f} by {height:.0f} mm is larger than a sheet of A1")


@dataclass(frozen=True)
class _Sheet:
    """A way to cut on a sheet of `size` mm called `paper`; `number` of how many ways."""

    layout: Layout
    way: Way
    number: tuple[int, int]
    paper: str
    size: tuple[float, float]

    @property
    def seen(self) -> str:
        """From which side the sheet shows the board."""
        level = self.way.off.level
        if level is Level.TOP:
            return "Seen from the top, the side that is cut."
        return "Seen from the bottom, the side that is cut: mirrored against every other file."

    @property
    def view(self) -> View:
        """True scale, the board in the middle of the room for it."""
        x0, y0, x1, y1 = self.shown([self.layout.edge])[0].bounds
        low = MARGIN + _STRIP + _AROUND
        slack = self.size[1] - MARGIN - _HEAD - _AROUND - low - 1e3 * (y1 - y0)
        return View(1.0, (0.5 * self.size[0] - 500.0 * (x0 + x1), low + 0.5 * slack - 1e3 * y0))

    def shown(self, outlines: Sequence[Outline]) -> list[Outline]:
        """Outlines as they are seen from the side that is cut."""
        return [each if self.way.off.level is Level.TOP else each.mirrored() for each in outlines]

    @property
    def marked(self) -> Marked:
        """The copper and what goes of it, as they are seen."""
        off = self.way.off
        side = 1.0 if off.level is Level.TOP else -1.0
        copper = self.shown(self.layout.copper(off.level))
        return Marked(copper, self.shown(off.first), self.shown(off.whole), off.marks, side)

    def draw(self, paper: Canvas) -> None:
        """Draw it all."""
        self._draw_head(paper)
        self._draw_board(paper)
        top = MARGIN + _STRIP - 2.0
        _draw_bar(paper, (MARGIN, top - 8.0))
        paper.text((MARGIN + BAR + 4.0, top - 7.6), f"measure this: {BAR:.0f} mm", 9.0, font=BOLD)
        paper.text(
            (MARGIN + BAR + 46.0, top - 7.6), "if it is not, print again at 100 %, not fitted to the page", _SMALL
        )
        draw_detail(paper, self.marked, ((MARGIN, MARGIN), _DETAIL), self._labels)
        self._draw_words(paper, (MARGIN + _DETAIL[0] + 5.0, top - 14.0))

    def _draw_head(self, paper: Canvas) -> None:
        top = self.size[1] - MARGIN
        right = self.size[0] - MARGIN
        paper.text((MARGIN, top - 5.0), self.layout.name, 13.0, font=BOLD)
        paper.text((right, top - 5.0), f"trim drawing, true scale 1:1, {self.paper}", 9.0, anchor="right")
        number, count = self.number
        which = f"Way {number} of {count}: choose one, they do not add up. " if count > 1 else ""
        paper.text((MARGIN, top - 11.0), f"{which}{self.seen}", _BODY)
        paper.lines([((MARGIN, top - 14.0), (right, top - 14.0))], _THIN)

    def _draw_board(self, paper: Canvas) -> None:
        view, marked = self.view, self.marked
        paper.outlines(marked.copper, view, COPPER)
        paper.outlines(marked.whole, view, REST)
        paper.outlines(marked.first, view, FIRST)
        hatched(paper, marked, view)
        paper.outlines(self.shown([self.layout.edge]), view, _EDGE)
        for hole in self.layout.holes:
            x, y = hole.centre
            paper.discs([view.place((marked.side * x, y))], 1e3 * hole.diameter, _HOLE)
        for place, aside, label in self._pointers:
            _draw_pointer(paper, view.place(place), aside, label)

    @property
    def _pointers(self) -> Iterator[tuple[Point, Point, str]]:
        """Place and way from which an arrow points at it, and its label: tabs each, other cuts once."""
        marks = self.marked.marks
        for i, mark in enumerate(marks if self.way.told["whole_cut_mm"] is None else marks[:1]):
            words = "A" if i == 0 else ""
            if self.way.told["whole_cut_mm"] is None:
                words = " ".join(filter(None, (words, _turn(mark.first, mark.whole))))
            yield mark.start, mark.aside, words

    @property
    def _labels(self) -> tuple[str, str]:
        """What the two dimensions of the detail say."""
        mark = self.way.off.marks[0]
        each = " each side" if self._sides > 1 else ""
        return f"first {_mm(1e3 * mark.first)}{each}", f"in all {_mm(1e3 * mark.whole)}{each}"

    @property
    def _sides(self) -> int:
        """Sides that share the amount: two of a gap."""
        return 1 if self.way.told["whole_cut_mm"] is None else len(self.way.off.marks)

    def _draw_words(self, paper: Canvas, corner: Point) -> None:
        x, y = corner
        for text, font in self._said:
            for line in wrapped(text, _BODY, self.size[0] - MARGIN - x, font=font):
                paper.text((x, y), line, _BODY, font=font)
                y -= _LINE
            y -= 1.2

    @property
    def _said(self) -> Iterator[tuple[str, str]]:
        told = self.way.told
        yield told["what"][:1].upper() + told["what"][1:], BOLD
        if told["whole_cut_mm"] is None:
            yield f"Cut first: {told['begin_with']}.", PLAIN
        else:
            each = ", half of it on each side" if self._sides > 1 else ""
            first, whole, most = (_mm(told[key]) for key in ("first_cut_mm", "whole_cut_mm", "most_mm"))
            yield f"Cut first {first}, {whole} in all{each}; no more than {most} can be cut.", PLAIN
        yield f"After the first cut: {_outlook(told['after_first'])}.", PLAIN
        yield f"After all of it: {_outlook(told['after_whole'])}.", PLAIN
        for warning in WARNINGS:
            yield warning, PLAIN


def _turn(first: float, whole: float) -> str:
    """When a tab is cut."""
    if first <= 0.0:
        return "later"
    return "first" if first >= whole else "half"


def _outlook(told: Mapping[str, Any]) -> str:
    parts = [f"response {100.0 * told['shift']:+.2f} % from the design"]
    if told["best_match_hz"] is not None:
        parts.append(f"best match at {show(told['best_match_hz'], 'frequency', 5)}")
    parts.append(f"worst {told['worst_reflection_db']:.1f} dB in the band")
    if told["worst_axial_ratio_db"] is not None:
        parts.append(f"axial ratio {told['worst_axial_ratio_db']:.1f} dB")
    said = f"{', '.join(parts)}; the brief is met with {100.0 * told['confidence']:.0f} % confidence"
    return re.sub(r"(?<![\w.])-(?=\d)", "\N{MINUS SIGN}", said)


def _mm(length_mm: float) -> str:
    return f"{length_mm:.3g} mm"


def _draw_bar(paper: Canvas, at: Point) -> None:
    """Ten parts, black and white in turn."""
    part = 0.1 * BAR
    for i in range(10):
        paper.box((at[0] + i * part, at[1]), (part, 2.4), Pen(0.13, BLACK, BLACK if i % 2 else "#ffffff"))


def _draw_pointer(paper: Canvas, tip: Point, aside: Point, label: str) -> None:
    """An arrow from `aside` that ends at `tip`, its label behind it."""
    (x, y), (ux, uy) = tip, aside
    tail = (x + 9.0 * ux, y + 9.0 * uy)
    heads = [(tip, (x + 2.2 * ux - s * uy, y + 2.2 * uy + s * ux)) for s in (-0.7, 0.7)]
    paper.lines([(tip, tail), *heads], _ARROW)
    anchor = "left" if ux > 0.5 else "right" if ux < -0.5 else "centre"
    away = 0.0 if abs(ux) > 0.5 else math.copysign(2.0, uy)
    place = (tail[0] + (math.copysign(1.0, ux) if anchor != "centre" else 0.0), tail[1] + away - 1.0)
    paper.text(place, label, _BODY, font=BOLD, anchor=anchor, halo=True)

"""A page of plain text: titled sections, wrapped to a width every terminal and printer takes."""

from __future__ import annotations

import re
import textwrap
from collections.abc import Iterable

from planar.copper.arc import Point

WIDTH = 96
"""Columns."""
PAGE_LINES = 70
"""Lines that are still one printed page."""
_BEFORE_A_UNIT = re.compile(r"(?<=\d) (?=(?:mm|um|[MG]?Hz|ohm|dB)\b|%)")
_TIE = "\u00a0"


def titled(title: str, *lines: str) -> str:
    """A section: its `title` and its lines, indented."""
    return "\n".join([title, *(f"  {line}" for line in lines)])


def wrapped(*texts: str) -> list[str]:
    """The lines of paragraphs, each wrapped for a section."""
    return [line for text in texts for line in _broken(text)]


def listed(marks: Iterable[str], texts: Iterable[str]) -> list[str]:
    """The lines of a list: each text wrapped beside its mark."""
    pairs = list(zip(marks, texts, strict=True))
    column = 1 + max(len(mark) for mark, _ in pairs)
    lines: list[str] = []
    for mark, text in pairs:
        first, hang = f"{mark:<{column}}", " " * column
        lines += _broken(text, first, hang)
    return lines


def _broken(text: str, first: str = "", hang: str = "") -> list[str]:
    """Lines of a paragraph; a number stays with its unit."""
    lines = textwrap.wrap(
        _BEFORE_A_UNIT.sub(_TIE, text),
        WIDTH - 2,
        initial_indent=first,
        subsequent_indent=hang,
        break_on_hyphens=False,
        break_long_words=False,
    )
    return [line.replace(_TIE, " ") for line in lines]


def page(*sections: str) -> str:
    """Sections with a line between them."""
    return "\n\n".join(sections) + "\n"


def mm(length: float, digits: int = 3) -> str:
    """A length in mm without its unit; no minus before a zero."""
    return f"{round(1e3 * length, digits) + 0.0:.{digits}f}"


def place(point: Point, digits: int = 3) -> str:
    """A place as "x, y" in mm without the unit."""
    return f"{mm(point[0], digits)}, {mm(point[1], digits)}"

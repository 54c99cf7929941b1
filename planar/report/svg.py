"""The few pieces every hand-drawn picture of the report is made of, and the colours they share.

A picture is one self-contained `<svg>` text: no script, no outside font, no ids, so that several stand on one page.
Colours are CSS variables with the light colour as fall-back; the page sets them from `PALETTE`. Widths of text are
estimated from above, so that what is set apart by them stays apart in any plain sans-serif font.
"""

from __future__ import annotations

import itertools
import re
from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from xml.sax.saxutils import escape, quoteattr

from planar.copper.svg_path import decimal

PALETTE: Mapping[str, tuple[str, str]] = {
    "ink": ("#1d2329", "#e8eaec"),
    "muted": ("#59626b", "#a7b0b8"),
    "paper": ("#ffffff", "#15191d"),
    "grid": ("#b3baae", "#525d63"),
    "board": ("#eceee3", "#232a28"),
    "board-edge": ("#5f6b58", "#93a08b"),
    "copper-top": ("#c2691c", "#d9822b"),
    "copper-bottom": ("#2b7a99", "#3f93b5"),
    "copper-beyond": ("#7d8790", "#7d8790"),
    "measure": ("#1d2329", "#f4f4f0"),
    "feed": ("#8a1f8f", "#e58fe8"),
    "gap": ("#f3d34a", "#f3d34a"),
    "keepout": ("#a23347", "#e07e8e"),
    "hole": ("#ffffff", "#0c0f11"),
    "dielectric": ("#d6d9b8", "#5d6444"),
    "mask": ("#7fb08c", "#3f6f4d"),
    "cover": ("#cbc6d9", "#57506b"),
    "metal": ("#8c939a", "#8c939a"),
    "radiated": ("#2b6fb3", "#5f9fdc"),
    "guided": ("#8fc3e8", "#a9d3f0"),
    "lost-copper": ("#c2691c", "#d9822b"),
    "lost-dielectric": ("#6b6f38", "#a4aa62"),
    "rise": ("#2b6fb3", "#5f9fdc"),
    "fall": ("#c2691c", "#d9822b"),
}
"""Name of a colour -> (on a light page, on a dark page): blue against orange with different lightness, so that they
are told apart without colour vision; letters and thin lines have a contrast of 4.5 and more on their ground."""
FONT = "system-ui, -apple-system, 'Liberation Sans', sans-serif"
NARROW, WIDE = "fijlrtI.,;:'|()[]- ", "mwMW%…×Ω±\N{MINUS SIGN}+=<>"
NARROW_WIDTH, WIDE_WIDTH, CAPITAL_WIDTH, LETTER_WIDTH, BOLD_WIDTH = 0.42, 1.0, 0.78, 0.64, 1.1
"""Widths of letters over the font size, bold over plain: those of a broad sans-serif font."""

_BEFORE_UNIT = re.compile(r"(?<=\d) (?=(?:mm|[kMG]?Hz|ohm)\b)")

Attributes = Mapping[str, str | float]
Point = tuple[float, float]


@dataclass(frozen=True)
class Lettering:
    """How words are written: `size` in the picture's unit, `anchor` start, middle or end."""

    size: float
    anchor: str = "start"
    colour: str = "ink"
    bold: bool = False


@dataclass(frozen=True)
class Box:
    """A rectangle of the picture, y downwards."""

    x0: float
    y0: float
    x1: float
    y1: float

    @property
    def width(self) -> float:
        """Its width."""
        return self.x1 - self.x0

    @property
    def height(self) -> float:
        """Its height."""
        return self.y1 - self.y0

    def joined(self, other: Box) -> Box:
        """The least rectangle round both."""
        return Box(min(self.x0, other.x0), min(self.y0, other.y0), max(self.x1, other.x1), max(self.y1, other.y1))

    def grown(self, by: float) -> Box:
        """Larger by `by` on every side."""
        return Box(self.x0 - by, self.y0 - by, self.x1 + by, self.y1 + by)

    def overlaps(self, other: Box) -> bool:
        """Whether the two share area."""
        return self.x0 < other.x1 and other.x0 < self.x1 and self.y0 < other.y1 and other.y0 < self.y1


def colour(name: str) -> str:
    """The colour `name` of `PALETTE` as CSS writes it."""
    return f"var(--{name}, {PALETTE[name][0]})"


def pen(name: str, width: float, extra: Attributes | None = None) -> dict[str, str | float]:
    """Attributes of a line in the colour `name`, `width` wide, with nothing inside, and the `extra` ones."""
    line: dict[str, str | float] = {"fill": "none", "stroke": colour(name), "stroke-width": width}
    return line | dict(extra or {})


def element(tag: str, attributes: Attributes, content: str = "") -> str:
    """An element; `content` is markup. Numbers are written with up to six decimals."""
    written = "".join(
        f" {name}={quoteattr(value if isinstance(value, str) else decimal(value))}"
        for name, value in attributes.items()
    )
    return f"<{tag}{written}>{content}</{tag}>" if content else f"<{tag}{written}/>"


def group(name: str, attributes: Attributes, parts: Iterable[str]) -> str:
    """The `parts` in a group of class `name`, nothing where there are none."""
    inside = "\n".join(parts)
    return element("g", {"class": name} | dict(attributes), inside) if inside else ""


def tooltip(words: str) -> str:
    """What is shown on hovering over the element it is put in."""
    return element("title", {}, escape(words))


def text(at: Point, words: str, style: Lettering) -> str:
    """`words` on the base line `at`."""
    attributes: dict[str, str | float] = {"x": at[0], "y": at[1], "font-size": style.size, "fill": colour(style.colour)}
    if style.anchor != "start":
        attributes["text-anchor"] = style.anchor
    if style.bold:
        attributes["font-weight"] = "600"
    return element("text", attributes, escape(words))


def text_width(words: str, size: float, *, bold: bool = False) -> float:
    """Width of `words`, estimated from above."""
    return size * sum(_letter_width(letter) for letter in words) * (BOLD_WIDTH if bold else 1.0)


def _letter_width(letter: str) -> float:
    if letter in NARROW:
        return NARROW_WIDTH
    if letter in WIDE:
        return WIDE_WIDTH
    return CAPITAL_WIDTH if letter.isupper() else LETTER_WIDTH


def wrapped(words: str, width: float, size: float) -> list[str]:
    """`words` in lines no wider than `width`, broken at blanks but not before a unit; a single word may be wider."""
    lines: list[str] = []
    for word in _BEFORE_UNIT.sub("\N{NO-BREAK SPACE}", words).split(" "):
        if lines and text_width(f"{lines[-1]} {word}", size) <= width:
            lines[-1] += f" {word}"
        else:
            lines.append(word)
    return lines


def spread(wanted: list[float], heights: list[float]) -> list[float]:
    """Centres of things of these `heights` in a column, in the order given, as near to the `wanted` centres as goes.

    The least squares of the displacements under "none overlaps the next", by pooling adjacent violators
    (M. Ayer et al., Ann. Math. Stat. 26 (1955) 641).
    """
    offsets = [0.0]
    for above, below in itertools.pairwise(heights):
        offsets.append(offsets[-1] + 0.5 * (above + below))
    pools: list[tuple[float, int]] = []
    for want, offset in zip(wanted, offsets, strict=False):
        mean, count = want - offset, 1
        while pools and pools[-1][0] > mean:
            before, more = pools.pop()
            mean, count = (mean * count + before * more) / (count + more), count + more
        pools.append((mean, count))
    means = [mean for mean, count in pools for _ in range(count)]
    return [mean + offset for mean, offset in zip(means, offsets, strict=False)]


def svg_document(view: Box, shown: tuple[str, str], words: tuple[str, str], body: Iterable[str]) -> str:
    """The picture of the `view`, `shown` at this width and height, with `words` (title, description) for who hears it.

    A page that is narrower scales it down.
    """
    title, description = words
    attributes: dict[str, str | float] = {
        "xmlns": "http://www.w3.org/2000/svg",
        "width": shown[0],
        "height": shown[1],
        "viewBox": " ".join(decimal(value) for value in (view.x0, view.y0, view.width, view.height)),
        "role": "img",
        "style": "max-width:100%;height:auto",
        "font-family": FONT,
        "font-size": "12",
    }
    head = [tooltip(title), element("desc", {}, escape(description))]
    return element("svg", attributes, "\n".join(["", *head, *(part for part in body if part), ""])) + "\n"

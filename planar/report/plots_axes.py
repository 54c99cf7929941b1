"""What plots share: a panel with axes, curves in it, a legend above it, and their colours.

Drawn with the pieces of `svg`: text stays text, nothing has an id, colours are CSS variables. A plot is laid out for
the width of a phone and shown no wider than it was laid out for, so that its letters are legible on both.
"""

from __future__ import annotations

import math
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass
from xml.sax.saxutils import escape

import numpy as np
from numpy.typing import NDArray

from planar.report.svg import PALETTE, Box, Lettering, element, text, text_width, tooltip

Array = NDArray[np.float64]

PLOT_PALETTE: Mapping[str, tuple[str, str]] = {
    "curve-1": ("#1f5fa8", "#74b0ee"),
    "curve-2": ("#ae4c14", "#f09a56"),
    "curve-3": ("#26735a", "#6cc9a5"),
    "asked": ("#9c2748", "#ee8ba3"),
    "band-fill": ("#f2e6b8", "#40391d"),
    "spread-fill": ("#c9dbef", "#27415e"),
}
"""Name of a colour -> (on a light page, on a dark page), beside those of `svg.PALETTE`. Curves differ in dash too."""
WIDTH = 440.0
"""Width of a plot, px."""
SIZE = 13.0
"""Size of its letters, px: on a phone 360 px wide they come to 9.5."""
DASHES: Mapping[str, str] = {"solid": "", "dashed": "7 4", "dotted": "2 3.5"}
LEFT, RIGHT, BELOW = 56.0, 14.0, 42.0
"""px kept free beside and below a panel for numbers and names."""


@dataclass(frozen=True)
class Stroke:
    """How a curve is drawn: a colour's name, width in px, a name of `DASHES`."""

    colour: str
    width: float = 2.0
    dash: str = "solid"


@dataclass(frozen=True)
class Axis:
    """From `low` to `high` with numbers at `ticks`, named with its unit."""

    low: float
    high: float
    ticks: tuple[float, ...]
    name: str


@dataclass(frozen=True)
class Panel:
    """A rectangle `box` of the picture with two axes."""

    box: Box
    x: Axis
    y: Axis

    def across(self, value: float | Array) -> float | Array:
        """Where `value` lies from left to right, px."""
        return self.box.x0 + (value - self.x.low) / (self.x.high - self.x.low) * self.box.width

    def down(self, value: float | Array) -> float | Array:
        """Where `value` lies from top to bottom, px; values beyond the axis lie on its end."""
        held = np.clip(value, self.y.low, self.y.high)
        return self.box.y1 - (held - self.y.low) / (self.y.high - self.y.low) * self.box.height

    def curve(self, x: Array, y: Array, stroke: Stroke) -> str:
        """The curve through (x, y) as far as the x axis goes, broken where y is NaN."""
        inside = (x >= self.x.low) & (x <= self.x.high)
        points = np.column_stack([np.asarray(self.across(x)), np.asarray(self.down(y))])
        points[~inside] = np.nan
        return polyline(points, stroke)

    def frame(self) -> list[str]:
        """Grid, numbers and names."""
        box, parts = self.box, []
        for tick in self.x.ticks:
            at = float(self.across(tick))
            parts.append(line((at, box.y0), (at, box.y1), Stroke("grid", 0.7)))
            parts.append(text((at, box.y1 + 17.0), number(tick), Lettering(SIZE, "middle", "muted")))
        for tick in self.y.ticks:
            at = float(self.down(tick))
            parts.append(line((box.x0, at), (box.x1, at), Stroke("grid", 0.7)))
            parts.append(text((box.x0 - 6.0, at + 0.35 * SIZE), number(tick), Lettering(SIZE, "end", "muted")))
        if self.x.name:
            middle = 0.5 * (box.x0 + box.x1)
            parts.append(text((middle, box.y1 + 36.0), self.x.name, Lettering(SIZE, "middle", "ink")))
        parts.append(_upright((14.0, 0.5 * (box.y0 + box.y1)), self.y.name))
        return parts

    def shaded(self, low: float, high: float) -> str:
        """The part from `low` to `high` of the x axis, shaded from top to bottom."""
        x0, x1 = (float(np.clip(self.across(end), self.box.x0, self.box.x1)) for end in (low, high))
        rectangle = {"x": x0, "y": self.box.y0, "width": max(x1 - x0, 1.0), "height": self.box.height}
        return element("rect", rectangle | {"fill": colour("band-fill")})

    def level(self, value: float, stroke: Stroke) -> str:
        """A line right across at `value`."""
        at = float(self.down(value))
        return line((self.box.x0, at), (self.box.x1, at), stroke)


def colour(name: str) -> str:
    """The colour `name` of either palette as CSS writes it."""
    return f"var(--{name}, {(PLOT_PALETTE.get(name) or PALETTE[name])[0]})"


def plot_palette_css(dark: bool) -> str:
    """Declarations that set every colour of `PLOT_PALETTE` for a `dark` page or a light one."""
    return "".join(f"--{name}:{pair[int(dark)]};" for name, pair in PLOT_PALETTE.items())


def number(value: float) -> str:
    """A tick's number, with a true minus sign."""
    return f"{value:g}".replace("-", "\N{MINUS SIGN}")


def round_ticks(low: float, high: float, most: int) -> tuple[float, ...]:
    """Up to `most` multiples of a round step (1, 2, 2.5, 5 times a power of ten) from `low` to `high`."""
    rough = (high - low) / most
    power = 10.0 ** math.floor(math.log10(rough))
    step = next(share * power for share in (1.0, 2.0, 2.5, 5.0, 10.0) if share * power >= rough * (1.0 - 1e-9))
    first = math.ceil(low / step - 1e-9)
    return tuple(round(i * step, 9) for i in range(first, math.floor(high / step + 1e-9) + 1))


def line(start: tuple[float, float], end: tuple[float, float], stroke: Stroke) -> str:
    """A straight line."""
    return polyline(np.array([start, end]), stroke)


def polyline(points: Array, stroke: Stroke) -> str:
    """A line through `points` (n, 2) px, broken where there is a NaN; nothing where no two are left."""
    words, pen = [], "M"
    for x, y in points.tolist():
        if math.isnan(x) or math.isnan(y):
            pen = "M"
            continue
        words.append(f"{pen}{x:.1f} {y:.1f}")
        pen = "L"
    if "L" not in "".join(words):
        return ""
    return element("path", {"d": "".join(words), "fill": "none"} | _stroked(stroke))


def area(points: Array, fill: str) -> str:
    """A closed area round `points` (n, 2) px."""
    words = "L".join(f"{x:.1f} {y:.1f}" for x, y in points.tolist())
    return element("path", {"d": f"M{words}Z", "fill": colour(fill)})


def circle(centre: tuple[float, float], radius: float, stroke: Stroke, fill: str = "none") -> str:
    """A circle, with a `fill` a colour's name."""
    place: dict[str, str | float] = {"cx": round(centre[0], 1), "cy": round(centre[1], 1), "r": round(radius, 1)}
    place["fill"] = fill if fill == "none" else colour(fill)
    return element("circle", place | _stroked(stroke))


def marker(kind: str, at: tuple[float, float], stroke: Stroke, words: str = "") -> str:
    """A mark round `at`: "circle", "up", "down", "diamond", "square"; `words` are shown on hovering."""
    corners = MARKERS[kind]
    points = " ".join(f"{at[0] + 5.5 * x:.1f},{at[1] + 5.5 * y:.1f}" for x, y in corners)
    style: dict[str, str | float] = {"fill": colour("paper"), "stroke": colour(stroke.colour), "stroke-width": 2.0}
    return element("polygon", {"points": points} | style, tooltip(words) if words else "")


MARKERS: Mapping[str, tuple[tuple[float, float], ...]] = {
    "circle": tuple((math.cos(a * math.pi / 8.0), math.sin(a * math.pi / 8.0)) for a in range(16)),
    "up": ((0.0, -1.1), (1.0, 0.8), (-1.0, 0.8)),
    "down": ((0.0, 1.1), (1.0, -0.8), (-1.0, -0.8)),
    "diamond": ((0.0, -1.25), (1.25, 0.0), (0.0, 1.25), (-1.25, 0.0)),
    "square": ((-0.9, -0.9), (0.9, -0.9), (0.9, 0.9), (-0.9, 0.9)),
}
"""Kind of mark -> corners on a circle of radius 1, y downwards."""


def hovers(points: Array, words: Iterable[str]) -> list[str]:
    """Invisible spots at `points` (n, 2) px that show their words on hovering."""
    return [
        element("circle", {"cx": round(x, 1), "cy": round(y, 1), "r": 6, "fill": "transparent"}, tooltip(each))
        for (x, y), each in zip(points.tolist(), words, strict=True)
        if not (math.isnan(x) or math.isnan(y))
    ]


def swatch(stroke: Stroke) -> str:
    """A short piece of a curve for a legend, from (0, 0) to (26, 0)."""
    return line((0.0, 0.0), (26.0, 0.0), stroke)


def patch(fill: str) -> str:
    """A small filled rectangle for a legend."""
    return element("rect", {"x": 2, "y": -6, "width": 22, "height": 12, "fill": colour(fill)})


def legend(entries: Sequence[tuple[str, str]], top: float, width: float = WIDTH) -> tuple[list[str], float]:
    """Entries (symbol, words) in rows from `top` px down, and where the rows end, px."""
    parts, x, y = [], 8.0, top + SIZE
    for symbol, words in entries:
        wide = 34.0 + text_width(words, SIZE) + 14.0
        if x > 8.0 and x + wide - 14.0 > width:
            x, y = 8.0, y + 1.45 * SIZE
        parts.append(element("g", {"transform": f"translate({x:.0f} {y - 0.35 * SIZE:.1f})"}, symbol))
        parts.append(text((x + 34.0, y), words, Lettering(SIZE)))
        x += wide
    return parts, y + 0.8 * SIZE


def haloed(at: tuple[float, float], words: str) -> str:
    """Small words centred at `at` that stay legible on lines."""
    style = {"text-anchor": "middle", "fill": colour("ink"), "stroke": colour("paper"), "paint-order": "stroke"}
    drawn: dict[str, str | float] = {
        "font-size": 0.85 * SIZE,
        "x": round(at[0], 1),
        "y": round(at[1], 1),
        "stroke-width": 4.0,
    }
    return element("text", drawn | style, escape(words))


def _upright(at: tuple[float, float], words: str) -> str:
    """Words that read from below upwards, centred at `at`."""
    turn = f"translate({at[0]:.1f} {at[1]:.1f}) rotate(-90)"
    return element("g", {"transform": turn}, text((0.0, 0.0), words, Lettering(SIZE, "middle")))


def _stroked(stroke: Stroke) -> dict[str, str | float]:
    style: dict[str, str | float] = {"stroke": colour(stroke.colour), "stroke-width": stroke.width}
    if DASHES[stroke.dash]:
        style["stroke-dasharray"] = DASHES[stroke.dash]
    return style

"""Bars with their values written beside them: where the power goes, and what matters most.

Letters are 11 units high in a picture 380 units wide, so that they stay legible on a phone. Nothing is told by colour
alone: every part of a bar is named, every value written with its sign.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from planar.errors import RangeError
from planar.report.svg import Box, Lettering, colour, element, group, pen, svg_document, text, text_width, tooltip

WIDTH, SIZE, EDGE, ROW = 380.0, 11.0, 4.0, 31.0
SHOWN = 1.2
"""Of the units in px, where there is room."""
BALANCE = 0.02
"""By how much shares may miss 1 in all: the solver's own bound is 0.01."""


@dataclass(frozen=True)
class Losses:
    """Shares of the power accepted, which add up to 1."""

    radiated: float
    surface_wave: float
    copper: float
    dielectric: float

    @property
    def named(self) -> tuple[tuple[str, str, float], ...]:
        """Name, colour and share, in the order drawn."""
        return (
            ("radiated into space", "radiated", self.radiated),
            ("guided in the board", "guided", self.surface_wave),
            ("lost in copper", "lost-copper", self.copper),
            ("lost in dielectrics", "lost-dielectric", self.dielectric),
        )


@dataclass(frozen=True)
class Bar:
    """A row: `value` in `unit`, signed, with the range `low` to `high` it may lie in where one is known."""

    name: str
    value: float
    unit: str
    low: float | None = None
    high: float | None = None


def loss_bar(losses: Losses, name: str) -> str:
    """One bar of the shares of `losses`, each with its part in per cent; `name` is whose. SVG text.

    Raises `RangeError` for shares that are negative or do not add up to 1.
    """
    shares = [share for _, _, share in losses.named]
    if min(shares) < 0.0 or abs(sum(shares) - 1.0) > BALANCE:
        raise RangeError(f"shares of {', '.join(f'{share:.4g}' for share in shares)} do not add up to 1")
    room, x, parts = WIDTH - 2.0 * EDGE, EDGE, []
    for title, hue, share in losses.named:
        width = room * share / sum(shares)
        if width > 0.0:
            box: dict[str, str | float] = {"x": x, "y": 4.0, "width": max(0.8, width - 1.2), "height": 26.0}
            words = f"{title}: {percent(share)} of the power accepted"
            parts.append(element("rect", box | {"fill": colour(hue)}, tooltip(words)))
        x += width
    rows = [part for i, row in enumerate(losses.named) for part in _share_row(row, i)]
    head = text(
        (EDGE, 84.0 + 2.0), "shares of the power accepted at the centre frequency", Lettering(SIZE, "start", "muted")
    )
    said = ", ".join(f"{title} {percent(share)}" for title, _, share in losses.named)
    view = Box(0.0, 0.0, WIDTH, 94.0)
    return svg_document(
        view, _shown(view), (f"{name}, where the power goes", said), [group("bar", {}, parts), *rows, head]
    )


def _share_row(row: tuple[str, str, float], index: int) -> list[str]:
    """The entry of a share, in two columns: swatch, per cent, name."""
    title, hue, share = row
    x, y = EDGE + (index % 2) * 0.5 * WIDTH, 49.0 + (index // 2) * 18.0
    swatch: dict[str, str | float] = {"x": x, "y": y - 9.0, "width": 10.0, "height": 10.0, "fill": colour(hue)}
    return [
        element("rect", swatch),
        text((x + 60.0, y), percent(share), Lettering(SIZE, "end", "ink", bold=True)),
        text((x + 66.0, y), title, Lettering(SIZE, "start", "ink")),
    ]


def percent(share: float) -> str:
    """A share in per cent with one decimal, as on the page."""
    return f"{100.0 * share:.1f} %"


def ranked_bars(bars: Sequence[Bar], title: str) -> str:
    """The `bars` by size of their values, all on one axis of one unit. SVG text.

    Raises `RangeError` where there are none or their units differ.
    """
    if not bars:
        raise RangeError("no bars to rank")
    if len({bar.unit for bar in bars}) > 1:
        raise RangeError(f"bars of different units: {', '.join(sorted({bar.unit for bar in bars}))}")
    ordered = sorted(bars, key=lambda bar: (-abs(bar.value), bar.name))
    ends = [end for bar in ordered for end in (bar.value, bar.low, bar.high) if end is not None]
    low, high = min(0.0, *ends), max(0.0, *ends)
    axis = _Axis(low, (WIDTH - 2.0 * EDGE) / ((high - low) or 1.0), low < 0.0 < high)
    rows = [part for i, bar in enumerate(ordered) for part in _bar_row(bar, 14.0 + ROW * i, axis)]
    said = "; ".join(f"{bar.name} {written(bar, signed=axis.both)}" for bar in ordered)
    view = Box(0.0, 0.0, WIDTH, ROW * len(ordered) + 4.0)
    return svg_document(view, _shown(view), (title, said), rows)


@dataclass(frozen=True)
class _Axis:
    """Where values lie: `low` end of the axis, units of the picture per unit of value, whether `both` signs occur."""

    low: float
    scale: float
    both: bool

    def at(self, value: float) -> float:
        """Place of a value across the picture."""
        return EDGE + (value - self.low) * self.scale


def written(bar: Bar, *, signed: bool) -> str:
    """The value to three digits with its unit, its sign where it is `signed`, and its range."""
    value = f"{bar.value:+.3g}" if signed else f"{bar.value:.3g}"
    reach = f" ({bar.low:.3g} to {bar.high:.3g})" if bar.low is not None and bar.high is not None else ""
    return f"{value} {bar.unit}{reach}".replace("-", "\N{MINUS SIGN}")


def _bar_row(bar: Bar, base: float, axis: _Axis) -> list[str]:
    """Name and value over the bar, which grows from the zero line to the side of its sign."""
    zero, end = axis.at(0.0), axis.at(bar.value)
    box: dict[str, str | float] = {
        "x": min(zero, end),
        "y": base + 4.5,
        "width": max(0.8, abs(end - zero)),
        "height": 8.0,
        "fill": colour("fall" if bar.value < 0.0 else "rise"),
    }
    value = written(bar, signed=axis.both)
    room = WIDTH - 2.0 * EDGE - text_width(value, SIZE, bold=True) - 6.0
    name = bar.name if text_width(bar.name, SIZE) <= room else f"{bar.name[: int(room / text_width('x', SIZE)) - 1]}…"
    ink = pen("ink", 1.0)
    parts = [
        text((EDGE, base), name, Lettering(SIZE, "start", "ink")),
        text((WIDTH - EDGE, base), value, Lettering(SIZE, "end", "ink", bold=True)),
        element("rect", box, tooltip(f"{bar.name}: {value}")),
        element("path", ink | {"d": f"M{zero:.6g} {base + 2:.6g}v13"}),
    ]
    if bar.low is not None and bar.high is not None:
        x0, x1, y = axis.at(bar.low), axis.at(bar.high), base + 8.5
        whisker = f"M{x0:.6g} {y:.6g}H{x1:.6g}M{x0:.6g} {y - 3:.6g}v6M{x1:.6g} {y - 3:.6g}v6"
        parts.append(element("path", ink | {"d": whisker}))
    return parts


def _shown(view: Box) -> tuple[str, str]:
    return f"{SHOWN * view.width:.6g}", f"{SHOWN * view.height:.6g}"

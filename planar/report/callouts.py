"""Callouts of a picture: words in the margins, sorted by height, with leaders to what they name.

Two ways to place them share one record. `beside` writes them left and right of the plan, for a wide page; `keyed` puts
numbers there and the words in a list below, so that a plan can fill a narrow screen. Neither lets two overlap. Units
are those of the picture, y downwards.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from dataclasses import dataclass

from planar.report.svg import Box, Lettering, Point, colour, element, group, pen, spread, text, text_width

LINE_HEIGHT = 1.25
"""Of the font size, from one base line to the next."""
RUN = 2.2
"""Font sizes between the plan and the words, in which leaders slant."""
NUDGE = 0.02
"""Of the plan's width: what lies nearer to its middle goes to the emptier side."""


@dataclass(frozen=True)
class Callout:
    """Words for one `spot` of the plan: `label` and its `value`, best `lift` above the spot's height."""

    name: str
    label: str
    value: str
    spot: Point
    lift: float = 0.0


@dataclass(frozen=True)
class Placed:
    """A callout with its place: `box` of the words (or number) and the `leader` from them to the spot."""

    callout: Callout
    number: int
    left: bool
    box: Box
    leader: tuple[Point, Point, Point]


@dataclass(frozen=True)
class Margins:
    """Callouts round a plan: where each is, their `leaders` and `words` as they are drawn, and the box round all."""

    placed: tuple[Placed, ...]
    leaders: tuple[str, ...]
    words: tuple[str, ...]
    extent: Box


Placing = Callable[[Sequence[Callout], Box, float], Margins]
"""From callouts, the plan they stand round and the font size."""


def beside(callouts: Sequence[Callout], plan: Box, size: float) -> Margins:
    """Name and value in two lines left and right of the `plan`, in a font of `size`."""
    width = max((_two_line_width(each, size) for each in callouts), default=0.0)
    placed = _columns(callouts, plan, (width, 2.0 * LINE_HEIGHT * size), size)
    words = tuple(part for each in placed for part in _two_lines(each, size))
    return Margins(placed, _leaders(placed, size), words, _extent(plan, placed))


def keyed(callouts: Sequence[Callout], plan: Box, size: float) -> Margins:
    """Numbers in circles left and right of the `plan`, and below it what they stand for, in a font of `size`."""
    across = 1.7 * size
    placed = _columns(callouts, plan, (across, across), size)
    extent = _extent(plan, placed)
    words = [part for each in placed for part in _balloon(each, size)]
    row, y = 1.6 * size, extent.y1 + 0.8 * size
    labels = max((text_width(each.label, size) for each in callouts), default=0.0)
    values = max((text_width(each.value, size, bold=True) for each in callouts), default=0.0)
    width = 2.2 * size + labels + values
    for each in placed:
        y += row
        words += _key_row(each, (extent.x0, y), size, labels)
    end = y + 0.4 * size if placed else extent.y1
    return Margins(
        placed, _leaders(placed, size), tuple(words), Box(extent.x0, extent.y0, max(extent.x1, extent.x0 + width), end)
    )


def _columns(callouts: Sequence[Callout], plan: Box, item: tuple[float, float], size: float) -> tuple[Placed, ...]:
    """Items of one (width, height) in a column on either side of `plan`, numbered down the left and then the right."""
    placed: list[Placed] = []
    for side, left in zip(_sides(callouts, plan, 1.08 * item[1]), (True, False), strict=True):
        ordered = sorted(side, key=lambda each: (each.spot[1] - each.lift, each.spot[0], each.name))
        heights = [1.08 * item[1]] * len(ordered)
        centres = spread([each.spot[1] - each.lift for each in ordered], heights)
        edge = plan.x0 - RUN * size if left else plan.x1 + RUN * size
        ordered = _uncrossed(ordered, edge, centres)
        for callout, centre in zip(ordered, centres, strict=True):
            x0 = edge - item[0] if left else edge
            box = Box(x0, centre - 0.5 * item[1], x0 + item[0], centre + 0.5 * item[1])
            inward = 1.0 if left else -1.0
            ends = ((edge + 0.25 * inward * size, centre), (edge + 0.9 * inward * size, centre))
            placed.append(Placed(callout, len(placed) + 1, left, box, (*ends, callout.spot)))
    return tuple(placed)


def _sides(callouts: Sequence[Callout], plan: Box, height: float) -> tuple[list[Callout], list[Callout]]:
    """Who goes left and who right: the nearer side, but no column grows much past the plan while the other is short."""
    middle = 0.5 * (plan.x0 + plan.x1)
    by_x = sorted(callouts, key=lambda each: (each.spot[0], each.spot[1], each.name))
    cut = sum(1 for each in by_x if each.spot[0] < middle - NUDGE * plan.width)
    free = sum(1 for each in by_x if abs(each.spot[0] - middle) <= NUDGE * plan.width)
    cut += max(0, min(free, len(by_x) // 2 - cut))
    most = max(1, math.floor(plan.height / height))
    if len(by_x) > 2 * most:
        most = math.ceil(0.5 * len(by_x))
    cut = min(max(cut, len(by_x) - most), most)
    return by_x[:cut], by_x[cut:]


def _uncrossed(ordered: list[Callout], edge: float, centres: list[float]) -> list[Callout]:
    """The callouts in such an order that no two neighbours' leaders cross."""
    found = list(ordered)
    for _ in range(len(found) ** 2):
        crossed = next(
            (
                i
                for i in range(len(found) - 1)
                if _cross(((edge, centres[i]), found[i].spot), ((edge, centres[i + 1]), found[i + 1].spot))
            ),
            None,
        )
        if crossed is None:
            break
        found[crossed : crossed + 2] = found[crossed : crossed + 2][::-1]
    return found


def _cross(one: tuple[Point, Point], other: tuple[Point, Point]) -> bool:
    """Whether two segments cross."""

    def turn(a: Point, b: Point, c: Point) -> float:
        return (b[0] - a[0]) * (c[1] - a[1]) - (b[1] - a[1]) * (c[0] - a[0])

    (a, b), (c, d) = one, other
    return turn(a, b, c) * turn(a, b, d) < 0.0 and turn(c, d, a) * turn(c, d, b) < 0.0


def _extent(plan: Box, placed: Sequence[Placed]) -> Box:
    extent = plan
    for each in placed:
        extent = extent.joined(each.box)
    return extent


def _two_line_width(callout: Callout, size: float) -> float:
    return max(text_width(callout.label, 0.92 * size), text_width(callout.value, size, bold=True))


def _two_lines(each: Placed, size: float) -> list[str]:
    anchor, x = ("end", each.box.x1) if each.left else ("start", each.box.x0)
    middle = 0.5 * (each.box.y0 + each.box.y1)
    return [
        text((x, middle - 0.2 * size), each.callout.label, Lettering(0.92 * size, anchor, "muted")),
        text((x, middle + 0.9 * size), each.callout.value, Lettering(size, anchor, "ink", bold=True)),
    ]


def _balloon(each: Placed, size: float) -> list[str]:
    middle = (0.5 * (each.box.x0 + each.box.x1), 0.5 * (each.box.y0 + each.box.y1))
    return [_circle(middle, size), text((middle[0], middle[1] + 0.34 * size), str(each.number), _numeral(size))]


def _key_row(each: Placed, at: Point, size: float, labels: float) -> list[str]:
    """A row of the list: number, label in a column `labels` wide, value."""
    x = at[0] + 2.2 * size
    return [
        text((at[0] + 0.85 * size, at[1]), str(each.number), _numeral(size)),
        text((x, at[1]), each.callout.label, Lettering(size, "start", "muted")),
        text((x + labels, at[1]), each.callout.value, Lettering(size, "start", "ink", bold=True)),
    ]


def _numeral(size: float) -> Lettering:
    return Lettering(0.92 * size, "middle", "ink", bold=True)


def _circle(centre: Point, size: float) -> str:
    place = {"cx": centre[0], "cy": centre[1], "r": 0.8 * size}
    return element("circle", pen("muted", 0.07 * size, place | {"fill": colour("paper")}))


def _leaders(placed: Sequence[Placed], size: float) -> tuple[str, ...]:
    """Thin lines that end in a dot."""
    lines, dots = [], []
    for each in placed:
        points = " ".join(f"{x:.4g},{y:.4g}" for x, y in each.leader)
        lines.append(element("polyline", {"points": points}))
        (x, y) = each.callout.spot
        dots.append(element("circle", {"cx": x, "cy": y, "r": 0.16 * size}))
    return (
        group("leader-halo", pen("paper", 0.2 * size, {"stroke-opacity": "0.55"}), lines),
        group("leaders", pen("muted", 0.06 * size), lines),
        group("leader-ends", pen("paper", 0.05 * size, {"fill": colour("measure")}), dots),
    )

"""Magnified windows on a board picture: dimensions too small to be seen at true scale are drawn there.

Small measured lines that lie close together share a window. The windows stand in rows below the plan, each with its
letter and its scale, and the plan shows where they look. Units are mm of the picture, y downwards.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from dataclasses import dataclass

from planar.copper.arc import Point as BoardPoint
from planar.report.dimension_marks import Mark
from planar.report.svg import Box, Lettering, Point, element, pen, text

SCALES = (2, 5, 10, 20, 50)
"""Magnifications of ISO 5455."""
SMALL = 0.35
"""Font sizes, a straight measured line shorter than this is drawn in a window."""
NEIGHBOUR = 1.3
"""Font sizes, one shorter than this moves into a window it fits."""
FILLED = 0.62
"""Part of a window that what is measured in it may take."""


@dataclass(frozen=True)
class Detail:
    """A window: `letter`, `scale` to one, the part `source` of the plan it shows, its own `box`, and the `names` of
    the marks drawn in it."""

    letter: str
    scale: int
    source: Box
    box: Box
    names: frozenset[str]

    @property
    def middle(self) -> Point:
        """The middle of what it shows, on the plan."""
        return 0.5 * (self.source.x0 + self.source.x1), 0.5 * (self.source.y0 + self.source.y1)

    def shown(self, at: Point) -> Point:
        """Where a point of the plan appears in the window."""
        return (
            self.box.x0 + self.scale * (at[0] - self.source.x0),
            self.box.y0 + self.scale * (at[1] - self.source.y0),
        )


def details_of(marks: Sequence[Mark], plan: Box, size: float) -> tuple[Detail, ...]:
    """Windows for the small ones of `marks`, below the `plan`, with letters of `size`."""
    groups = _groups(marks, size)
    side = min(max(0.27 * plan.width, 5.5 * size), 11.0 * size)
    gap = 1.3 * size
    per_row = max(1, math.floor((plan.width + gap) / (side + gap)))
    found = []
    taken: frozenset[str] = frozenset()
    for i, names in enumerate(groups):
        row, column = divmod(i, per_row)
        in_row = min(per_row, len(groups) - row * per_row)
        left = 0.5 * (plan.x0 + plan.x1) - 0.5 * (in_row * (side + gap) - gap)
        x0, y0 = left + column * (side + gap), plan.y1 + (row + 1) * 1.6 * size + row * side
        bounds = _bounds([mark for mark in marks if mark.name in names])
        scale = _scale(bounds, [_length(mark) for mark in marks if mark.name in names], side, size)
        source = _square(bounds, side / scale)
        joined = names | {m.name for m in marks if _fits(m, source, size)} - taken - frozenset().union(*groups)
        taken |= joined
        found.append(Detail(chr(ord("A") + i), scale, source, Box(x0, y0, x0 + side, y0 + side), joined))
    return tuple(found)


def detail_drawing(detail: Detail, size: float, inside: Callable[[Box, float], list[str]]) -> list[str]:
    """The window with its frame and its name; `inside` draws the part of the board in a box with pens of a size."""
    box, source = detail.box, detail.source
    window: dict[str, str | float] = {"x": box.x0, "y": box.y0, "width": box.width, "height": box.height}
    looks = " ".join(f"{value:.6g}" for value in (source.x0, source.y0, source.width, source.height))
    drawn = "\n".join(inside(source, size / detail.scale))
    name = f"{detail.letter}  {detail.scale}:1"
    return [
        element("svg", window | {"viewBox": looks}, drawn),
        element("rect", pen("ink", 0.07 * size, window)),
        text((box.x0, box.y0 - 0.35 * size), name, Lettering(0.92 * size, "start", "ink", bold=True)),
    ]


def detail_place(detail: Detail, size: float) -> list[str]:
    """The ring on the plan that tells where the window looks, with its letter."""
    (x, y), radius = detail.middle, _ring(detail, size)
    at = (x + 0.75 * radius + 0.1 * size, y - 0.75 * radius - 0.1 * size)
    letter = text(at, detail.letter, Lettering(0.92 * size, "start", "ink", bold=True))
    return [element("circle", pen("ink", 0.08 * size, {"cx": x, "cy": y, "r": radius})), letter]


def place_box(detail: Detail, size: float) -> Box:
    """The box round what `detail_place` draws."""
    (x, y), radius = detail.middle, _ring(detail, size)
    return Box(x - radius, y - radius - 0.9 * size, x + radius + size, y + radius)


def _ring(detail: Detail, size: float) -> float:
    return min(max(0.5 * detail.source.width, 0.4 * size), 0.9 * size)


def _length(mark: Mark) -> float:
    """Length in mm of a straight measured line, infinite for others."""
    straight = mark.measure is not None and len(mark.measure.edges) == 1 and mark.measure.edges[0].bulge == 0.0
    return 1e3 * mark.measure.length if straight and mark.measure is not None and not mark.is_radius else math.inf


def _groups(marks: Sequence[Mark], size: float) -> list[frozenset[str]]:
    """Names of the small marks, those near each other together, from the left to the right."""
    groups: list[list[Mark]] = []
    for mark in marks:
        if _length(mark) >= SMALL * size:
            continue
        near = [g for g in groups if any(math.dist(mark.spot, other.spot) < 0.9e-3 * size for other in g)]
        groups = [g for g in groups if g not in near] + [[mark, *(other for g in near for other in g)]]
    groups.sort(key=lambda g: min(mark.spot for mark in g))
    return [frozenset(mark.name for mark in g) for g in groups]


def _bounds(marks: Sequence[Mark]) -> Box:
    points: list[BoardPoint] = []
    for mark in marks:
        points += [point for edge in mark.measure.edges for point in edge.extremes()] if mark.measure else [mark.spot]
        points += [start for start, _ in mark.witnesses]
    xs, ys = [1e3 * x for x, _ in points], [-1e3 * y for _, y in points]
    return Box(min(xs), min(ys), max(xs), max(ys))


def _scale(bounds: Box, lengths: Sequence[float], side: float, size: float) -> int:
    """Large enough for the smallest length to be seen, small enough for all to fit."""
    fitting = FILLED * side / max(bounds.width, bounds.height, 1e-6)
    wanted = 1.7 * size / min(lengths)
    return max((s for s in SCALES if s <= fitting and s <= max(wanted, SCALES[0])), default=SCALES[0])


def _square(bounds: Box, side: float) -> Box:
    x, y = 0.5 * (bounds.x0 + bounds.x1), 0.5 * (bounds.y0 + bounds.y1)
    return Box(x - 0.5 * side, y - 0.5 * side, x + 0.5 * side, y + 0.5 * side)


def _fits(mark: Mark, source: Box, size: float) -> bool:
    if not _length(mark) < NEIGHBOUR * size:
        return False
    bounds, room = _bounds([mark]), source.grown(-0.15 * source.width)
    return bounds.x0 > room.x0 and bounds.x1 < room.x1 and bounds.y0 > room.y0 and bounds.y1 < room.y1

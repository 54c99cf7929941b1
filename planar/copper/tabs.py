"""Trim tabs: three pairs of short strips on the inner edge of the loop trace, to be cut off on the built board.

The middle pair lies a quarter of the mean line from the gap, where the voltage of a full-wave loop is highest and a
little copper weighs most; the upper pair is nearer the gap, the lower one further from it. Each tab leaves the trace at
right angles, on bends too, with straight and parallel sides.
"""

from __future__ import annotations

import itertools
from collections.abc import Mapping

from planar.copper.outline import Outline
from planar.copper.path import Path
from planar.copper.shapes import turned_rectangle
from planar.errors import GeometryError

PAIRS = 3
"""Pairs of tabs on a loop, named from the gap: upper, middle, lower."""
TOUCHING = 1e-8
"""m, copper nearer than this is one."""


def tab_places(line: Path, spacing: float, pairs: int = PAIRS) -> tuple[float, ...]:
    """Middles of the tabs, m along the mean `line` from the gap, when `pairs` of them are left: the upper go first."""
    if not 0 <= pairs <= PAIRS:
        raise GeometryError(f"{pairs} pairs of trim tabs, there are 0 to {PAIRS}")
    quarter = 0.25 * line.length
    left = (quarter - spacing, quarter, quarter + spacing)[PAIRS - pairs :]
    return tuple(place for each in left for place in (each, line.length - each))


def tab_outlines(line: Path, dimensions: Mapping[str, float], pairs: int = PAIRS) -> tuple[Outline, ...]:
    """Tabs from the mean `line` inward past the trace's edge. Raises `GeometryError` where they meet each other."""
    tabs = tuple(_inward(line, place, dimensions, 0.0) for place in tab_places(line, dimensions["tab_spacing"], pairs))
    for one, other in itertools.combinations(tabs, 2):
        if _touch(one, other):
            raise GeometryError(
                f"trim tabs of {_mm(dimensions['tab_length'])} by {_mm(dimensions['tab_width'])}, "
                f"{_mm(dimensions['tab_spacing'])} apart, meet each other"
            )
    return tabs


def check_places(line: Path, dimensions: Mapping[str, float], gaps: Mapping[float, float]) -> None:
    """Raise `GeometryError` where a tab meets one of the `gaps`, place along the mean `line` -> length, m."""
    for place in tab_places(line, dimensions["tab_spacing"]):
        for middle, length in gaps.items():
            apart = abs(place - middle)
            if min(apart, line.length - apart) <= 0.5 * (length + dimensions["tab_width"]):
                raise GeometryError(
                    f"the trim tab at {_mm(place)} along the mean line meets the gap at {_mm(middle)}: "
                    f"tab_spacing is {_mm(dimensions['tab_spacing'])}"
                )


def check_joined(line: Path, dimensions: Mapping[str, float], trace: Outline) -> None:
    """Raise `GeometryError` where the free half of a tab touches the `trace`: beside its foot or at the far side."""
    free = 0.5 * (dimensions["trace_width"] + dimensions["tab_length"])
    for place in tab_places(line, dimensions["tab_spacing"]):
        if _touch(_inward(line, place, dimensions, free), trace):
            raise GeometryError(
                f"a trim tab of {_mm(dimensions['tab_length'])} at {_mm(place)} along the mean line reaches another "
                "part of the trace"
            )


def check_clear(tabs: tuple[Outline, ...], others: tuple[Outline, ...], what: str) -> None:
    """Raise `GeometryError` where one of the `tabs` touches one of the `others`, which are `what`."""
    if any(_touch(tab, other) for tab, other in itertools.product(tabs, others)):
        raise GeometryError(f"the trim tabs reach {what}: shorter tabs are needed")


def _inward(line: Path, place: float, dimensions: Mapping[str, float], start: float) -> Outline:
    """Tab at `place` m along `line`, from `start` m inside it to the tab's end."""
    end = 0.5 * dimensions["trace_width"] + dimensions["tab_length"]
    (x, y), (ux, uy) = line.at(place)
    middle = 0.5 * (start + end)
    centre = (x - middle * uy, y + middle * ux)  # the inside is on the left of the mean line
    return turned_rectangle(centre, (ux, uy), length=dimensions["tab_width"], width=end - start)


def _touch(one: Outline, other: Outline) -> bool:
    return bool(one.shape().distance(other.shape()) < TOUCHING)


def _mm(length: float) -> str:
    return f"{length * 1e3:.2f} mm"

"""Cut now: copper that can be taken off the finished board to bring its response back.

Every cut this board offers is solved on the board found: tabs, the open end of a line, gaps, the edges of the loop.
Only those that move the response the right way are offered, with half of the computed amount as the first cut, because
what is gone is gone. Where only more copper would help, that is said.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from planar.copper.tabs import PAIRS
from planar.design.choices import Choices
from planar.design.line_size import STEP
from planar.design.retune.built import Artwork, Built, Outlook
from planar.design.trim import TAB_CUTS, end_step
from planar.design.variables import HEIGHT, LOOP
from planar.units import show

Array = NDArray[np.float64]
Complex = NDArray[np.complex128]

LEAST_SHIFT = 3e-4
"""Fraction by which a cut must be able to move the response to be worth mentioning."""
LEAST_CUT = 5e-5
"""m, smaller cuts cannot be made with a knife (common practice, no source)."""
EDGE, GAP_TRY = 0.12, 0.3
"""Of the trace's width or of a gap, the cuts tried first."""
WORSE = 1.0
"""dB by which the match in the band may suffer from a cut that brings the response back."""

Draw = Callable[[float], dict[str, float]]


@dataclass(frozen=True, eq=False)
class Cut:
    """A cut of `what`: `amount` m in all to bring the response back (None for tabs) of `spare` m at most, `first` m of
    them to cut now, `begin` the first cut in words; the outlook after the whole and after the first cut."""

    what: str
    amount: float | None
    first: float | None
    spare: float | None
    begin: str
    artwork: Artwork
    outlook: Outlook
    after_first: Outlook


@dataclass(frozen=True, eq=False)
class CutNow:
    """Cuts that help, the best first, and (what, why not) of the others."""

    ways: tuple[Cut, ...]
    others: tuple[tuple[str, str], ...]


@dataclass(frozen=True)
class _Knife:
    """A cut of any length up to `most` m: what it makes of the dimensions, tried at `amount` m first."""

    what: str
    amount: float
    most: float
    made: Draw


def cut_now(built: Built) -> CutNow:
    """What can be cut off the board to bring its response back to the design's."""
    here = built.outlook(built.unchanged)
    wanted = -here.shift
    knives = _knives(built.choices, built.artwork.dimensions)
    tabs = list(TAB_CUTS) if "trim" in built.choices.traits else []
    artworks = [Artwork(knife.made(knife.amount)) for knife in knives]
    artworks += [Artwork(built.artwork.dimensions, left) for left in tabs]
    tried = built.changes(artworks)
    ways: list[Cut] = []
    others: list[tuple[str, str]] = []
    for knife, change in zip(knives, tried, strict=False):
        _sort(_of_knife(built, knife, change, here), ways, others)
    for left, change in zip(tabs, tried[len(knives) :], strict=True):
        _sort(_of_tabs(built, left, change, here), ways, others)
    ways.sort(key=lambda cut: cut.outlook.distance)
    if not ways:
        more = "longer" if wanted < 0.0 else "shorter"
        others.append(("anything", f"nothing can be cut that helps: the loop should be {more}, see the next spin"))
    return CutNow(tuple(ways), tuple(others))


def _sort(found: Cut | tuple[str, str], ways: list[Cut], others: list[tuple[str, str]]) -> None:
    if isinstance(found, Cut):
        ways.append(found)
    else:
        others.append(found)


def _of_knife(built: Built, knife: _Knife, change: Complex | None, here: Outlook) -> Cut | tuple[str, str]:
    """The cut of the length that brings the response back, or (what, why not)."""
    if change is None:
        return knife.what, "it cannot be drawn or solved"
    slope = (built.outlook(change).shift - here.shift) / knife.amount
    refused = _refused(slope * knife.most, -here.shift)
    if refused:
        return knife.what, refused
    amount = min(knife.most, -here.shift / slope)
    amount = STEP * round(amount / STEP)
    if amount < LEAST_CUT:
        return knife.what, f"{1e6 * amount:.0f} um of it would do: too little for a knife"
    whole, half = built.changes([Artwork(knife.made(amount)), Artwork(knife.made(0.5 * amount))])
    if whole is None or half is None:
        return knife.what, "the cut it takes cannot be drawn or solved"
    outlook, first = built.outlook(whole), built.outlook(half)
    begin = f"{knife.what}, {show(0.5 * amount, 'length', 3)} of {show(amount, 'length', 3)} in all"
    artwork = Artwork(knife.made(amount))
    return _helps(Cut(knife.what, amount, 0.5 * amount, knife.most, begin, artwork, outlook, first), here)


def _of_tabs(built: Built, left: int, change: Complex | None, here: Outlook) -> Cut | tuple[str, str]:
    """Tabs cut away down to `left` pairs; half of that first, a pair at least."""
    what = TAB_CUTS[left]
    if change is None:
        return what, "it cannot be drawn or solved"
    outlook = built.outlook(change)
    refused = _refused(outlook.shift - here.shift, -here.shift)
    if refused:
        return what, refused
    if abs(outlook.shift) > abs(here.shift):
        return what, f"it moves the response {100.0 * (outlook.shift - here.shift):+.2f} %, too far"
    if left == PAIRS - 1:
        first, after = f"half the length of each tab of the {what}", built.outlook(0.5 * change)
    else:
        kept = PAIRS - (PAIRS - left) // 2
        first = TAB_CUTS[kept]
        (half,) = built.changes([Artwork(built.artwork.dimensions, kept)])
        after = built.outlook(0.5 * change if half is None else half)
    return _helps(Cut(what, None, None, None, first, Artwork(built.artwork.dimensions, left), outlook, after), here)


def _refused(possible: float, wanted: float) -> str:
    """Why a cut that can move the response by `possible` is no answer to `wanted`; empty where it is one."""
    if abs(possible) < LEAST_SHIFT:
        return f"it moves the response by {100.0 * possible:+.2f} % at most"
    if possible * wanted <= 0.0:
        return f"it moves the response the wrong way, {'up' if possible > 0.0 else 'down'}"
    return ""


def _helps(cut: Cut, here: Outlook) -> Cut | tuple[str, str]:
    """The cut, or why the board is no better with it."""
    after = cut.outlook
    if after.worst_db > here.worst_db + WORSE:
        return cut.what, f"the match in the band would go from {here.worst_db:.1f} to {after.worst_db:.1f} dB"
    if after.distance > here.distance:
        return (
            cut.what,
            f"it leaves the response farther from the design: {after.distance:.3f}, now {here.distance:.3f}",
        )
    return cut


def _knives(choices: Choices, dimensions: Mapping[str, float]) -> list[_Knife]:
    """Every cut of any length this board offers."""
    found = []
    trace, line = dimensions["trace_width"], dimensions.get("line_width", 0.0)
    edge = min(0.4 * trace, max(0.0, trace - 2.0 * line)) if line else 0.4 * trace
    for what, outer in (("outer edge of the loop, all round", True), ("inner edge of the loop, all round", False)):
        if edge > LEAST_CUT:
            found.append(_Knife(what, min(edge, EDGE * trace), edge, _edge(choices, dimensions, outer)))
    for name, what in (("gap", "feed gap, widened alike on both sides"), ("second_gap", "second gap, widened alike")):
        if name in dimensions:
            found.append(_Knife(what, GAP_TRY * dimensions[name], dimensions[name], _moved(dimensions, name, 1.0)))
    room = dimensions.get("end_length", 0.0) - dimensions.get("gap", 0.0)
    if choices.end == "open" and room > 0.0:
        first = min(end_step(choices.centre), room)
        found.append(_Knife("open end of the line, shortened", first, room, _moved(dimensions, "end_length", -1.0)))
    return found


def _moved(dimensions: Mapping[str, float], name: str, sign: float) -> Draw:
    return lambda amount: dict(dimensions) | {name: dimensions[name] + sign * amount}


def _edge(choices: Choices, dimensions: Mapping[str, float], outer: bool) -> Draw:
    """The loop without a strip along one edge: a narrower trace whose mean line has moved by half the strip."""
    sign = -1.0 if outer else 1.0

    def made(amount: float) -> dict[str, float]:
        cut = dict(dimensions) | {"trace_width": dimensions["trace_width"] - amount}
        for name in (LOOP, HEIGHT):
            if name in cut:
                cut[name] += sign * amount
        longer = cut[LOOP] / dimensions[LOOP]
        cut |= {name: dimensions[name] * longer for name in choices.family.along if name in cut}
        if "corner_radius" in cut:
            cut["corner_radius"] = max(0.0, cut["corner_radius"] + 0.5 * sign * amount)
        if "feed_length" in cut:
            cut["feed_length"] = cut["feed_length"] - 0.5 * sign * amount
        return cut

    return made

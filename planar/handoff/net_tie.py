"""Where the copper joins signal and return on purpose, which layout tools report as a short.

A loop is a short at DC. Either one island carries both terminals, or the signal's island meets the rest of the loop
in plated holes: those are the places a layout engineer marks as a net tie.
"""

from __future__ import annotations

from dataclasses import dataclass

from planar.copper.boolean import contains
from planar.copper.layout import Hole, Island, Layout, bounds_of
from planar.copper.outline import Outline, on_grid
from planar.copper.shapes import circle, rectangle

_CLEAR = 1e-3
"""m, from the copper or hole to the outline drawn round it."""


@dataclass(frozen=True)
class NetTie:
    """One place where signal and return of `net` meet: the `islands` that meet there, the plated `hole` they meet in
    (None where one island is both), a closed `outline` round it on the grid."""

    net: str
    islands: tuple[Island, ...]
    hole: Hole | None
    outline: Outline


def net_ties(layout: Layout) -> tuple[NetTie, ...]:
    """Every place of a snapped `layout` where signal and return meet; none where they do not at DC."""
    nets = {terminal: {p.net for p in layout.pads if p.terminal == terminal} for terminal in ("signal", "return")}
    return tuple(tie for net in sorted(nets["signal"] & nets["return"]) for tie in _ties_of(layout, net))


def _ties_of(layout: Layout, net: str) -> list[NetTie]:
    islands = [island for island in layout.islands if island.net == net]
    ends = {terminal: _islands_under(layout, islands, terminal) for terminal in ("signal", "return")}
    both = ends["signal"] & ends["return"]
    if both:
        return [NetTie(net, (islands[i],), None, _round(islands[i])) for i in sorted(both)]
    ties = []
    for hole in layout.holes:
        if not hole.plated or hole.net != net:
            continue
        met = [i for i, island in enumerate(islands) if contains(island.outline, hole.centre)]
        if set(met) & ends["signal"] and set(met) - ends["signal"]:
            joined = tuple(islands[i] for i in met)
            ties.append(NetTie(net, joined, hole, circle(hole.centre, hole.diameter + 2.0 * _CLEAR).normalised()))
    return ties


def _islands_under(layout: Layout, islands: list[Island], terminal: str) -> set[int]:
    """Numbers of the islands that carry a land of `terminal`."""
    found = set()
    nets = {island.net for island in islands}
    for pad in layout.pads:
        if pad.terminal != terminal or pad.net not in nets:
            continue
        x, y = pad.outline.shape().representative_point().coords[0]
        found |= {i for i, a in enumerate(islands) if a.level == pad.level and contains(a.outline, (x, y))}
    return found


def _round(island: Island) -> Outline:
    x0, y0, x1, y1 = bounds_of([island.outline])
    return rectangle(*(on_grid(c) for c in (x0 - _CLEAR, y0 - _CLEAR, x1 + _CLEAR, y1 + _CLEAR)))

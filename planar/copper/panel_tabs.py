"""Where tabs stand: on each stretch of a side, the place farthest from copper.

A tab holds a board to its neighbour or to the rail across the slot between them. It never stands nearer to copper
than a score line may, nor where a connector overhangs the edge. Its holes are drilled along the board's edge, their
middles a quarter of their diameter out in the tab: what stands out when it is broken is within the outline's tolerance,
and the notches that stay on the board are less than half a hole.
"""

from __future__ import annotations

import itertools
import math
from collections.abc import Iterator, Mapping
from dataclasses import dataclass

import numpy as np
import shapely
from numpy.typing import NDArray

from planar.copper.layout import Layout
from planar.copper.outline import GRID
from planar.copper.panel_copies import Blank, Box, nanometres
from planar.errors import Finding, Severity, SynthesisError
from planar.library.records import Fab, Panelling
from planar.units import show

STEP = 250_000
"""nm between the places tried."""
FINE = 1e-4
"""m, distances to copper that differ by less count as equal; the place nearer to the middle of its stretch wins."""
BODY_ROOM = 1_000_000
"""nm between a tab and a connector's body."""
SIDES = ("left", "right", "lower", "upper")
Places = Mapping[tuple[int, str], tuple[int, ...]]
"""(axis, which slot) -> middles of the tabs from the lower or left end of the boards' side, nm. Axis 0 are the slots
that run upwards; which is "first" beside the left or lower rail, "inner" between boards, "last" beside the other."""


@dataclass(frozen=True)
class TabRule:
    """A tab: `neck` wide at its narrowest in a slot of `slot`, one at least per `stretch` of a side, `count` holes of
    diameter `hole` at `pitch`, their middles `offset` outside the board's edge (nm); `copper_room` and `hole_room` from
    the board's edge along the tab to copper and to holes of the board (m)."""

    neck: int
    slot: int
    stretch: int
    count: int
    hole: int
    pitch: int
    offset: int
    copper_room: float
    hole_room: float

    @property
    def half(self) -> int:
        """Half of the tab along the board's edge, wider than the neck by the round ends of the slots, nm."""
        return (self.neck + self.slot) // 2


def tab_rule(fab: Fab, way: Panelling) -> TabRule:
    """The fab's tab. Raises `SynthesisError` when its walls between holes are thinner than its own rule."""
    offset = nanometres(min(0.25 * way.perforation_hole, fab.outline_tolerance))
    notch = 0.5 * way.perforation_hole - offset * GRID if way.perforation_count else 0.0
    rule = TabRule(
        neck=2 * (nanometres(way.tab_width) // 2),
        slot=2 * nanometres(fab.edge_radius),
        stretch=nanometres(way.tab_stretch),
        count=way.perforation_count,
        hole=nanometres(way.perforation_hole),
        pitch=nanometres(way.perforation_pitch),
        offset=offset,
        copper_room=max(fab.copper_to_score, notch + fab.copper_to_routed_edge),
        hole_room=notch + fab.hole_to_edge,
    )
    findings = tuple(_thin_walls(rule, way)) if rule.count else ()
    if findings:
        raise SynthesisError("the fab's perforation breaks by itself", findings)
    return rule


def _thin_walls(rule: TabRule, way: Panelling) -> Iterator[Finding]:
    """Walls between two holes, and between the last one and the round end of the slot, below the fab's own rule."""
    least, limit = nanometres(way.perforation_wall), show(way.perforation_wall, "length", 4)
    wall = rule.pitch - rule.hole
    if wall < least:
        advice = f"a pitch of {show((rule.hole + least) * GRID, 'length', 4)} in panelling.perforation_pitch"
        got = show(wall * GRID, "length", 4)
        yield Finding("perforation wall", "between two holes", got, limit, advice, Severity.REFUSE)
    end, run = 0.5 * rule.slot, 0.5 * (rule.count - 1) * rule.pitch
    beside = 0.5 * rule.neck + end - run
    to_slot = math.hypot(max(0.0, beside), end - rule.offset) - end - 0.5 * rule.hole
    if to_slot < least:
        neck = 2.0 * (math.sqrt((end + 0.5 * rule.hole + least) ** 2 - (end - rule.offset) ** 2) - end + run)
        advice = f"at least {show(math.ceil(neck / 1e4) * 1e-5, 'length', 4)} in panelling.tab_width"
        got = show(max(0.0, to_slot * GRID), "length", 4)
        yield Finding("perforation wall", "beside the slot", got, limit, advice, Severity.REFUSE)


def overhangs(body: Box | None, box: Box) -> dict[str, int]:
    """How far (nm) a connector's `body` reaches beyond each side of a board of `box`; sides it keeps within are out."""
    if body is None:
        return {}
    beyond = (box[0] - body[0], body[2] - box[2], box[1] - body[1], body[3] - box[3])
    return {side: reach for side, reach in zip(SIDES, beyond, strict=True) if reach > 0}


def tab_places(board: Layout, blank: Blank, *, rule: TabRule, body: Box | None, counts: tuple[int, int]) -> Places:
    """Where the tabs of `counts` (columns, rows) boards stand.

    `board` lies as in the panel, `blank` is its rectangle, `body` (nm) its connector's. Raises `SynthesisError` when
    the boards would not be held.
    """
    box = blank.box
    free = _Clearance(board, box, blank.corner, rule, body)
    places: dict[tuple[int, str], tuple[int, ...]] = {}
    for axis, (before, after) in enumerate((("left", "right"), ("lower", "upper"))):
        length = (box[3] - box[1], box[2] - box[0])[axis]
        u = free.positions(length)
        first, last = free.along(before, u), free.along(after, u)
        kinds = {"first": first, "inner": np.minimum(first, last), "last": last}
        if counts[axis] == 1:
            del kinds["inner"]
        places |= {(axis, which): _chosen(length, u, room, rule) for which, room in kinds.items()}
    _refuse_loose(places, rule, board.name)
    return places


def _refuse_loose(places: Places, rule: TabRule, name: str) -> None:
    """A board is held when every slot of both directions has a tab, or every slot of one direction has two."""
    fewest = [min(len(found) for (axis, _), found in places.items() if axis == each) for each in (0, 1)]
    if min(fewest) >= 1 or max(fewest) >= 2:
        return
    room = show(rule.copper_room, "length", 4)
    finding = Finding(
        rule="tabs",
        where=f"edges of {name}",
        got=f"copper within {room} of the edge on two sides that meet",
        limit=f"{room} from a tab to copper on two opposite sides at least",
        advice="allow a larger board, so that the copper keeps farther from its edge",
        severity=Severity.REFUSE,
    )
    raise SynthesisError("no place for tabs that hold the board", (finding,), ("order single boards",))


@dataclass(frozen=True)
class _Clearance:
    """The board as its tabs see it."""

    board: Layout
    box: Box
    corner: int
    rule: TabRule
    body: Box | None

    def positions(self, length: int) -> NDArray[np.int64]:
        """Middles tried on a side of `length`, symmetric about its middle, nm; the slot reaches past the corner."""
        reach = length // 2 - self.corner - self.rule.half
        steps = np.arange(0, max(reach, 0) + 1, STEP, dtype=np.int64) if reach >= 0 else np.empty(0, dtype=np.int64)
        return length // 2 + np.concatenate([-steps[:0:-1], steps])

    def along(self, side: str, u: NDArray[np.int64]) -> NDArray[np.float64]:
        """Distance (m) from the edge along a tab at each of `u` on `side` to copper; -1 where none may stand."""
        x0, y0, x1, y1 = self.box
        start, stop = u - self.rule.half, u + self.rule.half
        if side in ("left", "right"):
            fixed = np.full(len(u), x0 if side == "left" else x1)
            ends = [np.column_stack([fixed, y0 + each]) for each in (start, stop)]
            blocked = (1, 3, y0)
        else:
            fixed = np.full(len(u), y0 if side == "lower" else y1)
            ends = [np.column_stack([x0 + each, fixed]) for each in (start, stop)]
            blocked = (0, 2, x0)
        lines = np.asarray(shapely.linestrings(np.stack(ends, axis=1) * GRID))
        room = _distance(lines, [island.outline.shape() for island in self.board.islands])
        holes = [shapely.Point(hole.centre).buffer(0.5 * hole.diameter) for hole in self.board.holes]
        clear = _distance(lines, holes) >= self.rule.hole_room
        free = (room >= self.rule.copper_room - 0.5 * GRID) & clear
        if side in overhangs(self.body, self.box) and self.body is not None:
            low, high, origin = blocked
            free &= (stop + origin <= self.body[low] - BODY_ROOM) | (start + origin >= self.body[high] + BODY_ROOM)
        return np.where(free, room, -1.0)


def _distance(lines: NDArray[np.object_], shapes: list[shapely.Polygon]) -> NDArray[np.float64]:
    if not shapes:
        return np.full(len(lines), np.inf)
    together = shapely.multipolygons(shapes)
    shapely.prepare(together)
    return np.asarray(shapely.distance(together, lines), dtype=np.float64)


def _chosen(length: int, u: NDArray[np.int64], room: NDArray[np.float64], rule: TabRule) -> tuple[int, ...]:
    """A place on each stretch that has one: two stretches at least, unless the side is too short for two."""
    count = max(2, math.ceil(length / rule.stretch))
    inset = rule.half + rule.slot  # leaves slots between two tabs that the router enters
    if length < count * 2 * inset:
        count = 1
    bounds = [length * i // count for i in range(count + 1)]
    found = []
    for low, high in itertools.pairwise(bounds):
        within = room >= 0.0
        within &= (u >= low + inset) & (u <= high - inset) if count > 1 else True
        if np.any(within):
            near = np.abs(u[within] - (low + high) // 2)
            best = np.lexsort((near, -np.floor(room[within] / FINE)))[0]
            found.append(int(u[within][best]))
    return tuple(found)

"""The board as one record: copper islands by level, holes, pads, ports, mask, legend, edge, keepout.

Everything that is written, checked, meshed or drawn comes from a `Layout`; there is no second
description of the board. `Layout.snapped` snaps every outline to the nanometre grid once and names the
nets from what touches what. All views are from the top, the origin is the feed, lengths in metres.
"""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass, replace
from enum import StrEnum
from functools import cached_property

from planar.copper.arc import Point
from planar.copper.boolean import contains
from planar.copper.outline import Outline, on_grid
from planar.errors import GeometryError


class Level(StrEnum):
    """A copper level."""

    TOP = "top"
    BOTTOM = "bottom"


class Role(StrEnum):
    """What an island is for. A fiducial is a bare disc a camera looks for, a mark is copper that is read, not used."""

    RADIATOR = "radiator"
    LINE = "line"
    GROUND = "ground"
    FIDUCIAL = "fiducial"
    MARK = "mark"


class Kind(StrEnum):
    """What a layout is: one board, boards joined in a panel, or a board to measure on."""

    SINGLE = "single"
    ARRAY = "array"
    COUPON = "coupon"


ANTENNA = "ANT1"
"""Reference designator of the antenna, an etched part; its lands are the pins."""


@dataclass(frozen=True)
class Island:
    """One connected piece of copper on one level. `net` is filled in by `Layout.snapped`; `part` is the reference
    designator of the etched part a radiator belongs to."""

    level: Level
    outline: Outline
    role: Role
    net: str = ""
    part: str = ANTENNA


@dataclass(frozen=True)
class Hole:
    """A round hole of finished `diameter` m. `purpose`: "via", "mounting", "tooling" or "perforation"."""

    centre: Point
    diameter: float
    plated: bool
    purpose: str
    net: str = ""


@dataclass(frozen=True)
class Pad:
    """Where something is soldered: `outline` lies on copper of its `level`.

    `terminal` is "signal" or "return"; the two are the ends of the feed. `part` is the reference designator of the
    etched part whose pin the land is.
    """

    name: str
    level: Level
    outline: Outline
    terminal: str
    net: str = ""
    part: str = ANTENNA


@dataclass(frozen=True)
class Port:
    """Where the antenna is driven.

    `kind` "gap": across an in-plane gap of `length` m and `width` m on `level`, positive side along
    the unit vector `direction`. `kind` "vertical": between the end edge (`width` m, outward normal
    `direction`) of a line on `level` and the copper of the other level below it; `length` is 0.
    """

    name: str
    kind: str
    level: Level
    centre: Point
    direction: Point
    length: float
    width: float


@dataclass(frozen=True)
class Marking:
    """An outline on a level that is no copper: a mask opening or a piece of legend."""

    level: Level
    outline: Outline


@dataclass(frozen=True)
class Score:
    """A straight score line from edge to edge, `start` to `end` in m, cut from both sides.

    Raises `GeometryError` where both ends are one place.
    """

    start: Point
    end: Point

    def __post_init__(self) -> None:
        if all(on_grid(a) == on_grid(b) for a, b in zip(self.start, self.end, strict=True)):
            x, y = (1e3 * c for c in self.start)
            raise GeometryError(f"the score line at ({x:.3f}, {y:.3f}) mm has no length")


@dataclass(frozen=True)
class Layout:
    """A board, snapped. `levels` lists the copper levels, top first.

    A panel is a layout too: its boards are explicit copies, `cutouts` the closed outlines routed out inside `edge`,
    `scores` the lines it is scored along, `boards` the outlines of the boards in a panel.
    """

    name: str
    levels: tuple[Level, ...]
    islands: tuple[Island, ...]
    holes: tuple[Hole, ...]
    pads: tuple[Pad, ...]
    ports: tuple[Port, ...]
    mask_openings: tuple[Marking, ...]
    legend: tuple[Marking, ...]
    edge: Outline
    keepout: tuple[Outline, ...]
    kind: Kind = Kind.SINGLE
    cutouts: tuple[Outline, ...] = ()
    scores: tuple[Score, ...] = ()
    boards: tuple[Outline, ...] = ()

    def snapped(self) -> Layout:
        """The layout on the nanometre grid with its nets named. Raises `GeometryError` when copper is invalid."""
        islands = tuple(replace(island, outline=island.outline.normalised()) for island in self.islands)
        holes = tuple(replace(hole, centre=(on_grid(hole.centre[0]), on_grid(hole.centre[1]))) for hole in self.holes)
        pads = tuple(replace(pad, outline=pad.outline.normalised()) for pad in self.pads)
        nets = _net_names(islands, holes, pads)
        return replace(
            self,
            islands=tuple(replace(island, net=net) for island, net in zip(islands, nets, strict=True)),
            holes=tuple(
                replace(hole, net=_net_at(hole.centre, islands, nets) if hole.plated else "") for hole in holes
            ),
            pads=tuple(replace(pad, net=nets[_island_under(pad, islands)]) for pad in pads),
            mask_openings=_normalised(self.mask_openings),
            legend=_normalised(self.legend),
            edge=self.edge.normalised(),
            keepout=tuple(outline.normalised() for outline in self.keepout),
            cutouts=tuple(outline.normalised() for outline in self.cutouts),
            boards=tuple(outline.normalised() for outline in self.boards),
        )

    def copper(self, level: Level) -> tuple[Outline, ...]:
        """Outlines of the islands on `level`."""
        return tuple(island.outline for island in self.islands if island.level == level)

    def area(self, level: Level) -> float:
        """Copper area on `level`, m2."""
        return sum(outline.area for outline in self.copper(level))

    @cached_property
    def copper_bounds(self) -> tuple[float, float, float, float]:
        """x_min, y_min, x_max, y_max of all copper, m."""
        return bounds_of(island.outline for island in self.islands)

    @cached_property
    def size(self) -> tuple[float, float]:
        """Width and height of the board, m."""
        x0, y0, x1, y1 = self.edge.bounds
        return x1 - x0, y1 - y0

    @cached_property
    def dc_short(self) -> bool:
        """Whether signal and return of the feed are one net, as in an uncut loop."""
        nets = {terminal: {p.net for p in self.pads if p.terminal == terminal} for terminal in ("signal", "return")}
        return bool(nets["signal"] & nets["return"])


def bounds_of(outlines: Iterable[Outline]) -> tuple[float, float, float, float]:
    """Common x_min, y_min, x_max, y_max of `outlines`, m."""
    boxes = [outline.bounds for outline in outlines]
    x0, y0 = (min(box[i] for box in boxes) for i in (0, 1))
    x1, y1 = (max(box[i] for box in boxes) for i in (2, 3))
    return x0, y0, x1, y1


def _normalised(markings: tuple[Marking, ...]) -> tuple[Marking, ...]:
    return tuple(replace(marking, outline=marking.outline.normalised()) for marking in markings)


def _island_under(pad: Pad, islands: tuple[Island, ...]) -> int:
    x, y = pad.outline.shape().representative_point().coords[0]
    for i, island in enumerate(islands):
        if island.level == pad.level and contains(island.outline, (x, y)):
            return i
    raise GeometryError(f"pad {pad.name} has no copper under it")


def _connected(islands: tuple[Island, ...], holes: tuple[Hole, ...]) -> list[set[int]]:
    """Sets of island numbers joined by plated holes."""
    groups = [{i} for i in range(len(islands))]
    for hole in holes:
        if hole.plated:
            joined = {i for i, island in enumerate(islands) if contains(island.outline, hole.centre)}
            touched = [g for g in groups if g & joined]
            groups = [g for g in groups if not g & joined] + [set().union(*touched)] * bool(touched)
    return groups


def _net_names(islands: tuple[Island, ...], holes: tuple[Hole, ...], pads: tuple[Pad, ...]) -> list[str]:
    """Net of each island: ANT where both terminals meet, SIGNAL, RETURN, else ELEMENT1, ELEMENT2, ..."""
    names = [""] * len(islands)
    floating = 0
    used: set[str] = set()
    for group in sorted(_connected(islands, holes), key=min):
        terminals = {pad.terminal for pad in pads if _island_under(pad, islands) in group}
        if not terminals:
            floating += 1
        name = {0: f"ELEMENT{floating}", 1: "".join(terminals).upper(), 2: "ANT"}[len(terminals)]
        if name in used:
            raise GeometryError(f"the copper of terminal {name} is in two pieces that nothing joins")
        used.add(name)
        for i in group:
            names[i] = name
    return names


def _net_at(centre: Point, islands: tuple[Island, ...], nets: list[str]) -> str:
    for island, net in zip(islands, nets, strict=True):
        if contains(island.outline, centre):
            return net
    raise GeometryError(f"the plated hole at {centre[0] * 1e3:.3f}, {centre[1] * 1e3:.3f} mm meets no copper")

"""What a measuring board is put together from: launches, lines between them, a ring, end pieces.

Each function draws one structure with its launches into a `Part`. A launch is the land pattern of the board's own
connector, turned so that its line leaves in any direction; the plane where the line starts is its reference plane.
Nothing is on the grid yet.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

from planar.copper.arc import Edge, Point
from planar.copper.boolean import difference, united
from planar.copper.drawing import Dimensions
from planar.copper.families import NECK
from planar.copper.lands import land_holes, land_openings, land_pads
from planar.copper.layout import Hole, Island, Level, Marking, Pad, Role
from planar.copper.outline import Outline
from planar.copper.path import Path, band, loop_path, stepped_band
from planar.copper.shapes import QUARTER, circle, rectangle, turned_rectangle
from planar.library.records import Connector, Fab

GROUND = "GROUND"
RIGHT, UP, LEFT = 0.0, 0.5 * math.pi, math.pi
"""rad, directions in which a line leaves its launch."""
RESISTOR_LAND, RESISTOR_GAP = (0.9e-3, 0.8e-3), 0.7e-3
"""m, lands (across, along) of a chip resistor 1.6 mm by 0.8 mm, the gap between them (common practice, no source)."""
CROSS_NODE = 0.95e-3
"""m, half the length of the copper across the end of a line that two resistors share."""
LAND_OFFSET = 0.3e-3
"""m, from the reference plane to the resistors' lands, so that mask stands between them and the launch."""


@dataclass(frozen=True)
class Part:
    """Copper, holes, pads and mask openings of one structure."""

    islands: tuple[Island, ...] = ()
    holes: tuple[Hole, ...] = ()
    pads: tuple[Pad, ...] = ()
    openings: tuple[Marking, ...] = ()

    def joined(self, other: Part) -> Part:
        """Both parts together."""
        return Part(
            self.islands + other.islands,
            self.holes + other.holes,
            self.pads + other.pads,
            self.openings + other.openings,
        )


@dataclass(frozen=True)
class Launch:
    """A connector called `reference` whose line starts at `plane` (m) in the `direction` (rad)."""

    reference: str
    plane: Point
    direction: float

    def placed(self, outline: Outline) -> Outline:
        """An outline drawn for a line that leaves the origin upwards."""
        return outline.rotated(self.direction - UP).translated(*self.plane)

    def point(self, ahead: float, aside: float) -> Point:
        """The point `ahead` m along the line from the plane and `aside` m to its left."""
        c, s = math.cos(self.direction), math.sin(self.direction)
        return self.plane[0] + ahead * c - aside * s, self.plane[1] + ahead * s + aside * c


@dataclass(frozen=True)
class LaunchKit:
    """What every launch is made from."""

    connector: Connector
    fab: Fab

    def signal(self, launch: Launch) -> tuple[Outline, ...]:
        """Signal lands on top."""
        lands = land_pads(self.connector, (0.0, 0.0))
        return tuple(launch.placed(p.outline) for p in lands if p.terminal == "signal" and p.level is Level.TOP)

    def part(self, launch: Launch, net: str) -> Part:
        """Pads, holes and ground lands of `launch`, whose signal is on `net`; the signal's copper is the caller's."""
        pads = tuple(
            Pad(pad.name, pad.level, launch.placed(pad.outline), pad.terminal, self._net(pad, net), launch.reference)
            for pad in land_pads(self.connector, (0.0, 0.0))
        )
        grounds = tuple(
            Island(Level.TOP, pad.outline, Role.GROUND, GROUND, "")
            for pad in pads
            if pad.terminal == "return" and pad.level is Level.TOP
        )
        holes = tuple(
            Hole(launch.point(hole.centre[1], -hole.centre[0]), hole.diameter, hole.plated, hole.purpose, GROUND)
            for hole in land_holes(self.connector, (0.0, 0.0))
        )
        return Part(grounds, holes, pads, self.openings(launch))

    def openings(self, launch: Launch) -> tuple[Marking, ...]:
        """Mask openings over the lands of `launch`."""
        grown = land_openings(self.connector, (0.0, 0.0), self.fab.mask_expansion)
        return tuple(Marking(opening.level, launch.placed(opening.outline)) for opening in grown)

    @property
    def room(self) -> float:
        """Widest line, m, that starts between ground lands that reach its start; infinite where none does."""
        beside = [
            pad
            for pad in self.connector.pads
            if pad.net == "ground"
            and pad.level == Level.TOP.value
            and pad.centre[0] + 0.5 * pad.size[0] > -self.fab.min_gap
        ]
        return min((2.0 * (abs(p.centre[1]) - 0.5 * p.size[1] - self.fab.min_gap) for p in beside), default=math.inf)

    @staticmethod
    def _net(pad: Pad, net: str) -> str:
        return GROUND if pad.terminal == "return" else net


def line_between(ends: tuple[Launch, Launch], path: Path, width: float, net: str, kit: LaunchKit) -> Part:
    """A line of `width` m along `path` from one launch to the other, masked but for the lands."""
    copper = united([_necked(path, width, kit, both=True), *kit.signal(ends[0]), *kit.signal(ends[1])])
    lands = kit.part(ends[0], net).joined(kit.part(ends[1], net))
    return Part(_lines(copper, net)).joined(lands)


def staple_path(first: Point, second: Point, rise: float, radius: float) -> Path:
    """Up `rise` m from `first`, across and down to `second`, with bends of `radius` m."""
    (x0, y), (x1, _) = first, second
    top, r = y + rise, radius
    corners = [(x0, y), (x0, top - r), (x0 + r, top), (x1 - r, top), (x1, top - r), (x1, y)]
    bulges = [0.0, -QUARTER, 0.0, -QUARTER, 0.0]
    edges = [Edge(a, b, bulge) for a, b, bulge in zip(corners, corners[1:], bulges, strict=False)]
    return Path(tuple(edge for edge in edges if edge.chord > 1e-12))


def staple_opening(first: Point, second: Point, rise: float, half: float) -> Outline:
    """Window in the mask `half` m to either side of a staple, square at its corners."""
    (x0, y), (x1, _) = first, second
    inner, outer = y + rise - half, y + rise + half
    points = [
        (x0 - half, y), (x0 + half, y), (x0 + half, inner), (x1 - half, inner),
        (x1 - half, y), (x1 + half, y), (x1 + half, outer), (x0 - half, outer),
    ]  # fmt: skip
    return Outline.polygon(points)


def ring_between(ends: tuple[Launch, Launch], centre: Point, dimensions: Dimensions, kit: LaunchKit) -> Part:
    """A ring about `centre` and two feeds that end a gap from it, the first launch on its left.

    An outline has no hole, so a slit opens the ring. It faces the first feed: the modes that feed excites are mirror
    images about it, so no current would cross the slit and no voltage stands across it.
    """
    radius, width, slit = dimensions["ring_radius"], dimensions["ring_width"], dimensions["ring_slit"]
    circle_line = loop_path(2.0 * radius, 2.0 * radius, radius)
    opened = band(circle_line.between(0.25 * slit, circle_line.length - 0.25 * slit), width)
    window = turned_rectangle((0.0, radius), (1.0, 0.0), length=slit, width=2.0 * width)
    (ring,) = difference(opened, window)
    part = Part(_lines((ring.rotated(UP).translated(*centre),), "RING"))
    reach = radius + 0.5 * width + dimensions["ring_gap"]
    for launch, side, net in ((ends[0], -1.0, "RING_IN"), (ends[1], 1.0, "RING_OUT")):
        path = Path((Edge(launch.plane, (centre[0] + side * reach, centre[1])),))
        copper = united([_necked(path, dimensions["line_width"], kit, both=False), *kit.signal(launch)])
        part = part.joined(Part(_lines(copper, net))).joined(kit.part(launch, net))
    return part


def ring_openings(ends: tuple[Launch, Launch], centre: Point, dimensions: Dimensions) -> list[Outline]:
    """Window in the mask over the ring, its inside, and both feeds."""
    clear = dimensions["mask_clearance"]
    half = 0.5 * dimensions["line_width"] + clear
    disc = circle(centre, 2.0 * (dimensions["ring_radius"] + clear) + dimensions["ring_width"])
    feeds = [rectangle(end.plane[0], centre[1] - half, centre[0], centre[1] + half) for end in ends]
    inside = [feed.translated(shift, 0.0) for feed, shift in zip(feeds, (-1e-6, 1e-6), strict=True)]
    return list(united([disc, *inside]))


def open_end(launch: Launch, kit: LaunchKit) -> Part:
    """A launch without a line."""
    return Part(_lines(kit.signal(launch), "OPEN")).joined(kit.part(launch, "OPEN"))


def shorted_end(launch: Launch, dimensions: Dimensions, kit: LaunchKit) -> Part:
    """A launch whose signal goes to ground through three vias in a bar across the reference plane."""
    drill, ring = dimensions["via_drill"], dimensions["via_ring"]
    pitch = drill + 2.0 * ring
    bar = launch.placed(rectangle(-1.5 * pitch, -LAND_OFFSET, 1.5 * pitch, pitch))
    copper = united([*kit.signal(launch), bar])
    holes = tuple(Hole(launch.point(0.5 * pitch, i * pitch), drill, True, "via", GROUND) for i in (-1, 0, 1))
    islands = tuple(Island(Level.TOP, outline, Role.GROUND, GROUND, "") for outline in copper)
    return Part(islands, holes).joined(kit.part(launch, GROUND))


def loaded_end(launch: Launch, dimensions: Dimensions, kit: LaunchKit) -> Part:
    """A launch with lands for two resistors from its signal to ground, one on either side."""
    drill, ring = dimensions["via_drill"], dimensions["via_ring"]
    across, along = RESISTOR_LAND
    low, high = LAND_OFFSET, LAND_OFFSET + across
    node = launch.placed(rectangle(-CROSS_NODE, -LAND_OFFSET, CROSS_NODE, high))
    part = Part(_lines(united([*kit.signal(launch), node]), "LOAD")).joined(kit.part(launch, "LOAD"))
    inner = CROSS_NODE + RESISTOR_GAP
    outer = inner + along
    for side, name in ((-1.0, "R1"), (1.0, "R2")):
        # the via stands outside the land, where it draws no solder
        via = outer + 0.5 * drill + ring
        ground = launch.placed(rectangle(-side * inner, low, -side * (via + 0.5 * drill + ring), high))
        lands = [rectangle(-side * (CROSS_NODE - along), low, -side * CROSS_NODE, high)]
        lands.append(rectangle(-side * inner, low, -side * outer, high))
        pads = [
            Pad(label, Level.TOP, launch.placed(land), terminal, net, name)
            for land, label, terminal, net in zip(
                lands, ("1", "2"), ("signal", "return"), ("LOAD", GROUND), strict=True
            )
        ]
        holes = (Hole(launch.point(0.5 * (low + high), side * via), drill, True, "via", GROUND),)
        openings = tuple(Marking(Level.TOP, launch.placed(_grown(land, kit.fab.mask_expansion))) for land in lands)
        island = Island(Level.TOP, ground, Role.GROUND, GROUND, "")
        part = part.joined(Part((island,), holes, tuple(pads), openings))
    return part


def merged_openings(openings: Sequence[Marking], windows: Sequence[Outline]) -> tuple[Marking, ...]:
    """Openings over lands and `windows` over lines, on top, each group that overlaps as one."""
    top: list[Outline] = []
    for outline in (*windows, *(o.outline for o in openings if o.level is Level.TOP)):
        near = [other for other in top if _boxes_meet(other, outline)]
        top = [*(other for other in top if other not in near), *united([*near, outline])]
    return (*(Marking(Level.TOP, outline) for outline in top), *(o for o in openings if o.level is not Level.TOP))


def _lines(outlines: Sequence[Outline], net: str) -> tuple[Island, ...]:
    return tuple(Island(Level.TOP, outline, Role.LINE, net, "") for outline in outlines)


def _necked(path: Path, width: float, kit: LaunchKit, *, both: bool) -> Outline:
    """Copper of `width` m along `path`, with a neck at its start (and its end) where ground lands leave no room."""
    if kit.room >= width:
        return band(path, width)
    last = path.length - (NECK if both else 0.0)
    sections = [(path.between(0.0, NECK), kit.room), (path.between(NECK, last), width)]
    if both:
        sections.append((path.between(last, path.length), kit.room))
    return stepped_band(sections)


def _boxes_meet(one: Outline, other: Outline) -> bool:
    """Whether two bounding boxes meet: most openings lie far apart, and uniting costs more than looking."""
    (ax0, ay0, ax1, ay1), (bx0, by0, bx1, by1) = one.bounds, other.bounds
    return ax0 <= bx1 and bx0 <= ax1 and ay0 <= by1 and by0 <= ay1


def _grown(land: Outline, by: float) -> Outline:
    x0, y0, x1, y1 = land.bounds
    return rectangle(x0 - by, y0 - by, x1 + by, y1 + by)

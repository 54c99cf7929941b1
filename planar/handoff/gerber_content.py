"""What the layer files of a board hold, free of their syntax, and the one table of these files.

`gerber_content(layout, file, facts)` says what belongs into a file; the writer puts exactly that down, the reader
returns the same record. Islands are regions with true arcs; lands and via lands are flashes on top of them, because a
fab takes every flash of a copper file for a pad. The loop and what it shorts are one net, named by the layout.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping
from dataclasses import dataclass

from planar.copper.arc import Point
from planar.copper.boolean import contains
from planar.copper.layout import Hole, Island, Layout, Level, Pad, Role
from planar.copper.outline import GRID, Outline, on_grid
from planar.copper.shapes import centred_rectangle, circle
from planar.errors import HandoffError
from planar.handoff.gerber_attributes import Fields, ProjectFacts, file_attributes

DESIGNATOR = "ANT1"
"""Reference designator of the antenna, an etched component; its lands are the pins."""
PROFILE_WIDTH = 0.1e-3
"""m, line the board edge is drawn with; the edge is its middle."""
PAD_CHORD = 0.1e-6
"""m, chord error of lands with curved sides: apertures have none. The copper below keeps its arcs."""
_HALF_CIRCLE_SLACK = 1e-9
_ROLES = {Role.RADIATOR: "EtchedComponent", Role.LINE: "Conductor", Role.GROUND: "Conductor"}
_HOLE_LANDS = {"via": "ViaPad", "mounting": "ComponentPad"}
"""Purpose of a plated hole -> function of the land round it; a plated mounting hole takes the leg of a part."""


@dataclass(frozen=True)
class Aperture:
    """A shape to flash or draw with, in m.

    `kind` "C": a circle of diameter `size[0]`; "R": a rectangle of width and height `size`; "P": a polygon, `size`
    lists x and y of its corners from the centre.
    """

    kind: str
    size: tuple[float, ...]

    def at(self, centre: Point) -> Outline:
        """The shape flashed at `centre`."""
        if self.kind == "C":
            return circle(centre, *self.size)
        if self.kind == "R":
            return centred_rectangle(centre, *self.size)
        return Outline.polygon(list(zip(self.size[::2], self.size[1::2], strict=True))).translated(*centre)


@dataclass(frozen=True)
class Tags:
    """What a graphical object is, "" where nothing is said: aperture function with its fields separated by commas, net,
    component, and for a land the pin of the component."""

    function: str = ""
    net: str = ""
    component: str = ""
    pin: str = ""


@dataclass(frozen=True)
class Region:
    """A filled area."""

    outline: Outline
    tags: Tags


@dataclass(frozen=True)
class Flash:
    """An aperture put down once, `centre` in m."""

    centre: Point
    aperture: Aperture
    tags: Tags


@dataclass(frozen=True)
class Track:
    """A closed line drawn with an aperture along `outline`."""

    outline: Outline
    aperture: Aperture
    tags: Tags


@dataclass(frozen=True)
class GerberContent:
    """File attributes by name, and the objects of each kind in the order of the file.

    `faults` lists what a reader met that the standard or the house rules forbid; what is made from a layout has none.
    """

    attributes: Mapping[str, Fields]
    regions: tuple[Region, ...] = ()
    flashes: tuple[Flash, ...] = ()
    tracks: tuple[Track, ...] = ()
    faults: tuple[str, ...] = ()

    @property
    def filled(self) -> tuple[Outline, ...]:
        """Outlines of everything that is filled: regions and flashes."""
        return (*(r.outline for r in self.regions), *(f.aperture.at(f.centre) for f in self.flashes))


@dataclass(frozen=True)
class GerberFile:
    """A layer file: what it `holds` ("copper", "mask", "legend", "profile"), its level (None for all), its function and
    polarity."""

    name: str
    holds: str
    level: Level | None
    function: Fields
    polarity: str


GERBER_FILES: tuple[GerberFile, ...] = (
    GerberFile("copper-top.gbr", "copper", Level.TOP, ("Copper", "L1", "Top"), "Positive"),
    GerberFile("copper-bottom.gbr", "copper", Level.BOTTOM, ("Copper", "L2", "Bot"), "Positive"),
    GerberFile("mask-top.gbr", "mask", Level.TOP, ("Soldermask", "Top"), "Negative"),
    GerberFile("mask-bottom.gbr", "mask", Level.BOTTOM, ("Soldermask", "Bot"), "Negative"),
    GerberFile("legend-top.gbr", "legend", Level.TOP, ("Legend", "Top"), "Positive"),
    GerberFile("legend-bottom.gbr", "legend", Level.BOTTOM, ("Legend", "Bot"), "Positive"),
    GerberFile("profile.gbr", "profile", None, ("Profile", "NP"), "Positive"),
)
"""Every layer file a board may have. A mask file shows the openings, which its negative polarity says."""


@dataclass(frozen=True)
class GerberFacts:
    """What the layer files say beside the layout: `masked` lists the sides under solder mask, `via_ring_m` is the width
    of the ring round a plated hole that is shown as its land (m)."""

    project: ProjectFacts
    masked: tuple[Level, ...]
    via_ring_m: float


def gerber_files(layout: Layout, facts: GerberFacts) -> tuple[GerberFile, ...]:
    """The layer files of `layout`: an empty mask file would mean mask over everything, so there is none without mask.

    Raises `HandoffError` when the layout has openings in a mask that is not among those of `facts`.
    """
    unmasked = sorted({str(m.level) for m in layout.mask_openings if m.level not in facts.masked})
    if unmasked:
        raise HandoffError(f"{layout.name}: openings in the mask of the {' and '.join(unmasked)} side, which has none")
    present: dict[str, set[Level | None]] = {
        "copper": set(layout.levels),
        "mask": set(facts.masked),
        "legend": {marking.level for marking in layout.legend},
        "profile": {None},
    }
    return tuple(file for file in GERBER_FILES if file.level in present[file.holds])


def gerber_content(layout: Layout, file: GerberFile, facts: GerberFacts) -> GerberContent:
    """What `file` holds of a snapped `layout`."""
    attributes = file_attributes(facts.project, file.function, file.polarity)
    return _HOLDS[file.holds](layout, file, facts, attributes)


def _copper(layout: Layout, file: GerberFile, facts: GerberFacts, attributes: Mapping[str, Fields]) -> GerberContent:
    islands = [island for island in layout.islands if island.level == file.level]
    pads = [_pad_flash(pad) for pad in layout.pads if pad.level == file.level]
    holes = [hole for hole in layout.holes if hole.plated and _has_copper(hole, islands)]
    return GerberContent(
        attributes,
        tuple(Region(island.outline, _island_tags(island)) for island in islands),
        (*pads, *(_hole_flash(hole, facts.via_ring_m) for hole in holes)),
    )


def _has_copper(hole: Hole, islands: list[Island]) -> bool:
    return any(contains(island.outline, hole.centre) for island in islands)


def _island_tags(island: Island) -> Tags:
    component = DESIGNATOR if island.role is Role.RADIATOR else ""
    return Tags(_ROLES[island.role], island.net, component)


def _pad_flash(pad: Pad) -> Flash:
    found = flashable(pad.outline) or _as_polygon(pad.outline)
    # the mask opening is larger than the land, so that copper defines what is soldered
    return Flash(*found, Tags("SMDPad,CuDef", pad.net, DESIGNATOR, pad.name))


def _hole_flash(hole: Hole, ring: float) -> Flash:
    land = Aperture("C", (on_grid(hole.diameter + 2.0 * ring),))
    return Flash(hole.centre, land, Tags(_HOLE_LANDS[hole.purpose], hole.net))


def _openings(layout: Layout, file: GerberFile, _: GerberFacts, attributes: Mapping[str, Fields]) -> GerberContent:
    outlines = [m.outline for m in layout.mask_openings if m.level == file.level]
    tags = Tags("Material")
    pairs = [(outline, flashable(outline)) for outline in outlines]
    return GerberContent(
        attributes,
        tuple(Region(outline, tags) for outline, found in pairs if found is None),
        tuple(Flash(*found, tags) for _, found in pairs if found is not None),
    )


def _legend(layout: Layout, file: GerberFile, _: GerberFacts, attributes: Mapping[str, Fields]) -> GerberContent:
    tags = Tags("Material")
    return GerberContent(attributes, tuple(Region(m.outline, tags) for m in layout.legend if m.level == file.level))


def _profile(layout: Layout, _: GerberFile, __: GerberFacts, attributes: Mapping[str, Fields]) -> GerberContent:
    edge = Track(layout.edge, Aperture("C", (PROFILE_WIDTH,)), Tags("Profile"))
    return GerberContent(attributes, tracks=(edge,))


_HOLDS: dict[str, Callable[[Layout, GerberFile, GerberFacts, Mapping[str, Fields]], GerberContent]] = {
    "copper": _copper,
    "mask": _openings,
    "legend": _legend,
    "profile": _profile,
}


def flashable(outline: Outline) -> tuple[Point, Aperture] | None:
    """Centre and aperture that flash `outline`, on the grid; None when it is neither an upright rectangle nor a circle.

    The centre may move by half a nanometre onto the grid.
    """
    points = [(round(x / GRID), round(y / GRID)) for x, y, _ in outline.vertices.tolist()]
    bulges = [abs(bulge) for bulge in outline.vertices[:, 2].tolist()]
    (x0, y0), (x1, y1) = points[0], points[len(points) // 2]
    centre = (x0 + x1) // 2 * GRID, (y0 + y1) // 2 * GRID
    if len(points) == 2 and all(abs(bulge - 1.0) < _HALF_CIRCLE_SLACK for bulge in bulges):
        return centre, Aperture("C", (round(math.dist(*points)) * GRID,))
    corners = {(x, y) for x in (x0, x1) for y in (y0, y1)}
    if len(points) == 4 and not any(bulges) and set(points) == corners and len(corners) == 4:
        return centre, Aperture("R", (abs(x1 - x0) * GRID, abs(y1 - y0) * GRID))
    return None


def _as_polygon(outline: Outline) -> tuple[Point, Aperture]:
    """Middle and polygon of an outline of any other shape, its arcs as chords, all on the grid."""
    x0, y0, x1, y1 = outline.bounds
    middle = round(0.5 * (x0 + x1) / GRID), round(0.5 * (y0 + y1) / GRID)
    corners = [(round(x / GRID), round(y / GRID)) for x, y in outline.flattened(PAD_CHORD).tolist()]
    distinct = [here for here, after in zip(corners, [*corners[1:], corners[0]], strict=True) if here != after]
    offsets = [(n - m) * GRID for corner in distinct for n, m in zip(corner, middle, strict=True)]
    return (middle[0] * GRID, middle[1] * GRID), Aperture("P", tuple(offsets))

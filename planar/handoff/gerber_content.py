"""What the layer files of a board, panel or coupon hold, free of their syntax, and the one table of these files.

`gerber_content(layout, file, facts)` says what belongs into a file; the writer puts exactly that down, the reader
returns the same record. Islands are regions with true arcs; lands and via lands are flashes on top of them, because a
fab takes every flash of a copper file for a pad. A fiducial is a flash alone, for the camera's sake. The loop and what
it shorts are one net, named by the layout.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Iterable, Mapping
from dataclasses import dataclass

from planar.copper.arc import Point
from planar.copper.boolean import contains
from planar.copper.layout import Hole, Island, Kind, Layout, Level, Pad, Role
from planar.copper.outline import GRID, Outline, on_grid
from planar.copper.shapes import centred_rectangle, circle
from planar.errors import HandoffError
from planar.handoff.gerber_attributes import Fields, ProjectFacts, file_attributes

PROFILE_WIDTH = 0.1e-3
"""m, line that edges and scores are drawn with; the cut is its middle."""
PAD_CHORD = 0.1e-6
"""m, chord error of lands with curved sides: apertures have none. The copper below keeps its arcs."""
_HALF_CIRCLE_SLACK = 1e-9
_ROLES = {
    Role.RADIATOR: "EtchedComponent",
    Role.LINE: "Conductor",
    Role.GROUND: "Conductor",
    Role.MARK: "NonConductor",
}
"""Role of an island that is a region -> its function."""
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
class Stroke:
    """A straight line drawn with an aperture from `start` to `end`, m."""

    start: Point
    end: Point
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
    strokes: tuple[Stroke, ...] = ()

    @property
    def filled(self) -> tuple[Outline, ...]:
        """Outlines of everything that is filled: regions and flashes."""
        return (*(r.outline for r in self.regions), *(f.aperture.at(f.centre) for f in self.flashes))


@dataclass(frozen=True)
class GerberFile:
    """A layer file: what it `holds` ("copper", "mask", "legend", "profile", "score", "array"), its level (None for
    all), its function and polarity."""

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
PANEL_FILES: tuple[GerberFile, ...] = (
    GerberFile("score.gbr", "score", None, ("Vcut",), "Positive"),
    GerberFile("array.gbr", "array", None, ("ArrayDrawing",), "Positive"),
)
"""Layer files that scored boards and panels have besides; scores without a side are cut from both."""


@dataclass(frozen=True)
class GerberFacts:
    """What the layer files say beside the layout: `masked` lists the sides under solder mask, `via_ring_m` is the width
    of the ring round a plated hole that is shown as its land (m), `coupon_ring_m` that of holes beside the boards of a
    panel, None where they are alike."""

    project: ProjectFacts
    masked: tuple[Level, ...]
    via_ring_m: float
    coupon_ring_m: float | None = None

    def ring(self, layout: Layout, hole: Hole) -> float:
        """Width of the ring shown round a plated `hole` of `layout`, m."""
        if self.coupon_ring_m is None or any(contains(board, hole.centre) for board in layout.boards):
            return self.via_ring_m
        return self.coupon_ring_m


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
        "score": {None} if layout.scores else set(),
        "array": {None} if layout.kind is Kind.ARRAY else set(),
    }
    return tuple(file for file in (*GERBER_FILES, *PANEL_FILES) if file.level in present[file.holds])


def gerber_content(layout: Layout, file: GerberFile, facts: GerberFacts) -> GerberContent:
    """What `file` holds of a snapped `layout`. Raises `HandoffError` for copper the format's functions cannot name."""
    attributes = file_attributes(facts.project, file.function, file.polarity, kind=layout.kind)
    return _HOLDS[file.holds](layout, file, facts, attributes)


def _copper(layout: Layout, file: GerberFile, facts: GerberFacts, attributes: Mapping[str, Fields]) -> GerberContent:
    islands = [island for island in layout.islands if island.level == file.level]
    fiducials = [_fiducial_flash(island, layout.kind) for island in islands if island.role is Role.FIDUCIAL]
    pads = [_pad_flash(pad) for pad in layout.pads if pad.level == file.level]
    holes = [hole for hole in layout.holes if hole.plated and _has_copper(hole, islands)]
    return GerberContent(
        attributes,
        tuple(Region(i.outline, _island_tags(i)) for i in islands if i.role is not Role.FIDUCIAL),
        (*pads, *(_hole_flash(hole, facts.ring(layout, hole)) for hole in holes), *fiducials),
    )


def _has_copper(hole: Hole, islands: list[Island]) -> bool:
    return any(contains(island.outline, hole.centre) for island in islands)


def _island_tags(island: Island) -> Tags:
    component = island.part if island.role is Role.RADIATOR else ""
    return Tags(_ROLES[island.role], island.net, component)


def _pad_flash(pad: Pad) -> Flash:
    found = flashable(pad.outline) or _as_polygon(pad.outline)
    # the mask opening is larger than the land, so that copper defines what is soldered
    return Flash(*found, Tags("SMDPad,CuDef", pad.net, pad.part, pad.name))


def _fiducial_flash(island: Island, kind: Kind) -> Flash:
    found = flashable(island.outline)
    if found is None or found[1].kind != "C":
        x, y, _, _ = island.outline.bounds
        raise HandoffError(f"the fiducial at ({1e3 * x:.3f}, {1e3 * y:.3f}) mm is no disc, which a camera looks for")
    return Flash(*found, Tags(f"FiducialPad,{'Panel' if kind is Kind.ARRAY else 'Global'}"))


def _hole_flash(hole: Hole, ring: float) -> Flash:
    if hole.purpose not in _HOLE_LANDS:
        raise HandoffError(f"a plated hole for {hole.purpose}, expected {' or '.join(_HOLE_LANDS)}")
    land = Aperture("C", (on_grid(hole.diameter + 2.0 * ring),))
    return Flash(_snapped(hole.centre), land, Tags(_HOLE_LANDS[hole.purpose], hole.net))


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
    return GerberContent(attributes, tracks=_tracks((layout.edge, *layout.cutouts), "Profile"))


def _tracks(outlines: Iterable[Outline], function: str) -> tuple[Track, ...]:
    pen = Aperture("C", (PROFILE_WIDTH,))
    return tuple(Track(outline, pen, Tags(function)) for outline in outlines)


def _strokes(layout: Layout) -> tuple[Stroke, ...]:
    """The score lines on the grid; the standard has no function for them but "Other"."""
    pen, tags = Aperture("C", (PROFILE_WIDTH,)), Tags("Other,ScoreLine")
    return tuple(Stroke(_snapped(score.start), _snapped(score.end), pen, tags) for score in layout.scores)


def _snapped(point: Point) -> Point:
    return on_grid(point[0]), on_grid(point[1])


def _scores(layout: Layout, _: GerberFile, __: GerberFacts, attributes: Mapping[str, Fields]) -> GerberContent:
    return GerberContent(attributes, strokes=_strokes(layout))


def _array(layout: Layout, _: GerberFile, __: GerberFacts, attributes: Mapping[str, Fields]) -> GerberContent:
    """The panel as a drawing: its edge and cutouts, the outline of every board, the score lines."""
    tracks = (*_tracks((layout.edge, *layout.cutouts), "Profile"), *_tracks(layout.boards, "Other,BoardOutline"))
    return GerberContent(attributes, tracks=tracks, strokes=_strokes(layout))


_HOLDS: dict[str, Callable[[Layout, GerberFile, GerberFacts, Mapping[str, Fields]], GerberContent]] = {
    "copper": _copper,
    "mask": _openings,
    "legend": _legend,
    "profile": _profile,
    "score": _scores,
    "array": _array,
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

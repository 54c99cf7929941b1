"""What stands on the rails of a panel: tooling holes, fiducials, a mark for each board, the panel's name.

Every item takes an interval of a rail and stands in its middle line. Items keep a gap to each other and to score lines;
an item wider than the rail leaves room for, or for which no interval is left, is not placed, and a finding says so.
Holes and fiducials stand in three corners at unlike distances, so that a turned or mirrored panel shows.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field, replace

from planar.copper.arc import Point
from planar.copper.board import BOARD_CORNER
from planar.copper.layout import Hole, Island, Level, Marking, Role
from planar.copper.lettering import lettered, text_width
from planar.copper.panel_copies import metres, nanometres
from planar.copper.panel_grid import Array
from planar.copper.panel_score import score_places
from planar.copper.shapes import circle
from planar.errors import Finding, Severity
from planar.library.records import Fab, Panelling

GAP = 1_000_000
"""nm between two items on a rail."""
MARK = 2_000_000
"""nm, diameter of the copper disc that is crossed out for a bad board."""
LETTERING = (2.0e-3, 1.5e-3, 1.2e-3, 1.0e-3)
"""m, heights of the panel's name, tried from the largest."""
LABEL = 1.5e-3
"""m, height of the place beside a mark."""
BESIDE = 0.4e-3
"""m, from a mark to its label."""
MM = 1_000_000
HOLES = (("lower", 4 * MM), ("lower", -9 * MM), ("upper", 4 * MM))
FIDUCIALS = (("lower", 9 * MM), ("lower", -15 * MM), ("upper", 9 * MM))
"""Rail and wanted place along it, nm from its left end, or from its right end where negative."""


@dataclass(frozen=True)
class Rail:
    """A rail along `axis` (0: x) with its middle line at `middle`, usable from `start` to `stop`; `taken` intervals
    already include the gap to what comes next. All in nm."""

    axis: int
    middle: int
    start: int
    stop: int
    taken: tuple[tuple[int, int], ...] = ()

    def point(self, along: int) -> Point:
        """The place at `along` on the middle line, m."""
        place = (along, self.middle) if self.axis == 0 else (self.middle, along)
        return metres(place[0]), metres(place[1])

    def nearest(self, length: int, wanted: int) -> int | None:
        """Middle of the free interval of `length` nearest to `wanted`; None when none is left."""
        ends = sorted(self.taken)
        starts = [self.start, *(high for _, high in ends)]
        stops = [*(low for low, _ in ends), self.stop]
        half = (length + 1) // 2
        middles = []
        begin = self.start
        for start, stop in zip(starts, stops, strict=True):
            begin = max(begin, start)
            if stop - begin >= 2 * half:
                middles.append(min(max(wanted, begin + half), stop - half))
        return min(middles, key=lambda middle: abs(middle - wanted), default=None)

    def filled(self, middle: int, length: int) -> Rail:
        """The rail with an item of `length` at `middle`."""
        half = (length + 1) // 2 + GAP
        return replace(self, taken=(*self.taken, (middle - half, middle + half)))


@dataclass(frozen=True)
class RailItems:
    """What was placed, and what could not be."""

    holes: tuple[Hole, ...] = ()
    islands: tuple[Island, ...] = ()
    mask_openings: tuple[Marking, ...] = ()
    legend: tuple[Marking, ...] = ()
    findings: tuple[Finding, ...] = ()


@dataclass
class _Rails:
    """The rails while they are filled: `half` their width, items at least `near` off their edges, nm."""

    rails: dict[str, Rail]
    half: int
    near: int
    holes: list[Hole] = field(default_factory=list)
    islands: list[Island] = field(default_factory=list)
    openings: list[Marking] = field(default_factory=list)
    legend: list[Marking] = field(default_factory=list)
    findings: list[Finding] = field(default_factory=list)

    def place(self, name: str, length: int, across: int, wanted: int | None = None) -> int | None:
        """Take an interval of the rail `name` nearest to `wanted` (its start where None); None if there is none."""
        rail = self.rails[name]
        middle = (
            None
            if across > 2 * (self.half - self.near)
            else rail.nearest(length, rail.start if wanted is None else wanted)
        )
        if middle is not None:
            self.rails[name] = rail.filled(middle, length)
        return middle

    def missing(self, what: str, placed: int, wanted: int) -> None:
        """Say that some of `what` found no place."""
        if placed < wanted:
            advice = "put fewer boards in the panel, or have the fab's rail_width wider"
            self.findings.append(Finding(what, "rails", f"{placed} placed", str(wanted), advice, Severity.WARN))


@dataclass(frozen=True)
class RailRequest:
    """What the rails are to carry: `levels` of copper, those `masked`, the `places` of the boards in their order, the
    pieces of the panel's `text`."""

    levels: tuple[Level, ...]
    masked: tuple[Level, ...]
    places: tuple[str, ...]
    text: tuple[str, ...]


def rail_items(array: Array, fab: Fab, request: RailRequest, *, way: Panelling) -> RailItems:
    """Everything on the rails of `array`, in the panel's coordinates."""
    rails = _rails(array, fab)
    _tooling(rails, fab, request, way)
    _fiducials(rails, request, way)
    if fab.legend:
        _name(rails, fab, request)
    _marks(rails, fab, request)
    return RailItems(
        holes=tuple(rails.holes),
        islands=tuple(rails.islands),
        mask_openings=tuple(rails.openings),
        legend=tuple(rails.legend),
        findings=tuple(rails.findings),
    )


def _rails(array: Array, fab: Fab) -> _Rails:
    """Four empty rails; the lower and the upper one have the corners."""
    width, height = array.size
    scored = array.spacing == 0
    near = nanometres(max(fab.copper_to_routed_edge, fab.copper_to_score if scored else 0.0))
    inset = max(near, nanometres(BOARD_CORNER))
    xs, ys = score_places(array) if scored else ([], [])
    half = array.rail // 2
    crossed = [tuple((line - near, line + near) for line in lines) for lines in (xs, ys)]
    ends = (array.rail + GAP, height - array.rail - GAP)
    rails = {
        "lower": Rail(0, half, inset, width - inset, crossed[0]),
        "right": Rail(1, width - half, *ends, crossed[1]),
        "upper": Rail(0, height - half, inset, width - inset, crossed[0]),
        "left": Rail(1, half, *ends, crossed[1]),
    }
    return _Rails(rails, half, near)


def _corner_places(rails: _Rails, wanted: Sequence[tuple[str, int]], size: int) -> list[Point]:
    found = []
    for name, along in wanted:
        rail = rails.rails[name]
        middle = rails.place(name, size, size, along if along > 0 else rail.stop + rail.start + along)
        if middle is not None:
            found.append(rail.point(middle))
    return found


def _tooling(rails: _Rails, fab: Fab, request: RailRequest, way: Panelling) -> None:
    size = nanometres(way.tooling_hole)
    fits = size <= 2 * (rails.half - nanometres(fab.hole_to_edge))
    found = _corner_places(rails, HOLES, size) if fits else []
    rails.holes += [Hole(place, way.tooling_hole, False, "tooling") for place in found]
    opening = way.tooling_hole + 2.0 * fab.mask_expansion
    rails.openings += [Marking(level, circle(p, opening).normalised()) for p in found for level in request.masked]
    rails.missing("tooling holes", len(found), len(HOLES))


def _fiducials(rails: _Rails, request: RailRequest, way: Panelling) -> None:
    found = _corner_places(rails, FIDUCIALS, nanometres(way.fiducial_opening))
    for place in found:
        disc, opening = (circle(place, size).normalised() for size in (way.fiducial, way.fiducial_opening))
        rails.islands += [Island(level, disc, Role.FIDUCIAL, part="") for level in request.levels]
        rails.openings += [Marking(level, opening) for level in request.levels if level in request.masked]
    rails.missing("fiducials", len(found), len(FIDUCIALS))


def _name(rails: _Rails, fab: Fab, request: RailRequest) -> None:
    """The panel's name in one piece where a rail has room for it, else in pieces."""
    whole = (" ".join(request.text),)
    if _written(rails, whole[0], fab, request):
        return
    left_out = [piece for piece in request.text if not _written(rails, piece, fab, request)]
    if left_out:
        got, advice = f"no room for {', '.join(left_out)}", "write it on the order"
        rails.findings.append(Finding("panel text", "rails", got, "on a rail", advice, Severity.NOTE))


def _written(rails: _Rails, text: str, fab: Fab, request: RailRequest) -> bool:
    """Write `text` on every level at one place, its @ replaced by the level's name; False where no rail has room."""
    texts = {level: text.replace("@", level.value.upper()) for level in request.levels}
    for height in LETTERING:
        pen = max(fab.legend_min_stroke, 0.1 * height)
        length = nanometres(max(text_width(each, height, stroke=pen) for each in texts.values()))
        for name in ("upper", "lower"):
            rail = rails.rails[name]
            middle = rails.place(name, length, nanometres(height), (rail.start + rail.stop) // 2)
            if middle is not None:
                for level, each in texts.items():
                    rails.legend += _letters(each, rail.point(middle), height, pen=pen, level=level)
                return True
    return False


def _letters(text: str, place: Point, height: float, *, pen: float, level: Level) -> list[Marking]:
    strokes = lettered(text, place, height, stroke=pen, mirrored=level is Level.BOTTOM)
    return [Marking(level, stroke.normalised()) for stroke in strokes]


def _marks(rails: _Rails, fab: Fab, request: RailRequest) -> None:
    """A disc per board, in the boards' order: along the lower rail, then on the right one, the upper one, the left."""
    level = request.levels[0]
    pen = max(fab.legend_min_stroke, 0.1 * LABEL)
    disc = MARK + 2 * nanometres(fab.mask_expansion)
    names = list(rails.rails)
    labels = [nanometres(text_width(place, LABEL, stroke=pen)) if fab.legend else 0 for place in request.places]
    placed = 0
    for place, label in zip(request.places, labels, strict=True):
        found = _mark_place(rails, names, disc, longest=max(labels), label=label)
        if found is None:
            break
        at, label_at = found
        placed += 1
        rails.islands.append(Island(level, circle(at, metres(MARK)).normalised(), Role.MARK, part=""))
        if level in request.masked:
            rails.openings.append(Marking(level, circle(at, metres(disc)).normalised()))
        if fab.legend:
            rails.legend += _letters(place, label_at, LABEL, pen=pen, level=level)
    rails.missing("bad-board marks", placed, len(request.places))
    if not fab.legend:
        got = "no letters beside them, the fab prints none"
        advice = f"read them in the order {request.places[0]} to {request.places[-1]}, row by row from the lower left"
        rails.findings.append(Finding("bad-board marks", "rails", got, "letters", advice, Severity.NOTE))


def _mark_place(rails: _Rails, names: list[str], disc: int, *, longest: int, label: int) -> tuple[Point, Point] | None:
    """Places of a mark and of its label, on the first of `names` that still has room; full rails leave the list.

    All marks take the room of the `longest` label, so that none slips back into a gap too short for one before it.
    """
    height = nanometres(LABEL) if longest else 0
    between = nanometres(BESIDE) if longest else 0
    while names:
        rail = rails.rails[names[0]]
        flat = rail.axis == 0
        length = disc + between + (longest if flat else height)
        middle = rails.place(names[0], length, max(disc, height if flat else longest))
        if middle is not None:
            low = middle - length // 2
            beside = low + disc + between + (label if flat else height) // 2
            return rail.point(low + disc // 2), rail.point(beside)
        names.pop(0)
    return None

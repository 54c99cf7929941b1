"""What a family draws: copper about the loop's centre, before a board is put around it.

Loop coordinates: the feed gap is centred on the top of the loop's mean line, +y points from the
loop's centre to the gap, and the mean line runs counter-clockwise from the gap.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, replace

from planar.copper.arc import Point
from planar.copper.boolean import difference, united
from planar.copper.layout import Hole, Island, Level, Marking, Pad, Port
from planar.copper.outline import Outline
from planar.copper.path import Path, band, loop_path
from planar.copper.shapes import turned_rectangle
from planar.copper.tabs import PAIRS, check_joined, check_places, tab_outlines
from planar.errors import GeometryError
from planar.library.records import Connector, Fab

Dimensions = Mapping[str, float]
"""Name -> m, the names of the family's file in templates/families."""


@dataclass(frozen=True)
class DrawingRequest:
    """What drawing needs beside the dimensions.

    `end` is "via" or "open" for a guided line. `mirrored` gives the other sense of circular
    polarisation. `masked` lists the sides under solder mask. `size_limit` (width, height) m caps the
    board, None leaves it free. `tabs` is how many pairs of trim tabs are left, where there are any.
    """

    name: str
    end: str | None
    mirrored: bool
    connector: Connector
    fab: Fab
    masked: tuple[Level, ...]
    size_limit: tuple[float, float] | None = None
    tabs: int = PAIRS


@dataclass(frozen=True)
class Drawing:
    """Copper in loop coordinates. `feed` becomes the board's origin.

    `corridor` is +1 when the feed is reached from above the loop, -1 from below, 0 when it lies inside
    the loop and a cable leaves it at right angles to the board.
    """

    islands: tuple[Island, ...]
    holes: tuple[Hole, ...]
    pads: tuple[Pad, ...]
    ports: tuple[Port, ...]
    mask_openings: tuple[Marking, ...]
    feed: Point
    corridor: int
    inner_size: tuple[float, float]

    def translated(self, dx: float, dy: float) -> Drawing:
        """Everything moved by (dx, dy) m."""

        def moved(point: Point) -> Point:
            return point[0] + dx, point[1] + dy

        return Drawing(
            tuple(replace(i, outline=i.outline.translated(dx, dy)) for i in self.islands),
            tuple(replace(h, centre=moved(h.centre)) for h in self.holes),
            tuple(replace(p, outline=p.outline.translated(dx, dy)) for p in self.pads),
            tuple(replace(p, centre=moved(p.centre)) for p in self.ports),
            tuple(replace(m, outline=m.outline.translated(dx, dy)) for m in self.mask_openings),
            moved(self.feed),
            self.corridor,
            self.inner_size,
        )


def loop_height(dimensions: Dimensions) -> float:
    """Height of the mean line, m: that of a rectangle, else the width."""
    return dimensions.get("loop_height", dimensions["loop_width"])


def mean_line(dimensions: Dimensions) -> Path:
    """Closed mean line of the loop, from the gap's centre counter-clockwise; a circle has no corner radius given."""
    width, height = dimensions["loop_width"], loop_height(dimensions)
    return loop_path(width, height, dimensions.get("corner_radius", 0.5 * width))


def trim_tabs(dimensions: Dimensions, pairs: int = PAIRS) -> tuple[Outline, ...]:
    """The trim tabs of a loop with `pairs` of them left, each from the mean line inward; none where not dimensioned.

    Raises `GeometryError` where they meet each other.
    """
    return tab_outlines(mean_line(dimensions), dimensions, pairs) if "tab_length" in dimensions else ()


def loop_copper(dimensions: Dimensions, gap: float, *, tabs: int = PAIRS) -> tuple[Outline, ...]:
    """Loop trace with its feed gap of `gap` m and, where dimensioned, the second gap and `tabs` pairs of trim tabs: one
    or two islands.

    Both gaps have parallel sides. Raises `GeometryError` when the gaps meet, a bend is too tight or a tab meets a gap,
    another tab or another part of the trace.
    """
    line, trace = mean_line(dimensions), dimensions["trace_width"]
    if 2.0 * trace >= min(dimensions["loop_width"], loop_height(dimensions)):
        raise GeometryError(f"a trace of {trace * 1e3:.3f} mm fills the loop")
    slit = 0.25 * gap  # opens the ring, so that cutting the gap leaves no hole
    open_ring = band(line.between(slit, line.length - slit), trace)
    if "tab_length" in dimensions:
        gaps = {0.0: gap}
        if "second_gap" in dimensions:
            gaps[dimensions["second_gap_position"]] = dimensions["second_gap"]
        check_places(line, dimensions, gaps)
        check_joined(line, dimensions, open_ring)
        (open_ring,) = united([open_ring, *trim_tabs(dimensions, tabs)])
    islands = difference(open_ring, _gap_window(line, 0.0, length=gap, trace=trace))
    if "second_gap" in dimensions:
        position, length = dimensions["second_gap_position"], dimensions["second_gap"]
        nearest = min(position, line.length - position) - 0.5 * (gap + length)
        if nearest < trace:
            raise GeometryError(
                f"the second gap at {position * 1e3:.2f} mm is nearer than a trace width to the feed gap; "
                f"the mean line is {line.length * 1e3:.2f} mm long"
            )
        window = _gap_window(line, position, length=length, trace=trace)
        islands = tuple(part for island in islands for part in difference(island, window))
    return islands


def _gap_window(line: Path, position: float, *, length: float, trace: float) -> Outline:
    """Rectangle that cuts a parallel-sided gap across the trace at `position` m along the mean line."""
    centre, tangent = line.at(position)
    return turned_rectangle(centre, tangent, length=length, width=1.5 * trace + length)

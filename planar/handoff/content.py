"""What an exchange file holds, free of any format: outlines, drills and labels by layer.

`file_content(layout)` says what belongs into the files; the writers put exactly that down, the readers
return the same record, and `check_files` compares the two. The DIMENSIONS layer is made here: a
scale bar and a 10 mm square, because importers take millimetres for inches or metres.
"""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass, replace

import numpy as np

from planar.copper.arc import Point
from planar.copper.layout import Kind, Layout, Level, Pad, Score, bounds_of
from planar.copper.outline import GRID, Outline, on_grid
from planar.copper.shapes import rectangle, turned_rectangle
from planar.handoff.layers import LAYERS
from planar.handoff.net_tie import net_ties

LONG_BAR = 0.1
SHORT_BAR = 0.01
"""m, length of the scale bar, and the one for boards smaller than the long one in both directions."""
SQUARE = 0.01
"""m, side of the square beside the scale bar."""
SCORE_WIDTH = 0.1e-3
"""m, of the rectangle a score line is drawn as; the cut is its middle."""
_CLEAR = 5e-3
_BAR_HEIGHT = 1e-3


@dataclass(frozen=True)
class Drill:
    """A round hole: `centre` and finished `diameter` in m."""

    centre: Point
    diameter: float


@dataclass(frozen=True)
class Label:
    """A text at a place (m) on a layer."""

    layer: str
    text: str
    at: Point


@dataclass(frozen=True)
class FileContent:
    """Outlines and drills by layer name, and labels.

    `faults` lists what a reader met that the format's rules forbid (an open outline, wrong units);
    what is made from a layout has none.
    """

    outlines: Mapping[str, tuple[Outline, ...]]
    drills: Mapping[str, tuple[Drill, ...]]
    labels: tuple[Label, ...] = ()
    faults: tuple[str, ...] = ()

    def flattened(self, chord_error: float) -> FileContent:
        """A copy whose arcs are chains of chords no further than `chord_error` m from them, on the grid."""
        flat = {
            layer: tuple(flattened_on_grid(outline, chord_error) for outline in outlines)
            for layer, outlines in self.outlines.items()
        }
        return replace(self, outlines=flat)


def flattened_on_grid(outline: Outline, chord_error: float) -> Outline:
    """`outline` as a polygon on the nanometre grid, its arcs `chord_error` m or less from their chords."""
    points = np.rint(outline.flattened(chord_error) / GRID)
    distinct = np.any(points != np.roll(points, -1, axis=0), axis=1)
    return Outline.polygon(points[distinct] * GRID)


def file_content(layout: Layout) -> FileContent:
    """What the files of a snapped `layout` hold. Every layer of the table is listed, empty or not."""
    outlines: dict[str, tuple[Outline, ...]] = {layer.name: () for layer in LAYERS}
    for level in Level:
        side = level.name
        outlines[f"COPPER_{side}"] = layout.copper(level)
        outlines[f"MASK_{side}"] = tuple(m.outline for m in layout.mask_openings if m.level == level)
        outlines[f"LEGEND_{side}"] = tuple(m.outline for m in layout.legend if m.level == level)
    outlines["OUTLINE"] = (layout.edge, *layout.cutouts)
    outlines["SCORE"] = tuple(_score_outline(score) for score in layout.scores)
    outlines["KEEPOUT"] = layout.keepout
    outlines["NET_TIE"] = tuple(tie.outline for tie in net_ties(layout))
    outlines["DIMENSIONS"], scale_labels = _scale(layout)
    drills = {
        "DRILL_PLATED": tuple(Drill(h.centre, h.diameter) for h in layout.holes if h.plated),
        "DRILL_UNPLATED": tuple(Drill(h.centre, h.diameter) for h in layout.holes if not h.plated),
    }
    return FileContent(outlines, drills, (*_terminals(layout), *scale_labels))


def scale_bar_length(layout: Layout) -> float:
    """Length of the scale bar, m: 100 mm, or 10 mm beside a board smaller than that in both directions."""
    return SHORT_BAR if max(layout.size) < LONG_BAR else LONG_BAR


def _score_outline(score: Score) -> Outline:
    (x0, y0), (x1, y1) = score.start, score.end
    length = math.dist(score.start, score.end)
    along = ((x1 - x0) / length, (y1 - y0) / length)
    middle = (0.5 * (x0 + x1), 0.5 * (y0 + y1))
    return turned_rectangle(middle, along, length=length, width=SCORE_WIDTH).normalised()


def _called(layout: Layout, pad: Pad) -> str:
    """Name of a terminal, with its part where there are several parts of one kind."""
    return pad.name if layout.kind is Kind.SINGLE else f"{pad.part} {pad.name}"


def _terminals(layout: Layout) -> tuple[Label, ...]:
    """The name of each pad, on the copper under it."""
    labels = []
    for pad in layout.pads:
        x, y = pad.outline.shape().representative_point().coords[0]
        name = _called(layout, pad).encode("ascii", "replace").decode("ascii")  # the formats know no other letters
        labels.append(Label(f"COPPER_{pad.level.name}", name, (on_grid(x), on_grid(y))))
    return tuple(labels)


def _scale(layout: Layout) -> tuple[tuple[Outline, ...], tuple[Label, ...]]:
    """Scale bar and square below everything else, and the texts beside them."""
    everything = [layout.edge, *layout.keepout, *(island.outline for island in layout.islands)]
    x0, y0, _, _ = bounds_of(everything)
    x, bar_top = on_grid(x0), on_grid(y0 - _CLEAR)
    length = scale_bar_length(layout)
    square_top = bar_top - _BAR_HEIGHT - _CLEAR
    boxes = (
        (x, bar_top - _BAR_HEIGHT, x + length, bar_top),
        (x, square_top - SQUARE, x + SQUARE, square_top),
    )
    outlines = tuple(rectangle(*(on_grid(c) for c in box)) for box in boxes)
    labels = tuple(
        Label("DIMENSIONS", f"{1e3 * side:.0f} mm", (on_grid(right + 2e-3), on_grid(bottom)))
        for side, (_, bottom, right, _) in zip((length, SQUARE), boxes, strict=True)
    )
    return outlines, labels

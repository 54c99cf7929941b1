"""Reads the written files again and compares them with the layout they came from.

What a user loses silently when an exchange file is wrong is looked for here: scale, a mirrored
bottom, lost islands, flipped arcs, open outlines, drills off their place. The arc file must agree to
1e-9 in area; the files of chords within what their chord error allows. Every mismatch is reported.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from pathlib import Path

import numpy as np
from shapely import affinity, symmetric_difference
from shapely.geometry.base import BaseGeometry
from shapely.ops import unary_union

from planar.copper.layout import Layout, bounds_of
from planar.copper.outline import CHECK_CHORD, GRID, Outline
from planar.errors import HandoffError
from planar.handoff.content import Drill, FileContent, Label, file_content
from planar.handoff.dxf import SEGMENT_CHORD, outline_content, read_dxf
from planar.handoff.gds import GDS_CHORD, read_gds
from planar.handoff.layers import LAYERS, read_layers_csv

ARC_AREA = 1e-9
"""Relative difference in area allowed where arcs stay arcs."""
OVERLAY_GRID = 0.1 * GRID
"""m, grid of the overlays: without one, nearly coincident edges now and then lose a whole piece."""
GRID_SLACK = 2.0 * GRID
"""m, allowed on positions, diameters and extents for rounding to the grid."""

_COUNTED = 1e12
"""Units in a metre (and in a bulge of 1) outlines are compared by before their shapes are."""

_MISTAKES: tuple[tuple[str, float, float], ...] = (
    ("mirrored left to right", -1.0, 1.0),
    ("mirrored top to bottom", 1.0, -1.0),
    ("25.4 times too large", 1.0 / 25.4, 1.0 / 25.4),
    ("25.4 times too small", 25.4, 25.4),
    ("1000 times too large", 1e-3, 1e-3),
    ("1000 times too small", 1e3, 1e3),
)
"""What commonly goes wrong, and the factors on x and y that put it right."""


@dataclass(frozen=True)
class _File:
    """A file to check: what of a layout it holds, its chord error in m (0 where arcs stay arcs) and the layers whose
    texts it carries."""

    name: str
    read: Callable[[Path], FileContent]
    holds: Callable[[Layout], FileContent]
    chord_error: float
    labelled: frozenset[str]


_NESTED = frozenset({"OUTLINE"})
"""Layers whose outlines lie in each other: one that moves hides in the sum of all."""
_ALL_LAYERS = frozenset(layer.name for layer in LAYERS)
_FILES = (
    _File("board.dxf", read_dxf, file_content, 0.0, frozenset({"DIMENSIONS"})),
    _File("board-segments.dxf", read_dxf, file_content, SEGMENT_CHORD, frozenset({"DIMENSIONS"})),
    _File("outline.dxf", read_dxf, outline_content, 0.0, frozenset()),
    _File("board.gds", read_gds, file_content, GDS_CHORD, _ALL_LAYERS),
)


def check_files(layout: Layout, folder: Path) -> None:
    """Raise `HandoffError` with every mismatch of `layout_mismatches`."""
    mismatches = layout_mismatches(layout, folder)
    if mismatches:
        raise HandoffError("\n".join(["the written files do not agree with the layout:", *mismatches]))


def layout_mismatches(layout: Layout, folder: Path) -> list[str]:
    """How board.dxf, board-segments.dxf, outline.dxf, board.gds, layers.csv in `folder` differ from `layout`.

    Compared by layer: number of outlines, area, extents, shape, number, place and diameter of the drills,
    labels. Each mismatch says file, layer, what was found, what was expected.
    """
    expected = {holds: holds(layout) for holds in {file.holds for file in _FILES}}
    mismatches = [m for file in _FILES for m in _file_mismatches(file, folder / file.name, expected[file.holds])]
    return mismatches + _layer_map_mismatches(folder / "layers.csv")


def _layer_map_mismatches(path: Path) -> list[str]:
    try:
        right = read_layers_csv(path) == LAYERS
    except (OSError, HandoffError) as error:
        return [f"{path.name}: cannot be read: {error}"]
    return [] if right else [f"{path.name}: other layers than the files hold"]


def _file_mismatches(file: _File, path: Path, expected: FileContent) -> list[str]:
    try:
        got = file.read(path)
    except HandoffError as error:
        return [str(error)]
    found = list(got.faults)
    for layer in sorted({*got.outlines, *got.drills} - _ALL_LAYERS):
        found.append(f"{layer}: outlines on a layer of that name, expected none")
    for layer in expected.outlines:
        compared = nested_mismatches if layer in _NESTED else outline_mismatches
        texts = compared(got.outlines.get(layer, ()), expected.outlines[layer], file.chord_error)
        found += [f"{layer}: {text}" for text in texts]
    for layer in sorted({*expected.drills, *got.drills}):
        found += [
            f"{layer}: {text}" for text in _drill_mismatches(got.drills.get(layer, ()), expected.drills.get(layer, ()))
        ]
    found += _label_mismatches(got.labels, [label for label in expected.labels if label.layer in file.labelled])
    return [f"{file.name}: {text}" for text in found]


def outline_mismatches(got: Sequence[Outline], expected: Sequence[Outline], chord_error: float) -> list[str]:
    """How the outlines of one layer differ from those expected, arcs there within `chord_error` m of their chords.

    Files keep the order of the layout, so outlines are compared one by one first: shapes that agree in pairs agree as
    a whole, since the symmetric difference of two unions lies in the union of those of the pairs. Only where a pair
    does not agree are all of them overlaid and, where the sum hides what one does, each held against the nearest.
    """
    found = []
    if len(got) != len(expected):
        found.append(f"{len(got)} outlines, expected {len(expected)}")
    elif _agree_in_pairs(got, expected, chord_error):
        return found
    joint = _joint_mismatches(got, expected, chord_error)
    alone = not joint and len(got) == len(expected) > 1
    return found + (_nearest_mismatches(got, expected, chord_error) if alone else joint)


def _agree_in_pairs(got: Sequence[Outline], expected: Sequence[Outline], chord_error: float) -> bool:
    """Whether each outline agrees with the one at its place in the order; a pair that is a mere translation of an
    earlier one (a letter, a board of a panel) is not compared again."""
    seen = set()
    for here, right in zip(got, expected, strict=True):
        key = _relative(here, right), _relative(right, right)
        if key not in seen and _joint_mismatches([here], [right], chord_error):
            return False
        seen.add(key)
    return True


def _relative(outline: Outline, origin: Outline) -> bytes:
    """Vertices counted from the first of `origin` in picometres and bulges to twelve digits, to compare by."""
    away = outline.vertices - (*origin.vertices[0, :2], 0.0)
    return bytes(np.rint(away * _COUNTED).astype(np.int64).data)


def _joint_mismatches(got: Sequence[Outline], expected: Sequence[Outline], chord_error: float) -> list[str]:
    """Area, extents and shape of all outlines together."""
    if not got or not expected:
        return []
    found = []
    area, right_area = (math.fsum(abs(o.area) for o in outlines) for outlines in (got, expected))
    allowed = _chord_budget(expected, chord_error) if chord_error else ARC_AREA * right_area
    if abs(area - right_area) > allowed:
        found.append(f"area {1e6 * area:.9g} mm2, expected {1e6 * right_area:.9g} within {1e6 * allowed:.2g}")
    box, right_box = bounds_of(got), bounds_of(expected)
    if max(abs(a - b) for a, b in zip(box, right_box, strict=True)) > chord_error + GRID_SLACK:
        found.append(f"extents {_box(box)}, expected {_box(right_box)}")
    return found + _shape_mismatches(got, expected, chord_error)


def nested_mismatches(got: Sequence[Outline], expected: Sequence[Outline], chord_error: float) -> list[str]:
    """As `outline_mismatches`, but each outline against the one of those found whose extents are nearest."""
    if not got or len(expected) == 1 == len(got):
        return outline_mismatches(got, expected, chord_error)
    if len(got) == len(expected) and _agree_in_pairs(got, expected, chord_error):
        return []  # in the layout's order: a panel has hundreds of cutouts
    found = [] if len(got) == len(expected) else [f"{len(got)} outlines, expected {len(expected)}"]
    return found + _nearest_mismatches(got, expected, chord_error)


def _nearest_mismatches(got: Sequence[Outline], expected: Sequence[Outline], chord_error: float) -> list[str]:
    """How each outline differs from the one of those found whose extents are nearest."""
    found = []
    for right in expected:
        here = min(got, key=lambda outline: _apart(outline, right))
        texts = outline_mismatches([here], [right], chord_error)
        found += [f"outline at {_box(right.bounds)}: {text}" for text in texts]
    return found


def _apart(one: Outline, other: Outline) -> float:
    """How far the extents of two outlines are from each other at most, m."""
    return max(abs(a - b) for a, b in zip(one.bounds, other.bounds, strict=True))


def _chord_budget(outlines: Sequence[Outline], chord_error: float) -> float:
    """Area (m2) that chords and rounding may take from or add to `outlines`."""
    arcs = math.fsum(edge.length for outline in outlines for edge in outline.edges if edge.bulge != 0.0)
    return chord_error * arcs + GRID * math.fsum(outline.perimeter for outline in outlines)


def _shape_mismatches(got: Sequence[Outline], expected: Sequence[Outline], chord_error: float) -> list[str]:
    """Whether the area of the symmetric difference is more than chords and rounding explain."""
    shapes = [outline.shape() for outline in got]
    if not all(each.is_valid for each in shapes):
        return ["an outline that crosses itself, expected none"]
    shape, right_shape = unary_union(shapes), unary_union([outline.shape() for outline in expected])
    allowed = _chord_budget(expected, chord_error + CHECK_CHORD)
    apart = symmetric_difference(shape, right_shape, grid_size=OVERLAY_GRID).area
    if apart <= allowed:
        return []
    return [
        f"{_mistake(shape, right_shape, allowed)}, {1e6 * apart:.6g} mm2 differ, expected at most {1e6 * allowed:.2g}"
    ]


def _mistake(shape: BaseGeometry, right_shape: BaseGeometry, allowed: float) -> str:
    """Name of the common mistake that explains `shape`, if one does."""
    for name, x_factor, y_factor in _MISTAKES:
        righted = affinity.scale(shape, x_factor, y_factor, origin=(0.0, 0.0))
        if symmetric_difference(righted, right_shape, grid_size=OVERLAY_GRID).area <= allowed * max(1.0, abs(x_factor)):
            return name
    return "another shape"


def _drill_mismatches(got: Sequence[Drill], expected: Sequence[Drill]) -> list[str]:
    found = []
    if len(got) != len(expected):
        found.append(f"{len(got)} drills, expected {len(expected)}")
    elif all(_is_at(here, right) for here, right in zip(got, expected, strict=True)):
        return found  # the files keep the layout's order: the search below is for those that do not
    for drill in expected if got else ():
        nearest = min(got, key=lambda other: math.dist(other.centre, drill.centre))
        if math.dist(nearest.centre, drill.centre) > GRID_SLACK:
            found.append(f"drill at {_place(nearest.centre)}, expected {_place(drill.centre)}")
        if abs(nearest.diameter - drill.diameter) > GRID_SLACK:
            found.append(
                f"drill at {_place(drill.centre)} of {1e3 * nearest.diameter:.6f} mm, "
                f"expected {1e3 * drill.diameter:.6f} mm"
            )
    return found


def _is_at(got: Drill, expected: Drill) -> bool:
    away = math.dist(got.centre, expected.centre)
    return away <= GRID_SLACK and abs(got.diameter - expected.diameter) <= GRID_SLACK


def _label_mismatches(got: Sequence[Label], expected: Sequence[Label]) -> list[str]:
    here, right = ({f"{a.layer}: {a.text!r} at {_place(a.at)}" for a in labels} for labels in (got, expected))
    missing = [f"{label}: no such label, expected one" for label in sorted(right - here)]
    return missing + [f"{label}: label, expected none" for label in sorted(here - right)]


def _place(point: tuple[float, float]) -> str:
    x, y = (round(1e3 * c, 6) + 0.0 for c in point)  # + 0.0 makes minus zero zero
    return f"({x:.6f}, {y:.6f}) mm"


def _box(box: tuple[float, float, float, float]) -> str:
    x0, y0, x1, y1 = (f"{1e3 * value:.6f}" for value in box)
    return f"({x0}, {y0}) to ({x1}, {y1}) mm"

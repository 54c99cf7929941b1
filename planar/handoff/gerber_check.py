"""Compares the layer files in a folder with the layout they came from.

Outlines are compared with those of the layout itself, not with what the writer made of it: area and shape to what
rounding to the nanometre explains, extents to a few nanometres, common mistakes by name. Attributes, nets and lands
must be the very ones expected, and no flash may add copper.
"""

from __future__ import annotations

from collections import Counter
from collections.abc import Sequence
from pathlib import Path

import numpy as np
from shapely import difference
from shapely.ops import unary_union

from planar.copper.layout import Layout, Role
from planar.copper.outline import CHECK_CHORD, GRID, Outline
from planar.errors import HandoffError
from planar.handoff.check import OVERLAY_GRID, nested_mismatches, outline_mismatches
from planar.handoff.gerber_attributes import attribute_mismatches
from planar.handoff.gerber_content import (
    Flash,
    GerberContent,
    GerberFacts,
    GerberFile,
    Region,
    Stroke,
    Tags,
    Track,
    gerber_content,
    gerber_files,
)
from planar.handoff.gerber_reader import read_gerber


def gerber_mismatches(layout: Layout, folder: Path, *, facts: GerberFacts) -> list[str]:
    """What in the layer files of `folder` differs from `layout`, file by file; empty when all is right.

    Missing files are reported too.
    """
    files = gerber_files(layout, facts)
    return [f"{file.name}: {text}" for file in files for text in _file_mismatches(layout, file, folder, facts)]


def _file_mismatches(layout: Layout, file: GerberFile, folder: Path, facts: GerberFacts) -> list[str]:
    try:
        got = read_gerber(folder / file.name)
    except HandoffError as error:
        return [str(error)]
    expected = gerber_content(layout, file, facts)
    return [
        *got.faults,
        *attribute_mismatches(got.attributes, expected.attributes),
        *_shape_mismatches(layout, file, got),
        *_count_mismatches(got, expected),
        *_tag_mismatches([*got.regions, *got.tracks], [*expected.regions, *expected.tracks]),
        *_flash_mismatches(got, expected),
        *_stroke_mismatches(got, expected),
        *(_added_copper(layout, file, got) if file.holds == "copper" else []),
    ]


def _shape_mismatches(layout: Layout, file: GerberFile, got: GerberContent) -> list[str]:
    """How the shapes of a file differ from those of the layout; edge, cutouts and boards lie in each other."""
    if file.level is None:
        return nested_mismatches([track.outline for track in got.tracks], _layout_lines(layout, file), GRID)
    return outline_mismatches(_shapes(got, file), _layout_shapes(layout, file), GRID)


def _layout_lines(layout: Layout, file: GerberFile) -> tuple[Outline, ...]:
    """The outlines a file draws as closed lines."""
    edges = (layout.edge, *layout.cutouts)
    return {"profile": edges, "array": (*edges, *layout.boards)}.get(file.holds, ())


def _shapes(content: GerberContent, file: GerberFile) -> tuple[Outline, ...]:
    """The outlines of a file that stand for those of the layout; lands lie on copper and add nothing."""
    return content.filled if file.holds == "mask" else tuple(region.outline for region in content.regions)


def _layout_shapes(layout: Layout, file: GerberFile) -> tuple[Outline, ...]:
    if file.holds == "copper":
        islands = [i for i in layout.islands if i.level == file.level and i.role is not Role.FIDUCIAL]
        return tuple(island.outline for island in islands)  # fiducials are flashes
    markings = layout.mask_openings if file.holds == "mask" else layout.legend
    return tuple(marking.outline for marking in markings if marking.level == file.level)


def _count_mismatches(got: GerberContent, expected: GerberContent) -> list[str]:
    counts = [
        ("regions", len(got.regions), len(expected.regions)),
        ("closed lines", len(got.tracks), len(expected.tracks)),
        ("straight lines", len(got.strokes), len(expected.strokes)),
    ]
    return [f"{here} {what}, expected {right}" for what, here, right in counts if here != right]


def _tag_mismatches(got: Sequence[Region | Track], expected: Sequence[Region | Track]) -> list[str]:
    """Attributes of each expected object against those of the object whose extents are nearest."""
    if [_told(each) for each in got] == [_told(each) for each in expected]:
        return []  # the files keep the layout's order: the search below is for those that do not
    found = []
    extents = np.array([each.outline.bounds for each in got])  # a panel has thousands of letter strokes
    for right in expected if got else ():
        here = got[int(np.abs(extents - right.outline.bounds).max(axis=1).argmin())]
        x, y = right.outline.vertices[0, :2].tolist()
        where = f"{type(right).__name__.lower()} at ({1e3 * x:.6f}, {1e3 * y:.6f}) mm"
        found += [f"{where}: {text}" for text in _differences(here.tags, right.tags)]
        if isinstance(here, Track) and isinstance(right, Track) and here.aperture != right.aperture:
            found.append(f"{where}: drawn with {here.aperture}, expected {right.aperture}")
    return found


def _told(drawn: Region | Track) -> tuple[int, int, Tags, object]:
    """Where an object starts (nm), what it is, what it is drawn with."""
    x, y, _ = drawn.outline.vertices[0].tolist()
    return round(x / GRID), round(y / GRID), drawn.tags, drawn.aperture if isinstance(drawn, Track) else None


def _differences(got: Tags, expected: Tags) -> list[str]:
    names = ("function", "net", "component", "pin")
    pairs = [(name, getattr(got, name), getattr(expected, name)) for name in names]
    return [f"{name} {here or 'missing'}, expected {right or 'none'}" for name, here, right in pairs if here != right]


def _flash_mismatches(got: GerberContent, expected: GerberContent) -> list[str]:
    """Both sides are whole nanometres: equal flashes are equal records."""
    here, right = Counter(got.flashes), Counter(expected.flashes)
    missing = [f"{_shown(flash)}: no such flash, expected one" for flash in (right - here).elements()]
    return missing + [f"{_shown(flash)}: a flash, expected none" for flash in (here - right).elements()]


def _stroke_mismatches(got: GerberContent, expected: GerberContent) -> list[str]:
    """As for flashes: both sides are whole nanometres."""
    here, right = Counter(got.strokes), Counter(expected.strokes)
    missing = [f"{_line(stroke)}: no such line, expected one" for stroke in (right - here).elements()]
    return missing + [f"{_line(stroke)}: a line, expected none" for stroke in (here - right).elements()]


def _line(stroke: Stroke) -> str:
    (a, b), (c, d) = ((_mm(x), _mm(y)) for x, y in (stroke.start, stroke.end))
    width = _mm(stroke.aperture.size[0])
    return f"line from ({a}, {b}) to ({c}, {d}) mm, {width} mm wide, {stroke.tags.function or 'no function'}"


def _shown(flash: Flash) -> str:
    aperture, tags = flash.aperture, flash.tags
    if aperture.kind == "P":
        shape = f"polygon of {len(aperture.size) // 2} corners"
    else:
        shape = f"{aperture.kind} {'x'.join(f'{1e3 * size:.6f}' for size in aperture.size)} mm"
    x, y = (_mm(c) for c in flash.centre)
    pin = f", pin {tags.component}-{tags.pin}" if tags.pin else ""
    return f"{shape} at ({x}, {y}) mm, {tags.function}, net {tags.net or 'none'}{pin}"


def _mm(length: float) -> str:
    return f"{round(1e3 * length, 6) + 0.0:.6f}"  # + 0.0 makes minus zero zero


def _added_copper(layout: Layout, file: GerberFile, got: GerberContent) -> list[str]:
    """Flashes that reach beyond the copper of their net: they would change the antenna."""
    found = []
    for flash in got.flashes:
        outline = flash.aperture.at(flash.centre)
        islands = [i for i in layout.islands if i.level == file.level and i.net == flash.tags.net]
        copper = unary_union([island.outline.shape() for island in islands])
        beyond = difference(outline.shape(), copper, grid_size=OVERLAY_GRID).area
        if beyond > 2.0 * CHECK_CHORD * outline.perimeter:
            found.append(f"{_shown(flash)}: {1e6 * beyond:.6g} mm2 beyond the copper of its net")
    return found

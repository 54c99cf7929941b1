"""Compares the layer files in a folder with the layout they came from.

Outlines are compared with those of the layout itself, not with what the writer made of it: area and shape to what
rounding to the nanometre explains, extents to a few nanometres, common mistakes by name. Attributes, nets and lands
must be the very ones expected, and no flash may add copper.
"""

from __future__ import annotations

from collections import Counter
from collections.abc import Sequence
from pathlib import Path

from shapely import difference
from shapely.ops import unary_union

from planar.copper.layout import Layout
from planar.copper.outline import CHECK_CHORD, GRID, Outline
from planar.errors import HandoffError
from planar.handoff.check import OVERLAY_GRID, outline_mismatches
from planar.handoff.gerber_attributes import attribute_mismatches
from planar.handoff.gerber_content import (
    Flash,
    GerberContent,
    GerberFacts,
    GerberFile,
    Region,
    Tags,
    Track,
    gerber_content,
    gerber_files,
)
from planar.handoff.gerber_reader import read_gerber


def gerber_mismatches(layout: Layout, folder: Path, *, facts: GerberFacts) -> list[str]:
    """What in the layer files of `folder` differs from `layout`, file by file; empty when all is right.

    Missing files and layer files that do not belong to this board are reported too.
    """
    files = gerber_files(layout, facts)
    stale = sorted({path.name for path in folder.glob("*.gbr")} - {file.name for file in files})
    return [
        *(f"{file.name}: {text}" for file in files for text in _file_mismatches(layout, file, folder, facts)),
        *(f"{name}: a layer file this board does not have" for name in stale),
    ]


def _file_mismatches(layout: Layout, file: GerberFile, folder: Path, facts: GerberFacts) -> list[str]:
    try:
        got = read_gerber(folder / file.name)
    except HandoffError as error:
        return [str(error)]
    expected = gerber_content(layout, file, facts)
    return [
        *got.faults,
        *attribute_mismatches(got.attributes, expected.attributes),
        *outline_mismatches(_shapes(got, file), _layout_shapes(layout, file), GRID),
        *_count_mismatches(got, expected),
        *_tag_mismatches([*got.regions, *got.tracks], [*expected.regions, *expected.tracks]),
        *_flash_mismatches(got, expected),
        *(_added_copper(layout, file, got) if file.holds == "copper" else []),
    ]


def _shapes(content: GerberContent, file: GerberFile) -> tuple[Outline, ...]:
    """The outlines of a file that stand for those of the layout; lands lie on copper and add nothing."""
    if file.holds == "mask":
        return content.filled
    return tuple(each.outline for each in (content.tracks if file.holds == "profile" else content.regions))


def _layout_shapes(layout: Layout, file: GerberFile) -> tuple[Outline, ...]:
    if file.level is None:
        return (layout.edge,)
    if file.holds == "copper":
        return layout.copper(file.level)
    markings = layout.mask_openings if file.holds == "mask" else layout.legend
    return tuple(marking.outline for marking in markings if marking.level == file.level)


def _count_mismatches(got: GerberContent, expected: GerberContent) -> list[str]:
    counts = [
        ("regions", len(got.regions), len(expected.regions)),
        ("drawn lines", len(got.tracks), len(expected.tracks)),
    ]
    return [f"{here} {what}, expected {right}" for what, here, right in counts if here != right]


def _tag_mismatches(got: Sequence[Region | Track], expected: Sequence[Region | Track]) -> list[str]:
    """Attributes of each expected object against those of the object whose extents are nearest."""
    found = []
    for right in expected if got else ():
        here = min(got, key=lambda each: _apart(each.outline, right.outline))
        x, y = right.outline.vertices[0, :2].tolist()
        where = f"{type(right).__name__.lower()} at ({1e3 * x:.6f}, {1e3 * y:.6f}) mm"
        found += [f"{where}: {text}" for text in _differences(here.tags, right.tags)]
        if isinstance(here, Track) and isinstance(right, Track) and here.aperture != right.aperture:
            found.append(f"{where}: drawn with {here.aperture}, expected {right.aperture}")
    return found


def _apart(one: Outline, other: Outline) -> float:
    return max(abs(a - b) for a, b in zip(one.bounds, other.bounds, strict=True))


def _differences(got: Tags, expected: Tags) -> list[str]:
    names = ("function", "net", "component", "pin")
    pairs = [(name, getattr(got, name), getattr(expected, name)) for name in names]
    return [f"{name} {here or 'missing'}, expected {right or 'none'}" for name, here, right in pairs if here != right]


def _flash_mismatches(got: GerberContent, expected: GerberContent) -> list[str]:
    """Both sides are whole nanometres: equal flashes are equal records."""
    here, right = Counter(got.flashes), Counter(expected.flashes)
    missing = [f"{_shown(flash)}: no such flash, expected one" for flash in (right - here).elements()]
    return missing + [f"{_shown(flash)}: a flash, expected none" for flash in (here - right).elements()]


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

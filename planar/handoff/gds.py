"""GDSII stream for tools that take no DXF: polygons on a 1 nm grid, arcs as chords of 1 um error.

GDS has no arcs and no circles, so islands and drills alike are polygons. No polygon is ever split:
an island with more vertices than a record may hold is refused. Each terminal carries a label on its
copper. Dates are constants, so that two runs give the same bytes.
"""

from __future__ import annotations

import math
import re
from datetime import datetime
from pathlib import Path

import gdstk
import numpy as np

from planar.copper.layout import Layout
from planar.copper.outline import Outline
from planar.copper.shapes import circle
from planar.errors import HandoffError
from planar.handoff.content import Drill, FileContent, Label, file_content, flattened_on_grid
from planar.handoff.layers import DRILL_LAYERS, LAYERS, layer_named, name_of_gds

GDS_CHORD = 1e-6
"""m, chord error of the polygons."""
MAX_VERTICES = 4094
"""Vertices of one polygon; some readers warn beyond that."""
FARTHEST = 2.147
"""m, coordinates beyond wrap round in the format's 32-bit integers of 1 nm."""
_USER_UNIT = 1e-6
_DATABASE_UNIT = 1e-9
_TIMESTAMP = datetime(2000, 1, 1)
_LONGEST_NAME = 32
_END_OF_LIBRARY = b"\x00\x04\x04\x00"
"""The record every complete stream ends with."""


def cell_name(name: str) -> str:
    """`name` with what a GDS cell name may hold: letters, digits and "_", at most 32 of them."""
    return re.sub(r"[^A-Za-z0-9_]", "_", name)[:_LONGEST_NAME] or "LAYOUT"


def write_gds(layout: Layout, path: Path) -> None:
    """Write a snapped `layout` as one cell. The same layout gives the same bytes.

    Raises `HandoffError` when an outline needs more than 4094 vertices or lies beyond 2.147 m, and when the
    file could not be written whole.
    """
    content = file_content(layout)
    cell = gdstk.Cell(cell_name(layout.name))
    for name, outlines in _polygons(content).items():
        layer = layer_named(name)
        for outline in outlines:
            points = (_checked(outline, name).vertices[:, :2] / _USER_UNIT).round(3).tolist()
            cell.add(gdstk.Polygon(points, layer=layer.gds_layer, datatype=layer.gds_datatype))
    for label in content.labels:
        layer = layer_named(label.layer)
        place = (label.at[0] / _USER_UNIT, label.at[1] / _USER_UNIT)
        cell.add(gdstk.Label(label.text, place, layer=layer.gds_layer, texttype=layer.gds_datatype))
    library = gdstk.Library(cell.name, unit=_USER_UNIT, precision=_DATABASE_UNIT)
    library.add(cell)
    library.write_gds(path, max_points=MAX_VERTICES, timestamp=_TIMESTAMP)
    if not path.read_bytes().endswith(_END_OF_LIBRARY):  # the library says nothing when the disk is full
        raise HandoffError(f"{path.name} could not be written whole: the disk may be full")


def _polygons(content: FileContent) -> dict[str, list[Outline]]:
    """Everything as polygons by layer, drills too, in the order of the table."""
    polygons: dict[str, list[Outline]] = {layer.name: [] for layer in LAYERS}
    for name, outlines in content.outlines.items():
        polygons[name] += [flattened_on_grid(outline, GDS_CHORD) for outline in outlines]
    for name, drills in content.drills.items():
        polygons[name] += [flattened_on_grid(circle(d.centre, d.diameter), GDS_CHORD) for d in drills]
    return polygons


def _checked(outline: Outline, layer: str) -> Outline:
    if len(outline) > MAX_VERTICES:
        raise HandoffError(
            f"GDS: an outline on {layer} needs {len(outline)} vertices at a chord error of 1 um, limit {MAX_VERTICES}"
        )
    farthest = float(np.abs(outline.vertices[:, :2]).max())
    if farthest > FARTHEST:
        raise HandoffError(f"GDS: an outline on {layer} reaches {farthest:.3f} m from the origin, limit {FARTHEST} m")
    return outline


def read_gds(path: Path) -> FileContent:
    """What a GDS file of `write_gds` holds, by layer, in m; drills are told by their layer.

    What the rules forbid (several cells, references, paths, another grid) is named in `faults`. Layers
    the table does not know are listed as "number/datatype". Raises `HandoffError` when the file cannot
    be read as GDS.
    """
    try:
        library = gdstk.read_gds(path)
    except (OSError, RuntimeError) as error:
        raise HandoffError(f"{path.name} cannot be read as GDS: {error}") from error
    outlines: dict[str, list[Outline]] = {}
    drills: dict[str, list[Drill]] = {}
    labels: list[Label] = []
    for cell in _cells(library):
        for polygon in cell.polygons:
            name = name_of_gds(polygon.layer, polygon.datatype)
            outline = Outline.polygon(np.asarray(polygon.points) * library.unit)
            if name in DRILL_LAYERS:
                drills.setdefault(name, []).append(_drill(outline))
            else:
                outlines.setdefault(name, []).append(outline)
        for label in cell.labels:
            x, y = label.origin
            name = name_of_gds(label.layer, label.texttype)
            labels.append(Label(name, label.text, (x * library.unit, y * library.unit)))
    return FileContent(
        {layer: tuple(found) for layer, found in outlines.items()},
        {layer: tuple(found) for layer, found in drills.items()},
        tuple(labels),
        tuple(_faults(library)),
    )


def _cells(library: gdstk.Library) -> list[gdstk.Cell]:
    return [cell for cell in library.cells if isinstance(cell, gdstk.Cell)]


def _drill(outline: Outline) -> Drill:
    """Hole whose polygon, evenly spaced round the circle, is `outline`."""
    points = outline.vertices[:, :2]
    x, y = points.mean(axis=0)
    radius = float(np.hypot(points[:, 0] - x, points[:, 1] - y).mean())
    return Drill((float(x), float(y)), 2.0 * radius)


def _faults(library: gdstk.Library) -> list[str]:
    faults = []
    if not math.isclose(library.precision, _DATABASE_UNIT, rel_tol=1e-9):
        faults.append(f"header: database unit {library.precision:g} m, expected {_DATABASE_UNIT:g} m")
    if len(library.cells) != 1:
        faults.append(f"cells: {len(library.cells)}, expected 1")
    for cell in _cells(library):
        if cell.references or cell.paths:
            faults.append(f"cell {cell.name}: references or paths, expected polygons and labels only")
    return faults

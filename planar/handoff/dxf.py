"""DXF for the PCB layout engineer: closed polylines with true arcs, and a twin of short segments.

The file keeps to what every importer understands: release 2000, millimetres, model space, one closed
LWPOLYLINE per island with its arcs as bulges, drills as circles. Coordinates are whole nanometres
and no number carries an exponent. The reader goes by the bulge formula and knows nothing of curves,
so that what it measures is what the file says.
"""

from __future__ import annotations

import io
import re
from collections.abc import Iterator
from contextlib import contextmanager
from decimal import Decimal
from pathlib import Path

import numpy as np
from ezdxf import options, units  # type: ignore[attr-defined]  # "options" is documented, not declared exported
from ezdxf.document import Drawing as Document
from ezdxf.entities.circle import Circle
from ezdxf.entities.dxfentity import DXFEntity
from ezdxf.entities.lwpolyline import LWPolyline
from ezdxf.entities.text import Text
from ezdxf.filemanagement import new, readfile
from ezdxf.layouts.layout import Modelspace
from ezdxf.lldxf.const import DXFError
from numpy.typing import NDArray

from planar.copper.layout import Layout
from planar.copper.outline import Outline
from planar.errors import HandoffError
from planar.handoff.content import Drill, FileContent, Label, file_content
from planar.handoff.layers import LAYERS

SEGMENT_CHORD = 2e-6
"""m, chord error of the file without arcs."""
_TEXT_HEIGHT_MM = 2.0
_EXPONENT = re.compile(r"^-?\d+(?:\.\d+)?e[+-]?\d+$", re.MULTILINE)


def write_dxf(layout: Layout, path: Path) -> None:
    """Write a snapped `layout` with true arcs. The same layout gives the same bytes."""
    _write(file_content(layout), path)


def write_dxf_segments(layout: Layout, path: Path) -> None:
    """Write a snapped `layout` with arcs as segments, 2 um chord error, for importers that drop bulges."""
    _write(file_content(layout).flattened(SEGMENT_CHORD), path)


def outline_content(layout: Layout) -> FileContent:
    """What outline.dxf of a snapped `layout` holds: edge, cut-outs and unplated holes, all of them to be cut.

    The other layers of the table are listed empty. No scale bar: a mechanical drawing would take it for a cut.
    """
    whole = file_content(layout)
    outlines = {name: found if name == "OUTLINE" else () for name, found in whole.outlines.items()}
    drills = {name: found if name == "DRILL_UNPLATED" else () for name, found in whole.drills.items()}
    return FileContent(outlines, drills)


def write_outline_dxf(layout: Layout, path: Path) -> None:
    """Write edge and unplated holes of a snapped `layout` alone, with true arcs, for a mechanical drawing."""
    _write(outline_content(layout), path)


def _write(content: FileContent, path: Path) -> None:
    with _fixed_metadata():
        document = new("R2000", units=units.MM)
        document.header["$INSUNITS"] = units.MM
        document.header["$MEASUREMENT"] = 1
        for layer in LAYERS:
            document.layers.add(layer.name, color=layer.colour)
        _draw(content, document.modelspace())
        text = io.StringIO()
        document.write(text)
    plain = _EXPONENT.sub(lambda match: f"{Decimal(match[0]):f}", text.getvalue())
    path.write_bytes(plain.encode("ascii"))


@contextmanager
def _fixed_metadata() -> Iterator[None]:
    """Dates and identifiers of the document are constants inside: two runs give the same bytes."""
    before = options.write_fixed_meta_data_for_testing
    options.write_fixed_meta_data_for_testing = True
    try:
        yield
    finally:
        options.write_fixed_meta_data_for_testing = before


def _draw(content: FileContent, space: Modelspace) -> None:
    for layer, outlines in content.outlines.items():
        for outline in outlines:
            rows = [(_mm(x), _mm(y), bulge) for x, y, bulge in outline.vertices.tolist()]
            space.add_lwpolyline(rows, format="xyb", close=True, dxfattribs={"layer": layer})
    for layer, drills in content.drills.items():
        for drill in drills:
            centre = (_mm(drill.centre[0]), _mm(drill.centre[1]), 0.0)
            space.add_circle(centre, _mm(drill.diameter) / 2.0, dxfattribs={"layer": layer})
    for label in content.labels:
        if label.layer == "DIMENSIONS":  # a text on a copper layer would be taken for copper
            place = (_mm(label.at[0]), _mm(label.at[1]), 0.0)
            space.add_text(label.text, height=_TEXT_HEIGHT_MM, dxfattribs={"layer": label.layer, "insert": place})


def _mm(length: float) -> float:
    """A length in mm, a whole number of nanometres."""
    return round(length * 1e9) / 1e6


def read_dxf(path: Path) -> FileContent:
    """What a DXF file of `write_dxf` or `write_dxf_segments` holds, by layer, in m.

    Polylines become outlines by their vertices and bulges. What the rules forbid (an open polyline, a
    width, other units, other kinds of entity) is named in `faults` and left out of the outlines.
    Raises `HandoffError` when the file cannot be read as DXF.
    """
    try:
        document = readfile(path)
    except (OSError, DXFError) as error:
        raise HandoffError(f"{path.name} cannot be read as DXF: {error}") from error
    outlines: dict[str, list[Outline]] = {}
    drills: dict[str, list[Drill]] = {}
    labels: list[Label] = []
    faults = _document_faults(document)
    for entity in document.modelspace():
        layer = entity.dxf.layer
        entity_faults = _entity_faults(entity)
        faults += [f"{layer}: {fault}" for fault in entity_faults]
        if entity_faults:
            continue
        if isinstance(entity, LWPolyline):
            outlines.setdefault(layer, []).append(_outline(entity))
        elif isinstance(entity, Circle):
            x, y, _ = entity.dxf.center
            drills.setdefault(layer, []).append(Drill((x * 1e-3, y * 1e-3), 2e-3 * entity.dxf.radius))
        elif isinstance(entity, Text):
            x, y, _ = entity.dxf.insert
            labels.append(Label(layer, entity.dxf.text, (x * 1e-3, y * 1e-3)))
    return FileContent(
        {layer: tuple(found) for layer, found in outlines.items()},
        {layer: tuple(found) for layer, found in drills.items()},
        tuple(labels),
        tuple(faults),
    )


def _rows(polyline: LWPolyline) -> NDArray[np.float64]:
    """x and y in mm, widths at start and end, bulge of each vertex: (n, 5)."""
    return np.array(polyline.lwpoints.values, dtype=np.float64).reshape(-1, 5)


def _outline(polyline: LWPolyline) -> Outline:
    return Outline(_rows(polyline)[:, [0, 1, 4]] * (1e-3, 1e-3, 1.0))


def _document_faults(document: Document) -> list[str]:
    faults = []
    for variable, expected in (("$INSUNITS", units.MM), ("$MEASUREMENT", 1)):
        got = document.header.get(variable)
        if got != expected:
            faults.append(f"header: {variable} {got}, expected {expected}")
    return faults


def _entity_faults(entity: DXFEntity) -> list[str]:
    """What the rules forbid about one entity."""
    if isinstance(entity, LWPolyline):
        return _polyline_faults(entity)
    if isinstance(entity, Circle):
        flat = entity.dxf.center[2] == 0.0 and tuple(entity.dxf.extrusion) == (0.0, 0.0, 1.0)
        return [] if flat else ["a circle off the plane z = 0, expected z 0 seen from the top"]
    if isinstance(entity, Text) and entity.dxf.layer == "DIMENSIONS":
        return []
    return [f"a {entity.dxftype()}, expected closed LWPOLYLINE and CIRCLE only"]


def _polyline_faults(polyline: LWPolyline) -> list[str]:
    faults = []
    rows = _rows(polyline)
    if not polyline.closed:
        faults.append("an open polyline, expected closed")
    if len(rows) < 2 or np.array_equal(rows[0, :2], rows[-1, :2]):
        faults.append("a polyline that repeats its first vertex, expected the closed flag alone")
    if polyline.dxf.const_width != 0.0 or np.any(rows[:, 2:4]):
        faults.append("a polyline with a width, expected 0")
    if polyline.dxf.elevation != 0.0 or tuple(polyline.dxf.extrusion) != (0.0, 0.0, 1.0):
        faults.append("a polyline off the plane z = 0, expected z 0 seen from the top")
    return faults

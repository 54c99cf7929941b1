"""DXF written, read again with ezdxf alone, and measured with formulas of plane geometry.

Authority: the DXF reference (group 42: bulge = tan of a quarter of the included angle) and the area of a
band along a smooth line, length times width (Pappus). Tolerances: 1e-9 relative where arcs stay arcs,
chord error times arc length where they do not.
"""

from __future__ import annotations

import math
import re
from collections.abc import Callable
from dataclasses import replace
from pathlib import Path

import ezdxf
import numpy as np
import pytest
from ezdxf.document import Drawing as Document
from shapely.geometry import Polygon
from shapely.ops import unary_union

from planar.copper.layout import Layout, Level
from planar.copper.outline import Outline
from planar.copper.path import loop_path
from planar.handoff import LAYERS, file_content, read_dxf, write_dxf, write_dxf_segments

WRITERS = [write_dxf, write_dxf_segments]
NUMBER_LINE = re.compile(r"^-?\d+\.\d+$")


def document(layout: Layout, folder: Path, writer: Callable[[Layout, Path], None] = write_dxf) -> Document:
    path = folder / "board.dxf"
    writer(layout, path)
    return ezdxf.readfile(path)


def polylines(doc: Document, layer: str) -> list[np.ndarray]:
    """Rows x, y, bulge in mm of every polyline on `layer`."""
    return [np.array(e.get_points("xyb")) for e in doc.modelspace().query(f'LWPOLYLINE[layer=="{layer}"]')]


def bulge_area(rows: np.ndarray) -> float:
    """Signed area: polygon of the vertices, and r^2 / 2 (angle - sin angle) for each arc."""
    area = 0.0
    for (x, y, bulge), (u, v, _) in zip(rows, np.roll(rows, -1, axis=0), strict=True):
        area += 0.5 * (x * v - u * y)
        if bulge:
            angle = 4.0 * math.atan(abs(bulge))
            radius = 0.5 * math.hypot(u - x, v - y) / math.sin(0.5 * angle)
            area += math.copysign(0.5 * radius**2 * (angle - math.sin(angle)), bulge)
    return area


@pytest.mark.parametrize("writer", WRITERS)
def test_same_bytes_twice(layout: Layout, tmp_path: Path, writer: Callable[[Layout, Path], None]) -> None:
    for name in ("one", "two"):
        writer(layout, tmp_path / name)
    assert (tmp_path / "one").read_bytes() == (tmp_path / "two").read_bytes()


@pytest.mark.parametrize("writer", WRITERS)
def test_document(layout: Layout, tmp_path: Path, writer: Callable[[Layout, Path], None]) -> None:
    doc = document(layout, tmp_path, writer)
    assert doc.dxfversion == "AC1015"  # release 2000
    assert doc.header["$INSUNITS"] == 4  # millimetres
    assert doc.header["$MEASUREMENT"] == 1  # metric
    audit = doc.audit()
    assert not audit.errors
    assert not audit.fixes
    assert {layer.name for layer in LAYERS} <= {layer.dxf.name for layer in doc.layers}
    assert all(len(page) == 0 for page in doc.layouts if page.name != "Model")
    assert not [block.name for block in doc.blocks if len(block) and not block.name.startswith("*")]


@pytest.mark.parametrize("writer", WRITERS)
def test_entities_are_what_every_importer_takes(
    layout: Layout, tmp_path: Path, writer: Callable[[Layout, Path], None]
) -> None:
    for entity in document(layout, tmp_path, writer).modelspace():
        kind = entity.dxftype()
        if entity.dxf.layer == "DIMENSIONS":
            assert kind in ("LWPOLYLINE", "TEXT")
        elif entity.dxf.layer.startswith("DRILL_"):
            assert kind == "CIRCLE"
            assert entity.dxf.center.z == 0.0
        else:
            assert kind == "LWPOLYLINE"
        if kind == "LWPOLYLINE":
            rows = np.array(entity.get_points("xyseb"))
            assert entity.closed
            assert entity.dxf.elevation == 0.0
            assert entity.dxf.const_width == 0.0
            assert np.all(rows[:, 2:4] == 0.0)
            steps = np.linalg.norm(rows[:, :2] - np.roll(rows[:, :2], -1, axis=0), axis=1)
            assert steps.min() >= 1e-6  # no zero-length edge, first vertex not repeated
            nanometres = rows[:, :2] * 1e6
            assert np.allclose(nanometres, np.rint(nanometres), rtol=0.0, atol=1e-5)


@pytest.mark.parametrize("writer", WRITERS)
def test_numbers_carry_no_exponent_and_coordinates_end_at_the_nanometre(
    layout: Layout, tmp_path: Path, writer: Callable[[Layout, Path], None]
) -> None:
    path = tmp_path / "board.dxf"
    writer(layout, path)
    lines = path.read_text(encoding="ascii").splitlines()
    pairs = list(zip(lines[::2], lines[1::2], strict=True))
    assert not [value for _, value in pairs if re.fullmatch(r"-?[\d.]+[eE][+-]?\d+", value)]
    entities = pairs[pairs.index(("  2", "ENTITIES")) :]
    coordinates = [value for code, value in entities if code.strip() in ("10", "20")]
    assert coordinates
    assert all(len(value.split(".")[1]) <= 6 for value in coordinates if NUMBER_LINE.match(value))


def test_area_by_level_to_a_part_in_1e9(two_level: Layout, tmp_path: Path) -> None:
    """The band's area is its length times its width: both gaps lie on straight stretches."""
    doc = document(two_level, tmp_path)
    length = 1e3 * loop_path(0.1, 0.09, 0.02).length
    expected = {"COPPER_BOTTOM": (length - 2.0 - 0.8) * 5.0, "COPPER_TOP": 150.0 * 2.1 + 20.0 * 0.25}
    for layer, area in expected.items():
        # vertices lie on the grid, so area may differ by half a nanometre along the outline (about 0.7 m)
        assert sum(bulge_area(rows) for rows in polylines(doc, layer)) == pytest.approx(area, abs=4e-4)
    for level in Level:
        written = sum(bulge_area(rows) for rows in polylines(doc, f"COPPER_{level.name}"))
        assert written == pytest.approx(1e6 * two_level.area(level), rel=1e-9)


def test_one_polyline_per_island_counter_clockwise(layout: Layout, tmp_path: Path) -> None:
    doc = document(layout, tmp_path)
    for level in Level:
        found = polylines(doc, f"COPPER_{level.name}")
        assert len(found) == len(layout.copper(level))
        assert all(bulge_area(rows) > 0.0 for rows in found)


def test_every_layer_holds_its_part_of_the_board_and_nothing_is_mirrored(two_level: Layout, tmp_path: Path) -> None:
    doc = document(two_level, tmp_path)
    top, bottom = Level.TOP, Level.BOTTOM
    expected = {
        "COPPER_TOP": [i.outline for i in two_level.islands if i.level == top],
        "COPPER_BOTTOM": [i.outline for i in two_level.islands if i.level == bottom],
        "MASK_TOP": [m.outline for m in two_level.mask_openings if m.level == top],
        "MASK_BOTTOM": [m.outline for m in two_level.mask_openings if m.level == bottom],
        "LEGEND_TOP": [m.outline for m in two_level.legend if m.level == top],
        "LEGEND_BOTTOM": [m.outline for m in two_level.legend if m.level == bottom],
        "OUTLINE": [two_level.edge],
        "KEEPOUT": list(two_level.keepout),
    }
    for layer, outlines in expected.items():
        found = [1e-3 * rows[:, :2] for rows in polylines(doc, layer)]
        assert len(found) == len(outlines) > 0
        for got, outline in zip(found, outlines, strict=True):
            assert np.allclose(got, outline.vertices[:, :2], rtol=0.0, atol=1e-12)


def test_segments_stay_within_their_chord_error(layout: Layout, tmp_path: Path) -> None:
    doc = document(layout, tmp_path, write_dxf_segments)
    for layer, outlines in file_content(layout).outlines.items():
        rows = polylines(doc, layer)
        assert len(rows) == len(outlines)
        assert not any(np.any(part[:, 2]) for part in rows)
        shape = unary_union([Polygon(part[:, :2]) for part in rows])
        fine = unary_union([Polygon(1e3 * outline.flattened(1e-8)) for outline in outlines])
        arcs = 1e3 * sum(edge.length for outline in outlines for edge in outline.edges if edge.bulge)
        whole = 1e3 * sum(outline.perimeter for outline in outlines)
        assert shape.symmetric_difference(fine).area <= 2.01e-3 * arcs + 1e-6 * whole


@pytest.mark.parametrize("writer", WRITERS)
def test_drills_are_circles_of_finished_diameter(
    two_level: Layout, tmp_path: Path, writer: Callable[[Layout, Path], None]
) -> None:
    circles = document(two_level, tmp_path, writer).modelspace().query("CIRCLE")
    found = {(c.dxf.layer, round(c.dxf.center.x, 6), round(c.dxf.center.y, 6), 2.0 * c.dxf.radius) for c in circles}
    assert found == {
        ("DRILL_PLATED", -25.0, 45.0, 0.3),
        ("DRILL_UNPLATED", 30.0, 20.0, 3.2),
        ("DRILL_UNPLATED", -30.0, -25.0, 2.5),
    }


@pytest.mark.parametrize(("board", "bar"), [("two_level", 100.0), ("one_level", 10.0)])
def test_scale_bar_and_square_outside_the_board(
    board: str, bar: float, tmp_path: Path, request: pytest.FixtureRequest
) -> None:
    layout: Layout = request.getfixturevalue(board)
    doc = document(layout, tmp_path)
    sizes = [np.ptp(rows[:, :2], axis=0) for rows in polylines(doc, "DIMENSIONS")]
    assert sizes[0][0] == pytest.approx(bar, abs=1e-9)
    assert sizes[1] == pytest.approx([10.0, 10.0], abs=1e-9)
    lowest = 1e3 * min(layout.edge.bounds[1], layout.copper_bounds[1])
    assert all(rows[:, 1].max() < lowest for rows in polylines(doc, "DIMENSIONS"))
    texts = [text.dxf.text for text in doc.modelspace().query("TEXT")]
    assert texts == [f"{bar:.0f} mm", "10 mm"]


def test_reader_returns_what_was_drawn(layout: Layout, tmp_path: Path) -> None:
    path = tmp_path / "board.dxf"
    write_dxf(layout, path)
    read, drawn = read_dxf(path), file_content(layout)
    assert read.faults == ()
    for layer, outlines in drawn.outlines.items():
        for got, expected in zip(read.outlines.get(layer, ()), outlines, strict=True):
            assert isinstance(got, Outline)
            assert np.allclose(got.vertices, expected.vertices, rtol=0.0, atol=1e-15)
    assert sum(map(len, read.drills.values())) == len(layout.holes)


def test_small_coordinates_and_bulges_survive_without_exponent(two_level: Layout, tmp_path: Path) -> None:
    """1 nm is 1e-06 mm and a flat arc has a bulge of 1e-5: both would be printed with an exponent."""
    flat = Outline(np.array([(1e-9, 0.0, 0.0), (0.02, 0.0, 1e-5), (0.02, 0.01, 0.0), (0.0, 0.01, -2e-5)]))
    path = tmp_path / "board.dxf"
    write_dxf(replace(two_level, keepout=(flat,)), path)
    assert "e-0" not in path.read_text(encoding="ascii")
    (rows,) = polylines(ezdxf.readfile(path), "KEEPOUT")
    assert rows[0, 0] == 1e-6
    assert rows[:, 2].tolist() == [0.0, 1e-5, 0.0, -2e-5]

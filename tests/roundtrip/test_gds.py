"""GDS written, read again with gdstk alone and, for its header, byte by byte.

Authority: the stream format (records of length, type, content; UNITS holds the database unit in user units
and in metres as base-16 floating point numbers) and the chord error stated with the writer.
"""

from __future__ import annotations

import struct
from dataclasses import replace
from pathlib import Path

import gdstk
import numpy as np
import pytest
from shapely.geometry import Point, Polygon
from shapely.ops import unary_union

from planar.copper.layout import Island, Layout, Level, Role
from planar.copper.outline import Outline
from planar.errors import HandoffError
from planar.handoff import LAYERS, file_content, read_gds, write_gds
from planar.handoff.gds import cell_name

HOLDS_DRILLS = ("DRILL_PLATED", "DRILL_UNPLATED")


@pytest.fixture
def cell(layout: Layout, tmp_path: Path) -> gdstk.Cell:
    write_gds(layout, tmp_path / "board.gds")
    (only,) = gdstk.read_gds(tmp_path / "board.gds").cells
    return only


def records(data: bytes) -> list[tuple[int, bytes]]:
    """Record type and content of every record."""
    found, at = [], 0
    while at < len(data):
        length, kind = struct.unpack(">HBx", data[at : at + 4])
        found.append((kind, data[at + 4 : at + length]))
        at += length
    return found


def real8(data: bytes) -> float:
    """Excess-64 floating point number of base 16."""
    mantissa = int.from_bytes(data[1:8], "big") / 2.0**56
    return float((-1.0 if data[0] & 128 else 1.0) * mantissa * 16.0 ** ((data[0] & 127) - 64))


def test_same_bytes_twice(layout: Layout, tmp_path: Path) -> None:
    for name in ("one", "two"):
        write_gds(layout, tmp_path / name)
    assert (tmp_path / "one").read_bytes() == (tmp_path / "two").read_bytes()


def test_dates_are_constant(layout: Layout, tmp_path: Path) -> None:
    """BGNLIB and BGNSTR (types 1 and 5) hold two dates each, of six 16-bit numbers, years from 1900."""
    write_gds(layout, tmp_path / "board.gds")
    dates = [content for kind, content in records((tmp_path / "board.gds").read_bytes()) if kind in (1, 5)]
    assert dates == [struct.pack(">6H", 100, 1, 1, 0, 0, 0) * 2] * 2


def test_header_says_one_nanometre(layout: Layout, tmp_path: Path) -> None:
    write_gds(layout, tmp_path / "board.gds")
    units = next(content for kind, content in records((tmp_path / "board.gds").read_bytes()) if kind == 3)
    assert real8(units[:8]) == pytest.approx(1e-3, rel=1e-14)
    assert real8(units[8:]) == pytest.approx(1e-9, rel=1e-14)


def test_every_outline_is_one_unsplit_polygon_within_the_chord_error(cell: gdstk.Cell, layout: Layout) -> None:
    for layer in LAYERS:
        if layer.name in HOLDS_DRILLS:
            continue
        outlines = file_content(layout).outlines[layer.name]
        found = [p for p in cell.polygons if (p.layer, p.datatype) == (layer.gds_layer, layer.gds_datatype)]
        assert len(found) == len(outlines)
        fine = unary_union([Polygon(1e6 * outline.flattened(1e-8)) for outline in outlines])
        shape = unary_union([Polygon(p.points) for p in found])
        arcs = 1e6 * sum(edge.length for outline in outlines for edge in outline.edges if edge.bulge)
        whole = 1e6 * sum(outline.perimeter for outline in outlines)
        assert shape.symmetric_difference(fine).area <= 1.01 * arcs + 1e-3 * whole  # um and um2
        assert all(Polygon(p.points).is_valid for p in found)


def test_drills_are_polygons_round_their_hole(cell: gdstk.Cell, layout: Layout) -> None:
    drills = {layer.name: (layer.gds_layer, layer.gds_datatype) for layer in LAYERS if layer.name in HOLDS_DRILLS}
    for name, numbers in drills.items():
        expected = [hole for hole in layout.holes if hole.plated == (name == "DRILL_PLATED")]
        found = [p for p in cell.polygons if (p.layer, p.datatype) == numbers]
        for polygon, hole in zip(found, expected, strict=True):
            away = np.hypot(*(polygon.points - 1e6 * np.array(hole.centre)).T)
            assert away == pytest.approx(5e5 * hole.diameter, abs=1e-3)  # 1 nm
            sagitta = 5e5 * hole.diameter * (1.0 - np.cos(np.pi / len(away)))
            assert sagitta <= 1.0 + 1e-3


def test_a_label_on_the_copper_of_each_terminal(cell: gdstk.Cell, layout: Layout) -> None:
    numbers = {layer.name: layer.gds_layer for layer in LAYERS}
    named = {label.text: label for label in cell.labels if label.layer != numbers["DIMENSIONS"]}
    assert set(named) == {pad.name for pad in layout.pads}
    for pad in layout.pads:
        label = named[pad.name]
        assert label.layer == numbers[f"COPPER_{pad.level.name}"]
        copper = [Polygon(p.points) for p in cell.polygons if p.layer == label.layer]
        assert any(polygon.contains(Point(label.origin)) for polygon in copper)


def test_reader_returns_what_was_drawn(layout: Layout, tmp_path: Path) -> None:
    write_gds(layout, tmp_path / "board.gds")
    read, drawn = read_gds(tmp_path / "board.gds"), file_content(layout)
    assert read.faults == ()
    assert {layer: len(found) for layer, found in read.outlines.items()} == {
        layer: len(outlines) for layer, outlines in drawn.outlines.items() if outlines
    }
    for layer, drills in drawn.drills.items():
        for got, expected in zip(read.drills.get(layer, ()), drills, strict=True):
            assert got.centre == pytest.approx(expected.centre, abs=1e-9)
            assert got.diameter == pytest.approx(expected.diameter, abs=2e-9)


def test_cell_name_holds_letters_digits_and_underscore_only() -> None:
    assert cell_name("loop/1") == "loop_1"
    assert cell_name("Gänsefeld 868 MHz") == "G_nsefeld_868_MHz"
    assert cell_name("") == "LAYOUT"
    assert len(cell_name("x" * 80)) == 32


def regular_polygon(corners: int, radius: float) -> Outline:
    angles = 2.0 * np.pi * np.arange(corners) / corners
    return Outline.polygon(radius * np.column_stack([np.cos(angles), np.sin(angles)]))


def with_island(layout: Layout, outline: Outline) -> Layout:
    return replace(layout, islands=(Island(Level.TOP, outline, Role.RADIATOR),))


def test_largest_island_is_not_split_and_a_larger_one_refused(one_level: Layout, tmp_path: Path) -> None:
    path = tmp_path / "board.gds"
    write_gds(with_island(one_level, regular_polygon(4094, 0.015)), path)
    (cell,) = gdstk.read_gds(path).cells
    assert [len(p.points) for p in cell.polygons if p.layer == 1] == [4094]
    with pytest.raises(HandoffError, match="COPPER_TOP needs 4095 vertices"):
        write_gds(with_island(one_level, regular_polygon(4095, 0.015)), path)


def test_coordinates_that_would_wrap_round_are_refused(one_level: Layout, tmp_path: Path) -> None:
    with pytest.raises(HandoffError, match=r"2\.150 m"):
        write_gds(with_island(one_level, regular_polygon(4, 2.15)), tmp_path / "board.gds")


def test_a_file_cut_short_while_writing_is_noticed(one_level: Layout, tmp_path: Path) -> None:
    """A limit on the size of files stands for a full disk: writes fail beyond it."""
    resource = pytest.importorskip("resource")
    soft, hard = resource.getrlimit(resource.RLIMIT_FSIZE)
    resource.setrlimit(resource.RLIMIT_FSIZE, (1024, hard))
    try:
        with pytest.raises(HandoffError, match="disk may be full"):
            write_gds(one_level, tmp_path / "board.gds")
    finally:
        resource.setrlimit(resource.RLIMIT_FSIZE, (soft, hard))


def test_a_file_that_is_no_gds_is_refused(tmp_path: Path) -> None:
    path = tmp_path / "board.gds"
    path.write_bytes(b"")
    with pytest.raises(HandoffError, match=r"board\.gds"):
        read_gds(path)

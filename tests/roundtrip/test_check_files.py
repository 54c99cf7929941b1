"""Faults planted in the files one at a time: each must be found, named and placed.

Authority: the list of what users lose when exchange files go wrong (scale, mirrored bottom, lost islands,
arcs flipped, outlines open, drills off their place), common practice of board layout.
"""

from __future__ import annotations

import re
from collections.abc import Callable
from dataclasses import replace
from pathlib import Path

import ezdxf
import gdstk
import numpy as np
import pytest

from planar.copper.layout import Island, Layout, Level
from planar.copper.outline import Outline
from planar.errors import HandoffError
from planar.handoff import check_files, write_layout_files

FILES = ("board.dxf", "board-segments.dxf", "board.gds")


def refusal(layout: Layout, folder: Path) -> str:
    with pytest.raises(HandoffError) as caught:
        check_files(layout, folder)
    return str(caught.value)


def written(layout: Layout, folder: Path) -> Path:
    write_layout_files(layout, folder, status="a test board")
    return folder


def with_copper(layout: Layout, level: Level, change: Callable[[Outline], Outline]) -> Layout:
    islands = tuple(
        replace(island, outline=change(island.outline)) if island.level == level else island
        for island in layout.islands
    )
    return replace(layout, islands=islands)


def scaled(layout: Layout, factor: float) -> Layout:
    def grown(outline: Outline) -> Outline:
        return Outline(outline.vertices * (factor, factor, 1.0))

    return replace(
        with_copper(layout, Level.TOP, grown),
        edge=grown(layout.edge),
        keepout=tuple(grown(outline) for outline in layout.keepout),
    )


def test_what_was_written_agrees(layout: Layout, tmp_path: Path) -> None:
    check_files(layout, written(layout, tmp_path))


def test_mirrored_bottom(two_level: Layout, tmp_path: Path) -> None:
    text = refusal(two_level, written(with_copper(two_level, Level.BOTTOM, Outline.mirrored), tmp_path))
    for name in FILES:
        assert f"{name}: COPPER_BOTTOM: mirrored left to right" in text
    assert "COPPER_TOP" not in text


@pytest.mark.parametrize("lost", [0, 1, 2])
def test_lost_island(two_level: Layout, tmp_path: Path, lost: int) -> None:
    islands = two_level.islands[:lost] + two_level.islands[lost + 1 :]
    text = refusal(two_level, written(replace(two_level, islands=islands), tmp_path))
    layer = f"COPPER_{two_level.islands[lost].level.name}"
    count = len(two_level.copper(two_level.islands[lost].level))
    for name in FILES:
        assert f"{name}: {layer}: {count - 1} outlines, expected {count}" in text


@pytest.mark.parametrize(("factor", "words"), [(25.4, "25.4 times too large"), (1 / 25.4, "25.4 times too small")])
def test_wrong_unit(one_level: Layout, tmp_path: Path, factor: float, words: str) -> None:
    text = refusal(one_level, written(scaled(one_level, factor), tmp_path))
    for name in FILES:
        assert f"{name}: COPPER_TOP: {words}" in text
        assert f"{name}: COPPER_TOP: area" in text
        assert f"{name}: COPPER_TOP: extents" in text


def test_header_in_inches(two_level: Layout, tmp_path: Path) -> None:
    doc = ezdxf.readfile(written(two_level, tmp_path) / "board.dxf")
    doc.header["$INSUNITS"] = 1
    doc.saveas(tmp_path / "board.dxf")
    assert "board.dxf: header: $INSUNITS 1, expected 4" in refusal(two_level, tmp_path)


def test_shifted_drills(two_level: Layout, tmp_path: Path) -> None:
    holes = tuple(replace(h, centre=(h.centre[0] + 1e-4, h.centre[1])) for h in two_level.holes)
    text = refusal(two_level, written(replace(two_level, holes=holes), tmp_path))
    for name in FILES:
        assert f"{name}: DRILL_PLATED: drill at (-24.900000, 45.000000) mm, expected (-25.000000, 45.000000) mm" in text
        assert f"{name}: DRILL_UNPLATED: drill at (30.100000, 20.000000) mm" in text


def test_drill_of_another_size_or_kind_or_missing(two_level: Layout, tmp_path: Path) -> None:
    via, large, small = two_level.holes
    holes = (replace(large, diameter=3.0e-3), replace(small, plated=True))
    text = refusal(two_level, written(replace(two_level, holes=holes), tmp_path))
    for name in FILES:
        assert f"{name}: DRILL_UNPLATED: 1 drills, expected 2" in text
        assert f"{name}: DRILL_UNPLATED: drill at (30.000000, 20.000000) mm of 3.000000 mm" in text
        assert f"{name}: DRILL_PLATED: drill at (-30.000000, -25.000000) mm" in text
    assert via.plated


def test_flipped_arc(two_level: Layout, tmp_path: Path) -> None:
    doc = ezdxf.readfile(written(two_level, tmp_path) / "board.dxf")
    polyline = doc.modelspace().query('LWPOLYLINE[layer=="COPPER_BOTTOM"]')[0]
    rows = polyline.get_points("xyb")
    first = next(i for i, row in enumerate(rows) if row[2])
    rows[first] = (*rows[first][:2], -rows[first][2])
    polyline.set_points(rows, format="xyb")
    doc.saveas(tmp_path / "board.dxf")
    text = refusal(two_level, tmp_path)
    assert "board.dxf: COPPER_BOTTOM: area" in text
    assert "another shape" in text or "crosses itself" in text
    assert "board.gds" not in text


def test_lost_arcs(two_level: Layout, tmp_path: Path) -> None:
    straight = with_copper(two_level, Level.TOP, lambda outline: Outline(outline.vertices * (1.0, 1.0, 0.0)))
    text = refusal(two_level, written(straight, tmp_path))
    for name in FILES:
        assert f"{name}: COPPER_TOP: area" in text


def test_an_arc_a_micrometre_off_is_found_where_arcs_stay_arcs(two_level: Layout, tmp_path: Path) -> None:
    bent = with_copper(two_level, Level.TOP, lambda outline: Outline(outline.vertices * (1.0, 1.0, 1.00001)))
    text = refusal(two_level, written(bent, tmp_path))
    assert "board.dxf: COPPER_TOP: area" in text


def test_open_outline(two_level: Layout, tmp_path: Path) -> None:
    doc = ezdxf.readfile(written(two_level, tmp_path) / "board-segments.dxf")
    doc.modelspace().query('LWPOLYLINE[layer=="COPPER_TOP"]')[0].closed = False
    doc.saveas(tmp_path / "board-segments.dxf")
    text = refusal(two_level, tmp_path)
    assert "board-segments.dxf: COPPER_TOP: an open polyline, expected closed" in text
    assert "board-segments.dxf: COPPER_TOP: 0 outlines, expected 1" in text
    assert "board.dxf" not in text


def test_what_importers_stumble_over(two_level: Layout, tmp_path: Path) -> None:
    doc = ezdxf.readfile(written(two_level, tmp_path) / "board.dxf")
    space = doc.modelspace()
    space.add_spline([(0, 0), (1, 1), (2, 0)], dxfattribs={"layer": "COPPER_TOP"})
    space.add_text("feed", dxfattribs={"layer": "COPPER_TOP"})
    space.query('LWPOLYLINE[layer=="OUTLINE"]')[0].dxf.const_width = 0.1
    space.query('LWPOLYLINE[layer=="KEEPOUT"]')[0].dxf.elevation = 1.6
    space.add_lwpolyline([(0, 0), (1, 0), (1, 1), (0, 0)], close=True, dxfattribs={"layer": "MASK_TOP"})
    space.add_lwpolyline([(0, 0), (1, 0), (1, 1)], close=True, dxfattribs={"layer": "SCRAP"})
    doc.saveas(tmp_path / "board.dxf")
    text = refusal(two_level, tmp_path)
    assert "COPPER_TOP: a SPLINE" in text
    assert "COPPER_TOP: a TEXT" in text
    assert "OUTLINE: a polyline with a width" in text
    assert "KEEPOUT: a polyline off the plane z = 0" in text
    assert "MASK_TOP: a polyline that repeats its first vertex" in text
    assert "SCRAP: outlines on a layer of that name, expected none" in text


def test_split_island_in_gds(two_level: Layout, tmp_path: Path) -> None:
    path = written(two_level, tmp_path) / "board.gds"
    gdstk.read_gds(path).write_gds(path, max_points=100)
    text = refusal(two_level, tmp_path)
    assert "board.gds: COPPER_TOP: " in text
    assert "outlines, expected 1" in text


def test_one_sided_or_missing_keepout(two_level: Layout, tmp_path: Path) -> None:
    text = refusal(two_level, written(replace(two_level, keepout=()), tmp_path))
    for name in FILES:
        assert f"{name}: KEEPOUT: 0 outlines, expected 1" in text


def test_swapped_terminals(two_level: Layout, tmp_path: Path) -> None:
    first, second = two_level.pads
    pads = (replace(first, name=second.name), replace(second, name=first.name))
    text = refusal(two_level, written(replace(two_level, pads=pads), tmp_path))
    assert re.search(r"board\.gds: COPPER_TOP: 'RET' at \(-25\.\d+, 45\.\d+\) mm: label, expected none", text)
    assert re.search(r"board\.gds: COPPER_TOP: 'SIG' at \(-25\.\d+, 45\.\d+\) mm: no such label", text)


def test_truncated_and_missing_files(two_level: Layout, tmp_path: Path) -> None:
    written(two_level, tmp_path)
    data = (tmp_path / "board.dxf").read_bytes()
    (tmp_path / "board.dxf").write_bytes(data[: len(data) // 2])
    data = (tmp_path / "board.gds").read_bytes()
    (tmp_path / "board.gds").write_bytes(data[: len(data) // 2])
    (tmp_path / "board-segments.dxf").unlink()
    (tmp_path / "layers.csv").write_text("layer,number\n", encoding="utf-8")
    text = refusal(two_level, tmp_path)
    for name in (*FILES, "layers.csv"):
        assert name in text


@pytest.mark.parametrize("shift", [5e-9, 1e-6])
def test_extents_of_the_arc_file_to_a_few_nanometres(two_level: Layout, tmp_path: Path, shift: float) -> None:
    moved = with_copper(two_level, Level.TOP, lambda outline: outline.translated(shift, 0.0))
    assert "board.dxf: COPPER_TOP: extents" in refusal(two_level, written(moved, tmp_path))


def test_island_on_the_other_level(two_level: Layout, tmp_path: Path) -> None:
    line = two_level.islands[2]
    islands = (*two_level.islands[:2], Island(Level.BOTTOM, line.outline, line.role))
    text = refusal(two_level, written(replace(two_level, islands=islands), tmp_path))
    assert "COPPER_TOP: 0 outlines, expected 1" in text
    assert "COPPER_BOTTOM: 3 outlines, expected 2" in text


def test_every_mismatch_is_listed_once(two_level: Layout, tmp_path: Path) -> None:
    lines = refusal(two_level, written(with_copper(two_level, Level.BOTTOM, Outline.mirrored), tmp_path)).splitlines()
    assert len(lines) == len(set(lines))
    assert np.all([line.startswith(FILES) for line in lines[1:]])

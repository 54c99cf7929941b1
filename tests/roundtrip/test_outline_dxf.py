"""outline.dxf: the board edge and the unplated holes alone, read back by another reader, and spoilt.

Authority: the layout's own lengths; ezdxf as reader; common practice that everything in such a file is a cut.
"""

from __future__ import annotations

from pathlib import Path

import ezdxf
import pytest

from planar.copper.layout import Layout
from planar.errors import HandoffError
from planar.handoff import check_files, read_dxf, write_layout_files
from planar.handoff.dxf import outline_content, write_outline_dxf


def test_edge_and_unplated_holes_and_nothing_else(layout: Layout, tmp_path: Path) -> None:
    write_outline_dxf(layout, tmp_path / "outline.dxf")
    document = ezdxf.readfile(tmp_path / "outline.dxf")
    assert document.header["$INSUNITS"] == 4  # DXF reference: millimetres
    space = document.modelspace()
    assert {(e.dxftype(), e.dxf.layer) for e in space} <= {("LWPOLYLINE", "OUTLINE"), ("CIRCLE", "DRILL_UNPLATED")}
    (edge,) = space.query("LWPOLYLINE")
    assert edge.closed
    assert any(bulge for *_, bulge in edge.get_points("xyb"))  # corners stay arcs
    holes = {tuple(round(v, 6) for v in (*e.dxf.center.vec2, 2.0 * e.dxf.radius)) for e in space.query("CIRCLE")}
    assert holes == {
        (*(round(1e3 * c, 6) for c in hole.centre), round(1e3 * hole.diameter, 6))
        for hole in layout.holes
        if not hole.plated
    }


def test_edge_is_that_of_the_layout(layout: Layout, tmp_path: Path) -> None:
    write_outline_dxf(layout, tmp_path / "outline.dxf")
    got = read_dxf(tmp_path / "outline.dxf")
    assert got.faults == got.labels == ()
    (edge,) = got.outlines["OUTLINE"]
    assert edge.area == pytest.approx(layout.edge.area, rel=1e-12)
    assert edge.bounds == pytest.approx(layout.edge.bounds, abs=1e-12)
    assert not any(found for name, found in outline_content(layout).outlines.items() if name != "OUTLINE")


def test_same_bytes_twice(two_level: Layout, tmp_path: Path) -> None:
    for name in ("one.dxf", "two.dxf"):
        write_outline_dxf(two_level, tmp_path / name)
    assert (tmp_path / "one.dxf").read_bytes() == (tmp_path / "two.dxf").read_bytes()


def without_corners(document: ezdxf.document.Drawing) -> None:
    (edge,) = document.modelspace().query("LWPOLYLINE")
    edge.set_points([(x, y) for x, y, _ in edge.get_points("xyb")], format="xy")


def with_copper(document: ezdxf.document.Drawing) -> None:
    rows = [(0.0, 0.0), (1.0, 0.0), (1.0, 1.0)]
    document.modelspace().add_lwpolyline(rows, close=True, dxfattribs={"layer": "COPPER_TOP"})


def with_a_hole_lost(document: ezdxf.document.Drawing) -> None:
    space = document.modelspace()
    space.delete_entity(space.query("CIRCLE")[0])


@pytest.mark.parametrize(
    ("planted", "words"),
    [
        (without_corners, "outline.dxf: OUTLINE: area"),
        (with_copper, "outline.dxf: COPPER_TOP: 1 outlines, expected 0"),
        (with_a_hole_lost, "outline.dxf: DRILL_UNPLATED: 1 drills, expected 2"),
    ],
)
def test_fault_in_the_file(planted: object, words: str, two_level: Layout, tmp_path: Path) -> None:
    assert callable(planted)
    write_layout_files(two_level, tmp_path, status="a test board")
    document = ezdxf.readfile(tmp_path / "outline.dxf")
    planted(document)
    document.saveas(tmp_path / "outline.dxf")
    with pytest.raises(HandoffError) as caught:
        check_files(two_level, tmp_path)
    assert words in str(caught.value)

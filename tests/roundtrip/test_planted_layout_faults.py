"""One complete pack, and one fault at a time planted in what the layout engineer imports, in archive and manifest.

Files are changed by means that know nothing of this program: ezdxf, gdstk, zipfile, text edits. Authority: the list of
what users lose when such files go wrong, common practice of board layout.
"""

from __future__ import annotations

import math
import re
import zipfile
from collections.abc import Callable
from pathlib import Path

import ezdxf
import gdstk
import pytest
from ezdxf.entities.lwpolyline import LWPolyline

from planar.errors import HandoffError

Change = Callable[[Path], None]
ZIP = "two-level-fabrication.zip"


def text(file: str, change: Callable[[str], str]) -> Change:
    def planted(pack: Path) -> None:
        path = pack / "layout" / file
        before = path.read_text(encoding="utf-8")
        assert change(before) != before
        path.write_text(change(before), encoding="utf-8")

    return planted


def dxf(change: Callable[[ezdxf.document.Drawing], None], file: str = "board.dxf") -> Change:
    def planted(pack: Path) -> None:
        document = ezdxf.readfile(pack / "layout" / file)
        change(document)
        document.saveas(pack / "layout" / file)

    return planted


def gds(change: Callable[[gdstk.Cell], None]) -> Change:
    def planted(pack: Path) -> None:
        path = pack / "layout" / "board.gds"
        library = gdstk.read_gds(path)
        change(library.cells[0])
        library.write_gds(path, max_points=4094)

    return planted


def polyline(document: ezdxf.document.Drawing, layer: str) -> LWPolyline:
    found: LWPolyline = document.modelspace().query(f'LWPOLYLINE[layer=="{layer}"]')[0]
    return found


def bulge_of_the_complement(document: ezdxf.document.Drawing) -> None:
    """The other part of the same circle, over 180 degrees: tan((2 pi - a) / 4) = 1 / tan(a / 4), turned round."""
    outline = polyline(document, "COPPER_BOTTOM")
    rows = outline.get_points("xyb")
    first = next(i for i, row in enumerate(rows) if row[2])
    rows[first] = (*rows[first][:2], -1.0 / rows[first][2])
    assert abs(4.0 * math.atan(rows[first][2])) > math.pi
    outline.set_points(rows, format="xyb")


def keepout_on_one_level(document: ezdxf.document.Drawing) -> None:
    document.layers.add("KEEPOUT_TOP")
    polyline(document, "KEEPOUT").dxf.layer = "KEEPOUT_TOP"


def mirrored_bottom(cell: gdstk.Cell) -> None:
    for polygon in cell.polygons:
        if polygon.layer == 2:
            polygon.mirror((0.0, 0.0), (0.0, 1.0))


def removed(number: int) -> Callable[[gdstk.Cell], None]:
    return lambda cell: cell.remove(next(polygon for polygon in cell.polygons if polygon.layer == number))


def grown(cell: gdstk.Cell) -> None:
    for polygon in cell.polygons:
        polygon.scale(25.4)


def drills_moved(cell: gdstk.Cell) -> None:
    for polygon in cell.polygons:
        if polygon.layer == 41:
            polygon.translate(100.0, 0.0)


def stale_board(pack: Path) -> None:
    (pack / "layout" / "board (1).dxf").write_bytes((pack / "layout" / "board.dxf").read_bytes())


LAYOUT_FAULTS: list[tuple[str, Change, str]] = [
    (
        "arc over 180 degrees",
        dxf(bulge_of_the_complement),
        r"board\.dxf: COPPER_BOTTOM: (area|an outline that crosses)",
    ),
    (
        "keepout on one level only",
        dxf(keepout_on_one_level),
        r"board\.dxf: KEEPOUT_TOP: outlines on a layer of that name[\s\S]*board\.dxf: KEEPOUT: 0 outlines, expected 1",
    ),
    ("keepout missing", gds(removed(51)), r"board\.gds: KEEPOUT: 0 outlines, expected 1"),
    ("mirror one level", gds(mirrored_bottom), r"board\.gds: COPPER_BOTTOM: mirrored left to right"),
    ("drop an island", gds(removed(2)), r"board\.gds: COPPER_BOTTOM: 1 outlines, expected 2"),
    ("scale by 25.4", gds(grown), r"board\.gds: COPPER_TOP: 25\.4 times too large"),
    ("drills off by 0.1 mm", gds(drills_moved), r"board\.gds: DRILL_PLATED: drill at \(-24\.9"),
    (
        "open an outline",
        dxf(lambda document: setattr(polyline(document, "OUTLINE"), "closed", False), "board-segments.dxf"),
        r"board-segments\.dxf: OUTLINE: an open polyline",
    ),
    (
        "holes on the layer of the others",
        dxf(lambda d: [setattr(c.dxf, "layer", "DRILL_PLATED") for c in d.modelspace().query("CIRCLE")] and None),
        r"board\.dxf: DRILL_UNPLATED: 0 drills, expected 2",
    ),
    (
        "layer map of another file",
        text("layers.csv", lambda t: t.replace("KEEPOUT,51", "KEEPOUT,53")),
        r"layers\.csv: other layers",
    ),
    ("scale bar of another length", gds(removed(61)), r"board\.gds: DIMENSIONS: 1 outlines, expected 2"),
    (
        "picture of another board",
        text("preview-top.svg", lambda t: t.replace('class="copper" fill="#b5622b"', 'class="copper" fill="none"')),
        r"preview-top\.svg: .*fill=\"none\"",
    ),
    (
        "page of another board",
        text("README.txt", lambda t: t.replace("125.000", "126.000")),
        r"README\.txt: .*126\.000.*expected.*125\.000",
    ),
    (
        "picture missing",
        lambda pack: (pack / "layout" / "preview-bottom.svg").unlink(),
        r"preview-bottom\.svg cannot be",
    ),
    (
        "stale file",
        stale_board,
        r"board \(1\)\.dxf: does not belong here",
    ),
]


@pytest.mark.parametrize(("planted", "words"), [pytest.param(*fault[1:], id=fault[0]) for fault in LAYOUT_FAULTS])
def test_fault_in_the_layout_files(planted: Change, words: str, pack: Path, checks: dict[str, Change]) -> None:
    planted(pack)
    with pytest.raises(HandoffError) as caught:
        checks["layout"](pack)
    assert re.search(words, str(caught.value)), str(caught.value)


# faults in archive and manifest


def zip_without(name: str) -> Change:
    def planted(pack: Path) -> None:
        with zipfile.ZipFile(pack / ZIP) as archive:
            held = {entry: archive.read(entry) for entry in archive.namelist() if entry != name}
        with zipfile.ZipFile(pack / ZIP, "w") as archive:
            for entry, content in held.items():
                archive.writestr(entry, content)

    return planted


def zip_with_old_file(pack: Path) -> None:
    zip_without("copper-top.gbr")(pack)
    with zipfile.ZipFile(pack / ZIP, "a") as archive:
        archive.writestr("copper-top.gbr", (pack / "fabrication" / "copper-bottom.gbr").read_bytes())


def zip_with_stale_file(pack: Path) -> None:
    with zipfile.ZipFile(pack / ZIP, "a") as archive:
        archive.writestr("copper-inner.gbr", b"")


@pytest.mark.parametrize(
    ("planted", "words"),
    [
        pytest.param(zip_without("mask-top.gbr"), "lacks mask-top.gbr", id="missing"),
        pytest.param(zip_with_old_file, "holds another copper-top.gbr", id="old"),
        pytest.param(zip_with_stale_file, "holds copper-inner.gbr, which is not there", id="stale"),
    ],
)
def test_archive_that_is_not_the_folder(planted: Change, words: str, pack: Path, checks: dict[str, Change]) -> None:
    planted(pack)
    with pytest.raises(HandoffError, match=re.escape(f"{ZIP} does not hold the files of fabrication: {words}") + "$"):
        checks["zip"](pack)


@pytest.mark.filterwarnings("ignore:Duplicate name")
def test_archive_with_a_file_twice_or_cut_off(pack: Path, checks: dict[str, Change]) -> None:
    with zipfile.ZipFile(pack / ZIP, "a") as archive:
        archive.writestr("mask-top.gbr", (pack / "fabrication" / "mask-top.gbr").read_bytes())
    with pytest.raises(HandoffError, match=r"holds mask-top\.gbr 2 times"):
        checks["zip"](pack)
    (pack / ZIP).write_bytes((pack / ZIP).read_bytes()[:1000])
    with pytest.raises(HandoffError, match="cannot be read as an archive"):
        checks["zip"](pack)


@pytest.mark.parametrize("name", ["fabrication/old-mask.gbr", "fabrication/drill-old.xnc", "layout/board (1).dxf"])
def test_file_the_manifest_does_not_list(name: str, pack: Path, checks: dict[str, Change]) -> None:
    (pack / name).write_bytes(b"of last week")
    with pytest.raises(HandoffError, match=re.escape(name)):
        checks["destination"](pack)
    with pytest.raises(HandoffError, match=re.escape(f"{name}: there, but not listed")):
        checks["manifest"](pack)


def test_file_changed_or_lost_since_the_manifest(pack: Path, checks: dict[str, Change]) -> None:
    path = pack / "fabrication" / "drill-plated.xnc"
    path.write_text(path.read_text(encoding="ascii").replace("X-25.000", "X-24.900"), encoding="ascii")
    with pytest.raises(HandoffError, match=r"changed since.*drill-plated\.xnc"):
        checks["destination"](pack)
    (pack / "layout" / "board.gds").unlink()
    with pytest.raises(HandoffError) as caught:
        checks["manifest"](pack)
    assert caught.value.args[0].splitlines()[1:] == [
        "layout/board.gds: listed, but not there",
        "fabrication/drill-plated.xnc: changed since it was listed",
    ]

"""Files of panels spoilt one fault at a time, by text edits and by libraries that know nothing of this program.

Authority: the list of what users lose when such files go wrong, common practice of board fabrication.
"""

from __future__ import annotations

import hashlib
import re
from collections.abc import Callable
from dataclasses import replace
from pathlib import Path
from typing import Any

import ezdxf
import gdstk
import pytest

from planar.copper.layout import Score
from planar.errors import HandoffError
from planar.handoff import (
    check_layout_files,
    write_fabrication_files,
    write_layout_files,
)

Job = Any


# faults planted one at a time


def signed(text: str) -> str:
    """`text` with its signature put right: over all characters before it but the line ends."""
    body = text[: text.rindex("%TF.MD5")]
    return f"{body}%TF.MD5,{hashlib.md5(body.replace(chr(10), '').encode()).hexdigest()}*%\nM02*\n"


def in_text(name: str, change: Callable[[str], str]) -> Callable[[Path], None]:
    def plant(folder: Path) -> None:
        path = folder / "fabrication" / name
        text = path.read_text(encoding="ascii")
        other = change(text)
        assert other != text
        path.write_text(signed(other) if path.suffix == ".gbr" else other, encoding="ascii")

    return plant


def one_fiducial_less(text: str) -> str:
    return text.replace("X11000000Y5000000D03*\n", "")


def last_line_less(text: str) -> str:
    """What is drawn from the last move on."""
    return text[: text.rindex("X", 0, text.rindex("D02*"))] + text[text.rindex("%TF.MD5") :]


def plated_too(folder: Path) -> None:
    """The tool of the perforations in the file of plated holes."""
    unplated, plated = (folder / "fabrication" / f"drill-{name}.xnc" for name in ("unplated", "plated"))
    text = unplated.read_text(encoding="ascii")
    hits = text[text.index("\nT1\n") + 4 : text.index("\nT2\n")]
    other = plated.read_text(encoding="ascii")
    other = other.replace("%\n", "; #@! TA.AperFunction,MechanicalDrill,Breakout\nT2C0.500\n; #@! TD\n%\n")
    plated.write_text(other.replace("M30", f"T2\n{hits}\nM30"), encoding="ascii")
    rest = text.replace(f"T1\n{hits}\n", "").replace("; #@! TA.AperFunction,MechanicalDrill,Breakout\nT1C0.500\n", "")
    unplated.write_text(rest.replace("; #@! TD\n", "", 1), encoding="ascii")


def swapped(name: str, here: str, other: str) -> Callable[[Path], None]:
    return in_text(name, lambda text: text.replace(here, other))


def with_a_net(text: str) -> str:
    return text.replace("NonConductor*%\n", "NonConductor*%\n%TO.N,ANT*%\n", 1)


def pins_of_one_part(text: str) -> str:
    return re.sub(r"^(327.{17})ANT2", r"\1ANT1", text, flags=re.MULTILINE)


def on_the_page(name: str, here: str, other: str) -> Callable[[Path], None]:
    def plant(folder: Path) -> None:
        text = (folder / name).read_text(encoding="utf-8")
        assert here in text
        (folder / name).write_text(text.replace(here, other), encoding="utf-8")

    return plant


FAULTS: dict[str, tuple[str, Callable[[Path], None], str]] = {
    "score line moved by 0.1 mm": (
        "scored",
        swapped("score.gbr", "X47000000Y", "X47100000Y"),
        "gbr: line from (47.000",
    ),
    "score line lost": ("scored", in_text("score.gbr", last_line_less), "score.gbr: 4 straight lines, expected 5"),
    "score line one-sided": ("scored", swapped("score.gbr", "Vcut", "Vcut,Top"), "Vcut,Top, expected Vcut"),
    "no file of the scores": (
        "scored",
        lambda folder: (folder / "fabrication" / "score.gbr").unlink(),
        "score.gbr cannot be read",
    ),
    "score moved in the drawing": ("scored", swapped("array.gbr", "Y47000000D", "Y46900000D"), "array.gbr: line from"),
    "fiducial missing": ("tabbed", in_text("copper-bottom.gbr", one_fiducial_less), "Panel, net none: no such flash"),
    "fiducial of a board": ("tabbed", swapped("copper-top.gbr", "FiducialPad,Panel", "FiducialPad,Global"), "no such"),
    "mark with a net": ("tabbed", in_text("copper-top.gbr", with_a_net), "net ANT, expected none"),
    "cutout missing": ("tabbed", in_text("profile.gbr", last_line_less), "2 closed lines, expected 3"),
    "cutout moved by 0.1 mm": ("tabbed", swapped("profile.gbr", "X135000000Y", "X134900000Y"), "profile.gbr: outline"),
    "board moved in the drawing": ("scored", swapped("array.gbr", "X86000000Y", "X85900000Y"), "array.gbr: outline at"),
    "perforation plated": ("tabbed", plated_too, "drill-plated.xnc: 12 holes, expected 2"),
    "tooling hole as a mere hole": (
        "tabbed",
        swapped("drill-unplated.xnc", "MechanicalDrill,Tooling", "MechanicalDrill,Breakout"),
        "is MechanicalDrill,Breakout, expected MechanicalDrill,Tooling",
    ),
    "single instead of array": (
        "tabbed",
        swapped("copper-top.gbr", ".Part,Array", ".Part,Single"),
        ".Part Single, expected Array",
    ),
    "single instead of array in the holes": (
        "scored",
        swapped("drill-unplated.xnc", ".Part,Array", ".Part,Single"),
        ".Part Single, expected Array",
    ),
    "copies of one name": (
        "tabbed",
        swapped("copper-bottom.gbr", "TO.C,ANT2", "TO.C,ANT1"),
        "component ANT1, expected ANT2",
    ),
    "pins of one part": ("tabbed", in_text("netlist.ipc", pins_of_one_part), "land ANT2-1 at"),
    "net of the other copy": ("tabbed", swapped("netlist.ipc", "327SIGNAL_B1", "327SIGNAL_A1"), "net SIGNAL_A1, exp"),
    "fewer boards on the operator's page": (
        "tabbed",
        on_the_page("fabrication/README-cam.txt", "2 x 1 = 2 boards", "1 x 1 = 1 boards"),
        "README-cam.txt: ",
    ),
    "drawing of the other panel": (
        "tabbed",
        lambda folder: (folder / "fabrication" / "drawing.pdf").write_bytes(b"%PDF-1.4") and None,
        "drawing.pdf: ",
    ),
    "score file of a panel with tabs": (
        "tabbed",
        lambda folder: (folder / "fabrication" / "score.gbr").write_bytes(b"M02*") and None,
        "score.gbr: does not belong here",
    ),
    "coordinates of another set": (
        "scored",
        in_text("drill-unplated.xnc", lambda text: re.sub(r"(SameCoordinates,).{8}", r"\g<1>00000000", text)),
        ".SameCoordinates 00000000",
    ),
}


@pytest.mark.parametrize("fault", FAULTS)
def test_planted_fault_is_reported(fault: str, jobs: dict[str, Job], tmp_path: Path) -> None:
    name, plant, words = FAULTS[fault]
    job = jobs[name]
    folder = tmp_path / "fabrication"
    folder.mkdir()
    write_fabrication_files(job.layout, job.sheet, folder, facts=job.facts)
    plant(tmp_path)
    assert words in job.refusal(tmp_path)


def test_faults_in_exchange_files(jobs: dict[str, Job], tmp_path: Path) -> None:
    """Written from a layout with a fault, compared with the right one: each of the three files shows it."""
    for name, change, words in (
        ("tabbed", {"cutouts": jobs["tabbed"].layout.cutouts[:1]}, "OUTLINE: 2 outlines, expected 3"),
        (
            "tabbed",
            {"cutouts": tuple(c.translated(0.0, 1e-4) for c in jobs["tabbed"].layout.cutouts)},
            "OUTLINE: outline at (135.000000, 10.500000)",
        ),
        (
            "scored",
            {"scores": (Score((7.1e-3, 0.0), (7.1e-3, 54e-3)), *jobs["scored"].layout.scores[1:])},
            "SCORE: another shape",
        ),
    ):
        job = jobs[name]
        folder = tmp_path / words[:12] / "layout"
        folder.mkdir(parents=True, exist_ok=True)
        write_layout_files(replace(job.layout, **change), folder, status="a test")
        text = job.layout_refusal(folder.parent)
        for file in ("board.dxf", "board-segments.dxf", "board.gds"):
            assert f"{file}: {words}" in text


def dxf_layer_moved(layer: str, dx: float) -> Callable[[Path], None]:
    """The first polyline of a layer of board.dxf moved by `dx` mm."""

    def plant(folder: Path) -> None:
        path = folder / "layout" / "board.dxf"
        document = ezdxf.readfile(path)
        document.modelspace().query(f'LWPOLYLINE[layer=="{layer}"]')[0].translate(dx, 0.0, 0.0)
        document.saveas(path)

    return plant


def gds_polygon_lost(number: int, index: int) -> Callable[[Path], None]:
    """A polygon of a layer of board.gds gone."""

    def plant(folder: Path) -> None:
        path = folder / "layout" / "board.gds"
        library = gdstk.read_gds(path)
        cell = library.cells[0]
        cell.remove([polygon for polygon in cell.polygons if polygon.layer == number][index])
        library.write_gds(path, max_points=4094)

    return plant


def gds_letters_swapped(folder: Path) -> None:
    """Two strokes of the legend 2 um to the side: number and area are as before, and all arcs might differ by more."""
    path = folder / "layout" / "board.gds"
    library = gdstk.read_gds(path)
    strokes = [polygon for polygon in library.cells[0].polygons if polygon.layer == 21]
    strokes[3].translate(2.0, 0.0)
    strokes[-1].translate(-2.0, 0.0)
    library.write_gds(path, max_points=4094)


LAYOUT_FAULTS: dict[str, tuple[str, Callable[[Path], None], str]] = {
    "net tie of a board moved": ("scored", dxf_layer_moved("NET_TIE", 0.1), "board.dxf: NET_TIE: extents"),
    "net tie of the last board lost": (
        "scored",
        gds_polygon_lost(52, -1),
        "board.gds: NET_TIE: 1 outlines, expected 2",
    ),
    "board of the panel lost": ("tabbed", gds_polygon_lost(1, 1), "board.gds: COPPER_TOP: "),
    "letters moved by 2 um": ("tabbed", gds_letters_swapped, "board.gds: LEGEND_TOP: outline at"),
    "page of one board": (
        "tabbed",
        on_the_page("layout/README.txt", "copies of one board", "copies of two boards"),
        "README.txt: '2 copies of two boards",
    ),
    "picture without its cutouts": (
        "tabbed",
        on_the_page("layout/preview-top.svg", '<g class="cutouts"', '<g class="hidden"'),
        "preview-top.svg: ",
    ),
    "page for a builder": (
        "scored",
        lambda folder: (folder / "layout" / "README-build.txt").write_text("solder") and None,
        "README-build.txt: does not belong here",
    ),
}


@pytest.mark.parametrize("fault", LAYOUT_FAULTS)
def test_planted_fault_in_the_layout_folder_is_reported(fault: str, jobs: dict[str, Job], tmp_path: Path) -> None:
    name, plant, words = LAYOUT_FAULTS[fault]
    job = jobs[name]
    (tmp_path / "layout").mkdir()
    write_layout_files(job.layout, tmp_path / "layout", status="a test")
    plant(tmp_path)
    with pytest.raises(HandoffError) as caught:
        check_layout_files(job.layout, tmp_path / "layout", status="a test")
    assert words in str(caught.value)

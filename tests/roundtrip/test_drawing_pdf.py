"""The fabrication drawing, read back through another PDF reader: size on paper, curves, texts, refusals.

Authority: ISO 216 (A4), ISO 5455 (scales), PDF's unit of 1/72 inch, the layout's own lengths, and the list of what
every fabrication sheet must answer (common practice). The reader is pypdfium2, which knows nothing of this program.
"""

from __future__ import annotations

import ctypes
import math
import re
from collections.abc import Iterator
from dataclasses import replace
from pathlib import Path

import numpy as np
import pypdfium2
import pypdfium2.raw as pdfium
import pytest
from numpy.typing import NDArray

from planar.copper.arc import Edge
from planar.copper.layout import Layout, Level, bounds_of
from planar.copper.outline import Outline
from planar.copper.shapes import rounded_rectangle
from planar.errors import HandoffError
from planar.handoff.drawing_holes import drill_rows
from planar.handoff.drawing_pdf import write_drawing
from planar.handoff.drawing_pens import COPPER
from planar.handoff.fab_notes import fab_notes
from planar.handoff.paper import arc_curves
from tests.roundtrip.pdf_paths import filled_with
from tests.roundtrip.sheets import HASH, LINES, facts_for, sheet_for

MM_PER_POINT = 25.4 / 72.0


@pytest.fixture(params=["two_level", "one_level", "drawn"])
def board(request: pytest.FixtureRequest) -> Layout:
    layout: Layout = request.getfixturevalue(request.param)
    return layout


def drawing(board: Layout, folder: Path) -> pypdfium2.PdfDocument:
    path = folder / "drawing.pdf"
    write_drawing(board, sheet_for(board), path, facts=facts_for(board.name))
    return pypdfium2.PdfDocument(path)


def text_of(document: pypdfium2.PdfDocument) -> str:
    """All text, line breaks as blanks: a wrapped sentence is one sentence."""
    pages = [page.get_textpage().get_text_bounded() for page in document]
    return re.sub(r"\s+", " ", " ".join(pages))


def filled_paths(page: pypdfium2.PdfPage, colour: str) -> Iterator[list[tuple[int, float, float]]]:
    """Segments (type, x mm, y mm) of every path filled with `colour`."""
    for item in filled_with(page, colour):
        rows = []
        for i in range(pdfium.FPDFPath_CountSegments(item)):
            segment = pdfium.FPDFPath_GetPathSegment(item, i)
            x, y = ctypes.c_float(), ctypes.c_float()
            pdfium.FPDFPathSegment_GetPoint(segment, x, y)
            kind = pdfium.FPDFPathSegment_GetType(segment)
            rows.append((kind, MM_PER_POINT * x.value, MM_PER_POINT * y.value))
        yield rows


def copper_paths(page: pypdfium2.PdfPage, board: Layout, level: Level, steps: int = 200) -> list[NDArray[np.float64]]:
    """Points (mm) along the islands of `level`, in the layout's order; the key's swatch comes after them."""
    paths = list(filled_paths(page, COPPER[level]))
    assert len(paths) == len(board.copper(level)) + 1
    return [walked(rows, steps) for rows in paths[:-1]]


def walked(rows: list[tuple[int, float, float]], steps: int) -> NDArray[np.float64]:
    """Points (n, 2) in mm along a path, its curves by de Casteljau's polynomial."""
    points: list[tuple[float, float]] = []
    pending: list[tuple[float, float]] = []
    for kind, x, y in rows:
        if kind != pdfium.FPDF_SEGMENT_BEZIERTO:
            points.append((x, y))
            continue
        pending.append((x, y))
        if len(pending) == 3:
            a, (b, c, d) = np.array(points[-1]), (np.array(p) for p in pending)
            for t in np.linspace(0.0, 1.0, steps + 1)[1:]:
                s = 1.0 - t
                points.append(tuple(s**3 * a + 3 * s * s * t * b + 3 * s * t * t * c + t**3 * d))
            pending = []
    return np.array(points)


def test_same_bytes_twice_and_nothing_of_the_clock(board: Layout, tmp_path: Path) -> None:
    for name in ("one.pdf", "two.pdf"):
        write_drawing(board, sheet_for(board), tmp_path / name, facts=facts_for(board.name))
    data = (tmp_path / "one.pdf").read_bytes()
    assert data == (tmp_path / "two.pdf").read_bytes()
    assert set(re.findall(rb"\(D:(\d{4})", data)) <= {b"2000"}


def test_pages_are_a4_one_for_each_level_and_one_of_tables(board: Layout, tmp_path: Path) -> None:
    document = drawing(board, tmp_path)
    assert len(document) == len(board.levels) + 1
    for page in document:
        assert sorted(MM_PER_POINT * side for side in page.get_size()) == pytest.approx([210.0, 297.0], abs=0.01)
        text = page.get_textpage().get_text_bounded()
        assert board.name in text
        assert HASH in re.sub(r"\s", "", text)
        assert re.search(rf"[1-9] of {len(document)}", text)


def scale_of(page: pypdfium2.PdfPage) -> float:
    """Scale as the title block states it, larger than 1 for an enlargement."""
    (enlarged, reduced), *others = re.findall(r"\b(\d+):(\d+)\b", page.get_textpage().get_text_bounded())
    assert not others
    return int(enlarged) / int(reduced)


def test_copper_has_the_stated_size_on_paper(board: Layout, tmp_path: Path) -> None:
    """Extents on paper are those of the board within 1 um of the board, what curves may stray. Boards of 125 by 110 and
    118 by 121 mm fit A4 at true size and not at twice it, one of 40 by 40 mm at twice it and not at five times."""
    document = drawing(board, tmp_path)
    for page, level in zip(document, board.levels, strict=False):
        scale = scale_of(page)
        assert scale == (2.0 if max(board.size) < 0.05 else 1.0)
        points = np.vstack(copper_paths(page, board, level))
        x0, y0, x1, y1 = bounds_of(board.copper(level))
        extents = [1e3 * scale * (x1 - x0), 1e3 * scale * (y1 - y0)]
        assert np.ptp(points, axis=0) == pytest.approx(extents, abs=1e-3 * scale)


def test_small_board_is_enlarged_five_times(one_level: Layout, tmp_path: Path) -> None:
    """Everything of the loop of 33 mm shrunk to a fifth, so that 5:1 draws it as large as the loop itself."""

    def small(outline: Outline) -> Outline:
        return Outline(outline.vertices * (0.2, 0.2, 1.0))

    layout = replace(
        one_level,
        islands=tuple(replace(island, outline=small(island.outline)) for island in one_level.islands),
        pads=tuple(replace(pad, outline=small(pad.outline)) for pad in one_level.pads),
        mask_openings=(),
        edge=small(one_level.edge),
        keepout=(),
    ).snapped()
    page = drawing(layout, tmp_path)[0]
    assert scale_of(page) == 5.0
    x0, y0, x1, y1 = bounds_of(one_level.copper(Level.TOP))
    points = np.vstack(copper_paths(page, layout, Level.TOP))
    assert np.ptp(points, axis=0) == pytest.approx([1e3 * (x1 - x0), 1e3 * (y1 - y0)], abs=5e-3)
    assert "10 mm = 50 mm on paper" in page.get_textpage().get_text_bounded()


def test_pixels_measure_the_same(two_level: Layout, tmp_path: Path) -> None:
    """At 10 pixels to the millimetre the bottom copper's coloured extents are right to a pixel on each side."""
    page = drawing(two_level, tmp_path)[1]
    picture = np.asarray(page.render(scale=10.0 * MM_PER_POINT).to_pil().convert("RGB"), dtype=int)
    colour = [int(COPPER[Level.BOTTOM][i : i + 2], 16) for i in (1, 3, 5)]
    rows, columns = np.nonzero(np.all(np.abs(picture - colour) < 12, axis=2))
    figure = rows < rows.max() - 200  # without the key, which stands below
    x0, y0, x1, y1 = bounds_of(two_level.copper(Level.BOTTOM))
    assert np.ptp(columns[figure]) / 10.0 == pytest.approx(1e3 * (x1 - x0), abs=0.3)
    assert np.ptp(rows[figure]) / 10.0 == pytest.approx(1e3 * (y1 - y0), abs=0.3)


def test_curves_stay_within_a_micrometre_of_the_arcs(board: Layout, tmp_path: Path) -> None:
    """Every point of every copper path lies on the outline, found again by its origin on paper."""
    document = drawing(board, tmp_path)
    for page, level in zip(document, board.levels, strict=False):
        for points, outline in zip(copper_paths(page, board, level, 8), board.copper(level), strict=True):
            first = np.array(outline.edges[0].start)
            metres = 1e-3 * (points - points[0]) / scale_of(page) + first
            assert max(distance_to(outline, tuple(p)) for p in metres) < 1e-6


def distance_to(outline: Outline, point: tuple[float, float]) -> float:
    """Distance (m) of `point` to the nearest edge, arcs as arcs."""
    return min(edge_distance(edge, point) for edge in outline.edges)


def edge_distance(edge: Edge, point: tuple[float, float]) -> float:
    fraction = min(1.0, max(0.0, edge.fraction_of(point)))
    return math.dist(edge.point(fraction), point)


@pytest.mark.parametrize("radius", [1e-3, 60e-3, 0.5])
@pytest.mark.parametrize("bulge", [0.05, -0.4142, 1.0, -1.0])
def test_curve_error_over_the_whole_arc(radius: float, bulge: float) -> None:
    chord = 4.0 * abs(bulge) * radius / (1.0 + bulge * bulge)
    edge = Edge((0.0, 0.0), (chord, 0.0), bulge)
    start = np.array(edge.start)
    worst = 0.0
    for curve in arc_curves(edge):
        b, c, d = (np.array(point) for point in curve)
        for t in np.linspace(0.0, 1.0, 41):
            s = 1.0 - t
            point = s**3 * start + 3 * s * s * t * b + 3 * s * t * t * c + t**3 * d
            worst = max(worst, abs(math.dist(point, edge.centre) - radius))
        start = d
    assert worst < 0.6e-6
    assert tuple(start) == pytest.approx(edge.end, abs=1e-12)


def test_large_board_is_reduced_to_a_scale_of_iso_5455(two_level: Layout, tmp_path: Path) -> None:
    edge = rounded_rectangle(-0.15, -0.1, 0.15, 0.1, radius=3e-3)
    page = drawing(replace(two_level, edge=edge, keepout=()), tmp_path)[0]
    text = page.get_textpage().get_text_bounded()
    assert re.search(r"\b1:2\b", text)
    assert "100 mm = 50 mm on paper" in text
    assert "300.000" in text
    points = np.vstack(copper_paths(page, two_level, Level.TOP))
    x0, y0, x1, y1 = bounds_of(two_level.copper(Level.TOP))
    assert np.ptp(points, axis=0) == pytest.approx([500 * (x1 - x0), 500 * (y1 - y0)], abs=1e-3)


def test_wide_board_lies_across_the_sheet(two_level: Layout, tmp_path: Path) -> None:
    edge = rounded_rectangle(-0.12, -0.051, 0.12, 0.051, radius=3e-3)
    board = replace(two_level, edge=edge, keepout=(), holes=two_level.holes[:1])
    width, height = drawing(board, tmp_path)[0].get_size()
    assert width > height


def test_board_beyond_the_smallest_scale_is_refused(two_level: Layout, tmp_path: Path) -> None:
    edge = rounded_rectangle(-8.0, -8.0, 8.0, 8.0, radius=3e-3)
    with pytest.raises(HandoffError, match="too large"):
        drawing(replace(two_level, edge=edge), tmp_path)


def test_dimensions_drills_and_title(two_level: Layout, tmp_path: Path) -> None:
    text = text_of(drawing(two_level, tmp_path))
    for words in (
        "125.000", "110.000", "60.000 mm from the left and 55.000 mm from the lower side",
        "0.300 mm ±0.100 mm plated via", "2.500 mm ±0.100 mm unplated mounting hole",
        "3.200 mm ±0.100 mm unplated mounting hole", "top copper, seen from the top",
        "bottom copper, seen from the top", "keepout on every level", "4 × R 3.000",
        "B at x, y from the origin: (-30.000, -25.000)",
        "C at x, y from the origin: (30.000, 20.000)", "100 mm = 100 mm on paper printed at 100 %",
    ):  # fmt: skip
        assert words in text
    assert [row.letter for row in drill_rows(two_level)] == ["A", "B", "C"]


def test_key_lists_what_is_drawn_and_nothing_else(
    two_level: Layout, one_level: Layout, drawn: Layout, tmp_path: Path
) -> None:
    """A net tie only where signal meets return, a way to the feed only where keepout leaves one, a mask opening only on
    the side that has one."""
    openings = tuple(m for m in two_level.mask_openings if m.level is Level.TOP)
    pages = drawing(replace(two_level, mask_openings=openings, keepout=()), tmp_path)
    top, bottom, tables = (page.get_textpage().get_text_bounded() for page in pages)
    for words, sides in (
        ("mask opening", (True, False)), ("copper of the other level", (True, True)), ("keepout", (False, False)),
        ("open for the feed", (False, False)), ("signal meets return here, intended", (False, False)),
    ):  # fmt: skip
        assert (words in top, words in bottom) == sides, words
    assert re.search(r"scale\s.*none", tables, re.DOTALL)
    told = text_of(drawing(drawn, tmp_path))
    assert "open for the feed" in told
    assert "signal meets return here, intended" in told
    alone = text_of(drawing(one_level, tmp_path))
    assert "signal meets return here, intended" in alone
    assert "copper of the other level" not in alone


def test_letters_stand_inside_the_board_and_apart(drawn: Layout, tmp_path: Path) -> None:
    """Each letter of a hole or group of holes on paper: within the edge of 1:1, none over another."""
    page = drawing(drawn, tmp_path)[0]
    text = page.get_textpage()
    low = 8.0 + 22.0 + 60.0  # above title block, drill table and key
    chars = [
        (text.get_text_range(i, 1), [MM_PER_POINT * c for c in text.get_charbox(i)]) for i in range(text.count_chars())
    ]
    letters = {(c, *(round(v, 2) for v in box)) for c, box in chars if c in "AB" and box[1] > low}
    assert {c for c, *_ in letters} == {"A", "B"}
    boxes = [box for _, *box in letters]
    assert max(b[2] for b in boxes) - min(b[0] for b in boxes) < 1e3 * drawn.size[0]
    assert max(b[3] for b in boxes) - min(b[1] for b in boxes) < 1e3 * drawn.size[1]
    for i, a in enumerate(boxes):
        assert not any(a[0] < b[2] and b[0] < a[2] and a[1] < b[3] and b[1] < a[3] for b in boxes[i + 1 :])


def test_tables_and_notes(board: Layout, tmp_path: Path) -> None:
    sheet = sheet_for(board)
    text = text_of(drawing(board, tmp_path))
    for words in (
        "1.6 mm ±10 %", "43 µm", "35 µm", "4.300 ±5 %", "0.0200 ±30 %", "woven glass & <epoxy>", "868.3 MHz",
        "50.0 ±5.0 Ω", "150.0 Ω", "transformer coplanar strips",
        "Not controlled, do not adjust: transformer.", "3.050 mm", "0.270 mm", "not controlled, do not adjust",
        "Dimensions are finished copper at the foot of the conductor.", "no etch compensation included",
        "35 µm base, 43 µm finished", "Solder mask over the antenna: top side.", "Surface finish: ENIG.",
        "no thieving, teardrops, order number, width change or edge clip-back", "Board outline tolerance: ±0.15 mm.",
        "IPC-4101/126", "Permittivity of the laminate: 4.300 ±5 % at 868.3 MHz.",
        "Netlist supplied: netlist.ipc.", "electrical test of every board against it",
    ):  # fmt: skip
        assert words in text
    notes = fab_notes(board, sheet, facts=facts_for(board.name))
    for note in notes:
        signs = note.replace("+-", "±").replace(" um ", " µm ").replace("0 ohm", "0 Ω")
        assert re.sub(r"\s+", " ", signs) in text
    assert " ohm" not in text  # one way to write a unit on one paper
    short = "0 Ω between feed and ground is intended" in text
    assert short == board.dc_short


def test_no_text_leaves_the_frame(board: Layout, tmp_path: Path) -> None:
    """The frame is 8 mm inside the sheet; letters keep within it."""
    for page in drawing(board, tmp_path):
        width, height = (MM_PER_POINT * side for side in page.get_size())
        text = page.get_textpage()
        for i in range(text.count_chars()):
            left, bottom, right, top = (MM_PER_POINT * c for c in text.get_charbox(i))
            assert left >= 8.0 - 0.01
            assert right <= width - 8.0 + 0.01
            assert bottom >= 8.0 - 0.01
            assert top <= height - 8.0 + 0.01


def test_many_lines_go_on_to_further_sheets(two_level: Layout, tmp_path: Path) -> None:
    sheet = sheet_for(two_level)
    lines = tuple(replace(LINES[1], name=f"line_{i}") for i in range(60))
    write_drawing(
        two_level, replace(sheet, impedance_lines=lines), tmp_path / "drawing.pdf", facts=facts_for(two_level.name)
    )
    document = pypdfium2.PdfDocument(tmp_path / "drawing.pdf")
    assert len(document) > 3
    assert all(f"line {i} " in text_of(document) for i in range(60))
    for page in document:
        text = page.get_textpage()
        search = text.search("line ")
        while found := search.get_next():
            assert MM_PER_POINT * text.get_charbox(found[0])[1] > 8.0 + 22.0  # above the title block

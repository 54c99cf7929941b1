"""The trim drawing, read back through another PDF reader and as XML: true scale, what is hatched, what is said.

Authority: elementary geometry of what a knife takes off (a rectangle, a ring, a strip along straights and quarter
circles), ISO 216 sheets, PDF's unit of 1/72 inch. The reader is pypdfium2. Outlooks are INVENTED.
"""

from __future__ import annotations

import ctypes
import math
import re
from collections.abc import Iterator
from dataclasses import replace
from pathlib import Path
from typing import Any
from xml.etree import ElementTree

import numpy as np
import pypdfium2
import pypdfium2.raw as pdfium
import pytest

from planar.brief import check_brief
from planar.copper.boolean import contains
from planar.copper.cut_off import CutOff
from planar.copper.layout import Level, bounds_of
from planar.copper.shapes import rectangle
from planar.design.design import Design, make_design
from planar.design.retune.built import Artwork
from planar.design.retune.cut_places import cut_places
from planar.design.retune.cuts import Cut
from planar.errors import HandoffError, SynthesisError
from planar.handoff.trim_detail import FIRST
from planar.handoff.trim_drawing import WARNINGS, Way, write_trim_drawing, write_trim_svg
from planar.library import Library
from tests.roundtrip.pdf_paths import filled_with

Facts = dict[str, Any]

MM_PER_POINT = 25.4 / 72.0
SVG = "{http://www.w3.org/2000/svg}"
LIBRARY = Library.open()


def designed(name: str, band: tuple[str, str], antenna: Facts) -> Design:
    data = {
        "name": name,
        "target": {"band": list(band)},
        "board": {"laminate": "fr4-general", "thickness": "1.6 mm"},
        "antenna": antenna,
    }
    return make_design(check_brief(data, "x.toml", LIBRARY), LIBRARY, "x.toml")


@pytest.fixture(scope="module")
def tabbed() -> Design:
    """A plain loop, square with rounded corners, with trim tabs."""
    antenna = {"family": "plain", "shape": "square", "corner_radius": "6 mm", "trim": True}
    return designed("tabbed", ("1800 MHz", "1900 MHz"), antenna)


@pytest.fixture(scope="module")
def guided() -> Design:
    """A ring with an open line above it: the ring is cut on the bottom, the line on the top."""
    return designed("guided", ("880 MHz", "920 MHz"), {"family": "ring-guided", "end": "open", "shape": "circle"})


def cut_of(design: Design, what: str, amount: float | None, moved: dict[str, float], tabs: int = 3) -> CutOff:
    """Where the cut that moves these dimensions by so many metres, or leaves `tabs` pairs, takes copper off."""
    after = {name: value + moved.get(name, 0.0) for name, value in design.dimensions.items()}
    outlook: Any = None
    first = None if amount is None else 0.5 * amount
    cut = Cut(what, amount, first, amount, what, Artwork(after, tabs), outlook, outlook)
    return cut_places(design.choices, design.dimensions, cut)


def told_of(off: CutOff, amount_mm: float | None) -> Facts:
    """INVENTED entry of a retune.json for the cut."""
    outlook = {"worst_axial_ratio_db": None, "matched_band_hz": None, "distance": 0.01, "best_match_hz": 861.27e6}
    return {
        "what": off.what,
        "begin_with": f"begin with {off.what}",
        "first_cut_mm": None if amount_mm is None else 0.5 * amount_mm,
        "whole_cut_mm": amount_mm,
        "most_mm": None if amount_mm is None else 3.21 * amount_mm,
        "tab_pairs_left": 1 if amount_mm is None else None,
        "after_first": outlook | {"shift": -0.0123, "worst_reflection_db": -14.26, "confidence": 0.93},
        "after_whole": outlook | {"shift": 0.0004, "worst_reflection_db": -17.5, "confidence": 0.98},
    }


def outer_edge(design: Design, amount: float) -> CutOff:
    """A strip of `amount` m off the loop's outer edge: trace narrower, mean line half of that further in."""
    moved = {"trace_width": -amount, "loop_width": -amount, "feed_length": 0.5 * amount}
    if "corner_radius" in design.dimensions:
        moved["corner_radius"] = -0.5 * amount
    return cut_of(design, "outer edge", amount, moved)


def area(outlines: Any) -> float:
    return sum(outline.area for outline in outlines)


def test_strip_off_the_outer_edge(tabbed: Design) -> None:
    """Along straights it is as long as they are, round a corner the difference of two quarter circles; the gap has no
    copper. Tabs stay."""
    amount, d = 0.2e-3, tabbed.dimensions
    off = outer_edge(tabbed, amount)
    straight, radius = d["loop_width"] - 2.0 * d["corner_radius"], d["corner_radius"] + 0.5 * d["trace_width"]
    for outlines, taken in ((off.first, 0.5 * amount), (off.whole, amount)):
        corners = math.pi * (radius**2 - (radius - taken) ** 2)
        assert area(outlines) == pytest.approx((4.0 * straight - d["gap"]) * taken + corners, rel=1e-6)
    (mark,) = off.marks
    assert (mark.first, mark.whole) == pytest.approx((0.5 * amount, amount))
    for depth, gone in ((0.5, True), (1.5, False), (-0.5, False)):
        place = (mark.start[0] + depth * amount * mark.along[0], mark.start[1] + depth * amount * mark.along[1])
        assert any(contains(outline, place) for outline in off.whole) == gone


def test_gap_and_line_end_lose_rectangles_on_their_own_sides(guided: Design) -> None:
    d = guided.dimensions
    gap = cut_of(guided, "gap", 0.6e-3, {"gap": 0.6e-3})
    assert gap.level is Level.BOTTOM
    # across the curved trace: at most the thickness of the circle's bow more than a rectangle
    assert area(gap.whole) == pytest.approx(0.6e-3 * d["trace_width"], rel=1e-3)
    assert [mark.whole for mark in gap.marks] == pytest.approx([0.3e-3, 0.3e-3])
    end = cut_of(guided, "end", 2e-3, {"end_length": -2e-3})
    assert end.level is Level.TOP
    assert area(end.first) == pytest.approx(1e-3 * d["end_width"], rel=1e-6)  # a bent strip has that area too
    assert area(end.whole) == pytest.approx(2e-3 * d["end_width"], rel=1e-6)


def test_ring_below_a_line_is_cut_and_the_line_is_not(guided: Design) -> None:
    """A ring between two circles, less the gap with parallel sides and what the ground of the coax covers."""
    amount, d = 0.3e-3, guided.dimensions
    off = outer_edge(guided, amount)
    assert off.level is Level.BOTTOM
    radius = 0.5 * (d["loop_width"] + d["trace_width"])
    ring = math.pi * (radius**2 - (radius - amount) ** 2) - d["gap"] * amount
    grounds = [pad.outline.bounds for pad in guided.layout.pads if pad.level is Level.BOTTOM]
    covered = max((b[2] for b in grounds), default=0.0) - min((b[0] for b in grounds), default=0.0)
    assert ring - 3.0 * covered * amount <= area(off.whole) <= ring
    assert all(abs(x) < 1e-9 for x in off.marks[0].along[1:])


def test_tabs_go_pair_by_pair_and_a_single_pair_by_halves(tabbed: Design) -> None:
    """Tabs are rectangles that begin at the straight edge of the trace."""
    d = tabbed.dimensions
    tab = d["tab_length"] * d["tab_width"]
    for left, first, whole in ((2, 1.0, 2.0), (1, 2.0, 4.0)):
        off = cut_of(tabbed, "tabs", None, {}, left)
        assert (area(off.first), area(off.whole)) == pytest.approx((first * tab, whole * tab), rel=1e-6)
        assert len(off.marks) == round(whole)


def test_cut_that_takes_nothing_is_refused(tabbed: Design) -> None:
    with pytest.raises(SynthesisError, match="nothing is cut off"):
        cut_of(tabbed, "nothing", 1e-3, {})


def paths(page: pypdfium2.PdfPage, colour: str) -> Iterator[np.ndarray[Any, Any]]:
    """Points (n, 2), mm, of every path filled with `colour`: ends of lines and curves with their handles."""
    for item in filled_with(page, colour):
        points = []
        for i in range(pdfium.FPDFPath_CountSegments(item)):
            x, y = ctypes.c_float(), ctypes.c_float()
            pdfium.FPDFPathSegment_GetPoint(pdfium.FPDFPath_GetPathSegment(item, i), x, y)
            points.append((MM_PER_POINT * x.value, MM_PER_POINT * y.value))
        yield np.array(points)


def text_of(page: pypdfium2.PdfPage) -> str:
    return re.sub(r"\s+", " ", page.get_textpage().get_text_bounded()).replace("\N{MINUS SIGN}", "-")


@pytest.fixture(scope="module")
def ways(tabbed: Design) -> list[Way]:
    edge, tabs = outer_edge(tabbed, 0.3e-3), cut_of(tabbed, "two pairs of tabs", None, {}, 1)
    return [Way(tabs, told_of(tabs, None)), Way(edge, told_of(edge, 0.3))]


def test_tabs_lie_on_paper_where_they_lie_on_the_board(tabbed: Design, ways: list[Way], tmp_path: Path) -> None:
    """Sizes and distances are those of the board to 2 um: PDF's numbers have three decimals of 0.35 mm and more."""
    write_trim_drawing(tabbed.layout, ways, tmp_path / "trim.pdf", made_with="x")
    page = pypdfium2.PdfDocument(tmp_path / "trim.pdf")[0]
    assert [MM_PER_POINT * side for side in page.get_size()] == pytest.approx([210.0, 297.0], abs=0.01)
    drawn = list(paths(page, FIRST.fill or ""))[: len(ways[0].off.first)]
    places = [outline.bounds for outline in ways[0].off.first]
    for points, (x0, y0, x1, y1) in zip(drawn, places, strict=True):
        assert np.ptp(points, axis=0) == pytest.approx([1e3 * (x1 - x0), 1e3 * (y1 - y0)], abs=2e-3)
    apart = 1e3 * (places[1][0] - places[0][0])
    assert drawn[1][:, 0].min() - drawn[0][:, 0].min() == pytest.approx(apart, abs=2e-3)


def test_bar_to_measure_is_50_mm(tabbed: Design, ways: list[Way], tmp_path: Path) -> None:
    write_trim_drawing(tabbed.layout, ways, tmp_path / "trim.pdf", made_with="x")
    for page in pypdfium2.PdfDocument(tmp_path / "trim.pdf"):
        black = list(paths(page, "#000000"))
        assert len(black) == 5  # every other part of ten
        starts = [points[:, 0].min() for points in black]
        assert np.diff(starts) == pytest.approx(10.0, abs=1e-3)
        assert [np.ptp(points[:, 0]) for points in black] == pytest.approx([5.0] * 5, abs=1e-3)
        assert "measure this: 50 mm" in text_of(page)


def test_detail_is_enlarged_as_it_says(tabbed: Design, ways: list[Way], tmp_path: Path) -> None:
    """The strip in the detail is as wide as the first cut times the scale stated."""
    write_trim_drawing(tabbed.layout, ways, tmp_path / "trim.pdf", made_with="x")
    page = pypdfium2.PdfDocument(tmp_path / "trim.pdf")[1]
    (scale,) = re.findall(r"A, (\d+):1", text_of(page))
    strip = list(paths(page, FIRST.fill or ""))[len(ways[1].off.first)]
    assert np.ptp(strip[:, 0]) == pytest.approx(0.15 * int(scale), abs=2e-3)


def test_page_says_the_facts_and_the_warnings(tabbed: Design, ways: list[Way], tmp_path: Path) -> None:
    write_trim_drawing(tabbed.layout, ways, tmp_path / "trim.pdf", made_with="x")
    pages = list(pypdfium2.PdfDocument(tmp_path / "trim.pdf"))
    assert len(pages) == len(ways)
    for page, number in zip(pages, (1, 2), strict=True):
        text = text_of(page)
        assert f"Way {number} of 2" in text
        assert all(warning in text for warning in WARNINGS)
        for said in ("-1.23 %", "-14.3 dB", "93 %", "+0.04 %", "-17.5 dB", "98 %", "861.27 MHz", "tabbed", "1:1"):
            assert said in text
    assert "Cut first: begin with two pairs of tabs." in text_of(pages[0])
    assert text_of(pages[0]).count("later") == 2 + 1  # a pair of tabs, and the key
    assert "Cut first 0.15 mm, 0.3 mm in all; no more than 0.963 mm can be cut." in text_of(pages[1])
    assert "in all 0.3 mm" in text_of(pages[1])


def test_cut_below_is_seen_from_below(guided: Design, tmp_path: Path) -> None:
    """The feed of the board is not in its middle, and what is cut on the left of the view from below lies on the right
    of the layout."""
    gap = cut_of(guided, "gap", 0.6e-3, {"gap": 0.6e-3})
    moved = replace(gap, first=gap.first[:1], whole=gap.whole[:1])
    write_trim_drawing(guided.layout, [Way(moved, told_of(moved, 0.6))], tmp_path / "trim.pdf", made_with="x")
    page = pypdfium2.PdfDocument(tmp_path / "trim.pdf")[0]
    drawn = next(paths(page, FIRST.fill or ""))
    left, _, right, _ = guided.layout.edge.bounds
    seen = 0.5 * (drawn[:, 0].min() + drawn[:, 0].max()) - 0.5 * MM_PER_POINT * page.get_size()[0]
    x0, _, x1, _ = bounds_of(moved.first)
    assert seen == pytest.approx(-1e3 * (0.5 * (x0 + x1) - 0.5 * (left + right)), abs=2e-3)
    assert abs(seen) > 0.5
    assert "mirrored" in text_of(page)
    assert "half of it on each side" in text_of(page)


def test_svg_is_the_same_sheet_at_true_scale(tabbed: Design, ways: list[Way], tmp_path: Path) -> None:
    write_trim_svg(tabbed.layout, ways, tmp_path / "trim.svg")
    root = ElementTree.parse(tmp_path / "trim.svg").getroot()
    assert (root.attrib["width"], root.attrib["height"], root.attrib["viewBox"]) == ("210mm", "297mm", "0 0 210 297")
    black = [each for each in root.iter(f"{SVG}rect") if each.attrib.get("fill") == "#000000"]
    assert [float(each.attrib["width"]) for each in black] == pytest.approx([5.0] * 5)
    (first, *_) = [each for each in root.iter(f"{SVG}path") if each.attrib.get("fill") == FIRST.fill]
    assert first.attrib["transform"].endswith("scale(1)")
    numbers = [float(each) for each in re.findall(r"-?\d+\.?\d*", first.attrib["d"])]
    x0, y0, x1, y1 = (1e3 * value for value in bounds_of(ways[0].off.first))
    assert [min(numbers[::2]), max(numbers[::2])] == pytest.approx([x0, x1], abs=1e-5)
    assert [-max(numbers[1::2]), -min(numbers[1::2])] == pytest.approx([y0, y1], abs=1e-5)
    said = " ".join("".join(each.itertext()) for each in root.iter(f"{SVG}text"))
    assert "begin with two pairs of tabs" in said
    assert "measure this: 50 mm" in said


def test_same_bytes_twice_and_nothing_of_the_clock(tabbed: Design, ways: list[Way], tmp_path: Path) -> None:
    for name in ("one", "two"):
        write_trim_drawing(tabbed.layout, ways, tmp_path / f"{name}.pdf", made_with="x")
        write_trim_svg(tabbed.layout, ways, tmp_path / f"{name}.svg")
    for ending in ("pdf", "svg"):
        assert (tmp_path / f"one.{ending}").read_bytes() == (tmp_path / f"two.{ending}").read_bytes()
    assert set(re.findall(rb"\(D:(\d{4})", (tmp_path / "one.pdf").read_bytes())) <= {b"2000"}


def test_larger_boards_take_larger_sheets_up_to_a_limit(tabbed: Design, ways: list[Way], tmp_path: Path) -> None:
    """A board of 200 mm fits no A4 with its words, one of 1 m no A1."""
    large = replace(tabbed.layout, edge=rectangle(-0.1, -0.1, 0.1, 0.1))
    write_trim_drawing(large, ways, tmp_path / "trim.pdf", made_with="x")
    page = pypdfium2.PdfDocument(tmp_path / "trim.pdf")[0]
    assert [MM_PER_POINT * side for side in page.get_size()] == pytest.approx([297.0, 420.0], abs=0.01)
    assert "A3" in text_of(page)
    with pytest.raises(HandoffError, match="larger than a sheet of A1"):
        write_trim_svg(replace(large, edge=rectangle(-0.5, -0.5, 0.5, 0.5)), ways, tmp_path / "large.svg")


def test_without_a_way_to_cut_there_is_no_drawing(tabbed: Design, tmp_path: Path) -> None:
    with pytest.raises(HandoffError, match="no trim drawing"):
        write_trim_drawing(tabbed.layout, [], tmp_path / "trim.pdf", made_with="x")
    assert not (tmp_path / "trim.pdf").exists()

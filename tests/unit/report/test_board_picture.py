"""Board pictures held against the copper they show: the layout's own outlines, and the dimensions of the design."""

from __future__ import annotations

import re
from functools import cache
from pathlib import Path
from xml.etree import ElementTree
from xml.etree.ElementTree import Element

import pytest
from matplotlib.font_manager import FontProperties, findfont, get_font
from shapely import Point, unary_union

from planar.brief import check_brief, read_brief
from planar.copper.layout import Layout, Level
from planar.design.design import Design, make_design
from planar.library import Library
from planar.report.board_picture import board_picture, fitting_scale
from planar.report.callouts import Placing, beside, keyed
from planar.report.dimension_marks import PLACES, BoardMarks, Mark, board_marks
from planar.report.svg import text_width

SVG = "{http://www.w3.org/2000/svg}"
EXAMPLES = Path(__file__).parents[3] / "examples"
TRIMMED = {
    "name": "trimmed",
    "target": {"band": ["863 MHz", "870 MHz"]},
    "antenna": {
        "family": "ring-guided",
        "end": "via",
        "shape": "square",
        "trim": True,
        "dimensions": {
            "loop_width": "94 mm",
            "corner_radius": "12 mm",
            "trace_width": "8.3 mm",
            "gap": "2.1 mm",
            "feed_length": "5.5 mm",
            "line_width": "3.01 mm",
            "transformer_width": "0.42 mm",
            "transformer_length": "50.6 mm",
            "end_width": "0.9 mm",
            "end_length": "1.95 mm",
            "via_drill": "0.3 mm",
            "via_ring": "0.3 mm",
            "tab_length": "5.3 mm",
            "tab_width": "2.1 mm",
            "tab_spacing": "7.1 mm",
        },
    },
    "board": {"laminate": "fr4-general", "thickness": "1.6 mm", "mask": "both"},
}
NAMES = ("workshop-loop", "greenhouse-telemetry", "hydrogen-feed", "trimmed")
ON_COPPER = {
    "trace_width",
    "line_width",
    "transformer_width",
    "end_width",
    "strip_width",
    "strip_gap",
    "via_ring",
}
"""Measured from edge to edge of copper."""
LED_TO_COPPER = {"gap", "second_gap", "pad_width", "tab_width", "tab_length"}
"""Measured beside the copper; lines lead from its edge to them."""


@pytest.fixture(scope="module")
def designs() -> dict[str, Design]:
    library = Library.open()
    briefs = {name: read_brief(EXAMPLES / f"{name}.toml", library) for name in NAMES[:3]}
    briefs["trimmed"] = check_brief(TRIMMED, "trimmed.toml", library)
    return {name: make_design(brief, library, name) for name, brief in briefs.items()}


@pytest.fixture(params=NAMES)
def design(request: pytest.FixtureRequest, designs: dict[str, Design]) -> Design:
    return designs[request.param]


def picture(design: Design, level: Level, placing: Placing = beside) -> Element:
    scale = fitting_scale(design.layout)
    text = board_picture(design.layout, level, marks=board_marks(design, level), placing=placing, scale=scale)
    return ElementTree.fromstring(text)


def words(root: Element) -> list[str]:
    return ["".join(element.itertext()) for element in root.iter(f"{SVG}text")]


def marks_of(design: Design) -> dict[str, Mark]:
    return {mark.name: mark for level in design.layout.levels for mark in board_marks(design, level).dimensions}


def points(path: str) -> list[tuple[float, float]]:
    """Ends of the pieces of a path of M, L and A, in mm, y upwards."""
    pieces = re.findall(r"[MLA]([^MLAZ]*)", path)
    return [(float(piece.split()[-2]), -float(piece.split()[-1])) for piece in pieces]


def test_every_dimension_is_told_once_with_its_value(design: Design) -> None:
    marks = [mark for level in design.layout.levels for mark in board_marks(design, level).dimensions]
    assert {"feed", "mean_line", *design.dimensions} == {mark.name for mark in marks}
    assert len({mark.name for mark in marks}) == len(marks)
    for mark in marks:
        if mark.name in design.dimensions:
            shown = re.search(r"[\d.]+(?= mm)", mark.value)
            assert shown is not None
            assert float(shown[0]) == pytest.approx(1e3 * design.dimensions[mark.name], abs=0.5e-3)


def test_every_dimension_of_every_family_has_a_place() -> None:
    library = Library.open()
    for key in library.keys("families"):
        assert {rule.name for rule in library.family(key).dimensions} <= set(PLACES)


def test_measured_lines_are_as_long_as_what_they_measure(design: Design) -> None:
    """Beside an arc of the mean line a length is measured on a concentric one, in proportion to its radius."""
    dimensions = design.dimensions
    radius = dimensions.get("corner_radius", 0.5 * dimensions["loop_width"])
    for name, mark in marks_of(design).items():
        if mark.measure is not None:
            parts = [e.length * (radius / e.radius if e.bulge else 1.0) for e in mark.measure.edges]
            assert sum(parts) == pytest.approx(dimensions[name], rel=1e-9), name


def test_measured_lines_end_at_the_edge_of_the_copper(design: Design) -> None:
    """Copper is snapped to 1 nm and arcs are flattened to 1 um for this check; a drill ends inside its ring."""
    for level in design.layout.levels:
        edge = unary_union([outline.shape().boundary for outline in design.layout.copper(level)])
        drills = unary_union([Point(h.centre).buffer(0.5 * h.diameter, 256).boundary for h in design.layout.holes])
        for mark in board_marks(design, level).dimensions:
            assert mark.name in {"feed", "mean_line"} or mark.measure is not None
            if mark.name in ON_COPPER and mark.measure is not None:
                for end in (mark.measure.edges[0].start, mark.measure.edges[-1].end):
                    assert min(edge.distance(Point(end)), drills.distance(Point(end))) < 2e-6, mark.name
            if mark.name in LED_TO_COPPER:
                assert mark.witnesses
                for start, _ in mark.witnesses:
                    # a gap's sides are straight, the trace's edge between them may be an arc
                    assert edge.distance(Point(start)) < 20e-6, mark.name


def test_true_scale(designs: dict[str, Design]) -> None:
    """One unit is 1 mm: the size in mm is the view's, the copper stands at its coordinates, y downwards."""
    design = designs["trimmed"]
    root = ElementTree.fromstring(board_picture(design.layout, Level.BOTTOM))
    _, _, width, height = (float(value) for value in root.attrib["viewBox"].split())
    assert float(root.attrib["width"].removesuffix("mm")) == pytest.approx(width, abs=1e-6)
    assert float(root.attrib["height"].removesuffix("mm")) == pytest.approx(height, abs=1e-6)
    drawn = [path.attrib["d"] for path in root.findall(f"{SVG}g[@class='copper']/{SVG}path")]
    copper = design.layout.copper(Level.BOTTOM)
    assert len(drawn) == len(copper)
    for path, outline in zip(drawn, copper, strict=True):
        corners = [value for point in points(path)[:-1] for value in point]
        assert corners == pytest.approx((1e3 * outline.vertices[:, :2]).ravel().tolist(), abs=2e-6)


def test_a_small_board_is_enlarged_and_says_so(designs: dict[str, Design]) -> None:
    layout = designs["greenhouse-telemetry"].layout
    assert (fitting_scale(layout), fitting_scale(designs["trimmed"].layout)) == (2, 1)
    root = ElementTree.fromstring(board_picture(layout, Level.TOP, scale=2))
    width = float(root.attrib["viewBox"].split()[2])
    assert float(root.attrib["width"].removesuffix("mm")) == pytest.approx(2.0 * width, abs=1e-6)
    assert "Scale 2:1" in " ".join(words(root))


@pytest.mark.parametrize("placing", [beside, keyed])
def test_no_two_words_overlap_and_all_are_inside(design: Design, placing: Placing) -> None:
    """By the metrics of DejaVu Sans, which is among the widest of the plain fonts a browser may take."""
    for level in design.layout.levels:
        root = picture(design, level, placing)
        x0, y0, width, height = (float(value) for value in root.attrib["viewBox"].split())
        boxes = [text_box(element) for element in root.iter(f"{SVG}text")]
        assert len(boxes) > 8
        for i, (left, top, right, bottom) in enumerate(boxes):
            assert x0 <= left
            assert right <= x0 + width
            assert y0 <= top
            assert bottom <= y0 + height
            for other in boxes[:i]:
                assert left >= other[2] or other[0] >= right or top >= other[3] or other[1] >= bottom


def text_box(element: Element) -> tuple[float, float, float, float]:
    size, x, y = (float(element.attrib[key]) for key in ("font-size", "x", "y"))
    width = size * real_width(element.text or "", "bold" if "font-weight" in element.attrib else "normal")
    shift = {"start": 0.0, "middle": -0.5, "end": -1.0}[element.attrib.get("text-anchor", "start")] * width
    return x + shift, y - 0.73 * size, x + shift + width, y  # capitals are 0.73 of the size high


def real_width(words: str, weight: str) -> float:
    """Width over the font size: the sum of the letters' advances in DejaVu Sans."""
    return sum(advance(letter, weight) for letter in words)


@cache
def advance(letter: str, weight: str) -> float:
    font = get_font(findfont(FontProperties(family="DejaVu Sans", weight=weight)))
    font.set_size(100.0, 72.0)
    return float(font.load_char(ord(letter)).linearHoriAdvance) / 65536.0 / 100.0


def test_letters_are_legible_on_a_phone(design: Design) -> None:
    """330 px are left for the picture on a screen of 360: letters of 10 px, figures at the axes of 7.5 (common
    practice, no source)."""
    for level in design.layout.levels:
        root = picture(design, level, keyed)
        width = float(root.attrib["viewBox"].split()[2])
        shown = min(330.0, float(root.attrib["width"].removesuffix("mm")) * 96.0 / 25.4)
        sizes = [float(element.attrib["font-size"]) * shown / width for element in root.iter(f"{SVG}text")]
        assert min(sizes) >= 7.5
        assert max(sizes) >= 10.0


def test_hovering_names_copper_pads_holes_and_gaps(designs: dict[str, Design]) -> None:
    design = designs["hydrogen-feed"]
    roots = [picture(design, level) for level in design.layout.levels]
    titles = [element.text or "" for root in roots for element in root.iter(f"{SVG}title")]
    assert titles[0] == "hydrogen-feed, top copper"
    gap = design.dimensions["second_gap"]
    for start in ("loop, bottom copper, net ", "pad ", "via hole, plated", "mounting hole, not plated", "keepout"):
        assert any(title.startswith(start) for title in titles), start
    assert any(title.startswith(f"second gap, {1e3 * gap:g} mm long") for title in titles)


def test_pictures_stand_alone(design: Design) -> None:
    for level in design.layout.levels:
        text = board_picture(design.layout, level, marks=board_marks(design, level))
        assert text == board_picture(design.layout, level, marks=board_marks(design, level))
        root = ElementTree.fromstring(text)
        assert root.attrib["role"] == "img"
        assert [child.tag for child in root][:2] == [f"{SVG}title", f"{SVG}desc"]
        assert not re.search(r"\sid=|<script|href|url\(|\son\w+=", text)
        assert len(text) < 50_000


def test_mirrored_boards_have_mirrored_marks(designs: dict[str, Design]) -> None:
    """A right-handed board is the left-handed one mirrored: the second gap lies on its other half."""
    marks: BoardMarks = board_marks(designs["hydrogen-feed"], Level.BOTTOM)
    spot = next(mark.spot for mark in marks.dimensions if mark.name == "second_gap")
    copper = designs["hydrogen-feed"].layout.islands
    line = next(island.outline.bounds for island in copper if island.role == "line")
    assert spot[0] * (line[0] + line[2]) < 0.0  # the half without the line


def test_layouts_without_a_design_are_drawn(designs: dict[str, Design]) -> None:
    layout: Layout = designs["trimmed"].layout
    root = ElementTree.fromstring(board_picture(layout, Level.TOP))
    assert root.find(f"{SVG}g[@class='leaders']") is None
    assert root.find(f"{SVG}g[@class='copper']") is not None


def test_widths_are_estimated_from_above(design: Design) -> None:
    for mark in marks_of(design).values():
        assert real_width(mark.value, "bold") <= text_width(mark.value, 1.0, bold=True), mark.value
        assert real_width(mark.label, "normal") <= text_width(mark.label, 1.0), mark.label

"""The layout folder as a whole: same bytes twice, the picture true to scale, the page true to the copper.

Authority: SVG 1.1, 8.3.8 and F.6 (arcs), XML parsing by the standard library; chord-and-arc geometry.
"""

from __future__ import annotations

import math
import re
from dataclasses import replace
from pathlib import Path
from xml.etree import ElementTree

import pytest

from planar.copper.layout import Layout, Level
from planar.handoff import LAYERS, read_layers_csv, write_layout_files, write_preview_svg

SVG = "{http://www.w3.org/2000/svg}"
STATUS = "first-order, not field-solved: expect the resonance a few per cent off"


def svg_area(data: str) -> float:
    """Area inside a path of M, L, A and Z, mm2, positive for a path that turns clockwise on the page."""
    tokens = re.findall(r"([MLAZ])([^MLAZ]*)", data)
    area, x, y = 0.0, 0.0, 0.0
    for command, text in tokens:
        values = [float(value) for value in text.split()]
        if command == "Z":
            continue
        u, v = values[-2:]
        if command != "M":
            area += 0.5 * (x * v - u * y)
        if command == "A":
            radius, other, turn, large, sweep = values[:5]
            assert (other, turn, large) == (radius, 0.0, 0.0)
            half = math.asin(min(1.0, 0.5 * math.hypot(u - x, v - y) / radius))
            area += (1.0 if sweep else -1.0) * 0.5 * radius**2 * (2.0 * half - math.sin(2.0 * half))
        x, y = u, v
    return area


def test_same_bytes_twice(layout: Layout, tmp_path: Path) -> None:
    folders = [tmp_path / "one", tmp_path / "two"]
    for folder in folders:
        folder.mkdir()
        write_layout_files(layout, folder, status=STATUS)
    names = sorted(path.name for path in folders[0].iterdir())
    previews = {f"preview-{level}.svg" for level in layout.levels}
    assert (
        set(names)
        == {"board.dxf", "board-segments.dxf", "outline.dxf", "board.gds", "layers.csv", "README.txt"} | previews
    )
    for name in names:
        assert (folders[0] / name).read_bytes() == (folders[1] / name).read_bytes()


@pytest.mark.parametrize("level", list(Level))
def test_preview_is_true_to_scale(two_level: Layout, tmp_path: Path, level: Level) -> None:
    path = tmp_path / "preview.svg"
    write_preview_svg(two_level, level, path)
    root = ElementTree.parse(path).getroot()
    _, _, width, height = (float(value) for value in root.attrib["viewBox"].split())
    assert (root.attrib["width"], root.attrib["height"]) == (f"{width:g}mm", f"{height:g}mm")  # one unit is 1 mm
    copper = root.find(f"{SVG}g[@class='copper']")
    assert copper is not None
    areas = [svg_area(path.attrib["d"]) for path in copper]
    assert len(areas) == len(two_level.copper(level))
    # coordinates are whole nanometres, radii rounded to 1 nm: area to about 1 nm along the outline (0.7 m)
    assert -sum(areas) == pytest.approx(1e6 * two_level.area(level), abs=1e-3)
    assert root.findtext(f"{SVG}title") == f"two level, 868 MHz, {level} copper"
    assert "Seen from the top" in (root.findtext(f"{SVG}desc") or "")


def test_preview_is_upright_and_not_mirrored(two_level: Layout, tmp_path: Path) -> None:
    """The hole at (30, 20) mm appears right of the origin and above it, on both levels."""
    for level in Level:
        write_preview_svg(two_level, level, tmp_path / "preview.svg")
        root = ElementTree.parse(tmp_path / "preview.svg").getroot()
        holes = root.find(f"{SVG}g[@class='holes']")
        assert holes is not None
        found = {(c.attrib["cx"], c.attrib["cy"], c.attrib["r"]) for c in holes}
        assert found == {("-25", "-45", "0.15"), ("30", "-20", "1.6"), ("-30", "25", "1.25")}


def test_preview_shows_small_vias_and_the_other_level(two_level: Layout, one_level: Layout, tmp_path: Path) -> None:
    """A via of 0.3 mm is a dot: a ring of 0.6 mm radius lies round it. The other level stands on a pale line."""
    write_preview_svg(two_level, Level.BOTTOM, tmp_path / "preview.svg")
    root = ElementTree.parse(tmp_path / "preview.svg").getroot()
    rings = root.find(f"{SVG}g[@class='small-holes']")
    assert rings is not None
    assert [(c.attrib["cx"], c.attrib["cy"], c.attrib["r"]) for c in rings] == [("-25", "-45", "0.6")]
    for name in ("copper-beyond-ground", "copper-beyond"):
        group = root.find(f"{SVG}g[@class='{name}']")
        assert group is not None
        assert len(group) == len(two_level.copper(Level.TOP))
    caption = root.findtext(f"{SVG}text") or ""
    assert "cross: origin and feed; dotted: other level; ring: plated hole" in caption
    write_preview_svg(one_level, Level.TOP, tmp_path / "preview.svg")
    alone = ElementTree.parse(tmp_path / "preview.svg").getroot().findtext(f"{SVG}text") or ""
    assert alone.endswith("cross: origin and feed")


def test_names_are_escaped(one_level: Layout, tmp_path: Path) -> None:
    write_preview_svg(replace(one_level, name="<a> & b"), Level.TOP, tmp_path / "preview.svg")
    root = ElementTree.parse(tmp_path / "preview.svg").getroot()
    assert root.findtext(f"{SVG}title") == "<a> & b, top copper"


def test_readme_says_what_the_layout_is(two_level: Layout, one_level: Layout, tmp_path: Path) -> None:
    write_layout_files(two_level, tmp_path, status=STATUS)
    text = (tmp_path / "README.txt").read_text(encoding="utf-8")
    flowing = " ".join(text.split())
    assert STATUS in text
    assert "NOT mirrored" in text
    assert "125.000 by 110.000 mm" in text
    assert "100 mm long" in flowing
    assert "top 1 island, 320.0000 mm2" in flowing
    assert "bottom 2 islands" in flowing
    assert "not connected at DC" in flowing
    assert len(text.splitlines()) <= 70  # a page
    write_layout_files(one_level, tmp_path, status=STATUS)
    flowing = " ".join((tmp_path / "README.txt").read_text(encoding="utf-8").split())
    assert "0 ohm between feed and ground is intended" in flowing
    assert "10 mm long" in flowing
    assert "mirrored: do not flip" not in flowing


def test_layer_map(two_level: Layout, tmp_path: Path) -> None:
    write_layout_files(two_level, tmp_path, status=STATUS)
    assert read_layers_csv(tmp_path / "layers.csv") == LAYERS

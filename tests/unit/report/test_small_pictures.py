"""Stackup, bars and circuit: what stands in them is what they were given."""

from __future__ import annotations

import re
from dataclasses import replace
from pathlib import Path
from xml.etree import ElementTree
from xml.etree.ElementTree import Element

import pytest

from planar.brief import read_brief
from planar.design.design import Design, make_design
from planar.errors import RangeError
from planar.library import Library
from planar.network.circuit import Branch, Circuit, CouplingCapacitor, DcBranch, LineSection, OpenEnd
from planar.report.bars import Bar, Losses, loss_bar, percent, ranked_bars
from planar.report.circuit_picture import circuit_picture, engineering
from planar.report.stackup_picture import stackup_picture
from planar.stackup import Layer, LayerKind

SVG = "{http://www.w3.org/2000/svg}"
EXAMPLES = Path(__file__).parents[3] / "examples"
LOOP = Branch("loop", 0.0, 57.3e-9, 0.1423e-12, 2826.6)
CIRCUIT = Circuit(
    (LineSection(52.5, 0.678e-9), LineSection(120.3, 0.275e-9)),
    OpenEnd(LineSection(59.7, 0.4225e-9)),
    DcBranch(0.042, 91.2e-6),
    (LOOP, Branch("higher", 222.0, 155e-9, 0.119e-12)),
    0.209e-12,
    0.0077,
    (700e6, 1040e6),
)


def parsed(text: str) -> Element:
    root = ElementTree.fromstring(text)
    assert root.attrib["role"] == "img"
    assert [child.tag for child in root][:2] == [f"{SVG}title", f"{SVG}desc"]
    assert not re.search(r"\sid=|<script|href|url\(", text)
    width = float(root.attrib["viewBox"].split()[2])
    sizes = [float(element.attrib["font-size"]) for element in root.iter(f"{SVG}text")]
    assert min(sizes) * 330.0 / width >= 9.0  # on a phone: 330 px of 360 are left for the picture
    return root


def words(root: Element) -> list[str]:
    return ["".join(element.itertext()) for element in root.iter(f"{SVG}text")]


def numbers(text: str) -> list[float]:
    return [float(n) for n in re.findall(r"[-+]?\d+\.?\d*(?:e-?\d+)?", text.replace("\N{MINUS SIGN}", "-"))]


@pytest.fixture(scope="module")
def loop() -> Design:
    library = Library.open()
    return make_design(read_brief(EXAMPLES / "workshop-loop.toml", library), library, "workshop-loop.toml")


def test_stackup_says_thickness_and_material(loop: Design) -> None:
    """The layers of the brief: 1 mm of permittivity 3.5 with 35 um of copper."""
    text = stackup_picture(loop.choices.stackup, loop.layout, 1.85e9)
    said = " ".join(words(parsed(text)))
    assert "board, 1 mm" in said
    assert "εr 3.5, tan δ 0.0025" in said
    assert "top copper: loop" in said
    assert "35 µm foil" in said
    assert "Not to scale: thickness stretched" in said
    assert text == stackup_picture(loop.choices.stackup, loop.layout, 1.85e9)


def test_stackup_keeps_the_order_and_the_section(loop: Design) -> None:
    """A cover above, a reflector below; the copper that is cut lies where the loop's sides are."""
    model = loop.choices.stackup.substrate.model
    layers = (
        Layer("reflector", LayerKind.METAL_PLANE, "metal plane", 0.0),
        Layer("reflector-gap", LayerKind.AIR, "air", 40e-3, model),
        *loop.choices.stackup.layers,
        Layer("cover", LayerKind.COVER, "plastic", 2.5e-3, model),
    )
    root = parsed(stackup_picture(replace(loop.choices.stackup, layers=layers), loop.layout, 1.85e9))
    rects = root.findall(f"{SVG}g[@class='section']/{SVG}rect")
    heads = [rect.findtext(f"{SVG}title") or "" for rect in rects]
    tops = {head: float(rect.attrib["y"]) for head, rect in zip(heads, rects, strict=True)}
    copper = [rect for rect, head in zip(rects, heads, strict=True) if head.startswith("loop, top copper")]
    assert tops["cover"] < float(copper[0].attrib["y"]) < tops["dielectric"] < tops["reflector-gap"] < tops["reflector"]
    assert len(copper) == 2  # the loop is 45 mm wide on a board of 52.5 mm
    middles = [float(rect.attrib["x"]) + 0.5 * float(rect.attrib["width"]) for rect in copper]
    across = float(rects[heads.index("dielectric")].attrib["width"])
    assert (middles[1] - middles[0]) / across == pytest.approx(45.0 / 52.5, abs=1e-3)


def test_losses_are_told_in_per_cent_and_drawn_in_proportion() -> None:
    losses = Losses(0.71, 0.06, 0.05, 0.18)
    root = parsed(loss_bar(losses, "board"))
    assert [word for word in words(root) if word.endswith("%")] == ["71.0 %", "6.0 %", "5.0 %", "18.0 %"]
    bar = root.findall(f"{SVG}g[@class='bar']/{SVG}rect")
    starts = [float(rect.attrib["x"]) for rect in bar]
    assert (starts[3] - starts[1]) / (starts[1] - starts[0]) == pytest.approx(0.11 / 0.71, rel=1e-6)
    assert percent(0.9999) == "100.0 %"


def test_losses_that_do_not_add_up_are_refused() -> None:
    with pytest.raises(RangeError, match="do not add up"):
        loss_bar(Losses(0.7, 0.2, 0.2, 0.2), "board")
    with pytest.raises(RangeError, match="do not add up"):
        loss_bar(Losses(1.1, -0.1, 0.0, 0.0), "board")


def test_bars_are_ranked_by_size_with_their_sign() -> None:
    bars = [Bar("b", 1.25, "MHz"), Bar("a", -8.5, "MHz"), Bar("c", -0.31, "MHz")]
    root = parsed(ranked_bars(bars, "what moves the frequency"))
    said = words(root)
    assert said[::2] == ["a", "b", "c"]
    assert [numbers(value)[0] for value in said[1::2]] == [-8.5, 1.25, -0.31]
    rects = root.findall(f"{SVG}rect")
    widths = [float(rect.attrib["width"]) for rect in rects]
    assert widths[0] / widths[1] == pytest.approx(8.5 / 1.25, rel=1e-4)
    assert float(rects[0].attrib["x"]) < float(rects[1].attrib["x"])  # negative to the left


def test_bars_show_their_range_and_refuse_a_mixture() -> None:
    root = parsed(ranked_bars([Bar("permittivity", 61.0, "%", 52.0, 68.0)], "shares"))
    assert words(root)[1] == "61 % (52 to 68)"
    for bars in ([], [Bar("a", 1.0, "MHz"), Bar("b", 1.0, "%")]):
        with pytest.raises(RangeError):
            ranked_bars(bars, "none")


def test_circuit_tells_every_value() -> None:
    """Degrees are 360 f t: 0.678 ns are 211.5 degrees at 866.5 MHz."""
    said = words(parsed(circuit_picture(CIRCUIT, 866.5e6)))
    for value in ("52.5 Ω", "211.5°", "120 Ω", "85.8°", "59.7 Ω", "131.8°", "42.0 mΩ", "91.2 µH", "57.3 nH", "2.83 kΩ",
                  "0.142 pF", "222 Ω", "155 nH", "0.119 pF", "0.209 pF"):  # fmt: skip
        assert said.count(value) == 1, value
    assert f"mode loop: {LOOP.resonance / 1e9:.4g} GHz, Q {LOOP.quality:.3g}" in said
    assert any("within 0.0077" in line for line in said)


def test_circuit_draws_what_is_there() -> None:
    bare = replace(CIRCUIT, lines=(), coupling=None, dc=None, modes=(LOOP,), static_capacitance=0.0)
    coupled = replace(bare, coupling=CouplingCapacitor(1e-12))
    for circuit, count in ((CIRCUIT, 3 + 2 + 2 + 3 + 1), (bare, 2), (coupled, 3)):
        root = parsed(circuit_picture(circuit, 1e9))
        assert len(root.findall(f"{SVG}g[@class='symbol']")) == count
    assert "Degrees" not in " ".join(words(parsed(circuit_picture(bare, 1e9))))


@pytest.mark.parametrize(
    ("value", "unit", "text"),
    [
        (999.6, "Ω", "1.00 kΩ"),
        (47.0, "Ω", "47.0 Ω"),
        (0.0061, "Ω", "6.10 mΩ"),
        (0.358e-12, "F", "0.358 pF"),
        (5.78e-15, "F", "5.78 fF"),
        (1.2e-12, "F", "1.20 pF"),
        (86.1e-6, "H", "86.1 µH"),
    ],
)
def test_engineering_units(value: float, unit: str, text: str) -> None:
    """SI prefixes (SI brochure, 9th ed., table 7) in steps of a thousand, three digits."""
    assert engineering(value, unit) == text

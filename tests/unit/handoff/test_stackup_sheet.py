"""The stackup sheet: every layer, every line, every note, the same in JSON and in Markdown.

Authority: the stackup it is made from, sums done by hand, and common practice for the notes of a fab sheet.
"""

from __future__ import annotations

import json
from dataclasses import replace
from pathlib import Path

import pytest

from planar.errors import HandoffError
from planar.handoff.stackup_files import read_stackup_json, write_stackup_json, write_stackup_markdown
from planar.handoff.stackup_sheet import ImpedanceLine, SheetFacts, StackupSheet, stackup_sheet
from planar.library import WidebandDebye
from planar.stackup import Conductor, Layer, LayerKind, Stackup

FREQUENCY = 868.3e6
LINES = (
    ImpedanceLine("feed line", "microstrip", 3.05e-3, None, "top", "bottom", 50.0, 5.0, True),
    ImpedanceLine("strips", "coplanar strips", 1.14e-3, 0.27e-3, "top", "none", 150.0, None, False),
)
FACTS = SheetFacts("orchard", FREQUENCY, "ENIG", "IPC-4101/126", 0.15e-3, dc_short=True)


@pytest.fixture
def stackup() -> Stackup:
    laminate = WidebandDebye.from_point(4.3, 0.02, at=FREQUENCY)
    mask = WidebandDebye.from_point(3.5, 0.025, at=FREQUENCY)
    air = WidebandDebye.from_point(1.0, 0.0, at=FREQUENCY)
    layers = (
        Layer("reflector", LayerKind.METAL_PLANE, "metal plane", 0.0),
        Layer("reflector-gap", LayerKind.AIR, "air", 40e-3, air),
        Layer("copper-bottom", LayerKind.COPPER, "copper", 43e-6),
        Layer("dielectric", LayerKind.DIELECTRIC, "woven glass | epoxy", 1.6e-3, laminate, 0.1, 0.05, 0.3),
        Layer("copper-top", LayerKind.COPPER, "copper", 43e-6),
        Layer("mask-top", LayerKind.MASK, "solder mask", 20e-6, mask, 0.5),
        Layer("legend-top", LayerKind.LEGEND, "legend ink", 0.0),
    )
    return Stackup(layers, Conductor(base_thickness=35e-6, plating=8e-6, conductivity=5.8e7, roughness_rq=0.4e-6), 0.1)


@pytest.fixture
def sheet(stackup: Stackup) -> StackupSheet:
    return stackup_sheet(stackup, LINES, facts=FACTS)


def test_layers_top_to_bottom_and_totals(sheet: StackupSheet) -> None:
    names = [layer.name for layer in sheet.layers]
    assert names == ["legend-top", "mask-top", "copper-top", "dielectric", "copper-bottom"]
    assert [layer.name for layer in sheet.surroundings] == ["reflector-gap", "reflector"]
    assert sheet.total_thickness_m == pytest.approx(1.686e-3, rel=1e-12)
    assert sheet.masked_thickness_m == pytest.approx(1.706e-3, rel=1e-12)


def test_permittivity_at_the_design_frequency(sheet: StackupSheet) -> None:
    """The model goes through its data point, so that the sheet must show the point itself."""
    dielectric = sheet.layers[3]
    assert dielectric.eps_r == pytest.approx(4.3, rel=1e-9)
    assert dielectric.tan_d == pytest.approx(0.02, rel=1e-9)
    assert (dielectric.thickness_tolerance, dielectric.eps_r_tolerance) == (0.1, 0.05)
    copper = sheet.layers[2]
    assert (copper.thickness_m, copper.base_copper_m) == (43e-6, 35e-6)
    assert copper.eps_r is None
    assert copper.thickness_tolerance is None  # nobody stated one


@pytest.mark.parametrize(
    "words",
    [
        "finished copper at the foot of the conductor",
        "1:1 with no etch compensation",
        "35 um base, 43 um finished",
        "mask over the antenna: top side",
        "finish: ENIG",
        "Impedance-controlled: feed line. Not controlled, do not adjust: strips",
        "0 ohm between feed and ground is intended",
        "no thieving, teardrops, order number, width change or edge clip-back",
        "+-0.15 mm",
        "IPC-4101/126",
    ],
)
def test_notes_every_fab_sheet_carries(sheet: StackupSheet, words: str) -> None:
    assert words in "\n".join(sheet.notes)


def test_notes_follow_the_facts(stackup: Stackup) -> None:
    bare = replace(stackup, layers=tuple(a for a in stackup.layers if a.kind is not LayerKind.MASK))
    facts = replace(FACTS, dc_short=False, specification=None)
    text = "\n".join(stackup_sheet(bare, (), facts=facts).notes)
    assert "mask over the antenna: none" in text
    assert "not connected at DC" in text
    assert "0 ohm" not in text
    assert "no specification sheet known" in text
    assert "Impedance-controlled: none" in text


def test_json_round_trip(sheet: StackupSheet, tmp_path: Path) -> None:
    first, second = tmp_path / "one.json", tmp_path / "two.json"
    write_stackup_json(sheet, first)
    read = read_stackup_json(first)
    write_stackup_json(read, second)
    assert first.read_bytes() == second.read_bytes()
    assert read.facts.name == "orchard"
    assert read.notes == sheet.notes
    for got, line in zip(read.impedance_lines, LINES, strict=True):
        assert got.width_m == pytest.approx(line.width_m, abs=1e-12)
        assert (got.gap_m is None) == (line.gap_m is None)
        assert (got.name, got.impedance_ohm, got.tolerance_ohm) == (line.name, line.impedance_ohm, line.tolerance_ohm)
        assert (got.level, got.reference, got.controlled) == (line.level, line.reference, line.controlled)
    for got_layer, layer in zip(read.layers, sheet.layers, strict=True):
        assert (got_layer.name, got_layer.material) == (layer.name, layer.material)
        assert got_layer.thickness_m == pytest.approx(layer.thickness_m, abs=1e-12)


def test_json_numbers_carry_their_unit_in_the_key(sheet: StackupSheet, tmp_path: Path) -> None:
    write_stackup_json(sheet, tmp_path / "stackup.json")
    content = json.loads((tmp_path / "stackup.json").read_text(encoding="utf-8"))
    assert content["total_thickness_mm"] == 1.686
    assert content["frequency_hz"] == FREQUENCY
    dielectric = content["layers_top_to_bottom"][3]
    assert (dielectric["thickness_mm"], dielectric["eps_r"], dielectric["tan_d"]) == (1.6, 4.3, 0.02)
    assert content["layers_top_to_bottom"][2]["base_copper_mm"] == 0.035
    feed, strips = content["impedance_lines"]
    assert (feed["width_mm"], feed["impedance_ohm"], feed["tolerance_ohm"]) == (3.05, 50.0, 5.0)
    assert strips["gap_mm"] == 0.27
    assert strips["instruction"] == "not controlled, do not adjust"


def test_markdown_says_the_same(sheet: StackupSheet, tmp_path: Path) -> None:
    write_stackup_markdown(sheet, tmp_path / "stackup.md")
    text = (tmp_path / "stackup.md").read_text(encoding="utf-8")
    assert "at 868.3 MHz" in text
    assert r"| dielectric | woven glass \| epoxy | 1.6 mm +-10 % |  | 4.300 +-5 % | 0.0200 +-30 % |" in text
    assert "| copper-top | copper | 43 um | 35 um |  |  |" in text
    assert "Total 1.686 mm +-10 % with copper, without mask; 1.706 mm with mask." in text
    assert "| feed line | microstrip | 3.050 mm |  | top | bottom | 50.0 +-5.0 ohm | controlled" in text
    assert (
        "| strips | coplanar strips | 1.140 mm | 0.270 mm | top | none | 150.0 ohm | not controlled, do not adjust |"
        in text
    )
    assert "Not made by the fab" in text
    assert all(f"- {note}" in text for note in sheet.notes)


def test_same_bytes_twice(sheet: StackupSheet, tmp_path: Path) -> None:
    for writer in (write_stackup_json, write_stackup_markdown):
        for name in ("one", "two"):
            writer(sheet, tmp_path / name)
        assert (tmp_path / "one").read_bytes() == (tmp_path / "two").read_bytes()


@pytest.mark.parametrize("text", ["", "[]", "{}", '{"name": "x"}', "null"])
def test_other_files_are_refused(tmp_path: Path, text: str) -> None:
    (tmp_path / "stackup.json").write_text(text, encoding="utf-8")
    with pytest.raises(HandoffError, match=r"stackup\.json"):
        read_stackup_json(tmp_path / "stackup.json")

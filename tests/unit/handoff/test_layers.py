"""The layer table: names, numbers that do not clash, colours that can be seen.

Authority for contrast: WCAG 2.1, relative luminance and success criterion 1.4.11 (graphics: 3 to 1). Colours
of the DXF colour numbers: ezdxf's table.
"""

from __future__ import annotations

from pathlib import Path

import pytest
from ezdxf.colors import DXF_DEFAULT_COLORS, int2rgb

from planar.errors import HandoffError
from planar.handoff.layers import (
    DRILL_LAYERS,
    LAYERS,
    Layer,
    layer_named,
    name_of_gds,
    read_layers_csv,
    write_layers_csv,
)

WHITE, DARK = (255, 255, 255), (33, 40, 48)


def luminance(rgb: tuple[int, int, int]) -> float:
    linear = [c / 255 / 12.92 if c / 255 <= 0.04045 else ((c / 255 + 0.055) / 1.055) ** 2.4 for c in rgb]
    return 0.2126 * linear[0] + 0.7152 * linear[1] + 0.0722 * linear[2]


def contrast(one: tuple[int, int, int], other: tuple[int, int, int]) -> float:
    low, high = sorted((luminance(one), luminance(other)))
    return (high + 0.05) / (low + 0.05)


@pytest.mark.parametrize("layer", LAYERS, ids=lambda layer: layer.name)
def test_colour_reads_on_white_and_on_dark(layer: Layer) -> None:
    red, green, blue = int2rgb(DXF_DEFAULT_COLORS[layer.colour])
    assert contrast((red, green, blue), WHITE) >= 3.0
    assert contrast((red, green, blue), DARK) >= 3.0


def test_names_numbers_and_colours_are_unique() -> None:
    assert len({layer.name for layer in LAYERS}) == len(LAYERS)
    assert len({(layer.gds_layer, layer.gds_datatype) for layer in LAYERS}) == len(LAYERS)
    assert len({layer.colour for layer in LAYERS}) == len(LAYERS)


def test_look_up_by_name_and_by_number() -> None:
    for layer in LAYERS:
        assert layer_named(layer.name) is layer
        assert name_of_gds(layer.gds_layer, layer.gds_datatype) == layer.name
    assert name_of_gds(1, 7) == "1/7"
    assert set(DRILL_LAYERS) < {layer.name for layer in LAYERS}
    with pytest.raises(HandoffError, match="COPPER_TOP"):
        layer_named("COPPER_MIDDLE")


def test_layer_map_round_trip(tmp_path: Path) -> None:
    write_layers_csv(tmp_path / "layers.csv")
    assert read_layers_csv(tmp_path / "layers.csv") == LAYERS
    lines = (tmp_path / "layers.csv").read_text(encoding="utf-8").splitlines()
    assert lines[0] == "layer,gds_layer,gds_datatype,dxf_colour,holds"
    assert len(lines) == 1 + len(LAYERS)


@pytest.mark.parametrize(
    "text", ["", "name,number\nA,1\n", "layer,gds_layer,gds_datatype,dxf_colour,holds\nA,one,0,1,x\n"]
)
def test_other_files_are_refused(tmp_path: Path, text: str) -> None:
    (tmp_path / "layers.csv").write_text(text, encoding="utf-8")
    with pytest.raises(HandoffError, match=r"layers\.csv"):
        read_layers_csv(tmp_path / "layers.csv")

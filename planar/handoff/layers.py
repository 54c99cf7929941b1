"""The one table of layers: what every exchange file calls them and what they hold.

DXF, GDS, the layer map (`layers.csv`) and the README all read `LAYERS`, so that they cannot
disagree. Names are plain trade words. Colours are DXF colour numbers chosen for contrast: each one
stands out at least 3 to 1 on a white page and on a dark screen.
"""

from __future__ import annotations

import csv
import io
from dataclasses import dataclass
from pathlib import Path

from planar.errors import HandoffError


@dataclass(frozen=True)
class Layer:
    """A layer of the exchange files: DXF `name` and colour number, GDS numbers, `holds` in words."""

    name: str
    gds_layer: int
    gds_datatype: int
    colour: int
    holds: str


LAYERS: tuple[Layer, ...] = (
    Layer("COPPER_TOP", 1, 0, 42, "copper islands of the top level, one closed outline each"),
    Layer("COPPER_BOTTOM", 2, 0, 142, "copper islands of the bottom level seen from the top, not mirrored"),
    Layer("MASK_TOP", 11, 0, 92, "openings in the top solder mask"),
    Layer("MASK_BOTTOM", 12, 0, 125, "openings in the bottom solder mask seen from the top"),
    Layer("LEGEND_TOP", 21, 0, 181, "legend printed on the top side"),
    Layer("LEGEND_BOTTOM", 22, 0, 153, "legend printed on the bottom side seen from the top"),
    Layer("OUTLINE", 31, 0, 8, "board edge, and beside it the outlines cut out inside it"),
    Layer("SCORE", 32, 0, 150, "score lines drawn 0.1 mm wide, the cut is the middle"),
    Layer("DRILL_PLATED", 41, 0, 230, "plated holes, finished diameter"),
    Layer("DRILL_UNPLATED", 42, 0, 200, "unplated holes, finished diameter"),
    Layer("KEEPOUT", 51, 0, 20, "no copper but the antenna's own, no parts: on every level"),
    Layer("NET_TIE", 52, 0, 112, "round the copper that joins signal and return on purpose, not to be made"),
    Layer("DIMENSIONS", 61, 0, 65, "scale bar and 10 mm square outside the board, not to be made"),
)
"""Every layer an exchange file may hold, in the order they are listed everywhere."""

DRILL_LAYERS: tuple[str, ...] = ("DRILL_PLATED", "DRILL_UNPLATED")

_COLUMNS = ("layer", "gds_layer", "gds_datatype", "dxf_colour", "holds")


def layer_named(name: str) -> Layer:
    """The layer called `name`. Raises `HandoffError` when the table has none."""
    for layer in LAYERS:
        if layer.name == name:
            return layer
    raise HandoffError(f"no layer is called {name!r}; there are {', '.join(layer.name for layer in LAYERS)}")


def name_of_gds(number: int, datatype: int) -> str:
    """Name of a GDS layer and datatype; "number/datatype" when the table does not hold them."""
    for layer in LAYERS:
        if (layer.gds_layer, layer.gds_datatype) == (number, datatype):
            return layer.name
    return f"{number}/{datatype}"


def write_layers_csv(path: Path) -> None:
    """Write the layer map: one row per layer with name, GDS numbers, DXF colour and content."""
    text = io.StringIO()
    rows = csv.writer(text, lineterminator="\n")
    rows.writerow(_COLUMNS)
    rows.writerows((a.name, a.gds_layer, a.gds_datatype, a.colour, a.holds) for a in LAYERS)
    path.write_bytes(text.getvalue().encode("utf-8"))


def read_layers_csv(path: Path) -> tuple[Layer, ...]:
    """Layers of a layer map. Raises `HandoffError` when the file is none."""
    rows = list(csv.reader(io.StringIO(path.read_text(encoding="utf-8"))))
    header = ", ".join(rows[0]) if rows else ""
    if header != ", ".join(_COLUMNS):
        raise HandoffError(f"{path.name}: columns {header or 'missing'}, expected {', '.join(_COLUMNS)}")
    try:
        return tuple(Layer(name, int(n), int(d), int(c), holds) for name, n, d, c, holds in rows[1:])
    except ValueError as error:
        raise HandoffError(f"{path.name}: a row does not hold {', '.join(_COLUMNS)}") from error

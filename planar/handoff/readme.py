"""The page a PCB layout engineer reads before importing the copper.

It says what each file is, how to see that it came in at the right size and side, which copper is
meant to look like a short, and what must not be altered. Every number comes from the layout.
"""

from __future__ import annotations

import textwrap
from pathlib import Path

from planar.copper.layout import Layout, Level, Pad
from planar.handoff.content import SQUARE, scale_bar_length
from planar.handoff.dxf import SEGMENT_CHORD
from planar.handoff.gds import GDS_CHORD
from planar.handoff.layers import LAYERS

_WIDTH = 96


def write_layout_readme(layout: Layout, path: Path, *, status: str) -> None:
    """Write the page for a snapped `layout`. `status` says in one sentence how far its numbers can be trusted."""
    sections = [
        f"{layout.name}: printed loop antenna, copper for a PCB layout\n{status}",
        _titled("FILES", *_file_lines()),
        _titled("SIZE AND SIDE", *_wrapped(_size_and_side(layout))),
        _titled("COPPER", *_copper_lines(layout)),
        _titled("TERMINALS", *(_pad_line(pad) for pad in layout.pads), *_wrapped(_short_statement(layout))),
        _titled("KEEPOUT", *_wrapped(_KEEPOUT)),
        _titled("DO NOT ALTER", *_wrapped(_DO_NOT_ALTER)),
        _titled("LAYERS (DXF name, GDS layer/datatype)", *_layer_lines()),
    ]
    path.write_bytes(("\n\n".join(sections) + "\n").encode("utf-8"))


_KEEPOUT = (
    "The KEEPOUT outlines hold on every level, inner ones and those of the host board included: no copper but "
    "the antenna's own, no ground pour, no tracks, no vias, no parts, no metal screws."
)
_DO_NOT_ALTER = (
    "No width, gap or bend; no teardrops, thermal reliefs, thieving, solder mask change or text inside the "
    "antenna; no rounding to another grid; no rebuilding from measured widths. Dimensions are finished copper at "
    "the foot of the conductor, artwork 1:1 without etch compensation. Move or turn everything together only."
)


def _titled(title: str, *lines: str) -> str:
    return "\n".join([title, *(f"  {line}" for line in lines)])


def _wrapped(text: str) -> list[str]:
    return textwrap.wrap(text, _WIDTH - 2)


def _file_lines() -> list[str]:
    return [
        "board.dxf           true arcs (polylines with bulges): use this one",
        f"board-segments.dxf  arcs as segments, chord error {1e6 * SEGMENT_CHORD:.0f} um: where an importer drops arcs",
        f"board.gds           polygons on a 1 nm grid, chord error {1e6 * GDS_CHORD:.0f} um",
        "layers.csv          layer map          preview-*.svg  pictures at true scale",
    ]


def _size_and_side(layout: Layout) -> str:
    width, height = layout.size
    bar = 1e3 * scale_bar_length(layout)
    mirrored = "The bottom is drawn as seen through the board and is NOT mirrored: do not flip it on import. "
    bottom = mirrored if Level.BOTTOM in layout.levels else ""
    return (
        f"Units are millimetres. The origin is the feed. Every view is from the top. {bottom}The board measures "
        f"{1e3 * width:.3f} by {1e3 * height:.3f} mm. After import measure the scale bar on DIMENSIONS, {bar:.0f} mm "
        f"long, and the square, {1e3 * SQUARE:.0f} mm: anything else is a wrong unit (25.4 or 1000 times off)."
    )


def _copper_lines(layout: Layout) -> list[str]:
    lines = []
    for level in layout.levels:
        count = len(layout.copper(level))
        islands = f"{count} island{'' if count == 1 else 's'}"
        lines.append(f"{level:<8}{islands}, {1e6 * layout.area(level):.4f} mm2 in all")
    plated = sum(hole.plated for hole in layout.holes)
    return [*lines, f"holes   {plated} plated, {len(layout.holes) - plated} unplated, finished diameters"]


def _pad_line(pad: Pad) -> str:
    x0, y0, x1, y1 = pad.outline.bounds
    return (
        f"{pad.name} ({pad.terminal}) on {pad.level}: centre {500 * (x0 + x1):.4f}, {500 * (y0 + y1):.4f} mm, "
        f"{1e3 * (x1 - x0):.4f} by {1e3 * (y1 - y0):.4f} mm, net {pad.net}"
    )


def _short_statement(layout: Layout) -> str:
    if layout.dc_short:
        return (
            "Signal and return are one net: at DC the antenna is a short and 0 ohm between feed and ground is "
            "intended. A rule check will report it; do not open, cut or repair the loop."
        )
    return "Signal and return are not connected at DC on this board; do not join them."


def _layer_lines() -> list[str]:
    return [f"{a.name:<15}{a.gds_layer:>3}/{a.gds_datatype}  {a.holds}" for a in LAYERS]

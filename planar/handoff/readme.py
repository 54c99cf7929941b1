"""The page a PCB layout engineer reads before importing the copper; of a panel or coupon, what the files hold.

It says what each file is, how to see that it came in at the right size and side, which copper joins signal and return
on purpose, where nothing else may be, and what must not be altered. Every number comes from the layout.
"""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

from planar.copper.layout import Kind, Layout, Level, Pad
from planar.handoff.content import SQUARE, scale_bar_length
from planar.handoff.corridor import open_ways
from planar.handoff.dxf import SEGMENT_CHORD
from planar.handoff.gds import GDS_CHORD
from planar.handoff.kind_words import KIND_WORDS
from planar.handoff.layers import LAYERS
from planar.handoff.net_tie import net_ties
from planar.handoff.page import mm, page, place, titled, wrapped
from planar.handoff.readme_group import coupon_sections, panel_sections, tie_text


def write_layout_readme(layout: Layout, path: Path, *, status: str) -> None:
    """Write the page for a snapped `layout`. `status` says in one sentence how far its numbers can be trusted."""
    text = page(
        "\n".join([f"{layout.name}: {KIND_WORDS[layout.kind].what}", *wrapped(status)]),
        titled("FILES", *_file_lines(layout)),
        titled("SIZE AND SIDE", *wrapped(_size_and_side(layout))),
        titled("COPPER", *_copper_lines(layout)),
        *_SECTIONS[layout.kind](layout),
        titled("LAYERS (DXF name, GDS layer/datatype)", *_layer_lines()),
    )
    path.write_bytes(text.encode("utf-8"))


def _board_sections(layout: Layout) -> list[str]:
    return [
        titled("TERMINALS (centre, size, net)", *(_pad_line(pad) for pad in layout.pads)),
        titled("NET TIE", *wrapped(*_tie_texts(layout))),
        titled("KEEPOUT", *wrapped(_KEEPOUT, _corridor_text(layout))),
        titled("DO NOT ALTER", *wrapped(_DO_NOT_ALTER)),
    ]


_SECTIONS: dict[Kind, Callable[[Layout], list[str]]] = {
    Kind.SINGLE: _board_sections,
    Kind.ARRAY: panel_sections,
    Kind.COUPON: coupon_sections,
}
_KEEPOUT = (
    "The KEEPOUT outlines hold on every level, inner ones and those of the host board included: no copper but "
    "the antenna's own, no ground pour, no tracks, no vias, no parts, no metal screws."
)
_DO_NOT_ALTER = (
    "No width, gap or bend; no teardrops, thermal reliefs, thieving, solder mask change or text inside the "
    "antenna; no rounding to another grid; no rebuilding from measured widths. Dimensions are finished copper at "
    "the foot of the conductor, artwork 1:1 without etch compensation. Move or turn everything together only."
)
_HOW_TO_TIE = (
    "Make the antenna one part, the lands its pins, all its copper the part's own. Give signal and return their own "
    "nets outside, mark the part as a net tie (an intended short between its pins) and let the rule check pass it "
    "there only; leave it out of the parts list. Do not open, cut or repair the loop."
)


def _file_lines(layout: Layout) -> list[str]:
    previews = ", ".join(f"preview-{level}.svg" for level in layout.levels)
    return [
        "board.dxf           true arcs (polylines with bulges): use this one",
        f"board-segments.dxf  arcs as segments, chord error {1e6 * SEGMENT_CHORD:.0f} um: where an importer drops arcs",
        f"board.gds           polygons on a 1 nm grid, chord error {1e6 * GDS_CHORD:.0f} um",
        "outline.dxf         board edge and unplated holes alone, for a mechanical drawing",
        f"layers.csv          layer map; pictures at true scale: {previews}",
    ]


def _size_and_side(layout: Layout) -> str:
    width, height = layout.size
    words = KIND_WORDS[layout.kind]
    feed = "The origin is the feed. " if words.origin == "feed" else ""
    bar = 1e3 * scale_bar_length(layout)
    mirrored = "The bottom is drawn as seen through the board and is NOT mirrored: do not flip it on import. "
    bottom = mirrored if Level.BOTTOM in layout.levels else ""
    return (
        f"Units are millimetres. {feed}Every view is from the top. {bottom}The {words.thing} measures "
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
    centre = place((0.5 * (x0 + x1), 0.5 * (y0 + y1)), 4)
    return (
        f"{pad.name} ({pad.terminal}) on {pad.level}: {centre} mm, {mm(x1 - x0, 4)} by {mm(y1 - y0, 4)} mm, {pad.net}"
    )


def _tie_texts(layout: Layout) -> list[str]:
    """What joins signal and return and how to mark it, or that nothing does."""
    ties = net_ties(layout)
    if not ties:
        return ["Signal and return are not connected at DC on this board: no net tie, do not join them."]
    return [
        "Signal and return are one net: at DC the antenna is a short and 0 ohm between feed and ground is intended.",
        *(f"{tie_text(tie)} Outlined on NET_TIE." for tie in ties),
        _HOW_TO_TIE,
    ]


def _corridor_text(layout: Layout) -> str:
    """Where the board is free of keepout: the way to the feed."""
    pieces = open_ways(layout)
    if not pieces:
        return "No way to the feed is left open in it: what feeds the antenna comes at right angles to the board."
    boxes = " and ".join(f"x {mm(x0)} to {mm(x1)} mm, y {mm(y0)} to {mm(y1)} mm" for x0, y0, x1, y1 in pieces)
    return f"Left open for the feed: {boxes}. Only the connector or the feeding line and its ground go there."


def _layer_lines() -> list[str]:
    return [f"{a.name:<15}{a.gds_layer:>3}/{a.gds_datatype}  {a.holds}" for a in LAYERS]

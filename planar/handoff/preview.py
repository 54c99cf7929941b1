"""A picture of one side of a board, panel or coupon at true scale, arcs kept, seen from the top.

The drawing's unit is the millimetre; y is negated because SVG counts it downwards. The board carries
its own pale ground and everything off the board is drawn in middle tones, so that the picture reads
on a light and on a dark page.
"""

from __future__ import annotations

import math
from collections.abc import Iterable
from pathlib import Path
from xml.sax.saxutils import escape

from planar.copper.layout import Hole, Kind, Layout, Level, Port, Score, bounds_of
from planar.copper.outline import Outline
from planar.copper.svg_path import decimal, path_data, place
from planar.handoff.kind_words import KIND_WORDS

_MARGIN_MM = 5.0
_CAPTION_MM = 5.0
_GRID_MM = 10
_MIDDLE_TONE = "#7b8088"
_BOARD, _BOARD_EDGE = "#e3e6d8", "#6f7a68"
_COPPER = {Level.TOP: "#b5622b", Level.BOTTOM: "#2f7182"}
_OPENING, _LEGEND, _KEEPOUT, _FEED = "#f0c955", "#43356b", "#c9455a", "#8a2a9b"
_HOLE, _PLATING = "#fbfaf5", "#4a4f57"
_SCORE = "#1f5fa8"
_BEYOND, _BEYOND_GROUND = "#2b3037", "#f7f5ec"
_MARKED_BELOW_MM, _MARK_MM = 0.8, 0.6
"""Plated holes smaller than the first get a ring of the second radius: the hole itself is a dot."""


def write_preview_svg(layout: Layout, level: Level, path: Path) -> None:
    """Write a picture of `level` of a snapped `layout`. The same layout gives the same bytes."""
    x0, y0, x1, y1 = (1e3 * value for value in bounds_of([layout.edge, *layout.keepout, *layout.copper(level)]))
    left, bottom, right, top = x0 - _MARGIN_MM, y0 - _MARGIN_MM - _CAPTION_MM, x1 + _MARGIN_MM, y1 + _MARGIN_MM
    width, height = decimal(right - left), decimal(top - bottom)
    title = escape(f"{layout.name}, {level} copper")
    caption = _caption(layout, level)
    letter_height = min(2.6, 1.8 * (x1 - x0) / len(caption))  # a letter is about half as wide as high
    lines = [
        f'<svg xmlns="http://www.w3.org/2000/svg" width="{width}mm" height="{height}mm" '
        f'viewBox="{decimal(left)} {decimal(-top)} {width} {height}" '
        f'role="img" aria-labelledby="title-{level} desc-{level}">',
        f'<title id="title-{level}">{title}</title>',
        f'<desc id="desc-{level}">{escape(_description(layout, level))}</desc>',
        *_side(layout, level),
        *_grid((left, y0 - _MARGIN_MM, right, top)),
        *(_port_mark(port) for port in layout.ports),
        f'<path d="M-2 0H2M0 -2V2" fill="none" stroke="{_FEED}" stroke-width="0.15"/>',
        f'<text x="{decimal(x0)}" y="{decimal(-bottom - 2.0)}" font-family="sans-serif" '
        f'font-size="{decimal(letter_height)}" fill="{_MIDDLE_TONE}">{caption}</text>',
        "</svg>",
    ]
    path.write_bytes(("\n".join(lines) + "\n").encode("utf-8"))


def _caption(layout: Layout, level: Level) -> str:
    through = ", through the board" if level is Level.BOTTOM else ""
    beyond = "; dotted: other level" if len(layout.levels) > 1 else ""
    feed = " and feed" if KIND_WORDS[layout.kind].origin == "feed" else ""
    vias = "; ring: plated hole" if any(_is_small(hole) for hole in layout.holes) else ""
    return f"{level} copper, seen from the top{through}; grid {_GRID_MM} mm; cross: origin{feed}{beyond}{vias}"


def _description(layout: Layout, level: Level) -> str:
    width, height = layout.size
    thing, origin = KIND_WORDS[layout.kind].thing.capitalize(), "the origin is the feed"
    if layout.kind is not Kind.SINGLE:
        origin = f"the cross is the origin; {len(layout.cutouts)} cutouts and {len(layout.scores)} score lines"
    keepout = "legend and, dashed, the keepout of every level"
    return (
        f"{thing} of {1e3 * width:.3f} by {1e3 * height:.3f} mm with {len(layout.copper(level))} copper islands of "
        f"{1e6 * layout.area(level):.2f} square mm on the {level} level, {len(layout.holes)} holes, mask openings, "
        f"{keepout if layout.keepout or layout.kind is Kind.SINGLE else 'and legend'}. Seen from the top, {origin}."
    )


def _side(layout: Layout, level: Level) -> list[str]:
    """Board, copper, the other level dotted, openings, legend, holes, keepout: each over the one before."""
    openings = [marking.outline for marking in layout.mask_openings if marking.level == level]
    legend = [marking.outline for marking in layout.legend if marking.level == level]
    return [
        _group("board", [layout.edge], f'fill="{_BOARD}" stroke="{_BOARD_EDGE}" stroke-width="0.2"'),
        _group("copper", layout.copper(level), f'fill="{_COPPER[level]}"'),
        *_beyond(layout, level),
        _group(
            "mask-openings",
            openings,
            f'fill="{_OPENING}" fill-opacity="0.45" stroke="{_OPENING}" stroke-width="0.12"',
        ),
        _group("legend", legend, f'fill="{_LEGEND}"'),
        *_cuts(layout),
        *_holes(layout),
        _group(
            "keepout",
            layout.keepout,
            f'fill="none" stroke="{_KEEPOUT}" stroke-width="0.25" stroke-dasharray="1.5 1"',
        ),
    ]


def _beyond(layout: Layout, level: Level) -> list[str]:
    """Copper of the other level: dark dots on a pale line, which show on board and copper alike."""
    outlines = [island.outline for island in layout.islands if island.level != level]
    ground = f'fill="none" stroke="{_BEYOND_GROUND}" stroke-width="0.3"'
    dots = f'fill="none" stroke="{_BEYOND}" stroke-width="0.15" stroke-dasharray="0.6 0.4"'
    return [_group("copper-beyond-ground", outlines, ground), _group("copper-beyond", outlines, dots)]


def _group(name: str, outlines: Iterable[Outline], style: str) -> str:
    return "\n".join([f'<g class="{name}" {style}>', *(f'<path d="{path_data(o)}"/>' for o in outlines), "</g>"])


def _cuts(layout: Layout) -> list[str]:
    """Cutouts as holes in the board, outlines of the boards in a panel, score lines; nothing where there are none."""
    edge = f'stroke="{_BOARD_EDGE}" stroke-width="0.2"'
    groups = [
        (layout.cutouts, _group("cutouts", layout.cutouts, f'fill="{_HOLE}" {edge}')),
        (layout.boards, _group("boards", layout.boards, f'fill="none" {edge}')),
        (layout.scores, _score_lines(layout.scores)),
    ]
    return [text for things, text in groups if things]


def _score_lines(scores: Iterable[Score]) -> str:
    data = "".join(f"M{place(*score.start)}L{place(*score.end)}" for score in scores)
    return f'<path class="scores" d="{data}" fill="none" stroke="{_SCORE}" stroke-width="0.3" stroke-dasharray="3 1"/>'


def _holes(layout: Layout) -> list[str]:
    circles = []
    for hole in layout.holes:
        x, y = decimal(1e3 * hole.centre[0]), decimal(-1e3 * hole.centre[1])
        stroke = _PLATING if hole.plated else _BOARD_EDGE
        circles.append(f'<circle cx="{x}" cy="{y}" r="{decimal(500 * hole.diameter)}" stroke="{stroke}"/>')
    rings = [
        f'<circle cx="{decimal(1e3 * hole.centre[0])}" cy="{decimal(-1e3 * hole.centre[1])}" r="{_MARK_MM}"/>'
        for hole in layout.holes
        if _is_small(hole)
    ]
    return [
        f'<g class="holes" fill="{_HOLE}" stroke-width="0.12">',
        *circles,
        "</g>",
        f'<g class="small-holes" fill="none" stroke="{_HOLE}" stroke-width="0.2">',
        *rings,
        "</g>",
    ]


def _is_small(hole: Hole) -> bool:
    return hole.plated and 1e3 * hole.diameter < _MARKED_BELOW_MM


def _grid(box: tuple[float, float, float, float]) -> list[str]:
    """Lines every 10 mm within `box` (x_min, y_min, x_max, y_max in mm)."""
    x0, y0, x1, y1 = box
    across = [f"M{x} {decimal(-y1)}V{decimal(-y0)}" for x in _ticks(x0, x1)]
    along = [f"M{decimal(x0)} {-y}H{decimal(x1)}" for y in _ticks(y0, y1)]
    style = f'fill="none" stroke="{_MIDDLE_TONE}" stroke-width="0.08" stroke-opacity="0.45"'
    return [f'<path class="grid" d="{"".join(across + along)}" {style}/>']


def _ticks(low: float, high: float) -> range:
    return range(math.ceil(low / _GRID_MM) * _GRID_MM, math.floor(high / _GRID_MM) * _GRID_MM + 1, _GRID_MM)


def _port_mark(port: Port) -> str:
    """An arrow along the port's direction for a gap; a ring for a vertical port."""
    (x, y), (ux, uy) = port.centre, port.direction
    style = f'fill="none" stroke="{_FEED}" stroke-width="0.2"'
    if port.kind != "gap":
        return f'<circle cx="{decimal(1e3 * x)}" cy="{decimal(-1e3 * y)}" r="{decimal(500 * port.width)}" {style}/>'
    half = 0.5 * port.length
    head = min(half, 0.5 * port.width)
    tail, tip = (x - half * ux, y - half * uy), (x + half * ux, y + half * uy)
    barbs = [(tip[0] - head * (ux + s * uy), tip[1] - head * (uy - s * ux)) for s in (-0.5, 0.5)]
    arrow = f"M{place(*tail)}L{place(*tip)}M{place(*barbs[0])}L{place(*tip)}L{place(*barbs[1])}"
    return f'<path d="{arrow}" {style}/>'

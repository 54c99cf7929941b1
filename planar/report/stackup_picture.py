"""The stackup as a section across the board and its surroundings, thicknesses stretched so that each can be seen.

Across, the section is to scale: it cuts the real copper at a height above the feed, so that line and loop appear where
they are. Up, order is true and a thicker layer is drawn thicker, but not in proportion. Beside each layer stand its
thickness, material, permittivity and loss tangent.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

from planar.copper.layout import Layout, Level, Role, bounds_of
from planar.copper.outline import Outline
from planar.report.board_copper import ROLES
from planar.report.dimension_marks import millimetres
from planar.report.svg import (
    Box,
    Lettering,
    colour,
    element,
    group,
    pen,
    spread,
    svg_document,
    text,
    tooltip,
    wrapped,
)
from planar.stackup import Layer, LayerKind, Stackup, loss_tangent
from planar.units import show

WIDTH, SECTION = 380.0, 128.0
"""Units of the picture and of the section in it; letters are 11 units high, 10 px on a phone of 360 px."""
SIZE, LINE = 11.0, 13.5
THINNEST, PER_DECADE, FROM = 9.0, 15.0, 1.5e-5
"""A layer of `FROM` m is THINNEST units thick, each factor of ten adds PER_DECADE."""
CUT = 0.2
"""The section is this far, in heights of the copper, above its middle: it meets loop, line and strips."""
LEAST_PATCH = 2.5
"""Units, copper is drawn no narrower."""
FILLS = {
    LayerKind.DIELECTRIC: "dielectric",
    LayerKind.MASK: "mask",
    LayerKind.COVER: "cover",
    LayerKind.METAL_PLANE: "metal",
}
NAMES = {
    LayerKind.METAL_PLANE: "reflector",
    LayerKind.AIR: "air",
    LayerKind.MASK: "solder mask",
    LayerKind.DIELECTRIC: "board",
    LayerKind.COVER: "cover",
}
PLANE = 7.0
"""Units, thickness a metal plane is drawn with."""


@dataclass(frozen=True)
class _Row:
    """A layer with the height it is drawn at."""

    layer: Layer
    top: float
    bottom: float


def stackup_picture(stackup: Stackup, layout: Layout, frequency: float) -> str:
    """Section across `layout` on `stackup`; permittivities at `frequency` Hz. SVG text.

    Raises `RangeError` outside the frequency range of a layer's model.
    """
    rows = _rows(stackup)
    height = _cut_height(layout)
    notes = [_note(row.layer, stackup, layout, frequency) for row in rows]
    tall = [(1 + len(note[1])) * LINE + 4.0 for note in notes]
    centres = spread([0.5 * (row.top + row.bottom) for row in rows], tall)
    top = min([rows[0].top, *(c - 0.5 * h for c, h in zip(centres, tall, strict=True))]) - 4.0
    bottom = max([rows[-1].bottom, *(c + 0.5 * h for c, h in zip(centres, tall, strict=True))])
    caption = wrapped(_caption(stackup, height, frequency), WIDTH - 8.0, SIZE)
    below = [
        text((4.0, bottom + (i + 1) * LINE), line, Lettering(SIZE, "start", "muted")) for i, line in enumerate(caption)
    ]
    drawn = [part for row in _mask_round_copper(rows) for part in _drawn(row, layout, height)]
    words = [part for row, note, c in zip(rows, notes, centres, strict=True) for part in _written(row, note, c)]
    view = Box(0.0, top, WIDTH, bottom + (len(caption) + 0.6) * LINE)
    title = f"{layout.name}, stackup"
    said = "; ".join(f"{head}: {', '.join(rest)}" for head, rest in notes)
    body = [group("section", {}, drawn), group("notes", {}, words), group("caption", {}, below)]
    return svg_document(view, _shown(view), (title, f"From the top down: {said}"), body)


def _shown(view: Box) -> tuple[str, str]:
    """A fifth larger than laid out: letters of 13 px where there is room."""
    return f"{1.2 * view.width:.6g}", f"{1.2 * view.height:.6g}"


def _caption(stackup: Stackup, height: float, frequency: float) -> str:
    where = f"{millimetres(abs(height))} {'below' if height < 0.0 else 'above'} the feed"
    masked = any(layer.kind is LayerKind.MASK for layer in stackup.layers)
    mask = f", {millimetres(stackup.masked_thickness)} with mask" if masked else ""
    return (
        f"Section {where}. Not to scale: thickness stretched. Board {millimetres(stackup.total_thickness)} with "
        f"copper{mask}. Permittivity at {show(frequency, 'frequency')}."
    )


def _rows(stackup: Stackup) -> list[_Row]:
    """The layers that have a body, from the top down; mask lies in one row with the copper it covers."""
    rows: list[_Row] = []
    at = 0.0
    for layer in reversed(stackup.layers):
        if layer.kind is LayerKind.LEGEND:
            continue
        thick = PLANE if layer.kind is LayerKind.METAL_PLANE else _stretched(layer.thickness)
        rows.append(_Row(layer, at, at + thick))
        at += thick
    return rows


def _mask_round_copper(rows: Sequence[_Row]) -> list[_Row]:
    """The rows in the order they are drawn: mask reaches down to the board, and the copper lies in it."""
    copper = [row for row in rows if row.layer.kind is LayerKind.COPPER]
    found = []
    for row in rows:
        if row.layer.kind is LayerKind.MASK:
            inner = [each for each in copper if each.top == row.bottom or each.bottom == row.top]
            low, high = min(each.top for each in [row, *inner]), max(each.bottom for each in [row, *inner])
            found.append(_Row(row.layer, low, high))
        elif row not in copper:
            found.append(row)
    return [*found, *copper]


def _stretched(thickness: float) -> float:
    return max(THINNEST, THINNEST + PER_DECADE * math.log10(max(thickness, 1e-9) / FROM))


def _cut_height(layout: Layout) -> float:
    """Height m above the origin of the section."""
    radiators = [island.outline for island in layout.islands if island.role is Role.RADIATOR]
    _, y0, _, y1 = bounds_of(radiators or [island.outline for island in layout.islands])
    return 0.5 * (y0 + y1) + CUT * (y1 - y0)


def _cuts(outline: Outline, height: float) -> list[tuple[float, float]]:
    """Where the level line at `height` m runs inside `outline`: pairs of x in m."""
    points = outline.flattened(1e-5).tolist()
    crossings = []
    for (x0, y0), (x1, y1) in zip(points, [*points[1:], points[0]], strict=True):
        if (y0 > height) != (y1 > height):
            crossings.append(x0 + (height - y0) / (y1 - y0) * (x1 - x0))
    ordered = sorted(crossings)
    return list(zip(ordered[::2], ordered[1::2], strict=True))


def _drawn(row: _Row, layout: Layout, height: float) -> list[str]:
    layer = row.layer
    box: dict[str, str | float] = {"x": 4.0, "y": row.top, "width": SECTION, "height": row.bottom - row.top}
    if layer.kind is LayerKind.COPPER:
        return _copper(row, layout, height)
    if layer.kind is LayerKind.AIR:
        dashed = pen("muted", 0.7, {"stroke-dasharray": "2 3"})
        return [element("rect", box | dashed, tooltip(layer.name))]
    drawn = [element("rect", box | {"fill": colour(FILLS[layer.kind])}, tooltip(layer.name))]
    if layer.kind is LayerKind.METAL_PLANE:
        slant = "".join(
            f"M{4.0 + i} {row.bottom:.6g}l6 {row.top - row.bottom:.6g}" for i in range(2, int(SECTION) - 6, 8)
        )
        drawn.append(element("path", {"d": slant, "stroke": colour("ink"), "stroke-width": 0.7}))
    return drawn


def _copper(row: _Row, layout: Layout, height: float) -> list[str]:
    """The cut copper of a level, with the mask or air it lies in around it."""
    level = Level(row.layer.name.removeprefix("copper-"))
    x0, _, x1, _ = layout.edge.bounds
    across = SECTION / (x1 - x0)
    patches = []
    for island in layout.islands:
        if island.level != level:
            continue
        for left, right in _cuts(island.outline, height):
            width = max(LEAST_PATCH, across * (right - left))
            x = 4.0 + across * (0.5 * (left + right) - x0) - 0.5 * width
            box: dict[str, str | float] = {"x": x, "y": row.top, "width": width, "height": row.bottom - row.top}
            words = f"{ROLES[island.role]}, {level} copper: {millimetres(right - left)} of copper here"
            patches.append(element("rect", box | {"fill": colour(f"copper-{level}")}, tooltip(words)))
    return patches


def _note(layer: Layer, stackup: Stackup, layout: Layout, frequency: float) -> tuple[str, list[str]]:
    """Head line and further lines beside a layer."""
    if layer.kind is LayerKind.COPPER:
        level = Level(layer.name.removeprefix("copper-"))
        roles = [i.role for i in layout.islands if i.level == level]
        what = " and ".join(ROLES[role] for role in (Role.RADIATOR, Role.LINE) if role in roles)
        thick = f"{_thickness(stackup.finished_copper)} finished, {_thickness(stackup.base_copper)} foil"
        return f"{level} copper: {what}", [thick]
    if layer.kind is LayerKind.METAL_PLANE:
        return "reflector", [layer.material]
    head = f"{NAMES[layer.kind]}, {_thickness(layer.thickness)}"
    if layer.kind is LayerKind.AIR:
        return head, []
    eps = layer.permittivity(frequency)
    electric = f"εr {eps.real:.3g}, tan δ {loss_tangent(eps):.2g}"
    room = WIDTH - SECTION - 30.0
    material = [] if layer.kind is LayerKind.MASK else wrapped(layer.material, room, SIZE)
    return head, [*material, electric]


def _thickness(value: float) -> str:
    """Thickness with its unit: um below a tenth of a millimetre, as foils are named."""
    return show(value, "length", 4).replace("um", "µm")


def _written(row: _Row, note: tuple[str, Sequence[str]], centre: float) -> list[str]:
    """The note beside the section and the line that leads to its layer."""
    head, rest = note
    x = SECTION + 30.0
    first = centre - 0.5 * (1 + len(rest)) * LINE + 0.78 * LINE
    middle = 0.5 * (row.top + row.bottom)
    bend = ((SECTION + 4.0, middle), (SECTION + 10.0, middle), (SECTION + 20.0, centre), (x - 4.0, centre))
    leader = " ".join(f"{across:.6g},{down:.6g}" for across, down in bend)
    lines = [text((x, first), head, Lettering(SIZE, "start", "ink", bold=True))]
    lines += [text((x, first + (i + 1) * LINE), line, Lettering(SIZE, "start", "muted")) for i, line in enumerate(rest)]
    return [element("polyline", pen("muted", 0.7, {"points": leader})), *lines]

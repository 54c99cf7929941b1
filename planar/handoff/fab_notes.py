"""The notes of the fabrication drawing: every question a fab asks, answered, or no drawing at all.

Most answers are the notes of the stackup sheet, so that the two papers say the same; what the sheet leaves open
(permittivity, thickness, netlist) is added. `QUESTIONS` lists what must be answered and the words that show it.
"""

from __future__ import annotations

import re
from collections.abc import Iterator
from dataclasses import dataclass, replace

from planar.copper.layout import Kind, Layout, Role
from planar.errors import HandoffError
from planar.handoff.gerber_attributes import ProjectFacts
from planar.handoff.panel_notes import PANEL_QUESTIONS, PanelFacts, panel_contradictions, panel_notes
from planar.handoff.sheet_cells import with_spread
from planar.handoff.stackup_sheet import StackupSheet
from planar.stackup import LayerKind
from planar.units import show


@dataclass(frozen=True)
class DrawingFacts:
    """What a drawing says beside layout and stackup: `project` with name, revision and hash, the file name of the
    `netlist`, `hole_tolerance_m` of finished diameters in m, `panel` where the layout is one."""

    project: ProjectFacts
    netlist: str
    hole_tolerance_m: float
    panel: PanelFacts | None = None


QUESTIONS: tuple[tuple[str, str], ...] = (
    ("where a conductor's width is measured", "at the foot of the conductor"),
    ("who compensates for etching", "etch compensation"),
    ("base and finished copper", r"Copper: .*\d.* base, .*\d.* finished"),
    ("mask over the antenna", r"Solder mask over the antenna: \S"),
    ("finish", r"Surface finish: [^\s.]"),
    ("what may be added or changed", "no thieving, teardrops, order number, width change or edge clip-back"),
    ("which line has a controlled impedance", r"Impedance-controlled: \S.*Not controlled, do not adjust: \S"),
    ("DC short between feed and ground", r"DC short|not connected at DC"),
    ("outline tolerance", r"outline tolerance: \+-\S*\d"),
    ("hole tolerance", r"hole diameters: .*\+-\S*\d"),
    ("laminate and its specification", r"Laminate: [^\s;].*; \S"),
    ("permittivity and its frequency", r"Permittivity of the laminate: \d.* at \d"),
    ("board thickness and its tolerance", r"Board thickness: \d.*\+-\S*\d"),
    ("netlist and electrical test", r"Netlist supplied: \S+\. .*electrical test"),
)
"""What the fabrication drawing of a board answers, and a pattern the answer must match."""
_COUPON_ANSWERS = {
    "mask over the antenna": ("where mask goes", r"Solder mask as its files show: \S"),
    "DC short between feed and ground": ("DC short between signal and return", r"DC short|not connected at DC"),
}
"""Questions that a coupon, which has no antenna, is asked in other words."""
_COUPON_QUESTIONS = (("how the coupons are delivered", r"Delivery: single coupons"),)


def questions(kind: Kind) -> tuple[tuple[str, str], ...]:
    """What the drawing of a layout of `kind` answers, and a pattern each answer must match."""
    if kind is Kind.ARRAY:
        return QUESTIONS + PANEL_QUESTIONS
    if kind is Kind.COUPON:
        return tuple(_COUPON_ANSWERS.get(pair[0], pair) for pair in QUESTIONS) + _COUPON_QUESTIONS
    return QUESTIONS


def fab_notes(layout: Layout, sheet: StackupSheet, *, facts: DrawingFacts) -> tuple[str, ...]:
    """The notes of the drawing, in order.

    Raises `HandoffError` naming every question without an answer, every blank in the title block, and where sheet
    and layout disagree.
    """
    notes = (*sheet.notes, *_added_notes(sheet, facts), *_delivery_notes(layout, sheet, facts))
    faults = [*_blank_fields(sheet, facts), *_contradictions(layout, sheet, facts)]
    asked = questions(layout.kind)
    faults += [f"no answer to: {q}" for q, words in asked if not any(re.search(words, n) for n in notes)]
    if faults:
        raise HandoffError("\n".join(["the fabrication drawing cannot be made:", *faults]))
    return notes


def _added_notes(sheet: StackupSheet, facts: DrawingFacts) -> Iterator[str]:
    at = show(sheet.facts.frequency_hz, "frequency")
    cores = [layer for layer in sheet.layers if layer.kind == LayerKind.DIELECTRIC]
    if cores and all(layer.eps_r is not None for layer in cores):
        values = ", ".join(with_spread(f"{layer.eps_r:.3f}", layer.eps_r_tolerance) for layer in cores)
        yield f"Permittivity of the laminate: {values} at {at}. Do not substitute another laminate."
    if sheet.thickness_tolerance > 0.0:
        total = with_spread(show(sheet.total_thickness_m, "length"), sheet.thickness_tolerance)
        yield f"Board thickness: {total}, copper included, mask excluded."
    if facts.hole_tolerance_m > 0.0:
        yield f"All hole diameters: finished, +-{show(facts.hole_tolerance_m, 'length')}."
    yield f"Netlist supplied: {facts.netlist}. Do a bare-board electrical test of every board against it."


def _delivery_notes(layout: Layout, sheet: StackupSheet, facts: DrawingFacts) -> Iterator[str]:
    if layout.kind is Kind.ARRAY and facts.panel is not None:
        yield from panel_notes(layout, sheet.total_thickness_m, facts.panel)
    if layout.kind is Kind.COUPON:
        yield "Delivery: single coupons, cut along their outline."


def _blank_fields(sheet: StackupSheet, facts: DrawingFacts) -> Iterator[str]:
    """Fields whose text is blank or whose number says nothing."""
    texts = {
        "name": sheet.facts.name,
        "revision": facts.project.revision,
        "netlist": facts.netlist,
        "finish": sheet.facts.finish,
        **{f"material of {layer.name}": layer.material for layer in sheet.layers},
    }
    if sheet.facts.specification is not None:  # None is an answer: "none known"
        texts["laminate specification"] = sheet.facts.specification
    yield from (f"{what} is blank" for what, text in texts.items() if not text.strip())
    if sheet.facts.outline_tolerance_m <= 0.0:
        yield "outline tolerance is not positive"
    for layer in sheet.layers:
        if layer.kind == LayerKind.COPPER and not layer.base_copper_m:
            yield f"base copper of {layer.name} is blank"
        if layer.kind != LayerKind.LEGEND and layer.thickness_m <= 0.0:
            yield f"thickness of {layer.name} is blank"


def _contradictions(layout: Layout, sheet: StackupSheet, facts: DrawingFacts) -> Iterator[str]:
    coppers = sum(layer.kind == LayerKind.COPPER for layer in sheet.layers)
    if coppers != len(layout.levels):
        yield f"the stackup has {coppers} copper layers, the layout {len(layout.levels)}"
    if sheet.facts.kind != layout.kind:
        yield f"the stackup sheet is of kind {sheet.facts.kind}, the layout {layout.kind}"
    if (facts.panel is None) != (layout.kind is not Kind.ARRAY):
        yield f"facts of a panel {'missing' if facts.panel is None else 'given'} for a layout of kind {layout.kind}"
    elif facts.panel is not None:
        yield from panel_contradictions(layout, facts.panel)
    if facts.project.name != sheet.facts.name:
        yield f"the project is called {facts.project.name!r}, the stackup sheet {sheet.facts.name!r}"
    if sheet.facts.dc_short != (short := _antenna_short(layout)):
        yield f"the sheet says DC short {sheet.facts.dc_short}, the layout {short}"


def _antenna_short(layout: Layout) -> bool:
    """Whether the antennas are DC shorts; a short to measure on a coupon beside them is none of theirs."""
    antennas = {island.part for island in layout.islands if island.role is Role.RADIATOR}
    pads = tuple(pad for pad in layout.pads if pad.part in antennas)
    return replace(layout, pads=pads).dc_short if antennas else layout.dc_short

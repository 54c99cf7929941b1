"""The page the fab's CAM operator reads: what each file is, and an answer to each question fabs ask.

The answers are the notes of the fabrication drawing, word for word, so that two papers cannot disagree (those of a
panel say how it is made up and comes apart), and what an operator asks beyond them: origin, drills, panel, order
number, why nothing may be adjusted. Numbers come from layout and stackup sheet.
"""

from __future__ import annotations

import math
from collections.abc import Collection

from shapely.geometry import Point as ShapelyPoint
from shapely.ops import unary_union

from planar.copper.layout import Kind, Layout
from planar.handoff.drill_file import DRILL_FILES, drill_tools
from planar.handoff.fab_notes import DrawingFacts, fab_notes
from planar.handoff.gerber_content import GerberFacts, GerberFile, gerber_files
from planar.handoff.kind_words import KIND_WORDS
from planar.handoff.page import listed, mm, page, place, titled, wrapped
from planar.handoff.stackup_sheet import StackupSheet

_ENDS = {Kind.SINGLE: "feed and ground", Kind.ARRAY: "feed and ground of every board", Kind.COUPON: "signal and return"}
"""What a short joins."""
_HOLDS = {
    "copper": "copper, {side} side ({number})",
    "mask": "solder mask, {side} side: the file shows the openings",
    "legend": "legend, {side} side",
    "profile": "{thing} edge{cutouts}: the middle of the line",
    "score": "score lines, cut from both sides: the middle of the line",
    "array": "the panel as a drawing: nothing to make from it",
}
_OTHERS = (
    ("job.gbrjob", "job file: these files by function, complete stackup"),
    ("drawing.pdf", "drawing with the notes below"),
    ("stackup.md, .json", "stackup for people and for programs"),
)
_PAGES = {"README-build.txt": "for who solders and measures: nothing for the fab"}


_NO_PLANE = (
    " The ground under a line is a trace that carries the antenna's current; a width computed for a wide plane would "
    "put the antenna off frequency."
)


def cam_readme(
    layout: Layout, sheet: StackupSheet, *, gerber: GerberFacts, drawing: DrawingFacts, pages: Collection[str] = ()
) -> str:
    """The page for a snapped `layout` on the stackup of `sheet`, at most 96 columns. `pages` are the names of the pages
    beside it.

    Raises `HandoffError` where a question of the fab has no answer, as `fab_notes`.
    """
    project = drawing.project
    notes = fab_notes(layout, sheet, facts=drawing)
    title = f"{project.name}, revision {project.revision}, design {project.design_hash[:12]}: for the CAM operator"
    asked = f"{KIND_WORDS[layout.kind].purpose} Build it as drawn; ask before changing anything."
    head = "\n".join([title, *wrapped(asked)])
    return page(
        head,
        titled("FILES", *_file_lines(layout, gerber, drawing.netlist, pages)),
        titled("UNITS, ORIGIN, SIDE", *wrapped(_origin_text(layout))),
        titled("DRILLS (finished diameters; one tool a line)", *_drill_lines(layout)),
        titled("NOTES (those of the drawing)", *listed((f"{i}." for i in range(1, len(notes) + 1)), notes)),
        titled("ASKED OFTEN", *wrapped(*_answers(layout, sheet, drawing.netlist))),
    )


def _file_lines(layout: Layout, gerber: GerberFacts, netlist: str, pages: Collection[str]) -> list[str]:
    rows = [(file.name, _described(file, layout)) for file in gerber_files(layout, gerber)]
    for plated, name in DRILL_FILES.items():
        if any(hole.plated == plated for hole in layout.holes):
            rows.append((name, f"{'plated' if plated else 'unplated'} holes (XNC, metric, explicit decimal point)"))
    rows += [(netlist, "netlist for the bare-board test (IPC-D-356A)"), *_OTHERS]
    rows += [(name, _PAGES[name]) for name in pages if name in _PAGES]
    return listed((name for name, _ in rows), (text for _, text in rows))


def _described(file: GerberFile, layout: Layout) -> str:
    return _HOLDS[file.holds].format(
        side=file.level,
        number=file.function[1 if len(file.function) > 1 else 0],
        thing=KIND_WORDS[layout.kind].thing,
        cutouts=" and cutouts" if layout.cutouts else "",
    )


def _origin_text(layout: Layout) -> str:
    x0, y0, x1, y1 = layout.edge.bounds
    words = KIND_WORDS[layout.kind]
    feed = ", the feed of the antenna, inside the board edge" if words.origin == "feed" else ""
    return (
        f"Millimetres everywhere. One origin for all files{feed}. Every file is seen from the top; the bottom files "
        f"are not mirrored. The {words.thing} measures {mm(x1 - x0)} by {mm(y1 - y0)} mm, from {place((x0, y0))} to "
        f"{place((x1, y1))} mm."
    )


def _drill_lines(layout: Layout) -> list[str]:
    lines = []
    for plated in DRILL_FILES:
        for i, (function, diameter, holes) in enumerate(drill_tools(layout, plated=plated), 1):
            kind = "plated" if plated else "unplated"
            lines.append(f"{kind:<8}  T{i:<2}  {mm(diameter)} mm  {len(holes):>4}  {function}")
    return lines or ["none"]


def _answers(layout: Layout, sheet: StackupSheet, netlist: str) -> list[str]:
    answers = []
    if sheet.facts.dc_short:  # of the antennas, or of the coupon where there are none
        answers.append(
            f"Short between {_ENDS[layout.kind]}: right, 0 ohm. In {netlist} what is joined is one net with every land "
            "an end point: the test proves it whole."
        )
    if sheet.impedance_lines and not any(line.controlled for line in sheet.impedance_lines):
        why = " What comes out is what is to be measured." if layout.kind is Kind.COUPON else _NO_PLANE
        answers.append(f"Impedance: none is controlled, none to be tested or adjusted.{why}")
    answers.append("Etching: the artwork holds no compensation. Apply yours so that the finished foot is 1:1.")
    if any(hole.plated and hole.purpose == "via" for hole in layout.holes):
        answers.append(f"Vias: through, not filled, not plugged{_cover(layout, sheet)}.")
    edge = "edge of every board" if layout.boards else "edge"
    answers.append(
        f"Panel, tabs, scores: {KIND_WORDS[layout.kind].panel}. Copper comes within {_edge_room(layout)} mm of the "
        f"{edge} by design: no clip-back, route or score there without asking, no copper added to the board."
    )
    answers.append("Order number, date code, marks of the fab: not on the board; on the rail or on the packing.")
    return answers


def _cover(layout: Layout, sheet: StackupSheet) -> str:
    """How mask meets the vias, "" without mask."""
    if not any(layer.kind == "mask" for layer in sheet.layers):
        return ""
    vias = [ShapelyPoint(hole.centre) for hole in layout.holes if hole.plated and hole.purpose == "via"]
    opened = unary_union([marking.outline.shape() for marking in layout.mask_openings])
    free = sum(opened.contains(via) for via in vias)
    if free == 0:
        return "; mask covers them"
    return "; mask leaves them open" if free == len(vias) else f"; mask covers all but {free}, which lie in lands"


def _edge_room(layout: Layout) -> str:
    """Least distance from copper to the edge of its board, mm, rounded down."""
    copper = unary_union([island.outline.shape() for island in layout.islands])
    edges = [outline.shape().exterior for outline in layout.boards or (layout.edge,)]
    hundredths = math.floor(1e5 * min(edge.distance(copper) for edge in edges) + 1e-3)
    return f"{0.01 * hundredths:.2f}"

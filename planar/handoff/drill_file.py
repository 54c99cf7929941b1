"""Drill files in XNC: plated and unplated holes apart, one tool per function and finished diameter.

Millimetres with explicit decimal points, the origin of every other file of the pack, seen from the top. What a tool
is for stands in attribute comments (`; #@!`). The reader takes only what the writer may write, and `drill_mismatches`
compares the holes with the layout and with the copper they must meet.
"""

from __future__ import annotations

import math
import re
from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from pathlib import Path

from shapely.geometry import Point as ShapelyPoint

from planar.copper.arc import Point
from planar.copper.boolean import contains
from planar.copper.layout import Hole, Kind, Layout
from planar.copper.outline import GRID
from planar.errors import HandoffError
from planar.handoff.gerber_attributes import (
    Fields,
    ProjectFacts,
    attribute_fields,
    attribute_mismatches,
    attribute_text,
    file_attributes,
)
from planar.handoff.kind_words import KIND_WORDS

DRILL_FILES = {True: "drill-plated.xnc", False: "drill-unplated.xnc"}
"""File name by whether its holes are plated."""
FILE_FUNCTIONS: dict[bool, Fields] = {True: ("Plated", "1", "2", "PTH"), False: ("NonPlated", "1", "2", "NPTH")}
_BARE_FUNCTIONS = {"tooling": "MechanicalDrill,Tooling", "perforation": "MechanicalDrill,Breakout"}
"""Purpose of a hole that is never plated -> its function; every other unplated hole is a mere one."""
_SLACK = 2.0 * GRID
"""m, allowed on places and diameters for rounding to the grid."""
_INCH = 25.4
_NUMBER = r"[+-]?\d+\.\d+"
_TOOL = re.compile(r"T([1-9]\d?)C(\d+\.\d+)")
_HIT = re.compile(rf"X({_NUMBER})Y({_NUMBER})")
_ATTRIBUTE = re.compile(r"; #@! (T[FAD])(\..+)?")


@dataclass(frozen=True)
class DrillHit:
    """A hole of a file: `centre` and finished `diameter` in m, `function` of its tool ("ViaDrill", ...)."""

    centre: Point
    diameter: float
    function: str


@dataclass(frozen=True)
class DrillFile:
    """What a drill file holds: attributes of the file by name, holes, what breaks the rules."""

    attributes: dict[str, Fields]
    hits: tuple[DrillHit, ...]
    faults: tuple[str, ...]


def drill_function(hole: Hole) -> str:
    """What the drill of `hole` is for: via, a part's leg to be soldered, tooling, breaking off, or a mere hole.

    Raises `HandoffError` for plating in a hole that must have none.
    """
    if not hole.plated:
        return _BARE_FUNCTIONS.get(hole.purpose, "MechanicalDrill")
    if hole.purpose in _BARE_FUNCTIONS:
        raise HandoffError(f"a plated {hole.purpose} hole at {_place(hole.centre)}, expected an unplated one")
    return "ViaDrill" if hole.purpose == "via" else "ComponentDrill"


def drill_tools(layout: Layout, *, plated: bool) -> tuple[tuple[str, float, tuple[Hole, ...]], ...]:
    """Tools of the plated or unplated holes by function and finished diameter (m), each with its holes."""
    tools: dict[tuple[str, int], list[Hole]] = {}
    for hole in layout.holes:
        if hole.plated == plated:
            tools.setdefault((drill_function(hole), round(hole.diameter / GRID)), []).append(hole)
    ordered = sorted(tools, key=lambda tool: (tool[1], tool[0]))
    return tuple((function, steps * GRID, tuple(tools[function, steps])) for function, steps in ordered)


def write_drill(layout: Layout, path: Path, *, plated: bool, facts: ProjectFacts) -> None:
    """Write the plated or the unplated holes of a snapped `layout`. The same layout gives the same bytes.

    Raises `HandoffError` when there are none (a file without tools raises a question at every fab) or more than
    99 tools.
    """
    tools = drill_tools(layout, plated=plated)
    if not 1 <= len(tools) <= 99:
        raise HandoffError(f"{path.name} would have {len(tools)} tools, a drill file has 1 to 99")
    lines = ["M48", *_head(layout.kind, plated, facts), "METRIC"]
    for number, (function, diameter, _) in enumerate(tools, 1):
        lines += [f"; #@! TA.AperFunction,{function}", f"T{number}C{_mm(diameter)}", "; #@! TD"]
    lines += ["%", "G05"]
    for number, (_, _, holes) in enumerate(tools, 1):
        lines += [f"T{number}", *(f"X{_mm(hole.centre[0])}Y{_mm(hole.centre[1])}" for hole in holes)]
    path.write_bytes(("\n".join([*lines, "M30"]) + "\n").encode("ascii"))


def write_drills(layout: Layout, folder: Path, *, facts: ProjectFacts) -> None:
    """Write those of drill-plated.xnc and drill-unplated.xnc that have holes into `folder`."""
    for plated, name in DRILL_FILES.items():
        if name in drill_names(layout):
            write_drill(layout, folder / name, plated=plated, facts=facts)


def _head(kind: Kind, plated: bool, project: ProjectFacts) -> list[str]:
    """Attributes of the file, as comments."""
    attributes = file_attributes(project, FILE_FUNCTIONS[plated], "Positive", kind=kind)
    return [
        *(f"; #@! TF{attribute_text(name, fields)}" for name, fields in attributes.items()),
        f"; finished diameters; places from the {KIND_WORDS[kind].origin}, seen from the top",
    ]


def _mm(length: float) -> str:
    """A length in mm with three to six decimals, a whole number of nanometres."""
    whole, decimals = f"{abs(round(length / GRID)) / 1e6:.6f}".split(".")
    sign = "-" if round(length / GRID) < 0 else ""
    return f"{sign}{whole}.{decimals[:3]}{decimals[3:].rstrip('0')}"


def read_drill(path: Path) -> DrillFile:
    """What a drill file holds, in m, strictly by the rules of `write_drill`.

    What breaks them (inches, a number without decimal point, a tool nobody declared, routing) is named in
    `faults`; places in inches are taken as inches. Raises `HandoffError` when the file is no text.
    """
    try:
        lines = path.read_text(encoding="ascii").splitlines()
    except (OSError, ValueError) as error:
        raise HandoffError(f"{path.name} cannot be read as a drill file: {error}") from error
    head_end = lines.index("%") if "%" in lines else len(lines)
    head, body = lines[:head_end], lines[head_end + 1 :]
    faults = [] if head[:1] == ["M48"] else ["the first line is not M48"]
    faults += [] if head_end < len(lines) else ["no % after the head"]
    faults += [] if body[:1] == ["G05"] else ["no G05 before the holes"]
    faults += [] if body[-1:] == ["M30"] else ["no M30 at the end"]
    unit = 1e-3
    if "METRIC" not in head:
        faults.append("no METRIC, expected millimetres")
        unit *= _INCH if "INCH" in head else 1.0
    attributes, tools, head_faults = _read_head(head, unit)
    hits, body_faults = _read_body(body, tools, unit)
    return DrillFile(attributes, tuple(hits), (*faults, *head_faults, *body_faults))


_Tools = dict[str, tuple[float, str]]


def _read_head(head: Sequence[str], unit: float) -> tuple[dict[str, Fields], _Tools, list[str]]:
    """Attributes of the file, tool number -> diameter (m) and function, faults."""
    attributes: dict[str, Fields] = {}
    tools: _Tools = {}
    faults: list[str] = []
    function = ""
    for line in head:
        if attribute := _ATTRIBUTE.fullmatch(line):
            name, fields = attribute_fields(attribute[2] or "")
            if attribute[1] == "TF":
                attributes[name] = fields
            else:
                function = ",".join(fields) if name == ".AperFunction" else ""
        elif tool := _TOOL.fullmatch(line):
            if tool[1] in tools:
                faults.append(f"T{tool[1]} is declared twice")
            if not function:
                faults.append(f"T{tool[1]} has no function")
            tools[tool[1]] = float(tool[2]) * unit, function
        elif line not in ("M48", "METRIC", "INCH") and not line.startswith(";"):
            faults.append(f"{line!r} in the head")
    seen = list(tools.values())
    if len(set(seen)) < len(seen):
        faults.append("two tools of one diameter and function")
    if [diameter for diameter, _ in seen] != sorted(diameter for diameter, _ in seen):
        faults.append("tools not sorted by diameter")
    return attributes, tools, faults


def _read_body(body: Sequence[str], tools: _Tools, unit: float) -> tuple[list[DrillHit], list[str]]:
    hits: list[DrillHit] = []
    faults: list[str] = []
    current: str | None = None
    used: set[str] = set()
    for line in body:
        if line.startswith("T") and line[1:] in tools:
            current = line[1:]
            used.add(current)
        elif (hit := _HIT.fullmatch(line)) and current is not None:
            hits.append(DrillHit((float(hit[1]) * unit, float(hit[2]) * unit), *tools[current]))
        elif line not in ("G05", "M30"):
            faults.append(f"{line!r} among the holes")
    faults += [f"T{tool} drills nothing" for tool in tools if tool not in used]
    return hits, faults


def drill_names(layout: Layout) -> tuple[str, ...]:
    """Names of the drill files of `layout`: those that have holes."""
    return tuple(name for plated, name in DRILL_FILES.items() if any(hole.plated == plated for hole in layout.holes))


def drill_mismatches(layout: Layout, folder: Path, *, facts: ProjectFacts) -> list[str]:
    """What the drill files in `folder` say otherwise than a snapped `layout`: each with what was expected."""
    return [
        f"{name}: {text}"
        for plated, name in DRILL_FILES.items()
        if name in drill_names(layout)
        for text in _file_mismatches(layout, folder / name, plated, facts)
    ]


def _file_mismatches(layout: Layout, path: Path, plated: bool, facts: ProjectFacts) -> Iterator[str]:
    expected = [hole for *_, holes in drill_tools(layout, plated=plated) for hole in holes]
    try:
        got = read_drill(path)
    except HandoffError as error:
        yield str(error)
        return
    yield from got.faults
    right = file_attributes(facts, FILE_FUNCTIONS[plated], "Positive", kind=layout.kind)
    yield from attribute_mismatches(got.attributes, right)
    yield from _hole_mismatches(got.hits, expected)
    if plated:
        yield from _copper_mismatches(layout, got.hits)


def _hole_mismatches(got: Sequence[DrillHit], expected: Sequence[Hole]) -> Iterator[str]:
    if len(got) != len(expected):
        yield f"{len(got)} holes, expected {len(expected)}"
    elif not any(text for hit, hole in zip(got, expected, strict=True) for text in _differences(hit, hole)):
        return  # the file keeps the order of its tools: the search below is for one that does not
    left = list(got)
    for hole in expected:
        if not left:
            return
        hit = min(left, key=lambda other: math.dist(other.centre, hole.centre))
        left.remove(hit)
        yield from _differences(hit, hole)


def _differences(hit: DrillHit, hole: Hole) -> Iterator[str]:
    at = _place(hole.centre)
    if math.dist(hit.centre, hole.centre) > _SLACK:
        yield f"hole at {_place(hit.centre)}, expected {at}"
    if abs(hit.diameter - hole.diameter) > _SLACK:
        yield f"hole at {at} of {1e3 * hit.diameter:.3f} mm, expected {1e3 * hole.diameter:.3f} mm"
    if hit.function != drill_function(hole):
        yield f"hole at {at} is {hit.function}, expected {drill_function(hole)}"


def _copper_mismatches(layout: Layout, hits: Sequence[DrillHit]) -> Iterator[str]:
    """Plated holes with no copper all round on some level where they meet any."""
    for hit in hits:
        around = [island.outline for island in layout.islands if contains(island.outline, hit.centre)]
        if not around:
            yield f"hole at {_place(hit.centre)} meets no copper"
        for outline in around:
            ring = outline.shape().exterior.distance(ShapelyPoint(hit.centre)) - 0.5 * hit.diameter
            if ring <= 0.0:
                yield f"hole at {_place(hit.centre)} cuts the edge of its copper by {-1e3 * ring:.3f} mm"


def _place(point: Point) -> str:
    x, y = (round(1e3 * c, 6) + 0.0 for c in point)  # + 0.0 makes minus zero zero
    return f"({x:.6f}, {y:.6f}) mm"

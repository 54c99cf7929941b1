"""IPC-D-356A netlist for the bare-board test: every land and hole with its net, in 80 columns.

A loop that is whole at DC joins signal and return, so both lands carry one net and both are end points: the tester
then proves the loop instead of reporting a short. Vias are points between. Places are counted from the feed, seen
from the top. The solder-mask digit names the sides on which mask covers the place.
"""

from __future__ import annotations

import math
import textwrap
from collections import Counter
from dataclasses import replace
from pathlib import Path

from shapely.geometry import Point as ShapelyPoint

from planar.copper.arc import Point
from planar.copper.boolean import contains
from planar.copper.layout import Hole, Layout, Level, Pad
from planar.copper.outline import Outline
from planar.errors import HandoffError
from planar.handoff.gerber_content import DESIGNATOR, GerberFacts, flashable
from planar.handoff.netlist_record import (
    PLATED,
    STEP,
    SURFACE,
    UNPLATED,
    WIDEST,
    Netlist,
    NetRecord,
    named_lines,
    parsed,
    record_line,
    short_names,
)

NETLIST = "netlist.ipc"
_SIDES = {Level.TOP: 1, Level.BOTTOM: 2}
"""Access code of a level, and its bit in the solder-mask digit."""
_SLACK = 0.51 * STEP
"""m, what rounding to the file's step may move a place or change a size."""


def write_netlist(layout: Layout, path: Path, *, facts: GerberFacts) -> None:
    """Write the nets of a snapped `layout`. The same layout gives the same bytes.

    Raises `HandoffError` when the format cannot hold a place or a hole, or when a net of the feed that is one
    at DC has fewer than two end points.
    """
    records = netlist_records(layout, facts.masked, facts.via_ring_m)
    too_few = _short_faults(layout, records)
    if too_few:
        raise HandoffError("\n".join(too_few))
    short = short_names(record.net for record in records)
    job = " ".join(facts.project.name.encode("ascii", "replace").decode("ascii").split())[:60]
    lines = ["C  IPC-D-356A netlist; places from the feed, seen from the top"]
    lines += [f"P  JOB {job}", "P  UNITS CUST 1"]
    lines += [f"C  {line}" for text in _remarks(layout) for line in textwrap.wrap(text, 77)]
    lines += [line for i, pad in enumerate(layout.pads, 1) for line in named_lines(f"{DESIGNATOR}-{i}", pad.name)]
    lines += [line for net, name in short.items() for line in named_lines(name, net)]
    lines += [record_line(record, short) for record in records]
    path.write_bytes(("\n".join([*lines, "999"]) + "\n").encode("ascii"))


def read_netlist(path: Path) -> Netlist:
    """The netlist in a file, its faults named. Raises `HandoffError` when it cannot be read as text."""
    try:
        return parsed(path.read_text(encoding="ascii").splitlines())
    except (OSError, ValueError) as error:
        raise HandoffError(f"{path.name} cannot be read as a netlist: {error}") from error


def netlist_records(layout: Layout, masked: tuple[Level, ...], via_ring: float) -> tuple[NetRecord, ...]:
    """Records of a snapped `layout`: lands, plated holes, unplated holes.

    `masked` are the sides with solder mask, `via_ring` the width (m) of the ring shown round a plated hole. Lands
    are the pins 1, 2, ... of the antenna, in the layout's order.
    """
    lands = [_land(layout, pad, str(i), masked) for i, pad in enumerate(layout.pads, 1)]
    ends = Counter(record.net for record in lands)
    vias = [_via(layout, hole, masked, via_ring) for hole in layout.holes if hole.plated]
    vias = [replace(via, midpoint=ends[via.net] >= 2) for via in vias]
    bare = [
        NetRecord(UNPLATED, "", "", "", False, hole.diameter, 0, hole.centre, None, None)
        for hole in layout.holes
        if not hole.plated
    ]
    return (*lands, *vias, *bare)


def _remarks(layout: Layout) -> list[str]:
    shorted = sorted(_shorted_nets(layout))
    texts = [f"{net} joins feed and ground at DC: 0 ohm between its end points is intended" for net in shorted]
    if any(max(_feature(pad)[1]) > WIDEST for pad in layout.pads):
        texts.append(f"lands larger than the columns hold are given as {WIDEST * 1e3:.3f} mm")
    return texts


def _shorted_nets(layout: Layout) -> set[str]:
    """Nets that reach both terminals of the feed."""
    signal, back = ({pad.net for pad in layout.pads if pad.terminal == t} for t in ("signal", "return"))
    return signal & back


def _land(layout: Layout, pad: Pad, pin: str, masked: tuple[Level, ...]) -> NetRecord:
    at, size = _feature(pad)
    side = _SIDES[pad.level]
    held = (min(size[0], WIDEST), min(size[1], WIDEST))
    return NetRecord(SURFACE, pad.net, DESIGNATOR, pin, False, None, side, at, held, _covered(layout, at, masked))


def _feature(pad: Pad) -> tuple[Point, tuple[float, float]]:
    """Where to probe a land, and its size: a rectangle's sides, else the diameter of a circle that fits."""
    found = flashable(pad.outline)
    if found is not None:
        centre, aperture = found
        return centre, (aperture.size[0], aperture.size[1] if aperture.kind == "R" else 0.0)
    x, y = pad.outline.shape().representative_point().coords[0]
    return (x, y), (_room(pad.outline, (x, y)), 0.0)


def _room(outline: Outline, centre: Point) -> float:
    """Diameter of the largest circle about `centre` inside `outline`, m."""
    return 2.0 * float(outline.shape().exterior.distance(ShapelyPoint(centre)))


def _via(layout: Layout, hole: Hole, masked: tuple[Level, ...], ring: float) -> NetRecord:
    size = (min(hole.diameter + 2.0 * ring, WIDEST), 0.0)
    covered = _covered(layout, hole.centre, masked)
    return NetRecord(PLATED, hole.net, "VIA", "", False, hole.diameter, 0, hole.centre, size, covered)


def _covered(layout: Layout, at: Point, masked: tuple[Level, ...]) -> int:
    """Sum of the sides on which mask covers the place `at`."""
    opened = {m.level for m in layout.mask_openings if contains(m.outline, at)}
    return sum(_SIDES[level] for level in set(masked) - opened)


def _short_faults(layout: Layout, records: tuple[NetRecord, ...]) -> list[str]:
    """Nets that join the feed's terminals and cannot be proved whole for want of two end points."""
    faults = []
    for net in sorted(_shorted_nets(layout)):
        ends = sum(record.net == net and not record.midpoint for record in records)
        if ends < 2:
            faults.append(f"{net}: {ends} end points, expected at least 2 to prove the loop whole")
    return faults


def netlist_mismatches(layout: Layout, folder: Path) -> list[str]:
    """What the netlist in `folder` says otherwise than a snapped `layout`: each with what was expected.

    Which sides carry mask and how wide the rings of vias are is taken from the file: a side is masked when any
    record is covered there, the first via shows the ring of all. Everything else (units, nets, end points, places,
    lands, holes, access, mask openings) comes from the layout.
    """
    try:
        got = read_netlist(folder / NETLIST)
    except HandoffError as error:
        return [str(error)]
    masked = tuple(level for level, bit in _SIDES.items() if any((r.covered or 0) & bit for r in got.records))
    rings = [0.5 * (r.size[0] - r.hole) for r in got.records if r.code == PLATED and r.size and r.hole]
    expected = netlist_records(layout, masked, rings[0] if rings else 0.0)
    found = list(got.faults) + _short_faults(layout, got.records)
    for net in sorted({r.net for r in expected} - {r.net for r in got.records}):
        found.append(f"net {net} is missing")
    left = list(got.records)
    for record in expected:
        twin = _twin(record, left)
        if twin is None:
            found.append(f"{_called(record)} is missing")
            continue
        left.remove(twin)
        found += _record_mismatches(twin, record)
    found += [f"{_called(record)}, expected none" for record in left]
    if rings and rings[0] <= 0.0:
        found.append(f"vias with a ring of {1e3 * rings[0]:.3f} mm, expected copper round the hole")
    found += _name_mismatches(layout, got)
    return [f"{NETLIST}: {text}" for text in found]


def _twin(record: NetRecord, left: list[NetRecord]) -> NetRecord | None:
    """The record of the same kind and pin nearest to `record`."""
    same = [r for r in left if (r.code, r.designator, r.pin) == (record.code, record.designator, record.pin)]
    return min(same, key=lambda r: math.dist(r.at, record.at), default=None)


def _called(record: NetRecord) -> str:
    kind = {PLATED: "plated hole", SURFACE: f"land {record.designator}-{record.pin}", UNPLATED: "unplated hole"}
    x, y = (1e3 * c for c in record.at)
    return f"{kind[record.code]} at ({x:.3f}, {y:.3f}) mm"


def _record_mismatches(got: NetRecord, expected: NetRecord) -> list[str]:
    where = _called(expected)
    found = []
    if max(abs(a - b) for a, b in zip(got.at, expected.at, strict=True)) > _SLACK:
        found.append(f"{where} is moved to ({1e3 * got.at[0]:.3f}, {1e3 * got.at[1]:.3f}) mm")
    for what, here, right in (
        ("net", got.net, expected.net),
        ("midpoint", got.midpoint, expected.midpoint),
        ("access", got.access, expected.access),
        ("solder mask", got.covered, expected.covered),
    ):
        if here != right:
            found.append(f"{where}: {what} {here}, expected {right}")
    for what, length, right_length in (
        ("hole", got.hole, expected.hole),
        ("width", got.size and got.size[0], expected.size and expected.size[0]),
        ("height", got.size and got.size[1], expected.size and expected.size[1]),
    ):
        if (length is None) != (right_length is None) or abs((length or 0.0) - (right_length or 0.0)) > _SLACK:
            found.append(f"{where}: {what} {_mm(length)}, expected {_mm(right_length)}")
    return found


def _name_mismatches(layout: Layout, got: Netlist) -> list[str]:
    found = []
    for i, pad in enumerate(layout.pads, 1):
        name = got.named.get(f"{DESIGNATOR}-{i}")
        if name != pad.name:
            found.append(f"pin {DESIGNATOR}-{i} is called {name}, expected {pad.name}")
    return found


def _mm(length: float | None) -> str:
    return "none" if length is None else f"{1e3 * length:.3f} mm"

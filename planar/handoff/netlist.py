"""IPC-D-356A netlist for the bare-board test: every land and hole with its net, in 80 columns.

A loop that is whole at DC joins signal and return, so both lands carry one net and both are end points: the tester
then proves the loop instead of reporting a short. Vias are points between. Places are counted from the origin of the
files, seen from the top. Fiducials and marks belong to no net and are not tested. The solder-mask digit names the
sides on which mask covers the place.
"""

from __future__ import annotations

import math
import textwrap
from collections import Counter
from collections.abc import Sequence
from dataclasses import replace
from pathlib import Path

from shapely.geometry import Point as ShapelyPoint

from planar.copper.arc import Point
from planar.copper.boolean import contains
from planar.copper.layout import Hole, Layout, Level, Pad, Role
from planar.copper.outline import Outline
from planar.errors import HandoffError
from planar.handoff.gerber_content import GerberFacts, flashable
from planar.handoff.kind_words import KIND_WORDS
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
    records = netlist_records(layout, facts)
    too_few = _short_faults(layout, records)
    if too_few:
        raise HandoffError("\n".join(too_few))
    short = _short_names(layout)
    job = _job_name(facts)
    lines = [f"C  IPC-D-356A netlist; places from the {KIND_WORDS[layout.kind].origin}, seen from the top"]
    lines += [f"P  JOB {job}", "P  UNITS CUST 1"]
    lines += [f"C  {line}" for text in _remarks(layout) for line in textwrap.wrap(text, 77)]
    for pad, pin in zip(layout.pads, _pins(layout), strict=True):
        lines += named_lines(f"{short.get(pad.part, pad.part)}-{pin}", pad.name)
    lines += [line for full, name in short.items() for line in named_lines(name, full)]
    lines += [record_line(record, short) for record in records]
    path.write_bytes(("\n".join([*lines, "999"]) + "\n").encode("ascii"))


def _job_name(facts: GerberFacts) -> str:
    """The project's name in the letters and columns there are."""
    return " ".join(facts.project.name.encode("ascii", "replace").decode("ascii").split())[:60]


def read_netlist(path: Path) -> Netlist:
    """The netlist in a file, its faults named. Raises `HandoffError` when it cannot be read as text."""
    try:
        return parsed(path.read_text(encoding="ascii").splitlines())
    except (OSError, ValueError) as error:
        raise HandoffError(f"{path.name} cannot be read as a netlist: {error}") from error


def netlist_records(layout: Layout, facts: GerberFacts) -> tuple[NetRecord, ...]:
    """Records of a snapped `layout`: lands, plated holes, unplated holes.

    Lands are the pins 1, 2, ... of their part, in the layout's order.
    """
    masked = facts.masked
    pairs = zip(layout.pads, _pins(layout), strict=True)
    lands = [_land(layout, pad, pin, masked) for pad, pin in pairs]
    ends = Counter(record.net for record in lands)
    vias = [_via(layout, hole, masked, facts.ring(layout, hole)) for hole in layout.holes if hole.plated]
    vias = [replace(via, midpoint=ends[via.net] >= 2) for via in vias]
    bare = [
        NetRecord(UNPLATED, "", "", "", False, hole.diameter, 0, hole.centre, None, None)
        for hole in layout.holes
        if not hole.plated
    ]
    return (*lands, *vias, *bare)


def _short_names(layout: Layout) -> dict[str, str]:
    nets = [*(pad.net for pad in layout.pads), *(hole.net for hole in layout.holes if hole.plated)]
    return short_names(nets, (pad.part for pad in layout.pads))


def _pins(layout: Layout) -> list[str]:
    """Number of each land among those of its part, from 1."""
    counts: Counter[str] = Counter()
    pins = []
    for pad in layout.pads:
        counts[pad.part] += 1
        pins.append(str(counts[pad.part]))
    return pins


def _remarks(layout: Layout) -> list[str]:
    antennas = {island.part for island in layout.islands if island.role is Role.RADIATOR}
    fed = {pad.net for pad in layout.pads if pad.part in antennas}
    shorted = [(net, "feed and ground" if net in fed else "signal and return") for net in sorted(_shorted_nets(layout))]
    texts = [f"{net} joins {ends} at DC: 0 ohm between its end points is intended" for net, ends in shorted]
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
    return NetRecord(SURFACE, pad.net, pad.part, pin, False, None, side, at, held, _covered(layout, at, masked))


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


def netlist_mismatches(layout: Layout, folder: Path, *, facts: GerberFacts) -> list[str]:
    """What the netlist in `folder` says otherwise than a snapped `layout` and `facts`: each with what was expected."""
    try:
        got = read_netlist(folder / NETLIST)
    except HandoffError as error:
        return [str(error)]
    expected = netlist_records(layout, facts)
    found = list(got.faults) + _short_faults(layout, got.records)
    if got.job != _job_name(facts):
        found.append(f"job {got.job or 'missing'}, expected {_job_name(facts)}")
    for net in sorted({r.net for r in expected} - {r.net for r in got.records}):
        found.append(f"net {net} is missing")
    found += _records_mismatches(got.records, expected)
    found += _name_mismatches(layout, got)
    return [f"{NETLIST}: {text}" for text in found]


def _records_mismatches(got: Sequence[NetRecord], expected: Sequence[NetRecord]) -> list[str]:
    pairs = zip(got, expected, strict=False)
    if len(got) == len(expected) and all(_pin(a) == _pin(b) and not _record_mismatches(a, b) for a, b in pairs):
        return []  # the file keeps the order: the search below is for one that does not
    found = []
    left = list(got)
    for record in expected:
        twin = _twin(record, left)
        if twin is None:
            found.append(f"{_called(record)} is missing")
            continue
        left.remove(twin)
        found += _record_mismatches(twin, record)
    return found + [f"{_called(record)}, expected none" for record in left]


def _pin(record: NetRecord) -> tuple[str, str, str]:
    """What kind of place it is, and the pin it belongs to."""
    return record.code, record.designator, record.pin


def _twin(record: NetRecord, left: list[NetRecord]) -> NetRecord | None:
    """The record of the same kind and pin nearest to `record`."""
    same = [r for r in left if _pin(r) == _pin(record)]
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
    short = _short_names(layout)
    found = []
    for pad, pin in zip(layout.pads, _pins(layout), strict=True):
        name = got.named.get(f"{short.get(pad.part, pad.part)}-{pin}")
        if name != pad.name:
            found.append(f"pin {pad.part}-{pin} is called {name}, expected {pad.name}")
    return found


def _mm(length: float | None) -> str:
    return "none" if length is None else f"{1e3 * length:.3f} mm"

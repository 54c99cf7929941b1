"""The lines of an IPC-D-356A file: records of fixed columns, parameters, comments.

Columns count from 1: record 1-3, net 4-17, designator 21-26, pin 28-31, midpoint 32, hole and plating 33-38,
access 39-41, place 42-57, feature 58-71, solder mask 73-74. Lengths are whole thousandths of a millimetre. Names
the columns cannot hold get short ones, and comments say which.
"""

from __future__ import annotations

import re
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass, replace

from planar.copper.arc import Point
from planar.errors import HandoffError

STEP = 1e-6
"""m, unit of every length in the file (`P  UNITS CUST 1`)."""
WIDEST = 9999 * STEP
"""m, the longest feature or hole four digits hold."""
FARTHEST = 999999 * STEP
"""m, the farthest place from the origin six digits hold."""
PLATED, SURFACE, UNPLATED = "317", "327", "367"
_WIDTH = 80
_CHUNK = 50
_PLAIN_NET = re.compile(r"[!-~]{1,14}")
_PLAIN_PART = re.compile(r"[!-~]{1,6}")
_SHORT = re.compile(r"(?:NET|P)\d{5}")
_RECORD = re.compile(
    r"(?P<code>317|327|367)(?P<net>.{14})   (?P<designator>.{6})[- ](?P<pin>.{4})(?P<midpoint>[M ])"
    r"(?:D(?P<hole>\d{4})(?P<plating>[PU])| {6})A(?P<access>0[0-2])X(?P<x>[+-]\d{6})Y(?P<y>[+-]\d{6})"
    r"(?:X(?P<width>\d{4})Y(?P<height>\d{4})R000| {14}) (?:S(?P<covered>[0-3])|  ) {6}"
)
_NAMED = re.compile(r'(?P<short>\S+) = "(?P<part>.*)"')


@dataclass(frozen=True)
class NetRecord:
    """One place to probe or drill. `code` is 317 (plated hole), 327 (land) or 367 (unplated hole).

    `at` in m from the feed; `hole` its finished diameter in m, None for a land; `size` (along x, along y) of the
    feature in m, the second 0 for a round one, None where the record gives none. `access` is 0 for both sides, 1
    for the top, 2 for the bottom. `covered` adds 1 where mask covers the top and 2 where it covers the bottom.
    """

    code: str
    net: str
    designator: str
    pin: str
    midpoint: bool
    hole: float | None
    access: int
    at: Point
    size: tuple[float, float] | None
    covered: int | None


@dataclass(frozen=True)
class Netlist:
    """What a file holds: `job`, `units` as the file calls them, records, short name -> name, faults met.

    `named` holds the pads' names by pin ("ANT1-1"). Nets and parts in the records have their full names again.
    `faults` is empty for a file that keeps the rules.
    """

    job: str
    units: str
    records: tuple[NetRecord, ...]
    named: Mapping[str, str]
    faults: tuple[str, ...]


def short_names(nets: Iterable[str], parts: Iterable[str] = ()) -> dict[str, str]:
    """Net or part -> short name, for those parts that 6 columns of plain letters cannot hold and nets that 14 cannot.

    A name of both a net and a part gets one short name that fits either.
    """
    both = {name for name in parts if name}, {name for name in nets if name}
    taken = set().union(*both)
    short: dict[str, str] = {}
    for names, plain, stem in zip(both, (_PLAIN_PART, _PLAIN_NET), ("P", "NET"), strict=True):
        free = (name for i in range(1, 10**5) if (name := f"{stem}{i:05d}") not in taken)
        short |= {name: next(free) for name in sorted(names - short.keys()) if not plain.fullmatch(name)}
    return short


def named_lines(short: str, name: str) -> list[str]:
    """Comment lines that say what `short` stands for; a long name is carried on by further lines of its kind."""
    text = name.encode("unicode_escape").decode("ascii")
    return [f'C  {short} = "{text[i : i + _CHUNK]}"' for i in range(0, max(1, len(text)), _CHUNK)]


def record_line(record: NetRecord, short: Mapping[str, str]) -> str:
    """The 80 columns of a record. Raises `HandoffError` when a number is too large for its columns."""
    plating = "U" if record.code == UNPLATED else "P"
    hole = " " * 6 if record.hole is None else f"D{_digits(record.hole, WIDEST):04d}{plating}"
    feature = " " * 14
    if record.size is not None:
        width, height = (_digits(side, WIDEST) for side in record.size)
        feature = f"X{width:04d}Y{height:04d}R000"
    x, y = (_digits(c, FARTHEST) for c in record.at)
    covered = "  " if record.covered is None else f"S{record.covered}"
    dash = "-" if record.pin else " "
    line = (
        f"{record.code}{short.get(record.net, record.net):<14}   "
        f"{short.get(record.designator, record.designator):<6}{dash}{record.pin:<4}"
        f"{'M' if record.midpoint else ' '}{hole}A{record.access:02d}X{x:+07d}Y{y:+07d}{feature} {covered}"
    )
    return line.ljust(_WIDTH)


def _digits(length: float, limit: float) -> int:
    steps = round(length / STEP)
    if abs(steps) > round(limit / STEP):
        raise HandoffError(
            f"a netlist of IPC-D-356A holds lengths up to {limit * 1e3:.3f} mm here, not {length * 1e3:.3f} mm"
        )
    return steps


def parsed(lines: Sequence[str]) -> Netlist:
    """The netlist in `lines`. What breaks the rules is named in `faults` with its line number."""
    faults: list[str] = []
    records: list[NetRecord] = []
    parameters: dict[str, str] = {}
    names: dict[str, str] = {}
    for number, line in enumerate(lines, start=1):
        if len(line) > _WIDTH:
            faults.append(f"line {number}: {len(line)} columns, expected at most {_WIDTH}")
        if line.startswith("C"):
            if match := _NAMED.fullmatch(line[3:].rstrip()):
                names[match["short"]] = names.get(match["short"], "") + match["part"]
        elif line.startswith("P  "):
            key, _, value = line[3:].rstrip().partition(" ")
            parameters[key] = value
        elif match := _RECORD.fullmatch(line):
            records.append(_record(match))
            faults += [f"line {number}: {fault}" for fault in _record_faults(match)]
        elif not (line.rstrip() == "999" and number == len(lines)):
            faults.append(f"line {number}: {line.rstrip()!r}, expected a record of 80 columns")
    if not lines or lines[-1].rstrip() != "999":
        faults.append("no 999 at the end")
    if parameters.get("UNITS") != "CUST 1":
        faults.append(f"UNITS {parameters.get('UNITS', 'missing')}, expected CUST 1 (0.001 mm)")
    named = {short: text.encode("ascii", "replace").decode("unicode_escape") for short, text in names.items()}
    full = tuple(_with_full_names(record, named) for record in records)
    return Netlist(parameters.get("JOB", ""), parameters.get("UNITS", ""), full, named, tuple(faults))


def _record(match: re.Match[str]) -> NetRecord:
    width, height = match["width"], match["height"]
    return NetRecord(
        match["code"],
        match["net"].rstrip(),
        match["designator"].rstrip(),
        match["pin"].rstrip(),
        match["midpoint"] == "M",
        None if match["hole"] is None else int(match["hole"]) * STEP,
        int(match["access"]),
        (int(match["x"]) * STEP, int(match["y"]) * STEP),
        None if width is None else (int(width) * STEP, int(height) * STEP),
        None if match["covered"] is None else int(match["covered"]),
    )


def _record_faults(match: re.Match[str]) -> list[str]:
    """What contradicts itself within one record."""
    expected = {PLATED: "P", SURFACE: None, UNPLATED: "U"}[match["code"]]
    if match["plating"] == expected:
        return []
    return [f"record {match['code']} with plating {match['plating']}, expected {expected}"]


def _with_full_names(record: NetRecord, named: Mapping[str, str]) -> NetRecord:
    full = {short: name for short, name in named.items() if _SHORT.fullmatch(short)}
    return replace(
        record,
        net=full.get(record.net, record.net),
        designator=full.get(record.designator, record.designator),
    )

"""What planar does, stage by stage: the one module that knows them all.

Each function takes what the user gave and returns a frozen record of what was done; printing is left
to the command line. Results are written into a temporary folder, read back and compared with the
layout, and only then moved into place.
"""

from __future__ import annotations

import json
import re
from collections.abc import Callable, Iterator, Mapping
from dataclasses import asdict, dataclass, replace
from pathlib import Path
from typing import Any

import numpy as np

from planar import __version__
from planar.brief import Brief, read_brief, starter_brief, write_brief
from planar.design.design import Design, make_design
from planar.design.design_file import design_facts, read_design
from planar.design.field_solution import Solution, solve_design
from planar.design.line_question import LineQuestion, answer
from planar.design.line_table import LineRow
from planar.design.prediction import Prediction
from planar.design.sensitivity import sensitivities
from planar.design.sized import sized_design
from planar.design.solve_question import SolveQuestion, read_question
from planar.design.workers import workers
from planar.errors import Finding, GeometryError, HandoffError, RangeError, SynthesisError
from planar.field.result import PointResult
from planar.handoff import (
    FabricationFacts,
    GerberFacts,
    ImpedanceLine,
    ProjectFacts,
    SheetFacts,
    StackupSheet,
    check_destination,
    check_fabrication_files,
    check_files,
    check_zip,
    creation_date,
    packed,
    stackup_sheet,
    write_fabrication_files,
    write_layout_files,
    write_zip,
)
from planar.library import KINDS, Library
from planar.library.reading import parse
from planar.network.response import Response
from planar.network.spice import spice_subcircuit
from planar.network.touchstone import write_touchstone
from planar.units import show

Progress = Callable[[str], None]
REVISION = "A"
"""Of every design as planar makes it; a change of the brief is another design with another hash."""
S_DIGITS = 9
"""Decimals of a predicted reflection: what lies beyond is rounding."""


@dataclass(frozen=True)
class Made:
    """A design and the folder its pack was written to."""

    design: Design
    folder: Path


@dataclass(frozen=True)
class Solved:
    """A design and its field solution."""

    design: Design
    solution: Solution


def make(
    brief_path: Path,
    library: Library,
    outputs: Path,
    *,
    sensitive: bool = False,
    progress: Progress = lambda stage: None,
) -> Made:
    """The main job: brief in, pack out, at `outputs`/<name>, on wish with the table of sensitivities.

    Raises `PlanarError`; nothing is then left behind.
    """
    progress("reading the brief")
    brief = read_brief(brief_path, library)
    folder = outputs / brief.name
    check_destination(folder)
    design = _designed(brief, library, brief_path, progress)
    if sensitive:
        design = _with_sensitivities(design, progress)
    progress("writing files")
    with packed(folder) as fresh:
        write_pack(design, fresh)
        progress("reading the files back")
        check_pack(design, fresh)
    return Made(design, folder)


def size(path: Path, library: Library, *, sensitive: bool = False, progress: Progress = lambda stage: None) -> Design:
    """Dimensions, copper and prediction of a brief, on wish with the table of sensitivities, nothing written.

    Raises `PlanarError`.
    """
    progress("reading the brief")
    design = _designed(read_brief(path, library), library, path, progress)
    return _with_sensitivities(design, progress) if sensitive else design


def _with_sensitivities(design: Design, progress: Progress) -> Design:
    progress("trying every dimension and layer both ways")
    with workers() as shared:
        found = sensitivities(design.choices, design.dimensions, shared)
    if found:
        return replace(design, sensitivities=found)
    missed = Finding("sensitivities", "dimensions", "the board could not be solved for them", "a table", "")
    return replace(design, findings=(*design.findings, missed))


def solve(path: Path, library: Library, question: SolveQuestion, progress: Progress = lambda stage: None) -> Solved:
    """Field solution of a brief's design, or of the design in a design.json; `PlanarError`: nothing is then written."""
    if path.suffix == ".json":
        design = read_design(path, library)
        frequencies, sweep = read_question(question, design.choices.brief)
    else:
        brief = read_brief(path, library)
        frequencies, sweep = read_question(question, brief)
        given = bool(brief.antenna.dimensions)
        design = make_design(brief, library, str(path)) if given else _designed(brief, library, path, progress)
    try:
        solution = solve_design(design, frequencies, sweep=sweep, progress=progress)
    except GeometryError as error:
        raise SynthesisError(f"{path}: the field solver cannot take this copper: {error}") from error
    if question.s1p is not None and solution.sweep is not None:
        try:
            write_touchstone(solution.sweep, question.s1p, comments=(design.name, design.status))
        except OSError as error:
            raise HandoffError(f"cannot write {question.s1p}: {error.strerror}") from error
    return Solved(design, solution)


def solution_facts(solved: Solved) -> dict[str, Any]:
    """A field solution in plain types, units in the names: what `planar solve --json` says."""
    solution, reference = solved.solution, solved.design.choices.brief.target.impedance
    facts: dict[str, Any] = {
        "name": solved.design.name,
        "planar_version": __version__,
        "reference_ohm": reference,
        "unknowns": solution.unknowns,
        "convergence": solution.convergence,
        "power_balance": solution.points[len(solution.points) // 2].power_balance,
        "points": [
            _point_facts(point, gap, reference)
            for point, gap in zip(solution.points, solution.gap_impedance_ohm, strict=True)
        ],
        "findings": [asdict(finding) for finding in solution.findings],
    }
    if solution.sweep is not None:
        z = solution.sweep.z[:, 0, 0]
        facts["sweep"] = {
            "frequency_hz": solution.sweep.frequency.tolist(),
            "input_impedance_ohm": [[value.real, value.imag] for value in z.tolist()],
            "reflection_db": solution.sweep.reflection_db.tolist(),
            "best_match_hz": solution.sweep.best_match,
        }
    return facts


def _point_facts(point: PointResult, gap: complex, reference: float) -> dict[str, Any]:
    facts = asdict(point)
    z = point.input_impedance_ohm
    linear = point.sense == "linear"
    return facts | {
        "input_impedance_ohm": [z.real, z.imag],
        "gap_impedance_ohm": [gap.real, gap.imag],
        "reflection_db": point.reflection_db(reference),
        "axial_ratio_db": None if linear else point.axial_ratio_db,
        "power_balance": point.power_balance,
    }


def _designed(brief: Brief, library: Library, path: Path, progress: Progress) -> Design:
    try:
        return sized_design(brief, library, str(path), progress)
    except SynthesisError as error:  # a refusal names the file, as a fault does
        raise SynthesisError(f"{path}: {error.reason}", error.findings, error.changes) from error
    except (RangeError, GeometryError) as error:
        raise SynthesisError(f"{path}: {brief.name}: {error}") from error


def new_brief(path: Path) -> Path:
    """Write a commented brief for `path` (".toml" is added); never over an existing file."""
    text = starter_brief(path.name.removesuffix(".toml"))
    target = path if path.suffix == ".toml" else path.with_name(path.name + ".toml")
    try:
        with target.open("x", encoding="utf-8") as file:
            file.write(text)
    except FileExistsError as error:
        raise HandoffError(f"{target} exists already: choose another name or remove it") from error
    except OSError as error:
        raise HandoffError(f"cannot write {target}: {error.strerror}") from error
    return target


def lines(question: LineQuestion, library: Library) -> list[LineRow]:
    """Rows of line widths for `question`. Raises `BriefError` with all faults of the options, and `LibraryError`."""
    return answer(question, library)


def library_entries(library: Library, kind: str | None = None) -> dict[str, list[dict[str, str]]]:
    """Key, title and file of every entry, by kind; of one `kind` only when it is given."""
    return {
        each: [_entry_head(library, each, key) for key in library.keys(each)]
        for each in ([kind] if kind is not None else KINDS)
    }


def library_entry(library: Library, kind: str, key: str) -> dict[str, Any]:
    """One entry with every value and the source beside it."""
    raw = parse(library.source(kind, key))
    values = {name: value for name, value in _sourced(raw, "") if name != "title"}
    return _entry_head(library, kind, key) | {"values": values}


def _sourced(table: Mapping[str, Any], above: str) -> Iterator[tuple[str, dict[str, Any]]]:
    """Dotted name, value and source of everything in `table`; the source is empty where the entry states none."""
    for name, value in table.items():
        path = f"{above}{name}"
        if not isinstance(value, dict):
            yield path, {"value": value, "source": ""}
        elif "source" in value:
            rest = {k: v for k, v in value.items() if k != "source"}
            yield path, {"value": rest.get("value", rest) if len(rest) == 1 else rest, "source": value["source"]}
        else:
            yield from _sourced(value, f"{path}.")


def _entry_head(library: Library, kind: str, key: str) -> dict[str, str]:
    path = library.source(kind, key)
    return {"key": key, "title": str(parse(path).get("title", "")), "file": str(path)}


def write_pack(design: Design, folder: Path) -> None:
    """Write every file of the pack into the empty `folder`."""
    layout, fabrication = folder / "layout", folder / "fabrication"
    layout.mkdir()
    fabrication.mkdir()
    write_layout_files(design.layout, layout, status=design.status)
    told = design_facts(design)
    write_fabrication_files(design.layout, _sheet(design), fabrication, facts=_fabrication_facts(design, told["hash"]))
    write_zip(fabrication, folder / f"{design.name}-fabrication.zip")
    (folder / "brief.toml").write_bytes(write_brief(design.brief).encode("utf-8"))
    summary = json.dumps(told, indent=2, ensure_ascii=False) + "\n"
    (folder / "design.json").write_bytes(summary.encode("utf-8"))
    if design.prediction is not None:
        _write_prediction(design, design.prediction, folder)


def _write_prediction(design: Design, prediction: Prediction, folder: Path) -> None:
    """The response as a Touchstone file and the circuit as a SPICE subcircuit."""
    low, high = (show(end, "frequency", 4) for end in prediction.trusted)
    comments = (
        f"{design.name}: predicted reflection at the pads, nominal board",
        design.status,
        f"From {low} to {high} on the fine mesh; outside on the sizing mesh, for orientation only.",
    )
    response = prediction.response
    rounded = Response(np.round(response.frequency), np.round(response.s, S_DIGITS), response.z0)
    write_touchstone(rounded, folder / "antenna.s1p", comments=comments)
    named = re.sub(r"[^A-Za-z0-9_]", "_", design.name)
    text = spice_subcircuit(prediction.circuit, f"antenna_{named}", comments=comments[:1])
    (folder / "circuit.cir").write_bytes(text.encode("ascii"))


def check_pack(design: Design, folder: Path) -> None:
    """Read the written files again and compare. Raises `HandoffError` naming what differs."""
    check_files(design.layout, folder / "layout")
    facts = _fabrication_facts(design, design_facts(design)["hash"])
    check_fabrication_files(design.layout, _sheet(design), folder / "fabrication", facts=facts)
    check_zip(folder / "fabrication", folder / f"{design.name}-fabrication.zip")


def _fabrication_facts(design: Design, digest: str) -> FabricationFacts:
    choices = design.choices
    project = ProjectFacts(design.name, REVISION, digest, creation_date())
    ring = design.dimensions.get("via_ring", choices.fab.min_annular_ring)
    gerber = GerberFacts(project, choices.masked, ring)
    return FabricationFacts(gerber, choices.fab.min_track, choices.fab.min_gap, choices.fab.hole_tolerance)


def _sheet(design: Design) -> StackupSheet:
    choices = design.choices
    lines = tuple(
        ImpedanceLine(
            name=line.name,
            kind=line.line.kind,
            width_m=line.line.width,
            gap_m=line.line.gap,
            level=line.level.value,
            reference=line.reference,
            impedance_ohm=line.line.impedance,
            tolerance_ohm=line.tolerance_ohm,
            controlled=False,  # no plane under it: a fab that adjusted the width would detune the antenna
        )
        for line in design.lines
    )
    facts = SheetFacts(
        name=design.name,
        frequency_hz=choices.centre,
        finish=choices.fab.finishes[0],
        specification=choices.laminate.specification,
        outline_tolerance_m=choices.fab.outline_tolerance,
        dc_short=design.layout.dc_short,
    )
    return stackup_sheet(choices.stackup, lines, facts=facts)

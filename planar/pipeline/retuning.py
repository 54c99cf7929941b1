"""`planar retune`: a measured board in, what happened and what to change out."""

from __future__ import annotations

import json
from collections.abc import Callable, Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from planar import __version__
from planar.brief import check_brief, read_brief, write_brief
from planar.design.design_file import design_facts, given_brief, read_facts, redimensioned
from planar.design.option_reader import OptionReader
from planar.design.retune.batch import LearntLaminate, learnt_laminate
from planar.design.retune.cut_places import cut_places
from planar.design.retune.facts import retune_facts
from planar.design.retune.retuned import Retuned, RetuneRequest, behind_standards, judged, retune
from planar.design.retune.unknowns import Plane, coax_delay, plane_of_standards, stated_plane, unstated_plane
from planar.design.workers import workers
from planar.errors import HandoffError, PlanarError, SynthesisError
from planar.handoff import packed
from planar.handoff.trim_drawing import Way, write_trim_drawing, write_trim_svg
from planar.library import Library
from planar.network.measured import Measured, read_measured
from planar.pipeline.design_paths import design_file
from planar.pipeline.new_file import check_new, write_new
from planar.pipeline.spreading import solved_design
from planar.report.page import write_report
from planar.report.retune_page import retune_page
from planar.report.retune_pictures import retune_pictures

Progress = Callable[[str], None]
LONGEST = 2.0
"""m of coax that may be stated to lie in front."""


@dataclass(frozen=True)
class RetuneQuestion:
    """What is known beside the measured sweep: length of coax in front as a text, files of short, open and perhaps
    load measured in the antenna's place, a second sweep; where to write the next brief, and the user's library folder
    that learns the laminate."""

    extension: str | None = None
    standards: tuple[Path, ...] = ()
    second: Path | None = None
    write: Path | None = None
    learn: Path | None = None


@dataclass(frozen=True)
class Retuning:
    """A design, what its measurement says, and the folder of the results; `learnt` where the laminate was kept."""

    retuned: Retuned
    folder: Path
    learnt: LearntLaminate | None
    facts: dict[str, Any]


def retune_board(
    path: Path,
    file: Path,
    library: Library,
    outputs: Path,
    question: RetuneQuestion,
    progress: Progress = lambda stage: None,
) -> Retuning:
    """Explain the sweep in `file`, measured on a board of the design at `path`, and say what to change.

    Writes `outputs`/<name>-retune: page, facts, the next brief, a drawing to cut by where anything can be cut.
    Raises `PlanarError`; nothing is then left behind.
    """
    source = design_file(path)
    progress("reading the measurement")
    request, measured = _request(question, read_measured(file))
    if question.write is not None:
        check_new(question.write)
    judged(_band(source, library), measured, request)  # before any solving
    design = solved_design(source, library, progress)
    with workers() as shared:
        found = retune(design, measured, shared, request, progress)
    brief = write_brief(redimensioned(design, found.advice.best.dimensions, library))
    learnt = None
    if question.learn is not None:
        learnt = learnt_laminate(found.inferred, design.name, _digest(source))
    folder = outputs / f"{design.name}-retune"
    facts = retune_facts(found)
    progress("writing files")
    with packed(folder) as fresh:
        (fresh / "next.toml").write_bytes(brief.encode("utf-8"))
        _write(found, facts, fresh)
    if question.write is not None:
        write_new(brief, question.write)
    if question.learn is not None and learnt is not None:
        _keep(learnt, question.learn)
    return Retuning(found, folder, learnt, facts)


def _write(found: Retuned, facts: Mapping[str, Any], folder: Path) -> None:
    """Facts, page, and where to cut: a drawing to print at true size, where anything can be cut."""
    design = found.design
    told = json.dumps(facts, indent=2, ensure_ascii=False, allow_nan=False) + "\n"
    (folder / "retune.json").write_bytes(told.encode("utf-8"))
    ways = [
        Way(cut_places(design.choices, design.dimensions, cut), said)
        for cut, said in zip(found.advice.cut.ways, facts["cut_now"], strict=True)
    ]
    if ways:
        write_trim_drawing(design.layout, ways, folder / "trim.pdf", made_with=f"planar {__version__}")
        write_trim_svg(design.layout, ways, folder / "trim.svg")
    shown = design_facts(design)
    write_report(retune_page(facts, shown, retune_pictures(facts, shown)), folder / "retune.html")


def _request(question: RetuneQuestion, measured: Measured) -> tuple[RetuneRequest, Measured]:
    """What is known of the plane, and the sweep with standards taken off where they were measured."""
    second = None if question.second is None else read_measured(question.second)
    if not question.standards:
        return RetuneRequest(_stated(question), second), measured
    standards = [read_measured(each) for each in question.standards]
    behind = behind_standards(measured, *standards)
    return RetuneRequest(plane_of_standards(), None if second is None else behind_standards(second, *standards)), behind


def _band(source: Path, library: Library) -> tuple[float, float]:
    """Band (low, high) Hz that the design or brief at `source` is for."""
    if source.suffix != ".json":
        return read_brief(source, library).target.band
    return check_brief(given_brief(read_facts(source)), str(source), library).target.band


def _stated(question: RetuneQuestion) -> Plane:
    if question.extension is None:
        return unstated_plane()
    reader = OptionReader()
    length = reader.read("extension", question.extension, "length", (0.0, LONGEST))
    reader.raise_faults()
    return stated_plane(coax_delay(length))


def _digest(source: Path) -> str:
    """Hash of the design, none where dimensions come from a brief."""
    return str(read_facts(source)["hash"]) if source.suffix == ".json" else "none"


def _keep(learnt: LearntLaminate, folder: Path) -> None:
    """Write the laminate into the user's library `folder`; an earlier one of the same board is replaced."""
    try:
        (folder / "laminates").mkdir(parents=True, exist_ok=True)
        (folder / "laminates" / f"{learnt.key}.toml").write_bytes(learnt.text.encode("utf-8"))
        Library.open(folder).laminate(learnt.key)
    except OSError as error:
        raise HandoffError(f"cannot write into {folder}: {error.strerror}") from error
    except PlanarError as error:
        raise SynthesisError(f"what was learnt is no laminate: {error}") from error

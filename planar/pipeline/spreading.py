"""`planar spread`: how made boards scatter about a design, what does it, and where the design is best put."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from planar.brief import check_brief, read_brief, write_brief
from planar.design.design import Design
from planar.design.design_file import given_brief, read_facts, redimensioned
from planar.design.recentre import Recentred, recentred
from planar.design.sized import sized_design
from planar.design.spread import Spread, SpreadRequest, spread
from planar.design.spread_facts import recentred_facts, spread_facts, write_spread
from planar.design.workers import workers
from planar.handoff import packed, renewed
from planar.library import Library
from planar.pipeline.board_files import OUTPUTS, joins_pack
from planar.pipeline.design_paths import design_file
from planar.pipeline.new_file import check_new, write_new
from planar.pipeline.reports import SPREAD, write_pack_report

Progress = Callable[[str], None]


@dataclass(frozen=True)
class SpreadQuestion:
    """What is asked of a spread: boards drawn on the model, the seed they are drawn with, whether half of them are
    without their cover, whether to move the design for yield, and where to write the moved one as a brief."""

    samples: int
    seed: int
    uncovered: bool = False
    recentre: bool = False
    write: Path | None = None


@dataclass(frozen=True)
class Scattered:
    """A design, its spread, where it was moved for yield, where spread.json is, and in `facts` what `--json` says."""

    design: Design
    spread: Spread
    recentred: Recentred | None
    file: Path
    facts: dict[str, Any]


def scatter(
    path: Path,
    library: Library,
    outputs: Path | None,
    question: SpreadQuestion,
    progress: Progress = lambda stage: None,
) -> Scattered:
    """Work out the spread of the design, or of the brief, at `path`.

    spread.json joins the pack the design lies in, whose report then shows it, or stands in `outputs`/<name>-spread.
    The moved design is written as a brief last of all, where asked for. Raises `PlanarError`.
    """
    if question.write is not None:
        check_new(question.write)
    source = design_file(path)
    design = solved_design(source, library, progress)
    request = SpreadRequest(question.samples, question.seed, uncovered=question.uncovered)
    with workers() as shared:
        found = spread(design, shared, request, progress)
        moved = recentred(design, found, shared, progress) if question.recentre else None
    progress("writing files")
    told = spread_facts(found)
    file = _kept(told, source, outputs, library)
    if question.write is not None:
        kept = design if moved is None else moved.design
        write_new(write_brief(redimensioned(kept, kept.dimensions, library)), question.write)
    brought = {} if moved is None else {"recentred": recentred_facts(moved)}
    return Scattered(design, found, moved, file, told | brought)


def _kept(told: Mapping[str, Any], source: Path, outputs: Path | None, library: Library) -> Path:
    """Write `told`, the facts of a spread, as spread.json into the pack of the design.json `source`, whose report then
    shows it, or into a folder of its own; where it is."""
    pack = source.absolute().parent
    if joins_pack(source, outputs):
        with renewed(pack) as fresh:
            write_spread({**told, "design_hash": read_facts(source)["hash"]}, fresh / SPREAD)
            write_pack_report(fresh, library)
        return source.parent / SPREAD
    folder = (outputs or OUTPUTS) / f"{told['name']}-spread"
    with packed(folder) as fresh:
        write_spread(told, fresh / SPREAD)
    return folder / SPREAD


def solved_design(source: Path, library: Library, progress: Progress) -> Design:
    """The design with its prediction: sized from the brief at `source`, or that of a design.json solved anew with the
    dimensions it has. Raises `PlanarError`."""
    if source.suffix != ".json":
        return sized_design(read_brief(source, library), library, str(source), progress)
    given = given_brief(read_facts(source))
    return sized_design(check_brief(given, str(source), library), library, str(source), progress)

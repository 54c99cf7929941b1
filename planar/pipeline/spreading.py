"""`planar spread`: how made boards scatter about a design, what does it, and where the design is best put."""

from __future__ import annotations

import json
from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from planar.brief import check_brief, read_brief, write_brief
from planar.design.design import Design
from planar.design.design_file import design_facts, given_brief, read_design
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
    """A design, its spread, where it was moved for yield, and where spread.json is."""

    design: Design
    spread: Spread
    recentred: Recentred | None
    file: Path

    @property
    def facts(self) -> dict[str, Any]:
        """What `--json` says: the spread, and what re-centring brought."""
        moved = self.recentred
        return spread_facts(self.spread) | ({} if moved is None else {"recentred": recentred_facts(moved)})


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
    file = _kept(found, source, outputs, library)
    if question.write is not None:
        _write_brief(moved.design if moved is not None else design, library, question.write)
    return Scattered(design, found, moved, file)


def _kept(found: Spread, source: Path, outputs: Path | None, library: Library) -> Path:
    """Write spread.json into the pack of the design.json `source`, whose report then shows it, or into a folder of its
    own; where it is."""
    told = spread_facts(found)
    pack = source.absolute().parent
    if joins_pack(source, outputs):
        told |= {"design_hash": json.loads(source.read_bytes())["hash"]}
        with renewed(pack) as fresh:
            write_spread(told, fresh / SPREAD)
            write_pack_report(fresh, library)
        return source.parent / SPREAD
    folder = (outputs or OUTPUTS) / f"{found.name}-spread"
    with packed(folder) as fresh:
        write_spread(told, fresh / SPREAD)
    return folder / SPREAD


def solved_design(source: Path, library: Library, progress: Progress) -> Design:
    """The design with its prediction: sized from the brief at `source`, or that of a design.json solved anew with the
    dimensions it has. Raises `PlanarError`."""
    if source.suffix != ".json":
        return sized_design(read_brief(source, library), library, str(source), progress)
    read_design(source, library)  # refuses a file that was changed
    given = given_brief(json.loads(source.read_bytes()))
    return sized_design(check_brief(given, str(source), library), library, str(source), progress)


def _write_brief(design: Design, library: Library, path: Path) -> None:
    """The design as a brief with its dimensions given; never over an existing file."""
    told = given_brief(json.loads(json.dumps(design_facts(design))))
    write_new(write_brief(check_brief(told, str(path), library)), path)

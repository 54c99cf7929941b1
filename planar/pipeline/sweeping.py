"""`planar sweep`: one row a design over any axes of a brief, kept as they come, written as tables and plots."""

from __future__ import annotations

import csv
import io
import json
import tomllib
from collections.abc import Callable, Generator, Mapping, Sequence
from contextlib import closing
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from planar.brief import read_brief, write_brief
from planar.design.design_file import design_facts, drawn_again, given_brief, read_facts
from planar.design.row_farm import cluster_rows, local_rows
from planar.design.row_store import RowStore, row_store
from planar.design.sized import sized_design
from planar.design.sweep_axes import Axis, Row, read_axes, sweep_rows
from planar.design.sweep_rows import LOST, Task, row_columns, row_facts, row_ground, row_keys
from planar.design.workers import cores
from planar.handoff import check_destination, packed
from planar.library import Library
from planar.pipeline.design_paths import design_file
from planar.report.page import write_report
from planar.report.sweep_facts import asked_levels
from planar.report.sweep_page import sweep_page
from planar.report.sweep_plot import PLOTTED, check_plots, write_sweep_plots

Progress = Callable[[str], None]
STORE = "rows.sqlite"
"""Name of the file rows are kept in, in the folder of all outputs."""


@dataclass(frozen=True)
class SweepQuestion:
    """What is asked of a sweep: texts of its axes, whether the dimensions of the base stay as they are, the quantities
    to plot, the store (None: beside the outputs), processes (None: one for each core) or the scheduler of a cluster."""

    vary: tuple[str, ...]
    given: bool = False
    plots: tuple[str, ...] = ()
    store: Path | None = None
    processes: int | None = None
    scheduler: str | None = None


@dataclass(frozen=True)
class Swept:
    """Axes, rows, what became of each row (in their order), how many were kept from before, and the folder."""

    axes: tuple[Axis, ...]
    rows: tuple[Row, ...]
    facts: tuple[Mapping[str, Any], ...]
    kept: int
    folder: Path

    @property
    def table(self) -> list[dict[str, Any]]:
        """A mapping of columns for each row: its number, the axes as given, what was found."""
        pairs = zip(self.rows, self.facts, strict=True)
        return [{"row": row.number, **row.settings, **row_columns(facts)} for row, facts in pairs]


def sweep(
    path: Path,
    library_folder: Path | None,
    outputs: Path,
    question: SweepQuestion,
    progress: Progress = lambda stage: None,
) -> Swept:
    """Work out every row of `question` on the brief, or the design, at `path`; write `outputs`/<name>-sweep.

    Raises `PlanarError`. Rows done before an interruption stay in the store; a note of the exception says so.
    """
    library = Library.open(library_folder)
    axes = read_axes(question.vary)
    check_plots(question.plots)
    source = design_file(path)
    name, base = _base(source, library, question, progress)
    folder = outputs / f"{name}-sweep"
    check_destination(folder)
    rows = sweep_rows(base, axes, str(source), library)
    place = question.store or outputs / STORE
    try:
        with row_store(place) as store:
            found = _found(rows, store, _Work(name, library, library_folder, question, progress))
    except KeyboardInterrupt as interrupt:
        interrupt.add_note(f"rows that were done are kept in {place}: the same command goes on from there")
        raise
    swept = Swept(axes, rows, found.facts, found.kept, folder)
    progress("writing files")
    with packed(folder) as fresh:
        _write(swept, fresh, question.plots or PLOTTED)
    return swept


def _base(path: Path, library: Library, question: SweepQuestion, progress: Progress) -> tuple[str, Mapping[str, Any]]:
    """Name and tables the rows start from; with the dimensions of a design where these stay."""
    if path.suffix == ".json":
        facts = read_facts(path)
        return drawn_again(facts, str(path), library).name, given_brief(facts)
    brief = read_brief(path, library)
    if question.given and not brief.antenna.dimensions:
        progress("sizing the board whose dimensions stay")
        return brief.name, given_brief(design_facts(sized_design(brief, library, str(path))))
    return brief.name, tomllib.loads(write_brief(brief))


@dataclass(frozen=True)
class _Work:
    """Rows of the brief `name` with the `library`, of which `folder` is the user's, done where the `question` says."""

    name: str
    library: Library
    folder: Path | None
    question: SweepQuestion
    step: Progress

    def done(self, briefs: Sequence[Mapping[str, Any]]) -> Generator[tuple[int, dict[str, Any]], None, None]:
        """Index and facts of each of the `briefs` as it is done, here or on a cluster."""
        folder = None if self.folder is None else self.folder.resolve()  # workers stand elsewhere
        tasks: list[Task] = [(brief, self.name, folder) for brief in briefs]
        if self.question.scheduler is not None and tasks:
            return cluster_rows(row_facts, tasks, address=self.question.scheduler, ground=row_ground(self.library))
        return local_rows(row_facts, tasks, processes=self.question.processes or cores())


@dataclass(frozen=True)
class _Found:
    facts: tuple[Mapping[str, Any], ...]
    kept: int


def _found(rows: Sequence[Row], store: RowStore, work: _Work) -> _Found:
    """Facts of every row, those in the store from there; equal rows are worked out once."""
    keys = row_keys((row.data for row in rows), work.name, work.library)
    first = dict(zip(reversed(keys), reversed(rows), strict=True))
    known = {key: facts for key in dict.fromkeys(keys) if (facts := store.find(key)) is not None}
    kept = len(known)
    missing = list(dict.fromkeys(key for key in keys if key not in known))
    work.step(f"{len(rows)} rows, {kept} known from before")
    with closing(work.done([first[key].data for key in missing])) as done:
        for count, (index, facts) in enumerate(done, start=1):
            known[missing[index]] = facts
            if facts["status"] != LOST:
                store.keep(missing[index], facts)
            work.step(f"row {first[missing[index]].number} {facts['status']}, {count} of {len(missing)}")
    return _Found(tuple(known[key] for key in keys), kept)


def _write(swept: Swept, folder: Path, plots: Sequence[str]) -> None:
    """Tables for programs and people, a plot for each quantity, and the page."""
    table = swept.table
    names = list(dict.fromkeys(name for row in table for name in row))
    text = io.StringIO()
    writer = csv.DictWriter(text, names, lineterminator="\n", restval="")
    writer.writeheader()
    writer.writerows(table)
    (folder / "sweep.csv").write_bytes(text.getvalue().encode("utf-8"))
    told = {
        "axes": [{"key": axis.key, "values": list(axis.texts)} for axis in swept.axes],
        "rows": [
            {"row": row.number, "settings": dict(row.settings), **facts}
            for row, facts in zip(swept.rows, swept.facts, strict=True)
        ],
    }
    (folder / "sweep.json").write_bytes((json.dumps(told, indent=1, ensure_ascii=False) + "\n").encode("utf-8"))
    _write_parquet(table, names, folder / "sweep.parquet")
    write_sweep_plots(swept.axes, table, folder, plots, asked=asked_levels(told["rows"]))
    name = swept.folder.name.removesuffix("-sweep")
    write_report(sweep_page(swept.axes, told["rows"], name=name, plots=plots), folder / "sweep.html")


def _write_parquet(table: Sequence[Mapping[str, Any]], names: Sequence[str], path: Path) -> None:
    """The table as Parquet where pyarrow is installed."""
    try:
        import pyarrow
        import pyarrow.parquet
    except ImportError:
        return
    columns = {name: [row.get(name) for row in table] for name in names}
    pyarrow.parquet.write_table(pyarrow.table(columns), path)

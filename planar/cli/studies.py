"""Commands that look at many boards: spread, sweep."""

from __future__ import annotations

from pathlib import Path

import click

from planar.cli.options import apart_option, json_option, library_option, outputs_option, refusing


@click.command()
@click.argument("brief", metavar="BRIEF|DESIGN", type=click.Path(path_type=Path))
@click.option(
    "--vary",
    multiple=True,
    metavar="KEY=VALUES",
    help='A key of the brief with its values, "board.thickness=0.8 mm,1.6 mm", or a range with a count, '
    '"board.thickness=0.8 mm:1.6 mm:3"; may be repeated.',
)
@click.option("--given", is_flag=True, help="Size BRIEF once and keep its dimensions in every row. So for a DESIGN.")
@click.option("--plot", "plots", multiple=True, metavar="COLUMN", help="A column to plot as an SVG; may be repeated.")
@click.option(
    "--store", type=click.Path(path_type=Path), help="File rows are kept in. Default: rows.sqlite in OUTPUTS."
)
@click.option("--processes", type=click.IntRange(1), help="Processes of this machine. Default: one for each core.")
@click.option("--scheduler", metavar="ADDRESS", help="Work on the Dask cluster whose scheduler is at ADDRESS.")
@outputs_option
@library_option
@json_option
@refusing
def sweep(
    brief: Path,
    vary: tuple[str, ...],
    given: bool,
    plots: tuple[str, ...],
    store: Path | None,
    processes: int | None,
    scheduler: str | None,
    outputs: Path,
    library_folder: Path | None,
    as_json: bool,
) -> None:
    """Vary any keys of a brief over values or ranges: a row a design, as CSV, JSON and plots.

    A sweep that was interrupted goes on where it stopped; a row worked out before costs nothing.
    """
    from planar.pipeline import sweeping
    from planar.report import console, study_console

    question = sweeping.SweepQuestion(vary, given, plots, store, processes, scheduler)
    with console.progress() as step:
        swept = sweeping.sweep(brief, library_folder, outputs, question, step)
    if as_json:
        console.print_json({"folder": str(swept.folder), "known_from_before": swept.kept, "rows": swept.table})
    else:
        study_console.print_sweep(swept.axes, swept.table, swept.folder)


@click.command()
@click.argument("design", metavar="DESIGN|BRIEF", type=click.Path(path_type=Path))
@click.option("--samples", type=click.IntRange(1_000, 200_000), default=10_000, show_default=True, help="Boards drawn.")
@click.option("--seed", type=int, default=1, show_default=True, help="Of the draw: the same seed, the same yield.")
@click.option("--uncovered", is_flag=True, help="Half of the boards run without their cover.")
@click.option("--recentre", is_flag=True, help="Move the dimensions to where most boards meet the brief.")
@click.option("--write", type=click.Path(path_type=Path), help="Write the moved design as a brief; with --recentre.")
@apart_option
@library_option
@json_option
@refusing
def spread(
    design: Path,
    samples: int,
    seed: int,
    uncovered: bool,
    recentre: bool,
    write: Path | None,
    outputs: Path | None,
    library_folder: Path | None,
    as_json: bool,
) -> None:
    """Tolerances of laminate, fab and surroundings: worst corners, yield, what dominates, and re-centring."""
    if write is not None and not recentre:
        raise click.UsageError("--write goes with --recentre")
    from planar.library import Library
    from planar.pipeline import spreading
    from planar.report import console, study_console

    question = spreading.SpreadQuestion(samples, seed, uncovered, recentre, write)
    with console.progress() as step:
        found = spreading.scatter(design, Library.open(library_folder), outputs, question, step)
    if as_json:
        console.print_json(found.facts | {"file": str(found.file)})
    else:
        study_console.print_spread(found.facts, found.file)

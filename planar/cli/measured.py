"""The command for a board that was built and measured: retune."""

from __future__ import annotations

from pathlib import Path

import click

from planar.cli.options import json_option, library_option, outputs_option, refusing


@click.command()
@click.argument("design", metavar="DESIGN|BRIEF", type=click.Path(path_type=Path))
@click.argument("file", type=click.Path(path_type=Path))
@click.option(
    "--extension", metavar="LENGTH", help='Coax between calibration and board, such as "30 mm". Default: unknown.'
)
@click.option(
    "--short", type=click.Path(path_type=Path), help="Sweep of a short in the antenna's place; with --opened."
)
@click.option("--opened", type=click.Path(path_type=Path), help="Sweep of an open in the antenna's place.")
@click.option("--load", type=click.Path(path_type=Path), help="Sweep of a load in the antenna's place.")
@click.option("--second", type=click.Path(path_type=Path), help="A second sweep, the cable held or led differently.")
@click.option("--write", type=click.Path(path_type=Path), help="Also write the corrected brief to this new file.")
@click.option("--learn", type=click.Path(path_type=Path), help="Library folder that keeps the laminate as measured.")
@outputs_option
@library_option
@json_option
@refusing
def retune(
    design: Path,
    file: Path,
    extension: str | None,
    short: Path | None,
    opened: Path | None,
    load: Path | None,
    second: Path | None,
    write: Path | None,
    learn: Path | None,
    outputs: Path,
    library_folder: Path | None,
    as_json: bool,
) -> None:
    """From the measured reflection FILE of a built board: which dimension to change, and by how much.

    FILE is a Touchstone file or a table with a header. Says what can be cut off now, and writes the next brief.
    """
    if (short is None) != (opened is None) or (load is not None and short is None):
        raise click.UsageError("--short and --opened go together, --load with both")
    if short is not None and extension is not None:
        raise click.UsageError("--extension and measured standards are two answers: choose one")
    from planar.library import Library
    from planar.pipeline import retuning
    from planar.report import console, retune_console

    standards = tuple(each for each in (short, opened, load) if each is not None)
    question = retuning.RetuneQuestion(extension, standards, second, write, learn)
    with console.progress() as step:
        found = retuning.retune_board(design, file, Library.open(library_folder), outputs, question, step)
    if as_json:
        console.print_json(found.facts | {"folder": str(found.folder)})
    else:
        retune_console.print_retuned(found.facts, found.retuned.findings, found.folder)
        if found.learnt is not None:
            click.echo(f"laminate {found.learnt.key} kept in {learn}: use it with --library {learn}")

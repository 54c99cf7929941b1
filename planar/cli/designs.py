"""Commands from a brief to a board: new, make, size, solve."""

from __future__ import annotations

import json
import shlex
from pathlib import Path

import click

from planar.cli.options import json_option, library_option, outputs_option, refusing, sensitivities_option


@click.command()
@click.argument("name", type=click.Path(path_type=Path))
@json_option
@refusing
def new(name: Path, as_json: bool) -> None:
    """Write a commented brief NAME.toml."""
    from planar.pipeline.starting import new_brief

    path = new_brief(name)
    advice = f"{path} written: edit it, then planar make {shlex.quote(str(path))}"
    click.echo(json.dumps({"file": str(path)}) if as_json else advice)


@click.command()
@click.argument("brief", type=click.Path(path_type=Path))
@outputs_option
@sensitivities_option
@click.option("--open", "opened", is_flag=True, help="Open the report in the browser.")
@library_option
@json_option
@refusing
def make(
    brief: Path, outputs: Path, sensitivities: bool, opened: bool, library_folder: Path | None, as_json: bool
) -> None:
    """Size, draw, check and write the pack for BRIEF, with a report to decide from."""
    from planar.design.design_file import design_facts
    from planar.library import Library
    from planar.pipeline import making
    from planar.pipeline.reports import REPORT
    from planar.report import console

    with console.progress() as step:
        library = Library.open(library_folder)
        made = making.make(brief, library, outputs, sensitive=sensitivities, progress=step)
    if as_json:
        console.print_json(design_facts(made.design) | {"folder": str(made.folder)})
    else:
        console.print_design(made.design, made.folder)
        if made.gone:
            click.echo(f"{', '.join(made.gone)} of the earlier pack went with it: make them again for this board")
    if opened:
        click.launch(str(made.folder / REPORT))


@click.command()
@click.argument("brief", type=click.Path(path_type=Path))
@sensitivities_option
@library_option
@json_option
@refusing
def size(brief: Path, sensitivities: bool, library_folder: Path | None, as_json: bool) -> None:
    """Dimensions and prediction for BRIEF, nothing written."""
    from planar.design.design_file import design_facts
    from planar.library import Library
    from planar.pipeline import designing
    from planar.report import console

    with console.progress() as step:
        design = designing.size(brief, Library.open(library_folder), sensitive=sensitivities, progress=step)
    if as_json:
        console.print_json(design_facts(design))
    else:
        console.print_design(design)


@click.command()
@click.argument("brief", metavar="BRIEF|DESIGN", type=click.Path(path_type=Path))
@click.option(
    "--at", multiple=True, help='Frequency such as "868 MHz"; may be repeated. Default: edges and middle of the band.'
)
@click.option(
    "--sweep", type=(str, str, int), metavar="LOW HIGH N", help="Reflection at N frequencies from LOW to HIGH."
)
@click.option("--s1p", type=click.Path(path_type=Path), help="Write the sweep as a Touchstone file.")
@library_option
@json_option
@refusing
def solve(
    brief: Path,
    at: tuple[str, ...],
    sweep: tuple[str, str, int] | None,
    s1p: Path | None,
    library_folder: Path | None,
    as_json: bool,
) -> None:
    """Field solution of a brief's copper, or of that in a design.json: impedance, gain, losses, polarisation."""
    from planar.design.solve_question import SolveQuestion
    from planar.library import Library
    from planar.pipeline import designing
    from planar.report import console

    with console.progress() as step:
        solved = designing.solve(brief, Library.open(library_folder), SolveQuestion(at, sweep, s1p), step)
    if as_json:
        console.print_json(designing.solution_facts(solved))
    else:
        console.print_solution(solved.design, solved.solution)

"""The command line: reads arguments, calls the pipeline, prints. Nothing else.

Every command has `--json`; exit code 0 is done, 1 refused with the reason, 2 wrong usage. Heavy
imports stand inside the commands, so that `planar --help` answers at once.
"""

from __future__ import annotations

import functools
import io
import json
import shlex
import sys
from collections.abc import Callable
from dataclasses import asdict
from pathlib import Path
from typing import Any, TypeVar

import click

from planar import __version__
from planar.errors import PlanarError

Command = TypeVar("Command", bound=Callable[..., Any])

library_option = click.option(
    "--library",
    "library_folder",
    type=click.Path(path_type=Path),
    help="Folder searched before the shipped laminates, fabs, connectors, covers and families.",
)
json_option = click.option("--json", "as_json", is_flag=True, help="Print JSON instead of a table.")


def refusing(command: Command) -> Command:
    """Turn a `PlanarError` into its message on stderr and exit code 1."""

    @functools.wraps(command)
    def wrapped(*args: Any, **kwargs: Any) -> Any:
        try:
            return command(*args, **kwargs)
        except KeyboardInterrupt:
            click.echo("interrupted: nothing was written", err=True)
            sys.exit(130)
        except PlanarError as error:
            click.echo(f"refused: {error}", err=True)
            if kwargs.get("as_json"):
                click.echo(json.dumps({"refused": error.facts()}, indent=2))
            sys.exit(1)

    return wrapped  # type: ignore[return-value]


sensitivities_option = click.option(
    "--sensitivities",
    is_flag=True,
    help="Also solve every dimension and layer either way: MHz and ohm per mm.",
)


@click.group(context_settings={"help_option_names": ["-h", "--help"]})
@click.version_option(__version__, prog_name="planar")
def main() -> None:
    """From a band and a laminate to a tuned printed loop antenna.

    Start with `planar new NAME`, edit the brief, then `planar make NAME.toml`.
    """
    if isinstance(sys.stdout, io.TextIOWrapper):  # a name the terminal has no letters for must not end the run
        sys.stdout.reconfigure(errors="backslashreplace")


@main.command()
@click.argument("name", type=click.Path(path_type=Path))
@json_option
@refusing
def new(name: Path, as_json: bool) -> None:
    """Write a commented brief NAME.toml."""
    from planar import pipeline

    path = pipeline.new_brief(name)
    advice = f"{path} written: edit it, then planar make {shlex.quote(str(path))}"
    click.echo(json.dumps({"file": str(path)}) if as_json else advice)


@main.command()
@click.argument("brief", type=click.Path(path_type=Path))
@click.option(
    "--outputs",
    type=click.Path(path_type=Path),
    default=Path("outputs"),
    show_default=True,
    help="Folder the pack is written to, under the brief's name.",
)
@sensitivities_option
@library_option
@json_option
@refusing
def make(brief: Path, outputs: Path, sensitivities: bool, library_folder: Path | None, as_json: bool) -> None:
    """Size, draw, check and write the pack for BRIEF."""
    from planar import pipeline
    from planar.design.design_file import design_facts
    from planar.library import Library
    from planar.report import console

    with console.progress() as step:
        library = Library.open(library_folder)
        made = pipeline.make(brief, library, outputs, sensitive=sensitivities, progress=step)
    if as_json:
        console.print_json(design_facts(made.design) | {"folder": str(made.folder)})
    else:
        console.print_design(made.design, made.folder)


@main.command()
@click.argument("brief", type=click.Path(path_type=Path))
@sensitivities_option
@library_option
@json_option
@refusing
def size(brief: Path, sensitivities: bool, library_folder: Path | None, as_json: bool) -> None:
    """Dimensions and prediction for BRIEF, nothing written."""
    from planar import pipeline
    from planar.design.design_file import design_facts
    from planar.library import Library
    from planar.report import console

    with console.progress() as step:
        design = pipeline.size(brief, Library.open(library_folder), sensitive=sensitivities, progress=step)
    if as_json:
        console.print_json(design_facts(design))
    else:
        console.print_design(design)


@main.command()
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
    from planar import pipeline
    from planar.design.solve_question import SolveQuestion
    from planar.library import Library
    from planar.report import console

    with console.progress() as step:
        solved = pipeline.solve(brief, Library.open(library_folder), SolveQuestion(at, sweep, s1p), step)
    if as_json:
        console.print_json(pipeline.solution_facts(solved))
    else:
        console.print_solution(solved.design, solved.solution)


@main.command()
@click.option("--kind", type=click.Choice(["microstrip", "coplanar-strips"]), default="microstrip", show_default=True)
@click.option("--impedance", multiple=True, help='Such as "50 ohm"; may be repeated. Default 50, 75 and 100 ohm.')
@click.option("--laminate", multiple=True, help="Library key; may be repeated. Default fr4-general.")
@click.option("--height", multiple=True, help='Dielectric thickness such as "1.6 mm". Default: those sold.')
@click.option("--eps-r", type=float, help="Relative permittivity, instead of --laminate.")
@click.option("--tan-d", type=float, help="Loss tangent that goes with --eps-r. Default: none.")
@click.option("--frequency", default="1 GHz", show_default=True)
@click.option("--copper", help="Finished copper. Default: 35 um base and the fab's plating; none with --eps-r.")
@click.option("--gap", help="Gap of coplanar strips. Default: the widest that gives a usable width.")
@click.option("--mask", is_flag=True, help="Count the fab's solder mask on top.")
@click.option("--fab", default="pool-two-layer", show_default=True, help="Whose limits flag a row.")
@click.option("--csv", "as_csv", is_flag=True, help="Print CSV instead of a table.")
@click.option("--plot", type=click.Path(path_type=Path), help="Write width over impedance as an SVG.")
@library_option
@json_option
@refusing
def lines(library_folder: Path | None, as_json: bool, as_csv: bool, plot: Path | None, **asked: Any) -> None:
    """Trace widths for impedances across laminates and thicknesses."""
    if as_json and as_csv:
        raise click.UsageError("--json and --csv are two answers: choose one")
    from planar import pipeline
    from planar.design.line_question import LineQuestion
    from planar.library import Library
    from planar.report import console

    rows = pipeline.lines(LineQuestion(**asked), Library.open(library_folder))
    if plot is not None:
        from planar.report.line_plot import write_line_plot

        write_line_plot(rows, plot)
    if as_json:
        console.print_json([asdict(row) for row in rows])
    else:
        (console.print_lines_csv if as_csv else console.print_lines)(rows)


@main.command("library")
@click.argument("kind", required=False)
@click.argument("key", required=False)
@library_option
@json_option
@refusing
def show_library(kind: str | None, key: str | None, library_folder: Path | None, as_json: bool) -> None:
    """List laminates, fabs, connectors, covers and families; KIND and KEY show one entry with its sources."""
    from planar import pipeline
    from planar.library import Library
    from planar.report import console

    library = Library.open(library_folder)
    found = pipeline.library_entries(library, kind) if key is None else pipeline.library_entry(library, kind or "", key)
    if as_json:
        console.print_json(found)
    else:
        (console.print_entries if key is None else console.print_entry)(found)

"""Commands that need no design: lines, library."""

from __future__ import annotations

from dataclasses import asdict
from pathlib import Path
from typing import Any

import click

from planar.cli.options import json_option, library_option, refusing


@click.command()
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
    from planar.design.line_question import LineQuestion
    from planar.library import Library
    from planar.pipeline import answers
    from planar.report import console

    rows = answers.lines(LineQuestion(**asked), Library.open(library_folder))
    if plot is not None:
        from planar.report.line_plot import write_line_plot

        write_line_plot(rows, plot)
    if as_json:
        console.print_json([asdict(row) for row in rows])
    else:
        (console.print_lines_csv if as_csv else console.print_lines)(rows)


@click.command("library")
@click.argument("kind", required=False)
@click.argument("key", required=False)
@library_option
@json_option
@refusing
def show_library(kind: str | None, key: str | None, library_folder: Path | None, as_json: bool) -> None:
    """List laminates, fabs, connectors, covers and families; KIND and KEY show one entry with its sources."""
    from planar.library import Library
    from planar.pipeline import answers
    from planar.report import console

    library = Library.open(library_folder)
    found = answers.library_entries(library, kind) if key is None else answers.library_entry(library, kind or "", key)
    if as_json:
        console.print_json(found)
    else:
        (console.print_entries if key is None else console.print_entry)(found)

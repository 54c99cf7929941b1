"""Commands for pages: report, compare."""

from __future__ import annotations

import json
from pathlib import Path

import click

from planar.cli.options import json_option, library_option, refusing

open_option = click.option("--open", "opened", is_flag=True, help="Open the page in the browser.")


@click.command()
@click.argument("design", type=click.Path(path_type=Path))
@open_option
@library_option
@json_option
@refusing
def report(design: Path, opened: bool, library_folder: Path | None, as_json: bool) -> None:
    """Write report.html of DESIGN (a pack's folder or its design.json) anew."""
    from planar.library import Library
    from planar.pipeline import reports
    from planar.report import console

    with console.progress() as step:
        page = reports.report(design, Library.open(library_folder), step)
    _told(page, opened, as_json)


@click.command()
@click.argument("designs", nargs=-1, required=True, metavar="DESIGN DESIGN ...", type=click.Path(path_type=Path))
@click.option(
    "--page", type=click.Path(path_type=Path), default=Path("comparison.html"), show_default=True, help="File to write."
)
@open_option
@library_option
@json_option
@refusing
def compare(designs: tuple[Path, ...], page: Path, opened: bool, library_folder: Path | None, as_json: bool) -> None:
    """Hold two or more designs (packs' folders or design.json files) against each other on one page."""
    from planar.library import Library
    from planar.pipeline import reports
    from planar.report import console

    with console.progress() as step:
        written = reports.compare(designs, Library.open(library_folder), page, step)
    _told(written, opened, as_json)


def _told(page: Path, opened: bool, as_json: bool) -> None:
    click.echo(json.dumps({"file": str(page)}) if as_json else f"{page} written")
    if opened:
        click.launch(str(page))

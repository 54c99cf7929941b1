"""Commands for what is made beside the board itself: panel, coupon."""

from __future__ import annotations

from pathlib import Path

import click

from planar.cli.options import apart_option, json_option, library_option, refusing

design_argument = click.argument("design", type=click.Path(path_type=Path))


@click.command()
@design_argument
@click.option("--count", metavar="NXxNY", help='Columns and rows such as "2x3".')
@click.option("--fit", is_flag=True, help="As many boards as the fab's panel holds. So unless --count is given.")
@click.option("--separate", type=click.Choice(["score", "tabs"]), help="Default: scored where copper and edges allow.")
@click.option("--coupon", is_flag=True, help="With a strip to measure the laminate on, see planar coupon.")
@apart_option
@library_option
@json_option
@refusing
def panel(
    design: Path,
    count: str | None,
    fit: bool,
    separate: str | None,
    coupon: bool,
    outputs: Path | None,
    library_folder: Path | None,
    as_json: bool,
) -> None:
    """Join the boards of DESIGN (a pack's folder or design.json) in a panel with rails, marks and files of its own."""
    if fit and count is not None:
        raise click.UsageError("--fit and --count are two answers: choose one")
    from planar.library import Library
    from planar.pipeline import panels
    from planar.report import console, making_console

    question = panels.PanelQuestion(count, separate, coupon)
    with console.progress() as step:
        made = panels.panel(design, Library.open(library_folder), outputs, question, step)
    if as_json:
        console.print_json(panels.panel_facts(made.design, made.panel) | {"folder": str(made.folder)})
    else:
        making_console.print_panel(panels.panel_facts(made.design, made.panel), made.panel.findings, made.folder)


@click.command()
@design_argument
@click.option(
    "--measured",
    multiple=True,
    type=click.Path(path_type=Path),
    metavar="FILE",
    help="Touchstone of the ring or of both lines; may be repeated. Says the permittivity, writes nothing.",
)
@click.option("--thickness", help='Thickness of the dielectric as measured, such as "1.57 mm".')
@apart_option
@library_option
@json_option
@refusing
def coupon(
    design: Path,
    measured: tuple[Path, ...],
    thickness: str | None,
    outputs: Path | None,
    library_folder: Path | None,
    as_json: bool,
) -> None:
    """A board to measure the laminate of DESIGN (a pack's folder or design.json) on, or what --measured says of it."""
    if thickness is not None and not measured:
        raise click.UsageError("--thickness goes with --measured")
    from planar.design.coupon_sheet import measurement_report
    from planar.library import Library
    from planar.pipeline import coupons
    from planar.report import console, making_console
    from planar.units import quantity

    library = Library.open(library_folder)
    if measured:
        height = None if thickness is None else quantity(thickness, "length")
        found = coupons.measured_coupon(design, library, measured, thickness=height)
        if as_json:
            console.print_json(coupons.measurement_facts(found))
        else:
            click.echo(measurement_report(found), nl=False)
        return
    with console.progress() as step:
        made = coupons.coupon(design, library, outputs, step)
    if as_json:
        console.print_json(coupons.coupon_facts(made.coupon) | {"folder": str(made.folder)})
    else:
        making_console.print_coupon(coupons.coupon_facts(made.coupon), made.folder)

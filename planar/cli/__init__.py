"""The command line: reads arguments, calls the pipeline, prints. Nothing else.

Every command has `--json`; exit code 0 is done, 1 refused with the reason, 2 wrong usage. Heavy
imports stand inside the commands, so that `planar --help` answers at once.
"""

from __future__ import annotations

import io
import sys

import click

from planar import __version__
from planar.cli.designs import make, new, size, solve
from planar.cli.making import coupon, panel
from planar.cli.measured import retune
from planar.cli.pages import compare, report
from planar.cli.studies import spread, sweep
from planar.cli.tables import lines, show_library


@click.group(context_settings={"help_option_names": ["-h", "--help"]})
@click.version_option(__version__, prog_name="planar")
def main() -> None:
    """From a band and a laminate to a tuned printed loop antenna.

    Start with `planar new NAME`, edit the brief, then `planar make NAME.toml`.
    """
    if isinstance(sys.stdout, io.TextIOWrapper):  # a name the terminal has no letters for must not end the run
        sys.stdout.reconfigure(errors="backslashreplace")


for _command in (new, make, size, solve, panel, coupon, report, compare, spread, sweep, retune, lines, show_library):
    main.add_command(_command)

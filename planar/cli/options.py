"""What all commands share: options of one name, and the way a refusal is told."""

from __future__ import annotations

import functools
import json
import sys
from collections.abc import Callable
from pathlib import Path
from typing import Any, TypeVar

import click

from planar.errors import PlanarError

Command = TypeVar("Command", bound=Callable[..., Any])

library_option = click.option(
    "--library",
    "library_folder",
    type=click.Path(path_type=Path),
    help="Folder searched before the shipped laminates, fabs, connectors, covers and families.",
)
outputs_option = click.option(
    "--outputs",
    type=click.Path(path_type=Path),
    default=Path("outputs"),
    show_default=True,
    help="Folder results are written to, in a folder named after the brief.",
)
apart_option = click.option(
    "--outputs",
    type=click.Path(path_type=Path),
    help="Write into a folder of its own here. Default: join the pack, or else into outputs.",
)
json_option = click.option("--json", "as_json", is_flag=True, help="Print JSON instead of a table.")


def refusing(command: Command) -> Command:
    """Turn a `PlanarError` into its message on stderr and exit code 1; an interrupted command says what it left."""

    @functools.wraps(command)
    def wrapped(*args: Any, **kwargs: Any) -> Any:
        try:
            return command(*args, **kwargs)
        except KeyboardInterrupt as interrupt:
            left = getattr(interrupt, "__notes__", ["nothing was written"])
            click.echo(f"interrupted: {'; '.join(left)}", err=True)
            sys.exit(130)
        except PlanarError as error:
            click.echo("\n".join([f"refused: {error}", *getattr(error, "__notes__", ())]), err=True)
            if kwargs.get("as_json"):
                click.echo(json.dumps({"refused": error.facts()}, indent=2))
            sys.exit(1)
        except OSError as error:
            if isinstance(error, BrokenPipeError):
                raise
            click.echo(f"refused: cannot write the answer: {error.strerror}", err=True)
            sys.exit(1)

    return wrapped  # type: ignore[return-value]


sensitivities_option = click.option(
    "--sensitivities",
    is_flag=True,
    help="Also solve every dimension and layer either way: MHz and ohm per mm.",
)

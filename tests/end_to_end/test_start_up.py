"""What starting the command imports: help must not wait for libraries that help does not use."""

import re
import subprocess
import sys
from pathlib import Path

import pytest

SLOW = {"numpy", "pydantic", "pint", "shapely", "ezdxf", "gdstk", "matplotlib", "rich", "scipy", "tomli_w"}

WRITERS = {"ezdxf", "gdstk", "jinja2", "matplotlib", "reportlab"}


def loaded(folder: Path, *arguments: str, code: int = 0) -> tuple[str, set[str]]:
    """Output of a command that ends with the exit `code`, and the top-level names of every module it loaded."""
    command = [sys.executable, "-X", "importtime", "-m", "planar", *arguments]
    done = subprocess.run(command, cwd=folder, capture_output=True, text=True, encoding="utf-8", check=False)
    assert done.returncode == code
    return done.stdout, set(re.findall(r"^import time:.*\|\s+(\w+)(?:\.[\w.]+)?$", done.stderr, re.MULTILINE))


@pytest.mark.parametrize("arguments", [("--help",), ("-h",), ("--version",), ("make", "--help"), ("lines", "--help")])
def test_help_loads_nothing_slow(tmp_path: Path, arguments: tuple[str, ...]) -> None:
    output, modules = loaded(tmp_path, *arguments)
    assert "planar" in output
    assert {"planar", "click"} <= modules
    assert modules & SLOW == set()


def test_a_brief_to_start_from_waits_for_no_solver_and_sizing_for_no_writers(tmp_path: Path) -> None:
    """`size` ends here where it has read that there is no such brief, everything it needs loaded."""
    _, new = loaded(tmp_path, "new", "bench")
    _, size = loaded(tmp_path, "size", "none.toml", code=1)
    assert new & (WRITERS | {"scipy", "shapely"}) == set()
    assert size & WRITERS == set()
    assert "scipy" in size


def test_a_command_that_works_is_seen_loading(tmp_path: Path) -> None:
    """The measurement itself: a command that draws a table does load some of them."""
    _, modules = loaded(tmp_path, "library", "fabs")
    assert {"rich", "numpy"} <= modules

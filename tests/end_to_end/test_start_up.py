"""What starting the command imports: help must not wait for libraries that help does not use."""

import re
import subprocess
import sys
from pathlib import Path

import pytest

SLOW = {"numpy", "pydantic", "pint", "shapely", "ezdxf", "gdstk", "matplotlib", "rich", "scipy", "tomli_w"}


def loaded(folder: Path, *arguments: str) -> tuple[str, set[str]]:
    """Output of a command, and the top-level names of every module it loaded."""
    command = [sys.executable, "-X", "importtime", "-m", "planar", *arguments]
    done = subprocess.run(command, cwd=folder, capture_output=True, text=True, encoding="utf-8", check=True)
    return done.stdout, set(re.findall(r"^import time:.*\|\s+(\w+)(?:\.[\w.]+)?$", done.stderr, re.MULTILINE))


@pytest.mark.parametrize("arguments", [("--help",), ("-h",), ("--version",), ("make", "--help"), ("lines", "--help")])
def test_help_loads_nothing_slow(tmp_path: Path, arguments: tuple[str, ...]) -> None:
    output, modules = loaded(tmp_path, *arguments)
    assert "planar" in output
    assert {"planar", "click"} <= modules
    assert modules & SLOW == set()


def test_a_command_that_works_is_seen_loading(tmp_path: Path) -> None:
    """The measurement itself: a command that draws a table does load some of them."""
    _, modules = loaded(tmp_path, "library", "fabs")
    assert {"rich", "numpy"} <= modules

"""The files that lie beside the modules of the page: templates, style, tables of words, limits."""

from __future__ import annotations

import tomllib
from functools import cache
from importlib import resources
from typing import Any


@cache
def page_text(name: str) -> str:
    """Text of the file `name` of this package."""
    return resources.files("planar.report").joinpath(name).read_text(encoding="utf-8")


def page_table(name: str) -> dict[str, Any]:
    """Content of the TOML file `name` of this package."""
    return tomllib.loads(page_text(name))

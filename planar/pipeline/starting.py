"""`planar new`: a brief to start from."""

from __future__ import annotations

from pathlib import Path

from planar.brief import starter_brief
from planar.pipeline.new_file import write_new


def new_brief(path: Path) -> Path:
    """Write a commented brief for `path` (".toml" is added); never over an existing file. Raises `HandoffError`."""
    target = path if path.suffix == ".toml" else path.with_name(path.name + ".toml")
    write_new(starter_brief(path.name.removesuffix(".toml")), target)
    return target

"""Where a design lies: in the design.json of a pack, which may be named by its folder."""

from __future__ import annotations

from pathlib import Path

DESIGN = "design.json"
"""Name of a design in its pack."""


def design_file(path: Path) -> Path:
    """The design.json meant by `path`: itself, or that of the pack in the folder `path`."""
    return path / DESIGN if path.is_dir() else path

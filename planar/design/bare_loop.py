"""The loop of a design by itself, a source across its gap: what the line sees, and what the brief calls the gap."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import replace

from planar.copper.drawing import loop_copper, loop_height
from planar.copper.layout import Island, Layout, Port, Role
from planar.copper.shapes import rectangle
from planar.design.choices import Choices


def has_line(dimensions: Mapping[str, float]) -> bool:
    """Whether a board of `dimensions` has a line between its pads and the gap: a guided one or strips."""
    return bool({"line_width", "strip_width"} & set(dimensions))


def bare_loop_layout(choices: Choices, dimensions: Mapping[str, float], layout: Layout) -> Layout:
    """The loop alone with a port across its gap: no line, no strips, no connector."""
    level = choices.levels[-1]
    gap = dimensions["gap"] if "gap" in dimensions else dimensions["strip_gap"]
    top = 0.5 * loop_height(dimensions)
    islands = tuple(Island(level, outline, Role.RADIATOR) for outline in loop_copper(dimensions, gap))
    reach = dimensions["loop_width"] + top
    bare = replace(
        layout,
        levels=(level,),
        islands=islands,
        holes=(),
        pads=(),
        ports=(Port("gap", "gap", level, (0.0, top), (1.0, 0.0), gap, dimensions["trace_width"]),),
        mask_openings=(),
        legend=(),
        edge=rectangle(-reach, -reach, reach, reach),
        keepout=(),
    )
    return bare.snapped()

"""An outline as the path of a picture: millimetres, y downwards as SVG counts it, arcs kept as true arcs."""

from __future__ import annotations

from collections.abc import Iterable

from planar.copper.arc import Edge
from planar.copper.outline import Outline


def path_data(outline: Outline) -> str:
    """Closed SVG path of `outline` in mm, y downwards."""
    return chain_data(outline.edges) + "Z"


def chain_data(edges: Iterable[Edge]) -> str:
    """Open SVG path of `edges` that follow each other, in mm, y downwards."""
    parts: list[str] = []
    for edge in edges:
        if not parts:
            parts.append(f"M{place(*edge.start)}")
        if edge.bulge == 0.0:
            parts.append(f"L{place(*edge.end)}")
        else:
            radius = decimal(1e3 * edge.radius)
            large, sweep = int(abs(edge.bulge) > 1.0), int(edge.bulge < 0.0)  # counter-clockwise turns against sweep
            parts.append(f"A{radius} {radius} 0 {large} {sweep} {place(*edge.end)}")
    return "".join(parts)


def place(x: float, y: float) -> str:
    """The point (x, y) in m as SVG writes it: mm, y downwards."""
    return f"{decimal(1e3 * x)} {decimal(-1e3 * y)}"


def decimal(value: float) -> str:
    """A number with up to six decimals and no exponent."""
    text = f"{value:.6f}".rstrip("0").rstrip(".")
    return "0" if text == "-0" else text

"""How the figures of the drawing draw each thing, once, so that figure and key cannot disagree."""

from __future__ import annotations

from planar.copper.layout import Level
from planar.handoff.paper import BLACK, Pen

COPPER = {Level.TOP: "#e2ab7c", Level.BOTTOM: "#93c0cc"}
"""Fill of the copper by level, pale enough for lines and letters on top of it."""
SMALL, LETTER = 7.0, 6.5
"""Points, of what stands below a figure and of letters in it."""
THIN = Pen(0.13)
EDGE = Pen(0.35)
KEEPOUT = Pen(2.4, "#e88b99", None, (2.5, 1.2))
"""Twice as wide as it is seen: only what lies inside the keepout is."""
CORRIDOR = Pen(0.0, BLACK, "#dcefd2")
TIE = Pen(0.25, "#8a2a9b")
BEYOND = Pen(0.15, "#5a5f66", None, (0.8, 0.6))
OPENING = Pen(0.2, "#8a6d00", None, (0.4, 0.4))
CUTOUT = Pen(0.35, BLACK, "#ffffff")
BOARD = Pen(0.2, "#4a4f57")
FLOOR = Pen(0.2, "#4a4f57", "#eef0e6")
SCORE = Pen(0.3, "#1f5fa8", None, (3.0, 0.8, 0.6, 0.8))
DISC = Pen(0.0, BLACK, BLACK)
HOLE = Pen(0.15, BLACK, "#ffffff")


def copper_pen(level: Level) -> Pen:
    """The copper of a level: a fill without a line, so that the figure is as large as the copper."""
    return Pen(0.0, BLACK, COPPER[level])

"""Connector land patterns, placed: pads, ground vias and the ground under them."""

from __future__ import annotations

from planar.copper.arc import Point
from planar.copper.layout import Hole, Level, Marking, Pad
from planar.copper.outline import Outline
from planar.copper.shapes import centred_rectangle, circle, rectangle
from planar.library.records import Connector, LandPad

TERMINALS = {"signal": "signal", "ground": "return"}
"""Net of a land pattern -> terminal of the feed."""


def placed(point: Point, feed: Point) -> Point:
    """Land pattern coordinates (+x toward the antenna, +y to its left) to a board where +x points up."""
    return feed[0] - point[1], feed[1] + point[0]


def land_outline(pad: LandPad, feed: Point, *, grown: float = 0.0) -> Outline:
    """Outline of a land, `grown` m larger on every side."""
    centre = placed(pad.centre, feed)
    if pad.shape == "round":
        return circle(centre, pad.size[0] + 2.0 * grown)
    return centred_rectangle(centre, pad.size[1] + 2.0 * grown, pad.size[0] + 2.0 * grown)


def land_pads(connector: Connector, feed: Point) -> tuple[Pad, ...]:
    """The connector's lands as pads, in loop coordinates with the line starting at `feed`."""
    return tuple(Pad(pad.name, Level(pad.level), land_outline(pad, feed), TERMINALS[pad.net]) for pad in connector.pads)


def land_openings(connector: Connector, feed: Point, expansion: float) -> tuple[Marking, ...]:
    """Mask openings, `expansion` m larger than the lands on every side."""
    return tuple(Marking(Level(pad.level), land_outline(pad, feed, grown=expansion)) for pad in connector.pads)


def land_holes(connector: Connector, feed: Point) -> tuple[Hole, ...]:
    """The land pattern's holes."""
    purposes = {"via": "via", "mount": "mounting"}
    return tuple(
        Hole(placed(hole.centre, feed), hole.diameter, hole.plated, purposes[hole.purpose]) for hole in connector.holes
    )


def ground_tab(connector: Connector, feed: Point, loop_edge: float) -> Outline | None:
    """Ground under the land pattern, reaching up to the loop at height `loop_edge` m; None without one."""
    tab = connector.ground_tab
    if tab is None:
        return None
    return rectangle(feed[0] - tab.half_width, feed[1] - tab.length, feed[0] + tab.half_width, loop_edge)

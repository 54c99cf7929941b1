"""Small outlines everything else is drawn from: rectangles, circles, capsules."""

from __future__ import annotations

import math

from planar.copper.arc import Edge, Point
from planar.copper.outline import Outline

QUARTER = math.tan(math.pi / 8.0)
"""Bulge of a quarter circle."""


def rectangle(x0: float, y0: float, x1: float, y1: float) -> Outline:
    """Rectangle between two opposite corners, m, counter-clockwise."""
    (x0, x1), (y0, y1) = sorted((x0, x1)), sorted((y0, y1))
    return Outline.polygon([(x0, y0), (x1, y0), (x1, y1), (x0, y1)])


def centred_rectangle(centre: Point, width: float, height: float) -> Outline:
    """Rectangle of `width` by `height` m about `centre`."""
    x, y = centre
    return rectangle(x - 0.5 * width, y - 0.5 * height, x + 0.5 * width, y + 0.5 * height)


def rounded_rectangle(x0: float, y0: float, x1: float, y1: float, *, radius: float) -> Outline:
    """Rectangle whose corners are arcs of `radius` m; radius 0 gives sharp corners."""
    if radius == 0.0:
        return rectangle(x0, y0, x1, y1)
    r = radius
    rows = [
        (x0 + r, y0, 0.0), (x1 - r, y0, QUARTER), (x1, y0 + r, 0.0), (x1, y1 - r, QUARTER),
        (x1 - r, y1, 0.0), (x0 + r, y1, QUARTER), (x0, y1 - r, 0.0), (x0, y0 + r, QUARTER),
    ]  # fmt: skip
    return Outline.closed(rows)


def circle(centre: Point, diameter: float) -> Outline:
    """Circle as two half circles."""
    x, y, r = *centre, 0.5 * diameter
    return Outline.from_edges([Edge((x - r, y), (x + r, y), 1.0), Edge((x + r, y), (x - r, y), 1.0)])


def capsule(start: Point, end: Point, width: float) -> Outline:
    """A stroke of `width` m with round ends from `start` to `end` (which differ)."""
    length = math.dist(start, end)
    nx, ny = -(end[1] - start[1]) * 0.5 * width / length, (end[0] - start[0]) * 0.5 * width / length
    right, left = (start[0] - nx, start[1] - ny), (start[0] + nx, start[1] + ny)
    far_right, far_left = (end[0] - nx, end[1] - ny), (end[0] + nx, end[1] + ny)
    return Outline.from_edges(
        [Edge(right, far_right), Edge(far_right, far_left, 1.0), Edge(far_left, left), Edge(left, right, 1.0)]
    )


def turned_rectangle(centre: Point, along: Point, *, length: float, width: float) -> Outline:
    """Rectangle of `length` m along the unit vector `along` and `width` m across it."""
    (x, y), (ux, uy) = centre, along
    a, b = 0.5 * length, 0.5 * width
    corners = [(-a, -b), (a, -b), (a, b), (-a, b)]
    return Outline.polygon([(x + s * ux - t * uy, y + s * uy + t * ux) for s, t in corners])

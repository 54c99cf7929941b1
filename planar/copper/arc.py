"""The geometry of one edge: a straight segment or a circular arc given by its bulge.

The bulge is tan(angle / 4), positive for a counter-clockwise arc, 0 for a segment, 1 for half a
circle (the DXF convention). An edge from `start` to `end` is then three numbers pairs wide, and
offsetting, mirroring and rotating leave the bulge alone or flip its sign.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from functools import cached_property

Point = tuple[float, float]


@dataclass(frozen=True)
class Edge:
    """An edge from `start` to `end` (metres) with `bulge` = tan(angle / 4)."""

    start: Point
    end: Point
    bulge: float = 0.0

    @cached_property
    def chord(self) -> float:
        """Distance between the end points, m."""
        return math.dist(self.start, self.end)

    @cached_property
    def angle(self) -> float:
        """Signed angle the arc turns through, rad; 0 for a segment."""
        return 4.0 * math.atan(self.bulge)

    @cached_property
    def radius(self) -> float:
        """Radius of the arc, m; infinite for a segment."""
        b = abs(self.bulge)
        return math.inf if b == 0.0 else self.chord * (1.0 + b * b) / (4.0 * b)

    @cached_property
    def centre(self) -> Point:
        """Centre of the arc, m. Only arcs have one."""
        (x0, y0), (x1, y1) = self.start, self.end
        # the centre lies left of the chord by (1 - b^2) / (4 b) chords
        k = (1.0 - self.bulge**2) / (4.0 * self.bulge)
        return 0.5 * (x0 + x1) - k * (y1 - y0), 0.5 * (y0 + y1) + k * (x1 - x0)

    @cached_property
    def length(self) -> float:
        """Length along the edge, m."""
        return self.chord if self.bulge == 0.0 else self.radius * abs(self.angle)

    @cached_property
    def segment_area(self) -> float:
        """Signed area between arc and chord, m2, positive when it bulges to the right."""
        b = self.bulge
        if abs(b) < 1e-3:  # the closed form cancels here; the next term is b^5 / 35
            return self.chord**2 * (b / 3.0 + b**3 / 15.0)
        return self.chord**2 / (8.0 * b * b) * ((1.0 + b * b) ** 2 * math.atan(b) - b * (1.0 - b * b))

    def point(self, fraction: float) -> Point:
        """Point at `fraction` (0 to 1) of the length."""
        (x0, y0), (x1, y1) = self.start, self.end
        if self.bulge == 0.0:
            return x0 + fraction * (x1 - x0), y0 + fraction * (y1 - y0)
        if fraction in (0.0, 1.0):
            return self.end if fraction else self.start
        cx, cy = self.centre
        c, s = math.cos(fraction * self.angle), math.sin(fraction * self.angle)
        return cx + c * (x0 - cx) - s * (y0 - cy), cy + s * (x0 - cx) + c * (y0 - cy)

    def tangent(self, fraction: float) -> Point:
        """Unit vector along the edge at `fraction` of the length."""
        (x0, y0), (x1, y1) = self.start, self.end
        ux, uy = (x1 - x0) / self.chord, (y1 - y0) / self.chord
        turn = (fraction - 0.5) * self.angle  # the chord is the tangent half way round
        c, s = math.cos(turn), math.sin(turn)
        return c * ux - s * uy, s * ux + c * uy

    def part(self, first: float, last: float) -> Edge:
        """The piece between two fractions of the length, `first < last`."""
        bulge = self.bulge if (first, last) == (0.0, 1.0) else math.tan((last - first) * self.angle / 4.0)
        return Edge(self.point(first), self.point(last), bulge)

    def reversed(self) -> Edge:
        """The same edge walked backwards."""
        return Edge(self.end, self.start, -self.bulge)

    def fraction_of(self, point: Point) -> float:
        """Fraction of the length nearest to `point`, which must lie on the edge's line or circle.

        Values outside 0 to 1 mean a point beyond the end.
        """
        (x0, y0), (x1, y1) = self.start, self.end
        if self.bulge == 0.0:
            return ((point[0] - x0) * (x1 - x0) + (point[1] - y0) * (y1 - y0)) / self.chord**2
        cx, cy = self.centre
        turned = math.atan2(point[1] - cy, point[0] - cx) - math.atan2(y0 - cy, x0 - cx)
        middle = 0.5 * self.angle
        turned = middle + math.remainder(turned - middle, 2.0 * math.pi)  # centred on the arc
        return turned / self.angle

    def extremes(self) -> list[Point]:
        """End points and the arc's points furthest left, right, up and down."""
        points = [self.start, self.end]
        if self.bulge != 0.0:
            cx, cy = self.centre
            r = self.radius
            compass = [(cx + r, cy), (cx, cy + r), (cx - r, cy), (cx, cy - r)]
            points += [p for p in compass if 0.0 < self.fraction_of(p) < 1.0]
        return points

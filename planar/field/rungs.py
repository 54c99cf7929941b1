"""Division of a rung: a straight line across copper, cut into cells so that few of them carry the current well.

Toward an edge of copper the current grows like one over the root of the distance, so the outermost cell is a few
hundredths of the width: three cells [0.04, 0.92, 0.04] carry a strip as well as six of the cosine rule. Below a line on
the other level the return current gathers: the rung has a cell there (the core), and cells beside it grow outward.
"""

from __future__ import annotations

import itertools
import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from shapely.geometry import LineString
from shapely.geometry.base import BaseGeometry

from planar.copper.arc import Point

CROWDING = 3.6
"""Power of the division toward an edge; found with uniformly charged cells of a strip over another, as those below."""
SPREAD = 0.4
"""A core reaches this many heights beyond the shadow on both sides."""
FIRST = 2.3
"""Widest cell beside a core, in heights."""
GROWTH = 2.5
"""A cell is at most this many times as wide as the one nearer to the core."""
BROAD = 4.0
"""A shadow wider than this many heights has its own inner cells: below a broad line current gathers at its edges."""
SHALLOW = 0.05
"""A core ends at least this share of the rung from either edge, or else at the edge."""


@dataclass(frozen=True)
class MeshSettings:
    """`step` m along edges and at most across, at least `across` cells across a strip.

    `grain` scales the cells beside the shadow of a line on the other level. `crossed` divides every cell of a lane by
    both diagonals: twice the unknowns, and a current that may turn either way alike.
    """

    step: float
    across: int = 3
    grain: float = 1.0
    crossed: bool = False


@dataclass(frozen=True)
class Shadow:
    """Lines on the other level as seen from above, `copper` in m, and the `height` in m between the levels."""

    copper: BaseGeometry
    height: float

    def cores(self, start: Point, end: Point, settings: MeshSettings) -> list[tuple[float, float]]:
        """Ranges of distance from `start`, m, in which a rung gets cells of its own."""
        cut = LineString([start, end]).intersection(self.copper)
        spread, length = SPREAD * settings.grain * self.height, math.dist(start, end)
        cores: list[tuple[float, float]] = []
        for part in sorted(_ranges(cut, start)):
            low, high = part[0] - spread, part[1] + spread
            low = low if low > SHALLOW * length else 0.0
            high = high if high < (1.0 - SHALLOW) * length else length
            if cores and low <= cores[-1][1] + spread:
                low = cores.pop()[0]
            cores.append((low, high))
        return cores


def _ranges(cut: BaseGeometry, start: Point) -> list[tuple[float, float]]:
    lines = [part for part in getattr(cut, "geoms", [cut]) if isinstance(part, LineString) and not part.is_empty]
    ends = [[math.dist(start, (x, y)) for x, y, *_ in line.coords] for line in lines]
    return [(min(each), max(each)) for each in ends]


def edge_distances(depth: float, settings: MeshSettings) -> list[float]:
    """Distances from an edge, m, of the points that divide the `depth` m of copper beside it, less its far end."""
    return _layers(depth, (settings.across - 1) // 2)[1:]


def rung_points(start: Point, end: Point, settings: MeshSettings, shadow: Shadow | None = None) -> list[Point]:
    """Inner division points of the rung from `start` to `end`, the same seen from either end."""
    if end < start:
        return rung_points(end, start, settings, shadow)[::-1]
    length = math.dist(start, end)
    cores = shadow.cores(start, end, settings) if shadow is not None else []
    cores = [core for core in cores if core[1] - core[0] < (1.0 - SHALLOW) * length]
    places = _around(cores, length, shadow.height, settings) if cores and shadow else _graded(length, settings)
    ux, uy = (end[0] - start[0]) / length, (end[1] - start[1]) / length
    return [(start[0] + t * ux, start[1] + t * uy) for t in places]


def points_beside(core: Point, edge: Point, settings: MeshSettings, height: float) -> list[Point]:
    """Inner division points from the end of a core to the edge of the copper, levels `height` m apart."""
    length = math.dist(core, edge)
    places = _growing(length, settings.grain * height, settings)
    depth = length - places[-1] if places else length
    places += [length - t for t in reversed(edge_distances(depth, settings))]
    return [(core[0] + t / length * (edge[0] - core[0]), core[1] + t / length * (edge[1] - core[1])) for t in places]


def _graded(length: float, settings: MeshSettings) -> list[float]:
    """Places of the inner points of a rung without a core: crowded at both edges, even between."""
    layers = (settings.across - 1) // 2
    even = settings.across - 2 * layers
    while True:
        crowded = _layers(length / max(2, even), layers)
        middle = length - 2.0 * crowded[-1]
        if middle <= even * settings.step:
            break
        even += 1
    inner = [crowded[-1] + middle * i / even for i in range(1, even)]
    return [*crowded[1:], *inner, *(length - t for t in reversed(crowded[1:]))]


def _layers(depth: float, layers: int) -> list[float]:
    """Distances from an edge of the points that divide the `depth` beside it, the edge itself first."""
    return [depth * (i / (layers + 1)) ** CROWDING for i in range(layers + 1)]


def _around(cores: Sequence[tuple[float, float]], length: float, height: float, settings: MeshSettings) -> list[float]:
    """Places of the inner points of a rung with `cores`: their ends, cells that grow away from them, crowded edges."""
    grain = settings.grain * height
    places = {0.0, length}
    for low, high in cores:
        places |= {low, high}
        rim = (SPREAD + 1.0) * grain
        if high - low > (BROAD + 2.0 * SPREAD) * grain:
            inner = high - low - 2.0 * rim
            even = math.ceil(inner / settings.step)
            places |= {low + rim + inner * i / even for i in range(even + 1)}
    ends = [0.0, *itertools.chain.from_iterable(cores), length]
    for left, right in zip(ends[::2], ends[1::2], strict=True):
        room = right - left
        if left == 0.0:
            places |= {right - t for t in _growing(room, grain, settings)}
        elif right == length:
            places |= {left + t for t in _growing(room, grain, settings)}
        else:
            half = _growing(0.5 * room, grain, settings)
            places |= {left + t for t in half} | {right - t for t in half}
    known = sorted(places)
    layers = (settings.across - 1) // 2
    first, last = (_layers(min(each, 0.5 * length), layers)[1:] for each in (known[1], length - known[-2]))
    return sorted((places | set(first) | {length - t for t in last}) - {0.0, length})


def _growing(room: float, grain: float, settings: MeshSettings) -> list[float]:
    """Distances from a core, its end left out, of points that divide the `room` beside it into growing cells."""
    sizes: list[float] = []
    while sum(sizes) < room * (1.0 - 1e-9):
        sizes.append(min(GROWTH * sizes[-1] if sizes else FIRST * grain, settings.step))
    return [float(t) for t in np.cumsum(sizes)[:-1] * (room / sum(sizes))] if sizes else []

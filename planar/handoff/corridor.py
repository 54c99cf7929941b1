"""Where a board is free of keepout: the way to the feed."""

from __future__ import annotations

from shapely.ops import unary_union

from planar.copper.layout import Layout

_SLIVER = 1e-8
"""m2, pieces of board without keepout smaller than this are rounding."""

Box = tuple[float, float, float, float]


def open_ways(layout: Layout) -> list[Box]:
    """x_min, y_min, x_max, y_max (m) of each piece of board, on every board of a panel, that no keepout covers."""
    kept = unary_union([outline.shape() for outline in layout.keepout])
    boards = unary_union([outline.shape() for outline in layout.boards or (layout.edge,)])
    free = boards.difference(kept)
    return [piece.bounds for piece in getattr(free, "geoms", [free]) if piece.area > _SLIVER]

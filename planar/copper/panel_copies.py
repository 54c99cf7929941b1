"""Copies of a finished board, moved and turned without leaving the nanometre grid.

A copy must be the board to the nanometre: its vertices are taken as whole numbers of nanometres, turned by the
whole-number map (x, y) -> (-y, x) and shifted by whole nanometres. Nothing is normalised again. The bulge of an arc is
the same in every position. Nets and parts get the name of the copy's place, so that no two copies share one.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from planar.copper.arc import Point
from planar.copper.layout import ANTENNA, Hole, Island, Layout, Marking, Pad, Port
from planar.copper.outline import GRID, Outline
from planar.copper.shapes import rounded_rectangle

Box = tuple[int, int, int, int]
"""x_min, y_min, x_max, y_max in nm."""


def nanometres(length: float) -> int:
    """`length` m as a whole number of nanometres."""
    return round(length / GRID)


def metres(length: int) -> float:
    """`length` nm in m, the very number `on_grid` gives."""
    return length * GRID


@dataclass(frozen=True)
class Placement:
    """Where a copy goes: turned by 90 degrees counter-clockwise about the origin where `turned`, then moved by
    (`dx`, `dy`) nm."""

    dx: int
    dy: int
    turned: bool = False

    def point(self, point: Point) -> Point:
        """Place of `point` (m) in the copy."""
        x, y = nanometres(point[0]), nanometres(point[1])
        x, y = (-y, x) if self.turned else (x, y)
        return metres(x + self.dx), metres(y + self.dy)

    def direction(self, direction: Point) -> Point:
        """A direction of the board as it lies in the copy."""
        return (-direction[1], direction[0]) if self.turned else direction

    def outline(self, outline: Outline) -> Outline:
        """The outline in the copy."""
        x, y = (np.rint(column / GRID).astype(np.int64) for column in outline.vertices[:, :2].T)
        x, y = (-y, x) if self.turned else (x, y)
        return Outline(np.column_stack([(x + self.dx) * GRID, (y + self.dy) * GRID, outline.vertices[:, 2]]))

    def box(self, box: Box) -> Box:
        """The box in the copy."""
        x0, y0, x1, y1 = box
        x0, y0, x1, y1 = (-y1, x0, -y0, x1) if self.turned else box
        return x0 + self.dx, y0 + self.dy, x1 + self.dx, y1 + self.dy


@dataclass(frozen=True)
class Blank:
    """The rectangle a board is: its `box` in nm and the radius of its corners in nm."""

    box: Box
    corner: int

    @property
    def size(self) -> tuple[int, int]:
        """Width and height, nm."""
        x0, y0, x1, y1 = self.box
        return x1 - x0, y1 - y0


def blank_of(edge: Outline) -> Blank | None:
    """The rectangle, with sharp corners or corners of one radius, that `edge` is; None when it is something else."""
    x0, y0, x1, y1 = (nanometres(value) for value in edge.bounds)
    radii = {nanometres(each.radius) for each in edge.edges if each.bulge != 0.0}
    corner = min(radii, default=0)
    blank = Blank((x0, y0, x1, y1), corner)
    same = _corners(edge) == _corners(blank_outline(blank)) and max(radii, default=0) - corner <= 1
    return blank if same else None


def blank_outline(blank: Blank) -> Outline:
    """Outline of the rectangle, counter-clockwise."""
    x0, y0, x1, y1 = (metres(value) for value in blank.box)
    return rounded_rectangle(x0, y0, x1, y1, radius=metres(blank.corner)).normalised()


def _corners(outline: Outline) -> set[tuple[int, int]]:
    return {(nanometres(x), nanometres(y)) for x, y, _ in outline.vertices.tolist()}


def copied(board: Layout, placement: Placement, *, place: str, part: str) -> Layout:
    """`board` at its `placement`: nets end in `_` and its `place`, what was part ANT1 is `part`."""

    def net(name: str) -> str:
        return f"{name}_{place}" if name else ""

    def reference(name: str) -> str:
        return part if name == ANTENNA else name

    def island(i: Island) -> Island:
        return replace(i, outline=placement.outline(i.outline), net=net(i.net), part=reference(i.part))

    def hole(h: Hole) -> Hole:
        return replace(h, centre=placement.point(h.centre), net=net(h.net))

    def pad(p: Pad) -> Pad:
        return replace(p, outline=placement.outline(p.outline), net=net(p.net), part=reference(p.part))

    def port(p: Port) -> Port:
        centre, direction = placement.point(p.centre), placement.direction(p.direction)
        return replace(p, name=f"{p.name}_{place}", centre=centre, direction=direction)

    def marking(m: Marking) -> Marking:
        return replace(m, outline=placement.outline(m.outline))

    return replace(
        board,
        islands=tuple(island(i) for i in board.islands),
        holes=tuple(hole(h) for h in board.holes),
        pads=tuple(pad(p) for p in board.pads),
        ports=tuple(port(p) for p in board.ports),
        mask_openings=tuple(marking(m) for m in board.mask_openings),
        legend=tuple(marking(m) for m in board.legend),
        edge=placement.outline(board.edge),
        keepout=tuple(placement.outline(outline) for outline in board.keepout),
        cutouts=tuple(placement.outline(outline) for outline in board.cutouts),
    )


def column_letters(column: int) -> str:
    """A, B, ... Z, AA, AB, ... for columns 0, 1, ..."""
    letters = ""
    number = column + 1
    while number:
        number, rest = divmod(number - 1, 26)
        letters = chr(ord("A") + rest) + letters
    return letters

"""How many boards a panel holds: the sizes of an array with its rails, and the array that fits the fab's panel best.

All in whole nanometres. From the lower left corner of the panel, which is its origin, come the rail, the boards with
`spacing` before, between and after them (0 where they are scored), and the rail again. A coupon lies in a strip of its
own between the boards and the upper rail, so that no score line meets it.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

from planar.copper.panel_copies import Box, Placement, nanometres
from planar.library.records import Fab

SCORE_ROOM = 1_000_000
"""nm, from the slot round a coupon to the score lines beside it."""


@dataclass(frozen=True)
class CouponRoom:
    """What a coupon needs: its `size` as it lies, whether it is `turned`, `slot` round it and `web` below it, nm."""

    size: tuple[int, int]
    turned: bool
    slot: int
    web: int

    @property
    def width(self) -> int:
        """Along the rail, nm."""
        return self.size[0] + 2 * self.slot

    @property
    def height(self) -> int:
        """What it adds to the panel's height, nm."""
        return self.size[1] + 2 * self.slot + self.web


@dataclass(frozen=True)
class Array:
    """`columns` by `rows` boards of `cell` (width, height as they lie) nm, `turned` when that is the board turned."""

    columns: int
    rows: int
    cell: tuple[int, int]
    turned: bool
    spacing: int
    rail: int
    coupon: CouponRoom | None = None

    @property
    def boards(self) -> int:
        """Number of boards."""
        return self.columns * self.rows

    @property
    def window(self) -> Box:
        """From rail to rail: boards and the spaces round them, nm."""
        width, height = (
            count * side + (count + 1) * self.spacing
            for count, side in zip((self.columns, self.rows), self.cell, strict=True)
        )
        return self.rail, self.rail, self.rail + width, self.rail + height

    @property
    def size(self) -> tuple[int, int]:
        """Width and height of the panel, nm."""
        _, _, x1, y1 = self.window
        return x1 + self.rail, y1 + self.rail + (0 if self.coupon is None else self.coupon.height)

    def corner(self, column: int, row: int) -> tuple[int, int]:
        """Lower left corner of a board, nm; column 0 is the left one, row 0 the lower one."""
        pitch = [side + self.spacing for side in self.cell]
        start = self.rail + self.spacing
        return start + column * pitch[0], start + row * pitch[1]

    def coupon_corner(self, room: CouponRoom) -> tuple[int, int]:
        """Lower left corner of the coupon, nm: over the first column, or in the middle where no score line is."""
        x0, _, x1, y1 = self.window
        right = x1 if self.spacing else x0 + self.cell[0]
        return (x0 + right - room.size[0]) // 2, y1 + room.web + room.slot


@dataclass(frozen=True)
class Ingredients:
    """What every array of one board is made of, nm: the board's `size` as drawn, `spacing`, `rail`, the coupon's `size`
    as drawn (None without), the `slot` round it and the `web` below it."""

    size: tuple[int, int]
    spacing: int
    rail: int
    coupon: tuple[int, int] | None
    slot: int
    web: int

    def array(self, columns: int, rows: int, *, turned: bool = False) -> Array | None:
        """The array, its coupon lying so that it takes the lower strip; None when the strip is too narrow for it."""
        cell = self.size[::-1] if turned else self.size
        array = Array(columns, rows, cell, turned, self.spacing, self.rail)
        if self.coupon is None:
            return array
        x0, _, x1, _ = array.window
        span = x1 - x0 if self.spacing else cell[0] - 2 * SCORE_ROOM
        flat = self.coupon[1] > self.coupon[0]
        for lying in (flat, not flat):
            room = CouponRoom(self.coupon[::-1] if lying else self.coupon, lying, self.slot, self.web)
            if room.width <= span:
                return replace(array, coupon=room)
        return None

    def best(self, fab: Fab) -> Array | None:
        """The array with most boards that the fab's panel holds, the smaller panel among equals; None if none does."""
        found: list[Array] = []
        for turned in (False, True):
            cell = self.size[::-1] if turned else self.size
            most = [
                max(0, (side - 2 * self.rail) // (each + self.spacing))
                for side, each in zip(usable(fab), cell, strict=True)
            ]
            arrays = (
                self.array(columns, rows, turned=turned)
                for columns in range(1, most[0] + 1)
                for rows in range(1, most[1] + 1)
            )
            found += [array for array in arrays if array is not None and deliverable(array.size, fab)]
        return max(found, key=lambda a: (a.boards, -a.size[0] * a.size[1], not a.turned), default=None)


def placed_at(box: Box, corner: tuple[int, int], *, turned: bool) -> Placement:
    """Placement that brings the lower left corner of `box` (turned where asked) to `corner`, nm."""
    x0, y0, _, _ = Placement(0, 0, turned).box(box)
    return Placement(corner[0] - x0, corner[1] - y0, turned)


def usable(fab: Fab) -> tuple[int, int]:
    """The fab's panel less its border on each side, nm."""
    return nanometres(fab.panel[0] - 2.0 * fab.panel_border), nanometres(fab.panel[1] - 2.0 * fab.panel_border)


def deliverable(size: tuple[int, int], fab: Fab) -> bool:
    """Whether a panel of `size` nm is within the fab's panel, lying so, and within its largest board, either way."""
    width, height = usable(fab)
    largest = sorted((nanometres(fab.max_board[0]), nanometres(fab.max_board[1])))
    short, long = sorted(size)
    return size[0] <= width and size[1] <= height and short <= largest[0] and long <= largest[1]


def arrays_on_panel(size: tuple[int, int], fab: Fab) -> int:
    """How many panels of `size` nm the fab cuts from one of its own, all lying one way, a router's width between."""
    gap = nanometres(2.0 * fab.edge_radius)
    width, height = usable(fab)
    return max(((width + gap) // (x + gap)) * ((height + gap) // (y + gap)) for x, y in (size, size[::-1]))

"""What a sheet can be drawn on: a PDF (`Paper`) or an SVG (`SvgPaper`), so that one drawing makes both."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Protocol

from planar.copper.arc import Point
from planar.copper.outline import Outline
from planar.handoff.paper import PLAIN, Pen, View


class Canvas(Protocol):
    """A sheet; places are mm from its lower left corner."""

    def text(
        self, at: Point, text: str, size: float, *, font: str = PLAIN, anchor: str = "left", halo: bool = False
    ) -> None:
        """A line of text at `size` points; `anchor` is left, centre or right."""

    def lines(self, pairs: Sequence[tuple[Point, Point]], pen: Pen) -> None:
        """Straight lines between pairs of places."""

    def box(self, corner: Point, size: Point, pen: Pen) -> None:
        """A rectangle with its lower left corner at `corner`."""

    def discs(self, centres: Sequence[Point], diameter: float, pen: Pen) -> None:
        """Circles."""

    def outlines(self, outlines: Sequence[Outline], view: View, pen: Pen) -> None:
        """Outlines of the board."""

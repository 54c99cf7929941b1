"""A single sheet as SVG, drawn on with the calls of `Paper`: millimetres from the lower left corner, arcs kept.

Its size is stated in millimetres, so that a program that honours it prints the sheet at true scale.
"""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from pathlib import Path
from xml.sax.saxutils import escape

from planar.copper.arc import Point
from planar.copper.outline import Outline
from planar.copper.svg_path import decimal, path_data
from planar.handoff.paper import BLACK, BOLD, PLAIN, POINT_MM, Pen, View

_ANCHORS = {"left": "start", "centre": "middle", "right": "end"}
_HALO = 0.7
"""mm, width of the white line round a letter."""
_FONT = "DejaVu Sans, Verdana, sans-serif"


class SvgPaper:
    """A sheet of `size` (width, height) mm; `words` are its title and description."""

    def __init__(self, path: Path, size: tuple[float, float], words: tuple[str, str]) -> None:
        self._path, self._height = path, size[1]
        width, height = (decimal(each) for each in size)
        self._parts = [
            f'<svg xmlns="http://www.w3.org/2000/svg" width="{width}mm" height="{height}mm" '
            f'viewBox="0 0 {width} {height}" role="img" font-family="{_FONT}">',
            f"<title>{escape(words[0])}</title>",
            f"<desc>{escape(words[1])}</desc>",
            f'<rect width="{width}" height="{height}" fill="#ffffff"/>',
        ]

    def save(self) -> None:
        """Write the file."""
        self._path.write_bytes(("\n".join([*self._parts, "</svg>"]) + "\n").encode("utf-8"))

    def text(
        self, at: Point, text: str, size: float, *, font: str = PLAIN, anchor: str = "left", halo: bool = False
    ) -> None:
        """As `Paper.text`."""
        weight = ' font-weight="bold"' if font == BOLD else ""
        behind = f' stroke="#ffffff" stroke-width="{_HALO}" paint-order="stroke"' if halo else ""
        self._parts.append(
            f'<text x="{decimal(at[0])}" y="{decimal(self._height - at[1])}" font-size="{decimal(size * POINT_MM)}" '
            f'text-anchor="{_ANCHORS[anchor]}" fill="{BLACK}"{weight}{behind}>{escape(text)}</text>'
        )

    def lines(self, pairs: Iterable[tuple[Point, Point]], pen: Pen) -> None:
        """As `Paper.lines`."""
        data = "".join(f"M{self._place(start)}L{self._place(end)}" for start, end in pairs)
        if data:
            self._parts.append(f'<path d="{data}" {_style(pen, 1.0)}/>')

    def box(self, corner: Point, size: Point, pen: Pen) -> None:
        """As `Paper.box`."""
        x, y = decimal(corner[0]), decimal(self._height - corner[1] - size[1])
        width, height = (decimal(each) for each in size)
        self._parts.append(f'<rect x="{x}" y="{y}" width="{width}" height="{height}" {_style(pen, 1.0)}/>')

    def discs(self, centres: Iterable[Point], diameter: float, pen: Pen) -> None:
        """As `Paper.discs`."""
        radius = decimal(0.5 * diameter)
        for x, y in centres:
            place = f'cx="{decimal(x)}" cy="{decimal(self._height - y)}"'
            self._parts.append(f'<circle {place} r="{radius}" {_style(pen, 1.0)}/>')

    def outlines(self, outlines: Sequence[Outline], view: View, pen: Pen) -> None:
        """As `Paper.outlines`, always drawn in full."""
        if outlines:
            turn = f"translate({self._place(view.origin)}) scale({decimal(view.scale)})"
            data = "".join(path_data(outline) for outline in outlines)
            self._parts.append(f'<path transform="{turn}" d="{data}" {_style(pen, view.scale)}/>')

    def _place(self, point: Point) -> str:
        return f"{decimal(point[0])} {decimal(self._height - point[1])}"


def _style(pen: Pen, scale: float) -> str:
    """Attributes of a pen on something drawn `scale` times larger than told."""
    parts = [f'fill="{pen.fill or "none"}"']
    if pen.width > 0.0:
        parts.append(f'stroke="{pen.stroke}" stroke-width="{decimal(pen.width / scale)}"')
        if pen.dash:
            parts.append(f'stroke-dasharray="{" ".join(decimal(each / scale) for each in pen.dash)}"')
    return " ".join(parts)

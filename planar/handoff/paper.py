"""A PDF of A4 sheets drawn on in millimetres: lines, texts, outlines with true-looking arcs.

PDF knows no circular arc, so each becomes cubic curves, short enough that none strays from its circle by more than
half a micrometre on the board. The font is one that holds ohm, epsilon and plus-minus. Dates and identifiers are
fixed: the same drawing gives the same bytes.
"""

from __future__ import annotations

import math
from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from importlib.util import find_spec
from pathlib import Path

from reportlab.lib.utils import simpleSplit
from reportlab.pdfbase import pdfmetrics
from reportlab.pdfbase.ttfonts import TTFError, TTFont
from reportlab.pdfgen.canvas import Canvas

from planar.copper.arc import Edge, Point
from planar.copper.outline import Outline
from planar.errors import HandoffError

POINT_MM = 25.4 / 72.0
"""mm, the PDF's own unit."""
CURVE_ERROR = 0.5e-6
"""m, how far a curve may stray from its arc, on the board."""
PLAIN, BOLD = "DejaVuSans", "DejaVuSans-Bold"
BLACK, WHITE = "#000000", "#ffffff"
_HALO = 0.7
"""mm, width of the white line round a letter, half of it outside."""
_FILLED, _OUTLINES_ALONE = 0, 1
"""How PDF renders text."""


@dataclass(frozen=True)
class View:
    """Where the board lies on a sheet: `scale` 1 is true size, `origin` the place of the board's origin, mm."""

    scale: float
    origin: Point

    def place(self, point: Point) -> Point:
        """Place on the sheet (mm) of a `point` of the board (m)."""
        return self.origin[0] + 1e3 * self.scale * point[0], self.origin[1] + 1e3 * self.scale * point[1]


@dataclass(frozen=True)
class Pen:
    """How something is drawn: line `width` mm (0: no line), colours as "#rrggbb", `dash` lengths in mm."""

    width: float = 0.18
    stroke: str = BLACK
    fill: str | None = None
    dash: tuple[float, ...] = ()


def register_fonts() -> None:
    """Make the two fonts known. Raises `HandoffError` when their files are not where matplotlib keeps them."""
    spec = find_spec("matplotlib")  # asks where it lies, without the second its import takes
    places = list(spec.submodule_search_locations or ()) if spec else []
    for name in (PLAIN, BOLD):
        if name in pdfmetrics.getRegisteredFontNames():
            continue
        path = Path(*places[:1], "mpl-data", "fonts", "ttf", f"{name}.ttf")
        try:
            pdfmetrics.registerFont(TTFont(name, str(path)))
        except TTFError as error:
            raise HandoffError(f"the drawing needs the font {path.name} that comes with matplotlib: {error}") from error


def text_width(text: str, size: float, *, font: str = PLAIN) -> float:
    """Width of `text` in mm at a font `size` in points."""
    return float(pdfmetrics.stringWidth(text, font, size)) * POINT_MM


def wrapped(text: str, size: float, width: float, *, font: str = PLAIN) -> list[str]:
    """Lines of `text` no wider than `width` mm at a font `size` in points; a word wider than that is cut."""
    lines: list[str] = []
    for line in simpleSplit(text, font, size, width / POINT_MM):
        rest = str(line)
        while rest:
            count = next((n for n in range(len(rest), 1, -1) if text_width(rest[:n], size, font=font) <= width), 1)
            lines.append(rest[:count])
            rest = rest[count:]
    return lines or [""]


def arc_curves(edge: Edge) -> list[tuple[Point, Point, Point]]:
    """Cubic curves along an arc: two control points and the end of each, m.

    The handles are 4/3 tan(angle/4) radii long, so that ends, tangents and the middle lie on the circle. In between
    the curve lies outside it by up to 2/27 r sin(angle/4)^6 / cos(angle/4)^2, the leading term of its distance.
    """
    count = max(1, math.ceil(abs(edge.angle) / (0.5 * math.pi)))
    while _curve_error(edge.radius, edge.angle / count) > CURVE_ERROR:
        count += 1
    curves = []
    for i in range(count):
        piece = edge.part(i / count, (i + 1) / count)
        handle = 4.0 / 3.0 * math.tan(abs(edge.angle) / count / 4.0) * edge.radius
        (x0, y0), (x1, y1) = piece.start, piece.end
        (ux, uy), (vx, vy) = piece.tangent(0.0), piece.tangent(1.0)
        curves.append(((x0 + handle * ux, y0 + handle * uy), (x1 - handle * vx, y1 - handle * vy), (x1, y1)))
    return curves


def _curve_error(radius: float, angle: float) -> float:
    quarter = abs(angle) / 4.0
    return 2.0 / 27.0 * radius * math.sin(quarter) ** 6 / math.cos(quarter) ** 2


class Paper:
    """Sheets to draw on; places are mm from the lower left corner of the sheet."""

    def __init__(self, path: Path, *, title: str, creator: str) -> None:
        register_fonts()
        self._canvas = Canvas(str(path), invariant=1, pageCompression=1)
        self._canvas.setTitle(title)
        self._canvas.setCreator(creator)
        self._canvas.setAuthor("")
        self._canvas.setSubject("fabrication drawing")

    def sheet(self, width: float, height: float) -> None:
        """Begin a sheet of `width` by `height` mm."""
        self._canvas.setPageSize((width / POINT_MM, height / POINT_MM))

    def end_sheet(self) -> None:
        """Finish the sheet begun last."""
        self._canvas.showPage()

    def save(self) -> None:
        """Write the file."""
        self._canvas.save()

    def text(
        self, at: Point, text: str, size: float, *, font: str = PLAIN, anchor: str = "left", halo: bool = False
    ) -> None:
        """A line of text at `size` points whose base line begins, is centred or ends at `at`; a white `halo` keeps it
        readable on lines."""
        draw = {
            "left": self._canvas.drawString,
            "centre": self._canvas.drawCentredString,
            "right": self._canvas.drawRightString,
        }
        self._canvas.setFont(font, size)
        if halo:
            self._canvas.setLineWidth(_HALO / POINT_MM)
            self._canvas.setStrokeColor(WHITE)
            self._canvas.setDash([])
            draw[anchor](at[0] / POINT_MM, at[1] / POINT_MM, text, mode=_OUTLINES_ALONE)
        self._canvas.setFillColor(BLACK)
        draw[anchor](at[0] / POINT_MM, at[1] / POINT_MM, text, mode=_FILLED)

    def upright_text(self, at: Point, text: str, size: float) -> None:
        """A line of text turned to read from below, its middle at `at`."""
        self._canvas.saveState()
        self._canvas.translate(at[0] / POINT_MM, at[1] / POINT_MM)
        self._canvas.rotate(90)
        self.text((0.0, 0.0), text, size, anchor="centre")
        self._canvas.restoreState()

    def lines(self, pairs: Iterable[tuple[Point, Point]], pen: Pen) -> None:
        """Straight lines between pairs of places."""
        path = self._canvas.beginPath()
        for (x0, y0), (x1, y1) in pairs:
            path.moveTo(x0 / POINT_MM, y0 / POINT_MM)
            path.lineTo(x1 / POINT_MM, y1 / POINT_MM)
        self._draw(path, pen)

    def box(self, corner: Point, size: Point, pen: Pen) -> None:
        """A rectangle with its lower left corner at `corner`."""
        path = self._canvas.beginPath()
        path.rect(*(value / POINT_MM for value in (*corner, *size)))
        self._draw(path, pen)

    def discs(self, centres: Iterable[Point], diameter: float, pen: Pen) -> None:
        """Circles of a `diameter` in mm."""
        path = self._canvas.beginPath()
        for x, y in centres:
            path.circle(x / POINT_MM, y / POINT_MM, 0.5 * diameter / POINT_MM)
        self._draw(path, pen)

    def outlines(self, outlines: Sequence[Outline], view: View, pen: Pen, *, inside: bool = False) -> None:
        """Outlines of the board, each a path of its own; of a line drawn `inside` only its inner half is seen."""
        for outline in outlines:
            path = self._canvas.beginPath()
            path.moveTo(*self._point(outline.edges[0].start, view))
            for edge in outline.edges:
                if edge.bulge == 0.0:
                    path.lineTo(*self._point(edge.end, view))
                else:
                    for curve in arc_curves(edge):
                        path.curveTo(*(c for point in curve for c in self._point(point, view)))
            path.close()
            self._canvas.saveState()
            if inside:
                self._canvas.clipPath(path, stroke=0, fill=0)
            self._draw(path, pen)
            self._canvas.restoreState()

    def _point(self, point: Point, view: View) -> Point:
        x, y = view.place(point)
        return x / POINT_MM, y / POINT_MM

    def _draw(self, path: object, pen: Pen) -> None:
        self._canvas.setLineWidth(pen.width / POINT_MM)
        self._canvas.setStrokeColor(pen.stroke)
        self._canvas.setDash([length / POINT_MM for length in pen.dash])
        if pen.fill is not None:
            self._canvas.setFillColor(pen.fill)
        self._canvas.drawPath(path, stroke=int(pen.width > 0.0), fill=int(pen.fill is not None))

"""Measured lines over the copper of a picture: gaps, the mean line, and dimensions between arrow heads."""

from __future__ import annotations

from collections.abc import Sequence

from planar.copper.arc import Point as BoardPoint
from planar.copper.svg_path import chain_data, path_data, place
from planar.report.dimension_marks import BoardMarks, Mark
from planar.report.svg import colour, element, group, pen, tooltip


def over_copper(marks: BoardMarks, measured: Sequence[Mark], size: float) -> list[str]:
    """Gaps, mean line and the lines of the `measured` marks, over the copper; arrow heads suit letters of `size` mm."""
    gap = pen("ink", 0.04 * size, {"fill": colour("gap")})
    gaps = [element("path", {"d": path_data(zone.outline)}, tooltip(zone.title)) for zone in marks.gaps]
    dashes = " ".join(f"{part * size:.3g}" for part in (1.0, 0.25, 0.2, 0.25))
    chain = pen("measure", 0.04 * size, {"stroke-dasharray": dashes})
    mean = [] if marks.mean_line is None else [element("path", {"d": chain_data(marks.mean_line.edges) + "Z"})]
    return [
        group("gaps", gap, gaps),
        group("mean-line", chain, mean),
        *(part for mark in measured for part in measured_line(mark, size)),
    ]


def measured_line(mark: Mark, size: float) -> list[str]:
    """The line a dimension is measured along: heads inside where there is room, otherwise pointing in from outside."""
    if mark.measure is None:
        return []
    path, head = mark.measure, 0.55 * size
    inside = 1e3 * path.length > 3.0 * head
    shaft = [chain_data(path.edges)]
    ends = [path.at(path.length)] if mark.is_radius else [path.at(path.length), _turned(path.at(0.0))]
    heads = []
    for (x, y), (ux, uy) in ends:
        back = -1.0 if inside else 1.0
        heads.append(_arrow_head((x, y), (back * ux, back * uy), head))
        if not inside:
            shaft.append(f"M{place(x, y)}L{place(x + 2.2e-3 * head * ux, y + 2.2e-3 * head * uy)}")
    lines = "".join(f"M{place(*a)}L{place(*b)}" for a, b in mark.witnesses)
    drawn = "".join(shaft) + lines
    words = tooltip(f"{mark.label} {mark.value}".strip())
    return [
        element("path", pen("paper", 0.19 * size, {"d": drawn, "stroke-opacity": "0.45"})),
        element("path", pen("measure", 0.065 * size, {"class": "measure", "d": drawn}), words),
        element("path", {"d": "".join(heads), "fill": colour("measure")}),
    ]


def _turned(end: tuple[BoardPoint, BoardPoint]) -> tuple[BoardPoint, BoardPoint]:
    return end[0], (-end[1][0], -end[1][1])


def _arrow_head(tip: BoardPoint, back: BoardPoint, length: float) -> str:
    """A slim triangle of `length` mm that points to `tip`; `back` is the unit vector from the tip to its foot."""
    (x, y), (ux, uy) = tip, back
    reach, half = 1e-3 * length, 0.17e-3 * length
    feet = [(x + reach * ux + s * half * uy, y + reach * uy - s * half * ux) for s in (1.0, -1.0)]
    return f"M{place(*tip)}L{place(*feet[0])}L{place(*feet[1])}Z"

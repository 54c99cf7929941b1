"""Text as strokes: single-line capitals on a 4 by 6 cell, so that a legend needs no font.

Every stroke becomes a capsule outline; a fab's legend printer and every file format can draw that.
"""

from __future__ import annotations

import itertools

from planar.copper.arc import Point
from planar.copper.outline import Outline
from planar.copper.shapes import capsule

CELL_HEIGHT = 6
ADVANCE = 6
"""Cell units from one letter to the next."""

# Each letter: polylines as "xy xy ..." digit pairs, strokes separated by a blank and a bar.
_STROKES = {
    "A": "00 26 40 | 13 33", "B": "00 06 36 45 44 33 03 | 33 42 41 30 00", "C": "46 16 05 01 10 40",
    "D": "00 06 26 44 42 20 00", "E": "40 00 06 46 | 03 33", "F": "00 06 46 | 03 33", "G": "46 16 05 01 10 40 43 23",
    "H": "00 06 | 40 46 | 03 43", "I": "10 30 | 20 26 | 16 36", "J": "01 10 30 41 46", "K": "00 06 | 46 03 40",
    "L": "06 00 40", "M": "00 06 23 46 40", "N": "00 06 40 46", "O": "10 01 05 16 36 45 41 30 10",
    "P": "00 06 36 45 44 33 03", "Q": "10 01 05 16 36 45 41 30 10 | 22 40", "R": "00 06 36 45 44 33 03 | 23 40",
    "S": "00 30 41 42 33 13 04 05 16 46", "T": "20 26 | 06 46", "U": "06 01 10 30 41 46", "V": "06 20 46",
    "W": "06 10 23 30 46", "X": "00 46 | 06 40", "Y": "06 23 46 | 23 20", "Z": "06 46 00 40",
    "0": "10 01 05 16 36 45 41 30 10 | 12 34", "1": "04 26 20 | 10 30", "2": "05 16 36 45 44 00 40",
    "3": "05 16 36 45 44 33 42 41 30 10 01 | 13 33", "4": "30 36 02 42", "5": "46 06 03 33 42 41 30 00",
    "6": "36 05 01 10 30 41 42 33 03", "7": "06 46 10", "8": "13 04 05 16 36 45 44 33 13 02 01 10 30 41 42 33",
    "9": "10 41 45 36 16 05 04 13 43", "-": "13 33", "+": "13 33 | 22 24", ".": "20 21", ":": "21 22 | 24 25",
    "/": "00 46", "_": "00 40", "=": "02 42 | 04 44", "(": "36 24 22 30", ")": "16 24 22 10", ",": "21 10",
    "?": "05 16 36 45 33 22 | 20 21", " ": "",
}  # fmt: skip


def lettered(text: str, position: Point, height: float, *, stroke: float, mirrored: bool = False) -> list[Outline]:
    """Capsules that write `text` in capitals, centred on `position` (m), `height` m tall.

    `stroke` is the line width, m. `mirrored` text reads right from below. Characters without
    strokes are written as "?".
    """
    unit = (height - stroke) / CELL_HEIGHT
    x0, y0 = (
        position[0] - 0.5 * text_width(text, height, stroke=stroke) + 0.5 * stroke,
        position[1] - 0.5 * (height - stroke),
    )
    capsules = []
    for i, letter in enumerate(text.upper()):
        for polyline in _STROKES.get(letter, _STROKES["?"]).split("|"):
            cells = [(int(pair[0]), int(pair[1])) for pair in polyline.split()]
            points = [(x0 + (i * ADVANCE + cx) * unit, y0 + cy * unit) for cx, cy in cells]
            if mirrored:
                points = [(2.0 * position[0] - x, y) for x, y in points]
            capsules += [capsule(a, b, stroke) for a, b in itertools.pairwise(points)]
    return capsules


def text_width(text: str, height: float, *, stroke: float) -> float:
    """Width of `text` written by `lettered`, m."""
    unit = (height - stroke) / CELL_HEIGHT
    return (ADVANCE * len(text) - 2) * unit + stroke

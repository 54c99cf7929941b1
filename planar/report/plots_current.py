"""Currents on the copper: triangles of the mesh in classes of 2 dB, at true scale.

Current crowds at edges, corners and on a narrow line, so the largest of all is that of some small cell. 0 dB is
therefore what all but a tenth of a level's copper stays below.
Colours lie evenly on a straight line in OKLab (Ottosson 2020), from yellow to blue: equal steps look equal with and
without colour vision. On a light page dark is more, on a dark page light is more, as readers expect (Schloss et al.,
IEEE Trans. Vis. Comput. Graph. 25 (2019) 810).
"""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence

import numpy as np
from numpy.typing import NDArray

from planar.design.portrait import CurrentMap, ModeImage, Portrait
from planar.report.plots_axes import SIZE
from planar.report.svg import Box, Lettering, colour, element, svg_document, text, tooltip

Array = NDArray[np.float64]

STEP, CLASSES = 2.0, 10
"""dB of a class, and how many: the last one holds everything below."""
ENDS = {False: ("#eccb4b", "#0b1f52"), True: ("#31549c", "#fff3b0")}
"""Whether the page is dark -> colours of the smallest and the largest current."""
BEYOND = 0.1
"""Share of the copper's area that carries more than 0 dB."""
SEAM = 0.0012
"""Of the picture's width, the line that closes the seams between triangles."""
LEAST_WIDTH, LETTER = 88.0, 3.4
"""mm, width of a picture that holds its words, and the size of letters; on a wider one that is scaled down to a phone
they are larger, `LETTER_SHARE` of its width."""
LETTER_SHARE = 9.5 / 330.0
MODE_WIDTH = "210"
"""px, width of the small picture of a mode."""
OKLAB_LMS = np.array(
    [
        [0.4122214708, 0.5363325363, 0.0514459929],
        [0.2119034982, 0.6806995451, 0.1073969566],
        [0.0883024619, 0.2817188376, 0.6299787005],
    ]
)
OKLAB = np.array(
    [
        [0.2104542553, 0.7936177850, -0.0040720468],
        [1.9779984951, -2.4285922050, 0.4505937099],
        [0.0259040371, 0.7827717662, -0.8086757660],
    ]
)
"""Linear sRGB -> cone responses, their cube roots -> OKLab (Ottosson 2020)."""


def current_plot(portrait: Portrait, current: CurrentMap) -> str:
    """SVG of the size of the current on one level of `portrait` at the centre, seen from the top, at true scale."""
    title = f"Current on the {current.level} copper"
    told = (
        f"Size of the surface current at {1e-6 * portrait.centre:.6g} MHz, seen from the top, in steps of {STEP:g} dB. "
        f"{100.0 * BEYOND:g} % of this copper carries more than 0 dB"
    )
    zero = f"0 dB: {100.0 - 100.0 * BEYOND:g} % of it stays below"
    for other in portrait.currents:
        if other is not current:
            above = 20.0 * math.log10(usual(current) / usual(other))
            apart = f"{abs(above):.0f} dB {'above' if above >= 0.0 else 'below'}"
            told, zero = f"{told}, which is {apart} that of the {other.level}", f"{zero}; {apart} {other.level}'s"
    box = _around([each.points for each in portrait.currents])
    return _picture(current, box, (title, f"{told}."), (f"{current.level} copper", zero))


def mode_plot(mode: ModeImage) -> str:
    """SVG, small, of one characteristic mode of the bare loop: where it flows, resonance, Q, what the feed drives."""
    axis = {"horizontal": "along x", "vertical": "along y", "diagonal": "along a diagonal"}.get(mode.orientation, "")
    resonance = "no resonance near" if mode.resonance is None else f"resonates at {1e-6 * mode.resonance:.4g} MHz"
    quality = "" if mode.quality is None else f", Q {mode.quality:.1f}"
    lines = [f"field {axis}" if axis else "no dipole field", f"{resonance}{quality}", f"{_share(mode)} of the power"]
    title = f"Characteristic mode, {lines[0]}"
    told = f"{lines[1]}; {lines[2]} that a source across the gap radiates at the centre of the band."
    return _small_picture(mode.current, (title, told[0].upper() + told[1:]), lines)


def level_palette_css(dark: bool) -> str:
    """Declarations that set the colours of the classes for a `dark` page or a light one."""
    return "".join(f"--level-{i}:{shade};" for i, shade in enumerate(shades(dark)))


def shades(dark: bool) -> list[str]:
    """Colours of the classes, the largest current first: even steps on a straight line in OKLab."""
    small, large = (_oklab(each) for each in ENDS[dark])
    steps = np.linspace(1.0, 0.0, CLASSES)[:, None]
    return [_hex(lab) for lab in small + steps * (large - small)]


def usual(current: CurrentMap) -> float:
    """The relative magnitude that all but `BEYOND` of the copper's area stays below."""
    corners = current.points[current.triangles]
    (ax, ay), (bx, by) = (corners[:, i].T - corners[:, 0].T for i in (1, 2))
    size = np.abs(ax * by - ay * bx)
    order = np.argsort(current.magnitude, kind="stable")
    place = int(np.searchsorted(np.cumsum(size[order]), (1.0 - BEYOND) * size.sum()))
    return float(current.magnitude[order][min(place, len(order) - 1)])


def classes(magnitude: Array, reference: float) -> NDArray[np.int64]:
    """Class of each `magnitude` (m,) over `reference`: 0 for all above -`STEP` dB, the last for all below."""
    decibels = -20.0 * np.log10(np.maximum(magnitude / reference, 1e-9))
    return np.clip(np.floor(decibels / STEP), 0, CLASSES - 1).astype(np.int64)


def _picture(current: CurrentMap, box: Box, words: tuple[str, str], caption: tuple[str, str]) -> str:
    """The copper at true scale with a scale bar and a legend below."""
    letter, air = max(LETTER, LETTER_SHARE * box.width), max(0.0, 0.5 * (LEAST_WIDTH - box.width))
    box = Box(box.x0 - air, box.y0, box.x1 + air, box.y1)
    foot = [text((box.x0, box.y1 + 1.6 * letter), caption[0], Lettering(letter, bold=True))]
    foot.append(text((box.x0, box.y1 + 3.0 * letter), caption[1], Lettering(letter)))
    foot += _scale_bar(box, box.y1 + 1.6 * letter, letter)
    legend, bottom = _legend(box, box.y1 + 3.8 * letter, letter)
    view = Box(box.x0, box.y0, box.x1, bottom + 0.5 * letter)
    body = [*_triangles(current, box.width), *foot, *legend]
    return svg_document(view, (f"{view.width:.1f}mm", f"{view.height:.1f}mm"), words, body)


def _small_picture(current: CurrentMap, words: tuple[str, str], lines: Sequence[str]) -> str:
    box = _around([current.points])
    letter = SIZE / float(MODE_WIDTH) * box.width
    written = [
        text((box.x0, box.y1 + (1.4 + 1.3 * i) * letter), each, Lettering(letter)) for i, each in enumerate(lines)
    ]
    view = Box(box.x0, box.y0, box.x1, box.y1 + (1.0 + 1.35 * len(lines)) * letter)
    height = float(MODE_WIDTH) * view.height / view.width
    return svg_document(view, (MODE_WIDTH, f"{height:.0f}"), words, [*_triangles(current, box.width), *written])


def _triangles(current: CurrentMap, width: float) -> list[str]:
    """One path for each class, mm, y downwards."""
    corners = 1e3 * current.points[current.triangles] * (1.0, -1.0)
    number = classes(current.magnitude, usual(current))
    parts = []
    for each in range(CLASSES):
        data = "".join(_triangle(three) for three in corners[number == each].tolist())
        if data:
            shade = _level(each)
            style: Mapping[str, str | float] = {"fill": shade, "stroke": shade, "stroke-width": round(SEAM * width, 3)}
            parts.append(element("path", {"d": data} | dict(style), tooltip(_range(each))))
    return parts


def _triangle(corners: Sequence[Sequence[float]]) -> str:
    """A triangle, its second and third corner relative to the one before, to 0.01 mm."""
    (ax, ay), (bx, by), (cx, cy) = ((round(100.0 * x), round(100.0 * y)) for x, y in corners)
    numbers = (ax, ay, bx - ax, by - ay, cx - bx, cy - by)
    a, b, c, d, e, f = (f"{value / 100:g}" for value in numbers)
    return f"M{a} {b}l{c} {d} {e} {f}z"


def _legend(box: Box, top: float, letter: float) -> tuple[list[str], float]:
    """The classes in a row, and where they end."""
    wide = box.width / CLASSES
    parts = []
    for each in range(CLASSES):
        place: dict[str, str | float] = {"x": box.x1 - (each + 1) * wide, "y": top, "width": wide, "height": letter}
        place["fill"] = _level(each)
        parts.append(element("rect", place, tooltip(_range(each))))
    bottom = top + 2.2 * letter
    ends = [(box.x0, f"{-STEP * (CLASSES - 1):g} dB and less", "start"), (box.x1, f"{-STEP:g} dB and more", "end")]
    words = [
        text((x, bottom), each.replace("-", "\N{MINUS SIGN}"), Lettering(letter, anchor)) for x, each, anchor in ends
    ]
    return [*parts, *words], bottom


def _scale_bar(box: Box, y: float, letter: float) -> list[str]:
    """A round length, about a fifth of the picture."""
    length = next(step for step in (200.0, 100.0, 50.0, 20.0, 10.0, 5.0, 2.0, 1.0, 0.5) if step <= 0.25 * box.width)
    place: dict[str, str | float] = {"x": box.x1 - length, "y": y - 0.3 * letter}
    bar = place | {"width": length, "height": 0.25 * letter, "fill": colour("ink")}
    return [element("rect", bar), text((box.x1, y - 0.7 * letter), f"{length:g} mm", Lettering(letter, "end"))]


def _around(points: Sequence[Array]) -> Box:
    """The box round `points` (n, 2) m with a little air, mm, y downwards."""
    every = 1e3 * np.concatenate(points)
    (x0, y0), (x1, y1) = every.min(axis=0), every.max(axis=0)
    return Box(float(x0), -float(y1), float(x1), -float(y0)).grown(0.02 * float(x1 - x0))


def _range(number: int) -> str:
    high, low = (f"{-STEP * each:g} dB".replace("-", "\N{MINUS SIGN}") for each in (number, number + 1))
    if number == 0:
        return f"above {low}"
    return f"below {high}" if number == CLASSES - 1 else f"{low} to {high}"


def _level(number: int) -> str:
    return f"var(--level-{number}, {LIGHT[number]})"


def _share(mode: ModeImage) -> str:
    percent = 100.0 * mode.power_share
    return "under 1 %" if percent < 1.0 else f"{percent:.0f} %"


def _oklab(shade: str) -> Array:
    coded = np.array([int(shade[i : i + 2], 16) for i in (1, 3, 5)]) / 255.0
    linear = np.where(coded <= 0.04045, coded / 12.92, ((coded + 0.055) / 1.055) ** 2.4)
    lab: Array = OKLAB @ np.cbrt(OKLAB_LMS @ linear)
    return lab


def _hex(lab: Array) -> str:
    linear = np.clip(np.linalg.solve(OKLAB_LMS, np.linalg.solve(OKLAB, lab) ** 3), 0.0, 1.0)
    coded = np.where(linear <= 0.0031308, 12.92 * linear, 1.055 * linear ** (1.0 / 2.4) - 0.055)
    return "#" + "".join(f"{round(255.0 * value):02x}" for value in coded.tolist())


LIGHT = tuple(shades(False))
"""Colours of the classes on a light page."""

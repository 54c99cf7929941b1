"""Pattern cuts: gain round the board in a plane through its normal, and the axial ratio over the same angles.

The top of the picture is the normal of the board's top side, both half spaces are shown. The solver takes the slab as
endless, so along the board there is nothing to see: what is guided there leaves at a real board's edge.
"""

from __future__ import annotations

import math

import numpy as np
from numpy.typing import NDArray

from planar.design.portrait import PatternCut, Portrait
from planar.report.plots_axes import (
    BELOW,
    LEFT,
    RIGHT,
    SIZE,
    WIDTH,
    Axis,
    Panel,
    Stroke,
    circle,
    haloed,
    hovers,
    legend,
    line,
    number,
    polyline,
    swatch,
)
from planar.report.plots_frequency import ASKED, RATIO_SHOWN, Asked
from planar.report.svg import Box, Lettering, svg_document, text

Array = NDArray[np.float64]

CENTRE, RADIUS = (220.0, 196.0), 160.0
"""Of the polar plot in the picture, px."""
RANGE, RING = 30.0, 10.0
"""dB from the outer ring to the centre, and from ring to ring."""
SPOKE = 30
"""Degrees between two spokes."""
WHOLE, PARTS = Stroke("ink", 2.6), (Stroke("curve-1", 2.0), Stroke("curve-2", 2.0, "dashed"))
ENDLESS = (
    "Within some 10 degrees of the board the model, an endless slab, leaves too little: a real board radiates there."
)
SIDES = {0.0: ("\N{MINUS SIGN}x", "+x"), 90.0: ("\N{MINUS SIGN}y", "+y")}
"""Azimuth of a cut, degrees -> what lies left and right."""


def cut_plot(portrait: Portrait, cut: PatternCut) -> str:
    """SVG of one of the cuts of `portrait`: gain of the whole field and of its two named polarisations."""
    outer = outer_ring(portrait)
    left, right = SIDES[cut.azimuth]
    entries = [(swatch(WHOLE), "whole field")]
    entries += [(swatch(stroke), name) for stroke, name in zip(PARTS, portrait.parts, strict=True)]
    foot, bottom = legend(entries, CENTRE[1] + RADIUS + 30.0)
    curves = [(part, stroke) for part, stroke in zip(cut.part_dbi, PARTS, strict=True)]
    body = _grid(outer, left, right)
    for values, stroke in [*reversed(curves), (cut.gain_dbi, WHOLE)]:
        body.append(polyline(polar_places(cut.theta, values, outer), stroke))
    spots = slice(None, None, 5)
    pairs = zip(cut.theta[spots], cut.gain_dbi[spots], strict=True)
    words = (f"{number(theta)}\N{DEGREE SIGN}: {number(round(gain, 1))} dBi" for theta, gain in pairs)
    body += hovers(polar_places(cut.theta, cut.gain_dbi, outer)[spots], words)
    body += _ring_numbers(outer)
    plane = f"plane through the normal and the {right[1]} axis"
    title = f"Gain in the {plane}"
    told = f"Gain in dBi at {1e-6 * portrait.centre:.6g} MHz, top side upwards: {_told(cut, 0.0)} toward the top"
    told += ", nothing below the metal plane" if math.isnan(cut.gain_dbi[0]) else f", {_told(cut, 180.0)} below"
    size = (f"{WIDTH:.0f}", f"{bottom:.0f}")
    return svg_document(Box(0.0, 0.0, WIDTH, bottom), size, (title, f"{told}. {ENDLESS}"), [*body, *foot])


def axial_cut_plot(portrait: Portrait, *, asked: Asked) -> str:
    """SVG of the axial ratio over the angle from the normal in both planes, for a circular board."""
    strokes = (Stroke("curve-1", 2.4), Stroke("curve-2", 2.4, "dashed"))
    entries = [(swatch(s), f"toward {SIDES[cut.azimuth][1][1]}") for s, cut in zip(strokes, portrait.cuts, strict=True)]
    limit = asked.axial_ratio_db
    entries += [(swatch(ASKED), f"{limit:g} dB, the most that counts as circular")] if limit is not None else []
    head, top = legend(entries, 0.0)
    across = Axis(-180.0, 180.0, tuple(60.0 * i for i in range(-3, 4)), "angle from the normal of the top (degrees)")
    scale = Axis(0.0, RATIO_SHOWN, tuple(2.0 * i for i in range(round(RATIO_SHOWN / 2.0) + 1)), "axial ratio (dB)")
    panel = Panel(Box(LEFT, top + 6.0, WIDTH - RIGHT - 10.0, top + 176.0), across, scale)
    body = panel.frame()
    if limit is not None:
        body.append(panel.level(limit, ASKED))
    for stroke, cut in zip(strokes, portrait.cuts, strict=True):
        ratio = np.where(cut.axial_ratio_db > RATIO_SHOWN, np.nan, cut.axial_ratio_db)
        body.append(panel.curve(cut.theta, ratio, stroke))
    ratios = ", ".join(f"{cut.axial_ratio_db[len(cut.theta) // 2]:.2f} dB" for cut in portrait.cuts[:1])
    words = ("Axial ratio over angle", f"Axial ratio {ratios} toward the top; 180 degrees is the bottom side.")
    height = panel.box.y1 + BELOW
    return svg_document(Box(0.0, 0.0, WIDTH, height), (f"{WIDTH:.0f}", f"{height:.0f}"), words, [*head, *body])


def peak_gain(portrait: Portrait) -> float:
    """The largest gain in any of the cuts, dBi."""
    return max(float(np.nanmax(cut.gain_dbi)) for cut in portrait.cuts)


def outer_ring(portrait: Portrait) -> float:
    """Gain of the outer ring, dBi: the next 5 dB above the largest, one for all cuts."""
    return 5.0 * math.floor(peak_gain(portrait) / 5.0 + 1.0)


def polar_places(theta: Array, gain: Array, outer: float) -> Array:
    """Where `gain` (n,) dBi at `theta` (n,) degrees from the normal lies in the picture, (n, 2) px; NaN stays NaN."""
    radius = RADIUS * np.clip((gain - outer + RANGE) / RANGE, 0.0, 1.0)
    turned = np.radians(theta)
    places: Array = np.column_stack([CENTRE[0] + radius * np.sin(turned), CENTRE[1] - radius * np.cos(turned)])
    return places


def _grid(outer: float, left: str, right: str) -> list[str]:
    parts = []
    for step in range(round(RANGE / RING)):
        share = 1.0 - step * RING / RANGE
        stroke = Stroke("muted", 1.2) if step == 0 else Stroke("grid", 0.8)
        parts.append(circle(CENTRE, RADIUS * share, stroke))
    for degrees in range(0, 180, SPOKE):
        dx, dy = RADIUS * math.sin(math.radians(degrees)), RADIUS * math.cos(math.radians(degrees))
        parts.append(line((CENTRE[0] - dx, CENTRE[1] + dy), (CENTRE[0] + dx, CENTRE[1] - dy), Stroke("grid", 0.7)))
    board = 0.3 * RADIUS
    parts.append(line((CENTRE[0] - board, CENTRE[1]), (CENTRE[0] + board, CENTRE[1]), Stroke("copper-top", 4.0)))
    words = Lettering(SIZE, "middle", "ink", bold=True)
    parts.append(text((CENTRE[0], CENTRE[1] - RADIUS - 18.0), "top", words))
    parts.append(text((CENTRE[0], CENTRE[1] + RADIUS + 25.0), "bottom", words))
    parts.append(text((CENTRE[0] - RADIUS - 24.0, CENTRE[1] + 5.0), left, words))
    parts.append(text((CENTRE[0] + RADIUS + 24.0, CENTRE[1] + 5.0), right, words))
    small = Lettering(0.85 * SIZE, "middle", "muted")
    for degrees in (30, 60, 120, 150):
        for sign in (1, -1):
            x = CENTRE[0] + sign * (RADIUS + 15.0) * math.sin(math.radians(degrees))
            y = CENTRE[1] - (RADIUS + 15.0) * math.cos(math.radians(degrees)) + 4.0
            parts.append(text((x, y), f"{degrees}\N{DEGREE SIGN}", small))
    return parts


def _ring_numbers(outer: float) -> list[str]:
    """What the rings mean, on the lower right diagonal, over the curves."""
    parts = []
    for step in range(round(RANGE / RING)):
        reach = math.sqrt(0.5) * RADIUS * (1.0 - step * RING / RANGE)
        word = number(outer - step * RING) + (" dBi" if step == 0 else "")
        parts.append(haloed((CENTRE[0] + reach, CENTRE[1] + reach + 4.0), word))
    return parts


def _told(cut: PatternCut, theta: float) -> str:
    return f"{cut.gain_dbi[int(np.argmin(np.abs(cut.theta - theta)))]:.1f} dBi"

"""Plots over frequency: reflection against what is asked, gain and axial ratio toward the top."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from planar.design.portrait import Portrait
from planar.network.response import Response
from planar.report.plots_axes import (
    BELOW,
    LEFT,
    RIGHT,
    WIDTH,
    Axis,
    Panel,
    Stroke,
    area,
    hovers,
    legend,
    line,
    marker,
    number,
    patch,
    round_ticks,
    swatch,
)
from planar.report.svg import Box, svg_document

Array = NDArray[np.float64]

BESIDE = 0.55
"""Share of the trusted span that is shown on either side of it."""
DEEPEST = -40.0
"""dB, where the scale of reflection ends at the latest."""
PANEL = 210.0
"""Height of a panel, px."""
RATIO_SHOWN = 12.0
"""dB, where the scale of axial ratio ends."""
CURVE, SECOND, ASKED = Stroke("curve-1", 2.6), Stroke("curve-2", 2.4, "dashed"), Stroke("asked", 2.0, "dashed")
UNTRUSTED = Stroke("curve-1", 1.3, "dotted")
MIDDLE = Stroke("muted", 1.3, "dashed")


@dataclass(frozen=True)
class Asked:
    """What a brief asks: `band` (low, high) Hz, worst reflection `match_db` at `impedance` ohm, and the highest axial
    ratio `axial_ratio_db`, None for linear polarisation."""

    band: tuple[float, float]
    match_db: float
    impedance: float
    axial_ratio_db: float | None

    @classmethod
    def of(cls, facts: Mapping[str, Any]) -> Asked:
        """That of a design in the plain types of `design.json`."""
        target = facts["target"]
        low, high = facts["band_hz"]
        return cls((low, high), target["match_db"], target["impedance_ohm"], target["axial_ratio_db"])


@dataclass(frozen=True, eq=False)
class Spread:
    """Reflection over tolerances: `frequency` (n,) Hz, `low_db` and `high_db` (n,) dB, and the two in words; half of
    the boards lie below `middle_db` (n,) at each frequency, None where that is not known."""

    frequency: Array
    low_db: Array
    high_db: Array
    words: str
    middle_db: Array | None = None


def reflection_plot(
    response: Response, prediction: Mapping[str, Any], *, asked: Asked, spread: Spread | None = None
) -> str:
    """SVG of the predicted reflection over frequency, with the `spread` over tolerances; `prediction` are its facts as
    in `design.json`."""
    low, high = prediction["trusted_hz"]
    matched = prediction["matched_band_hz"]
    head, top = legend(_entries(prediction, asked, spread), 0.0)
    x0, x1 = max(response.frequency[0], low - BESIDE * (high - low)), high + BESIDE * (high - low)
    panel = _panel(top + 6.0, _mhz_axis(x0, min(x1, response.frequency[-1])), _depth(response, asked))
    body = [panel.shaded(*(1e-6 * end for end in asked.band))]
    if spread is not None:
        body.append(_spread_area(panel, spread))
    body += [*panel.frame(), panel.level(asked.match_db, ASKED)]
    if spread is not None and spread.middle_db is not None:
        body.append(panel.curve(1e-6 * spread.frequency, spread.middle_db, MIDDLE))
    body += _reflection_curves(panel, response, (low, high))
    if matched is not None:
        y = panel.box.y1 - 7.0
        x0, x1 = (float(np.clip(panel.across(1e-6 * end), panel.box.x0, panel.box.x1)) for end in matched)
        body.append(_bracket(x0, x1, y))
    words = ("Reflection over frequency", _reflection_said(prediction, asked, panel.x))
    return _document(panel.box.y1 + BELOW, words, [*head, *body])


def _reflection_said(prediction: Mapping[str, Any], asked: Asked, shown: Axis) -> str:
    """The plot of reflection over the frequencies `shown` in words."""
    matched, worst = prediction["matched_band_hz"], _db(prediction["worst_reflection_db"])
    where = "nowhere near the band" if matched is None else f"from {_span(matched, 4)}"
    return (
        f"Predicted reflection in dB from {_mhz(1e6 * shown.low)} to {_mhz(1e6 * shown.high)}. In the band "
        f"{_span(asked.band)} it is {worst} at worst, {_db(asked.match_db)} is asked. It is below that {where}."
    )


def _entries(prediction: Mapping[str, Any], asked: Asked, spread: Spread | None) -> list[tuple[str, str]]:
    """The legend of the plot of reflection."""
    entries = [
        (swatch(CURVE), "predicted"),
        (swatch(UNTRUSTED), "outside the finely solved span"),
        (patch("band-fill"), f"band {_span(asked.band)}"),
        (swatch(ASKED), f"asked {_db(asked.match_db)}"),
    ]
    if prediction["matched_band_hz"] is not None:
        entries.append((_bracket(0.0, 26.0, 0.0), f"below it {_span(prediction['matched_band_hz'], 4)}"))
    if spread is not None:
        entries.append((patch("spread-fill"), spread.words))
        entries += [(swatch(MIDDLE), "half of them below")] if spread.middle_db is not None else []
    return entries


def gain_plot(portrait: Portrait, *, asked: Asked) -> str:
    """SVG of gain toward the top over the trusted span, and for a circular board of the axial ratio below it."""
    entries = [(swatch(CURVE), "gain toward the top"), (patch("band-fill"), f"band {_span(asked.band)}")]
    if portrait.circular:
        entries.insert(1, (swatch(SECOND), "axial ratio"))
        entries.append((swatch(ASKED), f"{number(asked.axial_ratio_db or 0.0)} dB, the most that counts as circular"))
    head, top = legend(entries, 0.0)
    across = _mhz_axis(float(portrait.frequency[0]), float(portrait.frequency[-1]))
    panel = _panel(top + 6.0, across, _gain_axis(portrait.gain_dbi), height=150.0 if portrait.circular else PANEL)
    body = _over_frequency(panel, portrait.frequency, (portrait.gain_dbi, CURVE, "dBi"), asked)
    if portrait.circular:
        scale = Axis(0.0, RATIO_SHOWN, round_ticks(0.0, RATIO_SHOWN, 6), "axial ratio (dB)")
        panel = _panel(panel.box.y1 + BELOW + 14.0, across, scale, height=150.0)
        ratio = np.where(portrait.axial_ratio_db > RATIO_SHOWN, np.nan, portrait.axial_ratio_db)
        body += _over_frequency(panel, portrait.frequency, (ratio, SECOND, "dB"), asked)
        if asked.axial_ratio_db is not None:
            body.append(panel.level(asked.axial_ratio_db, ASKED))
    middle = len(portrait.frequency) // 2
    told = f"Gain toward the top is {portrait.gain_dbi[middle]:.2f} dBi at {_mhz(portrait.centre)}"
    title = "Gain over frequency"
    if portrait.circular:
        told += f", axial ratio {portrait.axial_ratio_db[middle]:.2f} dB"
        title = "Gain and axial ratio over frequency"
    low, high = portrait.gain_dbi.min(), portrait.gain_dbi.max()
    words = (title, f"{told}; gain runs from {low:.1f} to {high:.1f} dBi over the finely solved span.")
    return _document(panel.box.y1 + BELOW, words, [*head, *body])


def _over_frequency(panel: Panel, frequency: Array, drawn: tuple[Array, Stroke, str], asked: Asked) -> list[str]:
    """One curve over the band in its panel, with its values on hovering."""
    values, stroke, unit = drawn
    x = 1e-6 * frequency
    spots = np.column_stack([np.asarray(panel.across(x)), np.asarray(panel.down(values))])
    words = (f"{_mhz(f)}: {value:.2f} {unit}" for f, value in zip(frequency, values, strict=True))
    shaded = panel.shaded(*(1e-6 * end for end in asked.band))
    return [shaded, *panel.frame(), panel.curve(x, values, stroke), *hovers(spots, words)]


def _reflection_curves(panel: Panel, response: Response, trusted: tuple[float, float]) -> list[str]:
    """The curve inside the trusted span, what lies outside, the best match, and values on hovering."""
    f, decibels = response.frequency, np.maximum(response.reflection_db, 2.0 * DEEPEST)
    inside = (f >= trusted[0]) & (f <= trusted[1])
    # one more point on either side, so that the curves meet
    beyond = ~inside | ~np.roll(inside, 1) | ~np.roll(inside, -1)
    parts = [panel.curve(1e-6 * f, np.where(beyond, decibels, np.nan), UNTRUSTED)]
    parts.append(panel.curve(1e-6 * f, np.where(inside, decibels, np.nan), CURVE))
    spots = np.column_stack([np.asarray(panel.across(1e-6 * f)), np.asarray(panel.down(decibels))])
    shown = np.flatnonzero(inside)[::4]
    parts += hovers(spots[shown], [f"{_mhz(f[i])}: {_db(decibels[i])}" for i in shown])
    best = int(np.argmin(np.where(inside, decibels, np.inf)))
    place = (float(spots[best, 0]), float(spots[best, 1]))
    return [*parts, marker("down", place, CURVE, f"best match {_mhz(f[best])}: {_db(decibels[best])}")]


def _spread_area(panel: Panel, spread: Spread) -> str:
    inside = (spread.frequency >= 1e6 * panel.x.low) & (spread.frequency <= 1e6 * panel.x.high)
    x = np.asarray(panel.across(1e-6 * spread.frequency[inside]))
    low, high = (np.asarray(panel.down(edge[inside])) for edge in (spread.low_db, spread.high_db))
    return area(np.concatenate([np.column_stack([x, low]), np.column_stack([x, high])[::-1]]), "spread-fill")


def _bracket(x0: float, x1: float, y: float) -> str:
    """A bar with an end stop on either side."""
    stroke = Stroke("curve-3", 2.4)
    stops = [line((x, y - 4.5), (x, y + 4.5), stroke) for x in (x0, x1)]
    return "".join([line((x0, y), (x1, y), stroke), *stops])


def _panel(top: float, across: Axis, down: Axis, *, height: float = PANEL) -> Panel:
    return Panel(Box(LEFT, top, WIDTH - RIGHT, top + height), across, down)


def _mhz_axis(low: float, high: float) -> Axis:
    return Axis(1e-6 * low, 1e-6 * high, round_ticks(1e-6 * low, 1e-6 * high, 6), "frequency (MHz)")


def _depth(response: Response, asked: Asked) -> Axis:
    """Scale of reflection: from 0 dB as deep as there is something to see."""
    deepest = max(DEEPEST, min(float(response.reflection_db.min()), asked.match_db - 5.0))
    low = max(DEEPEST, 5.0 * math.floor((deepest - 3.0) / 5.0))
    return Axis(low, 0.0, tuple(5.0 * i for i in range(round(low / 5.0), 1)), "reflection (dB)")


def _gain_axis(gain: Array) -> Axis:
    """At least 4 dB, so that a flat curve looks flat."""
    middle, half = 0.5 * float(gain.max() + gain.min()), max(2.0, 0.6 * float(gain.max() - gain.min()))
    low, high = math.floor(middle - half), math.ceil(middle + half)
    return Axis(low, high, round_ticks(low, high, 6), "gain (dBi)")


def _document(height: float, words: tuple[str, str], body: Sequence[str]) -> str:
    return svg_document(Box(0.0, 0.0, WIDTH, height), (f"{WIDTH:.0f}", f"{height:.0f}"), words, body)


def _span(ends: Sequence[float], digits: int = 6) -> str:
    low, high = ends
    return f"{1e-6 * low:.{digits}g} to {1e-6 * high:.{digits}g} MHz"


def _mhz(frequency: float) -> str:
    return f"{1e-6 * frequency:.6g} MHz"


def _db(value: float) -> str:
    return f"{number(round(value, 1))} dB"

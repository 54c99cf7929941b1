"""Measured over predicted: the board's own reflection with what lies in front taken off, and as the instrument saw it.

Four curves are held against each other: as designed, as measured, the board found, and what the next spin should do;
each has a colour and a dash of its own.
"""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from planar.report.plots_axes import (
    BELOW,
    LEFT,
    RIGHT,
    WIDTH,
    Axis,
    Panel,
    Stroke,
    circle,
    hovers,
    legend,
    marker,
    number,
    patch,
    polyline,
    round_ticks,
    swatch,
)
from planar.report.plots_frequency import Asked
from planar.report.plots_smith import CENTRE, RADIUS, ohms, smith_grid, smith_places
from planar.report.svg import Box, svg_document

Array = NDArray[np.float64]
Complex = NDArray[np.complex128]
Facts = Mapping[str, Any]

OVER = (3, 1, 0, 2)
"""Order in which the curves are drawn: what is broken lies over what is whole."""
DEEPEST = -40.0
"""dB, where a scale of reflection ends at the latest."""
PANEL, LOWER = 230.0, 110.0
"""Heights of panels, px."""
HOVERED = 40
"""Points of a curve that say their value on hovering."""
ASKED, NOISE = Stroke("asked", 2.0, "dashed"), Stroke("asked", 1.6, "dotted")
DESIGNED, NEXT = Stroke("ink", 1.6, "dashed"), Stroke("curve-3", 4.5)
FOUND, MEASURED = Stroke("ink", 1.8, "dotted"), Stroke("curve-2", 3.2)
"""A thin broken line over a broad one that should follow it."""
RESIDUAL = Stroke("curve-2", 1.6)
NEAR = 0.06
"""Of the middle of the band, how far beyond the band the curves on the reflection chart go."""


@dataclass(frozen=True, eq=False)
class Curve:
    """A reflection called `words`, `reflected` (n,) at `frequency` (n,) Hz, how it is drawn, `kind` of its marks."""

    words: str
    frequency: Array
    reflected: Complex
    stroke: Stroke
    kind: str

    @property
    def decibels(self) -> Array:
        """dB (n,), not below twice what a scale shows."""
        sizes: Array = np.maximum(20.0 * np.log10(np.maximum(np.abs(self.reflected), 1e-9)), 2.0 * DEEPEST)
        return sizes


def retune_pictures(facts: Facts, design_facts: Facts) -> dict[str, str]:
    """SVG texts `board`, `chart` and `seen` from the contents of a retune.json and of the design's design.json."""
    asked = Asked.of(design_facts)
    return {
        "board": board_plot(facts, asked=asked),
        "chart": board_chart(facts, asked=asked),
        "seen": seen_plot(facts, asked=asked),
    }


def board_curves(facts: Facts) -> tuple[Curve, ...]:
    """The reflections of the board itself, nothing in front."""
    curves = facts["curves"]
    model, measured = np.array(curves["model_hz"]), np.array(curves["measured_hz"])
    return (
        Curve("designed", model, _complex(curves["designed"]), DESIGNED, "square"),
        Curve("measured, line in front taken off", measured, _complex(curves["measured"]), MEASURED, "circle"),
        Curve("board found", model, _complex(curves["inferred"]), FOUND, "up"),
        Curve("after the next spin", model, _complex(curves["after_next_spin"]), NEXT, "diamond"),
    )


def board_plot(facts: Facts, *, asked: Asked) -> str:
    """SVG of the reflection of the board itself over frequency: designed, measured, found, after the next spin."""
    curves = board_curves(facts)
    band = asked.band
    entries = [(swatch(each.stroke), each.words) for each in curves]
    entries += [(patch("band-fill"), f"band {_span(band)}"), (swatch(ASKED), f"asked {_db(asked.match_db)}")]
    head, top = legend(entries, 0.0)
    panel = _panel(top + 6.0, _across(curves), _depth(curves, asked.match_db), PANEL)
    body = [panel.shaded(*(1e-6 * end for end in band)), *panel.frame(), panel.level(asked.match_db, ASKED)]
    for place in OVER:
        body += _over_frequency(panel, curves[place])
    worst = "; ".join(f"{each.words}: {_db(_worst(each, band))}" for each in curves)
    words = "Reflection of the board itself", f"Reflection in dB over frequency; at worst in {_span(band)}: {worst}."
    return _document(panel.box.y1 + BELOW, words, [*head, *body])


def board_chart(facts: Facts, *, asked: Asked) -> str:
    """SVG of the same on a reflection chart, in and near the band, a mark on each curve at the middle of the band."""
    low, high = asked.band
    centre, z0 = 0.5 * (low + high), float(facts["curves"]["reference_ohm"])
    curves = board_curves(facts)
    at = [complex(_between(each, np.array([centre]))[0]) for each in curves]
    told = [f"{each.words}: {ohms(z0 * (1.0 + r) / (1.0 - r))}" for each, r in zip(curves, at, strict=True)]
    entries = [
        (swatch(each.stroke) + marker(each.kind, (13.0, 0.0), each.stroke), words)
        for each, words in zip(curves, told, strict=True)
    ]
    entries.append((swatch(ASKED), f"asked {_db(asked.match_db)}; marks at {_mhz(centre)}"))
    foot, bottom = legend(entries, CENTRE[1] + RADIUS + 22.0)
    body = [*smith_grid(z0), circle(CENTRE, RADIUS * 10.0 ** (asked.match_db / 20.0), ASKED)]
    span = low - NEAR * centre, high + NEAR * centre
    for curve in (curves[place] for place in OVER):
        inside = (curve.frequency >= span[0]) & (curve.frequency <= span[1])
        body.append(polyline(smith_places(curve.reflected[inside]), curve.stroke))
    for curve, reflected, words in zip(curves, at, told, strict=True):
        x, y = smith_places(np.array([reflected]))[0].tolist()
        body.append(marker(curve.kind, (x, y), curve.stroke, words))
    title = "Reflection of the board itself on a reflection chart"
    description = f"Reflection chart for {z0:g} ohm, from {_span(span)}; at {_mhz(centre)}: {'; '.join(told)}."
    return _document(bottom, (title, description), [*body, *foot])


def seen_plot(facts: Facts, *, asked: Asked) -> str:
    """SVG of what the instrument saw, of what it should see of the board found, and below of what is left between."""
    curves = facts["curves"]
    frequency = np.array(curves["measured_hz"])
    seen = Curve("as the instrument saw it", frequency, _complex(curves["seen"]), MEASURED, "circle")
    model = Curve("model: board found, line in front", frequency, _complex(curves["seen_by_model"]), FOUND, "up")
    left, noise = np.abs(model.reflected - seen.reflected), float(facts["measurement"]["noise"])
    rms = float(facts["residual_rms"])
    entries = [(swatch(each.stroke), each.words) for each in (seen, model)]
    entries += [(patch("band-fill"), f"band {_span(asked.band)}")]
    head, top = legend(entries, 0.0)
    across = _across((seen,))
    upper = _panel(top + 6.0, Axis(across.low, across.high, across.ticks, ""), _depth((seen, model), 0.0), PANEL - 40.0)
    most = 1e3 * max(1.15 * float(left.max()), 2.5 * noise, 0.01)
    scale = Axis(0.0, most, round_ticks(0.0, most, 4), "left over (1/1000)")
    second, bottom = legend(
        [(swatch(RESIDUAL), f"left over, {rms:.4f} rms"), (swatch(NOISE), f"noise {noise:.4f}")], upper.box.y1 + 28.0
    )
    lower = _panel(bottom + 6.0, across, scale, LOWER)
    body = []
    for panel in (upper, lower):
        body += [panel.shaded(*(1e-6 * end for end in asked.band)), *panel.frame()]
    body += [*_over_frequency(upper, seen), *_over_frequency(upper, model)]
    body += [lower.curve(1e-6 * frequency, 1e3 * left, RESIDUAL), lower.level(1e3 * noise, NOISE)]
    title = "As the instrument saw it, and the model"
    worst = int(np.argmax(left))
    told = (
        f"Reflection in dB with what lies in front, measured and from the model; what is left between them is "
        f"{rms:.4f} rms, most at {_mhz(frequency[worst])}: {left[worst]:.4f}, where the noise is {noise:.4f}."
    )
    return _document(lower.box.y1 + BELOW, (title, told), [*head, *second, *body])


def _over_frequency(panel: Panel, curve: Curve) -> list[str]:
    """A curve in its panel with values on hovering."""
    x = 1e-6 * curve.frequency
    shown = np.unique(np.linspace(0, len(x) - 1, HOVERED).astype(int))
    shown = shown[(x[shown] >= panel.x.low) & (x[shown] <= panel.x.high)]
    spots = np.column_stack([np.asarray(panel.across(x[shown])), np.asarray(panel.down(curve.decibels[shown]))])
    words = [f"{curve.words}, {_mhz(curve.frequency[i])}: {_db(curve.decibels[i])}" for i in shown]
    return [panel.curve(x, curve.decibels, curve.stroke), *hovers(spots, words)]


def _between(curve: Curve, at: Array) -> Complex:
    values: Complex = np.interp(at, curve.frequency, curve.reflected.real) + 1j * np.interp(
        at, curve.frequency, curve.reflected.imag
    )
    return values


def _worst(curve: Curve, band: tuple[float, float]) -> float:
    """dB at worst over `band` Hz, its ends among the frequencies."""
    inside = curve.frequency[(curve.frequency > band[0]) & (curve.frequency < band[1])]
    at = np.concatenate([[band[0]], inside, [band[1]]])
    return float(20.0 * np.log10(np.max(np.abs(_between(curve, at)))))


def _panel(top: float, across: Axis, down: Axis, height: float) -> Panel:
    return Panel(Box(LEFT, top, WIDTH - RIGHT, top + height), across, down)


def _across(curves: Sequence[Curve]) -> Axis:
    """The span in which all of the curves are."""
    low = 1e-6 * max(float(each.frequency[0]) for each in curves)
    high = 1e-6 * min(float(each.frequency[-1]) for each in curves)
    return Axis(low, high, round_ticks(low, high, 6), "frequency (MHz)")


def _depth(curves: Sequence[Curve], asked_db: float) -> Axis:
    deepest = max(DEEPEST, min(asked_db - 5.0, *(float(each.decibels.min()) for each in curves)))
    low = max(DEEPEST, 5.0 * math.floor((deepest - 1.0) / 5.0))
    return Axis(low, 0.0, round_ticks(low, 0.0, 8), "reflection (dB)")


def _document(height: float, words: tuple[str, str], body: Sequence[str]) -> str:
    return svg_document(Box(0.0, 0.0, WIDTH, height), (f"{WIDTH:.0f}", f"{height:.0f}"), words, body)


def _complex(pairs: Sequence[Sequence[float]]) -> Complex:
    values: Complex = np.array(pairs, dtype=np.float64).view(np.complex128)[:, 0]
    return values


def _span(ends: Sequence[float]) -> str:
    return f"{1e-6 * ends[0]:.6g} to {1e-6 * ends[1]:.6g} MHz"


def _mhz(frequency: float) -> str:
    return f"{1e-6 * frequency:.6g} MHz"


def _db(value: float) -> str:
    return f"{number(round(value, 1))} dB"

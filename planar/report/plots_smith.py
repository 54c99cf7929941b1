"""Impedance on a reflection chart: the complex plane of reflection with circles of resistance and arcs of reactance.

P. H. Smith, Electronics 12 (Jan. 1939) 29: reflection (z - 1)/(z + 1) of the impedance z over the reference; short at
the left, open at the right, match in the middle, inductive above.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Any

import numpy as np
from numpy.typing import NDArray

from planar.network.response import Response, reflection
from planar.report.plots_axes import WIDTH, Stroke, circle, haloed, hovers, legend, marker, polyline, swatch
from planar.report.plots_frequency import Asked
from planar.report.svg import Box, svg_document

Array = NDArray[np.float64]
Complex = NDArray[np.complex128]

CENTRE, RADIUS = (220.0, 206.0), 190.0
"""Of the chart in the picture, px."""
RESISTANCES = (0.2, 0.5, 1.0, 2.0, 5.0)
REACTANCES = (0.2, 0.5, 1.0, 2.0, 5.0)
"""Of the grid, over the reference."""
INSIDE, AROUND, LIMIT = Stroke("curve-2", 4.5), Stroke("curve-1", 1.8), Stroke("asked", 1.8, "dashed")
GRID = Stroke("grid", 0.8)
FAR = 60.0
"""Reactance at which an arc of the grid ends, over the reference: next to the open."""


def smith_plot(response: Response, prediction: Mapping[str, Any], *, asked: Asked) -> str:
    """SVG of the impedance at the pads over the trusted span, and at the gap of the bare loop at the centre.

    `prediction` are its facts as in `design.json`.
    """
    z0 = asked.impedance
    low, high = asked.band
    centre = 0.5 * (low + high)
    at_centre, at_gap = (complex(*prediction[key]) for key in ("input_impedance_ohm", "gap_impedance_ohm"))
    ends = [_at(response, end, z0) for end in (low, high)]
    marks = [
        ("down", Stroke("curve-2"), f"{_mhz(low)}: {ohms(ends[0])}", ends[0]),
        ("circle", Stroke("curve-2"), f"{_mhz(centre)}: {ohms(at_centre)}", at_centre),
        ("up", Stroke("curve-2"), f"{_mhz(high)}: {ohms(ends[1])}", ends[1]),
    ]
    if at_gap != at_centre:  # without a line the pads are the gap
        marks.append(("diamond", Stroke("curve-3"), f"gap of the bare loop, {_mhz(centre)}: {ohms(at_gap)}", at_gap))
    entries = [(marker(kind, (13.0, 0.0), stroke), words) for kind, stroke, words, _ in marks]
    entries += [
        (swatch(INSIDE), "at the pads, in the band"),
        (swatch(AROUND), "around it"),
        (swatch(LIMIT), f"asked {asked.match_db:g} dB".replace("-", "\N{MINUS SIGN}")),
    ]
    foot, bottom = legend(entries, CENTRE[1] + RADIUS + 22.0)
    body = [*smith_grid(z0), circle(CENTRE, RADIUS * 10.0 ** (asked.match_db / 20.0), LIMIT)]
    body += _curves(response, prediction["trusted_hz"], asked.band)
    for kind, stroke, words, impedance in reversed(marks):
        x, y = smith_places(reflection([impedance], z0))[0].tolist()
        body.append(marker(kind, (x, y), stroke, words))
    told = "; ".join(words for _, _, words, _ in marks)
    title = "Impedance on a reflection chart"
    description = f"Reflection chart for {z0:g} ohm, match in the middle, inductive above. At the pads {told}."
    size = (f"{WIDTH:.0f}", f"{bottom:.0f}")
    return svg_document(Box(0.0, 0.0, WIDTH, bottom), size, (title, description), [*body, *foot])


def smith_places(reflected: Complex) -> Array:
    """Where `reflected` (n,) lie in the picture, (n, 2) px, y downwards."""
    places: Array = np.column_stack([CENTRE[0] + RADIUS * reflected.real, CENTRE[1] - RADIUS * reflected.imag])
    return places


def ohms(impedance: complex) -> str:
    """An impedance as the trade writes it."""
    sign = "+" if impedance.imag >= 0.0 else "\N{MINUS SIGN}"
    return f"{impedance.real:.1f} {sign} j{abs(impedance.imag):.1f} ohm"


def _at(response: Response, frequency: float, z0: float) -> complex:
    """Impedance, ohm, at `frequency` Hz, the reflection linear between the frequencies held."""
    s = response.s[:, 0, 0]
    reflected = complex(
        np.interp(frequency, response.frequency, s.real), np.interp(frequency, response.frequency, s.imag)
    )
    return z0 * (1.0 + reflected) / (1.0 - reflected)


def _curves(response: Response, trusted: Sequence[float], band: tuple[float, float]) -> list[str]:
    """The trusted span, thin, the band in it, thick, with impedances on hovering."""
    f, s = response.frequency, response.s[:, 0, 0]
    span = (f >= trusted[0]) & (f <= trusted[1])
    inside = np.concatenate([[band[0]], f[(f > band[0]) & (f < band[1])], [band[1]]])
    in_band = np.interp(inside, f, s.real) + 1j * np.interp(inside, f, s.imag)
    shown = np.flatnonzero(span)[::4]
    words = [f"{_mhz(f[i])}: {ohms(response.z0 * (1.0 + s[i]) / (1.0 - s[i]))}" for i in shown]
    return [
        polyline(smith_places(s[span]), AROUND),
        polyline(smith_places(in_band), INSIDE),
        *hovers(smith_places(s[shown]), words),
    ]


def smith_grid(z0: float) -> list[str]:
    """Circles of resistance, arcs of reactance and their numbers in ohm for a reference of `z0` ohm."""
    parts = [circle(CENTRE, RADIUS, Stroke("muted", 1.4), "paper")]
    parts.append(polyline(smith_places(np.array([-1.0 + 0j, 1.0 + 0j])), GRID))
    for r in RESISTANCES:
        (middle,) = smith_places(np.array([r / (1.0 + r) + 0j]))
        parts.append(circle((float(middle[0]), float(middle[1])), RADIUS / (1.0 + r), GRID))
    along = np.concatenate([[0.0], np.geomspace(0.02, FAR, 60)])
    for x in REACTANCES:
        for sign in (1.0, -1.0):
            parts.append(polyline(smith_places(reflection(along + 1j * sign * x, 1.0)), GRID))
    for r in RESISTANCES:
        x, y = smith_places(reflection([complex(r, 0.0)], 1.0))[0].tolist()
        parts.append(haloed((x, y - 3.0), f"{r * z0:g}"))
    for x in REACTANCES:
        for sign in (1.0, -1.0):
            turned = complex(reflection([1j * sign * x], 1.0)[0])
            place = CENTRE[0] + 0.905 * RADIUS * turned.real, CENTRE[1] - 0.93 * RADIUS * turned.imag + 4.0
            word = f"{'+' if sign > 0 else chr(0x2212)}j{x * z0:g}"
            parts.append(haloed(place, word))
    return parts


def _mhz(frequency: float) -> str:
    return f"{1e-6 * frequency:.6g} MHz"

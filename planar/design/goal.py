"""What a design shall reach, as complex terms held against limits over a span of frequencies.

The terms are reflections at the connector's reference plane and, for circular polarisation, the share of the wrong
sense toward the top. Inside the band they are held to more than the brief asks; round it, out to the widest span the
loop can carry, to what it asks: margin beyond the band is worth having.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from planar.design.choices import Choices
from planar.design.minimax import LinearModel, worst
from planar.field.band import BandSolution
from planar.network.response import reflection

Array = NDArray[np.float64]
Complex = NDArray[np.complex128]

POINTS = 49
"""Even frequencies of a goal, an odd number for one at the centre; the edges of the band come on top."""
HALF_SPAN = 0.12
"""They reach so far to either side, of the centre frequency; round a wider band a tenth of it beyond its edges."""
IN_BAND = 0.6
"""Of the brief's reflection, the limit sized to inside the band: 4.4 dB better."""
CIRCULAR_MATCH = 10.0 ** (-15.0 / 20.0)
"""Reflection sized to where circular polarisation is asked for: a wrong sense comes back through the match."""
AXIAL_RATIO_DB = 2.7
"""dB, axial ratio sized to over the span: 3 dB with a margin."""
CENTRE_AXIAL_RATIO_DB, FINAL_CENTRE_AXIAL_RATIO_DB = 1.5, 0.35
"""dB, sized to at the centre: on a coarse mesh, whose own error is of that size, and on the fine one."""
WIDTHS = (0.02, 0.03, 0.045, 0.06, 0.08, 0.10, 0.12, 0.14, 0.16, 0.18, 0.20, 0.22)
"""Spans tried, over the centre frequency, widest last."""


@dataclass(frozen=True)
class Goal:
    """Limits at `frequencies` (f,) Hz round `centre`: `match` in and beyond `band` (low, high) Hz at `reference` ohm.

    `sense` is "right", "left" or None for linear polarisation.
    """

    frequencies: Array
    centre: float
    reference: float
    match: float
    band: tuple[float, float]
    sense: str | None
    centre_axial_ratio_db: float = CENTRE_AXIAL_RATIO_DB

    @classmethod
    def of(cls, choices: Choices) -> Goal:
        """Goal of a brief."""
        target = choices.brief.target
        half = half_span(choices)
        even = choices.centre * (1.0 + np.linspace(-half, half, POINTS))
        frequencies = np.unique(np.concatenate([even, target.band]))
        match = 10.0 ** (target.match_db / 20.0)
        sense = target.polarisation.removeprefix("circular-") if choices.circular else None
        return cls(frequencies, choices.centre, target.impedance, match, target.band, sense)

    def terms(self, band: BandSolution, shift: float = 1.0) -> Complex:
        """Terms of a solution, (j,): reflections, then wrong-sense shares; seen at frequencies times `shift`."""
        frequencies = shift * self.frequencies
        reflected = reflection(band.impedance(frequencies), self.reference)
        if self.sense is None:
            return reflected
        return np.concatenate([reflected, wrong_share(band.circular_ratio(frequencies), self.sense)])

    def chosen(self, width: float) -> NDArray[np.bool_]:
        """Terms that count for a span of `width` over the centre, (j,)."""
        low, high = self.span(width)
        inside = (self.frequencies >= low * (1.0 - 1e-9)) & (self.frequencies <= high * (1.0 + 1e-9))
        return inside if self.sense is None else np.concatenate([inside, inside])

    def span(self, width: float) -> tuple[float, float]:
        """Frequencies from and to, Hz: the span of `width`, at least the band."""
        half = 0.5 * width * self.centre
        return min(self.band[0], self.centre - half), max(self.band[1], self.centre + half)

    @property
    def widths(self) -> tuple[float, ...]:
        """Widths of span to be tried, over the centre frequency: the band's own and those wider."""
        own = (self.band[1] - self.band[0]) / self.centre
        return (own, *(width for width in WIDTHS if width > own))

    @property
    def limits(self) -> Array:
        """Limit of every term, (j,)."""
        spacing = (self.frequencies[-1] - self.frequencies[0]) / (POINTS - 1)
        apart = np.abs(self.frequencies - self.centre)
        low, high = self.band
        in_band = (self.frequencies >= low * (1.0 - 1e-12)) & (self.frequencies <= high * (1.0 + 1e-12))
        match = self.match if self.sense is None else min(self.match, CIRCULAR_MATCH)
        reflection = np.where(in_band, IN_BAND * self.match, match)
        if self.sense is None:
            return reflection
        share = np.where(apart < 0.5 * spacing, share_of(self.centre_axial_ratio_db), share_of(AXIAL_RATIO_DB))
        return np.concatenate([np.minimum(reflection, match), share])

    def worst(self, values: Complex, width: float) -> float:
        """Worst term over its limit across a span of `width`; 1 is just met."""
        chosen = self.chosen(width)
        terms: Complex = values[chosen]
        limits: Array = self.limits[chosen]
        return worst(terms, limits)

    def part(self, model: LinearModel, width: float) -> tuple[LinearModel, Array]:
        """Model and limits of the terms that count for `width`."""
        chosen = self.chosen(width)
        return LinearModel(model.values[chosen], model.slopes[chosen]), self.limits[chosen]


def half_span(choices: Choices) -> float:
    """How far a goal reaches to either side of the centre, as a fraction of it."""
    low, high = choices.brief.target.band
    return max(HALF_SPAN, 0.55 * (high - low) / choices.centre)


def wrong_share(ratio: Complex, sense: str) -> Complex:
    """Share of the other sense in the field, from left over right; its phase against the wanted one, 0 to 1 in size."""
    one = np.ones_like(ratio)
    wrong, right = (ratio, one) if sense == "right" else (one, ratio)
    turned = wrong * np.conj(right) / np.maximum(np.abs(right), 1e-30)
    share: Complex = turned / np.sqrt(1.0 + np.abs(ratio) ** 2)
    return share


def share_of(axial_ratio_db: float) -> float:
    """Size of the wrong-sense share at an axial ratio in dB."""
    ratio = 10.0 ** (axial_ratio_db / 20.0)
    size: float = (ratio - 1.0) / (ratio + 1.0)
    return size / math.hypot(1.0, size)

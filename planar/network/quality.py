"""Quality factor and matched bandwidth of a port: what one number at resonance says, and what the response itself says.

The quality factor is that of A. D. Yaghjian and S. R. Best, IEEE T-AP 53 (2005) 1298, from the slope of the impedance
with the port tuned by one lossless element. It predicts the bandwidth of a single resonance; a loop behind its line
has more than one, so bands and margins are read off the response.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike

from planar.errors import RangeError
from planar.network.rational import fit_rational
from planar.network.response import Response
from planar.units import show

SLOPE_STEP = 1e-5
"""Of the frequency, for a central difference of the model: it errs by (this times Q)^2, and rounds by 1e-9."""
MODEL_TOLERANCE = 1e-6
"""Error of the model of the samples, in the largest: computed samples reach it, noisy ones do not and are refused."""


@dataclass(frozen=True)
class MatchedBand:
    """A band from `low` to `high` Hz in which a port reflects less than some level.

    `low_open` and `high_open` say that the response ends there while the port is still matched.
    """

    low: float
    high: float
    low_open: bool
    high_open: bool

    @property
    def centre(self) -> float:
        """Middle of the band, Hz."""
        return 0.5 * (self.low + self.high)

    @property
    def fraction(self) -> float:
        """Width over centre."""
        return (self.high - self.low) / self.centre


@dataclass(frozen=True)
class Margins:
    """What a wanted band leaves to a level of reflection.

    `band` is the matched band that shares most with the wanted one, the nearest one if none does, None if there is
    none at all. `below` and `above` are the Hz from its edges to those of the wanted band, None with it: positive is to
    spare (or more, where the band is open), negative is how far the edge of the match must move. `worst_db` is the
    largest reflection inside the wanted band, at `worst_at` Hz; `spare_db` how far it stays below the level.
    """

    band: MatchedBand | None
    below: float | None
    above: float | None
    worst_db: float
    worst_at: float
    spare_db: float


def quality_factor(frequency: ArrayLike, impedance: ArrayLike, at: float) -> float:
    """Q_Z at `at` Hz of a port of `impedance` (n,) ohm at distinct `frequency` (n,) Hz, tuned there.

    omega/(2 R) sqrt(R'^2 + (X' + |X|/omega)^2): Yaghjian and Best, IEEE T-AP 53 (2005) 1298, with the slopes of a
    rational model of the samples, of which it needs some ten to a resonance.
    Raises `RangeError` for a frequency outside the samples, samples that no rational model meets to 1e-6, and a
    resistance that is not positive.
    """
    points = np.asarray(frequency, dtype=np.float64)
    # With half as many support points as samples a rational function meets any noise, and its slope is that of noise.
    model = fit_rational(points, impedance, tolerance=MODEL_TOLERANCE, most=max(1, (points.size + 2) // 3))
    if not (points.min() <= at <= points.max() and at > 0.0):
        raise RangeError(
            f"quality factor is asked at {show(at, 'frequency')}, the impedance is known from "
            f"{show(float(points.min()), 'frequency')} to {show(float(points.max()), 'frequency')}"
        )
    step = SLOPE_STEP * at
    below, z, above = (complex(value) for value in model(np.array([at - step, at, at + step])))
    if not z.real > 0.0:
        raise RangeError(f"resistance is {z.real:.6g} ohm at {show(at, 'frequency')}, a quality factor needs a loss")
    slope = at * (above - below) / (2.0 * step)  # omega dZ/domega
    return math.hypot(slope.real, slope.imag + abs(z.imag)) / (2.0 * z.real)


def matched_bandwidth(quality: float, vswr: float) -> float:
    """Width over centre of the band in which the standing-wave ratio stays below `vswr`, matched at its centre.

    (s - 1)/(sqrt(s) Q): Yaghjian and Best, IEEE T-AP 53 (2005) 1298, for one resonance of `quality` Q much larger than
    (s - 1)/(2 sqrt(s)). Raises `RangeError` for a quality that is not above that or a ratio not above 1.
    """
    if not (math.isfinite(vswr) and vswr > 1.0):
        raise RangeError(f"standing-wave ratio is {vswr:.6g}, it must be above 1")
    reach = (vswr - 1.0) / math.sqrt(vswr)
    if not (math.isfinite(quality) and quality > 0.5 * reach):
        raise RangeError(
            f"quality factor is {quality:.6g}, it must be above {0.5 * reach:.3g} for a ratio of {vswr:.3g}"
        )
    return reach / quality


def matched_bands(response: Response, level_db: float) -> list[MatchedBand]:
    """Every band in which port 1 of `response` reflects less than `level_db`, as `Response.band`, lowest first."""
    first, last = float(response.frequency[0]), float(response.frequency[-1])
    return [MatchedBand(low, high, low == first, high == last) for low, high in response.band(level_db)]


def margins(response: Response, band: tuple[float, float], level_db: float) -> Margins:
    """What the wanted `band` (low, high) Hz leaves to a reflection of `level_db` in `response`.

    Raises `RangeError` for a band that does not rise or is not inside the response, and a level that is not finite.
    """
    low, high = band
    frequency = response.frequency
    if not frequency[0] <= low < high <= frequency[-1]:
        raise RangeError(
            f"band from {show(low, 'frequency')} to {show(high, 'frequency')}: it must rise and lie between "
            f"{show(float(frequency[0]), 'frequency')} and {show(float(frequency[-1]), 'frequency')}, where the "
            "response is known"
        )
    inside = frequency[(frequency > low) & (frequency < high)]
    points = np.array([low, *inside, high])
    # |S| between samples is linear, as for the edges of a band: near a match its decibels are not.
    size = np.interp(points, frequency, np.abs(response.s[:, 0, 0]))
    worst = int(np.argmax(size))
    worst_db = 20.0 * math.log10(size[worst]) if size[worst] > 0.0 else -math.inf
    found = matched_bands(response, level_db)
    rest = worst_db, float(points[worst]), level_db - worst_db
    if not found:
        return Margins(None, None, None, *rest)
    # Shared width; where bands share nothing it is negative, and the nearest has the largest.
    nearest = max(found, key=lambda each: min(each.high, high) - max(each.low, low))
    return Margins(nearest, low - nearest.low, nearest.high - high, *rest)

"""Monte Carlo on a model: how made boards scatter, how many of them meet the brief, and what they owe it to.

Boards are drawn from the laws of what varies, all independent, with a seed that is kept. Shares of variance are first
order indices (Sobol', Math. Comput. Simul. 55 (2001) 271), here of a least-squares polynomial in each quantity alone
(after Sudret, Reliab. Eng. Syst. Saf. 93 (2008) 964); what no sum of such polynomials explains is interaction.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from planar.design.tolerances import Quantity
from planar.field.band import axial_ratio_db

Array = NDArray[np.float64]
Complex = NDArray[np.complex128]

DEGREE = 4
"""Of the polynomial in one quantity: more finds nothing new in a largest value over a band."""
CONFIDENCE = 1.96
"""Standard deviations of a 95 % interval."""
OTHER_SENSE = 60.0
"""dB, what an axial ratio of the other sense is counted as where numbers are added up: it is as bad as any."""
NOTHING = 1e-12
"""Standard deviation below which a result does not scatter at all."""


@dataclass(frozen=True, eq=False)
class Reader:
    """What is read off the terms of a board: reflections at `frequencies` (f,) Hz first, then wrong-sense ratios.

    `nominal` (f,) are the reflections of the board as designed, `band` (low, high) Hz that of the brief.
    """

    frequencies: Array
    nominal: Complex
    band: tuple[float, float]

    def outcome(self, terms: Complex) -> Outcome:
        """Results of boards of `terms` (n, j)."""
        count = len(self.frequencies)
        reflected, wrong = terms[:, :count], terms[:, count:]
        size = np.abs(reflected)
        axial = None if not wrong.shape[1] else _axial(wrong)
        return Outcome(size, self._worst(size), self._best(size), self._shift(reflected), axial)

    def _worst(self, size: Array) -> Array:
        """Largest reflection in the band, (n,), between frequencies held linear, as margins are."""
        low, high = self.band
        inside = (self.frequencies > low) & (self.frequencies < high)
        edges = [_between(self.frequencies, size, edge) for edge in self.band]
        worst: Array = np.max(np.column_stack([*edges, size[:, inside]]), axis=1)
        return worst

    def _best(self, size: Array) -> Array:
        """Frequency of least reflection, (n,) Hz, by a parabola of its square through the least sample's neighbours."""
        power = size**2
        place = np.clip(np.argmin(power, axis=1), 1, power.shape[1] - 2)
        rows = np.arange(len(power))
        before, least, after = (power[rows, place + step] for step in (-1, 0, 1))
        bend = np.maximum(before - 2.0 * least + after, 1e-30)
        step = np.clip(0.5 * (before - after) / bend, -1.0, 1.0)
        spacing = np.interp(place + step, np.arange(len(self.frequencies)), self.frequencies)
        return np.asarray(spacing, dtype=np.float64)

    def _shift(self, reflected: Complex) -> Array:
        """Fraction by which responses moved up in frequency, (n,), by least squares against the nominal slope; 0 for a
        response without any, of which nobody can tell."""
        slope = self.frequencies * np.gradient(self.nominal, self.frequencies)
        steepness = max(float(np.real(np.vdot(slope, slope))), NOTHING)
        shift: Array = np.real((self.nominal - reflected) @ slope.conj()) / steepness
        return shift


@dataclass(frozen=True, eq=False)
class Outcome:
    """Results of n boards: `size` (n, f) of the reflection, the `worst` (n,) in the band, `best_match` (n,) Hz of the
    least in the span, `shift` (n,) as a fraction, that part of a change which looks like one in frequency, and the
    `axial` ratio (n, a) in dB over the band or None."""

    size: Array
    worst: Array
    best_match: Array
    shift: Array
    axial: Array | None

    @property
    def worst_axial(self) -> Array | None:
        """Largest axial ratio in the band, (n,) dB, infinite where the sense is the other one."""
        return None if self.axial is None else np.max(self.axial, axis=1)

    @property
    def counted_axial(self) -> Array | None:
        """`worst_axial` with the other sense counted as `OTHER_SENSE`, (n,) dB."""
        worst = self.worst_axial
        return None if worst is None else np.minimum(worst, OTHER_SENSE)


@dataclass(frozen=True)
class Limits:
    """What the brief asks: the reflection `match` (a size), and the axial ratio in dB for circular polarisation."""

    match: float
    axial_db: float | None

    def met(self, outcome: Outcome, *, allowance: float = 0.0, axial_allowance: float = 0.0) -> NDArray[np.bool_]:
        """Boards that meet everything, (n,), their reflections taken larger by `allowance`, their axial ratios by
        `axial_allowance` dB."""
        good: NDArray[np.bool_] = outcome.worst + allowance <= self.match
        return good & self.round(outcome, allowance=axial_allowance)

    def round(self, outcome: Outcome, *, allowance: float = 0.0) -> NDArray[np.bool_]:
        """Boards round enough, (n,), their axial ratios taken larger by `allowance` dB: all for linear polarisation."""
        worst = outcome.worst_axial
        if worst is None or self.axial_db is None:
            return np.ones(len(outcome.worst), dtype=np.bool_)
        return np.asarray(worst + allowance <= self.axial_db, dtype=np.bool_)


def drawn(quantities: Sequence[Quantity], samples: int, seed: Sequence[int]) -> Array:
    """Deviations of `samples` boards over the scales, (samples, d); the same `seed` draws the same boards."""
    even = np.random.default_rng(list(seed)).random((samples, len(quantities)))
    columns = [quantity.quantile(even[:, number]) for number, quantity in enumerate(quantities)]
    return np.column_stack(columns) if columns else even


def yield_interval(good: int, samples: int) -> tuple[float, float]:
    """95 % interval of a yield of which `good` of `samples` were seen (Wilson, J. Am. Stat. Assoc. 22 (1927) 209)."""
    share, z = good / samples, CONFIDENCE**2 / samples
    middle, half = share + 0.5 * z, math.sqrt(z * (share * (1.0 - share) + 0.25 * z))
    return max(0.0, (middle - half) / (1.0 + z)), min(1.0, (middle + half) / (1.0 + z))


def variance_shares(deviations: Array, result: Array) -> tuple[Array, float] | None:
    """First-order shares (d,) of the variance of `result` (n,) and the share of interactions, None where nothing
    scatters. `deviations` (n, d) are independent, n many times d; the polynomials are fitted together and their
    variances taken one by one, so that they sum to one only as far as the samples go."""
    spread = float(np.std(result))
    if spread < NOTHING or not deviations.shape[1]:
        return None
    count = deviations.shape[1]
    powers = np.stack([deviations**power for power in range(1, DEGREE + 1)], axis=2)  # (n, d, degree)
    powers = powers - powers.mean(axis=0)
    table = powers.reshape(len(result), count * DEGREE)
    centred = result - result.mean()
    coefficients = np.linalg.lstsq(table, centred, rcond=None)[0].reshape(count, DEGREE)
    parts = np.einsum("ndk,dk->nd", powers, coefficients)
    rest = centred - parts.sum(axis=1)
    variance = spread**2
    return np.var(parts, axis=0) / variance, float(np.var(rest) / variance)


def _axial(wrong: Complex) -> Array:
    """Axial ratio in dB, infinite where the sense is the other one."""
    return np.where(np.abs(wrong) < 1.0, axial_ratio_db(wrong), np.inf)


def _between(frequencies: Array, size: Array, at: float) -> Array:
    """Columns of `size` (n, f) at the frequency `at` Hz, linear between those held, (n,)."""
    place = int(np.clip(np.searchsorted(frequencies, at) - 1, 0, len(frequencies) - 2))
    share = (at - frequencies[place]) / (frequencies[place + 1] - frequencies[place])
    found: Array = (1.0 - share) * size[:, place] + share * size[:, place + 1]
    return found

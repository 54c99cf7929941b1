"""What a measurement tells and what it does not, in numbers and in words.

The shift of the response is what all causes add up to; it is told well even where the causes are not. Causes whose
posterior is hardly narrower than their prior are told together or not at all.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from planar.design.retune.inference import Estimate
from planar.design.retune.unknowns import COAX_SPEED, DELAY, SOLVER, Unknown
from planar.units import show

Array = NDArray[np.float64]

CONFIDENCE = 1.96
"""Standard deviations of a 95 % interval."""
TOLD = 0.6
"""Posterior over prior standard deviation up to which a quantity is told by itself."""
BEYOND = 1.02
"""Of a tolerance, from which on a quantity counts as outside it."""
FELT = 0.0005
"""Shift of the response at one standard deviation of a quantity, from which on it counts as a cause."""


@dataclass(frozen=True)
class Value:
    """An inferred quantity: `value` with its 95 % interval `low` to `high`, `nominal` as designed, all in `unit`.

    `outside` says that it lies beyond its tolerance, `narrowed` is the posterior over the prior standard deviation,
    `away` how many prior standard deviations the value is off its mean, `shift` what it alone does to the response, a
    fraction (0 for what lies in front).
    """

    name: str
    unit: str
    nominal: float
    value: float
    low: float
    high: float
    outside: bool
    narrowed: float
    away: float
    shift: float

    @property
    def told(self) -> bool:
        """Whether the measurement itself says what it is."""
        return self.narrowed <= TOLD


@dataclass(frozen=True)
class Effect:
    """Shift of the response as a fraction, with its standard deviation."""

    shift: float
    sd: float

    @property
    def interval(self) -> tuple[float, float]:
        """95 %."""
        return self.shift - CONFIDENCE * self.sd, self.shift + CONFIDENCE * self.sd

    @property
    def sign(self) -> int:
        """1 where the board came out high, -1 low, 0 where the interval holds both."""
        low, high = self.interval
        return 1 if low > 0.0 else -1 if high < 0.0 else 0

    def __str__(self) -> str:
        return f"{100.0 * self.shift:+.2f} +- {100.0 * CONFIDENCE * self.sd:.2f} %"


@dataclass(frozen=True)
class Direction:
    """One independent combination of causes: `weights` (name -> share of a prior standard deviation, squares sum to
    one) and `narrowed`, its posterior over its prior standard deviation."""

    weights: tuple[tuple[str, float], ...]
    narrowed: float


def inferred_values(unknowns: tuple[Unknown, ...], estimate: Estimate, shifts: Array) -> tuple[Value, ...]:
    """Every unknown with its interval; `shifts` (p,) are those each alone makes."""
    sds = np.sqrt(np.diag(estimate.covariance))
    found = []
    for each, z, sd, shift in zip(unknowns, estimate.z.tolist(), sds.tolist(), shifts.tolist(), strict=True):
        half = CONFIDENCE * sd
        found.append(
            Value(
                each.name, each.unit, each.nominal, each.value(z), each.value(z - half), each.value(z + half),
                each.scale > 0.0 and abs(each.deviation(z)) > BEYOND, sd, z, shift,
            )
        )  # fmt: skip
    return tuple(found)


def directions(unknowns: tuple[Unknown, ...], estimate: Estimate) -> tuple[Direction, ...]:
    """Eigen-directions of the posterior in units of the prior, the best told one first."""
    variances, vectors = np.linalg.eigh(estimate.covariance)
    found = []
    for variance, vector in zip(variances.tolist(), vectors.T, strict=True):
        heavy = np.argsort(-np.abs(vector))
        turned = vector * (1.0 if vector[heavy[0]] > 0.0 else -1.0)
        weights = tuple((unknowns[i].name, float(turned[i])) for i in heavy if abs(turned[i]) > 0.2)
        found.append(Direction(weights, math.sqrt(max(0.0, variance))))
    return tuple(found)


def sentences(values: tuple[Value, ...], effect: Effect, felt: Array) -> tuple[str, ...]:
    """What is told and what is not, in words. `felt` (p,): shift at one prior standard deviation of each unknown."""
    said = []
    causes = [value for value, shift in zip(values, felt.tolist(), strict=True) if abs(shift) > FELT]
    alone = [each for each in causes if each.told and each.name != SOLVER]
    together = [each.name for each in causes if not each.told or each.name == SOLVER]
    if len(together) > 1:
        said.append(f"{_joined(together)} cannot be told apart here: the combined effect on the response is {effect}")
    else:
        said.append(f"the response lies {effect} from where it was designed")
    for each in alone:
        said.append(f"{each.name} is told by itself: {spoken(each)}, designed as {_amount(each.nominal, each.unit)}")
    for each in values:
        if each.outside:
            said.append(f"{each.name} may be outside its tolerance: {spoken(each)}")
    line = next((each for each in values if each.name == DELAY), None)
    if line is not None:
        mm = [1e3 * COAX_SPEED * part for part in (line.value, 0.5 * (line.high - line.low))]
        said.append(f"in front of the antenna lie {mm[0]:.1f} +- {mm[1]:.1f} mm of coax or as much delay")
    return tuple(said)


def spoken(value: Value) -> str:
    """The value with its interval and unit, such as "4.52 (4.31 to 4.73)"."""
    low, high = _amount(value.low, value.unit), _amount(value.high, value.unit)
    return f"{_amount(value.value, value.unit)} ({low} to {high})"


def _amount(value: float, unit: str) -> str:
    if unit == "m":
        return "0 m" if value == 0.0 else show(value, "length", 4)
    return f"{value:.4g}{f' {unit}' if unit else ''}"


def _joined(names: list[str]) -> str:
    return f"{', '.join(names[:-1])} and {names[-1]}"

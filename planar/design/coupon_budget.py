"""The uncertainty of a measured permittivity: what contributes, by how much, and how values are combined.

Every contribution is a standard uncertainty in units of eps_r; half-widths are divided by the root of three, as for
a uniform distribution. Contributions of one name are one cause: between values they share they add, all others add
as root of the sum of squares (Guide to the expression of uncertainty in measurement, JCGM 100:2008, 4.3.7, 5.1.2,
5.2.2).
"""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace

from planar.design.coupon_line import BareLine
from planar.units import show

COVERAGE = 2.0
"""Expanded uncertainties are this many standard uncertainties, about 95 %."""
UNIFORM = 1.0 / math.sqrt(3.0)
STATICS_ERROR, DISPERSION_ERROR = 0.002, 0.006
"""Fractions of eps_eff the published formulas are good to (Hammerstad & Jensen 1980; Kirschning & Jansen 1982)."""
CALIPER = 0.02e-3
"""m, half-width of a board thickness measured by the user (common practice, no source)."""
NOISE = "fit noise"


@dataclass(frozen=True)
class Contribution:
    """One cause of uncertainty: `standard` uncertainty in eps_r, `why` in words."""

    name: str
    standard: float
    why: str


@dataclass(frozen=True)
class Estimate:
    """A permittivity with what makes it uncertain."""

    eps_r: float
    contributions: tuple[Contribution, ...]

    @property
    def standard(self) -> float:
        """Standard uncertainty of eps_r, root of the sum of squares."""
        return math.sqrt(math.fsum(each.standard**2 for each in self.contributions))

    @property
    def uncertainty(self) -> float:
        """Expanded uncertainty of eps_r, k = 2."""
        return COVERAGE * self.standard

    def scaled(self, factor: float) -> Estimate:
        """Value and contributions times `factor`."""
        parts = tuple(replace(each, standard=factor * each.standard) for each in self.contributions)
        return Estimate(factor * self.eps_r, parts)


@dataclass(frozen=True)
class Tolerances:
    """Half-widths of what the board may differ in: slab `height` m with its reason, `etch` m per edge, `copper` as a
    fraction of its thickness."""

    height: float
    height_why: str
    etch: float
    copper: float


def geometry_contributions(
    invert: Callable[[BareLine], float], line: BareLine, tolerances: Tolerances
) -> tuple[Contribution, ...]:
    """What slab thickness, strip width and copper thickness add; `invert` gives eps_r as if the line were another."""
    at = invert(line)
    copper = line.conductor
    thicker = replace(line, height=line.height + 0.5 * tolerances.height)
    wider = replace(line, width=line.width + tolerances.etch)
    fuller = replace(line, conductor=replace(copper, thickness=copper.thickness * (1.0 + 0.5 * tolerances.copper)))
    # half the half-width is stepped, so that formulas stay within their range; both edges move by `etch`
    steps = (
        ("thickness", thicker, f"slab {tolerances.height_why}"),
        ("width", wider, f"strip {show(2.0 * tolerances.etch, 'length', 3)} wider or narrower, both edges together"),
        ("copper", fuller, f"copper {show(tolerances.copper, 'fraction', 2)} thicker or thinner"),
    )
    return tuple(Contribution(name, 2.0 * abs(invert(other) - at) * UNIFORM, why) for name, other, why in steps)


def formula_contribution(line: BareLine, eps_r: float, frequency: float) -> Contribution:
    """What the line formulas' own error adds."""
    slope = permittivity_slope(line, eps_r, frequency)
    error = math.hypot(STATICS_ERROR, DISPERSION_ERROR) * UNIFORM
    return Contribution(
        "formulas",
        error * slope * eps_r,
        "microstrip formulas good to 0.2 % in statics and 0.6 % in dispersion of the effective permittivity",
    )


def permittivity_slope(line: BareLine, eps_r: float, frequency: float) -> float:
    """Relative change of eps_r over that of eps_eff."""
    step = 1e-3
    low, high = (line.eps_eff(eps_r * factor, frequency) for factor in (1.0 - step, 1.0 + step))
    return 2.0 * step * 0.5 * (low + high) / (high - low)


def combined(estimates: Sequence[Estimate], own: frozenset[str]) -> Estimate:
    """The weighted mean of `estimates`; the contributions named in `own` are independent, all others common causes.

    Weights are the inverse squares of the independent parts.
    """
    parts = [math.fsum(c.standard**2 for c in each.contributions if c.name in own) for each in estimates]
    floor = 1e-12
    weights = [1.0 / max(part, floor) for part in parts]
    total = math.fsum(weights)
    weights = [weight / total for weight in weights]
    names: dict[str, tuple[float, str]] = {}
    for weight, each in zip(weights, estimates, strict=True):
        for c in each.contributions:
            before, why = names.get(c.name, (0.0, c.why))
            share = weight * c.standard
            names[c.name] = (math.hypot(before, share) if c.name in own else before + share, why)
    mean = math.fsum(weight * each.eps_r for weight, each in zip(weights, estimates, strict=True))
    return Estimate(mean, tuple(Contribution(name, standard, why) for name, (standard, why) in names.items()))


def inflation(residual: Sequence[complex]) -> float:
    """Factor on a standard uncertainty for residuals that are not white: sqrt((1 + r)/(1 - r)), r their lag-one
    correlation (0 to 0.95).

    Bartlett, J. Royal Stat. Soc. 98 (1935) 536 (from memory), for a first-order autoregressive residual.
    """
    before, after = residual[:-1], residual[1:]
    power = math.fsum(abs(value) ** 2 for value in residual)
    if not power or len(residual) < 3:
        return 1.0
    lagged = math.fsum((a.conjugate() * b).real for a, b in zip(before, after, strict=True)) / power
    r = min(max(lagged, 0.0), 0.95)
    return math.sqrt((1.0 + r) / (1.0 - r))

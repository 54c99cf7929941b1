"""From the ring's sweep to permittivities: which peak is which resonance, and the budget of each.

Every resonance is first looked for where the nominal laminate puts it, then all of them again about the clearest
one. Half the pull that the measured coupling allows is taken off, the other half is uncertainty.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass, replace

import numpy as np

from planar.design.coupon import Coupon, ExpectedResonance
from planar.design.coupon_budget import (
    NOISE,
    UNIFORM,
    Contribution,
    Estimate,
    Tolerances,
    formula_contribution,
    geometry_contributions,
    permittivity_slope,
)
from planar.design.coupon_files import Sweep, refused
from planar.design.coupon_line import BareLine
from planar.design.coupon_ring import LEAST_POINTS, FittedPeak, fit_peak
from planar.lines.ring_resonator import largest_pull
from planar.network.response import Response
from planar.units import SPEED_OF_LIGHT, show

SEARCH = 0.12
"""Half-width of the window in which the first resonance is looked for, as a fraction of frequency."""
SEARCH_NEXT = 0.03
"""The same for the others, once one is found."""
COARSEST = 0.5
"""Largest step of a sweep, in half-power widths of the resonance."""
CURVATURE_SHARE = 1.0 / 3.0
"""Half-width of the curvature correction, as a share of it (our estimate: planar model for a real fringing field)."""
LEAST_EXTERNAL_Q = 20.0
"""Stronger couplings are taken as this one: the pull is then of no use anyway."""
STEP = "frequency step"
"""Name of the contribution of the sweep's step."""


@dataclass(frozen=True)
class RingResonance:
    """A measured resonance: `frequency` Hz, loaded `q`, `unloaded_q`, peak |S| in dB, `pull` the fraction taken off for
    the gaps, and the permittivities that follow; `estimate` is of eps_r at `frequency`."""

    order: int
    frequency: float
    q: float
    unloaded_q: float
    height_db: float
    pull: float
    eps_eff: float
    estimate: Estimate


def ring_resonances(coupon: Coupon, sweep: Sweep, tolerances: Tolerances) -> tuple[RingResonance, ...]:
    """Every resonance of the ring that `sweep` shows; `FaultyInputError` for none or a sweep that cannot show any."""
    found = _peaks(coupon, sweep)
    return tuple(_resonance(coupon, sweep.response, order, peak, tolerances) for order, peak in found)


def _peaks(coupon: Coupon, sweep: Sweep) -> list[tuple[int, FittedPeak]]:
    """Order and fit of every peak: first each where the nominal laminate puts it, then each near the clearest one."""
    f = sweep.response.frequency
    listed = ", ".join(f"{show(r.frequency, 'frequency', 4)} (n = {r.order})" for r in coupon.resonances)
    inside = [r for r in coupon.resonances if f[0] < 0.98 * r.frequency and 1.02 * r.frequency < f[-1]]
    if not inside or len(f) < 2:
        span = f"{show(float(f[0]), 'frequency', 4)} to {show(float(f[-1]), 'frequency', 4)}"
        raise refused(sweep.path, "sweep", span, f"one that holds a resonance of the ring: {listed}")
    inside = _fine_enough(sweep, inside)
    first = [(r, _peak(coupon, sweep.response, r.order, r.frequency, min(SEARCH, 0.4 / r.order))) for r in inside]
    clear = [(r, peak) for r, peak in first if peak is not None]
    if not clear:
        near = ", ".join(show(r.frequency, "frequency", 4) for r in inside)
        expected = (
            f"a peak of |S21| (a dip of |S11| where one port) near {near}; is this the ring, both ends connected?"
        )
        raise refused(sweep.path, "resonances", "none", expected)
    anchor, strongest = max(clear, key=lambda pair: pair[1].significance)
    factor = strongest.frequency / anchor.frequency
    peaks = [(r, _peak(coupon, sweep.response, r.order, factor * r.frequency, SEARCH_NEXT)) for r in inside]
    return [(r.order, peak) for r, peak in peaks if peak is not None]


def _fine_enough(sweep: Sweep, resonances: list[ExpectedResonance]) -> list[ExpectedResonance]:
    """Those of the `resonances` across which the sweep has points enough; refused where there is none."""
    f = sweep.response.frequency

    def step(r: ExpectedResonance) -> float:
        near = f[(f > (1.0 - SEARCH) * r.frequency) & (f < (1.0 + SEARCH) * r.frequency)]
        return float(np.max(np.diff(near), initial=0.0)) if len(near) > LEAST_POINTS else math.inf

    fine = [r for r in resonances if step(r) <= COARSEST * r.frequency / r.q]
    if not fine:
        r = resonances[0]
        got = show(float(np.max(np.diff(f))), "frequency", 3)
        expected = (
            f"at most {show(COARSEST * r.frequency / r.q, 'frequency', 2)} near {show(r.frequency, 'frequency', 4)}"
        )
        raise refused(sweep.path, "frequency step", got, f"{expected}: sweep each resonance by itself")
    return fine


def _peak(coupon: Coupon, response: Response, order: int, expected: float, share: float) -> FittedPeak | None:
    """The resonance within `share` of `expected` Hz, the feeds' delay taken off."""
    f = response.frequency
    nominal = next(r for r in coupon.resonances if r.order == order)
    s = response.s[:, -1, 0]  # transmission of a two-port, reflection of a one-port
    delay = 2.0 * coupon.dimensions["feed_length"] * math.sqrt(nominal.eps_eff) / SPEED_OF_LIGHT
    turned = s * np.exp(2j * math.pi * f * delay)
    return fit_peak(f, turned, ((1.0 - share) * expected, (1.0 + share) * expected), nominal.q)


def _resonance(
    coupon: Coupon, response: Response, order: int, peak: FittedPeak, tolerances: Tolerances
) -> RingResonance:
    """A fitted peak as a permittivity, with its budget."""
    external = max(2.0 * peak.q / max(peak.height, 1e-6), LEAST_EXTERNAL_Q)
    pull = largest_pull(order, external)
    uncoupled = peak.frequency / (1.0 - 0.5 * pull)
    eps_eff, eps_r = coupon.ring.permittivities(order, uncoupled)
    parts = (
        *_ring_contributions(coupon, order, eps_r, uncoupled, tolerances.etch),
        *_peak_contributions(coupon, eps_r, peak, pull, float(np.median(np.diff(response.frequency)))),
        *geometry_contributions(_inversion(coupon, order, uncoupled), coupon.line, tolerances),
        formula_contribution(coupon.line, eps_r, uncoupled),
    )
    unloaded = 1.0 / max(1.0 / peak.q - response.s.shape[1] / external, 1e-9)
    height = 20.0 * math.log10(peak.height)
    estimate = Estimate(eps_r, parts)
    return RingResonance(order, peak.frequency, peak.q, unloaded, height, 0.5 * pull, eps_eff, estimate)


def _inversion(coupon: Coupon, order: int, frequency: float) -> Callable[[BareLine], float]:
    """eps_r from the uncoupled resonance at `frequency` Hz, as if the ring were of another line."""
    return lambda line: replace(coupon.ring, line=line).permittivities(order, frequency)[1]


def _gain(coupon: Coupon, eps_r: float, frequency: float) -> float:
    """eps_r per fraction of frequency or radius, whose square eps_eff follows."""
    return 2.0 * permittivity_slope(coupon.line, eps_r, frequency) * eps_r


def _peak_contributions(
    coupon: Coupon, eps_r: float, peak: FittedPeak, pull: float, step: float
) -> tuple[Contribution, ...]:
    """What the peak itself leaves open; `step` of the sweep in Hz."""
    gain = _gain(coupon, eps_r, peak.frequency)
    return (
        Contribution(NOISE, gain * peak.frequency_noise / peak.frequency, "residual of the fit"),
        Contribution(STEP, gain * 0.5 * step / peak.frequency * UNIFORM, "half a step of the sweep"),
        Contribution("gap", gain * 0.5 * pull * UNIFORM, "half the pull that the coupling allows, either way"),
    )


def _ring_contributions(
    coupon: Coupon, order: int, eps_r: float, frequency: float, etch: float
) -> tuple[Contribution, ...]:
    """What the ring's shape leaves open; `etch` m per edge."""
    ring, gain = coupon.ring, _gain(coupon, eps_r, frequency)
    bend = abs(ring.wavenumber(order, eps_r, frequency) * ring.electrical_radius / order - 1.0)
    slit = 0.5 * ring.slit / (2.0 * math.pi * ring.radius)
    return (
        Contribution("curvature", gain * bend * CURVATURE_SHARE * UNIFORM, "a third of the curvature correction"),
        Contribution("radius", gain * etch / ring.radius * UNIFORM, f"mean radius within {show(etch, 'length')}"),
        Contribution("slit", gain * slit * UNIFORM, "half the slit's length, either way"),
    )

"""From a measured coupon to the permittivity of the laminate, with its uncertainty.

A file that hardly transmits, or has one port, is the ring; two files that transmit are the two lines. Each resonance
and the line pair give a value of their own; all are taken to the middle of the design's band by the library's
dispersion times one factor, and combined. What does not look like a coupon is refused with the file's name.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass, replace
from pathlib import Path

import numpy as np

from planar.design.coupon import Coupon, eps_at
from planar.design.coupon_budget import (
    CALIPER,
    COVERAGE,
    NOISE,
    UNIFORM,
    Contribution,
    Estimate,
    Tolerances,
    combined,
    formula_contribution,
    geometry_contributions,
    permittivity_slope,
)
from planar.design.coupon_files import Sweep, delay, refused, sorted_sweeps
from planar.design.coupon_resonances import STEP, RingResonance, ring_resonances
from planar.design.coupon_two_lines import LineFit, LinePoint, fit_lines
from planar.errors import RangeError
from planar.network.response import Response
from planar.units import SPEED_OF_LIGHT, show

DELAYS = (0.7, 1.35)
"""Delay of the extra length over the nominal one outside which the files are not the coupon's lines."""
CONDUCTOR_SHARE = 0.4
"""Half-width of the computed conductor loss, as a share of it: published current factors differ by up to a third of it,
and thick strips lose up to 30 % less than any of them (our estimate)."""
LAUNCH_LENGTH = 0.1e-3
"""m, half-width of the length by which two soldered pairs of launches differ (common practice, no source)."""
THINNEST, THICKEST = 0.5, 1.5
"""Stated thickness over the nominal one outside which it is taken for a mistake."""
RING, LINES = "ring", "two lines"
OWN = frozenset({NOISE, STEP})
"""Contributions that each resonance has for itself."""
OWN_OF_METHOD = OWN | {"radius", "gap", "curvature", "slit", "length", "launches", "dispersion"}
"""Contributions that ring and lines do not share."""


@dataclass(frozen=True)
class LossTangent:
    """Loss tangent with its expanded uncertainty, k = 2, at `frequency` Hz."""

    tan_d: float
    uncertainty: float
    frequency: float


@dataclass(frozen=True)
class CouponMeasurement:
    """What the measurement says of the laminate.

    `estimate` is eps_r at `frequency` Hz, the middle of the design's band; `by_method` the same from ring and lines
    alone; `nominal` is what the library says there, with its `nominal_tolerance` as a fraction. `thickness` m is the
    one used. `tan_d` is None where it cannot be told from copper loss and noise.
    """

    estimate: Estimate
    frequency: float
    nominal: float
    nominal_tolerance: float
    by_method: tuple[tuple[str, Estimate], ...]
    resonances: tuple[RingResonance, ...]
    line_points: tuple[LinePoint, ...]
    tan_d: LossTangent | None
    thickness: float
    assumptions: tuple[str, ...]

    @property
    def eps_r(self) -> float:
        """Permittivity of the laminate."""
        return self.estimate.eps_r

    @property
    def uncertainty(self) -> float:
        """Expanded uncertainty of `eps_r`, k = 2, about 95 %."""
        return self.estimate.uncertainty


def measure_coupon(coupon: Coupon, files: Sequence[Path], *, thickness: float | None = None) -> CouponMeasurement:
    """Permittivity from Touchstone `files`: the ring (.s2p, or .s1p with its other connector open; one sweep over all
    resonances or one each), both lines (.s2p), or all of them, in any order.

    `thickness` is the measured thickness of the dielectric, m; None takes the nominal one with its tolerance. Raises
    `FaultyInputError` with file and what would be right, `RangeError` for a thickness that cannot be meant.
    """
    nominal = coupon.line.height
    if thickness is not None and not THINNEST * nominal <= thickness <= THICKEST * nominal:
        raise RangeError(
            f"thickness is {show(thickness, 'length')}, the coupon was drawn for {show(nominal, 'length')}: give "
            "that of the dielectric, without copper and mask"
        )
    measured = replace(coupon, line=replace(coupon.line, height=thickness or nominal))
    measured = replace(measured, ring=replace(coupon.ring, line=measured.line))
    tolerances = _tolerances(coupon, thickness)
    rings, lines = sorted_sweeps(files)
    notes = _assumptions(coupon, tolerances)
    methods: list[tuple[str, Estimate]] = []
    resonances: tuple[RingResonance, ...] = ()
    points: tuple[LinePoint, ...] = ()
    tan_d = None
    if rings:
        resonances = tuple(r for sweep in rings for r in ring_resonances(measured, sweep, tolerances))
        methods.append((RING, combined([_at_centre(coupon, r.estimate, r.frequency) for r in resonances], OWN)))
    if lines:
        fit, words = _line_fit(measured, (lines[0], lines[1]))
        tan_d, bound = _loss_tangent(measured, fit)
        methods.append((LINES, _at_centre(coupon, _line_estimate(measured, fit, tolerances), fit.middle)))
        points = fit.points
        notes += words + bound
    total = combined([estimate for _, estimate in methods], OWN_OF_METHOD)
    notes += _agreement(methods)
    return CouponMeasurement(
        total, coupon.centre, eps_at(coupon.laminate, coupon.centre)[0], coupon.laminate.eps_r_tolerance,
        tuple(methods), resonances, points, tan_d, measured.line.height, tuple(notes),
    )  # fmt: skip


def _tolerances(coupon: Coupon, thickness: float | None) -> Tolerances:
    copper = coupon.stackup.find("copper-top")
    share = copper.thickness_tolerance if copper is not None else 0.0
    if thickness is not None:
        why = f"measured {show(thickness, 'length')}, within {show(CALIPER, 'length')}"
        return Tolerances(CALIPER, why, coupon.fab.etch_tolerance, share)
    fraction = max(coupon.stackup.board_tolerance, coupon.stackup.substrate.thickness_tolerance)
    why = f"{show(coupon.line.height, 'length')} within {show(fraction, 'fraction', 3)}, not measured"
    return Tolerances(fraction * coupon.line.height, why, coupon.fab.etch_tolerance, share)


def _at_centre(coupon: Coupon, estimate: Estimate, frequency: float) -> Estimate:
    """The estimate at `frequency` Hz taken to the middle of the band by the library's dispersion."""
    factor = eps_at(coupon.laminate, coupon.centre)[0] / eps_at(coupon.laminate, frequency)[0]
    moved = estimate.scaled(factor)
    error = abs(factor - 1.0) * coupon.laminate.tan_d_tolerance * UNIFORM * moved.eps_r
    why = "the library's dispersion from where it was measured to the middle of the band, by its loss tangent"
    return replace(moved, contributions=(*moved.contributions, Contribution("dispersion", error, why)))


def _line_fit(coupon: Coupon, pair: tuple[Sweep, Sweep]) -> tuple[LineFit, list[str]]:
    """The fit of short and long line, and what was assumed. Raises `FaultyInputError` for two that do not belong."""
    short, long = (each.response for each in pair)
    names = f"{pair[0].path}, {pair[1].path}"
    if not np.array_equal(short.frequency, long.frequency) or short.z0 != long.z0:
        raise refused(names, "sweep", "two different ones", "the same frequencies and reference impedance in both")
    middle = coupon.phases[len(coupon.phases) // 2]
    expected = coupon.length_difference * math.sqrt(middle.eps_eff) / SPEED_OF_LIGHT
    later = delay(pair[1]) - delay(pair[0])
    if not DELAYS[0] * expected < later < DELAYS[1] * expected:
        right = f"about {expected * 1e9:.3f} ns between short and long line: is one of them another structure?"
        raise refused(names, "difference in delay", f"{later * 1e9:.3f} ns", right)
    words = []
    if all(not np.any(r.s[:, 0, 1]) and not np.any(r.s[:, 1, 1]) for r in (short, long)):
        short, long = _mirrored(short), _mirrored(long)
        words.append("S12 and S22 are empty in the files: the lines are mirror images of themselves, S11 and S21 do.")
    try:
        return fit_lines(short, long, coupon.line, coupon.length_difference, coupon.laminate.model), words
    except RangeError as error:
        raise refused(names, "sweep", "cannot be used", str(error)) from error


def _line_estimate(coupon: Coupon, fit: LineFit, tolerances: Tolerances) -> Estimate:
    """Permittivity at the frequency that carries the weight, with its budget."""
    eps_r = fit.scale * eps_at(coupon.laminate, fit.middle)[0]
    eps_eff = coupon.line.eps_eff(eps_r, fit.middle)
    gain = permittivity_slope(coupon.line, eps_r, fit.middle) * eps_r
    per_length = 2.0 * gain / coupon.length_difference * UNIFORM
    length, launches = per_length * tolerances.etch, per_length * LAUNCH_LENGTH
    contributions = (
        Contribution(NOISE, eps_r * fit.scale_noise / fit.scale, "residual of the fit"),
        Contribution("length", length, f"difference of the lines within {show(tolerances.etch, 'length')}"),
        Contribution("launches", launches, f"both pairs alike within {show(LAUNCH_LENGTH, 'length')} of line"),
        *geometry_contributions(lambda line: line.eps_r(eps_eff, fit.middle), coupon.line, tolerances),
        formula_contribution(coupon.line, eps_r, fit.middle),
    )
    return Estimate(eps_r, contributions)


def _loss_tangent(coupon: Coupon, fit: LineFit) -> tuple[LossTangent | None, list[str]]:
    """The loss tangent where it stands out from copper loss and noise, else a bound in words."""
    eps_r = fit.scale * eps_at(coupon.laminate, fit.middle)[0]
    copper = fit.conductor_share * _conductor_error(coupon, eps_r, fit.middle) * UNIFORM
    expanded = COVERAGE * math.hypot(fit.tan_d_noise, copper)
    if fit.tan_d > expanded:
        return LossTangent(fit.tan_d, expanded, fit.middle), []
    bound = max(fit.tan_d, 0.0) + expanded
    return None, [f"The loss tangent does not stand out from copper loss and noise: it is below {bound:.2g}."]


def _conductor_error(coupon: Coupon, eps_r: float, frequency: float) -> float:
    """Half-width of the computed conductor loss as a share of it: the formula's, and that of the foil's roughness."""
    conductor = coupon.line.conductor
    smooth = replace(coupon.line, conductor=replace(conductor, rq=0.0)).line(eps_r, 0.0, frequency).alpha_conductor
    rough = 1.0 - smooth / coupon.line.line(eps_r, 0.0, frequency).alpha_conductor
    return math.hypot(CONDUCTOR_SHARE, rough * coupon.laminate.roughness_tolerance)


def _mirrored(response: Response) -> Response:
    s = np.array(response.s)
    s[:, 0, 1], s[:, 1, 1] = s[:, 1, 0], s[:, 0, 0]
    return Response(response.frequency, s, response.z0)


def _agreement(methods: list[tuple[str, Estimate]]) -> list[str]:
    """One sentence on whether ring and lines agree within what they do not share."""
    if len(methods) < 2:
        return []
    (_, ring), (_, lines) = methods
    own = [
        math.sqrt(math.fsum(c.standard**2 for c in each.contributions if c.name in OWN_OF_METHOD))
        for each in (ring, lines)
    ]
    apart, limit = abs(ring.eps_r - lines.eps_r), COVERAGE * math.hypot(*own)
    verdict = "agree" if apart <= limit else "do NOT agree; look for a wrong file, a poor joint or a wrong thickness"
    return [f"Ring and lines are {apart:.3f} apart, {limit:.3f} is expected at most: they {verdict}."]


def _assumptions(coupon: Coupon, tolerances: Tolerances) -> list[str]:
    """What the result rests on, in words."""
    return [
        f"Uncertainties are expanded, k = {COVERAGE:g}, about 95 %.",
        f"Slab thickness: {tolerances.height_why}.",
        f"Permittivity over frequency follows the library's {coupon.laminate.key} times one factor.",
        "The value is that for a field across the board; along it a woven laminate may differ by several per cent.",
        "Lines and ring carry no solder mask; strip and radius are as drawn within the fab's etch tolerance.",
        "The files were calibrated at the connectors; what the launches add cancels or is far from a resonance.",
    ]

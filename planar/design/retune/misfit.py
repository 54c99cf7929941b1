"""When no plausible board explains a measurement, and why: said in the trade's words instead of an answer.

The order of suspicion: two dips where the board has one (current on the outside of the cable), an error that is the
same at all frequencies (calibration), then a file of something else. Two sweeps taken with the cable held differently
settle the first.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.optimize import least_squares
from scipy.special import chdtrc

from planar.design.retune.fit import Fit
from planar.design.retune.inference import line_starts
from planar.design.retune.sight import IN_FRONT
from planar.design.retune.sweep import Sweep
from planar.design.retune.unknowns import COAX_SPEED
from planar.errors import Finding, RangeError, Severity, SynthesisError
from planar.network.grade import grade
from planar.network.measured import Measured
from planar.units import show

Array = NDArray[np.float64]
Complex = NDArray[np.complex128]

FARTHEST = 4.0
"""Standard deviations of its prior beyond which a quantity is not plausible."""
LARGEST, DOUBTFUL = 0.06, 0.025
"""Rms residual of a reflection from which on a fit explains nothing, and from which on it is to be doubted."""
CROWD = 1e-6
"""Probability of a board as unusual in all its quantities together, below which it is not plausible."""
EXTRA = 3e-10
"""s, one way: how far the mean delay of an antenna's own reflection may be off."""
DIP = 0.12
"""Depth in reflection of a second dip to be taken for one."""
CONSTANT = 0.35
"""Of the residual that is left once a constant factor and offset are taken out, up to which it is calibration."""
EVALUATIONS = 60
"""Of a board with factor and offset at most."""
CABLE = 0.05
"""Difference of two sweeps, beyond their noise, from which on the cable is part of the antenna."""
CABLE_RULE = "cable"
CABLE_ADVICE = (
    "the cable is part of the antenna: put ferrites or a quarter-wave sleeve on it close to the board, or solder it "
    "where the loop has its voltage null, and measure again"
)


@dataclass(frozen=True)
class Comparison:
    """Two sweeps of one board: the largest `difference` of the reflection, `at` Hz, the `limit` it was held against."""

    difference: float
    at: float
    limit: float

    @property
    def finding(self) -> Finding:
        """What follows: a warning where the cable is part of the antenna, else a note."""
        got = f"{self.difference:.3f} at {show(self.at, 'frequency', 5)} between the sweeps"
        if self.difference > self.limit:
            return Finding(CABLE_RULE, "measurement", got, f"{self.limit:.3f}", CABLE_ADVICE)
        advice = "the sweeps agree: current on the cable is not what moved this board"
        return Finding(CABLE_RULE, "measurement", got, f"{self.limit:.3f}", advice, Severity.NOTE)


def compare_sweeps(first: Measured, second: Measured) -> Comparison:
    """Difference of two sweeps of one board with its cable held differently.

    Raises `RangeError` where they have no frequencies in common or other reference impedances.
    """
    one, other = first.response, second.response
    low, high = max(one.frequency[0], other.frequency[0]), min(one.frequency[-1], other.frequency[-1])
    inside = (one.frequency >= low) & (one.frequency <= high)
    if int(inside.sum()) < 3 or one.z0 != other.z0:
        raise RangeError("the two sweeps have no span or no reference impedance in common: sweep both alike")
    at = one.frequency[inside]
    there = np.interp(at, other.frequency, second.reflection.real) + 1j * np.interp(
        at, other.frequency, second.reflection.imag
    )
    apart = np.abs(_smoothed(first.reflection[inside] - there))
    noise = max(grade(each, (low, high)).noise for each in (first, second))
    worst = int(np.argmax(apart))
    return Comparison(float(apart[worst]), float(at[worst]), CABLE + 3.0 * noise)


def _smoothed(values: Complex) -> Complex:
    """Running mean of three."""
    padded = np.concatenate([values[:1], values, values[-1:]])
    result: Complex = (padded[:-2] + padded[1:-1] + padded[2:]) / 3.0
    return result


def check_plausible(fit: Fit, sweep: Sweep, noise: float) -> tuple[Finding, ...]:
    """Findings on the `fit` of a `sweep` with `noise`, rms.

    Raises `SynthesisError` where no plausible board explains it.
    """
    found = [*_implausible(fit), *_residual(fit, sweep, noise)]
    refused = tuple(each for each in found if each.severity is Severity.REFUSE)
    if refused:
        why = _why(fit, sweep)
        raise SynthesisError("no plausible board explains this measurement:", (*refused, why))
    return tuple(found)


def _implausible(fit: Fit) -> list[Finding]:
    z, unknowns = fit.estimate.z, fit.sight.unknowns
    found = []
    for each, away in zip(unknowns, z.tolist(), strict=True):
        if abs(away) > FARTHEST:
            limit = f"{FARTHEST:g} standard deviations from what is usual"
            found.append(Finding("plausible", each.name, f"{abs(away):.1f}", limit, "", Severity.REFUSE))
    crowd = float(chdtrc(len(z), float(z @ z)))
    if not found and crowd < CROWD:
        got, limit = f"one such board in {1.0 / max(crowd, 1e-12):.0e}", f"one in {1.0 / CROWD:.0e}"
        found.append(Finding("plausible", "all unknowns", got, limit, "", Severity.REFUSE))
    return found


def _residual(fit: Fit, sweep: Sweep, noise: float) -> list[Finding]:
    estimate = fit.estimate
    rms = float(np.sqrt(max(0.0, estimate.rms**2 - noise**2)))
    worst = int(np.argmax(np.abs(estimate.residual)))
    got = f"{rms:.3f} rms, most at {show(float(sweep.frequency[worst]), 'frequency', 4)}"
    if rms > LARGEST:
        return [Finding("residual", "reflection", got, f"{LARGEST:g}", "", Severity.REFUSE)]
    if rms > DOUBTFUL:
        why = _why(fit, sweep).advice
        return [Finding("residual", "reflection", got, f"{DOUBTFUL:g}", f"trust the advice less: {why}")]
    return []


def _why(fit: Fit, sweep: Sweep) -> Finding:
    """The usual cause of what is left."""
    measured, modelled = sweep.reflection, sweep.reflection + fit.estimate.residual
    line = _line_beyond(fit, sweep)
    if line is not None:
        return line
    dips, expected = _dips(measured), _dips(modelled)
    if len(dips) > max(1, len(expected)):
        got = " and ".join(show(float(sweep.frequency[place]), "frequency", 4) for place in dips)
        limit = f"{max(1, len(expected))} for this board"
        return Finding("dips", "reflection", got, limit, CABLE_ADVICE)
    if _calibrated_rms(fit, measured) < CONSTANT * max(fit.estimate.rms, LARGEST):
        advice = "calibrate again at the end of the cable in use; the error is the same at all frequencies"
        return Finding("calibration", "measurement", "a constant factor or offset explains it", "none", advice)
    advice = "is this the file of this board, over its band, with nothing but a short line in front?"
    return Finding("board", "measurement", "not this design's response", "that of the design", advice)


def _line_beyond(fit: Fit, sweep: Sweep) -> Finding | None:
    """A finding where the phase turns as behind a line much longer than what was taken as possible."""
    delay = fit.sight.unknowns[-IN_FRONT]
    bare = np.zeros(len(fit.sight.unknowns))
    bare[-IN_FRONT] = -delay.mean / delay.sd
    extra = 0.5 * (_mean_delay(sweep.frequency, sweep.reflection) - _mean_delay(sweep.frequency, fit.sight.seen(bare)))
    if abs(extra - delay.mean) <= FARTHEST * delay.sd + EXTRA:
        return None
    got = f"about {show(extra * COAX_SPEED, 'length', 2)} of coax" if extra > 0.0 else "less than nothing"
    longest = show((delay.mean + 2.0 * delay.sd) * COAX_SPEED, "length", 2)
    advice = "state the length of the line in front, or take it off with a short and an open measured at its end"
    return Finding("line in front", "measurement", got, f"up to {longest}", advice)


def _mean_delay(frequency: Array, reflected: Complex) -> float:
    """Mean round-trip delay, s, weighted with the size of the reflection."""
    turn, weight = np.angle(reflected[1:] * np.conj(reflected[:-1])), np.abs(reflected[1:] * reflected[:-1])
    return float(-np.sum(weight * turn) / np.sum(weight * np.diff(frequency)) / (2.0 * np.pi))


def _dips(reflected: Complex) -> list[int]:
    """Places of the dips of at least `DIP` on both sides, noise smoothed away."""
    size = np.abs(_smoothed(_smoothed(reflected)))
    found = []
    for place in range(1, len(size) - 1):
        if size[place] > min(size[place - 1], size[place + 1]) or size[place] == size[place - 1]:
            continue
        lower = np.flatnonzero(size < size[place])
        left = size[max(lower[lower < place], default=-1) + 1 : place].max(initial=0.0)
        right = size[place + 1 : min(lower[lower > place], default=len(size))].max(initial=0.0)
        if min(left, right) - size[place] >= DIP:
            found.append(place)
    return found


def _calibrated_rms(fit: Fit, measured: Complex) -> float:
    """Rms residual of the most probable board where the instrument may have a constant factor and offset; infinite
    where even so none is plausible."""
    count = len(fit.sight.unknowns)

    def off(place: Array) -> Complex:
        factor, offset = place[count:].view(np.complex128)
        left: Complex = factor * fit.sight.seen(place[:count]) + offset - measured
        return left

    def residuals(place: Array) -> Array:
        left = off(place)
        return np.concatenate([fit.whitener @ left.real, fit.whitener @ left.imag, place[:count]])

    starts = [np.concatenate([z, _dial(fit, z, measured)]) for z in line_starts(fit.sight)]
    start = min(starts, key=lambda place: float(np.linalg.norm(off(place))))
    found: Array = least_squares(residuals, start, max_nfev=EVALUATIONS).x
    far = bool(np.max(np.abs(found[:count])) > FARTHEST)
    return np.inf if far else float(np.sqrt(np.mean(np.abs(off(found)) ** 2)))


def _dial(fit: Fit, z: Array, measured: Complex) -> Array:
    """Real and imaginary part of the factor and of the offset (4,) that bring what is seen at `z` to `measured`."""
    table = np.column_stack([fit.sight.seen(z), np.ones_like(measured)])
    return np.asarray(np.linalg.lstsq(table, measured, rcond=None)[0].view(np.float64), dtype=np.float64)

"""From a wanted impedance to a width or a gap, and how far etch and laminate move the result.

Synthesis inverts the analysis numerically, so the two can never disagree: Brent's method on the
logarithm of the dimension, between the limits the analysis itself accepts. Sensitivities are central
differences of the same analysis, scaled to the steps fabs and laminate makers quote.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass, replace

from scipy.optimize import brentq

from planar.errors import RangeError, SynthesisError
from planar.lines.line import line_kind, wave
from planar.lines.records import Conductor, Line, Substrate
from planar.units import show

_TOLERANCE = 1e-13  # on the logarithm of the dimension
_STEP = 5e-4  # relative, half a central difference


@dataclass(frozen=True)
class Sensitivities:
    """How the impedance of a line moves, in ohm.

    `ohm_per_25_um_etch`: strips 25 um narrower than drawn, both edges together; where there is a gap
    it widens by the same 25 um, since the strips' outer edges recede too and their middles stay.
    `ohm_per_10_percent_height`: slab 10 % thicker. `ohm_per_1_percent_eps_r`: permittivity 1 %
    higher. All are slopes at the nominal line.
    """

    ohm_per_25_um_etch: float
    ohm_per_10_percent_height: float
    ohm_per_1_percent_eps_r: float


def width_for_impedance(
    kind: str,
    impedance: float,
    *,
    substrate: Substrate,
    conductor: Conductor,
    frequency: float,
    gap: float | None = None,
) -> Line:
    """The line of a `kind` (key of `LINES`) whose width gives `impedance` in ohm, analysed.

    `frequency` in Hz, `gap` in m where the kind has one. Relative error of the impedance below 1e-9.
    Raises `SynthesisError` with the impedances that can be reached if this one cannot, `RangeError` as
    the analysis.
    """
    row = line_kind(kind)
    limits = row.width_limits(gap, substrate, conductor, frequency)
    width = _solve(lambda each: row.wave(each, gap, substrate, conductor, frequency)[0], impedance, limits, "width")
    return row.analyse(width, gap, substrate, conductor, frequency)


def gap_for_impedance(
    kind: str, impedance: float, *, width: float, substrate: Substrate, conductor: Conductor, frequency: float
) -> Line:
    """The line of a `kind` with a gap whose gap gives `impedance` in ohm at a `width` in m, analysed.

    Arguments and errors as `width_for_impedance`.
    """
    row = line_kind(kind)
    if row.gap_limits is None:
        raise RangeError(f"{kind} has no gap")
    limits = row.gap_limits(width, substrate, conductor, frequency)
    gap = _solve(lambda each: row.wave(width, each, substrate, conductor, frequency)[0], impedance, limits, "gap")
    return row.analyse(width, gap, substrate, conductor, frequency)


def sensitivities(line: Line, *, substrate: Substrate, conductor: Conductor) -> Sensitivities:
    """Slopes of the impedance of `line` against etch, slab height and permittivity; see `Sensitivities`.

    `substrate` and `conductor` are those the line was analysed with. Raises `RangeError` as the analysis.
    """

    def impedance(width: float, gap: float | None, laminate: Substrate) -> float:
        return wave(line.kind, width, gap=gap, substrate=laminate, conductor=conductor, frequency=line.frequency)[0]

    def etched(by: float) -> float:
        gap = None if line.gap is None else line.gap + by
        return impedance(line.width - by, gap, substrate)

    def scaled(height: float, eps_r: float) -> float:
        laminate = replace(substrate, height=height * substrate.height, eps_r=eps_r * substrate.eps_r)
        return impedance(line.width, line.gap, laminate)

    etch = _STEP * min(line.width, line.gap or line.width)
    up, down = 1.0 + _STEP, 1.0 - _STEP
    return Sensitivities(
        ohm_per_25_um_etch=(etched(etch) - etched(-etch)) * 25e-6 / (2.0 * etch),
        ohm_per_10_percent_height=(scaled(up, 1.0) - scaled(down, 1.0)) * 0.10 / (2.0 * _STEP),
        ohm_per_1_percent_eps_r=(scaled(1.0, up) - scaled(1.0, down)) * 0.01 / (2.0 * _STEP),
    )


def _solve(impedance: Callable[[float], float], wanted: float, limits: tuple[float, float], dimension: str) -> float:
    """The dimension in m, within `limits`, at which the monotonic `impedance` is the `wanted` one."""
    low, high = limits
    if not 0.0 < low < high:
        raise SynthesisError(f"no {dimension} is within the range of the formulas for these other dimensions")
    ends = impedance(low), impedance(high)
    if not min(ends) <= wanted <= max(ends):
        raise SynthesisError(
            f"{wanted:.4g} ohm cannot be reached: {dimension}s of {show(low, 'length', 4)} to "
            f"{show(high, 'length', 4)} give {min(ends):.4g} to {max(ends):.4g} ohm"
        )
    root = brentq(
        lambda log: impedance(math.exp(log)) - wanted, math.log(low), math.log(high), xtol=_TOLERANCE, rtol=_TOLERANCE
    )
    return math.exp(root)

"""The ring's resonances in a measured sweep: centre, loaded Q and coupling of each, by a complex fit.

Near a resonance, transmission and reflection alike are a line in the complex plane over which a resonance circle is
laid: A/(1 + jQ(f/f0 - f0/f)) + b0 + b1 x, after the known delay of the feeds is taken off. A, b0 and b1 follow
linearly, so only f0 and Q are searched; the whole sweep round the resonance takes part, so noise averages.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.optimize import least_squares

from planar.design.coupon_budget import inflation

Array = NDArray[np.float64]
Complex = NDArray[np.complex128]

WIDTHS = 3.0
"""Half-width of the fitted window in half-power widths."""
LEAST_POINTS = 10
SIGNIFICANT = 6.0
"""Height of a peak in its own standard uncertainties below which it is noise."""
Q_RANGE = (4.0, 5000.0)
_GUESSES = (0.5, 1.0, 2.0)


@dataclass(frozen=True)
class FittedPeak:
    """A resonance: `frequency` Hz and loaded `q` with the standard uncertainty of the frequency, `height` of the
    peak or dip as |S|, and how many of its own standard uncertainties high it is."""

    frequency: float
    q: float
    frequency_noise: float
    height: float
    significance: float


def fit_peak(frequency: Array, s: Complex, window: tuple[float, float], q_guess: float) -> FittedPeak | None:
    """The strongest resonance of `s` (n,) over `frequency` (n,) Hz centred within `window` Hz; None for no clear one.

    `q_guess` is the expected loaded Q; half to twice of it are tried. `s` has the feeds' delay taken off.
    """
    best: tuple[float, float, float] | None = None
    for q in (guess * q_guess for guess in _GUESSES):
        centres = frequency[(frequency >= window[0]) & (frequency <= window[1])]
        for centre in centres[:: _stride(frequency, window, q)]:
            part = _near(frequency, float(centre), q)
            if part.sum() < LEAST_POINTS:
                continue
            height = _significance(frequency[part], s[part], float(centre), q)
            if best is None or height > best[0]:
                best = (height, float(centre), q)
    if best is None:
        return None
    peak: FittedPeak | None = None
    centre, q = best[1], best[2]
    for _ in range(2):  # the second time over the window that the fitted Q asks for
        part = _near(frequency, centre, q)
        if part.sum() < LEAST_POINTS:
            return None
        peak = _refined(frequency[part], s[part], centre, q)
        if peak is None or not window[0] <= peak.frequency <= window[1]:
            return None
        centre, q = peak.frequency, peak.q
    return peak if peak is not None and peak.significance > SIGNIFICANT else None


def _stride(frequency: Array, window: tuple[float, float], q: float) -> int:
    """Points from one centre tried to the next: a fifth of a half-power width."""
    width = 0.5 * (window[0] + window[1]) / q
    return max(1, int(0.2 * width / float(np.median(np.diff(frequency)))))


def _near(frequency: Array, centre: float, q: float) -> NDArray[np.bool_]:
    """Points within the fitted window."""
    inside: NDArray[np.bool_] = np.abs(frequency - centre) <= WIDTHS * centre / q
    return inside


def _columns(frequency: Array, centre: float, q: float) -> Complex:
    """Resonance, constant and slope, (n, 3)."""
    x = frequency / centre - centre / frequency
    return np.column_stack([1.0 / (1.0 + 1j * q * x), np.ones_like(x), x * q / WIDTHS]).astype(np.complex128)


def _linear(frequency: Array, s: Complex, centre: float, q: float) -> tuple[Complex, Complex]:
    """Coefficients and residual of the linear part."""
    columns = _columns(frequency, centre, q)
    found = np.asarray(np.linalg.lstsq(columns, s, rcond=None)[0], dtype=np.complex128)
    return found, s - columns @ found


def _significance(frequency: Array, s: Complex, centre: float, q: float) -> float:
    """Height of the resonance in its own standard uncertainties."""
    columns = _columns(frequency, centre, q)
    found, residual = _linear(frequency, s, centre, q)
    variance = float(np.sum(np.abs(residual) ** 2)) / max(1, len(s) - 3)
    spread = float(np.linalg.inv(columns.conj().T @ columns)[0, 0].real) * variance
    return abs(found[0]) / math.sqrt(spread) if spread > 0.0 else math.inf


def _refined(frequency: Array, s: Complex, centre: float, q: float) -> FittedPeak | None:
    q = min(max(q, Q_RANGE[0]), Q_RANGE[1])  # where the search starts must be allowed

    def residual(logs: Array) -> Array:
        left = _linear(frequency, s, centre * math.exp(logs[0]), q * math.exp(logs[1]))[1]
        return np.concatenate([left.real, left.imag])

    reach = WIDTHS / q
    limits = ([-reach, math.log(Q_RANGE[0] / q)], [reach, math.log(Q_RANGE[1] / q)])
    fit = least_squares(residual, [0.0, 0.0], bounds=limits, x_scale=[1.0 / q, 1.0])
    f0, loaded = centre * math.exp(fit.x[0]), q * math.exp(fit.x[1])
    found, left = _linear(frequency, s, f0, loaded)
    freedom = max(1, 2 * len(s) - 8)
    normal = fit.jac.T @ fit.jac
    if not np.linalg.cond(normal) < 1e14:
        return None
    spread = float(np.linalg.inv(normal)[0, 0]) * float(np.sum(np.abs(left) ** 2)) / freedom
    noise = f0 * math.sqrt(spread) * inflation(left.tolist())
    return FittedPeak(f0, loaded, noise, abs(complex(found[0])), _significance(frequency, s, f0, loaded))

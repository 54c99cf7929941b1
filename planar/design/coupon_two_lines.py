"""Two lines of different length between the same launches: propagation constant, permittivity and loss.

T_long T_short^-1 is similar to the transmission matrix of the extra length alone, whatever the launches are: its
eigenvalues are exp(-+ gamma dl), its trace 2 cosh(gamma dl) (Marks, IEEE Trans. MTT-39 (1991) 1205; Lee & Nam,
Electron. Lett. 32 (1996) 1207, both from memory). The laminate's permittivity and loss tangent are fitted to the
trace over the whole sweep, so no phase has to be unwrapped and lengths of half a wave do no harm.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.optimize import least_squares

from planar.design.coupon_budget import inflation
from planar.design.coupon_line import BareLine
from planar.errors import RangeError
from planar.library import WidebandDebye
from planar.lines.records import DB_PER_NEPER
from planar.network.response import Response
from planar.units import SPEED_OF_LIGHT

Array = NDArray[np.float64]
Complex = NDArray[np.complex128]

SCALES = (0.6, 1.6)
"""Permittivity over that of the library within which the fit searches."""
_SCAN, _SCAN_POINTS = 100, 41
LEAST_PHASE = 0.5
"""rad the extra length must turn at the top of the sweep."""
LEAST_POINTS = 10


@dataclass(frozen=True)
class LinePoint:
    """The line at one measured frequency, Hz: `eps_eff` and `loss_db_per_m` from the eigenvalue."""

    frequency: float
    eps_eff: float
    loss_db_per_m: float


@dataclass(frozen=True)
class LineFit:
    """What the fit gave: permittivity times the library's (`scale`) and `tan_d`, each with its standard fit noise.

    `middle` Hz is the frequency that carries the weight, `conductor_share` the loss tangent that the conductor loss
    would look like there, `points` the line over frequency.
    """

    scale: float
    scale_noise: float
    tan_d: float
    tan_d_noise: float
    middle: float
    conductor_share: float
    points: tuple[LinePoint, ...]


def extra_length(short: Response, long: Response) -> Complex:
    """exp(+-gamma dl) as the pair of eigenvalues (n, 2) of T_long T_short^-1 at every frequency."""
    found = np.linalg.eigvals(_transmission(long.s) @ np.linalg.inv(_transmission(short.s)))
    return np.asarray(found, dtype=np.complex128)


def fit_lines(short: Response, long: Response, line: BareLine, difference: float, model: WidebandDebye) -> LineFit:
    """Permittivity and loss tangent of the laminate under two lines that differ by `difference` m.

    `short` and `long` are two-ports at the same frequencies; eps_r(f) is taken to be `model` times one factor, the
    loss tangent constant, the conductor loss that of our formulas. Raises `RangeError` where the sweep has too few
    points the formulas cover or ends before the extra length turns `LEAST_PHASE`.
    """
    kept = [i for i, f in enumerate(short.frequency) if _covered(line, model, float(f))]
    if len(kept) < LEAST_POINTS:
        raise RangeError(f"{len(kept)} frequencies the formulas cover, at least {LEAST_POINTS} are needed")
    frequency = short.frequency[kept]
    permittivity = model.permittivity(frequency)
    extra = _ExtraLength.of(line, difference, frequency, permittivity.real)
    tan_d = float(np.mean(-permittivity.imag / permittivity.real))
    if float(extra.exponent(1.0, tan_d)[-1].imag) < LEAST_PHASE:
        raise RangeError("the sweep ends where the extra length turns less than 30 degrees; sweep higher")
    values = extra_length(short, long)[kept]
    half_trace = 0.5 * values.sum(axis=1)
    weight = np.abs(short.s[kept, 1, 0] * long.s[kept, 1, 0])

    def residual(unknowns: Array, stride: int = 1) -> Complex:
        expected = np.cosh(extra.every(stride).exponent(math.exp(unknowns[0]), unknowns[1]))
        left: Complex = weight[::stride] * (half_trace[::stride] - expected)
        return left

    stride = max(1, len(frequency) // _SCAN_POINTS)
    logs = np.linspace(math.log(SCALES[0]), math.log(SCALES[1]), _SCAN)
    start = min(logs, key=lambda log: float(np.sum(np.abs(residual(np.array([log, tan_d]), stride)) ** 2)))
    fit = least_squares(lambda unknowns: _split(residual(unknowns)), [float(start), tan_d], x_scale=0.01, method="lm")
    left = residual(fit.x)
    variance = float(np.sum(np.abs(left) ** 2)) / max(1, 2 * len(left) - 2)
    noise = np.sqrt(np.diag(np.linalg.inv(fit.jac.T @ fit.jac)) * variance) * inflation(left.tolist())
    scale = math.exp(fit.x[0])
    points = _points(frequency, values, extra.exponent(scale, max(float(fit.x[1]), 0.0)), difference)
    middle = float(np.sqrt(np.average(frequency**2, weights=weight**2)))
    return LineFit(
        scale, scale * float(noise[0]), float(fit.x[1]), float(noise[1]), middle, extra.conductor_share, points
    )


@dataclass(frozen=True)
class _ExtraLength:
    """The extra length by formulas: `nominal` permittivity and `conductor` attenuation in Np/m at each `frequency`."""

    line: BareLine
    difference: float
    frequency: Array
    nominal: Array
    conductor: Array

    @classmethod
    def of(cls, line: BareLine, difference: float, frequency: Array, nominal: Array) -> _ExtraLength:
        at = zip(nominal.tolist(), frequency.tolist(), strict=True)
        conductor = np.array([line.line(eps, 0.0, f).alpha_conductor for eps, f in at])
        return cls(line, difference, frequency, nominal, conductor)

    def every(self, stride: int) -> _ExtraLength:
        """Every `stride`-th frequency."""
        parts = (each[::stride] for each in (self.frequency, self.nominal, self.conductor))
        return _ExtraLength(self.line, self.difference, *parts)

    def exponent(self, scale: float, tan_d: float) -> Complex:
        """gamma dl (n,) on a laminate of `scale` times the nominal permittivity."""
        wavenumber, dielectric = self._wave(scale)
        exponent = (self.conductor + tan_d * dielectric + 1j * wavenumber) * self.difference
        return np.asarray(exponent, dtype=np.complex128)

    @property
    def conductor_share(self) -> float:
        """Loss tangent whose attenuation is nearest to the conductor's."""
        dielectric = self._wave(1.0)[1]
        return float(np.sum(self.conductor * dielectric) / np.sum(dielectric**2))

    def _wave(self, scale: float) -> tuple[Array, Array]:
        """Wave number in rad/m and dielectric attenuation in Np/m for a loss tangent of 1.

        The latter as `planar.lines.microstrip.dielectric_loss`, for arrays.
        """
        eps = scale * self.nominal
        at = zip(eps.tolist(), self.frequency.tolist(), strict=True)
        eps_eff = np.array([self.line.eps_eff(each, f) for each, f in at])
        wavenumber = 2.0 * math.pi * self.frequency / SPEED_OF_LIGHT * np.sqrt(eps_eff)
        return wavenumber, 0.5 * wavenumber * eps * (eps_eff - 1.0) / ((eps - 1.0) * eps_eff)


def _covered(line: BareLine, model: WidebandDebye, frequency: float) -> bool:
    """Whether the formulas hold at `frequency` for every permittivity that is searched."""
    try:
        for scale in SCALES:
            line.line(scale * model.permittivity(frequency).real, 0.0, frequency)
    except RangeError:
        return False
    return True


def _transmission(s: Complex) -> Complex:
    """Cascadable matrices of two-ports, (n, 2, 2): wave out of and into port 1 from those of port 2."""
    s11, s12, s21, s22 = s[:, 0, 0], s[:, 0, 1], s[:, 1, 0], s[:, 1, 1]
    rows = [[s12 * s21 - s11 * s22, s11], [-s22, np.ones_like(s21)]]
    result: Complex = np.moveaxis(np.array(rows), -1, 0) / s21[:, None, None]
    return result


def _split(values: Complex) -> Array:
    return np.concatenate([values.real, values.imag])


def _points(frequency: Array, values: Complex, expected: Complex, difference: float) -> tuple[LinePoint, ...]:
    """Each frequency's eigenvalue nearest the fit, as a line."""
    pairs = np.stack([1.0 / values, values], axis=-1).reshape(len(values), -1)
    nearest = np.argmin(np.abs(pairs - np.exp(expected)[:, None]), axis=1)
    log = np.log(pairs[np.arange(len(values)), nearest])
    turns = np.round((expected.imag - log.imag) / (2.0 * math.pi))
    phase = log.imag + 2.0 * math.pi * turns
    eps_eff = (phase * SPEED_OF_LIGHT / (2.0 * math.pi * frequency * difference)) ** 2
    loss = DB_PER_NEPER * log.real / difference
    return tuple(LinePoint(float(f), float(e), float(a)) for f, e, a in zip(frequency, eps_eff, loss, strict=True))

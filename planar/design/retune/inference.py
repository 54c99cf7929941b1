"""The most probable board and line for a measured reflection, and how far that is told.

Maximum a posteriori: least squares of whitened residuals and of the unknowns in standard deviations of their priors, by
damped Gauss-Newton steps (Levenberg 1944, Marquardt 1963) from several lengths of line, because a phase repeats. The
posterior is taken as normal with the inverse of the Gauss-Newton matrix as covariance (Tarantola, Inverse Problem
Theory, SIAM 2005, section 3.4).
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from planar.design.retune.sight import IN_FRONT, Sight

Array = NDArray[np.float64]
Complex = NDArray[np.complex128]

LEAST_NOISE = 5e-4
"""Rms of a reflection: no instrument does better (common practice, no source)."""
CALIBRATION = 0.005
"""Smooth rms error of a reflection, -46 dB: what a calibration and the solver leave (common practice, no source)."""
CORRELATION = 0.06
"""Of the frequency, over which errors of model and calibration stay alike."""
FIRST_STEPS, STEPS, DONE = 6, 40, 1e-4
"""Steps from every start, and from the best few; length of a step in standard deviations that ends them."""
TURNS = 6
"""Starts for each turn of the phase that the line's unknown length allows."""
REACH = 2.2
"""Standard deviations of the line's length within which starts lie."""
FINALISTS = 3


@dataclass(frozen=True)
class Doubt:
    """What the measurement and the model are off: white `noise` and a smooth error `model`, rms of a reflection."""

    noise: float
    model: float

    @classmethod
    def of(cls, noise: float, model: float) -> Doubt:
        """Doubt with the `noise` of the sweep and the `model` error, and with what a calibration leaves."""
        return cls(max(noise, LEAST_NOISE), math.hypot(model, CALIBRATION))

    def whitener(self, frequency: Array) -> Array:
        """Matrix (m, m) that makes the errors of real or imaginary part at `frequency` (m,) Hz white, of size one.

        The smooth error has a Gaussian correlation over `CORRELATION` of the frequency.
        """
        apart = np.log(frequency[:, None] / frequency[None, :]) / CORRELATION
        alike = np.exp(-0.5 * apart**2)
        covariance = 0.5 * (self.model**2 * alike + self.noise**2 * np.eye(len(frequency)))
        return np.asarray(np.linalg.inv(np.linalg.cholesky(covariance)), dtype=np.float64)


@dataclass(frozen=True, eq=False)
class Estimate:
    """The most probable unknowns `z` (p,) in standard deviations from their means, their posterior `covariance` (p, p),
    the `residual` (m,) of the reflection, and the whitened `misfit` (its sum of squares) over `freedom`."""

    z: Array
    covariance: Array
    residual: Complex
    misfit: float
    freedom: float

    @property
    def reduced(self) -> float:
        """Misfit for each degree of freedom: about 1 where errors are as expected."""
        return self.misfit / self.freedom

    @property
    def rms(self) -> float:
        """Root mean square of the residual."""
        return float(np.sqrt(np.mean(np.abs(self.residual) ** 2)))

    @property
    def cost(self) -> float:
        """Misfit and what the priors charge."""
        return self.misfit + float(self.z @ self.z)


@dataclass(frozen=True, eq=False)
class _Task:
    """Residuals of a measured reflection at `z`, with the bounds and the whitening."""

    sight: Sight
    reflection: Complex
    whitener: Array
    lowest: Array

    def residuals(self, z: Array) -> Array:
        """Whitened, real parts first, (2 m,)."""
        return self._white(self.sight.seen(z) - self.reflection)

    def both(self, z: Array) -> tuple[Array, Array]:
        """Residuals (2 m,) and their derivatives (2 m, p)."""
        seen, slopes, _ = self.sight.slopes(z)
        return self._white(seen - self.reflection), self._white(slopes)

    def _white(self, values: Complex) -> Array:
        return np.concatenate([self.whitener @ values.real, self.whitener @ values.imag])

    def improved(self, z: Array, steps: int) -> tuple[Array, float]:
        """The place reached from `z` in at most `steps`, and its cost."""
        damping = 1e-2
        residual, slopes = self.both(z)
        cost = float(residual @ residual + z @ z)
        for _ in range(steps):
            matrix = slopes.T @ slopes + (1.0 + damping) * np.eye(len(z))
            step = -np.linalg.solve(matrix, slopes.T @ residual + z)
            there = np.maximum(z + step, self.lowest)
            moved = self.residuals(there)
            cost_there = float(moved @ moved + there @ there)
            if not cost_there < cost:
                damping *= 8.0
                if damping > 1e8:
                    break
                continue
            length = float(np.max(np.abs(there - z)))
            z, cost, damping = there, cost_there, max(1e-6, 0.2 * damping)
            residual, slopes = self.both(z)
            if length < DONE:
                break
        return z, cost


def estimated(sight: Sight, reflection: Complex, whitener: Array, start: Array | None = None) -> Estimate:
    """The most probable unknowns of `sight` for a measured `reflection` (m,), from `start` (p,) or from all lengths of
    line. `whitener` (m, m) by `Doubt`."""
    lowest = np.array([(each.least - each.mean) / each.sd for each in sight.unknowns])
    task = _Task(sight, reflection, whitener, lowest)
    starts = line_starts(sight) if start is None else [start]
    tried = sorted((task.improved(each, FIRST_STEPS) for each in starts), key=lambda each: each[1])
    finished = [task.improved(z, STEPS) for z, _ in tried[:FINALISTS]]
    z = min(finished, key=lambda each: each[1])[0]
    residual, slopes = task.both(z)
    information = slopes.T @ slopes
    covariance: Array = np.asarray(np.linalg.inv(information + np.eye(len(z))), dtype=np.float64)
    told = float(np.trace(covariance @ information))
    free = max(1.0, len(residual) - told)
    return Estimate(z, covariance, sight.seen(z) - reflection, float(residual @ residual), free)


def line_starts(sight: Sight) -> list[Array]:
    """Means of everything (p,), with lengths of line a sixth of a turn of the phase apart."""
    delay = sight.unknowns[-IN_FRONT]
    shortest = max(-REACH, -delay.mean / delay.sd)
    turns = 2.0 * float(np.mean(sight.frequency)) * (REACH - shortest) * delay.sd
    count = max(1, math.ceil(TURNS * turns))
    places = np.linspace(shortest, REACH, count) if count > 1 else np.zeros(1)
    starts = []
    for place in places.tolist():
        z = np.zeros(len(sight.unknowns))
        z[-IN_FRONT] = place
        starts.append(z)
    return starts

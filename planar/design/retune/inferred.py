"""The built board as a measurement shows it: the inference carried through, with the solver asked at the answer.

The second-order model finds the most probable board; the board found is solved exactly, the model is set right there,
and the fit is repeated until the two agree.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from planar.design.retune.board_model import BoardModel, reflections_of
from planar.design.retune.fit import Fit, fitted
from planar.design.retune.misfit import check_plausible
from planar.design.retune.moving import response_shift, shift_slopes
from planar.design.retune.sight import Sight
from planar.design.retune.sweep import Sweep, swept
from planar.design.retune.told import Direction, Effect, Value, directions, inferred_values, sentences
from planar.design.retune.unknowns import Plane
from planar.errors import Finding
from planar.network.grade import Grade
from planar.network.measured import Measured

Array = NDArray[np.float64]
Complex = NDArray[np.complex128]


@dataclass(frozen=True, eq=False)
class Inferred:
    """The most probable built board of `model` for a `sweep`.

    `here` (j,) are the board's terms, the solver's own error of frequency in them. `effect` is the shift of the
    response from the design, `values` are all unknowns, `felt` (p,) the shift at one standard deviation of each, `said`
    what is told and what is not, in words.
    """

    model: BoardModel
    sweep: Sweep
    fit: Fit
    here: Complex
    effect: Effect
    values: tuple[Value, ...]
    felt: Array
    directions: tuple[Direction, ...]
    said: tuple[str, ...]
    findings: tuple[Finding, ...]

    @property
    def deviations(self) -> Array:
        """Of the board's quantities over their scales, (d,)."""
        return self.fit.sight.deviations(self.fit.estimate.z)

    @property
    def seen(self) -> Complex:
        """What the instrument would see of the board found, (m,)."""
        return self.fit.sight.seen(self.fit.estimate.z)

    @property
    def antenna(self) -> Complex:
        """The measured reflection (m,) behind the line and launch found, against the design's reference."""
        return self.fit.sight.bare(self.sweep.reflection, self.fit.estimate.z)

    def drawn(self, samples: int, seed: int) -> Complex:
        """Terms (samples, j) of boards drawn from the posterior with `seed`, as `here`."""
        rng, sight, z = np.random.default_rng(seed), self.fit.sight, self.fit.estimate.z
        root = np.linalg.cholesky(self.fit.estimate.covariance + 1e-12 * np.eye(len(z)))
        drawn = z + rng.standard_normal((samples, len(z))) @ root.T
        deviations = np.array([sight.deviations(each) for each in drawn])
        solver = len(self.model.question.quantities)
        offsets = drawn[:, solver] * sight.unknowns[solver].sd
        return _offset(self.model, self.fit.surface.at(deviations), offsets)


def inferred(model: BoardModel, measured: Measured, graded: Grade, plane: Plane) -> Inferred:
    """The most probable board behind a `measured` reflection, `graded`, with what is known of the `plane`.

    Raises `RangeError` for too few points, and `SynthesisError` where no plausible board explains the measurement.
    """
    sweep = swept(measured, model.grid)
    fit = fitted(model, sweep, plane, graded.noise)
    found = check_plausible(fit, sweep, graded.noise)
    return _told(model, sweep, fit, found)


def _told(model: BoardModel, sweep: Sweep, fit: Fit, found: tuple[Finding, ...]) -> Inferred:
    grid, count, sight, estimate = model.grid, len(model.grid), fit.sight, fit.estimate
    nominal, z = model.designed[:count], fit.estimate.z
    board = (grid, reflections_of(fit.surface, count), sight.reference)
    on_grid = Sight.at(grid, sweep.z0, board=board, unknowns=sight.unknowns)
    antenna = on_grid.antenna(z)
    moved = response_shift(grid, nominal, antenna)
    slopes = shift_slopes(grid, nominal, antenna, on_grid.board_slopes(z))
    effect = Effect(moved, float(np.sqrt(slopes @ estimate.covariance @ slopes)))
    alone, felt = _each_alone(model, sight, z)
    values = inferred_values(sight.unknowns, estimate, alone)
    place = sight.deviations(z)
    here = _offset(model, fit.surface.at(place[None, :]), np.array([values[len(place)].value]))[0]
    said = sentences(values, effect, felt)
    told = directions(sight.unknowns, estimate)
    return Inferred(model, sweep, fit, here, effect, values, felt, told, said, found)


def _each_alone(model: BoardModel, sight: Sight, z: Array) -> tuple[Array, Array]:
    """Shift by each unknown alone at its value from nominal, and at one standard deviation (p,); 0 in front."""
    count, place = len(model.grid), sight.deviations(z)
    nominal = model.surface.nominal[:count]
    alone, felt = np.zeros(len(z)), np.zeros(len(z))
    for number, unknown in enumerate(sight.unknowns[: len(place)]):
        for into, deviation in ((alone, place[number]), (felt, unknown.sd / unknown.scale)):
            terms = model.surface.at(deviation * np.eye(len(place))[[number]])[0, :count]
            into[number] = response_shift(model.grid, nominal, terms)
    solver = sight.unknowns[len(place)]
    alone[len(place)], felt[len(place)] = solver.value(float(z[len(place)])), solver.sd
    return alone, felt


def _offset(model: BoardModel, terms: Complex, offsets: Array) -> Complex:
    """`terms` (n, j) with their reflections moved up in frequency by the fractions `offsets` (n,)."""
    grid, count = model.grid, len(model.grid)
    reflected = terms[:, :count]
    slope = np.gradient(reflected, grid, axis=1, edge_order=2) * grid
    result: Complex = np.concatenate([reflected - offsets[:, None] * slope, terms[:, count:]], axis=1)
    return result

"""The fit carried through: the most probable board on the model, solved exactly, the model set right, fitted anew.

Two or three rounds and the board found is one the solver itself has seen.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from planar.design.retune.board_model import BoardModel
from planar.design.retune.inference import Doubt, Estimate, estimated
from planar.design.retune.sight import Sight
from planar.design.retune.sweep import Sweep
from planar.design.retune.unknowns import Plane, board_unknowns, other_unknowns
from planar.design.spread_model import SurfaceModel

Array = NDArray[np.float64]

FINER = 0.5
"""Error of the fine mesh over its difference from the one half again as coarse: an error of first to second order."""
HOPELESS, OUTLANDISH = 0.15, 6.0
"""Rms residual of a fit, and largest deviation in standard deviations, from which on no board is worth solving."""
ROUNDS, AGREED = 3, 0.002
"""Times the board found is solved exactly, and the rms difference of reflection that needs no other time."""


@dataclass(frozen=True, eq=False)
class Fit:
    """Where the rounds ended: the `sight` and its `estimate`, the `surface` set right there, the `whitener` (m, m) of
    the errors and how many `boards` were solved."""

    sight: Sight
    whitener: Array
    estimate: Estimate
    surface: SurfaceModel
    boards: int


def fitted(model: BoardModel, sweep: Sweep, plane: Plane, noise: float) -> Fit:
    """The most probable board, solved exactly and fitted anew until both agree; plausible or not."""
    unknowns = (*board_unknowns(model.question.quantities), *other_unknowns(plane, model.solver_shift))
    reference = model.choices.brief.target.impedance
    sight = Sight.at(sweep.frequency, sweep.z0, board=(model.grid, model.reflections, reference), unknowns=unknowns)
    whitener = Doubt.of(noise, FINER * model.mesh_error).whitener(sweep.frequency)
    estimate = estimated(sight, sweep.reflection, whitener)
    surface, boards, count = model.surface, 0, len(model.grid)
    for _ in range(ROUNDS):
        if estimate.rms > HOPELESS or np.max(np.abs(estimate.z)) > OUTLANDISH:
            break
        place = sight.deviations(estimate.z)
        exact = model.exact(place)
        if exact is None:
            break
        boards += 1
        off = exact - surface.at(place[None, :])[0]
        surface = surface.on(surface.nominal + off)
        sight = sight.on(surface.nominal[:count])
        estimate = estimated(sight, sweep.reflection, whitener, estimate.z)
        if float(np.sqrt(np.mean(np.abs(off[:count]) ** 2))) < AGREED:
            break
    return Fit(sight, whitener, estimate, surface, boards)

"""What an instrument would see of a board: the second-order model of the board behind a line and a launch.

Unknowns are counted in standard deviations from their means. The board's terms are carried from the model's few
frequencies to the measured ones by a cubic spline, its slope and bend with them, so that an error of the solver in
frequency moves the whole curve. Derivatives are exact in the board and differences in what lies in front.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray
from scipy.interpolate import CubicSpline

from planar.design.retune.unknowns import Unknown
from planar.design.spread_model import SurfaceModel
from planar.network.plane import Launch

Array = NDArray[np.float64]
Complex = NDArray[np.complex128]

STEP = 1e-6
"""Of a standard deviation, of a reflection: differences for derivatives."""
IN_FRONT = 4
"""Unknowns of the line and the launch: the last ones. The one before is the solver's frequency."""


@dataclass(frozen=True, eq=False)
class Sight:
    """`model` of the board's reflections against `reference` ohm at `grid` (j,) Hz, seen at `frequency` (m,) Hz by an
    instrument of `z0` ohm; `unknowns` (p,) are those of the board, of the solver and of what lies in front."""

    unknowns: tuple[Unknown, ...]
    grid: Array
    model: SurfaceModel
    reference: float
    frequency: Array
    z0: float
    loss_at: float
    _parts: tuple[SurfaceModel, SurfaceModel, SurfaceModel]

    @classmethod
    def at(
        cls, frequency: Array, z0: float, *, board: tuple[Array, SurfaceModel, float], unknowns: tuple[Unknown, ...]
    ) -> Sight:
        """The view at `frequency` (m,) Hz of a `board`: grid (j,) Hz, model of reflections there, reference in ohm."""
        grid, model, reference = board
        middle = float(np.mean(grid))
        return cls(unknowns, grid, model, reference, frequency, z0, middle, _carried(grid, model, frequency))

    def on(self, nominal: Complex) -> Sight:
        """The same with other `nominal` reflections (j,) of the board."""
        model = self.model.on(nominal)
        return replace(self, model=model, _parts=_carried(self.grid, model, self.frequency))

    def deviations(self, z: Array) -> Array:
        """Deviations (d,) of the board's quantities over their scales at `z` (p,)."""
        board = self.unknowns[: -1 - IN_FRONT]
        return np.array([each.deviation(place) for each, place in zip(board, z.tolist(), strict=False)])

    def launch(self, z: Array) -> Launch:
        """The line and launch at `z` (p,)."""
        delay, loss, inductance, capacitance = (
            each.value(place) for each, place in zip(self.unknowns[-IN_FRONT:], z[-IN_FRONT:].tolist(), strict=True)
        )
        return Launch(delay, loss, self.loss_at, inductance, capacitance)

    def antenna(self, z: Array) -> Complex:
        """Reflection (m,) of the board itself against its own reference, the solver's error of frequency in it."""
        return self._antenna(self.deviations(z), self._offset(z))

    def seen(self, z: Array) -> Complex:
        """Reflection (m,) the instrument sees."""
        return self._in_front(z, self.antenna(z))

    def bare(self, seen: Complex, z: Array) -> Complex:
        """The board's own reflection (m,) behind the line and launch of `z` from what an instrument has `seen`."""
        return renormalised(self.launch(z).removed(self.frequency, seen, self.z0), self.z0, self.reference)

    def slopes(self, z: Array) -> tuple[Complex, Complex, Complex]:
        """What is seen (m,), its derivatives (m, p), and those of the board's own reflection (m, p)."""
        board = self.board_slopes(z)
        here = self.antenna(z)
        seen = self._in_front(z, here)
        through = (self._in_front(z, here + STEP) - seen) / STEP  # one complex number a frequency: it is analytic
        total = through[:, None] * board
        for column in range(len(z) - IN_FRONT, len(z)):
            moved = z.copy()
            moved[column] += STEP
            total[:, column] = (self._in_front(moved, here) - seen) / STEP
        return seen, total, board

    def board_slopes(self, z: Array) -> Complex:
        """Derivatives (m, p) of the board's own reflection."""
        x, offset = self.deviations(z), self._offset(z)
        factors = (1.0, -offset, 0.5 * offset**2)
        sums = [_slopes(part, x) for part in self._parts]
        by_deviation: Complex = np.tensordot(np.array(factors), np.array(sums), axes=1)
        board = self.unknowns[: -1 - IN_FRONT]
        turns = np.array([each.sd / each.scale for each in board])
        first, second = (part.at(x[None, :])[0] for part in self._parts[1:])
        solver = (-first + offset * second) * self.unknowns[-1 - IN_FRONT].sd
        still = np.zeros((len(self.frequency), IN_FRONT))
        whole: Complex = np.concatenate([by_deviation.T * turns, solver[:, None], still], axis=1)
        return whole

    def _offset(self, z: Array) -> float:
        return self.unknowns[-1 - IN_FRONT].value(float(z[-1 - IN_FRONT]))

    def _antenna(self, x: Array, offset: float) -> Complex:
        value, first, second = (part.at(x[None, :])[0] for part in self._parts)
        moved: Complex = value - offset * first + 0.5 * offset**2 * second
        return moved

    def _in_front(self, z: Array, antenna: Complex) -> Complex:
        at_port = renormalised(antenna, self.reference, self.z0)
        return self.launch(z).seen(self.frequency, at_port, self.z0)


def renormalised(reflected: Complex, old: float, new: float) -> Complex:
    """Reflection (n,) against `new` ohm of what reflects `reflected` (n,) against `old` ohm, both real: Kurokawa, IEEE
    Trans. MTT 13 (1965) 194, for one port."""
    step = (new - old) / (new + old)
    result: Complex = (reflected - step) / (1.0 - step * reflected)
    return result


def _slopes(model: SurfaceModel, x: Array) -> Complex:
    """Derivatives (d, j) of the terms in the deviations at `x` (d,)."""
    found: Complex = model.slopes + 2.0 * x[:, None] * model.squares
    for (i, k), crossed in zip(model.pairs, model.crossed, strict=True):
        found[i] = found[i] + x[k] * crossed
        found[k] = found[k] + x[i] * crossed
    return found


def _carried(grid: Array, model: SurfaceModel, frequency: Array) -> tuple[SurfaceModel, SurfaceModel, SurfaceModel]:
    """The model at `frequency` (m,), then f times its slope and f squared times its bend over frequency there."""
    middle = float(np.mean(grid))
    spline = CubicSpline(grid / middle, np.eye(len(grid)))
    share = frequency / middle
    tables = (spline(share), share[:, None] * spline(share, 1), share[:, None] ** 2 * spline(share, 2))
    return tuple(_projected(model, table) for table in tables)  # type: ignore[return-value]


def _projected(model: SurfaceModel, table: Array) -> SurfaceModel:
    return SurfaceModel(
        table @ model.nominal, model.slopes @ table.T, model.squares @ table.T, model.pairs, model.crossed @ table.T
    )

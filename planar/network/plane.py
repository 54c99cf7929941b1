"""Reference planes: what lies between an instrument's port and the antenna's, put on or taken off.

A launch is a length of line with loss, then a series inductance and a shunt capacitance where it meets the board. It
is put in front of a reflection (to predict what an instrument sees) or taken off. Where short, open and perhaps load of
the same connector were measured, what lies in front follows from them: one-port error terms by Pozar, Microwave
Engineering, 3rd ed., section 4.5 (signal flow graph of a two-port with a load).
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from planar.errors import RangeError
from planar.network.measured import ALIKE
from planar.units import show

Array = NDArray[np.float64]
Complex = NDArray[np.complex128]


@dataclass(frozen=True)
class Launch:
    """What lies in front of the antenna: one-way `delay` (s) of a line of the port's impedance, its one-way `loss_db`
    (dB) at `loss_at` Hz, which grows with the square root of frequency (conductor loss), then `inductance` (H) in
    series and `capacitance` (F) across, nearest the antenna."""

    delay: float = 0.0
    loss_db: float = 0.0
    loss_at: float = 1e9
    inductance: float = 0.0
    capacitance: float = 0.0

    def seen(self, frequency: Array, reflection: Complex, z0: float) -> Complex:
        """The reflection (n,) an instrument sees of `reflection` (n,) at `frequency` (n,) Hz, both against `z0` ohm."""
        omega = 2.0 * np.pi * frequency
        admittance = (1.0 - reflection) / (1.0 + reflection) / z0 + 1j * omega * self.capacitance
        impedance = 1.0 / admittance + 1j * omega * self.inductance
        return np.asarray((impedance - z0) / (impedance + z0) * self._line(frequency), dtype=np.complex128)

    def removed(self, frequency: Array, reflection: Complex, z0: float) -> Complex:
        """The antenna's own reflection (n,) from what an instrument saw; the inverse of `seen`."""
        omega = 2.0 * np.pi * frequency
        bare = reflection / self._line(frequency)
        impedance = z0 * (1.0 + bare) / (1.0 - bare) - 1j * omega * self.inductance
        admittance = 1.0 / impedance - 1j * omega * self.capacitance
        return np.asarray((1.0 - z0 * admittance) / (1.0 + z0 * admittance), dtype=np.complex128)

    def _line(self, frequency: Array) -> Complex:
        """There and back through the line."""
        loss = 10.0 ** (-self.loss_db * np.sqrt(frequency / self.loss_at) / 10.0)
        return np.asarray(loss * np.exp(-4j * np.pi * frequency * self.delay), dtype=np.complex128)


def from_standards(measured: Complex, short: Complex, opened: Complex, load: Complex | None = None) -> Complex:
    """Reflection (n,) behind the plane at which `short`, `opened` and, if there is one, `load` were measured (n,).

    The standards are taken as ideal. Without a load what lies in front is taken as symmetric: its two reflections are
    one. Raises `RangeError` where short and open are so alike that nothing follows from them, and, without a load,
    where one looks as the other should.
    """
    if load is None:
        _check_turned(short, opened)
        directivity = (opened + short) / (2.0 + opened - short)
        match, through = directivity, (opened - directivity) * (1.0 - directivity)
    else:
        directivity = load
        match = (opened + short - 2.0 * load) / (opened - short)
        through = (opened - load) * (1.0 - match)
    alike = np.abs(opened - short) < ALIKE
    if alike.any():
        raise RangeError(
            f"short and open are the same at {int(alike.sum())} frequencies: was one of them measured twice?"
        )
    inner = measured - directivity
    return np.asarray(inner / (through + match * inner), dtype=np.complex128)


def _check_turned(short: Complex, opened: Complex) -> None:
    """Raise `RangeError` where short and open, each of the other's sign, leave nothing to divide by."""
    turned = np.abs(2.0 + opened - short) < ALIKE
    if turned.any():
        raise RangeError(f"short and open are taken for each other at {int(turned.sum())} frequencies: swap them")


def check_passive(frequency: Array, reflection: Complex, most: float) -> None:
    """Raise `RangeError` where a reflection taken to another plane is larger than `most`: too much was taken off.

    `frequency` (n,) Hz, `reflection` (n,); one that is no number counts as larger than any.
    """
    worst = int(np.argmax(np.abs(reflection)))  # the first that is no number, where there is one
    if not abs(reflection[worst]) <= most:
        raise RangeError(
            f"behind the reference plane the reflection is {abs(reflection[worst]):.3f} at "
            f"{show(float(frequency[worst]), 'frequency', 5)}, above {most:g}: the stated cable or standards do not fit"
        )

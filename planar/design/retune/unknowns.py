"""What is not known of a built board and of what lies in front of it: each unknown with its value, spread and unit.

Tolerances become bell curves of the same mean and standard deviation as the law boards follow, without an end: a board
may lie outside its tolerance. What lies in front of the antenna is as wide as common practice leaves it, or as narrow
as the user has stated.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from planar.design.tolerances import Quantity
from planar.units import SPEED_OF_LIGHT

Array = NDArray[np.float64]

COAX_SPEED = 0.7 * SPEED_OF_LIGHT
"""m/s, of waves in coax with a solid plastic dielectric (0.66 to 0.70 of light; common practice, no source)."""
USUAL_LENGTH, LENGTH_SD = 0.05, 0.04
"""m of coax in front when nothing is stated, and its standard deviation: 0 to 130 mm at two of them."""
STATED_SD, STANDARDS_SD = 1e-3, 0.3e-3
"""m of coax, how well a length is stated, and how well measured standards remove it (common practice, no source)."""
LAUNCH_INDUCTANCE, LAUNCH_CAPACITANCE = 0.08e-9, 0.02e-12
"""H and F, standard deviations of what a soldered launch adds beside length (common practice, no source)."""
USUAL_LOSS, LOSS_SD = 0.05, 0.05
"""dB one way of a short pigtail and of what the calibration leaves, and its standard deviation (common practice)."""
SOLVER_SHIFT = 0.003
"""Standard deviation of the field solver's own error in frequency, a fraction."""
LAW_POINTS = 2001
"""Even steps in probability over which a law's mean and standard deviation are taken."""
SOLVER, DELAY, LOSS, INDUCTANCE, CAPACITANCE = (
    "field solver's frequency",
    "delay of the line in front",
    "loss of the line in front",
    "launch inductance",
    "launch capacitance",
)


@dataclass(frozen=True)
class Unknown:
    """A quantity that the measurement is asked about: `mean` and standard deviation `sd` before it, in `unit` (m, s,
    dB, H, F or "", a pure number), `nominal` as designed, never below `least`. A board's quantity has a
    tolerance: `scale` is its half width, a deviation of 1; 0 where there is none."""

    name: str
    unit: str
    nominal: float
    mean: float
    sd: float
    least: float = -math.inf
    scale: float = 0.0

    def value(self, z: float) -> float:
        """The quantity `z` standard deviations above its mean, in its unit."""
        return max(self.least, self.mean + z * self.sd)

    def deviation(self, z: float) -> float:
        """The same as a deviation from nominal over the scale."""
        return (self.value(z) - self.nominal) / self.scale


@dataclass(frozen=True)
class Plane:
    """What is known of the reference plane: one-way `delay` (s) of the line between the instrument's plane and the
    antenna's and its standard deviation, one-way `loss` (dB) and its own, factor `launch` on what a launch may add;
    `said` tells where it comes from."""

    delay: float
    delay_sd: float
    loss: float
    loss_sd: float
    launch: float
    said: str

    @property
    def known(self) -> bool:
        """Whether the length in front was stated or taken off."""
        return self.delay_sd * COAX_SPEED < 0.5 * LENGTH_SD


def unstated_plane() -> Plane:
    """Nothing is known of what lies in front: a pigtail as they are."""
    said = "nothing stated: the length of line in front of the antenna is estimated from the measurement"
    return Plane(USUAL_LENGTH / COAX_SPEED, LENGTH_SD / COAX_SPEED, USUAL_LOSS, LOSS_SD, 1.0, said)


def stated_plane(delay: float, loss_db: float = 0.0) -> Plane:
    """A line of one-way `delay` (s) and `loss_db` (dB at the middle of the band) is stated to lie in front."""
    said = f"stated: {delay * 1e12:.0f} ps one way, {delay * COAX_SPEED * 1e3:.1f} mm of coax"
    return Plane(delay, STATED_SD / COAX_SPEED, loss_db, LOSS_SD, 1.0, said)


def coax_delay(length: float) -> float:
    """One-way delay (s) of `length` m of coax."""
    return length / COAX_SPEED


def plane_of_standards() -> Plane:
    """What lies in front was taken off with standards measured in the antenna's place."""
    said = "short and open measured at the end of the line were taken off"
    return Plane(0.0, STANDARDS_SD / COAX_SPEED, 0.0, 0.4 * LOSS_SD, 0.3, said)


def board_unknowns(quantities: Sequence[Quantity]) -> tuple[Unknown, ...]:
    """One for each of `quantities`, in their order: mean and standard deviation of its law."""
    return tuple(_of_law(each) for each in quantities)


def _of_law(quantity: Quantity) -> Unknown:
    even = (np.arange(LAW_POINTS) + 0.5) / LAW_POINTS
    deviations = quantity.quantile(even)
    mean, sd = quantity.value(float(deviations.mean())), quantity.scale * float(deviations.std())
    least = 0.0 if quantity.low == 0.0 else 0.02 * quantity.nominal if quantity.nominal > 0.0 else -math.inf
    if quantity.name.endswith("permittivity"):
        least = 1.0
    return Unknown(quantity.name, quantity.unit, quantity.nominal, mean, sd, least, quantity.scale)


def other_unknowns(plane: Plane, solver_shift: float = SOLVER_SHIFT) -> tuple[Unknown, ...]:
    """What is not the board's: the solver's own error in frequency, of standard deviation `solver_shift`, then the
    line's delay and loss and the launch's inductance and capacitance."""
    return (
        Unknown(SOLVER, "", 0.0, 0.0, solver_shift),
        Unknown(DELAY, "s", plane.delay, plane.delay, plane.delay_sd),
        Unknown(LOSS, "dB", plane.loss, plane.loss, plane.loss_sd),
        Unknown(INDUCTANCE, "H", 0.0, 0.0, plane.launch * LAUNCH_INDUCTANCE),
        Unknown(CAPACITANCE, "F", 0.0, 0.0, plane.launch * LAUNCH_CAPACITANCE),
    )

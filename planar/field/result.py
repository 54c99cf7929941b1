"""What a solution says at one frequency, in the trade's words: gain, efficiency, polarisation, losses.

Powers are shares of the power accepted. The slab is taken as endless, so a part of the power is
guided away in it; on a board it radiates from the edge. It counts as radiated in the efficiency and is
stated by itself. Gain and axial ratio hold at right angles to the board.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from planar.errors import RangeError
from planar.field.far_field import FarField, far_field
from planar.field.solver import FieldSolution

NORMAL = 1e-6
"""rad, as near to the board's normal as the polar angle is taken."""
BALANCE = 0.01
"""Share of the accepted power by which the sum of what is lost and radiated may exceed it."""


@dataclass(frozen=True)
class PointResult:
    """One frequency. Gains are toward the top and toward the bottom normal; the bottom's is None over a metal plane.

    `directivity_dbi` is that toward the top of what is radiated into space. Shares add up to 1.
    """

    frequency_hz: float
    input_impedance_ohm: complex
    gain_dbi: float
    gain_below_dbi: float | None
    directivity_dbi: float
    axial_ratio_db: float
    sense: str
    efficiency: float
    copper_share: float
    dielectric_share: float
    radiated_share: float
    surface_wave_share: float

    @property
    def power_balance(self) -> float:
        """Copper, dielectric and radiated power over the power accepted; what lacks to 1 is guided in the slab."""
        return self.copper_share + self.dielectric_share + self.radiated_share

    def reflection_db(self, reference: float) -> float:
        """Reflection at a real `reference` ohm, dB."""
        z = self.input_impedance_ohm
        return 20.0 * math.log10(max(1e-12, abs((z - reference) / (z + reference))))


def point_result(solution: FieldSolution) -> PointResult:
    """Evaluate `solution`. Raises `RangeError` when the powers do not balance to 1 %."""
    accepted = solution.accepted_power
    copper, dielectric = solution.copper_loss / accepted, solution.dielectric_loss / accepted
    radiated = solution.radiated / accepted
    guided = 1.0 - copper - dielectric - radiated
    if guided < -BALANCE:
        raise RangeError(
            f"at {solution.frequency / 1e6:.5g} MHz losses and radiation are {1.0 - guided:.3f} of the power accepted: "
            "the solution is not accurate enough to be shown, use a finer mesh"
        )
    field = far_field(solution.radiator, np.array([NORMAL, math.pi - NORMAL]), np.zeros(2))
    gain = _gain(field, 0, accepted)
    below = None if solution.medium.metal_backed else 10.0 * math.log10(_gain(field, 1, accepted))
    return PointResult(
        solution.frequency,
        solution.impedance,
        10.0 * math.log10(gain),
        below,
        10.0 * math.log10(gain / radiated),
        float(field.axial_ratio_db[0]),
        field.sense(0),
        1.0 - copper - dielectric,
        copper,
        dielectric,
        radiated,
        max(0.0, guided),
    )


def _gain(field: FarField, index: int, accepted: float) -> float:
    return float(4.0 * math.pi * field.intensity[index] / accepted)

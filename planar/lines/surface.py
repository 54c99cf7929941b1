"""What a conductor's surface does to a current: skin depth, surface resistance, roughness.

All three are one-line formulas for a good conductor much thicker than its skin depth, in SI units,
and are used by every line kind for its conductor loss.
"""

from __future__ import annotations

import math

from planar.units import VACUUM_PERMEABILITY


def skin_depth(frequency: float, conductivity: float) -> float:
    """Depth in m at which the current density has fallen to 1/e.

    `frequency` in Hz, `conductivity` in S/m, both positive. sqrt(2/(omega mu0 sigma)): Pozar,
    Microwave Engineering, eq. 1.60 (from memory); good conductors, non-magnetic.
    """
    return math.sqrt(1.0 / (math.pi * frequency * VACUUM_PERMEABILITY * conductivity))


def surface_resistance(frequency: float, conductivity: float) -> float:
    """Resistance in ohm per square of a smooth, thick conductor: 1/(sigma delta).

    `frequency` in Hz, `conductivity` in S/m. Pozar, Microwave Engineering, eq. 1.125 (from memory).
    """
    return 1.0 / (conductivity * skin_depth(frequency, conductivity))


def roughness_factor(frequency: float, conductivity: float, rq: float) -> float:
    """Factor (1 to 2) by which a rough surface raises the surface resistance.

    `rq` is the root-mean-square roughness in m, zero for a smooth surface. Hammerstad & Bekkadal,
    Microstrip Handbook, ELAB report STF44 A74169, 1975: 1 + (2/pi) atan(1.4 (rq/delta)^2). The
    factor saturates at 2; for profiles of some ten skin depths it underestimates the loss.
    """
    return 1.0 + 2.0 / math.pi * math.atan(1.4 * (rq / skin_depth(frequency, conductivity)) ** 2)

"""How far a change of a board moves its response along the frequency axis.

The shift is what the change of the reflection has in common with the slope of the reflection over frequency, over a
span round the band; what is left is a change of impedance. Boards are compared on meshes of the same step.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from planar.design.trial import Effort
from planar.network.response import reflection

Array = NDArray[np.float64]
Complex = NDArray[np.complex128]

COARSER, NODES, SOLVED_SPAN = 1.5, 4, 0.12
"""Step of the mesh over the default, solutions, and half the span solved, of the centre frequency."""
SPAN, POINTS = 0.06, 25
"""Half the span the shift is read over, of the centre frequency, and the frequencies in it."""
SLOPE = 1e-3
"""Of the frequency, the step of the reflection's slope."""


def comparing_effort(centre: float) -> Effort:
    """How boards round `centre` Hz are solved that are to be compared."""
    return Effort(COARSER, NODES, (centre * (1.0 - SOLVED_SPAN), centre * (1.0 + SOLVED_SPAN)))


def shift_frequencies(centre: float) -> Array:
    """`centre` Hz, the span, the span a little lower, the span a little higher, (1 + 3 POINTS,) Hz."""
    span = 1.0 + np.linspace(-SPAN, SPAN, POINTS)
    frequencies: Array = centre * np.concatenate([[1.0], span, span - SLOPE, span + SLOPE])
    return frequencies


def shift(here: Complex, there: Complex, reference: float) -> float:
    """Fraction by which the response moved up in frequency from `here` to `there`, impedances (1 + 3 POINTS,) ohm at
    `shift_frequencies`, by least squares of the reflection at `reference` ohm against its slope.

    The slope is the mean of both boards', by which the error is of third order in the shift.
    """
    slope = 0.5 * (_slope(here, reference) + _slope(there, reference))
    change = reflection(here[1 : 1 + POINTS], reference) - reflection(there[1 : 1 + POINTS], reference)
    return float(np.real(np.vdot(slope, change)) / np.real(np.vdot(slope, slope)))


def _slope(impedance: Complex, reference: float) -> Complex:
    """Change of the reflection with the frequency as a fraction of the centre, (POINTS,)."""
    below, above = impedance[1 + POINTS : 1 + 2 * POINTS], impedance[1 + 2 * POINTS :]
    difference: Complex = reflection(above, reference) - reflection(below, reference)
    return difference / (2.0 * SLOPE)

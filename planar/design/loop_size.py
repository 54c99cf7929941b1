"""The loop by formulas: how long the mean line must be, and what resistance the gap then shows.

The thin-loop series gives resonance and resistance of the circular strip loop on its stack of
layers; a square is longer by the published ratio of both in free space. Good to a few per cent in
frequency: the field solver decides later.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

from planar.copper.layout import Level
from planar.design.thin_loop import STRIP_TO_WIRE, LoopSetting, resonance, slab_relief, square_perimeter, widest_trace
from planar.errors import RangeError
from planar.lines.static_spectral import DielectricLayer
from planar.stackup import SlabStack, Stackup, loss_tangent
from planar.units import SPEED_OF_LIGHT, show

SQUARE_RESISTANCE = 0.91
"""Resonant resistance of a square loop over that of the circle (check value of this project, from a series and a
mesh solution)."""
FORMULA_ERROR = 0.04
"""Fraction by which the resonance of a drawn loop may be off: 2 % against the modal solution of a printed ring."""
NEAREST_PLANE = 0.04
"""Distance of a reflector in wavelengths below which the formulas are not used: the loop hardly radiates."""
LONGEST_ASPECT = 1.6
"""Aspect ratio up to which a rectangle is taken to resonate as the square of its perimeter."""
_ROUNDS = 30
_CLOSE = 1e-10


@dataclass(frozen=True)
class LoopShape:
    """Proportions of a loop: `aspect` width over height, `corner` the corner radius over half the smaller side.

    `corner` 1 of a square is a circle.
    """

    aspect: float
    corner: float

    def perimeter(self, width: float) -> float:
        """Length of the mean line of a loop `width` m wide, m."""
        height = width / self.aspect
        radius = 0.5 * self.corner * min(width, height)
        return 2.0 * (width + height) - (8.0 - 2.0 * math.pi) * radius

    def width(self, perimeter: float) -> float:
        """Width of the loop whose mean line is `perimeter` m long."""
        return perimeter / self.perimeter(1.0)


@dataclass(frozen=True)
class LoopEstimate:
    """The bare loop at its first-order resonance.

    `perimeter` of the mean line in m, the same in free-space wavelengths, `resistance` at the gap in
    ohm without losses, `eps_eff` of the trace.
    """

    frequency: float
    perimeter: float
    perimeter_wavelengths: float
    resistance: float
    eps_eff: float


@dataclass(frozen=True)
class LoopSurroundings:
    """Layers seen from the loop's level, outward, and the height of the loop over a metal plane in m (or None)."""

    below: tuple[DielectricLayer, ...]
    above: tuple[DielectricLayer, ...]
    plane: float | None

    @classmethod
    def of(cls, stackup: Stackup, level: Level, frequency: float) -> LoopSurroundings:
        """What the copper `level` of `stackup` sees at `frequency` Hz."""
        below = stackup.dielectrics_below(level.value, frequency)
        above = stackup.dielectrics_above(level.value, frequency)
        plane = sum(slab.thickness for slab in below.slabs) if below.metal_backed else None
        return cls(layers_of(below), layers_of(above), plane)


def layers_of(stack: SlabStack) -> tuple[DielectricLayer, ...]:
    """Slabs as layers with a real permittivity and a loss tangent, nearest first."""
    return tuple(DielectricLayer(s.thickness, s.eps_r.real, loss_tangent(s.eps_r)) for s in stack.slabs)


def resonant_loop(frequency: float, trace: float, shape: LoopShape, around: LoopSurroundings) -> LoopEstimate:
    """Bare loop with a `trace` m wide that resonates at `frequency` Hz, first-order.

    Raises `RangeError` outside what the formulas cover: trace too wide for a thin loop, rectangle
    too long, reflector too near.
    """
    wavelength = SPEED_OF_LIGHT / frequency
    _check(shape, around, wavelength)
    perimeter = wavelength
    for _ in range(_ROUNDS):
        estimate = _resonance(perimeter, trace, shape, around)
        longer = estimate.perimeter_wavelengths * wavelength
        if abs(longer - perimeter) < _CLOSE * perimeter:
            break
        perimeter = longer
    return LoopEstimate(frequency, perimeter, perimeter / wavelength, estimate.resistance, estimate.eps_eff)


def resonant_frequency(perimeter: float, trace: float, shape: LoopShape, around: LoopSurroundings) -> LoopEstimate:
    """First-order resonance of a bare loop whose mean line is `perimeter` m long. Raises as `resonant_loop`."""
    estimate = _resonance(perimeter, trace, shape, around)
    _check(shape, around, SPEED_OF_LIGHT / estimate.frequency)
    return estimate


def _resonance(perimeter: float, trace: float, shape: LoopShape, around: LoopSurroundings) -> LoopEstimate:
    radius = perimeter / (2.0 * math.pi)
    wire = STRIP_TO_WIRE * trace
    if trace > widest_trace(radius):
        raise RangeError(
            f"a trace of {show(trace, 'length', 4)} (antenna.trace_width) is too wide for the loop formulas: at most "
            f"{show(widest_trace(radius), 'length', 3)} on a loop of this size"
        )
    air = LoopSetting(radius / wire)
    relief = slab_relief(radius, trace, below=around.below, above=around.above)
    height = None if around.plane is None else around.plane / radius
    setting = LoopSetting(radius / wire, relief, height)
    circle, alone = resonance(setting), resonance(air)
    frequency = circle.perimeter * SPEED_OF_LIGHT / perimeter
    # a square in air is longer by this; the same ratio holds on the slab to first order
    square = square_perimeter(2.0 * wire, frequency) / alone.perimeter
    length = shape.corner + (1.0 - shape.corner) * square
    resistance = shape.corner + (1.0 - shape.corner) * SQUARE_RESISTANCE
    wavelengths = circle.perimeter * length
    return LoopEstimate(
        wavelengths * SPEED_OF_LIGHT / perimeter,
        perimeter,
        wavelengths,
        circle.resistance * resistance,
        setting.eps_eff,
    )


def _check(shape: LoopShape, around: LoopSurroundings, wavelength: float) -> None:
    longest = max(shape.aspect, 1.0 / shape.aspect)
    if longest > LONGEST_ASPECT:
        raise RangeError(
            f"antenna.aspect_ratio {longest:.3g} is outside the loop formulas, at most {LONGEST_ASPECT:g}: choose a "
            "rectangle nearer to a square"
        )
    if around.plane is not None and around.plane < NEAREST_PLANE * wavelength:
        least = show(NEAREST_PLANE * wavelength, "length", 3)
        raise RangeError(
            f"surroundings.reflector.distance puts the plane {show(around.plane, 'length', 3)} from the loop, too "
            f"near: it hardly radiates and the formulas do not hold; at least {least}, better a quarter wavelength"
        )

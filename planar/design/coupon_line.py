"""The measuring board's bare line and ring by formulas, both ways: from eps_r to what is measured, and back.

Everything that is drawn, expected or recovered from a measurement goes through these, so that design and measurement
cannot disagree.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

from scipy.optimize import brentq

from planar.errors import RangeError
from planar.lines.line import Line, analyse
from planar.lines.microstrip import EPS_RANGE, microstrip_wave
from planar.lines.records import Conductor, Substrate
from planar.lines.ring_resonator import planar_width, ring_wavenumber
from planar.units import SPEED_OF_LIGHT

_ROUNDS, _CLOSE = 60, 1e-12


@dataclass(frozen=True)
class BareLine:
    """A microstrip without mask: `width` and slab `height` in m, `conductor` of its copper."""

    width: float
    height: float
    conductor: Conductor

    def wave(self, eps_r: float, frequency: float) -> tuple[float, float]:
        """Impedance in ohm and effective permittivity at `frequency` Hz. Raises `RangeError` outside the formulas."""
        return microstrip_wave(self.width, None, Substrate(self.height, eps_r, 0.0), self.conductor, frequency)

    def eps_eff(self, eps_r: float, frequency: float) -> float:
        """Effective permittivity on a laminate of `eps_r` at `frequency` Hz."""
        return self.wave(eps_r, frequency)[1]

    def eps_r(self, eps_eff: float, frequency: float) -> float:
        """The permittivity, 1 to 18, that gives `eps_eff` at `frequency` Hz; `RangeError` where none does."""
        low, high = (self.eps_eff(eps, frequency) for eps in EPS_RANGE)
        if not low <= eps_eff <= high:
            raise RangeError(f"effective permittivity {eps_eff:.4g}: the formulas reach {low:.4g} to {high:.4g}")
        return float(brentq(lambda eps: self.eps_eff(eps, frequency) - eps_eff, *EPS_RANGE, xtol=1e-10))

    def line(self, eps_r: float, tan_d: float, frequency: float) -> Line:
        """The line with its losses."""
        substrate = Substrate(self.height, eps_r, tan_d)
        return analyse("microstrip", self.width, substrate=substrate, conductor=self.conductor, frequency=frequency)


@dataclass(frozen=True)
class BareRing:
    """A ring of the bare `line` about a mean `radius` m, opened by a `slit` m.

    The slit shortens the way round by something between nothing (narrow against the height, its fringing field
    bridges it) and its own length; half of it is taken, the other half is uncertainty.
    """

    line: BareLine
    radius: float
    slit: float

    @property
    def electrical_radius(self) -> float:
        """Radius, m, of the closed ring that has the same way round."""
        return self.radius - 0.25 * self.slit / math.pi

    def wavenumber(self, order: int, eps_r: float, frequency: float) -> float:
        """Wave number, rad/m, of resonance `order`, with the curvature; `RangeError` for too wide a ring."""
        impedance, eps_eff = self.line.wave(eps_r, frequency)
        width = planar_width(self.line.height, impedance, eps_eff)
        return ring_wavenumber(order, self.electrical_radius, width)

    def frequency(self, order: int, eps_r: float) -> float:
        """Resonance `order`, Hz, on a laminate of `eps_r`, uncoupled."""
        f = 1e9
        for _ in range(_ROUNDS):
            k = self.wavenumber(order, eps_r, f)
            better = SPEED_OF_LIGHT * k / (2.0 * math.pi * math.sqrt(self.line.eps_eff(eps_r, f)))
            if abs(better - f) < _CLOSE * f:
                return better
            f = better
        return f

    def permittivities(self, order: int, frequency: float) -> tuple[float, float]:
        """Effective permittivity and eps_r of the laminate whose uncoupled resonance `order` is at `frequency` Hz."""
        k = order / self.electrical_radius
        eps_r = 0.0
        for _ in range(_ROUNDS):
            eps_eff = (SPEED_OF_LIGHT * k / (2.0 * math.pi * frequency)) ** 2
            before, eps_r = eps_r, self.line.eps_r(eps_eff, frequency)
            if abs(eps_r - before) < 1e-9 * eps_r:
                break
            k = self.wavenumber(order, eps_r, frequency)
        return eps_eff, eps_r

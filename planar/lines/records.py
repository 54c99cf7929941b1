"""What a line is made of and what its analysis returns; every other module here shares these."""

from __future__ import annotations

import math
from dataclasses import dataclass

from planar.lines.static_spectral import DielectricLayer
from planar.units import SPEED_OF_LIGHT

DB_PER_NEPER = 20.0 / math.log(10.0)


@dataclass(frozen=True)
class Substrate:
    """The dielectric: slab `height` in m, relative `eps_r`, loss tangent `tan_d` at the line's frequency.

    `cover` lists layers above the strip level (solder mask first), then comes open air.
    """

    height: float
    eps_r: float
    tan_d: float
    cover: tuple[DielectricLayer, ...] = ()

    @property
    def slab(self) -> DielectricLayer:
        """The slab as a layer."""
        return DielectricLayer(self.height, self.eps_r, self.tan_d)


@dataclass(frozen=True)
class Conductor:
    """The strip metal: `thickness` in m, `conductivity` in S/m, roughness `rq` in m (root mean square).

    Thickness zero means "not considered": impedance and permittivity are those of an infinitely thin strip.
    """

    thickness: float
    conductivity: float
    rq: float = 0.0


@dataclass(frozen=True)
class Line:
    """A line at one frequency.

    `width` and `gap` in m (`gap` None where the kind has none), `frequency` in Hz, `impedance` in
    ohm, relative `eps_eff`, `alpha_conductor` and `alpha_dielectric` in Np/m.
    """

    kind: str
    width: float
    gap: float | None
    frequency: float
    impedance: float
    eps_eff: float
    alpha_conductor: float
    alpha_dielectric: float

    @property
    def wavelength(self) -> float:
        """Guided wavelength in m."""
        return SPEED_OF_LIGHT / (self.frequency * math.sqrt(self.eps_eff))

    @property
    def quarter_wave(self) -> float:
        """A quarter of the guided wavelength in m."""
        return self.wavelength / 4.0

    @property
    def loss_db_per_m(self) -> float:
        """Attenuation in dB/m, conductor and dielectric together."""
        return DB_PER_NEPER * (self.alpha_conductor + self.alpha_dielectric)

"""The quarter-wave section: one line that matches a load, complex or real, to a real impedance.

With a complex load the section is a little longer or shorter than a quarter wave; with a real one it
is exactly that. Loads no single section can match are refused with the nearest that it can.
"""

from __future__ import annotations

import math

from planar.errors import SynthesisError

_REAL_LOAD = 1e-12  # reactance over impedance below which a load counts as real


def quarter_wave_section(source_impedance: float, load: complex) -> tuple[float, float]:
    """Impedance in ohm and electrical length in rad of the line matching `load` to `source_impedance`.

    Both in ohm, the source real. The length lies between 0 and pi, near pi/2 for a nearly real load.
    Z_t^2 = Z0 (R^2 + X^2 - Z0 R)/(R - Z0), tan(theta) = Z_t (Z0 - R)/(Z0 X): both parts of the condition
    Zin = Z0 on Zin = Z_t (Z_L + j Z_t tan)/(Z_t + j Z_L tan), Pozar, Microwave Engineering, eq. 2.44.
    Raises `SynthesisError` where Z_t^2 is not positive, that is R <= Z0 <= |Z_L|^2/R, saying by how much R
    or X must change.
    """
    z0, r, x = source_impedance, load.real, load.imag
    if not (z0 > 0.0 and r > 0.0):
        raise SynthesisError(f"source {z0:.4g} ohm and load resistance {r:.4g} ohm must both be positive")
    if abs(x) <= _REAL_LOAD * abs(load):
        return math.sqrt(z0 * r), math.pi / 2.0
    if r == z0 or (r * r + x * x - z0 * r) / (r - z0) <= 0.0:
        raise SynthesisError(_refusal(z0, r, x))
    impedance = math.sqrt(z0 * (r * r + x * x - z0 * r) / (r - z0))
    angle = math.atan2(impedance * (z0 - r) / x, z0)
    return impedance, angle % math.pi


def quarter_wave_bandwidth(source_impedance: float, load: float, vswr: float) -> float:
    """Fractional bandwidth within which a quarter-wave section keeps the match below `vswr`.

    Real `source_impedance` and `load` in ohm, `vswr` above 1. Infinite match returns 2, the whole period.
    Pozar, Microwave Engineering, 3rd ed., eq. 5.33: 2 - (4/pi) acos(G/sqrt(1 - G^2) 2 sqrt(Z0 R)/|R - Z0|).
    """
    if not (source_impedance > 0.0 and load > 0.0 and vswr > 1.0):
        raise SynthesisError(
            f"source {source_impedance:.4g} and load {load:.4g} ohm must be positive, VSWR {vswr:.4g} above 1"
        )
    step = abs(load - source_impedance)
    reflection = (vswr - 1.0) / (vswr + 1.0)
    cosine = reflection / math.sqrt(1.0 - reflection**2) * 2.0 * math.sqrt(source_impedance * load)
    if cosine >= step:
        return 2.0
    return 2.0 - 4.0 / math.pi * math.acos(cosine / step)


def _refusal(z0: float, r: float, x: float) -> str:
    """Why no single line matches the load, and the nearest loads that one does."""
    # Z_t^2 has the sign of (|Z_L|^2/R - Z0)(R - Z0), and |Z_L|^2/R >= R: only R <= Z0 <= |Z_L|^2/R fails.
    smallest = math.sqrt(r * (z0 - r))
    return (
        f"no single line matches {r:.4g}{x:+.4g}j ohm to {z0:.4g} ohm: raise the resistance above {z0:.4g} ohm "
        f"(by more than {z0 - r:.4g} ohm) or bring the reactance within +-{smallest:.4g} ohm "
        f"(by at least {abs(x) - smallest:.4g} ohm)"
    )

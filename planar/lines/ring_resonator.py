"""A microstrip ring: at which wave number it resonates, and what a coupling gap does to it.

The ring is n guided wavelengths round (Troughton 1969). Its curvature is taken into account by the planar model:
an annulus with magnetic walls, as wide as the line that has the same impedance between two planes. A weak coupling
pulls the resonance by an amount that follows from how strongly it couples, which a measurement shows.
"""

from __future__ import annotations

import math

from scipy.optimize import brentq
from scipy.special import jvp, yvp

from planar.errors import RangeError
from planar.lines.ranges import require
from planar.units import WAVE_IMPEDANCE

WIDEST_RING = 1.6
"""Wave number times width of the planar model, about a quarter wave across: beyond it transverse modes come near (our
limit)."""
GAP_RATIOS = (0.1, 1.0)
"""Gap over width for which the gap formula was fitted."""


def planar_width(height: float, impedance: float, eps_eff: float) -> float:
    """Width in m between magnetic walls of the planar line that stands for a microstrip: eta0 h/(Z sqrt(eps_eff)).

    `height` of the slab in m, `impedance` in ohm. Owens, Electron. Lett. 12 (1976) 356 (from memory).
    """
    return WAVE_IMPEDANCE * height / (impedance * math.sqrt(eps_eff))


def ring_wavenumber(order: int, radius: float, width: float) -> float:
    """Wave number in rad/m at which a ring resonates with `order` guided wavelengths round it.

    `radius` of the middle and `width` between magnetic walls in m. The lowest root of
    J'n(k a) Y'n(k b) = J'n(k b) Y'n(k a) with a, b the inner and outer radius: Wolff & Knoppik, Electron. Lett. 7
    (1971) 779; order / radius in the limit of a narrow ring: Troughton, Electron. Lett. 5 (1969) 501 (both from
    memory). Raises `RangeError` for a width of more than half the radius or `WIDEST_RING`.
    """
    require("ring width / radius", width / radius, (0.0, 0.5))
    require("ring width x wave number", order * width / radius, (0.0, WIDEST_RING))
    inner, outer = radius - 0.5 * width, radius + 0.5 * width

    def walls(k: float) -> float:
        a, b = k * inner, k * outer
        return float(jvp(order, a) * yvp(order, b) - jvp(order, b) * yvp(order, a))

    # k^2 is the mean of (n/rho)^2 over the ring in the field's own weight, so it lies between its ends
    return float(brentq(walls, order / outer, order / inner, rtol=1e-12))


def gap_capacitance(width: float, height: float, eps_r: float, gap: float) -> float:
    """Series capacitance in F of a gap of `gap` m between two microstrip ends of `width` m.

    Garg & Bahl, Int. J. Electronics 45 (1978) 81 (from memory): width / height 0.5 to 2, gap / width 0.1 to 1, eps_r
    2.5 to 15, within 7 %. Ratios outside are taken at the nearest end: here it sizes a coupling that is then measured.
    """
    u = min(max(width / height, 0.5), 2.0)
    s = min(max(gap / width, GAP_RATIOS[0]), GAP_RATIOS[1])
    log = math.log10(u)
    odd = s ** (u * (0.619 * log - 0.3853)) * math.exp(4.26 - 1.453 * log) * (eps_r / 9.6) ** 0.8
    if s <= 0.3:
        power, level = 0.8675, 2.043 * u**0.12
    else:
        power, level = 1.565 / u**0.16 - 1.0, 1.97 - 0.03 / u
    even = 12.0 * s**power * math.exp(level) * (eps_r / 9.6) ** 0.9
    return float(max(0.5 * odd - 0.25 * even, 0.02 * odd) * width * 1e-12)


def largest_pull(order: int, external_q: float) -> float:
    """Fraction by which two coupling gaps at most lower the resonance of a ring of `order`: 1/sqrt(pi n Qe).

    `external_q` is that of one gap. A series capacitance C at an antinode of a ring of impedance Z, with
    b = omega C Z, adds C to the n pi/(omega Z) that the mode already stores (twice, for two gaps) and leaks into a
    line of Z: Qe = pi n/b^2, pull b/(pi n); b is eliminated. It is the most, since the feed also takes fringing field
    away from the ring. Raises `RangeError` for a coupling that is not weak.
    """
    if not external_q > 10.0:
        raise RangeError(f"external Q is {external_q:.3g}, a weakly coupled ring has more than 10")
    return 1.0 / math.sqrt(math.pi * order * external_q)

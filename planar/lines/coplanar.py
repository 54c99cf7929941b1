"""Coplanar strips: two strips on one face of a slab, no metal below, driven against each other.

The impedance is the exact static solution for thin strips; what the copper's thickness adds is the
capacitance between thick and thin strips in air, since all the added metal stands in the air. The
conformal formula is here only as its check: it is off by up to 8 % in permittivity for narrow gaps.
Everything is quasi-static, so the line and the slab must be small against the wavelength.
"""

from __future__ import annotations

import math
from dataclasses import replace

from scipy import special

from planar.errors import RangeError
from planar.lines.microstrip import dielectric_loss, require_thick, rough_sheet_resistance
from planar.lines.ranges import require
from planar.lines.records import Conductor, Line, Substrate
from planar.lines.static_spectral import DielectricLayer, StaticLine, coplanar_strips_static
from planar.lines.surface import skin_depth
from planar.lines.thick_pair import thick_pair_capacitance
from planar.units import SPEED_OF_LIGHT, VACUUM_PERMITTIVITY, WAVE_IMPEDANCE

WIDEST = 0.1
"""Copper extent (gap + 2 widths) over the wavelength in a medium half slab, half air (common practice)."""
THICKEST_SLAB = 0.06
"""h sqrt(eps_r - 1)/lambda0: a quarter of the TE1 cut-off, 0.25, where dispersion is a per cent or two (estimate)."""
THICKEST = 0.5
"""Copper thickness over the smaller of width and gap (our limit)."""
WIDTH_GAP_RANGE = (0.01, 100.0)
"""Width over gap."""


def coplanar_strips_conformal(width: float, gap: float, height: float, eps_r: float) -> StaticLine:
    """Conformal-mapping impedance and permittivity of thin strips on a bare slab; lengths in m.

    Z = eta0/sqrt(eps_eff) K(k)/K(k'), k = a/b, a = s/2, b = s/2 + w. Ghione & Naldi, Electron. Lett. 20
    (1984) 179, eqs. 1 to 4 (equation numbers from memory). Good to 0.5 % in permittivity for h > w and gap
    comparable to width; 2 to 8 % off for gaps much narrower and 8 % for gaps much wider than the slab.
    """
    inner, outer = gap / 2.0, gap / 2.0 + width
    # sinh(x)/sinh(y) written with exponentials so that a wide pair on a thin slab cannot overflow.
    x, y = math.pi * inner / (2.0 * height), math.pi * outer / (2.0 * height)
    slab = math.exp(x - y) * math.expm1(-2.0 * x) / math.expm1(-2.0 * y)
    air = _modulus_ratio(inner / outer)
    eps_eff = 1.0 + 0.5 * (eps_r - 1.0) * _modulus_ratio(slab) / air
    return StaticLine(WAVE_IMPEDANCE * air / math.sqrt(eps_eff), eps_eff)


def air_capacitance(width: float, gap: float) -> float:
    """Capacitance in F/m of thin coplanar strips in air, exact: eps0 K(k')/K(k); lengths in m.

    Ghione & Naldi 1984, with eps_r = 1.
    """
    return VACUUM_PERMITTIVITY / _modulus_ratio(gap / (gap + 2.0 * width))


def thick_line(thin: StaticLine, width: float, gap: float, substrate: Substrate, thickness: float) -> StaticLine:
    """The line `thin` with copper of `thickness` in m instead of none: impedance and permittivity both fall.

    The capacitance thickness adds in air (`thick_pair_capacitance`) is added to the filled and the empty
    line alike; under a cover it is taken in the cover's permittivity over the height the cover fills (our
    approximation). Raises `RangeError` for a thickness above half of width or gap, or width above 100 gaps.
    """
    if thickness == 0.0:
        return thin
    require("copper thickness / min(width, gap)", thickness / min(width, gap), (0.0, THICKEST))
    require("width / gap", width / gap, WIDTH_GAP_RANGE)
    empty = air_capacitance(width, gap)
    added = max(thick_pair_capacitance(width, gap, thickness) - empty, 0.0)
    eps_beside = 1.0
    if substrate.cover:
        mask = substrate.cover[0]
        eps_beside += (mask.eps_r - 1.0) * min(1.0, mask.thickness / thickness)
    filled = thin.eps_eff * empty + eps_beside * added
    empty += added
    return StaticLine(1.0 / (SPEED_OF_LIGHT * math.sqrt(filled * empty)), filled / empty)


def coplanar_strips_wave(
    width: float, gap: float | None, substrate: Substrate, conductor: Conductor, frequency: float
) -> tuple[float, float]:
    """Impedance in ohm and effective permittivity of coplanar strips, without their losses.

    `width` and `gap` in m, `frequency` in Hz (it only decides whether the quasi-static solution holds).
    Raises `RangeError` without a gap, where copper or slab are too large against the wavelength, and as
    `thick_line`.
    """
    if gap is None:
        raise RangeError("coplanar strips need a gap")
    _require_quasi_static(width, gap, substrate, frequency)
    line = _static(width, gap, substrate, conductor.thickness)
    return line.impedance, line.eps_eff


def coplanar_width_limits(
    gap: float | None, substrate: Substrate, conductor: Conductor, frequency: float
) -> tuple[float, float]:
    """Narrowest and widest strips in m covered at a `gap` in m; `frequency` in Hz."""
    if gap is None:
        raise RangeError("coplanar strips need a gap")
    narrowest, widest = (ratio * gap for ratio in WIDTH_GAP_RANGE)
    extent = _largest_extent(substrate, frequency)
    return max(narrowest, conductor.thickness / THICKEST), min(widest, (extent - gap) / 2.0)


def coplanar_gap_limits(
    width: float, substrate: Substrate, conductor: Conductor, frequency: float
) -> tuple[float, float]:
    """Smallest and largest gap in m covered at a strip `width` in m; `frequency` in Hz."""
    narrow, wide = WIDTH_GAP_RANGE
    extent = _largest_extent(substrate, frequency)
    return max(width / wide, conductor.thickness / THICKEST), min(width / narrow, extent - 2.0 * width)


def strip_resistance(width: float, gap: float, stop: float) -> float:
    """Integral of (J/I)^2 over one strip in 1/m: times the surface resistance, the resistance per m of both strips.

    J is the exact current of thin strips, I x 1/sqrt((x^2 - a^2)(b^2 - x^2)), shared by the two faces; the
    integral is cut `stop` (m) short of each edge. Lewin, IEEE Trans. MTT-32 (1984) 717; the closed form is
    Owyang & Wu, IRE Trans. AP-6 (1958) 49, as in Gupta et al., Microstrip Lines and Slotlines (from memory).
    """
    a, b = gap / 2.0, gap / 2.0 + width
    amplitude = b / float(special.ellipk(1.0 - (a / b) ** 2))
    at_gap = math.log((width - stop) / (a + b - stop) * (gap + stop) / stop) / (2.0 * a)
    outside = math.log((2.0 * b - stop) / stop * (width - stop) / (a + b + stop)) / (2.0 * b)
    return amplitude**2 * (at_gap + outside) / (b * b - a * a)


def stopping_distance(thickness: float) -> float:
    """Distance in m from a square edge, `thickness` m high, at which to cut the thin-strip current integral.

    t/(4 pi e^pi), about t/291: Lewin, IEEE Trans. MTT-32 (1984) 717; Holloway & Kuester, IEEE Trans.
    MTT-43 (1995) 2695 (both from memory); edges square, thickness of at least two skin depths.
    """
    return thickness / (4.0 * math.pi * math.exp(math.pi))


def coplanar_strips_line(
    width: float, gap: float | None, substrate: Substrate, conductor: Conductor, frequency: float
) -> Line:
    """Analysed coplanar strips; `width` and `gap` in m, `frequency` in Hz.

    Conductor thickness zero gives the impedance of thin strips and the loss of strips two skin depths
    thick, the thinnest the loss formula covers. Raises `RangeError` as `coplanar_strips_wave`, and where
    the strip is thinner than two skin depths.
    """
    if gap is None:
        raise RangeError("coplanar strips need a gap")
    require_thick(conductor, frequency)
    impedance, eps_eff = coplanar_strips_wave(width, gap, substrate, conductor, frequency)
    stop = stopping_distance(conductor.thickness or 2.0 * skin_depth(frequency, conductor.conductivity))
    resistance = rough_sheet_resistance(conductor, frequency) * strip_resistance(width, gap, stop)
    layers = (substrate.slab, *substrate.cover)
    dielectric = sum(
        dielectric_loss(_filling(width, gap, substrate, conductor.thickness, index), layer, frequency, eps_eff)
        for index, layer in enumerate(layers)
        if layer.tan_d
    )
    return Line(
        kind="coplanar-strips",
        width=width,
        gap=gap,
        frequency=frequency,
        impedance=impedance,
        eps_eff=eps_eff,
        alpha_conductor=resistance / (2.0 * impedance),
        alpha_dielectric=dielectric,
    )


def _modulus_ratio(modulus: float) -> float:
    """K(k)/K(k') of a modulus k; k' from 1 - k^2 without cancellation for k near 0."""
    square = modulus * modulus
    return float(special.ellipk(square) / special.ellipkm1(square))


def _static(width: float, gap: float, substrate: Substrate, thickness: float) -> StaticLine:
    """Static line with cover and copper thickness."""
    thin = coplanar_strips_static(width, gap, below=(substrate.slab,), above=substrate.cover)
    return thick_line(thin, width, gap, substrate, thickness)


def _filling(width: float, gap: float, substrate: Substrate, thickness: float, index: int) -> float:
    """d eps_eff / d eps_r of the slab (index 0) or a cover layer, from static solutions 1 % apart."""
    layers: list[DielectricLayer] = [substrate.slab, *substrate.cover]
    eps_r = layers[index].eps_r
    low = _static(width, gap, substrate, thickness).eps_eff
    layers[index] = replace(layers[index], eps_r=1.01 * eps_r)
    raised = replace(substrate, eps_r=layers[0].eps_r, cover=tuple(layers[1:]))
    return (_static(width, gap, raised, thickness).eps_eff - low) / (0.01 * eps_r)


def _largest_extent(substrate: Substrate, frequency: float) -> float:
    """Largest gap + 2 x width in m for which the line is quasi-static."""
    return WIDEST * SPEED_OF_LIGHT / (frequency * math.sqrt(0.5 * (substrate.eps_r + 1.0)))


def _require_quasi_static(width: float, gap: float, substrate: Substrate, frequency: float) -> None:
    """Raise `RangeError` where extent of the copper or the slab is not small against the wavelength."""
    require("eps_r", substrate.eps_r, (1.0, 20.0))
    largest = _largest_extent(substrate, frequency)
    require("copper extent, gap + 2 x width,", gap + 2.0 * width, (0.0, largest), "length")
    contrast = math.sqrt(substrate.eps_r - 1.0)
    if contrast:
        thickest = THICKEST_SLAB * SPEED_OF_LIGHT / (frequency * contrast)
        require("slab height", substrate.height, (0.0, thickest), "length")

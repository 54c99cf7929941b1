"""Microstrip by the published closed formulas: statics, strip thickness, dispersion, loss, cover.

Each formula is one function of pure numbers: `ratio` is width over height, `thickness_ratio` strip
thickness over height, frequency in GHz mm where the papers use it. `microstrip_line` joins them.
A cover (solder mask) has no closed formula good enough: the static spectral solution with and
without it gives the ratio by which impedance and permittivity change. Scalar `math` throughout,
so that a thousand lines take well under a second. Equation numbers are from memory.
"""

from __future__ import annotations

import math
from dataclasses import replace

from planar.errors import RangeError
from planar.lines.ranges import require
from planar.lines.records import Conductor, Line, Substrate
from planar.lines.static_spectral import DielectricLayer, StaticLine, microstrip_static
from planar.lines.surface import roughness_factor, skin_depth, surface_resistance
from planar.units import SPEED_OF_LIGHT, WAVE_IMPEDANCE

RATIO_RANGE = (0.1, 10.0)
"""Width over height: where the dispersion of impedance was fitted, the narrowest of the ranges."""
EPS_RANGE = (1.0, 18.0)
FREQUENCY_HEIGHT_RANGE = (0.0, 30.0)
"""Frequency times height in GHz mm (height up to a tenth of the free-space wavelength)."""
THICKEST = 0.5
"""Strip thickness over the smaller of width and height: the widening formula is for thin strips (our limit)."""


def air_impedance(ratio: float) -> float:
    """Impedance in ohm of a thin strip over a plane in air.

    `ratio` = w/h, 0.01 to 100, within 0.03 %. Hammerstad & Jensen, IEEE MTT-S Digest 1980, 407, eqs. 1, 2.
    """
    require("width / height", ratio, (0.01, 100.0))
    shape = 6.0 + (2.0 * math.pi - 6.0) * math.exp(-((30.666 / ratio) ** 0.7528))
    return WAVE_IMPEDANCE / (2.0 * math.pi) * math.log(shape / ratio + math.sqrt(1.0 + (2.0 / ratio) ** 2))


def static_eps_eff(ratio: float, eps_r: float) -> float:
    """Static effective permittivity of a thin strip on a grounded slab.

    `ratio` = w/h, 0.01 to 100, `eps_r` 1 to 128, within 0.2 %. Hammerstad & Jensen 1980, eqs. 3 to 5.
    """
    require("width / height", ratio, (0.01, 100.0))
    require("eps_r", eps_r, (1.0, 128.0))
    fourth = ratio**4
    a = (
        1.0
        + math.log((fourth + (ratio / 52.0) ** 2) / (fourth + 0.432)) / 49.0
        + math.log(1.0 + (ratio / 18.1) ** 3) / 18.7
    )
    b = 0.564 * ((eps_r - 0.9) / (eps_r + 3.0)) ** 0.053
    return (eps_r + 1.0) / 2.0 + (eps_r - 1.0) / 2.0 * math.pow(1.0 + 10.0 / ratio, -a * b)


def widened_ratios(ratio: float, thickness_ratio: float, eps_r: float) -> tuple[float, float]:
    """Width over height of the thin strips that stand for a thick one, in air and on the dielectric.

    `thickness_ratio` = t/h, at most half of the smaller of 1 and `ratio`. Hammerstad & Jensen 1980, eqs. 6, 7.
    """
    if thickness_ratio == 0.0:
        return ratio, ratio
    require("strip thickness / min(width, height)", thickness_ratio / min(ratio, 1.0), (0.0, THICKEST))
    coth = 1.0 / math.tanh(math.sqrt(6.517 * ratio))
    in_air = thickness_ratio / math.pi * math.log(1.0 + 4.0 * math.e / (thickness_ratio * coth**2))
    on_slab = in_air * 0.5 * (1.0 + 1.0 / math.cosh(math.sqrt(eps_r - 1.0)))
    return ratio + in_air, ratio + on_slab


def quasi_static(ratio: float, thickness_ratio: float, eps_r: float) -> StaticLine:
    """Static impedance and effective permittivity of a strip of finite thickness.

    Arguments as `widened_ratios`. Hammerstad & Jensen 1980, eqs. 8, 9.
    """
    in_air, on_slab = widened_ratios(ratio, thickness_ratio, eps_r)
    filled = static_eps_eff(on_slab, eps_r)
    impedance = air_impedance(on_slab)
    narrowed = (air_impedance(in_air) / impedance) ** 2 if thickness_ratio else 1.0
    return StaticLine(impedance / math.sqrt(filled), filled * narrowed)


def dispersed_eps_eff(ratio: float, eps_r: float, static: float, frequency_height: float) -> float:
    """Effective permittivity at frequency, from its `static` value.

    `ratio` 0.1 to 100, `eps_r` 1 to 20, `frequency_height` in GHz mm up to 39 (h/lambda0 0.13); within
    0.6 %. Kirschning & Jansen, Electron. Lett. 18 (1982) 272, eqs. 2, 3 (their GHz cm turned into GHz mm).
    """
    require("width / height", ratio, (0.1, 100.0))
    require("eps_r", eps_r, (1.0, 20.0))
    require("frequency x height in GHz mm", frequency_height, (0.0, 39.0))
    fh = frequency_height
    p1 = 0.27488 + (0.6315 + 0.525 / (1.0 + 0.0157 * fh) ** 20) * ratio - 0.065683 * math.exp(-8.7513 * ratio)
    p2 = 0.33622 * (1.0 - math.exp(-0.03442 * eps_r))
    p3 = 0.0363 * math.exp(-4.6 * ratio) * (1.0 - math.exp(-((fh / 38.7) ** 4.97)))
    p4 = 1.0 + 2.751 * (1.0 - math.exp(-((eps_r / 15.916) ** 8)))
    p = p1 * p2 * math.pow((0.1844 + p3 * p4) * fh, 1.5763)
    return eps_r - (eps_r - static) / (1.0 + p)


def impedance_dispersion(ratio: float, eps_r: float, static: float, dispersed: float, frequency_height: float) -> float:
    """Factor from static impedance to the power-current impedance at frequency.

    `static` and `dispersed` are the effective permittivities; `ratio` 0.1 to 10, `eps_r` 1 to 18,
    `frequency_height` in GHz mm up to 30; within 1 %. Jansen & Kirschning, AEU 37 (1983) 108, eqs. 1 to 16.
    """
    require("width / height", ratio, RATIO_RANGE)
    require("eps_r", eps_r, EPS_RANGE)
    require("frequency x height in GHz mm", frequency_height, FREQUENCY_HEIGHT_RANGE)
    fh, u = frequency_height, ratio
    r1 = min(0.03891 * eps_r**1.4, 20.0)
    r2 = min(0.267 * u**7, 20.0)
    r3 = 4.766 * math.exp(-3.228 * u**0.641)
    r4 = 0.016 + (0.0514 * eps_r) ** 4.524
    r5 = (fh / 28.843) ** 12
    r6 = min(22.20 * u**1.92, 20.0)
    r7 = 1.206 - 0.3144 * math.exp(-r1) * (1.0 - math.exp(-r2))
    r8 = 1.0 + 1.275 * (1.0 - math.exp(-0.004625 * r3 * eps_r**1.674 * (fh / 18.365) ** 2.745))
    contrast = (eps_r - 1.0) ** 6
    r9 = 5.086 * r4 * r5 / (0.3838 + 0.386 * r4) * math.exp(-r6) / (1.0 + 1.2992 * r5)
    r9 *= contrast / (1.0 + 10.0 * contrast)
    r10 = 0.00044 * eps_r**2.136 + 0.0184
    sixth = (fh / 19.47) ** 6
    r11 = sixth / (1.0 + 0.0962 * sixth)
    r12 = 1.0 / (1.0 + 0.00245 * u**2)
    r13 = 0.9408 * dispersed**r8 - 0.9603
    r14 = (0.9408 - r9) * static**r8 - 0.9603
    r15 = 0.707 * r10 * (fh / 12.3) ** 1.097
    r16 = 1.0 + 0.0503 * eps_r**2 * r11 * (1.0 - math.exp(-((u / 15.0) ** 6)))
    r17 = r7 * (1.0 - 1.1241 * r12 / r16 * math.exp(-0.026 * fh**1.15656 - r15))
    return math.pow(r13 / r14, r17)


def current_factor(static_air_impedance: float) -> float:
    """Share by which an uneven current raises or lowers the loss of strip and plane, see `conductor_loss`.

    `static_air_impedance` in ohm, of the same strip with air for dielectric: the current follows the
    magnetic field, which no dielectric changes. exp(-1.2 (Z/eta0)^0.7): Hammerstad & Jensen 1980, eq. 14.
    Within 2.5 % of Wheeler's incremental inductance rule for w/h >= 0.5 and strips a hundredth of the
    height thick; thicker strips lose less than it says (10 to 30 % less at four hundredths).
    """
    return math.exp(-1.2 * (static_air_impedance / WAVE_IMPEDANCE) ** 0.7)


def conductor_loss(width: float, impedance: float, sheet_resistance: float, factor: float) -> float:
    """Attenuation in Np/m by strip and plane: factor Rs/(Z w).

    `width` in m, `impedance` of the line in ohm, `sheet_resistance` in ohm with roughness, `factor` from
    `current_factor` (1: even current, no edge effect). Hammerstad & Jensen 1980, eq. 13, Q turned into
    attenuation; for strips of at least two skin depths.
    """
    return factor * sheet_resistance / (impedance * width)


def dielectric_loss(filling: float, layer: DielectricLayer, frequency: float, eps_eff: float) -> float:
    """Attenuation in Np/m by one dielectric: k0 eps_r tan_d filling/(2 sqrt(eps_eff)).

    `filling` = d eps_eff/d eps_r, (eps_eff - 1)/(eps_r - 1) where one dielectric and air share the field;
    `frequency` in Hz. Welch & Pratt, IEEE Trans. MTT-14 (1966) 332; Schneider, Bell Syst. Tech. J. 48
    (1969) 1421 (both from memory).
    """
    wavenumber = 2.0 * math.pi * frequency / SPEED_OF_LIGHT
    return 0.5 * wavenumber * layer.eps_r * layer.tan_d * filling / math.sqrt(eps_eff)


def cover_ratios(width: float, substrate: Substrate) -> tuple[float, float]:
    """Factors on impedance and effective permittivity by which the cover of `substrate` changes a line.

    `width` in m. Both are 1 without cover. The ratio of two exact static solutions (`microstrip_static`):
    the variational treatment of a covered strip, Yamashita & Mittra, IEEE Trans. MTT-16 (1968) 251,
    and Bahl & Stuchly, IEEE Trans. MTT-28 (1980) 104 (from memory); frequency and strip thickness are
    taken not to change the ratio.
    """
    if not substrate.cover:
        return 1.0, 1.0
    bare = microstrip_static(width, below=(substrate.slab,))
    covered = microstrip_static(width, below=(substrate.slab,), above=substrate.cover)
    return covered.impedance / bare.impedance, covered.eps_eff / bare.eps_eff


def microstrip_wave(
    width: float, gap: float | None, substrate: Substrate, conductor: Conductor, frequency: float
) -> tuple[float, float]:
    """Impedance in ohm and effective permittivity of a microstrip at `frequency` in Hz, without its losses.

    `width` in m, `gap` must be None. Statics, thickness, dispersion and cover together; raises
    `RangeError` outside the range of any of them (w/h 0.1 to 10, eps_r 1 to 18, h up to a tenth of a
    wavelength, copper up to half of width and height).
    """
    if gap is not None:
        raise RangeError("microstrip has no gap, leave it out")
    impedance, bare, cover = _wave(width, substrate, conductor.thickness, frequency)
    return impedance * cover[0], bare * cover[1]


def microstrip_width_limits(
    gap: float | None, substrate: Substrate, conductor: Conductor, frequency: float
) -> tuple[float, float]:
    """Narrowest and widest strip in m the formulas cover; `gap` must be None, `frequency` does not matter."""
    if gap is not None:
        raise RangeError("microstrip has no gap, leave it out")
    narrowest, widest = (ratio * substrate.height for ratio in RATIO_RANGE)
    return max(narrowest, conductor.thickness / THICKEST), widest


def microstrip_line(
    width: float, gap: float | None, substrate: Substrate, conductor: Conductor, frequency: float
) -> Line:
    """Analysed microstrip; `width` in m, `frequency` in Hz, `gap` must be None.

    Raises `RangeError` as `microstrip_wave`, and where the strip is thinner than two skin depths.
    """
    if gap is not None:
        raise RangeError("microstrip has no gap, leave it out")
    require_thick(conductor, frequency)
    bare_impedance, bare_eps, cover = _wave(width, substrate, conductor.thickness, frequency)
    impedance, eps_eff = bare_impedance * cover[0], bare_eps * cover[1]
    ratio = width / substrate.height
    in_air, _ = widened_ratios(ratio, conductor.thickness / substrate.height, substrate.eps_r)
    sheet = rough_sheet_resistance(conductor, frequency)
    filling = (bare_eps - 1.0) / (substrate.eps_r - 1.0) if substrate.eps_r > 1.0 else 1.0
    dielectric = dielectric_loss(filling, substrate.slab, frequency, eps_eff)
    for index, layer in enumerate(substrate.cover):
        if layer.tan_d:
            filling = _cover_filling(width, substrate, index)
            dielectric += dielectric_loss(filling, layer, frequency, eps_eff)
    return Line(
        kind="microstrip",
        width=width,
        gap=None,
        frequency=frequency,
        impedance=impedance,
        eps_eff=eps_eff,
        alpha_conductor=conductor_loss(width, impedance, sheet, current_factor(air_impedance(in_air))),
        alpha_dielectric=dielectric,
    )


def require_thick(conductor: Conductor, frequency: float) -> None:
    """Raise `RangeError` if the strip is thinner than two skin depths at `frequency` in Hz; zero thickness passes."""
    if conductor.thickness:
        two_depths = 2.0 * skin_depth(frequency, conductor.conductivity)
        require("copper thickness", conductor.thickness, (two_depths, 1e-3), "length")


def rough_sheet_resistance(conductor: Conductor, frequency: float) -> float:
    """Surface resistance in ohm of the conductor with its roughness, at `frequency` in Hz."""
    smooth = surface_resistance(frequency, conductor.conductivity)
    return smooth * roughness_factor(frequency, conductor.conductivity, conductor.rq)


def _wave(
    width: float, substrate: Substrate, thickness: float, frequency: float
) -> tuple[float, float, tuple[float, float]]:
    """Impedance and permittivity of the bare line at frequency, and the cover's factors on both."""
    require("width / height", width / substrate.height, RATIO_RANGE)
    require("eps_r", substrate.eps_r, EPS_RANGE)
    ratio, thickness_ratio = width / substrate.height, thickness / substrate.height
    static = quasi_static(ratio, thickness_ratio, substrate.eps_r)
    _, effective = widened_ratios(ratio, thickness_ratio, substrate.eps_r)
    effective = min(effective, RATIO_RANGE[1])
    fh = frequency * substrate.height * 1e-6
    dispersed = dispersed_eps_eff(effective, substrate.eps_r, static.eps_eff, fh)
    factor = impedance_dispersion(effective, substrate.eps_r, static.eps_eff, dispersed, fh)
    return static.impedance * factor, dispersed, cover_ratios(width, substrate)


def _cover_filling(width: float, substrate: Substrate, index: int) -> float:
    """d eps_eff / d eps_r of one cover layer, from static solutions 1 % apart."""
    low, high = (
        microstrip_static(width, below=(substrate.slab,), above=_scaled(substrate.cover, index, factor))
        for factor in (1.0, 1.01)
    )
    return (high.eps_eff - low.eps_eff) / (0.01 * substrate.cover[index].eps_r)


def _scaled(layers: tuple[DielectricLayer, ...], index: int, factor: float) -> tuple[DielectricLayer, ...]:
    """The layers with one permittivity multiplied."""
    changed = replace(layers[index], eps_r=factor * layers[index].eps_r)
    return (*layers[:index], changed, *layers[index + 1 :])

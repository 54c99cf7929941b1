"""A laminate given by its numbers instead of by a library key."""

from __future__ import annotations

from planar.library.dispersion import WidebandDebye
from planar.library.records import Laminate

_GIVEN = "given in the brief; a tolerance not given there is typical, common practice, no source"
_ASSUMED = "not given in the brief; typical of the trade, common practice, no source"


def inline_laminate(
    eps_r: float,
    tan_d: float,
    *,
    at: float,
    eps_r_tolerance: float = 0.05,
    tan_d_tolerance: float = 0.2,
    thickness_tolerance: float = 0.1,
) -> Laminate:
    """Laminate of relative permittivity `eps_r` and loss tangent `tan_d` at the frequency `at` (Hz).

    Tolerances are fractions; those left out, and the copper (5.8e7 S/m, 1.0 um rms rough, foil within 10 %), are
    typical of woven-glass boards (common practice, no source). No thickness or foil is listed, so any will do.
    Raises `RangeError` where no wideband Debye model goes through the point.
    """
    WidebandDebye.from_point(eps_r, tan_d, at=at)
    return Laminate(
        key="inline",
        title=f"laminate of permittivity {eps_r:g} and loss tangent {tan_d:g}, given in the brief",
        material_class="given in the brief",
        specification=None,
        copper_sides=2,
        eps_r=eps_r,
        eps_r_tolerance=eps_r_tolerance,
        tan_d=tan_d,
        tan_d_tolerance=tan_d_tolerance,
        at=at,
        thicknesses=(),
        thickness_tolerance=thickness_tolerance,
        base_coppers=(),
        base_copper_tolerance=0.1,
        roughness_rq=1.0e-6,
        roughness_tolerance=0.5,
        conductivity=5.8e7,
        sources=(("eps_r", _GIVEN), ("tan_d", _GIVEN), ("thickness", _ASSUMED), ("copper", _ASSUMED)),
    )

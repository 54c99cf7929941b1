"""Constants, and quantities with units at the boundary.

Inside planar every number is SI. People write `"1.6 mm"` or `"63 mil"`: `quantity` reads such a
text, `show` writes one. pint knows the units; nothing but this module imports it, and only when a
text is first read, so that starting up costs nothing.
"""

from __future__ import annotations

import math
import re
from functools import cache
from typing import TYPE_CHECKING

from planar.errors import UnitError

if TYPE_CHECKING:
    import pint

SPEED_OF_LIGHT = 299_792_458.0
"""m/s, exact (SI)."""
VACUUM_PERMEABILITY = 1.256_637_061_27e-6
"""H/m (CODATA 2022)."""
VACUUM_PERMITTIVITY = 8.854_187_8188e-12
"""F/m (CODATA 2022)."""
WAVE_IMPEDANCE = 376.730_313_412
"""ohm, of free space (CODATA 2022)."""

KINDS: dict[str, str] = {
    "length": "metre",
    "frequency": "hertz",
    "impedance": "ohm",
    "power": "watt",
    "fraction": "dimensionless",
    "angle": "radian",
    "conductivity": "siemens / metre",
}
"""Kind of quantity -> SI unit it is turned into. `"decibel"` is read beside these."""

EXAMPLES: dict[str, str] = {
    "length": '"1.6 mm"',
    "frequency": '"868.3 MHz"',
    "impedance": '"50 ohm"',
    "power": '"25 mW"',
    "fraction": '"5 %"',
    "angle": '"45 deg"',
    "conductivity": '"5.8e7 S/m"',
    "decibel": '"-10 dB"',
}

_TRADE_UNITS = {"%": "percent", "mil": "thou"}
_PREFIXES = [(1e9, "G"), (1e6, "M"), (1e3, "k"), (1.0, ""), (1e-3, "m"), (1e-6, "u"), (1e-9, "n")]
_SYMBOLS = {"frequency": "Hz", "impedance": "ohm", "power": "W"}
_FIXED = {
    "decibel": (1.0, "dB"),
    "fraction": (0.01, "%"),
    "angle": (math.pi / 180.0, "deg"),
    "conductivity": (1.0, "S/m"),
}
_NUMBER_AND_UNIT = re.compile(r"\s*([+-]?(?:\d+\.?\d*|\.\d+)(?:[eE][+-]?\d+)?)\s*(\S.*?)?\s*")


@cache
def _registry() -> pint.UnitRegistry[float]:
    import pint

    return pint.UnitRegistry(cache_folder=None)


@cache
def _factor(unit: str, kind: str) -> float:
    """SI units of `kind` in one `unit`."""
    import pint

    try:
        one, two = (float(_registry().Quantity(n, unit).to(KINDS[kind]).magnitude) for n in (1.0, 2.0))
    except pint.UndefinedUnitError as error:
        raise UnitError(f"unknown unit {unit!r}, write {EXAMPLES[kind]}") from error
    except pint.DimensionalityError as error:
        raise UnitError(f"{unit!r} is no unit of {kind}, write {EXAMPLES[kind]}") from error
    except Exception as error:  # pint's parser raises many kinds on malformed units
        raise UnitError(f"cannot read unit {unit!r}, write {EXAMPLES[kind]}") from error
    if abs(two - 2.0 * one) > 1e-9 * abs(one):  # dBm, degrees Celsius: no plain factor
        raise UnitError(f"{unit!r} is no plain unit of {kind}, write {EXAMPLES[kind]}")
    return one


def quantity(text: object, kind: str) -> float:
    """SI value of a text such as `"1.6 mm"`.

    `kind` is a key of `KINDS`, or `"decibel"` (returned in dB). Raises `UnitError` when the unit is
    missing, unknown or of another kind.
    """
    if not isinstance(text, str):
        raise UnitError(f"a text with a number and a unit is needed, write {EXAMPLES[kind]}")
    match = _NUMBER_AND_UNIT.fullmatch(text)
    if match is None:
        raise UnitError(f"no number with a unit, write {EXAMPLES[kind]}")
    number, unit = float(match[1]), match[2]
    if unit is None:
        raise UnitError(f"the unit is missing, write {EXAMPLES[kind]}")
    if kind == "decibel":
        if unit.lower() != "db":
            raise UnitError(f"{unit!r} is no decibel, write {EXAMPLES[kind]}")
        value = number
    else:
        value = number * _factor(_TRADE_UNITS.get(unit, unit), kind)
    if not math.isfinite(value):
        raise UnitError(f"not a finite number, write {EXAMPLES[kind]}")
    return value


def show(value: float, kind: str, digits: int = 6) -> str:
    """Text of an SI `value` with a unit a person would choose; `digits` significant digits.

    Lengths below a metre are shown in mm (um below 0.1 mm), as drawings do.
    """
    if kind == "length":
        scale, unit = (1e-6, "um") if 0 < abs(value) < 0.9995e-4 else (1e-3, "mm")
    elif kind in _FIXED:
        scale, unit = _FIXED[kind]
    else:
        scale, prefix = next(((s, p) for s, p in _PREFIXES if abs(value) >= s * 0.9999995), (1.0, ""))
        unit = prefix + _SYMBOLS[kind]
    return f"{value / scale:.{digits}g} {unit}"

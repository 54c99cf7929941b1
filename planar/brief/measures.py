"""What one value of a brief may be, and the words said when it is not.

A `Measure` reads a text with its unit into SI within stated limits and writes it back so that
reading gives the same number. A `Number` is a bare number within limits, a `LibraryKey` the name
of a library entry. All are pydantic annotations: the model in `model.py` is a list of them.
Every refusal names what would be right and, where one fits, the likely meaning.
"""

from __future__ import annotations

import re
import unicodedata
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any, Protocol

from pydantic import GetCoreSchemaHandler, ValidationInfo
from pydantic_core import CoreSchema, core_schema

from planar.brief.nearest import did_you_mean
from planar.errors import UnitError
from planar.units import EXAMPLES, quantity, show

NAME_LENGTH = 50
"""Characters in a name: with 4 bytes each and `-fabrication.zip` behind, a folder entry of 255 bytes holds it."""

_USUAL_UNITS: dict[str, tuple[str, ...]] = {
    "length": ("mm", "mil", "um", "inch", "m"),
    "frequency": ("MHz", "GHz", "kHz", "Hz"),
    "impedance": ("ohm", "kohm"),
    "power": ("mW", "W", "uW"),
    "decibel": ("dB",),
}
_SI_UNITS = {"length": "m", "frequency": "Hz", "impedance": "ohm", "power": "W", "decibel": "dB"}
_NUMBER = re.compile(r"\s*([+-]?(?:\d+\.?\d*|\.\d+)(?:[eE][+-]?\d+)?)\s*(.*?)\s*")
_DEVICE_NAMES = {"con", "prn", "aux", "nul", *(f"{port}{n}" for port in ("com", "lpt") for n in range(1, 10))}
_DIMENSION_NAME = re.compile(r"[a-z][a-z0-9]*(_[a-z0-9]+)*")


class KnownKeys(Protocol):
    """What a brief asks of a library: the keys of its entries of one kind."""

    def keys(self, kind: str, /) -> Sequence[str]:
        """Keys of all entries of `kind` ("laminates", "fabs", "connectors", "covers", "families")."""
        ...


@dataclass(frozen=True)
class Measure:
    """A quantity of `kind` from `low` to `high` (SI, both allowed).

    `limits` is the sentence said about them, with `{low}` and `{high}` where they stand.
    """

    kind: str
    low: float
    high: float
    limits: str

    def read(self, text: object) -> float:
        """SI value of `text`; raises ValueError with what would be right."""
        meant, example = self._meant(text), EXAMPLES[self.kind]
        right = f'"{meant}"' if meant else example
        if not isinstance(text, str):
            raise ValueError(f"a quantity is a text with its unit, write {right}")
        _refuse_trade_habits(text, self.kind)
        try:
            value = quantity(text, self.kind)
        except UnitError as error:
            raise ValueError(str(error).replace(example, right)) from error
        if not self.low <= value <= self.high:
            shown = show(value, self.kind)
            said = "" if shown == text.strip() else f"{text} is {shown}; "
            limits = self.limits.format(low=show(self.low, self.kind), high=show(self.high, self.kind))
            raise ValueError(f"{said}{limits}{f': did you mean {meant}?' if meant else ''}")
        return value

    def write(self, value: float) -> str:
        """Shortest text with a usual unit that reads back to exactly `value`, else the SI number."""
        for digits in range(6, 16):
            text = show(value, self.kind, digits)
            if quantity(text, self.kind) == value:
                return text
        return f"{value!r} {_SI_UNITS[self.kind]}"

    def _meant(self, text: object) -> str | None:
        """The number in `text` with the usual unit, or the sign, that brings it inside the limits."""
        match = _NUMBER.fullmatch(str(text))
        if match is None:
            return None
        number, unit = match[1].lstrip("+-"), match[2].lower()
        for usual in sorted(_USUAL_UNITS[self.kind], key=lambda known: known.lower() != unit):
            for meant in (f"{number} {usual}", f"-{number} {usual}"):
                if self.low <= quantity(meant, self.kind) <= self.high:
                    return meant
        return None

    def __get_pydantic_core_schema__(self, source: Any, handler: GetCoreSchemaHandler) -> CoreSchema:
        return core_schema.no_info_plain_validator_function(
            self.read, serialization=core_schema.plain_serializer_function_ser_schema(self.write)
        )


def _refuse_trade_habits(text: str, kind: str) -> None:
    """Raise ValueError for what people write by habit and the unit tables cannot read, or read wrongly."""
    comma = re.fullmatch(r"\s*(-?\d+),(\d+.*)", text)
    if comma is not None:
        raise ValueError(f"the decimal sign is a point: {comma[1]}.{comma[2]}")
    match = _NUMBER.fullmatch(text)
    unit = match[2].lower() if match else ""
    if kind == "length" and unit.startswith("oz"):
        raise ValueError("copper is given by its thickness: 0.5 oz is 17 um, 1 oz is 35 um, 2 oz is 70 um")
    if kind != "decibel" and unit.startswith("db"):
        example = '"25 mW" (14 dBm is 25 mW, 20 dBm is 100 mW)' if kind == "power" else EXAMPLES[kind]
        raise ValueError(f"a {kind} in decibels is not read, write {example}")


@dataclass(frozen=True)
class Number:
    """A bare number without a unit, from `low` to `high` (both allowed); `limits` as in `Measure`."""

    low: float
    high: float
    limits: str

    def read(self, value: object) -> float:
        """`value` as a float; raises ValueError with what would be right."""
        if isinstance(value, bool) or not isinstance(value, int | float):
            raise ValueError("a bare number, without quotes and without a unit")
        if not self.low <= value <= self.high:
            limits = self.limits.format(low=f"{self.low:g}", high=f"{self.high:g}")
            per_cent = self.high < value and value >= 1 and self.low <= value / 100 <= self.high
            raise ValueError(f"{limits}: did you mean {value / 100:g} ({value:g} %)?" if per_cent else limits)
        return float(value)

    def __get_pydantic_core_schema__(self, source: Any, handler: GetCoreSchemaHandler) -> CoreSchema:
        return core_schema.no_info_plain_validator_function(self.read)


@dataclass(frozen=True)
class LibraryKey:
    """The key of a library entry of `kind`, checked when a library stands in the validation context."""

    kind: str

    def check(self, key: str, info: ValidationInfo) -> str:
        """`key` itself; raises ValueError with the nearest key when the library has no such entry."""
        library: KnownKeys | None = (info.context or {}).get("library")
        if library is None:
            return key
        known = list(library.keys(self.kind))
        if key not in known:
            near = did_you_mean(key, known)
            raise ValueError(f"not among the {self.kind} of the library{near or ': ' + ', '.join(known)}")
        return key

    def __get_pydantic_core_schema__(self, source: Any, handler: GetCoreSchemaHandler) -> CoreSchema:
        return core_schema.with_info_after_validator_function(self.check, handler(source))


def check_name(name: str) -> str:
    """`name` itself when it can name a folder on every common system; ValueError otherwise."""
    if not name:
        raise ValueError("a name is needed: it becomes the folder of the results")
    if len(name) > NAME_LENGTH:
        raise ValueError(f"at most {NAME_LENGTH} characters, this has {len(name)}")
    for character in name:
        if unicodedata.category(character)[0] not in "LMN" and character not in " -_.":
            shown = character if character.isprintable() else f"U+{ord(character):04X}"
            raise ValueError(f"{shown!r} cannot stand in a folder name: letters, digits, space, - _ . only")
    if name[0] in " ." or name[-1] in " .":
        raise ValueError(f'no space or dot at either end, write "{name.strip(" .") or "my-antenna"}"')
    if name.split(".", maxsplit=1)[0].strip().lower() in _DEVICE_NAMES:
        raise ValueError(f'some systems reserve this name, write "{name}-antenna"')
    return name


def check_dimension_name(name: str) -> str:
    """`name` itself when written like `loop_radius`; ValueError otherwise."""
    if _DIMENSION_NAME.fullmatch(name) is None:
        words = re.findall(r"[a-z0-9]+", re.sub(r"(?<=[a-z0-9])(?=[A-Z])", "_", name).lower())
        raise ValueError(f'a dimension is named in small letters and underscores: "{"_".join(words) or "loop_radius"}"')
    return name

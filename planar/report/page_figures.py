"""Numbers as the page shows them: one way from a fact to its text, and back for whoever wants to compare.

Every number stands in a `data` element that names the fact it comes from (`data-key`, a path such as
`prediction.margin_hz.0`) and by what it was multiplied (`data-scale`); texts of the facts stand in elements with
`data-text`. So the page can be walked and held against design.json.
"""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any

from markupsafe import Markup

MINUS = "\N{MINUS SIGN}"


@dataclass(frozen=True)
class Form:
    """How a quantity is written: the fact times `scale` with so many `decimals`, then the `unit`.

    `signed` also shows a plus; `trimmed` leaves out zeros at the end, as a value somebody chose is written. Where
    `digits` is not 0, so many significant digits stand instead of a fixed number of decimals.
    """

    unit: str = ""
    scale: float = 1.0
    decimals: int = 1
    signed: bool = False
    trimmed: bool = False
    digits: int = 0

    def written(self, value: float) -> str:
        """The number without its unit."""
        scaled, decimals = value * self.scale, self.decimals
        if self.digits and scaled != 0.0:
            decimals = max(0, self.digits - 1 - math.floor(math.log10(abs(scaled))))
        number = float(f"{scaled:.{decimals}f}") + 0.0  # no minus before a zero
        text = f"{number:{'+' if self.signed else ''}.{decimals}f}".replace("-", MINUS)
        return text.rstrip("0").rstrip(".") if self.trimmed and "." in text else text


FORMS: Mapping[str, Form] = {
    "db": Form("dB"),
    "lacking_db": Form("dB", -1.0),
    "db2": Form("dB", decimals=2),
    "asked_db": Form("dB", decimals=2, trimmed=True),
    "dbi": Form("dBi", decimals=2),
    "dbm": Form("dBm"),
    "mhz": Form("MHz", 1e-6),
    "asked_mhz": Form("MHz", 1e-6, 4, trimmed=True),
    "mm": Form("mm"),
    "mm3": Form("mm", decimals=3),
    "cm": Form("cm", 0.1, digits=3),
    "ohm": Form("ohm"),
    "asked_ohm": Form("ohm", decimals=2, trimmed=True),
    "percent": Form("%", 100.0),
    "percent0": Form("%", 100.0, 0),
    "percent2": Form("%", 100.0, 2),
    "signed_percent2": Form("%", 100.0, 2, signed=True),
    "shift": Form("%", decimals=2, signed=True),
    "asked_percent": Form("%", 100.0, 2, trimmed=True),
    "mw": Form("mW", 1e3, trimmed=True, digits=3),
    "w_m2": Form("W/m\N{SUPERSCRIPT TWO}", decimals=2),
    "count": Form(decimals=0),
    "bare1": Form(),
    "bare2": Form(decimals=2),
    "bare3": Form(decimals=3),
    "bare4": Form(decimals=4),
    "asked": Form(decimals=6, trimmed=True),
    "signed1": Form(signed=True),
    "signed2": Form(decimals=2, signed=True),
    "percent_bare": Form("", 100.0, 0),
    "mhz_bare": Form("", 1e-6, 2),
    "signed_mhz_bare": Form("", 1e-6, 2, signed=True),
}
"""The forms by name."""


def fact(facts: Mapping[str, Any], key: str) -> Any:
    """The fact at the path `key`, parts separated by dots, places in lists as numbers. Raises `KeyError`."""
    value: Any = facts
    for part in key.split("."):
        try:
            value = value[int(part)] if isinstance(value, Sequence) else value[part]
        except (KeyError, IndexError, TypeError, ValueError) as error:
            raise KeyError(key) from error
    return value


def known(facts: Mapping[str, Any], key: str) -> bool:
    """Whether there is a fact at `key` and it is not None."""
    try:
        return fact(facts, key) is not None
    except KeyError:
        return False


def bare_figure(facts: Mapping[str, Any], key: str, form: str) -> Markup:
    """The number at `key` without its unit, `form` a key of `FORMS`."""
    value, how = float(fact(facts, key)), FORMS[form]
    return Markup('<data value="{}" data-key="{}" data-scale="{}">{}</data>').format(
        repr(value), key, repr(how.scale), how.written(value)
    )


def figure(facts: Mapping[str, Any], key: str, form: str) -> Markup:
    """The number at `key` with its unit, kept on one line."""
    unit, number = FORMS[form].unit, bare_figure(facts, key, form)
    return Markup('<span class="figure">{}&nbsp;{}</span>').format(number, unit) if unit else number


def figure_range(facts: Mapping[str, Any], keys: tuple[str, str], form: str) -> Markup:
    """Two numbers with one unit, from and to."""
    low = bare_figure(facts, keys[0], form)
    return Markup("{} to {}").format(low, figure(facts, keys[1], form))


def complex_figure(facts: Mapping[str, Any], key: str, unit: str = "ohm") -> Markup:
    """A complex number that stands as [real, imaginary] at `key`."""
    real, imaginary = bare_figure(facts, f"{key}.0", "bare1"), bare_figure(facts, f"{key}.1", "signed1")
    return Markup('<span class="figure">{}{}j&nbsp;{}</span>').format(real, imaginary, unit)


def quoted(facts: Mapping[str, Any], key: str) -> Markup:
    """The text at `key` as it stands there."""
    return Markup('<span data-text="{}">{}</span>').format(key, str(fact(facts, key)))

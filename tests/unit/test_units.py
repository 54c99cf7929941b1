"""Quantities with units. Conversions are exact by definition: SI Brochure, 9th ed.; 1 in = 25.4 mm (1959 agreement)."""

import math

import pytest
from hypothesis import given
from hypothesis import strategies as st

from planar.errors import UnitError
from planar.units import (
    EXAMPLES,
    KINDS,
    SPEED_OF_LIGHT,
    VACUUM_PERMEABILITY,
    VACUUM_PERMITTIVITY,
    WAVE_IMPEDANCE,
    quantity,
    show,
)


def test_constants_agree_among_each_other() -> None:
    """c^2 = 1/(mu0 eps0) and Z0 = mu0 c (Maxwell); c exact (SI Brochure); mu0 4 pi 1e-7 to 1e-9 (CODATA 2022)."""
    assert pytest.approx(299_792_458, rel=0) == SPEED_OF_LIGHT
    assert pytest.approx(1.0, rel=1e-11) == VACUUM_PERMEABILITY * VACUUM_PERMITTIVITY * SPEED_OF_LIGHT**2
    assert pytest.approx(VACUUM_PERMEABILITY * SPEED_OF_LIGHT, rel=1e-11) == WAVE_IMPEDANCE
    assert pytest.approx(4e-7 * math.pi, rel=1e-9) == VACUUM_PERMEABILITY


@pytest.mark.parametrize(
    ("text", "kind", "value"),
    [
        ("1.6 mm", "length", 1.6e-3),
        ("1.6mm", "length", 1.6e-3),
        ("  1.6   mm ", "length", 1.6e-3),
        ("63 mil", "length", 63 * 25.4e-6),
        ("63 thou", "length", 63 * 25.4e-6),
        ("0.5 inch", "length", 12.7e-3),
        ("35 um", "length", 35e-6),
        ("35 µm", "length", 35e-6),
        ("-2 cm", "length", -0.02),
        (".5 m", "length", 0.5),
        ("5. m", "length", 5.0),
        ("1e-3 m", "length", 1e-3),
        ("1.5E3 mm", "length", 1.5),
        ("868.3 MHz", "frequency", 868.3e6),
        ("2.44 GHz", "frequency", 2.44e9),
        ("50 ohm", "impedance", 50.0),
        ("50 Ω", "impedance", 50.0),
        ("1 kohm", "impedance", 1000.0),
        ("25 mW", "power", 0.025),
        ("5 %", "fraction", 0.05),
        ("5%", "fraction", 0.05),
        ("180 deg", "angle", math.pi),
        ("5.8e7 S/m", "conductivity", 5.8e7),
        ("58 MS/m", "conductivity", 5.8e7),
        ("-10 dB", "decibel", -10.0),
        ("-10dB", "decibel", -10.0),
        ("3 db", "decibel", 3.0),
    ],
)
def test_texts_with_units(text: str, kind: str, value: float) -> None:
    assert quantity(text, kind) == pytest.approx(value, rel=1e-12)


@pytest.mark.parametrize("kind", sorted(EXAMPLES))
def test_every_example_can_be_read(kind: str) -> None:
    """What an error message tells the user to write must be accepted."""
    assert math.isfinite(quantity(EXAMPLES[kind].strip('"'), kind))
    assert EXAMPLES.keys() == KINDS.keys() | {"decibel"}


@pytest.mark.parametrize(
    ("text", "kind", "said"),
    [
        ("1.6", "length", "unit is missing"),
        ("", "length", "no number"),
        ("mm", "length", "no number"),
        ("one mm", "length", "no number"),
        ("1,6 mm", "length", "cannot read unit|unknown unit"),
        ("1.6 milimeters", "length", "unknown unit 'milimeters'"),
        ("1.6 MHz", "length", "no unit of length"),
        ("50 mm", "impedance", "no unit of impedance"),
        ("1.6 mm mm", "length", "no unit of length"),
        ("1 mm +", "length", "cannot read unit"),
        ("1 m)", "length", "cannot read unit|unknown unit"),
        ("20 dBm", "power", "no plain unit"),
        ("1e400 m", "length", "not a finite number"),
        ("nan m", "length", "no number"),
        ("inf m", "length", "no number"),
        ("-10", "decibel", "unit is missing"),
        ("-10 dBm", "decibel", "no decibel"),
        (1.6, "length", "a text with a number and a unit"),
        (None, "length", "a text with a number and a unit"),
        (True, "length", "a text with a number and a unit"),
        (["1 mm"], "length", "a text with a number and a unit"),
    ],
)
def test_refused_with_what_would_be_right(text: object, kind: str, said: str) -> None:
    with pytest.raises(UnitError, match=said) as caught:
        quantity(text, kind)
    assert EXAMPLES[kind] in str(caught.value)


@pytest.mark.parametrize(
    ("value", "kind", "text"),
    [
        (1.6e-3, "length", "1.6 mm"),
        (35e-6, "length", "35 um"),
        (0.1e-3, "length", "0.1 mm"),
        (0.0, "length", "0 mm"),
        (-1e-5, "length", "-10 um"),
        (0.9225, "length", "922.5 mm"),
        (868.3e6, "frequency", "868.3 MHz"),
        (1e9, "frequency", "1 GHz"),
        (50.0, "impedance", "50 ohm"),
        (1500.0, "impedance", "1.5 kohm"),
        (0.025, "power", "25 mW"),
        (0.05, "fraction", "5 %"),
        (math.pi / 4, "angle", "45 deg"),
        (-10.0, "decibel", "-10 dB"),
        (5.8e7, "conductivity", "5.8e+07 S/m"),
    ],
)
def test_shown_as_a_person_would(value: float, kind: str, text: str) -> None:
    assert show(value, kind) == text


@pytest.mark.parametrize("kind", sorted(EXAMPLES))
@given(number=st.floats(1e-9, 1e12))
def test_shown_text_reads_back(kind: str, number: float) -> None:
    """Invariant: reading what was shown gives the value to the digits shown, here 12 (half a unit of the last)."""
    assert quantity(show(number, kind, 12), kind) == pytest.approx(number, rel=1e-11)


@given(number=st.floats(-1e6, 1e6))
def test_reading_is_linear_in_the_number(number: float) -> None:
    """Invariant: 25.4 mm to the inch at every number, negative ones too."""
    assert quantity(f"{number!r} inch", "length") == pytest.approx(
        quantity(f"{25.4 * number!r} mm", "length"), rel=1e-12
    )

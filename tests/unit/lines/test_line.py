"""Derived properties of a line, and the table of kinds."""

import math

import pytest

from planar.lines.line import LINES, Conductor, Line, Substrate, analyse
from planar.units import SPEED_OF_LIGHT

LINE = Line("microstrip", 3e-3, None, 1e9, 50.0, 4.0, 0.1, 0.2)


def test_derived_values() -> None:
    """Definitions: lambda = c/(f sqrt(e)); 1 Np = 8.685889638 dB."""
    assert pytest.approx(SPEED_OF_LIGHT / 2e9) == LINE.wavelength
    assert LINE.quarter_wave == LINE.wavelength / 4
    assert LINE.loss_db_per_m == pytest.approx(0.3 * 8.685889638, rel=1e-9)


@pytest.mark.parametrize("kind", list(LINES))
def test_every_kind_is_analysed_alike(kind: str) -> None:
    """Analysis and root-finding function of a kind give one impedance, and everything is finite and lossy."""
    row = LINES[kind]
    gap = 0.3e-3 if row.gap_limits else None
    arguments = (1e-3, gap, Substrate(1.6e-3, 4.4, 0.02), Conductor(35e-6, 5.8e7, 1e-6), 0.9e9)
    line = row.analyse(*arguments)
    assert line.kind == kind
    assert row.wave(*arguments) == pytest.approx((line.impedance, line.eps_eff), rel=1e-12)
    assert line.alpha_conductor > 0.0
    assert line.alpha_dielectric > 0.0
    assert math.isfinite(line.loss_db_per_m)


@pytest.mark.parametrize("kind", list(LINES))
def test_roughness_and_frequency_raise_the_loss(kind: str) -> None:
    gap = 0.3e-3 if LINES[kind].gap_limits else None
    substrate = Substrate(1.6e-3, 4.4, 0.0)

    def conductor_loss(rq: float, frequency: float) -> float:
        conductor = Conductor(35e-6, 5.8e7, rq)
        return analyse(
            kind, 1e-3, gap=gap, substrate=substrate, conductor=conductor, frequency=frequency
        ).alpha_conductor

    smooth = conductor_loss(0.0, 1e9)
    assert smooth < conductor_loss(1e-6, 1e9) < 2.0 * smooth
    assert conductor_loss(0.0, 4e9) == pytest.approx(2.0 * smooth, rel=5e-2)  # skin effect: root of frequency

"""The section really matches, the refusal's advice really helps, the bandwidth is that of the ideal section."""

import cmath
import math

import pytest
from hypothesis import assume, given
from hypothesis import strategies as st

from planar.errors import SynthesisError
from planar.lines.quarter_wave import quarter_wave_bandwidth, quarter_wave_section


def input_impedance(line: float, angle: float, load: complex) -> complex:
    """Lossless line, Pozar, Microwave Engineering, eq. 2.44 (from memory), in sines so that 90 degrees is no pole."""
    cos, sin = math.cos(angle), math.sin(angle)
    return line * (load * cos + 1j * line * sin) / (line * cos + 1j * load * sin)


@given(source=st.floats(10.0, 300.0), resistance=st.floats(5.0, 1000.0), reactance=st.floats(-500.0, 500.0))
def test_the_section_matches(source: float, resistance: float, reactance: float) -> None:
    assume(abs(resistance - source) > 1e-3 * source)
    assume(reactance == 0.0 or abs(reactance) > 1e-6)
    load = complex(resistance, reactance)
    try:
        impedance, angle = quarter_wave_section(source, load)
    except SynthesisError:
        assert resistance <= source <= abs(load) ** 2 / resistance * (1 + 1e-9)
        return
    assume(impedance > 1e-3 * source)
    assert 0.0 < angle < math.pi
    assert cmath.isclose(input_impedance(impedance, angle, load), source, rel_tol=1e-6)


@pytest.mark.parametrize("load", [30 + 40j, 49 - 20j, 20 + 30j])
def test_the_advice_helps(load: complex) -> None:
    """Just past either change the refusal names, the load can be matched."""
    with pytest.raises(SynthesisError, match="no single line matches"):
        quarter_wave_section(50.0, load)
    quarter_wave_section(50.0, complex(50.01, load.imag))
    nearest = math.sqrt(load.real * (50.0 - load.real))
    quarter_wave_section(50.0, complex(load.real, math.copysign(0.999 * nearest, load.imag)))
    with pytest.raises(SynthesisError):
        quarter_wave_section(50.0, complex(load.real, math.copysign(1.001 * nearest, load.imag)))


def test_nonsense_is_refused() -> None:
    with pytest.raises(SynthesisError, match="both be positive"):
        quarter_wave_section(50.0, -10 + 0j)
    with pytest.raises(SynthesisError, match="above 1"):
        quarter_wave_bandwidth(50.0, 100.0, 1.0)


def test_bandwidth_edges_have_the_vswr() -> None:
    """At both edges of the band the ideal section's reflection is exactly the limit (definition)."""
    for load, vswr in [(110.0, 2.0), (140.0, 2.0), (340.0, 1.5), (20.0, 1.3)]:
        bandwidth = quarter_wave_bandwidth(50.0, load, vswr)
        line = math.sqrt(50.0 * load)
        for edge in (1.0 - bandwidth / 2.0, 1.0 + bandwidth / 2.0):
            z = input_impedance(line, math.pi / 2.0 * edge, load)
            reflection = abs((z - 50.0) / (z + 50.0))
            assert reflection == pytest.approx((vswr - 1.0) / (vswr + 1.0), rel=1e-9)


def test_a_load_within_the_limit_has_no_edges() -> None:
    assert quarter_wave_bandwidth(50.0, 60.0, 2.0) == 2.0

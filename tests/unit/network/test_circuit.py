"""The circuit's impedance against scikit-rf, and circuits fitted to responses whose elements are known.

One response is not synthetic: a loop computed by planar's own solver, which says what a real loop asks of the circuit.
"""

import dataclasses
import math

import numpy as np
import pytest
import skrf

from planar.errors import RangeError
from planar.network.circuit import (
    Branch,
    Circuit,
    CouplingCapacitor,
    DcBranch,
    LineSection,
    OpenEnd,
    quadrature,
)
from planar.network.circuit_fit import CircuitShape, fit_circuit

F = np.linspace(0.8e9, 1.2e9, 41)
SPAN = (0.8e9, 1.2e9)
LOOP = Branch("loop", 110.0, 75e-9, 0.35e-12)
RADIATING = Branch("loop", 0.0, 75e-9, 0.35e-12, 2.0e3)
HORIZONTAL = Branch("horizontal", 120.0, 95e-9, 0.32e-12)
VERTICAL = Branch("vertical", 120.0, 80e-9, 0.27e-12)
DC = DcBranch(3.0, 60e-9)
CIRCUITS = {
    "bare loop": Circuit((), None, DC, (LOOP,), 0.25e-12, 0.0, SPAN),
    "one line": Circuit((LineSection(95.0, 250e-12),), None, DC, (RADIATING,), 0.25e-12, 0.0, SPAN),
    "circular, capacitor": Circuit(
        (LineSection(70.0, 200e-12),), CouplingCapacitor(4e-12), None, (HORIZONTAL, VERTICAL), 0.2e-12, 0.0, SPAN
    ),
    "two lossy lines, open end": Circuit(
        (LineSection(50.0, 40e-12, 0.01), LineSection(110.0, 240e-12, 0.03)),
        OpenEnd(LineSection(60.0, 180e-12, 0.02)),
        DC,
        (Branch("loop", 8.0, 75e-9, 0.35e-12, 2.0e3),),
        0.25e-12,
        0.0,
        SPAN,
    ),
}


def line_by_scikit_rf(line: LineSection) -> skrf.Network:
    """A matched two-port of the line's own impedance, seen from 50 ohm."""
    frequency = skrf.Frequency.from_f(F, unit="Hz")
    gamma = line.attenuation + 2j * np.pi * F * line.delay
    network = skrf.media.DefinedGammaZ0(frequency, z0=line.impedance, gamma=gamma).line(1.0, "m")
    network.renormalize(50.0)
    return network


def impedance_by_scikit_rf(circuit: Circuit) -> np.ndarray:
    """The same elements as networks of scikit-rf, joined in 50 ohm."""
    media = skrf.media.DefinedGammaZ0(skrf.Frequency.from_f(F, unit="Hz"), z0=50.0, gamma=1j)
    chains = [media.shunt_capacitor(circuit.static_capacitance)]
    if circuit.dc is not None:
        dc = media.resistor(circuit.dc.resistance) ** media.inductor(circuit.dc.inductance) ** media.short()
        chains.append(media.shunt(dc))
    for mode in circuit.modes:
        branch = media.resistor(mode.resistance) ** media.capacitor(mode.capacitance)
        if math.isfinite(mode.radiation):
            branch = branch ** media.shunt(media.resistor(mode.radiation) ** media.short())
        chains.append(media.shunt(branch ** media.inductor(mode.inductance) ** media.short()))
    front = [line_by_scikit_rf(line) for line in circuit.lines]
    if isinstance(circuit.coupling, CouplingCapacitor):
        front.append(media.capacitor(circuit.coupling.capacitance))
    elif circuit.coupling is not None:
        end = line_by_scikit_rf(circuit.coupling.line) ** media.open()
        # A one-port in series, by its definition in S: scikit-rf has series elements, not series networks.
        z = end.z[:, 0, 0] / 50.0
        s = np.array([[z, 2.0 + 0 * z], [2.0 + 0 * z, z]]).transpose(2, 0, 1) / (z + 2.0)[:, None, None]
        front.append(skrf.Network(frequency=media.frequency, s=s, z0=50.0))
    network = media.open()
    for each in reversed(front + chains):
        network = each**network
    return np.asarray(network.z[:, 0, 0])


@pytest.mark.parametrize("name", CIRCUITS)
def test_impedance_agrees_with_scikit_rf(name: str) -> None:
    """Two codings of the same ideal elements: rounding only."""
    circuit = CIRCUITS[name]
    np.testing.assert_allclose(circuit.impedance(F), impedance_by_scikit_rf(circuit), rtol=1e-9)


@pytest.mark.parametrize("name", CIRCUITS)
def test_circuits_are_passive(name: str) -> None:
    """Positive elements only: the resistance is positive at every frequency, also far outside the span."""
    assert (CIRCUITS[name].impedance(np.geomspace(1e6, 1e11, 500)).real > 0.0).all()


@pytest.mark.parametrize("branch", [LOOP, RADIATING, Branch("loop", 8.0, 75e-9, 0.35e-12, 2.0e3)])
def test_resonance_and_quality_are_those_of_the_pole(branch: Branch) -> None:
    """The pole is where the branch's impedance, continued to complex frequency, vanishes: |p| and |p|/(2 |Re p|)."""
    r, l, c, g = branch.resistance, branch.inductance, branch.capacitance, 1.0 / branch.radiation  # noqa: E741
    # R + s L/(1 + s L G) + 1/(s C) = 0, times s C (1 + s L G).
    pole = np.roots([l * c * (1.0 + r * g), r * c + l * g, 1.0])[0]
    assert 2.0 * math.pi * branch.resonance == pytest.approx(abs(pole), rel=1e-12)
    assert branch.quality == pytest.approx(abs(pole) / (2.0 * abs(pole.real)), rel=1e-12)


def test_a_radiation_resistance_grows_with_frequency_squared() -> None:
    """(omega L)^2/R_across while that is small, by the first term of the series: 1 % where the angle is 0.1."""
    branch = Branch("loop", 0.0, 10e-9, 1e-12, 630.0)
    low, high = branch.impedance(np.array([0.5e9, 1e9])).real
    assert high / low == pytest.approx(4.0, rel=0.01)


def test_a_quarter_wave_end_is_a_short_and_a_short_one_a_capacitor() -> None:
    """Pozar, eq. 2.46c: -j Z0 cot(beta l)."""
    end = OpenEnd(LineSection(60.0, 0.25e-9))
    assert abs(complex(end.impedance(1e9))) < 1e-12
    assert complex(end.impedance(1e6)) == pytest.approx(
        complex(CouplingCapacitor(0.25e-9 / 60.0).impedance(1e6)), rel=1e-5
    )


def test_quadrature_of_detuned_modes() -> None:
    """Exact: equal branches detuned to X = -R and X = +R carry equal currents, 45 degrees before and behind."""
    omega, q = 2.0 * math.pi * 1e9, 6.0
    x = 120.0 * q
    first = Branch("horizontal", 120.0, (x + 120.0) / omega, 1.0 / (omega * x))
    second = Branch("vertical", 120.0, (x - 120.0) / omega, 1.0 / (omega * x))
    circuit = Circuit((), None, None, (first, second), 0.0, 0.0, SPAN)
    found = quadrature(circuit, 1e9)
    assert found.current_db == pytest.approx(0.0, abs=1e-9)
    assert found.power_db == pytest.approx(0.0, abs=1e-9)
    assert found.phase_deg == pytest.approx(-90.0, abs=1e-9)


def test_quadrature_of_modes_driven_unequally() -> None:
    """A branch of twice the impedance takes half the current and half the power."""
    half = Branch("vertical", 240.0, 190e-9, 0.16e-12)
    found = quadrature(Circuit((), None, None, (HORIZONTAL, half), 0.0, 0.0, SPAN), 1e9)
    assert found.current_db == pytest.approx(20.0 * math.log10(2.0))
    assert found.power_db == pytest.approx(10.0 * math.log10(2.0))
    assert found.phase_deg == pytest.approx(0.0, abs=1e-9)


def test_quadrature_needs_two_modes() -> None:
    with pytest.raises(RangeError, match="two are needed"):
        quadrature(CIRCUITS["bare loop"], 1e9)


@pytest.mark.parametrize(
    "make",
    [
        lambda: LineSection(-50.0, 1e-10),
        lambda: LineSection(50.0, 1e-10, -0.1),
        lambda: CouplingCapacitor(0.0),
        lambda: DcBranch(0.0, 1e-9),
        lambda: Branch("loop", 0.0, 1e-9, 1e-12),
        lambda: Branch("loop", 1.0, math.nan, 1e-12),
        lambda: Branch("loop", 1.0, 1e-9, 1e-12, -5.0),
        lambda: Circuit((), None, None, (), 0.0, 0.0, SPAN),
        lambda: Circuit((), None, DC, (), -1e-12, 0.0, SPAN),
        lambda: CIRCUITS["bare loop"].impedance(0.0),
        lambda: CircuitShape(modes=()),
        lambda: CircuitShape(modes=("loop", "higher")),
        lambda: CircuitShape(wanted=0.0),
        lambda: fit_circuit(F, F[1:], CircuitShape(), reference=50.0),
        lambda: fit_circuit(F[::-1], F, CircuitShape(), reference=50.0),
        lambda: fit_circuit(F, F, CircuitShape(), reference=0.0),
    ],
)
def test_what_is_no_circuit_is_refused(make) -> None:
    with pytest.raises(RangeError):
        make()


def moved(circuit: Circuit) -> CircuitShape:
    """A shape to fit `circuit` again, its line and coupling off by about a tenth."""
    lines = tuple(
        dataclasses.replace(line, impedance=1.1 * line.impedance, delay=0.92 * line.delay) for line in circuit.lines
    )
    coupling = None if circuit.coupling is None else CouplingCapacitor(0.7 * circuit.coupling.capacitance)
    return CircuitShape(lines, coupling, circuit.dc is not None, tuple(mode.name for mode in circuit.modes))


def values(circuit: Circuit) -> dict[str, float]:
    """Every number of the circuit's elements by a name."""
    found = {"static": circuit.static_capacitance}
    parts = [*circuit.lines, *circuit.modes, *[part for part in (circuit.coupling, circuit.dc) if part is not None]]
    for number, part in enumerate(parts):
        for key, value in dataclasses.asdict(part).items():
            found[f"{number} {type(part).__name__}.{key}"] = value
    return {key: value for key, value in found.items() if not isinstance(value, str)}


@pytest.mark.parametrize("name", ["bare loop", "one line", "circular, capacitor"])
def test_a_circuit_is_found_again(name: str) -> None:
    """Noise-free, so the least sum of squares is zero: 1e-6 in reflection, 1 % in the worst-determined element."""
    circuit = CIRCUITS[name]
    found = fit_circuit(F, circuit.impedance(F), moved(circuit), reference=50.0)
    assert found.deviation < 1e-6
    assert values(found) == pytest.approx(values(circuit), rel=0.01)
    assert found.span == (F[0], F[-1])


COMPUTED_FREQUENCY = np.linspace(1954.5e6, 2902.8e6, 30)
COMPUTED_S = np.array(
    [
        *(-0.741671 + 0.055277j, -0.703576 + 0.122747j, -0.656056 + 0.184182j, -0.599840 + 0.237650j),
        *(-0.536151 + 0.281245j, -0.466742 + 0.313230j, -0.393885 + 0.332207j, -0.320299 + 0.337294j),
        *(-0.249007 + 0.328291j, -0.183130 + 0.305790j, -0.125631 + 0.271212j, -0.079053 + 0.226745j),
        *(-0.045293 + 0.175189j, -0.025442 + 0.119724j, -0.019723 + 0.063643j, -0.027528 + 0.010082j),
        *(-0.047539 - 0.038193j, -0.077907 - 0.078942j, -0.116446 - 0.110530j, -0.160824 - 0.131931j),
        *(-0.208722 - 0.142684j, -0.257955 - 0.142816j, -0.306552 - 0.132747j, -0.352805 - 0.113195j),
        *(-0.395281 - 0.085091j, -0.432822 - 0.049500j, -0.464529 - 0.007565j, -0.489740 + 0.039538j),
        *(-0.508004 + 0.090642j, -0.519055 + 0.144606j),
    ]
)
"""Reflection at 100 ohm of a circular loop for 2.44 GHz behind coplanar strips, computed by planar's own solver."""
COMPUTED_Z = 100.0 * (1.0 + COMPUTED_S) / (1.0 - COMPUTED_S)
STRIPS = LineSection(105.4, 102.4e-12)


def test_a_computed_loop_is_met_within_the_target() -> None:
    """Target: reflection within 0.02 over +-20 %. The deviation stated is the worst, seen from the impedance alone."""
    shape = CircuitShape(lines=(STRIPS,))
    circuit = fit_circuit(COMPUTED_FREQUENCY, COMPUTED_Z, shape, reference=100.0)
    z = circuit.impedance(COMPUTED_FREQUENCY)
    worst = np.abs((z - 100.0) / (z + 100.0) - COMPUTED_S).max()
    assert circuit.deviation == pytest.approx(worst, rel=1e-9)
    assert worst < 0.01
    assert circuit.modes[0].name == "loop"
    assert (circuit.impedance(np.geomspace(1e7, 1e11, 300)).real > 0.0).all()
    (line,) = circuit.lines
    assert 0.5 <= line.impedance / STRIPS.impedance <= 2.0
    assert 0.7 <= line.delay / STRIPS.delay <= 1.4
    assert circuit == fit_circuit(COMPUTED_FREQUENCY, COMPUTED_Z, shape, reference=100.0)


def test_no_more_elements_than_asked_for() -> None:
    """A series resistance meets 0.05 on its own; with nothing further allowed one mode stays and says how bad it is."""
    plain = fit_circuit(COMPUTED_FREQUENCY, COMPUTED_Z, CircuitShape((STRIPS,), wanted=0.05), reference=100.0)
    assert [mode.name for mode in plain.modes] == ["loop"]
    assert math.isinf(plain.modes[0].radiation)
    assert plain.deviation <= 0.05
    alone = fit_circuit(
        COMPUTED_FREQUENCY, COMPUTED_Z, CircuitShape((STRIPS,), wanted=1e-6, further=0), reference=100.0
    )
    assert len(alone.modes) == 1
    assert 1e-6 < alone.deviation < 0.02


def test_further_modes_are_named_by_where_they_lie() -> None:
    """Three modes of which one is asked for: the nearest to 1 GHz has the name, the others what they are to it."""
    far = [Branch("", 0.0, 190e-9, 0.27e-12, 5e3), Branch("", 0.0, 30e-9, 0.35e-12, 2e3)]
    circuit = Circuit((), None, None, (RADIATING, *far), 0.2e-12, 0.0, SPAN)
    found = fit_circuit(F, circuit.impedance(F), CircuitShape(dc=False, wanted=1e-3), reference=50.0)
    assert [mode.name for mode in found.modes] == ["loop", "lower", "higher"]
    assert [mode.resonance for mode in found.modes] == pytest.approx(
        [RADIATING.resonance, *(mode.resonance for mode in far)], rel=0.01
    )

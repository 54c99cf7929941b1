"""The equivalent circuit of a design: what its dimensions say the circuit starts from, then fitted to the solution.

On a guided line the sections are effective ones: the loop trace is a narrow ground, and current that jumps from line
to loop where the line starts and ends moves their impedance far from that of the formulas.
"""

from __future__ import annotations

import math
from collections.abc import Mapping
from typing import Any

import numpy as np
from numpy.typing import NDArray

from planar.design.choices import Choices
from planar.design.first_order import loop_shape
from planar.design.line_size import LineSettings, line_settings
from planar.network.circuit import Branch, Circuit, Coupling, CouplingCapacitor, DcBranch, LineSection, OpenEnd
from planar.network.circuit_fit import CircuitShape, fit_circuit
from planar.units import SPEED_OF_LIGHT

Array = NDArray[np.float64]
Complex = NDArray[np.complex128]


def fitted_circuit(choices: Choices, dimensions: Mapping[str, float], frequency: Array, impedance: Complex) -> Circuit:
    """Circuit of the board of `dimensions` nearest to `impedance` (n,) ohm at `frequency` (n,) Hz."""
    settings = line_settings(choices)
    modes = ("horizontal", "vertical") if choices.circular else ("loop",)
    coupling = None
    if choices.end == "open":
        coupling = OpenEnd(_section("microstrip", dimensions["end_width"], dimensions["end_length"], settings))
    shape = CircuitShape(_lines(choices, dimensions, settings), coupling, not choices.circular, modes)
    return fit_circuit(frequency, impedance, shape, reference=choices.brief.target.impedance)


def _lines(choices: Choices, dimensions: Mapping[str, float], settings: LineSettings) -> tuple[LineSection, ...]:
    """Sections of line from the port to the gap."""
    if "strip_width" in dimensions:
        strips = settings.analysed("coplanar-strips", dimensions["strip_width"], gap=dimensions["strip_gap"])
        return (_timed(strips.impedance, dimensions["strip_length"], strips.eps_eff),)
    if "line_width" not in dimensions:
        return ()
    transformer = dimensions["transformer_length"]
    round_loop = loop_shape(choices, dimensions).perimeter(dimensions["loop_width"])
    half = 0.5 * round_loop - transformer
    return (
        _section("microstrip", dimensions["line_width"], max(half, 0.1 * transformer), settings),
        _section("microstrip", dimensions["transformer_width"], transformer, settings),
    )


def circuit_facts(circuit: Circuit) -> dict[str, Any]:
    """The circuit in plain types, units in the names, from the port inward."""
    coupling: dict[str, float] | None = None
    if isinstance(circuit.coupling, OpenEnd):
        coupling = _line_facts(circuit.coupling.line)
    elif circuit.coupling is not None:
        coupling = {"capacitance_f": circuit.coupling.capacitance}
    return {
        "lines": [_line_facts(line) for line in circuit.lines],
        "coupling": coupling,
        "dc": circuit.dc and {"resistance_ohm": circuit.dc.resistance, "inductance_h": circuit.dc.inductance},
        "modes": [
            {
                "name": mode.name,
                "resonance_hz": mode.resonance,
                "quality": mode.quality,
                "resistance_ohm": mode.resistance,
                "inductance_h": mode.inductance,
                "capacitance_f": mode.capacitance,
                "resistance_across_inductance_ohm": None if math.isinf(mode.radiation) else mode.radiation,
            }
            for mode in circuit.modes
        ],
        "static_capacitance_f": circuit.static_capacitance,
        "worst_reflection_error": circuit.deviation,
        "span_hz": list(circuit.span),
    }


def circuit_of(facts: Mapping[str, Any]) -> Circuit:
    """The circuit that `circuit_facts` told; lines without loss, as told."""
    coupling: Coupling | None = None
    told, dc = facts["coupling"], facts["dc"]
    if told is not None:
        whole = "capacitance_f" in told
        coupling = CouplingCapacitor(told["capacitance_f"]) if whole else OpenEnd(_line_of(told))
    modes = tuple(
        Branch(
            mode["name"],
            mode["resistance_ohm"],
            mode["inductance_h"],
            mode["capacitance_f"],
            mode["resistance_across_inductance_ohm"] or math.inf,
        )
        for mode in facts["modes"]
    )
    return Circuit(
        tuple(_line_of(line) for line in facts["lines"]),
        coupling,
        dc and DcBranch(dc["resistance_ohm"], dc["inductance_h"]),
        modes,
        facts["static_capacitance_f"],
        deviation=facts["worst_reflection_error"],
        span=(facts["span_hz"][0], facts["span_hz"][1]),
    )


def _line_of(facts: Mapping[str, float]) -> LineSection:
    return LineSection(facts["impedance_ohm"], facts["delay_s"])


def _line_facts(line: LineSection) -> dict[str, float]:
    return {"impedance_ohm": line.impedance, "delay_s": line.delay}


def _section(kind: str, width: float, length: float, settings: LineSettings) -> LineSection:
    line = settings.analysed(kind, width)
    return _timed(line.impedance, length, line.eps_eff)


def _timed(impedance: float, length: float, eps_eff: float) -> LineSection:
    return LineSection(impedance, length * eps_eff**0.5 / SPEED_OF_LIGHT)

"""A circuit as the text of a SPICE subcircuit: R, L, C and lossless T elements, known to every SPICE since version 2.

Berkeley's SPICE3 user's manual (T. Quarles et al., 1993) is the authority for the element lines. A line's constant
attenuation is a pad of three resistors of the same impedance ahead of a lossless line, which is exact. A resistor of
1e12 ohm stands wherever a node would have no path for direct current, without which no operating point is found.
"""

from __future__ import annotations

import math
import re
from collections.abc import Iterable

from planar.errors import RangeError
from planar.network.circuit import Branch, Circuit, Coupling, CouplingCapacitor, LineSection
from planar.units import show

DC_PATH = 1e12
"""ohm: 1e-10 of any impedance met here."""
_NAME = re.compile(r"[A-Za-z][A-Za-z0-9_]*", re.ASCII)


def spice_subcircuit(circuit: Circuit, name: str, *, comments: Iterable[str] = ()) -> str:
    """The text of `.subckt name port ground` ... `.ends name` of `circuit`, `comments` one line each above it.

    Values are in ohm, H, F and s to 12 digits, each element below a line that says what it is. The same circuit gives
    the same text, in ASCII. Raises `RangeError` for a name that is not a letter followed by letters, digits or `_`.
    """
    if not _NAME.fullmatch(name):
        raise RangeError(f"subcircuit is named {name!r}: a letter, then letters, digits or _ are needed")
    ends = [show(end, "frequency") for end in circuit.span]
    lines = [f"* {line}".rstrip() for comment in comments for line in comment.splitlines() or [""]]
    lines.append(
        f"* valid from {ends[0]} to {ends[1]}: reflection within {circuit.deviation:.2g} of the response fitted"
    )
    lines.append(f".subckt {name} port ground")
    node = "port"
    for number, line in enumerate(circuit.lines, 1):
        last = number == len(circuit.lines) and circuit.coupling is None
        far = "loop" if last else f"line{number}"
        lines += _line(line, str(number), (node, far, "ground"), f"line section {number}")
        node = far
    if circuit.coupling is not None:
        lines += _coupling(circuit.coupling, node)
        node = "loop"
        if circuit.dc is None:
            lines += _element(f"Rpath {node} ground", DC_PATH, "path for direct current, no part of the antenna")
    return (
        "".join(f"{line}\n" for line in [*lines, *_loop(circuit, node), f".ends {name}"])
        .encode("ascii", "backslashreplace")
        .decode("ascii")
    )


def _loop(circuit: Circuit, node: str) -> list[str]:
    """The branches in parallel between `node` and ground."""
    lines: list[str] = []
    if circuit.dc is not None:
        lines += _element(
            f"Rdc {node} dc",
            circuit.dc.resistance,
            "inductive branch of the loop: resistance",
        )
        lines += _element(
            "Ldc dc ground",
            circuit.dc.inductance,
            "inductive branch of the loop: known in the span only",
        )
    for number, mode in enumerate(circuit.modes, 1):
        lines += _mode(mode, f"m{number}", node)
    if circuit.static_capacitance > 0.0:
        lines += _element(f"Cstatic {node} ground", circuit.static_capacitance, "static capacitance of the gap")
    return lines


def _mode(mode: Branch, tag: str, node: str) -> list[str]:
    """One mode between `node` and ground: capacitance, resistance where there is one in series, inductance."""
    what = f"{mode.name} mode, {show(mode.resonance, 'frequency')}, Q {mode.quality:.3g}:"
    lines = _element(f"C{tag} {node} {tag}", mode.capacitance, f"{what} capacitance")
    coil = tag
    if mode.resistance > 0.0:
        coil = f"{tag}r"
        lines += _element(f"R{tag} {tag} {coil}", mode.resistance, f"{what} resistance")
    lines += _element(f"L{tag} {coil} ground", mode.inductance, f"{what} inductance")
    if math.isfinite(mode.radiation):
        told = "radiation, across the inductance so that it grows with frequency squared"
        lines += _element(f"R{tag}rad {coil} ground", mode.radiation, f"{what} {told}")
    return lines


def _coupling(coupling: Coupling, node: str) -> list[str]:
    """The series element between `node` and the loop."""
    if isinstance(coupling, CouplingCapacitor):
        return _element(f"Ccouple {node} loop", coupling.capacitance, "line end to loop, across the gap")
    lines = _line(coupling.line, "end", (node, "end", "loop"), "line end beyond the gap, open, in series with the loop")
    return [*lines, *_element("Ropen end loop", DC_PATH, "path for direct current, no part of the antenna")]


def _line(line: LineSection, tag: str, nodes: tuple[str, str, str], what: str) -> list[str]:
    """A line from the first of `nodes` to the second, both against the third, its attenuation as a pad ahead of it."""
    near, far, back = nodes
    lines: list[str] = []
    if line.attenuation > 0.0:
        arm, rung = line.impedance * math.tanh(0.5 * line.attenuation), line.impedance / math.sinh(line.attenuation)
        told = f"{what}: {20.0 * line.attenuation / math.log(10.0):.3g} dB of loss"
        lines += _element(f"R{tag}a {near} {tag}mid", arm, told)
        lines += _element(f"R{tag}b {tag}mid {tag}in", arm, told)
        lines += _element(f"R{tag}c {tag}mid {back}", rung, told)
        near = f"{tag}in"
    lines.append(f"* {what}")
    lines.append(f"T{tag} {near} {back} {far} {back} Z0={_number(line.impedance)} TD={_number(line.delay)}")
    return lines


def _element(head: str, value: float, what: str) -> list[str]:
    return [f"* {what}", f"{head} {_number(value)}"]


def _number(value: float) -> str:
    return f"{value:.12g}"

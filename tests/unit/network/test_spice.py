"""The subcircuit's text, solved by a small nodal analysis, must give the circuit's own impedance."""

import math
import re

import numpy as np
import pytest

from planar.errors import RangeError
from planar.network.circuit import Branch, Circuit, CouplingCapacitor, DcBranch, LineSection, OpenEnd
from planar.network.spice import spice_subcircuit

FREQUENCIES = np.linspace(0.7e9, 1.3e9, 7)
SPAN = (0.7e9, 1.3e9)
SERIES = Branch("horizontal", 110.0, 60e-9, 0.45e-12)
RADIATING = Branch("vertical", 0.0, 55e-9, 0.4e-12, 2.6e3)
MIXED = Branch("higher", 6.0, 20e-9, 0.5e-12, 1.1e3)
DC = DcBranch(0.7, 90e-9)
FEED, TRANSFORMER = LineSection(50.0, 30e-12), LineSection(112.0, 280e-12, 0.02)
CIRCUITS = {
    "plain": Circuit((), None, DC, (SERIES,), 0.3e-12, 0.01, SPAN),
    "lines": Circuit((FEED, TRANSFORMER), None, DC, (RADIATING, MIXED), 0.0, 0.01, SPAN),
    "capacitor": Circuit((TRANSFORMER,), CouplingCapacitor(2e-12), DC, (SERIES, RADIATING), 0.2e-12, 0.01, SPAN),
    "open at DC": Circuit((FEED,), CouplingCapacitor(2e-12), None, (SERIES, MIXED), 0.2e-12, 0.01, SPAN),
    "open end": Circuit((FEED,), OpenEnd(LineSection(60.0, 210e-12, 0.03)), None, (SERIES,), 0.2e-12, 0.01, SPAN),
    "end only": Circuit((), OpenEnd(LineSection(60.0, 210e-12)), DC, (RADIATING,), 0.2e-12, 0.01, SPAN),
}


def elements(text: str) -> list[list[str]]:
    """Words of every element line between .subckt and .ends."""
    lines = text.splitlines()
    start = next(i for i, line in enumerate(lines) if line.startswith(".subckt"))
    assert lines[-1].startswith(".ends")
    return [line.split() for line in lines[start + 1 : -1] if not line.startswith("*")]


def solved(text: str, frequency: float) -> complex:
    """Impedance between port and ground by nodal analysis; a T line is Y = (-j cot, j csc)/Z0."""
    omega = 2.0 * math.pi * frequency
    nodes: dict[str, int] = {}
    stamps: list[tuple[str, str, str, str, complex]] = []
    for word, *rest in elements(text):
        if word[0] == "T":
            a, b, c, d, *values = rest
            given = dict(value.split("=") for value in values)
            theta, z0 = omega * float(given["TD"]), float(given["Z0"])
            own, across = -1j / (z0 * math.tan(theta)), 1j / (z0 * math.sin(theta))
            stamps += [(a, b, a, b, own), (c, d, c, d, own), (a, b, c, d, across), (c, d, a, b, across)]
        else:
            a, b, value = rest
            y = {"R": lambda v: 1.0 / v, "L": lambda v: 1.0 / (1j * omega * v), "C": lambda v: 1j * omega * v}
            stamps.append((a, b, a, b, complex(y[word[0]](float(value)))))
    for stamp in stamps:
        for node in stamp[:4]:
            nodes.setdefault(node, len(nodes))
    matrix = np.zeros((len(nodes), len(nodes)), dtype=complex)
    for a, b, c, d, y in stamps:
        for row, row_sign in ((a, 1.0), (b, -1.0)):
            for column, column_sign in ((c, 1.0), (d, -1.0)):
                matrix[nodes[row], nodes[column]] += row_sign * column_sign * y
    kept = [index for node, index in nodes.items() if node != "ground"]
    current = np.zeros(len(kept), dtype=complex)
    port = kept.index(nodes["port"])
    current[port] = 1.0
    return complex(np.linalg.solve(matrix[np.ix_(kept, kept)], current)[port])


@pytest.mark.parametrize("name", CIRCUITS)
def test_text_reproduces_the_impedance(name: str) -> None:
    """1e-9: values are written to 12 digits, and the paths for direct current take 1e-10."""
    circuit = CIRCUITS[name]
    text = spice_subcircuit(circuit, "antenna")
    for frequency in FREQUENCIES:
        assert solved(text, frequency) == pytest.approx(complex(circuit.impedance(frequency)), rel=1e-9)


@pytest.mark.parametrize("name", CIRCUITS)
def test_every_node_has_two_connections_and_a_path_for_direct_current(name: str) -> None:
    """SPICE3 user's manual, circuit description: both are demanded of every node, or there is no operating point."""
    met: dict[str, int] = {}
    joined: dict[str, set[str]] = {}
    for word, *rest in elements(spice_subcircuit(CIRCUITS[name], "antenna")):
        ends = rest[:4] if word[0] == "T" else rest[:2]
        for node in ends:
            met[node] = met.get(node, 0) + 1
        # A line passes direct current along each conductor, not between them.
        pairs = {"T": [(0, 2), (1, 3)], "C": []}.get(word[0], [(0, 1)])
        for i, j in pairs:
            if i < len(ends):
                joined.setdefault(ends[i], set()).add(ends[j])
                joined.setdefault(ends[j], set()).add(ends[i])
    reached, waiting = set(), ["ground", "port"]  # the port is driven from outside
    while waiting:
        node = waiting.pop()
        if node not in reached:
            reached.add(node)
            waiting += joined.get(node, set())
    assert set(met) <= reached
    assert min(count for node, count in met.items() if node != "port") >= 2


def test_text_is_plain_and_every_element_explained() -> None:
    text = spice_subcircuit(CIRCUITS["capacitor"], "orchard_1", comments=["two\nlines", "870 MHz ± 4"])
    assert text == spice_subcircuit(CIRCUITS["capacitor"], "orchard_1", comments=["two\nlines", "870 MHz ± 4"])
    assert text.isascii()
    lines = text.splitlines()
    assert lines[:2] == ["* two", "* lines"]
    assert ".subckt orchard_1 port ground" in lines
    assert lines[-1] == ".ends orchard_1"
    start = lines.index(".subckt orchard_1 port ground") + 1
    for comment, element in zip(lines[start:-1:2], lines[start + 1 : -1 : 2], strict=True):
        assert comment.startswith("* ")
        assert re.fullmatch(r"[RLCT]\w+( \w+){2,4}( Z0=\S+ TD=\S+| \S+)", element)
    names = [element.split()[0].lower() for element in lines[start + 1 : -1 : 2]]
    assert len(set(names)) == len(names)


@pytest.mark.parametrize("name", ["", "1st", "two words", "a-b", "ä"])
def test_names_spice_would_not_read_are_refused(name: str) -> None:
    with pytest.raises(RangeError, match="subcircuit is named"):
        spice_subcircuit(CIRCUITS["plain"], name)

"""The field solver against series and modal solutions of rings.

Sources, in the words of the project's check values. Wire loops: "(C; Fourier series of Storer, AIEE Trans. 75 (1956)
606; Wu, J. Math. Phys. 3 (1962) 1301; King & Smith 1981)", "a flat strip of width w acts as wire radius b = w/4 (M:
Butler 1982; C: 0.2 % at w/a 0.06, 1 % at 0.17)". Printed rings: "modal solution (C)", rebuilt in modal_ring.py.
C means computed independently of this project from published equations, M from memory of the cited source.

Mode 1 of a mesh solution: its current is the Fourier component I_1 of the current through the strip, its impedance
sinc(gamma/2) V/I_1: a source spread evenly over the gap angle gamma drives mode 1 with that share of its voltage.
"""

import math
from collections.abc import Callable
from types import ModuleType
from typing import NamedTuple

import numpy as np
import pytest
from numpy.typing import NDArray
from scipy.special import jv

from planar.field.far_field import far_field
from planar.field.result import point_result
from planar.field.solver import STEPS_PER_WAVELENGTH
from planar.units import SPEED_OF_LIGHT

SERIES = "Fourier series of Storer 1956, Wu 1962 (C), strip for wire b = w/4 (Butler 1982, M)"
PRINTED_RING = "modal solution of a printed ring (C)"
RADIUS = 50e-3
GAP = 2e-3


class Wire(NamedTuple):
    """A line of the table with a mesh fine enough for it, and the tolerance of G and I1."""

    omega: float
    ka: float
    conductance: float
    current: complex
    directivity: float
    mesh: tuple[float, int]
    tolerance: float = 0.015


WIRES = (
    # Mode 1 of the flat ring itself is 1.57 % from the series here, a fine mesh 1.53 %: the default number of cells
    # across meets 1.5 % (1.45 %) by the last bit of its own error only.
    Wire(10.0, 1.0, 5.2270e-3, 5.1337e-3 + 3.5251e-3j, 3.41, (6e-3, 3)),
    # A strip this wide is no wire: mode 1 of the flat ring itself is 2.05 % from the series (test_wide_strip finds the
    # solver nearer to the flat ring), so the series cannot be met closer than that.
    Wire(10.0, 1.1, 6.8857e-3, 6.7725e-3 - 0.1650e-3j, 3.78, (6e-3, 5), 0.0205),
    Wire(12.0, 1.0, 5.1784e-3, 5.1214e-3 + 3.5257e-3j, 3.44, (3e-3, 3)),
    Wire(12.0, 1.1, 6.3930e-3, 6.3240e-3 - 1.6796e-3j, 3.80, (2.2e-3, 4)),
)


def strip_width(omega: float) -> float:
    """Width in m of the strip that acts as the wire of Omega = 2 ln(2 pi a/b), b = w/4."""
    return 8.0 * math.pi * RADIUS * math.exp(-0.5 * omega)


def frequency_of(ka: float) -> float:
    return ka * SPEED_OF_LIGHT / (2.0 * math.pi * RADIUS)


@pytest.mark.parametrize("wire", WIRES, ids=lambda wire: f"Omega {wire.omega:g}, ka {wire.ka:g}")
def test_wire_loops(wire: Wire, field_cases: ModuleType, evidence: Callable[..., None]) -> None:
    """G and I1 within 1.5 % (one line: see there), directivity broadside within 0.05 dB, power balance 0.2 %."""
    step, across = wire.mesh
    frequency = frequency_of(wire.ka)
    board = field_cases.loop(RADIUS, strip_width(wire.omega), GAP)
    problem = field_cases.prepared(board, field_cases.stackup(field_cases.AIR), frequency, step=step, across=across)
    solution = problem.solve(frequency, lossless=True)
    current = 1.0 / field_cases.mode_impedance(solution, GAP / RADIUS)
    broadside = far_field(solution.radiator, np.array([0.0]), np.array([0.0])).intensity[0]
    directivity = 10.0 * math.log10(4.0 * math.pi * broadside / solution.accepted_power)
    share, why = f"{100 * wire.tolerance:g} %", "the flat ring's own mode 1 is up to that far from the wire"
    rows = (
        ("G", 1e3 * wire.conductance, 1e3 * (1.0 / solution.impedance).real, "mS", share, why),
        ("I1/V", 1e3 * wire.current, 1e3 * current, "mS", share, why),
        ("directivity on the axis", wire.directivity, directivity, "dBi", "0.05", "1 % in power"),
    )
    for name, theirs, ours, unit, allowed, reason in rows:
        evidence(
            f"field solver, wire loop, Omega {wire.omega:g}, ka {wire.ka:g}: {name}",
            source=SERIES,
            theirs=theirs,
            ours=ours,
            unit=unit,
            allowed=allowed,
            why=reason,
        )
    evidence(
        "field solver, wire loops: power radiated over power accepted",
        source="conservation of energy, exact",
        theirs=1.0,
        ours=solution.radiated / solution.accepted_power,
        allowed="0.2 %",
        why="two ways to the same power: far field and matrix",
    )


@pytest.mark.parametrize("ka", [1.0, 1.1])
def test_wide_strip(ka: float, modal_ring: ModuleType, field_cases: ModuleType, evidence: Callable[..., None]) -> None:
    """Mode 1 of the flat ring of Omega 10 (w/a 0.17) against its own modal solution, 1.5 %.

    Reference: the modal solution with three edge-weighted terms along phi and two across the strip, which one term
    along phi, the published form, leaves out: that changes Z1 by 2.4 % here and by 0.4 % at w/a 0.06.
    """
    frequency, width = frequency_of(ka), strip_width(10.0)
    ring = modal_ring.Ring(RADIUS, width)
    reference = modal_ring.mode_impedance(1, frequency, ring, modal_ring.Stack())
    one, several = (flat_ring_impedance(modal_ring, frequency, ring, terms) for terms in ((1, 0), (3, 2)))
    reference += several - one  # both cut off at the same wavenumber, which the difference hardly feels
    board = field_cases.loop(RADIUS, width, GAP)
    problem = field_cases.prepared(board, field_cases.stackup(field_cases.AIR), frequency, step=6e-3, across=5)
    found = field_cases.mode_impedance(problem.solve(frequency), GAP / RADIUS)
    evidence(
        f"field solver, flat ring, w/a 0.17, ka {ka:g}: Z1",
        source="modal solution with terms across the strip (C)",
        theirs=reference,
        ours=found,
        unit="ohm",
        allowed="1.5 %",
        why="what the default mesh is good for",
    )


def flat_ring_impedance(modal_ring: ModuleType, frequency: float, ring: object, terms: tuple[int, int]) -> complex:
    """V/I_1 in ohm of a flat ring in free space with `terms` along phi and across, Galerkin in the Hankel domain.

    J_phi = cos(phi) sum a_j T_j(s)/sqrt(1 - s^2), J_rho = sin(phi) sum b_j U_j(s) sqrt(1 - s^2), s across the strip.
    Transforms: TE int rho f J_1' + (1/k) int g J_1, TM int rho g J_1' + (1/k) int f J_1 (from charge and curl).
    """
    stack = modal_ring.Stack()
    path = modal_ring.integration_path(1, frequency, ring, stack, 10.0)
    total = np.zeros((sum(terms), sum(terms)), dtype=complex)
    for k, weights in ((path.bent, path.bent_weights), (path.straight, path.straight_weights)):
        te, tm = flat_ring_transforms(k, ring.radius, ring.width, terms)
        v_e, v_h = modal_ring.interface_voltages(k, frequency, stack)
        total += math.pi * ((te * (weights * k * v_h)) @ te.T + (tm * (weights * k * v_e)) @ tm.T)
    return complex(1.0 / np.linalg.inv(total)[0, 0])


def flat_ring_transforms(
    k: NDArray[np.inexact], radius: float, width: float, terms: tuple[int, int]
) -> tuple[NDArray[np.inexact], NDArray[np.inexact]]:
    """TE and TM transforms (terms, K) in m at wavenumbers `k`, by Gauss-Chebyshev quadrature across the strip."""
    count = 30 + math.ceil(0.6 * float(np.max(np.abs(k))) * width)
    angle = (np.arange(count) + 0.5) * math.pi / count
    rho = radius + 0.5 * width * np.cos(angle)
    argument = np.multiply.outer(k, rho)
    lower, upper = jv(0, argument), jv(2, argument)
    slope, ratio = 0.5 * (lower - upper), 0.5 * (lower + upper)  # J_1' and J_1(x)/x
    along = [rho * np.cos(j * angle) / count for j in range(terms[0])]
    across = [rho * np.sin(j * angle) * np.sin(angle) / count for j in range(1, terms[1] + 1)]
    te = [slope @ f for f in along] + [ratio @ g for g in across]
    tm = [ratio @ f for f in along] + [slope @ g for g in across]
    return np.array(te), np.array(tm)


class Printed(NamedTuple):
    """A printed ring: slabs below it (thickness m, permittivity), metal plane, radius m, f1 in Hz, tolerance of Z1,
    another frequency in Hz and Z1 in ohm there, by a mesh of 2584 edges too where that is known."""

    slabs: tuple[tuple[float, complex], ...]
    metal: bool
    radius: float
    frequency: float
    tolerance: float
    other: tuple[float, complex]
    mesh: complex | None = None


SLAB = (1.6e-3, 4.4 * (1.0 - 0.02j))
PRINTED = {
    "free space": Printed((), False, 16e-3, 3.1876e9, 0.015, (3.1714e9, 142.29 - 6.97j), 143.11 - 6.77j),
    "bare slab": Printed((SLAB,), False, 16e-3, 2.4089e9, 0.015, (2.4e9, 114.32 - 3.92j), 115.02 - 2.99j),
    "grounded slab": Printed((SLAB,), True, 12e-3, 2.2618e9, 0.05, (2.2143e9, 5.45 - 11.72j)),
    "air over metal": Printed(((24.982e-3, 1.0),), True, 16e-3, 3.0370e9, 0.015, (3.0e9, 178.65 - 15.95j)),
}


@pytest.mark.parametrize("name", PRINTED)
def test_printed_rings(
    name: str, modal_ring: ModuleType, field_cases: ModuleType, evidence: Callable[..., None]
) -> None:
    """Strip 1 mm: resonance of mode 1 within 0.4 % of the modal solution, Z1 there within 1.5 % (thin grounded: 5 %),
    Q within 3 %: a difference over 2 % of the frequency stands for the slope.

    Copper without loss, as in the modal solution. The default mesh: 40 steps a wavelength, crossed cells.
    """
    row, gap = PRINTED[name], 0.5e-3
    stack = modal_ring.Stack(row.slabs, row.metal, len(row.slabs))
    expected = modal_ring.resonance(
        modal_ring.Ring(row.radius, 1e-3), stack, (0.95 * row.frequency, 1.05 * row.frequency)
    )
    slabs = [field_cases.Slab(*slab) for slab in row.slabs] or [field_cases.AIR]
    board = field_cases.loop(row.radius, 1e-3, gap)
    stackup, step = field_cases.stackup(*slabs, metal=row.metal), SPEED_OF_LIGHT / row.frequency / STEPS_PER_WAVELENGTH
    problem = field_cases.prepared(board, stackup, 1.03 * row.frequency, step=step, crossed=True)
    found = field_cases.mode_resonance(problem, gap / row.radius, row.frequency)
    at = (found, 0.99 * found, 1.01 * found, row.other[0])
    there, low, high, elsewhere = (field_cases.mode_impedance(problem.solve(f), gap / row.radius) for f in at)
    quality = abs(high - low) / (0.02 * 2.0 * there.real)
    goal = "the solver's goal"
    rows = [
        ("f1", PRINTED_RING, 1e-9 * expected.frequency, 1e-9 * found, "GHz", "0.4 %", goal),
        ("Z1 at f1", PRINTED_RING, expected.impedance, there, "ohm", f"{100 * row.tolerance:g} %", goal),
        ("Q", PRINTED_RING, expected.quality, quality, "", "3 %", "the goal, and a secant for a slope"),
        *elsewhere_rows(row, expected.quality, elsewhere),
    ]
    if name == "grounded slab":
        efficiency = 100.0 * point_result(problem.solve(row.frequency)).efficiency
        rows.append(("efficiency", PRINTED_RING, 11.0, efficiency, "%", "0.5", "half a unit of the printed digit"))
    for quantity, source, theirs, ours, unit, allowed, why in rows:
        evidence(
            f"field solver, ring {name}: {quantity}",
            source=source,
            theirs=theirs,
            ours=ours,
            unit=unit,
            allowed=allowed,
            why=why,
        )


def elsewhere_rows(
    row: Printed, quality: float, found: complex
) -> list[tuple[str, str, complex, complex, str, str, str]]:
    """Z1 `found` at the other frequency of `row`: a resonance that is off by d turns it by 2 Q d of the resistance."""
    frequency, modal = row.other
    name, of_modal = f"Z1 at {1e-9 * frequency:g} GHz", (2.0 * 0.004 * quality + row.tolerance) * abs(modal.real)
    rows = [(name, PRINTED_RING, modal, found, "ohm", f"{of_modal:g}", "0.4 % in f1, and as at f1")]
    if row.mesh is not None:
        source, why = "separate mesh solution, 2584 edges (C)", "stated there: 0.3 % in f1, 0.5 % in resistance"
        of_mesh = (2.0 * 0.003 * quality + 0.005) * abs(row.mesh.real)
        rows.append((name, source, row.mesh, found, "ohm", f"{of_mesh:g}", why))
    return rows

"""The field solver on antennas that every textbook has: the half-wave dipole and the small loop.

Dipole: sinusoidal current, directivity 1.641 (Balanis, Antenna Theory, eq. 4-91; from memory); impedance by Hallen's
integral equation (1938; from memory), solved here. Small loop: R = 20 pi^2 (ka)^4, L = mu0 a (ln(8 a/b) - 2),
directivity 1.5 (from memory). A strip of width w acts as a wire of radius w/4 (Butler 1982; from memory).
"""

import math
from collections.abc import Callable
from types import ModuleType

import numpy as np
import pytest
from scipy.optimize import brentq

from planar.copper.layout import Island, Level, Port, Role
from planar.copper.shapes import rectangle
from planar.field.far_field import far_field
from planar.field.solver import FieldProblem, FieldSolution
from planar.units import SPEED_OF_LIGHT, VACUUM_PERMEABILITY, WAVE_IMPEDANCE

HALF, WIDTH, GAP = 75e-3, 2e-3, 1e-3


def hallen(half: float, radius: float, frequency: float, cells: int = 41) -> complex:
    """Input impedance in ohm of a wire of half length `half` and `radius` m, driven in the middle.

    int I(z') exp(-j k R)/(4 pi R) dz' = C cos(k z) - (j V/(2 eta)) sin(k |z|) with R^2 = (z - z')^2 + radius^2, I = 0
    at both ends: pulses on half the wire, mirrored, matched in their middles, C found with I at the end.
    """
    k, step = 2.0 * math.pi * frequency / SPEED_OF_LIGHT, half / (cells - 1)
    centres = step * np.arange(cells)
    nodes, weights = np.polynomial.legendre.leggauss(40)
    inside = 0.5 * step * nodes

    def kernel(sources: np.ndarray) -> np.ndarray:
        distance = np.sqrt((centres[:, None, None] - sources[None, :, None] - inside) ** 2 + radius**2)
        wave = np.exp(-1j * k * distance) / (4.0 * math.pi * distance)
        return np.asarray(wave @ (0.5 * step * weights))

    matrix = kernel(centres)
    matrix[:, 1:] += kernel(-centres[1:])
    matrix[:, -1] = -np.cos(k * centres)  # the current at the end is none, C takes its place
    drive = -0.5j / WAVE_IMPEDANCE * np.sin(k * centres)
    return complex(1.0 / np.linalg.solve(matrix, drive)[0])


@pytest.fixture(scope="module")
def dipole(field_cases: ModuleType) -> FieldProblem:
    ends = ((-HALF, -0.5 * GAP), (0.5 * GAP, HALF))
    arms = (rectangle(left, -0.5 * WIDTH, right, 0.5 * WIDTH) for left, right in ends)
    islands = [Island(Level.TOP, arm, Role.RADIATOR) for arm in arms]
    board = field_cases.layout(islands, [Port("feed", "gap", Level.TOP, (0.0, 0.0), (1.0, 0.0), GAP, WIDTH)])
    return field_cases.prepared(board, field_cases.stackup(field_cases.AIR), 1.05e9, step=4e-3, across=4)


def broadside_db(solution: FieldSolution) -> float:
    intensity = far_field(solution.radiator, np.array([0.0]), np.array([0.0])).intensity[0]
    return 10.0 * math.log10(4.0 * math.pi * intensity / solution.accepted_power)


def test_resonant_dipole(dipole: FieldProblem, field_cases: ModuleType, evidence: Callable[..., None]) -> None:
    expected = brentq(lambda f: hallen(HALF, 0.25 * WIDTH, f).imag, 0.85e9, 1.0e9, rtol=1e-5)
    found = field_cases.gap_resonance(dipole, (0.9e9, 1.0e9))
    solution = dipole.solve(found, lossless=True)
    scale = 2.0 * HALF / SPEED_OF_LIGHT
    hallens = "Hallen's equation, solved by the test (C), strip for wire b = w/4 (Butler 1982, M)"
    rows = (
        ("length at resonance", hallens, scale * expected, scale * found, "wavelengths", "1 %"),
        ("resistance", hallens, hallen(HALF, 0.25 * WIDTH, expected).real, solution.impedance.real, "ohm", "2 %"),
        ("directivity", "4/Cin(2 pi), sinusoidal current, Balanis (M)", 2.151, broadside_db(solution), "dBi", "0.05"),
    )
    for name, source, theirs, ours, unit, allowed in rows:
        evidence(
            f"field solver, resonant dipole of 2 mm strip, 150 mm: {name}",
            source=source,
            theirs=theirs,
            ours=ours,
            unit=unit,
            allowed=allowed,
            why="a gap of 1 mm for a point; ends of a strip; 1 % in power",
        )


def test_small_loop(field_cases: ModuleType, evidence: Callable[..., None]) -> None:
    """ka 0.03; the current is the part that is even all round, the resistance that of the power radiated."""
    radius, width, ka = 50e-3, 2e-3, 0.03
    frequency = ka * SPEED_OF_LIGHT / (2.0 * math.pi * radius)
    board = field_cases.loop(radius, width, 1e-3)
    problem = field_cases.prepared(board, field_cases.stackup(field_cases.AIR), frequency, step=6e-3)
    solution = problem.solve(frequency, lossless=True)
    even = field_cases.mode_current(solution, 0)
    resistance = solution.radiated / (0.5 * abs(even) ** 2)
    inductance = VACUUM_PERMEABILITY * radius * (math.log(32.0 * radius / width) - 2.0)
    rows = (
        ("radiation resistance", 1e6 * 20.0 * math.pi**2 * ka**4, 1e6 * resistance, "uohm"),
        ("inductance", 1e9 * inductance, 1e9 * (1.0 / even).imag / (2.0 * math.pi * frequency), "nH"),
    )
    for name, theirs, ours, unit in rows:
        evidence(
            f"field solver, small loop, ka 0.03: {name}",
            source="textbook limit (M), strip for wire b = w/4 (Butler 1982, M)",
            theirs=theirs,
            ours=ours,
            unit=unit,
            allowed="1 %",
            why="strip for wire 0.2 %, mesh",
        )

"""Cost of the field solver as ratios taken in one run; nothing here asserts a time.

`pytest tests/benchmarks -q -s` prints the table. Each case also runs once with the suite, at its smallest.
"""

from __future__ import annotations

import statistics
import time
from collections.abc import Callable

import numpy as np
import pytest

from planar.copper.boolean import difference
from planar.copper.layout import Island, Layout, Level, Port, Role
from planar.copper.path import band, loop_path
from planar.copper.shapes import rectangle
from planar.field.band import checked_band
from planar.field.mesh import MeshSettings
from planar.field.solver import FieldProblem
from planar.library import Library, inline_laminate
from planar.stackup import BoardChoice, Stackup, build_stackup

RADIUS, TRACE, GAP, LINE = 46e-3, 6e-3, 2e-3, 1.6e-3
EDGE = rectangle(-0.06, -0.06, 0.06, 0.06)
CASES = {"one level": (1, 8e-3), "two levels": (2, 9e-3)}


def median_time(work: Callable[[], object], rounds: int = 5) -> float:
    times = []
    for _ in range(rounds):
        start = time.perf_counter()
        work()
        times.append(time.perf_counter() - start)
    return statistics.median(times)


def stackup(levels: int) -> Stackup:
    board = BoardChoice(inline_laminate(4.3, 0.02, at=1e9), 1.6e-3, 35e-6, levels, "none")
    return build_stackup(board, Library.open().fab("pool-two-layer"))


def layout(levels: int) -> Layout:
    line = loop_path(2.0 * RADIUS, 2.0 * RADIUS, RADIUS)
    half = 0.5 * line.length
    ring = band(line.between(0.25 * GAP, line.length - 0.25 * GAP), TRACE)
    (cut,) = difference(ring, rectangle(-0.5 * GAP, RADIUS - TRACE, 0.5 * GAP, RADIUS + TRACE))
    ring_level = Level.TOP if levels == 1 else Level.BOTTOM
    islands = [Island(ring_level, cut.normalised(), Role.RADIATOR)]
    ports = [Port("feed", "gap", Level.TOP, (0.0, RADIUS), (1.0, 0.0), GAP, TRACE)]
    if levels == 2:
        end = 0.07 * RADIUS
        guided = line.between(half, line.length).followed_by(line.between(0.0, end))
        islands.append(Island(Level.TOP, band(guided, LINE).normalised(), Role.LINE))
        ports = []
        for name, place, way in (("feed", half, -1.0), ("end", end, 1.0)):
            (x, y), (ux, uy) = line.at(place)
            ports.append(Port(name, "vertical", Level.TOP, (x, y), (way * ux, way * uy), 0.0, LINE))
    return Layout("ring", (Level.TOP, Level.BOTTOM)[:levels], tuple(islands), (), (), tuple(ports), (), (), EDGE, ())


@pytest.mark.parametrize("name", CASES)
def test_one_frequency_against_one_linear_solve(name: str) -> None:
    levels, step = CASES[name]
    problem = FieldProblem.prepare(layout(levels), stackup(levels), 1e9, MeshSettings(step))
    count = problem.basis.count
    random = np.random.default_rng(1)
    matrix = random.standard_normal((count, count)) + 1j * random.standard_normal((count, count))
    load = random.standard_normal(count) + 0j
    problem.solve(0.9e9)
    fill_and_solve = median_time(lambda: problem.solve(0.95e9))
    solve = median_time(lambda: np.linalg.solve(matrix, load))
    print(f"\n{name}: {count} unknowns, fill and solve over one linear solve: {fill_and_solve / solve:.1f}")
    assert problem.solve(0.9e9).admittance[0, 0].real > 0.0  # passive: what was timed is a solution


def test_sweep_against_one_frequency() -> None:
    problem = FieldProblem.prepare(layout(1), stackup(1), 1.15e9, MeshSettings(12e-3))
    problem.solve(1e9)
    single = median_time(lambda: problem.solve(1e9))
    frequency = np.linspace(0.85e9, 1.15e9, 201)
    start = time.perf_counter()
    impedance = checked_band(problem, 0.85e9, 1.15e9, reference=100.0).impedance(frequency)
    sweep = time.perf_counter() - start
    print(f"\n201 points over +-15 %: {sweep / single:.1f} single frequencies, {problem.basis.count} unknowns")
    assert np.all(impedance.real > 0.0)

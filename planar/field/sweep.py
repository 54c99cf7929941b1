"""Many frequencies for the price of a few: the moment matrix interpolated, the port made rational.

f Z(f) is smooth: over +-15 % five Chebyshev nodes carry it to 1e-4 and better, which one further
fill checks. A frequency then costs one factorisation, and a rational model of the port admittance
(AAA) needs about a dozen of them.
"""

from __future__ import annotations

import itertools
import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from planar.errors import RangeError
from planar.field.medium import medium_of
from planar.field.solver import FieldProblem
from planar.network.rational import SampledRational, sampled_rational

Array = NDArray[np.float64]
Complex = NDArray[np.complex128]

NODES = 5
"""Chebyshev nodes of a segment."""
SEGMENT = 1.36
"""Highest over lowest frequency of a segment: +-15 %."""
MATRIX_TOLERANCE = 3e-4
"""Largest error of the interpolated matrix over its largest entry at the frequency that checks it."""
REFLECTION_TOLERANCE = 1e-3
"""Error of the reflection a rational model is sampled to."""


@dataclass(frozen=True, eq=False)
class MatrixSegment:
    """Moment matrix between two frequencies: `matrices` (NODES, n, n) of f Z at the Chebyshev `nodes`, Hz.

    `error` is the largest relative error found at the frequency that checks it.
    """

    problem: FieldProblem
    nodes: Array
    matrices: Complex
    error: float

    @classmethod
    def between(cls, problem: FieldProblem, low: float, high: float) -> MatrixSegment:
        """Fill the nodes from `low` to `high` Hz. Raises `RangeError` when the check misses the tolerance."""
        places = np.cos(np.pi * (np.arange(NODES) + 0.5) / NODES)
        nodes = 0.5 * (low + high) + 0.5 * (high - low) * places
        matrices = np.array([f * _field(problem, float(f)) for f in nodes])
        segment = cls(problem, nodes, matrices, 0.0)
        check = low + 0.07 * (high - low)  # between the outermost two nodes, where such an error is largest
        exact = _field(problem, check)
        error = float(np.abs(segment.matrix(check) - exact).max() / np.abs(exact).max())
        if error > MATRIX_TOLERANCE:
            raise RangeError(f"the interpolated moment matrix is off by {error:.1e}, at most {MATRIX_TOLERANCE:.0e}")
        return cls(problem, nodes, matrices, error)

    def matrix(self, frequency: float) -> Complex:
        """Field part of the moment matrix at `frequency` Hz, (n, n) ohm, by barycentric interpolation."""
        apart = frequency - self.nodes
        if np.any(apart == 0.0):
            at_node: Complex = self.matrices[int(np.argmin(np.abs(apart)))] / frequency
            return at_node
        angles = np.pi * (np.arange(NODES) + 0.5) / NODES
        weights = (-1.0) ** np.arange(NODES) * np.sin(angles) / apart
        mixed = np.tensordot(weights / weights.sum(), self.matrices, axes=1)
        return np.asarray(mixed / frequency, dtype=np.complex128)

    def admittance(self, frequency: float) -> complex:
        """Admittance of the first port at `frequency` Hz, S."""
        problem = self.problem
        matrix = problem.with_copper(self.matrix(frequency), problem.sheet_impedance(frequency))
        port = problem.excitations[0]
        return complex(port @ np.linalg.solve(matrix, port))


def _field(problem: FieldProblem, frequency: float) -> Complex:
    medium, _ = medium_of(problem.stackup, frequency)
    return problem.matrix(frequency, medium)


@dataclass(frozen=True)
class PortModel:
    """Rational model of the first port's admittance over a band. `error` is in reflection at `reference` ohm."""

    model: SampledRational
    reference: float

    def impedance(self, frequency: Array) -> Complex:
        """Input impedance at `frequency` (n,) Hz, ohm."""
        impedance: Complex = 1.0 / self.model.model(frequency)
        return impedance


def port_model(problem: FieldProblem, low: float, high: float, *, reference: float) -> PortModel:
    """Rational model of the port from `low` to `high` Hz, its reflection at `reference` ohm good to 1e-3.

    Raises `RangeError` when sampling does not reach that.
    """
    count = max(1, math.ceil(math.log(high / low) / math.log(SEGMENT) - 1e-9))
    ends = low * (high / low) ** (np.arange(count + 1) / count)
    segments = [MatrixSegment.between(problem, float(a), float(b)) for a, b in itertools.pairwise(ends)]

    def admittance(frequency: float) -> complex:
        number = min(count - 1, int(np.searchsorted(ends[1:-1], frequency)))
        return segments[number].admittance(frequency)

    def reflection(values: Complex) -> Complex:
        return (1.0 - reference * values) / (1.0 + reference * values)

    model = sampled_rational(admittance, (low, high), tolerance=REFLECTION_TOLERANCE, judged=reflection)
    return PortModel(model, reference)

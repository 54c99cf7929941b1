"""A band from a few solutions: the moment equations projected on the currents found at its nodes.

Over a band the currents hardly leave the space spanned by those at a few frequencies in it (reduced basis:
Rozza, Huynh & Patera, Arch. Comput. Methods Eng. 15 (2008) 229). Projected on it the moment matrix is as small as
there are nodes; its field part times f is interpolated, the copper added exactly. The port's admittance is
stationary, so it errs with the square of the current's error. A band costs as many fills and factorisations as it
has nodes, whatever the number of frequencies asked for.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from planar.errors import RangeError
from planar.field.medium import medium_of, surface_voltages
from planar.field.moments import gap_excitation
from planar.field.solver import FieldProblem, FieldSolution
from planar.network.response import reflection

Array = NDArray[np.float64]
Complex = NDArray[np.complex128]
NODES = (4, 6, 9, 13)
"""Nodes tried for a band: four hold +-15 % of a loop to some 1e-4."""
TOLERANCE = 1e-3
"""Error of the reflection a checked band is solved to."""
CHECKED_AT = (0.05, 0.95)
"""Places of the checks in the band: near its ends, where the error is largest."""


@dataclass(frozen=True, eq=False)
class BandSolution:
    """The first port over a band, from `nodes` (k,) Hz.

    `space` (n, k) orthonormal currents, `fields` (k, k, k) of f Z at each node projected on it, `overlap` (k, k) of
    the copper, `drive` (k,) of the port, `moments` (levels, 2, k) A m of each current along x and y.
    """

    problem: FieldProblem
    nodes: Array
    space: Complex
    fields: Complex
    overlap: Complex
    drive: Complex
    moments: Complex

    @classmethod
    def between(cls, problem: FieldProblem, low: float, high: float, nodes: int) -> BandSolution:
        """Solve `problem` at the `nodes` Chebyshev points from `low` to `high` Hz."""
        frequencies = 0.5 * (low + high) + 0.5 * (high - low) * np.cos(_angles(nodes))
        port = problem.excitations[0]
        fields, currents = [], []
        for frequency in frequencies.tolist():
            medium, _ = medium_of(problem.stackup, frequency)
            field = problem.reaching(frequency).matrix(frequency, medium)
            matrix = problem.with_copper(field, problem.sheet_impedance(frequency))
            fields.append(frequency * field)
            currents.append(np.linalg.solve(matrix, port))
        space = np.linalg.qr(np.array(currents).T)[0]
        projected = np.array([space.T @ field @ space for field in fields])
        moments = np.array([_moments(problem, level) @ space for level in sorted(problem.interfaces)])
        return cls(problem, frequencies, space, projected, space.T @ (problem.overlap @ space), port @ space, moments)

    def weights(self, frequencies: Array) -> Complex:
        """Currents in terms of `space` with 1 V at the port, (k, f) A, at `frequencies` (f,) Hz."""
        sheets = np.array([self.problem.sheet_impedance(float(f)) for f in frequencies])
        shares = _barycentric(self.nodes, frequencies) / frequencies[:, None]
        matrices = np.tensordot(shares, self.fields, axes=1) + sheets[:, None, None] * self.overlap
        drive = np.broadcast_to(self.drive, (len(frequencies), len(self.drive)))
        return np.asarray(np.linalg.solve(matrices, drive[..., None])[..., 0].T, dtype=np.complex128)

    def impedance(self, frequencies: Array) -> Complex:
        """Input impedance, (f,) ohm, at `frequencies` (f,) Hz."""
        return np.asarray(1.0 / (self.drive @ self.weights(frequencies)), dtype=np.complex128)

    def solution(self, frequency: float) -> FieldSolution:
        """The solution at `frequency` Hz, its currents rebuilt."""
        medium, _ = medium_of(self.problem.stackup, frequency)
        currents = self.space @ self.weights(np.array([frequency]))
        return FieldSolution(
            self.problem.reaching(frequency), frequency, medium, currents, self.problem.sheet_impedance(frequency)
        )

    def circular_ratio(self, frequencies: Array) -> Complex:
        """Left- over right-hand field toward the top normal, (f,), at `frequencies` (f,) Hz (IEEE Std 145)."""
        weights = self.weights(frequencies)
        field = np.zeros((2, len(frequencies)), dtype=np.complex128)
        for number, frequency in enumerate(frequencies.tolist()):
            medium, _ = medium_of(self.problem.stackup, frequency)
            for level, moments in zip(sorted(self.problem.interfaces), self.moments, strict=True):
                # at the normal TM and TE voltages are one
                outer = surface_voltages(medium, frequency, np.zeros(1), self.problem.interfaces[level]).top[1][0]
                field[:, number] += outer * (moments @ weights[:, number])
        ratio: Complex = (field[0] - 1j * field[1]) / (field[0] + 1j * field[1])
        return ratio


def checked_band(problem: FieldProblem, low: float, high: float, *, reference: float) -> BandSolution:
    """Solution from `low` to `high` Hz with as many nodes as its reflection at `reference` ohm needs.

    Two more frequencies are solved directly, near both ends, where such an error is largest. Raises
    `RangeError` when the most nodes tried do not bring it below the tolerance.
    """
    checks = np.array([low + share * (high - low) for share in CHECKED_AT])
    exact = np.array([problem.reaching(float(f)).solve(float(f)).impedance for f in checks])
    for nodes in NODES:
        band = BandSolution.between(problem, low, high, nodes)
        missed = reflection(band.impedance(checks), reference) - reflection(exact, reference)
        error = float(np.max(np.abs(missed)))
        if error < TOLERANCE:
            return band
    raise RangeError(
        f"the reflection over the band is off by {error:.1e}, at most {TOLERANCE:.0e} is accepted: ask for less at once"
    )


def axial_ratio_db(ratio: Complex) -> Array:
    """Axial ratio, dB, from the ratio of the two circular components, of any shape."""
    size = np.abs(ratio)
    with np.errstate(divide="ignore"):
        decibels: Array = 20.0 * np.log10((1.0 + size) / np.abs(1.0 - size))
    return decibels


def _angles(nodes: int) -> Array:
    angles: Array = np.pi * (np.arange(nodes) + 0.5) / nodes
    return angles


def _barycentric(nodes: Array, frequencies: Array) -> Array:
    """Lagrange polynomials of Chebyshev `nodes` (k,) at `frequencies` (f,), (f, k)."""
    apart = frequencies[:, None] - nodes
    exact = apart == 0.0
    signs = (-1.0) ** np.arange(len(nodes)) * np.sin(_angles(len(nodes)))
    terms = signs / np.where(exact, 1.0, apart)
    shares: Array = terms / terms.sum(axis=1, keepdims=True)
    return np.where(exact.any(axis=1, keepdims=True), exact, shares)


def _moments(problem: FieldProblem, level: int) -> Complex:
    """Integral of each basis function over `level`, (2, n) m: what radiates along x and along y."""
    cells = problem.mesh.level == level
    return np.array([gap_excitation(problem.basis, problem.mesh, cells, np.eye(2)[axis]) for axis in (0, 1)])

"""Characteristic modes of the copper: the currents it would like to carry, whatever drives it.

X J = lambda R J with R + j X the moment matrix without losses (Harrington & Mautz, IEEE Trans. AP-19 (1971) 629),
J' R J = 1. Every port is shorted: the source cells of a gap stay copper and a vertical port is a plain connection, so
a loop is closed and its modes are those the voltage across its gap excites. Cut there it would have other modes, a
bent dipole's, of which the port says nothing. Gaps that are not ports stay open.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from functools import cached_property
from typing import Literal

import numpy as np
from numpy.typing import NDArray
from scipy.interpolate import BarycentricInterpolator
from scipy.linalg import eigh
from scipy.optimize import brentq, linear_sum_assignment

from planar.errors import RangeError
from planar.field.medium import medium_of
from planar.field.solver import FieldProblem, without_loss

Array = NDArray[np.float64]
Complex = NDArray[np.complex128]
Orientation = Literal["horizontal", "vertical", "diagonal", "none"]

ABOVE_NOISE = 3.0
"""Modes are trusted whose radiation stands so many times above the error of the matrix."""
CONDITION = 1e-4
"""Least over largest eigenvalue of R among trusted modes; quadrature leaves R no better than that."""
REFINEMENTS = 2
"""Iterations on the space of the modes: the port's susceptance is then right to 1e-6."""
FULL_WAVE = 0.3
"""Least dipole share of a full-wave mode: cos(phi) on a circle has pi/4, and some goes to line currents that cancel;
uniform current and cos(2 phi) have 0, cos(3 phi) round a square has 0.24."""
DIAGONAL = math.pi / 8.0
"""rad, a dipole moment further than this from both axes is called diagonal."""
SAME = math.sqrt(0.5)
"""Least correlation of one mode at neighbouring frequencies: over half of its radiation is then the other's."""
NEIGHBOURS = 2
"""Frequencies on either side of a resonance that its interpolation uses at most."""
STEEPER = 3.0
"""An interval where lambda changes so many times what it does across the resonance is left out: a pole is near."""


@dataclass(frozen=True, eq=False)
class Mode:
    """One characteristic mode at `frequency` Hz.

    `eigenvalue` lambda, reactive over radiated power: 0 at resonance, positive where magnetic energy prevails.
    `current` (n,) of the basis functions; it radiates 1/2 W (peak values). `drive` is its coupling to 1 V at the first
    port, S^(1/2). `power_share` is its part of the power this port radiates. `moment` (x, y) A m is the integral of
    the current density, `dipole_share` its size over the integral of the density's size, 0 to 1.
    """

    frequency: float
    eigenvalue: float
    current: Array
    drive: float
    power_share: float
    moment: tuple[float, float]
    dipole_share: float

    @property
    def significance(self) -> float:
        """abs(1/(1 + j lambda)), 1 at resonance."""
        return 1.0 / math.hypot(1.0, self.eigenvalue)

    @property
    def admittance(self) -> complex:
        """The mode's part of the first port's admittance, drive^2/(1 + j lambda), S (Harrington & Mautz 1971)."""
        return self.drive**2 / complex(1.0, self.eigenvalue)

    @property
    def angle(self) -> float:
        """Direction of the dipole moment from the x axis, rad in (-pi/2, pi/2]."""
        turned = math.atan2(self.moment[1], self.moment[0])
        return turned - math.pi * math.ceil(turned / math.pi - 0.5)

    @property
    def orientation(self) -> Orientation:
        """Polarisation of a full-wave mode by its dipole moment: "horizontal" along x, "vertical" along y, "diagonal"
        between; "none" where the currents cancel, as in an even loop current or on a line."""
        if self.dipole_share < FULL_WAVE:
            return "none"
        tilt = abs(self.angle)
        if DIAGONAL < tilt < 0.5 * math.pi - DIAGONAL:
            return "diagonal"
        return "horizontal" if tilt <= DIAGONAL else "vertical"


@dataclass(frozen=True, eq=False)
class ModeTrack:
    """One mode followed over frequency: `modes`, frequency ascending, without a break."""

    modes: tuple[Mode, ...]

    @cached_property
    def frequencies(self) -> Array:
        """Frequencies, (f,) Hz."""
        return _fixed(np.array([mode.frequency for mode in self.modes]))

    @cached_property
    def eigenvalues(self) -> Array:
        """Eigenvalues, (f,)."""
        return _fixed(np.array([mode.eigenvalue for mode in self.modes]))

    @cached_property
    def resonance(self) -> float | None:
        """First frequency with lambda = 0, Hz, by a polynomial through the points around; None without one.

        A change of sign counts where lambda runs the same way before and after, as it does not across a pole; with
        two points alone, where atan(lambda) steps by less than pi/2.
        """
        found = self._crossing
        return None if found is None else found[0]

    @cached_property
    def quality(self) -> float | None:
        """Q = omega/2 abs(d lambda/d omega) at the resonance, None without one.

        It is the Q of Yaghjian & Best, IEEE Trans. AP-53 (2005) 1298, eq. 96, of the mode alone, its radiation
        resistance taken as constant, without losses: a lossy board's Q is this times its efficiency.
        """
        found = self._crossing
        return None if found is None else 0.5 * found[0] * abs(found[1])

    @cached_property
    def nearest(self) -> Mode:
        """The solved mode nearest its resonance: the one of least abs(lambda)."""
        return min(self.modes, key=lambda mode: abs(mode.eigenvalue))

    @cached_property
    def _crossing(self) -> tuple[float, float] | None:
        """Frequency in Hz and slope of lambda in 1/Hz at the first resonance."""
        values = self.eigenvalues
        at = next((i for i in range(len(values) - 1) if _through_zero(values, i)), None)
        if at is None:
            return None
        low, high = at, at + 1
        steps = np.diff(values) / (values[at + 1] - values[at])  # an interval that runs on has a positive one
        while low > max(0, at + 1 - NEIGHBOURS) and 0.0 < steps[low - 1] < STEEPER:
            low -= 1
        while high < min(len(values) - 1, at + NEIGHBOURS) and 0.0 < steps[high] < STEEPER:
            high += 1
        scale = float(self.frequencies[at])
        curve = BarycentricInterpolator(self.frequencies[low : high + 1] / scale, values[low : high + 1])
        ends = self.frequencies[at : at + 2] / scale
        root = float(brentq(lambda x: float(curve(x)), float(ends[0]), float(ends[1]), xtol=1e-12))
        return root * scale, float(curve.derivative(root)) / scale


@dataclass(frozen=True, eq=False)
class ModeTable:
    """Modes over `frequencies` (f,) Hz, as tracks: the most significant at the middle frequency first."""

    frequencies: Array
    tracks: tuple[ModeTrack, ...]

    def full_wave(self) -> tuple[ModeTrack, ...]:
        """The two (or fewer) most significant tracks with a dipole moment: a loop's full-wave modes."""
        return tuple(track for track in self.tracks if track.nearest.orientation != "none")[:2]


def characteristic_modes(problem: FieldProblem, frequency: float, count: int = 4) -> tuple[Mode, ...]:
    """The `count` modes of least abs(lambda) at `frequency` Hz, ascending, in the lossless medium.

    Fewer where the next cannot be told from the error of the moment matrix: a ring has n = 0, 1 and 2, five modes.
    Raises `RangeError` for a frequency the problem was not prepared for, or a count below 1.
    """
    _check_count(count)
    return _solved(problem, frequency).modes[:count]


def modes_over(problem: FieldProblem, frequencies: Sequence[float] | Array, count: int = 4) -> ModeTable:
    """The `count` most significant modes at the middle frequency, followed over ascending `frequencies` (f,) Hz.

    A mode goes on as the one it correlates with in radiation, J' R J; its track ends where none has half of it.
    One fill and one factorisation a frequency. Raises as `characteristic_modes`, and `RangeError` for frequencies
    that do not ascend.
    """
    _check_count(count)
    points = np.array(frequencies, dtype=np.float64)
    if len(points) < 2 or np.any(np.diff(points) <= 0.0):
        raise RangeError("modes are followed over two or more ascending frequencies")
    solved = [_solved(problem, float(frequency)) for frequency in points]
    middle = len(points) // 2
    start = list(range(min(count, len(solved[middle].modes))))
    upward = _followed(solved[middle:], start)
    downward = _followed(solved[middle::-1], start)
    return ModeTable(
        _fixed(points),
        tuple(ModeTrack((*down[:0:-1], *up)) for down, up in zip(downward, upward, strict=True)),
    )


@dataclass(frozen=True, eq=False)
class _Solved:
    """All trusted modes at one frequency, and R J (n, m) of each."""

    modes: tuple[Mode, ...]
    radiation: Array


def _check_count(count: int) -> None:
    if count < 1:
        raise RangeError(f"{count} modes asked for, at least 1")


def _through_zero(values: Array, at: int) -> bool:
    """Whether eigenvalues pass zero, not infinity, between points `at` and `at` + 1."""
    first, second = values[at], values[at + 1]
    if first * second > 0.0 or first == second:
        return False
    if len(values) == 2:
        return bool(abs(math.atan(second) - math.atan(first)) < 0.5 * math.pi)
    beside = np.diff(values)[[i for i in (at - 1, at + 1) if 0 <= i < len(values) - 1]]
    return bool(np.all(beside * (second - first) > 0.0))


def _fixed(array: Array) -> Array:
    array.setflags(write=False)
    return array


def _solved(problem: FieldProblem, frequency: float) -> _Solved:
    medium, _ = medium_of(problem.stackup, frequency)
    matrix = problem.matrix(frequency, without_loss(medium))
    matrix = 0.5 * (matrix + matrix.T)
    eigenvalues, currents = _eigenmodes(matrix)
    moments, sizes = _moments(problem, currents)
    signs = _signs(moments)
    currents, moments = currents * signs, moments * signs
    drives = problem.excitations[0].real @ currents
    powers = drives**2 / (1.0 + eigenvalues**2)
    total = float(powers.sum())
    modes = tuple(
        Mode(
            frequency,
            float(eigenvalues[i]),
            _fixed(currents[:, i].copy()),
            float(drives[i]),
            float(powers[i]) / total if total > 0.0 else 0.0,
            (float(moments[0, i]), float(moments[1, i])),
            float(np.hypot(*moments[:, i]) / sizes[i]),
        )
        for i in range(len(eigenvalues))
    )
    return _Solved(modes, matrix.real @ currents)


def _eigenmodes(matrix: Complex) -> tuple[Array, Array]:
    """Eigenvalues (k,) by ascending size, and currents (n, k) with J' R J = 1, of the trusted modes of `matrix` (n, n).

    A mode gives itself back, Z^-1 R J = J/(1 + j lambda): iterating that takes out what the first guess of the space
    has of other currents, at a thirtieth a step.
    """
    inverse = np.asarray(np.linalg.inv(matrix), dtype=np.complex128)
    eigenvalues, currents = _projected(matrix, _radiating(matrix, inverse))
    for _ in range(REFINEMENTS):
        answer = inverse @ (matrix.real @ currents) * (1.0 + 1.0j * eigenvalues)
        eigenvalues, currents = _projected(matrix, answer.real)
    order = np.argsort(np.abs(eigenvalues))
    return eigenvalues[order], currents[:, order]


def _projected(matrix: Complex, space: Array) -> tuple[Array, Array]:
    """Eigenvalues and currents of the problem within the columns of `space` (n, k)."""
    eigenvalues, vectors = eigh(space.T @ matrix.imag @ space, space.T @ matrix.real @ space)
    return eigenvalues, space @ vectors


def _radiating(matrix: Complex, inverse: Complex) -> Array:
    """Columns (n, k) that nearly span the modes radiating above the error of the matrix.

    R itself is useless for this: it is so nearly singular that quadrature errors of a per cent make it indefinite.
    But Re Z^-1 is the sum of J J'/(1 + lambda^2) over the modes, so its leading eigenvectors span the modes of small
    lambda, and the errors of R, met by the large reactance of currents that do not radiate, all but vanish. A true
    Re Z^-1 has no negative eigenvalues: the most negative one tells the error that is left. What passes for a mode
    but makes R too nearly singular again is left out as well.
    """
    scale = 1.0 / np.sqrt(np.abs(np.diag(matrix)))
    admittance = inverse.real / scale[:, None] / scale
    values, vectors = np.linalg.eigh(0.5 * (admittance + admittance.T))
    floor = max(ABOVE_NOISE * abs(min(float(values[0]), 0.0)), 1e-12 * float(values[-1]))
    space: Array = scale[:, None] * vectors[:, values > floor][:, ::-1]
    radiation = space.T @ matrix.real @ space
    count = 1
    while count < len(radiation) and _condition(radiation[: count + 1, : count + 1]) > CONDITION:
        count += 1
    return space[:, :count]


def _condition(symmetric: Array) -> float:
    values = np.linalg.eigvalsh(symmetric)
    return float(values[0] / values[-1])


def _moments(problem: FieldProblem, currents: Array) -> tuple[Array, Array]:
    """Integrals of the current density (2, m) and of its size (m,), A m, of the columns `currents`."""
    mesh, basis = problem.mesh, problem.basis
    density = basis.density.T @ currents
    flow = np.stack(
        [
            mesh.centroids[:, :1] * density - basis.anchor_x.T @ currents,
            mesh.centroids[:, 1:] * density - basis.anchor_y.T @ currents,
        ]
    )  # (2, t, m) A/m at the centroids, exact for the integral of a linear density
    area = mesh.areas[:, None]
    return np.sum(flow * area, axis=1), np.sum(np.hypot(flow[0], flow[1]) * area, axis=0)


def _signs(moments: Array) -> Array:
    """Signs (m,) that turn the larger component of each dipole moment positive."""
    larger = np.where(np.abs(moments[0]) >= np.abs(moments[1]), moments[0], moments[1])
    return np.where(larger < 0.0, -1.0, 1.0)


def _followed(solved: Sequence[_Solved], start: list[int]) -> list[list[Mode]]:
    """The modes numbered `start` of the first of `solved`, each followed through the others until it is lost."""
    tracks = [[solved[0].modes[i]] for i in start]
    going = list(range(len(tracks)))
    for each in solved[1:]:
        if not going:
            break
        seen = np.array([tracks[i][-1].current @ each.radiation for i in going])  # (going, modes) of the expansion
        correlation = np.abs(seen) / np.linalg.norm(seen, axis=1)[:, None]
        rows, columns = linear_sum_assignment(-correlation)
        kept = [(going[r], c) for r, c in zip(rows, columns, strict=True) if correlation[r, c] >= SAME]
        for i, column in kept:
            tracks[i].append(each.modes[column])
        going = [i for i, _ in kept]
    return tracks

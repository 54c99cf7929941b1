"""The equivalent circuit of a printed loop behind its line, as a user draws and tunes it.

From the port inward: sections of line, the coupling of an open line end where there is one, then in parallel the
loop's DC branch (a loop is a short at DC), one series R-L-C for each full-wave mode and one static capacitance. The
parallel part is Foster's second form with losses (R. M. Foster, Bell Syst. Tech. J. 3 (1924) 259): each resonance of a
loop driven at a gap is a pole of its admittance. All elements are positive, so the circuit is passive and can be built.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from planar.errors import RangeError
from planar.units import show

Array = NDArray[np.float64]
Complex = NDArray[np.complex128]


@dataclass(frozen=True)
class LineSection:
    """A section of line: characteristic `impedance` ohm, one-way `delay` s, one-way `attenuation` Np.

    The attenuation does not depend on frequency, which over the span of a circuit it nearly does not. Raises
    `RangeError` unless impedance and delay are positive and the attenuation is not negative.
    """

    impedance: float
    delay: float
    attenuation: float = 0.0

    def __post_init__(self) -> None:
        _positive(self, "impedance", "delay")
        _not_negative(self, "attenuation")

    def seen_through(self, load: ArrayLike, frequency: ArrayLike) -> Complex:
        """Impedance (n,) ohm at the near end with `load` (n,) ohm at the far one, at `frequency` (n,) Hz."""
        return seen_through_line(self.impedance, self.tanh(frequency), load)

    def tanh(self, frequency: ArrayLike) -> Complex:
        """tanh(gamma l), (n,), at `frequency` (n,) Hz."""
        return np.asarray(np.tanh(self.attenuation + _s(frequency) * self.delay), dtype=np.complex128)


@dataclass(frozen=True)
class CouplingCapacitor:
    """A line end that faces the loop across a gap: `capacitance` F in series. Raises `RangeError` unless positive."""

    capacitance: float

    def __post_init__(self) -> None:
        _positive(self, "capacitance")

    def impedance(self, frequency: ArrayLike) -> Complex:
        """1/(j omega C), (n,) ohm, at `frequency` (n,) Hz, not 0."""
        return np.asarray(1.0 / (_s(frequency) * self.capacitance), dtype=np.complex128)


@dataclass(frozen=True)
class OpenEnd:
    """A line that runs on beyond the gap and ends open: it stands in series with the loop.

    A short one is a capacitance delay/impedance, one of a quarter wave a short circuit.
    """

    line: LineSection

    def impedance(self, frequency: ArrayLike) -> Complex:
        """Z0 coth(gamma l), (n,) ohm, at `frequency` (n,) Hz, not 0: Pozar, 3rd ed., eq. 2.91 with an open load."""
        return np.asarray(self.line.impedance / self.line.tanh(frequency), dtype=np.complex128)


Coupling = CouplingCapacitor | OpenEnd


@dataclass(frozen=True)
class DcBranch:
    """The loop's copper as a direct current sees it: `resistance` ohm and `inductance` H in series, both positive."""

    resistance: float
    inductance: float

    def __post_init__(self) -> None:
        _positive(self, "resistance", "inductance")

    def admittance(self, frequency: ArrayLike) -> Complex:
        """1/(R + j omega L), (n,) S, at `frequency` (n,) Hz."""
        return np.asarray(1.0 / (self.resistance + _s(frequency) * self.inductance), dtype=np.complex128)


@dataclass(frozen=True)
class Branch:
    """One full-wave mode: `resistance` ohm, `inductance` H with `radiation` ohm across it, `capacitance` F in series.

    A series resistance is the same at every frequency; one across the inductance acts as a series one that grows with
    the frequency squared, as radiation does: the first-order circuit of L. J. Chu, J. Appl. Phys. 19 (1948) 1163.
    One of the two may be absent: `resistance` 0 or `radiation` infinite. `name` is what the user sees: "loop", or
    "horizontal" and "vertical". Raises `RangeError` for other elements that are not positive, or no resistance at all.
    """

    name: str
    resistance: float
    inductance: float
    capacitance: float
    radiation: float = math.inf

    def __post_init__(self) -> None:
        _positive(self, "inductance", "capacitance")
        _not_negative(self, "resistance")
        if not self.radiation > 0.0 or (self.resistance == 0.0 and math.isinf(self.radiation)):
            raise RangeError(f"mode {self.name} has no resistance: give one in series or across its inductance")

    @property
    def resonance(self) -> float:
        """Undamped frequency of the branch's pole, Hz; 1/(2 pi sqrt(L C)) with either resistance alone."""
        shared = 1.0 + self.resistance / self.radiation
        return 1.0 / (2.0 * math.pi * math.sqrt(self.inductance * self.capacitance * shared))

    @property
    def quality(self) -> float:
        """Quality factor of the branch's pole; sqrt(L/C)/R, or that across over sqrt(L/C), with either alone."""
        wave, shared = math.sqrt(self.inductance / self.capacitance), 1.0 + self.resistance / self.radiation
        return math.sqrt(shared) / (self.resistance / wave + wave / self.radiation)

    def impedance(self, frequency: ArrayLike) -> Complex:
        """R + 1/(1/(j omega L) + 1/R_across) + 1/(j omega C), (n,) ohm, at `frequency` (n,) Hz, not 0."""
        s = _s(frequency)
        coil = 1.0 / (1.0 / (s * self.inductance) + 1.0 / self.radiation)
        impedance: Complex = self.resistance + coil + 1.0 / (s * self.capacitance)
        return impedance


@dataclass(frozen=True)
class Circuit:
    """`lines` from the port inward, `coupling`, then `dc`, `modes` and `static_capacitance` F in parallel.

    `deviation` is the worst abs(delta S) against what the circuit was fitted to, over `span` (low, high) Hz; it claims
    nothing outside that span. There may be no coupling and no DC branch. Raises `RangeError` for a capacitance below
    zero or no branch at all.
    """

    lines: tuple[LineSection, ...]
    coupling: Coupling | None
    dc: DcBranch | None
    modes: tuple[Branch, ...]
    static_capacitance: float
    deviation: float
    span: tuple[float, float]

    def __post_init__(self) -> None:
        _not_negative(self, "static_capacitance")
        if self.dc is None and not self.modes:
            raise RangeError("a circuit needs a DC branch or a mode")

    def admittance(self, frequency: ArrayLike) -> Complex:
        """Admittance (n,) S of the loop itself, behind lines and coupling, at `frequency` (n,) Hz above 0.

        Raises `RangeError` for other frequencies.
        """
        total = _s(_checked(frequency)) * self.static_capacitance
        if self.dc is not None:
            total = total + self.dc.admittance(frequency)
        for mode in self.modes:
            total = total + 1.0 / mode.impedance(frequency)
        return total

    def impedance(self, frequency: ArrayLike) -> Complex:
        """Impedance (n,) ohm at the port, at `frequency` (n,) Hz above 0. Raises `RangeError` for other frequencies."""
        z: Complex = 1.0 / self.admittance(frequency)
        if self.coupling is not None:
            z = z + self.coupling.impedance(frequency)
        for line in reversed(self.lines):
            z = line.seen_through(z, frequency)
        return z


@dataclass(frozen=True)
class Quadrature:
    """Current of a circuit's first mode over that of the second, at `frequency` Hz.

    `current_db` is the ratio of the branch currents, `power_db` that of the powers their resistances take,
    `phase_deg` the phase by which the first leads, in (-180, 180]. Where both modes radiate alike, 0 dB of power and
    90 or -90 degrees are circular polarisation; where the port drives both alike, powers and currents have one ratio.
    """

    frequency: float
    current_db: float
    power_db: float
    phase_deg: float


def quadrature(circuit: Circuit, frequency: float) -> Quadrature:
    """How far the first two modes of `circuit` are from quadrature at `frequency` Hz.

    The branches share one voltage, so their currents are as their admittances, whatever lies in front of them.
    Raises `RangeError` for a circuit of fewer than two modes or a frequency not above 0 Hz.
    """
    if len(circuit.modes) < 2:
        raise RangeError(f"a circuit of {len(circuit.modes)} mode has no quadrature, two are needed")
    first, second = circuit.modes[:2]
    at = float(_checked(frequency))
    ratio = complex(second.impedance(at)) / complex(first.impedance(at))
    current_db = 20.0 * math.log10(abs(ratio))
    share = complex(first.impedance(at)).real / complex(second.impedance(at)).real
    power_db = current_db + 10.0 * math.log10(share)
    return Quadrature(at, current_db, power_db, math.degrees(math.atan2(ratio.imag, ratio.real)))


def seen_through_line(impedance: ArrayLike, tanh: ArrayLike, load: ArrayLike) -> Complex:
    """Impedance, ohm, at the near end of a line of real `impedance` ohm and `tanh` of gamma l with `load` ohm behind.

    Pozar, Microwave Engineering, 3rd ed., eq. 2.91. Shapes are those that numpy broadcasts.
    """
    z0, t, z = np.asarray(impedance), np.asarray(tanh), np.asarray(load, dtype=np.complex128)
    seen: Complex = z0 * (z + z0 * t) / (z0 + z * t)
    return seen


def _s(frequency: ArrayLike) -> Complex:
    """j omega, 1/s."""
    return np.asarray(2j * np.pi * np.asarray(frequency, dtype=np.float64), dtype=np.complex128)


def _checked(frequency: ArrayLike) -> Array:
    points = np.asarray(frequency, dtype=np.float64)
    if not (np.isfinite(points).all() and (points > 0.0).all()):
        raise RangeError(f"a circuit is asked at {show(float(points.min()), 'frequency')}, it must be above 0 Hz")
    return points


def _positive(record: object, *names: str) -> None:
    for name in names:
        value = getattr(record, name)
        if not (math.isfinite(value) and value > 0.0):
            raise RangeError(f"{name} of a {type(record).__name__} is {value:.6g}, it must be positive")


def _not_negative(record: object, *names: str) -> None:
    for name in names:
        value = getattr(record, name)
        if not (math.isfinite(value) and value >= 0.0):
            raise RangeError(f"{name} of a {type(record).__name__} is {value:.6g}, it must not be negative")

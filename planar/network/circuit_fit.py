"""The circuit of positive elements whose reflection is nearest to a computed one.

On a narrow ground line and loop are not separable, so the line sections move with the loop's elements, within stated
ranges of what the line formulas say. Every element is a logarithm, which keeps it positive; modes are resonance,
quality factor and resistance at resonance, which hardly depend on each other. The sum of squares has many minima, so
it is descended from starts spread by a seeded generator, always the same ones.
"""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import dataclass, replace
from functools import cached_property

import numpy as np
import scipy.optimize
from numpy.typing import ArrayLike, NDArray

from planar.errors import RangeError
from planar.network.circuit import (
    Branch,
    Circuit,
    Coupling,
    CouplingCapacitor,
    DcBranch,
    LineSection,
    OpenEnd,
    seen_through_line,
)

Array = NDArray[np.float64]
Complex = NDArray[np.complex128]

IMPEDANCE_RANGE = (0.5, 2.0)
DELAY_RANGE = (0.7, 1.4)
"""How far a line may move from its start, as factors: a narrow ground raises impedance, a step adds delay."""
CAPACITOR_RANGE = (0.1, 10.0)
"""The same for a coupling capacitor."""
PLACE_RANGE = (0.3, 4.0)
"""Resonance of a mode, in the middle of the span: what lies farther off is static or DC."""
QUALITY_RANGE = (0.5, 1e3)
ELEMENT_RANGE = (1e-4, 1e4)
"""Resistance and reactance of an element in the reference impedance."""

STARTS = 20
SEED = 1
START_PLACES = (0.7, 1.5)
START_QUALITIES = (2.0, 12.0)
START_RESISTANCES = (0.5, 4.0)
"""Modes to start from: resonance in the middle of the span, quality factor, resistance in the reference."""
START_LINES = (0.85, 1.15)
"""Line impedances and delays to start from, as factors."""
START_STATIC = 0.02
START_DC = (0.05, 2.0)
"""Susceptance of the static capacitance, resistance and reactance of the DC branch to start from, by the reference."""
STIFFNESS = 0.005
"""rms deviation that moving an impedance or delay by a factor e must gain: line and loop being hard to tell apart, the
line stays near its formulas where the reflection hardly cares."""
LET_GO = 0.1
"""Deviation of the fit without stiffness, over that with it, from which on the lines are what the reflection says."""
PAYS = 0.9
"""Deviation with one more mode, or with radiation, over that without, below which it is kept."""
STEP = 1e-5
"""Of a logarithm, for the derivatives: squared, still above rounding over it."""
FINALISTS = 3
ROUGH, FINE = 25, 200
"""Starts followed to the end, and evaluations spent on each start and on each finalist."""
SETTLED = 1e-9
"""Relative step or gain at which a descent ends."""


@dataclass(frozen=True)
class CircuitShape:
    """What to fit: `lines` and `coupling` to start from, whether there is a `dc` branch, the names of the `modes`.

    `dc` is False where a second gap opens the loop. Names go to the modes nearest the middle of the span,
    in rising resonance. While the deviation is above `wanted`, up to `further` modes are added, named "lower"
    and "higher". Raises `RangeError` for no mode, names that repeat, a `wanted` or `further` out of range.
    """

    lines: tuple[LineSection, ...] = ()
    coupling: Coupling | None = None
    dc: bool = True
    modes: tuple[str, ...] = ("loop",)
    wanted: float = 0.01
    further: int = 2

    def __post_init__(self) -> None:
        if not self.modes or len({*self.modes, "lower", "higher"}) < len(self.modes) + 2:
            raise RangeError(f"modes are {self.modes}: at least one, of different names, not 'lower' or 'higher'")
        if not (self.wanted > 0.0 and self.further >= 0):
            raise RangeError(f"a deviation of {self.wanted:.3g} is wanted with {self.further} further modes")


def fit_circuit(frequency: ArrayLike, impedance: ArrayLike, shape: CircuitShape, *, reference: float) -> Circuit:
    """The circuit of `shape` nearest to `impedance` (n,) ohm at rising `frequency` (n,) Hz.

    Nearest in the sum of abs(delta S)^2 against `reference` ohm; the worst of them is the circuit's `deviation`, which
    the caller judges: a poor fit is returned, not refused. Resistances of the modes stand in series if that reaches
    the wanted deviation, else across the inductances, as radiation does; then modes are added. Line impedances move
    by 0.5 to 2, delays by 0.7 to 1.4, a coupling capacitor by 0.1 to 10; attenuations stay. Raises `RangeError` for
    samples that are no such rows or a reference that is not positive.
    """
    f, z = _checked(frequency, impedance, reference)
    count = len(shape.modes)
    best = _Fit(f, z, reference, shape, count, radiating=False).best()
    for modes in range(count, count + shape.further + 1):
        if best.deviation > shape.wanted:
            more = _Fit(f, z, reference, shape, modes, radiating=True).best()
            best = more if more.deviation < PAYS * best.deviation else best
    return _named(best, shape)


def _checked(frequency: ArrayLike, impedance: ArrayLike, reference: float) -> tuple[Array, Complex]:
    f, z = np.array(frequency, dtype=np.float64), np.array(impedance, dtype=np.complex128)
    if f.ndim != 1 or z.shape != f.shape or len(f) < 3:
        raise RangeError(f"frequency {f.shape} and impedance {z.shape} must be rows of one length, three or more")
    if not (np.isfinite(f).all() and f[0] > 0.0 and (np.diff(f) > 0.0).all() and np.isfinite(z).all()):
        raise RangeError("frequencies must be finite, above 0 Hz and rise, impedances finite")
    if not (math.isfinite(reference) and reference > 0.0):
        raise RangeError(f"reference impedance is {reference:.6g} ohm, it must be positive")
    return f, z


@dataclass(frozen=True, eq=False)
class _Fit:
    """One circuit to fit: `modes` of them, their resistances in series or, `radiating`, across the inductances.

    Its vector: logarithms of impedance and delay of each line from the port inward and of an open end, or of a
    coupling capacitor; of resonance over the middle of the span, quality factor and resistance over the reference of
    each mode; of the static capacitance and of the DC branch's resistance and inductance, as susceptance and
    reactance in the middle of the span over the reference. Vectors may be stacked: (..., v).
    """

    frequency: Array
    z: Complex
    reference: float
    shape: CircuitShape
    modes: int
    radiating: bool
    stiffness: float = STIFFNESS

    def best(self) -> Circuit:
        """The circuit of least deviation that the starts lead to, its lines let go where that brings much."""
        rough = sorted((self._descended(start, ROUGH) for start in self._starts()), key=self._cost)
        held = min((self._descended(vector, FINE) for vector in rough[:FINALISTS]), key=self._deviation)
        free = replace(self, stiffness=0.0)._descended(held, FINE)
        return self._circuit(free if self._deviation(free) < LET_GO * self._deviation(held) else held)

    def _cost(self, vector: Array) -> float:
        return float(np.sum(self._residuals(vector) ** 2))

    def _deviation(self, vector: Array) -> float:
        return self._circuit(vector).deviation

    def _descended(self, start: Array, evaluations: int) -> Array:
        """The vector that least squares reaches from `start` within so many evaluations."""
        low, high = self._bounds
        found = scipy.optimize.least_squares(
            self._residuals,
            np.clip(start, low + 1e-6, high - 1e-6),
            self._slopes,
            bounds=(low, high),
            x_scale="jac",
            ftol=SETTLED,
            xtol=SETTLED,
            gtol=None,
            max_nfev=evaluations,
        )
        return np.asarray(found.x, dtype=np.float64)

    def _residuals(self, vectors: Array) -> Array:
        """Real and imaginary part of S less the S fitted, and the pull on lines that moved, (..., 2 n + m)."""
        miss = self._miss(self._impedance(vectors)) / math.sqrt(len(self.frequency))
        pull = self.stiffness * (vectors - self._home)[..., : len(self._front)]
        return np.concatenate([miss.real, miss.imag, pull], axis=-1)

    def _miss(self, z: Complex) -> Complex:
        """S of `z` less S fitted, without the cancellation of a difference of quotients."""
        return np.asarray(2.0 * self.reference * (z - self.z) / ((z + self.reference) * (self.z + self.reference)))

    def _slopes(self, vector: Array) -> Array:
        """Derivatives of the residuals, (2 n + m, v), by central differences of one stack."""
        steps = STEP * np.eye(len(vector))
        slopes: Array = ((self._residuals(vector + steps) - self._residuals(vector - steps)) / (2.0 * STEP)).T
        return slopes

    def _impedance(self, vectors: Array) -> Complex:
        """Impedance at the port, (..., n) ohm."""
        elements = iter(np.moveaxis(np.exp(vectors), -1, 0)[..., None])
        s = 2j * np.pi * self.frequency
        tanhs = []
        for line in self._lines:
            z0 = next(elements)
            tanhs.append((z0, np.tanh(line.attenuation + s * next(elements))))
        coupling: Array | float = 0.0
        if isinstance(self.shape.coupling, OpenEnd):
            z0, tanh = tanhs.pop()
            coupling = z0 / tanh
        elif self.shape.coupling is not None:
            coupling = 1.0 / (s * next(elements))
        z = self.reference / self._normalised(elements) + coupling
        for z0, tanh in reversed(tanhs):
            z = seen_through_line(z0, tanh, z)
        return np.asarray(z, dtype=np.complex128)

    def _normalised(self, elements: Iterator[Array]) -> Complex:
        """Admittance of the loop times the reference, (..., n)."""
        s = 1j * self.frequency / self._middle
        total = np.zeros_like(s)
        for _ in range(self.modes):
            place, quality, resistance = next(elements), next(elements), next(elements)
            coil, rest = s * quality * resistance / place, place * quality * resistance / s
            if self.radiating:
                total = total + 1.0 / (1.0 / (1.0 / coil + 1.0 / (resistance * quality**2)) + rest)
            else:
                total = total + 1.0 / (resistance + coil + rest)
        total = total + s * next(elements)
        if self.shape.dc:
            total = total + 1.0 / (next(elements) + s * next(elements))
        return np.asarray(total, dtype=np.complex128)

    @cached_property
    def _middle(self) -> float:
        """Middle of the span, Hz."""
        return 0.5 * float(self.frequency[0] + self.frequency[-1])

    @cached_property
    def _lines(self) -> tuple[LineSection, ...]:
        coupling = self.shape.coupling
        return (*self.shape.lines, *((coupling.line,) if isinstance(coupling, OpenEnd) else ()))

    @cached_property
    def _front(self) -> list[tuple[float, tuple[float, float]]]:
        """Start of each element of lines and coupling with the factors by which it may move."""
        front = []
        for line in self._lines:
            front += [(line.impedance, IMPEDANCE_RANGE), (line.delay, DELAY_RANGE)]
        if isinstance(self.shape.coupling, CouplingCapacitor):
            front.append((self.shape.coupling.capacitance, CAPACITOR_RANGE))
        return front

    @cached_property
    def _bounds(self) -> tuple[Array, Array]:
        """Least and largest vector."""
        front = [(value * low, value * high) for value, (low, high) in self._front]
        loop = [PLACE_RANGE, QUALITY_RANGE, ELEMENT_RANGE] * self.modes + [ELEMENT_RANGE] * (3 if self.shape.dc else 1)
        low, high = np.log(np.array(front + loop)).T
        return low, high

    @cached_property
    def _home(self) -> Array:
        """Lines and coupling as given; then the static and DC elements to start from, modes left at the middle."""
        rest = [START_STATIC, *START_DC] if self.shape.dc else [START_STATIC]
        home: Array = np.log([*(value for value, _ in self._front), *[1.0] * (3 * self.modes), *rest])
        return home

    def _starts(self) -> list[Array]:
        """Vectors to start from."""
        random = np.random.default_rng(SEED)
        low, high = np.log([START_PLACES, START_QUALITIES, START_RESISTANCES]).T
        moves = math.log(START_LINES[0]), math.log(START_LINES[1])
        starts = []
        for number in range(STARTS):
            start, front = self._home.copy(), len(self._front)
            start[:front] += random.uniform(*moves, front) * (number > 0)
            start[front : front + 3 * self.modes] = random.uniform(low, high, (self.modes, 3)).ravel()
            starts.append(start)
        return starts

    def _circuit(self, vector: Array) -> Circuit:
        """The circuit of this vector, with its deviation."""
        elements = iter(np.exp(vector).tolist())
        lines = tuple(replace(line, impedance=next(elements), delay=next(elements)) for line in self._lines)
        coupling = self.shape.coupling
        if isinstance(coupling, OpenEnd):
            lines, coupling = lines[:-1], OpenEnd(lines[-1])
        elif coupling is not None:
            coupling = CouplingCapacitor(next(elements))
        omega, z0 = 2.0 * math.pi * self._middle, self.reference
        modes = tuple(
            self._branch(omega * next(elements), next(elements), z0 * next(elements)) for _ in range(self.modes)
        )
        static = next(elements) / (omega * z0)
        dc = DcBranch(z0 * next(elements), z0 / omega * next(elements)) if self.shape.dc else None
        span = float(self.frequency[0]), float(self.frequency[-1])
        circuit = Circuit(lines, coupling, dc, modes, static, 0.0, span)
        return replace(circuit, deviation=float(np.abs(self._miss(circuit.impedance(self.frequency))).max()))

    def _branch(self, omega: float, quality: float, resistance: float) -> Branch:
        """A mode of this resonance, rad/s, and quality with `resistance` ohm at resonance."""
        inductance, capacitance = quality * resistance / omega, 1.0 / (omega * quality * resistance)
        if self.radiating:
            return Branch("", 0.0, inductance, capacitance, resistance * quality**2)
        return Branch("", resistance, inductance, capacitance)


def _named(circuit: Circuit, shape: CircuitShape) -> Circuit:
    """`circuit` with its modes named: those of the shape first, then those below the middle of the span, then above."""
    middle = 0.5 * (circuit.span[0] + circuit.span[1])
    nearest = sorted(circuit.modes, key=lambda mode: abs(math.log(mode.resonance / middle)))
    chosen = sorted(nearest[: len(shape.modes)], key=lambda mode: mode.resonance)
    further = sorted(nearest[len(shape.modes) :], key=lambda mode: mode.resonance)
    names = list(shape.modes)
    for mode in further:
        side = "lower" if mode.resonance < middle else "higher"
        names.append(side if side not in names else f"{side} {1 + sum(name.startswith(side) for name in names)}")
    modes = tuple(replace(mode, name=name) for mode, name in zip(chosen + further, names, strict=True))
    return replace(circuit, modes=modes)

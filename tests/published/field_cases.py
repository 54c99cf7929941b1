"""Hand-built layouts and stackups for the tests of the field solver, and what is read from its solutions.

The copper is drawn by planar.copper, so that what is solved is what would be exported. Layers have a permittivity that
does not depend on frequency, as the sources of the check values assume. Free space is a slab of permittivity 1.
"""

from __future__ import annotations

import itertools
import math
from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from scipy.optimize import brentq

from planar.copper.arc import Point
from planar.copper.drawing import loop_copper, mean_line
from planar.copper.layout import Island, Layout, Level, Port, Role
from planar.copper.outline import Outline
from planar.copper.path import band
from planar.copper.shapes import rectangle
from planar.field.mesh import MeshSettings
from planar.field.potentials import SEVEN_POINTS, SEVEN_WEIGHTS
from planar.field.solver import FieldProblem, FieldSolution
from planar.stackup import Conductor, Layer, LayerKind, Stackup

BOTH = (Level.TOP, Level.BOTTOM)
SMOOTH_COPPER = Conductor(35e-6, 0.0, 5.8e7, 0.0)
PERFECT = Conductor(35e-6, 0.0, 1e20, 0.0)
FR4 = 4.4 * (1.0 - 0.02j)
MASK = 3.5 * (1.0 - 0.025j)


@dataclass(frozen=True)
class Constant:
    """A permittivity eps' - j eps'' at all frequencies, in place of a library model."""

    eps_r: complex

    def permittivity(self, _frequency: float) -> complex:
        """`eps_r`."""
        return self.eps_r


@dataclass(frozen=True)
class Slab:
    """One layer of a hand-built stackup: `thickness` in m and complex relative permittivity."""

    thickness: float
    eps_r: complex


AIR = Slab(1e-3, 1.0)


def stackup(
    *below: Slab,
    above: Sequence[Slab] = (),
    metal: bool = False,
    two_sided: bool = False,
    conductor: Conductor = PERFECT,
) -> Stackup:
    """Copper on the slabs `below` (bottom to top), then those `above`; `metal` puts a plane under all of it.

    `two_sided` puts the bottom copper under the lowest slab.
    """
    layers: list[Layer] = []
    if metal:
        layers.append(Layer("plane", LayerKind.METAL_PLANE, "metal", 0.0))
    if two_sided:
        layers.append(Layer("copper-bottom", LayerKind.COPPER, "copper", 0.0))
    layers += [_layer(f"slab-{i}", slab) for i, slab in enumerate(below)]
    layers.append(Layer("copper-top", LayerKind.COPPER, "copper", 0.0))
    layers += [_layer(f"above-{i}", slab) for i, slab in enumerate(above)]
    return Stackup(tuple(layers), conductor, 0.1)


def _layer(name: str, slab: Slab) -> Layer:
    model = Constant(slab.eps_r)
    return Layer(name, LayerKind.DIELECTRIC, "test", slab.thickness, model)  # type: ignore[arg-type]


def layout(islands: Sequence[Island], ports: Sequence[Port], levels: tuple[Level, ...] = (Level.TOP,)) -> Layout:
    """Copper and ports on a board that is large enough, outlines on the nanometre grid."""
    on_grid = tuple(replace(island, outline=island.outline.normalised()) for island in islands)
    return Layout("test", levels, on_grid, (), (), tuple(ports), (), (), rectangle(-1.0, -1.0, 1.0, 1.0), ())


def loop(radius: float, width: float, gap: float, *, corner_radius: float | None = None) -> Layout:
    """A loop `radius` m from its centre to the middle of its straight or round sides, driven across its gap.

    `width` of the trace and `gap` in m; round unless a `corner_radius` in m is given. The gap is at (0, radius).
    """
    dimensions = {"loop_width": 2.0 * radius, "trace_width": width}
    if corner_radius is not None:
        dimensions["corner_radius"] = corner_radius
    islands = [Island(Level.TOP, outline, Role.RADIATOR) for outline in loop_copper(dimensions, gap)]
    return layout(islands, [Port("feed", "gap", Level.TOP, (0.0, radius), (1.0, 0.0), gap, width)])


def guided_ring(radius: float = 46e-3, width: float = 6e-3, gap: float = 2e-3, line: float = 1.6e-3) -> Layout:
    """The two-level ring of the check values, turned by 90 degrees (the gap is at (0, radius)).

    The line on top starts opposite the gap with the first port, follows the mean circle, crosses the gap and ends
    4 degrees behind it in the second port. Lengths in m.
    """
    dimensions = {"loop_width": 2.0 * radius, "trace_width": width}
    circle = mean_line(dimensions)
    half, past = 0.5 * circle.length, math.radians(4.0) * radius
    path = circle.between(half, circle.length).followed_by(circle.between(0.0, past))
    islands = [Island(Level.BOTTOM, outline, Role.RADIATOR) for outline in loop_copper(dimensions, gap)]
    islands.append(Island(Level.TOP, band(path, line), Role.LINE))
    (start, backward), (end, forward) = circle.at(half), circle.at(past)
    return layout(
        islands, [drop("feed", start, (-backward[0], -backward[1]), line), drop("end", end, forward, line)], BOTH
    )


def straight_line(length: float, width: float, *, lanes: Sequence[float], margin: float) -> Layout:
    """A strip `length` by `width` m over a wide ground, `margin` m longer at each end, with a port at each end.

    The ground reaches from minus to plus the last of `lanes` (m across the line). It is drawn in pieces that touch,
    parted along the other `lanes` and under both ends of the strip, so that the mesh has lines there.
    """
    across = sorted({side * lane for lane in lanes for side in (-1.0, 1.0)})
    along = [-margin, 0.0, length, length + margin]
    islands = [
        Island(Level.BOTTOM, rectangle(x0, y0, x1, y1), Role.RADIATOR)
        for x0, x1 in itertools.pairwise(along)
        for y0, y1 in itertools.pairwise(across)
    ]
    islands.append(Island(Level.TOP, rectangle(0.0, -0.5 * width, length, 0.5 * width), Role.LINE))
    return layout(islands, line_ports(length, width), BOTH)


def whole_ground(length: float, width: float, *, ground: float, margin: float) -> Layout:
    """As `straight_line` with a ground of one piece, `ground` m wide."""
    below = rectangle(-margin, -0.5 * ground, length + margin, 0.5 * ground)
    strip = rectangle(0.0, -0.5 * width, length, 0.5 * width)
    islands = [Island(Level.BOTTOM, below, Role.RADIATOR), Island(Level.TOP, strip, Role.LINE)]
    return layout(islands, line_ports(length, width), BOTH)


def line_ports(length: float, width: float) -> list[Port]:
    """Vertical ports at both ends of a strip along x."""
    return [drop("feed", (0.0, 0.0), (-1.0, 0.0), width), drop("end", (length, 0.0), (1.0, 0.0), width)]


def drop(name: str, centre: Point, outward: Point, width: float) -> Port:
    """A vertical port from the end of a line `width` m wide down to the copper below."""
    return Port(name, "vertical", Level.TOP, centre, outward, 0.0, width)


def mirrored(original: Layout) -> Layout:
    """Left and right exchanged."""
    ports = (
        replace(p, centre=(-p.centre[0], p.centre[1]), direction=(-p.direction[0], p.direction[1]))
        for p in original.ports
    )
    islands = tuple(replace(island, outline=island.outline.mirrored()) for island in original.islands)
    return replace(original, islands=islands, ports=tuple(ports))


def enlarged(original: Layout, factor: float) -> Layout:
    """All lengths of copper and ports multiplied."""
    ports = (
        replace(
            p,
            centre=(factor * p.centre[0], factor * p.centre[1]),
            length=factor * p.length,
            width=factor * p.width,
        )
        for p in original.ports
    )
    islands = tuple(
        replace(island, outline=Outline(island.outline.vertices * (factor, factor, 1.0))) for island in original.islands
    )
    return replace(original, islands=islands, ports=tuple(ports))


def prepared(
    board: Layout,
    stack: Stackup,
    highest: float,
    *,
    step: float,
    across: int = 3,
    grain: float = 1.0,
    crossed: bool = False,
) -> FieldProblem:
    """`FieldProblem.prepare` with a mesh `step` in m; `highest` frequency in Hz."""
    return FieldProblem.prepare(board, stack, highest, MeshSettings(step, across, grain, crossed))


def mode_current(solution: FieldSolution, order: int = 1) -> complex:
    """I_n in A of the current sum I_n cos(n phi) of a ring about the origin, phi from the gap at (0, radius).

    I_n = (1/pi) int int J_phi cos(n phi) d rho d phi with J_phi d rho the current through the strip; for order 0 half
    of it. The current density of every triangle is integrated with the 7-point rule; the gap's source cells belong to
    the current, which flows through the source there.
    """
    mesh, basis = solution.problem.mesh, solution.problem.basis
    current = solution.currents[:, 0]
    density = basis.density.T @ current
    anchor = np.column_stack([basis.anchor_x.T @ current, basis.anchor_y.T @ current])
    points = np.einsum("sc,tck->tsk", SEVEN_POINTS, mesh.corners)
    flow = density[:, None, None] * points - anchor[:, None, :]
    x, y = points[..., 0], points[..., 1]
    squared = x**2 + y**2
    around = (y * flow[..., 0] - x * flow[..., 1]) / squared  # J_phi/rho, phi clockwise as the port's direction
    angle = np.arctan2(x, y)
    total = complex(np.sum(mesh.areas[:, None] * SEVEN_WEIGHTS * around * np.cos(order * angle)))
    return total / (math.pi if order else 2.0 * math.pi)


def mode_impedance(solution: FieldSolution, gap_angle: float) -> complex:
    """Impedance of mode 1, ohm: sinc(gamma/2) V/I_1, the pi zeta_1 of the modal solution; `gap_angle` gamma in rad.

    A source that fills the gap evenly drives mode 1 with sinc(gamma/2) of its voltage.
    """
    return complex(np.sinc(gap_angle / (2.0 * math.pi))) / mode_current(solution)


def mode_resonance(problem: FieldProblem, gap_angle: float, guess: float) -> float:
    """Frequency in Hz near `guess` where mode 1 is real; a straight line through 1 % below and above errs < 1e-4."""
    low, high = 0.99 * guess, 1.01 * guess
    first, second = (mode_impedance(problem.solve(f), gap_angle).imag for f in (low, high))
    return low - first * (high - low) / (second - first)


def gap_resonance(problem: FieldProblem, bracket: tuple[float, float]) -> float:
    """Frequency in Hz in `bracket` where the input impedance is real, to 1e-4."""
    return float(brentq(lambda f: problem.solve(f).impedance.imag, *bracket, rtol=1e-4))

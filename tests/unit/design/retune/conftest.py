"""A board by formulas in place of the field solver: a parallel resonance that follows loop, slab and etching.

Retuning is tested on it because everything about it is known. Only the numbers below are invented; that a loop
resonates where its mean line is one guided wavelength long is the textbook's (Balanis, Antenna Theory, 4th ed.,
section 5.3).
"""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from numpy.typing import NDArray

from planar.brief import read_brief
from planar.copper.tabs import PAIRS
from planar.design.choices import Choices
from planar.design.design import Design, make_design
from planar.design.retune.board_model import BoardModel, compared
from planar.design.retune.inferred import Inferred, inferred
from planar.design.retune.unknowns import COAX_SPEED, Plane, unstated_plane
from planar.design.spread_boards import Question, _places
from planar.design.spread_model import fitted_surface
from planar.design.tolerances import board_with
from planar.design.workers import Workers
from planar.library import Library
from planar.network.grade import grade
from planar.network.measured import Measured
from planar.network.plane import Launch
from planar.network.response import Response, reflection
from planar.stackup import loss_tangent
from planar.units import SPEED_OF_LIGHT

Array = NDArray[np.float64]
Complex = NDArray[np.complex128]

EXAMPLE = Path(__file__).parents[4] / "examples" / "workshop-loop.toml"
LIBRARY = Library.open()
FILL, THINNER, NARROWER = 0.35, 0.5, -0.02
COVERED = 0.25
TAB = 0.005
RESISTANCE, QUALITY = 105.0, 7.0
POINTS = 201


def resonance(choices: Choices, dimensions: Mapping[str, float]) -> float:
    """Hz: one wavelength on the mean line, in a part of the slab."""
    slab = choices.stackup.substrate
    perimeter = 2.0 * (dimensions["loop_width"] + dimensions["loop_height"]) - 1.7 * dimensions["corner_radius"]
    filled = FILL * (slab.thickness / 1e-3) ** THINNER
    eps = 1.0 + filled * (slab.permittivity(choices.centre).real - 1.0) + covered(choices)
    trace = (dimensions["trace_width"] / 1.5e-3) ** NARROWER
    return 1.30 * SPEED_OF_LIGHT / perimeter / np.sqrt(eps) * trace


def covered(choices: Choices) -> float:
    """What a cover adds to the effective permittivity: less with each millimetre of air below it."""
    gap = choices.stackup.find("cover-gap")
    if choices.stackup.find("cover") is None:
        return 0.0
    return COVERED * float(np.exp(-(0.0 if gap is None else gap.thickness) / 3e-3))


def impedance(choices: Choices, dimensions: Mapping[str, float], frequency: Array) -> Complex:
    """Of a parallel resonance, ohm (n,) at `frequency` (n,) Hz; a wider gap raises its resistance a little."""
    f0 = resonance(choices, dimensions)
    loss = 1.0 + 5.0 * loss_tangent(choices.stackup.substrate.permittivity(choices.centre))
    resistance = RESISTANCE / loss * (dimensions["gap"] / 1e-3) ** 0.05
    return np.asarray(resistance / (1.0 + 1j * QUALITY * (frequency / f0 - f0 / frequency)), dtype=np.complex128)


def formula_terms(
    choices: Choices, dimensions: Mapping[str, float], question: Question, higher: float = 1.0
) -> Complex:
    return reflection(impedance(choices, dimensions, question.frequencies / higher), question.reference)


def formula_solved(task: tuple[Any, ...]) -> Complex:
    """In place of `solved_terms` and its like: choices, dimensions or artwork, effort, question."""
    choices, made, _, question = task
    if isinstance(made, Mapping):
        return formula_terms(choices, made, question)
    return formula_terms(choices, made.dimensions, question, (1.0 + TAB) ** (PAIRS - made.tabs))


@dataclass(frozen=True)
class FormulaWorkers(Workers):
    """Answers for boards by the formulas above; nothing is solved."""

    def each(self, function: Callable[[Any], Any], items: Sequence[Any]) -> list[Any]:
        return [formula_solved(item) for item in items]

    def beside(self, function: Callable[[Any], Any], item: Any) -> Callable[[], Any]:
        return lambda: formula_solved(item)


@dataclass(frozen=True, eq=False)
class FormulaModel(BoardModel):
    """A model of boards by formulas."""

    def exact(self, deviations: Array) -> Complex | None:
        return formula_terms(*built(self.question, deviations), self.question)


def built(question: Question, deviations: Array) -> tuple[Choices, dict[str, float]]:
    """The board at deviations (d,)."""
    return board_with(question.choices, question.dimensions, question.quantities, deviations)


@pytest.fixture(scope="session")
def design() -> Design:
    return make_design(read_brief(EXAMPLE, LIBRARY), LIBRARY, str(EXAMPLE))


@pytest.fixture(scope="session")
def model(design: Design) -> FormulaModel:
    return formula_model(design)


def formula_model(design: Design) -> FormulaModel:
    """The model of `design` by formulas."""
    question = compared(design.choices, design.dimensions)
    units = np.eye(len(question.quantities))
    terms = {
        (number, place): formula_terms(*built(question, place * units[number]), question)
        for number, quantity in enumerate(question.quantities)
        for place in _places(quantity)
    }
    nominal = formula_terms(question.choices, question.dimensions, question)
    changes: list[dict[float, Complex]] = [{} for _ in units]
    for (number, place), found in terms.items():
        changes[number][place] = found - nominal
    return FormulaModel(question, fitted_surface(nominal, changes, {}), 0.001, 0.0)


@dataclass(frozen=True)
class Bench:
    """Measures boards by formulas behind a line, and infers them again."""

    model: FormulaModel

    def deviations(self, **values: float) -> Array:
        """Deviations (d,) of the quantities whose names begin with these words, `_` for blanks."""
        names = [each.name.replace(" ", "_") for each in self.model.question.quantities]
        return np.array([next((v for k, v in values.items() if name.startswith(k)), 0.0) for name in names])

    def measured(self, deviations: Array, launch: Launch, *, noise: float = 0.003, seed: int = 1) -> Measured:
        """201 points over 28 % against 50 ohm."""
        centre = self.model.choices.centre
        frequency = np.linspace(0.86 * centre, 1.14 * centre, POINTS)
        seen = launch.seen(
            frequency, reflection(impedance(*built(self.model.question, deviations), frequency), 50.0), 50.0
        )
        random = np.random.default_rng(seed)
        dirt = random.standard_normal((2, POINTS)) * noise / np.sqrt(2.0)
        return Measured(Response(frequency, seen + dirt[0] + 1j * dirt[1], 50.0), ())

    def inferred(self, measured: Measured, plane: Plane | None = None) -> Inferred:
        graded = grade(measured, self.model.choices.brief.target.band)
        return inferred(self.model, measured, graded, plane or unstated_plane())


@pytest.fixture(scope="session")
def bench(model: FormulaModel) -> Bench:
    return Bench(model)


@pytest.fixture(scope="session")
def low_board(bench: Bench) -> Inferred:
    """A board that came out low behind 30 mm of coax: more permittivity, a thicker slab."""
    deviations = bench.deviations(laminate_permittivity=0.6, dielectric_thickness=0.5)
    return bench.inferred(bench.measured(deviations, Launch(0.03 / COAX_SPEED, 0.05, bench.model.choices.centre)))

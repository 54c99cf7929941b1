"""The boards a spread rests on: which are solved, on which mesh, and the terms that are compared.

Everything is solved once at the far end of its range; what does something there is solved at the near end too, and the
strongest in pairs. All boards share one mesh step, a little coarser than that of the prediction.
"""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from itertools import combinations

import numpy as np
from numpy.typing import NDArray

from planar.design.choices import Choices
from planar.design.spread_model import Pair, SurfaceModel, fitted_surface
from planar.design.tolerances import Quantity, board_with
from planar.design.trial import Effort, solve_trial
from planar.design.workers import Workers
from planar.errors import PlanarError, SynthesisError
from planar.field.band import BandSolution
from planar.network.response import reflection

Array = NDArray[np.float64]
Complex = NDArray[np.complex128]

COARSER, NODES = 1.5, 3
"""Step of the mesh over the default, and solutions over the least span; a wider one takes two more for each tenth."""
HALF_SPAN, BEYOND = 0.06, 0.02
"""Of the centre: how far round the middle of the band terms are taken at least, and how much farther is solved."""
BESIDE = 0.015
"""Of the centre, how far beyond its band terms are taken where the band is wide."""
AXIAL_POINTS = 21
"""Frequencies in the band at which the axial ratio is taken: those of the prediction."""
FELT = 0.004
"""Change of any term at the far end of a range below which a quantity is taken as linear."""
CROSSING, MOST_PAIRS = 1e-3, 12
"""Product of the changes two quantities make alone from which they are solved together, and how many pairs at most."""


@dataclass(frozen=True, eq=False)
class Question:
    """What is asked of every board of a spread: reflections at `frequencies` (f,) Hz, and, for circular polarisation,
    the ratio of the wrong sense to the wanted one at `axial_frequencies` (a,) Hz, else none."""

    choices: Choices
    dimensions: Mapping[str, float]
    quantities: tuple[Quantity, ...]
    frequencies: Array
    axial_frequencies: Array

    @property
    def reference(self) -> float:
        """Impedance of the port, ohm."""
        return self.choices.brief.target.impedance

    @property
    def effort(self) -> Effort:
        """How all boards are solved that are compared."""
        centre = self.choices.centre
        low, high = float(self.frequencies[0]), float(self.frequencies[-1])
        wider = 0.5 * (high - low) / centre - HALF_SPAN
        return Effort(
            COARSER,
            NODES + 2 * math.ceil(10.0 * wider - 1e-2),
            (low - BEYOND * centre, high + BEYOND * centre),
        )

    def terms_of(self, band: BandSolution) -> Complex:
        """Terms (j,) of a solved board."""
        reflected = reflection(band.impedance(self.frequencies), self.reference)
        if not self.axial_frequencies.size:
            return reflected
        ratio = band.circular_ratio(self.axial_frequencies)
        wrong = ratio if self.choices.brief.target.polarisation == "circular-right" else 1.0 / ratio
        return np.concatenate([reflected, wrong])

    def terms(self, tasks: Sequence[Array], workers: Workers) -> list[Complex | None]:
        """Terms (j,) of the boards at each of `tasks`, deviations (d,); None where one cannot be drawn or solved."""
        boards = [board_with(self.choices, self.dimensions, self.quantities, each) for each in tasks]
        return workers.each(solved_terms, [(choices, sizes, self.effort, self) for choices, sizes in boards])


def span_of(choices: Choices) -> tuple[float, float]:
    """Frequencies from and to, Hz, over which a spread is told: round the middle of the band, and beyond its ends."""
    low, high = choices.brief.target.band
    centre = choices.centre
    half = max(HALF_SPAN, 0.5 * (high - low) / centre + BESIDE)
    return centre * (1.0 - half), centre * (1.0 + half)


def solved_terms(task: tuple[Choices, Mapping[str, float], Effort, Question]) -> Complex | None:
    """Terms of one board, None where it cannot be drawn or solved."""
    choices, dimensions, effort, question = task
    try:
        return question.terms_of(solve_trial(choices, dimensions, effort).band)
    except (PlanarError, np.linalg.LinAlgError):
        return None


@dataclass(frozen=True, eq=False)
class Surface:
    """The `model` of the differences, `here` (j,) the nominal terms on its mesh, and how many `boards` it took."""

    model: SurfaceModel
    here: Complex
    boards: int


def solved_surface(question: Question, workers: Workers) -> Surface:
    """The boards solved and the model fitted. Raises `SynthesisError` where one within its ranges cannot be made."""
    count = len(question.quantities)
    far = [_places(quantity)[0] for quantity in question.quantities]
    tasks = [np.zeros(count), *(place * unit for place, unit in zip(far, np.eye(count), strict=True))]
    here, *moved = _all_solved(question, tasks, workers)
    changes: list[dict[float, Complex]] = [{place: terms - here} for place, terms in zip(far, moved, strict=True)]
    strengths = [float(np.max(np.abs(terms - here))) for terms in moved]
    felt = [number for number in range(count) if strengths[number] > FELT]
    near = [_places(question.quantities[number])[1] for number in felt]
    pairs = _crossing(felt, strengths)
    tasks = [place * np.eye(count)[number] for place, number in zip(near, felt, strict=True)]
    tasks += [far[i] * np.eye(count)[i] + far[j] * np.eye(count)[j] for i, j in pairs]
    found = _all_solved(question, tasks, workers)
    for number, place, terms in zip(felt, near, found, strict=False):
        changes[number][place] = terms - here
    both = zip(pairs, found[len(felt) :], strict=True)
    crossed = {(i, j): (np.array([far[i], far[j]]), terms - here) for (i, j), terms in both}
    return Surface(fitted_surface(here, changes, crossed), here, 1 + count + len(found))


def _crossing(felt: Sequence[int], strengths: Sequence[float]) -> list[Pair]:
    """Pairs of quantities strong enough to be solved together, the strongest first."""
    pairs = sorted(combinations(felt, 2), key=lambda pair: -strengths[pair[0]] * strengths[pair[1]])
    return [(i, j) for i, j in pairs if strengths[i] * strengths[j] > CROSSING][:MOST_PAIRS]


def _places(quantity: Quantity) -> tuple[float, float]:
    """The two deviations a quantity is solved at, the farther first: its ends, or half way where one is the nominal."""
    low, high = quantity.ends
    if low == 0.0 or high == 0.0:
        end = low + high
        return end, 0.5 * end
    return (high, low) if high >= -low else (low, high)


def _all_solved(question: Question, tasks: list[Array], workers: Workers) -> list[Complex]:
    solved = []
    for place, terms in zip(tasks, question.terms(tasks, workers), strict=True):
        if terms is None:
            moved = [q.name for q, value in zip(question.quantities, place.tolist(), strict=True) if value != 0.0]
            raise SynthesisError(
                f"within its tolerances this board cannot be drawn or solved: {' and '.join(moved) or 'as designed'} "
                "at an end of the range"
            )
        solved.append(terms)
    return solved

"""How boards scatter that are made of one design: yield, worst corners, and what dominates.

A second-order model of all that varies, from boards solved at the ends of every range, carries ten thousand boards in a
moment; a few of them, drawn afresh, are solved too and say how far the model is off. Corners, where everything that can
go one way does, are found on the model and solved exactly.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from planar.design.choices import Choices
from planar.design.design import Design
from planar.design.prediction import AXIAL_RATIO_DB, Prediction
from planar.design.sizing import verifying_effort
from planar.design.spread_boards import AXIAL_POINTS, Question, solved_surface, solved_terms, span_of
from planar.design.spread_model import SurfaceModel
from planar.design.spread_sampling import Limits, Outcome, Reader, drawn, variance_shares
from planar.design.tolerances import Quantity, left_off, varied_quantities
from planar.design.workers import Workers
from planar.errors import SynthesisError

Array = NDArray[np.float64]
Complex = NDArray[np.complex128]
Progress = Callable[[str], None]

SAMPLES, SEED, CHECKS = 10_000, 1, 6
"""Boards drawn on the model, what they are drawn with, and boards drawn afresh that are solved."""
MOST_FLIPS = 60
"""Quantities moved to their other end at most on the way to a corner."""
Aim = Callable[[Outcome], Array]


@dataclass(frozen=True)
class SpreadRequest:
    """How a spread is taken: `samples` on the model, the `seed` they are drawn with, `checks` solved exactly; every
    tolerance times `tolerance`, 0 for the board as designed; where `uncovered` half of the boards without their cover.
    """

    samples: int = SAMPLES
    seed: int = SEED
    checks: int = CHECKS
    tolerance: float = 1.0
    uncovered: bool = False


@dataclass(frozen=True)
class Contributor:
    """What one quantity does alone: shares of the variance of the worst reflection, of the shift of the response and of
    the worst axial ratio (None for linear polarisation); and at the `low` and `high` end of its range the worst
    reflection (a size) and the shift as a fraction."""

    quantity: Quantity
    match_share: float
    shift_share: float
    axial_share: float | None
    worst: tuple[float, float]
    shift: tuple[float, float]


@dataclass(frozen=True, eq=False)
class Corner:
    """A board with every quantity at an end of its range, `deviations` (d,) over their scales: what the model says and
    what was `solved`, both an outcome of one board; None where it could not be drawn."""

    name: str
    deviations: Array
    modelled: Outcome
    solved: Outcome | None


@dataclass(frozen=True)
class ModelError:
    """How far the model was off on `checks` boards drawn afresh and solved: the largest distance of the complex
    reflection over the span and inside the band, and of the worst axial ratio in dB (None for linear polarisation)."""

    checks: int
    reflection: float
    in_band: float
    axial_db: float | None


@dataclass(frozen=True, eq=False)
class Spread:
    """Boards made of a design as they scatter.

    `outcome` of `request.samples` boards at `deviations` (n, d), `nominal` that of the board as designed. `rest` are
    the shares of variance that no quantity has alone (match, shift, axial). `solutions`: field solutions it took.
    """

    name: str
    request: SpreadRequest
    question: Question
    model: SurfaceModel
    reader: Reader
    limits: Limits
    deviations: Array
    outcome: Outcome
    nominal: Outcome
    contributors: tuple[Contributor, ...]
    rest: tuple[float, float, float | None]
    corners: tuple[Corner, ...]
    error: ModelError | None
    boards: int
    solutions: int

    @property
    def match_yield(self) -> float:
        """Share of boards that meet the brief's match over its band."""
        return float(np.mean(self.outcome.worst <= self.limits.match))

    @property
    def axial_yield(self) -> float | None:
        """Share of boards with an axial ratio up to 3 dB over the band, in the sense asked for; None if linear."""
        return None if self.outcome.axial is None else float(np.mean(self.limits.round(self.outcome)))

    @property
    def total_yield(self) -> float:
        """Share of boards that meet both."""
        return float(np.mean(self.limits.met(self.outcome)))

    @property
    def doubtful_yield(self) -> tuple[float, float]:
        """The total yield where the model errs by its largest errors, to the bad and to the good side."""
        error = self.error
        off, axial = (0.0, 0.0) if error is None else (error.in_band, error.axial_db or 0.0)
        bad, good = (
            self.limits.met(self.outcome, allowance=side * off, axial_allowance=side * axial) for side in (1.0, -1.0)
        )
        return float(np.mean(bad)), float(np.mean(good))


def spread(
    design: Design, workers: Workers, request: SpreadRequest = SpreadRequest(), progress: Progress = lambda stage: None
) -> Spread:
    """How boards made of the solved `design` scatter.

    Raises `SynthesisError` for a design that was not solved, and where a board within tolerances cannot be made.
    """
    question = asked_of(design, request)
    progress(f"solving boards at the ends of {len(question.quantities)} tolerances")
    wrong = _fine_wrong(question, workers)
    surface, predicted = solved_surface(question, workers), _predicted(design, question)
    nominal = np.concatenate([predicted, wrong()])
    model = surface.model.on(nominal)
    reader = Reader(question.frequencies, predicted, design.choices.brief.target.band)
    names, corners = _worst_corners(model, reader, question)
    fresh = drawn(question.quantities, request.checks if question.quantities else 0, (request.seed, 1))
    progress(f"solving {len(corners)} worst corners and {len(fresh)} boards drawn afresh")
    found = question.terms([*corners, *fresh], workers)
    solved = [None if each is None else nominal + each - surface.here for each in found]
    deviations = drawn(question.quantities, request.samples, (request.seed,))
    outcome = reader.outcome(model.at(deviations))
    contributors, rest = _contributors(question.quantities, model, reader, deviations, outcome)
    boards = surface.boards + len(found)
    return Spread(
        name=design.name,
        request=request,
        question=question,
        model=model,
        reader=reader,
        limits=limits_of(design.choices),
        deviations=deviations,
        outcome=outcome,
        nominal=reader.outcome(nominal[None, :]),
        contributors=contributors,
        rest=rest,
        corners=_corners(names, corners, solved, model, reader),
        error=_model_error(fresh, solved[len(corners) :], model, reader),
        boards=boards,
        solutions=_solutions(question, boards),
    )


def _solutions(question: Question, boards: int) -> int:
    """Field solutions of so many `boards` and, of a circular design, of the one on the fine mesh."""
    fine = verifying_effort(question.choices).nodes if question.axial_frequencies.size else 0
    return boards * question.effort.nodes + fine


def asked_of(design: Design, request: SpreadRequest) -> Question:
    """What is asked of every board of `design`. Raises `SynthesisError` for a design that was not solved."""
    choices = design.choices
    low, high = span_of(choices)
    known = _prediction_of(design).response.frequency
    axial = np.linspace(*choices.brief.target.band, AXIAL_POINTS) if choices.circular else np.zeros(0)
    varied = [each.within(request.tolerance) for each in varied_quantities(choices, design.dimensions)]
    varied += left_off(choices) if request.uncovered else ()
    kept = tuple(each for each in varied if each.scale > 0.0)
    return Question(choices, design.dimensions, kept, known[(known >= low) & (known <= high)], axial)


def limits_of(choices: Choices) -> Limits:
    """What the brief asks of a board."""
    match = 10.0 ** (choices.brief.target.match_db / 20.0)
    return Limits(float(match), AXIAL_RATIO_DB if choices.circular else None)


def _prediction_of(design: Design) -> Prediction:
    if design.prediction is None:
        raise SynthesisError(f"{design.name}: a spread starts from a field solution, this design has none")
    return design.prediction


def _predicted(design: Design, question: Question) -> Complex:
    """Reflections of the prediction at the question's frequencies."""
    response = _prediction_of(design).response
    reflected: Complex = response.s[np.isin(response.frequency, question.frequencies), 0, 0]
    return reflected


def _fine_wrong(question: Question, workers: Workers) -> Callable[[], Complex]:
    """Begin the board as designed on the mesh of the prediction, for its wrong-sense ratios; call for them."""
    if not question.axial_frequencies.size:
        return lambda: np.zeros(0, dtype=np.complex128)
    task = (question.choices, question.dimensions, verifying_effort(question.choices), question)
    begun = workers.beside(solved_terms, task)

    def result() -> Complex:
        terms = begun()
        if terms is None:
            raise SynthesisError("the board as designed cannot be solved")
        return terms[len(question.frequencies) :]

    return result


def _aims(axial: bool) -> dict[str, Aim]:
    """Name of a corner -> what is largest there."""
    aims: dict[str, Aim] = {
        "worst match": lambda outcome: outcome.worst,
        "lowest frequency": lambda outcome: -outcome.shift,
        "highest frequency": lambda outcome: outcome.shift,
    }
    return aims | ({"worst axial ratio": _worst_axial} if axial else {})


def _worst_axial(outcome: Outcome) -> Array:
    """Aim of a circular board's worst axial ratio; a linear one has none."""
    worst = outcome.counted_axial
    return np.zeros(0) if worst is None else worst


def _worst_corners(model: SurfaceModel, reader: Reader, question: Question) -> tuple[list[str], list[Array]]:
    """Names of the corners and their deviations (d,); one corner may be the worst in more than one way."""
    found: dict[tuple[float, ...], list[str]] = {}
    if question.quantities:
        for name, aim in _aims(bool(question.axial_frequencies.size)).items():
            corner = _corner(model, reader, question.quantities, aim)
            found.setdefault(tuple(corner.tolist()), []).append(name)
    return [", ".join(names) for names in found.values()], [np.array(corner) for corner in found]


def _corner(model: SurfaceModel, reader: Reader, quantities: Sequence[Quantity], aim: Aim) -> Array:
    """The corner with the largest `aim`: every quantity at the end where it alone does more, then turned one after the
    other as long as that makes it worse."""

    def aims(places: Array) -> Array:
        return aim(reader.outcome(model.at(places)))

    ends = np.array([quantity.ends for quantity in quantities])
    units = np.eye(len(ends))
    sides = (aims(ends[:, 1:] * units) > aims(ends[:, :1] * units)).astype(int)
    everyone = np.arange(len(ends))
    here = ends[everyone, sides]
    for _ in range(MOST_FLIPS):
        turned = np.where(units > 0.0, ends[everyone, 1 - sides], here)
        values = aims(turned)
        best = int(np.argmax(values))
        if values[best] <= aims(here[None, :])[0]:
            break
        sides[best] = 1 - sides[best]
        here = turned[best]
    corner: Array = here
    return corner


def _corners(
    names: list[str], places: list[Array], solved: list[Complex | None], model: SurfaceModel, reader: Reader
) -> tuple[Corner, ...]:
    corners = []
    for name, place, terms in zip(names, places, solved, strict=False):
        exact = None if terms is None else reader.outcome(terms[None, :])
        corners.append(Corner(name, place, reader.outcome(model.at(place[None, :])), exact))
    return tuple(corners)


def _model_error(fresh: Array, solved: list[Complex | None], model: SurfaceModel, reader: Reader) -> ModelError | None:
    pairs = [(place, terms) for place, terms in zip(fresh, solved, strict=True) if terms is not None]
    if not pairs:
        return None
    said, exact = model.at(np.array([place for place, _ in pairs])), np.array([terms for _, terms in pairs])
    count, (low, high) = len(reader.frequencies), reader.band
    off = np.abs(said - exact)[:, :count]
    near = _around_band(reader.frequencies, low, high)
    axial, other = reader.outcome(said).counted_axial, reader.outcome(exact).counted_axial
    axial_db = None if axial is None or other is None else float(np.max(np.abs(axial - other)))
    return ModelError(len(pairs), float(off.max()), float(off[:, near].max()), axial_db)


def _around_band(frequencies: Array, low: float, high: float) -> slice:
    """The frequencies held in the band and one to either side."""
    first, last = np.searchsorted(frequencies, [low, high])
    return slice(max(0, int(first) - 1), int(last) + 1)


def _contributors(
    quantities: Sequence[Quantity], model: SurfaceModel, reader: Reader, deviations: Array, outcome: Outcome
) -> tuple[tuple[Contributor, ...], tuple[float, float, float | None]]:
    """What every quantity does, the one with the largest share of the match first, and what is left."""
    nothing = np.zeros(len(quantities)), 0.0
    match = variance_shares(deviations, outcome.worst) or nothing
    shift = variance_shares(deviations, outcome.shift) or nothing
    counted = outcome.counted_axial
    axial = None if counted is None else variance_shares(deviations, counted) or nothing
    ends = np.array([quantity.ends for quantity in quantities]).reshape(len(quantities), 2)
    units = np.eye(len(quantities))
    low, high = (reader.outcome(model.at(ends[:, [side]] * units)) for side in (0, 1))
    found = [
        Contributor(
            quantity,
            float(match[0][i]),
            float(shift[0][i]),
            None if axial is None else float(axial[0][i]),
            (float(low.worst[i]), float(high.worst[i])),
            (float(low.shift[i]), float(high.shift[i])),
        )
        for i, quantity in enumerate(quantities)
    ]
    found.sort(key=lambda each: -each.match_share)
    return tuple(found), (match[1], shift[1], None if axial is None else axial[1])

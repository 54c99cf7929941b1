"""Re-centring: dimensions moved so that as many boards as possible meet the brief.

What acts one way only (mask that thins out, a cover that may be left off) pushes boards to one side of what was
designed. The boards of a spread are moved together by second-order models of what the sizing variables do, and the
move with the largest yield is solved: the new board's prediction and a spread of its own say what it brought.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray
from scipy.optimize import minimize

from planar.copper.rules import fab_findings
from planar.design.accuracy import power_findings
from planar.design.choices import Choices
from planar.design.design import Design, connector_impedance
from planar.design.first_order import DETAILS
from planar.design.goal import Goal
from planar.design.line_size import design_lines, line_settings
from planar.design.prediction import predict, unmet, wide_response
from planar.design.sizing import Bench, verifying_effort
from planar.design.spread import Spread, spread
from planar.design.spread_boards import solved_terms
from planar.design.spread_model import SurfaceModel, fitted_surface
from planar.design.trial import draw, solve_trial
from planar.design.trim import cut_table
from planar.design.variables import LOOP, Variables, variables_of
from planar.design.workers import Workers
from planar.errors import RangeError, Severity, SynthesisError

Array = NDArray[np.float64]
Complex = NDArray[np.complex128]
Progress = Callable[[str], None]

STEPS = {LOOP: 0.06}
USUAL_STEP = 0.08
"""Steps of the variables, in their own units, at which they are solved either way: 1.5 % of the loop, 8 % of a line."""
REACH = 1.5
"""Times its step a variable may move: as far as its model is believed."""
FEW = 2000
"""Boards of the spread the move is sought with; all of them judge it."""
SOFT = 0.03
"""Of its limit, over which a board turns from good to bad while a move is sought: a yield has no slope."""
EASE = 0.05
"""Price of the mean of all boards, so that a full yield goes on to the middle of its window."""
WORTH = 0.002
"""Yield the other variables must add to what moving the loop alone brings."""


@dataclass(frozen=True, eq=False)
class Recentred:
    """A design moved for yield, and the spreads `before` and `after`, both with boards solved for them.

    `expected_yield` by the moved model; `moved` is false where no move promised or brought more, and `design` is then
    the one given; `remark` says what was done. `solutions`: field solutions beside those of both spreads and of the
    prediction.
    """

    design: Design
    moved: bool
    before: Spread
    after: Spread
    expected_yield: float
    remark: str
    solutions: int

    @property
    def changes(self) -> dict[str, tuple[float, float]]:
        """Dimensions that moved: name -> m before and after."""
        old, new = self.before.question.dimensions, self.design.dimensions
        return {name: (old[name], new[name]) for name in new if new[name] != old[name]}


def recentred(
    design: Design, scattered: Spread, workers: Workers, progress: Progress = lambda stage: None
) -> Recentred:
    """`design` moved so that the yield of its spread `scattered` is largest, or as it is where nothing is gained.

    Raises `SynthesisError` where the variables cannot be solved at all.
    """
    before = scattered.total_yield

    def kept(why: str, expected: float = before, solutions: int = 0) -> Recentred:
        return Recentred(design, False, scattered, scattered, expected, f"not moved: {why}", solutions)

    if scattered.doubtful_yield[0] == 1.0:
        return kept("every board meets the brief already, with the model's error against it")
    progress("trying what the sizing variables do")
    variables = _variables(design)
    model, boards = _moves(variables, scattered, workers)
    move, expected = _best_move(variables, model, scattered)
    solutions = boards * scattered.question.effort.nodes
    if not move.any() or expected <= before:
        return kept("no move of the sizing variables promises more", before, solutions)
    progress("predicting the moved board")
    try:
        moved = _redesigned(design, _rounded(variables, move, workers), workers)
        after = spread(moved, workers, scattered.request, progress)
    except (SynthesisError, RangeError) as error:
        return kept(f"the moved board cannot be had: {error}", expected, solutions)
    if after.total_yield <= before:
        return kept(f"the moved board, solved, has a yield of {100.0 * after.total_yield:.2f} %", expected, solutions)
    remark = "verified by the prediction of the moved board on the fine mesh and a spread of its own"
    return Recentred(moved, True, scattered, after, expected, remark, solutions)


def _rounded(variables: Variables, move: Array, workers: Workers) -> dict[str, float]:
    """Dimensions after `move`, to the drawing step and inside the size limit."""
    choices = variables.choices
    bench = Bench(variables, Goal.of(choices), verifying_effort(choices), workers)
    return variables.dimensions(bench.fitted(move, rounding=True), rounding=True)


def _variables(design: Design) -> Variables:
    """What may move: for given dimensions too, but for the details that stand in the brief."""
    choices, antenna = design.choices, design.choices.brief.antenna
    details = {name: value for name, value in antenna.dimensions.items() if name in DETAILS}
    free = choices.brief.model_copy(update={"antenna": antenna.model_copy(update={"dimensions": details})})
    return variables_of(replace(choices, brief=free), design.dimensions)


def _moves(variables: Variables, scattered: Spread, workers: Workers) -> tuple[SurfaceModel, int]:
    """Model of the terms in the steps of the variables over their usual ones, and how many boards it took."""
    question, steps = scattered.question, _steps(variables)
    count = len(steps)
    tried = [(number, sign) for number in range(count) for sign in (1.0, -1.0) if _inside(variables, number, sign)]
    places = [np.zeros(count), *(sign * steps[number] * np.eye(count)[number] for number, sign in tried)]
    boards = [variables.dimensions(place) for place in places]
    tasks = [(question.choices, dimensions, question.effort, question) for dimensions in boards]
    here, *found = workers.each(solved_terms, tasks)
    if here is None:
        raise SynthesisError("the board as designed cannot be solved for re-centring")
    changes: list[dict[float, Complex]] = [{} for _ in range(count)]
    for (number, sign), terms in zip(tried, found, strict=True):
        if terms is not None:
            changes[number][sign] = terms - here
    still = {1.0: np.zeros_like(here)}
    return fitted_surface(np.zeros_like(here), [each or still for each in changes], {}), len(tasks)


def _steps(variables: Variables) -> Array:
    return np.array([STEPS.get(name, USUAL_STEP) for name in variables.names])


def _inside(variables: Variables, number: int, sign: float) -> bool:
    place = sign * _steps(variables)[number]
    return bool(variables.low[number] <= place <= variables.high[number])


def _best_move(variables: Variables, model: SurfaceModel, scattered: Spread) -> tuple[Array, float]:
    """Steps of the variables (x,) with the largest yield on the model, and that yield: the loop alone, or all of them
    where they bring more."""
    steps = _steps(variables)
    low, high = np.maximum(variables.low / steps, -REACH), np.minimum(variables.high / steps, REACH)
    low, high = np.minimum(low, 0.0), np.maximum(high, 0.0)  # what stands at a bound may stand a hair beyond it
    still = np.abs(model.slopes).max(axis=1) == 0.0
    low[still] = high[still] = 0.0
    everything = scattered.model.at(scattered.deviations)
    few = everything[:FEW]

    def price(move: Array) -> float:
        badness = _badness(few + model.at(move[None, :]), scattered)
        return float(np.mean(0.5 * (1.0 + np.tanh((badness - 1.0) / SOFT))) + EASE * np.mean(badness))

    def reached(move: Array) -> float:
        return float(np.mean(_badness(everything + model.at(move[None, :]), scattered) <= 1.0))

    loop = np.arange(len(steps)) == 0
    alone = _sought(price, np.zeros(len(steps)), np.where(loop, low, 0.0), np.where(loop, high, 0.0))
    together = _sought(price, alone, low, high)
    here, moved, more = reached(np.zeros(len(steps))), reached(alone), reached(together)
    if more > moved + WORTH or (more >= moved and price(together) < price(alone) - SOFT):
        return together * steps, more
    return (alone * steps, moved) if moved >= here else (np.zeros(len(steps)), here)


def _sought(price: Callable[[Array], float], start: Array, low: Array, high: Array) -> Array:
    """The cheapest place between `low` and `high` (x,) found from `start`; what has no room stays."""
    free = low < high
    if not free.any():
        return start

    def whole(part: Array) -> Array:
        place = start.copy()
        place[free] = np.clip(part, low[free], high[free])
        return place

    found = minimize(
        lambda part: price(whole(part)),
        start[free],
        method="Powell",
        bounds=list(zip(low[free], high[free], strict=True)),
        options={"xtol": 1e-3, "ftol": 1e-5, "maxiter": 20},
    )
    place = whole(np.atleast_1d(found.x))
    return place if price(place) < price(start) else start


def _badness(terms: Complex, scattered: Spread) -> Array:
    """Worst term of each board over its limit, (n,): 1 is just met."""
    outcome, limits = scattered.reader.outcome(terms), scattered.limits
    match: Array = outcome.worst / limits.match
    worst = outcome.counted_axial
    if worst is None or limits.axial_db is None:
        return match
    return np.maximum(match, _out_of_round(worst) / _out_of_round(np.array(limits.axial_db)))


def _out_of_round(axial_ratio_db: Array) -> Array:
    """Size of the wrong sense over the wanted one at an axial ratio in dB (IEEE Std 145)."""
    ratio = 10.0 ** (axial_ratio_db / 20.0)
    size: Array = (ratio - 1.0) / (ratio + 1.0)
    return size


def _restated(choices: Choices, dimensions: Mapping[str, float]) -> Choices:
    """A brief that states dimensions then states the new ones."""
    antenna = choices.brief.antenna
    if not antenna.dimensions:
        return choices
    stated = antenna.model_copy(update={"dimensions": dict(dimensions)})
    return replace(choices, brief=choices.brief.model_copy(update={"antenna": stated}))


def _redesigned(design: Design, moved: Mapping[str, float], workers: Workers) -> Design:
    """`design` with the `moved` dimensions, solved as the first was. Raises `SynthesisError` where they break a rule of
    the fab or cannot be drawn."""
    choices = design.choices
    dimensions = {name: moved[name] for name in choices.family.needed(choices.traits)}
    planned = draw(choices, dimensions)
    rules = (*planned.findings, *fab_findings(planned.layout, choices.fab, choices.brief.board.size_limit))
    broken = tuple(each for each in rules if each.severity is Severity.REFUSE)
    if broken:
        raise SynthesisError(f"{design.name}: the re-centred board cannot be made:", broken)
    wide = workers.beside(wide_response, (choices, dimensions))
    trial = replace(solve_trial(choices, dimensions, verifying_effort(choices)), planned=planned)
    prediction = predict(choices, trial, wide())
    return replace(
        design,
        choices=_restated(choices, dimensions),
        dimensions=dimensions,
        layout=planned.layout,
        lines=design_lines(dimensions, choices, line_settings(choices)),
        findings=(
            *unmet(choices, prediction, Severity.WARN),
            *connector_impedance(choices),
            *power_findings([prediction.centre]),
            *rules,
        ),
        prediction=prediction,
        sensitivities=(),
        cuts=cut_table(choices, dimensions, workers) if design.cuts else (),
    )

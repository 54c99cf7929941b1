"""Sizing on the field solver: from first dimensions to those that meet the goal best.

First the loop is scaled to where the start works best. Derivatives by finite differences then give a linear model of
all terms; each round tries the best steps of that model in a trust region and in one half as wide, and what they teach
corrects the model (Broyden 1965). The last steps take their values from the fine mesh and their slopes from the coarse
one, so what is delivered is what the fine mesh says of copper rounded to the drawing step.
"""

from __future__ import annotations

import math
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from planar.copper.drawing import loop_height
from planar.design.choices import Choices
from planar.design.goal import FINAL_CENTRE_AXIAL_RATIO_DB, Goal, half_span
from planar.design.line_size import STEP
from planar.design.minimax import LinearModel, best_step
from planar.design.trial import Effort, Trial, draw, solve_trial
from planar.design.variables import LOOP, Variables
from planar.design.workers import Workers
from planar.errors import PlanarError, SynthesisError

Array = NDArray[np.float64]
Complex = NDArray[np.complex128]

COARSER = 3.0
"""Step of the sizing mesh over that of the verification."""
DIFFERENCE = 0.08
"""Step of the derivatives: well above what a changed number of cells does to the terms."""
FIRST_REACH, LEAST_REACH = 0.3, 0.06
"""Half the side of the first trust region, and that below which steps are lost in the mesh's own error."""
HALVES = (1.0, 0.5)
"""Reaches tried side by side in a round, of the trust region."""
ROUNDS, FINE_ROUNDS = 7, 3
"""Rounds at most on the coarse mesh, steps on the fine one."""
ENOUGH = 0.05
"""Predicted gain of the worst term, as a fraction, below which another round is not worth its boards."""
GENEROUS, SATISFIED = 0.15, 0.92
"""The same where the goal is met with ease: on the coarse mesh the worst term over its limit, at the widest span the
end; on the fine one any term inside its limit."""
COMFORTABLE = 0.92
"""Worst term over its limit up to which a wider span is tried."""
SPAN, FINE_SPAN = 0.16, 0.2
"""Half the solved span over the centre frequency, on either mesh, where the goal does not reach farther."""
CENTRING, CENTRING_WIDTH = 0.22, 0.12
"""Half the span of the start, over the centre frequency, and the width it is judged over."""
TOUCHING = 1e-6
"""Of a side, by which a board may exceed its limit: rounding."""
FITTINGS = 6
"""Times a loop is shortened to bring its board inside a size limit: each leaves a small part of what was over."""
AMPLE = 0.7
"""Of the fab's largest board: a loop smaller than this fits with everything round it."""
COARSE_NODES, FINE_NODES = 4, 5
"""Solutions over such a span; a wider one takes two more for each tenth."""
BEYOND = 0.02
"""How far the solved span reaches beyond the goal's."""


@dataclass(frozen=True, eq=False)
class Bench:
    """What boards are tried with: the variables, the goal, the effort, and who does the work."""

    variables: Variables
    goal: Goal
    effort: Effort
    workers: Workers

    @property
    def choices(self) -> Choices:
        """What the brief leaves no longer open."""
        return self.variables.choices

    def fitted(self, place: Array, *, rounding: bool = False) -> Array:
        """`place` with the loop made smaller until the board keeps to the brief's size limit and the fab's largest.

        Raises `SynthesisError` where the board cannot be drawn.
        """
        limit, fab = self.choices.brief.board.size_limit, self.choices.fab.max_board
        for _ in range(FITTINGS):
            dimensions = self.variables.dimensions(place, rounding=rounding)
            if limit is None and max(loop_height(dimensions), dimensions[LOOP]) < AMPLE * min(fab):
                return place
            loop = (dimensions[LOOP], loop_height(dimensions))
            size = draw(self.choices, dimensions, lettered_board=False).layout.size
            limits = [] if limit is None else list(zip(size, limit, loop, strict=True))
            limits += zip(sorted(size), sorted(fab), sorted(loop), strict=True)
            over = max((side - most) / along for side, most, along in limits)
            if over <= TOUCHING:
                return place
            shorter = 1.0 - over - STEP / min(loop)
            if shorter <= 0.0:
                raise SynthesisError("the board exceeds its size limit whatever the loop")
            place = place.copy()
            place[0] += math.log(shorter) / self.variables.scales[0]
        raise SynthesisError("the board exceeds its size limit")

    def terms(self, places: list[Array]) -> list[Complex | None]:
        """Terms of the boards at `places`, None where one cannot be drawn or solved."""
        dimensions = [self.variables.dimensions(place) for place in places]
        return self.workers.each(_terms, [(self.choices, each, self.effort, self.goal) for each in dimensions])

    def slopes(self, place: Array, values: Complex) -> Complex:
        """Derivatives of the terms at `place`, one board a variable; none where it cannot be drawn either way."""
        room = place + DIFFERENCE <= self.variables.high
        steps = np.where(room, DIFFERENCE, -DIFFERENCE)
        units = np.eye(len(place))
        moved = self.terms([place + step * unit for step, unit in zip(steps, units, strict=True)])
        failed = [i for i, terms in enumerate(moved) if terms is None]
        steps[failed] *= -1.0
        for i, terms in zip(failed, self.terms([place + steps[i] * units[i] for i in failed]), strict=True):
            moved[i] = terms
        columns = [values if terms is None else terms for terms in moved]
        return np.array([(terms - values) / step for terms, step in zip(columns, steps, strict=True)]).T


def _terms(task: tuple[Choices, dict[str, float], Effort, Goal]) -> Complex | None:
    choices, dimensions, effort, goal = task
    try:
        terms = goal.terms(solve_trial(choices, dimensions, effort).band)
    except (PlanarError, np.linalg.LinAlgError):
        return None
    return terms if np.isfinite(terms).all() else None


@dataclass(frozen=True, eq=False)
class Sized:
    """Where sizing stands on one mesh.

    `place` (x,) of the variables, `model` of the terms there, `width` of the span (over the centre frequency) sized
    for, and how many `boards` were solved on this mesh for it.
    """

    bench: Bench
    place: Array
    model: LinearModel
    width: float
    boards: int

    @property
    def dimensions(self) -> dict[str, float]:
        """Dimensions, name -> m, not rounded."""
        return self.bench.variables.dimensions(self.place)

    @property
    def rounded(self) -> dict[str, float]:
        """The same, rounded to the drawing step."""
        return self.bench.variables.dimensions(self.place, rounding=True)

    @property
    def worst(self) -> float:
        """Worst term over its limit across the span sized for."""
        return self.bench.goal.worst(self.model.values, self.width)

    @property
    def solutions(self) -> int:
        """Field solutions it took: a matrix filled and solved each."""
        return self.boards * self.bench.effort.nodes


@dataclass(frozen=True, eq=False)
class Verified:
    """Where sizing ended on the fine mesh: where it stands, and the `trial` of the rounded dimensions."""

    sized: Sized
    trial: Trial

    @property
    def held(self) -> tuple[str, ...]:
        """Names of the dimensions that stand at one of their bounds."""
        return self.sized.bench.variables.held(self.sized.place)


def effort_over(choices: Choices, coarser: float, half: float, nodes: int) -> Effort:
    """Effort on a mesh `coarser` than the default, `half` the centre to either side or as far as the goal reaches."""
    wanted = max(half, half_span(choices) + BEYOND)
    more = 2 * math.ceil(10.0 * (wanted - half) - 1e-9)
    return Effort(coarser, nodes + more, (choices.centre * (1.0 - wanted), choices.centre * (1.0 + wanted)))


def verifying_effort(choices: Choices) -> Effort:
    """Effort of the fine mesh."""
    return effort_over(choices, 1.0, FINE_SPAN, FINE_NODES)


def size_coarsely(variables: Variables, workers: Workers) -> Sized:
    """Dimensions that bring the worst term over the widest span inside its limits, or as near as they come.

    Raises `SynthesisError` where not even the start can be drawn or solved.
    """
    sized = _started(variables, Goal.of(variables.choices), workers)
    reach, renewed = FIRST_REACH, False
    for _ in range(ROUNDS):
        here = sized.worst
        sized, promised, reached = _round(sized, reach)
        gain = (here - reached) / max(here - promised, 1e-9)
        reach *= 1.5 if gain > 0.7 else 1.0 if gain > 0.3 else 0.5
        if _enough(sized):
            break
        if reach < LEAST_REACH:
            if renewed or sized.worst < 1.0:
                break
            slopes = sized.bench.slopes(sized.place, sized.model.values)
            model = LinearModel(sized.model.values, slopes)
            sized = replace(sized, model=model, boards=sized.boards + len(sized.place))
            reach, renewed = 0.5 * FIRST_REACH, True
    return sized


def _started(variables: Variables, goal: Goal, workers: Workers) -> Sized:
    """The start with its loop scaled to where it works best, and the derivatives there."""
    place = np.clip(np.zeros(len(variables.names)), variables.low, variables.high)
    choices = variables.choices
    reach = max(CENTRING, half_span(choices) + CENTRING - 0.5 * CENTRING_WIDTH)
    wide = effort_over(choices, COARSER, reach, FINE_NODES + 2 * math.ceil(10.0 * (reach - CENTRING) - 1e-9))
    band = solve_trial(choices, variables.dimensions(place), wide).band
    room = CENTRING - 0.5 * CENTRING_WIDTH
    shifts = np.linspace(1.0 - room, 1.0 + room, 65).tolist()
    best = min(shifts, key=lambda s: goal.worst(goal.terms(band, s), CENTRING_WIDTH) + 0.2 * abs(math.log(s)))
    place[0] = np.clip(math.log(best) / variables.scales[0], variables.low[0], variables.high[0])
    effort = effort_over(choices, COARSER, SPAN, COARSE_NODES)
    bench = Bench(variables, goal, effort, workers)
    place = bench.fitted(place)
    (values,) = bench.terms([place])
    if values is None:
        raise SynthesisError("the field solver cannot take the first dimensions")
    model = LinearModel(values, bench.slopes(place, values))
    return _rewidened(Sized(bench, place, model, goal.widths[0], 2 + len(place)), FIRST_REACH)


def _rewidened(sized: Sized, reach: float) -> Sized:
    """The same, judged over the widest span its model can bring inside the limits within `reach`."""
    width = sized.bench.goal.widths[0]
    for number, each in enumerate(sized.bench.goal.widths):
        step = _step(sized, each, reach)
        if number > 0 and sized.bench.goal.worst(sized.model.at(step), each) > COMFORTABLE:
            break
        width = each
    return replace(sized, width=width)


def _step(sized: Sized, width: float, reach: float) -> Array:
    """The best step for a span of `width` within `reach` and the bounds."""
    variables = sized.bench.variables
    model, limits = sized.bench.goal.part(sized.model, width)
    low, high = np.maximum(-reach, variables.low - sized.place), np.minimum(reach, variables.high - sized.place)
    return best_step(model, limits, low, high)


def _round(sized: Sized, reach: float) -> tuple[Sized, float, float]:
    """The outcome of one round, the worst term it promised, and the one its best board had."""
    goal, width = sized.bench.goal, sized.width
    steps = _fitted_steps(sized, [_step(sized, width, half * reach) for half in HALVES])
    if not steps:
        return sized, sized.worst, math.inf
    promised = goal.worst(sized.model.at(steps[0]), width)
    found = sized.bench.terms([sized.place + step for step in steps])
    tried = [(step, values) for step, values in zip(steps, found, strict=True) if values is not None]
    boards = sized.boards + len(steps)
    if not tried:
        return replace(sized, boards=boards), promised, math.inf
    tried.sort(key=lambda each: -goal.worst(each[1], width))
    slopes = sized.model.slopes
    for step, values in tried:  # the best last, so that the model agrees with it
        slopes = LinearModel(sized.model.values, slopes).learned(step, values).slopes
    step, values = tried[-1]
    reached = goal.worst(values, width)
    if reached >= sized.worst:
        return replace(sized, model=LinearModel(sized.model.values, slopes), boards=boards), promised, reached
    better = replace(sized, place=sized.place + step, model=LinearModel(values, slopes), boards=boards)
    return _rewidened(better, reach), promised, reached


def _fitted_steps(sized: Sized, steps: list[Array]) -> list[Array]:
    """Those of `steps` whose boards can be drawn, shortened to the size limit."""
    fitted = []
    for step in steps:
        try:
            fitted.append(sized.bench.fitted(sized.place + step) - sized.place)
        except SynthesisError:
            continue
    return [step for step in fitted if step.any()]


def _enough(sized: Sized) -> bool:
    """Whether another round is not worth its boards."""
    if sized.worst < SATISFIED and sized.width == sized.bench.goal.widths[-1]:
        return True
    step = _step(sized, sized.width, FIRST_REACH)
    promised = sized.bench.goal.worst(sized.model.at(step), sized.width)
    return promised > sized.worst * (1.0 - (GENEROUS if sized.worst < SATISFIED else ENOUGH))


def size_finely(coarse: Sized) -> Verified:
    """The same on the fine mesh, from where the coarse one ended and with its slopes; dimensions are rounded."""
    effort = verifying_effort(coarse.bench.choices)
    goal = replace(coarse.bench.goal, centre_axial_ratio_db=FINAL_CENTRE_AXIAL_RATIO_DB)
    bench = replace(coarse.bench, goal=goal, effort=effort)
    place = bench.fitted(coarse.place, rounding=True)
    trial = _rounded_trial(bench, place)
    model = LinearModel(goal.terms(trial.band), coarse.model.slopes)
    sized = _rewidened(Sized(bench, place, model, coarse.width, 1), FIRST_REACH)
    reach = FIRST_REACH
    for _ in range(FINE_ROUNDS):
        step = _step(sized, sized.width, reach)
        promised = goal.worst(sized.model.at(step), sized.width)
        if promised > sized.worst * (1.0 - (GENEROUS if sized.worst < 1.0 else ENOUGH)):
            break
        try:
            step = bench.fitted(sized.place + step, rounding=True) - sized.place
            tried = _rounded_trial(bench, sized.place + step)
        except SynthesisError:
            sized, reach = replace(sized, boards=sized.boards + 1), 0.5 * reach
            continue
        values = goal.terms(tried.band)
        learned = sized.model.learned(step, values)
        sized = replace(sized, boards=sized.boards + 1)
        if goal.worst(values, sized.width) < sized.worst:
            trial, sized = tried, replace(sized, place=sized.place + step, model=learned)
        else:
            sized, reach = replace(sized, model=LinearModel(sized.model.values, learned.slopes)), 0.5 * reach
        sized = _rewidened(sized, reach)
    return Verified(sized, trial)


def _rounded_trial(bench: Bench, place: Array) -> Trial:
    return solve_trial(bench.choices, bench.variables.dimensions(place, rounding=True), bench.effort)

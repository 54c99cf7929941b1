"""The next spin: dimensions that bring the response back to where it was designed, on the materials found.

The aim is the design's own predicted response, reflection and polarisation, near the band: what the user accepted once.
Every variable of sizing is tried alone and all of them together, by least squares on second-order models of what each
does to the inferred board; what is offered is solved once more and set right there.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray
from scipy.optimize import least_squares

from planar.copper.rules import fab_findings
from planar.design.choices import Choices
from planar.design.first_order import DETAILS
from planar.design.retune.built import Artwork, Built, Outlook
from planar.design.spread_model import SurfaceModel, fitted_surface
from planar.design.trial import draw
from planar.design.variables import LOOP, Variables, variables_of
from planar.errors import Finding, Severity, SynthesisError

Array = NDArray[np.float64]
Complex = NDArray[np.complex128]

STEPS = {LOOP: 0.08}
USUAL_STEP = 0.10
"""Steps of the variables, in their own units, at which boards are solved: 2 % of the loop, 10 % of a width."""
REACH = 4.0
"""Times its step a variable may move."""
EASE = 0.003
"""Rms reflection a step of a variable must win back; the loop moves for nothing."""
UNMOVED = 1e-7
"""m, a dimension that differs by less is the same one rounded."""
SETTLED = 0.05
"""Of a step, by which a move may still change once it was solved."""
PULL = 5.0
"""Rms reflection a shift of the response counts as: 0.1 % as much as 0.005, so that the frequency comes first."""
ROUNDS = 3
"""Times a move is solved and set right."""
WORTH = 0.004
"""Rms reflection by which all variables together must do better than the loop alone."""
ALONE = 1
"""Dimensions beside the loop that are solved alone at most: those that come nearest."""
CLOSE = 0.75
"""Of the distance from the design, down to which one dimension alone must bring the response to be worth solving."""


@dataclass(frozen=True, eq=False)
class Respin:
    """One way to draw the board anew: `what` moves, its `dimensions` before and after (m), what comes of it, and the
    fab's rules it would break."""

    what: str
    before: dict[str, float]
    dimensions: dict[str, float]
    outlook: Outlook
    broken: tuple[Finding, ...]

    @property
    def moves(self) -> dict[str, tuple[float, float]]:
        """Name -> m from and to, of what moves."""
        return {
            name: (self.before[name], value)
            for name, value in self.dimensions.items()
            if abs(value - self.before[name]) > UNMOVED
        }


@dataclass(frozen=True, eq=False)
class NextSpin:
    """Ways to draw the board anew, the best first, and (what, why not) of the others."""

    ways: tuple[Respin, ...]
    others: tuple[tuple[str, str], ...]


def next_spin(built: Built) -> NextSpin:
    """What to change on the next board, from what is known of this one.

    Raises `SynthesisError` where the variables cannot be solved.
    """
    variables = free_variables(built.choices, built.artwork.dimensions)
    steps = np.array([STEPS.get(name, USUAL_STEP) for name in variables.names])
    model = _moves(built, variables, steps)
    count = len(steps)
    here = _distance(built, built.unchanged)
    alone = {}
    for number, name in enumerate(variables.names):
        mask = np.arange(count) == number
        move = _best(built, model, variables, steps, mask, np.zeros(count))
        alone[name] = (_distance(built, model.at(move[None, :])[0]), mask, move)
    near = sorted((name for name in alone if name != LOOP), key=lambda name: alone[name][0])
    chosen = [LOOP, *(name for name in near[:ALONE] if alone[name][0] < CLOSE * here)]
    others = [
        (_called(name), f"alone it leaves the response {alone[name][0]:.3f} from the design, now {here:.3f}")
        for name in near
        if name not in chosen
    ]
    ways = []
    for name in chosen:
        way = _settled(built, model, variables, steps, *alone[name][1:])
        ways += [] if way is None else [way]
    if count > 1:
        everything = _best(built, model, variables, steps, np.ones(count, dtype=np.bool_), np.zeros(count))
        together = _settled(built, model, variables, steps, np.ones(count, dtype=np.bool_), everything)
        ways += [] if together is None else [together]
    if not ways:
        raise SynthesisError("no change of this board's dimensions could be solved")
    return _ranked(ways, others)


def free_variables(choices: Choices, dimensions: Mapping[str, float]) -> Variables:
    """What may move: for given dimensions too, but for the details that stand in the brief."""
    antenna = choices.brief.antenna
    details = {name: value for name, value in antenna.dimensions.items() if name in DETAILS}
    free = choices.brief.model_copy(update={"antenna": antenna.model_copy(update={"dimensions": details})})
    return variables_of(replace(choices, brief=free), dimensions)


def _moves(built: Built, variables: Variables, steps: Array) -> SurfaceModel:
    """Model of the change of the terms in the steps of the variables over their usual ones."""
    count = len(steps)
    tried = [(number, sign) for number in range(count) for sign in (1.0, -1.0)]
    tried = [(i, s) for i, s in tried if variables.low[i] <= s * steps[i] <= variables.high[i]]
    places = [sign * steps * np.eye(count)[number] for number, sign in tried]
    found = built.changes([Artwork(variables.dimensions(place)) for place in places])
    changes: list[dict[float, Complex]] = [{} for _ in range(count)]
    for (number, sign), terms in zip(tried, found, strict=True):
        if terms is not None:
            changes[number][sign] = terms
    nothing = built.unchanged
    if not any(changes):
        raise SynthesisError("no change of this board's dimensions could be solved")
    return fitted_surface(nothing, [each or {1.0: nothing} for each in changes], {})


def _best(
    built: Built, model: SurfaceModel, variables: Variables, steps: Array, free: NDArray[np.bool_], start: Array
) -> Array:
    """Steps over the usual ones (x,), of the variables that are `free`, that bring the response nearest the design."""
    low = np.minimum(np.maximum(variables.low / steps, -REACH), 0.0)[free]
    high = np.maximum(np.minimum(variables.high / steps, REACH), 0.0)[free]
    price = EASE * np.array([0.0 if name == LOOP else 1.0 for name in variables.names])[free]
    room = high > low
    if not room.any():
        return start

    def whole(part: Array) -> Array:
        place = start.copy()
        place[np.flatnonzero(free)[room]] = part
        return place

    def off(part: Array) -> Array:
        terms = built.inferred.here + model.at(whole(part)[None, :])[0]
        missing = built.missing(terms)
        scaled = missing / np.sqrt(len(missing))
        return np.concatenate([scaled.real, scaled.imag, [PULL * built.shift(terms)], price[room] * part])

    begin = np.clip(start[free][room], low[room] + 1e-9, high[room] - 1e-9)
    found = least_squares(off, begin, bounds=(low[room], high[room]), x_scale=1.0, diff_step=1e-4, max_nfev=30)
    return whole(found.x)


def _settled(
    built: Built, model: SurfaceModel, variables: Variables, steps: Array, free: NDArray[np.bool_], move: Array
) -> Respin | None:
    """The `move` solved, the model set right there and the move found anew, until it stays; rounded at the end."""
    for _ in range(ROUNDS):
        (exact,) = built.changes([Artwork(variables.dimensions(move * steps))])
        if exact is None:
            return None
        model = model.on(model.nominal + exact - model.at(move[None, :])[0])
        again = _best(built, model, variables, steps, free, move)
        moved = float(np.max(np.abs(again - move)))
        move = again
        if moved < SETTLED:
            break
    dimensions = variables.dimensions(move * steps, rounding=True)
    needed = {name: dimensions[name] for name in built.choices.family.needed(built.choices.traits)}
    before = {name: built.artwork.dimensions[name] for name in needed}
    (exact,) = built.changes([Artwork(needed)])
    if exact is None:
        return None
    names = [name for name, moves in zip(variables.names, free, strict=True) if moves]
    what = _called(names[0]) if len(names) == 1 else "all dimensions of sizing together"
    return Respin(what, before, needed, built.outlook(exact), _broken(built.choices, needed))


def _broken(choices: Choices, dimensions: dict[str, float]) -> tuple[Finding, ...]:
    """Rules of the fab and the brief that a board of `dimensions` would break."""
    planned = draw(choices, dimensions, lettered_board=False)
    rules = (*planned.findings, *fab_findings(planned.layout, choices.fab, choices.brief.board.size_limit))
    return tuple(each for each in rules if each.severity is Severity.REFUSE)


def _ranked(ways: list[Respin], others: list[tuple[str, str]]) -> NextSpin:
    """The nearest to the design first; the loop alone where all together hardly do better."""
    allowed = [way for way in ways if not way.broken]
    others = others + [(way.what, f"it would break a rule: {way.broken[0]}") for way in ways if way.broken]

    def price(way: Respin) -> float:
        return way.outlook.distance + WORTH * (len(way.moves) > 1 and way.what != _called(LOOP))

    allowed.sort(key=price)
    return NextSpin(tuple(allowed), tuple(others))


def _distance(built: Built, change: Complex) -> float:
    return float(np.sqrt(np.mean(np.abs(built.missing(built.inferred.here + change)) ** 2)))


def _called(name: str) -> str:
    return "the loop, with all that lies along it" if name == LOOP else name

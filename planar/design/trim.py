"""What cutting does to a finished board: tabs of the loop and the open end of a line, each cut solved.

Every row is the board as drawn with that copper gone; only copper that is there can be removed. All boards are solved
on meshes of the same step, coarser than that of the prediction: compare rows of the table, of which the first is the
whole board on that mesh. Shifts are within 1 % (plain loop) to 6 % (guided ring) of those on a finer mesh.
"""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from planar.copper.tabs import PAIRS
from planar.design.choices import Choices
from planar.design.shift import COARSER, NODES, SOLVED_SPAN, shift, shift_frequencies
from planar.design.sizing import effort_over
from planar.design.trial import Effort, solve_trial
from planar.design.workers import Workers
from planar.errors import Finding, PlanarError, Severity
from planar.network.response import reflection
from planar.units import SPEED_OF_LIGHT, show

Array = NDArray[np.float64]
Complex = NDArray[np.complex128]

TAB_CUTS = {2: "upper pair of tabs", 1: "upper and middle pair of tabs", 0: "all three pairs of tabs"}
"""Pairs left -> what has been cut."""
WHOLE = "nothing, the whole board"
END_STEP = 0.003
"""Least cut of an open end over the wavelength: 1 mm at 0.9 GHz; rounded to 1, 2 or 5 of a power of ten."""
END_CUTS = (1, 2, 4)
"""Cuts of an open end in such steps."""
POINTS = 961
"""Frequencies in the solved span among which the best match is looked for."""
BAND_POINTS = 41
"""Frequencies in the band, its ends among them, of which the worst reflection is taken."""
ADVICE = (
    "measure first, take the row that moves the board the right way, cut half of the computed amount, both tabs of a "
    "pair alike and flush with the trace, measure and cut on"
)


@dataclass(frozen=True)
class Cut:
    """One way of trimming: `name` says what is cut off, `removed` m2 of copper is gone then.

    `hz` is the shift of the response from the whole board, positive is up; `best_match_hz` (None
    outside the span solved) and `worst_reflection_db` over the band hold for the board after the cut.
    """

    name: str
    removed: float
    hz: float
    best_match_hz: float | None
    worst_reflection_db: float


@dataclass(frozen=True)
class _Board:
    """A board to solve: its dimensions and the pairs of tabs left on it."""

    name: str
    dimensions: Mapping[str, float]
    tabs: int = PAIRS


@dataclass(frozen=True, eq=False)
class _Answer:
    """A solved board: `copper` m2, impedance ohm at `shift_frequencies`, and what a `Cut` says of it."""

    copper: float
    impedance: Complex
    best_match_hz: float | None
    worst_reflection_db: float


def cut_table(choices: Choices, dimensions: Mapping[str, float], workers: Workers) -> tuple[Cut, ...]:
    """What each cut does to the board of `dimensions` (name -> m), the whole board first; cuts that cannot be solved
    are left out. Empty without trim tabs."""
    if "trim" not in choices.traits:
        return ()
    whole = _Board(WHOLE, dimensions)
    tabs = [_Board(name, dimensions, left) for left, name in TAB_CUTS.items()]
    boards = [whole, *tabs, *_shortened(choices, dimensions)]
    here, *after = workers.each(_solved, [(choices, board) for board in boards])
    if here is None:
        return ()
    reference, cuts = choices.brief.target.impedance, []
    for board, there in zip(boards, [here, *after], strict=True):
        if there is not None:
            hz = choices.centre * shift(here.impedance, there.impedance, reference)
            removed = here.copper - there.copper
            cuts.append(Cut(board.name, removed, hz, there.best_match_hz, there.worst_reflection_db))
    return tuple(cuts)


def trim_finding(cuts: tuple[Cut, ...]) -> Finding:
    """How to use the table of `cuts`, with what the tabs and the line's end can do."""
    if len(cuts) < 2:
        got = "no cut of this board could be solved"
        return Finding("trimming", "antenna.trim", got, "a table of cuts", "cut little and measure often")
    tabs = [cut.hz for cut in cuts if cut.name in TAB_CUTS.values()]
    ends = [cut.hz for cut in cuts if cut.removed > 0.0 and cut.name not in TAB_CUTS.values()]
    reach = {name: max(each, key=abs) for name, each in (("tabs", tabs), ("line's end", ends)) if each}
    got = ", ".join(f"{hz / 1e6:+.3g} MHz by the {name}" for name, hz in reach.items())
    return Finding("trimming", "antenna.trim", f"up to {got}", "what is cut off stays off", ADVICE, Severity.NOTE)


def _shortened(choices: Choices, dimensions: Mapping[str, float]) -> list[_Board]:
    """The board with its open end shortened, as long as the line still crosses the gap."""
    if choices.end != "open":
        return []
    step = end_step(choices.centre)
    lengths = {count * step: dimensions["end_length"] - count * step for count in END_CUTS}
    return [
        _Board(f"line end shortened by {show(cut, 'length', 3)}", dict(dimensions) | {"end_length": left})
        for cut, left in lengths.items()
        if left > 0.5 * dimensions["gap"]
    ]


def end_step(centre: float) -> float:
    """The least cut of an open end at `centre` Hz, m: 1, 2 or 5 times a power of ten, the nearest by ratio."""
    wanted = END_STEP * SPEED_OF_LIGHT / centre
    decade = 10.0 ** math.floor(math.log10(wanted))
    nearest = min((1.0, 2.0, 5.0, 10.0), key=lambda digit: abs(math.log(wanted / (digit * decade))))
    return nearest * decade


def _solved(task: tuple[Choices, _Board]) -> _Answer | None:
    """The board, None where it cannot be drawn or solved."""
    choices, board = task
    effort = _effort(choices)
    try:
        trial = solve_trial(choices, board.dimensions, effort, tabs=board.tabs)
    except PlanarError:
        return None
    reference = choices.brief.target.impedance
    span = np.linspace(*effort.span, POINTS)
    matched = np.abs(reflection(trial.band.impedance(span), reference))
    in_band = np.linspace(*choices.brief.target.band, BAND_POINTS)
    worst = float(np.max(np.abs(reflection(trial.band.impedance(in_band), reference))))
    return _Answer(
        sum(island.outline.area for island in trial.planned.layout.islands),
        trial.band.impedance(shift_frequencies(choices.centre)),
        _inner_minimum(span, matched),
        20.0 * math.log10(worst),
    )


def _inner_minimum(frequency: Array, values: Array) -> float | None:
    """Where `values` are least, None where that is at an end."""
    place = int(np.argmin(values))
    return float(frequency[place]) if 0 < place < len(values) - 1 else None


def _effort(choices: Choices) -> Effort:
    """That of every comparison, over the whole band where that is wider."""
    return effort_over(choices, COARSER, SOLVED_SPAN, NODES)

"""What sizing may move: dimensions of a family as logarithmic steps from a start.

The loop carries everything that lies along it: its step scales the mean line and all lengths measured along it, so
that it is a shift in frequency and little else. Every other variable is a factor on one dimension.
"""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from planar.design.choices import Choices
from planar.design.first_order import detail_dimensions, stated_dimensions
from planar.design.line_size import LineSettings, line_settings, rounded, rounded_up
from planar.errors import SynthesisError
from planar.lines.line import line_kind
from planar.units import show

Array = NDArray[np.float64]

LOOP, HEIGHT = "loop_width", "loop_height"
WITH_LOOP = ("loop_width", "loop_height", "corner_radius")
REACH = 10.0
"""Factor a dimension may move from its start, where nothing else bounds it."""
SCALES = {LOOP: 0.25, "second_gap": 4.0, "second_gap_position": 0.5}
"""Logarithmic step that counts as one: the loop's decides the frequency, a gap's capacitance hardly its length."""


@dataclass(frozen=True)
class Variables:
    """`names` of what moves from `start` (name -> m), the loop first; `low` and `high` (x,) bound the steps.

    A step is logarithmic, in units of `scales` (x,).
    """

    choices: Choices
    start: Mapping[str, float]
    names: tuple[str, ...]
    scales: Array
    low: Array
    high: Array

    def dimensions(self, step: Array, *, rounding: bool = False) -> dict[str, float]:
        """Dimensions after `step` (x,); with `rounding` to the drawing step."""
        factors = dict(zip(self.names, np.exp(self.scales * step).tolist(), strict=True))
        loop = factors.pop(LOOP)
        family = self.choices.family
        stated = stated_dimensions(self.choices)
        moved = {
            name: value * (loop if (name in WITH_LOOP or name in family.along) and name not in stated else 1.0)
            for name, value in self.start.items()
        }
        moved = {name: value * factors.get(name, 1.0) for name, value in moved.items()}
        if HEIGHT in factors:  # the loop as long as it was: only its proportions change
            width, height = (moved[name] * factors[HEIGHT] ** power for name, power in ((LOOP, -0.5), (HEIGHT, -0.5)))
            longer = (moved[LOOP] + moved[HEIGHT] / factors[HEIGHT]) / (width + height)
            moved |= {LOOP: width * longer, HEIGHT: height * longer}
            moved["corner_radius"] = min(moved["corner_radius"], 0.5 * min(moved[LOOP], moved[HEIGHT]))
        if "end_width" in moved and self.choices.end == "open":  # the open end is the line gone on
            moved["end_width"] = moved["line_width"]
        if rounding:
            moved = {name: value if name in stated else rounded(value) for name, value in moved.items()}
        details = {k: v for k, v in detail_dimensions(self.choices, moved).items() if k not in stated}
        return moved | details

    def held(self, step: Array) -> tuple[str, ...]:
        """Names of what stands at one of its bounds after `step`."""
        near = (step < self.low + 1e-3) | (step > self.high - 1e-3)
        return tuple(name for name, held in zip(self.names, near, strict=True) if held)


def variables_of(choices: Choices, start: Mapping[str, float]) -> Variables:
    """What sizing moves of the dimensions `start`, and how far. Raises `SynthesisError` where bounds leave nothing."""
    stated = stated_dimensions(choices)
    fixed = {*stated, *(["loop_height"] if choices.brief.antenna.aspect_ratio is not None else [])}
    sized = [name for name in choices.family.sized(choices.traits) if name not in fixed]
    names = (LOOP, *sorted(sized))
    low, high = np.full(len(names), -math.log(REACH)), np.full(len(names), math.log(REACH))
    settings = line_settings(choices)
    for number, name in enumerate(names[1:], start=1):
        least, most = _bounds(choices, name, start, settings)
        if least > most:
            raise SynthesisError(
                f"{name} would be at least {show(least, 'length', 3)} for the fab and the line formulas, and at most "
                f"{show(most, 'length', 3)} under a trace of {show(start['trace_width'], 'length', 3)}: give "
                "antenna.trace_width more, or choose a finer fab"
            )
        low[number] = max(low[number], math.log(least / start[name]))
        high[number] = max(low[number], min(high[number], math.log(most / start[name])))
    scales = np.array([SCALES.get(name, 1.0) for name in names])
    return Variables(choices, start, names, scales, low / scales, high / scales)


def _bounds(choices: Choices, name: str, start: Mapping[str, float], settings: LineSettings) -> tuple[float, float]:
    """Smallest and largest value, m: what the fab etches, line formulas cover, and the trace over which a line runs."""
    fab = choices.fab
    if name.endswith("_gap"):
        return rounded_up(fab.min_gap), math.inf
    if not name.endswith("_width"):
        return 1e-6, math.inf
    gap = start["strip_gap"] if name == "strip_width" else None
    kind = line_kind("microstrip" if gap is None else "coplanar-strips")
    low, high = kind.width_limits(gap, settings.substrate, settings.conductor, settings.frequency)
    widest = 0.5 * start["trace_width"] if gap is None else math.inf
    return max(rounded_up(fab.min_track), rounded_up(low)), min(high, widest)

"""How a sweep is drawn: over which axis, a curve for which settings, each with a look of its own.

The axis with the most numbers runs across; without one an axis of words does, and then nothing joins the points. Of
the other axes the laminate, or else the first, has the colour, the rest the dash; marks differ with both. Where there
are more curves than can be told apart, the colour alone is explained.
"""

from __future__ import annotations

import itertools
import math
import re
from collections.abc import Mapping, Sequence
from dataclasses import dataclass

from planar.design.sweep_axes import Axis

COLOURS, DASHED = 6, ("solid", "dashed", "dotted")
"""Accents of the palette, and names of dashes."""
KINDS = ("circle", "square", "up", "diamond", "down")
"""Names of marks."""
MOST_NAMED = COLOURS * len(DASHED)
"""Curves beyond which the legend no longer names each."""
_LAMINATE = "board.laminate"
_NUMBER = re.compile(r"([+-]?(?:\d+\.?\d*|\.\d+)(?:[eE][+-]?\d+)?)\s*([^\W\d_][\w/]*|%)?")

Setting = tuple[str, ...]


@dataclass(frozen=True)
class Look:
    """Number of the accent from 1, name of the dash, kind of mark, width in px."""

    accent: int
    dash: str
    mark: str
    width: float = 2.0


@dataclass(frozen=True)
class Curves:
    """The axis `along` with the place of each of its texts and their `unit` (None: words, not numbers); the axes whose
    settings are curves, the look of each curve, and the legend: what its entries are of, and their words."""

    along: Axis
    places: Mapping[str, float]
    unit: str | None
    others: tuple[Axis, ...]
    looks: Mapping[Setting, Look]
    named_by: str
    legend: tuple[tuple[Look, str], ...]


def sweep_curves(axes: Sequence[Axis]) -> Curves:
    """How to draw a sweep over `axes`. An axis of one value makes neither curves nor a scale if another can."""
    varied = [axis for axis in axes if len(set(axis.texts)) > 1] or list(axes[:1])
    numeric = [axis for axis in varied if axis_numbers(axis) is not None]
    along = max(numeric, key=lambda axis: len(set(axis.texts)), default=varied[0])
    others = sorted((axis for axis in varied if axis is not along), key=lambda axis: axis.key != _LAMINATE)
    numbers = axis_numbers(along)
    if numbers is None:
        places, unit = {text: float(i) for i, text in enumerate(dict.fromkeys(along.texts))}, None
    else:
        places, unit = {text: float(number) for text, number in numbers[0].items()}, numbers[1]
    looks, entries = _looks(others)
    by = ", ".join(axis.key for axis in (others if len(entries) == len(looks) else others[:1]))
    return Curves(along, places, unit, tuple(others), looks, by, entries if others else ())


def axis_numbers(axis: Axis) -> tuple[dict[str, str], str] | None:
    """Text -> its number as it was written, and their common unit; None unless all are numbers with the same unit."""
    found = [_NUMBER.fullmatch(text.strip()) for text in axis.texts]
    units = {(match[2] or "").strip() for match in found if match}
    if not all(found) or len(units) != 1:
        return None
    numbers = {text: match[1] for text, match in zip(axis.texts, found, strict=True) if match}
    return (numbers, units.pop()) if all(math.isfinite(float(each)) for each in numbers.values()) else None


def _looks(others: Sequence[Axis]) -> tuple[dict[Setting, Look], tuple[tuple[Look, str], ...]]:
    """Look of each curve, and the entries of the legend: one a curve, or one a colour where that is too many."""
    values = [list(dict.fromkeys(axis.texts)) for axis in others]
    curves = list(itertools.product(*values))
    first, rest = len(values[0]) if values else 1, len(curves) // (len(values[0]) if values else 1)
    if len(curves) <= MOST_NAMED:
        shared = rest > 1 and first <= COLOURS and rest <= len(DASHED)
        places = [divmod(i, rest) if shared else (i % COLOURS, i // COLOURS) for i in range(len(curves))]
        looks = {curve: _look(*place) for curve, place in zip(curves, places, strict=True)}
        return looks, tuple((look, ", ".join(curve)) for curve, look in looks.items())
    looks = {}
    for i, curve in enumerate(curves):
        colour = i // rest
        looks[curve] = Look(colour % COLOURS + 1, DASHED[colour // COLOURS % len(DASHED)], "circle", 1.0)
    named = tuple((looks[curves[i * rest]], text) for i, text in enumerate(values[0]))
    return looks, named if len(named) <= MOST_NAMED else ()


def _look(colour: int, dash: int) -> Look:
    return Look(colour + 1, DASHED[dash], KINDS[(colour + dash) % len(KINDS)])

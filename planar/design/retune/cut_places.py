"""The copper each advised cut takes off the board: of the whole cut and of the first, for a drawing at true scale."""

from __future__ import annotations

from collections.abc import Mapping

from planar.copper.cut_off import Board, CutOff, cut_off
from planar.copper.tabs import PAIRS
from planar.design.choices import Choices
from planar.design.retune.cuts import Cut
from planar.design.trial import drawing_request
from planar.errors import GeometryError, SynthesisError


def cut_places(choices: Choices, dimensions: Mapping[str, float], cut: Cut) -> CutOff:
    """What `cut` takes off the board of `choices` and `dimensions` (name -> m).

    Raises `SynthesisError` where it cannot be drawn.
    """
    before = Board(choices.family.key, dimensions, drawing_request(choices))
    whole = before.changed(cut.artwork.dimensions, cut.artwork.tabs)
    try:
        return cut_off(cut.what, before, _first(before, whole), whole)
    except GeometryError as error:
        raise SynthesisError(f"the cut cannot be drawn: {error}") from error


def _first(before: Board, whole: Board) -> Board:
    """The board after the first cut: half of the way, half of the tabs that go, half the length of a single pair."""
    was, left = before.dimensions, whole.request.tabs
    if left == before.request.tabs:
        return before.changed({name: 0.5 * (was[name] + value) for name, value in whole.dimensions.items()})
    if left == PAIRS - 1:
        return before.changed({**was, "tab_length": 0.5 * was["tab_length"]})
    return before.changed(was, PAIRS - (PAIRS - left) // 2)

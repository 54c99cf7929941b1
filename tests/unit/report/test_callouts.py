"""Callouts in the margins, and the column they are spread over."""

from __future__ import annotations

import itertools

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.optimize import minimize

from planar.report.callouts import Callout, Placing, beside, keyed
from planar.report.svg import Box, spread

PLAN = Box(0.0, 0.0, 100.0, 80.0)
SPOTS = st.lists(st.tuples(st.floats(0.0, 100.0), st.floats(0.0, 80.0)), max_size=24)


def callouts(spots: list[tuple[float, float]]) -> list[Callout]:
    return [Callout(f"n{i}", f"dimension {i}", f"{i}.25 mm", spot, 2.0 * (i % 2)) for i, spot in enumerate(spots)]


@pytest.mark.parametrize("placing", [beside, keyed])
@given(spots=SPOTS)
@settings(max_examples=40, deadline=None)
def test_none_overlaps_another_or_the_plan(placing: Placing, spots: list[tuple[float, float]]) -> None:
    margins = placing(callouts(spots), PLAN, 3.0)
    assert {each.callout.name for each in margins.placed} == {f"n{i}" for i in range(len(spots))}
    for one, other in itertools.combinations(margins.placed, 2):
        assert not one.box.overlaps(other.box)
    for each in margins.placed:
        assert not each.box.overlaps(PLAN)
        assert each.leader[-1] == each.callout.spot
        assert margins.extent.joined(each.box) == margins.extent


@given(spots=SPOTS)
@settings(max_examples=40, deadline=None)
def test_numbers_run_down_the_left_and_then_the_right(spots: list[tuple[float, float]]) -> None:
    placed = keyed(callouts(spots), PLAN, 3.0).placed
    assert [each.number for each in placed] == list(range(1, len(spots) + 1))
    order = [(not each.left, each.box.y0) for each in placed]
    assert order == sorted(order)


@pytest.mark.parametrize(
    ("wanted", "heights"),
    [
        ([0.0, 100.0, 200.0], [10.0, 10.0, 10.0]),
        ([5.0, 5.0, 5.0, 60.0], [10.0, 20.0, 10.0, 4.0]),
        ([30.0, 10.0, 20.0, 21.0, 90.0, 80.0], [8.0, 8.0, 8.0, 3.0, 9.0, 9.0]),
    ],
)
def test_a_column_is_the_nearest_without_overlap(wanted: list[float], heights: list[float]) -> None:
    """Against a general optimiser (SLSQP of scipy): least squares of the displacements under the distances."""
    least = 0.5 * (np.array(heights[:-1]) + np.array(heights[1:]))
    found = np.array(spread(wanted, heights))
    best = minimize(
        lambda x: float(np.sum((x - np.array(wanted)) ** 2)),
        np.cumsum([0.0, *least]),
        constraints={"type": "ineq", "fun": lambda x: np.diff(x) - least},
        method="SLSQP",
    )
    assert np.all(np.diff(found) >= least - 1e-9)
    assert found == pytest.approx(best.x, abs=1e-3)


def test_no_callouts_leave_the_plan_alone() -> None:
    assert spread([], []) == []
    for placing in (beside, keyed):
        assert placing([], PLAN, 3.0).extent == PLAN

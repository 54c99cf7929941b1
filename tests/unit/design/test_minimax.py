"""The minimax step and what it is made of. Authority: cases solved by hand, and brute force on a grid."""

from __future__ import annotations

import numpy as np
import pytest

from planar.design.minimax import LinearModel, best_step, worst

BOX = np.full(2, 1.0)


def test_single_term_is_brought_to_zero() -> None:
    """|0.5 + x| is least at x = -0.5; a price of the way keeps it a little short."""
    model = LinearModel(np.array([0.5 + 0j]), np.array([[1.0 + 0j]]))
    step = best_step(model, np.ones(1), np.array([-1.0]), np.array([1.0]))
    assert step[0] == pytest.approx(-0.5, abs=0.03)


def test_two_terms_meet_half_way() -> None:
    """|x - 1| and |x + 0.4| are equal at x = 0.3."""
    model = LinearModel(np.array([-1.0 + 0j, 0.4]), np.array([[1.0 + 0j], [1.0]]))
    step = best_step(model, np.ones(2), np.array([-2.0]), np.array([2.0]))
    assert step[0] == pytest.approx(0.3, abs=0.06)


def test_limits_weigh_the_terms() -> None:
    """|x - 1|/1 and |x + 1|/3 are equal at x = 0.5."""
    model = LinearModel(np.array([-1.0 + 0j, 1.0]), np.array([[1.0 + 0j], [1.0]]))
    step = best_step(model, np.array([1.0, 3.0]), np.array([-2.0]), np.array([2.0]))
    assert step[0] == pytest.approx(0.5, abs=0.1)


def test_as_good_as_a_grid() -> None:
    """Ten random complex terms of two variables: nothing on a grid of 401 by 401 is better by more than 6 %."""
    random = np.random.default_rng(3)
    values = random.normal(size=10) + 1j * random.normal(size=10)
    slopes = random.normal(size=(10, 2)) + 1j * random.normal(size=(10, 2))
    limits = random.uniform(0.5, 2.0, 10)
    model = LinearModel(values, slopes)
    found = worst(model.at(best_step(model, limits, -BOX, BOX)), limits)
    grid = np.linspace(-1.0, 1.0, 401)
    places = np.stack(np.meshgrid(grid, grid), axis=-1).reshape(-1, 2)
    best = (np.abs(values[:, None] + slopes @ places.T) / limits[:, None]).max(axis=0).min()
    assert best <= found * (1.0 + 1e-9)
    assert found < 1.06 * best


def test_stays_in_the_box() -> None:
    model = LinearModel(np.array([5.0 + 0j]), np.array([[1.0 + 0j, 0.0]]))
    step = best_step(model, np.ones(1), np.array([-0.3, -0.1]), np.array([0.2, 0.4]))
    assert step == pytest.approx([-0.3, 0.0], abs=1e-6)


def test_what_does_not_help_stays() -> None:
    """The second variable moves nothing: it is not moved."""
    model = LinearModel(np.array([0.5 + 0j]), np.array([[1.0 + 0j, 0.0]]))
    assert best_step(model, np.ones(1), -BOX, BOX)[1] == pytest.approx(0.0, abs=1e-6)


def test_a_step_teaches_in_its_own_direction_only() -> None:
    """Broyden 1965: slopes across the step stay; along it the model comes nearer to what was found."""
    model = LinearModel(np.array([1.0 + 0j]), np.array([[1.0 + 0j, 2.0]]))
    learned = model.learned(np.array([0.8, 0.0]), np.array([1.0 + 0.4j]))
    assert learned.values[0] == 1.0 + 0.4j
    assert learned.slopes[0, 1] == 2.0
    before, after = (abs(each.slopes[0, 0] - 0.5j) for each in (model, learned))
    assert after < 0.1 * before


def test_a_short_step_teaches_little() -> None:
    model = LinearModel(np.array([1.0 + 0j]), np.array([[1.0 + 0j]]))
    learned = model.learned(np.array([0.02]), np.array([1.5 + 0j]))
    assert abs(learned.slopes[0, 0] - 1.0) < 0.01 * abs(0.48 / 0.02)

"""The shift of a response. Authority: a resonance whose frequency is moved by a known fraction moves by that fraction;
against `planar.design.shift` the definitions agree."""

import numpy as np
import pytest

from planar.design.retune.moving import best_match, response_shift, shift_slopes
from planar.design.shift import POINTS, SLOPE, shift, shift_frequencies
from planar.network.response import reflection

CENTRE = 1e9
GRID = CENTRE * np.linspace(0.85, 1.15, 61)


def resonance(frequency, f0):
    return 50.0 / (1.0 + 8j * (frequency / f0 - f0 / frequency))


@pytest.mark.parametrize("moved", [-0.03, -0.004, 0.0, 0.02])
def test_shift_of_a_moved_resonance_is_what_it_was_moved_by(moved):
    nominal, there = (reflection(resonance(GRID, f0), 50.0) for f0 in (CENTRE, CENTRE * (1.0 + moved)))
    # the mean slope errs in third order: (2 Q moved)^2 of the shift with a factor below one, here a quarter
    third = abs(moved) * (2.0 * 8.0 * moved) ** 2
    assert response_shift(GRID, nominal, there) == pytest.approx(moved, abs=0.25 * third + 1e-9)


def test_shift_is_that_of_the_solved_boards():
    at = shift_frequencies(CENTRE)
    here, there = (resonance(at, f0) for f0 in (CENTRE, 0.99 * CENTRE))
    grid = np.unique(np.concatenate([GRID, at[1 : 1 + POINTS]]))
    nominal, moved = (reflection(resonance(grid, f0), 50.0) for f0 in (CENTRE, 0.99 * CENTRE))
    assert SLOPE < 0.01  # its differences are small beside the resonance
    assert response_shift(grid, nominal, moved) == pytest.approx(shift(here, there, 50.0), rel=0.02)


def test_slopes_of_the_shift_are_its_differences():
    nominal, there = (reflection(resonance(GRID, f0), 50.0) for f0 in (CENTRE, 0.995 * CENTRE))
    change = reflection(resonance(GRID, 0.99501 * CENTRE), 50.0) - there
    step = response_shift(GRID, nominal, there + change) - response_shift(GRID, nominal, there)
    assert shift_slopes(GRID, nominal, there, change[:, None])[0] == pytest.approx(step, rel=0.02)


def test_best_match_is_the_dip_and_none_at_an_end():
    assert best_match(GRID, reflection(resonance(GRID, 0.97e9), 50.0)) == pytest.approx(0.97e9, rel=1e-3)
    assert best_match(GRID, reflection(resonance(GRID, 0.7e9), 50.0)) is None

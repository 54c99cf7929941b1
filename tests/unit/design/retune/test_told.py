"""What is said to be told. Authority: which causes the formula board tells apart is known: permittivity and thickness
act through one number."""

import numpy as np
import pytest


def test_permittivity_and_thickness_are_told_together(low_board):
    said = low_board.said[0]
    assert "laminate permittivity" in said
    assert "dielectric thickness" in said
    assert "cannot be told apart here: the combined effect on the response is -" in said
    assert " +- " in said


def test_length_of_line_is_said(low_board):
    assert any("mm of coax" in each and each.startswith("in front") for each in low_board.said)


def test_best_told_direction_is_a_combination(low_board):
    narrow = [each for each in low_board.directions if each.narrowed < 0.3]
    board = [dict(each.weights) for each in narrow if "laminate permittivity" in dict(each.weights)]
    assert board
    assert all(len(each) > 1 for each in board)


def test_intervals_hold_the_values(low_board):
    for value in low_board.values:
        assert value.low <= value.value <= value.high
        assert 0.0 < value.narrowed <= 1.0 + 1e-9


def test_posterior_draws_scatter_about_the_answer(low_board):
    drawn = low_board.drawn(200, 1)
    count = len(low_board.model.grid)
    assert drawn.shape == (200, count)
    assert np.abs(drawn.mean(axis=0) - low_board.here[:count]).max() < 0.01
    assert low_board.drawn(3, 1) == pytest.approx(low_board.drawn(3, 1))

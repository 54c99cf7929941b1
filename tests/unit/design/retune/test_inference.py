"""Inference on a board by formulas. Authority: the values the synthetic measurement was made with; for the covariance,
the chi-square law of the normalised error (Tarantola, Inverse Problem Theory, SIAM 2005, section 3.4)."""

from dataclasses import replace

import numpy as np
import pytest
from scipy.stats import chi2

from planar.design.retune.inference import Doubt, estimated
from planar.design.retune.moving import response_shift
from planar.design.retune.sight import Sight
from planar.design.retune.unknowns import COAX_SPEED, board_unknowns, other_unknowns, stated_plane, unstated_plane
from planar.network.plane import Launch

DRAWS = 200


def sight_of(model, plane, frequency, z0=50.0):
    unknowns = (*board_unknowns(model.question.quantities), *other_unknowns(plane))
    return Sight.at(frequency, z0, board=(model.grid, model.reflections, model.question.reference), unknowns=unknowns)


def test_slopes_are_differences_of_what_is_seen(model):
    sight = sight_of(model, unstated_plane(), model.grid[3:-3:4])
    z = np.linspace(-0.8, 0.7, len(sight.unknowns))
    _, slopes, _ = sight.slopes(z)
    for column, unit in enumerate(1e-5 * np.eye(len(z))):
        step = (sight.seen(z + unit) - sight.seen(z - unit)) / 2e-5
        # differences of step 1e-4 stand behind the line's own slopes; the board's are exact
        np.testing.assert_allclose(slopes[:, column], step, atol=2e-4)


def test_bare_is_the_inverse_of_seen(model):
    sight = sight_of(model, unstated_plane(), model.grid)
    z = np.linspace(0.5, -0.5, len(sight.unknowns))
    np.testing.assert_allclose(sight.bare(sight.seen(z), z), sight.antenna(z), atol=1e-12)


def test_covariance_is_that_of_the_errors(model):
    frequency = np.linspace(model.grid[0], model.grid[-1], 41)
    flat = replace(model.reflections, squares=np.zeros_like(model.reflections.squares))  # for a law of normal errors
    sight = sight_of(model, stated_plane(1e-10), frequency)
    sight = Sight.at(frequency, 50.0, board=(model.grid, flat, sight.reference), unknowns=sight.unknowns)
    whitener = Doubt.of(0.004, 0.002).whitener(frequency)
    colour = np.linalg.inv(whitener)
    random, count = np.random.default_rng(3), len(sight.unknowns)
    errors, inside = [], []
    for _ in range(DRAWS):
        z = random.standard_normal(count)
        dirt = colour @ random.standard_normal((len(frequency), 2))
        found = estimated(sight, sight.seen(z) + dirt @ np.array([1.0, 1j]), whitener, np.zeros(count))
        off = found.z - z
        errors.append(off @ np.linalg.solve(found.covariance, off))
        inside.append(np.abs(off) < 1.96 * np.sqrt(np.diag(found.covariance)))
    # the mean of 200 chi-squares of `count` degrees stays within 4 standard errors; curvature of the model adds little
    assert np.mean(errors) == pytest.approx(count, abs=4.0 * np.sqrt(2.0 * count / DRAWS))
    assert np.mean(np.array(errors) > chi2.ppf(0.95, count)) == pytest.approx(0.05, abs=0.045)
    assert 0.90 <= np.mean(inside) <= 0.98


@pytest.mark.parametrize("length", [0.0, 0.005, 0.03, 0.06, 0.12])
def test_length_of_the_line_in_front_is_found(bench, length):
    launch = Launch(length / COAX_SPEED, 0.05, bench.model.choices.centre)
    found = bench.inferred(bench.measured(bench.deviations(), launch))
    delay = next(each for each in found.values if each.unit == "s")
    assert delay.low <= launch.delay <= delay.high
    assert delay.high - delay.low < 2.0 * 0.004 / COAX_SPEED  # a few millimetres, though 130 were possible


@pytest.mark.parametrize("permittivity", [-1.0, -0.6, 0.4, 1.0])
def test_shift_is_found_with_its_interval(bench, permittivity):
    deviations = bench.deviations(laminate_permittivity=permittivity)
    here, there = (bench.model.exact(each) for each in (bench.deviations(), deviations))
    found = bench.inferred(bench.measured(deviations, Launch(0.03 / COAX_SPEED, 0.05, bench.model.choices.centre)))
    low, high = found.effect.interval
    true = response_shift(bench.model.grid, here, there)
    assert low <= true <= high
    assert found.effect.sign in (0, int(np.sign(true)))
    assert found.effect.sd < 0.004
    assert found.fit.estimate.rms < 0.006


def test_a_stated_length_narrows_the_answer(bench):
    deviations = bench.deviations(laminate_permittivity=1.0)
    launch = Launch(0.03 / COAX_SPEED, 0.0, bench.model.choices.centre)
    measured = bench.measured(deviations, launch)
    free, stated = bench.inferred(measured), bench.inferred(measured, stated_plane(launch.delay))
    assert stated.effect.sd < free.effect.sd
    assert stated.effect.sign == -1

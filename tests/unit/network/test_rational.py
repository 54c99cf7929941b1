"""Rational models of functions whose poles, zeros and residues are known in closed form."""

import cmath
import math

import numpy as np
import pytest

from planar.errors import RangeError
from planar.network.rational import RationalModel, fit_rational

F = np.linspace(0.765e9, 1.035e9, 101)


def partial_fractions(z: np.ndarray, poles: np.ndarray, residues: np.ndarray, constant: complex) -> np.ndarray:
    return constant + (residues / (np.asarray(z)[..., None] - poles)).sum(axis=-1)


@pytest.mark.parametrize("degree", [1, 2, 3, 4])
def test_rational_function_of_known_degree_is_recovered(degree: int) -> None:
    """Type (k, k) takes k + 1 support points; poles and residues come back to rounding times their condition."""
    rng = np.random.default_rng(degree)
    poles = 1e9 * (np.linspace(0.8, 1.0, degree) + 1j * rng.uniform(0.02, 0.1, degree))
    residues = 1e9 * (rng.uniform(1.0, 2.0, degree) + 1j * rng.uniform(-1.0, 1.0, degree))
    values = partial_fractions(F, poles, residues, 3.0 - 2.0j)
    model = fit_rational(F, values, tolerance=1e-12)
    assert len(model.support) == degree + 1
    order = np.argsort(model.poles.real)
    np.testing.assert_allclose(model.poles[order], poles, rtol=1e-9)
    np.testing.assert_allclose(model.residues[order], residues, rtol=1e-6)
    beyond = np.array([0.5e9, 1.4e9, 0.9e9 - 0.3e9j])
    np.testing.assert_allclose(model(beyond), partial_fractions(beyond, poles, residues, 3.0 - 2.0j), rtol=1e-7)
    np.testing.assert_allclose(partial_fractions(model.zeros, poles, residues, 3.0 - 2.0j), 0.0, atol=1e-6)


@pytest.mark.parametrize("q", [5.0, 50.0, 500.0])
def test_poles_of_a_series_resonator(q: float) -> None:
    """Y = 1/(R + j omega L + 1/(j omega C)): f = f0 (j/(2 Q) +- sqrt(1 - 1/(4 Q^2))), zeros at 0 and infinity."""
    f0, resistance = 0.9e9, 100.0
    x = F / f0
    model = fit_rational(F, 1.0 / (resistance * (1.0 + 1j * q * (x - 1.0 / x))), tolerance=1e-11)
    exact = f0 * (0.5j / q + np.array([1.0, -1.0]) * cmath.sqrt(1.0 - 0.25 / q**2))
    found = model.poles[np.argsort(-model.poles.real)]
    assert found[0] == pytest.approx(exact[0], rel=1e-10)
    assert found[1] == pytest.approx(exact[1], rel=1e-5)  # far outside the band
    assert model.zeros == pytest.approx([0.0], abs=1e-6 * f0)


def test_model_meets_its_data_at_the_support_exactly() -> None:
    values = np.exp(1j * F / 1e8) / (F - 0.9e9 - 2e7j)
    model = fit_rational(F, values)
    at = np.searchsorted(F, model.support)
    assert (model(model.support) == values[at]).all()
    assert np.abs(model(F) - values).max() <= 1e-6 * np.abs(values).max()


def test_call_keeps_the_shape() -> None:
    model = fit_rational(F, 1.0 / (F - 0.9e9 - 2e7j))
    assert model(0.9e9).shape == ()
    assert model(F.reshape(1, -1, 1)).shape == (1, 101, 1)


def test_spurious_pole_and_zero_are_removed() -> None:
    """|x| on 50 samples: its only singularity on the line is at 0, its rational models have poles on the
    imaginary axis (from memory); without the removal one stays at x = 0.301.
    """
    x = np.linspace(-1.0, 1.0, 50)
    model = fit_rational(x, np.abs(x), tolerance=1e-8)
    nearly_real = model.poles[np.abs(model.poles.imag) < 1e-3]
    assert (np.abs(nearly_real.real) < 0.05).all()
    assert np.abs(model(x) - np.abs(x)).max() <= 1e-8


@pytest.mark.parametrize("constant", [0.0, 2.0 - 1.0j])
def test_constant_has_one_support_point_and_no_poles(constant: complex) -> None:
    model = fit_rational(F, np.full(len(F), constant))
    assert len(model.support) == 1
    assert len(model.poles) == len(model.zeros) == len(model.residues) == 0
    assert model(2e9) == constant


def test_one_sample_is_a_constant() -> None:
    assert fit_rational([1e9], [3.0])(5e9) == 3.0


def test_two_samples_cannot_carry_a_slope() -> None:
    with pytest.raises(RangeError, match="off by"):
        fit_rational([1.0, 2.0], [1.0, 2.0])


def test_order_of_the_samples_does_not_matter() -> None:
    values = 1.0 / (F - 0.9e9 - 2e7j)
    shuffled = np.random.default_rng(0).permutation(len(F))
    there = np.array([0.8e9, 0.93e9])
    np.testing.assert_allclose(fit_rational(F[shuffled], values[shuffled])(there), fit_rational(F, values)(there))


def test_weights_up_to_a_factor_give_the_same_function() -> None:
    """r = n/d does not change when all weights are multiplied by one number."""
    model = fit_rational(F, 1.0 / (F - 0.9e9 - 2e7j))
    scaled = RationalModel(model.support, model.values, 7e5j * model.weights)
    np.testing.assert_allclose(scaled(F), model(F), rtol=1e-12)
    np.testing.assert_allclose(scaled.poles, model.poles, rtol=1e-9)


def test_model_cannot_be_changed() -> None:
    model = fit_rational(F, 1.0 / (F - 0.9e9 - 2e7j))
    for array in (model.support, model.values, model.weights, model.poles, model.zeros, model.residues):
        with pytest.raises(ValueError, match="read-only"):
            array[0] = 0.0


@pytest.mark.parametrize(
    ("frequency", "values", "words"),
    [
        ([1.0, 1.0], [1.0, 2.0], "distinct"),
        ([1.0, 2.0], [1.0], "one length"),
        ([], [], "one length"),
        ([[1.0, 2.0]], [[1.0, 2.0]], "rows"),
        ([1.0, math.inf], [1.0, 2.0], "finite"),
        ([1.0, 2.0], [1.0, math.nan], "finite"),
    ],
)
def test_samples_that_are_none_are_refused(frequency: list[float], values: list[float], words: str) -> None:
    with pytest.raises(RangeError, match=words):
        fit_rational(frequency, values)


def test_tolerance_not_reached_is_an_error() -> None:
    noise = np.random.default_rng(3).normal(size=101)
    with pytest.raises(RangeError, match=r"8 support points, 1\.00e-06 was asked for"):
        fit_rational(F, 1.0 + noise, most=8)


@pytest.mark.parametrize("wrong", [{"tolerance": 0.0}, {"most": 0}])
def test_senseless_limits_are_refused(wrong: dict[str, float]) -> None:
    with pytest.raises(RangeError, match="must be positive"):
        fit_rational(F, np.ones(len(F)), **wrong)  # type: ignore[arg-type]

"""The rational model on the examples of its paper.

Y. Nakatsukasa, O. Sete, L. N. Trefethen, SIAM J. Sci. Comput. 40 (2018) A1494. The functions are those of its examples
(from memory: exp, tan(pi z/2), the gamma function, |x|), on real samples, since frequency is real. What they are
checked against is exact: poles and residues of the functions, the best rational approximation of |x|, and
scipy's own AAA where there is one.
"""

import math

import numpy as np
import pytest
import scipy.interpolate
import scipy.special

from planar.network.rational import fit_rational

X = np.linspace(-1.0, 1.0, 1000)


def test_exponential_to_thirteen_digits() -> None:
    """Best type (6, 6) on [-1, 1] is off by 6!^2/(12! 13!) 2^-12 = 4e-17 (Braess, leading term; from memory),
    best type (5, 5) by 1e-13 and best type (4, 4) by 1.5e-10: a tolerance of 1e-13 e needs 6 or 7 support points.
    """
    model = fit_rational(X, np.exp(X), tolerance=1e-13)
    between = np.linspace(-1.0, 1.0, 9973)
    assert len(model.support) in {6, 7}
    np.testing.assert_allclose(model(between), np.exp(between), rtol=0, atol=3e-13)
    assert np.abs(model.poles).min() > 5.0  # an entire function: none near the interval


def test_tangent_has_poles_at_odd_integers() -> None:
    """tan(pi z/2): poles at odd integers, residues -2/pi, zeros at even integers. The nearest ones are known best."""
    x = np.linspace(-0.9, 0.9, 500)
    model = fit_rational(x, np.tan(0.5 * np.pi * x), tolerance=1e-13)
    nearest = np.argsort(np.abs(model.poles))
    poles, residues = model.poles[nearest], model.residues[nearest]
    np.testing.assert_allclose(np.sort(poles[:2].real), [-1.0, 1.0], rtol=1e-9)
    np.testing.assert_allclose(residues[:2], -2.0 / math.pi, rtol=1e-7)
    np.testing.assert_allclose(np.sort(poles[2:4].real), [-3.0, 3.0], rtol=0.01)
    assert np.abs(model.zeros).min() < 1e-12


def test_gamma_function_poles_inside_the_samples() -> None:
    """Gamma(x): poles at -n with residue (-1)^n/n!, and Gamma(1/2) = sqrt(pi) (Abramowitz & Stegun 6.1)."""
    x = np.linspace(-1.5, 1.5, 100)
    model = fit_rational(x, scipy.special.gamma(x), tolerance=1e-12)
    for n, digits in ((0, 1e-12), (1, 1e-8), (2, 1e-5)):
        k = np.abs(model.poles + n).argmin()
        assert model.poles[k] == pytest.approx(-n, abs=digits)
        assert model.residues[k] == pytest.approx((-1) ** n / math.factorial(n), abs=10 * digits)
    assert model(0.5) == pytest.approx(math.sqrt(math.pi), rel=1e-11)


def test_modulus_converges_at_a_root_exponential_rate() -> None:
    """Best type (n, n) of |x| on [-1, 1] is off by 8 exp(-pi sqrt(n)), (Stahl; from memory): 1e-3 needs
    n = 8.2, even n being the ones that count; AAA is not best but should need less than twice that.
    """
    x = np.sort(np.concatenate([s * np.logspace(-6, 0, 1500) for s in (-1.0, 1.0)]))
    model = fit_rational(x, np.abs(x), tolerance=1e-3)
    degree = len(model.support) - 1
    best = (math.log(8.0 / 1e-3) / math.pi) ** 2
    assert best - 1.0 < degree < 2.0 * best
    assert np.abs(model(x) - np.abs(x)).max() <= 1e-3


@pytest.mark.skipif(not hasattr(scipy.interpolate, "AAA"), reason="scipy before 1.15 has no AAA")
@pytest.mark.parametrize(
    "function",
    [np.exp, lambda x: np.tan(1.4 * x), lambda x: 1.0 / (1.0 + 25.0 * x**2 - 3.0j * x), lambda x: np.exp(9j * x)],
    ids=["exp", "tan", "resonance", "line"],
)
def test_second_opinion(function: np.ufunc) -> None:
    """The same greedy choice on the same samples: the same support, and the same function between the samples."""
    values = function(X)
    ours = fit_rational(X, values, tolerance=1e-9)
    other = scipy.interpolate.AAA(X, values, rtol=1e-9)
    between = np.linspace(-1.0, 1.0, 1234)
    np.testing.assert_array_equal(np.sort(ours.support), np.sort(other.support_points.real))
    np.testing.assert_allclose(ours(between), other(between), rtol=0, atol=2e-9 * np.abs(values).max())
    mine, theirs = (p[np.argmin(np.abs(p))] for p in (ours.poles, other.poles()))
    assert abs(mine) == pytest.approx(abs(theirs), rel=1e-6)

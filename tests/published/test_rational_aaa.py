"""The rational model on the examples of its paper.

Y. Nakatsukasa, O. Sete, L. N. Trefethen, SIAM J. Sci. Comput. 40 (2018) A1494. The functions are those of its examples
(from memory: exp, tan(pi z/2), the gamma function, |x|), on real samples, since frequency is real. What they are
checked against is exact: poles and residues of the functions, the best rational approximation of |x|, and
scipy's own AAA where there is one.
"""

import math
from collections.abc import Callable

import numpy as np
import pytest
import scipy.interpolate
import scipy.special
from numpy.typing import ArrayLike

from planar.network.rational import fit_rational

X = np.linspace(-1.0, 1.0, 1000)
SCIPY = "scipy.interpolate.AAA"


def test_exponential_to_thirteen_digits(evidence: Callable[..., None]) -> None:
    """Best type (6, 6) on [-1, 1] is off by 6!^2/(12! 13!) 2^-12 = 4e-17 (Braess, leading term; from memory),
    best type (5, 5) by 1e-13 and best type (4, 4) by 1.5e-10: a tolerance of 1e-13 e needs 6 or 7 support points.
    """
    model = fit_rational(X, np.exp(X), tolerance=1e-13)
    between = np.linspace(-1.0, 1.0, 9973)
    assert len(model.support) in {6, 7}
    shown(evidence, "exp(x) between the samples", np.exp(between), model(between).real, "3e-13")
    assert np.abs(model(between).imag).max() <= 3e-13
    assert np.abs(model.poles).min() > 5.0  # an entire function: none near the interval


def test_tangent_has_poles_at_odd_integers(evidence: Callable[..., None]) -> None:
    """tan(pi z/2): poles at odd integers, residues -2/pi, zeros at even integers. The nearest ones are known best."""
    x = np.linspace(-0.9, 0.9, 500)
    model = fit_rational(x, np.tan(0.5 * np.pi * x), tolerance=1e-13)
    nearest = np.argsort(np.abs(model.poles))
    poles, residues = model.poles[nearest], model.residues[nearest]
    shown(evidence, "tan(pi z/2): nearest poles", [-1.0, 1.0], np.sort(poles[:2].real), "1e-7 %")
    shown(evidence, "tan(pi z/2): their residues", -2.0 / math.pi + 0j, residues[:2], "1e-5 %")
    shown(evidence, "tan(pi z/2): next poles", [-3.0, 3.0], np.sort(poles[2:4].real), "1 %")
    assert np.abs(model.zeros).min() < 1e-12


def test_gamma_function_poles_inside_the_samples(evidence: Callable[..., None]) -> None:
    """Gamma(x): poles at -n with residue (-1)^n/n!, and Gamma(1/2) = sqrt(pi) (Abramowitz & Stegun 6.1)."""
    x = np.linspace(-1.5, 1.5, 100)
    model = fit_rational(x, scipy.special.gamma(x), tolerance=1e-12)
    for n, digits in ((0, 1e-12), (1, 1e-8), (2, 1e-5)):
        k = np.abs(model.poles + n).argmin()
        shown(evidence, f"Gamma(x): pole {n}", -n + 0j, model.poles[k], f"{digits:g}")
        residue = (-1) ** n / math.factorial(n)
        shown(evidence, f"Gamma(x): residue of pole {n}", residue + 0j, model.residues[k], f"{10 * digits:g}")
    shown(evidence, "Gamma(1/2)", math.sqrt(math.pi) + 0j, model(0.5), "1e-9 %")


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
def test_second_opinion(function: np.ufunc, evidence: Callable[..., None]) -> None:
    """The same greedy choice on the same samples: the same support, and the same function between the samples."""
    values = function(X)
    ours = fit_rational(X, values, tolerance=1e-9)
    other = scipy.interpolate.AAA(X, values, rtol=1e-9)
    between = np.linspace(-1.0, 1.0, 1234)
    np.testing.assert_array_equal(np.sort(ours.support), np.sort(other.support_points.real))
    mine, theirs = (p[np.argmin(np.abs(p))] for p in (ours.poles, other.poles()))
    largest = f"{2e-9 * np.abs(values).max():g}"
    shown(evidence, "four functions between the samples", other(between), ours(between), largest, SCIPY)
    shown(evidence, "their nearest poles", abs(theirs), abs(mine), "1e-4 %", SCIPY)


def shown(
    evidence: Callable[..., None],
    name: str,
    theirs: ArrayLike,
    ours: ArrayLike,
    allowed: str,
    source: str = "exact; example of Nakatsukasa, Sete, Trefethen 2018 (M)",
) -> None:
    """One comparison of a rational model."""
    why = "both stop at 1e-9" if source == SCIPY else "what the fit's tolerance leaves: all digits near, fewer far"
    evidence(f"rational model, {name}", source=source, theirs=theirs, ours=ours, allowed=allowed, why=why)

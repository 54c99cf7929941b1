"""Wideband Debye model against its published form.

Authority: Djordjevic, Biljic, Likar-Smiljanic, Sarkar, IEEE Trans. EMC 43 (2001) 662; the numbers were computed
separately from the published equation (4.4/0.02 at 1 GHz, corners 1 kHz and 1 THz). They carry six and five digits,
hence the tolerances of half a unit in the last one.
"""

import math
from collections.abc import Callable

import numpy as np
import pytest

from planar.errors import RangeError
from planar.library import WidebandDebye

FR4 = WidebandDebye.from_point(4.4, 0.02, at=1e9)


@pytest.mark.parametrize(
    ("frequency", "eps_r", "tan_d"), [(1e9, 4.4, 0.02), (2.45e9, 4.34977, 0.020212), (5.8e9, 4.30146, 0.020396)]
)
def test_permittivity_and_loss_tangent_at_other_frequencies(
    frequency: float, eps_r: float, tan_d: float, evidence: Callable[..., None]
) -> None:
    eps = FR4.permittivity(frequency)
    rows = (("permittivity", eps_r, eps.real, "5e-6"), ("loss tangent", tan_d, -eps.imag / eps.real, "5e-7"))
    for name, theirs, ours, allowed in rows:
        evidence(
            f"4.4/0.02 at 1 GHz, seen at {1e-9 * frequency:g} GHz: {name}",
            source="Djordjevic et al. 2001 (P, C)",
            theirs=theirs,
            ours=ours,
            allowed=allowed,
            why="half a unit of the last printed digit",
        )


def test_array_agrees_with_the_separately_computed_values() -> None:
    eps = FR4.permittivity(np.array([[2.45e9], [5.8e9]]))
    assert eps.shape == (2, 1)
    np.testing.assert_allclose(eps[:, 0].real, [4.34977, 4.30146], atol=5e-6)


def test_permittivity_is_causal() -> None:
    """Kramers-Kronig relation for a slowly varying loss: d eps'/d ln f = -(2/pi) eps'' (exact for flat eps'')."""
    f = np.array([0.999e9, 1e9, 1.001e9])
    eps = FR4.permittivity(f)
    slope = (eps[2].real - eps[0].real) / math.log(f[2] / f[0])
    assert slope == pytest.approx(2 / math.pi * eps[1].imag, rel=2e-3)


def test_data_point_is_met_for_other_corners_and_no_loss_is_constant() -> None:
    """Exact by construction of the published model."""
    model = WidebandDebye.from_point(3.0, 0.0016, at=10e9, lower=1e4, upper=1e13)
    assert model.permittivity(10e9) == pytest.approx(3.0 - 0.0048j, rel=1e-12)
    assert WidebandDebye.from_point(2.2, 0.0, at=10e9).permittivity(1e6) == 2.2


@pytest.mark.parametrize("frequency", [0.0, 999.0, 1.1e12, math.nan])
def test_outside_the_corners_is_refused(frequency: float) -> None:
    with pytest.raises(RangeError, match="1 kHz to 1000 GHz"):
        FR4.permittivity(frequency)


@pytest.mark.parametrize(
    ("eps_r", "tan_d", "at"),
    [(0.9, 0.0, 1e9), (4.4, -0.01, 1e9), (4.4, 0.02, 1e13), (1.05, 0.5, 1e9), (math.nan, 0, 1e9)],
)
def test_a_point_no_model_goes_through_is_refused(eps_r: float, tan_d: float, at: float) -> None:
    with pytest.raises(RangeError):
        WidebandDebye.from_point(eps_r, tan_d, at=at)

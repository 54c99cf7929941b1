"""The field solver on a square loop."""

import math
from types import ModuleType

import pytest

from planar.units import SPEED_OF_LIGHT


@pytest.mark.parametrize("width", [1e-3, 2e-3])
def test_resonant_perimeter(width: float, field_cases: ModuleType) -> None:
    """1.5 %. Source: check values, "Square loop, resonant perimeter (P; L. B. Cebik, fit): 1.0413 + 0.0128 [log10(1e5
    d/lambda)]^2 wavelengths, d wire diameter; within 1 %". A flat strip acts as a wire of diameter w/2 (Butler 1982,
    from memory).
    """
    half = 45e-3
    board = field_cases.loop(half, width, 1e-3, corner_radius=0.0)
    problem = field_cases.prepared(board, field_cases.stackup(field_cases.AIR), 1.0e9, step=6e-3)
    found = field_cases.gap_resonance(problem, (0.87e9, 0.98e9))
    wavelength = SPEED_OF_LIGHT / found
    fit = 1.0413 + 0.0128 * math.log10(1e5 * 0.5 * width / wavelength) ** 2
    assert 8.0 * half / wavelength == pytest.approx(fit, rel=0.015)

"""Surface formulas: limits and the definition that joins them."""

import math

import pytest

from planar.lines.surface import roughness_factor, skin_depth, surface_resistance


def test_resistance_is_a_sheet_one_skin_depth_thick() -> None:
    assert surface_resistance(1e9, 5.8e7) * 5.8e7 * skin_depth(1e9, 5.8e7) == pytest.approx(1.0)


def test_root_of_frequency() -> None:
    assert skin_depth(4e9, 5.8e7) == pytest.approx(skin_depth(1e9, 5.8e7) / 2.0)


def test_roughness_limits() -> None:
    """1 for a smooth surface, 2 for a very rough one; at rq = delta 1 + (2/pi) atan 1.4."""
    assert roughness_factor(1e9, 5.8e7, 0.0) == 1.0
    assert roughness_factor(1e9, 5.8e7, 1.0) == pytest.approx(2.0, rel=1e-6)
    depth = skin_depth(1e9, 5.8e7)
    assert roughness_factor(1e9, 5.8e7, depth) == pytest.approx(1.0 + 2.0 / math.pi * math.atan(1.4))

"""Polarisation: axial ratio, share of the wrong sense, and sense, as IEEE Std 145 defines them.

The discrimination 20 log((r + 1)/(r - 1)) of an axial ratio r is tabulated in books on satellite links, to a tenth of
a decibel (from memory). The sense follows IEEE Std 145: clockwise seen along the propagation is right (from memory).
"""

import math
from collections.abc import Callable

import numpy as np
import pytest

from planar.design.goal import share_of, wrong_share
from planar.field.far_field import FarField

DISCRIMINATION = [(0.5, 30.8), (1.0, 24.8), (2.0, 18.8), (3.0, 15.3), (6.0, 9.6)]
"""Axial ratio and discrimination, dB."""


def ellipse(axial_ratio_db: float, tilt: float, sense: float) -> FarField:
    """The field of half axes 1 and 1/r, the long one `tilt` rad from theta, turning from theta to phi for `sense` 1."""
    minor = 10.0 ** (-axial_ratio_db / 20.0)
    along, across = 1.0 + 0j, -1j * sense * minor  # cos(omega t) along the long axis, sin(omega t) across it
    e_theta = along * math.cos(tilt) - across * math.sin(tilt)
    e_phi = along * math.sin(tilt) + across * math.cos(tilt)
    return FarField(np.zeros(1), np.zeros(1), np.array([e_theta]), np.array([e_phi]))


@pytest.mark.parametrize(("axial_ratio_db", "discrimination"), DISCRIMINATION)
def test_share_of_the_wrong_sense(axial_ratio_db: float, discrimination: float, evidence: Callable[..., None]) -> None:
    share = share_of(axial_ratio_db)
    evidence(
        f"share of the wrong sense at an axial ratio of {axial_ratio_db:g} dB",
        source="tables of cross-polar discrimination (M)",
        theirs=-discrimination,
        ours=20.0 * math.log10(share / math.sqrt(1.0 - share**2)),
        unit="dB",
        allowed="0.06",
        why="half a unit of the last digit, and a hair",
    )


@pytest.mark.parametrize("tilt", [0.0, 0.4, 1.9])
@pytest.mark.parametrize(("sense", "name"), [(1.0, "right"), (-1.0, "left")])
@pytest.mark.parametrize("axial_ratio_db", [row[0] for row in DISCRIMINATION])
def test_axial_ratio_and_sense(
    axial_ratio_db: float, sense: float, name: str, tilt: float, evidence: Callable[..., None]
) -> None:
    """Half axes given, ratio and sense read off; seen along r, from theta to phi is clockwise."""
    field = ellipse(axial_ratio_db, tilt, sense)
    assert field.sense(0) == name
    evidence(
        f"axial ratio of an ellipse of {axial_ratio_db:g} dB, any tilt, both senses",
        source="IEEE Std 145, ratio of the axes (M)",
        theirs=axial_ratio_db,
        ours=field.axial_ratio_db,
        unit="dB",
        allowed="1e-9",
        why="exact",
    )
    right, left = field.circular
    evidence(
        f"share of the wrong sense in an ellipse of {axial_ratio_db:g} dB, any tilt, both senses",
        source="(r - 1)/sqrt(2 (r^2 + 1)), by hand",
        theirs=(10.0 ** (axial_ratio_db / 20.0) - 1.0) / math.sqrt(2.0 * (10.0 ** (axial_ratio_db / 10.0) + 1.0)),
        ours=np.abs(wrong_share(left / right, name)),
        allowed="1e-9",
        why="exact",
    )

"""Q and matched bandwidth: A. D. Yaghjian and S. R. Best, IEEE T-AP 53 (2005) 1298 (from memory).

FBW Q = (s - 1)/sqrt(s), exact for a series circuit, where Q_Z = omega/(2 R) |dZ/domega| is its Q.
"""

import math
from collections.abc import Callable

import numpy as np
import pytest
import skrf

from planar.network.quality import matched_bands, matched_bandwidth, quality_factor
from planar.network.response import Response

F0, R = 1e9, 50.0
BEST = "Yaghjian & Best 2005, FBW Q = (s - 1)/sqrt(s) (M)"


def series_circuit(q: float, frequency: np.ndarray) -> np.ndarray:
    """Impedance in ohm of R, L and C in series by scikit-rf, resonant at `F0`."""
    media = skrf.media.DefinedGammaZ0(skrf.Frequency.from_f(frequency, unit="Hz"), z0=R)
    inductor = media.inductor(q * R / (2.0 * math.pi * F0))
    capacitor = media.capacitor(1.0 / (2.0 * math.pi * F0 * q * R))
    whole = inductor**capacitor ** media.resistor(R) ** media.short()
    return np.asarray(whole.z[:, 0, 0])


@pytest.mark.parametrize(("q", "theirs"), [(1.0, 0.7071), (20.0, 0.035355)])
def test_bandwidth_of_a_q(q: float, theirs: float, evidence: Callable[..., None]) -> None:
    evidence(
        f"fractional bandwidth at VSWR 2 of Q {q:g}",
        source=BEST,
        theirs=theirs,
        ours=matched_bandwidth(q, 2.0),
        allowed="0.01 %",
        why="the printed digits",
    )


@pytest.mark.parametrize("vswr", [1.5, 2.0, 3.0])
@pytest.mark.parametrize("q", [10.0, 20.0, 60.0])
def test_series_circuit(q: float, vswr: float, evidence: Callable[..., None]) -> None:
    """The circuit's impedance comes from scikit-rf; its Q is read off the slope, its band off the reflection."""
    frequency = F0 * np.linspace(0.9, 1.1, 4001)
    z = series_circuit(q, frequency)
    response = Response.from_impedance(frequency, z, z0=R)
    (band,) = matched_bands(response, 20.0 * math.log10((vswr - 1.0) / (vswr + 1.0)))
    evidence(
        "Q of a series circuit, 10 to 60, from its impedance",
        source="scikit-rf circuit of that Q",
        theirs=q,
        ours=quality_factor(frequency[::100], z[::100], F0),
        allowed="1e-4 %",
        why="exact; the slope is a difference",
    )
    evidence(
        "FBW Q of a series circuit, Q 10 to 60, VSWR 1.5 to 3",
        source="Yaghjian & Best 2005 (M)",
        theirs=(vswr - 1.0) / math.sqrt(vswr),
        ours=(band.high - band.low) / F0 * q,
        allowed="0.01 %",
        why="exact; reflection is linear between samples",
    )

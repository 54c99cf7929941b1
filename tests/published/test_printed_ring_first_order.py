"""The first-order loop on a slab against the modal solution of the same ring.

Source: table "Printed circular strip loop on an infinite slab: modal solution (C)", where C means:
computed independently of this project from published equations with separate throw-away code. The
loop formulas here take the slab quasi-statically and count neither loss nor the slab's part in the
radiation, so these are the error bars of a first-order figure, not of a solution. Measured when this
was written: frequency -2.0 %, resistance -16 %, sensitivities within 14 %.
"""

from __future__ import annotations

import math
from collections.abc import Callable

import pytest

from planar.design.loop_size import LoopEstimate, LoopShape, LoopSurroundings, resonant_frequency
from planar.library import Library
from planar.lines.static_spectral import DielectricLayer

MM = 1e-3
SOURCE = "modal solution of a printed ring (C)"


def ring(
    *, radius: float = 16 * MM, width: float = 1 * MM, eps_r: float = 4.4, height: float = 1.6 * MM
) -> LoopEstimate:
    around = LoopSurroundings((DielectricLayer(height, eps_r, 0.02),), (), None)
    return resonant_frequency(2.0 * math.pi * radius, width, LoopShape(1.0, 1.0), around)


def test_frequency_within_the_stated_error(evidence: Callable[..., None]) -> None:
    """Row "bare 4.4/0.02, 1.6 mm | 16, 1 | 2.4089 GHz | 114.90 ohm"; the plain family states its error in frequency."""
    stated = Library.open().family("plain").start(frozenset()).frequency_error
    assert stated == pytest.approx(0.04)
    evidence(
        "first-order formulas, ring on a bare slab: f1",
        source=SOURCE,
        theirs=2.4089,
        ours=1e-9 * ring().frequency,
        unit="GHz",
        allowed=f"{100 * stated:g} %",
        why="the error stated for the family",
    )
    assert ring().frequency == pytest.approx(0.98 * 2.4089e9, rel=5e-3)  # about -2 %, as said above


def test_resistance_within_a_fifth(evidence: Callable[..., None]) -> None:
    """Part "114.90 ohm", same row. No losses are counted here and no radiation of the slab's own: 16 % below."""
    evidence(
        "first-order formulas, ring on a bare slab: resistance",
        source=SOURCE,
        theirs=114.90,
        ours=ring().resistance,
        unit="ohm",
        allowed="20 %",
        why="no losses and no radiation of the slab's own are counted",
    )


# "Sensitivities of the second row: eps 4.2/4.6: f +1.05/-1.01 %; h 1.44/1.76: +1.16/-1.04 %;
# w 0.9/1.1: -0.63/+0.60 %; w 2: +5.1 %; a 15/17: +6.3/-5.6 %."
SENSITIVITIES = [
    ({"eps_r": 4.2}, 1.05), ({"eps_r": 4.6}, -1.01), ({"height": 1.44 * MM}, 1.16), ({"height": 1.76 * MM}, -1.04),
    ({"width": 0.9 * MM}, -0.63), ({"width": 1.1 * MM}, 0.60), ({"width": 2 * MM}, 5.1),
    ({"radius": 15 * MM}, 6.3), ({"radius": 17 * MM}, -5.6),
]  # fmt: skip


@pytest.mark.parametrize(("change", "percent"), SENSITIVITIES)
def test_sensitivities(change: dict[str, float], percent: float, evidence: Callable[..., None]) -> None:
    """First-order: within 15 %. Measured: eps +8 %, height +12 %, width -12 % (-14 % at 2 mm), radius -2 %."""
    found = 100.0 * (ring(**change).frequency / ring().frequency - 1.0)
    ((name, value),) = change.items()
    evidence(
        f"first-order formulas, ring on a bare slab: shift of f1 with {name} {value if value > 1.0 else value / MM:g}",
        source=SOURCE,
        theirs=percent,
        ours=found,
        unit="%",
        allowed="15 %",
        why="first order: the slab is taken quasi-statically",
    )

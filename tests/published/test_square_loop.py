"""The square loop against the published fit of its resonant perimeter.

Source: "Square loop, resonant perimeter (P; L. B. Cebik, fit): 1.0413 + 0.0128 [log10(1e5 d/lambda)]^2
wavelengths, d wire diameter; within 1 %. Square resistance is about 0.91 of the circle's (C)."
"""

from __future__ import annotations

import math
from collections.abc import Callable

import pytest

from planar.design.loop_size import LoopShape, LoopSurroundings, resonant_frequency, resonant_loop
from planar.design.thin_loop import square_perimeter
from planar.errors import RangeError
from planar.units import SPEED_OF_LIGHT

CEBIK = "fit of L. B. Cebik (P)"
AIR = LoopSurroundings((), (), None)
SQUARE, CIRCLE = LoopShape(1.0, 0.0), LoopShape(1.0, 1.0)


def fit(diameter_in_wavelengths: float) -> float:
    """The words of the source, typed again."""
    return 1.0413 + 0.0128 * math.log10(1e5 * diameter_in_wavelengths) ** 2


@pytest.mark.parametrize("thickness", [1e-5, 1e-4, 1e-3, 5e-3])
def test_the_fit_itself(thickness: float, evidence: Callable[..., None]) -> None:
    frequency = 0.9e9
    diameter = thickness * SPEED_OF_LIGHT / frequency
    evidence(
        "formula of the square loop's perimeter, wire of 1e-5 to 5e-3 wavelengths",
        source=CEBIK,
        theirs=fit(thickness),
        ours=square_perimeter(diameter, frequency),
        unit="wavelengths",
        allowed="1e-10 %",
        why="the formula itself",
    )


@pytest.mark.parametrize(("frequency", "trace"), [(100e6, 2e-3), (434e6, 2e-3), (868e6, 3e-3), (2.45e9, 1e-3)])
def test_sized_square_follows_the_fit(frequency: float, trace: float, evidence: Callable[..., None]) -> None:
    """A strip acts as a wire of diameter w/2; the fit is good to 1 %."""
    loop = resonant_loop(frequency, trace, SQUARE, AIR)
    expected = fit(0.5 * trace * frequency / SPEED_OF_LIGHT)
    circle = resonant_loop(frequency, trace, CIRCLE, AIR)
    evidence(
        f"sized square loop, {1e-6 * frequency:g} MHz, {1e3 * trace:g} mm strip: perimeter",
        source=CEBIK,
        theirs=expected,
        ours=loop.perimeter_wavelengths,
        unit="wavelengths",
        allowed="1 %",
        why="what the fit is good for",
    )
    evidence(
        f"sized square loop, {1e-6 * frequency:g} MHz: resistance over the circle's",
        source="mesh solution, rounded (C)",
        theirs=0.91,
        ours=loop.resistance / circle.resistance,
        allowed="2 %",
        why="rounded so",
    )


@pytest.mark.parametrize("shape", [SQUARE, CIRCLE, LoopShape(1.0, 0.3), LoopShape(1.5, 0.2)])
def test_sizing_and_analysis_agree(shape: LoopShape) -> None:
    """Exact: the loop sized for a frequency resonates there."""
    loop = resonant_loop(868e6, 3e-3, shape, AIR)
    again = resonant_frequency(loop.perimeter, 3e-3, shape, AIR)
    assert again.frequency == pytest.approx(868e6, rel=1e-8)
    assert shape.perimeter(shape.width(loop.perimeter)) == pytest.approx(loop.perimeter, rel=1e-12)


def test_rounded_corners_lie_between_circle_and_square() -> None:
    lengths = [resonant_loop(868e6, 3e-3, LoopShape(1.0, c), AIR).perimeter for c in (0.0, 0.25, 0.5, 0.75, 1.0)]
    assert lengths == sorted(lengths, reverse=True)


@pytest.mark.parametrize(
    ("shape", "around", "message"),
    [
        (LoopShape(1.61, 0.2), AIR, "aspect_ratio 1.61 is outside"),
        (LoopShape(1 / 1.61, 0.2), AIR, "aspect_ratio 1.61 is outside"),
        (SQUARE, LoopSurroundings((), (), 0.039 * SPEED_OF_LIGHT / 868e6), "too near"),
    ],
)
def test_what_the_formulas_do_not_cover_is_refused(shape: LoopShape, around: LoopSurroundings, message: str) -> None:
    with pytest.raises(RangeError, match=message):
        resonant_loop(868e6, 3e-3, shape, around)

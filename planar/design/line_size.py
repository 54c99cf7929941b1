"""The lines of a design: which line formulas they are, their widths for an impedance, their spread.

A guided line is a microstrip whose ground is the loop trace; coplanar strips lie on the bare slab.
Widths are rounded to the drawing step and analysed again as rounded, so that what is stated is what
is drawn.
"""

from __future__ import annotations

import bisect
import math
from dataclasses import dataclass

from planar.copper.layout import Level
from planar.design.choices import Choices
from planar.design.loop_size import layers_of
from planar.errors import SynthesisError
from planar.lines.line import Line, analyse, line_kind, wave
from planar.lines.records import Conductor, Substrate
from planar.lines.synthesis import Sensitivities, sensitivities, width_for_impedance
from planar.stackup import loss_tangent
from planar.units import show

STEP = 1e-5
"""m, dimensions are rounded to this: drawings in hundredths of a millimetre."""
STRIP_GAPS = (1.0e-3, 0.7e-3, 0.5e-3, 0.4e-3, 0.3e-3, 0.25e-3, 0.2e-3, 0.15e-3, 0.1e-3)
"""m, gaps tried for coplanar strips, widest first: a wide gap is the least sensitive to etching."""
_SLACK = 1e-9
STRIP_WIDTHS = (0.5e-3, 4.0e-3)
"""m, strips wide enough to solder and etch, narrow enough not to fill the loop."""


@dataclass(frozen=True)
class DesignLine:
    """A line of a design: `name` is that of its width, `level` where it lies, `reference` what it works against.

    `substrate` and `conductor` are what it was analysed on; `tolerance_ohm` is the root of the sum of squares of
    etch, thickness and permittivity at their tolerances.
    """

    name: str
    line: Line
    level: Level
    reference: str
    slopes: Sensitivities
    tolerance_ohm: float


@dataclass(frozen=True)
class LineSettings:
    """What every line of a design is worked out on, at the middle of the band."""

    substrate: Substrate
    conductor: Conductor
    frequency: float


def line_settings(choices: Choices) -> LineSettings:
    """Slab under the top level, layers above it, finished copper."""
    stackup, frequency = choices.stackup, choices.centre
    slab = stackup.substrate
    eps = slab.permittivity(frequency)
    cover = layers_of(stackup.dielectrics_above("top", frequency))
    substrate = Substrate(slab.thickness, eps.real, loss_tangent(eps), cover)
    copper = stackup.conductor
    return LineSettings(
        substrate, Conductor(stackup.finished_copper, copper.conductivity, copper.roughness_rq), frequency
    )


def microstrip_width(impedance: float, settings: LineSettings) -> float:
    """Width m of a microstrip of `impedance` ohm, rounded. Raises `SynthesisError` where none has it."""
    line = width_for_impedance(
        "microstrip",
        impedance,
        substrate=settings.substrate,
        conductor=settings.conductor,
        frequency=settings.frequency,
    )
    return rounded(line.width)


def strip_width_and_gap(impedance: float, settings: LineSettings, least: tuple[float, float]) -> tuple[float, float]:
    """Width and gap m of coplanar strips of `impedance` ohm, the widest gap that gives a usable width.

    `least` is the fab's smallest track and gap, m. Raises `SynthesisError` saying what can be reached.
    """
    narrowest = max(STRIP_WIDTHS[0], least[0])
    gaps = [gap for gap in sorted(STRIP_GAPS) if gap >= least[1] - _SLACK]
    if not gaps:
        raise SynthesisError(
            f"coplanar strips: the fab's smallest gap, {show(least[1], 'length')}, is too wide for any"
        )

    def widest(gap: float) -> float:
        limits = line_kind("coplanar-strips").width_limits(
            gap, settings.substrate, settings.conductor, settings.frequency
        )
        return max(min(STRIP_WIDTHS[1], limits[1]), narrowest)

    def lowest(gap: float) -> float:
        return _strip_impedance(widest(gap), gap, settings)

    # impedance grows with the gap: the widest gap that is low enough with the widest strips
    count = bisect.bisect_right(gaps, impedance, key=lowest)
    if count == 0 or impedance > _strip_impedance(narrowest, gaps[count - 1], settings):
        low, high = lowest(gaps[0]), _strip_impedance(narrowest, gaps[-1], settings)
        raise SynthesisError(
            f"coplanar strips of {impedance:.0f} ohm: with gaps from {show(gaps[0], 'length')} and widths of "
            f"{show(narrowest, 'length')} to {show(widest(gaps[0]), 'length', 3)} this board gives {low:.0f} to "
            f"{high:.0f} ohm; change target.impedance, the laminate or the fab"
        )
    line = width_for_impedance(
        "coplanar-strips",
        impedance,
        gap=gaps[count - 1],
        substrate=settings.substrate,
        conductor=settings.conductor,
        frequency=settings.frequency,
    )
    return rounded(line.width), gaps[count - 1]


def _strip_impedance(width: float, gap: float, settings: LineSettings) -> float:
    return wave(
        "coplanar-strips",
        width,
        gap=gap,
        substrate=settings.substrate,
        conductor=settings.conductor,
        frequency=settings.frequency,
    )[0]


def design_lines(dimensions: dict[str, float], choices: Choices, settings: LineSettings) -> tuple[DesignLine, ...]:
    """The lines drawn by `dimensions`, analysed as drawn."""
    if choices.family.key == "coplanar":
        line = strips(dimensions["strip_width"], dimensions["strip_gap"], settings)
        return (_described("strip_width", line, "the other strip", choices, settings),)
    names = [name for name in ("line_width", "transformer_width", "end_width") if name in dimensions]
    reference = f"loop trace on bottom, {show(dimensions['trace_width'], 'length', 4)} wide"
    return tuple(
        _described(name, microstrip(dimensions[name], settings), reference, choices, settings) for name in names
    )


def rounded(length: float) -> float:
    """`length` m to the drawing step."""
    return round(length / STEP) * STEP


def microstrip(width: float, settings: LineSettings) -> Line:
    """Microstrip `width` m wide, analysed."""
    return analyse(
        "microstrip",
        width,
        substrate=settings.substrate,
        conductor=settings.conductor,
        frequency=settings.frequency,
    )


def strips(width: float, gap: float, settings: LineSettings) -> Line:
    """Coplanar strips `width` m wide with `gap` m between them, analysed."""
    return analyse(
        "coplanar-strips",
        width,
        gap=gap,
        substrate=settings.substrate,
        conductor=settings.conductor,
        frequency=settings.frequency,
    )


def _described(name: str, line: Line, reference: str, choices: Choices, settings: LineSettings) -> DesignLine:
    slopes = sensitivities(line, substrate=settings.substrate, conductor=settings.conductor)
    laminate, fab = choices.laminate, choices.fab
    etch = slopes.ohm_per_25_um_etch * 2.0 * fab.etch_tolerance / 25e-6
    height = slopes.ohm_per_10_percent_height * laminate.thickness_tolerance / 0.10
    permittivity = slopes.ohm_per_1_percent_eps_r * laminate.eps_r_tolerance / 0.01
    return DesignLine(name, line, Level.TOP, reference, slopes, math.hypot(etch, height, permittivity))

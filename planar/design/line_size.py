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
from planar.lines.coplanar import coplanar_gap_limits
from planar.lines.line import Line, analyse, line_kind
from planar.lines.records import Conductor, Substrate
from planar.lines.synthesis import Sensitivities, gap_for_impedance, sensitivities, width_for_impedance
from planar.stackup import loss_tangent
from planar.units import show

STEP, STEP_DIGITS = 1e-5, 5
"""m and decimal places, dimensions are rounded to this: drawings in hundredths of a millimetre."""
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
    """What every line of a design is worked out on, and the line formulas on it; `frequency` in Hz.

    Widths, gaps in m, impedances in ohm. Errors are those of `planar.lines`.
    """

    substrate: Substrate
    conductor: Conductor
    frequency: float

    def analysed(self, kind: str, width: float, *, gap: float | None = None) -> Line:
        """The line of a `kind`, with losses."""
        return analyse(
            kind, width, gap=gap, substrate=self.substrate, conductor=self.conductor, frequency=self.frequency
        )

    def impedance(self, kind: str, width: float, *, gap: float | None = None) -> float:
        """Its impedance alone, which is quicker."""
        place = (self.substrate, self.conductor, self.frequency)
        return line_kind(kind).wave(width, gap, *place)[0]

    def of_impedance(self, kind: str, impedance: float, *, gap: float | None = None) -> Line:
        """The line whose width gives `impedance`."""
        return width_for_impedance(
            kind, impedance, gap=gap, substrate=self.substrate, conductor=self.conductor, frequency=self.frequency
        )

    def of_width(self, kind: str, impedance: float, *, width: float) -> Line:
        """The line whose gap gives `impedance` at a `width`."""
        return gap_for_impedance(
            kind, impedance, width=width, substrate=self.substrate, conductor=self.conductor, frequency=self.frequency
        )

    def sensitivities(self, line: Line) -> Sensitivities:
        """Slopes of the impedance of `line`."""
        return sensitivities(line, substrate=self.substrate, conductor=self.conductor)


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
    line = settings.of_impedance("microstrip", impedance)
    return rounded(line.width)


def strip_width_and_gap(impedance: float, settings: LineSettings, least: tuple[float, float]) -> tuple[float, float]:
    """Width and gap m of coplanar strips of `impedance` ohm, the widest of the usual gaps that gives a usable width.

    `least` is the fab's smallest track and gap, m. Raises `SynthesisError` saying what can be reached.
    """
    gaps = _usable_gaps(settings, least)
    low, high = strip_reach(settings, least)
    if not low <= impedance <= high:
        raise SynthesisError(
            f"coplanar strips of {impedance:.0f} ohm: this board and fab reach {low:.0f} to {high:.0f} ohm"
        )
    # impedance grows with the gap: the widest gap that is low enough with the widest strips
    gap = gaps[bisect.bisect_right(gaps, impedance, key=lambda each: _span(each, settings, least)[0]) - 1]
    if (
        impedance > _span(gap, settings, least)[1]
    ):  # between two usual gaps: the narrowest strips and a gap of their own
        line = settings.of_width("coplanar-strips", impedance, width=_narrowest(least))
    else:
        line = settings.of_impedance("coplanar-strips", impedance, gap=gap)
    return max(rounded(line.width), rounded_up(least[0])), max(rounded(line.gap or gap), rounded_up(least[1]))


def strip_reach(settings: LineSettings, least: tuple[float, float]) -> tuple[float, float]:
    """Lowest and highest impedance, ohm, of coplanar strips of usable widths and gaps; `least` track and gap m."""
    gaps = _usable_gaps(settings, least)
    return _span(gaps[0], settings, least)[0], _span(gaps[-1], settings, least)[1]


def _narrowest(least: tuple[float, float]) -> float:
    return max(STRIP_WIDTHS[0], rounded_up(least[0]))


def _usable_gaps(settings: LineSettings, least: tuple[float, float]) -> list[float]:
    """The usual gaps the fab etches and for which the formulas hold with the narrowest strips."""
    narrowest, where = _narrowest(least), (settings.substrate, settings.conductor, settings.frequency)
    low, high = coplanar_gap_limits(narrowest, *where)
    usable = [gap for gap in sorted(STRIP_GAPS) if max(least[1] - _SLACK, low) <= gap <= high]
    if not usable:
        raise SynthesisError(
            f"coplanar strips: no gap from {show(least[1], 'length')} suits this copper of "
            f"{show(settings.conductor.thickness, 'length', 3)} and frequency; thinner copper or a lower band would"
        )
    return usable


def _span(gap: float, settings: LineSettings, least: tuple[float, float]) -> tuple[float, float]:
    """Impedance, ohm, of the widest and the narrowest usable strips `gap` m apart."""
    limits = line_kind("coplanar-strips").width_limits(gap, settings.substrate, settings.conductor, settings.frequency)
    widest = min(STRIP_WIDTHS[1], limits[1])
    return settings.impedance("coplanar-strips", widest, gap=gap), settings.impedance(
        "coplanar-strips", _narrowest(least), gap=gap
    )


def design_lines(dimensions: dict[str, float], choices: Choices, settings: LineSettings) -> tuple[DesignLine, ...]:
    """The lines drawn by `dimensions`, analysed as drawn."""
    if "strip_width" in dimensions:
        line = settings.analysed("coplanar-strips", dimensions["strip_width"], gap=dimensions["strip_gap"])
        return (_described("strip_width", line, "the other strip", choices, settings),)
    names = [name for name in ("line_width", "transformer_width", "end_width") if name in dimensions]
    reference = f"loop trace on bottom, {show(dimensions['trace_width'], 'length', 4)} wide"
    return tuple(
        _described(name, settings.analysed("microstrip", dimensions[name]), reference, choices, settings)
        for name in names
    )


def rounded(length: float) -> float:
    """`length` m to the drawing step."""
    return round(length, STEP_DIGITS)


def rounded_up(length: float) -> float:
    """`length` m to the drawing step, never less: for what a fab rule bounds from below."""
    return round(math.ceil(length / STEP - 1e-6) * STEP, STEP_DIGITS)


def _described(name: str, line: Line, reference: str, choices: Choices, settings: LineSettings) -> DesignLine:
    slopes = settings.sensitivities(line)
    laminate, fab = choices.laminate, choices.fab
    etch = slopes.ohm_per_25_um_etch * 2.0 * fab.etch_tolerance / 25e-6
    height = slopes.ohm_per_10_percent_height * laminate.thickness_tolerance / 0.10
    permittivity = slopes.ohm_per_1_percent_eps_r * laminate.eps_r_tolerance / 0.01
    return DesignLine(name, line, Level.TOP, reference, slopes, math.hypot(etch, height, permittivity))

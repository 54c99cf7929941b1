"""First dimensions by published formulas and the family's starting values.

Loop from `loop_size`, widths from `line_size`, details (pads, via, feed) from the fab's rules. Every
dimension is rounded to 0.01 mm. This is where the field solver starts from, not where it ends: the
frequency is good to a few per cent, and the match of a guided line is not predicted at all.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping

from planar.copper.families import BEND_WIDTHS
from planar.copper.layout import Level
from planar.design.choices import Choices
from planar.design.line_size import (
    LineSettings,
    line_settings,
    microstrip,
    microstrip_width,
    rounded,
    strip_width_and_gap,
    strips,
)
from planar.design.loop_size import LoopEstimate, LoopShape, LoopSurroundings, resonant_frequency, resonant_loop
from planar.errors import SynthesisError
from planar.lines.discontinuities import open_end_extension
from planar.lines.quarter_wave import quarter_wave_section
from planar.units import SPEED_OF_LIGHT, show

PAD_LENGTH = 2e-3
PAD_WIDTH = 1.5e-3
"""m, feed pads a hand can solder (common practice, no source)."""
VIA_RING = 0.3e-3
"""m, copper round the via at the line's end: a single via carries the whole current, so be generous."""
FEED_CLEARANCE = 1e-3
"""m, from the bend of the line to the connector's land."""
CORNER_SHARE = 0.12
"""Default corner radius of a square or rectangle, in its smaller side."""

Dimensions = dict[str, float]


def loop_shape(choices: Choices, dimensions: Mapping[str, float] | None = None) -> LoopShape:
    """Proportions of the loop: those asked for, or those of given `dimensions`."""
    antenna = choices.brief.antenna
    if antenna.shape == "circle":
        return LoopShape(1.0, 1.0)
    if dimensions is not None:
        width = dimensions["loop_width"]
        height = dimensions.get("loop_height", width)
        return LoopShape(width / height, dimensions["corner_radius"] / (0.5 * min(width, height)))
    return LoopShape(_aspect(choices), 2.0 * CORNER_SHARE)


def loop_surroundings(choices: Choices) -> LoopSurroundings:
    """What the loop trace sees: it lies on the lower of the levels."""
    return LoopSurroundings.of(choices.stackup, choices.levels[-1], choices.centre)


def loop_level(choices: Choices) -> Level:
    """Level of the loop trace."""
    return choices.levels[-1]


def first_dimensions(choices: Choices) -> tuple[Dimensions, LoopEstimate]:
    """Every dimension the family needs, m, and the bare loop they rest on.

    Raises `SynthesisError` or `RangeError` where formulas and fab rules leave no such design.
    """
    settings = line_settings(choices)
    start = choices.family.start(choices.traits)
    trace = _trace_width(choices, settings)
    bare = resonant_loop(choices.centre, trace, loop_shape(choices), loop_surroundings(choices))
    dimensions = _loop_dimensions(choices, bare.perimeter * start.perimeter_ratio, trace)
    resistance = start.gap_resistance or bare.resistance
    dimensions |= _LINE_DIMENSIONS[choices.family.key](choices, dimensions, resistance, settings)
    if choices.circular:
        dimensions |= _second_gap(choices, dimensions)
    dimensions |= {k: v for k, v in detail_dimensions(choices, dimensions).items() if k not in dimensions}
    ordered = choices.family.needed(choices.traits)
    return {name: dimensions[name] for name in ordered}, bare


def given_dimensions(choices: Choices) -> tuple[Dimensions, LoopEstimate]:
    """The brief's own dimensions with the details it leaves out, and the first-order resonance of their bare loop.

    The names have been checked. Raises `RangeError` where the loop is outside the formulas.
    """
    dimensions = dict(choices.brief.antenna.dimensions)
    antenna = choices.brief.antenna
    stated = {"trace_width": antenna.trace_width, "corner_radius": antenna.corner_radius}
    dimensions |= {name: value for name, value in stated.items() if value is not None}
    dimensions |= {k: v for k, v in detail_dimensions(choices, dimensions).items() if k not in dimensions}
    ordered = {name: dimensions[name] for name in choices.family.needed(choices.traits)}
    shape = loop_shape(choices, ordered)
    perimeter = shape.perimeter(ordered["loop_width"])
    return ordered, resonant_frequency(perimeter, ordered["trace_width"], shape, loop_surroundings(choices))


def detail_dimensions(choices: Choices, dimensions: Mapping[str, float]) -> Dimensions:
    """Dimensions that follow from the fab's rules and the others: pads, via, feed length."""
    fab = choices.fab
    details = {"pad_length": PAD_LENGTH, "via_drill": fab.min_hole, "via_ring": max(VIA_RING, fab.min_annular_ring)}
    if "strip_width" in dimensions:
        details["pad_width"] = max(PAD_WIDTH, dimensions["strip_width"])
    if "line_width" in dimensions:
        bend = BEND_WIDTHS * dimensions["line_width"]
        details["feed_length"] = rounded(max(bend, 0.5 * dimensions["trace_width"]) + FEED_CLEARANCE)
    return {name: value for name, value in details.items() if name in choices.family.needed(choices.traits)}


DETAILS = frozenset({"pad_length", "pad_width", "via_drill", "via_ring", "feed_length"})
"""Dimensions a brief that gives dimensions may leave out."""


def _aspect(choices: Choices) -> float:
    """Width over height of a rectangle: that asked for, lying along the longer side of the size limit."""
    antenna, limit = choices.brief.antenna, choices.brief.board.size_limit
    if antenna.shape != "rectangle":
        return 1.0
    if antenna.aspect_ratio is None:
        return 1.0 if limit is None else limit[0] / limit[1]
    upright = limit is not None and limit[1] > limit[0]
    return 1.0 / antenna.aspect_ratio if upright else antenna.aspect_ratio


def _trace_width(choices: Choices, settings: LineSettings) -> float:
    given, family = choices.brief.antenna.trace_width, choices.family
    if given is not None:
        return given
    wavelength = SPEED_OF_LIGHT / choices.centre
    trace = max(family.trace_wavelengths * wavelength, choices.fab.min_track)
    if family.trace_line_widths:
        trace = max(trace, family.trace_line_widths * microstrip_width(choices.brief.target.impedance, settings))
    return rounded(trace)


def _loop_dimensions(choices: Choices, perimeter: float, trace: float) -> Dimensions:
    shape = loop_shape(choices)
    radius = choices.brief.antenna.corner_radius
    if radius is None:
        width = shape.width(perimeter)
        radius = 0.5 * shape.corner * min(width, width / shape.aspect)
    else:  # straight sides and four given quarter circles
        width = (perimeter + (8.0 - 2.0 * math.pi) * radius) / (2.0 * (1.0 + 1.0 / shape.aspect))
    dimensions = {"loop_width": rounded(width), "trace_width": trace}
    if choices.brief.antenna.shape != "circle":
        dimensions["corner_radius"] = rounded(max(radius, 0.5 * trace))
    if choices.brief.antenna.shape == "rectangle":
        dimensions["loop_height"] = rounded(width / shape.aspect)
    return dimensions


def _loop_gap(choices: Choices) -> float:
    wavelengths = choices.family.gap_wavelengths * SPEED_OF_LIGHT / choices.centre
    return rounded(max(wavelengths, 2.0 * choices.fab.min_gap))


def _no_line(choices: Choices, dimensions: Dimensions, resistance: float, settings: LineSettings) -> Dimensions:
    del dimensions, resistance, settings  # the plain loop has a gap and no line
    return {"gap": _loop_gap(choices)}


def _strips(choices: Choices, dimensions: Dimensions, resistance: float, settings: LineSettings) -> Dimensions:
    impedance, length = quarter_wave_section(choices.brief.target.impedance, complex(resistance))
    width, gap = strip_width_and_gap(impedance, settings, (choices.fab.min_track, choices.fab.min_gap))
    line = strips(width, gap, settings)
    return {
        "strip_width": width,
        "strip_gap": gap,
        "strip_length": rounded(length / (2.0 * math.pi) * line.wavelength),
    }


def _guided(choices: Choices, dimensions: Dimensions, resistance: float, settings: LineSettings) -> Dimensions:
    port = choices.brief.target.impedance
    impedance, length = quarter_wave_section(port, complex(resistance))
    line_width, narrow = microstrip_width(port, settings), microstrip_width(impedance, settings)
    if narrow < choices.fab.min_track:
        least = show(choices.fab.min_track, "length")
        raise SynthesisError(
            f"the transformer of {impedance:.0f} ohm would be {show(narrow, 'length', 3)} wide, the fab etches "
            f"{least}: choose a thicker board, a lower permittivity or a finer fab"
        )
    section = microstrip(narrow, settings)
    gap = _loop_gap(choices)
    sized = {
        "gap": gap,
        "line_width": line_width,
        "transformer_width": narrow,
        "transformer_length": rounded(length / (2.0 * math.pi) * section.wavelength),
    }
    if choices.end == "via":
        pad = choices.fab.min_hole + 2.0 * max(VIA_RING, choices.fab.min_annular_ring)
        return sized | {"end_width": rounded(pad), "end_length": rounded(0.5 * gap + pad)}
    end = microstrip(line_width, settings)
    substrate = settings.substrate
    fringe = open_end_extension(line_width, substrate.height, substrate.eps_r, min(end.eps_eff, substrate.eps_r))
    return sized | {"end_width": line_width, "end_length": rounded(end.quarter_wave - fringe)}


_LINE_DIMENSIONS: dict[str, Callable[[Choices, Dimensions, float, LineSettings], Dimensions]] = {
    "plain": _no_line,
    "coplanar": _strips,
    "ring-guided": _guided,
}


def _second_gap(choices: Choices, dimensions: Dimensions) -> Dimensions:
    """Second gap at the starting angle, as a distance along the mean line from the feed gap."""
    start = choices.family.start(choices.traits)
    if start.second_gap_angle is None or start.second_gap_wavelengths is None:
        raise SynthesisError(f"family {choices.family.key} has no starting values for a second gap")
    shape = loop_shape(choices, dimensions)
    perimeter = shape.perimeter(dimensions["loop_width"])
    length = start.second_gap_wavelengths * SPEED_OF_LIGHT / choices.centre
    return {
        "second_gap": rounded(max(length, choices.fab.min_gap)),
        "second_gap_position": rounded(perimeter * start.second_gap_angle / (2.0 * math.pi)),
    }

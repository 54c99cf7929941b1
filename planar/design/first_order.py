"""First dimensions by published formulas and the family's starting values.

Loop from `loop_size`, widths from `line_size`, details (pads, via, feed) from the fab's rules. Every
dimension is rounded to 0.01 mm. This is where the field solver starts from, not where it ends: the
frequency is good to a few per cent, and the match of a guided line is not predicted at all.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping

from planar.copper.families import BEND_WIDTHS
from planar.design.choices import Choices
from planar.design.line_size import (
    LineSettings,
    line_settings,
    microstrip_width,
    rounded,
    rounded_up,
    strip_reach,
    strip_width_and_gap,
)
from planar.design.loop_size import (
    LONGEST_ASPECT,
    LoopEstimate,
    LoopShape,
    LoopSurroundings,
    resonant_frequency,
    resonant_loop,
)
from planar.errors import RangeError, SynthesisError
from planar.lines.discontinuities import open_end_extension
from planar.lines.line import line_kind
from planar.lines.quarter_wave import quarter_wave_section
from planar.units import SPEED_OF_LIGHT, show

PAD_LENGTH = 2e-3
PAD_WIDTH = 1.5e-3
"""m, feed pads a hand can solder (common practice, no source)."""
VIA_RING = 0.3e-3
"""m, copper round the via at the line's end: a single via carries the whole current, so be generous."""
FEED_CLEARANCE = 1e-3
"""m, from the bend of the line to the connector's land."""
TAB_LENGTH, TAB_WIDTH, TAB_SPACING = 0.015, 0.006, 0.02
"""Trim tabs over the mean line: a pair moves the frequency by some parts in a thousand (field solution of sized
loops)."""
WIDEST_TRACE = 0.032
"""Of the wavelength: a trace twice as wide again keeps the second gap of a circular loop from working (field solution
of sized loops, 1.42 GHz)."""
CORNER_SHARE = 0.12
"""Default corner radius of a square or rectangle, in its smaller side."""
SHAPE_ROUNDS = 8
"""Rounds in which size and corner share settle; each divides the error by more than ten."""

Dimensions = dict[str, float]


def loop_shape(choices: Choices, dimensions: Mapping[str, float]) -> LoopShape:
    """Proportions of the loop that `dimensions` draw."""
    if choices.brief.antenna.shape == "circle":
        return LoopShape(1.0, 1.0)
    width = dimensions["loop_width"]
    height = dimensions.get("loop_height", width)
    return LoopShape(width / height, dimensions["corner_radius"] / (0.5 * min(width, height)))


def loop_surroundings(choices: Choices) -> LoopSurroundings:
    """What the loop trace sees: it lies on the lower of the levels."""
    return LoopSurroundings.of(choices.stackup, choices.levels[-1], choices.centre)


def first_dimensions(choices: Choices) -> tuple[Dimensions, LoopEstimate]:
    """Every dimension the family needs, m, and the bare loop they rest on.

    Raises `SynthesisError` or `RangeError` where formulas and fab rules leave no such design.
    """
    settings = line_settings(choices)
    start = choices.family.start(choices.traits)
    dimensions, bare = _loop_dimensions(choices, _trace_width(choices, settings), start.perimeter_ratio)
    resistance = bare.resistance * (start.gap_resistance_ratio or 1.0)
    dimensions |= _LINE_DIMENSIONS[choices.family.key](choices, dimensions, resistance, settings)
    if choices.circular:
        dimensions |= _second_gap(choices, dimensions)
    dimensions |= {k: v for k, v in detail_dimensions(choices, dimensions).items() if k not in dimensions}
    ordered = choices.family.needed(choices.traits)
    return {name: dimensions[name] for name in ordered}, bare


def stated_dimensions(choices: Choices) -> Dimensions:
    """Dimensions that stand in the brief, under [antenna] or [antenna.dimensions], m."""
    antenna = choices.brief.antenna
    stated = {"trace_width": antenna.trace_width, "corner_radius": antenna.corner_radius}
    return dict(antenna.dimensions) | {name: value for name, value in stated.items() if value is not None}


def given_dimensions(choices: Choices) -> tuple[Dimensions, LoopEstimate | None]:
    """The brief's own dimensions with the details it leaves out, and the first-order resonance of their bare loop.

    The names have been checked. The resonance is None where the loop is outside the formulas.
    """
    dimensions = stated_dimensions(choices)
    dimensions |= {k: v for k, v in detail_dimensions(choices, dimensions).items() if k not in dimensions}
    ordered = {name: dimensions[name] for name in choices.family.needed(choices.traits)}
    shape = loop_shape(choices, ordered)
    perimeter = shape.perimeter(ordered["loop_width"])
    try:
        bare = resonant_frequency(perimeter, ordered["trace_width"], shape, loop_surroundings(choices))
    except RangeError:
        bare = None
    return ordered, bare


def detail_dimensions(choices: Choices, dimensions: Mapping[str, float]) -> Dimensions:
    """Dimensions that follow from the fab's rules and the others: pads, via, feed length, trim tabs."""
    fab = choices.fab
    details = {"pad_length": PAD_LENGTH, "via_drill": fab.min_hole, "via_ring": max(VIA_RING, fab.min_annular_ring)}
    if "strip_width" in dimensions:
        details["pad_width"] = max(PAD_WIDTH, dimensions["strip_width"])
    if "line_width" in dimensions:
        bend = BEND_WIDTHS * dimensions["line_width"]
        details["feed_length"] = rounded(max(bend, 0.5 * dimensions["trace_width"]) + FEED_CLEARANCE)
    if "trim" in choices.traits:
        details |= _tabs(choices, dimensions)
    return {name: value for name, value in details.items() if name in choices.family.needed(choices.traits)}


def _tabs(choices: Choices, dimensions: Mapping[str, float]) -> Dimensions:
    """Trim tabs in proportion to the mean line, about a wavelength, and no finer than the fab etches."""
    mean_line = loop_shape(choices, dimensions).perimeter(dimensions["loop_width"])
    track, gap = rounded_up(choices.fab.min_track), rounded_up(choices.fab.min_gap)
    width = max(rounded(TAB_WIDTH * mean_line), track)
    spacing = max(rounded(TAB_SPACING * mean_line), width + 2.0 * gap)
    return {
        "tab_length": max(rounded(TAB_LENGTH * mean_line), track, gap),
        "tab_width": width,
        "tab_spacing": rounded(spacing),
    }


DETAILS = frozenset(
    {"pad_length", "pad_width", "via_drill", "via_ring", "feed_length", "tab_length", "tab_width", "tab_spacing"}
)
"""Dimensions a brief that gives dimensions may leave out."""


def _aspect(choices: Choices) -> float:
    """Width over height of a rectangle: that asked for, lying along the longer side of the size limit."""
    antenna, limit = choices.brief.antenna, choices.brief.board.size_limit
    if antenna.shape != "rectangle":
        return 1.0
    if antenna.aspect_ratio is None:
        ratio = 1.0 if limit is None else limit[0] / limit[1]
        return min(LONGEST_ASPECT, max(1.0 / LONGEST_ASPECT, ratio))
    upright = limit is not None and limit[1] > limit[0]
    return 1.0 / antenna.aspect_ratio if upright else antenna.aspect_ratio


def _trace_width(choices: Choices, settings: LineSettings) -> float:
    given, family = choices.brief.antenna.trace_width, choices.family
    if given is not None:
        return given
    wavelength = SPEED_OF_LIGHT / choices.centre
    trace = family.trace_wavelengths * wavelength
    if family.trace_line_widths:
        guided = family.trace_line_widths * microstrip_width(choices.brief.target.impedance, settings)
        widest = WIDEST_TRACE * wavelength if choices.circular else math.inf
        trace = max(trace, min(guided, widest))
    return max(rounded(trace), rounded_up(choices.fab.min_track))


def _loop_dimensions(choices: Choices, trace: float, ratio: float) -> tuple[Dimensions, LoopEstimate]:
    """Dimensions of a mean line `ratio` times as long as the resonant bare loop of its shape, and that loop."""
    antenna, around = choices.brief.antenna, loop_surroundings(choices)
    if antenna.shape == "circle":
        bare = resonant_loop(choices.centre, trace, LoopShape(1.0, 1.0), around)
        return {"loop_width": rounded(bare.perimeter * ratio / math.pi), "trace_width": trace}, bare
    least = rounded_up(0.5 * trace)
    if antenna.corner_radius is not None and antenna.corner_radius < 0.5 * trace:
        raise SynthesisError(
            f"antenna.corner_radius {show(antenna.corner_radius, 'length')} is that of the mean line: a trace of "
            f"{show(trace, 'length', 4)} needs at least {show(least, 'length', 4)}"
        )
    aspect = _aspect(choices)
    shape = LoopShape(aspect, 2.0 * CORNER_SHARE)
    for _ in range(SHAPE_ROUNDS):  # a stated radius is a share of a side that is only now being found
        bare = resonant_loop(choices.centre, trace, shape, around)
        side = shape.width(bare.perimeter * ratio) * min(1.0, 1.0 / aspect)
        radius = antenna.corner_radius if antenna.corner_radius is not None else max(CORNER_SHARE * side, least)
        shape = LoopShape(aspect, min(1.0, radius / (0.5 * side)))
    width = rounded(shape.width(bare.perimeter * ratio))
    dimensions = {"loop_width": width, "corner_radius": _drawn_radius(choices, radius), "trace_width": trace}
    if antenna.shape == "rectangle":
        dimensions["loop_height"] = rounded(width / aspect)
    return dimensions, bare


def _drawn_radius(choices: Choices, radius: float) -> float:
    return radius if choices.brief.antenna.corner_radius is not None else rounded(radius)


def _loop_gap(choices: Choices) -> float:
    wavelengths = choices.family.gap_wavelengths * SPEED_OF_LIGHT / choices.centre
    return max(rounded(wavelengths), rounded_up(2.0 * choices.fab.min_gap))


def _no_line(choices: Choices, dimensions: Dimensions, resistance: float, settings: LineSettings) -> Dimensions:
    del dimensions, resistance, settings  # the plain loop has a gap and no line
    return {"gap": _loop_gap(choices)}


def _strips(choices: Choices, dimensions: Dimensions, resistance: float, settings: LineSettings) -> Dimensions:
    port = choices.brief.target.impedance
    impedance, length = quarter_wave_section(port, complex(resistance))
    least = (choices.fab.min_track, choices.fab.min_gap)
    low, high = strip_reach(settings, least)
    if not low <= impedance <= high:
        raise SynthesisError(
            f"target.impedance {port:g} ohm needs strips of {impedance:.0f} ohm for a loop of {resistance:.0f} ohm; "
            f"this board and fab reach {low:.0f} to {high:.0f} ohm, that is a port of {low**2 / resistance:.0f} to "
            f"{high**2 / resistance:.0f} ohm"
        )
    width, gap = strip_width_and_gap(impedance, settings, least)
    line = settings.analysed("coplanar-strips", width, gap=gap)
    return {
        "strip_width": width,
        "strip_gap": gap,
        "strip_length": rounded(length / (2.0 * math.pi) * line.wavelength),
    }


def _start_width(impedance: float, settings: LineSettings, least: float) -> float:
    """Width of a transformer of `impedance` ohm, or the narrowest the fab etches and formulas cover: sizing decides."""
    substrate, conductor, frequency = settings.substrate, settings.conductor, settings.frequency
    narrowest = line_kind("microstrip").width_limits(None, substrate, conductor, frequency)[0]
    least = max(rounded_up(least), rounded_up(narrowest))
    try:
        return max(microstrip_width(impedance, settings), least)
    except SynthesisError:
        return least


def _guided(choices: Choices, dimensions: Dimensions, resistance: float, settings: LineSettings) -> Dimensions:
    port = choices.brief.target.impedance
    impedance, length = quarter_wave_section(port, complex(resistance))
    line_width = microstrip_width(port, settings)
    narrow = _start_width(impedance, settings, choices.fab.min_track)
    section = settings.analysed("microstrip", narrow)
    gap = _loop_gap(choices)
    sized = {
        "gap": gap,
        "line_width": line_width,
        "transformer_width": narrow,
        "transformer_length": rounded(length / (2.0 * math.pi) * section.wavelength),
    }
    if choices.end == "via":
        via = detail_dimensions(choices, dimensions)
        pad = via["via_drill"] + 2.0 * via["via_ring"]
        return sized | {"end_width": rounded_up(pad), "end_length": rounded(0.5 * gap + pad)}
    end = settings.analysed("microstrip", line_width)
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
        "second_gap": max(rounded(length), rounded_up(choices.fab.min_gap)),
        "second_gap_position": rounded(perimeter * start.second_gap_angle / (2.0 * math.pi)),
    }

"""One analysis for every kind of line, chosen by name from one table.

A kind is a row of `LINES`: its full analysis, its impedance alone for root finding, and the
dimensions it covers. A new kind is one module with these functions and one row here.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

from planar.errors import RangeError
from planar.lines.coplanar import (
    coplanar_gap_limits,
    coplanar_strips_line,
    coplanar_strips_wave,
    coplanar_width_limits,
)
from planar.lines.microstrip import microstrip_line, microstrip_wave, microstrip_width_limits
from planar.lines.records import Conductor, Line, Substrate

__all__ = ["LINES", "Conductor", "Line", "LineKind", "Substrate", "analyse", "line_kind", "wave"]

Wave = tuple[float, float]


@dataclass(frozen=True)
class LineKind:
    """A kind of line: `analyse` gives the `Line`, `wave` impedance in ohm and effective permittivity only.

    Arguments of both: width in m, gap in m or None, substrate, conductor, frequency in Hz. `width_limits`
    gives the narrowest and widest strip in m (first argument the gap), `gap_limits` the smallest and
    largest gap (first argument the width), None for kinds without.
    """

    analyse: Callable[[float, float | None, Substrate, Conductor, float], Line]
    wave: Callable[[float, float | None, Substrate, Conductor, float], Wave]
    width_limits: Callable[[float | None, Substrate, Conductor, float], tuple[float, float]]
    gap_limits: Callable[[float, Substrate, Conductor, float], tuple[float, float]] | None


LINES: dict[str, LineKind] = {
    "microstrip": LineKind(microstrip_line, microstrip_wave, microstrip_width_limits, None),
    "coplanar-strips": LineKind(coplanar_strips_line, coplanar_strips_wave, coplanar_width_limits, coplanar_gap_limits),
}
"""Kind of line -> its functions."""


def analyse(
    kind: str,
    width: float,
    *,
    substrate: Substrate,
    conductor: Conductor,
    frequency: float,
    gap: float | None = None,
) -> Line:
    """The line of a `kind` (key of `LINES`) with its impedance, permittivity and losses.

    `width` and `gap` in m (`gap` only for kinds that have one), `frequency` in Hz. Raises `RangeError`
    for an unknown kind and outside the range of the kind's formulas (see its module).
    """
    return line_kind(kind).analyse(width, gap, substrate, conductor, frequency)


def wave(
    kind: str,
    width: float,
    *,
    substrate: Substrate,
    conductor: Conductor,
    frequency: float,
    gap: float | None = None,
) -> Wave:
    """Impedance in ohm and effective permittivity only: what root finding needs. As `analyse` otherwise."""
    return line_kind(kind).wave(width, gap, substrate, conductor, frequency)


def line_kind(kind: str) -> LineKind:
    """The row of `LINES`; raises `RangeError` naming the kinds there are."""
    if kind not in LINES:
        raise RangeError(f"line kind is {kind!r}, there are {', '.join(LINES)}")
    return LINES[kind]

"""The nearest change to a brief that works, found by trying.

A refusal without a way out is half an answer. Each suggestion here is a changed brief that was drawn
from first dimensions and passed every rule; what was not tried is not suggested.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Iterator

from planar.brief import Brief
from planar.library import Library
from planar.units import show

Works = Callable[[Brief], bool]
SCALES = (1.1, 1.25, 1.4, 1.6, 1.8, 2.0, 2.3, 2.7, 3.2, 4.0)
"""Multiples the band is tried at, lowest first; the step to the first that works is then bisected."""
LAMINATES_TRIED = 6
SHAPES = ("square", "circle", "rectangle")


def nearest_changes(brief: Brief, library: Library, works: Works) -> tuple[str, ...]:
    """Changes, one at a time, that make `brief` work, each in one sentence; empty where none was found."""
    found = []
    for search in (_other_shape, _other_laminate, _other_fab, _higher_band):
        change = next(search(brief, library, works), None)
        if change is not None:
            found.append(change)
    return tuple(found)


def _changed(brief: Brief, table: str, values: dict[str, object]) -> Brief:
    return brief.model_copy(update={table: getattr(brief, table).model_copy(update=values)})


def _other_shape(brief: Brief, library: Library, works: Works) -> Iterator[str]:
    """Another shape, another end of the guided line, or both."""
    del library
    if brief.antenna.dimensions:
        return
    guided = brief.antenna.family in {None, "ring-guided"}
    ends = (brief.antenna.end, "via") if guided and brief.antenna.end != "via" else (brief.antenna.end,)
    shapes = (brief.antenna.shape, *(each for each in SHAPES if each != brief.antenna.shape))
    for end, shape in ((end, shape) for end in ends for shape in shapes):
        values: dict[str, object] = {}
        if shape != brief.antenna.shape:
            values |= {"shape": shape, "aspect_ratio": None, "corner_radius": None}
        if end != brief.antenna.end:
            values |= {"family": "ring-guided", "end": end}
        if values and works(_changed(brief, "antenna", values)):
            named = ", ".join(f'{key} = "{value}"' for key, value in values.items() if value is not None)
            dropped = [key for key in ("aspect_ratio", "corner_radius") if getattr(brief.antenna, key) is not None]
            without = f" without {' and '.join(dropped)}" if dropped and "shape" in values else ""
            yield f"antenna: {named}{without} can be made"


def _other_laminate(brief: Brief, library: Library, works: Works) -> Iterator[str]:
    """Laminates sold in this thickness, those of nearest permittivity first."""
    if not isinstance(brief.board.laminate, str):
        return
    here = library.laminate(brief.board.laminate)
    others = [library.laminate(key) for key in library.keys("laminates") if key != here.key]
    sold = [each for each in others if any(abs(t / brief.board.thickness - 1.0) < 0.07 for t in each.thicknesses)]
    for laminate in sorted(sold, key=lambda each: abs(each.eps_r - here.eps_r))[:LAMINATES_TRIED]:
        if works(_changed(brief, "board", {"laminate": laminate.key})):
            yield f'board.laminate = "{laminate.key}" (permittivity {laminate.eps_r:g}) can be made'


def _other_fab(brief: Brief, library: Library, works: Works) -> Iterator[str]:
    for key in library.keys("fabs"):
        if key != brief.make.fab and works(_changed(brief, "make", {"fab": key})):
            yield f'make.fab = "{key}" can be made'


def _higher_band(brief: Brief, library: Library, works: Works) -> Iterator[str]:
    """The lowest band, moved up as a whole, for which the same board is made."""
    del library
    if brief.antenna.dimensions:
        return

    def moved(scale: float) -> Brief:
        low, high = brief.target.band
        return _changed(brief, "target", {"band": (low * scale, high * scale)})

    high = next((scale for scale in SCALES if works(moved(scale))), math.inf)
    if math.isinf(high):
        return
    low = max((scale for scale in SCALES if scale < high), default=1.0)
    while high / low > 1.01:
        middle = (low * high) ** 0.5
        low, high = (low, middle) if works(moved(middle)) else (middle, high)
    lowest = _rounded_up(brief.target.band[0] * high)
    if works(moved(lowest / brief.target.band[0])):
        yield f"the same brief can be made with its band moved up to start at {show(lowest, 'frequency', 3)}"


def _rounded_up(frequency: float) -> float:
    """`frequency` to three digits, never lower: what is named must work as named."""
    step = 10.0 ** (math.floor(math.log10(frequency)) - 2)
    return math.ceil(frequency / step * (1.0 - 1e-12)) * step

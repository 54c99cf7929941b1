"""How far a solution can be believed, said the same way everywhere: mesh, efficiency, the endless slab."""

from __future__ import annotations

from collections.abc import Sequence

from planar.errors import Finding, RangeError, Severity
from planar.field.result import PointResult
from planar.units import show

COARSER = 1.5
"""Step of the mesh a solution is compared with over its own."""
MOST_MOVED = 0.15
"""Change of the input impedance from that mesh, of its magnitude, above which nothing is shown."""
CLOSE_CIRCUIT = 0.05
"""Reflection up to which an equivalent circuit may be off without a word (our choice)."""
LOW_EFFICIENCY = 0.5
"""Efficiency below which a finding says so."""


def moved(fine: complex, coarse: complex) -> float:
    """Change of an input impedance between two meshes, of its magnitude. Raises `RangeError` where it is too large."""
    change = abs(coarse - fine) / abs(fine)
    if change > MOST_MOVED:
        raise RangeError(
            f"the input impedance moves by {100 * change:.0f} % from a mesh {COARSER:g} times as coarse, at most "
            f"{100 * MOST_MOVED:.0f} % is accepted: this copper needs a finer mesh than the default"
        )
    return change


def circuit_findings(deviation: float) -> list[Finding]:
    """What the user must know of an equivalent circuit whose reflection is off by `deviation` at most."""
    if deviation <= CLOSE_CIRCUIT:
        return []
    got, advice = f"off by up to {deviation:.2f} of reflection", "for orientation only: use antenna.s1p instead"
    return [Finding("equivalent circuit", "circuit.cir", got, f"{CLOSE_CIRCUIT:g}", advice)]


def power_findings(points: Sequence[PointResult]) -> list[Finding]:
    """What the user must know of the powers at these frequencies: efficiency, what the endless slab hides."""
    worst, found = min(points, key=lambda point: point.efficiency), []
    if worst.efficiency < LOW_EFFICIENCY:
        where = f"at {show(worst.frequency_hz, 'frequency', 4)}"
        got = f"about {100.0 * worst.efficiency:.0f} %"
        advice = "a metal plane close behind the loop or a lossy laminate takes the rest: move it away or change it"
        found.append(Finding("efficiency", where, got, f"{100.0 * LOW_EFFICIENCY:.0f} %", advice))
    share = max(point.surface_wave_share for point in points)
    advice = "the slab is taken as endless; on the board this part leaves at the edge and fills in the pattern"
    got = f"up to {100.0 * share:.0f} % of the power is guided in the slab"
    return [*found, Finding("board edge", "board", got, "endless slab", advice, Severity.NOTE)]

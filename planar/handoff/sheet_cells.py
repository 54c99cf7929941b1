"""Rows of the stackup and impedance tables as text, for every paper that prints them.

A paper says how it writes a length, the sign of a tolerance and the unit of an impedance; what stands in which column
is the same everywhere.
"""

from __future__ import annotations

from collections.abc import Callable

from planar.handoff.stackup_sheet import ImpedanceLine, SheetLayer
from planar.units import show


def with_spread(text: str, tolerance: float | None, sign: str = "+-") -> str:
    """`text` with its `tolerance`, a fraction, after the `sign`; alone where there is none."""
    return text if tolerance is None else f"{text} {sign}{show(tolerance, 'fraction')}"


def layer_cells(layer: SheetLayer, length: Callable[[float], str], sign: str) -> tuple[str, ...]:
    """Name, material, thickness, base copper, permittivity and loss tangent of a layer; `length` writes m."""
    return (
        layer.name,
        layer.material,
        "" if layer.thickness_m == 0.0 else with_spread(length(layer.thickness_m), layer.thickness_tolerance, sign),
        "" if layer.base_copper_m is None else length(layer.base_copper_m),
        "" if layer.eps_r is None else with_spread(f"{layer.eps_r:.3f}", layer.eps_r_tolerance, sign),
        "" if layer.tan_d is None else with_spread(f"{layer.tan_d:.4f}", layer.tan_d_tolerance, sign),
    )


def line_cells(line: ImpedanceLine, sign: str, ohm: str) -> tuple[str, ...]:
    """Name, kind, width, gap, level, reference, impedance and instruction of a line."""
    tolerance = "" if line.tolerance_ohm is None else f" {sign}{line.tolerance_ohm:.1f}"
    return (
        line.called,
        line.kind.replace("-", " "),
        f"{1e3 * line.width_m:.3f} mm",
        "" if line.gap_m is None else f"{1e3 * line.gap_m:.3f} mm",
        line.level,
        line.reference,
        f"{line.impedance_ohm:.1f}{tolerance} {ohm}",
        line.instruction,
    )

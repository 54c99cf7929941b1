"""Dimensions of a measuring board: how long the lines, how large the ring, how wide its gaps.

The ring has the largest radius that fits with one of its resonances in the middle of the band; where even the
fundamental would be too large, the largest that fits. Its gaps couple just as much as a small analyser needs.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

from scipy.optimize import brentq

from planar.design.coupon_line import BareLine, BareRing
from planar.design.line_size import STEP, rounded, rounded_up
from planar.errors import RangeError, SynthesisError
from planar.library import Connector, Fab
from planar.lines.ring_resonator import GAP_RATIOS, gap_capacitance
from planar.units import SPEED_OF_LIGHT, show

LARGEST = (100e-3, 80e-3)
"""m, board aimed at: a common price step."""
INSERTION_DB = -35.0
"""Peak transmission of the ring aimed at: above the noise of a small analyser, below what pulls the resonance."""
SPANNER = 4e-3
"""m between neighbouring connectors, for fingers or a spanner."""
SIDE = 1e-3
"""m from the room of an outer connector to the board edge, and from lands to an edge that carries no connector."""
BEND_WIDTHS = 1.5
"""Bend radius in line widths; both lines have the same bends, so their effect cancels."""
DIFFERENCES = (20e-3, 60e-3)
"""m, least and most difference of the two lines."""
MASK_HEIGHTS = 1.5
"""Mask stays this many slab heights away from bare lines, where their field has gone (common practice, no source)."""
MASK_BAR = 0.5e-3
"""m of mask left between two windows."""
ENDS_ROOM = 3.6e-3
"""m ahead of the reference planes of open, short and load for what they end in and their names."""
LEAST_RISE, LEAST_STRAIGHT = 3e-3, 3.0
"""m straight from a launch to the bend, and slab heights straight between bends."""
LEAST_DRILL, LEAST_RING, LEAST_SLIT = 0.3e-3, 0.15e-3, 0.2e-3
"""m, vias and slit are not drawn smaller even where the fab could (common practice, no source)."""
NARROWEST_RING = 5.0
"""Least radius of the ring in line widths (our limit: curvature then moves a resonance by below half a per cent)."""
MOST_ORDER = 8
_ROUNDS = 8


@dataclass(frozen=True)
class CouponBasis:
    """What the dimensions follow from: the bare 50 ohm `line`, `trace_width` m of the impedance trace, `connector`
    and `fab`, nominal `eps_r` and `tan_d` at the `centre` of the band, Hz."""

    line: BareLine
    trace_width: float
    connector: Connector
    fab: Fab
    eps_r: float
    tan_d: float
    centre: float


def coupon_dimensions(basis: CouponBasis) -> tuple[dict[str, float], int]:
    """Name -> m for `planar.copper.coupon`, and the order of the resonance nearest the band.

    Raises `SynthesisError` where no ring fits the formulas, `RangeError` as the line formulas.
    """
    sizes = _rows(basis) | _spans(basis)
    radius, order = _ring(basis, _largest_radius(basis, sizes))
    reach = radius + 0.5 * basis.line.width
    clear = _clear(basis)
    sizes["ring_radius"] = radius
    sizes["ring_gap"] = _gap(basis, radius, order)
    sizes["feed_length"] = rounded(0.5 * sizes["board_width"] - sizes["launch_depth"] - reach - sizes["ring_gap"])
    top = sizes["launch_depth"] + sizes["rise"] + 0.5 * basis.line.width
    sizes["ring_row"] = rounded_up(top + clear + reach)
    sizes["trace_row"] = rounded_up(sizes["ring_row"] + reach + clear + 0.5 * basis.trace_width)
    sizes["board_height"] = rounded_up(sizes["trace_row"] + 0.5 * sizes["launch_pitch"] + SIDE)
    return sizes, order


def _rows(basis: CouponBasis) -> dict[str, float]:
    """Everything that does not depend on the ring."""
    line, fab, connector = basis.line, basis.fab, basis.connector
    mask = rounded_up(MASK_HEIGHTS * line.height)
    body = connector.body.size[1] if connector.body else 0.0
    bend = rounded_up(BEND_WIDTHS * line.width)
    return {
        "line_width": line.width,
        "ring_width": line.width,
        "ring_slit": rounded_up(max(LEAST_SLIT, fab.min_gap)),
        "trace_width": basis.trace_width,
        "mask_clearance": mask,
        "bend_radius": bend,
        "rise": rounded_up(max(LEAST_RISE + bend, 0.5 * line.width + mask + ENDS_ROOM)),
        "launch_pitch": rounded_up(max(max(body, connector.reach) + SPANNER, line.width + 2.0 * mask + MASK_BAR)),
        "launch_depth": _depth(connector, fab),
        "ground_margin": rounded_up(max(fab.copper_to_routed_edge, fab.copper_to_score)),
        "via_drill": max(LEAST_DRILL, fab.min_hole),
        "via_ring": max(LEAST_RING, fab.min_annular_ring),
    }


def _depth(connector: Connector, fab: Fab) -> float:
    """From the board edge to the plane where the line starts, m."""
    if connector.edge_distance is not None:
        return connector.edge_distance
    back = max(0.5 * pad.size[0] - pad.centre[0] for pad in connector.pads)
    return rounded_up(back + max(SIDE, fab.copper_to_routed_edge + fab.outline_tolerance))


def _spans(basis: CouponBasis) -> dict[str, float]:
    """Spans and lengths of both lines, and the board's width."""
    row = _rows(basis)
    pitch, bend, mask = row["launch_pitch"], row["bend_radius"], row["mask_clearance"]
    short = rounded_up(max(pitch, 2.0 * bend + LEAST_STRAIGHT * basis.line.height))
    fixed = 2.0 * pitch + 2.0 * SIDE + 2.0 * short
    # open, short and load stand under the long line, a quarter of its span apart
    beside = 0.5 * basis.connector.reach + 0.5 * basis.line.width + mask + MASK_BAR
    least = max(DIFFERENCES[0], 4.0 * max(pitch, beside) - short)
    difference = rounded_up(max(least, min(DIFFERENCES[1], math.floor((LARGEST[0] - fixed) * 2e3) / 2e3)))
    straight = row["rise"] - bend
    around = 2.0 * straight + (math.pi - 2.0) * bend
    return {
        "short_span": short,
        "long_span": rounded(short + difference),
        "short_length": around + short,
        "long_length": around + rounded(short + difference),
        "board_width": rounded(fixed + difference),
    }


def _clear(basis: CouponBasis) -> float:
    """From ring copper to the copper above and below it, m."""
    return 2.0 * MASK_HEIGHTS * basis.line.height + MASK_BAR


def _largest_radius(basis: CouponBasis, sizes: dict[str, float]) -> float:
    below = sizes["launch_depth"] + sizes["rise"] + 0.5 * basis.line.width + _clear(basis)
    above = _clear(basis) + 0.5 * basis.trace_width + 0.5 * sizes["launch_pitch"] + SIDE
    free = 0.5 * (LARGEST[1] - below - above - basis.line.width) - 2.0 * STEP
    return max(free, NARROWEST_RING * basis.line.width)


def _ring(basis: CouponBasis, largest: float) -> tuple[float, int]:
    """Mean radius, m, and the order that resonates in the middle of the band, or 1 above it."""
    eps_eff = basis.line.eps_eff(basis.eps_r, basis.centre)
    wave = SPEED_OF_LIGHT / (basis.centre * math.sqrt(eps_eff))
    slit = max(LEAST_SLIT, basis.fab.min_gap)
    for order in range(min(MOST_ORDER, int(2.0 * math.pi * largest / wave)), 0, -1):
        radius = order * wave / (2.0 * math.pi)
        try:
            for _ in range(_ROUNDS):  # frequency and radius are nearly inverse to each other
                radius *= BareRing(basis.line, radius, slit).frequency(order, basis.eps_r) / basis.centre
        except RangeError:
            continue
        if radius <= largest:
            return rounded(radius), order
    radius = rounded(largest)
    try:
        fundamental = BareRing(basis.line, radius, slit).frequency(1, basis.eps_r)
    except RangeError as error:
        raise SynthesisError(
            f"coupon: no ring that fits {show(LARGEST[1], 'length')} is narrow enough for its formulas: {error}; "
            "a thinner laminate would do"
        ) from error
    if fundamental < basis.centre:
        raise SynthesisError(
            f"coupon: at {show(basis.centre, 'frequency')} a 50 ohm line of {show(basis.line.width, 'length', 3)} is "
            "too wide against the wavelength for a ring; a thinner laminate would do"
        )
    return radius, 1


def _gap(basis: CouponBasis, radius: float, order: int) -> float:
    """Gap, m, between feeds and ring that lets the aimed share through, as far as fab and formula allow."""
    ring = BareRing(basis.line, radius, 0.0)
    frequency = ring.frequency(order, basis.eps_r)
    line = basis.line.line(basis.eps_r, basis.tan_d, frequency)
    q = math.pi / (line.wavelength * (line.alpha_conductor + line.alpha_dielectric))
    share = 10.0 ** (INSERTION_DB / 20.0)
    # |S21| = 2 QL/Qe with 1/QL = 1/Q + 2/Qe
    external = 2.0 * q * (1.0 - share) / share
    coupling = math.sqrt(math.pi * order / external)
    wanted = coupling / (2.0 * math.pi * frequency * line.impedance)
    width, height = basis.line.width, basis.line.height
    low, high = (ratio * width for ratio in GAP_RATIOS)

    def excess(gap: float) -> float:
        return gap_capacitance(width, height, basis.eps_r, gap) - wanted

    gap = low if excess(low) <= 0.0 else high if excess(high) >= 0.0 else float(brentq(excess, low, high))
    return rounded_up(max(gap, 1.5 * basis.fab.min_gap))

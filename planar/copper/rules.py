"""What the fab cannot make of a layout, as a list of findings.

Everything is measured on the drawn copper (flattened to 1 um), not read from the dimensions. Islands
are measured against each other. Within an island, copper narrower than the rule disappears when it is
shrunk and grown again, a slot narrower than the rule fills up when it is grown and shrunk; one whose
area is below a tenth of the squared rule escapes that test.
"""

from __future__ import annotations

import itertools
import math
from collections.abc import Callable

from shapely import difference
from shapely.geometry import Point as ShapelyPoint
from shapely.geometry.base import BaseGeometry

from planar.copper.layout import Hole, Layout
from planar.copper.outline import CHECK_CHORD
from planar.errors import Finding, Severity
from planar.library.records import Fab
from planar.units import show

OVERLAY_GRID = 1e-10
"""m, grid of the overlays: without one, nearly coincident edges now and then lose a whole piece."""
SLIVER = 0.1
"""What disappears or fills counts above this share of the squared rule; less is a sliver at an acute corner."""
SLACK = CHECK_CHORD + 1e-8
"""m, chord error of the flattened copies and ten grid steps: copper drawn at the rule never makes a finding."""
SIZE_RULE = "size limit"
"""Name of the rule that a board keeps to the size the brief allows."""


def fab_findings(layout: Layout, fab: Fab, size_limit: tuple[float, float] | None = None) -> tuple[Finding, ...]:
    """Every rule of `fab`, and the brief's `size_limit` (m, m), that `layout` misses."""
    too_many_levels = _levels(layout, fab)
    if too_many_levels:  # the rules below would repeat it hole by hole
        return tuple(too_many_levels)
    findings = [
        *_between_islands(layout, fab),
        *_tracks_and_gaps(layout, fab),
        *_between_holes(layout, fab),
        *(finding for hole in layout.holes for finding in _hole(layout, hole, fab)),
        *_edge_distance(layout, fab),
        *_mask_webs(layout, fab),
        *_sizes(layout, fab, size_limit),
    ]
    return tuple(findings)


def _mm(length: float) -> str:
    return show(length, "length", 4)


def _levels(layout: Layout, fab: Fab) -> list[Finding]:
    if len(layout.levels) <= fab.levels:
        return []
    advice = "choose a fab with two copper levels, or a family on one level (plain, coplanar)"
    return [Finding("copper levels", "board", str(len(layout.levels)), str(fab.levels), advice, Severity.REFUSE)]


def _between_islands(layout: Layout, fab: Fab) -> list[Finding]:
    """Islands of one level that are nearer than the gap rule, or touch."""
    findings = []
    for level in layout.levels:
        islands = [(i, i.outline.shape()) for i in layout.islands if i.level == level]
        for (one, first), (other, second) in itertools.combinations(islands, 2):
            distance = first.distance(second)
            where = f"{one.role.value} ({one.net}) and {other.role.value} ({other.net}) on {level.value}"
            limit = _mm(fab.min_gap)
            if distance < SLACK:
                advice = "narrow the copper there, or choose another connector or laminate"
                findings.append(Finding("short", where, "they touch", limit, advice, Severity.REFUSE))
            elif distance < fab.min_gap - SLACK:
                advice = f"keep {limit} between them"
                findings.append(Finding("gap", where, _mm(distance), limit, advice, Severity.REFUSE))
    return findings


def _between_holes(layout: Layout, fab: Fab) -> list[Finding]:
    """Unplated holes with too little board between them."""
    holes = [hole for hole in layout.holes if not hole.plated]
    findings = []
    for one, other in itertools.combinations(holes, 2):
        web = math.dist(one.centre, other.centre) - 0.5 * (one.diameter + other.diameter)
        if web < fab.hole_to_edge - SLACK:
            where = f"holes at ({one.centre[0] * 1e3:.2f}, {one.centre[1] * 1e3:.2f}) mm and beside"
            advice = "leave one out or enlarge the board"
            findings.append(Finding("hole to hole", where, _mm(web), _mm(fab.hole_to_edge), advice, Severity.REFUSE))
    return findings


def _tracks_and_gaps(layout: Layout, fab: Fab) -> list[Finding]:
    findings = []
    for level in layout.levels:
        where = f"copper {level.value}"
        for copper in (outline.shape() for outline in layout.copper(level)):
            findings += _within_island(copper, fab, where)
    return findings


def _within_island(copper: BaseGeometry, fab: Fab, where: str) -> list[Finding]:
    findings = []
    track = _smallest(copper, fab.min_track, _lost_when_opened)
    if track is not None:
        advice = f"widen the copper at {track[1]} to {_mm(fab.min_track)}"
        findings.append(Finding("track", where, _mm(track[0]), _mm(fab.min_track), advice, Severity.REFUSE))
    gap = _smallest(copper, fab.min_gap, _filled_when_closed)
    if gap is not None:
        advice = f"open the gap at {gap[1]} to {_mm(fab.min_gap)}"
        findings.append(Finding("gap", where, _mm(gap[0]), _mm(fab.min_gap), advice, Severity.REFUSE))
    return findings


def _grown(copper: BaseGeometry, by: float) -> BaseGeometry:
    return copper.buffer(by, join_style="mitre", mitre_limit=5.0)


def _lost_when_opened(copper: BaseGeometry, width: float) -> BaseGeometry:
    return difference(copper, _grown(_grown(copper, -0.5 * width), 0.5 * width * 1.0001), grid_size=OVERLAY_GRID)


def _filled_when_closed(copper: BaseGeometry, width: float) -> BaseGeometry:
    return difference(_grown(_grown(copper, 0.5 * width), -0.5 * width * 1.0001), copper, grid_size=OVERLAY_GRID)


def _smallest(
    copper: BaseGeometry, limit: float, residue: Callable[[BaseGeometry, float], BaseGeometry]
) -> tuple[float, str] | None:
    """Smallest width below `limit` that leaves a residue, and where; None when there is none."""

    def worst(width: float) -> BaseGeometry | None:
        left = residue(copper, width)
        parts = [part for part in getattr(left, "geoms", [left]) if part.area > SLIVER * width**2]
        return max(parts, key=lambda part: part.area, default=None)

    found = worst(limit - SLACK)
    if found is None:
        return None
    low, high = 0.0, limit
    while high - low > 1e-3 * limit:
        middle = 0.5 * (low + high)
        part = worst(middle)
        low, high, found = (low, middle, part) if part is not None else (middle, high, found)
    place = found.representative_point()
    return high, f"({place.x * 1e3:.2f}, {place.y * 1e3:.2f}) mm"


def _hole(layout: Layout, hole: Hole, fab: Fab) -> list[Finding]:
    where = f"{hole.purpose} hole at ({hole.centre[0] * 1e3:.2f}, {hole.centre[1] * 1e3:.2f}) mm"
    findings = []
    if hole.diameter < fab.min_hole:
        got, limit = _mm(hole.diameter), _mm(fab.min_hole)
        findings.append(Finding("hole", where, got, f"at least {limit}", f"drill {limit}", Severity.REFUSE))
    if hole.diameter > fab.max_hole:
        got, limit = _mm(hole.diameter), _mm(fab.max_hole)
        findings.append(Finding("hole", where, got, f"at most {limit}", "have it routed", Severity.WARN))
    centre = ShapelyPoint(hole.centre)
    web = layout.edge.shape().exterior.distance(centre) - 0.5 * hole.diameter
    if web < fab.hole_to_edge - SLACK:
        advice = "move the hole inward or enlarge the board"
        findings.append(Finding("hole to edge", where, _mm(web), _mm(fab.hole_to_edge), advice, Severity.REFUSE))
    if hole.plated:
        findings += _plated(layout, hole, fab, where)
    return findings


def _plated(layout: Layout, hole: Hole, fab: Fab, where: str) -> list[Finding]:
    if not fab.plated_holes:
        advice = "choose a fab that plates holes, or end the line open"
        return [Finding("plated holes", where, "plated", "none plated", advice, Severity.REFUSE)]
    findings = []
    centre = ShapelyPoint(hole.centre)
    for level in layout.levels:
        around = [shape for outline in layout.copper(level) if (shape := outline.shape()).contains(centre)]
        ring = around[0].exterior.distance(centre) - 0.5 * hole.diameter if around else 0.0
        if ring < fab.min_annular_ring - SLACK:
            advice = f"give the hole a pad of {_mm(hole.diameter + 2.0 * fab.min_annular_ring)}"
            place = f"{where}, {level.value}"
            limit = _mm(fab.min_annular_ring)
            findings.append(Finding("annular ring", place, _mm(ring), limit, advice, Severity.REFUSE))
    return findings


def _edge_distance(layout: Layout, fab: Fab) -> list[Finding]:
    board = layout.edge.shape()
    findings = []
    for island in layout.islands:
        copper = island.outline.shape()
        distance = board.exterior.distance(copper) if board.contains(copper) else 0.0
        if distance < fab.copper_to_routed_edge - SLACK:
            where = f"{island.role.value} on {island.level.value}"
            limit = _mm(fab.copper_to_routed_edge)
            advice = "enlarge the board or make the antenna smaller"
            findings.append(Finding("copper to edge", where, _mm(distance), limit, advice, Severity.REFUSE))
    return findings


def _mask_webs(layout: Layout, fab: Fab) -> list[Finding]:
    """Mask between two openings too narrow to print: it flakes off, a warning only."""
    findings = []
    for level in layout.levels:
        openings = [m.outline.shape() for m in layout.mask_openings if m.level == level]
        webs = [a.distance(b) for i, a in enumerate(openings) for b in openings[:i]]
        narrow = min((web for web in webs if web > 0.0), default=math.inf)
        if fab.mask and narrow < fab.mask_web - SLACK:
            where = f"mask {level.value}"
            advice = "the fab may join the two openings; that is harmless here"
            findings.append(Finding("mask web", where, _mm(narrow), _mm(fab.mask_web), advice, Severity.NOTE))
    return findings


def _sizes(layout: Layout, fab: Fab, size_limit: tuple[float, float] | None) -> list[Finding]:
    width, height = layout.size
    got = f"{_mm(width)} x {_mm(height)}"
    usable = tuple(side - 2.0 * fab.panel_border for side in fab.panel)
    if not _fits((width, height), fab.max_board, turnable=True):
        usable = (math.inf, math.inf)  # said once is enough
    checks = [
        (SIZE_RULE, size_limit, Severity.REFUSE, "choose a higher permittivity, another shape, or allow more space"),
        ("largest board", fab.max_board, Severity.REFUSE, "choose a fab with larger boards"),
        ("panel", usable, Severity.REFUSE, "choose a fab with a larger panel"),
        ("price step", fab.price_step, Severity.NOTE, "smaller boards are in the cheaper class"),
    ]
    return [
        Finding(rule, "board", got, f"{_mm(limit[0])} x {_mm(limit[1])}", advice, severity)
        for rule, limit, severity, advice in checks
        if limit is not None and not _fits((width, height), (limit[0], limit[1]), turnable=rule != SIZE_RULE)
    ]


def _fits(size: tuple[float, float], limit: tuple[float, float], *, turnable: bool) -> bool:
    straight = size[0] <= limit[0] + SLACK and size[1] <= limit[1] + SLACK
    turned = size[1] <= limit[0] + SLACK and size[0] <= limit[1] + SLACK
    return straight or (turnable and turned)

"""How a board is put into a panel: scored or routed, how many, and why not otherwise.

Scoring is chosen where it is allowed, since it wastes no board; what speaks against it then becomes the reason for
tabs. What was asked for and cannot be made is refused with the change that works.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

from planar.copper.layout import Layout
from planar.copper.panel_copies import Blank, Box, metres, nanometres
from planar.copper.panel_grid import Array, Ingredients, deliverable, usable
from planar.copper.panel_score import score_obstacles, size_obstacles
from planar.copper.panel_tabs import overhangs
from planar.errors import Finding, Severity, SynthesisError
from planar.library.records import Fab, Panelling
from planar.units import show

SEPARATIONS = ("score", "tabs")
CHOSEN = "chosen instead: tabs"


@dataclass(frozen=True)
class Job:
    """Board, fab and wishes, the rectangles of board and coupon found; `body` is the connector's, nm."""

    board: Layout
    blank: Blank
    fab: Fab
    way: Panelling
    thickness: float
    count: tuple[int, int] | None
    separation: str | None
    coupon: tuple[Layout, Blank] | None
    body: Box | None

    def ingredients(self, *, scored: bool) -> Ingredients:
        """What the arrays of that separation are made of."""
        slot = 2 * nanometres(self.fab.edge_radius)
        rail = 2 * (nanometres(self.way.rail_width) // 2)
        web = nanometres(max(self.fab.open_frame_web, metres(rail // 2)))
        coupon = None if self.coupon is None else self.coupon[1].size
        return Ingredients(self.blank.size, 0 if scored else slot, rail, coupon, slot, web)


def chosen(job: Job) -> tuple[str, Array, tuple[Finding, ...]]:
    """Separation, array, and what the user must know of the choice. Raises `SynthesisError` where it cannot be made."""
    if job.separation not in (None, *SEPARATIONS):
        raise SynthesisError(f"boards are separated by {' or '.join(SEPARATIONS)}, not {job.separation}")
    if job.separation == "tabs":
        return "tabs", _array(job, scored=False), ()
    obstacles = score_obstacles(job.board, job.blank, job.fab, way=job.way, thickness=job.thickness)
    if not obstacles:
        try:
            array = _array(job, scored=True)
        except SynthesisError as error:
            if job.separation == "score":
                raise
            reason = Finding("score", "panel", error.reason, "score lines", CHOSEN, Severity.NOTE)
            return "tabs", _array(job, scored=False), (reason,)
        obstacles = size_obstacles(array, job.way)
        if not obstacles:
            return "score", array, ()
    if job.separation == "score":
        raise SynthesisError("the boards cannot be scored apart", obstacles, ("ask for tabs",))
    reasons = tuple(replace(each, severity=Severity.NOTE, advice=CHOSEN) for each in obstacles)
    return "tabs", _array(job, scored=False), reasons


def _array(job: Job, *, scored: bool) -> Array:
    """The array asked for, or the one that holds most. Raises `SynthesisError` where the fab's panel is too small."""
    ingredients = job.ingredients(scored=scored)
    if job.count is None:
        best = ingredients.best(job.fab)
        if best is None:
            raise SynthesisError("not one board fits", (_panel_finding(ingredients, (1, 1), job.fab),))
        return best
    columns, rows = job.count
    if columns < 1 or rows < 1:
        raise SynthesisError(f"a panel of {columns} x {rows} boards has none", changes=("count at least 1 x 1",))
    array = ingredients.array(columns, rows)
    if array is not None and (deliverable(array.size, job.fab) or deliverable(array.size[::-1], job.fab)):
        return array
    if array is None:
        raise SynthesisError(
            f"the coupon is wider than the room above {columns} x {rows} boards",
            changes=("order the coupon alone", *(("ask for tabs",) if scored else ("put more columns in the panel",))),
        )
    finding = _panel_finding(ingredients, job.count, job.fab)
    raise SynthesisError(f"{columns} x {rows} boards do not fit", (finding,), _largest(ingredients.best(job.fab), job))


def _largest(best: Array | None, job: Job) -> tuple[str, ...]:
    """What fits instead, in words. The board may lie turned; the count is then that of the turned panel."""
    if best is None:
        return ("choose a fab with a larger panel",)
    counts = (best.rows, best.columns) if best.turned and job.coupon is None else (best.columns, best.rows)
    lying = ", the boards turned, which leaving out the count does" if best.turned and job.coupon is not None else ""
    return (f"at most {counts[0]} x {counts[1]} boards{lying}",)


def _panel_finding(ingredients: Ingredients, counts: tuple[int, int], fab: Fab) -> Finding:
    array = ingredients.array(*counts) or replace(ingredients, coupon=None).array(*counts)
    size = (0, 0) if array is None else array.size
    got, limit = (f"{_mm(metres(a))} x {_mm(metres(b))}" for a, b in (size, usable(fab)))
    return Finding("panel", f"{counts[0]} x {counts[1]} boards and rails", got, limit, "", Severity.REFUSE)


def told(job: Job, *, scored: bool) -> tuple[Finding, ...]:
    """What whoever builds the boards must know of the separation."""
    findings = []
    if scored and job.blank.corner:
        got, limit = "square in the panel", f"rounded by {_mm(metres(job.blank.corner))} on the single board"
        advice = "the copper is the same; ask for tabs where the corners matter"
        findings.append(Finding("corners", "boards", got, limit, advice, Severity.NOTE))
    free = 0 if scored else 2 * nanometres(job.fab.edge_radius)
    for side, reach in overhangs(job.body, job.blank.box).items():
        if reach > free:
            got, limit = f"{_mm(metres(reach))} beyond the {side} edge", f"{_mm(metres(free))} free in the panel"
            advice = "solder the connector after separating the boards"
            findings.append(Finding("connector overhang", "boards", got, limit, advice, Severity.NOTE))
    if not scored and not job.way.perforation_count:
        advice = "saw the tabs and file the edge"
        findings.append(Finding("perforation", "tabs", "none", "a row of holes", advice, Severity.NOTE))
    return tuple(findings)


def _mm(length: float) -> str:
    return show(length, "length", 4)

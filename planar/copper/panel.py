"""A panel planned from a finished board: copies in rows and columns, joined by score lines or tabs, inside four rails.

The panel's origin is the lower left corner of its outline, x to the right, y upwards, seen from the top; every file of
the panel shares it. Boards are counted from there: columns A, B, ... to the right, rows 1, 2, ... upwards; the order of
the array is A1, B1, ..., A2, B2, ..., and the antenna of the n-th board is part ANTn. A coupon lies in a strip of its
own below the upper rail, always routed, with nets that end in _CPN and the part CPN1.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

from planar.copper.board import BOARD_CORNER
from planar.copper.lands import placed
from planar.copper.layout import Kind, Layout, Level
from planar.copper.outline import Outline
from planar.copper.panel_choice import Job, chosen, told
from planar.copper.panel_copies import (
    Blank,
    Box,
    Placement,
    blank_of,
    blank_outline,
    column_letters,
    copied,
    metres,
    nanometres,
)
from planar.copper.panel_grid import Array, arrays_on_panel, placed_at
from planar.copper.panel_rails import RailItems, RailRequest, rail_items
from planar.copper.panel_score import score_lines
from planar.copper.panel_slots import Routing, Window, routed
from planar.copper.panel_tabs import tab_places, tab_rule
from planar.copper.shapes import rounded_rectangle
from planar.errors import Finding, Severity, SynthesisError
from planar.library.records import Connector, Fab

COUPON = "CPN"
"""End of the nets of a coupon; with a 1, its part."""
DIGITS = 8
"""Digits of the design's hash written on the rail."""


@dataclass(frozen=True)
class PanelRequest:
    """What is asked of a panel, beside board and fab.

    `name`, `revision` and `digest` (the design's hash) are written on the rail. `thickness` of the board in m,
    `masked` its levels under solder mask. `count` is (columns, rows), None for as many as the fab's panel holds.
    `separation` is "score" or "tabs", None for scored where that is allowed. `body` is the rectangle (x_min, y_min,
    x_max, y_max in m, the board's coordinates) over its connector, see `connector_box`.
    """

    name: str
    revision: str
    digest: str
    thickness: float
    masked: tuple[Level, ...]
    count: tuple[int, int] | None = None
    separation: str | None = None
    coupon: Layout | None = None
    body: tuple[float, float, float, float] | None = None


@dataclass(frozen=True)
class PlannedPanel:
    """A panel and what it yields.

    `board_size` (width, height) of a board as it lies and `spacing` between boards in m, 0 where they are scored.
    `score_web` is the part of the thickness left under a score, `tab_width` that of the tabs in m, each None where
    there are none. `places` names the boards in the order of the array, which is that of `layout.boards`; the `coupon`,
    where there is one, is not among these. `tabs` are rectangles across the slots. `used_share` is board area over the
    area of the fab's whole panel.
    """

    layout: Layout
    columns: int
    rows: int
    turned: bool
    separation: str
    board_size: tuple[float, float]
    spacing: float
    score_web: float | None
    tab_width: float | None
    places: tuple[str, ...]
    tabs: tuple[Outline, ...]
    coupon: Outline | None
    arrays_per_fab_panel: int
    used_share: float
    findings: tuple[Finding, ...]

    @property
    def boards(self) -> int:
        """Boards in one panel."""
        return self.columns * self.rows

    @property
    def boards_per_fab_panel(self) -> int:
        """Boards cut from one panel of the fab."""
        return self.boards * self.arrays_per_fab_panel


def connector_box(connector: Connector) -> tuple[float, float, float, float] | None:
    """x_min, y_min, x_max, y_max (m) of the connector's body on a board whose feed is the origin; None without body."""
    if connector.body is None:
        return None
    (x, y), (along, across) = placed(connector.body.centre, (0.0, 0.0)), connector.body.size
    return x - 0.5 * across, y - 0.5 * along, x + 0.5 * across, y + 0.5 * along


def plan_panel(board: Layout, fab: Fab, request: PanelRequest) -> PlannedPanel:
    """The panel of a finished, snapped `board` for `fab`.

    Raises `SynthesisError`, with the change that works, where the fab's file has no panelling, the outline is no
    rectangle, the count does not fit, scores asked for come too near to copper, or no tab finds a place.
    """
    job = _job(board, fab, request)
    separation, array, reasons = chosen(job)
    scored = separation == "score"
    places = tuple(f"{column_letters(c)}{r + 1}" for r in range(array.rows) for c in range(array.columns))
    boards = _copies(job, array, places, scored=scored)
    coupons = _coupons(job, array)
    routings = ([] if scored else [_board_slots(job, array)]) + [around for _, around in coupons]
    copies = [*boards, *(coupon for coupon, _ in coupons)]
    text = (request.name, f"REV {request.revision} {request.digest[:DIGITS]}", f"@ {separation.upper()}")
    items = rail_items(array, fab, RailRequest(board.levels, request.masked, places, text), way=job.way)
    arrays = arrays_on_panel(array.size, fab)
    return PlannedPanel(
        layout=replace(_joined(copies, routings, items, array), boards=tuple(each.edge for each in boards)),
        columns=array.columns,
        rows=array.rows,
        turned=array.turned,
        separation=separation,
        board_size=(metres(array.cell[0]), metres(array.cell[1])),
        spacing=metres(array.spacing),
        score_web=job.way.score_web if scored else None,
        tab_width=job.way.tab_width if routings else None,
        places=places,
        tabs=tuple(tab for routing in routings for tab in routing.tabs),
        coupon=coupons[0][0].edge if coupons else None,
        arrays_per_fab_panel=arrays,
        used_share=array.boards * arrays * abs(board.edge.area) / (fab.panel[0] * fab.panel[1]),
        findings=(*reasons, *told(job, scored=scored), *items.findings),
    )


def _job(board: Layout, fab: Fab, request: PanelRequest) -> Job:
    """The request with what is read from board, coupon and fab. Raises `SynthesisError` where one of them is unfit."""
    if fab.panelling is None:
        reason = f"the file of fab {fab.key} has no [panelling], so how it joins boards is not known"
        raise SynthesisError(reason, changes=("add [panelling] as in the shipped fabs",))
    coupon = request.coupon
    if coupon is not None and not set(coupon.levels) <= set(board.levels):
        raise SynthesisError("the coupon has copper levels the board has not", changes=("order the coupon alone",))
    return Job(
        board=board,
        blank=_blank(board),
        fab=fab,
        way=fab.panelling,
        thickness=request.thickness,
        count=request.count,
        separation=request.separation,
        coupon=None if coupon is None else (coupon, _blank(coupon)),
        body=None if request.body is None else _box(request.body),
    )


def _box(box: tuple[float, float, float, float]) -> Box:
    x0, y0, x1, y1 = box
    return nanometres(x0), nanometres(y0), nanometres(x1), nanometres(y1)


def _blank(board: Layout) -> Blank:
    blank = blank_of(board.edge)
    if blank is None:
        finding = Finding(
            "outline", board.name, "another shape", "a rectangle, its corners sharp or of one radius", "order it alone",
            Severity.REFUSE,
        )  # fmt: skip
        raise SynthesisError("only rectangles are put into a panel", (finding,))
    return blank


def _copies(job: Job, array: Array, places: tuple[str, ...], *, scored: bool) -> list[Layout]:
    """The boards in the order of `places`; scored ones have square corners."""
    blank = replace(job.blank, corner=0) if scored else job.blank
    board = replace(job.board, edge=blank_outline(blank))
    corners = [array.corner(column, row) for row in range(array.rows) for column in range(array.columns)]
    return [
        copied(board, placed_at(blank.box, corner, turned=array.turned), place=place, part=f"ANT{number}")
        for number, (corner, place) in enumerate(zip(corners, places, strict=True), start=1)
    ]


def _board_slots(job: Job, array: Array) -> Routing:
    """Slots and tabs of the boards."""
    lying = Placement(0, 0, array.turned)
    body = None if job.body is None else lying.box(job.body)
    counts = (array.columns, array.rows)
    board = copied(job.board, lying, place="", part="")
    rule = tab_rule(job.fab, job.way)
    blank = replace(job.blank, box=lying.box(job.blank.box))
    places = tab_places(board, blank, rule=rule, body=body, counts=counts)
    return routed(Window(array.window[:2], counts, array.cell, blank.corner), places, rule)


def _coupons(job: Job, array: Array) -> list[tuple[Layout, Routing]]:
    """The coupon in its place and the slot round it, where one is asked for."""
    if job.coupon is None or array.coupon is None:
        return []
    (coupon, blank), room = job.coupon, array.coupon
    corner = array.coupon_corner(room)
    placement = placed_at(blank.box, corner, turned=room.turned)
    copy = copied(coupon, placement, place=COUPON, part=f"{COUPON}1")
    rule = tab_rule(job.fab, job.way)
    lying = replace(blank, box=placement.box(blank.box))
    places = tab_places(copy, lying, rule=rule, body=None, counts=(1, 1))
    start = corner[0] - room.slot, corner[1] - room.slot
    return [(copy, routed(Window(start, (1, 1), room.size, blank.corner), places, rule))]


def _joined(copies: list[Layout], routings: list[Routing], items: RailItems, array: Array) -> Layout:
    """One layout of everything, named after the first copy and with its levels; `boards` is left to the caller."""
    width, height = (metres(side) for side in array.size)
    scored = array.spacing == 0
    return Layout(
        name=f"{copies[0].name} panel",
        levels=copies[0].levels,
        islands=(*(i for copy in copies for i in copy.islands), *items.islands),
        holes=(
            *(hole for copy in copies for hole in copy.holes),
            *(hole for routing in routings for hole in routing.perforations),
            *items.holes,
        ),
        pads=tuple(pad for copy in copies for pad in copy.pads),
        ports=tuple(port for copy in copies for port in copy.ports),
        mask_openings=(*(m for copy in copies for m in copy.mask_openings), *items.mask_openings),
        legend=(*(m for copy in copies for m in copy.legend), *items.legend),
        edge=rounded_rectangle(0.0, 0.0, width, height, radius=BOARD_CORNER).normalised(),
        keepout=tuple(outline for copy in copies for outline in copy.keepout),
        kind=Kind.ARRAY,
        cutouts=(
            *(outline for copy in copies for outline in copy.cutouts),
            *(outline for routing in routings for outline in routing.cutouts),
        ),
        scores=score_lines(array) if scored else (),
    )

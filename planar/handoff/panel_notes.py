"""What a fab sheet says of a panel: how it is delivered, how the boards come apart, what lies on the rails.

Sizes, places and counts are measured on the layout; only what no outline shows (how much a score leaves, whether a
panel with a bad board is taken) comes from `PanelFacts`. Where the two disagree there is no sheet.
"""

from __future__ import annotations

import math
from collections.abc import Iterable, Iterator, Sequence
from dataclasses import dataclass

import numpy as np
from scipy.sparse import coo_array
from scipy.sparse.csgraph import connected_components
from scipy.spatial import KDTree

from planar.copper.arc import Point
from planar.copper.boolean import contains
from planar.copper.layout import Hole, Island, Layout, Role, Score, bounds_of
from planar.copper.outline import GRID
from planar.units import show

_SLACK = 2.0 * GRID
_LINKED = 1.2
"""Perforations no further apart than this many times the least distance are one row."""


@dataclass(frozen=True)
class PanelFacts:
    """What a panel's papers say beside its layout.

    `columns` and `rows` of boards of `board_size_m` (width, height); `score_web` what a score line leaves of the
    board's thickness, a fraction, None where nothing is scored; `tab_width_m` of the tabs that hold the boards, None
    where there are none; `bad_boards_allowed` whether a panel with a bad board, crossed out, is taken; `coupon_size_m`
    of a coupon beside the boards, None without one.
    """

    columns: int
    rows: int
    board_size_m: tuple[float, float]
    score_web: float | None
    tab_width_m: float | None
    bad_boards_allowed: bool
    coupon_size_m: tuple[float, float] | None = None


PANEL_QUESTIONS: tuple[tuple[str, str], ...] = (
    ("how the boards are delivered", r"Delivery: as a panel of \d.* boards of \d"),
    ("how the boards come apart", r"Separation: (scored|tabs)"),
    ("rails and spacing", r"Rails, to be left on: .*\d"),
    ("tooling holes", r"Tooling holes: \S"),
    ("fiducials", r"Fiducials: \S"),
    ("bad boards", r"Bad boards: (allowed|none)"),
)
"""What the drawing of a panel answers besides, and a pattern the answer must match."""


def panel_notes(layout: Layout, thickness: float, facts: PanelFacts) -> Iterator[str]:
    """The notes of a panel whose boards are `thickness` m thick."""
    count = facts.columns * facts.rows
    coupon = "" if facts.coupon_size_m is None else f" and a coupon of {size_text(facts.coupon_size_m)}"
    yield (
        f"Delivery: as a panel of {size_text(layout.size)} with {facts.columns} x {facts.rows} = {count} boards of "
        f"{size_text(facts.board_size_m)}{coupon}, not taken apart."
    )
    rails = ", ".join(f"{side} {show(width, 'length')}" for side, width in rail_widths(layout).items())
    yield f"Rails, to be left on: {rails}. Between boards: {spacing_text(layout)}."
    if facts.score_web is not None:
        yield _score_note(layout, thickness, facts.score_web)
    if facts.tab_width_m is not None:
        yield (
            f"Separation: tabs {show(facts.tab_width_m, 'length')} wide bridge the routed slots. "
            f"Perforation: {perforation_text(layout)}."
        )
    yield f"Tooling holes: {hole_text(holes_for(layout, 'tooling'))}."
    yield f"Fiducials: {fiducial_text(layout)}. No copper, mask or legend of the fab's own beside them."
    if facts.bad_boards_allowed:
        yield "Bad boards: allowed, crossed out on the rail mark; state the number with the delivery."
    else:
        yield "Bad boards: none allowed; a panel with a bad board is not taken."


def _score_note(layout: Layout, thickness: float, web: float) -> str:
    depth = 0.5 * (1.0 - web) * thickness
    return (
        f"Separation: scored along {len(layout.scores)} straight lines from both sides (score.gbr), depth "
        f"{show(depth, 'length', 3)} from each; remaining web {show(web * thickness, 'length', 3)}, "
        f"{show(web, 'fraction', 3)} of the board thickness."
    )


def panel_rows(layout: Layout, facts: PanelFacts) -> Iterator[tuple[str, str]]:
    """The table of a panel: what is stated, and what it is."""
    yield "overall size", size_text(layout.size)
    boards = f"{facts.columns} x {facts.rows} = {facts.columns * facts.rows} of {size_text(facts.board_size_m)}"
    yield "boards", boards
    if facts.coupon_size_m is not None:
        yield "coupon", size_text(facts.coupon_size_m)
    yield "rails", ", ".join(f"{side} {show(width, 'length')}" for side, width in rail_widths(layout).items())
    yield "between boards", spacing_text(layout)
    if layout.scores:
        yield "score lines", "; ".join(_score_text(layout, score) for score in layout.scores)
    yield "cutouts", str(len(layout.cutouts))
    yield "perforations", perforation_text(layout)
    yield "tooling holes", hole_text(holes_for(layout, "tooling"))
    yield "fiducials", fiducial_text(layout)
    yield "marks", mark_text(layout)


def _score_text(layout: Layout, score: Score) -> str:
    """Where a line lies from the panel's lower left corner."""
    x0, y0, _, _ = layout.edge.bounds
    (a, b), (c, d) = ((1e3 * (x - x0), 1e3 * (y - y0)) for x, y in (score.start, score.end))
    if abs(c - a) < 1e-6:
        return f"x {a:.3f} mm from the left side"
    if abs(d - b) < 1e-6:
        return f"y {b:.3f} mm from the lower side"
    return f"({a:.3f}, {b:.3f}) to ({c:.3f}, {d:.3f}) mm from the lower left corner"


def mark_text(layout: Layout) -> str:
    """Number and diameter of the marks, by level."""
    texts = []
    for level in layout.levels:
        marks = [i for i in layout.islands if i.level is level and i.role is Role.MARK]
        if marks:
            texts.append(
                f"{level} {len(marks)} of {' and '.join(show(w, 'length') for w in _distinct(map(_width, marks)))}"
            )
    return "; ".join(texts) or "none"


def panel_contradictions(layout: Layout, facts: PanelFacts) -> Iterator[str]:
    """Where `facts` say otherwise than the layout."""
    boxes = [board.bounds for board in layout.boards]
    columns, rows = (len(_distinct(box[i] for box in boxes)) for i in (0, 1))
    if (len(boxes), columns, rows) != (facts.columns * facts.rows, facts.columns, facts.rows):
        yield (
            f"the panel has {len(boxes)} boards in {columns} columns and {rows} rows, the facts say "
            f"{facts.columns} x {facts.rows}"
        )
    for x0, y0, x1, y1 in boxes:
        if math.dist((x1 - x0, y1 - y0), facts.board_size_m) > _SLACK:
            yield f"a board of {size_text((x1 - x0, y1 - y0))}, the facts say {size_text(facts.board_size_m)}"
    if bool(layout.scores) != (facts.score_web is not None):
        yield f"{len(layout.scores)} score lines, the facts say a remaining web of {facts.score_web}"
    if facts.score_web is not None and not 0.0 < facts.score_web < 1.0:
        yield f"a score that leaves {facts.score_web} of the thickness, expected a fraction between 0 and 1"
    if holes_for(layout, "perforation") and not facts.tab_width_m:
        yield "perforations, but no width of the tabs they are in"
    if facts.score_web is None and facts.tab_width_m is None:
        yield "neither score lines nor tabs: nothing says how the boards come apart"
    if facts.bad_boards_allowed and not any(island.role is Role.MARK for island in layout.islands):
        yield "bad boards are allowed, but there is no mark on the rail to cross out"


def rail_widths(layout: Layout) -> dict[str, float]:
    """Width (m) of what stays between each side of the panel and the boards or their slots; {} without boards."""
    if not layout.boards:
        return {}
    (x0, y0, x1, y1), (a, b, c, d) = layout.edge.bounds, bounds_of((*layout.boards, *layout.cutouts))
    return {"left": a - x0, "right": x1 - c, "bottom": b - y0, "top": y1 - d}


def spacing_text(layout: Layout) -> str:
    """Distances between neighbouring columns and between neighbouring rows of boards, in words."""
    found = []
    for name, axis in (("columns", 0), ("rows", 1)):
        lows, highs = (_distinct(board.bounds[i] for board in layout.boards) for i in (axis, axis + 2))
        gaps = _distinct(low - high for high, low in zip(highs, lows[1:], strict=False))
        if gaps:
            found.append(f"{name} {' and '.join(show(gap, 'length') for gap in gaps)}")
    return ", ".join(found) or "nothing, one board"


def holes_for(layout: Layout, purpose: str) -> list[Hole]:
    """The holes of one purpose, in the layout's order."""
    return [hole for hole in layout.holes if hole.purpose == purpose]


def hole_text(holes: Sequence[Hole]) -> str:
    """How many holes of which finished diameter, and where."""
    if not holes:
        return "none"
    sizes = _distinct(hole.diameter for hole in holes)
    per_size = (sum(abs(hole.diameter - size) < _SLACK for hole in holes) for size in sizes)
    counts = " and ".join(f"{n} of {show(d, 'length')}" for n, d in zip(per_size, sizes, strict=True))
    return f"{counts}, unplated, at {places_text([hole.centre for hole in holes])}"


def perforation_text(layout: Layout) -> str:
    """Number, diameter, pitch and rows of the perforations."""
    holes = holes_for(layout, "perforation")
    if not holes:
        return "none"
    centres = [hole.centre for hole in holes]
    diameters = " and ".join(show(d, "length") for d in _distinct(hole.diameter for hole in holes))
    text = f"{len(holes)} unplated holes of {diameters}"
    if len(centres) < 2:
        return text
    tree = KDTree(centres)
    pitch = float(tree.query(centres, k=2)[0][:, 1].min())
    rows = _row_lengths(tree, _LINKED * pitch)
    shortest, longest = min(rows), max(rows)
    each = f"{shortest}" if shortest == longest else f"{shortest} to {longest}"
    return f"{text} at {show(pitch, 'length')}, {len(rows)} rows of {each}"


def _row_lengths(places: KDTree, reach: float) -> list[int]:
    """How many places each group has whose members are within `reach` m of another member."""
    pairs = places.query_pairs(reach, output_type="ndarray")
    links = coo_array((np.ones(len(pairs)), pairs.T), shape=(places.n, places.n))
    groups = connected_components(links, directed=False)[1]
    return [int(count) for count in np.bincount(groups)]


def fiducial_text(layout: Layout) -> str:
    """Number, diameter, mask opening and places of the fiducials, by level."""
    texts = []
    for level in layout.levels:
        discs = [i for i in layout.islands if i.level is level and i.role is Role.FIDUCIAL]
        if discs:
            sizes = " and ".join(show(d, "length") for d in _distinct(_width(disc) for disc in discs))
            at = places_text([_centre(disc) for disc in discs])
            texts.append(f"{level} {len(discs)} of {sizes}, {_opening_text(layout, discs)}, at {at}")
    return "; ".join(texts) or "none"


def _opening_text(layout: Layout, discs: Sequence[Island]) -> str:
    openings = [
        marking.outline.bounds[2] - marking.outline.bounds[0]
        for disc in discs
        for marking in layout.mask_openings
        if marking.level is disc.level and contains(marking.outline, _centre(disc))
    ]
    return f"mask opening {show(min(openings), 'length')}" if openings else "no mask opening"


def places_text(places: Iterable[Point]) -> str:
    """Places in mm from the origin of the files."""
    return " ".join(f"({1e3 * x:.3f}, {1e3 * y:.3f})" for x, y in places) + " mm from the origin"


def size_text(size: tuple[float, float]) -> str:
    """Width by height."""
    return " by ".join(f"{1e3 * side:.3f}" for side in size) + " mm"


def _width(island: Island) -> float:
    x0, _, x1, _ = island.outline.bounds
    return x1 - x0


def _centre(island: Island) -> Point:
    x0, y0, x1, y1 = island.outline.bounds
    return 0.5 * (x0 + x1), 0.5 * (y0 + y1)


def _distinct(lengths: Iterable[float]) -> list[float]:
    """Lengths that differ by more than rounding, in order."""
    found: list[float] = []
    for length in sorted(lengths):
        if not found or length - found[-1] > _SLACK:
            found.append(length)
    return found

"""Each rule on a board made to miss that rule alone, and none on the good one.

Authority: the miss is drawn by hand with a known size; `got` must name it within 2 %.
"""

from __future__ import annotations

from dataclasses import replace

import pytest

from planar.copper.layout import Hole, Island, Layout, Level, Marking, Role
from planar.copper.outline import Outline
from planar.copper.path import band, loop_path
from planar.copper.rules import fab_findings
from planar.copper.shapes import circle, rectangle
from planar.errors import Finding, Severity
from planar.library import Fab, Library
from planar.units import quantity

MM = 1e-3


@pytest.fixture(scope="module")
def fab(library: Library) -> Fab:
    return library.fab("pool-two-layer")


def box(x0: float, y0: float, x1: float, y1: float) -> Outline:
    return rectangle(x0 * MM, y0 * MM, x1 * MM, y1 * MM)


def top(outline: Outline, role: Role = Role.RADIATOR) -> Island:
    return Island(Level.TOP, outline, role)


def bottom(outline: Outline) -> Island:
    return Island(Level.BOTTOM, outline, Role.RADIATOR)


def arc(width: float) -> Outline:
    """A bent trace: rules must not stumble over flattened arcs."""
    line = loop_path(16 * MM, 16 * MM, 8 * MM)
    return band(line.between(0.1 * line.length, 0.6 * line.length), width * MM).translated(45 * MM, 20 * MM)


VIA = Hole((12 * MM, 12 * MM), 0.4 * MM, True, "via")
GOOD = Layout(
    name="good",
    levels=(Level.TOP, Level.BOTTOM),
    islands=(top(box(5, 5, 25, 15)), top(box(5, 15.2, 25, 20)), top(arc(0.2)), bottom(box(5, 5, 25, 15))),
    holes=(VIA, Hole((40 * MM, 5 * MM), 3.2 * MM, False, "mounting")),
    pads=(),
    ports=(),
    mask_openings=(Marking(Level.TOP, box(6, 6, 8, 8)), Marking(Level.TOP, box(8.15, 6, 10, 8))),
    legend=(),
    edge=box(0, 0, 60, 40),
    keepout=(),
)


def islands(*more: Island) -> Layout:
    return replace(GOOD, islands=(*GOOD.islands, *more))


def holes(*more: Hole) -> Layout:
    return replace(GOOD, holes=(*GOOD.holes, *more))


def only(findings: tuple[Finding, ...], rule: str) -> Finding:
    assert {finding.rule for finding in findings} == {rule}
    return findings[0]


def test_the_good_board_is_clean(fab: Fab) -> None:
    assert fab_findings(GOOD, fab, (60 * MM, 40 * MM)) == ()


MISSES = {
    "track, straight": ("track", islands(top(box(5, 25, 20, 25.11))), 0.11 * MM),
    "track, on the other level": ("track", islands(bottom(box(5, 25, 20, 25.05))), 0.05 * MM),
    "track, bent": ("track", replace(GOOD, islands=(*GOOD.islands[:2], top(arc(0.12)), GOOD.islands[3])), 0.12 * MM),
    "track, a neck": (
        "track",
        islands(top(Outline.polygon([(x * MM, y * MM) for x, y in (
            (5, 25), (15, 25), (15, 25.9), (16, 25.9), (16, 25), (25, 25),
            (25, 27), (16, 27), (16, 26), (15, 26), (15, 27), (5, 27))]))),
        0.1 * MM,
    ),
    "gap, straight": ("gap", islands(top(box(5, 20.09, 25, 22))), 0.09 * MM),
    "gap, a slot in one island": (
        "gap",
        islands(top(Outline.polygon([(x * MM, y * MM) for x, y in (
            (5, 25), (15, 25), (15, 29), (10.06, 29), (10.06, 26), (9.94, 26), (9.94, 29), (5, 29))]))),
        0.12 * MM,
    ),
    "hole, too small": ("hole", holes(replace(VIA, centre=(18 * MM, 8 * MM), diameter=0.2 * MM)), 0.2 * MM),
    "hole, too large": ("hole", holes(Hole((50 * MM, 10 * MM), 7 * MM, False, "mounting")), 7 * MM),
    "hole to edge": ("hole to edge", holes(Hole((58 * MM, 20 * MM), 3.2 * MM, False, "mounting")), 0.4 * MM),
    "hole to hole": ("hole to hole", holes(Hole((43.6 * MM, 5 * MM), 3.2 * MM, False, "mounting")), 0.4 * MM),
    "annular ring": ("annular ring", holes(replace(VIA, centre=(5.3 * MM, 10 * MM))), 0.1 * MM),
    "copper to edge": ("copper to edge", islands(top(box(40, 30, 50, 39.8))), 0.2 * MM),
    "mask web": (
        "mask web",
        replace(GOOD, mask_openings=(*GOOD.mask_openings, Marking(Level.TOP, box(6, 8.07, 8, 9)))),
        0.07 * MM,
    ),
}  # fmt: skip


@pytest.mark.parametrize(("rule", "layout", "true"), MISSES.values(), ids=MISSES)
def test_each_rule_alone_with_the_true_measure(rule: str, layout: Layout, true: float, fab: Fab) -> None:
    finding = only(fab_findings(layout, fab), rule)
    assert quantity(finding.got, "length") == pytest.approx(true, rel=0.02)
    harmless = rule == "mask web" or true > fab.max_hole
    assert (finding.severity is Severity.REFUSE) != harmless
    assert finding.advice


def test_a_via_missing_copper_on_one_level_has_no_ring(fab: Fab) -> None:
    """Present on top, absent below: the ring there is nothing."""
    layout = replace(islands(top(box(30, 5, 35, 10))), holes=(replace(VIA, centre=(32 * MM, 7 * MM)),))
    missed = only(fab_findings(layout, fab), "annular ring")
    assert missed.where.endswith("bottom")
    assert quantity(missed.got, "length") == 0.0


def test_islands_that_touch_are_a_short(fab: Fab) -> None:
    """Flush sides and overlap alike: two islands are two nets or one island drawn twice."""
    for low in (20.0, 19.0):
        finding = only(fab_findings(islands(top(box(5, low, 25, 22))), fab), "short")
        assert finding.severity is Severity.REFUSE


def test_copper_beyond_the_edge(fab: Fab) -> None:
    assert quantity(only(fab_findings(islands(top(box(40, 30, 50, 41))), fab), "copper to edge").got, "length") == 0.0


@pytest.mark.parametrize(
    ("rule", "limit", "severity"),
    [
        ("size limit", (59.9 * MM, 40 * MM), Severity.REFUSE),
        ("size limit", (40 * MM, 60 * MM), Severity.REFUSE),  # the limit is in x and y: not to be turned
    ],
)
def test_size_limit(rule: str, limit: tuple[float, float], severity: Severity, fab: Fab) -> None:
    finding = only(fab_findings(GOOD, fab, limit), rule)
    assert finding.severity is severity
    assert finding.got == "60 mm x 40 mm"


@pytest.mark.parametrize(
    ("rule", "change", "severity"),
    [
        ("largest board", {"max_board": (59 * MM, 50 * MM)}, Severity.REFUSE),
        ("panel", {"panel": (100 * MM, 100 * MM), "panel_border": 25 * MM}, Severity.REFUSE),
        ("price step", {"price_step": (50 * MM, 50 * MM)}, Severity.NOTE),
        ("copper levels", {"levels": 1}, Severity.REFUSE),
        ("plated holes", {"plated_holes": False}, Severity.REFUSE),
    ],
)
def test_rules_of_another_fab(rule: str, change: dict[str, object], severity: Severity, fab: Fab) -> None:
    finding = only(fab_findings(GOOD, replace(fab, **change)), rule)  # type: ignore[arg-type]
    assert finding.severity is severity
    assert finding.advice


def test_a_board_may_be_turned_to_fit_the_fab(fab: Fab) -> None:
    assert fab_findings(GOOD, replace(fab, max_board=(40 * MM, 60 * MM), price_step=(40 * MM, 60 * MM))) == ()


def test_copper_exactly_at_the_rule_is_no_finding(fab: Fab) -> None:
    """0.15 mm track and gap, 0.3 mm to the edge, 0.15 mm ring, 0.3 mm hole, straight and round."""
    exact = replace(
        GOOD,
        islands=(
            top(box(5, 5, 20, 5.15)), top(box(5, 5.3, 20, 8)), top(box(0.3, 30, 20, 35)), top(arc(0.15)),
            top(circle((30 * MM, 10 * MM), 0.6 * MM)), bottom(circle((30 * MM, 10 * MM), 0.6 * MM)),
        ),
        holes=(Hole((30 * MM, 10 * MM), 0.3 * MM, True, "via"),),
    )  # fmt: skip
    assert fab_findings(exact, fab) == ()


def test_a_fab_without_mask_has_no_webs(fab: Fab) -> None:
    assert fab_findings(MISSES["mask web"][1], replace(fab, mask=False)) == ()

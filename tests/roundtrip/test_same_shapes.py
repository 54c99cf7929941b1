"""Gerber, DXF and GDS of one board hold the same shapes, as readers see them that know nothing of this program.

Authority: gerbonara (regions, flashes, lines), ezdxf with the bulge formula of the DXF reference (a bulge is the
tangent of a quarter of the arc's angle), gdstk. Measure: area of the symmetric difference on every level and layer, for
the first-order board of every example and the hand-drawn boards. Budget: chord error of the file times length of its
arcs, rounding to the nanometre along the outline, and the chords of this comparison.
"""

from __future__ import annotations

import math
import warnings
from collections.abc import Iterable
from pathlib import Path
from typing import Any

import ezdxf
import gdstk
import pytest
from shapely import symmetric_difference
from shapely.geometry import Polygon
from shapely.geometry.base import BaseGeometry
from shapely.ops import unary_union

from planar.brief import read_brief
from planar.copper.layout import Layout, Level
from planar.copper.panel import PanelRequest, plan_panel
from planar.design.design import make_design
from planar.handoff import GerberFacts, ProjectFacts, creation_date, write_layout_files
from planar.handoff.gerber import write_gerber_files
from planar.library import Library

with warnings.catch_warnings():
    warnings.simplefilter("ignore", DeprecationWarning)  # raised inside the reader's own imports
    from gerbonara import GerberFile as OtherFile
    from gerbonara.graphic_primitives import ArcPoly, Circle

EXAMPLES = Path(__file__).resolve().parents[2] / "examples"
BRIEFS = sorted(path.stem for path in EXAMPLES.glob("*.toml") if not path.name.startswith("refused-"))
BOARDS = [*BRIEFS, "two_level", "one_level", "panel"]
GDS_NUMBERS = {
    "COPPER_TOP": 1,
    "COPPER_BOTTOM": 2,
    "MASK_TOP": 11,
    "MASK_BOTTOM": 12,
    "LEGEND_TOP": 21,
    "LEGEND_BOTTOM": 22,
    "OUTLINE": 31,
}
"""As layers.csv lists them."""
CHORD_MM = {"gerber": 0.0, "dxf": 0.0, "segments": 2e-3, "gds": 1e-3}
"""Chord error each file states; lands in Gerber mask files are true circles and rectangles."""
FINE_MM = 1e-4
"""Chord error of this comparison."""
NM = 1e-6
OVERLAY_MM = 1e-7

Place = tuple[float, float]


def arc_points(start: Place, end: Place, centre: Place, turn: float) -> list[Place]:
    """Points of an arc that turns by `turn` rad, the last one left out, no chord further than FINE_MM from it."""
    radius = math.dist(start, centre)
    step = 2.0 * math.acos(max(0.0, 1.0 - FINE_MM / radius))
    count = max(1, math.ceil(abs(turn) / step))
    first = math.atan2(start[1] - centre[1], start[0] - centre[0])
    angles = [first + turn * i / count for i in range(1, count)]
    return [start, *((centre[0] + radius * math.cos(a), centre[1] + radius * math.sin(a)) for a in angles)]


class Shapes:
    """Area covered by the outlines of one layer of one file, and the length of their arcs, mm.

    Of the layer `OUTLINE` the largest is the edge and the others are cut out of it.
    """

    def __init__(self, outlines: Iterable[tuple[list[Place], float]], layer: str = "") -> None:
        found = [(Polygon(points), arcs) for points, arcs in outlines]
        assert all(polygon.is_valid for polygon, _ in found)
        polygons = sorted((polygon for polygon, _ in found), key=lambda polygon: -polygon.area)
        self.covered: BaseGeometry = unary_union(polygons)
        if layer == "OUTLINE":
            self.covered = polygons[0].difference(unary_union(polygons[1:]))
        self.perimeter = sum(polygon.length for polygon, _ in found)
        self.arcs = sum(arcs for _, arcs in found)


def bulged(rows: list[tuple[float, float, float]]) -> tuple[list[Place], float]:
    """An outline of DXF vertices (x, y, bulge)."""
    points: list[Place] = []
    arcs = 0.0
    for (x0, y0, bulge), (x1, y1, _) in zip(rows, rows[1:] + rows[:1], strict=True):
        if not bulge:
            points.append((x0, y0))
            continue
        turn, chord = 4.0 * math.atan(bulge), math.dist((x0, y0), (x1, y1))
        away = 0.25 * chord * (1.0 / bulge - bulge)  # from the chord's middle to the centre, to the left
        u, v = (x1 - x0) / chord, (y1 - y0) / chord
        centre = (0.5 * (x0 + x1) - away * v, 0.5 * (y0 + y1) + away * u)
        points += arc_points((x0, y0), (x1, y1), centre, turn)
        arcs += abs(turn) * math.dist((x0, y0), centre)
    return points, arcs


def of_dxf(document: ezdxf.document.Drawing, layer: str) -> Shapes:
    lines = document.modelspace().query(f'LWPOLYLINE[layer=="{layer}"]')
    return Shapes((bulged(line.get_points("xyb")) for line in lines), layer)


def of_gds(cell: gdstk.Cell, layer: str) -> Shapes:
    polygons = (polygon for polygon in cell.polygons if polygon.layer == GDS_NUMBERS[layer])
    return Shapes((([tuple(point) for point in polygon.points], 0.0) for polygon in polygons), layer)


def swept(points: list[Place], centres: list[Any]) -> tuple[list[Place], float]:
    """An outline of points, each edge with None or (clockwise, centre)."""
    walk: list[Place] = []
    arcs = 0.0
    for start, end, arc in zip(points, points[1:], centres, strict=False):
        if not arc or arc[1] is None:
            walk.append(start)
            continue
        clockwise, centre = arc
        a, b = ((p[0] - centre[0], p[1] - centre[1]) for p in (start, end))
        turn = math.atan2(a[0] * b[1] - a[1] * b[0], a[0] * b[0] + a[1] * b[1]) % math.tau
        turn -= math.tau * bool(clockwise)
        walk += arc_points(start, end, centre, turn)
        arcs += abs(turn) * math.hypot(*a)
    return walk, arcs


def contours(objects: Iterable[Any]) -> list[list[Any]]:
    """Lines and arcs that begin where the one before ends, together."""
    found: list[list[Any]] = []
    for each in objects:
        if found and math.dist((found[-1][-1].x2, found[-1][-1].y2), (each.x1, each.y1)) < NM:
            found[-1].append(each)
        else:
            found.append([each])
    return found


def contour(objects: list[Any]) -> tuple[list[Place], float]:
    """What a closed line encloses."""
    ends = [(each.x1, each.y1) for each in objects]
    arcs = [
        (each.clockwise, (each.x1 + each.cx, each.y1 + each.cy)) if type(each).__name__ == "Arc" else None
        for each in objects
    ]
    return swept([*ends, ends[0]], arcs)


def of_gerber(path: Path) -> Shapes:
    """Everything a file shows: regions, flashes, and the lines of a board edge and its cutouts as what they enclose."""
    objects = OtherFile.open(path).objects
    kinds = {type(each).__name__ for each in objects}
    if kinds <= {"Line", "Arc"}:
        return Shapes([contour(each) for each in contours(objects)], "OUTLINE")
    found = []
    for each in objects:
        if type(each).__name__ == "Region":
            found.append(swept(list(each.outline), list(each.arc_centers or [None] * len(each.outline))))
            continue
        (primitive,) = each.to_primitives()
        if isinstance(primitive, Circle):
            places = [(primitive.x - s * primitive.r, primitive.y) for s in (1.0, -1.0)]
            found.append(bulged([(*place, 1.0) for place in places]))
        else:
            poly = primitive if isinstance(primitive, ArcPoly) else primitive.to_arc_poly()
            found.append(swept([*poly.outline, poly.outline[0]], [None] * len(poly.outline)))
    return Shapes(found)


@pytest.fixture(scope="module")
def panel() -> Layout:
    """Two boards of an example side by side, with rails, marks and routed slots."""
    library, path = Library.open(), EXAMPLES / "hydrogen-feed.toml"
    design = make_design(read_brief(path, library), library, str(path))
    request = PanelRequest("panel", "A", "0" * 8, 1.6e-3, design.choices.masked, (2, 1), "tabs")
    return plan_panel(design.layout, design.choices.fab, request).layout


@pytest.fixture(scope="module", params=BOARDS)
def files(request: pytest.FixtureRequest, tmp_path_factory: pytest.TempPathFactory) -> tuple[Layout, Path]:
    """A board and the folder its files are written into."""
    folder = tmp_path_factory.mktemp("shapes")
    if request.param in BRIEFS:
        library, path = Library.open(), EXAMPLES / f"{request.param}.toml"
        layout = make_design(read_brief(path, library), library, str(path)).layout
    else:
        layout = request.getfixturevalue(request.param)
    write_layout_files(layout, folder, status="a test board")
    masked = tuple(level for level in Level if any(m.level == level for m in layout.mask_openings))
    project = ProjectFacts(layout.name, "A", "0123456789abcdef" * 4, creation_date())
    write_gerber_files(layout, folder, facts=GerberFacts(project, masked, 0.15e-3))
    return layout, folder


def test_formulas_of_this_test() -> None:
    """Exact: two bulges of 1 make a disc; a quarter circle is drawn alike by bulge tan(pi/8) and by its centre."""
    disc = Shapes([bulged([(-1.0, 0.0, 1.0), (1.0, 0.0, 1.0)])])
    assert disc.covered.area == pytest.approx(math.pi, abs=FINE_MM * math.tau)
    assert disc.arcs == pytest.approx(math.tau, rel=1e-14)
    quarter = Shapes([bulged([(1.0, 0.0, math.tan(math.pi / 8.0)), (0.0, 1.0, 0.0), (0.0, 0.0, 0.0)])])
    same = Shapes([swept([(1.0, 0.0), (0.0, 1.0), (0.0, 0.0), (1.0, 0.0)], [(False, (0.0, 0.0)), None, None])])
    assert quarter.covered.area == pytest.approx(0.25 * math.pi, abs=FINE_MM * math.pi / 2.0)
    assert symmetric_difference(quarter.covered, same.covered).area < 1e-12
    notch = Shapes([swept([(1.0, 0.0), (0.0, 1.0), (0.0, 0.0), (1.0, 0.0)], [(True, (1.0, 1.0)), None, None])])
    assert notch.covered.area == pytest.approx(1.0 - 0.25 * math.pi, abs=FINE_MM * math.pi / 2.0)


def test_every_level_and_layer_is_the_same_in_all_files(files: tuple[Layout, Path]) -> None:
    layout, folder = files
    board, segments = (ezdxf.readfile(folder / f"{name}.dxf") for name in ("board", "board-segments"))
    (cell,) = gdstk.read_gds(folder / "board.gds", unit=1e-3).cells
    compared = 0
    for layer in GDS_NUMBERS:
        stem = "profile" if layer == "OUTLINE" else layer.lower().replace("_", "-")
        true = of_dxf(board, layer)
        if true.covered.is_empty:
            assert not (folder / f"{stem}.gbr").exists()
            continue
        compared += 1
        others = {
            "gerber": of_gerber(folder / f"{stem}.gbr"),
            "segments": of_dxf(segments, layer),
            "gds": of_gds(cell, layer),
        }
        for name, other in others.items():
            budget = (CHORD_MM[name] + FINE_MM) * true.arcs + 2.0 * NM * true.perimeter
            apart = symmetric_difference(true.covered, other.covered, grid_size=OVERLAY_MM).area
            assert apart <= budget, (layer, name)
    sides = len(layout.levels)
    assert compared >= 1 + sides, "copper of each level and the edge at least"

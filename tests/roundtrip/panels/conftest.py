"""Panels and a coupon drawn by hand, with all their writers are told; their numbers are in the text."""

from __future__ import annotations

import hashlib
from dataclasses import dataclass, replace
from pathlib import Path
from types import SimpleNamespace

import pytest

from planar.copper.layout import Hole, Island, Kind, Layout, Level, Marking, Pad, Role, Score
from planar.copper.outline import Outline, on_grid
from planar.copper.shapes import capsule, circle, rectangle, rounded_rectangle
from planar.errors import HandoffError
from planar.handoff import (
    FabricationFacts,
    GerberFacts,
    ImpedanceLine,
    PanelFacts,
    ProjectFacts,
    SheetFacts,
    StackupSheet,
    check_fabrication_files,
    check_files,
    creation_date,
    stackup_sheet,
    write_fabrication_files,
    write_layout_files,
)
from planar.handoff.fab_notes import DrawingFacts
from planar.library import WidebandDebye
from planar.stackup import Conductor, Layer, LayerKind, Stackup

HASH = hashlib.sha256(b"a panel").hexdigest()
FREQUENCY = 868.3e6
TOOLING, PERFORATION, PITCH, FIDUCIAL, OPENING, MARK = 3.2e-3, 0.5e-3, 0.8e-3, 1e-3, 2e-3, 1.5e-3
BOTH = (Level.TOP, Level.BOTTOM)


# the layouts


def place_on(point: tuple[float, float], dx: float, dy: float) -> tuple[float, float]:
    return on_grid(point[0] + dx), on_grid(point[1] + dy)


def moved(board: Layout, dx: float, dy: float, place: str, part: str) -> Layout:
    """A copy of a board with nets and designator of its own."""

    def at(outline: Outline) -> Outline:
        return outline.translated(dx, dy).normalised()

    def net(name: str) -> str:
        return f"{name}_{place}" if name else ""

    return replace(
        board,
        islands=tuple(replace(i, outline=at(i.outline), net=net(i.net), part=part) for i in board.islands),
        holes=tuple(replace(h, centre=place_on(h.centre, dx, dy), net=net(h.net)) for h in board.holes),
        pads=tuple(replace(p, outline=at(p.outline), net=net(p.net), part=part) for p in board.pads),
        ports=(),
        mask_openings=tuple(replace(m, outline=at(m.outline)) for m in board.mask_openings),
        legend=tuple(replace(m, outline=at(m.outline)) for m in board.legend),
        edge=at(board.edge),
        keepout=tuple(at(outline) for outline in board.keepout),
    )


def two_in_a_row(board: Layout, spacing: float, rail: float) -> Layout:
    """Two copies beside each other between four rails, the lower left corner at the origin; three corners of the rails
    have tooling hole and fiducials, a mark for each board stands on the lower rail."""
    x0, y0, x1, y1 = board.edge.bounds
    width, height = x1 - x0, y1 - y0
    steps = (rail - x0, rail - x0 + width + spacing)
    copies = [moved(board, dx, rail - y0, f"{'AB'[i]}1", f"ANT{i + 1}") for i, dx in enumerate(steps)]
    size = (2.0 * rail + 2.0 * width + spacing, 2.0 * rail + height)
    half = 0.5 * rail
    corners = ((half, half), (size[0] - half, half), (half, size[1] - half))
    beside = [(x + (6e-3 if x < 0.5 * size[0] else -6e-3), y) for x, y in corners]
    marks = [(half + 12e-3, half), (half + 16e-3, half)]
    discs = [(level, circle(at, FIDUCIAL), Role.FIDUCIAL) for level in board.levels for at in beside]
    discs += [(board.levels[0], circle(at, MARK), Role.MARK) for at in marks]
    return Layout(
        name="two in a row",
        levels=board.levels,
        islands=(
            *(island for copy in copies for island in copy.islands),
            *(Island(level, outline.normalised(), role, part="") for level, outline, role in discs),
        ),
        holes=(
            *(hole for copy in copies for hole in copy.holes),
            *(Hole(at, TOOLING, False, "tooling") for at in corners),
        ),
        pads=tuple(pad for copy in copies for pad in copy.pads),
        ports=(),
        mask_openings=(
            *(opening for copy in copies for opening in copy.mask_openings),
            *(Marking(level, circle(at, OPENING).normalised()) for level in board.levels for at in beside),
        ),
        legend=tuple(marking for copy in copies for marking in copy.legend),
        edge=rounded_rectangle(0.0, 0.0, *size, radius=2e-3).normalised(),
        keepout=tuple(outline for copy in copies for outline in copy.keepout),
        kind=Kind.ARRAY,
        boards=tuple(copy.edge for copy in copies),
    )


@pytest.fixture(scope="module")
def tabbed(two_level: Layout) -> Layout:
    """Boards of 125 by 110 mm, 3 mm apart; the slot between them is left out at one perforated tab of 5 mm."""
    panel = two_in_a_row(two_level, 3e-3, 10e-3)
    x, low, high, middle = 136.5e-3, 12e-3, 118e-3, 65e-3
    ends = ((low, middle - 2.5e-3 - 1.5e-3), (middle + 2.5e-3 + 1.5e-3, high))
    slots = tuple(capsule((x, a), (x, b), 3e-3).normalised() for a, b in ends)
    rows = [(x + side, middle + i * PITCH) for side in (-1.2e-3, 1.2e-3) for i in (-2, -1, 0, 1, 2)]
    holes = tuple(Hole(place_on((a, b), 0.0, 0.0), PERFORATION, False, "perforation") for a, b in rows)
    return replace(panel, cutouts=slots, holes=panel.holes + holes)


@pytest.fixture(scope="module")
def scored(one_level: Layout) -> Layout:
    """Boards of 40 by 40 mm edge to edge in a panel of 94 by 54 mm; each loop is a DC short."""
    panel = two_in_a_row(one_level, 0.0, 7e-3)
    upright = [Score((x, 0.0), (x, 54e-3)) for x in (7e-3, 47e-3, 87e-3)]
    across = [Score((0.0, y), (94e-3, y)) for y in (7e-3, 47e-3)]
    return replace(panel, scores=(*upright, *across), keepout=())


@pytest.fixture(scope="module")
def coupon() -> Layout:
    """A line of 30 mm over ground with a land of a part at each end, and a land that is shorted to ground."""
    line, stub = rectangle(-15e-3, -1.5e-3, 15e-3, 1.5e-3), rectangle(-15e-3, 6e-3, -10e-3, 9e-3)
    ground = rectangle(-18e-3, -9e-3, 18e-3, 12e-3)
    ends = [rectangle(-15e-3, -1e-3, -13e-3, 1e-3), rectangle(13e-3, -1e-3, 15e-3, 1e-3)]
    returns = [rectangle(x - 1e-3, -5e-3, x + 1e-3, -3e-3) for x in (-14e-3, 14e-3)]
    names = ("J1", "LAUNCH_RIGHT")
    pads = [Pad("1", Level.TOP, outline, "signal", "LINE", part) for outline, part in zip(ends, names, strict=True)]
    pads += [Pad("2", Level.BOTTOM, o, "return", "GND", part) for o, part in zip(returns, names, strict=True)]
    pads += [Pad("1", Level.TOP, rectangle(-15e-3, 6.5e-3, -13e-3, 8.5e-3), "signal", "GND", "J3")]
    pads += [Pad("2", Level.BOTTOM, rectangle(-15e-3, 6.5e-3, -13e-3, 8.5e-3), "return", "GND", "J3")]
    return Layout(
        name="coupon of lines",
        levels=BOTH,
        islands=tuple(
            Island(level, outline.normalised(), role, net, "")
            for level, outline, role, net in (
                (Level.TOP, line, Role.LINE, "LINE"),
                (Level.TOP, stub, Role.GROUND, "GND"),
                (Level.BOTTOM, ground, Role.GROUND, "GND"),
            )
        ),
        holes=(Hole((-11e-3, 7.5e-3), 0.3e-3, True, "via", "GND"), Hole((0.0, 10e-3), 3.2e-3, False, "mounting")),
        pads=tuple(replace(pad, outline=pad.outline.normalised()) for pad in pads),
        ports=(),
        mask_openings=tuple(Marking(pad.level, pad.outline.normalised()) for pad in pads),
        legend=(),
        edge=rectangle(-20e-3, -12e-3, 20e-3, 14e-3).normalised(),
        keepout=(),
        kind=Kind.COUPON,
    )


PANELS = {
    "tabbed": PanelFacts(2, 1, (125e-3, 110e-3), None, 5e-3, bad_boards_allowed=True),
    "scored": PanelFacts(2, 1, (40e-3, 40e-3), 1.0 / 3.0, None, bad_boards_allowed=False),
    "coupon": None,
}


@dataclass(frozen=True)
class Job:
    """A layout with all its writers are told."""

    layout: Layout
    sheet: StackupSheet
    facts: FabricationFacts

    @property
    def drawing(self) -> DrawingFacts:
        return DrawingFacts(self.facts.gerber.project, "netlist.ipc", 0.1e-3, self.facts.panel)

    def write(self, folder: Path) -> Path:
        for name in ("fabrication", "layout"):
            (folder / name).mkdir(parents=True, exist_ok=True)
        write_fabrication_files(self.layout, self.sheet, folder / "fabrication", facts=self.facts)
        write_layout_files(self.layout, folder / "layout", status="a test")
        return folder

    def refusal(self, folder: Path) -> str:
        with pytest.raises(HandoffError) as caught:
            check_fabrication_files(self.layout, self.sheet, folder / "fabrication", facts=self.facts)
        return str(caught.value)

    def layout_refusal(self, folder: Path) -> str:
        with pytest.raises(HandoffError) as caught:
            check_files(self.layout, folder / "layout")
        return str(caught.value)


def job_of(layout: Layout, panel: PanelFacts | None) -> Job:
    laminate = WidebandDebye.from_point(4.3, 0.02, at=FREQUENCY)
    mask = WidebandDebye.from_point(3.5, 0.025, at=FREQUENCY)
    bottom = [Layer("copper-bottom", LayerKind.COPPER, "copper", 43e-6)] if len(layout.levels) > 1 else []
    layers = (
        *bottom,
        Layer("dielectric", LayerKind.DIELECTRIC, "woven glass", 1.6e-3, laminate, 0.1, 0.05, 0.3),
        Layer("copper-top", LayerKind.COPPER, "copper", 43e-6),
        Layer("mask-top", LayerKind.MASK, "solder mask", 20e-6, mask, 0.5),
    )
    conductor = Conductor(base_thickness=35e-6, plating=8e-6, conductivity=5.8e7, roughness_rq=0.4e-6)
    facts = SheetFacts(layout.name, FREQUENCY, "ENIG", None, 0.15e-3, dc_short=layout.dc_short, kind=layout.kind)
    line = ImpedanceLine("line", "microstrip", 3.0e-3, None, "top", "bottom", 50.0, None, False)
    sheet = stackup_sheet(Stackup(layers, conductor, 0.1), (line,), facts=facts)
    gerber = GerberFacts(ProjectFacts(layout.name, "A", HASH, creation_date()), layout.levels, 0.15e-3)
    return Job(layout, sheet, FabricationFacts(gerber, 0.15e-3, 0.15e-3, 0.1e-3, panel))


@pytest.fixture(scope="module")
def jobs(tabbed: Layout, scored: Layout, coupon: Layout) -> dict[str, Job]:
    layouts = {"tabbed": tabbed, "scored": scored, "coupon": coupon}
    return {name: job_of(layout, PANELS[name]) for name, layout in layouts.items()}


@pytest.fixture(scope="module")
def folders(jobs: dict[str, Job], tmp_path_factory: pytest.TempPathFactory) -> dict[str, Path]:
    """Every file of each, written once; who spoils one writes its own."""
    return {name: job.write(tmp_path_factory.mktemp(name)) for name, job in jobs.items()}


@pytest.fixture(params=["tabbed", "scored", "coupon"])
def name(request: pytest.FixtureRequest) -> str:
    found: str = request.param
    return found


@pytest.fixture(scope="session")
def drawing_tools() -> SimpleNamespace:
    """What tests draw and describe layouts of their own with."""
    return SimpleNamespace(moved=moved, job_of=job_of, panels=PANELS)

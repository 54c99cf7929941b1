"""Layouts drawn by hand: small boards with everything an exchange file can hold, none of it symmetric."""

from __future__ import annotations

import hashlib
import shutil
from collections.abc import Callable
from pathlib import Path

import pytest

from planar.brief import check_brief
from planar.copper.boolean import difference
from planar.copper.layout import Hole, Island, Layout, Level, Marking, Pad, Port, Role
from planar.copper.lettering import lettered
from planar.copper.path import band, loop_path, stepped_band
from planar.copper.shapes import circle, rectangle, rounded_rectangle
from planar.design.design import make_design
from planar.handoff import (
    BuildFacts,
    FabricationFacts,
    GerberFacts,
    ProjectFacts,
    SheetFacts,
    StackupSheet,
    check_destination,
    check_fabrication_files,
    check_layout_files,
    check_manifest,
    check_zip,
    creation_date,
    stackup_sheet,
    write_fabrication_files,
    write_layout_files,
    write_manifest,
    write_zip,
)
from planar.library import Library, WidebandDebye
from planar.stackup import Conductor, Layer, LayerKind, Stackup

GAP = 2e-3
FAMILIES = {
    "ring-guided": {"family": "ring-guided", "end": "via"},
    "plain": {"family": "plain"},
    "coplanar": {"family": "coplanar", "shape": "rectangle", "aspect_ratio": 1.3},
}
PACK_ZIP = "two-level-fabrication.zip"
STATUS = "a test board"
BUILD = BuildFacts("Edge coax: a socket", False, 50.0, (863e6, 870e6), -10.0, True, STATUS)


@pytest.fixture(scope="session")
def two_level() -> Layout:
    """A loop with two gaps on the bottom, a line of two widths above it, a via, two mounting holes."""
    loop = loop_path(0.1, 0.09, 0.02)
    ring = band(loop.between(0.5 * GAP, loop.length - 0.5 * GAP), 5e-3)
    pieces = difference(ring, rectangle(-0.06, 0.01, -0.04, 0.0108))
    line = stepped_band([(loop.between(0.02, 0.17), 2.1e-3), (loop.between(0.17, 0.19), 0.25e-3)])
    start, _ = loop.at(0.025)
    end, _ = loop.at(0.18)
    return Layout(
        name="two level, 868 MHz",
        levels=(Level.TOP, Level.BOTTOM),
        islands=(
            *(Island(Level.BOTTOM, piece, Role.RADIATOR) for piece in pieces),
            Island(Level.TOP, line, Role.LINE),
        ),
        holes=(
            Hole(start, 0.3e-3, True, "via"),
            Hole((0.03, 0.02), 3.2e-3, False, "mounting"),
            Hole((-0.03, -0.025), 2.5e-3, False, "mounting"),
        ),
        pads=(
            Pad("SIG", Level.TOP, circle(start, 1.5e-3), "signal"),
            Pad("RET", Level.BOTTOM, circle(end, 3e-3), "return"),
        ),
        ports=(Port("feed", "gap", Level.BOTTOM, (0.0, 0.045), (1.0, 0.0), GAP, 5e-3),),
        mask_openings=(
            Marking(Level.TOP, circle(start, 1.7e-3)),
            Marking(Level.BOTTOM, rounded_rectangle(0.01, -0.05, 0.02, -0.04, radius=1e-3)),
        ),
        legend=(
            *(Marking(Level.TOP, stroke) for stroke in lettered("TOP", (0.01, 0.0), 3e-3, stroke=0.2e-3)),
            *(
                Marking(Level.BOTTOM, stroke)
                for stroke in lettered("BOTTOM", (0.01, -0.01), 3e-3, stroke=0.2e-3, mirrored=True)
            ),
        ),
        edge=rounded_rectangle(-0.06, -0.055, 0.065, 0.055, radius=3e-3),
        keepout=(rectangle(-0.07, -0.065, 0.075, 0.065),),
    ).snapped()


@pytest.fixture(scope="session")
def one_level() -> Layout:
    """A small circle with a gap and two pads, nothing else."""
    loop = loop_path(0.03, 0.03, 0.015)
    ring = band(loop.between(0.5 * GAP, loop.length - 0.5 * GAP), 3e-3)
    pads = {"1": (-2e-3, "signal"), "2": (2e-3, "return")}
    outlines = {name: rectangle(x - 0.8e-3, 0.0138, x + 0.8e-3, 0.0158) for name, (x, _) in pads.items()}
    return Layout(
        name="loop/1",
        levels=(Level.TOP,),
        islands=(Island(Level.TOP, ring, Role.RADIATOR),),
        holes=(),
        pads=tuple(Pad(name, Level.TOP, outlines[name], terminal) for name, (_, terminal) in pads.items()),
        ports=(Port("feed", "gap", Level.TOP, (0.0, 0.015), (1.0, 0.0), GAP, 3e-3),),
        mask_openings=tuple(Marking(Level.TOP, outline) for outline in outlines.values()),
        legend=(),
        edge=rounded_rectangle(-0.02, -0.02, 0.02, 0.02, radius=1e-3),
        keepout=(rectangle(-0.025, -0.025, 0.025, 0.025),),
    ).snapped()


@pytest.fixture(scope="session")
def drawn() -> Layout:
    """A designed ring-guided board: a via at the line's end makes feed and ground one net; ground vias, four holes."""
    data = {
        "name": "ring",
        "target": {"band": ["880 MHz", "920 MHz"]},
        "board": {"laminate": "fr4-general", "thickness": "1.6 mm"},
        "antenna": {"family": "ring-guided", "end": "via"},
    }
    library = Library.open()
    return make_design(check_brief(data, "ring.toml", library), library, "ring.toml").layout


def designed(name: str) -> Layout:
    library = Library.open()
    data = {
        "name": "small",
        "target": {"band": ["880 MHz", "920 MHz"], "impedance": "120 ohm" if name == "coplanar" else "50 ohm"},
        "board": {"laminate": "fr4-general", "thickness": "1.6 mm"},
        "antenna": FAMILIES[name],
    }
    return make_design(check_brief(data, "small.toml", library), library, "small.toml").layout


@pytest.fixture(scope="session")
def ring_guided() -> Layout:
    """A line over a ring, joined by a via."""
    return designed("ring-guided")


@pytest.fixture(scope="session")
def coplanar() -> Layout:
    """Strips into a loop on one level."""
    return designed("coplanar")


@pytest.fixture(scope="session")
def plain() -> Layout:
    """A ring whose lands are pieces of the ring, with curved sides."""
    return designed("plain")


@pytest.fixture(params=["two_level", "one_level"])
def layout(request: pytest.FixtureRequest) -> Layout:
    """Each of the hand-drawn boards."""
    board: Layout = request.getfixturevalue(request.param)
    return board


@pytest.fixture(scope="session")
def pack_sheet(two_level: Layout) -> StackupSheet:
    laminate = WidebandDebye.from_point(4.3, 0.02, at=868e6)
    mask = WidebandDebye.from_point(3.5, 0.025, at=868e6)
    layers = (
        Layer("legend-bottom", LayerKind.LEGEND, "legend ink", 0.0),
        Layer("mask-bottom", LayerKind.MASK, "solder mask", 20e-6, mask),
        Layer("copper-bottom", LayerKind.COPPER, "copper", 43e-6),
        Layer("dielectric", LayerKind.DIELECTRIC, "glass epoxy", 1.6e-3, laminate),
        Layer("copper-top", LayerKind.COPPER, "copper", 43e-6),
        Layer("mask-top", LayerKind.MASK, "solder mask", 20e-6, mask),
        Layer("legend-top", LayerKind.LEGEND, "legend ink", 0.0),
    )
    conductor = Conductor(base_thickness=35e-6, plating=8e-6, conductivity=5.8e7, roughness_rq=0.4e-6)
    facts = SheetFacts(two_level.name, 868e6, "immersion tin", None, 0.15e-3, dc_short=two_level.dc_short)
    return stackup_sheet(Stackup(layers, conductor, 0.1), (), facts=facts)


@pytest.fixture(scope="session")
def pack_facts(two_level: Layout) -> FabricationFacts:
    project = ProjectFacts(two_level.name, "A", hashlib.sha256(b"two level").hexdigest(), creation_date())
    return FabricationFacts(GerberFacts(project, two_level.levels, 0.15e-3), 0.15e-3, 0.15e-3, 0.1e-3, build=BUILD)


@pytest.fixture(scope="session")
def whole(
    two_level: Layout, pack_sheet: StackupSheet, pack_facts: FabricationFacts, tmp_path_factory: pytest.TempPathFactory
) -> Path:
    """The pack as written; not to be changed."""
    pack = tmp_path_factory.mktemp("whole") / "pack"
    for name in ("layout", "fabrication"):
        (pack / name).mkdir(parents=True)
    write_layout_files(two_level, pack / "layout", status=STATUS)
    write_fabrication_files(two_level, pack_sheet, pack / "fabrication", facts=pack_facts)
    write_zip(pack / "fabrication", pack / PACK_ZIP)
    write_manifest(pack)
    return pack


@pytest.fixture
def pack(whole: Path, tmp_path: Path) -> Path:
    """A copy of the pack to be spoilt."""
    return Path(shutil.copytree(whole, tmp_path / "pack"))


@pytest.fixture
def checks(
    two_level: Layout, pack_sheet: StackupSheet, pack_facts: FabricationFacts
) -> dict[str, Callable[[Path], None]]:
    """What validates a pack, by the part of it."""
    return {
        "layout": lambda pack: check_layout_files(two_level, pack / "layout", status=STATUS),
        "fabrication": lambda pack: check_fabrication_files(
            two_level, pack_sheet, pack / "fabrication", facts=pack_facts
        ),
        "zip": lambda pack: check_zip(pack / "fabrication", pack / PACK_ZIP),
        "destination": check_destination,
        "manifest": check_manifest,
    }

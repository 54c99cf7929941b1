"""`planar make` on every brief of examples/, through the real command, and its files read back by other means.

The reading is independent of planar: raw ezdxf and gdstk, and a bulge formula of its own. The DXF reference defines a
bulge as the tangent of a quarter of the arc's included angle; the rest is circle geometry.
"""

import hashlib
import json
import math
import os
import re
import shutil
import subprocess
import sys
import tomllib
from pathlib import Path

import ezdxf
import gdstk
import numpy as np
import pytest
import skrf
from ezdxf import recover
from shapely.geometry import Polygon

EXAMPLES = Path(__file__).resolve().parents[2] / "examples"
BRIEFS = sorted(path for path in EXAMPLES.glob("*.toml") if not path.name.startswith("refused-"))
REFUSED = sorted(EXAMPLES.glob("refused-*.toml"))
COPPER = {"top": ("COPPER_TOP", 1), "bottom": ("COPPER_BOTTOM", 2)}
"""Level -> DXF layer and GDS layer number, as layers.csv lists them."""
SEGMENT_CHORD_MM = 2e-3
GDS_CHORD_MM = 1e-3
"""Largest distance of an arc from its chord, as the layout's README states."""
GRID_MM = 1e-6

Vertex = tuple[float, float, float]


def run(folder: Path, *arguments: object, expect: int = 0, **environment: str) -> subprocess.CompletedProcess[str]:
    """Run the real command in `folder`."""
    command = [sys.executable, "-m", "planar", *map(str, arguments)]
    env = os.environ | {"OPENBLAS_NUM_THREADS": "1"} | environment
    done = subprocess.run(command, cwd=folder, env=env, capture_output=True, text=True, encoding="utf-8", check=False)
    assert done.returncode == expect, done.stderr
    assert "Traceback" not in done.stderr
    return done


def tree(folder: Path) -> dict[str, bytes]:
    """Content of every file under `folder`, by relative path."""
    return {p.relative_to(folder).as_posix(): p.read_bytes() for p in sorted(folder.rglob("*")) if p.is_file()}


REPEATED = {"hydrogen-feed", "workshop-loop"}
"""Examples made a second time from their brief: two levels, given dimensions. One level is, from the pack's brief."""
ELSEWHERE = {"PYTHONHASHSEED": "7", "TZ": "Pacific/Auckland"}
"""What may not change a byte of a second run."""


def pack_of(name: str) -> pytest.MarkDecorator:
    """The test takes the pack of this example only."""
    return pytest.mark.parametrize("pack", [EXAMPLES / f"{name}.toml"], indirect=True, ids=[name])


@pytest.fixture
def copied(pack: Path, tmp_path: Path) -> Path:
    """A copy of the pack at tmp_path/outputs, to be spoiled, with its brief at tmp_path/brief.toml."""
    shutil.copy(EXAMPLES / f"{pack.name}.toml", tmp_path / "brief.toml")
    return Path(shutil.copytree(pack, tmp_path / "outputs" / pack.name))


def facts(pack: Path) -> dict[str, object]:
    found: dict[str, object] = json.loads((pack / "design.json").read_text(encoding="utf-8"))
    return found


def islands(pack: Path, level: str) -> list[dict[str, object]]:
    copper = facts(pack)["copper"]
    assert isinstance(copper, list)
    return [island for island in copper if island["level"] == level]


def verify_sums(pack: Path) -> None:
    """Every line of SHA256SUMS is the hash of its file, and every other file has a line."""
    lines = (pack / "SHA256SUMS").read_text(encoding="utf-8").splitlines()
    listed = {}
    for line in lines:
        match = re.fullmatch(r"([0-9a-f]{64})  (\S.*)", line)
        assert match is not None, line
        listed[match[2]] = match[1]
    files = {name: hashlib.sha256(data).hexdigest() for name, data in tree(pack).items() if name != "SHA256SUMS"}
    assert listed == files


def test_there_are_examples() -> None:
    assert len(BRIEFS) >= 6
    assert REFUSED


def test_pack_is_complete(pack: Path) -> None:
    levels = {str(island["level"]) for island in facts(pack)["copper"]}  # type: ignore[attr-defined]
    layout = {"board.dxf", "board-segments.dxf", "outline.dxf", "board.gds", "layers.csv", "README.txt"}
    layout |= {f"preview-{level}.svg" for level in levels}
    expected = {"SHA256SUMS", "brief.toml", "design.json", "antenna.s1p", "circuit.cir", "field.json", "report.html"}
    fabrication = {"stackup.json", "stackup.md", "job.gbrjob", "netlist.ipc", "drawing.pdf", "profile.gbr"}
    fabrication |= {"README-cam.txt", "README-build.txt"}
    stackup = json.loads((pack / "fabrication" / "stackup.json").read_text(encoding="utf-8"))
    named = {layer["name"] for layer in stackup["layers_top_to_bottom"]}
    fabrication |= {f"mask-{side}.gbr" for side in ("top", "bottom") if f"mask-{side}" in named}
    for level in levels:
        fabrication |= {f"legend-{level}.gbr"} & {f"{name}.gbr" for name in named}
        fabrication.add(f"copper-{level}.gbr")
    plated = {hole["plated"] for hole in facts(pack)["holes"]}  # type: ignore[attr-defined]
    fabrication |= {f"drill-{'plated' if each else 'unplated'}.xnc" for each in plated}
    expected |= {f"fabrication/{name}" for name in fabrication} | {f"{pack.name}-fabrication.zip"}
    files = tree(pack)
    assert files.keys() == expected | {f"layout/{name}" for name in layout}
    assert all(files.values())
    assert [p.name for p in pack.parent.iterdir()] == [pack.name]


def test_sums_verify(pack: Path) -> None:
    verify_sums(pack)


def test_second_run_gives_the_same_bytes_and_json(pack: Path, tmp_path: Path) -> None:
    """Another working folder, outputs folder, hash seed, time zone and way of writing the brief's path."""
    if pack.name not in REPEATED:
        pytest.skip("made once")
    brief = os.path.relpath(EXAMPLES / f"{pack.name}.toml", tmp_path)
    again = tmp_path / "other place"
    done = run(tmp_path, "make", brief, "--outputs", again, "--json", **ELSEWHERE)
    assert tree(again / pack.name) == tree(pack)
    said = json.loads(done.stdout)
    assert Path(said.pop("folder")) == again / pack.name
    assert said == facts(pack)
    assert said["dimensions_mm"]
    assert done.stderr == ""


@pack_of("greenhouse-telemetry")
def test_brief_of_the_pack_makes_the_pack(pack: Path, tmp_path: Path) -> None:
    """What was asked, with the defaults written out, asks for the same again, to the byte as in any second run."""
    run(tmp_path, "make", pack / "brief.toml", **ELSEWHERE)
    assert tree(tmp_path / "outputs" / pack.name) == tree(pack)


@pytest.mark.parametrize("side", ["top", "bottom"])
def test_readme_shows_the_copper_of_today(pack: Path, side: str) -> None:
    """Change detector: the pictures README shows are those the worked brief draws."""
    if pack.name != "orchard-gateway":
        pytest.skip("README shows another board")
    shown = EXAMPLES / "pictures" / f"orchard-gateway-{side}.svg"
    assert shown.read_bytes() == (pack / "layout" / f"preview-{side}.svg").read_bytes()


def test_table_shows_the_dimensions(pack: Path) -> None:
    text = (pack.parents[1] / "printed.txt").read_text(encoding="utf-8")
    for name, value in facts(pack)["dimensions_mm"].items():  # type: ignore[attr-defined]
        assert re.search(rf"^{name} +{value:.3f} ", text, re.MULTILINE), name
    assert str(facts(pack)["status"])[:60] in text


def angle(bulge: float) -> float:
    """Angle of an arc in rad, positive when it runs counter-clockwise."""
    return 4.0 * math.atan(bulge)


def arcs(vertices: list[Vertex]) -> list[tuple[float, float, float]]:
    """Chord, radius and angle of every edge that is an arc."""
    found = []
    for (x0, y0, bulge), (x1, y1, _) in zip(vertices, vertices[1:] + vertices[:1], strict=True):
        if bulge:
            chord = math.hypot(x1 - x0, y1 - y0)
            found.append((chord, 0.5 * chord / math.sin(0.5 * abs(angle(bulge))), angle(bulge)))
    return found


def signed_area(vertices: list[Vertex]) -> float:
    """Shoelace area and the circular segments between chords and arcs, summed without loss."""
    (x, y, _), pairs = vertices[0], zip(vertices, vertices[1:] + vertices[:1], strict=True)
    shoelace = [0.5 * ((x0 - x) * (y1 - y) - (x1 - x) * (y0 - y)) for (x0, y0, _), (x1, y1, _) in pairs]
    segments = [0.5 * radius**2 * (turn - math.sin(turn)) for _, radius, turn in arcs(vertices)]
    return math.fsum(shoelace + segments)


def flattened(vertices: list[Vertex], chord_error: float = 1e-4) -> list[tuple[float, float]]:
    """Corners of a polygon whose chords lie within `chord_error` mm of the arcs."""
    points = []
    for (x0, y0, bulge), (x1, y1, _) in zip(vertices, vertices[1:] + vertices[:1], strict=True):
        points.append((x0, y0))
        if not bulge:
            continue
        # the centre lies on the perpendicular through the chord's middle, at (1 - b^2) / 4b chords to its left
        off = (1.0 - bulge**2) / (4.0 * bulge)
        cx, cy = 0.5 * (x0 + x1) - off * (y1 - y0), 0.5 * (y0 + y1) + off * (x1 - x0)
        radius, start, turn = math.hypot(x0 - cx, y0 - cy), math.atan2(y0 - cy, x0 - cx), angle(bulge)
        count = math.ceil(abs(turn) / (2.0 * math.acos(1.0 - min(chord_error / radius, 1.0))))
        steps = (start + turn * i / count for i in range(1, count))
        points += [(cx + radius * math.cos(a), cy + radius * math.sin(a)) for a in steps]
    return points


def dxf_outlines(path: Path) -> dict[str, list[list[Vertex]]]:
    """Vertices (mm, mm, bulge) of every closed polyline by layer."""
    found: dict[str, list[list[Vertex]]] = {}
    for entity in ezdxf.readfile(path).modelspace().query("LWPOLYLINE"):
        assert entity.closed  # type: ignore[attr-defined]
        rows = [(x, y, b) for x, y, b in entity.get_points("xyb")]  # type: ignore[attr-defined]
        found.setdefault(entity.dxf.layer, []).append(rows)
    return found


def gds_outlines(path: Path) -> dict[int, list[list[Vertex]]]:
    """Vertices (mm, mm, 0) of every polygon by layer number."""
    library = gdstk.read_gds(path)
    (cell,) = library.top_level()
    found: dict[int, list[list[Vertex]]] = {}
    for polygon in cell.polygons:
        scale = library.unit / 1e-3
        rows = [(float(x) * scale, float(y) * scale, 0.0) for x, y in polygon.points]
        found.setdefault(polygon.layer, []).append(rows)
    return found


def copper(pack: Path, level: str, file: str) -> list[list[Vertex]]:
    """Outlines of the copper of a level in one of the three exchange files."""
    path, (layer, number) = pack / "layout" / file, COPPER[level]
    return (gds_outlines(path).get(number, [])) if file.endswith(".gds") else dxf_outlines(path).get(layer, [])


def test_formulas_of_this_test() -> None:
    """Exact: two bulges of 1 make a circle of radius 1; a quarter circle has a bulge of tan(pi/8)."""
    disc = [(-1.0, 0.0, 1.0), (1.0, 0.0, 1.0)]
    assert signed_area(disc) == pytest.approx(math.pi, rel=1e-14)
    assert Polygon(flattened(disc)).area == pytest.approx(math.pi, abs=2e-4 * math.pi)
    quarter = [(1.0, 0.0, math.tan(math.pi / 8.0)), (0.0, 1.0, 0.0), (0.0, 0.0, 0.0)]
    assert signed_area(quarter) == pytest.approx(math.pi / 4.0, rel=1e-14)
    assert signed_area([(x, y, 0.0) for x, y in flattened(quarter)]) == pytest.approx(math.pi / 4.0, abs=2e-4)
    notch = [(1.0, 0.0, -math.tan(math.pi / 8.0)), (0.0, 1.0, 0.0), (0.0, 0.0, 0.0)]
    assert signed_area(notch) == pytest.approx(1.0 - math.pi / 4.0, rel=1e-13)


@pytest.mark.parametrize("level", COPPER)
def test_arc_areas_are_exact(pack: Path, level: str) -> None:
    expected = sorted(float(island["area_mm2"]) for island in islands(pack, level))  # type: ignore[arg-type]
    areas = sorted(abs(signed_area(outline)) for outline in copper(pack, level, "board.dxf"))
    assert len(areas) == len(expected)
    assert areas == pytest.approx(expected, rel=1e-9, abs=0.0)


@pytest.mark.parametrize("level", COPPER)
@pytest.mark.parametrize(("file", "chord"), [("board-segments.dxf", SEGMENT_CHORD_MM), ("board.gds", GDS_CHORD_MM)])
def test_chords_keep_their_budget(pack: Path, level: str, file: str, chord: float) -> None:
    """A chord takes at most 2/3 of its sagitta times its length; rounding at most a grid step along the perimeter."""
    true = sorted(copper(pack, level, "board.dxf"), key=signed_area)
    chained = sorted(copper(pack, level, file), key=signed_area)
    assert len(chained) == len(true) == len(islands(pack, level))
    for outline, chain in zip(true, chained, strict=True):
        assert not arcs(chain)
        arc_length = math.fsum(radius * abs(turn) for _, radius, turn in arcs(outline))
        fine, coarse = Polygon(flattened(outline)), Polygon([(x, y) for x, y, _ in chain])
        budget = chord * arc_length + GRID_MM * fine.length
        assert abs(abs(signed_area(chain)) - abs(signed_area(outline))) <= budget
        # the comparison polygon has chords of its own, of 0.1 um
        assert fine.symmetric_difference(coarse).area <= budget + 1e-4 * arc_length
        assert fine.exterior.hausdorff_distance(coarse.exterior) <= chord + 1e-4 + 2 * GRID_MM


@pytest.mark.parametrize("file", ["board.dxf", "board-segments.dxf", "board.gds"])
def test_outlines_are_sound(pack: Path, file: str) -> None:
    """No zero-length edge (less than a grid step), no outline that crosses itself, no two islands overlapping."""
    path = pack / "layout" / file
    found = gds_outlines(path) if file.endswith(".gds") else dxf_outlines(path)
    assert found
    for layer, outlines in found.items():
        for outline in outlines:
            edges = [math.dist(a[:2], b[:2]) for a, b in zip(outline, outline[1:] + outline[:1], strict=True)]
            assert min(edges) >= 0.999 * GRID_MM, layer
            assert Polygon(flattened(outline)).is_valid, layer
    for level in COPPER:
        shapes = [Polygon(flattened(outline)) for outline in copper(pack, level, file)]
        assert all(not a.intersects(b) for i, a in enumerate(shapes) for b in shapes[:i])


@pytest.mark.parametrize("file", ["board.dxf", "board-segments.dxf"])
def test_dxf_is_clean(pack: Path, file: str) -> None:
    """Neither errors nor repairs in the audit, also of the reader that expects damage; plain entities in mm."""
    document, auditor = recover.readfile(pack / "layout" / file)
    assert not auditor.errors
    assert not auditor.fixes
    assert not document.audit().errors
    assert document.header["$INSUNITS"] == 4
    assert document.header["$MEASUREMENT"] == 1
    kinds = {entity.dxftype() for entity in document.modelspace()}
    assert kinds <= {"LWPOLYLINE", "CIRCLE", "TEXT"}
    by_layer = dxf_outlines(pack / "layout" / file)
    for level, (layer, _) in COPPER.items():
        assert len(by_layer.get(layer, [])) == len(islands(pack, level))


def test_arc_dxf_keeps_arcs(pack: Path) -> None:
    outlines = dxf_outlines(pack / "layout" / "board.dxf")
    assert any(arcs(outline) for layer in ("COPPER_TOP", "COPPER_BOTTOM") for outline in outlines.get(layer, []))


def test_gds_has_one_cell_of_whole_islands(pack: Path) -> None:
    library = gdstk.read_gds(pack / "layout" / "board.gds")
    (cell,) = library.cells
    assert library.precision == pytest.approx(1e-9, rel=1e-9)
    assert not cell.references
    assert not cell.paths
    for level, (_, number) in COPPER.items():
        assert sum(polygon.layer == number for polygon in cell.polygons) == len(islands(pack, level))


@pytest.mark.parametrize("file", ["board.dxf", "board-segments.dxf", "board.gds"])
def test_board_has_the_size_stated(pack: Path, file: str) -> None:
    """A file off by 25.4 or 1000, or turned, would show here."""
    path = pack / "layout" / file
    (edge,) = gds_outlines(path)[31] if file.endswith(".gds") else dxf_outlines(path)["OUTLINE"]
    x0, y0, x1, y1 = Polygon(flattened(edge)).bounds
    assert [x1 - x0, y1 - y0] == pytest.approx(facts(pack)["board_mm"], abs=2 * SEGMENT_CHORD_MM)


@pytest.mark.parametrize("brief", REFUSED, ids=lambda path: path.stem)
def test_refused_with_reason_and_a_change_that_works(brief: Path, tmp_path: Path) -> None:
    done = run(tmp_path, "make", brief, expect=1)
    assert done.stdout == ""
    assert done.stderr.startswith("refused: ")
    assert str(brief) in done.stderr
    assert "size limit" in done.stderr
    assert "450 mm x 600 mm" in done.stderr
    assert "Nearest changes:" in done.stderr
    (page,) = (path for path in tmp_path.rglob("*") if path.is_file() and path.name != "SHA256SUMS")
    assert done.stderr.rstrip().endswith(f"as a page: {page.relative_to(tmp_path)}")
    assert "450 mm x 600 mm" in page.read_text(encoding="utf-8")
    # the change is tried: a promise that does not hold is worse than none
    nearest = re.search(r"can be made with its band moved up to start at ([\d.]+) MHz", done.stderr)
    assert nearest is not None
    text, low = brief.read_text(encoding="utf-8"), float(nearest[1])
    changed = tmp_path / "changed.toml"
    changed.write_text(
        text.replace('["136.5 MHz", "138 MHz"]', f'["{low} MHz", "{low * 138 / 136.5:.6f} MHz"]'), encoding="utf-8"
    )
    assert changed.read_text(encoding="utf-8") != text
    again = run(tmp_path, "size", changed)
    assert "board" in again.stdout


def edited(path: Path, *changes: tuple[str, str]) -> None:
    text = path.read_text(encoding="utf-8")
    for old, new in changes:
        assert old in text
        text = text.replace(old, new)
    path.write_text(text, encoding="utf-8")


@pytest.fixture
def brief(tmp_path: Path) -> Path:
    """A copy of an example with two copper levels, to be edited."""
    return Path(shutil.copy(EXAMPLES / "orchard-gateway.toml", tmp_path / "orchard.toml"))


@pack_of("orchard-gateway")
def test_run_over_a_pack_replaces_it(copied: Path, tmp_path: Path) -> None:
    """The second design has one level: nothing of the first, such as its bottom preview, is left."""
    assert (copied / "layout" / "preview-bottom.svg").exists()
    another = Path(shutil.copy(EXAMPLES / "workshop-loop.toml", tmp_path))
    edited(another, ('"workshop-loop"', '"orchard-gateway"'))
    run(tmp_path, "make", another)
    verify_sums(copied)
    assert facts(copied)["family"] == "plain"
    assert not (copied / "layout" / "preview-bottom.svg").exists()
    assert [p.name for p in copied.parent.iterdir()] == [copied.name]


@pack_of("workshop-loop")
def test_refused_run_leaves_the_pack(copied: Path, tmp_path: Path) -> None:
    """The page that says why goes into a folder of its own."""
    before = tree(copied)
    edited(tmp_path / "brief.toml", ("[board]\n", '[board]\nsize_limit = ["20 mm", "20 mm"]\n'))
    run(tmp_path, "make", "brief.toml", expect=1)
    assert tree(copied) == before


@pack_of("workshop-loop")
@pytest.mark.parametrize("theirs", ["notes.txt", "layout/board.dxf"])
def test_files_of_others_are_left_alone(copied: Path, tmp_path: Path, theirs: str) -> None:
    """A file added to a pack, and one of ours that somebody has edited since."""
    (copied / theirs).write_text("measured on Tuesday", encoding="utf-8")
    before = tree(copied.parent)
    message = run(tmp_path, "make", "brief.toml", expect=1).stderr
    assert Path(theirs).name in message
    assert "move them away" in message
    assert tree(copied.parent) == before


@pytest.mark.parametrize("where", ["outputs", "outputs/orchard-gateway"])
def test_destination_that_is_no_folder(brief: Path, tmp_path: Path, where: str) -> None:
    path = tmp_path / where
    path.parent.mkdir(exist_ok=True)
    path.write_text("a file", encoding="utf-8")
    before = tree(tmp_path)
    assert str(path) in run(tmp_path, "make", brief, expect=1).stderr
    assert tree(tmp_path) == before


def test_folder_of_somebody_else_is_left_alone(brief: Path, tmp_path: Path) -> None:
    folder = tmp_path / "outputs" / "orchard-gateway"
    folder.mkdir(parents=True)
    (folder / "photo.jpg").write_bytes(b"\xff\xd8")
    assert "not ours to replace" in run(tmp_path, "make", brief, expect=1).stderr
    assert tree(tmp_path / "outputs") == {"orchard-gateway/photo.jpg": b"\xff\xd8"}


@pytest.mark.skipif(not Path("/proc/self").is_dir(), reason="needs a file system nobody can write to")
def test_outputs_nobody_can_write_to(brief: Path, tmp_path: Path) -> None:
    """/proc takes no folders, not even from root."""
    message = run(tmp_path, "make", brief, "--outputs", "/proc/planar", expect=1).stderr
    assert "cannot write" in message
    assert "/proc" in message


def test_names_with_letters_and_spaces_of_any_language(tmp_path: Path) -> None:
    name = "Gewächshaus Süd Ωμέγα 2"
    brief = tmp_path / "Mein Entwurf ü.toml"
    shutil.copy(EXAMPLES / "workshop-loop.toml", brief)
    edited(brief, ('"workshop-loop"', f'"{name}"'))
    run(tmp_path, "make", brief.name, "--outputs", "fertige Pläne", PYTHONUTF8="1")
    pack = tmp_path / "fertige Pläne" / name
    verify_sums(pack)
    assert facts(pack)["name"] == name
    assert len(copper(pack, "top", "board.gds")) == len(islands(pack, "top"))


@pytest.mark.parametrize("as_json", [True, False])
def test_terminal_without_these_letters(tmp_path: Path, as_json: bool) -> None:
    """A name the output encoding has no letters for: no traceback behind a written pack, JSON stays JSON."""
    brief = tmp_path / "b.toml"
    shutil.copy(EXAMPLES / "workshop-loop.toml", brief)
    edited(brief, ('"workshop-loop"', '"петля"'))
    done = run(tmp_path, "make", brief, *(["--json"] if as_json else []), PYTHONIOENCODING="ascii", PYTHONUTF8="0")
    assert (tmp_path / "outputs" / "петля" / "SHA256SUMS").exists()
    if as_json:
        assert json.loads(done.stdout)["name"] == "петля"


def test_prediction_meets_the_brief(pack: Path) -> None:
    """What the tool is for: every example's copper, as solved, keeps the match its brief asks over its band."""
    said, brief = facts(pack), tomllib.loads((pack / "brief.toml").read_text(encoding="utf-8"))
    predicted, target = said["prediction"], brief["target"]
    assert predicted["worst_reflection_db"] <= float(target["match"].split()[0])
    assert 0.8 < predicted["power_balance"] <= 1.01  # what lacks to 1 is guided in the slab
    assert predicted["convergence"] < 0.075  # half of what is refused
    if target["polarisation"] == "linear":
        assert predicted["sense"] == "linear"
    else:
        assert target["polarisation"] == f"circular-{predicted['sense']}"
        assert predicted["worst_axial_ratio_db"] < 3.0


def test_touchstone_file_is_the_prediction(pack: Path) -> None:
    """Read by scikit-rf; reaches from nearly DC to 2.2 times the centre, and is passive."""
    network, said = skrf.Network(str(pack / "antenna.s1p")), facts(pack)
    low, high = said["band_hz"]
    centre = 0.5 * (low + high)
    assert network.f[0] < 0.06 * centre
    assert network.f[-1] == pytest.approx(2.2 * centre, rel=1e-6)
    assert np.abs(network.s).max() <= 1.0
    here = network.z[np.argmin(np.abs(network.f - centre)), 0, 0]
    assert abs(here - complex(*said["prediction"]["input_impedance_ohm"])) < 0.01 * abs(here)


def test_circuit_is_within_a_fiftieth_of_the_solver(pack: Path) -> None:
    """Asked: reflection within 0.02 over +-20 %, every element positive; the values are those of the SPICE file."""
    circuit = facts(pack)["circuit"]
    assert circuit["worst_reflection_error"] < 0.02
    for mode in circuit["modes"]:
        assert min(mode["inductance_h"], mode["capacitance_f"]) > 0.0
        assert max(mode["resistance_ohm"], mode["resistance_across_inductance_ohm"] or 0.0) > 0.0
    assert circuit["static_capacitance_f"] >= 0.0
    text = (pack / "circuit.cir").read_text(encoding="ascii")
    assert text.count(".subckt") == 1
    assert text.rstrip().splitlines()[-1].startswith(".ends")


def test_solving_the_design_file_gives_the_prediction(pack: Path, tmp_path: Path) -> None:
    """`planar solve design.json` draws the copper again and solves it: the same impedance at the centre of the band."""
    said = facts(pack)
    centre = f"{0.5 * sum(said['band_hz']) / 1e6} MHz"
    solved = json.loads(run(tmp_path, "solve", pack / "design.json", "--at", centre, "--json").stdout)
    (point,) = solved["points"]
    there, here = (complex(*each["input_impedance_ohm"]) for each in (point, said["prediction"]))
    assert abs(there - here) < 0.01 * abs(here)


@pack_of("workshop-loop")
def test_design_file_edited_by_hand_is_refused(copied: Path, tmp_path: Path) -> None:
    path = copied / "design.json"
    edited(path, ('"loop_width": 45.0', '"loop_width": 46.0'))
    message = run(tmp_path, "solve", path, expect=1).stderr
    assert "hash" in message
    assert "[antenna.dimensions]" in message

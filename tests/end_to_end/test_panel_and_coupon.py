"""`planar panel` and `planar coupon` through the command, on a design that no field solution was needed for.

Authority: the contract of the commands; counts by hand; scikit-rf makes the measurement of the coupon.
"""

from __future__ import annotations

import json
import shutil
from pathlib import Path

import numpy as np
import pytest
import skrf

from planar.brief import read_brief
from planar.design.design import make_design
from planar.design.design_file import design_facts
from planar.handoff import packed, read_manifest
from planar.library import Library
from tests.end_to_end.bench_loop import run

EXAMPLES = Path(__file__).parents[2] / "examples"


@pytest.fixture(scope="module")
def pack(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """A pack that holds the design alone, its dimensions from formulas."""
    library = Library.open()
    path = EXAMPLES / "orchard-gateway.toml"
    folder = tmp_path_factory.mktemp("packs") / "orchard-gateway"
    design = make_design(read_brief(path, library), library, str(path), oversize=0.2)
    with packed(folder) as fresh:
        (fresh / "design.json").write_text(json.dumps(design_facts(design)), encoding="utf-8")
    return folder


def copied(pack: Path, tmp_path: Path) -> Path:
    return Path(shutil.copytree(pack, tmp_path / pack.name))


def test_a_panel_joins_the_pack_whole(pack: Path, tmp_path: Path) -> None:
    own = copied(pack, tmp_path)
    result = run("panel", own, "--count", "2x1", "--json")
    assert result.exit_code == 0, result.output
    told = json.loads(result.stdout)
    assert (told["boards"], told["places"], told["separation"]) == (2, ["A1", "B1"], "tabs")
    assert Path(told["folder"]) == own / "panel"
    listed = read_manifest(own)
    assert {"design.json", "panel/panel.json", "panel/fabrication/array.gbr", "panel/fabrication/drawing.pdf"} <= set(
        listed
    )
    width, height = told["panel_mm"]
    board_width, board_height = told["board_mm"]
    rails, slots = 2 * 7.0, 3 * 2.0  # by hand: two rails, a slot beside each board and between the two
    assert width == pytest.approx(2 * board_width + rails + slots)
    assert height == pytest.approx(board_height + rails + 2 * 2.0)


def test_a_panel_again_is_the_same_to_the_byte_and_replaces_the_first(pack: Path, tmp_path: Path) -> None:
    own = copied(pack, tmp_path)
    before = run("panel", own, "--count", "1x2")
    first = read_manifest(own)
    assert before.exit_code == 0
    assert run("panel", own / "design.json", "--count", "1x2").exit_code == 0
    assert read_manifest(own) == first


@pytest.mark.parametrize(
    ("arguments", "code", "said"),
    [
        (("--count", "2 by 3"), 1, "columns and rows"),
        (("--count", "40x40"), 1, "at most"),
        (("--count", "1x1", "--separate", "score"), 1, "tabs"),
        (("--count", "2x2", "--fit"), 2, "choose one"),
    ],
)
def test_panels_that_cannot_be_are_refused_and_nothing_is_written(
    arguments: tuple[str, ...], code: int, said: str, pack: Path, tmp_path: Path
) -> None:
    own = copied(pack, tmp_path)
    before = read_manifest(own)
    result = run("panel", own, *arguments)
    assert (result.exit_code, said in result.output) == (code, True), result.output
    assert read_manifest(own) == before
    assert not (own / "panel").exists()


def test_a_file_that_is_no_design_is_refused(tmp_path: Path) -> None:
    for command in ("panel", "coupon", "report"):
        result = run(command, tmp_path)
        assert result.exit_code == 1
        assert "design.json" in result.output


def test_a_coupon_comes_with_its_sheet_and_reads_its_measurement(pack: Path, tmp_path: Path) -> None:
    own = copied(pack, tmp_path)
    result = run("coupon", own, "--json")
    assert result.exit_code == 0, result.output
    told = json.loads(result.stdout)
    assert "formula-sheet.md" in {path.name for path in (own / "coupon").iterdir()}
    short, long = (told["dimensions_mm"][f"{name}_length"] * 1e-3 for name in ("short", "long"))
    width = told["dimensions_mm"]["line_width"] * 1e-3
    frequency = skrf.Frequency(0.5, 3.0, 251, "GHz")
    line = skrf.media.MLine(
        frequency, w=width, h=1.6e-3, t=55e-6, ep_r=4.5, tand=0.02, rho=1.72e-8, z0_port=50.0,
        diel="djordjevicsvensson",
        f_epr_tand=866.5e6,
    )  # fmt: skip
    files = []
    for name, length in (("short", short), ("long", long)):
        path = tmp_path / f"{name}.s2p"
        line.line(length, "m").write_touchstone(str(path.with_suffix("")))
        files += ["--measured", path]
    found = json.loads(run("coupon", own, *files, "--thickness", "1.6 mm", "--json").stdout)
    assert found["eps_r"] == pytest.approx(4.5, rel=0.01)  # the goal: within 1 %
    assert abs(found["eps_r"] - 4.5) < found["eps_r_uncertainty"]
    assert found["library_eps_r"] == pytest.approx(4.3, abs=0.05)
    assert np.isclose(found["thickness_mm"], 1.6)

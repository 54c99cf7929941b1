"""`planar solve` through the real command: JSON, table, Touchstone, wrong options.

Authority: the demanded fields of the JSON; scikit-rf as independent reader of the Touchstone file; a plain
loop is its own bare loop, so gap and input impedance of one must agree.
"""

from __future__ import annotations

import json
from pathlib import Path

import pytest
import skrf
from click.testing import CliRunner, Result

from planar.cli import main

BRIEF = """\
name = "bench-loop"
[target]
band = ["1.8 GHz", "1.9 GHz"]
impedance = "110 ohm"
[antenna]
family = "plain"
[antenna.dimensions]
loop_width = "46 mm"
trace_width = "{trace}"
gap = "1 mm"
pad_length = "2 mm"
[board]
laminate = {{ eps_r = 3.5, tan_d = 0.0025, at = "2.5 GHz" }}
thickness = "1 mm"
mask = "none"
"""


def solve(folder: Path, *options: str, trace: str = "2 mm") -> Result:
    brief = folder / "bench-loop.toml"
    brief.write_text(BRIEF.format(trace=trace), encoding="utf-8")
    return CliRunner().invoke(main, ["solve", str(brief), *options])


@pytest.fixture(scope="module")
def solved(tmp_path_factory: pytest.TempPathFactory) -> tuple[dict, Path]:
    folder = tmp_path_factory.mktemp("solve")
    touchstone = folder / "bench.s1p"
    sweep = ("--sweep", "1.7 GHz", "2.0 GHz", "31", "--s1p", str(touchstone))
    done = solve(folder, "--json", "--at", "1.85 GHz", *sweep)
    assert done.exit_code == 0, done.output
    return json.loads(done.stdout), touchstone


def test_json_has_the_demanded_fields(solved: tuple[dict, Path]) -> None:
    facts, _ = solved
    assert {"unknowns", "convergence", "power_balance", "points", "sweep"} <= set(facts)
    (point,) = facts["points"]
    demanded = {"frequency_hz", "gap_impedance_ohm", "input_impedance_ohm", "reflection_db", "gain_dbi", "efficiency"}
    assert demanded | {"axial_ratio_db", "sense"} <= set(point)
    assert point["frequency_hz"] == 1.85e9
    assert 0.0 < facts["convergence"] < 0.05


def test_plain_loop_is_its_own_bare_loop(solved: tuple[dict, Path]) -> None:
    (point,) = solved[0]["points"]
    gap, port = complex(*point["gap_impedance_ohm"]), complex(*point["input_impedance_ohm"])
    assert abs(gap - port) < 0.01 * abs(port)


def test_loop_of_one_wavelength_behaves_like_one(solved: tuple[dict, Path]) -> None:
    """A one-wavelength loop is about 1 dB over a half-wave dipole's 2.15 dBi (fact of the trade, no source)."""
    (point,) = solved[0]["points"]
    assert 2.0 < point["gain_dbi"] < 3.6
    assert point["sense"] == "linear"
    assert point["axial_ratio_db"] is None
    assert 0.95 < point["efficiency"] < 1.0


def test_touchstone_says_what_the_json_says(solved: tuple[dict, Path]) -> None:
    facts, path = solved
    network = skrf.Network(str(path))
    assert network.f.tolist() == pytest.approx(facts["sweep"]["frequency_hz"])
    assert network.z0[0, 0].real == facts["reference_ohm"] == 110.0
    z = [complex(*pair) for pair in facts["sweep"]["input_impedance_ohm"]]
    assert network.z[:, 0, 0] == pytest.approx(z, rel=1e-9)


def test_sweep_meets_the_point(solved: tuple[dict, Path]) -> None:
    facts, _ = solved
    here = facts["sweep"]["frequency_hz"].index(1.85e9)
    swept, point = complex(*facts["sweep"]["input_impedance_ohm"][here]), facts["points"][0]["input_impedance_ohm"]
    assert abs(swept - complex(*point)) < 2e-3 * abs(swept)


def test_table_names_what_limits_the_numbers(tmp_path: Path) -> None:
    done = solve(tmp_path, "--at", "1.85 GHz")
    assert done.exit_code == 0
    assert "1.85 GHz" in done.stdout
    assert "unknowns" in done.stdout
    assert "from a coarser mesh" in done.stdout
    assert "guided in the slab" in done.stdout


@pytest.mark.parametrize(
    ("options", "words"),
    [
        (("--at", "1.85"), ("--at = 1.85", "the unit is missing")),
        (("--at", "5 THz"), ("--at = 5 THz", "from 1 MHz to 100 GHz")),
        (("--at", "1 GHz", "--at", "9 GHz"), ("--at = 1 GHz, 9 GHz", "within a factor of 8")),
        (("--sweep", "2 GHz", "1.8 GHz", "5"), ("--sweep = 2 GHz 1.8 GHz", "the lower frequency comes first")),
        (("--sweep", "1.8 GHz", "2 GHz", "1"), ("--sweep = 1", "2 to 10001 points")),
    ],
)
def test_wrong_options_are_refused(tmp_path: Path, options: tuple[str, ...], words: tuple[str, ...]) -> None:
    done = solve(tmp_path, *options)
    assert done.exit_code == 1
    assert all(word in done.stderr for word in words), done.stderr


def test_touchstone_needs_a_sweep(tmp_path: Path) -> None:
    done = solve(tmp_path, "--at", "1.85 GHz", "--s1p", str(tmp_path / "x.s1p"))
    assert done.exit_code == 1
    assert "--sweep LOW HIGH N" in done.stderr
    assert not (tmp_path / "x.s1p").exists()


def test_loop_of_many_wavelengths_is_refused(tmp_path: Path) -> None:
    done = solve(tmp_path, "--at", "9 GHz")
    assert done.exit_code == 1
    assert "wavelengths round, at most 4" in done.stderr

"""`planar lines`, `planar library` and `planar new` through the command line.

Commands run in this process, for speed, one of each as a user would. Numbers are checked by formulas written here.
"""

import csv
import io
import json
import math
import re
import subprocess
import sys
import xml.etree.ElementTree as ET
from pathlib import Path
from typing import Any

import pytest
from click.testing import CliRunner, Result

from planar.brief import read_brief
from planar.cli import main
from planar.library import Library

FIELDS = [
    "kind",
    "laminate",
    "height_mm",
    "frequency_ghz",
    "impedance_ohm",
    "width_mm",
    "gap_mm",
    "eps_eff",
    "quarter_wave_mm",
    "loss_db_per_m",
    "ohm_per_25_um_etch",
    "ohm_per_10_percent_height",
    "ohm_per_1_percent_eps_r",
    "makeable",
    "note",
]
TEMPLATES = Path(__file__).resolve().parents[2] / "templates"
KINDS = ("laminates", "fabs", "connectors", "covers", "families")
SPEED_OF_LIGHT_MM_GHZ = 299.792458
"""Exact (SI)."""


def planar(*arguments: object, expect: int = 0) -> Result:
    result = CliRunner().invoke(main, [str(argument) for argument in arguments])
    assert result.exit_code == expect, result.output
    assert result.exception is None or isinstance(result.exception, SystemExit)
    return result


def rows_of(*arguments: object) -> list[dict[str, Any]]:
    found: list[dict[str, Any]] = json.loads(planar("lines", *arguments, "--json").stdout)
    return found


def hammerstad_width(impedance: float, eps_r: float) -> float:
    """Width over height of a thin microstrip (Hammerstad 1975; Pozar, 3rd ed., eq. 3.197, from memory)."""
    a = impedance / 60 * math.sqrt((eps_r + 1) / 2) + (eps_r - 1) / (eps_r + 1) * (0.23 + 0.11 / eps_r)
    b = 377 * math.pi / (2 * impedance * math.sqrt(eps_r))
    tail = (eps_r - 1) / (2 * eps_r) * (math.log(b - 1) + 0.39 - 0.61 / eps_r)
    wide = 2 / math.pi * (b - 1 - math.log(2 * b - 1) + tail)
    narrow = 8 * math.exp(a) / (math.exp(2 * a) - 2)
    return narrow if narrow < 2 else wide


def test_free_values_as_a_user_gives_them(tmp_path: Path) -> None:
    """Pozar, 3rd ed., example 3.7 (from memory; recomputed above): 50 ohm on 1.27 mm of 2.20 at 2.5 GHz, w/d 3.081.

    Within 0.5 %: the book's design formula is good to about that, and leaves out dispersion.
    """
    assert hammerstad_width(50.0, 2.20) == pytest.approx(3.081, abs=5e-4)
    command = [sys.executable, "-m", "planar", "lines", "--kind", "microstrip", "--eps-r", "2.2", "--height", "1.27 mm"]
    command += ["--frequency", "2.5 GHz", "--impedance", "50 ohm", "--json"]
    done = subprocess.run(command, cwd=tmp_path, capture_output=True, text=True, encoding="utf-8", check=True)
    assert done.stderr == ""
    (row,) = json.loads(done.stdout)
    assert row["width_mm"] / 1.27 == pytest.approx(3.081, rel=5e-3)
    assert row["width_mm"] / 1.27 == pytest.approx(hammerstad_width(50.0, 2.20), rel=5e-3)
    assert row["quarter_wave_mm"] == pytest.approx(21.9, rel=6e-3)  # the book's 2.19 cm
    assert (row["kind"], row["laminate"], row["height_mm"]) == ("microstrip", "given", pytest.approx(1.27))
    assert (row["frequency_ghz"], row["impedance_ohm"], row["gap_mm"]) == (2.5, 50.0, None)
    assert list(tmp_path.iterdir()) == []


def test_fields_and_their_units() -> None:
    """Each relation holds only if both fields are in the units of their names."""
    rows = rows_of("--height", "1.6 mm", "--height", "0.8 mm", "--frequency", "868 MHz", "--copper", "0 um")
    assert [list(row) for row in rows] == [FIELDS] * 6
    assert [(row["height_mm"], row["impedance_ohm"]) for row in rows] == [
        (pytest.approx(height), ohm) for height in (1.6, 0.8) for ohm in (50.0, 75.0, 100.0)
    ]
    for row in rows:
        wave = SPEED_OF_LIGHT_MM_GHZ / 0.868 / math.sqrt(row["eps_eff"])
        assert row["quarter_wave_mm"] == pytest.approx(wave / 4, rel=1e-9)
        # thin copper on the class's 4.3; the formula is good to 1 %
        assert row["width_mm"] / row["height_mm"] == pytest.approx(
            hammerstad_width(row["impedance_ohm"], 4.3), rel=0.01
        )
        # tan d 0.02 with most of the field in the slab: 8.686 pi tan d eps_r/eps_eff q sqrt(eps_eff)/wavelength,
        # q = (eps_eff - 1)/(eps_r - 1) (Pozar eq. 3.198, from memory); copper adds some
        filling = 4.3 * (row["eps_eff"] - 1) / (row["eps_eff"] * 3.3)
        slab = 8.686 * math.pi * 0.02 * filling * math.sqrt(row["eps_eff"]) / (SPEED_OF_LIGHT_MM_GHZ / 0.868 / 1e3)
        assert slab < row["loss_db_per_m"] < 2 * slab


def test_sensitivities_are_differences_of_rows() -> None:
    """A height 2 % and a permittivity 1 % off, asked for as rows of their own: the width that gives 100 ohm there
    differs by as much as the slope over the width slope says (first order, hence 15 %)."""
    shared = ("--impedance", "100 ohm", "--copper", "35 um")
    middle, lower = rows_of(*shared, "--impedance", "99 ohm", "--eps-r", "4", "--height", "1 mm")
    (thicker,) = rows_of(*shared, "--eps-r", "4", "--height", "1.02 mm")
    (denser,) = rows_of(*shared, "--eps-r", "4.04", "--height", "1 mm")
    ohm_per_mm = -1.0 / (lower["width_mm"] - middle["width_mm"])
    assert ohm_per_mm < 0
    by_height = -(thicker["width_mm"] - middle["width_mm"]) * ohm_per_mm
    assert by_height == pytest.approx(0.2 * middle["ohm_per_10_percent_height"], rel=0.15)
    by_permittivity = -(denser["width_mm"] - middle["width_mm"]) * ohm_per_mm
    assert by_permittivity == pytest.approx(middle["ohm_per_1_percent_eps_r"], rel=0.15)
    # etching takes 25 um off the width, and nothing else changes
    assert middle["ohm_per_25_um_etch"] == pytest.approx(-0.025 * ohm_per_mm, rel=0.15)


def test_csv_says_what_json_says() -> None:
    asked = ("--height", "1.6 mm", "--impedance", "50 ohm", "--impedance", "400 ohm")
    reader = csv.DictReader(io.StringIO(planar("lines", *asked, "--csv").stdout))
    rows = list(reader)
    assert reader.fieldnames == FIELDS
    for row, expected in zip(rows, rows_of(*asked), strict=True):
        assert row == {name: "" if value is None else str(value) for name, value in expected.items()}


def test_table_is_for_reading() -> None:
    """Default: the three usual impedances over every thickness fr4-general is sold in; a column of gaps is left out."""
    text = planar("lines").stdout
    sold = re.findall(r"^microstrip +fr4-general +([\d.]+) +1 +(\d+) ", text, re.MULTILINE)
    assert {ohm for _, ohm in sold} == {"50", "75", "100"}
    thicknesses = {float(height) for height, _ in sold}
    assert {0.2, 0.8, 1.6} <= thicknesses
    assert len(sold) == 3 * len(thicknesses)
    assert "gap" not in text.splitlines()[0]
    assert max(len(line) for line in text.splitlines()) <= 160
    strips = ("--kind", "coplanar-strips", "--gap", "0.5 mm", "--height", "1.6 mm", "--impedance", "100 ohm")
    assert "gap" in planar("lines", *strips).stdout.splitlines()[0]


def test_rows_that_cannot_be_had_stay_with_the_reason() -> None:
    asked = ("--height", "1.6 mm", "--impedance", "50 ohm", "--impedance", "500 ohm", "--impedance", "120 ohm")
    good, unreachable, _ = rows_of(*asked)
    assert good["makeable"] is True
    assert good["note"] == ""
    assert unreachable["makeable"] is False
    assert unreachable["width_mm"] is None
    assert "500 ohm cannot be reached" in unreachable["note"]
    text = planar("lines", *asked).stdout
    assert re.search(r"500 .*\bno +500 ohm cannot be reached", text)


def test_rows_the_fab_cannot_etch_are_flagged() -> None:
    """0.14 mm of track against 0.15 mm of the pool; the finer fab takes it. The width itself is the same."""
    asked = ("--height", "0.2 mm", "--impedance", "75 ohm", "--copper", "55 um")
    (pool,), (fine,) = rows_of(*asked), rows_of(*asked, "--fab", "fine-two-layer")
    assert pool["width_mm"] == fine["width_mm"] < 0.15
    assert (pool["makeable"], fine["makeable"]) == (False, True)
    assert "track below 0.15 mm" in pool["note"]


def test_mask_lowers_the_impedance() -> None:
    """Invariant: a dielectric on top adds capacitance, so the same impedance needs a narrower line."""
    (bare,), (masked,) = (rows_of("--height", "0.8 mm", "--impedance", "50 ohm", *mask) for mask in ([], ["--mask"]))
    assert 0.9 * bare["width_mm"] < masked["width_mm"] < bare["width_mm"]
    assert masked["eps_eff"] > bare["eps_eff"]


def test_laminates_and_fixed_gap() -> None:
    rows = rows_of("--laminate", "alumina-96", "--laminate", "foam-core", "--height", "1 mm", "--impedance", "60 ohm")
    assert [row["laminate"] for row in rows] == ["alumina-96", "foam-core"]
    assert rows[0]["width_mm"] < rows[1]["width_mm"]
    (strips,) = rows_of("--kind", "coplanar-strips", "--gap", "12 mil", "--height", "1 mm", "--impedance", "100 ohm")
    assert strips["gap_mm"] == pytest.approx(0.3048)


@pytest.mark.parametrize(
    ("arguments", "said"),
    [
        (["--impedance", "50"], ["--impedance = 50", "the unit is missing", '"50 ohm"']),
        (["--impedance", "50 mm"], ["--impedance = 50 mm", "no unit of impedance"]),
        (["--impedance", "0 ohm"], ["--impedance = 0 ohm", "from 5 ohm to 1 kohm"]),
        (["--height", "1.6 inch"], ["--height = 1.6 inch", "from 10 um to 20 mm"]),
        (["--frequency", "fast"], ["--frequency = fast", '"868.3 MHz"']),
        (["--copper", "1 oz"], ["--copper = 1 oz", "no unit of length"]),
        (["--gap", "1 mm"], ["--gap = 1 mm", "only --kind coplanar-strips has a gap"]),
        (["--eps-r", "2.2"], ["--height", 'needed with --eps-r: --height "1.6 mm"']),
        (["--eps-r", "22", "--height", "1 mm"], ["--eps-r = 22", "1 to 20"]),
        (["--eps-r", "nan", "--height", "1 mm"], ["--eps-r = nan", "1 to 20"]),
        (["--eps-r", "2", "--tan-d", "2", "--height", "1 mm"], ["--tan-d = 2", "0 to 0.2"]),
        (["--eps-r", "2", "--height", "1 mm", "--laminate", "foam-core"], ["--laminate = foam-core", "not both"]),
        (["--tan-d", "0.02"], ["--tan-d = 0.02", "goes with --eps-r"]),
        (["--mask", "--fab", "milled-single-sided"], ["--mask = on", "applies no solder mask"]),
        (["--laminate", "fr4-generel"], ["laminate", '"fr4-generel"', 'nearest is "fr4-general"']),
        (["--fab", "pool-two-layers"], ["fab", '"pool-two-layers"', 'nearest is "pool-two-layer"']),
        (["--library", "nowhere"], ["folder = nowhere", "laminates"]),
        (["--height", "1 mm", "--plot", "widths.png"], ["widths.png", "name it with .svg"]),
        (["--height", "1 mm", "--plot", "no/such/folder/widths.svg"], ["cannot write", "widths.svg"]),
    ],
    ids=lambda value: " ".join(value) if value[0].startswith("--") else None,
)
def test_wrong_values_are_refused(
    arguments: list[str], said: list[str], tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.chdir(tmp_path)
    result = planar("lines", *arguments, expect=1)
    assert list(tmp_path.iterdir()) == []
    assert result.stdout == ""
    assert result.stderr.startswith("refused: ")
    assert [words for words in said if words not in result.stderr] == [], result.stderr
    assert len(result.stderr.splitlines()) == 1


@pytest.mark.parametrize(
    ("arguments", "said"),
    [
        (["lines", "--kind", "slot"], "'microstrip', 'coplanar-strips'"),
        (["lines", "--eps-r", "two"], "'two' is not a valid float"),
        (["lines", "--json", "--csv"], "choose one"),
        (["lines", "--width", "3 mm"], "No such option"),
        (["lines", "fr4-general"], "unexpected extra argument"),
        (["make"], "Missing argument 'BRIEF'"),
        (["new"], "Missing argument 'NAME'"),
        (["etch"], "No such command 'etch'"),
    ],
    ids=" ".join,
)
def test_wrong_usage(arguments: list[str], said: str) -> None:
    result = planar(*arguments, expect=2)
    assert result.stdout == ""
    assert said in result.stderr


def test_all_wrong_options_at_once() -> None:
    result = planar("lines", "--impedance", "fifty", "--height", "1", "--gap", "1 mm", "--frequency", "1 m", expect=1)
    lines = result.stderr.removeprefix("refused: ").splitlines()
    assert {re.findall(r"--[\w-]+", line)[0] for line in lines} == {"--impedance", "--height", "--gap", "--frequency"}
    assert all(line.startswith("command line: ") for line in lines)


def test_plot_is_an_svg_and_the_same_twice(tmp_path: Path) -> None:
    """Two processes with different hash seeds: the same bytes, well-formed, with a curve for each thickness."""
    files = [tmp_path / "one.svg", tmp_path / "two.svg"]
    asked = ["lines", "--height", "0.8 mm", "--height", "1.6 mm", "--impedance", "400 ohm"]
    asked += ["--impedance", "50 ohm", "--impedance", "75 ohm"]
    for seed, file in enumerate(files):
        command = [sys.executable, "-m", "planar", *asked, "--plot", str(file)]
        environment = {"PYTHONHASHSEED": str(seed), "PATH": "", "HOME": str(tmp_path)}
        subprocess.run(command, cwd=tmp_path, env=environment, capture_output=True, check=True)
    assert files[0].read_bytes() == files[1].read_bytes()
    root = ET.fromstring(files[0].read_text(encoding="utf-8"))
    assert root.tag == "{http://www.w3.org/2000/svg}svg"
    curves = [g for g in root.iter("{http://www.w3.org/2000/svg}g") if re.fullmatch(r"line2d_\d+", g.get("id", ""))]
    with_markers = [g for g in curves if len(list(g.iter("{http://www.w3.org/2000/svg}use"))) == 2]
    assert len(with_markers) == 2  # 50 and 75 ohm on each; the row without a width is left out


def test_library_lists_every_entry() -> None:
    found = json.loads(planar("library", "--json").stdout)
    assert tuple(found) == KINDS
    for kind in KINDS:
        assert [entry["key"] for entry in found[kind]] == sorted(
            path.stem for path in (TEMPLATES / kind).glob("*.toml")
        )
        assert all(entry["title"] and Path(entry["file"]).is_file() for entry in found[kind])
    text = planar("library").stdout
    assert all(entry["key"] in text for entries in found.values() for entry in entries)
    assert list(json.loads(planar("library", "fabs", "--json").stdout)) == ["fabs"]


def test_library_entry_shows_every_value_with_its_source() -> None:
    entry = json.loads(planar("library", "laminates", "fr4-general", "--json").stdout)
    assert entry["values"]["eps_r"]["value"] == {"value": 4.3, "at": "1 GHz", "tolerance": "5 %"}
    assert entry["values"]["eps_r"]["source"]
    text = planar("library", "laminates", "fr4-general").stdout
    assert re.search(r"^eps_r +4.3; at 1 GHz; tolerance 5 % ", text, re.MULTILINE)
    assert entry["title"] in text


@pytest.mark.parametrize("family", ["plain", "ring-guided", "coplanar"])
def test_library_entry_names_the_dimensions_of_a_family(family: str) -> None:
    """What `planar new` sends the user here for: the names [antenna.dimensions] may use."""
    text = planar("library", "families", family).stdout
    for name in ("loop_width", "trace_width"):
        assert f"dimensions.{name}.meaning" in text


@pytest.mark.parametrize(
    ("arguments", "said"),
    [
        (["laminate"], ["kind", '"laminate"', 'nearest is "laminates"']),
        (["laminates", "fr4-generel"], ['"fr4-generel"', 'nearest is "fr4-general"']),
        (["boards", "fr4-general"], ['"boards"', "one of laminates"]),
    ],
    ids=" ".join,
)
def test_library_refuses_with_the_nearest(arguments: list[str], said: list[str]) -> None:
    message = planar("library", *arguments, expect=1).stderr
    assert [words for words in said if words not in message] == [], message


@pytest.fixture
def own_library(tmp_path: Path) -> Path:
    """A user's folder: fr4-general measured at 3.9 instead of 4.3, and a laminate of their own."""
    folder = tmp_path / "bench library"
    (folder / "laminates").mkdir(parents=True)
    text = (TEMPLATES / "laminates" / "fr4-general.toml").read_text(encoding="utf-8")
    own = re.sub(r"(\[eps_r\]\nvalue = )4\.3", r"\g<1>3.9", text)
    assert own != text
    (folder / "laminates" / "fr4-general.toml").write_text(own, encoding="utf-8")
    (folder / "laminates" / "shelf-sheet.toml").write_text(own, encoding="utf-8")
    return folder


def test_own_library_comes_first(own_library: Path) -> None:
    asked = ("--height", "1.6 mm", "--impedance", "50 ohm")
    (shipped,), (own,) = rows_of(*asked), rows_of(*asked, "--library", own_library)
    (shelf,) = rows_of(*asked, "--library", own_library, "--laminate", "shelf-sheet")
    (free,) = rows_of(*asked, "--eps-r", "3.9", "--copper", "55 um")
    assert own["width_mm"] == shelf["width_mm"] > shipped["width_mm"]
    # roughness and loss do not enter the width
    assert own["width_mm"] == pytest.approx(free["width_mm"], rel=1e-6)
    listed = json.loads(planar("library", "laminates", "--library", own_library, "--json").stdout)["laminates"]
    files = {entry["key"]: Path(entry["file"]) for entry in listed}
    assert files["fr4-general"].parent == own_library / "laminates"
    assert files["shelf-sheet"].parent == own_library / "laminates"
    assert files["foam-core"].parent == TEMPLATES / "laminates"


def test_make_uses_the_own_library(own_library: Path, tmp_path: Path) -> None:
    """With given dimensions, which are not sized: where a laminate comes from does not depend on that."""
    brief = tmp_path / "b.toml"
    text = (TEMPLATES.parent / "examples" / "workshop-loop.toml").read_text(encoding="utf-8")
    own = re.sub(r"^laminate = .*$", 'laminate = "shelf-sheet"', text, flags=re.MULTILINE)
    assert own != text
    brief.write_text(own, encoding="utf-8")
    refused = planar("make", brief, "--outputs", tmp_path / "out", expect=1)
    assert "shelf-sheet" in refused.stderr
    planar("make", brief, "--outputs", tmp_path / "out", "--library", own_library)
    assert "shelf-sheet" in (tmp_path / "out" / "workshop-loop" / "brief.toml").read_text(encoding="utf-8")


@pytest.mark.parametrize("given", ["pump-house", "pump-house.toml", "Pumpe Süd 2"])
def test_new_brief_is_read_as_it_stands(given: str, tmp_path: Path) -> None:
    path = tmp_path / given
    said = json.loads(planar("new", path, "--json").stdout)
    name = given.removesuffix(".toml")
    assert Path(said["file"]) == tmp_path / f"{name}.toml"
    text = Path(said["file"]).read_text(encoding="utf-8")
    assert all(f"[{table}]" in text for table in ("target", "antenna", "board", "surroundings", "make"))
    assert read_brief(said["file"], Library.open()).name == name


def test_new_brief_is_made_as_it_stands(tmp_path: Path) -> None:
    """It leaves the family open: every realisation is sized, one chosen and said why."""
    path = json.loads(planar("new", tmp_path / "pump-house", "--json").stdout)["file"]
    made = json.loads(planar("make", path, "--outputs", tmp_path / "out", "--json").stdout)
    assert (tmp_path / "out" / "pump-house" / "SHA256SUMS").is_file()
    candidates = made["sizing"]["candidates"]
    assert {each["family"] for each in candidates} == {"plain", "ring-guided", "coplanar"}
    assert candidates[0]["meets_brief"]
    assert (candidates[0]["family"], candidates[0]["end"]) == (made["family"], made["end"])
    assert any("chosen over" in reason for reason in made["assumptions"])


def test_new_says_what_comes_next(tmp_path: Path) -> None:
    text = planar("new", tmp_path / "pump").stdout
    assert f"planar make {tmp_path / 'pump.toml'}" in text


def test_new_never_overwrites(tmp_path: Path) -> None:
    path = tmp_path / "pump.toml"
    path.write_text("mine", encoding="utf-8")
    for name in ("pump", "pump.toml"):
        message = planar("new", tmp_path / name, expect=1).stderr
        assert f"{path} exists already" in message
    assert path.read_text(encoding="utf-8") == "mine"


@pytest.mark.parametrize(
    ("name", "said"), [("a*b", "folder name"), ("no/such/folder/pump", "cannot write"), ("x" * 60, "at most 50")]
)
def test_new_refuses_names_make_would_refuse(name: str, said: str, tmp_path: Path) -> None:
    assert said in planar("new", tmp_path / name, expect=1).stderr
    assert list(tmp_path.iterdir()) == []

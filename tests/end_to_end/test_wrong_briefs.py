"""Wrong briefs through `planar make`: exit code 1, one clear message, nothing written.

A message names the file, the key, what stands there and what would be right. Most cases run the command in this
process, for speed; two run it as a user would.
"""

import re
import subprocess
import sys
from pathlib import Path

import pytest
from click.testing import CliRunner

from planar.brief import read_brief
from planar.cli import main
from planar.copper.layout import Level
from planar.design.design import make_design
from planar.library import Library

GOOD = """\
name = "pump-house"

[target]
band = ["863 MHz", "870 MHz"]

[antenna]
shape = "circle"

[board]
laminate = "fr4-general"
thickness = "1.6 mm"
mask = "none"

[make]
fab = "pool-two-layer"
"""
TARGET, ANTENNA, BOARD, MAKE = "[target]\n", "[antenna]\n", "[board]\n", "[make]\n"
THICKNESS = 'thickness = "1.6 mm"'

Changes = dict[str, str]
"""Text of the good brief -> what stands there instead."""

READ: dict[str, tuple[Changes, tuple[str, str, str]]] = {
    # what is refused on reading: (key, value, what would be right)
    "unit missing": ({'"1.6 mm"': '"1.6"'}, ("board.thickness", '"1.6"', 'the unit is missing, write "1.6 mm"')),
    "no text": ({'"1.6 mm"': "1.6"}, ("board.thickness", "1.6", 'text with its unit, write "1.6 mm"')),
    "unknown unit": (
        {'"1.6 mm"': '"1.6 milimeters"'},
        ("board.thickness", '"1.6 milimeters"', "unknown unit 'milimeters'"),
    ),
    "wrong kind of unit": ({'"1.6 mm"': '"1.6 MHz"'}, ("board.thickness", '"1.6 MHz"', "no unit of length")),
    "inch for mm": ({'"1.6 mm"': '"1.6 inch"'}, ("board.thickness", '"1.6 inch"', "did you mean 1.6 mm?")),
    "decimal comma": ({'"1.6 mm"': '"1,6 mm"'}, ("board.thickness", '"1,6 mm"', "the decimal sign is a point: 1.6 mm")),
    "band upside down": (
        {'["863 MHz", "870 MHz"]': '["870 MHz", "863 MHz"]'},
        ("target.band", '["870 MHz", "863 MHz"]', 'swap them: ["863 MHz", "870 MHz"]'),
    ),
    "GHz for MHz": ({'"870 MHz"': '"870 GHz"'}, ("target.band[1]", '"870 GHz"', "did you mean 870 MHz?")),
    "unknown key": ({MAKE: MAKE + "quanttiy = 3\n"}, ("make.quanttiy", "3", 'did you mean "quantity"?')),
    "key in the wrong table": ({MAKE: MAKE + 'copper = "35 um"\n'}, ("make.copper", '"35 um"', "belongs in [board]")),
    "key missing": ({THICKNESS: ""}, ("board.thickness", "(not given)", f"for instance {THICKNESS}")),
    "unknown laminate": (
        {"fr4-general": "fr4-generel"},
        ("board.laminate", '"fr4-generel"', 'did you mean "fr4-general"?'),
    ),
    "unknown fab": (
        {"pool-two-layer": "pool-two-layers"},
        ("make.fab", '"pool-two-layers"', 'did you mean "pool-two-layer"?'),
    ),
    "match above zero": ({ANTENNA: f'match = "10 dB"\n{ANTENNA}'}, ("target.match", '"10 dB"', "did you mean -10 dB?")),
    "transmit without power": (
        {TARGET: TARGET + "transmit = true\n"},
        ("target.power", "(not given)", 'needed with transmit = true, for the exposure figures: power = "25 mW"'),
    ),
    "circular without sense": (
        {TARGET: TARGET + 'polarisation = "circular"\n'},
        ("target.polarisation", '"circular"', '"circular-right" or "circular-left"'),
    ),
    "corner of a circle": (
        {ANTENNA: ANTENNA + 'corner_radius = "5 mm"\n'},
        ("antenna.corner_radius", '"5 mm"', 'write shape = "square" or leave it out'),
    ),
    "name with a slash": (
        {"pump-house": "pump/house"},
        ("name", '"pump/house"', "letters, digits, space, - _ . only"),
    ),
    "name that climbs": ({"pump-house": ".."}, ("name", '".."', "no space or dot at either end")),
    "unknown dimension": (
        {
            ANTENNA: ANTENNA + 'family = "plain"\n'
            'dimensions = { loop_width = "112 mm", trace_width = "3 mm", gap = "2 mm", gpa = "2 mm" }\n'
        },
        ("antenna.dimensions.gpa", '"2 mm"', 'nearest is "gap"'),
    ),
    "dimension missing": (
        {ANTENNA: ANTENNA + 'family = "plain"\ndimensions = { loop_width = "112 mm", trace_width = "3 mm" }\n'},
        ("antenna.dimensions.gap", "", "feed gap between the trace's ends"),
    ),
    "dimensions of no family": (
        {ANTENNA: ANTENNA + 'dimensions = { gap = "2 mm" }\n'},
        ("antenna.family", "(not given)", "needed where [antenna.dimensions] are given"),
    ),
    "reflector out of reach": (
        {MAKE: f'[surroundings]\nreflector = {{ distance = "5 m" }}\n{MAKE}'},
        ("surroundings.reflector.distance", '"5 m"', "within one wavelength"),
    ),
    "fraction of a board": ({MAKE: MAKE + "quantity = 2.5\n"}, ("make.quantity", "2.5", "a whole number")),
}

DESIGNED: dict[str, tuple[Changes, tuple[str, ...]]] = {
    # what is refused on designing: the key or rule, the value that does not go, and a way out
    "connector of another family": (
        {ANTENNA: ANTENNA + 'family = "ring-guided"\n', MAKE: MAKE + 'connector = "bare-pads"\n'},
        ("make.connector", "bare-pads", "a coax feed for ring-guided", "use edge-coax"),
    ),
    "two levels at a one-level fab": (
        {ANTENNA: ANTENNA + 'family = "ring-guided"\n', "pool-two-layer": "milled-single-sided"},
        ("make.fab", "2 for ring-guided, limit 1 at milled-single-sided", "use a two-level fab"),
    ),
    "mask at a fab without": (
        {"pool-two-layer": "milled-single-sided", 'mask = "none"': 'mask = "top"'},
        ("mask", "top", "no mask offered", 'mask = "none", or another fab'),
    ),
    "too little room": (
        {BOARD: BOARD + 'size_limit = ["60 mm", "60 mm"]\n'},
        ("size limit", "limit 60 mm x 60 mm", "allow more space"),
    ),
    "trace far too wide": (
        {ANTENNA: ANTENNA + 'trace_width = "60 mm"\n'},
        ("antenna.trace_width", "60 mm", "at most"),
    ),
    "reflector too near": (
        {MAKE: f'[surroundings]\nreflector = {{ distance = "1 mm" }}\n{MAKE}'},
        ("surroundings.reflector.distance", "1 mm", "at least"),
    ),
    "impedance strips cannot have": (
        {ANTENNA: f'impedance = "20 ohm"\n{ANTENNA}family = "coplanar"\n'},
        ("target.impedance", "20 ohm", "this board and fab reach", "that is a port of"),
    ),
}


def written(folder: Path, changes: Changes) -> Path:
    text = GOOD
    for old, new in changes.items():
        assert text.count(old) == 1, old
        text = text.replace(old, new)
    path = folder / "pump.toml"
    path.write_text(text, encoding="utf-8")
    return path


def refusal(brief: Path) -> str:
    """What `planar make` says; it must refuse, print nothing else, and write nothing."""
    outputs = brief.parent / "results"
    before = sorted(brief.parent.iterdir())
    result = CliRunner().invoke(main, ["make", str(brief), "--outputs", str(outputs)])
    assert result.exit_code == 1, result.output
    assert isinstance(result.exception, SystemExit)
    assert result.stdout == ""
    page = outputs / "pump-house-refused" / "report.html"
    told = f"as a page: {page}\n"
    if result.stderr.endswith(told):  # a brief that can be read and not be made: the page that says why, nothing else
        assert sorted(path.name for path in page.parent.iterdir()) == ["SHA256SUMS", "report.html"]
        before.append(outputs)
    assert sorted(brief.parent.iterdir()) == sorted(before)
    assert [path.parent for path in outputs.rglob("report.html")] == [page.parent] * outputs.exists()
    assert result.stderr.startswith("refused: ")
    return result.stderr.removeprefix("refused: ").removesuffix(told)


def test_the_brief_they_are_made_from_is_good(tmp_path: Path) -> None:
    """Read, and drawn from first dimensions by every rule; what is wrong below is then the one change made to it."""
    brief, library = written(tmp_path, {}), Library.open()
    design = make_design(read_brief(brief, library), library, str(brief))
    assert design.name == "pump-house"
    assert design.layout.copper(Level.TOP)


@pytest.mark.parametrize("case", READ)
def test_refused_on_reading(case: str, tmp_path: Path) -> None:
    changes, (key, value, right) = READ[case]
    brief = written(tmp_path, changes)
    lines = refusal(brief).splitlines()
    assert len(lines) == 1
    assert re.match(rf"{re.escape(f'{brief}: {key} = {value}')}.*: ", lines[0]), lines[0]
    assert right in lines[0]


@pytest.mark.parametrize("case", DESIGNED)
def test_refused_on_designing(case: str, tmp_path: Path) -> None:
    changes, said = DESIGNED[case]
    brief = written(tmp_path, changes)
    message = refusal(brief)
    assert [words for words in (str(brief), *said) if words not in message] == [], message


def test_missing_file(tmp_path: Path) -> None:
    written(tmp_path, {})
    message = refusal(tmp_path / "pumps.toml")
    assert message == f"{tmp_path / 'pumps.toml'}: file = no such file: did you mean {tmp_path / 'pump.toml'}?\n"


def test_folder_for_a_file(tmp_path: Path) -> None:
    (tmp_path / "briefs").mkdir()
    message = refusal(tmp_path / "briefs")
    assert message == f"{tmp_path / 'briefs'}: file = a folder: the path of a brief, a TOML file\n"


@pytest.mark.parametrize(
    ("broken", "line", "key", "right"),
    [
        ('thickness = "1.6 mm', 11, "board.thickness", "closing quote"),
        ("thickness = 1.6 mm", 11, "board.thickness", ""),
        ('thickness "1.6 mm"', 11, "thickness", "= and its value"),
        (f"{THICKNESS}\n{THICKNESS}", 12, "board.thickness", "given twice"),
    ],
)
def test_toml_that_cannot_be_read(broken: str, line: int, key: str, right: str, tmp_path: Path) -> None:
    """The line, counted by hand in the text above."""
    brief = written(tmp_path, {THICKNESS: broken})
    message = refusal(brief)
    assert message.startswith(f"{brief}:{line}: {key}")
    assert right in message
    assert message.count("\n") == 1


def test_file_that_is_no_text(tmp_path: Path) -> None:
    brief = tmp_path / "board.toml"
    brief.write_bytes(b'name = "a"\n\xff\xfe')
    message = refusal(brief)
    assert str(brief) in message
    assert "line 2" in message
    assert "UTF-8" in message


def test_all_faults_at_once(tmp_path: Path) -> None:
    """Five mistakes in five tables, one message with five lines in the order of the brief."""
    changes = {
        "pump-house": "pump/house",
        TARGET: TARGET + 'match = "10 dB"\n',
        "shape =": "shap =",
        "fr4-general": "fr4-generel",
        "pool-two-layer": "pool-two-layers",
    }
    brief = written(tmp_path, changes)
    lines = refusal(brief).splitlines()
    assert all(line.startswith(f"{brief}: ") for line in lines)
    keys = [line.removeprefix(f"{brief}: ").split(" = ")[0] for line in lines]
    assert keys == ["name", "target.match", "antenna.shap", "board.laminate", "make.fab"]


@pytest.mark.parametrize(
    ("changes", "said"),
    [(READ["inch for mm"][0], "did you mean 1.6 mm?"), (DESIGNED["mask at a fab without"][0], "no mask offered")],
    ids=["inch for mm", "mask at a fab without"],
)
def test_as_a_user_meets_it(changes: Changes, said: str, tmp_path: Path) -> None:
    """The whole command in a folder of its own: the message on stderr, exit code 1, no folder `outputs`."""
    brief = written(tmp_path, changes)
    command = [sys.executable, "-m", "planar", "make", brief.name]
    done = subprocess.run(command, cwd=tmp_path, capture_output=True, text=True, encoding="utf-8", check=False)
    assert done.returncode == 1
    assert done.stdout == ""
    assert done.stderr.startswith(f"refused: {brief.name}: ")
    assert said in done.stderr
    assert "Traceback" not in done.stderr
    page = Path("outputs", "pump-house-refused", "report.html")
    designed = done.stderr.endswith(f"as a page: {page}\n")
    assert sorted(tmp_path.iterdir()) == ([tmp_path / "outputs", brief] if designed else [brief])

"""`planar spread` and `planar retune` through the command.

Authority: the contract of the commands; a sweep of another board by scikit-rf's formulas for what must be refused.
"""

from __future__ import annotations

import json
from pathlib import Path

import numpy as np
import pytest

from planar.brief import read_brief
from planar.design.design import make_design
from planar.design.design_file import design_facts
from planar.library import Library
from tests.end_to_end.bench_loop import BRIEF, run


def test_a_spread_says_yield_and_what_dominates(tmp_path: Path) -> None:
    brief = tmp_path / "brief.toml"
    brief.write_text(BRIEF, encoding="utf-8")
    result = run("spread", brief, "--outputs", tmp_path / "out", "--json")
    assert result.exit_code == 0, result.output
    told = json.loads(result.stdout)
    assert Path(told["file"]).is_file()
    assert 0.0 <= told["yield"]["total_95_percent"][0] <= told["yield"]["total"] <= 1.0
    shares = [each["match_share"] for each in told["contributors"]] + [told["interactions"]["match_share"]]
    assert sum(shares) == pytest.approx(1.0, abs=0.02)  # the limit: within 2 %
    assert told["model_error"]["reflection"] < 0.02
    assert {each["name"] for each in told["quantities"]} >= {"laminate permittivity", "etch bias per edge"}


@pytest.fixture(scope="module")
def design(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """A design.json that needed no solving: a measurement is judged before anything is solved."""
    folder = tmp_path_factory.mktemp("design")
    brief, library = folder / "brief.toml", Library.open()
    brief.write_text(BRIEF, encoding="utf-8")
    facts = design_facts(make_design(read_brief(brief, library), library, str(brief)))
    (folder / "design.json").write_text(json.dumps(facts), encoding="utf-8")
    return folder / "design.json"


def sweep(
    path: Path, *, head: str = "# HZ S RI R 50", points: int = 201, scale: float = 1.0, size: float = 0.5
) -> Path:
    frequency = np.linspace(2.2e9, 2.7e9, points)
    s = size * np.exp(-2j * np.pi * frequency * 0.5e-9)
    rows = [f"{f * scale:.6f} {v.real:.9f} {v.imag:.9f}" for f, v in zip(frequency, s, strict=True)]
    path.write_text("\n".join([head, *rows]), encoding="utf-8")
    return path


@pytest.mark.parametrize(
    ("asked", "said"),
    [
        ({"head": "# HZ Z RI R 50"}, "line 1"),
        ({"points": 5}, "at least 11"),
        ({"size": 1.4}, "calibrate again"),
        ({"head": "# MHZ S RI R 50", "scale": 1e-9}, "unit in the file is wrong"),
    ],
    ids=["impedances", "five points", "more back than went in", "gigahertz taken as megahertz"],
)
def test_measurements_that_cannot_be_used_are_refused_before_any_solving(
    asked: dict[str, object], said: str, design: Path, tmp_path: Path
) -> None:
    file = sweep(tmp_path / "board.s1p", **asked)  # type: ignore[arg-type]
    result = run("retune", design, file, "--outputs", tmp_path / "out")
    assert (result.exit_code, said in result.output) == (1, True), result.output
    assert not (tmp_path / "out").exists()


def test_options_that_contradict_each_other_are_wrong_usage(design: Path, tmp_path: Path) -> None:
    file = sweep(tmp_path / "board.s1p")
    assert run("retune", design, file, "--short", file).exit_code == 2
    assert run("retune", design, file, "--short", file, "--opened", file, "--extension", "30 mm").exit_code == 2
    assert run("retune", design, tmp_path / "none.s1p").exit_code == 1

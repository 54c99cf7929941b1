"""The whole of it on boards by formulas, with a cover that is not where it should be. Authority: what was put in."""

import tomllib
from dataclasses import replace

import pytest

from planar.brief import check_brief, write_brief
from planar.design.design import make_design
from planar.design.retune import board_model
from planar.design.retune.board_model import other_surroundings
from planar.design.retune.retuned import retune
from planar.design.retune.unknowns import COAX_SPEED
from planar.network.plane import Launch

from .conftest import LIBRARY, Bench, FormulaWorkers, formula_solved, resonance


@pytest.fixture
def covered_design(design, monkeypatch):

    monkeypatch.setattr(board_model, "solved_terms", formula_solved)
    cover = {"material": "abs", "air_gap": "6 mm", "thickness": "2.5 mm"}
    data = tomllib.loads(write_brief(design.brief)) | {"surroundings": {"cover": cover}}
    return make_design(check_brief(data, "covered.toml", LIBRARY), LIBRARY, "covered.toml")


def measured_with(design, choices):
    """The board of `design` in the surroundings of `choices` behind 30 mm of coax."""
    workers = FormulaWorkers(None)
    moved = board_model.board_model(replace(design, choices=choices), workers)
    launch = Launch(0.03 / COAX_SPEED, 0.05, choices.centre)
    bench = Bench(moved)
    return bench.measured(bench.deviations(laminate_permittivity=0.3), launch)


def test_surroundings_that_may_be_others(covered_design, design):
    (touching, close), (nearer, _), (missing, bare) = other_surroundings(covered_design.choices)
    assert "touches" in touching
    assert close.stackup.find("cover-gap") is None
    assert close.stackup.find("cover") is not None
    assert "nearer" in nearer
    assert "without" in missing
    assert bare.stackup.find("cover") is None
    assert other_surroundings(design.choices) == ()


@pytest.mark.parametrize(("number", "word"), [(0, "touches"), (2, "without")])
def test_cover_elsewhere_is_found_and_answered(covered_design, number, word):
    choices = other_surroundings(covered_design.choices)[number][1]
    found = retune(covered_design, measured_with(covered_design, choices), FormulaWorkers(None))
    if number == 0:
        assert word in found.surroundings
        assert any("drawn for these surroundings" in each.advice for each in found.findings)
        assert found.inferred.effect.sign == -1
    best = found.advice.best.dimensions
    designed = resonance(covered_design.choices, covered_design.dimensions)
    # permittivity 0.3 of its tolerance of 5 %: the same board, drawn anew, in the same surroundings
    stackup = choices.stackup.varied("dielectric", permittivity=1.0 + 0.3 * 0.05)
    assert resonance(replace(choices, stackup=stackup), best) == pytest.approx(designed, rel=0.005)


def test_board_as_designed_stays(covered_design):
    found = retune(covered_design, measured_with(covered_design, covered_design.choices), FormulaWorkers(None))
    assert found.surroundings == ""
    assert found.inferred.effect.interval[0] <= -0.004 <= found.inferred.effect.interval[1] or not found.advice.sure

"""The page of a retuned board held against the facts it is made of and against the HTML standard (html5lib, strict).

The boards are by formulas (see the conftest of the tests of retuning): a loop with trim tabs that came out low, and one
of which it is not told on which side it lies.
"""

from __future__ import annotations

import copy
import re
import tomllib
from typing import Any
from xml.etree import ElementTree
from xml.etree.ElementTree import Element

import html5lib
import numpy as np
import pytest

from planar.brief import check_brief, write_brief
from planar.design.design import Design, make_design
from planar.design.design_file import design_facts
from planar.design.retune import board_model
from planar.design.retune.facts import retune_facts
from planar.design.retune.retuned import retune
from planar.design.retune.unknowns import COAX_SPEED
from planar.errors import HandoffError
from planar.network.plane import Launch
from planar.report.plots_frequency import Asked
from planar.report.retune_page import retune_page
from planar.report.retune_pictures import board_chart, board_curves, board_plot, retune_pictures
from tests.unit.design.retune.conftest import LIBRARY, Bench, FormulaWorkers, formula_model, formula_solved
from tests.unit.design.retune.conftest import design as example

Facts = dict[str, Any]

SVG = "{http://www.w3.org/2000/svg}"
BOARDS = {
    "low": {"laminate_permittivity": 0.6, "dielectric_thickness": 0.5},
    "unsure": {"laminate_permittivity": 0.02},
}
"""Deviations over tolerances of the boards."""


@pytest.fixture(scope="module")
def trimmed() -> Design:
    """The example with trim tabs."""
    plain: Design = example.__wrapped__()
    data = tomllib.loads(write_brief(plain.brief))
    data["antenna"] |= {"trim": True}
    return make_design(check_brief(data, "trimmed.toml", LIBRARY), LIBRARY, "trimmed.toml")


@pytest.fixture(scope="module")
def retuned(trimmed: Design) -> dict[str, Facts]:
    """Content of retune.json of each board."""
    bench = Bench(formula_model(trimmed))
    launch = Launch(0.03 / COAX_SPEED, 0.05, trimmed.choices.centre)
    with pytest.MonkeyPatch.context() as patched:
        patched.setattr(board_model, "solved_terms", formula_solved)
        return {
            name: retune_facts(retune(trimmed, bench.measured(bench.deviations(**off), launch), FormulaWorkers(None)))
            for name, off in BOARDS.items()
        }


@pytest.fixture(scope="module")
def designed(trimmed: Design) -> Facts:
    return design_facts(trimmed)


@pytest.fixture(scope="module")
def pages(retuned: dict[str, Facts], designed: Facts) -> dict[str, str]:
    return {name: retune_page(facts, designed, retune_pictures(facts, designed)) for name, facts in retuned.items()}


def parsed(page: str) -> Element:
    """The document; raises on the first error a strict parser finds."""
    return html5lib.HTMLParser(strict=True, namespaceHTMLElements=False).parse(page)


def fact(facts: Any, key: str) -> Any:
    for part in key.split("."):
        facts = facts[int(part)] if isinstance(facts, list) else facts[part]
    return facts


def words(element: Element) -> str:
    return " ".join("".join(element.itertext()).split())


@pytest.mark.parametrize("board", BOARDS)
def test_every_number_and_text_is_that_of_the_facts(
    board: str, pages: dict[str, str], retuned: dict[str, Facts], designed: Facts
) -> None:
    facts = retuned[board] | {key: designed[key] for key in ("target", "band_hz")}
    document, shown = parsed(pages[board]), set()
    for each in document.iter("data"):
        key, scale = each.attrib["data-key"], float(each.attrib["data-scale"])
        text = words(each).replace("\N{MINUS SIGN}", "-")
        decimals = len(text.partition(".")[2])
        assert abs(float(text) - scale * fact(facts, key)) <= 0.5000001 * 10.0**-decimals, key
        shown.add(key)
    for each in document.iter():
        if "data-text" in each.attrib:
            assert words(each) == " ".join(str(fact(facts, each.attrib["data-text"])).split())
            shown.add(each.attrib["data-text"])
    for i, value in enumerate(facts["values"]):
        end = next(name.removeprefix("value") for name in value if name.startswith("value"))
        assert {f"values.{i}.{name}{end}" for name in ("nominal", "value", "low_95", "high_95")} <= shown
    for group, keys in (("told", ("",)), ("not_advised", (".what", ".why"))):
        assert {f"{group}.{i}{key}" for i in range(len(facts[group])) for key in keys} <= shown
    for i, cut in enumerate(facts["cut_now"]):
        lengths = [] if cut["whole_cut_mm"] is None else [f"cut_now.{i}.first_cut_mm", f"cut_now.{i}.whole_cut_mm"]
        assert {f"cut_now.{i}.what", f"cut_now.{i}.after_first.shift", *lengths} <= shown
    moves = facts["next_spin"][0]["moves_mm"]
    assert {f"next_spin.0.moves_mm.{name}.{side}" for name in moves for side in (0, 1)} <= shown


def test_board_that_came_out_low_is_to_be_cut_with_caution(pages: dict[str, str], retuned: dict[str, Facts]) -> None:
    page, facts = words(parsed(pages["low"])), retuned["low"]
    assert facts["shift"] < 0.0
    assert f"came out {-100.0 * facts['shift']:.2f} % low" in page
    assert f"Cut first {facts['cut_now'][0]['first_cut_mm']:.3f}" in page.replace("\N{NO-BREAK SPACE}", " ")
    assert "cannot be taken back" in page
    assert 'href="trim.pdf"' in pages["low"]


def test_nothing_is_to_be_cut_where_the_side_is_not_told(pages: dict[str, str], retuned: dict[str, Facts]) -> None:
    page = words(parsed(pages["unsure"]))
    assert not retuned["unsure"]["sure"]
    assert "Cut nothing: the measurement does not tell" in page
    assert "is not told" in page
    assert "Cut first" not in page
    assert "trim.pdf" not in page


def test_nothing_is_to_be_cut_where_only_copper_would_help(retuned: dict[str, Facts], designed: Facts) -> None:
    why = "nothing can be cut that helps: the loop should be longer, see the next spin"
    facts = retuned["unsure"] | {"sure": True, "shift": 0.0123, "not_advised": [{"what": "anything", "why": why}]}
    page = words(parsed(retune_page(facts, designed, {})))
    assert "came out 1.23 % high" in page
    assert f"Cut nothing: {why}." in page


def test_quantities_are_marked_in_words(pages: dict[str, str], retuned: dict[str, Facts], designed: Facts) -> None:
    facts = copy.deepcopy(retuned["low"])
    told = [value["told"] for value in facts["values"]]
    assert words(parsed(pages["low"])).count("told by itself") == sum(told)
    assert "outside its tolerance" not in pages["low"]
    facts["values"][0]["outside_tolerance"] = True
    assert "<strong>outside its tolerance</strong>" in retune_page(facts, designed, {})


def test_surroundings_findings_and_second_sweep_are_told(retuned: dict[str, Facts], designed: Facts) -> None:
    facts = copy.deepcopy(retuned["low"])
    finding = {"rule": "cable", "where": "x", "got": "0.07 <b>", "limit": "0.05", "advice": "hold", "severity": "warn"}
    facts |= {"surroundings": "its cover touches the board", "findings": [finding]}
    facts["measurement"]["sweeps_differ_by"] = 0.0123
    page = words(parsed(retune_page(facts, designed, {})))
    assert "its cover touches the board" in page
    assert "0.07 <b>" in page
    assert "differs by 0.012" in page


def test_page_fetches_nothing_and_is_the_same_twice(
    pages: dict[str, str], retuned: dict[str, Facts], designed: Facts
) -> None:
    page = pages["low"]
    again = retune_page(retuned["low"], designed, retune_pictures(retuned["low"], designed))
    assert page == again
    links = set(re.findall(r'href="([^"]*)"', page))
    assert links == {"#main", "trim.pdf", "trim.svg", "next.toml"}
    assert not re.search(r"https?://(?!www\.w3\.org/2000/svg)", page)
    assert len(page) < 400_000


def test_curves_are_those_of_the_facts(retuned: dict[str, Facts], designed: Facts) -> None:
    """On the chart the mark of the board as measured lies where its reflection at the middle of the band does: 190 px
    are a reflection of 1, the middle is at (220, 206), real part to the right and imaginary part up."""
    facts, asked = retuned["low"], Asked.of(designed)
    measured = board_curves(facts)[1]
    centre = 0.5 * sum(asked.band)
    pairs = np.array(facts["curves"]["measured"])
    wanted = [np.interp(centre, facts["curves"]["measured_hz"], pairs[:, i]) for i in (0, 1)]
    chart = ElementTree.fromstring(board_chart(facts, asked=asked))
    marks = [each for each in chart.iter(f"{SVG}polygon") if measured.words in "".join(each.itertext())]
    corners = [[float(c) for c in pair.split(",")] for pair in marks[-1].attrib["points"].split()]
    x, y = np.mean(corners, axis=0)
    assert [(x - 220.0) / 190.0, (206.0 - y) / 190.0] == pytest.approx(wanted, abs=1e-3)
    for drawn in (board_plot(facts, asked=asked), *retune_pictures(facts, designed).values()):
        assert "nan" not in drawn


def test_picture_that_is_no_picture_is_refused(retuned: dict[str, Facts], designed: Facts) -> None:
    with pytest.raises(HandoffError, match="no SVG"):
        retune_page(retuned["low"], designed, {"board": "<p>"})

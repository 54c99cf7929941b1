"""The page held against the facts it is made of, and against the HTML standard (html5lib, strict)."""

from __future__ import annotations

import json
import re
from collections import Counter
from collections.abc import Callable, Iterator, Mapping
from itertools import pairwise
from pathlib import Path
from typing import Any
from xml.etree.ElementTree import Element

import html5lib
import pytest

from planar.errors import BriefError, Fault, Finding, HandoffError, RangeError, SynthesisError
from planar.report.compare_page import compare_page
from planar.report.page import report_page, write_report
from planar.report.page_facts import page_facts
from planar.report.page_figures import FORMS
from planar.report.page_pictures import inline_svg, laid_out, placed
from planar.report.refusal_page import refusal_page
from planar.report.spread_pictures import spread_envelope, spread_pictures
from planar.report.study_console import print_spread
from planar.report.tables import quantities

Facts = dict[str, Any]
Make = Callable[[str], Facts]

FILES = {"design.json": "0" * 64, "layout/board.dxf": "a1" * 32}
SVG = (
    '<?xml version="1.0"?>\n<svg xmlns="http://www.w3.org/2000/svg" xmlns:xlink="http://www.w3.org/1999/xlink" '
    'width="40" height="20" viewBox="0 0 4 2"><metadata>made by a plotter</metadata><defs><style>*{stroke-width:1}'
    '.curve, .dot{fill:none}</style><clipPath id="cut"><rect width="4" height="2"/></clipPath></defs>'
    '<g id="line" clip-path="url(#cut)"><path class="curve" d="M0 0L4 2"/></g><use xlink:href="#line"/></svg>'
)
REFUSALS = {
    "rules": SynthesisError("x.toml: small: no:", (Finding("size", "board", "9 mm", "8 mm", "less"),), ("a change",)),
    "faults": BriefError([Fault("x.toml", "target.band", "(not given)", 'band = ["863 MHz", "870 MHz"]')]),
    "reason": RangeError("<outside> & beyond"),
}


def parsed(page: str) -> Element:
    """The document; raises on the first error a strict parser finds."""
    return html5lib.HTMLParser(strict=True, namespaceHTMLElements=False).parse(page)


def at(facts: Any, key: str) -> Any:
    for part in key.split("."):
        facts = facts[int(part)] if isinstance(facts, list | tuple) else facts[part]
    return facts


def differing(page: str, facts: Mapping[str, Any]) -> Iterator[str]:
    """Every number and text on the page that is not its fact, rounded to the digits shown."""
    for element in parsed(page).iter():
        if "data-key" in element.attrib:
            shown = "".join(element.itertext()).replace("\N{MINUS SIGN}", "-")
            decimals = len(shown.partition(".")[2])
            true = at(facts, element.attrib["data-key"])
            error = abs(float(shown) - true * float(element.attrib["data-scale"]))
            if error > 0.5000001 * 10.0**-decimals or float(element.attrib["value"]) != true:
                yield f"{element.attrib['data-key']}: {shown} for {true}"
        if "data-text" in element.attrib:
            told = at(facts, element.attrib["data-text"])
            if "".join(element.itertext()) != str(told):
                yield f"{element.attrib['data-text']}: {told}"


def shown_keys(page: str) -> set[str]:
    return {e.attrib["data-key"] for e in parsed(page).iter() if "data-key" in e.attrib}


@pytest.mark.parametrize("name", ["orchard-gateway", "parcel-reader", "pass-tracker", "workshop-loop"])
@pytest.mark.parametrize("kind", ["first_order", "invented"])
def test_every_figure_is_that_of_the_facts(name: str, kind: str, request: pytest.FixtureRequest) -> None:
    facts = request.getfixturevalue(kind)(name)
    page = report_page(facts, {"reflection": SVG}, FILES)
    assert list(differing(page, page_facts(facts))) == []
    assert {f"dimensions_mm.{each}" for each in facts["dimensions_mm"]} <= shown_keys(page)


def test_every_predicted_quantity_is_shown(invented: Make) -> None:
    page = report_page(invented("parcel-reader"), {}, FILES)
    keys = {key for each in quantities() for key in each.keys if each.join != "complex"}
    assert keys <= shown_keys(page)
    assert {f"{each.keys[0]}.{part}" for each in quantities() if each.join == "complex" for part in "01"} <= shown_keys(
        page
    )


def test_a_wrong_figure_would_be_found(invented: Make) -> None:
    facts = invented("orchard-gateway")
    page = report_page(facts, {}, FILES)
    told = page_facts(facts)
    assert any("gain_dbi" in each for each in differing(page.replace(">2.14<", ">2.15<"), told))
    moved = json.loads(json.dumps(told))
    moved["dimensions_mm"]["gap"] += 0.001
    assert any("dimensions_mm.gap" in each for each in differing(page, moved))


def test_numbers_round_half_a_unit_and_lose_no_sign() -> None:
    assert FORMS["db"].written(-16.149) == "\N{MINUS SIGN}16.1"
    assert FORMS["db"].written(-0.04) == "0.0"
    assert FORMS["signed1"].written(0.04) == "+0.0"
    assert FORMS["asked_mhz"].written(868.3e6) == "868.3"
    assert FORMS["asked_mhz"].written(870e6) == "870"
    assert FORMS["mw"].written(1e-6) == "0.001"
    assert FORMS["mw"].written(0.0253) == "25.3"
    assert FORMS["cm"].written(3328.4) == "333"


@pytest.mark.parametrize("name", ["orchard-gateway", "parcel-reader"])
def test_page_is_valid_and_stands_alone(name: str, invented: Make) -> None:
    page = report_page(invented(name), {"board_top": SVG, "board_bottom": SVG, "current-top": SVG}, FILES)
    document = parsed(page)
    elements = list(document.iter())
    ids = Counter(e.attrib["id"] for e in elements if "id" in e.attrib)
    assert ids.most_common(1)[0][1] == 1
    linked = [e.attrib["href"] for e in elements if e.tag == "a"]
    assert linked
    assert all(link.startswith("#") and link[1:] in ids for link in linked)
    assert not re.search(r"(?:href|src)=[\"'](?!#)|@import|url\([\"']?(?!#)", page)
    assert not re.search(r"https?://(?!www\.w3\.org/)", page)
    assert "default-src 'none'" in page
    assert all(e.attrib.get("aria-label") for e in elements if e.attrib.get("class") == "picture")
    headings = [int(e.tag[1]) for e in elements if e.tag in {"h1", "h2", "h3"}]
    assert headings[0] == 1
    assert headings.count(1) == 1
    assert all(after <= before + 1 for before, after in pairwise(headings))


def test_page_is_the_same_twice(invented: Make) -> None:
    pictures = {"reflection": SVG, "stackup": SVG}
    assert report_page(invented("orchard-gateway"), pictures, FILES) == report_page(
        invented("orchard-gateway"), dict(reversed(pictures.items())), dict(reversed(FILES.items()))
    )


def test_missing_pictures_take_their_section_along(invented: Make) -> None:
    facts = invented("orchard-gateway")
    bare = report_page(facts, {}, FILES)
    assert 'id="copper"' not in bare
    assert 'id="response"' not in bare
    drawn = report_page(facts, {"reflection": SVG}, FILES)
    assert 'id="copper"' not in drawn
    assert 'id="picture-reflection"' in drawn
    assert "Both sides" not in drawn  # one side, nothing to choose


def test_a_narrow_picture_takes_the_place_of_its_wide_one(invented: Make) -> None:
    page = report_page(invented("orchard-gateway"), {"board_top": SVG, "board_top-narrow": SVG}, FILES)
    classes = {e.attrib["id"]: e.attrib["class"].split() for e in parsed(page).iter() if e.tag == "figure"}
    assert "roomy" in classes["picture-board_top"]
    assert "narrow" in classes["picture-board_top-narrow"]


def test_names_of_two_pictures_cannot_meet() -> None:
    text = inline_svg(SVG, "losses")
    assert text.startswith("<svg")
    assert "metadata" not in text
    assert 'id="losses-cut"' in text
    assert 'clip-path="url(#losses-cut)"' in text
    assert 'xlink:href="#losses-line"' in text
    assert "#picture-losses *{stroke-width:1}" in text.replace(" {", "{")
    assert "#picture-losses .curve, #picture-losses .dot" in text


@pytest.mark.parametrize(
    "inside",
    [
        '<image href="https://example.org/a.png"/>',
        "<script>alert(1)</script>",
        '<rect onload="x()"/>',
        "<style>@import 'a.css';</style>",
        '<rect fill="url(https://example.org/b#c)"/>',
    ],
)
def test_a_picture_that_reaches_out_is_refused(inside: str) -> None:
    with pytest.raises(HandoffError, match="not self-contained"):
        inline_svg(f'<svg xmlns="http://www.w3.org/2000/svg">{inside}</svg>', "losses")


def test_words_in_a_picture_are_no_script() -> None:
    assert "one = 3" in inline_svg("<svg><text>the one = 3 of them</text></svg>", "losses")


def test_a_picture_without_a_place_is_refused(invented: Make) -> None:
    with pytest.raises(HandoffError, match="no place for the picture holiday"):
        report_page(invented("orchard-gateway"), {"holiday": SVG}, FILES)


def test_words_of_the_facts_cannot_become_markup(invented: Make) -> None:
    facts = invented("orchard-gateway")
    evil = "<script>alert('x')</script>"
    facts["findings"].append(
        {"rule": evil, "where": evil, "got": evil, "limit": evil, "advice": evil, "severity": "warn"}
    )
    page = report_page(facts, {}, {evil: evil})
    assert evil not in page
    assert list(differing(page, page_facts(facts))) == []


def words_of(page: str) -> str:
    body = parsed(page).find("body")
    assert body is not None
    return " ".join("".join(body.itertext()).replace("\N{NO-BREAK SPACE}", " ").split())


def test_verdict_of_a_board_that_meets(invented: Make) -> None:
    words = words_of(report_page(invented("parcel-reader"), {}, FILES))
    assert "Meets the brief, as predicted" in words
    assert "worst reflection is \N{MINUS SIGN}17.5 dB where \N{MINUS SIGN}14 dB is asked: 3.5 dB to spare" in words
    assert "160.7 MHz below and 91.8 MHz above the band" in words
    assert "axial ratio is 0.42 dB at worst where 3 dB counts as circular, sense left" in words
    assert "yield is not computed here" in words


@pytest.mark.parametrize(
    ("name", "change", "said"),
    [
        ("orchard-gateway", {"worst_reflection_db": -8.0}, "The match misses by 2.0 dB"),
        ("parcel-reader", {"worst_axial_ratio_db": 3.4}, "axial ratio is 3.40 dB at worst"),
        ("parcel-reader", {"sense": "right"}, "sense toward the top is right, not circular-left"),
    ],
)
def test_verdict_of_a_board_that_misses(name: str, change: Facts, said: str, invented: Make) -> None:
    facts = invented(name)
    facts["prediction"] |= change
    words = words_of(report_page(facts, {}, FILES))
    assert "Misses the brief" in words
    assert "Meets the brief" not in words
    assert said in words


def test_no_verdict_without_a_prediction(first_order: Make) -> None:
    facts = first_order("orchard-gateway")
    words = words_of(report_page(facts, {}, {}))
    assert "Not judged" in words
    assert facts["status"] in words
    assert "no exposure figures" in words


def test_yield_is_told_where_it_is_known(invented: Make, spread: Facts) -> None:
    words = words_of(report_page(invented("parcel-reader"), {}, FILES, spread))
    assert "Of 10000 boards drawn at random within the tolerances 93.12 % meet it" in words
    assert "92.61 to 93.60 % as an interval of 95 % for so many draws; 92.77 to 93.41 % if their model errs" in words
    assert "The largest part of the scatter of the match, 61 %, is made by laminate permittivity" in words
    assert "Meets the brief, as predicted" in words


def test_a_board_most_copies_of_which_fail_is_not_praised(invented: Make, spread: Facts) -> None:
    spread["yield"]["total"] = 0.3
    words = words_of(report_page(invented("parcel-reader"), {}, FILES, spread))
    assert "Meets the brief as designed, but most made boards will not" in words


def test_every_figure_of_the_spread_is_that_of_its_file(invented: Make, spread: Facts) -> None:
    facts = invented("parcel-reader")
    page = report_page(facts, spread_pictures(spread), FILES, spread, 3.3)
    assert list(differing(page, page_facts(facts, spread, 3.3))) == []
    keys = shown_keys(page)
    assert {f"spread.yield.{key}" for key in ("match", "axial_ratio", "total")} <= keys
    assert {f"spread.percentiles.worst_reflection_db.{i}" for i in range(5)} <= keys
    assert "spread.corners.0.solved.worst_reflection_db" in keys
    assert "spread.corners.1.modelled.worst_axial_ratio_db" in keys
    assert "spread.corners.0.at.etch_bias_per_edge_mm" in keys
    words = words_of(page)
    assert all(each["why"] in words for each in spread["not_varied"])
    assert spread["laws"] in words


def test_a_ratio_of_the_other_sense_is_said_in_words(
    invented: Make, spread: Facts, capsys: pytest.CaptureFixture[str]
) -> None:
    """It has no number: a corner solved, and the 99th percentile, each on the page and on the terminal."""
    spread["percentiles"]["worst_axial_ratio_db"][-1] = None
    page = report_page(invented("parcel-reader"), {}, FILES, spread)
    print_spread(spread, Path("spread.json"))
    assert (page.count(">other sense<"), capsys.readouterr().out.count("other sense")) == (2, 2)


def test_a_linear_spread_has_no_axial_ratio(invented: Make, spread: Facts) -> None:
    spread["yield"]["axial_ratio"] = spread["percentiles"]["worst_axial_ratio_db"] = None
    spread["interactions"]["axial_ratio_share"] = None
    for each in spread["contributors"]:
        each["axial_ratio_share"] = None
    assert set(spread_pictures(spread)) == {"contributors-match", "contributors-frequency"}
    page = report_page(invented("orchard-gateway"), spread_pictures(spread), FILES, spread)
    assert not {key for key in shown_keys(page) if "yield.match" in key or "percentiles.worst_axial" in key}


def test_bars_of_the_spread_say_every_share(spread: Facts) -> None:
    """Shares of one result and what is made together: 61 + 35 + 4 = 100 per cent, by hand."""
    picture = spread_pictures(spread)["contributors-match"]
    for words in ("61 %", "35 %", "4 %", "laminate permittivity", "together"):
        assert words in picture
    assert set(spread_pictures(spread)) == {"contributors-match", "contributors-frequency", "contributors-axial"}
    nothing = spread | {"contributors": [], "interactions": dict.fromkeys(spread["interactions"])}
    assert spread_pictures(nothing) == {}


def test_cloud_of_the_spread_lies_between_its_percentiles(spread: Facts) -> None:
    cloud = spread_envelope(spread)
    assert cloud.words == "90 % of made boards"
    assert cloud.frequency.tolist() == spread["envelope"]["frequency_hz"]
    assert cloud.middle_db is not None
    assert (cloud.low_db < cloud.middle_db).all()
    assert (cloud.middle_db < cloud.high_db).all()


def test_rows_of_pictures_hold_when_some_are_missing() -> None:
    """Nothing stands alone beside an empty place, unless it is all there is; the order stays."""
    names = ["reflection", "smith", "cut-0", "cut-90", "current-bottom", "losses", "mode-1", "mode-2", "circuit"]
    every = placed(dict.fromkeys(names, SVG))
    for missing in range(len(every)):
        kept = [each for i, each in enumerate(every) if i != missing]
        rows = laid_out(kept)
        assert all(len(row) > 1 for row in rows)
        assert [each.name for row in rows for each in row] == [each.name for each in kept]
    assert [[each.name for each in row] for row in laid_out(every[:1])] == [["reflection"]]
    assert laid_out([]) == []


def test_warnings_come_first_in_what_to_check(invented: Make) -> None:
    facts = invented("orchard-gateway")
    page = report_page(facts, {}, FILES)
    warned = [each["rule"] for each in facts["findings"] if each["severity"] == "warn"]
    raised = [e for e in parsed(page).iter() if e.tag == "li" and e.attrib.get("class") == "raised"]
    assert ["".join(e.itertext()).split(" (")[0] for e in raised] == warned
    assert warned


def test_a_receiver_gets_no_word_on_transmitting(invented: Make) -> None:
    page = report_page(invented("pass-tracker"), {}, FILES)
    words = words_of(page)
    assert "for receiving only" in words
    assert "Local rules and licensed practice decide" in words
    assert not {key for key in shown_keys(page) if key.startswith("safety")}
    assert "Distance to keep" not in words
    assert "Transmitting." not in words


def test_a_transmitter_gets_its_distance_and_both_powers(invented: Make) -> None:
    words = words_of(report_page(invented("parcel-reader"), {}, FILES))
    assert "849 mW" in words  # 500 mW times 10 to the 0.2301, by hand
    assert "29.3 dBm" in words
    assert "27.1 dBm" in words
    assert "ICNIRP 2020" in words
    assert "edition 97-01" in words
    assert "Local rules and licensed practice decide" in words


@pytest.mark.parametrize("kind", REFUSALS)
def test_a_refusal_says_why_and_what_would_work(kind: str) -> None:
    error = REFUSALS[kind]
    facts = json.loads(json.dumps(error.facts()))
    page = refusal_page(facts, 'name = "small"\n# <b>\n')
    words = words_of(page)
    assert "Refused" in words
    assert "small" in words
    assert "# <b>" in words
    assert list(differing(page, facts)) == []
    assert all(change in words for change in facts.get("nearest_changes", ()))
    assert all(fault["expected"] in words for fault in facts.get("faults", ()))
    assert "<outside>" not in page
    parsed(refusal_page(facts, ""))


def test_designs_side_by_side(first_order: Make, invented: Make) -> None:
    one, two, three = invented("orchard-gateway"), invented("parcel-reader"), first_order("pass-tracker")
    two["prediction"]["gain_dbi"] = 2.9
    page = compare_page([one, two, three], [{"reflection": SVG}, {"reflection": SVG}, {}])
    assert list(differing(page, {str(i): page_facts(each) for i, each in enumerate((one, two, three))})) == []
    best = [
        "".join(row.itertext()).split("2.14")[1]
        for row in parsed(page).iter()
        if row.tag == "tr" and "gain toward the top" in "".join(row.itertext())
    ]
    assert [each.replace("\N{NO-BREAK SPACE}", " ") for each in best] == [" dBi2.90 dBibest\N{EN DASH}"]
    ids = Counter(e.attrib["id"] for e in parsed(page).iter() if "id" in e.attrib)
    assert ids.most_common(1)[0][1] == 1


def test_page_is_written_as_it_is_and_refuses_politely(tmp_path: Path) -> None:
    write_report("\N{MINUS SIGN}1\n", tmp_path / "report.html")
    assert (tmp_path / "report.html").read_bytes() == b"\xe2\x88\x921\n"
    with pytest.raises(HandoffError, match="cannot write"):
        write_report("", tmp_path / "none" / "report.html")

"""Designs of small briefs: what is kept, what is refused, and that every way out offered is one.

Authority: the demanded behaviour (given dimensions are kept exactly, a refusal names rule and nearest
change, two runs are equal); the drawing rules of the fab; a suggestion is tried by applying it.
"""

from __future__ import annotations

import re
from collections.abc import Callable

import pytest

from planar.brief import Brief
from planar.design.design import Design, make_design
from planar.design.line_size import STEP
from planar.errors import BriefError, Severity, SynthesisError
from planar.library import Library
from planar.units import quantity

MakeBrief = Callable[..., Brief]
WHERE = "small.toml"
RING = {"family": "ring-guided"}
CASES = {
    "plain": {"antenna": {"family": "plain"}},
    "plain square, circular": {
        "antenna": {"family": "plain", "shape": "square"}, "target": {"polarisation": "circular-left"},
    },
    "coplanar": {"antenna": {"family": "coplanar"}, "target": {"impedance": "100 ohm"}},
    "coplanar rectangle": {
        "antenna": {"family": "coplanar", "shape": "rectangle", "aspect_ratio": 1.3},
        "target": {"impedance": "120 ohm"},
    },
    "ring-guided, chosen": {},
    "ring-guided, via": {"antenna": RING | {"end": "via"}},
    "ring-guided square, via": {"antenna": RING | {"end": "via", "shape": "square", "corner_radius": "9 mm"}},
    "ring-guided, circular": {"antenna": RING | {"end": "open"}, "target": {"polarisation": "circular-right"}},
    "ring-guided, circular, via": {"antenna": RING | {"end": "via"}, "target": {"polarisation": "circular-left"}},
    "before a reflector": {"antenna": {"family": "plain"}, "surroundings": {"reflector": {"distance": "60 mm"}}},
    "under a cover": {
        "surroundings": {"cover": {"material": "abs", "air_gap": "2 mm", "thickness": "2 mm"}},
    },
    "milled at home": {
        "antenna": {"family": "plain"}, "make": {"fab": "milled-single-sided"},
        "board": {"laminate": "paper-phenolic", "mask": "none"},
    },
}  # fmt: skip


@pytest.fixture(scope="module", params=CASES, ids=lambda name: name.replace(", ", "-").replace(" ", "-"))
def asked(request: pytest.FixtureRequest, brief: MakeBrief) -> Brief:
    return brief(**CASES[request.param])


@pytest.fixture(scope="module")
def design(asked: Brief, library: Library) -> Design:
    return make_design(asked, library, WHERE)


def refusal(asked: Brief, library: Library) -> SynthesisError:
    with pytest.raises(SynthesisError) as caught:
        make_design(asked, library, WHERE)
    return caught.value


def test_first_dimensions_are_hundredths_of_a_millimetre(design: Design) -> None:
    for name, value in design.dimensions.items():
        assert value / STEP == pytest.approx(round(value / STEP), abs=1e-6), name
        assert value > 0.0


def test_dimensions_are_those_of_the_family(design: Design) -> None:
    choices = design.choices
    assert tuple(design.dimensions) == choices.family.needed(choices.traits)
    assert not design.given


def test_nothing_refused_is_handed_out(design: Design) -> None:
    assert all(finding.severity is not Severity.REFUSE for finding in design.findings)


def test_loop_is_the_bare_loop_times_the_starting_ratio(design: Design) -> None:
    """The centre of the band is met by formula; rounding to 0.01 mm leaves 0.05 %."""
    choices, dimensions = design.choices, design.dimensions
    a, b = dimensions["loop_width"], dimensions.get("loop_height", dimensions["loop_width"])
    radius = dimensions.get("corner_radius", 0.5 * a)
    perimeter = 2.0 * (a + b) - (8.0 - 2.0 * 3.141592653589793) * radius
    ratio = choices.family.start(choices.traits).perimeter_ratio
    assert design.bare_loop.frequency == pytest.approx(choices.centre, rel=1e-9)
    assert perimeter == pytest.approx(ratio * design.bare_loop.perimeter, rel=5e-4)


def test_status_states_the_error_and_that_nothing_is_solved(design: Design) -> None:
    percent = round(100 * design.frequency_error)
    assert f"expected frequency error {percent} %" in design.status
    assert "not field-solved" in design.status
    assert "match over the band is not predicted" in design.status
    start = design.choices.family.start(design.choices.traits)
    assert design.frequency_error == start.frequency_error


def test_cautions_name_what_is_not_known(design: Design) -> None:
    rules = {finding.rule for finding in design.findings}
    assert "first-order sizing" in rules
    assert "match" in rules or design.choices.family.key == "plain"
    assert ("polarisation" in rules) == design.choices.circular


def test_twice_is_the_same(design: Design, asked: Brief, library: Library) -> None:
    again = make_design(asked, library, WHERE)
    assert again.dimensions == design.dimensions
    assert [str(f) for f in again.findings] == [str(f) for f in design.findings]
    for one, two in zip(again.layout.islands, design.layout.islands, strict=True):
        assert one.outline.vertices.tobytes() == two.outline.vertices.tobytes()


def test_its_dimensions_given_back_make_the_same_copper(design: Design, brief: MakeBrief, library: Library) -> None:
    """A sized design written into a brief is drawn unchanged, to far below the grid: one vocabulary."""
    choices = design.choices
    asked = choices.brief
    antenna = {
        "family": choices.family.key, "shape": asked.antenna.shape,
        "dimensions": {name: f"{1e3 * value:.2f} mm" for name, value in design.dimensions.items()},
    }  # fmt: skip
    if choices.end is not None:
        antenna["end"] = choices.end
    rest = {table: getattr(asked, table) for table in ("target", "board", "surroundings", "make")}
    given = brief(antenna=antenna).model_copy(update=rest)
    again = make_design(given, library, WHERE)
    assert again.given
    for one, two in zip(again.layout.islands, design.layout.islands, strict=True):
        assert one.outline.vertices == pytest.approx(two.outline.vertices, abs=1e-13)


PLAIN = {"family": "plain", "shape": "circle", "dimensions": {
    "loop_width": "93.377 mm", "trace_width": "3.001 mm", "gap": "2.0005 mm",
}}  # fmt: skip


def test_given_dimensions_are_kept_exactly(brief: MakeBrief, library: Library) -> None:
    """Not even rounded; the detail left out follows from common practice."""
    asked = brief(antenna=PLAIN)
    design = make_design(asked, library, WHERE)
    for name, value in asked.antenna.dimensions.items():
        assert design.dimensions[name] == value
    assert asked.antenna.dimensions["gap"] == pytest.approx(2.0005e-3, rel=1e-14)
    assert design.dimensions["pad_length"] == 2e-3
    assert "given, not sized" in design.status
    assert "expected error 4 %" in design.status


def test_a_loop_off_its_band_is_said_so(brief: MakeBrief, library: Library) -> None:
    small = PLAIN | {"dimensions": PLAIN["dimensions"] | {"loop_width": "70 mm"}}
    near, off = (make_design(brief(antenna=antenna), library, WHERE) for antenna in (PLAIN, small))
    assert "resonance" not in {finding.rule for finding in near.findings}
    (finding,) = (f for f in off.findings if f.rule == "resonance")
    assert quantity(finding.got, "frequency") == pytest.approx(off.bare_loop.frequency, rel=1e-3)


def test_wrong_names_of_dimensions_are_reported_at_once(brief: MakeBrief, library: Library) -> None:
    wrong = {"loop_widht": "93 mm", "trace_width": "3 mm", "line_width": "2 mm", "second_gap": "1 mm"}
    with pytest.raises(BriefError) as caught:
        make_design(brief(antenna={"family": "plain", "dimensions": wrong}), library, WHERE)
    faults = {fault.key.removeprefix("antenna.dimensions."): fault for fault in caught.value.faults}
    assert set(faults) == {"loop_widht", "line_width", "second_gap", "loop_width", "gap"}
    assert 'nearest is "loop_width"' in faults["loop_widht"].expected
    assert faults["loop_widht"].value == '"93 mm"'
    assert faults["gap"].value == "(not given)"
    assert {fault.where for fault in caught.value.faults} == {WHERE}


def applied(change: str, asked: Brief) -> Brief:
    """The brief with a suggestion, read as a person would, written into it."""
    data = {table: getattr(asked, table) for table in ("target", "antenna", "board", "make")}
    band = re.fullmatch(r"the same brief can be made with its band moved up to start at (.+)", change)
    if band:
        low = quantity(band[1], "frequency")
        high = low * asked.target.band[1] / asked.target.band[0]
        data["target"] = asked.target.model_copy(update={"band": (low, high)})
    elif change.startswith("antenna: "):
        values = dict(re.findall(r'(\w+) = "([^"]+)"', change))
        data["antenna"] = asked.antenna.model_copy(update={"aspect_ratio": None, "corner_radius": None} | values)
    else:
        match = re.match(r'(\w+)\.(\w+) = "([^"]+)"', change)
        assert match is not None
        data[match[1]] = data[match[1]].model_copy(update={match[2]: match[3]})
    return asked.model_copy(update=data)


@pytest.mark.parametrize(
    ("tables", "rule"),
    [
        ({"antenna": {"family": "plain"}, "board": {"size_limit": ["92 mm", "92 mm"]}}, "size limit"),
        ({"antenna": {"family": "plain", "shape": "rectangle", "aspect_ratio": 2.5}}, None),
        ({"antenna": RING, "make": {"fab": "milled-single-sided"}}, "copper levels"),
        ({"antenna": {"family": "plain"}, "surroundings": {"reflector": {"distance": "8 mm"}}}, None),
        ({"antenna": {"family": "coplanar"}, "target": {
            "impedance": "100 ohm", "polarisation": "circular-left"}}, None),
        ({"antenna": {"family": "plain", "dimensions": {
            "loop_width": "90 mm", "trace_width": "0.12 mm", "gap": "2 mm"}}}, "track"),
    ],
    ids=["too large", "too long", "one level", "reflector too near", "impedance out of reach", "track too thin"],
)  # fmt: skip
def test_refusals_name_the_rule_and_offer_what_works(
    tables: dict[str, dict[str, object]], rule: str | None, brief: MakeBrief, library: Library
) -> None:
    asked = brief(**tables)
    error = refusal(asked, library)
    assert {finding.rule for finding in error.findings} == ({rule} if rule else set())
    assert all(finding.severity is Severity.REFUSE and finding.advice for finding in error.findings)
    assert error.changes
    for change in error.changes:
        changed = applied(change, asked)
        assert changed != asked
        make_design(changed, library, WHERE)
        assert change in str(error)


@pytest.mark.parametrize(
    ("tables", "words"),
    [
        ({"antenna": {"family": "plain", "shape": "rectangle", "aspect_ratio": 2.5}}, "aspect_ratio 2.5 is outside"),
        ({"antenna": {"family": "plain"}, "surroundings": {"reflector": {"distance": "8 mm"}}}, "too near"),
        ({"antenna": {"family": "coplanar"}, "target": {"impedance": "20 ohm"}}, r"reach \d+ to \d+ ohm"),
        ({"antenna": {"family": "plain", "trace_width": "40 mm"}}, "too wide for the loop formulas"),
        (
            {"antenna": {"family": "plain", "dimensions": {
                "loop_width": "90 mm", "trace_width": "3 mm", "gap": "2 mm", "pad_length": "2 mm"}},
             "target": {"polarisation": "circular-left"}},
            "second_gap",
        ),
    ],
)  # fmt: skip
def test_reasons_are_in_plain_words(
    tables: dict[str, dict[str, object]], words: str, brief: MakeBrief, library: Library
) -> None:
    with pytest.raises((SynthesisError, BriefError), match=words):
        make_design(brief(**tables), library, WHERE)

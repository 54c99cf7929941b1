"""Briefs that are met, and briefs that are refused: with what is missed, what limits it and what would pass.

Authority: the brief itself, and the field solution asked again; every change that is offered is tried.
"""

from __future__ import annotations

import re
from collections.abc import Callable
from dataclasses import replace
from typing import Any

import numpy as np
import pytest

from planar.brief import Brief
from planar.design.candidates import frequency_spread, line_error, realisations
from planar.design.choices import choose
from planar.design.design import Design
from planar.design.first_order import first_dimensions
from planar.design.prediction import prediction_facts
from planar.design.sized import sized_design
from planar.errors import Severity, SynthesisError
from planar.library import Library

MakeBrief = Callable[..., Brief]
PLAIN = {"family": "plain"}


@pytest.fixture(scope="module")
def met(brief: MakeBrief, library: Library) -> Design:
    return sized_design(brief(target={"impedance": "115 ohm"}, antenna=PLAIN), library, "x")


def refused(asked: Brief, library: Library) -> SynthesisError:
    with pytest.raises(SynthesisError) as caught:
        sized_design(asked, library, "x")
    return caught.value


def test_prediction_is_that_of_the_copper(met: Design) -> None:
    prediction = met.prediction
    assert prediction is not None
    assert prediction.margins.spare_db > 0.0
    assert met.bare_loop is None
    assert met.layout.legend  # the board that ships is lettered
    assert "field solver" in met.status
    assert prediction.circuit.deviation < 0.02
    low, high = prediction.trusted
    assert low < met.choices.brief.target.band[0] < met.choices.brief.target.band[1] < high


def test_portrait_says_what_the_prediction_says(met: Design) -> None:
    """Both are of one solution: the pictures and design.json may not differ by more than rounding."""
    assert met.prediction is not None
    assert met.portrait is not None
    facts, shown = prediction_facts(met.prediction), met.portrait
    middle = len(shown.frequency) // 2
    assert shown.frequency[middle] == shown.centre == met.choices.centre
    assert shown.gain_dbi[middle] == round(facts["gain_dbi"], 2)
    assert shown.axial_ratio_db[middle] == min(40.0, round(met.prediction.centre.axial_ratio_db, 2))
    assert 1.0 - shown.losses.copper - shown.losses.dielectric == pytest.approx(facts["efficiency"], abs=2e-4)
    assert (shown.frequency[0], shown.frequency[-1]) == pytest.approx(met.prediction.trusted, abs=1.0)
    assert len(shown.modes) == 2


def test_gap_of_a_loop_without_line_is_its_port(met: Design) -> None:
    assert met.prediction is not None
    assert met.prediction.gap_impedance_ohm == pytest.approx(met.prediction.centre.input_impedance_ohm)


def test_a_loop_is_a_short_at_direct_current(met: Design) -> None:
    """From its lowest frequency on the response turns away from a short: an inductance (circuit theory)."""
    assert met.prediction is not None
    response = met.prediction.response
    first = response.z[0, 0, 0]
    assert response.s[0, 0, 0].real < 0.0
    assert first.imag > 0.0
    assert first.real < 5.0


def test_response_does_not_jump_between_the_meshes(met: Design) -> None:
    """Steps where fine and coarse mesh meet are no larger than elsewhere at that spacing."""
    assert met.prediction is not None
    response = met.prediction.response
    slope = np.abs(np.diff(response.s[:, 0, 0])) / np.diff(response.frequency)
    for edge in met.prediction.trusted:
        near = np.abs(response.frequency[1:] - edge) < 0.05 * edge
        around = np.abs(response.frequency[1:] - edge) < 0.15 * edge
        assert slope[near].max() < 2.0 * np.quantile(slope[around], 0.9)


def test_match_out_of_reach_is_refused_with_what_is(brief: MakeBrief, library: Library) -> None:
    """A circle of 115 ohm on 50 ohm reflects -8 dB (arithmetic); the impedance offered instead is met."""
    error = refused(brief(antenna=PLAIN), library)
    assert "match over the band" in str(error)
    offered = next(change for change in error.changes if "target.impedance" in change)
    ohm = re.search(r'"(\d+) ohm"', offered)
    assert ohm is not None
    assert 95 <= int(ohm[1]) <= 140
    again = sized_design(brief(target={"impedance": f"{ohm[1]} ohm"}, antenna=PLAIN), library, "x")
    assert again.prediction is not None
    assert again.prediction.margins.spare_db > 0.0


def test_given_dimensions_are_not_refused_but_told(brief: MakeBrief, library: Library) -> None:
    given = {"loop_width": "103 mm", "trace_width": "3 mm", "gap": "2 mm", "pad_length": "2 mm"}
    design = sized_design(brief(antenna=PLAIN | {"dimensions": given}), library, "x")
    assert design.sizing is None
    assert {f.rule: f.severity for f in design.findings}["match over the band"] is Severity.WARN


NINE: dict[str, tuple[dict[str, Any], tuple[str, ...]]] = {
    "board far too small": (
        {"board": {"size_limit": ["60 mm", "60 mm"]}, "antenna": PLAIN, "target": {"impedance": "115 ohm"}},
        ("size limit", "limit 60 mm x 60 mm", "band moved up"),
    ),
    "band too wide for one loop": (
        {"target": {"impedance": "115 ohm", "band": ["750 MHz", "1050 MHz"]}, "antenna": PLAIN},
        ("match over the band", "this copper reaches it from", "target.band ="),
    ),
    "strips the fab cannot etch": (
        {
            "antenna": {"family": "coplanar"},
            "make": {"fab": "milled-single-sided"},
            "board": {"laminate": "paper-phenolic"},
        },
        ("needs strips of", "this board and fab reach"),
    ),
    "137 MHz on a small panel": (
        {
            "target": {"band": ["136.5 MHz", "138 MHz"], "impedance": "330 ohm", "polarisation": "circular-right"},
            "antenna": PLAIN,
            "board": {"size_limit": ["450 mm", "600 mm"]},
        },
        ("size limit", "limit 450 mm x 600 mm", "band moved up"),
    ),
    "24 GHz, where the connector is the antenna": (
        {
            "target": {"band": ["24 GHz", "24.25 GHz"]},
            "antenna": {"family": "ring-guided"},
            "board": {"laminate": "ptfe-glass-2-2", "thickness": "0.508 mm"},
        },
        ("connector", "wavelengths", "the connector would be the antenna"),
    ),
    "metal plane right behind": (
        {
            "target": {"impedance": "100 ohm"},
            "antenna": PLAIN,
            "surroundings": {"reflector": {"distance": "4 mm"}},
        },
        ("surroundings.reflector.distance", "hardly radiates", "at least"),
    ),
    "metal plane too near for the match": (
        {
            "target": {"impedance": "100 ohm"},
            "antenna": PLAIN,
            "surroundings": {"reflector": {"distance": "15 mm"}},
        },
        ("match over the band", "ohm at the centre"),
    ),
    "coax at a one-level fab": (
        {"antenna": {"family": "ring-guided"}, "make": {"fab": "milled-single-sided"}},
        ("copper levels", "use a two-level fab"),
    ),
    "better match than a loop keeps": (
        {"target": {"impedance": "115 ohm", "match": "-30 dB"}, "antenna": PLAIN},
        ("match over the band", "limit -30 dB", "which this copper keeps"),
    ),
    "circular over more than a second gap carries": (
        {
            "target": {"impedance": "330 ohm", "polarisation": "circular-right", "band": ["840 MHz", "960 MHz"]},
            "antenna": PLAIN,
        },
        ("axial ratio", "limit 3 dB", "this copper reaches it from"),
    ),
}


@pytest.mark.parametrize("case", NINE)
def test_infeasible_briefs_are_refused_in_words_to_act_on(case: str, brief: MakeBrief, library: Library) -> None:
    tables, said = NINE[case]
    message = str(refused(brief(**tables), library))
    assert [words for words in said if words not in message] == [], message


def test_realisations_of_an_open_brief(brief: MakeBrief) -> None:
    def named(asked: Brief) -> list[tuple[str | None, str | None, str]]:
        return [(each.antenna.family, each.antenna.end, each.antenna.shape) for each in realisations(asked)]

    coax = named(brief())
    assert coax[:2] == [("ring-guided", "open", "circle"), ("ring-guided", "via", "circle")]
    assert coax[2:] == [("coplanar", None, "circle"), ("plain", None, "circle"), ("plain", None, "rectangle")]
    chip = named(brief(target={"impedance": "100 ohm"}, antenna={"shape": "square"}))
    assert chip == [("coplanar", None, "square"), ("plain", None, "square")]
    circular = named(brief(target={"polarisation": "circular-left"}))
    assert ("plain", None, "rectangle") not in circular


def test_what_tolerances_take_from_the_margin(brief: MakeBrief, library: Library) -> None:
    """No tolerance, no spread; the gap of strips is what etching hurts most (a fact of the trade, no source)."""
    choices = choose(brief(target={"impedance": "100 ohm"}, antenna={"family": "coplanar"}), library)
    dimensions, _ = first_dimensions(choices)
    assert 0.001 < frequency_spread(choices, dimensions) < 0.05
    layers = tuple(replace(each, thickness_tolerance=0.0, eps_r_tolerance=0.0) for each in choices.stackup.layers)
    exact = replace(choices, stackup=replace(choices.stackup, layers=layers))
    assert frequency_spread(exact, dimensions) == 0.0
    error, remark = line_error(choices, dimensions)
    assert 0.02 < error < 0.3
    assert "gap" in remark

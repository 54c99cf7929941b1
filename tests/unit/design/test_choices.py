"""What a brief leaves open, and what does not go together.

Authority: the table of families in the design notes (levels, feed, impedances each is for).
"""

from __future__ import annotations

from collections.abc import Callable

import pytest

from planar.brief import Brief
from planar.copper.layout import Level
from planar.design.choices import choose
from planar.errors import Severity, SynthesisError
from planar.library import Library
from planar.stackup import LayerKind

MakeBrief = Callable[..., Brief]
ONE_LEVEL = {"fab": "milled-single-sided"}
BARE = {"mask": "none"}


@pytest.mark.parametrize(
    ("tables", "family", "connector"),
    [
        ({}, "ring-guided", "edge-coax"),
        ({"board": {"thickness": "0.8 mm"}}, "ring-guided", "pigtail-pads"),
        ({"make": ONE_LEVEL, "board": BARE}, "coplanar", "bare-pads"),
        ({"target": {"impedance": "100 ohm"}}, "coplanar", "bare-pads"),
        ({"target": {"impedance": "300 ohm"}}, "plain", "bare-pads"),
        ({"make": ONE_LEVEL, "board": BARE, "target": {"polarisation": "circular-left"}}, "plain", "bare-pads"),
        ({"make": {"connector": "bare-pads"}}, "coplanar", "bare-pads"),
    ],
)
def test_family_and_connector_follow_from_port_and_fab(
    tables: dict[str, dict[str, object]], family: str, connector: str, brief: MakeBrief, library: Library
) -> None:
    choices = choose(brief(**tables), library)
    assert (choices.family.key, choices.connector.key) == (family, connector)
    assert any(f'family "{family}" chosen' in reason for reason in choices.reasons)


def test_what_is_asked_for_is_not_chosen_again(brief: MakeBrief, library: Library) -> None:
    choices = choose(brief(antenna={"family": "ring-guided", "end": "via"}), library)
    assert choices.end == "via"
    assert not any("chosen: " in reason or '"open"' in reason for reason in choices.reasons)
    assert choices.traits == {"via"}
    assert choices.levels == (Level.TOP, Level.BOTTOM)
    assert choices.centre == pytest.approx(900e6)


@pytest.mark.parametrize(
    ("shape", "traits"), [("circle", set()), ("square", {"corner"}), ("rectangle", {"corner", "rectangle"})]
)
def test_traits(shape: str, traits: set[str], brief: MakeBrief, library: Library) -> None:
    asked = brief(antenna={"family": "plain", "shape": shape}, target={"polarisation": "circular-right"})
    assert choose(asked, library).traits == traits | {"circular"}


@pytest.mark.parametrize(
    ("tables", "rules"),
    [
        ({"antenna": {"family": "plain"}, "make": {"connector": "edge-coax"}}, {"feed"}),
        ({"antenna": {"family": "ring-guided"}, "make": {"connector": "bare-pads"}}, {"feed"}),
        ({"antenna": {"family": "ring-guided"}, "make": ONE_LEVEL}, {"copper levels"}),
        ({"make": {"connector": "edge-coax"}, "board": {"thickness": "0.8 mm"}}, {"connector"}),
        (
            {"antenna": {"family": "ring-guided"}, "make": ONE_LEVEL | {"connector": "bare-pads"}},
            {"feed", "copper levels"},
        ),
    ],
)
def test_parts_that_do_not_go_together(
    tables: dict[str, dict[str, object]], rules: set[str], brief: MakeBrief, library: Library
) -> None:
    """All of them at once, each with what to do."""
    with pytest.raises(SynthesisError, match="do not go together") as caught:
        choose(brief(**tables), library)
    findings = caught.value.findings
    assert {finding.rule for finding in findings} == rules
    assert all(finding.severity is Severity.REFUSE and finding.advice for finding in findings)


def test_mask_on_a_side_without_copper_is_printed_as_it_is_solved(brief: MakeBrief, library: Library) -> None:
    plain = {"family": "plain"}
    for side in ("bottom", "top", "both", "none"):
        choices = choose(brief(antenna=plain, board={"mask": side}), library)
        printed = {f"mask-{level}" for level in choices.masked}
        assert printed == {layer.name for layer in choices.stackup.layers if layer.kind is LayerKind.MASK}
        assert (Level.BOTTOM in choices.masked) == (side in {"bottom", "both"})


def test_an_unusual_thickness_is_said(brief: MakeBrief, library: Library) -> None:
    odd, usual = (choose(brief(board={"thickness": t}), library).reasons for t in ("1.45 mm", "1.6 mm"))
    assert any("no usual thickness" in reason for reason in odd)
    assert not any("no usual thickness" in reason for reason in usual)

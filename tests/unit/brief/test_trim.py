"""The key antenna.trim: linear polarisation only.

Authority: the requirements. Tabs on a loop of circular polarisation would upset its axial ratio (common practice, no
source).
"""

from __future__ import annotations

from typing import Any

import pytest

from planar.brief import check_brief, parse_brief, starter_brief, write_brief
from planar.errors import BriefError
from planar.library import Library

LIBRARY = Library.open()


def asked(trim: object, polarisation: str = "linear") -> dict[str, Any]:
    return {
        "name": "trimmed",
        "target": {"band": ["863 MHz", "870 MHz"], "polarisation": polarisation},
        "antenna": {"trim": trim},
        "board": {"laminate": "fr4-general", "thickness": "1.6 mm"},
    }


def test_there_are_no_tabs_unless_asked_for():
    data = asked(trim=True)
    assert check_brief(data, "a.toml", LIBRARY).antenna.trim is True
    del data["antenna"]
    assert check_brief(data, "a.toml", LIBRARY).antenna.trim is False


@pytest.mark.parametrize("trim", [True, False])
def test_brief_reads_back(trim):
    brief = check_brief(asked(trim), "a.toml", LIBRARY)
    assert parse_brief(write_brief(brief), "a.toml", LIBRARY) == brief


@pytest.mark.parametrize("polarisation", ["circular-left", "circular-right"])
def test_circular_polarisation_is_refused_with_the_reason(polarisation):
    with pytest.raises(BriefError) as caught:
        check_brief(asked(True, polarisation), "a.toml", LIBRARY)
    (fault,) = caught.value.faults
    assert (fault.where, fault.key, fault.value) == ("a.toml", "antenna.trim", "true")
    assert "axial ratio" in fault.expected
    assert f'"{polarisation}"' in fault.expected
    assert "leave trim out" in fault.expected
    assert check_brief(asked(False, polarisation), "a.toml", LIBRARY).antenna.trim is False


@pytest.mark.parametrize("value", ["true", 1, "yes"])
def test_it_is_true_or_false(value):
    with pytest.raises(BriefError) as caught:
        check_brief(asked(value), "a.toml", LIBRARY)
    (fault,) = caught.value.faults
    assert fault.key == "antenna.trim"
    assert "true or false" in fault.expected


def test_starter_shows_it():
    text = starter_brief("first")
    (line,) = [line for line in text.splitlines() if "trim" in line]
    assert line.startswith("# trim = true")
    assert "linear only" in line
    brief = parse_brief(text.replace("# trim = true", "trim = true"), "first.toml", LIBRARY)
    assert brief.antenna.trim is True

"""Antenna families as files: the dimensions a design needs, where sizing starts, and every slip reported.

Authority: the table of families and the rough searches in the design notes; the demanded behaviour.
"""

from __future__ import annotations

import math
from pathlib import Path

import pytest

from planar.errors import LibraryError
from planar.library import Library
from planar.library.families import read_family
from planar.library.reading import parse

SHIPPED = Library.open()


def test_shipped_families_are_those_of_the_notes() -> None:
    assert SHIPPED.keys("families") == ["coplanar", "plain", "ring-guided"]
    families = [SHIPPED.family(key) for key in SHIPPED.keys("families")]
    assert [(f.levels, f.feed) for f in families] == [(1, "balanced"), (1, "balanced"), (2, "coax")]
    assert [family.ends for family in families] == [(), (), ("open", "via")]
    assert all(0.0 < start.frequency_error <= 0.10 for family in families for start in family.starts.values())


def test_starting_values_are_those_of_the_searches() -> None:
    """Coplanar 48.9 mm against 47.6 mm by formula; open end 55.4 against 50.4 mm; second gap near 80 degrees."""
    coplanar, guided = SHIPPED.family("coplanar"), SHIPPED.family("ring-guided")
    assert coplanar.start(frozenset()).perimeter_ratio == pytest.approx(48.9 / 47.6, abs=0.005)
    assert guided.start(frozenset({"open"})).perimeter_ratio == pytest.approx(55.4 / 50.4, abs=0.005)
    start = guided.start(frozenset({"circular", "open", "corner"}))
    assert start.second_gap_angle == pytest.approx(math.radians(80.0))
    assert SHIPPED.family("plain").start(frozenset()).perimeter_ratio == 1.0


@pytest.mark.parametrize(
    ("traits", "more"),
    [
        (set(), set()),
        ({"corner"}, {"corner_radius"}),
        ({"corner", "rectangle"}, {"corner_radius", "loop_height"}),
        ({"circular"}, {"second_gap", "second_gap_position"}),
    ],
)
def test_dimensions_a_plain_design_needs(traits: set[str], more: set[str]) -> None:
    needed = SHIPPED.family("plain").needed(frozenset(traits))
    assert set(needed) == {"loop_width", "trace_width", "gap", "pad_length"} | more


def test_every_dimension_has_a_meaning_and_every_end_a_start() -> None:
    for key in SHIPPED.keys("families"):
        family = SHIPPED.family(key)
        assert all(family.meaning(rule.name) == rule.meaning != "" for rule in family.dimensions)
        ends = [frozenset({"via"}), frozenset({"open"})] if key == "ring-guided" else [frozenset()]
        for end in ends:
            assert family.start(end).second_gap_angle is None
            assert family.start(end | {"circular"}).second_gap_angle is not None


def test_names_given_are_checked_all_at_once() -> None:
    given = {"loop_widht": 0.1, "trace_width": 3e-3, "via_drill": 3e-4}
    faults = SHIPPED.family("plain").dimension_faults(given, frozenset(), frozenset({"pad_length"}), where="b.toml")
    by_key = {fault.key: fault for fault in faults}
    assert set(by_key) == {f"antenna.dimensions.{n}" for n in ("loop_widht", "via_drill", "loop_width", "gap")}
    assert 'nearest is "loop_width"' in by_key["antenna.dimensions.loop_widht"].expected
    assert by_key["antenna.dimensions.loop_widht"].value == '"100 mm"'
    assert "feed gap" in by_key["antenna.dimensions.gap"].expected
    assert {fault.where for fault in faults} == {"b.toml"}


SLIPS = {
    "start.linear.frequency_error.value": ('{ value = "4 %"', '{ value = "4 mm"'),
    "gap_wavelengths.source": ('value = 0.006, source = "2 mm at 0.9 GHz in the search below"', "value = 0.006"),
    "levels": ("levels = 1", "levels = 3"),
    "feed": ('feed = "balanced"', 'feed = "balancd"'),
    "dimensions.loop_height.needs": ('needs = ["rectangle"]', 'needs = ["rectangel"]'),
    "dimensions.gap.meaning": ("[dimensions.gap]\nmeaning", "[dimensions.gap]\nmeanin"),
    "start.linear.perimeter_ratio.value": ("value = 1.0,", "value = 9.0,"),
    "start.circular.gap_resistance_ratio.value": ("value = 2.86", 'value = "2.86"'),
    "start.circular.second_gap_angle.value": ('"87 deg"', '"87"'),
}


def written(tmp_path: Path, *changes: tuple[str, str]) -> Path:
    text = SHIPPED.source("families", "plain").read_text(encoding="utf-8")
    for old, new in changes:
        assert old in text
        text = text.replace(old, new, 1)
    path = tmp_path / "plain.toml"
    path.write_text(text, encoding="utf-8")
    return path


@pytest.mark.parametrize("key", SLIPS)
def test_one_slip_is_one_message(key: str, tmp_path: Path) -> None:
    path = written(tmp_path, SLIPS[key])
    with pytest.raises(LibraryError) as caught:
        read_family("plain", parse(path), str(path))
    assert key in {fault.key for fault in caught.value.faults}
    assert {fault.where for fault in caught.value.faults} == {str(path)}


@pytest.mark.parametrize("table", ["dimensions", "start"])
def test_a_family_without_dimensions_or_start_is_refused(table: str, tmp_path: Path) -> None:
    raw = {k: v for k, v in parse(written(tmp_path)).items() if k != table}
    with pytest.raises(LibraryError, match=table):
        read_family("plain", raw, "f.toml")
    with pytest.raises(LibraryError, match="at least one"):
        read_family("plain", raw | {table: {}}, "f.toml")


def test_a_start_that_is_not_given_is_named(tmp_path: Path) -> None:
    raw = parse(written(tmp_path))
    family = read_family("plain", raw | {"start": {"linear": raw["start"]["linear"]}}, "f.toml")
    with pytest.raises(LibraryError, match=r"start\.circular"):
        family.start(frozenset({"circular"}))

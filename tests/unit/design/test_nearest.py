"""Suggestions against a predicate whose answer is known beforehand."""

from __future__ import annotations

import re
from collections.abc import Callable

import pytest

from planar.brief import Brief
from planar.design.nearest import LAMINATES_TRIED, SCALES, nearest_changes
from planar.library import Library
from planar.units import quantity

MakeBrief = Callable[..., Brief]


def test_nothing_works_nothing_is_suggested(brief: MakeBrief, library: Library) -> None:
    assert nearest_changes(brief(), library, lambda _: False) == ()


def test_every_suggestion_was_tried(brief: MakeBrief, library: Library) -> None:
    """All is well: the first candidate of each search, and each is one the predicate saw."""
    seen: list[Brief] = []

    def works(changed: Brief) -> bool:
        seen.append(changed)
        return True

    changes = nearest_changes(brief(), library, works)
    assert len(changes) == 4
    assert [any(word in change for word in ("shape", "laminate", "fab", "band")) for change in changes] == [True] * 4
    assert all(changed != brief() for changed in seen)


def test_only_another_shape(brief: MakeBrief, library: Library) -> None:
    found = nearest_changes(brief(), library, lambda b: b.antenna.shape == "rectangle" and b.antenna.end is None)
    assert found == ('antenna: shape = "rectangle" can be made',)


def test_another_shape_drops_what_belongs_to_the_old_one(brief: MakeBrief, library: Library) -> None:
    asked = brief(antenna={"shape": "square", "corner_radius": "5 mm"})
    tried: list[Brief] = []

    def works(changed: Brief) -> bool:
        tried.append(changed)
        return changed.antenna.shape == "circle" and changed.antenna.corner_radius is None

    assert nearest_changes(asked, library, works)[0] == 'antenna: shape = "circle" without corner_radius can be made'
    assert all(b.antenna.corner_radius is None for b in tried if b.antenna.shape != "square")


def test_another_end(brief: MakeBrief, library: Library) -> None:
    found = nearest_changes(brief(), library, lambda b: b.antenna.end == "via")
    assert found == ('antenna: family = "ring-guided", end = "via" can be made',)
    plain = brief(antenna={"family": "plain"})
    assert nearest_changes(plain, library, lambda b: b.antenna.end == "via") == ()


def test_the_laminate_of_nearest_permittivity(brief: MakeBrief, library: Library) -> None:
    """Only laminates sold in this thickness, and no more than a few are tried."""
    here, tried = library.laminate("fr4-general"), []

    def works(changed: Brief) -> bool:
        key = changed.board.laminate
        assert isinstance(key, str)
        if key != here.key:
            tried.append(library.laminate(key))
        return False

    nearest_changes(brief(), library, works)
    distances = [abs(laminate.eps_r - here.eps_r) for laminate in tried]
    assert distances == sorted(distances)
    assert 0 < len(tried) <= LAMINATES_TRIED
    assert all(min(abs(t / 1.6e-3 - 1.0) for t in laminate.thicknesses) < 0.07 for laminate in tried)


def test_another_fab(brief: MakeBrief, library: Library) -> None:
    found = nearest_changes(brief(), library, lambda b: b.make.fab == "fine-two-layer")
    assert found == ('make.fab = "fine-two-layer" can be made',)


@pytest.mark.parametrize("lowest", [0.9e9, 1.0044e9, 1.2345e9, 1.2399e9, 1.9951e9, 2.5049e9, 3.3333e9])
def test_the_band_named_works_and_is_near_the_lowest(lowest: float, brief: MakeBrief, library: Library) -> None:
    """What is named must hold after rounding, and be within 2 % of the true limit."""
    (change,) = nearest_changes(brief(), library, lambda b: b.target.band[0] >= lowest)
    match = re.search(r"band moved up to start at (.+)", change)
    assert match is not None
    assert lowest <= quantity(match[1], "frequency") <= 1.02 * lowest


def test_bands_out_of_reach_are_not_suggested(brief: MakeBrief, library: Library) -> None:
    assert nearest_changes(brief(), library, lambda b: b.target.band[0] > 1.01 * SCALES[-1] * 880e6) == ()


def test_given_dimensions_are_not_changed(brief: MakeBrief, library: Library) -> None:
    """They belong to this shape and this band: only laminate and fab are tried."""
    given = brief(antenna={"family": "plain", "dimensions": {"loop_width": "90 mm"}})
    assert len(nearest_changes(given, library, lambda _: True)) == 2

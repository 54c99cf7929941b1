"""The portrait of small boards on coarse meshes, and its file.

Authority: definitions of the quantities (IEEE Std 145), mirror symmetry of the copper, areas of the drawn outlines,
conservation of power, and the single numbers of the prediction, which are worked out elsewhere.
"""

from __future__ import annotations

import json
from collections.abc import Callable
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

from planar.brief import Brief
from planar.design.choices import Choices
from planar.design.design import make_design
from planar.design.portrait import FLOOR, ModeImage, Portrait, portrait
from planar.design.portrait_file import portrait_facts, read_portrait, write_portrait
from planar.design.portrait_modes import loop_modes
from planar.design.trial import Effort, Trial, solve_trial
from planar.errors import BriefError
from planar.field.result import PointResult, point_result
from planar.library import Library

MakeBrief = Callable[..., Brief]
SPAN = (0.8e9, 1.0e9)
LARGEST_FILE = 300e3
"""Bytes: what a page that carries it can afford."""


def solved(choices: Choices, dimensions: dict[str, float]) -> Trial:
    return solve_trial(choices, dimensions, Effort(3.0, 3, SPAN))


def portrayed(asked: Brief, library: Library, modes: bool = True) -> tuple[Portrait, Trial, PointResult]:
    design = make_design(asked, library, "x")
    choices, dimensions = design.choices, dict(design.dimensions)
    trial = solved(choices, dimensions)
    centre = point_result(trial.band.solution(choices.centre))
    images: tuple[ModeImage, ...] = loop_modes((choices, dimensions)) if modes else ()
    return portrait(choices, trial, centre=centre, span=SPAN, modes=images), trial, centre


def plain(brief: MakeBrief, polarisation: str, **tables: dict[str, object]) -> Brief:
    target = {"impedance": "115 ohm" if polarisation == "linear" else "330 ohm", "polarisation": polarisation}
    return brief(target=target, antenna={"family": "plain"}, **tables)


@pytest.fixture(scope="module")
def linear(brief: MakeBrief, library: Library) -> tuple[Portrait, Trial, PointResult]:
    return portrayed(plain(brief, "linear"), library)


@pytest.fixture(scope="module")
def circular(brief: MakeBrief, library: Library) -> tuple[Portrait, Trial, PointResult]:
    return portrayed(plain(brief, "circular-right"), library)


@pytest.fixture(params=["linear", "circular"])
def board(request: pytest.FixtureRequest) -> tuple[Portrait, Trial, PointResult]:
    found: tuple[Portrait, Trial, PointResult] = request.getfixturevalue(request.param)
    return found


def test_pattern_says_what_the_prediction_says(board: tuple[Portrait, Trial, PointResult]) -> None:
    """Both round the same solution to 0.01 dB: cuts at the normal, and the curve at the centre."""
    shown, _, centre = board
    for cut in shown.cuts:
        top, bottom = (int(np.flatnonzero(cut.theta == at)[0]) for at in (0.0, 180.0))
        assert cut.gain_dbi[top] == round(centre.gain_dbi, 2)
        assert cut.gain_dbi[bottom] == round(centre.gain_below_dbi or 0.0, 2)
        assert cut.axial_ratio_db[top] == min(40.0, round(centre.axial_ratio_db, 2))
    middle = int(np.flatnonzero(shown.frequency == shown.centre)[0])
    assert shown.gain_dbi[middle] == round(centre.gain_dbi, 2)
    assert shown.axial_ratio_db[middle] == min(40.0, round(centre.axial_ratio_db, 2))


def test_a_cut_closes(board: tuple[Portrait, Trial, PointResult]) -> None:
    """-180 and 180 degrees are one direction; along the endless slab nothing leaves."""
    for cut in board[0].cuts:
        assert cut.gain_dbi[0] == pytest.approx(cut.gain_dbi[-1], abs=0.011)
        assert cut.gain_dbi[np.abs(cut.theta) == 90.0] == pytest.approx(FLOOR)


def test_polarisations_add_up_to_the_whole(board: tuple[Portrait, Trial, PointResult]) -> None:
    """Powers of orthogonal polarisations add (IEEE Std 145); 0.01 dB of rounding, and nothing counts at the floor."""
    for cut in board[0].cuts:
        seen = cut.gain_dbi > FLOOR + 25.0
        whole = 10.0 * np.log10(np.sum(10.0 ** (0.1 * cut.part_dbi), axis=0))
        assert whole[seen] == pytest.approx(cut.gain_dbi[seen], abs=0.03)


def test_axial_ratio_is_that_of_the_circular_parts(circular: tuple[Portrait, Trial, PointResult]) -> None:
    """(R + L)/(R - L) of the two circular fields (IEEE Std 145), where rounding to 0.01 dB leaves it its digits."""
    for cut in circular[0].cuts:
        right, left = 10.0 ** (0.05 * cut.part_dbi)
        seen = (cut.gain_dbi > FLOOR + 20.0) & (cut.axial_ratio_db < 10.0) & np.all(cut.part_dbi > FLOOR, axis=0)
        assert np.count_nonzero(seen) > 50
        ratio = 20.0 * np.log10((right + left)[seen] / np.abs(right - left)[seen])
        assert ratio == pytest.approx(cut.axial_ratio_db[seen], abs=0.05)


def test_a_right_hand_board_is_right_handed_above_and_left_handed_below(
    circular: tuple[Portrait, Trial, PointResult],
) -> None:
    """A current sheet turns the same way for both sides, seen along propagation the other way round."""
    shown, _, _ = circular
    assert shown.parts == ("right-hand circular", "left-hand circular")
    for cut in shown.cuts:
        right, left = cut.part_dbi
        assert right[cut.theta == 0.0] > left[cut.theta == 0.0] + 10.0
        assert left[cut.theta == 180.0] > right[cut.theta == 180.0] + 10.0


def test_a_loop_fed_at_the_top_is_horizontal(linear: tuple[Portrait, Trial, PointResult]) -> None:
    """The board is its own mirror image in x and driven along x: in the plane x = 0 the field is along x alone."""
    shown, _, _ = linear
    assert shown.parts == ("horizontal, along x", "vertical, along y")
    across = next(cut for cut in shown.cuts if cut.azimuth == 90.0)
    along_x, along_y = across.part_dbi
    seen = across.gain_dbi > FLOOR + 20.0
    assert np.all(along_y[seen] < along_x[seen] - 25.0)


def test_nothing_is_below_a_reflector(brief: MakeBrief, library: Library) -> None:
    shown, _, centre = portrayed(
        plain(brief, "linear", surroundings={"reflector": {"distance": "40 mm"}}), library, modes=False
    )
    assert centre.gain_below_dbi is None
    for cut in shown.cuts:
        below = np.abs(cut.theta) > 90.0
        assert np.all(np.isnan(cut.gain_dbi) == below)
        assert np.all(np.isnan(cut.part_dbi) == below)
    assert shown.modes == ()


def test_currents_lie_on_the_drawn_copper(board: tuple[Portrait, Trial, PointResult]) -> None:
    """Area of the triangles that of the outlines, 2 % for chords instead of arcs; the largest current is 1."""
    shown, trial, _ = board
    (current,) = shown.currents
    assert current.level == "top"
    corners = current.points[current.triangles]
    (ax, ay), (bx, by) = (corners[:, i].T - corners[:, 0].T for i in (1, 2))
    drawn = sum(island.outline.area for island in trial.planned.layout.islands)
    assert 0.5 * np.sum(np.abs(ax * by - ay * bx)) == pytest.approx(drawn, rel=0.02)
    assert current.magnitude.max() == 1.0
    assert current.magnitude.min() >= 0.0


def test_power_goes_somewhere(board: tuple[Portrait, Trial, PointResult]) -> None:
    """Four shares rounded to 0.0001 each; what is guided is what lacks, cut off at 0: 1 % (see `field.result`)."""
    losses = board[0].losses
    total = losses.radiated + losses.guided + losses.dielectric + losses.copper
    assert total == pytest.approx(1.0, abs=0.01)
    assert losses.radiated > 0.5


def test_modes_of_a_ring_are_one_turned_by_a_quarter(linear: tuple[Portrait, Trial, PointResult]) -> None:
    """A circle has two full-wave modes of one resonance (symmetry); a source at the top drives the one along x."""
    first, second = linear[0].modes
    assert (first.orientation, second.orientation) == ("horizontal", "vertical")
    assert first.resonance == pytest.approx(second.resonance, rel=0.01)
    assert first.quality == pytest.approx(second.quality, rel=0.02)
    assert first.power_share > 0.9
    assert second.power_share < 0.05


def test_second_gap_splits_the_modes(circular: tuple[Portrait, Trial, PointResult]) -> None:
    """Circular polarisation is two modes of one power, one resonant below and one above the centre (principle of
    quadrature by detuning); both are driven."""
    shown, _, _ = circular
    low, high = sorted(mode.resonance or 0.0 for mode in shown.modes)
    assert low < shown.centre < high
    assert all(mode.power_share > 0.2 for mode in shown.modes)


def test_modes_of_the_other_sense_are_mirrored(
    circular: tuple[Portrait, Trial, PointResult], brief: MakeBrief, library: Library
) -> None:
    """The copper is the mirror image, and mirrored copper has the mirrored mesh."""
    design = make_design(plain(brief, "circular-left"), library, "x")
    left = loop_modes((design.choices, design.dimensions))
    for one, other in zip(circular[0].modes, left, strict=True):
        assert (one.resonance, one.quality, one.power_share) == (other.resonance, other.quality, other.power_share)
        mirrored = sorted(map(tuple, (other.current.points * (-1.0, 1.0) + 0.0).round(6).tolist()))
        assert sorted(map(tuple, (one.current.points + 0.0).round(6).tolist())) == mirrored


def test_file_reads_back_as_written(board: tuple[Portrait, Trial, PointResult], tmp_path: Path) -> None:
    shown, _, _ = board
    first, second = tmp_path / "field.json", tmp_path / "again.json"
    write_portrait(shown, first)
    back = read_portrait(first)
    write_portrait(back, second)
    assert first.read_bytes() == second.read_bytes()
    assert first.stat().st_size < LARGEST_FILE
    assert back.parts == shown.parts
    assert back.losses == shown.losses
    for one, other in zip(shown.cuts, back.cuts, strict=True):
        assert np.array_equal(one.part_dbi, other.part_dbi)
    for one, other in zip(shown.currents, back.currents, strict=True):
        assert np.array_equal(one.points, other.points)
        assert np.array_equal(one.magnitude, other.magnitude)


def test_solved_again_it_is_the_same_to_the_byte(
    linear: tuple[Portrait, Trial, PointResult], brief: MakeBrief, library: Library
) -> None:
    again, _, _ = portrayed(plain(brief, "linear"), library)
    assert json.dumps(portrait_facts(again)) == json.dumps(portrait_facts(linear[0]))


def test_no_field_leaves_a_hole_in_the_file(linear: tuple[Portrait, Trial, PointResult], tmp_path: Path) -> None:
    """JSON has no NaN (RFC 8259)."""
    shown, _, _ = linear
    cut = shown.cuts[0]
    empty = replace(cut, gain_dbi=np.where(np.abs(cut.theta) > 90.0, np.nan, cut.gain_dbi))
    path = tmp_path / "field.json"
    write_portrait(replace(shown, cuts=(empty,)), path)
    facts = json.loads(path.read_text(), parse_constant=lambda word: pytest.fail(f"{word} in JSON"))
    assert facts["cuts"][0]["gain_dbi"][0] is None
    assert np.isnan(read_portrait(path).cuts[0].gain_dbi[0])


@pytest.mark.parametrize("text", ["", "{}", "[1]", '{"centre_hz": 1, "parts": ["a", "b"], "losses": {}}'])
def test_other_files_are_refused(text: str, tmp_path: Path) -> None:
    path = tmp_path / "field.json"
    path.write_text(text)
    with pytest.raises(BriefError, match="field"):
        read_portrait(path)
    with pytest.raises(BriefError, match="field"):
        read_portrait(tmp_path / "none.json")

"""The cut table against boards solved one by one, and against what cutting must do.

Authority: the moment equations themselves (a board drawn without tabs is one whose tabs are all cut), another estimate
of a shift (the stretch of the frequency axis that makes two responses agree best), perturbation of a resonator, and
common practice, no source: tabs at a voltage maximum are capacitance, so that cutting them raises the frequency.
"""

from __future__ import annotations

import json
import math
from collections.abc import Callable
from pathlib import Path

import numpy as np
import pytest
from scipy.optimize import brentq, minimize_scalar

from planar.brief import Brief
from planar.copper.rules import fab_findings
from planar.design.choices import Choices, choose
from planar.design.design import Design, make_design
from planar.design.design_file import design_facts, read_design
from planar.design.first_order import first_dimensions
from planar.design.shift import comparing_effort, reflection, shift, shift_frequencies
from planar.design.sized import sized_design
from planar.design.trial import Trial, draw, solve_trial
from planar.design.trim import Cut, cut_table, end_step
from planar.design.variables import variables_of
from planar.design.workers import workers
from planar.errors import BriefError
from planar.library import Library
from planar.report.console import print_design

MakeBrief = Callable[..., Brief]
ANTENNAS = {
    "plain circle": ({"family": "plain"}, 100),
    "coplanar square": ({"family": "coplanar", "shape": "square"}, 100),
    "ring-guided open circle": ({"family": "ring-guided", "end": "open"}, 50),
}
MATCHED_RING = {
    "loop_width": 114.96, "trace_width": 8.3, "gap": 2.08, "feed_length": 6.4, "line_width": 3.6,
    "transformer_width": 0.36, "transformer_length": 39.49, "end_width": 3.6, "end_length": 56.58, "tab_length": 5.42,
    "tab_width": 2.17, "tab_spacing": 7.22,
}  # fmt: skip
"""mm, of a ring-guided loop matched at 866 MHz: an unmatched one answers with its line more than with its loop."""
ONE_LEVEL = ("plain circle", "coplanar square")
SHAPES = ("circle", "square", "rectangle")
REALISATIONS = (("plain", None), ("coplanar", None), ("ring-guided", "open"))


def trimmed(brief: MakeBrief, library: Library, antenna: dict[str, object], ohm: int, *, trim: bool = True) -> Choices:
    band = ["846 MHz", "886 MHz"]
    return choose(brief(target={"band": band, "impedance": f"{ohm} ohm"}, antenna=antenna | {"trim": trim}), library)


@pytest.fixture(scope="module")
def tables(brief: MakeBrief, library: Library) -> dict[str, tuple[Choices, dict[str, float], tuple[Cut, ...]]]:
    """Boards and their cut tables: first-order dimensions on one level, roughly matched, and the ring above."""
    found = {}
    with workers() as shared:
        for name, (antenna, ohm) in ANTENNAS.items():
            choices = trimmed(brief, library, antenna, ohm)
            dimensions, _ = first_dimensions(choices)
            if name not in ONE_LEVEL:
                dimensions = {key: MATCHED_RING[key] * 1e-3 for key in dimensions}
            found[name] = (choices, dimensions, cut_table(choices, dimensions, shared))
    return found


@pytest.fixture(scope="module")
def bare(tables, brief: MakeBrief, library: Library) -> dict[str, tuple[Trial, Trial]]:
    """The boards of the tables with their tabs, and drawn by a brief that knows no tabs, solved one by one."""
    found = {}
    for name in ONE_LEVEL:
        antenna, ohm = ANTENNAS[name]
        choices, dimensions, _ = tables[name]
        none = trimmed(brief, library, antenna, ohm, trim=False)
        rest = {key: value for key, value in dimensions.items() if not key.startswith("tab_")}
        effort = comparing_effort(choices.centre)
        found[name] = (solve_trial(choices, dimensions, effort), solve_trial(none, rest, effort))
    return found


@pytest.mark.parametrize("name", ANTENNAS)
def test_every_further_pair_raises_the_frequency_further(name, tables):
    whole, *tabs = tables[name][2][:4]
    assert (whole.hz, whole.removed) == (0.0, 0.0)
    assert "whole board" in whole.name
    assert [cut.name.split()[0] for cut in tabs] == ["upper", "upper", "all"]
    shifts = [cut.hz for cut in tabs]
    assert 0.0 < shifts[0] < shifts[1] < shifts[2]
    # a tab is a hundredth of a wavelength long: all six move the frequency by a few per cent at most
    assert shifts[2] < 0.04 * tables[name][0].centre
    assert [cut.best_match_hz for cut in (whole, *tabs)] == sorted(cut.best_match_hz for cut in (whole, *tabs))


def test_removed_copper_is_that_of_the_tabs(tables):
    _, dimensions, cuts = tables["coplanar square"]
    pair = 2.0 * dimensions["tab_length"] * dimensions["tab_width"]
    removed = [cut.removed for cut in cuts]
    assert removed == pytest.approx([0.0, pair, 2.0 * pair, 3.0 * pair], rel=1e-5)  # snapped to nanometres


@pytest.mark.parametrize("name", ONE_LEVEL)
def test_all_tabs_cut_is_the_board_drawn_without_tabs(name, tables, bare):
    choices, _, cuts = tables[name]
    last = next(cut for cut in cuts if cut.name.startswith("all"))
    with_tabs, without = (trial.band for trial in bare[name])
    port, (low, high) = choices.brief.target.impedance, choices.brief.target.band
    places = shift_frequencies(choices.centre)
    hz = choices.centre * shift(with_tabs.impedance(places), without.impedance(places), port)
    # the same copper; edges may start elsewhere along the outline and rounding differ by a grid step
    assert last.hz == pytest.approx(hz, rel=0.01)
    span = np.linspace(*comparing_effort(choices.centre).span, 2001)
    best = span[np.argmin(np.abs(reflection(without.impedance(span), port)))]
    assert last.best_match_hz == pytest.approx(best, rel=5e-4)  # two grids of frequencies
    worst = np.max(np.abs(reflection(without.impedance(np.linspace(low, high, 41)), port)))
    assert last.worst_reflection_db == pytest.approx(20.0 * math.log10(worst), abs=0.02)


@pytest.mark.parametrize("name", ONE_LEVEL)
def test_shift_makes_the_two_responses_agree_best(name, tables, bare):
    choices, _, cuts = tables[name]
    last = next(cut for cut in cuts if cut.name.startswith("all"))
    with_tabs, without = (trial.band for trial in bare[name])
    port, span = choices.brief.target.impedance, choices.centre * np.linspace(0.94, 1.06, 49)
    target = reflection(without.impedance(span), port)

    def apart(stretch: float) -> float:
        return float(np.sum(np.abs(reflection(with_tabs.impedance(span * (1.0 - stretch)), port) - target) ** 2))

    stretch = minimize_scalar(apart, bounds=(-0.05, 0.05), method="bounded", options={"xatol": 1e-6}).x
    # one estimate moves the response, the other stretches it, by 2 % at most over 12 % of the frequency; what is left
    # after either is a change of impedance, which weighs differently in the two
    assert last.hz == pytest.approx(choices.centre * stretch, rel=0.05)


def test_resonance_of_the_plain_loop_moves_as_a_widened_trace_would_make_it(tables, bare):
    """Extra charge where the voltage is highest: perturbation of a resonator (Slater 1946, from memory).

    Taken for a trace as wide as the tabs reach, over the stretch they stand on, they raise the capacitance a length
    there by ln(w2 / w1) / (ln(8 R / a) - 2), a = w1 / 4 (thin ring with the charge of its first mode, King & Harrison
    1969, from memory), and lower the frequency by half of that times the stretch over the half of the loop that the
    voltage fills. Tabs leave gaps, so this is the most; a third of it is the least tabs so close together can do.
    """
    choices, dimensions, cuts = tables["plain circle"]
    low, high = comparing_effort(choices.centre).span

    def resonance(trial: Trial) -> float:
        return float(brentq(lambda f: trial.band.impedance(np.array([f]))[0].imag, low, high))

    with_tabs, without = (resonance(trial) for trial in bare["plain circle"])
    narrow, radius = dimensions["trace_width"], 0.5 * dimensions["loop_width"]
    wider = math.log(1.0 + dimensions["tab_length"] / narrow) / (math.log(8.0 * radius / (0.25 * narrow)) - 2.0)
    stretch = 2.0 * 3.0 * dimensions["tab_spacing"]
    most = 0.5 * wider * stretch / (math.pi * radius)
    assert most / 3.0 < without / with_tabs - 1.0 < most
    # the reflection moves less than the resonance: it holds the reactance of the other modes, which stay
    assert cuts[3].hz == pytest.approx(without - with_tabs, rel=0.25)
    assert cuts[3].hz < without - with_tabs


def test_open_end_moves_as_the_solver_says(tables):
    choices, dimensions, cuts = tables["ring-guided open circle"]
    ends = [cut for cut in cuts if cut.name.startswith("line end")]
    assert [cut.name for cut in ends] == [f"line end shortened by {mm} mm" for mm in (1, 2, 4)]
    assert [cut.removed for cut in ends] == pytest.approx(
        [mm * 1e-3 * dimensions["end_width"] for mm in (1, 2, 4)], rel=1e-3
    )
    effort, port = comparing_effort(choices.centre), choices.brief.target.impedance
    band = solve_trial(choices, dict(dimensions) | {"end_length": dimensions["end_length"] - 4e-3}, effort).band
    span = np.linspace(*effort.span, 2001)
    best = span[np.argmin(np.abs(reflection(band.impedance(span), port)))]
    assert ends[2].best_match_hz == pytest.approx(best, rel=5e-4)  # two grids of frequencies
    assert math.copysign(1.0, ends[2].hz) == math.copysign(1.0, best - cuts[0].best_match_hz)
    sizes = [abs(cut.hz) for cut in ends]
    assert sizes == sorted(sizes)
    assert len({math.copysign(1.0, cut.hz) for cut in ends}) == 1
    # small cuts are in proportion: twice the cut, twice the shift, within the mesh's own error
    assert ends[1].hz == pytest.approx(2.0 * ends[0].hz, rel=0.2)


@pytest.mark.parametrize(
    ("mhz", "mm"), [(900, 1.0), (866.5, 1.0), (433, 2.0), (137, 5.0), (2440, 0.5), (5800, 0.2), (24000, 0.05)]
)
def test_least_cut_of_an_end_is_a_round_length_near_a_third_of_a_per_cent_of_the_wavelength(mhz, mm):
    assert end_step(mhz * 1e6) == pytest.approx(mm * 1e-3, rel=1e-12)
    assert 0.5 < end_step(mhz * 1e6) / (0.003 * 299_792_458.0 / (mhz * 1e6)) < 2.0


def test_without_tabs_there_is_no_table(brief, library):
    choices = choose(brief(antenna={"family": "plain"}), library)
    dimensions, _ = first_dimensions(choices)
    assert not any(name.startswith("tab_") for name in dimensions)
    with workers(1) as alone:
        assert cut_table(choices, dimensions, alone) == ()


@pytest.mark.parametrize("shape", SHAPES)
@pytest.mark.parametrize(("family", "end"), REALISATIONS)
def test_first_tabs_can_be_made_on_every_loop(family, end, shape, brief, library):
    ohm = 50 if family == "ring-guided" else 100
    antenna = {"family": family, "shape": shape} | ({} if end is None else {"end": end})
    choices = trimmed(brief, library, antenna, ohm)
    dimensions, _ = first_dimensions(choices)
    wavelength = 299_792_458.0 / choices.centre
    # the loop is a wavelength round within a sixth, and the tabs are in proportion to it
    for name, share in (("tab_length", 0.015), ("tab_width", 0.006), ("tab_spacing", 0.02)):
        assert dimensions[name] == pytest.approx(share * wavelength, rel=0.17)
    assert not [f for f in fab_findings(draw(choices, dimensions).layout, choices.fab) if f.severity == "refuse"]


def test_tabs_are_no_finer_than_the_fab_etches(brief, library):
    made = brief(
        target={"band": ["24.0 GHz", "24.25 GHz"], "impedance": "100 ohm"},
        antenna={"family": "plain", "trim": True},
        board={"laminate": "ptfe-glass-2-2", "thickness": "0.25 mm"},
    )
    choices = choose(made, library)
    dimensions, _ = first_dimensions(choices)
    fab = choices.fab
    assert min(dimensions["tab_width"], dimensions["tab_length"]) >= max(fab.min_track, fab.min_gap)
    assert dimensions["tab_spacing"] - dimensions["tab_width"] >= 2.0 * fab.min_gap


def test_tabs_follow_the_loop_and_are_not_sized(brief, library):
    choices = trimmed(brief, library, {"family": "plain", "shape": "square"}, 100)
    dimensions, _ = first_dimensions(choices)
    variables = variables_of(choices, dimensions)
    assert not any(name.startswith("tab_") for name in variables.names)
    step = np.zeros(len(variables.names))
    step[0] = 0.4  # the loop, by exp(0.25 * 0.4)
    moved = variables.dimensions(step)
    for name in ("loop_width", "tab_length", "tab_width", "tab_spacing"):
        assert moved[name] == pytest.approx(dimensions[name] * math.exp(0.1), abs=1.1e-5), name  # the drawing step


def given(brief: MakeBrief, **changed: str) -> Brief:
    dimensions = {"loop_width": "100 mm", "trace_width": "3 mm", "gap": "2 mm"} | changed
    antenna = {"family": "plain", "trim": True, "dimensions": dimensions}
    return brief(target={"impedance": "100 ohm", "match": "-6 dB"}, antenna=antenna)


def test_given_dimensions_may_leave_the_tabs_out_or_state_them(brief, library):
    left_out = make_design(given(brief), library, "a.toml").dimensions
    assert left_out["tab_length"] == pytest.approx(0.015 * math.pi * 100e-3, abs=1e-5)
    stated = make_design(given(brief, tab_length="3 mm"), library, "a.toml").dimensions
    assert stated["tab_length"] == pytest.approx(3e-3, rel=1e-12)
    antenna = {"family": "plain", "dimensions": {"loop_width": "100 mm", "tab_length": "3 mm"}}
    untrimmed = brief(antenna=antenna)
    with pytest.raises(BriefError, match="no such dimension"):
        make_design(untrimmed, library, "a.toml")


@pytest.fixture(scope="module")
def design(brief: MakeBrief, library: Library) -> Design:
    return sized_design(given(brief), library, "a.toml")


def test_design_carries_its_cut_table(design):
    assert [cut.name.split()[0] for cut in design.cuts] == ["nothing,", "upper", "upper", "all"]
    (finding,) = [finding for finding in design.findings if finding.rule == "trimming"]
    assert "cut half of the computed amount" in finding.advice
    assert f"{design.cuts[3].hz / 1e6:+.3g} MHz by the tabs" in finding.got
    facts = design_facts(design)["cuts"]
    assert set(facts[0]) == {"cut", "removed_mm2", "shift_hz", "best_match_hz", "worst_reflection_db"}
    assert [fact["shift_hz"] for fact in facts] == pytest.approx([cut.hz for cut in design.cuts], rel=1e-6)


def test_design_file_gives_back_copper_with_tabs(design: Design, library: Library, tmp_path: Path):
    path = tmp_path / "design.json"
    path.write_text(json.dumps(design_facts(design)))
    again = read_design(path, library)
    assert again.choices.brief.antenna.trim
    for one, other in zip(design.layout.islands, again.layout.islands, strict=True):
        assert np.array_equal(one.outline.vertices, other.outline.vertices)


def test_table_is_printed(design, capsys):
    print_design(design)
    lines = capsys.readouterr().out.splitlines()
    (row,) = [line for line in lines if line.startswith("upper and middle pair of tabs")]
    assert f"{design.cuts[2].hz / 1e6:+.3f}" in row.split()

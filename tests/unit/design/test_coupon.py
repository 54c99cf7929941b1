"""The measuring board sized for a design: it can be made; widths and expectations follow from published formulas."""

import itertools
import math
import re
from typing import Any

import numpy as np
import pytest
import skrf
from scipy.linalg import eigh
from scipy.optimize import brentq
from skrf.media import MLine

from planar.brief import Brief, check_brief
from planar.copper.layout import Level
from planar.copper.lettering import lettered
from planar.design.choices import Choices, choose
from planar.design.coupon import Coupon, design_coupon
from planar.design.coupon_sheet import coupon_sheet
from planar.design.line_size import design_lines, line_settings
from planar.errors import RangeError, SynthesisError
from planar.handoff.gerber_content import gerber_files
from planar.library import Library
from planar.lines.ring_resonator import gap_capacitance, largest_pull, planar_width, ring_wavenumber
from planar.pipeline.board_files import gerber_facts

LIBRARY = Library.open()
BOARDS = [
    ("fr4-general", "0.8 mm"),
    ("fr4-general", "1.0 mm"),
    ("fr4-general", "1.6 mm"),
    ("ceramic-ptfe-10-2", "0.635 mm"),
]
BANDS = {"fr4-general": ("863 MHz", "870 MHz")}


def small(**tables: dict[str, Any]) -> Brief:
    data: dict[str, Any] = {
        "name": "small",
        "target": {"band": ["2.4 GHz", "2.5 GHz"]},
        "board": {"laminate": "fr4-general", "thickness": "1.6 mm"},
    }
    for table, keys in tables.items():
        data[table] = data.get(table, {}) | keys
    return check_brief(data, "small.toml", LIBRARY)


def chosen(**tables: dict[str, Any]) -> Choices:
    return choose(small(**tables), LIBRARY)


@pytest.fixture(scope="module")
def coupon() -> Coupon:
    return design_coupon(chosen(), (), library=LIBRARY)


def end_names(made: Coupon) -> int:
    """Strokes of the legend in front of open, short and load."""
    low = made.dimensions["launch_depth"] + 1.9e-3
    boxes = [marking.outline.bounds for marking in made.layout.legend if marking.level is Level.TOP]
    return sum(low < y0 and y1 < low + 1.4e-3 for _, y0, _, y1 in boxes)


@pytest.mark.parametrize("fab", ["pool-two-layer", "fine-two-layer"])
@pytest.mark.parametrize(("laminate", "thickness"), BOARDS)
def test_fabs_can_make_it(laminate: str, thickness: str, fab: str) -> None:
    """No finding at all, and within the price step of 100 mm by 100 mm; aimed at is 100 mm by 80 mm."""
    band = list(BANDS.get(laminate, ("2.4 GHz", "2.5 GHz")))
    brief = {"target": {"band": band}, "board": {"laminate": laminate, "thickness": thickness}, "make": {"fab": fab}}
    made = design_coupon(chosen(**brief), (), library=LIBRARY)
    assert made.findings == ()
    assert end_names(made) == sum(
        len(lettered(t, (0.0, 0.0), 2e-3, stroke=2e-4)) for t in ("OPEN", "SHORT", "LOAD 2X100")
    )
    width, height = made.layout.size
    assert width <= 100.001e-3
    assert height <= 80.001e-3
    nearest = min(made.resonances, key=lambda r: abs(r.frequency - made.centre))
    assert abs(nearest.frequency / made.centre - 1.0) < 0.5


def test_lines_are_50_ohm(coupon: Coupon) -> None:
    """By scikit-rf's coding of Hammerstad & Jensen and Kirschning & Jansen."""
    line, f = coupon.line, np.array([coupon.centre])
    eps = coupon.laminate.model.permittivity(coupon.centre).real
    media = MLine(
        skrf.Frequency.from_f(f, unit="Hz"), w=line.width, h=line.height, t=line.conductor.thickness, ep_r=eps,
        tand=0.0, diel="frequencyinvariant", disp="kirschningjansen",
    )  # fmt: skip
    assert float(media.z0_characteristic.real[0]) == pytest.approx(50.0, rel=2e-3)
    row = next(p for p in coupon.phases if p.frequency == coupon.centre)
    assert row.phase == pytest.approx(float(media.gamma.imag[0]) * coupon.length_difference, rel=1e-3)


def test_one_resonance_lies_in_the_band(coupon: Coupon) -> None:
    """n guided wavelengths round the middle, curvature apart (Troughton 1969)."""
    found = next(r for r in coupon.resonances if r.order == coupon.order)
    low, high = (2.4e9, 2.5e9)
    assert low < found.frequency < high
    wave = 299_792_458.0 / (found.frequency * math.sqrt(found.eps_eff))
    assert 2.0 * math.pi * coupon.ring.radius / wave == pytest.approx(coupon.order, rel=0.01)


def test_design_with_a_line_gets_it_as_impedance_trace() -> None:
    choices = chosen(antenna={"family": "ring-guided"})
    drawn = {"trace_width": 8e-3, "line_width": 2.2e-3, "transformer_width": 0.5e-3}
    lines = design_lines(drawn, choices, line_settings(choices))
    made = design_coupon(choices, lines, library=LIBRARY)
    assert made.dimensions["trace_width"] == 2.2e-3
    assert made.trace_impedance == pytest.approx(lines[0].line.impedance)


def test_one_level_design_gets_a_two_level_coupon() -> None:
    """And is told that it is a board of its own, with a coax."""
    choices = chosen(antenna={"family": "coplanar"}, target={"impedance": "100 ohm"})
    made = design_coupon(choices, (), library=LIBRARY)
    assert len(made.layout.levels) == 2
    assert made.stackup.levels == ("bottom", "top")
    assert any("board of its own" in note for note in made.notes)
    assert not made.connector.balanced


def test_coupon_of_a_one_level_design_has_its_own_masked_sides() -> None:
    """Mask on both sides, as the fab offers: the bottom has lands, so a mask file that opens them."""
    made = design_coupon(chosen(antenna={"family": "plain"}), (), library=LIBRARY)
    facts = gerber_facts("small-coupon", "0" * 64, made.masked, via_ring=made.dimensions["via_ring"])
    names = {file.name for file in gerber_files(made.layout, facts)}
    assert {"copper-top.gbr", "copper-bottom.gbr", "mask-top.gbr", "mask-bottom.gbr"} <= names


def test_one_level_fab_is_refused() -> None:
    choices = chosen(make={"fab": "milled-single-sided"}, target={"impedance": "100 ohm"})
    with pytest.raises(SynthesisError, match="a fab with two copper levels"):
        design_coupon(choices, (), library=LIBRARY)


def test_sheet_holds_the_expected_numbers(coupon: Coupon) -> None:
    sheet = coupon_sheet(coupon, design="outputs/small")
    for r in coupon.resonances:
        assert f"| {r.order} | " in sheet
    assert "planar coupon outputs/small --measured ring.s2p" in sheet
    assert all(name in sheet for name in ("Troughton", "Wolff & Knoppik", "Marks", "Kirschning & Jansen"))
    assert sheet == coupon_sheet(coupon, design="outputs/small")


def test_formula_of_the_sheet_gives_its_own_resonance(coupon: Coupon) -> None:
    """r and K_1 as printed, c = 299.792458 mm GHz, into n c / (2 pi r f) K: the effective permittivity it lists."""
    sheet = coupon_sheet(coupon, design="small")
    drawn, bend = re.findall(r"r = (\S+) mm, K_1 = (\S+)", sheet)[0]
    first = coupon.resonances[0]
    wave = 299.792458 * float(bend) / (2.0 * math.pi * float(drawn) * first.frequency * 1e-9)
    assert wave**2 == pytest.approx(first.eps_eff, rel=2e-4)  # four decimals of K


@pytest.mark.parametrize("order", [1, 2, 4])
@pytest.mark.parametrize("width", [0.5e-3, 3e-3, 6e-3])
def test_curved_ring_against_finite_elements(order: int, width: float) -> None:
    """The radial equation (rho R')'/rho - n^2 R/rho^2 + k^2 R = 0 with magnetic walls, in 400 linear elements."""
    radius, count = 20e-3, 400
    nodes = np.linspace(radius - 0.5 * width, radius + 0.5 * width, count + 1)
    stiff, mass = np.zeros((count + 1, count + 1)), np.zeros((count + 1, count + 1))
    for i, (a, b) in enumerate(itertools.pairwise(nodes)):
        step, middle = b - a, 0.5 * (a + b)
        stiff[i : i + 2, i : i + 2] += middle / step * np.array([[1.0, -1.0], [-1.0, 1.0]])
        share = step / 6.0 * np.array([[2.0, 1.0], [1.0, 2.0]])
        stiff[i : i + 2, i : i + 2] += order**2 / middle * share
        mass[i : i + 2, i : i + 2] += middle * share
    lowest = float(eigh(stiff, mass, subset_by_index=[0, 0], eigvals_only=True)[0])
    assert ring_wavenumber(order, radius, width) == pytest.approx(math.sqrt(lowest), rel=1e-6)


def test_narrow_ring_is_n_wavelengths_round() -> None:
    """The limit of Troughton 1969; the next term is w^2/(24 r^2) for small n."""
    assert ring_wavenumber(3, 0.02, 2e-5) == pytest.approx(150.0, rel=1e-6)
    assert ring_wavenumber(1, 0.02, 2e-3) == pytest.approx(50.0 * (1.0 + 0.1**2 / 24.0), rel=2e-6)
    with pytest.raises(RangeError, match="ring width"):
        ring_wavenumber(1, 0.02, 0.011)


def test_planar_width_in_air_is_the_strip_of_the_same_capacitance() -> None:
    """In air without fringing eta0 h/Z = w: exact limit."""
    assert planar_width(1e-3, 376.730313412 / 5.0, 1.0) == pytest.approx(5e-3, rel=1e-9)


def test_gap_capacitance_falls_with_the_gap() -> None:
    values = [gap_capacitance(1.0e-3, 0.635e-3, 9.6, gap * 1e-3) for gap in (0.1, 0.2, 0.4, 0.8)]
    assert all(a > b > 0.0 for a, b in itertools.pairwise(values))


def test_pull_is_that_of_a_circuit() -> None:
    """Two series capacitances into 50 ohm at a closed line one wave round: root of the nodal susceptance.

    Both halves of the ring join the nodes; with opposite voltages each node sees 2 (coth - csch) of half the way round
    (Pozar, 3rd ed., table 4.2) and its own coupling.
    """
    impedance, capacitance, uncoupled = 50.0, 20e-15, 2e9

    def susceptance(f: float) -> float:
        theta, omega = math.pi * f / uncoupled, 2.0 * math.pi * f
        coupling = 1j * omega * capacitance / (1.0 + 1j * omega * capacitance * impedance)
        return -2.0 / (impedance * math.tan(0.5 * theta)) + coupling.imag

    resonance = float(brentq(susceptance, 0.9 * uncoupled, uncoupled * (1.0 - 1e-9)))
    strength = 2.0 * math.pi * uncoupled * capacitance * impedance
    assert 1.0 - resonance / uncoupled == pytest.approx(largest_pull(1, math.pi / strength**2), rel=0.01)

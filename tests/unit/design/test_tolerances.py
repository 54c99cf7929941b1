"""What varies on made boards: laws against scipy's, ranges against the library, etching against plane geometry.

Authorities: scipy.stats for truncated normal and triangular laws; a polygon shrunk by shapely for what etching does to
copper; the tolerances written in the shipped files.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
import pytest
from scipy import stats
from shapely import box, union_all

from planar.brief import Brief
from planar.copper.layout import Level
from planar.design.choices import Choices, choose
from planar.design.first_order import first_dimensions
from planar.design.tolerances import LAWS, Quantity, board_with, etched, left_off, varied_quantities
from planar.design.trial import draw
from planar.library import Library
from planar.stackup import LayerKind, loss_tangent

MakeBrief = Callable[..., Brief]
U = np.linspace(0.0005, 0.9995, 201)
COVERED = {"cover": {"material": "abs", "air_gap": "6 mm", "thickness": "2.5 mm"}}


@dataclass(frozen=True)
class Board:
    """Choices and first dimensions of a brief: nothing here needs more of a design."""

    choices: Choices
    dimensions: dict[str, float]

    @classmethod
    def of(cls, brief: Brief, library: Library) -> Board:
        choices = choose(brief, library)
        return cls(choices, first_dimensions(choices)[0])

    @property
    def named(self) -> dict[str, Quantity]:
        return {each.name: each for each in varied_quantities(self.choices, self.dimensions)}

    def moved(self, quantities: Sequence[Quantity], **deviations: float) -> Any:
        """Stackup and dimensions with quantities (spaces as underscores) at deviations over their scales."""
        places = [deviations.get(each.name.replace(" ", "_"), 0.0) for each in quantities]
        choices, dimensions = board_with(self.choices, self.dimensions, quantities, np.array(places))
        return choices.stackup, dimensions

    def edges(self) -> dict[str, int]:
        """Edges by which each dimension grows where every edge recedes by 20 um."""
        found = etched(self.choices, self.dimensions, 20e-6)
        return {name: round((found[name] - old) / 20e-6) for name, old in self.dimensions.items()}


@pytest.mark.parametrize(
    ("law", "ends", "known"),
    [
        ("truncated-normal", (-1.0, 1.0), stats.truncnorm(-2.0, 2.0, scale=0.5)),
        ("uniform", (-1.0, 0.5), stats.uniform(-1.0, 1.5)),
        ("triangular", (-1.0, 0.4), stats.triang(1.0 / 1.4, loc=-1.0, scale=1.4)),
    ],
)
def test_laws_are_those_of_scipy(law: str, ends: tuple[float, float], known: Any) -> None:
    assert LAWS[law](U, ends) == pytest.approx(known.ppf(U), abs=1e-12)


def test_either_end_is_half_and_half() -> None:
    found = LAWS["either-end"](U, (0.0, 1.0))
    assert set(found) == {0.0, 1.0}
    assert abs(found.mean() - 0.5) < 0.005


def test_ranges_are_those_of_the_library(brief: MakeBrief, library: Library) -> None:
    """FR-4 5, 20, 10, 50 %; pool: 0.05 mm an edge, mask 25 um + 40 % and down to nothing, hole 0.1 mm; ABS 10 %."""
    asked = brief(antenna={"family": "ring-guided", "end": "via"}, surroundings=COVERED)
    found = Board.of(asked, library).named
    sides = {name: (q.low / q.nominal, q.high / q.nominal) for name, q in found.items() if q.nominal}
    assert sides["laminate permittivity"] == pytest.approx((0.95, 1.05))
    assert sides["laminate loss tangent"] == pytest.approx((0.8, 1.2))
    assert sides["dielectric thickness"] == pytest.approx((0.9, 1.1))
    assert sides["copper roughness"] == pytest.approx((0.5, 1.5))
    assert sides["mask thickness"] == pytest.approx((0.0, 1.4))
    assert sides["via drill"] == pytest.approx((2 / 3, 4 / 3))
    assert sides["cover permittivity"] == pytest.approx((0.9, 1.1))
    assert (found["etch bias per edge"].low, found["etch bias per edge"].high) == pytest.approx((-5e-5, 5e-5))
    assert (found["cover gap"].low, found["cover gap"].high) == pytest.approx((5.5e-3, 6.5e-3))
    assert all(each.source for each in found.values())


def test_only_what_is_there_varies(brief: MakeBrief, library: Library) -> None:
    bare = Board.of(brief(antenna={"family": "plain"}, board={"mask": "none"}), library).named
    assert not [name for name in bare if name.split()[0] in {"mask", "cover", "via", "reflector"}]
    backed = Board.of(brief(antenna={"family": "plain"}, surroundings={"reflector": {"distance": "40 mm"}}), library)
    assert backed.named["reflector distance"].nominal == pytest.approx(40e-3)


def test_a_cover_that_touches_can_only_leave(brief: MakeBrief, library: Library) -> None:
    touching = {"cover": {"material": "abs", "air_gap": "0 mm", "thickness": "2.5 mm"}}
    design = Board.of(brief(antenna={"family": "plain"}, surroundings=touching), library)
    gap = design.named["cover gap"]
    assert gap.ends == (0.0, 1.0)
    stackup, _ = design.moved([gap], cover_gap=1.0)
    kinds = [layer.kind for layer in stackup.layers]
    assert kinds.index(LayerKind.AIR) == kinds.index(LayerKind.COVER) - 1
    assert stackup.find("cover-gap").thickness == pytest.approx(0.5e-3)


def test_values_reach_the_stackup(brief: MakeBrief, library: Library) -> None:
    asked = brief(antenna={"family": "ring-guided", "end": "via"}, surroundings=COVERED)
    design = Board.of(asked, library)
    quantities = [*varied_quantities(design.choices, design.dimensions), *left_off(design.choices)]
    by_name = {each.name: each for each in quantities}
    centre = design.choices.centre
    ends = {"laminate_permittivity": 1.0, "laminate_loss_tangent": -1.0, "mask_thickness": -1.0, "cover_gap": -1.0}
    stackup, dimensions = design.moved(quantities, **ends, copper_roughness=1.0, via_drill=1.0)
    eps = stackup.substrate.permittivity(centre)
    assert eps.real == pytest.approx(by_name["laminate permittivity"].high)
    assert loss_tangent(eps) == pytest.approx(by_name["laminate loss tangent"].low)
    assert [stackup.find(f"mask-{side}").thickness for side in ("bottom", "top")] == [0.0, 0.0]
    assert stackup.find("cover-gap").thickness == pytest.approx(5.5e-3)
    assert stackup.conductor.roughness_rq == pytest.approx(1.5e-6)
    old = design.dimensions
    assert dimensions["via_drill"] == pytest.approx(0.4e-3)  # in the same pad
    pads = [each["via_drill"] + 2.0 * each["via_ring"] for each in (old, dimensions)]
    assert pads[0] == pytest.approx(pads[1])
    off, _ = design.moved(quantities, cover_left_off=1.0, cover_permittivity=1.0)
    assert off.find("cover").permittivity(centre) == pytest.approx(1.0)


HAND = {
    "plain": {"trace_width": -2, "gap": 2, "second_gap": 2},
    "coplanar": {
        "trace_width": -2,
        "strip_width": -2,
        "strip_gap": 2,
        "pad_width": -2,
        "pad_length": -2,
        "second_gap": 2,
    },
    "ring-guided": {
        "trace_width": -2,
        "gap": 2,
        "line_width": -2,
        "transformer_width": -2,
        "transformer_length": 1,
        "end_width": -2,
        "end_length": -1,
        "second_gap": 2,
    },
}
"""Edges by which each dimension grows, counted on a drawing; all others keep their value."""


@pytest.fixture(scope="module", params=HAND)
def circular(request: pytest.FixtureRequest, brief: MakeBrief, library: Library) -> Board:
    family = request.param
    ohm = {"plain": "330 ohm", "coplanar": "75 ohm", "ring-guided": "50 ohm"}[family]
    antenna = {"family": family} | ({"end": "open"} if family == "ring-guided" else {})
    asked = brief(target={"impedance": ohm, "polarisation": "circular-left"}, antenna=antenna)
    return Board.of(asked, library)


def test_etching_moves_dimensions_by_their_edges(circular: Board) -> None:
    assert {name: edges for name, edges in circular.edges().items() if edges} == HAND[circular.choices.family.key]


def test_a_via_stays_where_it_is(brief: MakeBrief, library: Library) -> None:
    """The end of the line is then the via's centre; its ring loses one edge."""
    grown = Board.of(brief(antenna={"family": "ring-guided", "end": "via"}), library).edges()
    assert (grown["end_length"], grown["via_drill"], grown["via_ring"]) == (0, 0, -1)


@pytest.mark.parametrize("bias", [50e-6, -50e-6])
def test_etched_dimensions_draw_the_copper_with_every_edge_moved(circular: Board, bias: float) -> None:
    """Shrinking the drawn copper with shapely moves every edge; away from the connector, whose lands are a part's and
    not etched by name, what differs is less than 0.1 % of what moved: corners of round copper. The line's step in the
    middle of the gap recedes too and no dimension says so, which is 0.4 % of a line."""
    drawn, smaller = (
        draw(circular.choices, dimensions, lettered_board=False).layout
        for dimensions in (circular.dimensions, etched(circular.choices, circular.dimensions, bias))
    )
    connected = circular.choices.family.key == "ring-guided"
    for level in drawn.levels:
        before, after = (
            union_all([i.outline.shape(1e-7) for i in layout.islands if i.level is level])
            for layout in (drawn, smaller)
        )
        x0, y0, x1, y1 = before.bounds
        away = box(x0 - 1.0, y0 + (0.2 * (y1 - y0) if connected else -1.0), x1 + 1.0, y1 + 1.0)
        wanted = before.buffer(-bias, join_style="mitre").intersection(away)
        changed = wanted.symmetric_difference(before.intersection(away)).area
        left = 0.009 if connected and level is Level.TOP else 0.001
        assert wanted.symmetric_difference(after.intersection(away)).area < left * changed

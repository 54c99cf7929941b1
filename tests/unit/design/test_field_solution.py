"""A design handed to the field solver: the bare loop, what is refused, what is said.

Authority: the sense of circular polarisation of the design (IEEE Std 145), solved with the fields; the rest
are definitions.
"""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
import pytest

from planar.brief import Brief
from planar.copper.layout import Level, Role
from planar.design.bare_loop import bare_loop_layout
from planar.design.design import Design, make_design
from planar.field.far_field import far_field
from planar.field.mesh import MeshSettings
from planar.field.solver import FieldProblem
from planar.library import Library

MakeBrief = Callable[..., Brief]
UP = np.array([1e-6])


def solved_sense(design: Design, step: float) -> tuple[str, float]:
    """Sense and axial ratio (dB) toward the top at the middle of the band."""
    problem = FieldProblem.prepare(design.layout, design.choices.stackup, design.choices.centre, MeshSettings(step))
    field = far_field(problem.solve(design.choices.centre).radiator, UP, np.zeros(1))
    return field.sense(0), float(field.axial_ratio_db[0])


@pytest.mark.parametrize("sense", ["right", "left"])
def test_plain_circular_loop_has_the_sense_asked_for(brief: MakeBrief, library: Library, sense: str) -> None:
    """Starting values give an axial ratio below 3 dB (a rough search: 86 to 88 degrees, FR-4 4.3, 1.6 mm)."""
    asked = brief(target={"impedance": "330 ohm", "polarisation": f"circular-{sense}"}, antenna={"family": "plain"})
    solved, ratio = solved_sense(make_design(asked, library, "x"), 20e-3)
    assert solved == sense
    assert ratio < 3.0


@pytest.mark.parametrize("sense", ["right", "left"])
def test_guided_circular_loop_has_the_sense_asked_for(brief: MakeBrief, library: Library, sense: str) -> None:
    asked = brief(target={"polarisation": f"circular-{sense}"}, antenna={"family": "ring-guided", "end": "open"})
    solved, ratio = solved_sense(make_design(asked, library, "x"), 16e-3)
    assert solved == sense
    assert ratio < 6.0


def test_bare_loop_has_no_line_and_a_port_across_its_gap(brief: MakeBrief, library: Library) -> None:
    design = make_design(brief(antenna={"family": "ring-guided", "end": "via"}), library, "x")
    bare = bare_loop_layout(design.choices, design.dimensions, design.layout)
    assert bare.levels == (Level.BOTTOM,)
    assert [island.role for island in bare.islands] == [Role.RADIATOR]
    (port,) = bare.ports
    assert (port.kind, port.length, port.width) == ("gap", design.dimensions["gap"], design.dimensions["trace_width"])
    problem = FieldProblem.prepare(bare, design.choices.stackup, design.choices.centre, MeshSettings(16e-3))
    assert problem.mesh.source.any()


def test_bare_loop_of_a_plain_board_is_the_board(brief: MakeBrief, library: Library) -> None:
    """A board without a line is its own bare loop: the same copper, another origin, so 1e-6."""
    design = make_design(brief(antenna={"family": "plain"}), library, "x")
    centre, settings = design.choices.centre, MeshSettings(20e-3, crossed=True)
    board, bare = (
        FieldProblem.prepare(layout, design.choices.stackup, centre, settings).solve(centre).impedance
        for layout in (design.layout, bare_loop_layout(design.choices, design.dimensions, design.layout))
    )
    assert abs(bare - board) < 1e-6 * abs(board)

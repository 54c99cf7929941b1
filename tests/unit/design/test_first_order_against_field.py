"""What first-order sizing promises, held against the field solution of the very copper it draws.

Authority: the field solver, itself held against published values in tests/published; the promise is the
frequency error each family states.
"""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
import pytest

from planar.brief import Brief
from planar.design.design import make_design
from planar.field.band import BandSolution
from planar.field.mesh import MeshSettings
from planar.field.solver import FieldProblem
from planar.library import Library
from planar.units import SPEED_OF_LIGHT

CASES = {
    "plain": ("115 ohm", {"family": "plain"}),
    "plain square": ("105 ohm", {"family": "plain", "shape": "square"}),
    "coplanar": ("100 ohm", {"family": "coplanar"}),
    "open": ("50 ohm", {"family": "ring-guided", "end": "open"}),
    "via": ("50 ohm", {"family": "ring-guided", "end": "via"}),
}


@pytest.mark.parametrize("name", CASES)
def test_best_match_lies_within_the_stated_error(name: str, brief: Callable[..., Brief], library: Library) -> None:
    """Measured on a finer mesh at 866 MHz, FR-4 1.6 mm: +2.4, -0.7, 0.0, -0.4 and +5.8 %.

    Four nodes hold the reflection over the span to 1e-4 of that by eight, and the best match to a step of 0.07 %.
    """
    impedance, antenna = CASES[name]
    asked = brief(target={"impedance": impedance, "band": ["863 MHz", "869 MHz"]}, antenna=antenna)
    design = make_design(asked, library, "x")
    centre, port = design.choices.centre, design.choices.brief.target.impedance
    settings = MeshSettings(SPEED_OF_LIGHT / centre / 25.0)
    problem = FieldProblem.prepare(design.layout, design.choices.stackup, 1.15 * centre, settings)
    frequency = np.linspace(0.86 * centre, 1.15 * centre, 401)
    z = BandSolution.between(problem, frequency[0], frequency[-1], 4).impedance(frequency)
    best = frequency[np.argmin(np.abs((z - port) / (z + port)))]
    assert abs(best / centre - 1.0) < design.frequency_error

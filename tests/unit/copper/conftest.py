"""Every family in every shape, polarisation, end and handedness, drawn once from dimensions written here.

The dimensions are those of the rough searches in the design notes (0.9 GHz on 1.6 mm), rounded; no
sizing is involved, so these tests see the drawing code alone.
"""

from __future__ import annotations

from itertools import product

import pytest

from planar.copper.board import PlannedBoard, plan_board
from planar.copper.drawing import Drawing, DrawingRequest
from planar.copper.families import FAMILIES
from planar.copper.layout import Layout, Level
from planar.library import Library

MM = 1e-3
LIBRARY = Library.open()
SHAPES = {
    "circle": {"loop_width": 104 * MM},
    "square": {"loop_width": 90 * MM, "corner_radius": 12 * MM},
    "rectangle": {"loop_width": 100 * MM, "loop_height": 80 * MM, "corner_radius": 8 * MM},
}
COPPER = {
    "plain": {"trace_width": 3 * MM, "gap": 2 * MM, "pad_length": 2 * MM},
    "coplanar": {
        "trace_width": 3 * MM, "strip_width": 1.14 * MM, "strip_gap": 0.27 * MM, "strip_length": 42 * MM,
        "pad_width": 1.5 * MM, "pad_length": 2 * MM,
    },
    "ring-guided": {
        "trace_width": 8 * MM, "gap": 2 * MM, "feed_length": 6 * MM, "line_width": 3 * MM,
        "transformer_width": 0.25 * MM, "transformer_length": 40 * MM,
    },
}  # fmt: skip
ENDS = {
    None: {},
    "via": {"end_width": 0.9 * MM, "end_length": 2.5 * MM, "via_drill": 0.3 * MM, "via_ring": 0.3 * MM},
    "open": {"end_width": 3 * MM, "end_length": 46 * MM},
}
SECOND_GAP = {"second_gap": 0.8 * MM, "second_gap_position": 70 * MM}
CONNECTORS = {"plain": "bare-pads", "coplanar": "bare-pads", "ring-guided": "edge-coax"}
ENDS_OF = {"plain": (None,), "coplanar": (None,), "ring-guided": ("via", "open")}
Case = tuple[str, str, str, str | None, bool]
CASES: list[Case] = [
    (family, shape, polarisation, end, mirrored)
    for family, shape, polarisation, mirrored in product(COPPER, SHAPES, ("linear", "circular"), (False, True))
    for end in ENDS_OF[family]
]
"""Family, shape, polarisation, end, mirrored."""


@pytest.fixture(scope="session")
def library() -> Library:
    return LIBRARY


@pytest.fixture(
    scope="session", params=CASES, ids=lambda case: "-".join(str(part) for part in case if part not in (None, False))
)
def case(request: pytest.FixtureRequest) -> Case:
    found: Case = request.param
    return found


@pytest.fixture(scope="session")
def family(case: Case) -> str:
    return case[0]


@pytest.fixture(scope="session")
def dimensions(case: Case) -> dict[str, float]:
    family, shape, polarisation, end, _ = case
    second = SECOND_GAP if polarisation == "circular" else {}
    return SHAPES[shape] | COPPER[family] | ENDS[end] | second


@pytest.fixture(scope="session")
def asked(case: Case) -> DrawingRequest:
    family, _, _, end, mirrored = case
    levels = (Level.TOP, Level.BOTTOM) if family == "ring-guided" else (Level.TOP,)
    connector = LIBRARY.connector(CONNECTORS[family])
    return DrawingRequest("test loop", end, mirrored, connector, LIBRARY.fab("pool-two-layer"), levels)


@pytest.fixture(scope="session")
def drawing(family: str, dimensions: dict[str, float], asked: DrawingRequest) -> Drawing:
    return FAMILIES[family](dimensions, asked)


@pytest.fixture(scope="session")
def planned(drawing: Drawing, asked: DrawingRequest) -> PlannedBoard:
    return plan_board(drawing, asked, asked.masked)


@pytest.fixture(scope="session")
def layout(planned: PlannedBoard) -> Layout:
    return planned.layout

"""A right brief: its SI numbers, its defaults, and text -> brief -> text.

Authorities: the example of the design notes; SI prefixes; 1 mil = 25.4 um and 1 inch = 25.4 mm
exactly (international yard and pound agreement, 1959). Round trips are exact by requirement.
"""

from __future__ import annotations

import pickle
import string
import tomllib

import pytest
import tomli_w
from hypothesis import given, settings
from hypothesis import strategies as st
from pydantic import ValidationError

from planar.brief import check_brief, parse_brief, starter_brief, write_brief
from planar.brief.faults import known_paths
from planar.errors import BriefError

SMALLEST = """
name = "field"
target.band = ["1.4 GHz", "1440 MHz"]
board = { laminate = "fr4-general", thickness = "63 mil" }
"""


def test_example_in_si(whole, library):
    brief = parse_brief(tomli_w.dumps(whole), "gateway.toml", library)
    assert brief.name == "orchard-gateway"
    assert brief.target.band == pytest.approx((863e6, 870e6), rel=1e-15)
    assert brief.target.impedance == 50.0
    assert brief.target.match_db == -10.0
    assert brief.target.transmit is True
    assert brief.target.power == pytest.approx(0.025, rel=1e-15)
    assert brief.antenna.family == "ring-guided"
    assert brief.antenna.corner_radius == pytest.approx(0.006, rel=1e-15)
    assert brief.antenna.trace_width == pytest.approx(0.005, rel=1e-15)
    assert brief.antenna.dimensions == {"gap": pytest.approx(0.002, rel=1e-15)}
    assert brief.board.laminate == "fr4-general"
    assert brief.board.thickness == pytest.approx(0.0016, rel=1e-15)
    assert brief.board.copper == pytest.approx(35e-6, rel=1e-15)
    assert brief.board.size_limit == pytest.approx((0.1, 0.1), rel=1e-15)
    assert brief.surroundings.cover is not None
    assert brief.surroundings.cover.air_gap == pytest.approx(0.006, rel=1e-15)
    assert brief.surroundings.cover.thickness == pytest.approx(0.0025, rel=1e-15)
    assert brief.surroundings.reflector is not None
    assert brief.surroundings.reflector.distance == pytest.approx(0.04, rel=1e-15)
    assert (brief.make.fab, brief.make.connector, brief.make.quantity) == ("pool-two-layer", "edge-coax", 5)


def test_defaults_are_the_stated_ones(library):
    brief = parse_brief(SMALLEST, "field.toml", library)
    assert brief.target.band == pytest.approx((1.4e9, 1.44e9), rel=1e-15)
    assert brief.board.thickness == pytest.approx(63 * 25.4e-6, rel=1e-15)
    assert (brief.target.impedance, brief.target.match_db, brief.target.polarisation) == (50.0, -10.0, "linear")
    assert (brief.target.transmit, brief.target.power) == (False, None)
    assert (brief.antenna.family, brief.antenna.shape, brief.antenna.dimensions) == (None, "circle", {})
    assert (brief.board.copper, brief.board.mask, brief.board.size_limit) == (35e-6, None, None)
    assert (brief.surroundings.cover, brief.surroundings.reflector) == (None, None)
    assert (brief.make.fab, brief.make.connector, brief.make.quantity) == ("pool-two-layer", None, 5)


def test_inline_materials(whole, library):
    whole["board"]["laminate"] = {"eps_r": 3, "tan_d": 0.0025, "at": "2.5 GHz"}
    whole["surroundings"]["cover"]["material"] = {"eps_r": 2.8, "tan_d": 0.01}
    brief = check_brief(whole, "gateway.toml", library)
    assert (brief.board.laminate.eps_r, brief.board.laminate.tan_d, brief.board.laminate.at) == (3.0, 0.0025, 2.5e9)
    assert (brief.surroundings.cover.material.eps_r, brief.surroundings.cover.material.tan_d) == (2.8, 0.01)
    assert parse_brief(write_brief(brief), "again.toml", library) == brief


def test_records_are_frozen_and_travel_between_processes(whole, library):
    brief = check_brief(whole, "gateway.toml", library)
    with pytest.raises(ValidationError):
        brief.board.thickness = 0.001
    assert pickle.loads(pickle.dumps(brief)) == brief


@pytest.mark.parametrize("name", ["orchard-gateway", "Grünhaus 3", "地面-1420", "v1.2_b", "x" * 50])
def test_starter_is_valid_under_any_right_name(name, library):
    brief = parse_brief(starter_brief(name), f"{name}.toml", library)
    assert brief.name == name
    # The starter states the defaults: with its optional keys taken out the same brief remains.
    written = tomllib.loads(starter_brief(name))
    assert brief == check_brief(
        {
            "name": name,
            "target": {"band": written["target"]["band"]},
            "board": {"laminate": written["board"]["laminate"], "thickness": written["board"]["thickness"]},
        },
        "bare.toml",
        library,
    )


def test_starter_explains_every_key():
    lines = starter_brief("x").splitlines()
    for path in known_paths():
        key = path[-1]
        explained = [line for line in lines if f"[{'.'.join(path)}]" in line or (f"{key} =" in line and "#" in line)]
        assert explained, key


def test_starter_with_every_optional_key_is_valid(library):
    text = starter_brief("x").replace("transmit = false", "transmit = true").replace('"circle"', '"rectangle"')
    opened = "\n".join(
        line.removeprefix("# ") if line.startswith("# ") and ("=" in line or "[" in line) else line
        for line in text.splitlines()
    )
    brief = parse_brief(opened, "x.toml", library)
    assert brief.antenna.end == "open"
    assert brief.antenna.dimensions == {"gap": pytest.approx(0.002)}
    assert brief.surroundings.cover is not None
    assert brief.surroundings.reflector is not None


def test_starter_refuses_a_name_that_leaves_the_folder():
    with pytest.raises(BriefError, match="folder name"):
        starter_brief("../up")


def lengths(low: float, high: float) -> st.SearchStrategy[str]:
    """Texts of lengths from `low` to `high` metres in the units people use."""
    scale = {"mm": 1e-3, "um": 1e-6, "mil": 25.4e-6, "inch": 25.4e-3, "m": 1.0}
    return st.tuples(st.floats(low * 1.001, high * 0.999), st.sampled_from(sorted(scale))).map(
        lambda pair: f"{pair[0] / scale[pair[1]]!r} {pair[1]}"
    )


def bands() -> st.SearchStrategy[list[str]]:
    return st.tuples(st.floats(10.1e6, 14e9), st.floats(1.001, 1.9), st.sampled_from([("MHz", 1e6), ("GHz", 1e9)])).map(
        lambda t: [f"{t[0] / t[2][1]!r} {t[2][0]}", f"{t[0] * t[1] / t[2][1]!r} {t[2][0]}"]
    )


NAMES = st.text(st.characters(categories=["L", "N"]), min_size=1, max_size=40).map(lambda text: f"n{text}")
DIMENSION_NAMES = st.text(string.ascii_lowercase, min_size=1, max_size=9).map(lambda text: f"zz_{text}")
INLINE_LAMINATES = st.fixed_dictionaries(
    {"eps_r": st.floats(1, 20), "tan_d": st.floats(0, 0.2), "at": st.floats(0.01, 90).map(lambda f: f"{f!r} GHz")}
)
TARGETS = st.fixed_dictionaries(
    {"band": bands()},
    optional={
        "impedance": st.floats(10, 600).map(lambda ohm: f"{ohm!r} ohm"),
        "match": st.floats(-40, -1).map(lambda db: f"{db!r} dB"),
        "polarisation": st.sampled_from(["linear", "circular-right", "circular-left"]),
    },
)
POWERS = st.none() | st.floats(0.01, 9e5).map(lambda power: f"{power!r} mW")
ANTENNAS = st.fixed_dictionaries(
    {"family": st.sampled_from(["plain", "coplanar"]), "shape": st.just("rectangle")},
    optional={
        "aspect_ratio": st.floats(1, 3),
        "corner_radius": lengths(1e-5, 1.0),
        "trace_width": lengths(0.02e-3, 0.1),
        "dimensions": st.dictionaries(DIMENSION_NAMES, lengths(1e-6, 10.0), max_size=4),
    },
)
BOARDS = st.fixed_dictionaries(
    {"laminate": st.just("alumina-96") | INLINE_LAMINATES, "thickness": lengths(0.05e-3, 6.5e-3)},
    optional={
        "copper": lengths(5e-6, 210e-6),
        "mask": st.sampled_from(["none", "top", "bottom", "both"]),
        "size_limit": st.lists(lengths(5e-3, 3.0), min_size=2, max_size=2),
    },
)
COVERS = st.fixed_dictionaries(
    {
        "material": st.just("abs") | st.fixed_dictionaries({"eps_r": st.floats(1, 20), "tan_d": st.floats(0, 0.2)}),
        "air_gap": lengths(1e-6, 1.0) | st.just("0 mm"),
        "thickness": lengths(0.01e-3, 0.1),
    }
)
SURROUNDINGS = st.fixed_dictionaries({}, optional={"cover": COVERS})
MAKES = st.fixed_dictionaries({}, optional={"connector": st.just("edge-coax"), "quantity": st.integers(1, 1_000_000)})


BRIEFS = st.fixed_dictionaries(
    {"name": NAMES, "target": TARGETS, "board": BOARDS},
    optional={"antenna": ANTENNAS, "surroundings": SURROUNDINGS, "make": MAKES},
)


@settings(deadline=None)  # the first example loads the unit tables
@given(BRIEFS, POWERS)
def test_text_to_brief_to_text(library, data, power):
    transmit = {} if power is None else {"transmit": True, "power": power}
    text = tomli_w.dumps(data | {"target": data["target"] | transmit})
    brief = parse_brief(text, "any.toml", library)
    written = write_brief(brief)
    again = parse_brief(written, "again.toml", library)
    assert again == brief
    assert write_brief(again) == written


ANYTHING = st.recursive(
    st.booleans() | st.integers() | st.floats() | st.text() | st.dates(),
    lambda inner: st.lists(inner, max_size=3) | st.dictionaries(st.text(), inner, max_size=3),
    max_leaves=4,
)
JARGON = (
    "pydantic",
    "Input should",
    "Value error",
    "validat",
    "tuple",
    "dict",
    "(by key)",
    "(inline)",
    "cannot be read",
)


@settings(deadline=None)  # the first example loads the unit tables
@given(st.sampled_from(known_paths()), ANYTHING)
def test_any_value_on_any_key_is_refused_in_plain_words(library, path, value):
    """The board's thickness is missing or a random value, so that there always is a fault."""
    whole: dict = {"name": "x", "target": {"band": ["863 MHz", "870 MHz"]}, "board": {"laminate": "fr4-general"}}
    table = whole
    for step in path[:-1]:
        if not isinstance(table.get(step), dict):
            table[step] = {}
        table = table[step]
    table[path[-1]] = value
    with pytest.raises(BriefError) as caught:
        check_brief(whole, "any.toml", library)
    assert len(str(caught.value).splitlines()) == len(caught.value.faults)
    for fault in caught.value.faults:
        assert fault.expected
        assert not [word for word in JARGON if word in fault.expected]

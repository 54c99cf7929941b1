"""Axes of a sweep: what `--vary` reads, and the rows that come of it. Expected values by hand."""

import tomllib
from pathlib import Path

import pytest

from planar.brief import check_brief, write_brief
from planar.design.sweep_axes import MOST_ROWS, read_axes, sweep_rows
from planar.errors import BriefError
from planar.library import Library

BRIEF = """
name = "bench-loop"
[target]
band = ["1840 MHz", "1860 MHz"]
[antenna]
family = "plain"
[board]
laminate = "fr4-general"
thickness = "1.6 mm"
"""


@pytest.fixture(scope="module")
def library() -> Library:
    return Library.open()


@pytest.mark.parametrize(
    ("text", "key", "values"),
    [
        ("board.laminate=fr4-general,ptfe-glass-2-2", "board.laminate", ("fr4-general", "ptfe-glass-2-2")),
        ("board.thickness=0.8 mm,1.6 mm", "board.thickness", ("0.8 mm", "1.6 mm")),
        ("board.thickness=0.8 mm:1.6 mm:3", "board.thickness", ("0.8 mm", "1.2 mm", "1.6 mm")),
        ("board.thickness=0.8:1.6 mm:2", "board.thickness", ("0.8 mm", "1.6 mm")),
        ("target.match=-10 dB:-14 dB:2", "target.match", ("-10 dB", "-14 dB")),
        ("antenna.trim=true,false", "antenna.trim", (True, False)),
        ("board.laminate.eps_r=2:10:3", "board.laminate.eps_r", (2, 6, 10)),
        (
            'target.band=["1.8 GHz", "1.9 GHz"],["2.4 GHz", "2.5 GHz"]',
            "target.band",
            (["1.8 GHz", "1.9 GHz"], ["2.4 GHz", "2.5 GHz"]),
        ),
    ],
)
def test_an_axis_reads_lists_and_ranges(text: str, key: str, values: tuple[object, ...]) -> None:
    (axis,) = read_axes([text])
    assert (axis.key, axis.values) == (key, values)


@pytest.mark.parametrize(
    "text",
    [
        "board.thickness",
        "=1 mm",
        "board.thickness=",
        "board.thickness=1 mm:2 mil:3",
        "board.thickness=1.2.3 mm:2 mm:3",
    ],
)
def test_what_is_no_axis_is_named(text: str) -> None:
    with pytest.raises(BriefError, match="--vary"):
        read_axes([text])


def test_no_axis_and_the_same_key_twice_are_faults() -> None:
    with pytest.raises(BriefError, match="at least one axis"):
        read_axes([])
    with pytest.raises(BriefError, match="each key once"):
        read_axes(["board.thickness=1 mm", "board.thickness=2 mm"])


def test_rows_are_all_combinations_the_last_axis_fastest(library: Library) -> None:
    axes = read_axes(["board.laminate=fr4-general,ptfe-glass-2-2", "board.thickness=0.8 mm,1.6 mm"])
    base = tomllib.loads(write_brief(check_brief(tomllib.loads(BRIEF), "brief", library)))
    rows = sweep_rows(base, axes, "brief", library)
    assert [tuple(row.settings.values()) for row in rows] == [
        ("fr4-general", "0.8 mm"),
        ("fr4-general", "1.6 mm"),
        ("ptfe-glass-2-2", "0.8 mm"),
        ("ptfe-glass-2-2", "1.6 mm"),
    ]
    assert [row.number for row in rows] == [1, 2, 3, 4]
    assert rows[2].data["board"]["laminate"] == "ptfe-glass-2-2"
    assert base["board"]["laminate"] == "fr4-general"


@pytest.mark.parametrize(
    ("text", "said"),
    [
        ("board.laminat=fr4-general", "did you mean"),
        ("board.laminate=fr4-genera", "did you mean"),
        ("board.thickness=160 mm,1.6 mm", "board.thickness"),
        ("name.first=x", "a key of a table"),
        (f"board.thickness=1 mm:2 mm:{MOST_ROWS}", "rows"),
    ],
)
def test_values_no_brief_allows_are_found_before_any_work(text: str, said: str, library: Library) -> None:
    axes = [*read_axes([text]), *read_axes(["antenna.trim=true,false"])]
    with pytest.raises(BriefError, match=said):
        sweep_rows(tomllib.loads(BRIEF), axes, str(Path("brief.toml")), library)

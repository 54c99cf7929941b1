"""What the commands that look at many boards print."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from pathlib import Path
from typing import Any

from planar.design.sweep_axes import Axis
from planar.report.console import terminal, text_table
from planar.report.spread_tables import OTHER_SENSE

SHOWN = {
    "row": "row",
    "status": "",
    "meets_brief": "meets\nbrief",
    "family": "family",
    "board_width_mm": "board\nmm",
    "board_height_mm": "\nmm",
    "worst_reflection_db": "worst\ndB",
    "matched_percent": "matched\n%",
    "gain_dbi": "gain\ndBi",
    "efficiency_percent": "efficiency\n%",
    "worst_axial_ratio_db": "axial ratio\ndB",
    "reason": "reason",
}
"""Columns of the table on a terminal; the files have all."""
REASON = 70
"""Letters of a reason that a row has room for; the files have the whole."""


def print_sweep(axes: Sequence[Axis], table: Sequence[Mapping[str, Any]], folder: Path) -> None:
    """Print a row a design, its axes first, and where the files are."""
    names = ["row", *(axis.key for axis in axes), *(name for name in SHOWN if name != "row")]
    names = [name for name in names if any(_cell(row, name) for row in table)]
    heads = [SHOWN.get(name, name.replace(".", ".\n")) for name in names]
    right = [i for i, name in enumerate(names) if any(isinstance(row.get(name), float) for row in table)]
    console = terminal()
    console.print(text_table(heads, [[_cell(row, name) for name in names] for row in table], right=right))
    console.print(f"written to {folder}", highlight=False, soft_wrap=True)


def _cell(row: Mapping[str, Any], name: str) -> str:
    value = row.get(name)
    if isinstance(value, float):
        return f"{value:.1f}" if name.endswith(("_mm", "_percent")) else f"{value:.2f}"
    text = "" if value is None else str(value)
    return f"{text[:REASON]} ..." if len(text) > REASON else text


def print_spread(facts: Mapping[str, Any], file: Path) -> None:
    """Print yield, what is typical, worst corners, contributors, and what re-centring brought."""
    console = terminal()
    console.print(text_table((f"{facts['name']}, {facts['samples']} boards", ""), _yield_rows(facts)))
    console.print(text_table(("percentile", *(f"{p:g} %" for p in facts["percentiles"]["at_percent"])), _ranges(facts)))
    console.print(text_table(("share of variance", "match %", "frequency %", "axial ratio %"), _shares(facts)))
    circular = facts["axial_ratio_limit_db"] is not None
    corners = [
        (corner["name"], *(_result(corner[how], circular=circular) for how in ("solved", "modelled")))
        for corner in facts["corners"]
    ]
    console.print(text_table(("worst corner", "solved", "by the model"), corners))
    error = facts["model_error"]
    if error is not None:
        ratio = error["axial_ratio_db"]
        console.print(
            f"model against {error['boards_checked']} boards drawn afresh and solved: reflection within "
            f"{error['reflection']:.3f}, in the band {error['reflection_in_band']:.3f}"
            + ("" if ratio is None else f", worst axial ratio within {ratio:.2f} dB"),
            highlight=False,
        )
    not_varied = ", ".join(each["what"] for each in facts["not_varied"])
    console.print(f"not varied: {not_varied}", highlight=False)
    if "recentred" in facts:
        _print_recentred(facts["recentred"])
    console.print(f"written to {file}", highlight=False, soft_wrap=True)


def _yield_rows(facts: Mapping[str, Any]) -> list[tuple[str, str]]:
    told = facts["yield"]
    low, high = told["total_95_percent"]
    bad, good = told["total_if_model_errs"]
    rows = [
        ("yield", f"{_percent(told['total'])}; {_percent(low)} to {_percent(high)} for so many draws (95 %)"),
        ("were the model off by its error", f"{_percent(bad)} to {_percent(good)}"),
        ("match alone", _percent(told["match"])),
    ]
    return rows if told["axial_ratio"] is None else [*rows, ("axial ratio alone", _percent(told["axial_ratio"]))]


def _ranges(facts: Mapping[str, Any]) -> list[tuple[str, ...]]:
    names = {
        "worst_reflection_db": "worst reflection, dB",
        "shift_percent": "shift of the response, %",
        "worst_axial_ratio_db": "worst axial ratio, dB",
    }
    found = [(words, facts["percentiles"][name]) for name, words in names.items()]
    return [(words, *map(_number, values)) for words, values in found if values is not None]


def _number(value: float | None) -> str:
    """A percentile; an axial ratio of the other sense has no number."""
    return OTHER_SENSE if value is None else f"{value:.2f}"


def _shares(facts: Mapping[str, Any]) -> list[tuple[str, str, str, str]]:
    keys = ("match_share", "frequency_share", "axial_ratio_share")
    rows = [(each["name"], *(each[key] for key in keys)) for each in facts["contributors"]]
    rows.append(("only together", *(facts["interactions"][key] for key in keys)))
    return [(name, *("" if share is None else f"{100.0 * share:.1f}" for share in shares)) for name, *shares in rows]


def _result(result: Mapping[str, Any] | None, *, circular: bool) -> str:
    if result is None:
        return "cannot be made"
    axial = result["worst_axial_ratio_db"]
    ratio = "" if not circular else f", {OTHER_SENSE}" if axial is None else f", axial ratio {axial:.2f} dB"
    return f"{result['worst_reflection_db']:.1f} dB, shift {result['shift_percent']:+.2f} %{ratio}"


def _print_recentred(facts: Mapping[str, Any]) -> None:
    console = terminal()
    rows = [(name, f"{old:.3f}", f"{new:.3f}") for name, (old, new) in facts["changes_mm"].items()]
    if rows:
        console.print(text_table(("re-centred", "was mm", "is mm"), rows, right=(1, 2)))
    console.print(
        f"yield {_percent(facts['yield_before'])} before, {_percent(facts['yield_after'])} after; {facts['remark']}",
        highlight=False,
    )


def _percent(share: float) -> str:
    return f"{100.0 * share:.2f} %"

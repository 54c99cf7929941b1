"""What the commands for panels and coupons print."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from pathlib import Path
from typing import Any

from planar.errors import Finding
from planar.report.console import MARKS, terminal, text_table


def print_panel(facts: Mapping[str, Any], findings: Sequence[Finding], folder: Path) -> None:
    """Print what the panel is, what to know, and where the files are."""
    width, height = facts["panel_mm"]
    board = " x ".join(f"{side:g}" for side in facts["board_mm"])
    turned = ", turned by 90 degrees" if facts["board_turned"] else ""
    rows = [
        (
            "panel",
            f"{width:g} x {height:g} mm, {facts['columns']} x {facts['rows']} = {facts['boards']} boards{turned}",
        ),
        ("board", f"{board} mm, {facts['spacing_mm']:g} mm apart"),
        ("separation", _separation(facts)),
        (
            "from a panel of the fab",
            f"{facts['panels_per_fab_panel']} panels, {facts['boards_per_fab_panel']} boards, "
            f"{100.0 * facts['used_share']:.0f} % of its area",
        ),
    ]
    console = terminal()
    console.print(text_table((facts["name"], ""), rows))
    if findings:
        console.print(text_table(("", "finding"), [(MARKS[f.severity], str(f)) for f in findings]))
    console.print(f"written to {folder}", highlight=False, soft_wrap=True)


def _separation(facts: Mapping[str, Any]) -> str:
    if facts["score_web"] is not None:
        return f"scored, {100.0 * facts['score_web']:.0f} % of the thickness left"
    return f"tabs of {facts['tab_width_mm']:g} mm with perforations"


def print_coupon(facts: Mapping[str, Any], folder: Path) -> None:
    """Print what the coupon holds, what to expect of it, and where the files are."""
    console = terminal()
    size = " x ".join(f"{side:g}" for side in facts["board_mm"])
    console.print(f"coupon for {facts['laminate']}, {size} mm", highlight=False)
    dimensions = [(name, f"{value:.3f}") for name, value in facts["dimensions_mm"].items()]
    console.print(text_table(("dimension", "mm"), dimensions, right=(1,)))
    rings = [
        (str(r["order"]), f"{r['frequency_hz'] / 1e6:.1f}", f"{r['eps_eff']:.4f}", f"{r['q']:.0f}")
        for r in facts["resonances"]
    ]
    console.print(text_table(("ring, order", "MHz", "eps eff", "Q"), rings, right=(0, 1, 2, 3)))
    for note in facts["notes"]:
        console.print(note, highlight=False)
    console.print(f"written to {folder}", highlight=False, soft_wrap=True)

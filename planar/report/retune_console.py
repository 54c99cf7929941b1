"""What `planar retune` prints: what happened, with intervals; what to do now, what next time; what was assumed."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from pathlib import Path
from typing import Any

from planar.errors import Finding
from planar.report.console import MARKS, terminal, text_table

UNIT_ENDS = {"_mm": "mm", "_ps": "ps", "_db": "dB", "_nh": "nH", "_pf": "pF", "": ""}
"""End of a key -> its unit."""


def print_retuned(facts: Mapping[str, Any], findings: Sequence[Finding], folder: Path) -> None:
    """Print what the measurement says and what to change."""
    console = terminal()
    low, high = (100.0 * end for end in facts["shift_interval_95"])
    off = f"{100.0 * facts['shift']:+.2f} % ({low:+.2f} to {high:+.2f} %)"
    console.print(f"{facts['name']}: the response is {off} off the design", highlight=False)
    if facts["surroundings"]:
        console.print(f"measured so, it seems: {facts['surroundings']}", highlight=False)
    for sentence in facts["told"]:
        console.print(sentence, highlight=False)
    heads = ("quantity", "designed", "found", "95 % from", "to", "unit", "moves it by %", "told by itself")
    console.print(text_table(heads, [_value_row(each) for each in facts["values"]], right=(1, 2, 3, 4, 6)))
    for number, sentence in enumerate(facts["advice"]):
        console.print(f"{'now' if number == 0 else number}: {sentence}", highlight=False)
    if facts["not_advised"]:
        rows = [(each["what"], each["why"]) for each in facts["not_advised"]]
        console.print(text_table(("not advised", "because"), rows))
    if findings:
        console.print(text_table(("", "finding"), [(MARKS[f.severity], str(f)) for f in findings]))
    console.print(text_table(("assumed",), [(each,) for each in facts["measurement"]["assumed"]]))
    console.print(CAUTION, highlight=False)
    console.print(f"written to {folder}", highlight=False, soft_wrap=True)


CAUTION = (
    "A cut cannot be taken back: cut the first amount, measure again, then go on. Copper and glass dust: cut wet or "
    "with extraction, eye protection on."
)


def _value_row(value: Mapping[str, Any]) -> tuple[str, ...]:
    end = next(end for end in UNIT_ENDS if f"value{end}" in value)
    numbers = [f"{value[f'{name}{end}']:.4g}" for name in ("nominal", "value", "low_95", "high_95")]
    told = "outside its tolerance" if value["outside_tolerance"] else "yes" if value["told"] else ""
    return value["name"], *numbers, UNIT_ENDS[end], f"{100.0 * value['shift']:+.2f}", told

"""One row of a sweep: a brief in, facts or a refusal out, and the columns a table shows of them.

A row is what `planar size` says of the same brief, so that a sweep can be checked row by row. What is refused stays a
row, with its reason. Rows depend on brief, library and program alone: `row_key` is a hash of these three.
"""

from __future__ import annotations

import hashlib
import json
from collections.abc import Mapping
from functools import cache
from pathlib import Path
from typing import Any

import planar
from planar.brief import check_brief, write_brief
from planar.design.design_file import design_facts
from planar.design.sized import sized_design
from planar.errors import PlanarError
from planar.library import Library

Facts = Mapping[str, Any]
Task = tuple[Mapping[str, Any], str, Path | None]
"""Tables of a brief, the file it came from, the user's library folder."""

DESIGNED, REFUSED, LOST = "designed", "refused", "lost"
"""What became of a row: `LOST` where the process that worked on it died, twice and then alone."""
NUMBERS = (
    "board_width_mm", "board_height_mm", "board_area_cm2", "worst_reflection_db", "best_match_mhz", "matched_from_mhz",
    "matched_to_mhz", "matched_percent", "gain_dbi", "efficiency_percent", "axial_ratio_db", "worst_axial_ratio_db",
    "input_resistance_ohm", "input_reactance_ohm", "quality",
)  # fmt: skip
"""Columns of numbers that a row of any family may have."""


def row_facts(task: Task) -> dict[str, Any]:
    """What is to be said of one row, in plain types: the facts of its design, or why there is none."""
    data, where, folder = task
    try:
        library = Library.open(folder)
        design = sized_design(check_brief(data, where, library), library, where)
    except PlanarError as error:
        return {"status": REFUSED, "reason": str(error), "refused": error.facts()}
    return {"status": DESIGNED, "reason": "", "design": design_facts(design)}


def lost_row(times: int) -> dict[str, Any]:
    """A row whose process died `times` times."""
    return {"status": LOST, "reason": f"the process that solved it died {times} times: memory?"}


def row_key(data: Mapping[str, Any], where: str, library: Library) -> str:
    """Hash of everything a row depends on: the brief with its defaults, the library's files, the program.

    Of a brief that is no valid one the tables themselves stand for it.
    """
    try:
        brief = write_brief(check_brief(data, where, library))
    except PlanarError:
        brief = json.dumps(data, sort_keys=True, default=str) + where
    text = "\0".join((brief, _files_digest(library.folders, "*.toml"), _program_digest()))
    return hashlib.sha256(text.encode()).hexdigest()


def _files_digest(folders: tuple[Path, ...], pattern: str) -> str:
    found = hashlib.sha256()
    for folder in folders:
        for path in sorted(folder.rglob(pattern)):
            found.update(f"{path.relative_to(folder).as_posix()}\0".encode())
            found.update(path.read_bytes())
    return found.hexdigest()


@cache
def _program_digest() -> str:
    """Of the source of this package: a row of another program is another row."""
    return _files_digest((Path(planar.__file__).parent,), "*.py")


def row_columns(facts: Facts) -> dict[str, Any]:
    """The columns of one row, units in their names; only what the row has."""
    columns: dict[str, Any] = {"status": facts["status"]}
    design = facts.get("design")
    if design is not None:
        columns |= _design_columns(design)
    columns["findings"] = "; ".join(_finding(each) for each in design["findings"]) if design else ""
    columns["reason"] = " ".join(facts["reason"].split())
    return columns


def _design_columns(design: Facts) -> dict[str, Any]:
    width, height = design["board_mm"]
    columns = {
        "family": design["family"],
        "end": design["end"] or "",
        "shape": design["shape"],
        "board_width_mm": width,
        "board_height_mm": height,
        "board_area_cm2": round(width * height / 100.0, 4),
    }
    predicted = design["prediction"]
    columns |= {} if predicted is None else _predicted_columns(predicted)
    columns |= {f"{name}_mm": value for name, value in design["dimensions_mm"].items()}
    return columns | {f"{line['name']}_ohm": round(line["impedance_ohm"], 4) for line in design["lines"]}


def _predicted_columns(predicted: Facts) -> dict[str, Any]:
    band = predicted["matched_band_hz"]
    columns = {
        "worst_reflection_db": predicted["worst_reflection_db"],
        "best_match_mhz": predicted["best_match_hz"] / 1e6,
        "matched_from_mhz": None if band is None else band[0] / 1e6,
        "matched_to_mhz": None if band is None else band[1] / 1e6,
        "matched_percent": None if band is None else 200.0 * (band[1] - band[0]) / (band[1] + band[0]),
        "gain_dbi": predicted["gain_dbi"],
        "efficiency_percent": 100.0 * predicted["efficiency"],
        "axial_ratio_db": predicted["axial_ratio_db"],
        "worst_axial_ratio_db": predicted["worst_axial_ratio_db"],
        "input_resistance_ohm": predicted["input_impedance_ohm"][0],
        "input_reactance_ohm": predicted["input_impedance_ohm"][1],
        "quality": predicted["quality"],
    }
    return {name: None if value is None else float(f"{value:.6g}") for name, value in columns.items()}


def _finding(finding: Facts) -> str:
    return f"{finding['severity']}: {finding['rule']}: {finding['got']}, limit {finding['limit']}"

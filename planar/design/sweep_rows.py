"""One row of a sweep: a brief in, facts or a refusal out, and the columns a table shows of them.

A row is what `planar size` says of the same brief, so that a sweep can be checked row by row. What is refused stays a
row, with its reason. Rows depend on brief, library and program alone: `row_keys` are hashes of these three.
"""

from __future__ import annotations

import hashlib
import json
from collections.abc import Iterable, Mapping
from functools import cache
from pathlib import Path
from typing import Any

import planar
from planar.brief import check_brief, write_brief
from planar.design.design_file import design_facts
from planar.design.sized import sized_design
from planar.errors import PlanarError
from planar.library import KINDS, Library

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


def row_keys(briefs: Iterable[Mapping[str, Any]], where: str, library: Library) -> list[str]:
    """Hash of everything each row depends on: its brief with its defaults, the library's files, the program.

    `briefs` are tables of briefs from the file `where`. Of one that is not valid the tables themselves stand for it.
    """
    ground = row_ground(library)
    told = (f"{_brief_text(data, where, library)}\0{ground}" for data in briefs)
    return [hashlib.sha256(text.encode()).hexdigest() for text in told]


def row_ground(library: Library) -> str:
    """Hash of what all rows depend on beside their briefs: the library's files and the program."""
    return f"{_library_digest(library)}\0{_program_digest()}"


def _brief_text(data: Mapping[str, Any], where: str, library: Library) -> str:
    try:
        return write_brief(check_brief(data, where, library))
    except PlanarError:
        return json.dumps(data, sort_keys=True, default=str) + where


def _library_digest(library: Library) -> str:
    """Of the files it reads; what else lies in a user's folder has no part in a row."""
    found = [(folder, path) for folder in library.folders for kind in KINDS for path in (folder / kind).glob("*.toml")]
    return _files_digest(found)


def _files_digest(files: Iterable[tuple[Path, Path]]) -> str:
    """Of names and contents of `files`, pairs of a folder and a path in it."""
    found = hashlib.sha256()
    for folder, path in sorted(files):
        found.update(f"{path.relative_to(folder).as_posix()}\0".encode())
        found.update(path.read_bytes())
    return found.hexdigest()


@cache
def _program_digest() -> str:
    """Of the source of this package: a row of another program is another row."""
    folder = Path(planar.__file__).parent
    return _files_digest((folder, path) for path in folder.rglob("*.py"))


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
    if predicted is not None:
        columns |= {"meets_brief": "yes" if _meets(design, predicted) else "no"} | _predicted_columns(predicted)
    columns |= {f"{name}_mm": value for name, value in design["dimensions_mm"].items()}
    return columns | {f"{line['name']}_ohm": round(line["impedance_ohm"], 4) for line in design["lines"]}


def _meets(design: Facts, predicted: Facts) -> bool:
    """Whether the board as predicted meets what the brief asks."""
    target, axial = design["target"], predicted["worst_axial_ratio_db"]
    matched = predicted["worst_reflection_db"] <= target["match_db"]
    in_sense: bool = axial is None or design["polarisation"].endswith(predicted["sense"])
    return bool(matched and in_sense and (axial is None or axial <= target["axial_ratio_db"]))


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

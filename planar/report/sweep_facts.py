"""What the page of a sweep tells: the columns of each row, whether it meets its brief, which row has most to spare.

Whether a row meets its brief is the verdict of its own report, so that page and report never disagree.
"""

from __future__ import annotations

from collections import Counter
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass
from typing import Any

from planar.design.sweep_rows import DESIGNED, LOST, REFUSED, row_columns
from planar.report.page_facts import page_facts
from planar.report.verdict import Tone, verdict

Facts = Mapping[str, Any]
MEETS, MISSES, NOT_JUDGED = "meets", "misses", "not judged"
"""What a designed row comes to: `NOT_JUDGED` where nothing is predicted."""
_RESULTS = {Tone.GOOD: MEETS, Tone.BAD: MISSES, Tone.WARN: NOT_JUDGED}


@dataclass(frozen=True)
class SweptRow:
    """A row: its `number`, the text of each axis, its `columns` (with `spare_db`, what its match has to spare), how it
    ended (`result`), the whole `reason` of a refusal, and which columns miss what is asked."""

    number: int
    settings: Mapping[str, str]
    columns: Facts
    result: str
    reason: str
    missed: frozenset[str]

    @property
    def table(self) -> dict[str, Any]:
        """The row as a row of a table."""
        return {"row": self.number, **self.settings, **self.columns}


def swept_row(told: Facts) -> SweptRow:
    """A row of a sweep.json: `row`, `settings`, `status`, `reason`, and `design` where there is one."""
    columns, missed, result = row_columns(told), frozenset[str](), str(told["status"])
    if result == DESIGNED:
        facts = page_facts(told["design"])
        result = _RESULTS[verdict(facts).tone]
        derived = facts["derived"]
        columns |= {"spare_db": derived["spare_db"]} if "spare_db" in derived else {}
        missed = frozenset(_missed(derived))
        sense = "" if facts["prediction"] is None else facts["prediction"]["sense"]
        if sense and not facts["polarisation"].endswith(sense):
            result = f"{result}: sense {sense}"
    return SweptRow(told["row"], told["settings"], columns, result, told["reason"], missed)


def _missed(derived: Facts) -> Iterable[str]:
    if derived.get("spare_db", 0.0) < 0.0:
        yield from ("worst_reflection_db", "spare_db")
    if (derived.get("axial_ratio_spare_db") or 0.0) < 0.0:
        yield "worst_axial_ratio_db"


def best_row(rows: Sequence[SweptRow]) -> SweptRow | None:
    """Of the rows that meet the brief, or of all that are judged, the first with the most to spare in reflection."""
    judged = [row for row in rows if "spare_db" in row.columns]
    among = [row for row in judged if row.result == MEETS] or judged
    return max(among, key=lambda row: row.columns["spare_db"], default=None)


def row_counts(rows: Sequence[SweptRow]) -> dict[str, int]:
    """How many rows there are, and how many ended in which way."""
    ended = Counter(row.columns["status"] for row in rows)
    meeting = sum(row.result == MEETS for row in rows)
    return {"rows": len(rows), "meets": meeting} | {each: ended[each] for each in (DESIGNED, REFUSED, LOST)}


def asked_levels(rows: Sequence[Facts]) -> dict[str, float]:
    """Column -> what is asked of it, for rows of a sweep.json, where all that were designed are asked the same."""
    targets = [row["design"]["target"] for row in rows if row.get("design")]
    pairs = (("worst_reflection_db", "match_db"), ("worst_axial_ratio_db", "axial_ratio_db"))
    found = {column: {target[key] for target in targets} - {None} for column, key in pairs}
    return {column: levels.pop() for column, levels in found.items() if len(levels) == 1}


def row_ranges(numbers: Iterable[int]) -> str:
    """Numbers of rows in order, runs of three and more as from to."""
    runs: list[list[int]] = []
    for each in sorted(numbers):
        if runs and each == runs[-1][-1] + 1:
            runs[-1].append(each)
        else:
            runs.append([each])
    told = (f"{run[0]} to {run[-1]}" if len(run) > 2 else ", ".join(map(str, run)) for run in runs)
    return ", ".join(told)

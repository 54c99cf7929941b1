"""The table of outside numbers: who says what, what we get, how far apart, how far apart it may be.

A test states a comparison where it makes it; stating it is asserting it, so the allowance in the table is the one that
was enforced. Comparisons travel with the test's report (`user_properties`), which pytest-xdist carries to the process
that sums up. Those of one quantity and one source are one row, the worst. With `--evidence` the rows are written to
EVIDENCE.md; without, a run of all tests of this folder fails when the names in that file are not those of the run.
"""

from __future__ import annotations

import ast
import math
import re
from collections import defaultdict
from collections.abc import Iterable, Mapping
from dataclasses import asdict, dataclass, replace
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from numpy.typing import ArrayLike

HERE = Path(__file__).parent
TABLE = HERE / "EVIDENCE.md"
NOT_COVERED = HERE / "not_covered.md"
OF_THE_TABLE = "test_evidence.py"
"""Tests of this module: they make no comparisons, and one needs the table."""
PROPERTY = "evidence"
NEAREST = 8
UNSEEN = 1e-9
"""Of their value: a smaller deviation is rounding, which differs from machine to machine."""
ALLOWED = re.compile(r"(?P<number>[0-9.e+-]+)(?P<percent> %)?")


@dataclass(frozen=True)
class Comparison:
    """`theirs` and `ours` in words, `deviation` and `allowance` of `theirs` or in `unit` (`relative` says which).

    `points` values were compared, this is the worst of them.
    """

    quantity: str
    source: str
    theirs: str
    ours: str
    unit: str
    deviation: float
    allowance: float
    relative: bool
    why: str
    points: int

    @property
    def used(self) -> float:
        """Share of the allowance that the deviation uses up."""
        return abs(self.deviation) / self.allowance


def compared(
    quantity: str, *, source: str, theirs: ArrayLike, ours: ArrayLike, allowed: str, unit: str = "", why: str
) -> Comparison:
    """The worst comparison of `ours` with `theirs`, real or complex, one value or arrays of one shape.

    `allowed` is "1 %" of the magnitude of `theirs`, or "0.05" in `unit`; `why` is the reason for that much. Raises
    ValueError for an allowance that is neither.
    """
    stated = ALLOWED.fullmatch(allowed)
    if stated is None:
        raise ValueError(f"{quantity}: allowed = {allowed!r}, it must be like '1 %' or '0.05'")
    relative = stated["percent"] is not None
    allowance = float(stated["number"]) / (100.0 if relative else 1.0)
    expected, found = np.broadcast_arrays(np.atleast_1d(theirs), np.atleast_1d(ours))
    expected, found = expected.ravel(), found.ravel()
    deviation = np.abs(found - expected) / (np.abs(expected) if relative else 1.0)
    worst = int(np.argmax(deviation))  # a NaN counts as the largest
    size = float(deviation[worst])
    if not (np.iscomplexobj(expected) or np.iscomplexobj(found)):
        size = math.copysign(size, float(found[worst] - expected[worst]))
    shown = _digits(allowance if relative else allowance / max(abs(expected[worst]), allowance))
    values = (_value(expected[worst], shown), _value(found[worst], shown))
    return Comparison(quantity, source, *values, unit, size, allowance, relative, why, len(expected))


def merged(comparisons: Iterable[Comparison]) -> list[Comparison]:
    """One comparison, the worst, for each quantity and source, sorted by both."""
    groups: dict[tuple[str, str], list[Comparison]] = defaultdict(list)
    for each in comparisons:
        groups[each.quantity, each.source].append(each)
    return [
        replace(
            max(group, key=lambda each: (float(f"{each.used:.3g}"), each.theirs)), points=sum(c.points for c in group)
        )
        for _, group in sorted(groups.items())
    ]


def rendered(by_file: Mapping[str, Iterable[Comparison]]) -> str:
    """EVIDENCE.md of the comparisons made in the test files of those names."""
    sections = {name: merged(found) for name, found in sorted(by_file.items())}
    rows = [row for found in sections.values() for row in found]
    nearest = sorted(rows, key=lambda row: (-float(f"{row.used:.3g}"), row.quantity))[:NEAREST]
    lines = [
        "# Evidence",
        "",
        "Written by the tests of this folder (`pytest tests/published --evidence`); do not edit. A row is one quantity",
        "of one source: the value stated there, ours, the deviation, and the deviation at which the test fails. Where",
        "one row stands for many points it shows the worst. Percentages are of the magnitude of their value; complex",
        "values deviate by their distance, without a sign. (P) is a published formula or table, (C) computed from",
        "published equations with code that is not this project's, or by the test without it, (M) cited from memory,",
        "not read again, (T) common practice without a source.",
        "",
        f"{len(rows)} rows, {sum(row.points for row in rows)} comparisons. Nearest to their allowances:",
        "",
        *(f"- {row.used:.0%}: {row.quantity} ({_deviation(row)}, allowed {_allowance(row)})" for row in nearest),
    ]
    for name, found in sections.items():
        doc = (ast.get_docstring(ast.parse((HERE / name).read_text(encoding="utf-8"))) or name).splitlines()[0]
        lines += ["", f"## {doc.rstrip('.')}", "", f"`{name}`", ""]
        lines += ["| quantity | theirs | ours | unit | deviation | allowed | points | source | why so much |"]
        lines += ["|---|---|---|---|---|---|---|---|---|"]
        lines += [_row(row) for row in found]
    return "\n".join([*lines, "", NOT_COVERED.read_text(encoding="utf-8").rstrip(), ""])


def listed(text: str) -> set[tuple[str, str]]:
    """Quantity and source of every row of an EVIDENCE.md."""
    cells = [line[2:-2].split(" | ") for line in text.splitlines() if line.startswith("| ")]
    return {(row[0], row[7]) for row in cells if row[0] != "quantity"}


def _row(row: Comparison) -> str:
    cells = (
        row.quantity, row.theirs, row.ours, row.unit, _deviation(row), _allowance(row), str(row.points), row.source,
        row.why,
    )  # fmt: skip
    return f"| {' | '.join(cell.replace('|', chr(92) + '|') for cell in cells)} |"


def _deviation(row: Comparison) -> str:
    if row.relative and abs(row.deviation) < UNSEEN:
        return "0 %"
    sign = "+" if row.deviation > 0.0 and "j" not in row.theirs + row.ours else ""
    return f"{sign}{100.0 * row.deviation:.2g} %" if row.relative else f"{sign}{row.deviation:.2g}"


def _allowance(row: Comparison) -> str:
    return f"{100.0 * row.allowance:.3g} %" if row.relative else f"{row.allowance:.3g}"


def _digits(share: float) -> int:
    """Digits in which a tenth of an allowance of that share shows, six to twelve."""
    return min(max(6, 2 - math.floor(math.log10(share))), 12)


def _value(value: complex, digits: int) -> str:
    if isinstance(value, complex):
        if abs(value.imag) < 0.1**digits * abs(value.real):
            value = complex(value.real)
        return f"{value.real:.{digits}g}{'-' if value.imag < 0.0 else '+'}j{abs(value.imag):.{digits}g}"
    return f"{value:.{digits}g}"


class Evidence:
    """Call it with the arguments of `compared`: it records the comparison and fails the test beyond the allowance."""

    def __init__(self, node: pytest.Item) -> None:
        self._node = node

    def __call__(self, quantity: str, **comparison: Any) -> None:
        __tracebackhide__ = True
        found = compared(quantity, **comparison)
        self._node.user_properties.append((PROPERTY, asdict(found)))
        if not found.used <= 1.0:
            pytest.fail(
                f"{quantity}: ours {found.ours} {found.unit}, theirs {found.theirs} ({found.source}): "
                f"off by {_deviation(found)}, allowed {_allowance(found)}"
            )


class EvidenceTable:
    """Gathers comparisons from the reports of all tests and writes or checks EVIDENCE.md after the last one."""

    def __init__(self, config: pytest.Config) -> None:
        self._config = config
        self._collected: dict[str, str] = {}
        self._live: set[str] = set()
        self._expected = 0
        self._passed = 0
        self._found: dict[str, list[Comparison]] = defaultdict(list)
        self._message = ""

    @pytest.hookimpl(tryfirst=True)
    def pytest_collection_modifyitems(self, items: list[pytest.Item]) -> None:
        """Before anything is deselected: all tests there are, and those that run only when asked for."""
        here = [item for item in items if _compares(item.path)]
        self._collected = {item.nodeid: item.path.name for item in here}
        self._live = {item.nodeid for item in here if item.get_closest_marker("reference")}

    def pytest_collection_finish(self, session: pytest.Session) -> None:
        """How many tests of this folder are to pass for the table to be whole, 0 if some are left out."""
        chosen = {item.nodeid for item in session.items if _compares(item.path)}
        files = {path.name for path in HERE.glob("test_*.py") if _compares(path)}
        whole = files == set(self._collected.values()) and chosen == set(self._collected) - self._live
        named = any("::" in arg for arg in self._config.args)  # then a file is collected in part
        self._expected = len(chosen) if whole and not named else 0
        if hasattr(self._config, "workeroutput"):
            self._config.workeroutput[PROPERTY] = self._expected

    @pytest.hookimpl(optionalhook=True)
    def pytest_testnodedown(self, node: Any) -> None:
        """Every worker collects all tests; what it expects comes with its farewell."""
        self._expected = getattr(node, "workeroutput", {}).get(PROPERTY, self._expected)

    def pytest_runtest_logreport(self, report: pytest.TestReport) -> None:
        """Comparisons of a test that has run."""
        path = self._config.rootpath / report.nodeid.split("::")[0]
        if report.when == "call" and _compares(path):
            self._passed += report.passed
            stated: list[tuple[str, Any]] = report.user_properties
            self._found[path.name] += [Comparison(**value) for key, value in stated if key == PROPERTY]

    def pytest_sessionfinish(self, session: pytest.Session) -> None:
        """Writes or checks the table, in the process that sums up."""
        if hasattr(self._config, "workeroutput"):
            return
        asked = self._config.getoption("evidence")
        if not self._expected or self._passed != self._expected:
            self._message = "not written: not all tests of tests/published ran and passed" if asked else ""
        else:
            text = rendered({name: found for name, found in self._found.items() if found})
            if asked:
                TABLE.write_text(text, encoding="utf-8")
            else:
                self._message = stale(TABLE.read_text(encoding="utf-8") if TABLE.exists() else "", text)
        if self._message:
            session.exitstatus = pytest.ExitCode.TESTS_FAILED

    def pytest_terminal_summary(self, terminalreporter: Any) -> None:
        """Says what is wrong with the table."""
        if self._message:
            terminalreporter.section("evidence")
            terminalreporter.line(f"{TABLE.name}: {self._message}", red=True)


def _compares(path: Path) -> bool:
    return path.parent == HERE and path.name != OF_THE_TABLE


def stale(kept: str, made: str) -> str:
    """What an EVIDENCE.md `kept` lacks or has too much against the one just `made`, in words; empty if neither."""
    old, new = listed(kept), listed(made)
    if old == new:
        return ""
    parts = [
        f"{len(rows)} {what}, as {' / '.join(min(rows))}"
        for rows, what in ((new - old, "missing"), (old - new, "no longer compared"))
        if rows
    ]
    return f"rows {'; '.join(parts)}. Write it anew: pytest tests/published --evidence"

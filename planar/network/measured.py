"""A measured reflection, read as found: what was in the file, what was taken for granted, how far it can be trusted.

One port is what counts: of a two-port file S11. Points are sorted, doubled ones merged where they agree. The grade says
what a careful person would notice before believing the numbers; what cannot be believed at all is refused.
"""

from __future__ import annotations

import cmath
import math
import re
from dataclasses import dataclass
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from planar.network.measured_text import Line, Reading, Table, read_table
from planar.network.response import Response
from planar.network.touchstone import FORMATS, UNITS
from planar.units import show

Array = NDArray[np.float64]
Complex = NDArray[np.complex128]

PASSIVE = 1.05
"""Size of a reflection up to which noise and calibration explain what exceeds 1."""
FEWEST = 11
"""Points a band can be judged from."""
ALIKE = 0.02
"""Difference of reflections at one frequency that noise explains."""
HIGHEST = 3e11
"""Hz, above which a frequency unit must be wrong."""


@dataclass(frozen=True, eq=False)
class Measured:
    """A reflection of one port, `assumed` while reading it."""

    response: Response
    assumed: tuple[str, ...]

    @property
    def reflection(self) -> Complex:
        """(n,)."""
        return np.asarray(self.response.s[:, 0, 0], dtype=np.complex128)


def read_measured(path: Path) -> Measured:
    """The reflection in a Touchstone file (1.x, 2.0) or a table with a header (CSV).

    Raises `FaultyInputError` with the line of everything that cannot be trusted.
    """
    reading = Reading(str(path))
    table = read_table(path, reading)
    rows = _table_rows(table, reading) if table.heads else _touchstone_rows(table, path, reading)
    reading.raise_faults()
    points = _merged(_sorted(rows, reading), reading)
    reading.raise_faults()
    frequency, s = np.array([f for f, _ in points]), np.array([value for _, value in points])
    return Measured(Response(frequency, s, table.z0), tuple(reading.assumed))


_Rows = list[tuple[Line, float, complex]]


def _touchstone_rows(table: Table, path: Path, reading: Reading) -> _Rows:
    widths = {len(numbers) for _, numbers in table.rows}
    if len(widths) > 1:
        usual = max(widths, key=lambda width: sum(len(numbers) == width for _, numbers in table.rows))
        for line, numbers in table.rows:
            if len(numbers) != usual:
                reading.fault(line, "numbers", f"{usual} numbers, as on the other lines")
        return []
    width = widths.pop()
    two_ports = path.suffix.lower() == ".s2p"
    if width == 3 and two_ports:
        reading.assume("the file is named as two ports but holds one")
    if width == 9:
        reading.assume("of two ports S11 is taken, with whatever stood at the second one")
    if width == 5:
        reading.whole("numbers", "5 on a line", "3 for one port, 9 for two")
        return []
    form = table.form
    return _checked([(line, n[0] * table.unit, _value(form, n[1], n[2])) for line, n in table.rows], reading)


def _table_rows(table: Table, reading: Reading) -> _Rows:
    """Rows of a table whose header says which column is what."""
    heads = table.heads
    frequency = _column(heads, r"freq|^f\b|^f$|^f ?[\[(]")
    pair = _pair_columns(heads)
    if frequency is None or pair is None:
        right = "columns for frequency with its unit, and real and imaginary part, or magnitude or dB and angle"
        reading.whole("header", ", ".join(heads), right)
        return []
    unit = re.search(r"[kmg]?hz", heads[frequency])
    scale = UNITS[unit[0].upper()] if unit else 1.0
    if unit is None:
        reading.assume("no unit in the frequency's column head: Hz")
    first, second, form = pair
    turn = math.degrees(1.0) if "rad" in heads[second] and form != "RI" else 1.0
    return _checked(
        [(line, n[frequency] * scale, _value(form, n[first], n[second] * turn)) for line, n in table.rows], reading
    )


def _value(form: str, first: float, second: float) -> complex:
    """The value of a pair of numbers; decibels of a number that cannot be held are none, which the check then says."""
    try:
        return FORMATS[form](first, second)
    except OverflowError:
        return complex("nan")


def _pair_columns(heads: tuple[str, ...]) -> tuple[int, int, str] | None:
    """Columns of the two numbers of S11 and their format."""
    real, imaginary = _column(heads, r"\bre(al)?\b|_re\b|^re"), _column(heads, r"\bim(ag(inary)?)?\b|_im\b|^im")
    if real is not None and imaginary is not None:
        return real, imaginary, "RI"
    angle = _column(heads, r"phase|ang|deg|arg")
    decibels = _column(heads, r"\bdb\b|_db\b|\(db\)|\[db\]|log ?mag")
    if decibels is not None and angle is not None:
        return decibels, angle, "DB"
    size = _column(heads, r"mag|\babs|\|s11\||lin")
    return None if size is None or angle is None else (size, angle, "MA")


def _column(heads: tuple[str, ...], pattern: str) -> int | None:
    """The first column whose head fits; one of S11 before the others."""
    found = [i for i, head in enumerate(heads) if re.search(pattern, head)]
    return next((i for i in found if "s11" in heads[i]), found[0] if found else None)


def _checked(rows: _Rows, reading: Reading) -> _Rows:
    """`rows` with a fault for each that no measurement gives."""
    for line, frequency, value in rows:
        if not (math.isfinite(frequency) and cmath.isfinite(value)):
            reading.fault(line, "numbers", "finite numbers")
        elif not 0.0 < frequency <= HIGHEST:
            right = f"a frequency above 0 and up to {show(HIGHEST, 'frequency')}: is the unit right?"
            reading.fault(line, "frequency", f"{right} here it is {show(frequency, 'frequency')}")
    return rows


def _sorted(rows: _Rows, reading: Reading) -> _Rows:
    ordered = sorted(rows, key=lambda row: row[1])
    if ordered != rows:
        reading.assume("the points were not in order and were sorted")
    return ordered


def _merged(rows: _Rows, reading: Reading) -> list[tuple[float, complex]]:
    """One value a frequency: the mean of doubled points, which must agree."""
    groups: list[tuple[float, list[tuple[Line, complex]]]] = []
    for line, frequency, value in rows:
        if groups and groups[-1][0] == frequency:
            groups[-1][1].append((line, value))
        else:
            groups.append((frequency, [(line, value)]))
    for _, group in groups:
        first = group[0][1]
        for line, value in group[1:]:
            if abs(value - first) > ALIKE:
                reading.fault(line, "frequency", "one value for a frequency; the other one differs")
    if any(len(group) > 1 for _, group in groups):
        reading.assume("points given twice were averaged")
    return [(frequency, sum(value for _, value in group) / len(group)) for frequency, group in groups]

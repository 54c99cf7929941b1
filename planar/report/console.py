"""What commands print: aligned tables for people, JSON and CSV for programs.

Tables go to stdout, progress to stderr and only to a terminal, so that piped output stays clean.
"""

from __future__ import annotations

import csv
import json
import sys
import time
from collections.abc import Callable, Iterator, Mapping, Sequence
from contextlib import contextmanager
from dataclasses import asdict, fields
from pathlib import Path
from typing import Any

from rich.console import Console
from rich.table import Table

from planar.design.design import Design
from planar.design.field_solution import Solution
from planar.design.line_table import LineRow
from planar.design.prediction import Prediction
from planar.design.sensitivity import Sensitivity
from planar.design.sizing_record import Candidate
from planar.design.trim import Cut
from planar.errors import Severity
from planar.units import SPEED_OF_LIGHT, show

WIDTH = 160
"""Columns of a table that is not printed to a terminal."""
HEADS = {
    "kind": "kind",
    "laminate": "laminate",
    "height_mm": "height\nmm",
    "frequency_ghz": "GHz",
    "impedance_ohm": "ohm",
    "width_mm": "width\nmm",
    "gap_mm": "gap\nmm",
    "eps_eff": "eps\neff",
    "quarter_wave_mm": "quarter\nwave mm",
    "loss_db_per_m": "loss\ndB/m",
    "ohm_per_25_um_etch": "ohm per\n25 um etch",
    "ohm_per_10_percent_height": "ohm per\n10 % height",
    "ohm_per_1_percent_eps_r": "ohm per\n1 % eps",
    "makeable": "fab",
    "note": "note",
}
MARKS = {Severity.REFUSE: "refused", Severity.WARN: "warning", Severity.NOTE: "note"}


@contextmanager
def progress() -> Iterator[Callable[[str], None]]:
    """A function that reports the stage begun, with seconds since the start, to a terminal on stderr."""
    started = time.monotonic()
    shown = sys.stderr.isatty()

    def step(stage: str) -> None:
        if shown:
            sys.stderr.write(f"{time.monotonic() - started:6.2f} s  {stage}\n")

    yield step
    step("done")


def print_json(data: object) -> None:
    """Print `data` as indented JSON, in ASCII: a pipe need not be UTF-8."""
    sys.stdout.write(json.dumps(data, indent=2) + "\n")


def print_design(design: Design, folder: Path | None = None) -> None:
    """Print dimensions, lines, findings and where the pack is."""
    console = terminal()
    choices = design.choices
    polarisation = choices.brief.target.polarisation
    console.print(
        f"{design.name}: {choices.family.key}, {choices.brief.antenna.shape}, {polarisation}", highlight=False
    )
    width, height = design.layout.size
    console.print(f"{_loop(design)}board {width * 1e3:.1f} x {height * 1e3:.1f} mm", highlight=False)
    if design.prediction is not None:
        console.print(_prediction_table(design, design.prediction))
    if design.sizing is not None and design.sizing.candidates:
        console.print(_candidate_table(design.sizing.candidates))
    console.print(_dimension_table(design))
    if design.sensitivities:
        console.print(_sensitivity_table(design.sensitivities))
    if design.cuts:
        console.print(_cut_table(design.cuts))
    if design.lines:
        console.print(_design_line_table(design))
    if design.findings:
        console.print(text_table(("", "finding"), [(MARKS[f.severity], str(f)) for f in design.findings]))
    console.print(text_table(("assumed",), [(reason,) for reason in choices.reasons]))
    console.print(design.status, highlight=False)
    if choices.brief.target.transmit:
        console.print(CAUTION_TRANSMIT, highlight=False)
    if folder is not None:
        console.print(f"written to {folder}", highlight=False, soft_wrap=True)


CAUTION_TRANSMIT = (
    "Transmitting: keep people at the distance that the report of planar make tells; local rules and licensed "
    "practice decide what may be radiated. Etching and cutting boards: gloves, eye protection, no glass dust in the "
    "air."
)


def _loop(design: Design) -> str:
    """Mean line as drawn, in wavelengths, and for a first-order design the bare loop it rests on."""
    wavelength = SPEED_OF_LIGHT / design.choices.centre
    drawn = f"mean line {design.perimeter * 1e3:.2f} mm, {design.perimeter / wavelength:.3f} wavelengths; "
    bare = design.bare_loop
    if bare is None:
        return drawn
    resonance = f"{bare.resistance:.0f} ohm at {show(bare.frequency, 'frequency', 4)} by formulas"
    return f"{drawn}the bare loop resonates with {resonance}; "


def _prediction_table(design: Design, prediction: Prediction) -> Table:
    """What the solver says, a row a quantity, beside what the brief asks."""
    target, point, spare = design.choices.brief.target, prediction.centre, prediction.margins
    rows = [("worst reflection in the band", f"{spare.worst_db:.1f} dB", f"{target.match_db:g} dB")]
    if spare.band is not None:
        ends = f"{show(spare.band.low, 'frequency', 4)} to {show(spare.band.high, 'frequency', 4)}"
        asked = " to ".join(show(end, "frequency", 4) for end in target.band)
        low, high = prediction.trusted
        beyond = "" if low <= spare.band.low and spare.band.high <= high else "; ends beyond the finely solved span"
        rows.append((f"below {target.match_db:g} dB", f"{ends}, {100.0 * spare.band.fraction:.1f} %{beyond}", asked))
    rows.append(("gap of the bare loop at centre", f"{_ohm(prediction.gap_impedance_ohm)} ohm", ""))
    rows.append(("input impedance at centre", f"{_ohm(point.input_impedance_ohm)} ohm", f"{target.impedance:g} ohm"))
    if prediction.worst_axial_ratio_db is not None:
        ratio = f"{point.axial_ratio_db:.2f} dB, {prediction.worst_axial_ratio_db:.2f} dB at worst in the band"
        rows.append(("axial ratio at centre", ratio, f"3 dB, {target.polarisation}"))
        if prediction.axial_band is not None:
            low, high = prediction.axial_band
            width = 100.0 * (high - low) / design.choices.centre
            ends = f"{show(low, 'frequency', 4)} to {show(high, 'frequency', 4)}, {width:.1f} %"
            rows.append(("axial ratio below 3 dB", ends, ""))
    guided = f"{100.0 * point.surface_wave_share:.0f} % of the power guided in the slab among it, not in the gain"
    rows.append(("gain, efficiency", f"{point.gain_dbi:.2f} dBi, {100.0 * point.efficiency:.0f} %; {guided}", ""))
    rows.append(("Q of the port", f"{prediction.quality:.1f}", ""))
    return text_table(("predicted", "", "asked"), rows)


def _sensitivity_table(found: Sequence[Sensitivity]) -> Table:
    rows = []
    for each in sorted(found, key=lambda each: -abs(each.hz_per_unit * each.value)):
        pure = each.name.endswith("permittivity")
        scale, unit = (0.1, "0.1") if pure else (1e-4, "0.1 mm")
        uneven = "" if each.asymmetry is None else f"{100.0 * each.asymmetry:+.0f}"
        value = f"{each.value:.3f}" if pure else f"{each.value * 1e3:.3f} mm"
        ohm = _ohm(each.ohm_per_unit * scale)
        rows.append((each.name, value, unit, f"{each.hz_per_unit * scale / 1e6:+.3f}", ohm, uneven))
    heads = ("sensitivity", "is", "more by", "MHz", "ohm", "uneven %")
    return text_table(heads, rows, right=(1, 2, 3, 4, 5))


def _cut_table(cuts: Sequence[Cut]) -> Table:
    rows = [
        (
            each.name,
            f"{each.removed * 1e6:.2f}",
            f"{each.hz / 1e6:+.3f}",
            "" if each.best_match_hz is None else f"{each.best_match_hz / 1e6:.2f}",
            f"{each.worst_reflection_db:.1f}",
        )
        for each in cuts
    ]
    heads = ("cut off, on the mesh of comparisons", "mm2", "shift MHz", "best match MHz", "worst in the band dB")
    return text_table(heads, rows, right=(1, 2, 3, 4))


def _candidate_table(candidates: Sequence[Candidate]) -> Table:
    rows = []
    for each in candidates:
        size = "" if each.size is None else f"{each.size[0] * 1e3:.0f} x {each.size[1] * 1e3:.0f}"
        margin = "" if each.margin is None else f"{100.0 * each.margin:.1f}" if each.margin > -1.0 else "no match"
        verdict = "meets" if each.meets else "misses" if each.margin is not None else "not sized"
        balun = "needs a balun; " if each.needs_balun else ""
        rows.append((each.name, verdict, margin, size, balun + each.remark))
    heads = ("considered", "brief", "margin after\ntolerances %", "board mm", "remark")
    return text_table(heads, rows, right=(2,))


def _dimension_table(design: Design) -> Table:
    family = design.choices.family
    rows = [(name, f"{value * 1e3:.3f}", family.meaning(name)) for name, value in design.dimensions.items()]
    return text_table(("dimension", "mm", "meaning"), rows, right=(1,))


def _design_line_table(design: Design) -> Table:
    rows = [
        (
            each.name,
            each.line.kind,
            f"{each.line.impedance:.1f}",
            f"{each.tolerance_ohm:.1f}",
            f"{each.line.eps_eff:.3f}",
            f"{each.line.quarter_wave * 1e3:.2f}",
            f"{each.line.loss_db_per_m:.2f}",
            each.reference,
        )
        for each in design.lines
    ]
    heads = ("line", "kind", "ohm", "+-ohm", "eps eff", "quarter wave mm", "loss dB/m", "against")
    return text_table(heads, rows, right=(2, 3, 4, 5, 6))


def print_solution(design: Design, solution: Solution) -> None:
    """Print a field solution: a row a frequency, the sweep in one line, what limits the numbers."""
    console, port = terminal(), design.choices.brief.target.impedance
    rows = []
    for point, gap in zip(solution.points, solution.gap_impedance_ohm, strict=True):
        ratio = "linear" if point.sense == "linear" else f"{point.axial_ratio_db:.2f} {point.sense}"
        rows.append(
            (
                show(point.frequency_hz, "frequency", 6),
                _ohm(gap),
                _ohm(point.input_impedance_ohm),
                f"{point.reflection_db(port):.1f}",
                f"{point.gain_dbi:.2f}",
                f"{100.0 * point.efficiency:.0f}",
                ratio,
                f"{100.0 * point.copper_share:.1f} / {100.0 * point.dielectric_share:.1f}",
            )
        )
    heads = ("at", "bare loop's gap ohm", "input ohm", "reflection dB", "gain dBi", "efficiency %", "axial ratio dB")
    console.print(text_table((*heads, "copper / dielectric %"), rows, right=(1, 2, 3, 4, 5)))
    if solution.sweep is not None:
        best = show(solution.sweep.best_match, "frequency", 5)
        bands = solution.sweep.band(design.choices.brief.target.match_db)
        texts = [f"{show(low, 'frequency', 5)} to {show(high, 'frequency', 5)}" for low, high in bands]
        level = f"{design.choices.brief.target.match_db:g} dB"
        console.print(f"best match at {best}; below {level}: {', '.join(texts) or 'nowhere'}", highlight=False)
    console.print(text_table(("", "finding"), [(MARKS[f.severity], str(f)) for f in solution.findings]))
    console.print(
        f"{solution.unknowns} unknowns; the input impedance moves by {100.0 * solution.convergence:.1f} % from a "
        "coarser mesh; gain and axial ratio toward the top",
        highlight=False,
    )


def _ohm(value: complex) -> str:
    return f"{value.real:.1f}{value.imag:+.1f}j"


def print_lines(rows: Sequence[LineRow]) -> None:
    """Print line rows as a table; columns nobody needs are left out."""
    empty = {name for name in HEADS if all(getattr(row, name) in (None, "") for row in rows)}
    names = [name for name in HEADS if name not in empty]
    cells = [tuple(_line_cell(name, getattr(row, name)) for name in names) for row in rows]
    right = tuple(i for i, name in enumerate(names) if name not in {"kind", "laminate", "makeable", "note"})
    terminal().print(text_table(tuple(HEADS[name] for name in names), cells, right=right))


def _line_cell(name: str, value: object) -> str:
    if name == "makeable":
        return "ok" if value else "no"
    if isinstance(value, float):
        return f"{value:.3f}" if name in {"width_mm", "gap_mm", "eps_eff"} else f"{value:.4g}"
    return "" if value is None else str(value)


def print_lines_csv(rows: Sequence[LineRow]) -> None:
    """Print line rows as CSV, full precision, empty where there is no value."""
    writer = csv.DictWriter(sys.stdout, [field.name for field in fields(LineRow)], lineterminator="\n")
    writer.writeheader()
    writer.writerows(asdict(row) for row in rows)


def print_entries(entries: Mapping[str, Sequence[Mapping[str, Any]]]) -> None:
    """Print library entries by kind: key and title, and where they come from."""
    for kind, found in entries.items():
        rows = [(entry["key"], entry["title"], entry["file"]) for entry in found]
        terminal().print(text_table((kind, "title", "file"), rows))


def print_entry(entry: Mapping[str, Any]) -> None:
    """Print one library entry: every value with its source."""
    console = terminal()
    console.print(f"{entry['key']}: {entry['title']}\n{entry['file']}", highlight=False, soft_wrap=True)
    rows = [(name, _in_words(value["value"]), value["source"]) for name, value in entry["values"].items()]
    console.print(text_table(("name", "value", "source"), rows))


def _in_words(value: object) -> str:
    if isinstance(value, Mapping):
        return "; ".join(
            _in_words(each) if name in {"value", "values"} else f"{name} {_in_words(each)}"
            for name, each in value.items()
        )
    if isinstance(value, list):
        return ", ".join(_in_words(each) for each in value)
    return str(value).lower() if isinstance(value, bool) else str(value)


def text_table(heads: Sequence[str], rows: Sequence[Sequence[str]], *, right: Sequence[int] = ()) -> Table:
    """A table without lines of the texts in `rows`, the columns numbered in `right` set to the right."""
    table = Table(box=None, pad_edge=False, header_style="bold")
    for i, head in enumerate(heads):
        table.add_column(head, justify="right" if i in right else "left", overflow="fold")
    for row in rows:
        table.add_row(*row)
    return table


def terminal() -> Console:
    """Where tables go: stdout, as wide as the terminal or `WIDTH` where it is none."""
    terminal = sys.stdout.isatty()
    return Console(file=sys.stdout, width=None if terminal else WIDTH, markup=False, emoji=False)

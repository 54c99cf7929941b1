"""What planar does, stage by stage: the one module that knows them all.

Each function takes what the user gave and returns a frozen record of what was done; printing is left
to the command line. Results are written into a temporary folder, read back and compared with the
layout, and only then moved into place.
"""

from __future__ import annotations

import hashlib
import json
from collections.abc import Callable
from dataclasses import asdict, dataclass
from pathlib import Path
from typing import Any

from planar import __version__
from planar.brief import read_brief, starter_brief, write_brief
from planar.copper.layout import Layout
from planar.design.design import Design, make_design
from planar.design.line_size import DesignLine
from planar.design.line_table import LineRequest, LineRow, Material, line_rows
from planar.errors import BriefError, Fault, HandoffError, UnitError
from planar.handoff import (
    ImpedanceLine,
    SheetFacts,
    StackupSheet,
    check_files,
    check_stackup,
    packed,
    stackup_sheet,
    write_layout_files,
    write_stackup_json,
    write_stackup_markdown,
)
from planar.library import KINDS, Library
from planar.library.reading import parse
from planar.units import quantity, show

Progress = Callable[[str], None]
BASE_COPPER = 35e-6
"""m, foil of a board whose copper nobody stated (common practice, no source)."""
IMPEDANCES = (50.0, 75.0, 100.0)
"""ohm, of `planar lines` where none is asked for."""


@dataclass(frozen=True)
class Made:
    """A design and the folder its pack was written to."""

    design: Design
    folder: Path


def make(brief_path: Path, library: Library, outputs: Path, progress: Progress = lambda stage: None) -> Made:
    """The main job: brief in, pack out, at `outputs`/<name>. Raises `PlanarError`; nothing is then left behind."""
    progress("reading the brief")
    brief = read_brief(brief_path, library)
    progress("sizing and drawing")
    design = make_design(brief, library, str(brief_path))
    folder = outputs / brief.name
    progress("writing files")
    with packed(folder) as fresh:
        write_pack(design, fresh)
        progress("reading the files back")
        check_pack(design, fresh)
    return Made(design, folder)


def size(brief_path: Path, library: Library) -> Design:
    """Dimensions and copper of a brief, nothing written."""
    return make_design(read_brief(brief_path, library), library, str(brief_path))


def new_brief(path: Path) -> Path:
    """Write a commented brief for `path` (".toml" is added); never over an existing file."""
    target = path if path.suffix == ".toml" else path.with_name(path.name + ".toml")
    text = starter_brief(target.stem)
    try:
        with target.open("x", encoding="utf-8") as file:
            file.write(text)
    except FileExistsError as error:
        raise HandoffError(f"{target} exists already: choose another name or remove it") from error
    except OSError as error:
        raise HandoffError(f"cannot write {target}: {error.strerror}") from error
    return target


@dataclass(frozen=True)
class LineQuestion:
    """The options of `planar lines` as they were written; texts carry their units."""

    kind: str
    impedance: tuple[str, ...]
    laminate: tuple[str, ...]
    height: tuple[str, ...]
    eps_r: float | None
    tan_d: float
    frequency: str
    copper: str | None
    gap: str | None
    mask: bool
    fab: str


def lines(question: LineQuestion, library: Library) -> list[LineRow]:
    """Rows of widths for every laminate, height and impedance asked for. Raises `BriefError` with all faults."""
    ask = _Options()
    frequency = ask.read("frequency", question.frequency, "frequency", (1e6, 100e9))
    impedances = [ask.read("impedance", text, "impedance", (5.0, 1000.0)) for text in question.impedance]
    heights = [ask.read("height", text, "length", (0.01e-3, 0.02)) for text in question.height]
    gap = None if question.gap is None else ask.read("gap", question.gap, "length", (1e-6, 0.02))
    copper = None if question.copper is None else ask.read("copper", question.copper, "length", (0.0, 0.5e-3))
    if question.gap is not None and question.kind == "microstrip":
        ask.fault("gap", question.gap, "only --kind coplanar-strips has a gap")
    if question.eps_r is not None:
        if not 1.0 <= question.eps_r <= 20.0:
            ask.fault("eps-r", f"{question.eps_r:g}", "a relative permittivity is 1 to 20")
        if not 0.0 <= question.tan_d <= 0.2:
            ask.fault("tan-d", f"{question.tan_d:g}", "a loss tangent is 0 to 0.2")
        if question.laminate:
            ask.fault("laminate", question.laminate[0], "give --laminate or --eps-r, not both")
        if not heights:
            ask.fault("height", "(missing)", 'needed with --eps-r: --height "1.6 mm"')
    ask.raise_faults()
    fab = library.fab(question.fab)
    thickness = copper if copper is not None else (BASE_COPPER + fab.plating if question.eps_r is None else 0.0)
    request = LineRequest(question.kind, frequency, thickness, fab, question.mask, gap)
    return list(line_rows(_materials(question, heights, frequency, library), impedances or IMPEDANCES, request))


def plot_lines(rows: list[LineRow], path: Path) -> None:
    """Write width over impedance as an SVG. Raises `HandoffError` when it cannot be written."""
    from planar.report.line_plot import write_line_plot

    if path.suffix.lower() != ".svg":
        raise HandoffError(f"{path}: the plot is an SVG, name it with .svg")
    try:
        write_line_plot(rows, path)
    except OSError as error:
        raise HandoffError(f"cannot write {path}: {error.strerror}") from error


def _materials(
    question: LineQuestion, heights: list[float], frequency: float, library: Library
) -> list[tuple[Material, float]]:
    if question.eps_r is not None:
        material = Material("given", question.eps_r, question.tan_d)
        return [(material, height) for height in heights]
    laminates = [library.laminate(key) for key in question.laminate or ("fr4-general",)]
    return [
        (Material.of(laminate, frequency), height)
        for laminate in laminates
        for height in heights or laminate.thicknesses
    ]


class _Options:
    """Reads command-line texts, collecting the faults of all of them."""

    def __init__(self) -> None:
        self.faults: list[Fault] = []

    def read(self, option: str, text: str, kind: str, span: tuple[float, float]) -> float:
        """SI value of `text`; a fault, and the lower end, when it is none or outside `span`."""
        try:
            value = quantity(text, kind)
        except UnitError as error:
            self.fault(option, text, str(error))
            return span[0]
        if not span[0] <= value <= span[1]:
            self.fault(option, text, f"from {show(span[0], kind)} to {show(span[1], kind)}")
        return value

    def fault(self, option: str, text: str, expected: str) -> None:
        self.faults.append(Fault("command line", f"--{option}", text, expected))

    def raise_faults(self) -> None:
        if self.faults:
            raise BriefError(self.faults)


def library_entries(library: Library, kind: str | None = None) -> dict[str, list[dict[str, str]]]:
    """Key, title and file of every entry, by kind; of one `kind` only when it is given."""
    return {
        each: [_entry_head(library, each, key) for key in library.keys(each)]
        for each in ([kind] if kind is not None else KINDS)
    }


def library_entry(library: Library, kind: str, key: str) -> dict[str, Any]:
    """One entry with every value and the source beside it."""
    raw = parse(library.source(kind, key))
    values = {}
    for name, table in raw.items():
        if isinstance(table, dict) and "source" in table:
            rest = {k: v for k, v in table.items() if k != "source"}
            values[name] = {"value": rest.get("value", rest) if len(rest) == 1 else rest, "source": table["source"]}
    return _entry_head(library, kind, key) | {"values": values}


def _entry_head(library: Library, kind: str, key: str) -> dict[str, str]:
    path = library.source(kind, key)
    return {"key": key, "title": str(parse(path).get("title", "")), "file": str(path)}


def write_pack(design: Design, folder: Path) -> None:
    """Write every file of the pack into the empty `folder`."""
    layout, fabrication = folder / "layout", folder / "fabrication"
    layout.mkdir()
    fabrication.mkdir()
    write_layout_files(design.layout, layout, status=design.status)
    sheet = _sheet(design)
    write_stackup_json(sheet, fabrication / "stackup.json")
    write_stackup_markdown(sheet, fabrication / "stackup.md")
    (folder / "brief.toml").write_text(write_brief(design.choices.brief), encoding="utf-8")
    summary = json.dumps(design_facts(design), indent=2, ensure_ascii=False) + "\n"
    (folder / "design.json").write_text(summary, encoding="utf-8")


def check_pack(design: Design, folder: Path) -> None:
    """Read the written files again and compare. Raises `HandoffError` naming what differs."""
    check_files(design.layout, folder / "layout")
    check_stackup(_sheet(design), folder / "fabrication" / "stackup.json")


def design_facts(design: Design) -> dict[str, Any]:
    """The design in plain types, units in the names: what `design.json` and `--json` say."""
    choices, bare = design.choices, design.bare_loop
    facts: dict[str, Any] = {
        "name": design.name,
        "planar_version": __version__,
        "status": design.status,
        "dimensions_given": design.given,
        "family": choices.family.key,
        "shape": choices.brief.antenna.shape,
        "end": choices.end,
        "polarisation": choices.brief.target.polarisation,
        "connector": choices.connector.key,
        "fab": choices.fab.key,
        "band_hz": list(choices.brief.target.band),
        "dimensions_mm": {name: round(value * 1e3, 6) for name, value in design.dimensions.items()},
        "board_mm": [round(side * 1e3, 6) for side in design.layout.size],
        "first_order": {
            "bare_loop_frequency_hz": bare.frequency,
            "bare_loop_perimeter_mm": bare.perimeter * 1e3,
            "bare_loop_perimeter_wavelengths": bare.perimeter_wavelengths,
            "bare_loop_resistance_ohm": bare.resistance,
            "trace_eps_eff": bare.eps_eff,
            "expected_frequency_error": choices.family.frequency_error,
        },
        "lines": [_line_facts(line) for line in design.lines],
        "copper": _copper_facts(design.layout),
        "dc_short": design.layout.dc_short,
        "assumptions": list(choices.reasons),
        "findings": [asdict(finding) for finding in design.findings],
    }
    digest = hashlib.sha256(json.dumps(facts, sort_keys=True).encode()).hexdigest()
    return facts | {"hash": digest}


def _line_facts(line: DesignLine) -> dict[str, Any]:
    return {
        "name": line.name,
        "kind": line.line.kind,
        "width_mm": line.line.width * 1e3,
        "gap_mm": None if line.line.gap is None else line.line.gap * 1e3,
        "impedance_ohm": line.line.impedance,
        "tolerance_ohm": line.tolerance_ohm,
        "eps_eff": line.line.eps_eff,
        "quarter_wave_mm": line.line.quarter_wave * 1e3,
        "loss_db_per_m": line.line.loss_db_per_m,
        "reference": line.reference,
    }


def _copper_facts(layout: Layout) -> list[dict[str, Any]]:
    return [
        {
            "level": island.level.value,
            "role": island.role.value,
            "net": island.net,
            "area_mm2": island.outline.area * 1e6,
            "vertices": len(island.outline),
        }
        for island in layout.islands
    ]


def _sheet(design: Design) -> StackupSheet:
    choices = design.choices
    lines = tuple(
        ImpedanceLine(
            name=line.name,
            kind=line.line.kind,
            width_m=line.line.width,
            gap_m=line.line.gap,
            level=line.level.value,
            reference=line.reference,
            impedance_ohm=line.line.impedance,
            tolerance_ohm=line.tolerance_ohm,
            controlled=False,  # no plane under it: a fab that adjusted the width would detune the antenna
        )
        for line in design.lines
    )
    facts = SheetFacts(
        name=design.name,
        frequency_hz=choices.centre,
        finish=choices.fab.finishes[0],
        specification=choices.laminate.specification,
        outline_tolerance_m=choices.fab.outline_tolerance,
        dc_short=design.layout.dc_short,
    )
    return stackup_sheet(choices.stackup, lines, facts=facts)

"""What `planar lines` was asked, read from the texts of the command line into SI.

As in a brief, every fault is found before any is reported, and an option that would change nothing
is a fault: whoever wrote it expects that it does.
"""

from __future__ import annotations

from dataclasses import dataclass

from planar.design.line_table import LineRequest, LineRow, Material, line_rows
from planar.design.option_reader import OptionReader
from planar.library import Library

BASE_COPPER = 35e-6
"""m, foil of a board whose copper nobody stated (common practice, no source)."""
IMPEDANCES = (50.0, 75.0, 100.0)
"""ohm, where none is asked for."""
LAMINATES = ("fr4-general",)


@dataclass(frozen=True)
class LineQuestion:
    """The options of `planar lines` as they were written; texts carry their units."""

    kind: str
    impedance: tuple[str, ...]
    laminate: tuple[str, ...]
    height: tuple[str, ...]
    eps_r: float | None
    tan_d: float | None
    frequency: str
    copper: str | None
    gap: str | None
    mask: bool
    fab: str


def answer(question: LineQuestion, library: Library) -> list[LineRow]:
    """Rows for every laminate, height and impedance asked for.

    Raises `BriefError` with all faults of the options, and `LibraryError` for an unknown laminate or fab.
    """
    fab = library.fab(question.fab)
    ask = OptionReader()
    frequency = ask.read("frequency", question.frequency, "frequency", (1e6, 100e9))
    impedances = [ask.read("impedance", text, "impedance", (5.0, 1000.0)) for text in question.impedance]
    heights = [ask.read("height", text, "length", (0.01e-3, 0.02)) for text in question.height]
    gap = None if question.gap is None else ask.read("gap", question.gap, "length", (1e-6, 0.02))
    copper = None if question.copper is None else ask.read("copper", question.copper, "length", (0.0, 0.5e-3))
    if question.gap is not None and question.kind == "microstrip":
        ask.fault("gap", question.gap, "only --kind coplanar-strips has a gap")
    if question.mask and not fab.mask:
        ask.fault("mask", "on", f"{fab.key} applies no solder mask: leave --mask out or name another --fab")
    _check_material(question, ask)
    ask.raise_faults()
    thickness = copper if copper is not None else (BASE_COPPER + fab.plating if question.eps_r is None else 0.0)
    request = LineRequest(question.kind, frequency, thickness, fab, question.mask, gap)
    return list(line_rows(_materials(question, heights, frequency, library), impedances or IMPEDANCES, request))


def _check_material(question: LineQuestion, ask: OptionReader) -> None:
    """Faults of a substrate given by its numbers, or of numbers given beside a laminate."""
    if question.eps_r is None:
        if question.tan_d is not None:
            ask.fault("tan-d", f"{question.tan_d:g}", "goes with --eps-r; a laminate has its own loss tangent")
        return
    if not 1.0 <= question.eps_r <= 20.0:
        ask.fault("eps-r", f"{question.eps_r:g}", "a relative permittivity is 1 to 20")
    if question.tan_d is not None and not 0.0 <= question.tan_d <= 0.2:
        ask.fault("tan-d", f"{question.tan_d:g}", "a loss tangent is 0 to 0.2")
    if question.laminate:
        ask.fault("laminate", question.laminate[0], "give --laminate or --eps-r, not both")
    if not question.height:
        ask.fault("height", "(not given)", 'needed with --eps-r: --height "1.6 mm"')


def _materials(
    question: LineQuestion, heights: list[float], frequency: float, library: Library
) -> list[tuple[Material, float]]:
    if question.eps_r is not None:
        material = Material("given", question.eps_r, question.tan_d or 0.0)
        return [(material, height) for height in heights]
    laminates = [library.laminate(key) for key in question.laminate or LAMINATES]
    return [
        (Material.of(laminate, frequency), height)
        for laminate in laminates
        for height in heights or laminate.thicknesses
    ]

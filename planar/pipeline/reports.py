"""report.html: put together from the files of a pack, so that it can be made again from them and says what they say.

`planar make` writes it last, `planar report` anew; both go the same way. A refused brief has a page too, in a folder of
its own, so that an earlier result stays.
"""

from __future__ import annotations

import json
from collections.abc import Callable, Mapping, Sequence
from pathlib import Path
from typing import Any

from planar.design.design import Design
from planar.design.design_file import read_design
from planar.design.equivalent import circuit_of
from planar.design.portrait import Portrait
from planar.design.portrait_file import read_portrait
from planar.errors import BriefError, Fault, PlanarError
from planar.handoff import file_hashes, is_pack, packed, renewed
from planar.library import Library
from planar.network.touchstone import read_touchstone
from planar.pipeline.board_files import DESIGN, design_file
from planar.report.bars import Bar, Losses, loss_bar, ranked_bars
from planar.report.board_picture import board_picture, fitting_scale
from planar.report.callouts import keyed
from planar.report.circuit_picture import circuit_picture
from planar.report.compare_page import compare_page
from planar.report.dimension_marks import board_marks
from planar.report.page import report_page, write_report
from planar.report.page_facts import page_facts
from planar.report.plots import portrait_plots, response_plots
from planar.report.refusal_page import refusal_page
from planar.report.stackup_picture import stackup_picture

Progress = Callable[[str], None]
REPORT, FIELD, RESPONSE, SPREAD = "report.html", "field.json", "antenna.s1p", "spread.json"
"""Names in a pack: the page, what only the field solution knows, the predicted reflection, how made boards scatter."""
COMPARED = ("reflection", "board_top", "board_bottom", "cut-0")
"""Pictures a comparison shows of each design."""


def write_pack_report(folder: Path, library: Library) -> None:
    """Write report.html from the files of the pack in `folder`. Raises `PlanarError`."""
    facts, pictures = _told(folder / DESIGN, library)
    files = {name: digest for name, digest in file_hashes(folder).items() if name != REPORT}
    write_report(report_page(facts, pictures, files), folder / REPORT)


def report(path: Path, library: Library, progress: Progress = lambda stage: None) -> Path:
    """Write the page of the design at `path` (a design.json in its pack, or the folder of it) anew; where it is.

    Raises `PlanarError`; the pack then stays as it was.
    """
    source = design_file(path)
    pack = source.parent
    if source.name != DESIGN or not is_pack(pack.absolute()):
        raise BriefError([Fault(str(path), "file", source.name, f"the {DESIGN} of a pack, or the pack's folder")])
    progress("reading the pack")
    with renewed(pack) as fresh:
        write_pack_report(fresh, library)
    return pack / REPORT


def compare(paths: Sequence[Path], library: Library, target: Path, progress: Progress = lambda stage: None) -> Path:
    """Write a page to `target` that holds the designs at `paths` against each other. Raises `PlanarError`."""
    if len(paths) < 2:
        raise BriefError([Fault("command line", "designs", f"{len(paths)}", "two or more packs to compare")])
    told = []
    for path in paths:
        progress(f"reading {path}")
        told.append(_told(design_file(path), library))
    shown = [{name: each for name, each in pictures.items() if name in COMPARED} for _, pictures in told]
    write_report(compare_page([facts for facts, _ in told], shown), target)
    return target


def write_refusal(error: PlanarError, brief_text: str, folder: Path) -> Path:
    """Write the page of a refused brief into `folder`, replaced whole; where it is. Raises `HandoffError`."""
    with packed(folder) as fresh:
        write_report(refusal_page(error.facts(), brief_text), fresh / REPORT)
    return folder / REPORT


def _told(source: Path, library: Library) -> tuple[dict[str, Any], dict[str, str]]:
    """Facts and pictures of the design in the file `source` and the files beside it."""
    design = read_design(source, library)
    facts = json.loads(source.read_bytes())
    field, response = source.with_name(FIELD), source.with_name(RESPONSE)
    pictures = _board_pictures(design)
    if facts["prediction"] is not None and response.is_file():
        pictures |= response_plots(facts, read_touchstone(response))
        pictures["circuit"] = circuit_picture(circuit_of(facts["circuit"]), design.choices.centre)
    if field.is_file():
        pictures |= _field_pictures(facts, read_portrait(field))
    bars = _sensitivity_bars(facts)
    if bars:
        pictures["sensitivities"] = ranked_bars(bars, f"{design.name}: shift by the tolerance of each")
    return facts, pictures


def _board_pictures(design: Design) -> dict[str, str]:
    """Copper of each level for wide and narrow pages, and the cross-section."""
    layout = design.layout
    pictures = {}
    for level in layout.levels:
        marks, scale = board_marks(design, level), fitting_scale(layout)
        pictures[f"board_{level}"] = board_picture(layout, level, marks=marks, scale=scale)
        pictures[f"board_{level}-narrow"] = board_picture(layout, level, marks=marks, placing=keyed, scale=scale)
    pictures["stackup"] = stackup_picture(design.choices.stackup, layout, design.choices.centre)
    return pictures


def _field_pictures(facts: Mapping[str, Any], portrait: Portrait) -> dict[str, str]:
    lost = portrait.losses
    shares = Losses(lost.radiated, lost.guided, lost.copper, lost.dielectric)
    return portrait_plots(facts, portrait) | {"losses": loss_bar(shares, str(facts["name"]))}


def _sensitivity_bars(facts: Mapping[str, Any]) -> list[Bar]:
    """MHz either way by the tolerance of each dimension and layer, where the design has its sensitivities."""
    shifts: Mapping[str, float] = page_facts(facts)["derived"]["tolerance_shift_mhz"]
    return [Bar(name, mhz, "MHz", -mhz, mhz) for name, mhz in shifts.items()]

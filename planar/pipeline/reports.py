"""report.html: put together from the files of a pack, so that it can be made again from them and says what they say.

`planar make` writes it last, `planar report` anew; both go the same way. A refused brief has a page too, in a folder of
its own, so that an earlier result stays.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from planar import __version__
from planar.design.design import Design
from planar.design.design_file import drawn_again, read_facts
from planar.design.equivalent import circuit_of
from planar.design.portrait import Portrait
from planar.design.portrait_file import read_portrait
from planar.design.spread_facts import read_spread
from planar.errors import BriefError, Fault, HandoffError, PlanarError
from planar.handoff import file_hashes, is_pack, packed, renewed
from planar.library import Library
from planar.network.touchstone import read_touchstone
from planar.pipeline.design_paths import DESIGN, design_file
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
from planar.report.safety import known_gain
from planar.report.spread_pictures import spread_envelope, spread_pictures
from planar.report.stackup_picture import stackup_picture

Progress = Callable[[str], None]
REPORT, FIELD, RESPONSE, SPREAD = "report.html", "field.json", "antenna.s1p", "spread.json"
"""Names in a pack: the page, what only the field solution knows, the predicted reflection, how made boards scatter."""
COMPARED = ("reflection", "board_top", "board_top-narrow", "board_bottom", "board_bottom-narrow", "cut-0")
"""Pictures a comparison shows of each design."""


def write_pack_report(folder: Path, library: Library) -> None:
    """Write report.html from the files of the pack in `folder`. Raises `PlanarError`."""
    told = _told(folder / DESIGN, library)
    files = {name: digest for name, digest in file_hashes(folder).items() if name != REPORT}
    write_report(report_page(told.facts, told.pictures, files, told.spread, told.peak_gain_dbi), folder / REPORT)


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
    _check_page(target)
    told = []
    for path in paths:
        progress(f"reading {path}")
        told.append(_told(design_file(path), library))
    shown = [{name: each for name, each in one.pictures.items() if name in COMPARED} for one in told]
    write_report(compare_page([one.facts for one in told], shown), target)
    return target


def _check_page(target: Path) -> None:
    """Raise `HandoffError` where the file at `target` is none of ours: a page replaces an earlier one, nothing else."""
    try:
        ours = not target.exists() or target.read_bytes().startswith(b"<!DOCTYPE html>")
    except OSError as error:
        raise HandoffError(f"cannot write {target}: {error.strerror}") from error
    if not ours:
        raise HandoffError(f"{target} exists already and is no page: choose another name or remove it")


def write_refusal(error: PlanarError, brief_text: str, folder: Path) -> Path:
    """Write the page of a refused brief into `folder`, replaced whole; where it is. Raises `HandoffError`."""
    with packed(folder) as fresh:
        write_report(refusal_page(error.facts(), brief_text), fresh / REPORT)
    return folder / REPORT


@dataclass(frozen=True)
class _Told:
    """What the files of a pack tell: content of design.json, pictures, the spread if there is one, the largest gain."""

    facts: dict[str, Any]
    pictures: dict[str, str]
    spread: dict[str, Any] | None
    peak_gain_dbi: float | None


def _told(source: Path, library: Library) -> _Told:
    """What the design in the file `source` and the files beside it tell."""
    facts = read_facts(source)
    design = drawn_again(facts, str(source), library)
    made_by = facts.get("planar_version")
    if made_by != __version__:  # another version may mean something else by the same key
        right = f"a pack made by planar {__version__}: run planar make with its brief.toml again"
        raise BriefError([Fault(str(source), "planar_version", f'"{made_by}"', right)])
    field, response = source.with_name(FIELD), source.with_name(RESPONSE)
    spread = _spread(source.with_name(SPREAD), facts["hash"])
    pictures, peak = _board_pictures(design), None
    if facts["prediction"] is not None and response.is_file():
        cloud = None if spread is None else spread_envelope(spread)
        pictures |= response_plots(facts, read_touchstone(response), cloud)
        pictures["circuit"] = circuit_picture(circuit_of(facts["circuit"]), design.choices.centre)
    if field.is_file():
        portrait = read_portrait(field)
        pictures |= _field_pictures(facts, portrait)
        peak = known_gain(portrait, design.choices.brief.target.band)
    bars = _sensitivity_bars(facts)
    if bars:
        pictures["sensitivities"] = ranked_bars(bars, f"{design.name}: shift by the tolerance of each")
    if spread is not None:
        pictures |= spread_pictures(spread)
    return _Told(facts, pictures, spread, peak)


def _spread(path: Path, digest: str) -> dict[str, Any] | None:
    """The spread in the file `path`, where there is one and it is that of the design with the hash `digest`."""
    if not path.is_file():
        return None
    spread = read_spread(path)
    return spread if spread.get("design_hash") == digest else None


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

"""`planar panel`: the boards of a design joined for the fab, with files of their own beside those of the board."""

from __future__ import annotations

import json
import re
from collections.abc import Callable, Mapping
from dataclasses import asdict, dataclass, replace
from pathlib import Path
from typing import Any

from planar.copper.outline import Outline
from planar.copper.panel import PanelRequest, PlannedPanel, connector_box, plan_panel
from planar.design.coupon import design_coupon
from planar.design.design import Design
from planar.design.design_file import drawn_again, read_facts
from planar.errors import BriefError, Fault
from planar.handoff import FabricationFacts, PanelFacts
from planar.library import Library
from planar.pipeline.board_files import (
    REVISION,
    Making,
    beside_design,
    check_making,
    design_ring,
    gerber_facts,
    impedance_lines,
    sheet_of,
    write_making,
)
from planar.pipeline.design_paths import design_file

Progress = Callable[[str], None]
PART = "panel"
"""Folder of the panel in a pack."""
_COUNT = re.compile(r"\s*(\d{1,3})\s*[x*]\s*(\d{1,3})\s*")


@dataclass(frozen=True)
class Panelled:
    """A design, its panel and the folder the files of the panel were written to."""

    design: Design
    panel: PlannedPanel
    folder: Path


@dataclass(frozen=True)
class PanelQuestion:
    """What is asked of a panel: count of columns and rows such as "2x3", None for the most that fit; "score" or "tabs",
    None for what suits the board; whether a coupon goes with it."""

    count: str | None = None
    separation: str | None = None
    coupon: bool = False


def panel(
    path: Path, library: Library, outputs: Path | None, question: PanelQuestion, progress: Progress = lambda stage: None
) -> Panelled:
    """Plan the panel of the design at `path` (a design.json or the folder of its pack) and write its files.

    They join the pack the design lies in. Where that is none, or `outputs` are named, they stand alone there in
    <name>-panel. Raises `PlanarError`; nothing is then left behind.
    """
    source = design_file(path)
    count = None if question.count is None else _read_count(question.count)
    progress("drawing the board")
    said = read_facts(source)
    design = drawn_again(said, str(source), library)
    progress("planning the panel")
    coupon = design_coupon(design.choices, design.lines, library=library) if question.coupon else None
    request = _request(design, said["hash"], count, question.separation)
    request = replace(request, coupon=None if coupon is None else coupon.layout)
    planned = plan_panel(design.layout, design.choices.fab, request)
    ring = None if coupon is None else coupon.dimensions["via_ring"]
    making = _making(design, planned, said, coupon_ring=ring)
    with beside_design(source, outputs, design.name, PART) as (fresh, folder):
        progress("writing files")
        write_making(making, fresh)
        told = json.dumps(panel_facts(design, planned), indent=2, ensure_ascii=False) + "\n"
        (fresh / "panel.json").write_bytes(told.encode("utf-8"))
        progress("reading the files back")
        check_making(making, fresh)
    return Panelled(design, planned, folder)


def _read_count(text: str) -> tuple[int, int]:
    found = _COUNT.fullmatch(text)
    if found is None or not (int(found[1]) and int(found[2])):
        raise BriefError([Fault("command line", "--count", text, 'columns and rows such as "2x3", each at least 1')])
    return int(found[1]), int(found[2])


def _request(design: Design, digest: str, count: tuple[int, int] | None, separation: str | None) -> PanelRequest:
    choices = design.choices
    return PanelRequest(
        design.name,
        REVISION,
        digest,
        choices.brief.board.thickness,
        choices.masked,
        count,
        separation,
        body=connector_box(choices.connector),
    )


def _making(design: Design, planned: PlannedPanel, said: Mapping[str, Any], *, coupon_ring: float | None) -> Making:
    """The panel to be made; `said` is the content of the design's file, `coupon_ring` the via ring of a coupon, m."""
    choices, fab, name = design.choices, design.choices.fab, f"{design.name}-{PART}"
    panel = PanelFacts(
        planned.columns,
        planned.rows,
        planned.board_size,
        planned.score_web,
        planned.tab_width,
        bad_boards_allowed=True,
        coupon_size_m=None if planned.coupon is None else _size(planned.coupon),
    )
    gerber = gerber_facts(name, said["hash"], choices.masked, via_ring=design_ring(design))
    gerber = replace(gerber, coupon_ring_m=coupon_ring)
    facts = FabricationFacts(gerber, fab.min_track, fab.min_gap, fab.hole_tolerance, panel)
    dc_short = design.layout.dc_short
    lines = impedance_lines(design)
    sheet = sheet_of(planned.layout, choices, choices.stackup, lines, name=name, dc_short=dc_short)
    return Making(name, planned.layout, sheet, facts, said["status"])


def panel_facts(design: Design, planned: PlannedPanel) -> dict[str, Any]:
    """The panel in plain types, units in the names: what panel.json and `--json` say."""
    return {
        "name": design.name,
        "columns": planned.columns,
        "rows": planned.rows,
        "boards": planned.boards,
        "places": list(planned.places),
        "board_turned": planned.turned,
        "separation": planned.separation,
        "panel_mm": _mm(planned.layout.size),
        "board_mm": _mm(planned.board_size),
        "spacing_mm": round(planned.spacing * 1e3, 6),
        "score_web": planned.score_web,
        "tab_width_mm": None if planned.tab_width is None else round(planned.tab_width * 1e3, 6),
        "panels_per_fab_panel": planned.arrays_per_fab_panel,
        "boards_per_fab_panel": planned.boards_per_fab_panel,
        "used_share": round(planned.used_share, 4),
        "findings": [asdict(finding) for finding in planned.findings],
    }


def _size(outline: Outline) -> tuple[float, float]:
    x0, y0, x1, y1 = outline.bounds
    return x1 - x0, y1 - y0


def _mm(size: tuple[float, float]) -> list[float]:
    return [round(side * 1e3, 6) for side in size]

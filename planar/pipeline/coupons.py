"""`planar coupon`: a board to measure the laminate on, and what its measurement says of it."""

from __future__ import annotations

import json
from collections.abc import Callable, Sequence
from dataclasses import asdict, dataclass
from pathlib import Path
from typing import Any

from planar.design.coupon import Coupon, design_coupon
from planar.design.coupon_measure import CouponMeasurement, measure_coupon
from planar.design.coupon_sheet import coupon_sheet
from planar.design.design import Design
from planar.design.design_file import drawn_again, read_design, read_facts
from planar.handoff import FabricationFacts, ImpedanceLine
from planar.library import Library
from planar.pipeline.board_files import (
    Making,
    beside_design,
    check_making,
    gerber_facts,
    sheet_of,
    write_making,
)
from planar.pipeline.design_paths import design_file

Progress = Callable[[str], None]
PART = "coupon"
"""Folder of the coupon in a pack."""
SHEET = "formula-sheet.md"


@dataclass(frozen=True)
class Couponed:
    """A design, its coupon and the folder the files of the coupon were written to."""

    design: Design
    coupon: Coupon
    folder: Path


def coupon(path: Path, library: Library, outputs: Path | None, progress: Progress = lambda stage: None) -> Couponed:
    """Draw the coupon of the design at `path` (a design.json or the folder of its pack) and write its files.

    They join the pack the design lies in. Where that is none, or `outputs` are named, they stand alone there in
    <name>-coupon. Raises `PlanarError`; nothing is then left behind.
    """
    source = design_file(path)
    progress("drawing the coupon")
    facts = read_facts(source)
    design = drawn_again(facts, str(source), library)
    drawn = design_coupon(design.choices, design.lines, library=library)
    making = _making(design, drawn, str(facts["hash"]))
    with beside_design(source, outputs, design.name, PART) as (fresh, folder):
        progress("writing files")
        write_making(making, fresh)
        told = json.dumps(coupon_facts(drawn), indent=2, ensure_ascii=False) + "\n"
        (fresh / "coupon.json").write_bytes(told.encode("utf-8"))
        (fresh / SHEET).write_bytes(coupon_sheet(drawn, design=source.name).encode("utf-8"))
        progress("reading the files back")
        check_making(making, fresh)
    return Couponed(design, drawn, folder)


def measured_coupon(
    path: Path, library: Library, files: Sequence[Path], *, thickness: float | None
) -> CouponMeasurement:
    """What the Touchstone `files`, measured on the coupon of the design at `path`, say of its laminate.

    `thickness` is that of the dielectric as measured, m. Raises `PlanarError`.
    """
    design = read_design(design_file(path), library)
    drawn = design_coupon(design.choices, design.lines, library=library)
    return measure_coupon(drawn, files, thickness=thickness)


def _making(design: Design, drawn: Coupon, digest: str) -> Making:
    choices, fab, name = design.choices, drawn.fab, f"{design.name}-{PART}"
    trace = ImpedanceLine(
        name="impedance trace",
        kind="microstrip",
        width_m=drawn.dimensions["trace_width"],
        gap_m=None,
        level="top",
        reference="bottom copper",
        impedance_ohm=drawn.trace_impedance,
        tolerance_ohm=(fab.impedance_tolerance or 0.1) * drawn.trace_impedance,
        controlled=False,  # what the fab really makes is what is to be measured
    )
    gerber = gerber_facts(name, digest, drawn.masked, via_ring=drawn.dimensions["via_ring"])
    facts = FabricationFacts(gerber, fab.min_track, fab.min_gap, fab.hole_tolerance)
    dc_short = drawn.layout.dc_short
    sheet = sheet_of(drawn.layout, choices, drawn.stackup, (trace,), name=name, dc_short=dc_short)
    return Making(name, drawn.layout, sheet, facts, "A board to measure the laminate on: made like the antenna's.")


def coupon_facts(drawn: Coupon) -> dict[str, Any]:
    """The coupon in plain types, units in the names: what coupon.json and `--json` say."""
    return {
        "name": drawn.name,
        "laminate": drawn.laminate.key,
        "board_mm": [round(side * 1e3, 6) for side in drawn.layout.size],
        "dimensions_mm": {name: round(value * 1e3, 6) for name, value in drawn.dimensions.items()},
        "ring_order_for_the_band": drawn.order,
        "trace_impedance_ohm": round(drawn.trace_impedance, 4),
        "resonances": [
            {"order": r.order, "frequency_hz": round(r.frequency), "eps_eff": round(r.eps_eff, 5), "q": round(r.q, 1)}
            for r in drawn.resonances
        ],
        "phases": [
            {
                "frequency_hz": round(p.frequency),
                "long_minus_short_rad": round(p.phase, 5),
                "loss_db": round(p.loss_db, 4),
                "eps_eff": round(p.eps_eff, 5),
                "impedance_ohm": round(p.impedance, 3),
            }
            for p in drawn.phases
        ],
        "notes": list(drawn.notes),
        "findings": [asdict(finding) for finding in drawn.findings],
    }


def measurement_facts(found: CouponMeasurement) -> dict[str, Any]:
    """What a coupon's measurement says, in plain types; uncertainties are expanded, k = 2."""
    return {
        "eps_r": found.eps_r,
        "eps_r_uncertainty": found.uncertainty,
        "frequency_hz": found.frequency,
        "library_eps_r": found.nominal,
        "library_tolerance": found.nominal_tolerance,
        "thickness_mm": found.thickness * 1e3,
        "methods": {
            name: {
                "eps_r": each.eps_r,
                "eps_r_uncertainty": each.uncertainty,
                "standard_contributions": {c.name: c.standard for c in each.contributions},
            }
            for name, each in found.by_method
        },
        "resonances": [
            {
                "order": r.order,
                "frequency_hz": r.frequency,
                "q_loaded": r.q,
                "q_unloaded": r.unloaded_q,
                "eps_eff": r.eps_eff,
                "eps_r": r.estimate.eps_r,
                "eps_r_uncertainty": r.estimate.uncertainty,
            }
            for r in found.resonances
        ],
        "tan_d": None if found.tan_d is None else found.tan_d.tan_d,
        "tan_d_uncertainty": None if found.tan_d is None else found.tan_d.uncertainty,
        "assumptions": list(found.assumptions),
    }

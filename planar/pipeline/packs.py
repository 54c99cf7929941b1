"""What a pack holds: written in one call and read back in another."""

from __future__ import annotations

import json
import re
from pathlib import Path

import numpy as np

from planar.brief import write_brief
from planar.design.design import Design
from planar.design.design_file import design_facts
from planar.design.prediction import Prediction
from planar.handoff import (
    FabricationFacts,
    GerberFacts,
    ImpedanceLine,
    ProjectFacts,
    SheetFacts,
    StackupSheet,
    check_fabrication_files,
    check_files,
    check_zip,
    creation_date,
    stackup_sheet,
    write_fabrication_files,
    write_layout_files,
    write_zip,
)
from planar.network.response import Response
from planar.network.spice import spice_subcircuit
from planar.network.touchstone import write_touchstone
from planar.units import show

REVISION = "A"
"""Of every design as planar makes it; a change of the brief is another design with another hash."""
S_DIGITS = 9
"""Decimals of a predicted reflection: what lies beyond is rounding."""


def write_pack(design: Design, folder: Path) -> None:
    """Write every file of the pack into the empty `folder`."""
    layout, fabrication = folder / "layout", folder / "fabrication"
    layout.mkdir()
    fabrication.mkdir()
    write_layout_files(design.layout, layout, status=design.status)
    told = design_facts(design)
    write_fabrication_files(design.layout, _sheet(design), fabrication, facts=_fabrication_facts(design, told["hash"]))
    write_zip(fabrication, folder / f"{design.name}-fabrication.zip")
    (folder / "brief.toml").write_bytes(write_brief(design.brief).encode("utf-8"))
    summary = json.dumps(told, indent=2, ensure_ascii=False) + "\n"
    (folder / "design.json").write_bytes(summary.encode("utf-8"))
    if design.prediction is not None:
        _write_prediction(design, design.prediction, folder)


def _write_prediction(design: Design, prediction: Prediction, folder: Path) -> None:
    """The response as a Touchstone file and the circuit as a SPICE subcircuit."""
    low, high = (show(end, "frequency", 4) for end in prediction.trusted)
    comments = (
        f"{design.name}: predicted reflection at the pads, nominal board",
        design.status,
        f"From {low} to {high} on the fine mesh; outside on the sizing mesh, for orientation only.",
    )
    response = prediction.response
    rounded = Response(np.round(response.frequency), np.round(response.s, S_DIGITS), response.z0)
    write_touchstone(rounded, folder / "antenna.s1p", comments=comments)
    named = re.sub(r"[^A-Za-z0-9_]", "_", design.name)
    text = spice_subcircuit(prediction.circuit, f"antenna_{named}", comments=comments[:1])
    (folder / "circuit.cir").write_bytes(text.encode("ascii"))


def check_pack(design: Design, folder: Path) -> None:
    """Read the written files again and compare. Raises `HandoffError` naming what differs."""
    check_files(design.layout, folder / "layout")
    facts = _fabrication_facts(design, design_facts(design)["hash"])
    check_fabrication_files(design.layout, _sheet(design), folder / "fabrication", facts=facts)
    check_zip(folder / "fabrication", folder / f"{design.name}-fabrication.zip")


def _fabrication_facts(design: Design, digest: str) -> FabricationFacts:
    choices = design.choices
    project = ProjectFacts(design.name, REVISION, digest, creation_date())
    ring = design.dimensions.get("via_ring", choices.fab.min_annular_ring)
    gerber = GerberFacts(project, choices.masked, ring)
    return FabricationFacts(gerber, choices.fab.min_track, choices.fab.min_gap, choices.fab.hole_tolerance)


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

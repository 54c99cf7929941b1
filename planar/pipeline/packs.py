"""What a pack holds: written in one call and read back in another."""

from __future__ import annotations

import json
import re
from pathlib import Path

import numpy as np

from planar.brief import write_brief
from planar.design.design import Design
from planar.design.design_file import design_facts
from planar.design.portrait_file import write_portrait
from planar.design.prediction import Prediction
from planar.handoff import BuildFacts, Expected, FabricationFacts
from planar.network.response import Response
from planar.network.spice import spice_subcircuit
from planar.network.touchstone import write_touchstone
from planar.pipeline.board_files import (
    Making,
    check_making,
    design_ring,
    gerber_facts,
    impedance_lines,
    sheet_of,
    write_making,
)
from planar.units import show

S_DIGITS = 9
"""Decimals of a predicted reflection: what lies beyond is rounding."""


def write_pack(design: Design, folder: Path) -> None:
    """Write every file of the pack into the empty `folder`."""
    told = design_facts(design)
    write_making(_making(design, told["hash"]), folder)
    (folder / "brief.toml").write_bytes(write_brief(design.brief).encode("utf-8"))
    summary = json.dumps(told, indent=2, ensure_ascii=False) + "\n"
    (folder / "design.json").write_bytes(summary.encode("utf-8"))
    if design.prediction is not None:
        _write_prediction(design, design.prediction, folder)
    if design.portrait is not None:
        write_portrait(design.portrait, folder / "field.json")


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
    check_making(_making(design, design_facts(design)["hash"]), folder)


def _making(design: Design, digest: str) -> Making:
    choices, layout = design.choices, design.layout
    gerber = gerber_facts(design.name, digest, choices.masked, via_ring=design_ring(design))
    fab = choices.fab
    build = _build_facts(design)
    facts = FabricationFacts(gerber, fab.min_track, fab.min_gap, fab.hole_tolerance, build=build)
    lines = impedance_lines(design)
    sheet = sheet_of(layout, choices, choices.stackup, lines, name=design.name, dc_short=layout.dc_short)
    return Making(design.name, layout, sheet, facts, design.status)


def _build_facts(design: Design) -> BuildFacts:
    """What the page for who builds the board says: connector, what is asked, what to expect, what cuts do."""
    target, connector, said = design.choices.brief.target, design.choices.connector, design.prediction
    expected = None
    if said is not None:
        band = said.margins.band
        matched = None if band is None else (band.low, band.high)
        expected = Expected(said.best_match, said.margins.worst_db, matched, said.centre.input_impedance_ohm)
    return BuildFacts(
        connector.title,
        connector.balanced,
        target.impedance,
        target.band,
        target.match_db,
        target.transmit,
        design.status,
        expected,
        tuple((cut.name, cut.hz) for cut in design.cuts[1:]),  # the first is the whole board
    )

"""The fabrication folder of a pack: all a fab house builds from, written in one call and read back in another."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path

from planar.copper.layout import Layout
from planar.errors import HandoffError
from planar.handoff.drawing_pdf import write_drawing
from planar.handoff.drill_file import drill_mismatches, write_drills
from planar.handoff.fab_notes import DrawingFacts
from planar.handoff.gerber import write_gerber_files
from planar.handoff.gerber_check import gerber_mismatches
from planar.handoff.gerber_content import GerberFacts, gerber_files
from planar.handoff.jobfile import Job, JobFacts, ListedFile, job_mismatches, listed, make_job, write_job
from planar.handoff.netlist import netlist_mismatches, write_netlist
from planar.handoff.stackup_files import check_stackup, write_stackup_json, write_stackup_markdown
from planar.handoff.stackup_sheet import StackupSheet

NETLIST, JOB, DRAWING = "netlist.ipc", "job.gbrjob", "drawing.pdf"
DRILLS = (
    ListedFile("drill-plated.xnc", "Plated,1,2,PTH", "Positive"),
    ListedFile("drill-unplated.xnc", "NonPlated,1,2,NPTH", "Positive"),
)


@dataclass(frozen=True)
class FabricationFacts:
    """What the files say beside layout and stackup sheet: `gerber` with project, masked sides and via ring, least
    track and gap the design keeps to (m), tolerance of finished holes (m)."""

    gerber: GerberFacts
    min_track_m: float
    min_gap_m: float
    hole_tolerance_m: float


def write_fabrication_files(layout: Layout, sheet: StackupSheet, folder: Path, *, facts: FabricationFacts) -> None:
    """Write layers, drills, netlist, job file, drawing and stackup sheets of a snapped `layout` into `folder`.

    Raises `HandoffError` where a format cannot hold the layout or a question of the fab is left open.
    """
    write_gerber_files(layout, folder, facts=facts.gerber)
    write_drills(layout, folder, facts=facts.gerber.project)
    write_netlist(layout, folder / NETLIST, facts=facts.gerber)
    write_job(_job(layout, sheet, facts), folder / JOB)
    drawing = DrawingFacts(facts.gerber.project, NETLIST, facts.hole_tolerance_m)
    write_drawing(layout, sheet, folder / DRAWING, facts=drawing)
    write_stackup_json(sheet, folder / "stackup.json")
    write_stackup_markdown(sheet, folder / "stackup.md")


def check_fabrication_files(layout: Layout, sheet: StackupSheet, folder: Path, *, facts: FabricationFacts) -> None:
    """Read the files of `folder` again. Raises `HandoffError` naming everything that differs from the layout."""
    wrong = [
        *gerber_mismatches(layout, folder, facts=facts.gerber),
        *drill_mismatches(layout, folder),
        *netlist_mismatches(layout, folder),
        *job_mismatches(_job(layout, sheet, facts), folder / JOB),
    ]
    if wrong:
        raise HandoffError("\n".join(["the fabrication files do not agree with the layout:", *wrong]))
    check_stackup(sheet, folder / "stackup.json")


def _job(layout: Layout, sheet: StackupSheet, facts: FabricationFacts) -> Job:
    plated = {hole.plated for hole in layout.holes}
    drills = [file for file, kind in zip(DRILLS, (True, False), strict=True) if kind in plated]
    files = (*listed(gerber_files(layout, facts.gerber)), *drills)
    return make_job(layout, sheet, JobFacts(facts.gerber.project, files, facts.min_track_m, facts.min_gap_m))

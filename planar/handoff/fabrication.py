"""The fabrication folder of a pack: all a fab house builds from, written in one call and read back in another."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path

from planar.copper.layout import Layout
from planar.errors import HandoffError
from planar.handoff.drawing_pdf import write_drawing
from planar.handoff.drill_file import DRILL_FILES, FILE_FUNCTIONS, drill_mismatches, drill_names, write_drills
from planar.handoff.fab_notes import DrawingFacts
from planar.handoff.fresh import fresh_mismatches, stale_mismatches
from planar.handoff.gerber import write_gerber_files
from planar.handoff.gerber_check import gerber_mismatches
from planar.handoff.gerber_content import GerberFacts, gerber_files
from planar.handoff.jobfile import Job, JobFacts, ListedFile, job_mismatches, listed, make_job, write_job
from planar.handoff.netlist import NETLIST, netlist_mismatches, write_netlist
from planar.handoff.panel_notes import PanelFacts
from planar.handoff.readme_build import BuildFacts
from planar.handoff.readmes import ReadmeFacts, readme_names, write_fabrication_readmes
from planar.handoff.stackup_files import stackup_mismatches, write_stackup_json, write_stackup_markdown
from planar.handoff.stackup_sheet import StackupSheet

JOB, DRAWING = "job.gbrjob", "drawing.pdf"
STACKUP, STACKUP_PAGE = "stackup.json", "stackup.md"


@dataclass(frozen=True)
class FabricationFacts:
    """What the files say beside layout and stackup sheet: `gerber` with project, masked sides and via ring, least
    track and gap the design keeps to (m), tolerance of finished holes (m), `panel` where the layout is one, `build`
    where somebody builds and measures it: a page is written for them."""

    gerber: GerberFacts
    min_track_m: float
    min_gap_m: float
    hole_tolerance_m: float
    panel: PanelFacts | None = None
    build: BuildFacts | None = None

    @property
    def drawing(self) -> DrawingFacts:
        """What the drawing is told."""
        return DrawingFacts(self.gerber.project, NETLIST, self.hole_tolerance_m, self.panel)


def fabrication_names(layout: Layout, facts: FabricationFacts) -> frozenset[str]:
    """Names of the files of `layout` in its fabrication folder: these and no others."""
    layers = (file.name for file in gerber_files(layout, facts.gerber))
    pages = readme_names(facts.build)
    return frozenset((*layers, *drill_names(layout), NETLIST, JOB, DRAWING, STACKUP, STACKUP_PAGE, *pages))


def write_fabrication_files(layout: Layout, sheet: StackupSheet, folder: Path, *, facts: FabricationFacts) -> None:
    """Write layers, drills, netlist, job file, drawing, stackup sheets and pages of a snapped `layout` into `folder`.

    Raises `HandoffError` where a format cannot hold the layout or a question of the fab is left open.
    """
    write_gerber_files(layout, folder, facts=facts.gerber)
    write_drills(layout, folder, facts=facts.gerber.project)
    write_netlist(layout, folder / NETLIST, facts=facts.gerber)
    write_job(_job(layout, sheet, facts), folder / JOB)
    write_stackup_json(sheet, folder / STACKUP)
    _write_papers(layout, sheet, folder, facts)


def _write_papers(layout: Layout, sheet: StackupSheet, folder: Path, facts: FabricationFacts) -> None:
    """What people read: no reader of ours."""
    write_drawing(layout, sheet, folder / DRAWING, facts=facts.drawing)
    write_stackup_markdown(sheet, folder / STACKUP_PAGE)
    pages = ReadmeFacts(facts.gerber, facts.drawing, facts.build)
    write_fabrication_readmes(layout, sheet, folder, facts=pages)


def check_fabrication_files(layout: Layout, sheet: StackupSheet, folder: Path, *, facts: FabricationFacts) -> None:
    """Read the files of `folder` again. Raises `HandoffError` naming everything that differs from the layout, and every
    file that is missing or does not belong there."""
    wrong = [
        *stale_mismatches(folder, fabrication_names(layout, facts)),
        *gerber_mismatches(layout, folder, facts=facts.gerber),
        *drill_mismatches(layout, folder, facts=facts.gerber.project),
        *netlist_mismatches(layout, folder, facts=facts.gerber),
        *job_mismatches(_job(layout, sheet, facts), folder / JOB),
        *stackup_mismatches(sheet, folder / STACKUP),
        *fresh_mismatches(folder, lambda fresh: _write_papers(layout, sheet, fresh, facts)),
    ]
    if wrong:
        raise HandoffError("\n".join(["the fabrication files do not agree with the layout:", *wrong]))


def _job(layout: Layout, sheet: StackupSheet, facts: FabricationFacts) -> Job:
    drills = [
        ListedFile(name, ",".join(FILE_FUNCTIONS[plated]), "Positive")
        for plated, name in DRILL_FILES.items()
        if name in drill_names(layout)
    ]
    files = (*listed(gerber_files(layout, facts.gerber)), *drills)
    return make_job(layout, sheet, JobFacts(facts.gerber.project, files, facts.min_track_m, facts.min_gap_m))

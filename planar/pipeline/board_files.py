"""The files of one thing to be made (a board, a panel, a coupon): for the layout engineer, the fab, and as an archive.

Written in one call, read back in another. They join the pack they belong to, or stand in a folder of their own.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from contextlib import contextmanager
from dataclasses import dataclass
from pathlib import Path

from planar.copper.layout import Layout, Level
from planar.design.choices import Choices
from planar.design.design import Design
from planar.handoff import (
    FabricationFacts,
    GerberFacts,
    ImpedanceLine,
    ProjectFacts,
    SheetFacts,
    StackupSheet,
    check_fabrication_files,
    check_layout_files,
    check_zip,
    creation_date,
    extended,
    is_pack,
    packed,
    stackup_sheet,
    write_fabrication_files,
    write_layout_files,
    write_zip,
)
from planar.pipeline.design_paths import DESIGN
from planar.stackup import Stackup

OUTPUTS = Path("outputs")
"""Where results go that join no pack, unless a folder is named."""
REVISION = "A"
"""Of every design as planar makes it; a change of the brief is another design with another hash."""


@dataclass(frozen=True)
class Making:
    """What is to be made: `name` of its archive, a snapped layout, what the fab is told, how far numbers can be
    trusted in one sentence."""

    name: str
    layout: Layout
    sheet: StackupSheet
    facts: FabricationFacts
    status: str


def write_making(making: Making, folder: Path) -> None:
    """Write layout/, fabrication/ and the archive of the latter into the empty `folder`."""
    layout, fabrication = folder / "layout", folder / "fabrication"
    layout.mkdir()
    fabrication.mkdir()
    write_layout_files(making.layout, layout, status=making.status)
    write_fabrication_files(making.layout, making.sheet, fabrication, facts=making.facts)
    write_zip(fabrication, folder / f"{making.name}-fabrication.zip")


def check_making(making: Making, folder: Path) -> None:
    """Read the files of `write_making` again and compare. Raises `HandoffError` naming what differs."""
    check_layout_files(making.layout, folder / "layout", status=making.status)
    check_fabrication_files(making.layout, making.sheet, folder / "fabrication", facts=making.facts)
    check_zip(folder / "fabrication", folder / f"{making.name}-fabrication.zip")


def gerber_facts(name: str, digest: str, masked: tuple[Level, ...], *, via_ring: float) -> GerberFacts:
    """Project, `masked` sides and via ring (m) of something made for the design whose hash is `digest`."""
    return GerberFacts(ProjectFacts(name, REVISION, digest, creation_date()), masked, via_ring)


def design_ring(design: Design) -> float:
    """Copper round the plated holes of a design, m."""
    return design.dimensions.get("via_ring", design.choices.fab.min_annular_ring)


def sheet_of(
    layout: Layout, choices: Choices, stackup: Stackup, lines: Sequence[ImpedanceLine], *, name: str, dc_short: bool
) -> StackupSheet:
    """The stackup summary of `layout` on `stackup`; `dc_short` is that of one board, coupon aside."""
    facts = SheetFacts(
        name=name,
        frequency_hz=choices.centre,
        finish=choices.fab.finishes[0],
        specification=choices.laminate.specification,
        outline_tolerance_m=choices.fab.outline_tolerance,
        dc_short=dc_short,
        kind=layout.kind,
    )
    return stackup_sheet(stackup, tuple(lines), facts=facts)


def impedance_lines(design: Design) -> tuple[ImpedanceLine, ...]:
    """The lines of a design as the fab sheet shows them."""
    return tuple(
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


def joins_pack(source: Path, outputs: Path | None) -> bool:
    """Whether results for the design file `source` join the pack it lies in: unless another folder is named."""
    return outputs is None and source.name == DESIGN and is_pack(source.absolute().parent)


@contextmanager
def beside_design(source: Path, outputs: Path | None, name: str, part: str) -> Iterator[tuple[Path, Path]]:
    """A folder to write into and the folder it will be: `part` of the pack in which the design file `source` lies, or,
    where that is no pack or `outputs` are named, `<name>-<part>` there. Raises `HandoffError` as `packed`."""
    if joins_pack(source, outputs):
        with extended(source.absolute().parent, part) as fresh:
            yield fresh, source.parent / part
    else:
        alone = (outputs or OUTPUTS) / f"{name}-{part}"
        with packed(alone) as fresh:
            yield fresh, alone

"""A stackup sheet and the facts of a drawing, for every test that writes one."""

from planar.copper.layout import Layout
from planar.handoff.fab_notes import DrawingFacts
from planar.handoff.gerber_attributes import ProjectFacts, creation_date
from planar.handoff.stackup_sheet import ImpedanceLine, SheetFacts, StackupSheet, stackup_sheet
from planar.library import WidebandDebye
from planar.stackup import Conductor, Layer, LayerKind, Stackup

FREQUENCY = 868.3e6
HASH = "0123456789abcdef" * 4
LINES = (
    ImpedanceLine("feed_line", "microstrip", 3.05e-3, None, "top", "bottom", 50.0, 5.0, True),
    ImpedanceLine("transformer_width", "coplanar-strips", 1.14e-3, 0.27e-3, "top", "none", 150.0, None, False),
)


def facts_for(name: str) -> DrawingFacts:
    return DrawingFacts(ProjectFacts(name, "A", HASH, creation_date()), "netlist.ipc", 0.1e-3)


def sheet_for(layout: Layout) -> StackupSheet:
    """A stackup with as many copper levels as `layout` has."""
    laminate = WidebandDebye.from_point(4.3, 0.02, at=FREQUENCY)
    mask = WidebandDebye.from_point(3.5, 0.025, at=FREQUENCY)
    bottom = [Layer("copper-bottom", LayerKind.COPPER, "copper", 43e-6)] if len(layout.levels) > 1 else []
    layers = (
        *bottom,
        Layer("dielectric", LayerKind.DIELECTRIC, "woven glass & <epoxy>", 1.6e-3, laminate, 0.1, 0.05, 0.3),
        Layer("copper-top", LayerKind.COPPER, "copper", 43e-6),
        Layer("mask-top", LayerKind.MASK, "solder mask", 20e-6, mask, 0.5),
    )
    conductor = Conductor(base_thickness=35e-6, plating=8e-6, conductivity=5.8e7, roughness_rq=0.4e-6)
    facts = SheetFacts(layout.name, FREQUENCY, "ENIG", "IPC-4101/126", 0.15e-3, dc_short=layout.dc_short)
    return stackup_sheet(Stackup(layers, conductor, 0.1), LINES, facts=facts)

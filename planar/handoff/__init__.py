"""Files for the fab and the layout engineer, written, read again and compared."""

from planar.handoff.check import check_files
from planar.handoff.content import Drill, FileContent, Label, file_content
from planar.handoff.dxf import read_dxf, write_dxf, write_dxf_segments
from planar.handoff.fabrication import (
    FabricationFacts,
    check_fabrication_files,
    fabrication_names,
    write_fabrication_files,
)
from planar.handoff.folder import check_layout_files, layout_names, write_layout_files
from planar.handoff.gds import read_gds, write_gds
from planar.handoff.gerber_attributes import ProjectFacts, creation_date
from planar.handoff.gerber_content import GerberFacts
from planar.handoff.layers import LAYERS, read_layers_csv, write_layers_csv
from planar.handoff.pack import (
    check_destination,
    check_manifest,
    check_zip,
    extended,
    file_hashes,
    is_pack,
    packed,
    read_manifest,
    renewed,
    write_manifest,
    write_zip,
)
from planar.handoff.panel_notes import PanelFacts
from planar.handoff.preview import write_preview_svg
from planar.handoff.readme import write_layout_readme
from planar.handoff.readme_build import BuildFacts, Expected
from planar.handoff.stackup_files import (
    read_stackup_json,
    stackup_mismatches,
    write_stackup_json,
    write_stackup_markdown,
)
from planar.handoff.stackup_sheet import ImpedanceLine, SheetFacts, SheetLayer, StackupSheet, stackup_sheet

__all__ = [
    "LAYERS",
    "BuildFacts",
    "Drill",
    "Expected",
    "FabricationFacts",
    "FileContent",
    "GerberFacts",
    "ImpedanceLine",
    "Label",
    "PanelFacts",
    "ProjectFacts",
    "SheetFacts",
    "SheetLayer",
    "StackupSheet",
    "check_destination",
    "check_fabrication_files",
    "check_files",
    "check_layout_files",
    "check_manifest",
    "check_zip",
    "creation_date",
    "extended",
    "fabrication_names",
    "file_content",
    "file_hashes",
    "is_pack",
    "layout_names",
    "packed",
    "read_dxf",
    "read_gds",
    "read_layers_csv",
    "read_manifest",
    "read_stackup_json",
    "renewed",
    "stackup_mismatches",
    "stackup_sheet",
    "write_dxf",
    "write_dxf_segments",
    "write_fabrication_files",
    "write_gds",
    "write_layers_csv",
    "write_layout_files",
    "write_layout_readme",
    "write_manifest",
    "write_preview_svg",
    "write_stackup_json",
    "write_stackup_markdown",
    "write_zip",
]

"""The layout folder of a pack: what a PCB layout engineer imports, in one call."""

from __future__ import annotations

from pathlib import Path

from planar.copper.layout import Layout
from planar.handoff.dxf import write_dxf, write_dxf_segments
from planar.handoff.gds import write_gds
from planar.handoff.layers import write_layers_csv
from planar.handoff.preview import write_preview_svg
from planar.handoff.readme import write_layout_readme


def write_layout_files(layout: Layout, folder: Path, *, status: str) -> None:
    """Write board.dxf, board-segments.dxf, board.gds, layers.csv, a preview of each level and README.txt.

    `layout` is snapped, `folder` exists, `status` says in one sentence how far the numbers can be trusted.
    Raises `HandoffError` when a format cannot hold the layout.
    """
    write_dxf(layout, folder / "board.dxf")
    write_dxf_segments(layout, folder / "board-segments.dxf")
    write_gds(layout, folder / "board.gds")
    write_layers_csv(folder / "layers.csv")
    for level in layout.levels:
        write_preview_svg(layout, level, folder / f"preview-{level}.svg")
    write_layout_readme(layout, folder / "README.txt", status=status)

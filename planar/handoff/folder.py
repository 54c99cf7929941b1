"""The layout folder of a pack: what a PCB layout engineer imports, written in one call and read back in another."""

from __future__ import annotations

from pathlib import Path

from planar.copper.layout import Layout
from planar.errors import HandoffError
from planar.handoff.check import layout_mismatches
from planar.handoff.dxf import write_dxf, write_dxf_segments, write_outline_dxf
from planar.handoff.fresh import fresh_mismatches, stale_mismatches
from planar.handoff.gds import write_gds
from planar.handoff.layers import write_layers_csv
from planar.handoff.preview import write_preview_svg
from planar.handoff.readme import write_layout_readme


def write_layout_files(layout: Layout, folder: Path, *, status: str) -> None:
    """Write board.dxf, board-segments.dxf, outline.dxf, board.gds, layers.csv, a preview of each level, README.txt.

    `layout` is snapped, `folder` exists, `status` says in one sentence how far the numbers can be trusted.
    Raises `HandoffError` when a format cannot hold the layout.
    """
    write_dxf(layout, folder / "board.dxf")
    write_dxf_segments(layout, folder / "board-segments.dxf")
    write_outline_dxf(layout, folder / "outline.dxf")
    write_gds(layout, folder / "board.gds")
    write_layers_csv(folder / "layers.csv")
    _write_papers(layout, folder, status)


def _write_papers(layout: Layout, folder: Path, status: str) -> None:
    """What people look at: no reader of ours."""
    for level in layout.levels:
        write_preview_svg(layout, level, folder / f"preview-{level}.svg")
    write_layout_readme(layout, folder / "README.txt", status=status)


def layout_names(layout: Layout) -> frozenset[str]:
    """Names of the files of `layout` in its layout folder: these and no others."""
    previews = (f"preview-{level}.svg" for level in layout.levels)
    exchange = ("board.dxf", "board-segments.dxf", "outline.dxf", "board.gds", "layers.csv")
    return frozenset((*exchange, "README.txt", *previews))


def check_layout_files(layout: Layout, folder: Path, *, status: str) -> None:
    """Read the files of `write_layout_files` again and compare: exchange files by what they hold, pages and pictures
    with what is written afresh. Raises `HandoffError` naming everything that differs, is missing or does not belong
    there."""
    wrong = [
        *stale_mismatches(folder, layout_names(layout)),
        *layout_mismatches(layout, folder),
        *fresh_mismatches(folder, lambda fresh: _write_papers(layout, fresh, status)),
    ]
    if wrong:
        raise HandoffError("\n".join(["the files for the layout do not agree with it:", *wrong]))

"""The pages of the fabrication folder: one for the CAM operator, one for who builds a board where there is one."""

from __future__ import annotations

from collections.abc import Collection
from dataclasses import dataclass
from pathlib import Path

from planar.copper.layout import Layout
from planar.handoff.fab_notes import DrawingFacts
from planar.handoff.gerber_content import GerberFacts
from planar.handoff.readme_build import BuildFacts, build_readme
from planar.handoff.readme_cam import cam_readme
from planar.handoff.stackup_sheet import StackupSheet

CAM_README, BUILD_README = "README-cam.txt", "README-build.txt"


@dataclass(frozen=True)
class ReadmeFacts:
    """What the pages say beside layout and stackup sheet: the facts of layer files, drawing and builder's page (None
    where nobody builds it, as a panel)."""

    gerber: GerberFacts
    drawing: DrawingFacts
    build: BuildFacts | None = None


def readme_names(build: BuildFacts | None) -> tuple[str, ...]:
    """Names of the pages."""
    return (CAM_README,) if build is None else (CAM_README, BUILD_README)


def write_fabrication_readmes(layout: Layout, sheet: StackupSheet, folder: Path, *, facts: ReadmeFacts) -> None:
    """Write README-cam.txt and, where facts for the builder are given, README-build.txt of a snapped `layout`.

    Raises `HandoffError` where a question of the fab has no answer.
    """
    for name, text in _pages(layout, sheet, facts).items():
        (folder / name).write_bytes(text.encode("utf-8"))


def _pages(layout: Layout, sheet: StackupSheet, facts: ReadmeFacts) -> dict[str, str]:
    names: Collection[str] = readme_names(facts.build)
    pages = {CAM_README: cam_readme(layout, sheet, gerber=facts.gerber, drawing=facts.drawing, pages=names)}
    if facts.build is not None:
        pages[BUILD_README] = build_readme(layout, sheet, facts=facts.build)
    return pages

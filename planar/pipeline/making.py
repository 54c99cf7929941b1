"""`planar make`, the main job: a brief in, its pack out, checked, with the page to decide from."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path

from planar.brief import read_brief
from planar.design.design import Design
from planar.errors import HandoffError, SynthesisError
from planar.handoff import check_destination, packed
from planar.library import Library
from planar.pipeline.designing import designed, with_sensitivities
from planar.pipeline.packs import check_pack, write_pack
from planar.pipeline.reports import SPREAD, write_pack_report, write_refusal

Progress = Callable[[str], None]
REFUSED = "-refused"
"""End of the folder a refusal's page is written to."""


@dataclass(frozen=True)
class Made:
    """A design and the folder its pack was written to; `gone` names what an earlier pack there had beside it: panel,
    coupon and spread were those of the earlier board."""

    design: Design
    folder: Path
    gone: tuple[str, ...] = ()


def make(
    brief_path: Path,
    library: Library,
    outputs: Path,
    *,
    sensitive: bool = False,
    progress: Progress = lambda stage: None,
) -> Made:
    """The main job: brief in, pack out, at `outputs`/<name>, on wish with the table of sensitivities.

    Raises `PlanarError`; nothing is then left behind but, for a design that is refused, the page that says why, at
    `outputs`/<name>-refused; a note of the exception names it.
    """
    progress("reading the brief")
    brief = read_brief(brief_path, library)
    folder = outputs / brief.name
    check_destination(folder)
    try:
        design = designed(brief, library, brief_path, progress)
    except SynthesisError as error:
        error.add_note(_refusal_note(error, brief_path, outputs / f"{brief.name}{REFUSED}"))
        raise
    if sensitive:
        design = with_sensitivities(design, progress)
    progress("writing files")
    gone = tuple(name for name in ("panel", "coupon", SPREAD) if (folder / name).exists())
    with packed(folder) as fresh:
        write_pack(design, fresh)
        progress("reading the files back")
        check_pack(design, fresh)
        progress("drawing the report")
        write_pack_report(fresh, library)
    return Made(design, folder, gone)


def _refusal_note(error: SynthesisError, brief_path: Path, folder: Path) -> str:
    """Write the page of the refusal and say where it is; a page that cannot be written hides no reason."""
    try:
        page = write_refusal(error, brief_path.read_bytes().decode("utf-8-sig"), folder)
    except HandoffError as unwritten:
        return f"no page of it: {unwritten}"
    return f"as a page: {page}"

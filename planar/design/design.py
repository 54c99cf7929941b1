"""A design: the brief with its dimensions, its copper, its lines and everything to be said about it.

`make_design` goes from a brief to a `Design`, or refuses: with every rule that is missed and with
the nearest change that was tried and works.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, replace

from planar.brief import Brief
from planar.copper.board import plan_board
from planar.copper.drawing import DrawingRequest
from planar.copper.families import FAMILIES
from planar.copper.layout import Layout
from planar.copper.rules import fab_findings
from planar.design.choices import Choices, choose
from planar.design.first_order import DETAILS, first_dimensions, given_dimensions
from planar.design.line_size import DesignLine, design_lines, line_settings
from planar.design.loop_size import LoopEstimate
from planar.design.nearest import nearest_changes
from planar.errors import BriefError, Finding, GeometryError, PlanarError, RangeError, Severity, SynthesisError
from planar.library import Library
from planar.units import show

MIRRORED = "circular-left"
"""Sense of circular polarisation drawn as the mirror image; the field solver confirms which is which."""


@dataclass(frozen=True)
class Design:
    """A finished first-order design. `given` tells that the dimensions stand in the brief.

    `dimensions` name -> m; `bare_loop` is the first-order resonance of the loop alone.
    """

    choices: Choices
    dimensions: Mapping[str, float]
    given: bool
    layout: Layout
    bare_loop: LoopEstimate
    lines: tuple[DesignLine, ...]
    findings: tuple[Finding, ...]

    @property
    def name(self) -> str:
        """Name of the brief."""
        return self.choices.brief.name

    @property
    def status(self) -> str:
        """One sentence on how far these dimensions can be trusted."""
        error = show(self.choices.family.frequency_error, "fraction", 2)
        if self.given:
            return f"Dimensions given, not sized. Resonance of the bare loop by formulas, expected error {error}."
        match = " The match is not predicted." if self.choices.family.feed == "coax" or self.choices.circular else ""
        return (
            f"First-order dimensions from line and loop formulas, not field-solved: expected frequency error {error}."
            f"{match} Do not order a quantity from them: build one, measure it, then decide."
        )


def make_design(brief: Brief, library: Library, where: str) -> Design:
    """Design of `brief`, read from the file `where`.

    Raises `BriefError` for dimensions the family does not have, `LibraryError`, and `SynthesisError`
    where no such board can be made, with every rule missed and the nearest changes that work.
    """
    try:
        design = _attempt(brief, library, where)
        refused = _refusals(design)
        reason = f"{brief.name}: this board cannot be made as asked:"
    except (RangeError, SynthesisError) as error:
        design, refused = None, getattr(error, "findings", ())
        reason = f"{brief.name}: {getattr(error, 'reason', str(error))}"
    if design is not None and not refused:
        return replace(design, findings=(*_cautions(design), *design.findings))

    def works(changed: Brief) -> bool:
        try:
            return not _refusals(_attempt(changed, library, where))
        except PlanarError:
            return False

    raise SynthesisError(reason, refused, nearest_changes(brief, library, works))


def _refusals(design: Design) -> tuple[Finding, ...]:
    return tuple(finding for finding in design.findings if finding.severity is Severity.REFUSE)


def _attempt(brief: Brief, library: Library, where: str) -> Design:
    """The design as far as formulas and drawing go, with the rules it misses among its findings."""
    choices = choose(brief, library)
    given = bool(brief.antenna.dimensions)
    if given:
        _check_names(choices, where)
    dimensions, bare = given_dimensions(choices) if given else first_dimensions(choices)
    request = drawing_request(choices)
    try:
        drawing = FAMILIES[choices.family.key](dimensions, request)
    except GeometryError as error:
        raise SynthesisError(f"the copper cannot be drawn: {error}") from error
    planned = plan_board(drawing, request, choices.levels)
    missed = fab_findings(planned.layout, choices.fab, brief.board.size_limit)
    lines = design_lines(dimensions, choices, line_settings(choices))
    return Design(choices, dimensions, given, planned.layout, bare, lines, (*planned.findings, *missed))


def drawing_request(choices: Choices) -> DrawingRequest:
    """What the drawing functions need of `choices`."""
    return DrawingRequest(
        name=choices.brief.name,
        family=choices.family.key,
        end=choices.end,
        mirrored=choices.brief.target.polarisation == MIRRORED,
        connector=choices.connector,
        fab=choices.fab,
        masked=choices.masked,
        size_limit=choices.brief.board.size_limit,
    )


def _check_names(choices: Choices, where: str) -> None:
    antenna = choices.brief.antenna
    stated = {"trace_width": antenna.trace_width, "corner_radius": antenna.corner_radius}
    given = dict(antenna.dimensions) | {name: value for name, value in stated.items() if value is not None}
    faults = choices.family.dimension_faults(given, choices.traits, DETAILS, where=where)
    if faults:
        raise BriefError(faults)


def _cautions(design: Design) -> list[Finding]:
    """What the user must know before ordering."""
    choices = design.choices
    findings = []
    if not design.given:
        error = show(choices.family.frequency_error, "fraction", 2)
        advice = "treat these dimensions as a start; verify before ordering"
        findings.append(
            Finding("first-order sizing", "dimensions", f"frequency within {error}", "field solution", advice)
        )
    if choices.family.feed == "coax":
        got = "not predicted by line formulas: the loop trace is a narrow ground and carries antenna current"
        findings.append(Finding("match", "target.match", got, f"{choices.brief.target.match_db:g} dB"))
    if choices.circular and choices.family.circular_note:
        findings.append(Finding("axial ratio", choices.family.key, choices.family.circular_note, "3 dB"))
    if choices.circular:
        got = "sense and axial ratio come from starting values, not computed"
        findings.append(Finding("polarisation", "target.polarisation", got, choices.brief.target.polarisation))
    if design.given:
        findings += _off_band(design)
    return findings


def _off_band(design: Design) -> list[Finding]:
    low, high = design.choices.brief.target.band
    frequency, error = design.bare_loop.frequency, design.choices.family.frequency_error
    if low * (1.0 - error) <= frequency <= high * (1.0 + error):
        return []
    limit = f"{show(low, 'frequency')} to {show(high, 'frequency')}"
    advice = "the bare loop's resonance need not be the best match; the line moves it"
    return [Finding("resonance", "antenna.dimensions", show(frequency, "frequency", 4), limit, advice, Severity.NOTE)]

"""A design: the brief with its dimensions, its copper, its lines and everything to be said about it.

`make_design` goes from a brief to a `Design`, or refuses: with every rule that is missed and with
the nearest change that was tried and works.
"""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass, replace

from planar.brief import Brief, parse_brief, write_brief
from planar.copper.layout import Layout
from planar.copper.rules import SIZE_RULE, fab_findings
from planar.design.choices import Choices, choose
from planar.design.first_order import DETAILS, first_dimensions, given_dimensions, loop_shape, stated_dimensions
from planar.design.line_size import DesignLine, design_lines, line_settings
from planar.design.loop_size import FORMULA_ERROR, LoopEstimate
from planar.design.nearest import nearest_changes
from planar.design.portrait import Portrait
from planar.design.prediction import Prediction
from planar.design.sensitivity import Sensitivity
from planar.design.sizing_record import SizingRecord
from planar.design.trial import draw
from planar.design.trim import Cut
from planar.errors import BriefError, Finding, PlanarError, RangeError, Severity, SynthesisError
from planar.library import Library
from planar.units import show

_LINE_MATCH = {
    "coax": "not predicted by line formulas: the loop trace is a narrow ground and carries antenna current",
    "balanced": "line formulas match the resonant loop at the middle of the band; over the band planar solve does",
}


@dataclass(frozen=True)
class Design:
    """A finished design. `given` tells that the dimensions stand in the brief.

    `dimensions` name -> m; `bare_loop` is the first-order resonance of the loop alone, None where given dimensions
    are outside the formulas and where the field solver has sized it. `prediction` is what the solver says of the copper
    and `sizing` how it came to be, both None for a first-order design; `sensitivities` are empty unless asked for,
    `cuts` unless the brief has trim tabs. `portrait` is what goes with a prediction to be looked at; it has a file of
    its own.
    """

    choices: Choices
    dimensions: Mapping[str, float]
    given: bool
    layout: Layout
    bare_loop: LoopEstimate | None
    lines: tuple[DesignLine, ...]
    findings: tuple[Finding, ...]
    prediction: Prediction | None = None
    sizing: SizingRecord | None = None
    sensitivities: tuple[Sensitivity, ...] = ()
    asked: Brief | None = None
    cuts: tuple[Cut, ...] = ()
    portrait: Portrait | None = None

    @property
    def brief(self) -> Brief:
        """The brief as it was asked: that of `choices` names the family where it was left open."""
        return self.asked or self.choices.brief

    @property
    def name(self) -> str:
        """Name of the brief."""
        return self.choices.brief.name

    @property
    def frequency_error(self) -> float:
        """Fraction by which the first-order frequency may be off."""
        return FORMULA_ERROR if self.given else self.choices.family.start(self.choices.traits).frequency_error

    @property
    def perimeter(self) -> float:
        """Length of the drawn mean line, m."""
        return loop_shape(self.choices, self.dimensions).perimeter(self.dimensions["loop_width"])

    @property
    def status(self) -> str:
        """One sentence on how far these dimensions can be trusted."""
        if self.prediction is not None:
            how = "Dimensions given" if self.given else "Sized on the field solver"
            return (
                f"{how}; predicted with {self.prediction.unknowns} unknowns, which move the input impedance by "
                f"{100.0 * self.prediction.convergence:.1f} % from a coarser mesh. Laminate and etch tolerances come "
                "on top: build one board and measure it before ordering a quantity."
            )
        error = show(self.frequency_error, "fraction", 2)
        if self.given and self.bare_loop is None:
            return "Dimensions given, not sized; the loop is outside the formulas, so nothing is predicted."
        if self.given:
            return f"Dimensions given, not sized. Resonance of the bare loop by formulas, expected error {error}."
        match = " The match over the band is not predicted."
        return (
            f"First-order dimensions from line and loop formulas, not field-solved: expected frequency error {error}."
            f"{match} Run planar solve on them, build one board and measure it before ordering a quantity."
        )


def make_design(brief: Brief, library: Library, where: str, *, oversize: float = 0.0) -> Design:
    """First-order design of `brief`, read from the file `where`; its board may exceed the brief's size limit by the
    fraction `oversize`.

    Raises `BriefError` for dimensions the family does not have, `LibraryError`, and `SynthesisError`
    where no such board can be made, with every rule missed and the nearest changes that work.
    """
    try:
        design = _attempt(brief, library, where)
        refused = _refusals(design, oversize)
        reason = f"{brief.name}: this board cannot be made as asked:"
    except RangeError as error:
        design, refused = None, ()
        look = "it follows from target.band, board.thickness and board.copper"
        reason = f"{brief.name}: outside what the formulas cover: {error}; {look}"
    except SynthesisError as error:
        design, refused, reason = None, error.findings, f"{brief.name}: {error.reason}"
    if design is not None and not refused:
        return replace(design, findings=(*_cautions(design), *design.findings))

    def works(changed: Brief) -> bool:
        try:
            valid = parse_brief(write_brief(changed), where, library)
            return not _refusals(_attempt(valid, library, where, drawn_only=True))
        except PlanarError:
            return False

    raise SynthesisError(reason, refused, nearest_changes(brief, library, works))


def _refusals(design: Design, oversize: float = 0.0) -> tuple[Finding, ...]:
    refused = tuple(finding for finding in design.findings if finding.severity is Severity.REFUSE)
    limit, size = design.choices.brief.board.size_limit, design.layout.size
    if limit is None or any(side > (1.0 + oversize) * most for side, most in zip(size, limit, strict=True)):
        return refused
    return tuple(finding for finding in refused if finding.rule != SIZE_RULE)


def _attempt(brief: Brief, library: Library, where: str, *, drawn_only: bool = False) -> Design:
    """The design as far as formulas and drawing go, with the rules it misses among its findings.

    `drawn_only` leaves out legend and line table: whether it can be made does not depend on them.
    """
    choices = choose(brief, library)
    given = bool(brief.antenna.dimensions)
    if given:
        _check_names(choices, where)
    dimensions, bare = given_dimensions(choices) if given else first_dimensions(choices)
    planned = draw(choices, dimensions, lettered_board=not drawn_only)
    missed = fab_findings(planned.layout, choices.fab, brief.board.size_limit)
    lines = () if drawn_only else design_lines(dimensions, choices, line_settings(choices))
    return Design(choices, dimensions, given, planned.layout, bare, lines, (*planned.findings, *missed))


def _check_names(choices: Choices, where: str) -> None:
    faults = choices.family.dimension_faults(stated_dimensions(choices), choices.traits, DETAILS, where=where)
    if faults:
        raise BriefError(faults)


def _cautions(design: Design) -> list[Finding]:
    """What the user must know before ordering."""
    choices = design.choices
    findings = []
    if not design.given:
        error = show(design.frequency_error, "fraction", 2)
        advice = "treat these dimensions as a start: planar solve says what they do"
        findings.append(
            Finding("first-order sizing", "dimensions", f"frequency within {error}", "field solution", advice)
        )
    if design.lines:
        findings.append(
            Finding("match", "target.match", _LINE_MATCH[choices.family.feed], f"{choices.brief.target.match_db:g} dB")
        )
    findings += _gap_match(design)
    findings += connector_impedance(choices)
    if choices.circular and choices.family.circular_note:
        findings.append(Finding("axial ratio", choices.family.key, choices.family.circular_note, "3 dB"))
    if choices.circular:
        got = "axial ratio not computed, the second gap is a starting value; the sense holds toward the top side"
        findings.append(Finding("polarisation", "target.polarisation", got, choices.brief.target.polarisation))
    if design.given:
        findings += _off_band(design)
    return findings


def connector_impedance(choices: Choices) -> list[Finding]:
    """A finding where the connector has another impedance than the port."""
    port, connector = choices.brief.target.impedance, choices.connector
    if connector.impedance in {None, port}:
        return []
    limit = f"{connector.impedance:g} ohm of {connector.key}"
    return [
        Finding("port impedance", "target.impedance", f"{port:g} ohm", limit, "choose a connector of that impedance")
    ]


def _gap_match(design: Design) -> list[Finding]:
    """Reflection of a loop that meets its port without a line."""
    choices, target = design.choices, design.choices.brief.target
    if design.lines or design.bare_loop is None:
        return []
    ratio = None if design.given else choices.family.start(choices.traits).gap_resistance_ratio
    ohm, port = design.bare_loop.resistance * (ratio or 1.0), target.impedance
    reflection = abs(ohm - port) / (ohm + port)
    if reflection <= 10.0 ** (target.match_db / 20.0):
        return []
    got = f"about {20.0 * math.log10(reflection):.1f} dB: {ohm:.0f} ohm at the gap, {port:g} ohm at the port"
    advice = f"match outside the board, ask for {ohm:.0f} ohm, or use a family that carries a line"
    return [Finding("match", "target.impedance", got, f"{target.match_db:g} dB", advice)]


def _off_band(design: Design) -> list[Finding]:
    low, high = design.choices.brief.target.band
    if design.bare_loop is None:
        got = "not computed: the loop is outside the formulas"
        return [Finding("resonance", "antenna.dimensions", got, "the band", "", Severity.NOTE)]
    frequency, error = design.bare_loop.frequency, design.frequency_error
    if low * (1.0 - error) <= frequency <= high * (1.0 + error):
        return []
    limit = f"{show(low, 'frequency')} to {show(high, 'frequency')}"
    advice = "the bare loop's resonance need not be the best match; the line moves it"
    far = not low * (1.0 - 4.0 * error) <= frequency <= high * (1.0 + 4.0 * error)
    severity = Severity.WARN if far else Severity.NOTE
    return [Finding("resonance", "antenna.dimensions", show(frequency, "frequency", 4), limit, advice, severity)]

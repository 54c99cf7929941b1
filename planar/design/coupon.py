"""A board to measure the laminate on, sized for a design: what is drawn, and what is expected of it.

Widths come from inverting our own microstrip analysis on the design's laminate, bare of mask. The lines differ by
as much as fits the board; the ring is the largest that fits with one of its resonances in the middle of the design's
band, or else its fundamental as near above the band as fits. Whatever the design's own board has, the coupon has two
copper levels.
"""

from __future__ import annotations

import math
from collections.abc import Iterable, Mapping
from dataclasses import dataclass

from planar.copper.coupon import CouponRequest, coupon_layout
from planar.copper.layout import Layout, Level
from planar.copper.rules import fab_findings
from planar.design.choices import Choices
from planar.design.coupon_line import BareLine, BareRing
from planar.design.coupon_size import CouponBasis, coupon_dimensions
from planar.design.line_size import DesignLine, rounded, rounded_up
from planar.errors import Finding, RangeError, Severity, SynthesisError
from planar.library import Connector, Fab, Laminate, Library
from planar.lines.line import analyse
from planar.lines.records import Conductor, Substrate
from planar.lines.static_spectral import DielectricLayer
from planar.lines.synthesis import width_for_impedance
from planar.stackup import BoardChoice, Stackup, build_stackup, loss_tangent
from planar.units import show

IMPEDANCE = 50.0
"""ohm, of analyser, lines and ring."""
HIGHEST = 6e9
"""Hz, resonances and phases are listed up to this, or to just above the design's band where that lies higher."""
MOST_ORDERS = 6
"""Resonances listed, unless the band needs a higher order."""
PHASE_FREQUENCIES = (0.5e9, 1e9, 2e9, 3e9, 4e9, 6e9)
"""Hz, at which the two-line phases are listed beside the band."""
FALLBACKS = ("edge-coax", "pigtail-pads")
"""Connectors tried where the design's own is no coax."""


@dataclass(frozen=True)
class ExpectedResonance:
    """Ring resonance `order` on the nominal laminate: `frequency` Hz, `eps_eff`, unloaded `q` without radiation."""

    order: int
    frequency: float
    eps_eff: float
    q: float


@dataclass(frozen=True)
class ExpectedPhase:
    """What the long line adds to the short one at `frequency` Hz on the nominal laminate.

    `phase` in rad (positive: later), `loss_db`, with `eps_eff` and `impedance` (ohm) of the line.
    """

    frequency: float
    phase: float
    loss_db: float
    eps_eff: float
    impedance: float


@dataclass(frozen=True)
class Coupon:
    """A measuring board and what is expected of it.

    `dimensions` name -> m, as drawn; `line` and `ring` the formulas on them; `stackup` of the coupon itself, two
    copper levels; `centre` the middle of the design's band, Hz. `order` is the resonance meant for the band. `notes`
    say in words what was decided.
    """

    name: str
    layout: Layout
    dimensions: Mapping[str, float]
    line: BareLine
    ring: BareRing
    laminate: Laminate
    fab: Fab
    connector: Connector
    stackup: Stackup
    centre: float
    trace_impedance: float
    order: int
    resonances: tuple[ExpectedResonance, ...]
    phases: tuple[ExpectedPhase, ...]
    findings: tuple[Finding, ...]
    notes: tuple[str, ...]

    @property
    def masked(self) -> tuple[Level, ...]:
        """Levels under solder mask, of the coupon's own two."""
        return _masked(self.stackup)

    @property
    def length_difference(self) -> float:
        """What the long line is longer than the short one, m."""
        return self.dimensions["long_length"] - self.dimensions["short_length"]


def design_coupon(choices: Choices, lines: Iterable[DesignLine], *, library: Library) -> Coupon:
    """The measuring board for the design of `choices` with its `lines`; `library` gives a coax launch where the design
    has none.

    Raises `SynthesisError` where fab, laminate or connector cannot make it, or where it would break a rule of the fab.
    """
    notes: list[str] = []
    _check(choices)
    connector = _connector(choices, library, notes)
    stackup = _stackup(choices, notes)
    try:
        line = _bare_line(choices, stackup)
        trace = _trace(choices, lines, stackup, notes)
        eps_r, tan_d = eps_at(choices.laminate, choices.centre)
        basis = CouponBasis(line, trace[0], connector, choices.fab, eps_r, tan_d, choices.centre)
        dimensions, order = coupon_dimensions(basis)
        ring = BareRing(line, dimensions["ring_radius"], dimensions["ring_slit"])
        resonances = _resonances(choices, ring, order)
        phases = _phases(choices, line, dimensions["long_length"] - dimensions["short_length"])
    except RangeError as error:
        raise SynthesisError(
            f"coupon: outside what the formulas cover: {error}; it follows from band, board thickness and copper"
        ) from error
    masked = _masked(stackup)
    request = CouponRequest(choices.brief.name, connector, choices.fab, masked, trace[1])
    layout = coupon_layout(dimensions, request)
    findings = fab_findings(layout, choices.fab)
    refused = tuple(f for f in findings if f.severity is Severity.REFUSE)
    if refused:
        raise SynthesisError(f"coupon: {choices.fab.key} cannot make it:", refused)
    notes += _words(choices, dimensions, order, resonances, masked)
    return Coupon(
        f"{choices.brief.name}-coupon", layout, dimensions, line, ring, choices.laminate, choices.fab, connector,
        stackup, choices.centre, trace[1], order, resonances, phases, findings, tuple(notes),
    )  # fmt: skip


def eps_at(laminate: Laminate, frequency: float) -> tuple[float, float]:
    """Permittivity and loss tangent the library states for `laminate` at `frequency` Hz."""
    eps = laminate.model.permittivity(frequency)
    return eps.real, loss_tangent(eps)


def _masked(stackup: Stackup) -> tuple[Level, ...]:
    return tuple(level for level in Level if stackup.find(f"mask-{level.value}") is not None)


def _check(choices: Choices) -> None:
    laminate, fab = choices.laminate, choices.fab
    findings = []
    if fab.levels < 2:
        got, advice = f"{fab.levels} at {fab.key}", "a fab with two copper levels; the laminate is what counts"
        findings.append(Finding("copper levels", "make.fab", got, "2", advice, Severity.REFUSE))
    if laminate.copper_sides < 2:
        got, advice = f"{laminate.copper_sides} of {laminate.key}", "the same laminate with copper on both sides"
        findings.append(Finding("copper sides", "board.laminate", got, "2", advice, Severity.REFUSE))
    if findings:
        raise SynthesisError("the coupon's lines need a ground plane on the other side:", tuple(findings))


def _connector(choices: Choices, library: Library, notes: list[str]) -> Connector:
    """The design's own coax, or one that fits the board."""
    own = choices.connector
    if not own.balanced and own.pads:
        return own
    thickness = choices.brief.board.thickness
    for key in FALLBACKS:
        found = library.connector(key)
        low, high = found.board_thickness or (0.0, math.inf)
        if low <= thickness <= high:
            notes.append(f"The design is fed by {own.key}; the coupon has {key}, for a coax.")
            return found
    raise SynthesisError(f"coupon: no coax launch of the library fits a board of {show(thickness, 'length')}")


def _stackup(choices: Choices, notes: list[str]) -> Stackup:
    """The design's board with two copper levels."""
    board = choices.brief.board
    mask = board.mask or ("both" if choices.fab.mask else "none")
    if len(choices.levels) < 2:
        notes.append(
            "The design's board has one copper level, the coupon two: order it as a board of its own, of the same "
            "laminate and thickness; it cannot lie in the design's panel."
        )
    return build_stackup(BoardChoice(choices.laminate, board.thickness, board.copper, 2, mask), choices.fab)


def _bare_line(choices: Choices, stackup: Stackup) -> BareLine:
    """The 50 ohm line without mask, its width on the drawing step."""
    copper = stackup.conductor
    conductor = Conductor(stackup.finished_copper, copper.conductivity, copper.roughness_rq)
    eps_r, tan_d = eps_at(choices.laminate, choices.centre)
    height = stackup.substrate.thickness
    line = width_for_impedance(
        "microstrip",
        IMPEDANCE,
        substrate=Substrate(height, eps_r, tan_d),
        conductor=conductor,
        frequency=choices.centre,
    )
    return BareLine(max(rounded(line.width), rounded_up(choices.fab.min_track)), height, conductor)


def _trace(choices: Choices, lines: Iterable[DesignLine], stackup: Stackup, notes: list[str]) -> tuple[float, float]:
    """Width m and impedance ohm of the impedance trace: the design's line under its mask, or 50 ohm."""
    copper = stackup.conductor
    conductor = Conductor(stackup.finished_copper, copper.conductivity, copper.roughness_rq)
    eps_r, tan_d = eps_at(choices.laminate, choices.centre)
    mask = stackup.find("mask-top")
    cover: tuple[DielectricLayer, ...] = ()
    if mask is not None:
        eps = mask.permittivity(choices.centre)
        cover = (DielectricLayer(mask.thickness, eps.real, loss_tangent(eps)),)
    substrate = Substrate(stackup.substrate.thickness, eps_r, tan_d, cover)
    own = next((each.line for each in lines if each.name == "line_width"), None)
    if own is None:
        wanted = width_for_impedance(
            "microstrip", IMPEDANCE, substrate=substrate, conductor=conductor, frequency=choices.centre
        )
        width = rounded(wanted.width)
        notes.append("The design has no microstrip of its own: the impedance trace is 50 ohm.")
    else:
        width = own.width
    line = analyse("microstrip", width, substrate=substrate, conductor=conductor, frequency=choices.centre)
    return width, line.impedance


def _resonances(choices: Choices, ring: BareRing, order: int) -> tuple[ExpectedResonance, ...]:
    """Orders from the fundamental up, as far as listed frequencies and the ring's formula go."""
    found = []
    eps_r, tan_d = eps_at(choices.laminate, choices.centre)
    for n in range(1, max(MOST_ORDERS, order) + 1):
        try:
            frequency = ring.frequency(n, eps_r)
            for _ in range(3):  # the laminate's own dispersion
                eps_r, tan_d = eps_at(choices.laminate, frequency)
                frequency = ring.frequency(n, eps_r)
            line = ring.line.line(eps_r, tan_d, frequency)
        except RangeError:
            break
        if frequency > _highest(choices):
            break
        q = math.pi / (line.wavelength * (line.alpha_conductor + line.alpha_dielectric))
        found.append(ExpectedResonance(n, frequency, line.eps_eff, q))
    return tuple(found)


def _phases(choices: Choices, line: BareLine, difference: float) -> tuple[ExpectedPhase, ...]:
    """The two-line measurement at the band's ends and middle and at round frequencies, those the formulas cover."""
    listed = sorted({*choices.brief.target.band, choices.centre, *PHASE_FREQUENCIES})
    rows = []
    for f in listed:
        if f > _highest(choices):
            continue
        try:
            at = line.line(*eps_at(choices.laminate, f), f)
        except RangeError:
            continue
        rows.append(
            ExpectedPhase(
                f, 2.0 * math.pi * difference / at.wavelength, at.loss_db_per_m * difference, at.eps_eff, at.impedance
            )
        )
    return tuple(rows)


def _highest(choices: Choices) -> float:
    return max(HIGHEST, 1.1 * max(choices.brief.target.band))


def _words(
    choices: Choices,
    dimensions: Mapping[str, float],
    order: int,
    resonances: tuple[ExpectedResonance, ...],
    masked: tuple[Level, ...],
) -> list[str]:
    """What was decided, in words."""
    near = next((r for r in resonances if r.order == order), resonances[0])
    centre = show(choices.centre, "frequency", 4)
    if abs(near.frequency / choices.centre - 1.0) < 0.02:
        where = f"Order n = {order} of the ring lies in the middle of the band, {centre}."
    else:
        where = (
            f"A ring for {centre} would not fit the board; its fundamental, n = 1, is at "
            f"{show(near.frequency, 'frequency', 4)}, and the laminate's dispersion leads from there to the band."
        )
    notes = [where]
    if Level.TOP in masked:
        notes.append(
            "Ring, feeds and both lines are bare of solder mask, so that the laminate alone is measured; the impedance "
            "trace is masked as the antenna's line is."
        )
    notes.append(
        "The ring has a slit where it faces the first feed, since copper without a hole is what every format takes: no "
        "current would cross it in the modes that are measured."
    )
    notes.append(f"Ground margin to the board edge: {show(dimensions['ground_margin'], 'length')}, lands excepted.")
    return notes

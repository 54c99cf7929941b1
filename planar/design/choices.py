"""Everything a brief leaves open, chosen, with the reason; library keys turned into records.

The result is what sizing, drawing and the writers work from. A combination that cannot be built (a
coax on a balanced port, two levels at a one-level fab) is refused here, before any sizing.
"""

from __future__ import annotations

from dataclasses import dataclass

from planar.brief import Brief
from planar.brief.model import CoverSpec, InlineLaminate, InlineMaterial
from planar.copper.families import FAMILIES
from planar.copper.layout import Level
from planar.errors import Finding, Severity, SynthesisError
from planar.library import Connector, Cover, Fab, Family, Laminate, Library, inline_laminate
from planar.stackup import BoardChoice, CoverChoice, Stackup, Surroundings, build_stackup
from planar.units import SPEED_OF_LIGHT, show

COAX_IMPEDANCES = (40.0, 80.0)
"""ohm, port impedances taken to be a coax."""
COVER_EPS_TOLERANCE, COVER_TAN_TOLERANCE, COVER_FREQUENCY = 0.05, 0.3, 1e9
"""Of a cover given by its numbers: typical of plastics (common practice, no source); frequency in Hz."""
WIDEST_LANDS = 0.25
"""Wavelengths, width of a connector's lands from which on they, not the loop, decide (common practice, no source)."""
STRIP_IMPEDANCES = (45.0, 220.0)
"""ohm, port impedances coplanar strips can be sized for."""


@dataclass(frozen=True)
class Choices:
    """A brief with nothing left open. `centre` Hz is the middle of the band; `reasons` say what was assumed."""

    brief: Brief
    family: Family
    laminate: Laminate
    fab: Fab
    connector: Connector
    stackup: Stackup
    end: str | None
    reasons: tuple[str, ...]

    @property
    def centre(self) -> float:
        """Middle of the band, Hz."""
        low, high = self.brief.target.band
        return 0.5 * (low + high)

    @property
    def circular(self) -> bool:
        """Whether circular polarisation is asked for."""
        return self.brief.target.polarisation != "linear"

    @property
    def traits(self) -> frozenset[str]:
        """What makes a dimension needed, see `planar.library.families.TRAITS`."""
        shape = self.brief.antenna.shape
        present = {
            "corner": shape != "circle",
            "rectangle": shape == "rectangle",
            "circular": self.circular,
            "via": self.end == "via",
            "open": self.end == "open",
            "trim": self.brief.antenna.trim,
        }
        return frozenset(trait for trait, there in present.items() if there)

    @property
    def levels(self) -> tuple[Level, ...]:
        """Copper levels, top first."""
        return (Level.TOP, Level.BOTTOM)[: self.family.levels]

    @property
    def masked(self) -> tuple[Level, ...]:
        """Sides that carry solder mask, the bare side of a one-level board among them."""
        return tuple(level for level in Level if self.stackup.find(f"mask-{level.value}") is not None)


def choose(brief: Brief, library: Library) -> Choices:
    """Records and defaults for `brief`. Raises `LibraryError` or `SynthesisError` where they do not go together."""
    fab = library.fab(brief.make.fab)
    reasons: list[str] = []
    family = library.family(_family_key(brief, fab, library, reasons))
    _check_drawn(family)
    end = _end(brief, family, reasons)
    connector = library.connector(_connector_key(brief, family, library, reasons))
    _check_feed(family, connector, brief, fab)
    laminate = _laminate(brief, library)
    _check_sides(family, laminate)
    _note_laminate(brief, laminate, reasons)
    reasons.append("thickness is that of the dielectric; finished copper and mask come on top")
    plated = (
        f"the fab plates {show(fab.plating, 'length', 3)} on top of it"
        if fab.plating
        else "the fab plates nothing on it"
    )
    reasons.append(f"copper is the base foil; {plated}")
    board = BoardChoice(laminate, brief.board.thickness, brief.board.copper, family.levels, _mask(brief, fab, reasons))
    around = Surroundings(_cover(brief.surroundings.cover, library), _reflector(brief))
    stackup = build_stackup(board, fab, surroundings=around)
    return Choices(brief, family, laminate, fab, connector, stackup, end, tuple(reasons))


def _check_drawn(family: Family) -> None:
    if family.key not in FAMILIES:
        limit = f"one of {', '.join(sorted(FAMILIES))}"
        advice = "a family file needs a drawing function"
        finding = Finding("family", "antenna.family", family.key, limit, advice, Severity.REFUSE)
        raise SynthesisError("this family cannot be drawn:", (finding,))


def _family_key(brief: Brief, fab: Fab, library: Library, reasons: list[str]) -> str:
    if brief.antenna.family is not None:
        return brief.antenna.family
    ohm = brief.target.impedance
    low, high = COAX_IMPEDANCES
    coax = brief.make.connector is None or not library.connector(brief.make.connector).balanced
    if fab.levels >= 2 and low <= ohm <= high and coax:
        key, why = "ring-guided", f"{ohm:g} ohm is a coax, and on two copper levels it needs no balun"
    elif brief.target.polarisation == "linear" and STRIP_IMPEDANCES[0] <= ohm <= STRIP_IMPEDANCES[1]:
        key, why = "coplanar", f"{ohm:g} ohm on one copper level: strips transform the loop to the port"
    else:
        key, why = "plain", f"no line of this board turns its loop into {ohm:g} ohm: bring your own match to the pads"
    reasons.append(f'family "{key}" chosen: {why}')
    return key


def _end(brief: Brief, family: Family, reasons: list[str]) -> str | None:
    if not family.ends or brief.antenna.end is not None:
        return brief.antenna.end
    end = "open" if "open" in family.ends else family.ends[0]
    reasons.append(f'the line ends "{end}"{": no via, and the widest band" if end == "open" else ""}')
    return end


def _connector_key(brief: Brief, family: Family, library: Library, reasons: list[str]) -> str:
    if brief.make.connector is not None:
        return brief.make.connector
    if family.feed == "balanced":
        reasons.append("no connector: two pads for a balanced chip, balun or line")
        return "bare-pads"
    fits = _fits_board(library.connector("edge-coax"), brief.board.thickness)
    key = "edge-coax" if fits else "pigtail-pads"
    reasons.append(f'connector "{key}" chosen for a board of {show(brief.board.thickness, "length")}')
    return key


def _check_feed(family: Family, connector: Connector, brief: Brief, fab: Fab) -> None:
    findings = []
    if connector.balanced != (family.feed == "balanced"):
        wanted = "bare-pads" if family.feed == "balanced" else "edge-coax, miniature-coax or pigtail-pads"
        advice = f"use {wanted}, or another family"
        limit = f"a {family.feed} feed for {family.key}"
        findings.append(Finding("feed", "make.connector", connector.key, limit, advice, Severity.REFUSE))
    wavelength = SPEED_OF_LIGHT / (0.5 * sum(brief.target.band))
    if connector.reach > WIDEST_LANDS * wavelength:
        got = f"lands {show(connector.reach, 'length', 3)} wide, {connector.reach / wavelength:.2f} wavelengths"
        advice = "the connector would be the antenna: use bare-pads, or a lower band"
        limit = f"{WIDEST_LANDS:g} wavelengths"
        findings.append(Finding("connector", "make.connector", got, limit, advice, Severity.REFUSE))
    thickness = brief.board.thickness
    if connector.board_thickness is not None and not _fits_board(connector, thickness):
        low, high = connector.board_thickness
        got, limit = show(thickness, "length"), f"{show(low, 'length')} to {show(high, 'length')}"
        advice = f"{connector.key} does not fit this board: use pigtail-pads, or another thickness"
        findings.append(Finding("connector", "board.thickness", got, limit, advice, Severity.REFUSE))
    if family.levels > fab.levels:
        advice = "use a two-level fab, or the family plain or coplanar"
        got, limit = f"{family.levels} for {family.key}", f"{fab.levels} at {fab.key}"
        findings.append(Finding("copper levels", "make.fab", got, limit, advice, Severity.REFUSE))
    if findings:
        raise SynthesisError("the brief asks for parts that do not go together:", tuple(findings))


def _fits_board(connector: Connector, thickness: float) -> bool:
    if connector.board_thickness is None:
        return True
    low, high = connector.board_thickness
    return low <= thickness <= high


def _laminate(brief: Brief, library: Library) -> Laminate:
    choice = brief.board.laminate
    if isinstance(choice, InlineLaminate):
        return inline_laminate(choice.eps_r, choice.tan_d, at=choice.at)
    return library.laminate(choice)


def _check_sides(family: Family, laminate: Laminate) -> None:
    if family.levels > laminate.copper_sides:
        advice = "use a laminate with copper on both sides, or the family plain or coplanar"
        got = f"{laminate.key}: {laminate.copper_sides}"
        limit = f"{family.levels} for {family.key}"
        finding = Finding("copper sides", "board.laminate", got, limit, advice, Severity.REFUSE)
        raise SynthesisError("the brief asks for parts that do not go together:", (finding,))


def _note_laminate(brief: Brief, laminate: Laminate, reasons: list[str]) -> None:
    usual = laminate.thicknesses
    thickness = brief.board.thickness
    if usual and min(abs(thickness - each) for each in usual) > 0.02 * thickness:
        sold = ", ".join(show(each, "length", 4) for each in usual)
        reasons.append(f"{show(thickness, 'length', 4)} is no usual thickness of {laminate.key} ({sold}): ask the fab")


def _mask(brief: Brief, fab: Fab, reasons: list[str]) -> str:
    """The mask asked for, or what the fab offers."""
    if brief.board.mask is None:
        reasons.append(f"solder mask {'on both sides' if fab.mask else 'none'}: what {fab.key} offers")
        return "both" if fab.mask else "none"
    return brief.board.mask


def _cover(spec: CoverSpec | None, library: Library) -> CoverChoice | None:
    if spec is None:
        return None
    if isinstance(spec.material, InlineMaterial):
        cover = Cover(
            "inline",
            "cover given in the brief",
            spec.material.eps_r,
            COVER_EPS_TOLERANCE,
            spec.material.tan_d,
            COVER_TAN_TOLERANCE,
            COVER_FREQUENCY,
            (("eps_r", "given in the brief"), ("tan_d", "given in the brief")),
        )
    else:
        cover = library.cover(spec.material)
    return CoverChoice(cover, spec.air_gap, spec.thickness)


def _reflector(brief: Brief) -> float | None:
    reflector = brief.surroundings.reflector
    return None if reflector is None else reflector.distance

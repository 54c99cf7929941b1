"""What the fab must build, layer by layer, and which line has a controlled impedance.

One record, `StackupSheet`, is made from the stackup and the lines; the JSON file and the page of
Markdown say the same. Lengths are SI in the record; in the files every key carries its unit. A
tolerance nobody stated is left out rather than written as zero.
"""

from __future__ import annotations

from dataclasses import dataclass

from planar.copper.layout import Kind
from planar.handoff.kind_words import KIND_WORDS
from planar.stackup import Layer, LayerKind, Stackup, loss_tangent
from planar.units import show

_CALLED = {
    "line_width": "feed line",
    "transformer_width": "transformer",
    "end_width": "line end",
    "strip_width": "coplanar strips",
}
_OF_THE_BOARD = (LayerKind.LEGEND, LayerKind.MASK, LayerKind.COPPER, LayerKind.DIELECTRIC)


@dataclass(frozen=True)
class ImpedanceLine:
    """A line of the board. Widths in m at the foot of the conductor, `gap_m` None where it has none.

    `reference` names the copper level below or beside it; `tolerance_ohm` is None where nothing is asked
    of the fab. Only a `controlled` line may be adjusted and tested by the fab.
    """

    name: str
    kind: str
    width_m: float
    gap_m: float | None
    level: str
    reference: str
    impedance_ohm: float
    tolerance_ohm: float | None
    controlled: bool

    @property
    def called(self) -> str:
        """What people call it; `name` is that of its width among the dimensions."""
        return _CALLED.get(self.name, self.name.replace("_", " "))

    @property
    def instruction(self) -> str:
        """What the fab is to do with the line."""
        return "controlled: fab may propose a width, ask first" if self.controlled else "not controlled, do not adjust"


@dataclass(frozen=True)
class SheetLayer:
    """One layer: thicknesses in m (`base_copper_m` for copper only), tolerances as fractions, None where not stated.

    `eps_r` and `tan_d` hold at the sheet's frequency; None for metal and legend.
    """

    name: str
    kind: str
    material: str
    thickness_m: float
    base_copper_m: float | None
    eps_r: float | None
    tan_d: float | None
    thickness_tolerance: float | None
    eps_r_tolerance: float | None
    tan_d_tolerance: float | None


@dataclass(frozen=True)
class SheetFacts:
    """What a sheet says beside the stackup.

    `frequency_hz` is the design frequency; `specification` the laminate's IPC-4101 or IPC-4103 sheet, None if
    unknown; `outline_tolerance_m` of the board edge; `dc_short` whether feed and ground are one net at DC; `kind`
    that of the layout.
    """

    name: str
    frequency_hz: float
    finish: str
    specification: str | None
    outline_tolerance_m: float
    dc_short: bool
    kind: Kind = Kind.SINGLE


@dataclass(frozen=True)
class StackupSheet:
    """Everything `stackup.json` and `stackup.md` say.

    `layers` are those of the board, top to bottom; `surroundings` (cover, air, reflector) are no business of
    the fab but of the antenna. `total_thickness_m` counts copper and dielectric, `masked_thickness_m` mask too;
    `thickness_tolerance` is a fraction.
    """

    facts: SheetFacts
    layers: tuple[SheetLayer, ...]
    surroundings: tuple[SheetLayer, ...]
    total_thickness_m: float
    masked_thickness_m: float
    thickness_tolerance: float
    impedance_lines: tuple[ImpedanceLine, ...]
    notes: tuple[str, ...]


def stackup_sheet(stackup: Stackup, impedance_lines: tuple[ImpedanceLine, ...], *, facts: SheetFacts) -> StackupSheet:
    """The sheet of `stackup` with its lines.

    Raises `RangeError` when the frequency lies outside the range of a layer's permittivity.
    """
    top_down = stackup.layers[::-1]
    board = tuple(_row(a, stackup, facts.frequency_hz) for a in top_down if a.kind in _OF_THE_BOARD)
    around = tuple(_row(a, stackup, facts.frequency_hz) for a in top_down if a.kind not in _OF_THE_BOARD)
    return StackupSheet(
        facts,
        board,
        around,
        stackup.total_thickness,
        stackup.masked_thickness,
        stackup.board_tolerance,
        impedance_lines,
        _notes(stackup, impedance_lines, facts),
    )


def _row(layer: Layer, stackup: Stackup, frequency: float) -> SheetLayer:
    permittivity = None if layer.model is None else layer.permittivity(frequency)
    return SheetLayer(
        layer.name,
        str(layer.kind),
        layer.material,
        layer.thickness,
        stackup.base_copper if layer.kind is LayerKind.COPPER else None,
        None if permittivity is None else permittivity.real,
        None if permittivity is None else loss_tangent(permittivity),
        layer.thickness_tolerance or None,
        layer.eps_r_tolerance or None,
        layer.tan_d_tolerance or None,
    )


def _notes(stackup: Stackup, lines: tuple[ImpedanceLine, ...], facts: SheetFacts) -> tuple[str, ...]:
    """What every fab sheet carries."""
    masked = [layer.name.removeprefix("mask-") for layer in stackup.layers if layer.kind is LayerKind.MASK]
    controlled = [line.called for line in lines if line.controlled]
    others = [line.called for line in lines if not line.controlled]
    words = KIND_WORDS[facts.kind]
    return (
        "Dimensions are finished copper at the foot of the conductor.",
        "Artwork is 1:1 with no etch compensation included; the fab applies its own.",
        f"Copper: {show(stackup.base_copper, 'length')} base, {show(stackup.finished_copper, 'length')} finished.",
        f"Solder mask {words.masked}: {' and '.join(sorted(masked, reverse=True)) + ' side' if masked else 'none'}. "
        f"{words.openings}; do not add or remove it.",
        f"Surface finish: {facts.finish}.",
        f"Impedance-controlled: {', '.join(controlled) or 'none'}. "
        f"Not controlled, do not adjust: {', '.join(others) or 'none'}.",
        words.short if facts.dc_short else words.no_short,
        f"{words.window}: no thieving, teardrops, order number, width change or edge clip-back.",
        f"Board outline tolerance: +-{show(facts.outline_tolerance_m, 'length')}.",
        f"Laminate: {stackup.substrate.material}; {facts.specification or 'no specification sheet known'}.",
    )

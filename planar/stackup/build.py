"""A stackup from what was chosen: laminate, copper, mask, and what stands around the board.

The board's thickness is that of its dielectric, as laminates are sold; copper and mask come on top. Cover and
reflector distances are counted from the outermost surface of the board, mask included.
"""

from __future__ import annotations

from dataclasses import dataclass

from planar.errors import Finding, Severity, SynthesisError
from planar.library import Cover, Fab, Laminate, WidebandDebye
from planar.stackup.layers import Conductor, Layer, LayerKind, Stackup
from planar.units import show

_AIR = WidebandDebye.from_point(1.0, 0.0, at=1e9)
_MASKED_SIDES = {"none": (), "top": ("top",), "bottom": ("bottom",), "both": ("bottom", "top")}


@dataclass(frozen=True)
class BoardChoice:
    """The bare board: `thickness` of the dielectric and `base_copper` foil in m, `levels` of copper 1 (top only) or 2,
    `mask` "none", "top", "bottom" or "both"."""

    laminate: Laminate
    thickness: float
    base_copper: float
    levels: int
    mask: str


@dataclass(frozen=True)
class CoverChoice:
    """A dielectric wall above the top side: `air_gap` (0 where it touches) and `thickness` in m."""

    cover: Cover
    air_gap: float
    thickness: float


@dataclass(frozen=True)
class Surroundings:
    """What stands around the board; `reflector` is the distance in m of a metal plane below the bottom side."""

    cover: CoverChoice | None = None
    reflector: float | None = None


def build_stackup(board: BoardChoice, fab: Fab, *, surroundings: Surroundings | None = None) -> Stackup:
    """Stackup of `board` as `fab` makes it, in its `surroundings` (open air where left out).

    Raises `SynthesisError` with all reasons where the fab cannot make it or a thickness is not positive.
    """
    around = surroundings or Surroundings()
    findings = (*_process_findings(board, fab), *_thickness_findings(board, around))
    if findings:
        raise SynthesisError("this stackup cannot be made:", findings)
    layers = (
        *_reflector(around.reflector),
        *([Layer("legend-bottom", LayerKind.LEGEND, "legend ink", 0.0)] if fab.legend and board.levels == 2 else []),
        *_mask(board, fab, "bottom"),
        *_board(board, fab),
        *_mask(board, fab, "top"),
        *([Layer("legend-top", LayerKind.LEGEND, "legend ink", 0.0)] if fab.legend else []),
        *_cover(around.cover),
    )
    laminate = board.laminate
    conductor = Conductor(board.base_copper, fab.plating, laminate.conductivity, laminate.roughness_rq)
    return Stackup(layers, conductor, fab.thickness_tolerance)


def _board(board: BoardChoice, fab: Fab) -> list[Layer]:
    laminate = board.laminate
    finished = board.base_copper + fab.plating
    dielectric = Layer(
        "dielectric",
        LayerKind.DIELECTRIC,
        laminate.title,
        board.thickness,
        laminate.model,
        laminate.thickness_tolerance,
        laminate.eps_r_tolerance,
        laminate.tan_d_tolerance,
    )
    sides = ("bottom", "top") if board.levels == 2 else ("top",)
    copper = {
        side: Layer(
            f"copper-{side}",
            LayerKind.COPPER,
            "copper",
            finished,
            thickness_tolerance=laminate.base_copper_tolerance,
        )
        for side in sides
    }
    return [*([copper["bottom"]] if "bottom" in copper else []), dielectric, copper["top"]]


def _mask(board: BoardChoice, fab: Fab, side: str) -> list[Layer]:
    if side not in _MASKED_SIDES[board.mask]:
        return []
    return [
        Layer(
            f"mask-{side}",
            LayerKind.MASK,
            "solder mask",
            fab.mask_thickness,
            fab.mask_model,
            fab.mask_thickness_tolerance,
        )
    ]


def _reflector(distance: float | None) -> list[Layer]:
    if distance is None:
        return []
    return [
        Layer("reflector", LayerKind.METAL_PLANE, "metal plane", 0.0),
        Layer("reflector-gap", LayerKind.AIR, "air", distance, _AIR),
    ]


def _cover(choice: CoverChoice | None) -> list[Layer]:
    if choice is None:
        return []
    cover = choice.cover
    wall = Layer(
        "cover",
        LayerKind.COVER,
        cover.title,
        choice.thickness,
        cover.model,
        eps_r_tolerance=cover.eps_r_tolerance,
        tan_d_tolerance=cover.tan_d_tolerance,
    )
    gap = [Layer("cover-gap", LayerKind.AIR, "air", choice.air_gap, _AIR)] if choice.air_gap > 0.0 else []
    return [*gap, wall]


def _process_findings(board: BoardChoice, fab: Fab) -> list[Finding]:
    findings = []
    if not 1 <= board.levels <= fab.levels:
        findings.append(
            _refusal("copper levels", fab.key, str(board.levels), f"1 to {fab.levels}", "choose another fab or family")
        )
    if board.mask not in _MASKED_SIDES:
        findings.append(_refusal("mask", "board", board.mask, f"one of {', '.join(_MASKED_SIDES)}", ""))
    elif board.mask != "none" and not fab.mask:
        findings.append(_refusal("mask", fab.key, board.mask, "no mask offered", 'mask = "none", or another fab'))
    return findings


def _thickness_findings(board: BoardChoice, around: Surroundings) -> list[Finding]:
    lengths = {"board thickness": board.thickness, "base copper": board.base_copper}
    if around.cover is not None:
        lengths["cover thickness"] = around.cover.thickness
    if around.reflector is not None:
        lengths["reflector distance"] = around.reflector
    findings = [
        _refusal(name, "board", show(value, "length"), "more than 0", "")
        for name, value in lengths.items()
        if not value > 0.0
    ]
    if around.cover is not None and not around.cover.air_gap >= 0.0:
        findings.append(_refusal("cover air gap", "board", show(around.cover.air_gap, "length"), "at least 0", ""))
    return findings


def _refusal(rule: str, where: str, got: str, limit: str, advice: str) -> Finding:
    return Finding(rule, where, got, limit, advice, Severity.REFUSE)

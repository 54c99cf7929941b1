"""Learning the batch: the laminate a board was made of, as an entry for a folder of the user's own.

A measurement tells what permittivity and thickness do together, hardly which of them did it. The entry therefore holds
the permittivity that does the same at the thickness designed for, with its own, narrower tolerance.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Any

import numpy as np
import tomli_w

from planar.design.choices import Choices
from planar.design.retune.inferred import Inferred
from planar.design.tolerances import SOURCE
from planar.errors import SynthesisError
from planar.library import WidebandDebye
from planar.stackup import loss_tangent
from planar.units import show

PERMITTIVITY, LOSS, THICKNESS = "laminate permittivity", "laminate loss tangent", "dielectric thickness"
NARROWED = 0.75
"""Posterior over prior standard deviation of what permittivity and thickness do together, from which on too little was
learnt to be kept."""
TWO_SIGMA = 2.0
LEAST_TOLERANCE = 0.005
"""Of a permittivity: no single board tells more."""


@dataclass(frozen=True)
class LearntLaminate:
    """`key` and TOML `text` of a library entry; `permittivity` at the middle of the band, for the thickness designed
    for, and its `tolerance`, a fraction."""

    key: str
    text: str
    permittivity: float
    tolerance: float


def learnt_laminate(inferred: Inferred, name: str, digest: str) -> LearntLaminate:
    """The laminate of the board of the design `name`, whose design.json has the hash `digest`.

    Raises `SynthesisError` where the measurement says too little of it.
    """
    choices, values = inferred.model.choices, {each.name: each for each in inferred.values}
    permittivity, tolerance = _permittivity(inferred, name)
    loss = values.get(LOSS)
    told = loss if loss is not None and loss.told else None
    slab = choices.stackup.substrate
    tan_d = loss_tangent(slab.permittivity(choices.centre)) if told is None else told.value
    tan_tolerance = slab.tan_d_tolerance if told is None else 0.5 * (told.high - told.low) / told.value
    thickness = show(choices.brief.board.thickness, "length", 4)
    source = (
        f"inferred from a measured board of design {name}, hash {digest[:12]}, 2 sigma; "
        f"holds for a thickness of {thickness}, which was assumed"
    )
    at = choices.laminate.at
    there = WidebandDebye.from_point(permittivity, tan_d, at=choices.centre).permittivity(at)
    entry = _entry(choices)
    entry["eps_r"] |= {
        "value": float(f"{there.real:.5g}"),
        "tolerance": f"{100.0 * tolerance:.2g} %",
        "source": source,
    }
    entry["tan_d"] |= {"value": float(f"{loss_tangent(there):.4g}"), "tolerance": f"{100.0 * tan_tolerance:.3g} %"}
    if told is not None:
        entry["tan_d"]["source"] = source
    return LearntLaminate(f"{choices.laminate.key}-{name}", tomli_w.dumps(entry), permittivity, tolerance)


def _permittivity(inferred: Inferred, name: str) -> tuple[float, float]:
    """Permittivity at the middle of the band that does at the thickness designed for what both do, and its tolerance.

    Raises `SynthesisError` where it has none, or where the measurement narrows it too little.
    """
    unknowns, estimate = inferred.fit.sight.unknowns, inferred.fit.estimate
    names = [each.name for each in unknowns]
    if PERMITTIVITY not in names:
        raise SynthesisError(f"{name}: the laminate's permittivity has no tolerance, so nothing can be learnt of it")
    together = np.isin(names, (PERMITTIVITY, THICKNESS))
    effect = np.where(together, inferred.felt, 0.0)
    spread = math.sqrt(float(effect @ estimate.covariance @ effect))
    narrowed = spread / float(np.linalg.norm(effect))
    if narrowed > NARROWED:
        raise SynthesisError(
            f"{name}: the measurement tells too little of the laminate: what permittivity and thickness do together is "
            f"known to {narrowed:.2f} of the tolerance, {NARROWED:g} is needed; take the line in front off"
        )
    place = names.index(PERMITTIVITY)
    each = unknowns[place]
    value = each.mean + each.sd * float(effect @ estimate.z) / effect[place]
    return value, max(LEAST_TOLERANCE, TWO_SIGMA * each.sd * spread / abs(effect[place]) / value)


def _entry(choices: Choices) -> dict[str, Any]:
    """The laminate of `choices` as the tables of a library file. One given by its numbers gets the thickness and foil
    of the brief."""
    laminate, board = choices.laminate, choices.brief.board
    said = dict(laminate.sources)
    entry: dict[str, Any] = {"title": f"{laminate.title}, as measured", "class": laminate.material_class}
    if laminate.specification is not None:
        entry["specification"] = laminate.specification
    if laminate.copper_sides != 2:
        entry["copper_sides"] = {"value": laminate.copper_sides, "source": said.get("copper_sides", SOURCE)}
    return entry | {
        "eps_r": {
            "value": laminate.eps_r,
            "at": show(laminate.at, "frequency", 9),
            "tolerance": _percent(laminate.eps_r_tolerance),
            "source": said.get("eps_r", SOURCE),
        },
        "tan_d": {
            "value": laminate.tan_d,
            "tolerance": _percent(laminate.tan_d_tolerance),
            "source": said.get("tan_d", SOURCE),
        },
        "thickness": {
            "values": [_lengths(each) for each in laminate.thicknesses or (board.thickness,)],
            "tolerance": _percent(laminate.thickness_tolerance),
            "source": said.get("thickness", SOURCE),
        },
        "copper": {
            "base": [_lengths(each) for each in laminate.base_coppers or (board.copper,)],
            "tolerance": _percent(laminate.base_copper_tolerance),
            "roughness_rq": _lengths(laminate.roughness_rq),
            "roughness_tolerance": _percent(laminate.roughness_tolerance),
            "conductivity": f"{laminate.conductivity:g} S/m",
            "source": said.get("copper", SOURCE),
        },
    }


def _percent(fraction: float) -> str:
    return f"{100.0 * fraction:.6g} %"


def _lengths(length: float) -> str:
    return show(length, "length", 6)

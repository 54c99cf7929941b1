"""`field.json`: the portrait of a board in plain types, units in the names, and the way back.

Everything in a portrait is rounded when it is made, so what is read back is what was written, to the last digit.
"""

from __future__ import annotations

import json
import math
from collections.abc import Mapping
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import ArrayLike, NDArray

from planar.design.portrait import (
    CIRCULAR_PARTS,
    LINEAR_PARTS,
    METRE_DIGITS,
    CurrentMap,
    Losses,
    ModeImage,
    PatternCut,
    Portrait,
)
from planar.errors import BriefError, Fault

Array = NDArray[np.float64]


def portrait_facts(portrait: Portrait) -> dict[str, Any]:
    """The portrait in plain types, units in the names; null where there is no field."""
    losses = portrait.losses
    return {
        "centre_hz": portrait.centre,
        "parts": list(portrait.parts),
        "losses": {
            "radiated_share": losses.radiated,
            "guided_share": losses.guided,
            "dielectric_share": losses.dielectric,
            "copper_share": losses.copper,
        },
        "toward_top": {
            "frequency_hz": portrait.frequency.tolist(),
            "gain_dbi": portrait.gain_dbi.tolist(),
            "axial_ratio_db": portrait.axial_ratio_db.tolist(),
        },
        "cuts": [
            {
                "azimuth_deg": cut.azimuth,
                "theta_deg": cut.theta.tolist(),
                "gain_dbi": _holed(cut.gain_dbi),
                "part_dbi": [_holed(part) for part in cut.part_dbi],
                "axial_ratio_db": _holed(cut.axial_ratio_db),
            }
            for cut in portrait.cuts
        ],
        "currents": [_map_facts(each) for each in portrait.currents],
        "modes": [
            {
                "orientation": mode.orientation,
                "resonance_hz": mode.resonance,
                "quality": mode.quality,
                "power_share": mode.power_share,
                "current": _map_facts(mode.current),
            }
            for mode in portrait.modes
        ],
    }


def portrait_of(facts: Mapping[str, Any]) -> Portrait:
    """The portrait of `facts` as `portrait_facts` gives them.

    Raises `KeyError`, `TypeError` or `ValueError` for others.
    """
    parts, losses, top = tuple(facts["parts"]), facts["losses"], facts["toward_top"]
    if parts not in (CIRCULAR_PARTS, LINEAR_PARTS):
        raise ValueError(f"polarisations {parts}")
    shares = ("radiated_share", "guided_share", "dielectric_share", "copper_share")
    return Portrait(
        float(facts["centre_hz"]),
        (parts[0], parts[1]),
        tuple(_cut_of(cut) for cut in facts["cuts"]),
        _numbers(top["frequency_hz"]),
        _numbers(top["gain_dbi"]),
        _numbers(top["axial_ratio_db"]),
        Losses(*(float(losses[name]) for name in shares)),
        tuple(_map_of(each) for each in facts["currents"]),
        tuple(
            ModeImage(
                str(mode["orientation"]),
                mode["resonance_hz"],
                mode["quality"],
                float(mode["power_share"]),
                _map_of(mode["current"]),
            )
            for mode in facts["modes"]
        ),
    )


def write_portrait(portrait: Portrait, path: Path) -> None:
    """Write `portrait` as JSON, a line for each part. Raises `OSError` when it cannot be written."""
    facts = portrait_facts(portrait)
    rows = (f"{json.dumps(key)}: {json.dumps(value, separators=(',', ':'))}" for key, value in facts.items())
    path.write_bytes(("{\n" + ",\n".join(rows) + "\n}\n").encode("ascii"))


def read_portrait(path: Path) -> Portrait:
    """The portrait in the file `path`. Raises `BriefError` for a file that holds none."""
    try:
        return portrait_of(json.loads(path.read_bytes()))
    except OSError as error:
        raise _no_portrait(path, (error.strerror or "unreadable").lower()) from error
    except (KeyError, TypeError, ValueError, RecursionError) as error:
        raise _no_portrait(path, f"no field data: {error}") from error


def _no_portrait(path: Path, value: str) -> BriefError:
    return BriefError([Fault(str(path), "file", value, "the field.json of a pack as planar make writes it")])


def _holed(values: Array) -> list[float | None]:
    """Numbers, None for NaN, which JSON does not have."""
    return [None if math.isnan(value) else value for value in values.tolist()]


def _numbers(values: ArrayLike) -> Array:
    """Numbers, NaN for None, of any shape, not to be written to."""
    array = np.array(values, dtype=np.float64)
    array.setflags(write=False)
    return array


def _cut_of(facts: Mapping[str, Any]) -> PatternCut:
    return PatternCut(
        float(facts["azimuth_deg"]),
        _numbers(facts["theta_deg"]),
        _numbers(facts["gain_dbi"]),
        _numbers(facts["part_dbi"]),
        _numbers(facts["axial_ratio_db"]),
    )


def _map_facts(current: CurrentMap) -> dict[str, Any]:
    return {
        "level": current.level,
        "points_mm": np.round(current.points * 1e3, METRE_DIGITS - 3).tolist(),
        "triangles": current.triangles.tolist(),
        "magnitude": current.magnitude.tolist(),
    }


def _map_of(facts: Mapping[str, Any]) -> CurrentMap:
    points = np.round(np.array(facts["points_mm"], dtype=np.float64) * 1e-3, METRE_DIGITS)
    triangles = np.array(facts["triangles"], dtype=np.int64)
    if len(triangles) and not 0 <= triangles.min() <= triangles.max() < len(points):
        raise ValueError("triangles of points that are not there")
    return CurrentMap(str(facts["level"]), _numbers(points), triangles, _numbers(facts["magnitude"]))

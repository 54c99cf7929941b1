"""The shape of each kind of library file, and the record made from it.

One table per kind (`LAMINATE`, `COVER`, `FAB`, `CONNECTOR`) says which keys there are, what each is and in which
range a slip of the pen would show. A new value is one row there and one field of the record. What only shows when
values are seen together is checked once all of them are read.
"""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from planar.errors import Fault, LibraryError, RangeError
from planar.library.dispersion import WidebandDebye
from planar.library.reading import (
    Convert,
    Key,
    Rows,
    Table,
    boolean,
    choice,
    count,
    list_of,
    measure,
    number,
    pair_of,
    read,
    source_list,
    text,
)
from planar.library.records import Body, Connector, Cover, Fab, GroundTab, Laminate, LandHole, LandPad, Panelling

_FRACTION = measure("fraction", 0.0, 1.0)
_FREQUENCY = measure("frequency", 1e4, 1e11)
_FOIL = measure("length", 1e-6, 5e-4)
_SHEET = measure("length", 5e-6, 2e-2)
_DETAIL = measure("length", 1e-6, 2e-2)
_FROM_ZERO = measure("length", 0.0, 2e-2)
_COORDINATE = measure("length", -5e-2, 5e-2)
_EXTENT = measure("length", 1e-5, 5e-2)
_SIZE = pair_of(measure("length", 1e-2, 2.0))


def _sourced(convert: Convert, more: Mapping[str, Convert] | None = None, *, required: bool = True) -> Table:
    """A table of `value`, the keys in `more`, and the `source` they come from."""
    keys = {"value": convert, **(more or {}), "source": text}
    return Table({name: Key(each) for name, each in keys.items()}, required)


_PERMITTIVITY: dict[str, Key | Table | Rows] = {
    "eps_r": _sourced(number(1.0, 100.0), {"at": _FREQUENCY, "tolerance": _FRACTION}),
    "tan_d": _sourced(number(0.0, 0.5), {"tolerance": _FRACTION}),
}

LAMINATE = Table(
    {
        "title": Key(text),
        "class": Key(text),
        "specification": Key(text, required=False),
        "copper_sides": _sourced(count(1, 2), required=False),
        **_PERMITTIVITY,
        "thickness": Table({"values": Key(list_of(_SHEET)), "tolerance": Key(_FRACTION), "source": Key(text)}),
        "copper": Table(
            {
                "base": Key(list_of(_FOIL)),
                "tolerance": Key(_FRACTION),
                "roughness_rq": Key(measure("length", 1e-8, 1e-5)),
                "roughness_tolerance": Key(_FRACTION),
                "conductivity": Key(measure("conductivity", 1e6, 6.5e7)),
                "source": Key(text),
            }
        ),
    }
)

COVER = Table({"title": Key(text), **_PERMITTIVITY})

_MASK_KEYS = ("mask_thickness", "mask_eps_r", "mask_tan_d", "mask_expansion", "mask_web")
_LEGEND_KEYS = ("legend_min_stroke",)
_SCORE_KEYS = ("score_web", "score_least_thickness", "score_least_panel")
_PERFORATION_KEYS = ("perforation_hole", "perforation_pitch", "perforation_wall")

PANELLING = Table(
    {
        "rail_width": _sourced(measure("length", 3e-3, 5e-2)),
        "tooling_hole": _sourced(_DETAIL),
        "fiducial": _sourced(_DETAIL),
        "fiducial_opening": _sourced(_DETAIL),
        "score": _sourced(boolean),
        "score_web": _sourced(number(0.1, 0.9), required=False),
        "score_least_thickness": _sourced(_FROM_ZERO, required=False),
        "score_least_panel": _sourced(pair_of(measure("length", 0.0, 2.0)), required=False),
        "tab_width": _sourced(_DETAIL),
        "tab_stretch": _sourced(measure("length", 5e-3, 1.0)),
        "perforation_count": _sourced(count(0, 50)),
        "perforation_hole": _sourced(_DETAIL, required=False),
        "perforation_pitch": _sourced(_DETAIL, required=False),
        "perforation_wall": _sourced(_FROM_ZERO, required=False),
    },
    required=False,
)

FAB = Table(
    {
        "title": Key(text),
        "levels": _sourced(count(1, 2)),
        "min_track": _sourced(_DETAIL),
        "min_gap": _sourced(_DETAIL),
        "min_hole": _sourced(_DETAIL),
        "max_hole": _sourced(_DETAIL),
        "hole_tolerance": _sourced(_FROM_ZERO),
        "plated_holes": _sourced(boolean),
        "min_annular_ring": _sourced(_FROM_ZERO),
        "hole_to_edge": _sourced(_FROM_ZERO),
        "copper_to_routed_edge": _sourced(_FROM_ZERO),
        "copper_to_score": _sourced(_FROM_ZERO),
        "open_frame_web": _sourced(_FROM_ZERO),
        "edge_radius": _sourced(_FROM_ZERO),
        "etch_tolerance": _sourced(_FROM_ZERO),
        "outline_tolerance": _sourced(_FROM_ZERO),
        "thickness_tolerance": _sourced(_FRACTION),
        "impedance_tolerance": _sourced(_FRACTION, required=False),
        "plating": _sourced(measure("length", 0.0, 1e-4)),
        "max_board": _sourced(_SIZE),
        "panel": _sourced(_SIZE),
        "panel_border": _sourced(measure("length", 0.0, 0.1)),
        "price_step": _sourced(_SIZE),
        "mask": _sourced(boolean),
        "mask_thickness": _sourced(measure("length", 1e-6, 2e-4), {"tolerance": _FRACTION}, required=False),
        "mask_eps_r": _sourced(number(1.0, 20.0), {"at": _FREQUENCY}, required=False),
        "mask_tan_d": _sourced(number(0.0, 0.5), required=False),
        "mask_expansion": _sourced(_FROM_ZERO, required=False),
        "mask_web": _sourced(_FROM_ZERO, required=False),
        "legend": _sourced(boolean),
        "legend_min_stroke": _sourced(_DETAIL, required=False),
        "finishes": Table({"values": Key(list_of(text)), "source": Key(text)}),
        "panelling": PANELLING,
    }
)

_NET = choice("signal", "ground")

CONNECTOR = Table(
    {
        "title": Key(text),
        "balanced": _sourced(boolean),
        "impedance": _sourced(measure("impedance", 1.0, 1e3), required=False),
        "edge_distance": _sourced(measure("length", 0.0, 5e-2), required=False),
        "board_thickness": _sourced(pair_of(_SHEET), required=False),
        "body": Table(
            {"centre": Key(pair_of(_COORDINATE)), "size": Key(pair_of(_EXTENT)), "source": Key(text)}, required=False
        ),
        "ground_tab": Table({"half_width": Key(_EXTENT), "length": Key(_EXTENT), "source": Key(text)}, required=False),
        "pads": Rows(
            Table(
                {
                    "name": Key(text),
                    "net": Key(_NET),
                    "level": Key(choice("top", "bottom")),
                    "shape": Key(choice("rectangle", "round")),
                    "centre": Key(pair_of(_COORDINATE)),
                    "size": Key(pair_of(_EXTENT)),
                    "source": Key(text),
                }
            )
        ),
        "holes": Rows(
            Table(
                {
                    "centre": Key(pair_of(_COORDINATE)),
                    "diameter": Key(_EXTENT),
                    "plated": Key(boolean),
                    "net": Key(_NET, required=False),
                    "purpose": Key(choice("via", "mount")),
                    "source": Key(text),
                }
            )
        ),
    }
)


def read_laminate(key: str, raw: Mapping[str, Any], where: str) -> Laminate:
    """Laminate from the parsed file `raw`; `where` names the file. Raises `LibraryError` with every fault."""
    found = read(raw, LAMINATE, where)
    _refuse(_dispersion_faults(found, where))
    copper, thickness = found["copper"], found["thickness"]
    return Laminate(
        key=key,
        title=found["title"],
        material_class=found["class"],
        specification=found["specification"],
        copper_sides=(found["copper_sides"] or {"value": 2})["value"],
        eps_r=found["eps_r"]["value"],
        eps_r_tolerance=found["eps_r"]["tolerance"],
        tan_d=found["tan_d"]["value"],
        tan_d_tolerance=found["tan_d"]["tolerance"],
        at=found["eps_r"]["at"],
        thicknesses=thickness["values"],
        thickness_tolerance=thickness["tolerance"],
        base_coppers=copper["base"],
        base_copper_tolerance=copper["tolerance"],
        roughness_rq=copper["roughness_rq"],
        roughness_tolerance=copper["roughness_tolerance"],
        conductivity=copper["conductivity"],
        sources=source_list(raw),
    )


def read_cover(key: str, raw: Mapping[str, Any], where: str) -> Cover:
    """Cover material from the parsed file `raw`; `where` names the file. Raises `LibraryError` with every fault."""
    found = read(raw, COVER, where)
    _refuse(_dispersion_faults(found, where))
    return Cover(
        key=key,
        title=found["title"],
        eps_r=found["eps_r"]["value"],
        eps_r_tolerance=found["eps_r"]["tolerance"],
        tan_d=found["tan_d"]["value"],
        tan_d_tolerance=found["tan_d"]["tolerance"],
        at=found["eps_r"]["at"],
        sources=source_list(raw),
    )


def read_fab(key: str, raw: Mapping[str, Any], where: str) -> Fab:
    """Fab from the parsed file `raw`; `where` names the file. Raises `LibraryError` with every fault."""
    found = read(raw, FAB, where)
    _refuse(_offer_faults(raw, found, where) + _panelling_faults(raw, found, where))
    same_name = {name: table["value"] for name, table in found.items() if isinstance(table, dict) and "value" in table}
    mask_thickness = found["mask_thickness"] or {"value": 0.0, "tolerance": 0.0}
    mask_eps_r = found["mask_eps_r"] or {"value": 1.0, "at": 1e9}
    not_offered = {"mask_tan_d": 0.0, "mask_expansion": 0.0, "mask_web": 0.0, "legend_min_stroke": 0.0}
    fields: dict[str, Any] = {
        "impedance_tolerance": None,
        **not_offered,
        **same_name,
        "mask_thickness": mask_thickness["value"],
        "mask_thickness_tolerance": mask_thickness["tolerance"],
        "mask_eps_r": mask_eps_r["value"],
        "mask_at": mask_eps_r["at"],
        "finishes": found["finishes"]["values"],
        "panelling": found["panelling"] and _panelling(found["panelling"]),
    }
    below = tuple((f"panelling.{name}", source) for name, source in source_list(raw.get("panelling", {})))
    return Fab(key=key, title=found["title"], sources=source_list(raw) + below, **fields)


def _panelling(found: Mapping[str, Any]) -> Panelling:
    """Record of a checked table; what is not offered is 0."""
    not_offered: dict[str, Any] = {
        **dict.fromkeys(_SCORE_KEYS + _PERFORATION_KEYS, 0.0),
        "score_least_panel": (0.0, 0.0),
    }
    return Panelling(**not_offered | {name: table["value"] for name, table in found.items() if table is not None})


def read_connector(key: str, raw: Mapping[str, Any], where: str) -> Connector:
    """Connector from the parsed file `raw`; `where` names the file. Raises `LibraryError` with every fault."""
    found = read(raw, CONNECTOR, where)
    _refuse(_land_faults(found, where))
    body, tab = found["body"], found["ground_tab"]
    return Connector(
        key=key,
        title=found["title"],
        balanced=found["balanced"]["value"],
        impedance=_value(found["impedance"]),
        edge_distance=_value(found["edge_distance"]),
        board_thickness=_value(found["board_thickness"]),
        pads=tuple(
            LandPad(pad["name"], pad["net"], pad["level"], pad["shape"], pad["centre"], pad["size"])
            for pad in found["pads"]
        ),
        holes=tuple(
            LandHole(hole["centre"], hole["diameter"], hole["plated"], hole["net"], hole["purpose"])
            for hole in found["holes"]
        ),
        body=body and Body(body["centre"], body["size"]),
        ground_tab=tab and GroundTab(tab["half_width"], tab["length"]),
        sources=source_list(raw),
    )


def _value(table: dict[str, Any] | None) -> Any:
    return None if table is None else table["value"]


def _refuse(faults: list[Fault]) -> None:
    if faults:
        raise LibraryError(faults)


def _dispersion_faults(found: dict[str, Any], where: str) -> list[Fault]:
    eps_r, tan_d = found["eps_r"], found["tan_d"]
    try:
        WidebandDebye.from_point(eps_r["value"], tan_d["value"], at=eps_r["at"])
    except RangeError as error:
        return [Fault(where, "tan_d.value", f"{tan_d['value']:g}", str(error))]
    return []


def _offer_faults(raw: Mapping[str, Any], found: dict[str, Any], where: str) -> list[Fault]:
    """What mask and legend need where they are offered, and must not state where they are not."""
    faults = []
    for offer, keys in (("mask", _MASK_KEYS), ("legend", _LEGEND_KEYS)):
        offered = found[offer]["value"]
        for name in keys:
            if offered and name not in raw:
                faults.append(Fault(where, name, "(not given)", f"this key is needed, since {offer} is offered"))
            if not offered and name in raw:
                faults.append(Fault(where, name, str(raw[name]), f"leave it out, since {offer} is not offered"))
    if found["max_hole"]["value"] < found["min_hole"]["value"]:
        expected = f"at least min_hole, {raw['min_hole']['value']}, is needed"
        faults.append(Fault(where, "max_hole.value", raw["max_hole"]["value"], expected))
    return faults


def _panelling_faults(raw: Mapping[str, Any], found: Mapping[str, Any], where: str) -> list[Fault]:
    """What scoring and perforation need where they are offered, and must not state where they are not."""
    given = found["panelling"]
    if given is None:
        return []
    faults = []
    offers = (("score", _SCORE_KEYS), ("perforation_count", _PERFORATION_KEYS))
    for offer, keys in offers:
        offered = bool(given[offer]["value"])
        for name in keys:
            if offered and given[name] is None:
                expected = f"this key is needed, since {offer} is not 0 or false"
                faults.append(Fault(where, f"panelling.{name}", "(not given)", expected))
            if not offered and given[name] is not None:
                expected = f"leave it out, since {offer} is 0 or false"
                faults.append(Fault(where, f"panelling.{name}", str(raw["panelling"][name]), expected))
    opening, disc = given["fiducial_opening"]["value"], given["fiducial"]["value"]
    if opening < disc:
        expected = f"at least fiducial, {raw['panelling']['fiducial']['value']}, is needed"
        written = raw["panelling"]["fiducial_opening"]["value"]
        faults.append(Fault(where, "panelling.fiducial_opening.value", written, expected))
    return faults


def _land_faults(found: dict[str, Any], where: str) -> list[Fault]:
    """Land patterns that contradict themselves."""
    faults = []
    if found["pads"] and not any(pad["net"] == "signal" for pad in found["pads"]):
        faults.append(Fault(where, "pads", f"{len(found['pads'])} rows", "one pad of the net signal is needed"))
    if not found["balanced"]["value"] and not found["pads"]:
        faults.append(Fault(where, "pads", "(not given)", "an unbalanced connector needs its pads"))
    if not found["balanced"]["value"] and found["impedance"] is None:
        faults.append(Fault(where, "impedance", "(not given)", "an unbalanced connector needs its impedance"))
    for index, pad in enumerate(found["pads"], start=1):
        if pad["shape"] == "round" and pad["size"][0] != pad["size"][1]:
            faults.append(Fault(where, f"pads[{index}].size", str(pad["size"]), "both sizes of a round pad are equal"))
    for index, hole in enumerate(found["holes"], start=1):
        if hole["plated"] != (hole["net"] is not None):
            expected = "a plated hole needs its net, an unplated one has none"
            faults.append(Fault(where, f"holes[{index}].net", str(hole["net"]), expected))
    return faults

"""A design as a file: everything a person or a program may want of it, and the way back to the same copper.

`design.json` holds the brief with its defaults written out, the dimensions, what was predicted and every finding, in
plain types with units in the names, and a hash over all of it. Read back, its dimensions are given ones: nothing is
sized again, so that the prediction can be reproduced.
"""

from __future__ import annotations

import hashlib
import json
import tomllib
from collections.abc import Mapping
from dataclasses import asdict
from pathlib import Path
from typing import Any

from planar import __version__
from planar.brief import Brief, check_brief, write_brief
from planar.copper.layout import Hole, Layout
from planar.design.design import Design, make_design
from planar.design.equivalent import circuit_facts
from planar.design.line_size import DesignLine
from planar.design.prediction import AXIAL_RATIO_DB, prediction_facts
from planar.design.sensitivity import Sensitivity
from planar.design.sizing_record import Candidate, SizingRecord
from planar.design.trim import Cut
from planar.errors import BriefError, Fault
from planar.library import Library
from planar.stackup import Layer, loss_tangent

COMPUTED = ("prediction", "circuit", "sizing", "sensitivities", "cuts")
"""What the field solver says: its last digits are those of this or that machine."""
NEEDED = ("brief", "family", "dimensions_mm", "hash")
"""Keys without which a file is no design."""


def design_facts(design: Design) -> dict[str, Any]:
    """The design in plain types, units in the names: what `design.json` and `--json` say."""
    choices = design.choices
    facts: dict[str, Any] = {
        "name": design.name,
        "brief": tomllib.loads(write_brief(design.brief)),
        "planar_version": __version__,
        "status": design.status,
        "dimensions_given": design.given,
        "family": choices.family.key,
        "shape": choices.brief.antenna.shape,
        "end": choices.end,
        "polarisation": choices.brief.target.polarisation,
        "connector": choices.connector.key,
        "fab": choices.fab.key,
        "band_hz": list(choices.brief.target.band),
        "target": _target_facts(design),
        "dimensions_mm": {name: round(value * 1e3, 6) for name, value in design.dimensions.items()},
        "dimension_meanings": {name: choices.family.meaning(name) for name in design.dimensions},
        "dimension_tolerances_mm": _tolerances_mm(design),
        "board_mm": [round(side * 1e3, 6) for side in design.layout.size],
        "mean_line_mm": design.perimeter * 1e3,
        "first_order": _first_order_facts(design),
        "starting_values": _start_facts(design),
        "prediction": None if design.prediction is None else prediction_facts(design.prediction),
        "circuit": None if design.prediction is None else circuit_facts(design.prediction.circuit),
        "sizing": None if design.sizing is None else _sizing_facts(design.sizing),
        "sensitivities": [_sensitivity_facts(each) for each in design.sensitivities],
        "cuts": [_cut_facts(each) for each in design.cuts],
        "lines": [_line_facts(line) for line in design.lines],
        "copper": _copper_facts(design.layout),
        "holes": [_hole_facts(hole) for hole in design.layout.holes],
        "dc_short": design.layout.dc_short,
        "layers": [_layer_facts(layer, choices.centre) for layer in choices.stackup.layers],
        "sources": _source_facts(design),
        "assumptions": list(choices.reasons),
        "findings": [asdict(finding) for finding in design.findings],
    }
    facts |= {key: _rounded(facts[key]) for key in COMPUTED}
    return facts | {"hash": _digest(facts)}


def _rounded(value: Any) -> Any:
    """Numbers to seven digits, in whatever holds them."""
    if isinstance(value, float):
        return float(f"{value:.7g}")
    if isinstance(value, dict):
        return {key: _rounded(each) for key, each in value.items()}
    return [_rounded(each) for each in value] if isinstance(value, list | tuple) else value


def _digest(facts: Mapping[str, Any]) -> str:
    """SHA-256 over everything but the hash itself."""
    rest = {key: value for key, value in facts.items() if key != "hash"}
    return hashlib.sha256(json.dumps(rest, sort_keys=True).encode()).hexdigest()


def read_design(path: Path, library: Library) -> Design:
    """The design in the file `path`, its copper drawn again from the dimensions there.

    Raises `BriefError` for a file that is no design or was changed since it was written, and as `make_design`.
    """
    return drawn_again(read_facts(path), str(path), library)


def drawn_again(facts: Mapping[str, Any], where: str, library: Library) -> Design:
    """The design of `facts`, read from the file `where`, its copper drawn again. Raises as `make_design`."""
    return make_design(check_brief(given_brief(facts), where, library), library, where)


def read_facts(path: Path) -> dict[str, Any]:
    """What the file `path` says of its design. Raises `BriefError` where it is none or was changed since."""
    try:
        facts = json.loads(path.read_bytes())
    except OSError as error:
        reason = (error.strerror or "unreadable").lower()
        raise _no_design(path, "file", reason, "the design.json that planar make writes into a pack") from error
    except (ValueError, RecursionError) as error:
        raise _no_design(path, "file", "no JSON", "the design.json that planar make writes into a pack") from error
    missing = [key for key in NEEDED if not isinstance(facts, dict) or key not in facts]
    if missing:
        raise _no_design(path, missing[0], "(not given)", "a design.json as planar make writes it")
    if facts["hash"] != _digest(facts):
        expected = "the file as planar wrote it: to change dimensions write a brief with [antenna.dimensions]"
        raise _no_design(path, "hash", f'"{facts["hash"]}"', expected)
    return dict(facts)


def given_brief(facts: Mapping[str, Any]) -> dict[str, Any]:
    """The brief of a design with the family chosen and the dimensions found in their places."""
    brief: dict[str, Any] = dict(facts["brief"])
    kept = {k: v for k, v in brief.get("antenna", {}).items() if k not in {"trace_width", "corner_radius"}}
    chosen = {"family": facts["family"], "shape": facts["shape"], "end": facts["end"]}
    dimensions = {name: f"{value!r} mm" for name, value in facts["dimensions_mm"].items()}
    antenna = kept | {key: value for key, value in chosen.items() if value is not None} | {"dimensions": dimensions}
    return brief | {"antenna": antenna}


def redimensioned(design: Design, dimensions: Mapping[str, float], library: Library) -> Brief:
    """The brief of `design` with these `dimensions` (name -> m) given, family, shape and end as they were chosen, and
    nothing else changed; `planar make` takes them as they stand. `write_brief` makes it a file."""
    choices = design.choices
    facts = {
        "brief": tomllib.loads(write_brief(design.brief)),
        "family": choices.family.key,
        "shape": choices.brief.antenna.shape,
        "end": choices.end,
        "dimensions_mm": {name: round(value * 1e3, 6) for name, value in dimensions.items()},
    }
    return check_brief(given_brief(facts), f"{design.name}, redimensioned", library)


def _no_design(path: Path, key: str, value: str, expected: str) -> BriefError:
    return BriefError([Fault(str(path), key, value, expected)])


def _target_facts(design: Design) -> dict[str, Any]:
    """What the brief asks, as numbers."""
    target = design.choices.brief.target
    return {
        "impedance_ohm": target.impedance,
        "match_db": target.match_db,
        "axial_ratio_db": AXIAL_RATIO_DB if design.choices.circular else None,
        "transmit": target.transmit,
        "power_w": target.power,
    }


def _tolerances_mm(design: Design) -> dict[str, float | None]:
    """How far etching or drilling may move each dimension either way, mm; None where neither moves it: a mean line
    stays where the artwork has it, since its two edges move in opposite directions."""
    choices = design.choices
    edges = choices.family.etched(choices.traits)
    reach = {name: abs(edges.get(name, 0)) * choices.fab.etch_tolerance for name in design.dimensions}
    reach |= {name: choices.fab.hole_tolerance for name in reach if name.endswith("_drill")}
    return {name: round(value * 1e3, 6) or None for name, value in reach.items()}


def _layer_facts(layer: Layer, frequency: float) -> dict[str, Any]:
    """A layer, its permittivity at `frequency` Hz; None for what it does not have. Tolerances are fractions."""
    eps_r = None if layer.model is None else layer.permittivity(frequency)
    return {
        "name": layer.name,
        "kind": layer.kind.value,
        "material": layer.material,
        "thickness_mm": round(layer.thickness * 1e3, 6),
        "thickness_tolerance": layer.thickness_tolerance,
        "eps_r": None if eps_r is None else _rounded(eps_r.real),
        "eps_r_tolerance": None if eps_r is None else layer.eps_r_tolerance,
        "loss_tangent": None if eps_r is None else _rounded(loss_tangent(eps_r)),
        "loss_tangent_tolerance": None if eps_r is None else layer.tan_d_tolerance,
    }


def _source_facts(design: Design) -> dict[str, dict[str, str]]:
    """Where the numbers of the library come from: kind of entry -> key in it -> source."""
    choices = design.choices
    return {
        "laminate": dict(choices.laminate.sources),
        "fab": dict(choices.fab.sources),
        "connector": dict(choices.connector.sources),
    }


def _sensitivity_facts(each: Sensitivity) -> dict[str, Any]:
    """Per mm of a dimension or thickness, per 1 of a permittivity."""
    pure = each.name.endswith("permittivity")
    scale, unit = (1.0, "unit") if pure else (1e-3, "mm")
    mode = each.mode_hz_per_unit
    return {
        "name": each.name,
        "value" if pure else "value_mm": each.value / scale,
        f"mhz_per_{unit}": each.hz_per_unit * scale / 1e6,
        f"ohm_per_{unit}": [each.ohm_per_unit.real * scale, each.ohm_per_unit.imag * scale],
        f"mode_mhz_per_{unit}": None if mode is None else mode * scale / 1e6,
        "step": each.step / scale,
        "asymmetry": each.asymmetry,
    }


def _cut_facts(cut: Cut) -> dict[str, Any]:
    return {
        "cut": cut.name,
        "removed_mm2": cut.removed * 1e6,
        "shift_hz": cut.hz,
        "best_match_hz": cut.best_match_hz,
        "worst_reflection_db": cut.worst_reflection_db,
    }


def _sizing_facts(record: SizingRecord) -> dict[str, Any]:
    return {
        "coarse_boards": record.coarse_boards,
        "fine_boards": record.fine_boards,
        "field_solutions": record.solutions,
        "sized_span": record.width,
        "at_bound": list(record.held),
        "candidates": [_candidate_facts(each) for each in record.candidates],
    }


def _candidate_facts(candidate: Candidate) -> dict[str, Any]:
    return {
        "family": candidate.family,
        "end": candidate.end,
        "shape": candidate.shape,
        "meets_brief": candidate.meets,
        "margin_after_tolerance": candidate.margin,
        "board_mm": None if candidate.size is None else [round(side * 1e3, 3) for side in candidate.size],
        "needs_balun": candidate.needs_balun,
        "remark": candidate.remark,
    }


def _first_order_facts(design: Design) -> dict[str, float] | None:
    """The bare loop by formulas; None where given dimensions are outside them."""
    bare = design.bare_loop
    if bare is None:
        return None
    return {
        "bare_loop_frequency_hz": bare.frequency,
        "bare_loop_perimeter_mm": bare.perimeter * 1e3,
        "bare_loop_perimeter_wavelengths": bare.perimeter_wavelengths,
        "bare_loop_resistance_ohm": bare.resistance,
        "trace_eps_eff": bare.eps_eff,
        "expected_frequency_error": design.frequency_error,
    }


def _start_facts(design: Design) -> dict[str, Any] | None:
    """Where sizing started from; None for given dimensions."""
    if design.given:
        return None
    start = design.choices.family.start(design.choices.traits)
    return {
        "mean_line_over_resonant_bare_loop": start.perimeter_ratio,
        "line_load_over_bare_loop_resistance": start.gap_resistance_ratio or 1.0,
    }


def _line_facts(line: DesignLine) -> dict[str, Any]:
    return {
        "name": line.name,
        "kind": line.line.kind,
        "width_mm": line.line.width * 1e3,
        "gap_mm": None if line.line.gap is None else line.line.gap * 1e3,
        "impedance_ohm": line.line.impedance,
        "tolerance_ohm": line.tolerance_ohm,
        "ohm_per_25_um_etch": line.slopes.ohm_per_25_um_etch,
        "eps_eff": line.line.eps_eff,
        "quarter_wave_mm": line.line.quarter_wave * 1e3,
        "loss_db_per_m": line.line.loss_db_per_m,
        "reference": line.reference,
    }


def _hole_facts(hole: Hole) -> dict[str, Any]:
    return {
        "centre_mm": [round(value * 1e3, 6) for value in hole.centre],
        "diameter_mm": round(hole.diameter * 1e3, 6),
        "plated": hole.plated,
        "purpose": hole.purpose,
        "net": hole.net,
    }


def _copper_facts(layout: Layout) -> list[dict[str, Any]]:
    return [
        {
            "level": island.level.value,
            "role": island.role.value,
            "net": island.net,
            "area_mm2": island.outline.area * 1e6,
            "vertices": len(island.outline),
        }
        for island in layout.islands
    ]

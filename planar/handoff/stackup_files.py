"""The stackup sheet as JSON for programs and as a page of Markdown for the fab.

Both files are written from the same `StackupSheet`. JSON lengths are millimetres and carry that in
their key; `read_stackup_json` returns the record again.
"""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any

from planar.copper.layout import Kind
from planar.errors import HandoffError
from planar.handoff.kind_words import KIND_WORDS
from planar.handoff.sheet_cells import layer_cells, line_cells, with_spread
from planar.handoff.stackup_sheet import ImpedanceLine, SheetFacts, SheetLayer, StackupSheet
from planar.units import show


def write_stackup_json(sheet: StackupSheet, path: Path) -> None:
    """Write `sheet` as JSON. The same sheet gives the same bytes."""
    path.write_bytes((json.dumps(_content(sheet), indent=2, ensure_ascii=False) + "\n").encode("utf-8"))


def stackup_mismatches(sheet: StackupSheet, path: Path) -> list[str]:
    """What the JSON at `path` says otherwise than `sheet`: each with what was expected."""
    try:
        got, expected = _content(read_stackup_json(path)), _content(sheet)
    except HandoffError as error:
        return [str(error)]
    pairs = [(key, got.get(key), expected.get(key)) for key in {**expected, **got}]
    return [f"{path.name}: {key} is {here}, expected {right}" for key, here, right in pairs if here != right]


def _content(sheet: StackupSheet) -> dict[str, Any]:
    facts = sheet.facts
    return {
        "name": facts.name,
        **({} if facts.kind is Kind.SINGLE else {"kind": str(facts.kind)}),
        "frequency_hz": facts.frequency_hz,
        "finish": facts.finish,
        "laminate_specification": facts.specification,
        "outline_tolerance_mm": _mm(facts.outline_tolerance_m),
        "dc_short_between_feed_and_ground": facts.dc_short,
        "total_thickness_mm": _mm(sheet.total_thickness_m),
        "total_thickness_with_mask_mm": _mm(sheet.masked_thickness_m),
        "total_thickness_tolerance_fraction": sheet.thickness_tolerance,
        "layers_top_to_bottom": [_layer_json(layer) for layer in sheet.layers],
        "surroundings_top_to_bottom": [_layer_json(layer) for layer in sheet.surroundings],
        "impedance_lines": [_line_json(line) for line in sheet.impedance_lines],
        "notes": list(sheet.notes),
    }


def read_stackup_json(path: Path) -> StackupSheet:
    """The sheet of a file of `write_stackup_json`. Raises `HandoffError` when it is none."""
    try:
        content = json.loads(path.read_text(encoding="utf-8"))
        return _sheet(content)
    except (OSError, ValueError, TypeError, KeyError) as error:
        raise HandoffError(f"{path.name} is no stackup file: {type(error).__name__} {error}") from error


def _sheet(content: dict[str, Any]) -> StackupSheet:
    facts = SheetFacts(
        content["name"],
        content["frequency_hz"],
        content["finish"],
        content["laminate_specification"],
        content["outline_tolerance_mm"] * 1e-3,
        content["dc_short_between_feed_and_ground"],
        Kind(content.get("kind", Kind.SINGLE)),
    )
    return StackupSheet(
        facts,
        tuple(_layer(row) for row in content["layers_top_to_bottom"]),
        tuple(_layer(row) for row in content["surroundings_top_to_bottom"]),
        content["total_thickness_mm"] * 1e-3,
        content["total_thickness_with_mask_mm"] * 1e-3,
        content["total_thickness_tolerance_fraction"],
        tuple(_line(row) for row in content["impedance_lines"]),
        tuple(content["notes"]),
    )


def _layer_json(layer: SheetLayer) -> dict[str, Any]:
    return {
        "name": layer.name,
        "kind": layer.kind,
        "material": layer.material,
        "thickness_mm": _mm(layer.thickness_m),
        "thickness_tolerance_fraction": layer.thickness_tolerance,
        "base_copper_mm": None if layer.base_copper_m is None else _mm(layer.base_copper_m),
        "eps_r": None if layer.eps_r is None else round(layer.eps_r, 6),
        "eps_r_tolerance_fraction": layer.eps_r_tolerance,
        "tan_d": None if layer.tan_d is None else round(layer.tan_d, 9),
        "tan_d_tolerance_fraction": layer.tan_d_tolerance,
    }


def _layer(row: dict[str, Any]) -> SheetLayer:
    base = row["base_copper_mm"]
    return SheetLayer(
        row["name"],
        row["kind"],
        row["material"],
        row["thickness_mm"] * 1e-3,
        None if base is None else base * 1e-3,
        row["eps_r"],
        row["tan_d"],
        row["thickness_tolerance_fraction"],
        row["eps_r_tolerance_fraction"],
        row["tan_d_tolerance_fraction"],
    )


def _line_json(line: ImpedanceLine) -> dict[str, Any]:
    return {
        "name": line.name,
        "kind": line.kind,
        "width_mm": _mm(line.width_m),
        "gap_mm": None if line.gap_m is None else _mm(line.gap_m),
        "level": line.level,
        "reference": line.reference,
        "impedance_ohm": round(line.impedance_ohm, 6),
        "tolerance_ohm": None if line.tolerance_ohm is None else round(line.tolerance_ohm, 6),
        "controlled": line.controlled,
        "instruction": line.instruction,
    }


def _line(row: dict[str, Any]) -> ImpedanceLine:
    gap = row["gap_mm"]
    return ImpedanceLine(
        row["name"],
        row["kind"],
        row["width_mm"] * 1e-3,
        None if gap is None else gap * 1e-3,
        row["level"],
        row["reference"],
        row["impedance_ohm"],
        row["tolerance_ohm"],
        row["controlled"],
    )


def write_stackup_markdown(sheet: StackupSheet, path: Path) -> None:
    """Write `sheet` as a page of Markdown. The same sheet gives the same bytes."""
    at = show(sheet.facts.frequency_hz, "frequency")
    parts = [
        f"# Stackup of {sheet.facts.name}",
        f"Seen from the side, top to bottom. Permittivity and loss tangent at {at}.",
        _table(_LAYER_HEAD, [layer_cells(layer, _length, "+-") for layer in sheet.layers]),
        f"Total {with_spread(_length(sheet.total_thickness_m), sheet.thickness_tolerance)} with copper, without mask; "
        f"{show(sheet.masked_thickness_m, 'length')} with mask.",
        f"Finish: {sheet.facts.finish}.",
    ]
    if sheet.surroundings:
        surroundings = _table(_LAYER_HEAD, [layer_cells(layer, _length, "+-") for layer in sheet.surroundings])
        parts += ["## Around the board", f"Not made by the fab; {KIND_WORDS[sheet.facts.kind].around}.", surroundings]
    parts += ["## Impedance", *_impedance(sheet), "## Notes", "\n".join(f"- {note}" for note in sheet.notes)]
    path.write_bytes(("\n\n".join(parts) + "\n").encode("utf-8"))


_LAYER_HEAD = ("layer", "material", "thickness", "base copper", "eps_r", "tan d")
_LINE_HEAD = ("line", "kind", "width", "gap", "level", "reference", "impedance", "instruction")


def _impedance(sheet: StackupSheet) -> list[str]:
    if not sheet.impedance_lines:
        return ["No line on this board has a stated impedance."]
    return [_table(_LINE_HEAD, [line_cells(line, "+-", "ohm") for line in sheet.impedance_lines])]


def _table(head: tuple[str, ...], rows: list[tuple[str, ...]]) -> str:
    lines = [head, tuple("---" for _ in head), *rows]
    return "\n".join("| " + " | ".join(cell.replace("|", "\\|") for cell in line) + " |" for line in lines)


def _length(length: float) -> str:
    return show(length, "length")


def _mm(length: float) -> float:
    """A length in mm, rounded to 1 nm."""
    return round(length * 1e3, 6)

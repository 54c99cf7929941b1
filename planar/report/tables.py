"""The tables of the page: rows of cells made from facts, drawn by one macro of the template.

A builder takes the facts of the page and gives a `Table`, or None where there is nothing to tell; columns in which no
row says anything are left out.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any

from markupsafe import Markup

from planar.report.page_figures import bare_figure, complex_figure, figure, figure_range, known, quoted
from planar.report.page_files import page_table

Facts = Mapping[str, Any]
Cell = Markup | str
Row = tuple[Cell, ...]
SEVERITIES: Mapping[str, str] = {"refuse": "refused", "warn": "check", "note": "note"}
"""Severity of a finding -> the word the page says."""
LINE_METHODS: Mapping[str, str] = {
    "microstrip": (
        "Microstrip over a wide ground, which the loop trace is not: Hammerstad and Jensen 1980, dispersion by "
        "Kirschning and Jansen 1982, the mask by a static solution"
    ),
    "coplanar-strips": "Coplanar strips: exact static solution for thin strips, thickness added as capacitance",
}
"""Kind of line -> how its numbers are found."""


@dataclass(frozen=True)
class Column:
    """Head of a column; `number` aligns it right."""

    head: str
    number: bool = False


@dataclass(frozen=True)
class Table:
    """What a table says: `title`, heads, rows of as many cells, and a `note` below."""

    title: str
    columns: tuple[Column, ...]
    rows: tuple[Row, ...]
    note: Cell = ""


@dataclass(frozen=True)
class Quantity:
    """A row of quantities.toml."""

    label: str
    keys: tuple[str, ...]
    form: str
    method: str
    join: str = ""
    asked: tuple[str, ...] = ()
    asked_form: str = ""
    better: str = ""

    def told(self, facts: Facts) -> Cell | None:
        """The quantity as the page writes it, None where it is not known."""
        return _joined(facts, self.keys, self.form, self.join)

    def wanted(self, facts: Facts) -> Cell:
        """What the brief asks of it, empty where it asks nothing."""
        join = "range" if len(self.asked) > 1 else ""
        return (_joined(facts, self.asked, self.asked_form, join) or "") if self.asked else ""


def quantities() -> tuple[Quantity, ...]:
    """The rows of quantities.toml."""
    rows = page_table("quantities.toml")["quantity"]
    listed = ("keys", "asked")
    told: list[dict[str, Any]] = [{k: tuple(v) if k in listed else v for k, v in row.items()} for row in rows]
    return tuple(Quantity(**row) for row in told)


def _joined(facts: Facts, keys: Sequence[str], form: str, join: str) -> Cell | None:
    if not all(known(facts, key) for key in keys):
        return None
    if join == "complex":
        return complex_figure(facts, keys[0])
    if join == "range":
        return figure_range(facts, (keys[0], keys[1]), form)
    return Markup(" and ").join(figure(facts, key, form) for key in keys)


def table(title: str, heads: Sequence[str], rows: Sequence[Row], note: Cell = "") -> Table | None:
    """A table without its empty columns, None without rows; a head that ends in ` #` is one of numbers."""
    if not rows:
        return None
    used = [i for i in range(len(heads)) if any(row[i] != "" for row in rows)]
    columns = tuple(Column(heads[i].removesuffix(" #"), heads[i].endswith(" #")) for i in used)
    return Table(title, columns, tuple(tuple(row[i] for i in used) for row in rows), note)


def prediction_table(facts: Facts) -> Table | None:
    """Everything predicted, beside what is asked, with the method."""
    if facts["prediction"] is None:
        return None
    told = ((each, each.told(facts)) for each in quantities())
    rows = [(each.label, cell, each.wanted(facts), each.method) for each, cell in told if cell is not None]
    return table("Predicted", ("quantity", "predicted #", "asked #", "how it is found"), rows)


def first_order_table(facts: Facts) -> Table | None:
    """What the formulas say of the bare loop, where nothing was solved."""
    rows = [
        (label, figure(facts, f"first_order.{key}", form))
        for key, label, form in (
            ("bare_loop_frequency_hz", "resonance of the bare loop", "mhz"),
            ("bare_loop_resistance_ohm", "resistance there", "ohm"),
            ("bare_loop_perimeter_mm", "mean line at resonance", "mm"),
            ("bare_loop_perimeter_wavelengths", "the same in wavelengths", "bare3"),
            ("trace_eps_eff", "effective permittivity of the trace", "bare3"),
            ("expected_frequency_error", "expected error of the frequency", "percent"),
        )
        if known(facts, f"first_order.{key}")
    ]
    return table("By formulas, not solved", ("quantity", "value #"), rows)


def dimension_table(facts: Facts) -> Table | None:
    """Every dimension with meaning, tolerance and effect."""
    effects = {each["name"]: f"sensitivities.{i}" for i, each in enumerate(facts["sensitivities"])}
    rows = []
    for name in facts["dimensions_mm"]:
        tolerance, shift = f"dimension_tolerances_mm.{name}", f"derived.tolerance_shift_mhz.{name}"
        effect = f"{effects[name]}.mhz_per_mm" if name in effects else ""
        rows.append(
            (
                _code(name),
                quoted(facts, f"dimension_meanings.{name}"),
                bare_figure(facts, f"dimensions_mm.{name}", "bare3"),
                _plus_minus(facts, tolerance, "asked") if known(facts, tolerance) else "artwork",
                bare_figure(facts, effect, "signed2") if effect else "",
                _plus_minus(facts, shift, "bare2") if known(facts, shift) else "",
            )
        )
    note = (
        "Finished copper at the foot of the conductor. Tolerance: etching, on both edges of a width or a gap, and "
        "drilling, by the fab's file; artwork means that etching does not move it. What a tolerance makes is slope "
        "times tolerance, one at a time."
    )
    if not effects:
        note += " The effect of each dimension is worked out with planar make --sensitivities."
    heads = ("dimension", "meaning", "mm #", "tolerance mm #", "MHz per mm #", "tolerance makes MHz #")
    return table("Dimensions", heads, rows, note)


def layer_effect_table(facts: Facts) -> Table | None:
    """What moves the response beside the dimensions."""
    rows = []
    for i, each in enumerate(facts["sensitivities"]):
        name, at = each["name"], f"sensitivities.{i}"
        if name in facts["dimensions_mm"]:
            continue
        value, unit = ("value", "unit") if "value" in each else ("value_mm", "mm")
        shift = f"derived.tolerance_shift_mhz.{name}"
        rows.append(
            (
                name,
                bare_figure(facts, f"{at}.{value}", "bare3"),
                bare_figure(facts, f"{at}.mhz_per_{unit}", "signed2"),
                "per mm" if unit == "mm" else "per 1 of permittivity",
                _plus_minus(facts, shift, "bare2") if known(facts, shift) else "",
            )
        )
    note = (
        "Differences of field solutions, both ways where both can be drawn, on a coarser mesh; the shift is that of "
        "the whole response. Tolerances as under Layers."
    )
    return table("Effect of the layers", ("layer", "is #", "MHz #", "", "tolerance makes MHz #"), rows, note)


def line_table(facts: Facts) -> Table | None:
    """The printed lines with impedance and tolerance."""
    rows = []
    for i, line in enumerate(facts["lines"]):
        at = f"lines.{i}"
        gap = f"{at}.gap_mm"
        rows.append(
            (
                _code(line["name"]),
                line["kind"],
                bare_figure(facts, f"{at}.width_mm", "bare3"),
                bare_figure(facts, gap, "bare3") if known(facts, gap) else "",
                bare_figure(facts, f"{at}.impedance_ohm", "bare1"),
                _plus_minus(facts, f"{at}.tolerance_ohm", "bare1"),
                bare_figure(facts, f"{at}.eps_eff", "bare3"),
                bare_figure(facts, f"{at}.quarter_wave_mm", "bare2"),
                bare_figure(facts, f"{at}.loss_db_per_m", "bare2"),
                quoted(facts, f"{at}.reference"),
            )
        )
    methods = "; ".join(LINE_METHODS[kind] for kind in dict.fromkeys(line["kind"] for line in facts["lines"]))
    note = (
        f"By line formulas at the middle of the band. {methods}. Tolerance: etch, thickness and permittivity as a root "
        "of squares. The prediction does not use these numbers: it solves the lines as they are drawn."
    )
    heads = ("line", "kind", "width mm #", "gap mm #", "ohm #", "tolerance ohm #", "effective permittivity #")
    return table("Lines", (*heads, "quarter wave mm #", "loss dB/m #", "against"), rows, note)


def layer_table(facts: Facts) -> Table | None:
    """The stackup, top first, as the solver and the formulas take it."""
    rows = []
    for i, layer in reversed(list(enumerate(facts["layers"]))):
        if layer["thickness_mm"] == 0.0:  # ink in patches, a plane of metal
            continue
        at = f"layers.{i}"
        spread = {key: known(facts, f"{at}.{key}") and layer[key] > 0.0 for key in _LAYER_TOLERANCES}
        cells = {key: _plus_minus(facts, f"{at}.{key}", "percent0") if spread[key] else "" for key in spread}
        rows.append(
            (
                layer["name"],
                quoted(facts, f"{at}.material"),
                bare_figure(facts, f"{at}.thickness_mm", "bare3"),
                cells["thickness_tolerance"],
                bare_figure(facts, f"{at}.eps_r", "bare3") if layer["eps_r"] is not None else "",
                cells["eps_r_tolerance"],
                bare_figure(facts, f"{at}.loss_tangent", "bare4") if layer["eps_r"] is not None else "",
                cells["loss_tangent_tolerance"],
            )
        )
    note = "Top first; permittivity and loss tangent at the middle of the band, wideband Debye model."
    heads = ("layer", "material", "mm #", "tolerance #", "permittivity #", "tolerance #", "loss tangent #")
    return table("Layers", (*heads, "tolerance #"), rows, note)


_LAYER_TOLERANCES = ("thickness_tolerance", "eps_r_tolerance", "loss_tangent_tolerance")


def candidate_table(facts: Facts) -> Table | None:
    """What else was considered, and why not."""
    sizing = facts["sizing"]
    rows = []
    for i, each in enumerate([] if sizing is None else sizing["candidates"]):
        at = f"sizing.candidates.{i}"
        margin, board = f"{at}.margin_after_tolerance", f"{at}.board_mm"
        words = ", ".join(w for w in (each["family"], each["end"] and f"end {each['end']}", each["shape"]) if w)
        sized = "meets" if each["meets_brief"] else "misses" if known(facts, margin) else "not sized"
        matched = known(facts, margin) and each["margin_after_tolerance"] > -1.0
        rows.append(
            (
                words,
                "chosen" if i == 0 and each["meets_brief"] else sized,
                bare_figure(facts, margin, "percent_bare") if matched else "",
                sides(facts, board) if known(facts, board) else "",
                "yes" if each["needs_balun"] else "no",
                quoted(facts, f"{at}.remark") if each["remark"] else "",
            )
        )
    note = (
        "On the coarse mesh of sizing. Margin: from the band to the nearer end of the match, the match held to what "
        "the most fragile line may be off, less the shift by laminate and thickness, over the centre frequency."
    )
    heads = ("realisation", "brief", "margin % #", "board #", "balun", "remark")
    return table("Considered", heads, rows, note)


def finding_table(facts: Facts) -> Table | None:
    """Every finding with what was got, the limit and the advice."""
    rows = [
        (Markup("<strong>{}</strong>").format(SEVERITIES[each["severity"]]), *_finding_cells(facts, f"findings.{i}"))
        for i, each in enumerate(facts["findings"])
    ]
    return table("Findings", ("", "rule", "at", "got", "limit", "advice"), rows)


def _finding_cells(facts: Facts, at: str) -> Row:
    return tuple(quoted(facts, f"{at}.{key}") for key in ("rule", "where", "got", "limit", "advice"))


def cut_table(facts: Facts) -> Table | None:
    """What trimming does."""
    rows = []
    for i in range(len(facts["cuts"])):
        at = f"cuts.{i}"
        best = f"{at}.best_match_hz"
        rows.append(
            (
                quoted(facts, f"{at}.cut"),
                bare_figure(facts, f"{at}.removed_mm2", "bare2"),
                bare_figure(facts, f"{at}.shift_hz", "signed_mhz_bare"),
                bare_figure(facts, best, "mhz_bare") if known(facts, best) else "",
                bare_figure(facts, f"{at}.worst_reflection_db", "bare1"),
            )
        )
    heads = ("cut off", "mm\N{SUPERSCRIPT TWO} #", "shift MHz #", "best match MHz #", "worst in the band dB #")
    return table("Trimming", heads, rows, "All on one coarser mesh: compare rows with each other.")


def power_table(facts: Facts) -> Table | None:
    """Radiated power in both ways of counting."""
    if facts["safety"] is None:
        return None
    rows = [
        (label, figure(facts, f"safety.{key}_w", "mw"), figure(facts, f"safety.{key}_dbm", "dbm"), against)
        for key, label, against in (
            ("eirp", "e.i.r.p.", "power times gain, against a source alike in all directions"),
            ("erp", "e.r.p.", "2.15 dB below, against a half-wave dipole"),
        )
    ]
    return table("Radiated power", ("", "power #", "level #", "counted"), rows)


def limit_table(facts: Facts) -> Table | None:
    """Distances at which the power density meets the levels for the public."""
    rows = []
    for i, each in enumerate([] if facts["safety"] is None else facts["safety"]["limits"]):
        at = f"safety.limits.{i}"
        told = each["level_w_m2"] is not None
        shown = {key: figure(facts, f"{at}.{key}_mm", "cm") if told else "" for key in ("distance", "reflected")}
        held = ", the least that is told" if each["floor_holds"] else ""
        rows.append(
            (
                quoted(facts, f"{at}.name"),
                figure(facts, f"{at}.level_w_m2", "w_m2") if told else "none stated at this frequency",
                Markup("{}{}").format(shown["distance"], held),
                shown["reflected"],
                Markup("{}; {}; averaged {}").format(*(quoted(facts, f"{at}.{k}") for k in _LIMIT_WORDS)),
            )
        )
    heads = ("limit", "level #", "distance #", "all reflected #", "edition and place")
    return table("Distance", heads, rows)


_LIMIT_WORDS = ("source", "edition", "averaged")


def file_table(files: Mapping[str, str]) -> Table | None:
    """The files of the pack with their hashes (path -> SHA-256)."""
    hashed = Markup('<code class="hash">{}</code>')
    rows = [(_code(name), hashed.format(digest)) for name, digest in sorted(files.items())]
    return table("Files", ("file", "SHA-256"), rows, "As in SHA256SUMS: sha256sum -c checks them.")


def source_table(facts: Facts) -> Table | None:
    """Where the library's numbers come from: a row a source, with its values and what is remarked on them."""
    rows: list[Row] = []
    for kind, entries in facts["sources"].items():
        by_source: dict[str, list[str]] = {}
        for key, told in entries.items():
            source, _, remark = told.partition("; ")
            by_source.setdefault(source, []).append(f"{key} ({remark})" if remark else key)
        rows += [(f"{kind}: {source}", ", ".join(keys)) for source, keys in by_source.items()]
    return table("Sources of the library's values", ("source", "values"), rows)


def _code(name: str) -> Markup:
    return Markup("<code>{}</code>").format(name)


def sides(facts: Facts, key: str) -> Markup:
    """Width and height that stand in mm at `key`."""
    width, height = bare_figure(facts, f"{key}.0", "bare1"), figure(facts, f"{key}.1", "mm")
    return Markup("{}&nbsp;\N{MULTIPLICATION SIGN}&nbsp;{}").format(width, height)


def _plus_minus(facts: Facts, key: str, form: str) -> Markup:
    return Markup("\N{PLUS-MINUS SIGN}{}").format(figure(facts, key, form))

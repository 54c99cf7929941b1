"""Tables of how made boards scatter: yield, results over boards, worst corners, and what was varied by which law."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from markupsafe import Markup

from planar.report.page_figures import bare_figure, figure, figure_range, known, quoted
from planar.report.tables import Cell, Row, Table, table

Facts = Mapping[str, Any]
RESULTS: Mapping[str, tuple[str, str]] = {
    "worst_reflection_db": ("worst reflection in the band", "db"),
    "worst_axial_ratio_db": ("worst axial ratio in the band", "db2"),
    "shift_percent": ("shift of the response", "shift"),
}
"""Key of a result of one board -> its name and how it is written."""
OTHER_SENSE = "other sense"
"""Said in place of an axial ratio that turns the other way: it has no number."""


def yield_table(facts: Facts) -> Table | None:
    """Share of boards that meet each demand, and how well it is known."""
    if facts["spread"] is None:
        return None
    rows: list[Row] = []
    for key, name in (("match", "the match"), ("axial_ratio", "the axial ratio"), ("total", "all the brief asks")):
        if not known(facts, f"spread.yield.{key}") or (key == "match" and not known(facts, "spread.yield.axial_ratio")):
            continue
        doubts = ("total_95_percent", "total_if_model_errs") if key == "total" else ()
        told: list[Cell] = [_between(facts, f"spread.yield.{each}", "percent2") for each in doubts]
        rows.append((name, figure(facts, f"spread.yield.{key}", "percent2"), *(told or ("", ""))))
    return table("Yield", ("meets", "boards #", "95 % interval #", "where the model errs #"), rows, _yield_note(facts))


def _yield_note(facts: Facts) -> Markup:
    note = Markup(
        "{} boards drawn at random (seed {}) within {} times the tolerances, on a second-order model of {} boards "
        "solved. The interval is that of so many draws (Wilson 1927)."
    ).format(*(bare_figure(facts, f"spread.{key}", "asked") for key in _DRAWN))
    if known(facts, "spread.model_error"):
        axial = "spread.model_error.axial_ratio_db"
        note += Markup(" On {} boards drawn afresh the model was off by up to {} of reflection in the band{}.").format(
            bare_figure(facts, "spread.model_error.boards_checked", "count"),
            bare_figure(facts, "spread.model_error.reflection_in_band", "bare4"),
            Markup(" and {} of worst axial ratio").format(figure(facts, axial, "db2")) if known(facts, axial) else "",
        )
    if facts["spread"]["half_uncovered"]:
        note += Markup(" Half of the boards are without their cover.")
    return note


_DRAWN = ("samples", "seed", "tolerance_factor", "boards_solved")


def result_table(facts: Facts) -> Table | None:
    """Percentiles of every result, beside the board as designed."""
    if facts["spread"] is None:
        return None
    percent = facts["spread"]["percentiles"]["at_percent"]
    rows: list[Row] = []
    for key, (name, form) in RESULTS.items():
        at = f"spread.percentiles.{key}"
        if known(facts, at):
            told = (_told(facts, f"{at}.{i}", form) for i in range(len(percent)))
            rows.append((name, _told(facts, f"spread.nominal.{key}", form), *told))
    heads = ("result", "as designed #", *(f"{each:g} % below #" for each in percent))
    note = (
        "5 % below: one board in twenty has less. The shift is that of the whole response along the frequency axis; a "
        "wide match may stay while it moves. Mask runs from none, as over edges of copper, to its upper tolerance."
    )
    return table("Over the boards", heads, rows, note)


def corner_table(facts: Facts) -> Table | None:
    """Boards on which everything that can go one way does: solved, else from the model."""
    if facts["spread"] is None:
        return None
    rows: list[Row] = []
    for i, corner in enumerate(facts["spread"]["corners"]):
        at = f"spread.corners.{i}"
        how = "solved" if corner["solved"] is not None else "modelled"
        told = [_told(facts, f"{at}.{how}.{key}", form) for key, (_, form) in RESULTS.items()]
        ends = Markup(", ").join(
            Markup("{} {}").format(key.removesuffix("_mm").replace("_", " "), _end(facts, f"{at}.at.{key}"))
            for key in corner["at"]
        )
        rows.append((quoted(facts, f"{at}.name"), how, *told, ends))
    heads = ("corner", "how", *(f"{name} #" for name, _ in RESULTS.values()), "with")
    note = "Every tolerance at one of its ends at once: found on the model, solved as drawn. Few boards come near them."
    return table("Worst corners", heads, rows, note)


def quantity_table(facts: Facts) -> Table | None:
    """What was varied, between which ends, by which law, on whose word."""
    if facts["spread"] is None:
        return None
    rows: list[Row] = []
    for i, each in enumerate(facts["spread"]["quantities"]):
        at = f"spread.quantities.{i}"
        unit = f" {each['unit']}" if each["unit"] else ""
        told = (Markup("{}{}").format(bare_figure(facts, f"{at}.{key}", "asked"), unit) for key in _ENDS)
        rows.append(
            (quoted(facts, f"{at}.name"), *told, *(quoted(facts, f"{at}.{key}") for key in ("distribution", "source")))
        )
    heads = ("quantity", "as designed #", "least #", "most #", "law", "source")
    return table("What was varied", heads, rows, quoted(facts, "spread.laws"))


_ENDS = ("nominal", "low", "high")


def unvaried_table(facts: Facts) -> Table | None:
    """What differs between boards and was left out, with the reason."""
    count = 0 if facts["spread"] is None else len(facts["spread"]["not_varied"])
    keys = (f"spread.not_varied.{i}" for i in range(count))
    rows: list[Row] = [(quoted(facts, f"{key}.what"), quoted(facts, f"{key}.why")) for key in keys]
    return table("What was not varied", ("quantity", "why"), rows)


def _told(facts: Facts, key: str, form: str) -> Cell:
    """A result, empty where a board has none; an axial ratio of the other sense has no number."""
    if known(facts, key):
        return figure(facts, key, form)
    return OTHER_SENSE if "axial" in key and known(facts, "spread.axial_ratio_limit_db") else ""


def _between(facts: Facts, key: str, form: str) -> Markup:
    return figure_range(facts, (f"{key}.0", f"{key}.1"), form)


def _end(facts: Facts, key: str) -> Markup:
    return Markup("{}{}").format(bare_figure(facts, key, "asked"), " mm" if key.endswith("_mm") else "")

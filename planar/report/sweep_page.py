"""sweep.html: one self-contained page of a sweep, from the rows of its sweep.json and nothing else.

What was varied, what came of it, the row with most to spare, small plots of every quantity, a table of all rows that a
click on a head sorts. Without its script it is as complete; it holds no date and no path, and is the same twice.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from typing import Any

from markupsafe import Markup

from planar import __version__
from planar.design.sweep_axes import Axis
from planar.report.page import page
from planar.report.page_facts import page_facts
from planar.report.page_figures import figure
from planar.report.page_files import page_text
from planar.report.page_pictures import Picture, inline_svg
from planar.report.sweep_columns import numeric_columns, quantity
from planar.report.sweep_curves import Curves, sweep_curves
from planar.report.sweep_facts import (
    MEETS,
    SweptRow,
    asked_levels,
    best_row,
    row_counts,
    row_ranges,
    swept_row,
)  # fmt: skip
from planar.report.sweep_pictures import asked_symbol, legend_entries, plot_words, sweep_plot
from planar.report.sweep_tables import axis_table, dimension_tables, finding_table, rows_table
from planar.report.verdict import Tone, verdict

MOST_RANGES = 12
"""Runs of rows that are listed in the verdict."""
NO_BREAK = "\N{NO-BREAK SPACE}"
MULTIPLES = (
    "worst_reflection_db", "matched_percent", "gain_dbi", "efficiency_percent", "worst_axial_ratio_db",
    "board_area_cm2",
)  # fmt: skip
"""Columns with a plot on the page where any row has a number for them."""


def sweep_page(
    axes: Sequence[Axis], rows: Sequence[Mapping[str, Any]], *, name: str, plots: Sequence[str] = MULTIPLES
) -> str:
    """The page of the sweep `name` over `axes`; `rows` as in its sweep.json, `plots` columns drawn beside `MULTIPLES`.

    The numbers in its sentences are facts of the best row (as in design.json) and `counts`.
    """
    swept = [swept_row(row) for row in rows]
    best = best_row(swept)
    facts = {} if best is None else page_facts(next(row["design"] for row in rows if row["row"] == best.number))
    facts["counts"] = row_counts(swept)
    curves, asked = sweep_curves(axes), asked_levels(rows)
    return page(
        "sweep.html.jinja",
        {
            "name": name,
            "kept": _kept(rows),
            "key_figures": list(_key_figures(facts)),
            "verdict": _verdict(swept, best, facts),
            "meeting": _meeting(swept),
            "axis_table": axis_table(axes),
            "pictures": _pictures(axes, swept, asked, plots),
            "named_by": curves.named_by if curves.legend else "",
            "unnamed": _unnamed(curves),
            "legend": [(Markup(symbol), words) for symbol, words in legend_entries(curves)],
            "asked": Markup(asked_symbol()) if asked else "",
            "rows": rows_table(axes, swept),
            "dimensions": dimension_tables(axes, swept),
            "findings": finding_table(rows),
            "version": __version__,
            "own_style": Markup(page_text("sweep.css")),
            "own_script": Markup(page_text("sweep.js")),
        },
    )


def _kept(rows: Sequence[Mapping[str, Any]]) -> bool:
    """Whether every designed row has dimensions that were given."""
    designs = [row["design"] for row in rows if row.get("design")]
    return bool(designs) and all(each["dimensions_given"] for each in designs)


def _key_figures(facts: Mapping[str, Any]) -> Iterator[tuple[str, Markup]]:
    for key, words in (
        ("rows", "rows"),
        ("designed", "designed"),
        ("refused", "refused"),
        ("lost", "lost"),
        ("meets", "meet the brief"),
    ):
        yield words, figure(facts, f"counts.{key}", "count")


def _verdict(swept: Sequence[SweptRow], best: SweptRow | None, facts: Mapping[str, Any]) -> Mapping[str, Any]:
    """Tone, headline and the sentence on the best row."""
    if best is None:
        designed = facts["counts"]["designed"]
        headline = "Nothing is predicted for any row" if designed else "No row gave a board"
        return {"tone": Tone.WARN if designed else Tone.BAD, "headline": headline, "row": None, "sentence": ""}
    settings = ", ".join(f"{key} {text}".replace(" ", NO_BREAK) for key, text in best.settings.items())
    told = {"row": best.number, "settings": settings, "sentence": verdict(facts).sentence}
    meeting = facts["counts"]["meets"]
    if not meeting:
        return told | {"tone": Tone.BAD, "headline": "No row meets the brief"}
    headline = f"{meeting} of {len(swept)} rows meet{'s' if meeting == 1 else ''} the brief, as predicted"
    return told | {"tone": Tone.GOOD, "headline": headline}


def _meeting(swept: Sequence[SweptRow]) -> str:
    """Which rows meet the brief, where that is no long list."""
    told = row_ranges(row.number for row in swept if row.result == MEETS)
    return told if told.count(",") < MOST_RANGES else "see the column result"


def _unnamed(curves: Curves) -> str:
    """What is said where curves share a look."""
    if len(curves.looks) == max(1, len(curves.legend)):
        return ""
    rest = " and ".join(axis.key for axis in (curves.others[1:] if curves.legend else curves.others))
    within = ": within a colour one" if curves.legend else ", one"
    return f"{len(curves.looks)} curves{within} for each setting of {rest}"


def _pictures(
    axes: Sequence[Axis], swept: Sequence[SweptRow], asked: Mapping[str, float], plots: Sequence[str]
) -> list[Picture]:
    table = [row.table for row in swept]
    there, curves, pictures = numeric_columns(table), sweep_curves(axes), []
    for column in dict.fromkeys((*MULTIPLES, *plots)):
        if column not in there:
            continue
        title, alt = plot_words(table, quantity(column), curves)
        drawn = Markup(inline_svg(sweep_plot(axes, table, column, asked.get(column)), column))
        pictures.append(Picture(column, f"picture-{column}", "plots", title, "", alt, drawn))
    return pictures

"""report.html: one self-contained page from the facts of a design, pictures, and the files of its pack.

The page knows nothing that is not in `page_facts`: it is put together from facts, tables, verdict and pictures, and
drawn by templates beside this module. No date and no path stands on it, so that it is the same twice.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator, Mapping
from functools import cache, partial
from pathlib import Path
from typing import Any

from jinja2 import Environment, FunctionLoader, StrictUndefined
from markupsafe import Markup

from planar.errors import HandoffError
from planar.report import spread_tables, tables
from planar.report.glossary import glossary
from planar.report.page_facts import page_facts
from planar.report.page_figures import figure, figure_range, known, quoted
from planar.report.page_files import page_text
from planar.report.page_palette import palette_css
from planar.report.page_pictures import Picture, laid_out, placed
from planar.report.verdict import verdict

SECTIONS: Mapping[str, str] = {
    "copper": "Copper as it is",
    "response": "What it does",
    "numbers": "Numbers",
    "safety": "Safety and law",
    "words": "In plain words",
}
"""Anchor -> title of the sections below the verdict."""
TABLES: tuple[Callable[[Mapping[str, Any]], tables.Table | None], ...] = (
    tables.prediction_table,
    spread_tables.yield_table,
    spread_tables.result_table,
    spread_tables.corner_table,
    tables.first_order_table,
    tables.dimension_table,
    tables.line_table,
    tables.layer_table,
    tables.layer_effect_table,
    tables.cut_table,
    tables.candidate_table,
    tables.finding_table,
)
"""Builders of the tables under Numbers."""
FOLDED = (spread_tables.quantity_table, spread_tables.unvaried_table)
"""Builders of those that are folded in."""


def report_page(
    facts: Mapping[str, Any],
    pictures: Mapping[str, str],
    files: Mapping[str, str],
    spread: Mapping[str, Any] | None = None,
    peak_gain_dbi: float | None = None,
) -> str:
    """The page of the design of `facts` (content of its design.json).

    `pictures` name -> SVG text, see pictures.toml; one that is missing is left out. `files` path in the pack ->
    SHA-256. `spread` is the content of a spread.json, None where none was computed; `peak_gain_dbi` the largest gain
    of the field data in dBi, where there is any. Raises `HandoffError` for a picture that cannot stand on the page.
    """
    told = page_facts(facts, spread, peak_gain_dbi)
    sections = _pictured(placed(pictures))
    shown = [name for name in SECTIONS if sections.get(name, True)]
    return page(
        "report.html.jinja",
        {
            "facts": told,
            "figure": partial(figure, told),
            "quoted": partial(quoted, told),
            "descriptor": _descriptor(told),
            "key_figures": list(_key_figures(told)),
            "verdict": verdict(told),
            "sections": {name: {"title": SECTIONS[name], "number": i} for i, name in enumerate(shown, 1)},
            "pictures": sections,
            "rows": laid_out(sections["response"]),
            "both_sides": {"board_top", "board_bottom"} <= set(pictures),
            "tables": [made for made in (build(told) for build in TABLES) if made is not None],
            "folded_tables": [made for made in (build(told) for build in FOLDED) if made is not None],
            "listed_tables": (tables.source_table(told), tables.file_table(files)),
            "power_table": tables.power_table(told),
            "limit_table": tables.limit_table(told),
            "glossary": glossary(),
        },
    )


def page(template: str, context: Mapping[str, Any]) -> str:
    """The page a `template` of this package makes of `context`, style and script in it."""
    frame = {"style": Markup(palette_css() + page_text("page.css")), "script": Markup(page_text("page.js"))}
    return _templates().get_template(template).render({**context, **frame})


def write_report(text: str, path: Path) -> None:
    """Write a page. Raises `HandoffError` when it cannot be written."""
    try:
        path.write_bytes(text.encode("utf-8"))
    except OSError as error:
        raise HandoffError(f"cannot write {path}: {error.strerror}") from error


@cache
def _templates() -> Environment:
    return Environment(
        loader=FunctionLoader(page_text),
        autoescape=True,
        undefined=StrictUndefined,
        trim_blocks=True,
        lstrip_blocks=True,
    )


def _pictured(shown: tuple[Picture, ...]) -> dict[str, list[Picture]]:
    """Section -> its pictures; no pictures, no section."""
    return {name: [each for each in shown if each.section == name] for name in ("copper", "response")}


def _descriptor(told: Mapping[str, Any]) -> Markup:
    """The antenna in one line: family, shape, polarisation, laminate."""
    end = f", line ending {'in a via' if told['end'] == 'via' else 'open'}" if told["end"] else ""
    core = next((i for i, layer in enumerate(told["layers"]) if layer["kind"] == "dielectric"), None)
    on = Markup(" on {}").format(quoted(told, f"layers.{core}.material")) if core is not None else ""
    use = "transmitting and receiving" if told["target"]["transmit"] else "receiving only"
    return Markup("{} loop, {}{}; {} polarisation, {}{}.").format(
        told["family"].capitalize(), told["shape"], end, told["polarisation"].replace("-", " "), use, on
    )


def _key_figures(told: Mapping[str, Any]) -> Iterator[tuple[str, Markup]]:
    """The five or six numbers a reader looks for first."""
    yield "band", figure_range(told, ("band_hz.0", "band_hz.1"), "asked_mhz")
    if told["prediction"] is not None:
        yield "worst reflection in it", figure(told, "prediction.worst_reflection_db", "db")
        yield "gain toward the top", figure(told, "prediction.gain_dbi", "dbi")
        if known(told, "prediction.worst_axial_ratio_db"):
            yield "axial ratio at worst", figure(told, "prediction.worst_axial_ratio_db", "db2")
        yield "efficiency", figure(told, "prediction.efficiency", "percent0")
        if told["spread"] is not None:
            yield "boards that meet it", figure(told, "spread.yield.total", "percent2")
    elif known(told, "first_order.bare_loop_frequency_hz"):
        yield "bare loop by formulas", figure(told, "first_order.bare_loop_frequency_hz", "mhz")
        yield "expected error", figure(told, "first_order.expected_frequency_error", "percent0")
    yield "board", tables.sides(told, "board_mm")

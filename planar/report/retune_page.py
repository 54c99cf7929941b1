"""retune.html: what a measured board says and what to change, from the facts of its retune.json and of its design.

In the order in which it is needed: what happened, what to cut now, what to draw next, the curves it rests on, what was
inferred and what cannot be told apart, what was not advised, what was assumed. The same facts give the same page.
"""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from typing import Any

from markupsafe import Markup

from planar import __version__
from planar.report.page import page
from planar.report.page_figures import FORMS, bare_figure, figure, figure_range, quoted
from planar.report.page_pictures import Picture, inline_svg
from planar.report.retune_console import CAUTION, UNIT_ENDS
from planar.report.tables import Cell, Row, Table, finding_table, table
from planar.report.verdict import Tone

Facts = Mapping[str, Any]
SURE = 0.95
"""Confidence that the brief is met from which on a board may stay as it is."""
TRIM = ("trim.pdf", "trim.svg")
"""Names of the drawing of the cut beside the page."""
NEXT = "next.toml"
"""Name of the corrected brief beside the page."""
SHIFT = "signed_percent2"
WORDS: Mapping[str, tuple[str, str]] = {
    "board": (
        "Measured over predicted",
        "Reflection of the board itself, what lies in front of it taken off. Where the dotted line follows the "
        "measured curve, the board is understood; the next spin should follow the dashed line, what was designed.",
    ),
    "chart": (
        "The same on a reflection chart",
        "In and near the band; the trade calls it a Smith chart. The middle is a perfect match, inside the dashed "
        "circle the brief is met.",
    ),
    "seen": (
        "As the instrument saw it",
        "With the line and launch in front. Below, what is left between measurement and model, as a reflection: "
        "it should be noise alone, without a wave in it.",
    ),
}
"""Name of a picture -> its title and caption."""


def retune_page(facts: Facts, design_facts: Facts, pictures: Mapping[str, str]) -> str:
    """The page of a retuned board.

    `facts` are the content of its retune.json, `design_facts` that of the design's design.json, `pictures` name -> SVG
    text as `retune_pictures` gives them. Raises `HandoffError` for a picture that cannot stand on a page.
    """
    told = dict(facts) | {"target": design_facts["target"], "band_hz": design_facts["band_hz"]}
    return page(
        "retune.html.jinja",
        {
            "name": quoted(told, "name"),
            "key_figures": _key_figures(told),
            "verdict": _verdict(told),
            "happened": _happened(told),
            "board": _outlook(told, "board"),
            "caution": CAUTION,
            "stays": bool(told["cut_now"]) and told["board"]["confidence"] >= SURE,
            "first_cut": _first_cut(told),
            "cuts": cut_table(told),
            "trim": TRIM,
            "no_cut": _no_cut(told),
            "next_file": NEXT,
            "moves": move_table(told),
            "next_outlook": _outlook(told, "next_spin.0.outlook"),
            "next_what": quoted(told, "next_spin.0.what"),
            "other_spins": spin_table(told),
            "pictures": [_picture(name, pictures[name]) for name in WORDS if name in pictures],
            "told": [quoted(told, f"told.{i}") for i in range(len(told["told"]))],
            "values": value_table(told),
            "refused": refused_table(told),
            "measurement": _measurement(told),
            "assumed": [quoted(told, f"measurement.assumed.{i}") for i in range(len(told["measurement"]["assumed"]))],
            "findings": finding_table(told),
            "version": __version__,
        },
    )


def _key_figures(told: Facts) -> list[tuple[str, Markup]]:
    return [
        ("response off the design", figure(told, "shift", SHIFT)),
        ("95 % interval", _interval(told)),
        ("worst reflection as it is", figure(told, "board.worst_reflection_db", "db")),
        ("sure to meet the brief", figure(told, "board.confidence", "percent0")),
        ("band", figure_range(told, ("band_hz.0", "band_hz.1"), "asked_mhz")),
    ]


def _interval(told: Facts) -> Markup:
    return figure_range(told, ("shift_interval_95.0", "shift_interval_95.1"), SHIFT)


def _verdict(told: Facts) -> Mapping[str, Any]:
    """Tone and headline: whether the board may stay, and which way it is off."""
    met = told["board"]["confidence"] >= SURE
    if not told["sure"]:
        headline = "On which side of the design the board lies is not told"
        return {"tone": Tone.GOOD if met else Tone.WARN, "headline": f"{headline}{', but it meets the brief' * met}"}
    way = "high" if told["shift"] > 0.0 else "low"
    off = FORMS["percent2"].written(abs(told["shift"]))
    verdict = "it meets the brief all the same" if met else "it is not sure to meet the brief"
    return {"tone": Tone.GOOD if met else Tone.BAD, "headline": f"The board came out {off} % {way}; {verdict}"}


def _happened(told: Facts) -> Markup:
    """What happened, in one sentence."""
    said = Markup("The response lies {} from where it was designed (95 %: {})").format(
        figure(told, "shift", SHIFT), _interval(told)
    )
    if told["surroundings"]:
        said += Markup("; the board was measured so, it seems: {}").format(quoted(told, "surroundings"))
    return said + "."


def _outlook(told: Facts, key: str) -> Markup:
    """An outlook in words with numbers."""
    value = told
    for part in key.split("."):
        value = value[int(part)] if isinstance(value, Sequence) else value[part]
    parts = [Markup("response {} from the design").format(figure(told, f"{key}.shift", SHIFT))]
    if value["best_match_hz"] is not None:
        parts.append(Markup("best match at {}").format(figure(told, f"{key}.best_match_hz", "mhz")))
    worst, asked = figure(told, f"{key}.worst_reflection_db", "db"), figure(told, "target.match_db", "asked_db")
    parts.append(Markup("{} at worst in the band where {} is asked").format(worst, asked))
    if value["matched_band_hz"] is not None:
        ends = (f"{key}.matched_band_hz.0", f"{key}.matched_band_hz.1")
        parts.append(Markup("matched from {}").format(figure_range(told, ends, "mhz")))
    if value["worst_axial_ratio_db"] is not None:
        parts.append(Markup("axial ratio {} at worst").format(figure(told, f"{key}.worst_axial_ratio_db", "db2")))
    met = Markup("the brief is met with {} confidence").format(figure(told, f"{key}.confidence", "percent0"))
    return Markup("{}; {}").format(Markup(", ").join(parts), met)


def _short(told: Facts, key: str) -> Markup:
    """An outlook in a cell of a table."""
    return Markup("{}, {}, {}").format(
        figure(told, f"{key}.shift", SHIFT),
        figure(told, f"{key}.worst_reflection_db", "db"),
        figure(told, f"{key}.confidence", "percent0"),
    )


def _first_cut(told: Facts) -> Markup:
    """What to do first; empty where nothing is to be cut."""
    if not told["cut_now"]:
        return Markup("")
    what = quoted(told, "cut_now.0.what")
    if told["cut_now"][0]["first_cut_mm"] is None:
        return Markup("Cut first: <strong>{}</strong>. That is the first step of cutting: {}.").format(
            quoted(told, "cut_now.0.begin_with"), what
        )
    return Markup("Cut first <strong>{}</strong> off: {}. The whole cut would be {}.").format(
        figure(told, "cut_now.0.first_cut_mm", "mm3"), what, figure(told, "cut_now.0.whole_cut_mm", "mm3")
    )


def _no_cut(told: Facts) -> Markup:
    """Why nothing is to be cut: the last reason, which holds for all of it."""
    reasons = [i for i, each in enumerate(told["not_advised"]) if each["what"] in ("anything", "cutting")]
    if told["cut_now"] or not reasons:
        return Markup("")
    return Markup("Cut nothing: {}.").format(quoted(told, f"not_advised.{reasons[-1]}.why"))


def cut_table(told: Facts) -> Table | None:
    """Ways to cut, the best first."""
    rows = [_cut_row(told, f"cut_now.{i}", each) for i, each in enumerate(told["cut_now"])]
    heads = ("way to cut", "cut first", "in all #", "at most #", "after the first cut", "after all of it")
    note = (
        "Choose one way: they do not add up. After a cut: how far the response lies from the design, the worst "
        "reflection in the band, the confidence that the brief is met."
    )
    return table("Ways to cut, the best first", heads, rows, note)


def _cut_row(told: Facts, at: str, cut: Facts) -> Row:
    tabs = cut["whole_cut_mm"] is None
    lengths: list[Cell] = [
        "" if tabs else figure(told, f"{at}.{key}", "mm3") for key in ("first_cut_mm", "whole_cut_mm", "most_mm")
    ]
    first = quoted(told, f"{at}.begin_with") if tabs else lengths[0]
    after = (_short(told, f"{at}.{key}") for key in ("after_first", "after_whole"))
    return (quoted(told, f"{at}.what"), first, *lengths[1:], *after)


def move_table(told: Facts) -> Table | None:
    """What the next spin advised changes."""
    rows: list[Row] = [
        (
            Markup("<code>{}</code>").format(name),
            figure(told, f"next_spin.0.moves_mm.{name}.0", "mm3"),
            figure(told, f"next_spin.0.moves_mm.{name}.1", "mm3"),
        )
        for name in told["next_spin"][0]["moves_mm"]
    ]
    return table("What moves", ("dimension", "from #", "to #"), rows)


def spin_table(told: Facts) -> Table | None:
    """The other ways to draw the board anew."""
    rows: list[Row] = []
    for i, way in enumerate(told["next_spin"][1:], 1):
        moves = [
            Markup("<code>{}</code> to {}").format(name, figure(told, f"next_spin.{i}.moves_mm.{name}.1", "mm3"))
            for name in way["moves_mm"]
        ]
        after = (
            figure(told, f"next_spin.{i}.outlook.{key}", form)
            for key, form in (("shift", SHIFT), ("worst_reflection_db", "db"), ("confidence", "percent0"))
        )
        rows.append((quoted(told, f"next_spin.{i}.what"), Markup(", ").join(moves), *after))
    heads = ("what moves", "to", "response then #", "worst in the band #", "sure to meet the brief #")
    return table("Other ways to draw it", heads, rows)


def value_table(told: Facts) -> Table | None:
    """Every inferred quantity with its interval."""
    rows = [_value_row(told, f"values.{i}", each) for i, each in enumerate(told["values"])]
    heads = ("quantity", "designed #", "found #", "95 % from #", "to #", "unit", "moves the response #", "remark")
    note = (
        "Told by itself: the measurement says what it is. Where that does not stand, the value is little more than "
        "what was expected before measuring; it may be wrong though the sum of all is right."
    )
    return table("What was inferred", heads, rows, note)


def _value_row(told: Facts, at: str, value: Facts) -> Row:
    end = next(end for end in UNIT_ENDS if f"value{end}" in value)
    form = _form(0.5 * (value[f"high_95{end}"] - value[f"low_95{end}"]))
    numbers = (bare_figure(told, f"{at}.{name}{end}", form) for name in ("nominal", "value", "low_95", "high_95"))
    words = ["told by itself"] if value["told"] else []
    if value["outside_tolerance"]:
        words.append(Markup("<strong>outside its tolerance</strong>"))
    moves = figure(told, f"{at}.shift", SHIFT) if value["shift"] else ""
    return (quoted(told, f"{at}.name"), *numbers, UNIT_ENDS[end], moves, Markup(", ").join(words))


def _form(half: float) -> str:
    """The form with as many decimals as give half an interval two digits."""
    decimals = 0 if half <= 0.0 else min(4, max(0, 1 - math.floor(math.log10(half))))
    return ("count", "bare1", "bare2", "bare3", "bare4")[decimals]


def refused_table(told: Facts) -> Table | None:
    """What is not advised, and why."""
    rows: list[Row] = [
        (quoted(told, f"not_advised.{i}.what"), quoted(told, f"not_advised.{i}.why"))
        for i in range(len(told["not_advised"]))
    ]
    return table("Not advised", ("what", "why not"), rows)


def _measurement(told: Facts) -> Markup:
    """The measurement in one sentence."""
    said = Markup("{} points from {} against {}, noise {} of full reflection; the model leaves {} rms").format(
        figure(told, "measurement.points", "count"),
        figure_range(told, ("measurement.from_hz", "measurement.to_hz"), "mhz"),
        figure(told, "measurement.reference_ohm", "asked_ohm"),
        figure(told, "measurement.noise", "bare4"),
        figure(told, "residual_rms", "bare4"),
    )
    if told["measurement"]["sweeps_differ_by"] is None:
        return said + "."
    differ = figure(told, "measurement.sweeps_differ_by", "bare3")
    return said + Markup("; a second sweep with the cable held differently differs by {}.").format(differ)


def _picture(name: str, drawn: str) -> Picture:
    title, caption = WORDS[name]
    return Picture(name, f"picture-{name}", "curves", title, caption, title, Markup(inline_svg(drawn, name)))

"""The verdict of the page: whether the brief is met, by how much, and what to check before ordering.

Said from the predicted numbers against the brief's. Without a prediction there is no verdict, and that is said.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from enum import StrEnum
from typing import Any

from markupsafe import Markup

from planar.report.page_figures import figure, figure_range, known, quoted

Facts = Mapping[str, Any]


class Tone(StrEnum):
    """How a verdict sounds; the page says it in words and by a mark, the colour only repeats it."""

    GOOD = "good"
    WARN = "warn"
    BAD = "bad"


@dataclass(frozen=True)
class Check:
    """One thing to look at before ordering; `raised` by a finding of this design."""

    text: Markup
    raised: bool = False


@dataclass(frozen=True)
class Verdict:
    """A `headline`, the `sentence` with the margins, what is said of tolerances, and what to check before ordering."""

    tone: Tone
    headline: str
    sentence: Markup
    tolerance: Markup
    checks: tuple[Check, ...]


def verdict(facts: Facts) -> Verdict:
    """The verdict on the facts of the page."""
    checks = (*(Check(w, True) for w in _warnings(facts)), *(Check(text) for text in _before_ordering(facts)))
    if facts["prediction"] is None:
        sentence = Markup("Nothing is predicted for this board: {}").format(quoted(facts, "status"))
        return Verdict(Tone.WARN, "Not judged", sentence, Markup(""), checks)
    missed = [*_missed(facts)]
    if missed:
        sentence = Markup("{}. {}.").format(_match(facts), Markup("; ").join(missed))
        return Verdict(Tone.BAD, "Misses the brief", sentence, _tolerance(facts), checks)
    sentence = Markup("{}{}{}.").format(_match(facts), _margin(facts), _axial(facts))
    if facts["spread"] is not None and facts["spread"]["yield"]["total"] < 0.5:
        headline = "Meets the brief as designed, but most made boards will not"
        return Verdict(Tone.WARN, headline, sentence, _tolerance(facts), checks)
    return Verdict(Tone.GOOD, "Meets the brief, as predicted", sentence, _tolerance(facts), checks)


def _match(facts: Facts) -> Markup:
    return Markup("From {} the worst reflection is {} where {} is asked").format(
        figure_range(facts, ("band_hz.0", "band_hz.1"), "asked_mhz"),
        figure(facts, "prediction.worst_reflection_db", "db"),
        figure(facts, "target.match_db", "asked_db"),
    )


def _margin(facts: Facts) -> Markup:
    spare = figure(facts, "derived.spare_db", "db")
    if not known(facts, "prediction.margin_hz"):
        return Markup(": {} to spare").format(spare)
    below, above = (figure(facts, f"prediction.margin_hz.{side}", "mhz") for side in (0, 1))
    told = Markup(": {} to spare, and the match goes on for {} below and {} above the band").format(spare, below, above)
    if not facts["derived"]["beyond_trusted"]:
        return told
    span = figure_range(facts, ("prediction.trusted_hz.0", "prediction.trusted_hz.1"), "mhz")
    return Markup("{} (it ends outside the finely solved {})").format(told, span)


def _axial(facts: Facts) -> Markup:
    if not known(facts, "prediction.worst_axial_ratio_db"):
        return Markup("")
    return Markup(". The axial ratio is {} at worst where {} counts as circular, sense {} toward the top").format(
        figure(facts, "prediction.worst_axial_ratio_db", "db2"),
        figure(facts, "target.axial_ratio_db", "asked_db"),
        quoted(facts, "prediction.sense"),
    )


def _missed(facts: Facts) -> Iterator[Markup]:
    """What of the brief's target is missed, in words with numbers."""
    if facts["derived"]["spare_db"] < 0.0:
        yield Markup("The match misses by {}").format(figure(facts, "derived.spare_db", "lacking_db"))
    if known(facts, "derived.axial_ratio_spare_db") and facts["derived"]["axial_ratio_spare_db"] < 0.0:
        worst = figure(facts, "prediction.worst_axial_ratio_db", "db2")
        yield Markup("The axial ratio is {} at worst where {} counts as circular").format(
            worst, figure(facts, "target.axial_ratio_db", "asked_db")
        )
    if not facts["polarisation"].endswith(facts["prediction"]["sense"]):
        yield Markup("The sense toward the top is {}, not {}").format(
            quoted(facts, "prediction.sense"), quoted(facts, "polarisation")
        )


def _tolerance(facts: Facts) -> Markup:
    """Yield where it was computed, else what the formulas say of the most fragile line."""
    if facts["spread"] is not None:
        return _yield(facts)
    told = Markup(
        "These are the figures of the board as designed; yield is not computed here, <code>planar spread</code> does "
        "that."
    )
    lines = facts["lines"]
    if not lines:
        return told
    worst = max(range(len(lines)), key=lambda i: lines[i]["tolerance_ohm"] / lines[i]["impedance_ohm"])
    return Markup(
        "{} Tolerances: by formula spread, the most fragile line is <code>{}</code>, {} \N{PLUS-MINUS SIGN}{}; see "
        '<a href="#numbers">Dimensions and Lines</a>.'
    ).format(
        told,
        lines[worst]["name"],
        figure(facts, f"lines.{worst}.impedance_ohm", "ohm"),
        figure(facts, f"lines.{worst}.tolerance_ohm", "ohm"),
    )


def _yield(facts: Facts) -> Markup:
    told = Markup("Of {} boards drawn at random within the tolerances {} meet it").format(
        figure(facts, "spread.samples", "count"), figure(facts, "spread.yield.total", "percent2")
    )
    sure, errs = (
        figure_range(facts, (f"spread.yield.{key}.0", f"spread.yield.{key}.1"), "percent2")
        for key in ("total_95_percent", "total_if_model_errs")
    )
    told += Markup(" ({} as an interval of 95 % for so many draws; {} if their model errs)").format(sure, errs)
    contributors = facts["spread"]["contributors"]
    if not contributors or contributors[0]["match_share"] <= 0.0:
        return told + Markup(".")
    first = max(range(len(contributors)), key=lambda i: contributors[i]["match_share"])
    return told + Markup(". The largest part of the scatter of the match, {}, is made by {}.").format(
        figure(facts, f"spread.contributors.{first}.match_share", "percent0"),
        quoted(facts, f"spread.contributors.{first}.name"),
    )


def _warnings(facts: Facts) -> Iterator[Markup]:
    for i, each in enumerate(facts["findings"]):
        if each["severity"] != "warn":
            continue
        at = f"findings.{i}"
        rule, where, got, limit = (quoted(facts, f"{at}.{key}") for key in ("rule", "where", "got", "limit"))
        told = Markup("<strong>{}</strong> ({}): {}; limit {}").format(rule, where, got, limit)
        advice = Markup("; {}").format(quoted(facts, f"{at}.advice")) if each["advice"] else ""
        yield Markup("{}{}.").format(told, advice)


def _before_ordering(facts: Facts) -> Iterator[Markup]:
    """What no computation can know, so a person must look."""
    yield from _laminate(facts)
    yield Markup(
        "<strong>Fab.</strong> Send the fabrication folder as it is: artwork 1:1, the fab applies its own etch "
        "compensation and changes nothing inside the keepout."
    )
    if facts["dc_short"]:
        yield Markup("<strong>DC short.</strong> 0 ohm between feed and ground is intended; do not open the loop.")
    surroundings = facts["brief"].get("surroundings") or {}
    if surroundings:
        yield Markup(
            "<strong>Surroundings.</strong> Solved with {} as in the brief: check the real distances. Anything else "
            "near, metal above all, moves the frequency."
        ).format(" and ".join(sorted(surroundings)))
    else:
        yield Markup(
            "<strong>Surroundings.</strong> Solved with nothing near: a housing, metal or a hand moves the frequency. "
            "A cover belongs in the brief."
        )
    if facts["target"]["transmit"]:
        yield Markup(
            '<strong>Transmitting.</strong> See <a href="#safety">Safety and law</a>: distance, e.r.p. and e.i.r.p.'
        )
    yield Markup("<strong>First board.</strong> Build one and measure it at the reference plane before more.")


def _laminate(facts: Facts) -> Iterator[Markup]:
    for i, layer in enumerate(facts["layers"]):
        if layer["kind"] == "dielectric":
            yield Markup(
                "<strong>Laminate.</strong> Compare with its data sheet: permittivity {} \N{PLUS-MINUS SIGN}{}, {} "
                "\N{PLUS-MINUS SIGN}{} thick, as assumed here."
            ).format(
                figure(facts, f"layers.{i}.eps_r", "bare3"),
                figure(facts, f"layers.{i}.eps_r_tolerance", "percent0"),
                figure(facts, f"layers.{i}.thickness_mm", "mm3"),
                figure(facts, f"layers.{i}.thickness_tolerance", "percent0"),
            )

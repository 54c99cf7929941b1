"""Designs side by side: a row a quantity, a column a design, the best of a row named in words."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace
from typing import Any

from markupsafe import Markup

from planar import __version__
from planar.report.page import page
from planar.report.page_facts import page_facts
from planar.report.page_figures import fact, figure, figure_range
from planar.report.page_pictures import NARROW, Picture, placed
from planar.report.tables import Cell, Quantity, quantities, sides
from planar.report.verdict import Verdict, verdict


@dataclass(frozen=True)
class Design:
    """A column: the name, what antenna it is, its verdict."""

    name: str
    antenna: str
    verdict: Verdict


@dataclass(frozen=True)
class Group:
    """The same picture of several designs, with its `title` and `caption`."""

    title: str
    caption: str
    pictures: tuple[Picture, ...]


@dataclass(frozen=True)
class Told:
    """A cell, and whether it is the best of its row."""

    told: Cell
    best: bool = False


@dataclass(frozen=True)
class Row:
    """A quantity of all designs."""

    label: str
    cells: tuple[Told, ...]


def compare_page(designs: Sequence[Mapping[str, Any]], pictures: Sequence[Mapping[str, str]]) -> str:
    """The page that holds `designs` (contents of design.json files) against each other, with the `pictures` of each.

    Facts of the second design stand under the key `1.`, and so on. Raises `ValueError` unless there are as many
    pictures' mappings as designs, and `HandoffError` for a picture that cannot stand on the page.
    """
    told = [page_facts(facts) for facts in designs]
    numbered = {str(i): each for i, each in enumerate(told)}
    rows = [
        Row("band asked", tuple(Told(_band(numbered, i)) for i in range(len(told)))),
        Row("match asked", tuple(Told(figure(numbered, f"{i}.target.match_db", "asked_db")) for i in range(len(told)))),
    ]
    rows += [Row("board", tuple(Told(sides(numbered, f"{i}.board_mm")) for i in range(len(told))))]
    rows += [row for row in (_row(each, numbered, len(told)) for each in quantities()) if row is not None]
    columns = [Design(each["name"], _antenna(each), verdict(each)) for each in told]
    context = {"columns": columns, "rows": rows, "pictures": _pictures(told, pictures), "version": __version__}
    return page("compare.html.jinja", context)


def _row(quantity: Quantity, numbered: Mapping[str, Any], count: int) -> Row | None:
    """A quantity of every design, None where no design has it."""
    each = [replace(quantity, keys=tuple(f"{i}.{key}" for key in quantity.keys)) for i in range(count)]
    told = [one.told(numbered) for one in each]
    if all(cell is None for cell in told):
        return None
    values = {i: fact(numbered, each[i].keys[0]) for i in range(count) if told[i] is not None}
    best = _best(values, quantity.better)
    return Row(quantity.label, tuple(Told(cell or Markup("&ndash;"), i in best) for i, cell in enumerate(told)))


def _best(values: Mapping[int, Any], better: str) -> set[int]:
    """Places of the best value; nothing is best alone, or where no end is the better one."""
    if not better or len(values) < 2:
        return set()
    wanted = (max if better == "high" else min)(values.values())
    return {i for i, value in values.items() if value == wanted}


def _band(numbered: Mapping[str, Any], i: int) -> Markup:
    return figure_range(numbered, (f"{i}.band_hz.0", f"{i}.band_hz.1"), "asked_mhz")


def _antenna(facts: Mapping[str, Any]) -> str:
    parts = (facts["family"], facts["end"] and f"end {facts['end']}", facts["shape"], facts["polarisation"])
    return ", ".join(part for part in parts if part)


def _pictures(told: Sequence[Mapping[str, Any]], pictures: Sequence[Mapping[str, str]]) -> list[Group]:
    """Each picture of every design which has it, called after the design; the narrow one where there is one."""
    titles: dict[str, str] = {}
    groups: dict[str, list[Picture]] = {}
    for i, (facts, own) in enumerate(zip(told, pictures, strict=True)):
        shown = {name: text for name, text in own.items() if name + NARROW not in own}
        for each in placed(shown, f"design-{i}-"):
            alt = f"{facts['name']}: {each.alt}"
            named = replace(each, title=facts["name"], caption="", alt=alt, wide=False, half=False, screen="")
            titles.setdefault(each.title, each.caption)
            groups.setdefault(each.title, []).append(named)
    return [Group(title, caption, tuple(groups[title])) for title, caption in titles.items()]

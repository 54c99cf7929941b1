"""The page of a brief that was refused: why, what was missed, what would work, and the brief itself."""

from __future__ import annotations

import re
from collections.abc import Mapping
from typing import Any

from markupsafe import Markup

from planar import __version__
from planar.report.page import page
from planar.report.page_figures import quoted
from planar.report.tables import Row, Table, table

_NAME = re.compile(r'^\s*name\s*=\s*"([^"]*)"', re.MULTILINE)
FAULTY = "The file cannot be read as a brief: every fault is listed below."


def refusal_page(error_facts: Mapping[str, Any], brief_text: str) -> str:
    """The page of a refusal: `error_facts` as `PlanarError.facts()` gives them, `brief_text` the TOML as it was given
    (empty where there is none to show)."""
    found = _NAME.search(brief_text)
    name = found[1] if found else "brief"
    reason = str(error_facts.get("reason", FAULTY if error_facts.get("faults") else "No reason is given."))
    return page(
        "refusal.html.jinja",
        {
            "name": name,
            "reason": [_plain(line, name) for line in reason.splitlines()],
            "first": _first(error_facts),
            "changes": error_facts.get("nearest_changes", ()),
            "table": _missed(error_facts),
            "brief": brief_text,
            "version": __version__,
        },
    )


def _plain(line: str, name: str) -> str:
    """A line of the reason without the path and the name in front of it, which the page shows elsewhere."""
    _, found, rest = line.partition(f"{name}: ")
    told = (rest if found else line).strip().rstrip(":.")
    return f"{told[:1].upper()}{told[1:]}."


def _first(error_facts: Mapping[str, Any]) -> Markup:
    """The first rule missed in a sentence, nothing where there is none."""
    findings = error_facts.get("findings", ())
    i = next((i for i, each in enumerate(findings) if each["severity"] == "refuse"), None)
    if i is None:
        return Markup("")
    told = (quoted(error_facts, f"findings.{i}.{key}") for key in ("rule", "got", "limit"))
    return Markup("What stands in the way first, {}: {}, where the limit is {}.").format(*told)


def _missed(error_facts: Mapping[str, Any]) -> Table | None:
    """The rules missed, or the faults of the file."""
    if error_facts.get("faults"):
        faults = _rows(error_facts, "faults", ("key", "value", "expected"))
        return table("Faults", ("key", "value", "what would be right"), faults)
    keys = ("rule", "where", "got", "limit", "advice")
    return table(
        "What stands in the way", ("rule", "at", "got", "limit", "advice"), _rows(error_facts, "findings", keys)
    )


def _rows(error_facts: Mapping[str, Any], group: str, keys: tuple[str, ...]) -> list[Row]:
    entries = error_facts.get(group, ())
    return [
        tuple(quoted(error_facts, f"{group}.{i}.{key}") if entry[key] else "" for key in keys)
        for i, entry in enumerate(entries)
    ]

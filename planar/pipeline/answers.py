"""Answers that need no design: line widths, what the library holds."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from typing import Any

from planar.design.line_question import LineQuestion, answer
from planar.design.line_table import LineRow
from planar.library import KINDS, Library
from planar.library.reading import parse


def lines(question: LineQuestion, library: Library) -> list[LineRow]:
    """Rows of line widths for `question`. Raises `BriefError` with all faults of the options, and `LibraryError`."""
    return answer(question, library)


def library_entries(library: Library, kind: str | None = None) -> dict[str, list[dict[str, str]]]:
    """Key, title and file of every entry, by kind; of one `kind` only when it is given."""
    return {
        each: [_entry_head(library, each, key) for key in library.keys(each)]
        for each in ([kind] if kind is not None else KINDS)
    }


def library_entry(library: Library, kind: str, key: str) -> dict[str, Any]:
    """One entry with every value and the source beside it."""
    raw = parse(library.source(kind, key))
    values = {name: value for name, value in _sourced(raw, "") if name != "title"}
    return _entry_head(library, kind, key) | {"values": values}


def _sourced(table: Mapping[str, Any], above: str) -> Iterator[tuple[str, dict[str, Any]]]:
    """Dotted name, value and source of everything in `table`; the source is empty where the entry states none."""
    for name, value in table.items():
        path = f"{above}{name}"
        if not isinstance(value, dict):
            yield path, {"value": value, "source": ""}
        elif "source" in value:
            rest = {k: v for k, v in value.items() if k != "source"}
            yield path, {"value": rest.get("value", rest) if len(rest) == 1 else rest, "source": value["source"]}
        else:
            yield from _sourced(value, f"{path}.")


def _entry_head(library: Library, kind: str, key: str) -> dict[str, str]:
    path = library.source(kind, key)
    return {"key": key, "title": str(parse(path).get("title", "")), "file": str(path)}

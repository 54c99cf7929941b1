"""The words of the page in plain ones."""

from __future__ import annotations

from dataclasses import dataclass

from planar.report.page_files import page_table


@dataclass(frozen=True)
class Word:
    """A `term` of the trade and what it `means`."""

    term: str
    means: str


def glossary() -> tuple[Word, ...]:
    """Every word of glossary.toml, in its order."""
    return tuple(Word(**each) for each in page_table("glossary.toml")["word"])

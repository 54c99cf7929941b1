"""Small briefs, changed one table at a time, and the shipped library."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import pytest

from planar.brief import Brief, check_brief
from planar.library import Library

LIBRARY = Library.open()
WHERE = "small.toml"
MakeBrief = Callable[..., Brief]


@pytest.fixture(scope="session")
def library() -> Library:
    return LIBRARY


@pytest.fixture(scope="session")
def brief() -> MakeBrief:
    """Makes a brief for 880 to 920 MHz on 1.6 mm glass epoxy, with keys of its tables added or replaced."""

    def made(**tables: dict[str, Any]) -> Brief:
        data: dict[str, Any] = {
            "name": "small",
            "target": {"band": ["880 MHz", "920 MHz"]},
            "board": {"laminate": "fr4-general", "thickness": "1.6 mm"},
        }
        for table, keys in tables.items():
            data[table] = data.get(table, {}) | keys
        return check_brief(data, WHERE, LIBRARY)

    return made

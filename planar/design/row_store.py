"""Rows that were worked out before, in one small database file: the same row costs nothing the second time.

Each row is committed as it comes, so that a sweep that is killed goes on where it stopped. A file that is damaged or no
store is refused, never overwritten.
"""

from __future__ import annotations

import json
import sqlite3
from collections.abc import Iterator, Mapping
from contextlib import closing, contextmanager
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from planar.errors import HandoffError

_NAME = "rows"
_TABLE = f"CREATE TABLE IF NOT EXISTS {_NAME} (key TEXT PRIMARY KEY, facts TEXT NOT NULL)"
_WAIT = 60.0
"""s, two sweeps may share a store: how long one waits for the other to finish writing."""


@dataclass(frozen=True)
class RowStore:
    """An open store. Made by `row_store`."""

    connection: sqlite3.Connection

    def find(self, key: str) -> dict[str, Any] | None:
        """The facts kept under `key`."""
        found = self.connection.execute("SELECT facts FROM rows WHERE key = ?", (key,)).fetchone()
        try:
            return None if found is None else dict(json.loads(found[0]))
        except (TypeError, ValueError) as error:
            raise sqlite3.DatabaseError("a row in it cannot be read") from error

    def keep(self, key: str, facts: Mapping[str, Any]) -> None:
        """Keep `facts` under `key`, safe from then on."""
        with self.connection:
            self.connection.execute("INSERT OR REPLACE INTO rows VALUES (?, ?)", (key, json.dumps(facts)))


@contextmanager
def row_store(path: Path) -> Iterator[RowStore]:
    """The store in the file `path`, made when there is none. Raises `HandoffError` when that cannot be used as one."""
    try:
        path.parent.mkdir(parents=True, exist_ok=True)
    except OSError as error:
        raise HandoffError(f"cannot write into {path.parent}: {error.strerror}") from error
    try:
        with closing(sqlite3.connect(path, timeout=_WAIT)) as connection:
            tables = {name for (name,) in connection.execute("SELECT name FROM sqlite_master WHERE type = 'table'")}
            if tables and _NAME not in tables:
                raise sqlite3.DatabaseError("a database of something else")
            with connection:
                connection.execute(_TABLE)
            yield RowStore(connection)
    except sqlite3.Error as error:
        raise HandoffError(f"{path}: cannot be used to keep rows: {error}; name another file with --store") from error

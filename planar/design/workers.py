"""Work shared among processes, one for each core, each with one thread for its linear algebra.

Results do not depend on how many there are: the same function on the same items, in their order. Where there is one
core or processes cannot be started, the work is done here, one item after the other.
"""

from __future__ import annotations

import multiprocessing
import os
from collections.abc import Callable, Iterator, Sequence
from concurrent.futures import ProcessPoolExecutor
from contextlib import contextmanager
from dataclasses import dataclass
from typing import TypeVar

from threadpoolctl import threadpool_limits

Item = TypeVar("Item")
Result = TypeVar("Result")

MOST = 8
"""Processes: sizing has no more to do at once."""


@dataclass(frozen=True)
class Workers:
    """Processes to share work among; `pool` None works here."""

    pool: ProcessPoolExecutor | None

    def each(self, function: Callable[[Item], Result], items: Sequence[Item]) -> list[Result]:
        """`function`, a module's own, of every item."""
        if self.pool is None or len(items) < 2:
            return [function(item) for item in items]
        return list(self.pool.map(function, items))

    def beside(self, function: Callable[[Item], Result], item: Item) -> Callable[[], Result]:
        """Begin `function` of `item`; call what is returned for the result."""
        if self.pool is None:
            return lambda: function(item)
        return self.pool.submit(function, item).result


@contextmanager
def workers(count: int | None = None) -> Iterator[Workers]:
    """`Workers` on `count` processes, by default one for each core; linear algebra in one thread meanwhile."""
    processes = min(MOST, count or _cores())
    with threadpool_limits(1):
        if processes < 2:
            yield Workers(None)
            return
        method = "fork" if "fork" in multiprocessing.get_all_start_methods() else "spawn"
        with ProcessPoolExecutor(processes, multiprocessing.get_context(method), threadpool_limits, (1,)) as pool:
            yield Workers(pool)


def _cores() -> int:
    """Cores this process may use."""
    if hasattr(os, "sched_getaffinity"):
        return len(os.sched_getaffinity(0))
    return os.cpu_count() or 1

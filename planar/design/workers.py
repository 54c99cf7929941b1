"""Work shared among processes, one for each core, each with one thread for its linear algebra.

Results do not depend on how many there are: the same function on the same items, in their order. Where there is one
core, or processes cannot be started or die, the work is done here, one item after the other.
"""

from __future__ import annotations

import multiprocessing
import os
import signal
import sys
import threading
from collections.abc import Callable, Iterator, Sequence
from concurrent.futures import BrokenExecutor, ProcessPoolExecutor
from contextlib import contextmanager, suppress
from dataclasses import dataclass
from multiprocessing.connection import wait
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
        if self.pool is not None and len(items) > 1:
            with suppress(BrokenExecutor):
                return list(self.pool.map(function, items))
        return [function(item) for item in items]

    def beside(self, function: Callable[[Item], Result], item: Item) -> Callable[[], Result]:
        """Begin `function` of `item`; call what is returned for the result."""
        if self.pool is None:
            return lambda: function(item)
        begun = self.pool.submit(function, item)

        def result() -> Result:
            try:
                return begun.result()
            except BrokenExecutor:
                return function(item)

        return result


@contextmanager
def workers(count: int | None = None) -> Iterator[Workers]:
    """`Workers` on `count` processes, by default one for each core; linear algebra in one thread meanwhile."""
    inside = multiprocessing.parent_process() is not None  # one of many processes already: no more of them
    processes = 1 if inside else min(MOST, count or cores())
    with threadpool_limits(1):
        pool = process_pool(processes) if processes > 1 else None
        try:
            yield Workers(pool)
        finally:
            if pool is not None:
                pool.shutdown(cancel_futures=True)


def process_pool(processes: int) -> ProcessPoolExecutor | None:
    """Processes that are ready, each with one thread for its linear algebra; None where the system gives none."""
    # a forked process starts at once; from Python 3.12 on forking beside threads is warned of
    forking = sys.platform == "linux" and sys.version_info < (3, 12)
    method = "fork" if forking else "forkserver" if os.name == "posix" else "spawn"
    try:
        pool = ProcessPoolExecutor(processes, multiprocessing.get_context(method), _begin)
        pool.submit(cores).result()
    except (OSError, NotImplementedError, BrokenExecutor):
        return None
    return pool


def _begin() -> None:
    """In every process: one thread; an interrupt, which the parent gets too, ends it, and so does the parent's end."""
    threadpool_limits(1)
    signal.signal(signal.SIGINT, signal.SIG_DFL)
    parent = multiprocessing.parent_process()
    if parent is not None:
        threading.Thread(target=_end_with, args=(parent.sentinel,), daemon=True).start()


def _end_with(parent: int) -> None:
    """End this process when the one with the sentinel `parent` has ended, however that was: nobody else would."""
    wait([parent])
    os._exit(1)


def cores() -> int:
    """Cores this process may use."""
    if hasattr(os, "sched_getaffinity"):
        return len(os.sched_getaffinity(0))
    return os.cpu_count() or 1

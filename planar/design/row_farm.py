"""Who works on the rows of a sweep: this machine's processes, or the workers of a Dask cluster.

Both hand over (index, facts) as rows are done, in any order, and give the same facts: a row is worked out in one
process with one thread for its linear algebra, wherever that is. A process that dies takes its rows along; they are
given out again, once among others and once alone, before they are reported as lost.
"""

from __future__ import annotations

from collections import Counter, deque
from collections.abc import Callable, Generator, Sequence
from concurrent.futures import FIRST_COMPLETED, BrokenExecutor, Future, ProcessPoolExecutor, wait
from dataclasses import dataclass
from typing import Any

from threadpoolctl import threadpool_limits

from planar.design.sweep_rows import Task, lost_row, row_ground
from planar.design.workers import process_pool
from planar.errors import HandoffError, PlanarError
from planar.library import Library

Facts = dict[str, Any]
Worked = Callable[[Task], Facts]
"""What is done with a row: `sweep_rows.row_facts`, a function of a module so that other processes find it."""
DEATHS = 3
"""Times a row may take its process along before it is reported as lost; the last try is alone."""
_CONNECT = 20
"""s to wait for the scheduler of a cluster."""


def local_rows(work: Worked, tasks: Sequence[Task], *, processes: int) -> Generator[tuple[int, Facts], None, None]:
    """`work` of every task on `processes` processes of this machine."""
    if len(tasks) <= 1:  # a row alone may share its own work among processes
        yield from _rows_here(work, tasks)
        return
    waiting, suspects = deque(range(len(tasks))), deque[int]()
    deaths: Counter[int] = Counter()
    while waiting or suspects:
        count = processes if waiting else 1
        batch = waiting if waiting else deque([suspects.popleft()])
        pool = process_pool(count)
        if pool is None:
            for index, facts in _rows_here(work, [tasks[i] for i in batch]):
                yield batch[index], facts
            batch.clear()
            continue
        given = _Given(pool, count, [])
        try:
            yield from _rows_of(given, work, tasks, batch)
        except BrokenExecutor:
            for index in given.taken:
                deaths[index] += 1
                if deaths[index] == DEATHS:
                    yield index, lost_row(DEATHS)
                else:
                    (suspects if deaths[index] == DEATHS - 1 else waiting).append(index)
        finally:
            pool.shutdown(cancel_futures=True)


def _rows_here(work: Worked, tasks: Sequence[Task]) -> Generator[tuple[int, Facts], None, None]:
    for index, task in enumerate(tasks):
        with threadpool_limits(1):
            facts = work(task)
        yield index, facts


@dataclass
class _Given:
    """Rows given out: those not come back are in `taken`, no more than `most`, so that a death throws suspicion on
    few."""

    pool: ProcessPoolExecutor
    most: int
    taken: list[int]


def _rows_of(
    given: _Given, work: Worked, tasks: Sequence[Task], waiting: deque[int]
) -> Generator[tuple[int, Facts], None, None]:
    """Rows from `waiting` as the pool finishes them."""
    running: dict[Future[Facts], int] = {}
    while waiting or running:
        while waiting and len(running) < given.most:
            index = waiting.popleft()
            given.taken.append(index)
            running[given.pool.submit(work, tasks[index])] = index
        done, _ = wait(running, return_when=FIRST_COMPLETED)
        for future in done:
            facts = future.result()
            index = running.pop(future)
            given.taken.remove(index)
            yield index, facts


def cluster_rows(
    work: Worked, tasks: Sequence[Task], *, address: str, ground: str
) -> Generator[tuple[int, Facts], None, None]:
    """`work` of every task on the Dask cluster whose scheduler is at `address`.

    `ground` is the `row_ground` here: a worker with another version of planar or other files of the library would give
    other rows. Raises `HandoffError` for such a worker, and where Dask is not installed or the scheduler does not
    answer.
    """
    try:
        from dask.distributed import Client, as_completed
        from distributed.scheduler import KilledWorker
    except ImportError as error:
        raise HandoffError("--scheduler needs the extra `cluster`: pip install '.[cluster]' in the checkout") from error
    try:
        client = Client(address, timeout=_CONNECT, set_as_default=False)
    except (OSError, ValueError, TimeoutError) as error:
        raise HandoffError(f"no scheduler answers at {address}: {error}") from error
    with client:
        futures = client.map(_in_one_thread, [(work, task, ground) for task in tasks], pure=False, retries=0)
        places = {future.key: index for index, future in enumerate(futures)}
        for future in as_completed(futures, loop=client.loop):
            try:
                facts = future.result()
            except KilledWorker:
                facts = lost_row(DEATHS)
            except ImportError as error:
                raise HandoffError(f"a worker of the cluster lacks this version of planar: {error}") from error
            yield places[future.key], facts


def _in_one_thread(task: tuple[Worked, Task, str]) -> Facts:
    """A row on a worker of a cluster. Raises `HandoffError` where it would not be the row of the machine that asks."""
    work, row, ground = task
    _, _, folder = row
    try:
        here = row_ground(Library.open(folder))
    except PlanarError as error:
        raise HandoffError(f"a worker of the cluster lacks the library: {error}") from error
    if here != ground:
        raise HandoffError(
            "a worker of the cluster has another version of planar, or other files in its library, than this machine: "
            "make them the same"
        )
    with threadpool_limits(1):
        return work(row)

"""Rows of a sweep on processes: all come back, those of a process that dies too, or they are reported as lost."""

import os
import signal
import sqlite3
import subprocess
import sys
from contextlib import closing
from pathlib import Path
from typing import Any

import pytest

from planar.design.row_farm import _in_one_thread, cluster_rows, local_rows
from planar.design.row_store import row_store
from planar.design.sweep_rows import LOST, Task, row_columns, row_keys
from planar.errors import HandoffError
from planar.library import Library


def squared(task: Task) -> dict[str, Any]:
    return {"status": "designed", "value": task[0]["n"] ** 2}


def deadly_once(task: Task) -> dict[str, Any]:
    """Ends its process on the first try of a row marked so."""
    data, _, folder = task
    assert folder is not None
    mark = folder / str(data["n"])
    if data["n"] == 2 and not mark.exists():
        mark.touch()
        os._exit(9)
    return squared(task)


def deadly_always(task: Task) -> dict[str, Any]:
    if task[0]["n"] == 2:
        os._exit(9)
    return squared(task)


def tasks(folder: Path) -> list[Task]:
    return [({"n": n}, "brief", folder) for n in range(5)]


@pytest.mark.parametrize("processes", [1, 2])
def test_every_row_comes_back_once(processes: int, tmp_path: Path) -> None:
    done = dict(local_rows(squared, tasks(tmp_path), processes=processes))
    assert {index: facts["value"] for index, facts in done.items()} == {0: 0, 1: 1, 2: 4, 3: 9, 4: 16}


def test_a_process_that_dies_loses_nothing(tmp_path: Path) -> None:
    done = dict(local_rows(deadly_once, tasks(tmp_path), processes=2))
    assert {index: facts["value"] for index, facts in done.items()} == {0: 0, 1: 1, 2: 4, 3: 9, 4: 16}


def test_a_row_that_always_kills_is_reported_and_the_others_are_done(tmp_path: Path) -> None:
    done = dict(local_rows(deadly_always, tasks(tmp_path), processes=2))
    assert done.pop(2)["status"] == LOST
    assert {index: facts["value"] for index, facts in done.items()} == {0: 0, 1: 1, 3: 9, 4: 16}


@pytest.mark.skipif(sys.platform == "win32", reason="a process there has no parent to be asked for")
def test_processes_do_not_outlive_the_one_that_began_them() -> None:
    """Killed, it can tell them nothing; the pipe they share with it is then at its end."""
    script = (
        "import os\nfrom planar.design.workers import process_pool\npool = process_pool(2)\n"
        "list(pool.map(abs, range(8)))\nos.kill(os.getpid(), 9)"
    )
    done = subprocess.run([sys.executable, "-c", script], stdout=subprocess.PIPE, timeout=60, check=False)
    assert done.returncode == -signal.SIGKILL  # all that hold its output have ended, or the call would not return


def test_a_scheduler_that_does_not_answer_is_named(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr("planar.design.row_farm._CONNECT", 0.2)
    with pytest.raises(HandoffError, match=r"no scheduler answers at tcp://127\.0\.0\.1:9"):
        list(cluster_rows(squared, tasks(tmp_path), address="tcp://127.0.0.1:9", ground=""))


@pytest.mark.parametrize(("kept", "ground"), [(True, "another program"), (False, "")])
def test_a_worker_with_another_library_or_program_gives_no_row(kept: bool, ground: str, tmp_path: Path) -> None:
    """Its rows would be kept as those of this machine."""
    if kept:
        (tmp_path / "laminates").mkdir()
    with pytest.raises(HandoffError, match="a worker of the cluster"):
        _in_one_thread((squared, tasks(tmp_path)[0], ground))


def test_rows_are_found_again_after_a_store_is_closed(tmp_path: Path) -> None:
    path = tmp_path / "deep" / "rows.sqlite"
    with row_store(path) as store:
        assert store.find("a") is None
        store.keep("a", {"value": 1.5})
    with row_store(path) as store:
        assert store.find("a") == {"value": 1.5}


def test_a_file_that_is_no_store_is_refused_and_kept(tmp_path: Path) -> None:
    path = tmp_path / "notes.txt"
    path.write_text("my notes, not a database, long enough to be told apart " * 20)
    before = path.read_bytes()
    with pytest.raises(HandoffError, match="cannot be used to keep rows"), row_store(path) as store:
        store.keep("a", {})
    assert path.read_bytes() == before


def test_a_database_of_something_else_is_refused_and_kept(tmp_path: Path) -> None:
    path = tmp_path / "other.sqlite"
    with closing(sqlite3.connect(path)) as connection:
        connection.execute("CREATE TABLE letters (words TEXT)")
    before = path.read_bytes()
    with pytest.raises(HandoffError, match="something else"), row_store(path):
        pass
    assert path.read_bytes() == before


def test_what_goes_wrong_beside_a_store_is_not_blamed_on_it(tmp_path: Path) -> None:
    with pytest.raises(OSError, match="elsewhere"), row_store(tmp_path / "rows.sqlite"):
        raise OSError("elsewhere")


def test_a_row_depends_on_brief_and_library(tmp_path: Path) -> None:
    (tmp_path / "laminates").mkdir()
    shipped, own = Library.open(), Library.open(tmp_path)
    data = {"name": "x", "target": {"band": ["1 GHz", "1.1 GHz"]}, "board": {}}
    (key,) = row_keys([data], "x", shipped)
    (tmp_path / "notes.toml").write_text("no part of the library")
    assert row_keys([data], "x", own) == [key]
    assert row_keys([data | {"name": "y"}, data], "x", shipped)[1:] == [key]
    assert row_keys([data | {"name": "y"}], "x", shipped) != [key]
    (tmp_path / "laminates" / "mine.toml").write_text("title = 'mine'")
    assert row_keys([data], "x", own) != [key]


def test_columns_of_a_refused_row_say_why() -> None:
    columns = row_columns({"status": "refused", "reason": "too\n  large", "refused": {}})
    assert columns == {"status": "refused", "findings": "", "reason": "too large"}

"""`planar sweep` through the command: rows, files, what is known from before, a cluster, and what is refused.

Authority: a row is what `planar size --json` says of the same brief.
"""

from __future__ import annotations

import json
import warnings
from pathlib import Path

import pytest
from click.testing import Result

from planar.design.row_store import row_store
from tests.end_to_end.bench_loop import BRIEF, run

VARY = ("--vary", "board.thickness=0.8 mm,1.6 mm", "--vary", "make.fab=pool-two-layer")


@pytest.fixture(scope="module")
def swept(tmp_path_factory: pytest.TempPathFactory) -> tuple[Path, Path, Result]:
    """Brief, folder of outputs and what the sweep printed."""
    folder = tmp_path_factory.mktemp("a sweep")
    brief = folder / "brief.toml"
    brief.write_text(BRIEF, encoding="utf-8")
    result = run("sweep", brief, *VARY, "--outputs", folder / "out", "--json")
    assert result.exit_code == 0, result.output
    return brief, folder / "out", result


def test_a_row_is_what_size_says_of_the_same_brief(swept: tuple[Path, Path, Result], tmp_path: Path) -> None:
    _, out, _ = swept
    rows = json.loads((out / "bench loop-sweep" / "sweep.json").read_text(encoding="utf-8"))["rows"]
    single = tmp_path / "single.toml"
    single.write_text(BRIEF.replace("1.6 mm", "0.8 mm") + '[make]\nfab = "pool-two-layer"\n', encoding="utf-8")
    told = json.loads(run("size", single, "--json").stdout)
    assert rows[0]["design"] == told


def test_tables_and_plots_are_written(swept: tuple[Path, Path, Result]) -> None:
    _, out, result = swept
    names = {path.name for path in (out / "bench loop-sweep").iterdir()}
    assert {"sweep.csv", "sweep.json", "sweep.parquet", "gain_dbi.svg", "SHA256SUMS"} <= names
    head, first, second = (out / "bench loop-sweep" / "sweep.csv").read_text(encoding="utf-8").splitlines()
    assert head.startswith("row,board.thickness,make.fab,status,family")
    assert first.startswith("1,0.8 mm,pool-two-layer,designed,plain")
    assert second.startswith("2,1.6 mm")
    table = json.loads(result.stdout)["rows"]
    assert table[0]["best_match_mhz"] > table[1]["best_match_mhz"]  # more dielectric, lower frequency


def test_rows_known_from_before_are_not_solved_again(
    swept: tuple[Path, Path, Result], monkeypatch: pytest.MonkeyPatch
) -> None:
    brief, out, first = swept
    monkeypatch.setattr("planar.pipeline.sweeping.local_rows", lambda work, tasks, processes: iter_of_none(tasks))
    again = run("sweep", brief, *VARY, "--outputs", out, "--json")
    told, before = json.loads(again.stdout), json.loads(first.stdout)
    assert (told["known_from_before"], told["rows"]) == (2, before["rows"])


def iter_of_none(tasks: list[object]):  # type: ignore[no-untyped-def]
    """Rows of no tasks; a task would be a row that was forgotten."""
    assert tasks == []
    yield from ()


def test_an_interrupted_sweep_says_what_it_kept(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    def interrupted(work: object, tasks: object, processes: int):  # type: ignore[no-untyped-def]
        yield 0, {"status": "refused", "reason": "made up", "refused": {}}
        raise KeyboardInterrupt

    monkeypatch.setattr("planar.pipeline.sweeping.local_rows", interrupted)
    brief = tmp_path / "brief.toml"
    brief.write_text(BRIEF, encoding="utf-8")
    result = run("sweep", brief, *VARY, "--outputs", tmp_path / "out")
    assert result.exit_code == 130
    assert "rows.sqlite" in result.stderr
    assert "nothing was written" not in result.stderr
    with row_store(tmp_path / "out" / "rows.sqlite") as store:
        assert store.connection.execute("SELECT count(*) FROM rows").fetchone() == (1,)


def test_a_cluster_gives_the_same_bytes(swept: tuple[Path, Path, Result], tmp_path: Path) -> None:
    brief, out, _ = swept
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")  # the cluster's own, of ports in use and of its dashboard
        distributed = pytest.importorskip("distributed")
        with distributed.LocalCluster(
            n_workers=2, threads_per_worker=1, dashboard_address=None, host="127.0.0.1"
        ) as cluster:
            result = run(
                "sweep", brief, *VARY, "--outputs", tmp_path, "--scheduler", cluster.scheduler_address, "--json"
            )
    assert result.exit_code == 0, result.output
    for name in ("sweep.json", "sweep.csv"):
        assert (tmp_path / "bench loop-sweep" / name).read_bytes() == (out / "bench loop-sweep" / name).read_bytes()


def test_a_refused_row_stays_with_its_reason(tmp_path: Path) -> None:
    brief = tmp_path / "brief.toml"
    brief.write_text(BRIEF, encoding="utf-8")
    result = run("sweep", brief, "--vary", "antenna.dimensions.trace_width=40 mm", "--outputs", tmp_path, "--json")
    (row,) = json.loads(result.stdout)["rows"]
    assert (result.exit_code, row["status"]) == (0, "refused")
    assert "trace_width" in row["reason"] or "drawn" in row["reason"]


@pytest.mark.parametrize(
    ("arguments", "said"),
    [
        ((), "at least one axis"),
        (("--vary", "board.laminate=fr4-genera"), "did you mean"),
        (("--vary", "board.thickness=1 mm,2 mm", "--plot", "gain"), "--plot"),
    ],
)
def test_wrong_questions_are_refused_before_any_work(arguments: tuple[str, ...], said: str, tmp_path: Path) -> None:
    brief = tmp_path / "brief.toml"
    brief.write_text(BRIEF, encoding="utf-8")
    result = run("sweep", brief, *arguments, "--outputs", tmp_path / "out")
    assert result.exit_code == 1
    assert said in result.output
    assert not (tmp_path / "out" / "bench loop-sweep").exists()

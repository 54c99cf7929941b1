"""Packs of the examples, made by the real command, once for all tests and processes."""

import os
import subprocess
import sys
import time
from pathlib import Path

import pytest

EXAMPLES = Path(__file__).resolve().parents[2] / "examples"
BRIEFS = sorted(path for path in EXAMPLES.glob("*.toml") if not path.name.startswith("refused-"))


@pytest.fixture(scope="module", params=BRIEFS, ids=lambda path: path.stem)
def pack(request: pytest.FixtureRequest, tmp_path_factory: pytest.TempPathFactory) -> Path:
    """The pack of one example, made from another folder, once for all processes."""
    elsewhere = shared(tmp_path_factory) / "elsewhere" / request.param.stem
    printed = elsewhere / "printed.txt"
    elsewhere.parent.mkdir(exist_ok=True)
    try:
        elsewhere.mkdir()
    except FileExistsError:
        wait_for(printed)
    else:
        stdout = "not made"
        try:
            stdout = made(elsewhere, request.param)
        finally:
            printed.with_suffix(".part").write_text(stdout, encoding="utf-8")
            printed.with_suffix(".part").rename(printed)
    assert printed.read_text(encoding="utf-8") != "not made"
    return elsewhere / "outputs" / str(request.param.stem)


def shared(factory: pytest.TempPathFactory) -> Path:
    """A folder all processes of this test run share."""
    own = factory.getbasetemp()
    return own.parent if "PYTEST_XDIST_WORKER" in os.environ else own


def made(folder: Path, brief: Path) -> str:
    """What the real command prints when it makes `brief` in `folder`."""
    command = [sys.executable, "-m", "planar", "make", str(brief)]
    env = os.environ | {"OPENBLAS_NUM_THREADS": "1"}
    done = subprocess.run(command, cwd=folder, env=env, capture_output=True, text=True, encoding="utf-8", check=False)
    assert done.returncode == 0, done.stderr
    assert "Traceback" not in done.stderr
    return done.stdout


def wait_for(path: Path) -> None:
    for _ in range(1200):
        if path.exists():
            return
        time.sleep(0.25)
    pytest.fail(f"{path} was not made by the process that began it")

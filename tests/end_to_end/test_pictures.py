"""Change detector: the pictures README shows are those the worked brief draws today."""

from __future__ import annotations

import subprocess
import sys
from pathlib import Path

import pytest

EXAMPLES = Path(__file__).parents[2] / "examples"


@pytest.fixture(scope="module")
def pack(tmp_path_factory: pytest.TempPathFactory) -> Path:
    folder = tmp_path_factory.mktemp("pictures")
    brief = EXAMPLES / "orchard-gateway.toml"
    command = [sys.executable, "-m", "planar", "make", str(brief), "--outputs", str(folder)]
    subprocess.run(command, check=True, capture_output=True, cwd=folder)
    return folder / "orchard-gateway"


@pytest.mark.parametrize("side", ["top", "bottom"])
def test_readme_shows_the_copper_of_today(pack: Path, side: str) -> None:
    shown = EXAMPLES / "pictures" / f"orchard-gateway-{side}.svg"
    assert shown.read_bytes() == (pack / "layout" / f"preview-{side}.svg").read_bytes()

"""Support of all tests: the table of evidence, which is summed up by the process that starts the others."""

import importlib.util
import sys
from pathlib import Path

import pytest

NAME = "evidence"


def pytest_addoption(parser: pytest.Parser) -> None:
    parser.addoption("--evidence", action="store_true", help="write tests/published/EVIDENCE.md from this run")


def pytest_configure(config: pytest.Config) -> None:
    """This folder's settings are the deepest that are read before tests are collected, in all processes."""
    if NAME not in sys.modules:
        spec = importlib.util.spec_from_file_location(NAME, Path(__file__).parent / "published" / f"{NAME}.py")
        assert spec is not None
        assert spec.loader is not None
        module = importlib.util.module_from_spec(spec)
        sys.modules[NAME] = module  # dataclasses look their module up while it is being executed
        spec.loader.exec_module(module)
    config.pluginmanager.register(sys.modules[NAME].EvidenceTable(config), NAME)

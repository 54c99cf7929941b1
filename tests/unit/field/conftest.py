"""Support of the field solver's tests."""

import importlib.util
import sys
from pathlib import Path
from types import ModuleType

import pytest


@pytest.fixture(scope="session")
def field_cases() -> ModuleType:
    """The module field_cases.py of the published tests, which import mode importlib does not put on the path."""
    name = "field_cases"
    if name not in sys.modules:
        file = Path(__file__).parents[2] / "published" / f"{name}.py"
        spec = importlib.util.spec_from_file_location(name, file)
        assert spec is not None
        assert spec.loader is not None
        module = importlib.util.module_from_spec(spec)
        sys.modules[name] = module  # dataclasses look their module up while it is being executed
        spec.loader.exec_module(module)
    return sys.modules[name]

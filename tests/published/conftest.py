"""Support of the tests against published values."""

import importlib.util
import sys
from pathlib import Path
from types import ModuleType

import pytest


@pytest.fixture(scope="session")
def modal_ring() -> ModuleType:
    """The module modal_ring.py beside this file, which import mode importlib does not put on the path."""
    name = "modal_ring"
    if name not in sys.modules:
        spec = importlib.util.spec_from_file_location(name, Path(__file__).with_name("modal_ring.py"))
        assert spec is not None
        assert spec.loader is not None
        module = importlib.util.module_from_spec(spec)
        sys.modules[name] = module  # dataclasses look their module up while it is being executed
        spec.loader.exec_module(module)
    return sys.modules[name]

"""Support of the tests against published values."""

import importlib.util
import sys
from collections.abc import Callable
from pathlib import Path
from types import ModuleType

import pytest


def beside(name: str) -> ModuleType:
    """The module of that name beside this file, which import mode importlib does not put on the path."""
    if name not in sys.modules:
        spec = importlib.util.spec_from_file_location(name, Path(__file__).with_name(f"{name}.py"))
        assert spec is not None
        assert spec.loader is not None
        module = importlib.util.module_from_spec(spec)
        sys.modules[name] = module  # dataclasses look their module up while it is being executed
        spec.loader.exec_module(module)
    return sys.modules[name]


@pytest.fixture
def evidence(request: pytest.FixtureRequest) -> Callable[..., None]:
    """Asserts and records one comparison with an outside number; arguments of `evidence.compared`."""
    recorder: Callable[..., None] = beside("evidence").Evidence(request.node)
    return recorder


@pytest.fixture(scope="session")
def modal_ring() -> ModuleType:
    """The oracle of printed rings."""
    return beside("modal_ring")


@pytest.fixture(scope="session")
def field_cases() -> ModuleType:
    """Layouts and stackups for the field solver."""
    return beside("field_cases")

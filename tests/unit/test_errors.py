"""The error tree and its two records: what a user reads."""

import dataclasses
import inspect

import pytest

from planar import errors
from planar.errors import (
    BriefError,
    Fault,
    FaultyInputError,
    Finding,
    HandoffError,
    LibraryError,
    PlanarError,
    Severity,
    SynthesisError,
)

FAULT = Fault("orchard.toml", "board.thickness", '"1.6 inch"', 'did you mean "1.6 mm"?')
FINDING = Finding("track", "copper top", "0.1 mm", "0.15 mm", "widen the copper")


def test_every_error_has_one_root() -> None:
    """The command line catches `PlanarError` alone, so every error raised on purpose must be one."""
    classes = [c for _, c in inspect.getmembers(errors, inspect.isclass) if issubclass(c, Exception)]
    assert len(classes) >= 9
    assert all(issubclass(c, PlanarError) for c in classes)


def test_fault_says_file_key_value_and_what_is_right() -> None:
    text = str(FAULT)
    positions = [text.index(p) for p in ("orchard.toml", "board.thickness", '"1.6 inch"', 'did you mean "1.6 mm"?')]
    assert positions == sorted(positions)
    assert "\n" not in text


@pytest.mark.parametrize("kind", [BriefError, LibraryError])
def test_all_faults_in_one_message(kind: type[FaultyInputError]) -> None:
    other = dataclasses.replace(FAULT, key="board.copper")
    error = kind([FAULT, other])
    assert error.faults == (FAULT, other)
    assert str(error).splitlines() == [str(FAULT), str(other)]


def test_finding_says_rule_place_value_and_limit() -> None:
    assert str(FINDING) == "track at copper top: 0.1 mm, limit 0.15 mm; widen the copper"
    assert str(dataclasses.replace(FINDING, advice="")) == "track at copper top: 0.1 mm, limit 0.15 mm"
    assert FINDING.severity is Severity.WARN


@pytest.mark.parametrize("record", [FAULT, FINDING])
def test_records_are_frozen(record: Fault | Finding) -> None:
    with pytest.raises(dataclasses.FrozenInstanceError):
        record.where = "elsewhere"  # type: ignore[misc]


def test_synthesis_error_ends_with_the_way_out() -> None:
    error = SynthesisError("the board is too small:", (FINDING,), ('shape = "square" works',))
    lines = str(error).splitlines()
    assert lines[0] == "the board is too small:"
    assert str(FINDING) in lines[1]
    assert lines[-2] == "Nearest changes:"
    assert lines[-1].strip() == 'shape = "square" works'


def test_synthesis_error_promises_no_change_it_has_not() -> None:
    assert str(SynthesisError("no")) == "no"
    assert "change" not in str(SynthesisError("no", (FINDING,)))


def test_other_errors_carry_their_text() -> None:
    assert str(HandoffError("board.dxf: 2 outlines, expected 3")) == "board.dxf: 2 outlines, expected 3"

"""One error tree, and the two records that say what is wrong.

A `Fault` is something wrong in what the user wrote: file, key, value and what would be right.
A `Finding` is something the design does not meet (a fab rule, a target): data, not an exception.
Everything raised on purpose derives from `PlanarError`; the command line turns it into exit code 1.
"""

from __future__ import annotations

from dataclasses import asdict, dataclass
from enum import StrEnum
from typing import Any


@dataclass(frozen=True)
class Fault:
    """One thing wrong in an input file.

    `where` is the file (and line, where known), `key` the dotted key, `value` what stands there
    as text, `expected` what would be right.
    """

    where: str
    key: str
    value: str
    expected: str

    def __str__(self) -> str:
        return f"{self.where}: {self.key} = {self.value}: {self.expected}"


class Severity(StrEnum):
    """How much a finding weighs: `REFUSE` stops the pack, `WARN` and `NOTE` are reported."""

    REFUSE = "refuse"
    WARN = "warn"
    NOTE = "note"


@dataclass(frozen=True)
class Finding:
    """A rule the design misses or a fact the user must know.

    `rule` names the rule, `where` the copper or key concerned, `got` and `limit` are texts with
    units, `advice` is the nearest change that works.
    """

    rule: str
    where: str
    got: str
    limit: str
    advice: str = ""
    severity: Severity = Severity.WARN

    def __str__(self) -> str:
        text = f"{self.rule} at {self.where}: {self.got}, limit {self.limit}"
        return f"{text}; {self.advice}" if self.advice else text


class PlanarError(Exception):
    """Base of every error planar raises on purpose."""

    def facts(self) -> dict[str, Any]:
        """The error in plain types, as `--json` prints it."""
        return {"reason": str(self)}


class UnitError(PlanarError):
    """A quantity without a unit, with an unknown unit or of the wrong kind."""


class FaultyInputError(PlanarError):
    """An input file with one or more faults, all of them reported at once."""

    def __init__(self, faults: list[Fault]) -> None:
        self.faults = tuple(faults)
        super().__init__("\n".join(str(fault) for fault in faults))

    def __reduce__(self) -> tuple[type[FaultyInputError], tuple[list[Fault]]]:
        """Made again from its faults, not from their text, in another process."""
        return type(self), (list(self.faults),)

    def facts(self) -> dict[str, Any]:
        """Every fault with file, key, value and what would be right."""
        return {"faults": [asdict(fault) for fault in self.faults]}


class BriefError(FaultyInputError):
    """A brief that cannot be read as one."""


class LibraryError(FaultyInputError):
    """A library entry that is missing or malformed."""


class RangeError(PlanarError):
    """A formula asked for a value outside the range it was published for."""


class GeometryError(PlanarError):
    """An outline or layout that is no valid copper."""


class SynthesisError(PlanarError):
    """A design that cannot be made: the reason, the rules missed, and the nearest changes that work."""

    def __init__(self, reason: str, findings: tuple[Finding, ...] = (), changes: tuple[str, ...] = ()) -> None:
        self.reason = reason
        self.findings = findings
        self.changes = changes
        lines = [reason, *(f"  {finding}" for finding in findings)]
        if changes:
            lines += ["Nearest changes:", *(f"  {change}" for change in changes)]
        super().__init__("\n".join(lines))

    def __reduce__(self) -> tuple[type[SynthesisError], tuple[str, tuple[Finding, ...], tuple[str, ...]]]:
        """Made again from its parts in another process."""
        return type(self), (self.reason, self.findings, self.changes)

    def facts(self) -> dict[str, Any]:
        """Reason, rules missed and changes that work."""
        findings = [asdict(finding) for finding in self.findings]
        return {"reason": self.reason, "findings": findings, "nearest_changes": list(self.changes)}


class HandoffError(PlanarError):
    """Written files that do not agree with the layout they came from."""

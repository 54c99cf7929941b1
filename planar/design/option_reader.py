"""Texts of the command line turned into SI, the faults of all of them reported at once."""

from __future__ import annotations

from planar.errors import BriefError, Fault, UnitError
from planar.units import quantity, show


class OptionReader:
    """Reads command-line texts, collecting the faults of all of them."""

    def __init__(self) -> None:
        self.faults: list[Fault] = []

    def read(self, option: str, text: str, kind: str, span: tuple[float, float]) -> float:
        """SI value of `text`; a fault, and the lower end, when it is none or outside `span`."""
        try:
            value = quantity(text, kind)
        except UnitError as error:
            self.fault(option, text, str(error))
            return span[0]
        if not span[0] <= value <= span[1]:
            self.fault(option, text, f"from {show(span[0], kind)} to {show(span[1], kind)}")
        return value

    def fault(self, option: str, text: str, expected: str) -> None:
        """Note that `option` says `text` and what would be right."""
        self.faults.append(Fault("command line", f"--{option}", text, expected))

    def raise_faults(self) -> None:
        """Raise `BriefError` when there are any."""
        if self.faults:
            raise BriefError(self.faults)

"""The one place where a line formula refuses a value outside the range it was published for.

Published limits are round numbers; a thousandth of slack lets a sensitivity be taken at a limit.
"""

from __future__ import annotations

from planar.errors import RangeError
from planar.units import KINDS, show

_SLACK = 1e-3


def require(quantity: str, value: float, limits: tuple[float, float], kind: str = "") -> None:
    """Raise `RangeError` naming `quantity`, value and range unless `value` lies within `limits`.

    `kind` is a key of `units.KINDS` for values with a unit, empty for pure numbers.
    """
    low, high = limits
    if low * (1.0 - _SLACK) <= value <= high * (1.0 + _SLACK):
        return
    texts = [show(each, kind, 4) if kind in KINDS else f"{each:.4g}" for each in (value, low, high)]
    raise RangeError(f"{quantity} is {texts[0]}, the formula covers {texts[1]} to {texts[2]}")

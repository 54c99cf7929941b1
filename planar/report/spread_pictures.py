"""Pictures of how made boards scatter: bars of what does it, and the cloud of their reflections for its plot.

Made from the facts of a spread alone, so that a page can be drawn from its file.
"""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

import numpy as np

from planar.report.bars import Bar, ranked_bars
from planar.report.plots_frequency import Spread

SCATTERED: Mapping[str, tuple[str, str]] = {
    "match": ("match_share", "worst reflection in the band"),
    "frequency": ("frequency_share", "shift of the response"),
    "axial": ("axial_ratio_share", "worst axial ratio in the band"),
}
"""Name of a picture -> key of a contributor's share, and of what it is the share of the variance."""
TOGETHER = "together"


def spread_pictures(facts: Mapping[str, Any]) -> dict[str, str]:
    """SVG texts `contributors-match`, `contributors-frequency` and, of a circular board, `contributors-axial` of the
    `facts` of a spread.json: per cent of the variance that each quantity makes alone, and what they make together.

    Empty for a spread in which nothing varies.
    """
    pictures = {}
    for name, (key, of) in SCATTERED.items():
        shares = {each["name"]: each[key] for each in facts["contributors"] if each[key] is not None}
        rest = facts["interactions"][key]
        shares |= {TOGETHER: rest} if rest is not None else {}
        if any(shares.values()):
            bars = [Bar(quantity, 100.0 * share, "%") for quantity, share in shares.items()]
            pictures[f"contributors-{name}"] = ranked_bars(bars, f"{facts['name']}: share of the variance, {of}")
    return pictures


def spread_envelope(facts: Mapping[str, Any]) -> Spread:
    """The outermost and the middle percentile of reflection over frequency in the `facts` of a spread.json."""
    envelope = facts["envelope"]
    percent, curves = envelope["at_percent"], np.array(envelope["reflection_db"], dtype=np.float64)
    middle = min(range(len(percent)), key=lambda i: abs(percent[i] - 50.0))
    words = f"{percent[-1] - percent[0]:g} % of made boards"
    return Spread(np.array(envelope["frequency_hz"], dtype=np.float64), curves[0], curves[-1], words, curves[middle])

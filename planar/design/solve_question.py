"""The options of `planar solve` as they were written, read into frequencies with every fault at once."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path

from planar.brief import Brief
from planar.design.option_reader import OptionReader

WIDEST = 8.0
"""Highest over lowest frequency asked for in one run: the mesh of the highest serves all of them."""
MOST_POINTS = 10_001


@dataclass(frozen=True)
class SolveQuestion:
    """Texts of `--at` (any number) and `--sweep` (low, high, points), and the file of `--s1p`."""

    at: tuple[str, ...]
    sweep: tuple[str, str, int] | None
    s1p: Path | None = None


def read_question(question: SolveQuestion, brief: Brief) -> tuple[tuple[float, ...], tuple[float, float, int] | None]:
    """Frequencies, Hz, and sweep of `question`; the band's edges and middle where none is asked for.

    Raises `BriefError` with all faults.
    """
    ask = OptionReader()
    span = (1e6, 100e9)
    low, high = brief.target.band
    frequencies = tuple(ask.read("at", text, "frequency", span) for text in question.at) or (
        low,
        0.5 * (low + high),
        high,
    )
    sweep = None
    if question.sweep is not None:
        first, last, count = question.sweep
        ends = ask.read("sweep", first, "frequency", span), ask.read("sweep", last, "frequency", span)
        sweep = (*ends, count)
        if not ask.faults and not ends[0] < ends[1]:
            ask.fault("sweep", f"{first} {last}", "the lower frequency comes first")
        if not 2 <= count <= MOST_POINTS:
            ask.fault("sweep", str(count), f"2 to {MOST_POINTS} points")
    if question.s1p is not None and sweep is None:
        ask.fault("s1p", str(question.s1p), "a Touchstone file holds a sweep: --sweep LOW HIGH N")
    if not ask.faults:
        asked = [*frequencies, *(sweep[:2] if sweep else ())]
        if max(asked) > WIDEST * min(asked) * (1.0 - 1e-9):
            expected = f"all frequencies of one run, the band where none is asked for, within a factor of {WIDEST:g}"
            option, text = (
                ("sweep", " ".join(map(str, question.sweep))) if question.sweep else ("at", ", ".join(question.at))
            )
            ask.fault(option, text, expected)
    ask.raise_faults()
    return frequencies, sweep

"""Which measured file is what: the ring hardly transmits or has one port, the two lines transmit.

Everything that does not look like this is refused with the file's name and what would be right.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path

import numpy as np

from planar.errors import Fault, FaultyInputError
from planar.network.response import Response
from planar.network.touchstone import read_touchstone

LARGEST_S = 1.05
"""|S| above which a passive coupon was not measured with a valid calibration."""
RING_TRANSMISSION = 0.18
"""Median |S21| below which a two-port is the ring: -15 dB."""


@dataclass(frozen=True)
class Sweep:
    """A measured file: its `path` and what it holds."""

    path: Path
    response: Response

    @property
    def is_ring(self) -> bool:
        """Whether it has one port or hardly transmits."""
        s = self.response.s
        return s.shape[1] == 1 or float(np.median(np.abs(s[:, 1, 0]))) < RING_TRANSMISSION


def refused(path: Path | str, key: str, value: str, expected: str) -> FaultyInputError:
    """The error that names the file, what is wrong and what would be right."""
    return FaultyInputError([Fault(str(path), key, value, expected)])


def sorted_sweeps(files: Sequence[Path]) -> tuple[list[Sweep], list[Sweep]]:
    """The ring's sweeps, and both lines', short first. Raises `FaultyInputError` for anything else."""
    sweeps = [Sweep(path, read_touchstone(path)) for path in files]
    for each in sweeps:
        largest = float(np.abs(each.response.s).max())
        if largest > LARGEST_S:
            expected = f"at most {LARGEST_S:g} of a passive board: calibrate at the cable ends and measure again"
            raise refused(each.path, "largest |S|", f"{largest:.3g}", expected)
    rings = [each for each in sweeps if each.is_ring]
    lines = [each for each in sweeps if not each.is_ring]
    names = ", ".join(str(each.path) for each in sweeps) or "(none)"
    wanted = "the ring (.s1p or .s2p; a file a resonance will do), both lines (two .s2p), or all of them"
    if len(lines) not in (0, 2) or not sweeps:
        expected = f"{wanted}; a line of the coupon alone does not separate board from connectors"
        raise refused(names, "files of a line", str(len(lines)), expected)
    lines.sort(key=delay)
    return rings, lines


def delay(sweep: Sweep) -> float:
    """Mean delay of a line, s."""
    frequency, s21 = sweep.response.frequency, sweep.response.s[:, 1, 0]
    turned = np.angle(s21[1:] * s21[:-1].conj())
    return float(-np.sum(turned) / (2.0 * math.pi * (frequency[-1] - frequency[0]))) if len(frequency) > 1 else 0.0

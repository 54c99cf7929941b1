"""How far a measured reflection can be trusted: what a careful person looks at before believing it.

Nothing here knows what was measured, only the band that matters. What no antenna and cable can show (more back than
went in, a phase that runs forward) is refused with the usual cause; what merely limits the answer is said.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from planar.errors import Finding, Severity
from planar.network.measured import FEWEST, PASSIVE, Measured
from planar.units import show

Array = NDArray[np.float64]

_RAYLEIGH_MEDIAN = float(np.sqrt(np.log(2.0)))
"""Median over root mean square of the size of complex Gaussian noise."""
_THIRD_DIFFERENCE = float(np.sqrt(20.0))
"""Root mean square of third differences of white noise over that of the noise: 1, -3, 3, -1."""
NOISY = 0.02
"""Noise of a reflection from which on it limits what can be said (-34 dB)."""
COARSE_TURN = 0.5 * np.pi
"""rad, phase from one point to the next from which on a turn more cannot be told from a turn less."""
UNIT_SLIPS = (1e-9, 1e-6, 1e-3, 1e3, 1e6, 1e9)
"""Factors by which a wrong unit moves the frequencies."""


@dataclass(frozen=True)
class Grade:
    """`noise` rms of the reflection, `delay` mean round-trip delay in s, `step` largest frequency step in Hz, and what
    is to be said; a finding of severity `refuse` means that the numbers cannot be used."""

    noise: float
    delay: float
    step: float
    findings: tuple[Finding, ...]

    @property
    def usable(self) -> bool:
        """Whether nothing speaks against using the measurement."""
        return all(finding.severity is not Severity.REFUSE for finding in self.findings)


def grade(measured: Measured, band: tuple[float, float]) -> Grade:
    """Judge `measured` for an antenna whose band is `band` (low, high) Hz."""
    frequency, s = measured.response.frequency, measured.reflection
    found = _coverage(frequency, band)
    if any(finding.severity is Severity.REFUSE for finding in found):
        return Grade(0.0, 0.0, 0.0, tuple(found))
    turn = np.angle(s[1:] * np.conj(s[:-1]))
    weight = np.abs(s[1:]) * np.abs(s[:-1])
    step = np.diff(frequency)
    delay = float(-np.sum(weight * turn) / np.sum(weight * step) / (2.0 * np.pi)) if np.any(weight > 0.0) else 0.0
    noise = _noise(measured)
    found += _size(frequency, np.abs(s), noise)
    found += _phase(turn, weight, delay, float(np.max(step)))
    if noise > NOISY:
        got = f"{20.0 * np.log10(noise):.0f} dB"
        advice = "average more sweeps, or narrow the receiver's bandwidth"
        found.append(Finding("noise", "measurement", got, f"{20.0 * np.log10(NOISY):.0f} dB", advice, Severity.WARN))
    return Grade(noise, delay, float(np.max(step)), tuple(found))


def _coverage(frequency: Array, band: tuple[float, float]) -> list[Finding]:
    """Whether there are enough points and whether they cover the band."""
    low, high = float(frequency[0]), float(frequency[-1])
    got = f"{show(low, 'frequency', 5)} to {show(high, 'frequency', 5)}"
    asked = f"{show(band[0], 'frequency', 5)} to {show(band[1], 'frequency', 5)}"
    if low <= band[0] and high >= band[1]:
        if len(frequency) >= FEWEST:
            return []
        advice = "measure 201 points over a third of the frequency about the band"
        return [Finding("points", "measurement", str(len(frequency)), f"at least {FEWEST}", advice, Severity.REFUSE)]
    centre = 0.5 * (band[0] + band[1])
    slip = next((factor for factor in UNIT_SLIPS if low <= centre * factor <= high), None)
    if slip is not None:
        advice = f"the frequencies are {slip:g} times those of the brief: the unit in the file is wrong"
    else:
        advice = "measure over the band and a sixth of the frequency to either side"
    return [Finding("band", "measurement", got, f"all of {asked}", advice, Severity.REFUSE)]


def _noise(measured: Measured) -> float:
    """Rms noise of the reflection by third differences, which a smooth curve hardly has."""
    thirds = np.abs(np.diff(measured.reflection, 3))
    return float(np.median(thirds)) / _RAYLEIGH_MEDIAN / _THIRD_DIFFERENCE


def _size(frequency: Array, size: Array, noise: float) -> list[Finding]:
    worst = int(np.argmax(size))
    if size[worst] <= max(PASSIVE, 1.0 + 4.0 * noise):
        return []
    got = f"{size[worst]:.3f} at {show(float(frequency[worst]), 'frequency', 5)}"
    advice = "more comes back than went in: calibrate again with the adapter and cable in use"
    return [Finding("size of the reflection", "measurement", got, f"{PASSIVE:g}", advice, Severity.REFUSE)]


def _phase(turn: Array, weight: Array, delay: float, step: float) -> list[Finding]:
    strong = weight > 0.25
    if strong.any() and float(np.median(np.abs(turn[strong]))) > COARSE_TURN:
        got = f"{np.degrees(np.median(np.abs(turn[strong]))):.0f} degrees from point to point"
        advice = f"steps of {show(step, 'frequency', 3)} are too coarse for the cable in front: measure more points"
        return [Finding("resolution", "measurement", got, "90 degrees", advice, Severity.REFUSE)]
    if delay < 0.0 and strong.any() and delay * step * len(turn) < -0.1:
        got = f"{delay * 1e9:.2f} ns round trip"
        advice = "the phase runs forward: a port extension too long, or the sign of the angle changed on export"
        return [Finding("delay", "measurement", got, "positive", advice, Severity.REFUSE)]
    return []

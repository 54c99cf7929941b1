"""`retune`: a measured board in, what happened and what to change out; the corrected brief and plain facts of it.

The order is that of a careful person: is the file to be believed, does the cable belong to the antenna, what board
explains it, what follows.
"""

from __future__ import annotations

from collections.abc import Callable
from contextlib import suppress
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from planar.design.design import Design
from planar.design.retune.advice import Advice, advised
from planar.design.retune.board_model import BoardModel, board_model, other_surroundings, surrounded
from planar.design.retune.built import built_board
from planar.design.retune.inferred import Inferred, inferred
from planar.design.retune.misfit import Comparison, compare_sweeps
from planar.design.retune.unknowns import Plane, unstated_plane
from planar.design.workers import Workers
from planar.errors import Finding, RangeError, Severity, SynthesisError
from planar.network.grade import Grade, grade
from planar.network.measured import Measured
from planar.network.plane import check_passive, from_standards
from planar.network.response import Response

Array = NDArray[np.float64]
Complex = NDArray[np.complex128]
Progress = Callable[[str], None]

UNUSUAL = 2.5
"""Standard deviations of any unknown from which on other surroundings are tried too."""
LIKELIER = 6.0
"""By how much more of the misfit the surroundings of the design are believed than others: 20 to 1 in probability."""
LARGEST_BEHIND = 1.1
"""Size of a reflection behind measured standards up to which it is believed: handling of the cable shows there."""


@dataclass(frozen=True)
class RetuneRequest:
    """What is known beside the sweep: the reference `plane`, and a `second` sweep with the cable held differently."""

    plane: Plane
    second: Measured | None = None


@dataclass(frozen=True, eq=False)
class Retuned:
    """A measured board explained, and what to change. `findings` on the measurement and the fit; `surroundings` is
    empty, or says in what else than it was designed for the board must have been measured."""

    design: Design
    measured: Measured
    grade: Grade
    plane: Plane
    comparison: Comparison | None
    inferred: Inferred
    advice: Advice
    findings: tuple[Finding, ...]
    surroundings: str = ""


def retune(
    design: Design,
    measured: Measured,
    workers: Workers,
    request: RetuneRequest | None = None,
    progress: Progress = lambda stage: None,
) -> Retuned:
    """What the fab and the surroundings did to the board of `design`, and what to change.

    Without a `request` nothing is known of the line in front. Raises `SynthesisError` for a measurement that cannot be
    used, that two sweeps contradict, or that no plausible board explains, and `RangeError` for too few points.
    """
    asked = request or RetuneRequest(unstated_plane())
    graded, comparison = judged(design.choices.brief.target.band, measured, asked)
    progress("solving boards at the ends of all tolerances")
    model = board_model(design, workers)
    return explained(design, model, (measured, graded, asked, comparison), workers, progress)


def judged(band: tuple[float, float], measured: Measured, request: RetuneRequest) -> tuple[Grade, Comparison | None]:
    """The grade of a measurement for an antenna of `band` Hz and the comparison with a second one, where there is one.

    Raises `SynthesisError` where either says that it cannot be used.
    """
    graded = grade(measured, band)
    if not graded.usable:
        raise SynthesisError("this measurement cannot be used:", _refused(graded.findings))
    if request.second is None:
        return graded, None
    comparison = compare_sweeps(measured, request.second)
    if comparison.finding.severity is not Severity.NOTE:
        raise SynthesisError("the two sweeps contradict each other:", (comparison.finding,))
    return graded, comparison


def explained(
    design: Design,
    model: BoardModel,
    seen: tuple[Measured, Grade, RetuneRequest, Comparison | None],
    workers: Workers,
    progress: Progress = lambda stage: None,
) -> Retuned:
    """The same with the `model` of the board solved before, for what `judged` has accepted."""
    measured, graded, request, comparison = seen
    progress("looking for the board that explains the measurement")
    found, surroundings = _plausible(model, (measured, graded, request.plane), workers, progress)
    progress("trying changes on the board found")
    advice = advised(built_board(found, workers))
    told = () if comparison is None else (comparison.finding,)
    findings = (*graded.findings, *told, *found.findings, *_elsewhere(surroundings))
    return Retuned(
        design, measured, graded, request.plane, comparison, found, advice, findings, surroundings
    )  # fmt: skip


def _elsewhere(surroundings: str) -> tuple[Finding, ...]:
    """What to know where the board stood in other `surroundings` than it was designed for; nothing where it did not."""
    if not surroundings:
        return ()
    advice = "the next spin is drawn for these surroundings; are they not meant, put the cover right and measure again"
    return (Finding("surroundings", "surroundings.cover", surroundings, "as designed", advice),)


def _plausible(
    model: BoardModel, seen: tuple[Measured, Grade, Plane], workers: Workers, progress: Progress
) -> tuple[Inferred, str]:
    """The board that explains the measurement, in the surroundings of the design or, where that takes an unusual board
    and they do better, in others, and those in words. Raises `SynthesisError` where no board does."""
    found: list[tuple[float, Inferred, str]] = []
    refused: SynthesisError | None = None
    try:
        usual = inferred(model, *seen)
        if np.max(np.abs(usual.fit.estimate.z)) < UNUSUAL:
            return usual, ""
        found.append((usual.fit.estimate.cost - LIKELIER, usual, ""))
    except SynthesisError as error:
        refused = error
    for words, choices in other_surroundings(model.choices):
        progress(f"trying whether {words}")
        with suppress(SynthesisError):
            other = inferred(surrounded(model, choices, workers), *seen)
            found.append((other.fit.estimate.cost, other, words))
    if not found and refused is not None:
        raise refused
    return min(found, key=lambda each: each[0])[1:]


def behind_standards(measured: Measured, short: Measured, opened: Measured, load: Measured | None = None) -> Measured:
    """`measured` with the line in front taken off by short, open and perhaps load measured at its end.

    Raises `RangeError` where a standard does not cover the measurement, has another reference or does not fit.
    """
    frequency = measured.response.frequency
    first, second = (_at(frequency, each, measured.response.z0) for each in (short, opened))
    third = None if load is None else _at(frequency, load, measured.response.z0)
    behind = from_standards(measured.reflection, first, second, third)
    check_passive(frequency, behind, LARGEST_BEHIND)
    assumed = (*measured.assumed, "the standards are ideal and were measured where the antenna is")
    return Measured(Response(frequency, behind, measured.response.z0), assumed)


def _at(frequency: Array, standard: Measured, z0: float) -> Complex:
    """The reflection of a standard at `frequency` (n,) Hz."""
    own = standard.response.frequency
    if own[0] > frequency[0] or own[-1] < frequency[-1] or standard.response.z0 != z0:
        raise RangeError("a standard does not cover the sweep or has another reference: measure both alike")
    value = standard.reflection
    found: Complex = np.interp(frequency, own, value.real) + 1j * np.interp(frequency, own, value.imag)
    return found


def _refused(findings: tuple[Finding, ...]) -> tuple[Finding, ...]:
    return tuple(each for each in findings if each.severity is Severity.REFUSE)

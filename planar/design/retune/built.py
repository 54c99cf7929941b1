"""The inferred board as a bench: what a change of its copper does to the measured response.

A change is solved on one coarse mesh with and without it, both with the materials and etching found; the difference is
put on what the measurement says of the board as it is. Boards drawn from the posterior say how sure the outcome is.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from planar.copper.tabs import PAIRS
from planar.design.choices import Choices
from planar.design.retune.inferred import Inferred
from planar.design.retune.moving import best_match, response_shift
from planar.design.spread import limits_of
from planar.design.spread_boards import Question
from planar.design.spread_sampling import Limits, Reader
from planar.design.tolerances import board_with
from planar.design.trial import Effort, solve_trial
from planar.design.workers import Workers
from planar.errors import PlanarError, SynthesisError
from planar.network.response import Response

Array = NDArray[np.float64]
Complex = NDArray[np.complex128]

SAMPLES, SEED = 400, 1
"""Boards drawn from the posterior, and what they are drawn with."""


@dataclass(frozen=True)
class Artwork:
    """Copper as drawn: `dimensions` name -> m, `tabs` pairs of trim tabs left."""

    dimensions: Mapping[str, float]
    tabs: int = PAIRS


@dataclass(frozen=True, eq=False)
class Outlook:
    """The board after a change: its reflection `reflected` (j,) on the model's frequencies and what follows from it.

    `shift` of the response from the design (a fraction), `best_match` Hz (None without a dip), `worst_db` over the
    brief's band, the `matched` band (low, high) Hz at the brief's level, worst `axial_db` over the band (None for
    linear polarisation), rms `distance` of the terms from the design's near the band, and `confidence` that the brief
    is met, 0 to 1.
    """

    reflected: Complex
    shift: float
    best_match: float | None
    worst_db: float
    matched: tuple[float, float] | None
    axial_db: float | None
    distance: float
    confidence: float


@dataclass(frozen=True, eq=False)
class Built:
    """The inferred board, `drawn` terms (n, j) from its posterior, and `coarse` terms (j,) of it on the mesh changes
    are solved on."""

    inferred: Inferred
    artwork: Artwork
    drawn: Complex
    coarse: Complex
    workers: Workers

    @property
    def question(self) -> Question:
        """What every board is asked."""
        return self.inferred.model.question

    @property
    def choices(self) -> Choices:
        """Those of the design."""
        return self.question.choices

    @property
    def limits(self) -> Limits:
        """What the brief asks."""
        return limits_of(self.choices)

    @property
    def reader(self) -> Reader:
        """What reads results off terms."""
        grid = self.question.frequencies
        return Reader(grid, self.inferred.model.designed[: len(grid)], self.choices.brief.target.band)

    @property
    def unchanged(self) -> Complex:
        """No change of the terms, (j,)."""
        return np.zeros_like(self.coarse)

    def changes(self, artworks: Sequence[Artwork]) -> list[Complex | None]:
        """Change of the terms (j,) by each of `artworks`, None where one cannot be drawn or solved."""
        found = _solved(self.inferred, artworks, self.workers)
        return [None if terms is None else terms - self.coarse for terms in found]

    def outlook(self, change: Complex) -> Outlook:
        """The board after a `change` of its terms (j,)."""
        grid, count = self.question.frequencies, len(self.question.frequencies)
        terms = self.inferred.here + change
        reader, reflected = self.reader, terms[:count]
        outcome = reader.outcome(terms[None, :])
        axial = outcome.worst_axial
        met = self.limits.met(reader.outcome(self.drawn + change))
        return Outlook(
            reflected=reflected,
            shift=self.shift(terms),
            best_match=best_match(grid, reflected),
            worst_db=float(20.0 * np.log10(outcome.worst[0])),
            matched=_matched(grid, reflected, self.choices),
            axial_db=None if axial is None else float(axial[0]),
            distance=float(np.sqrt(np.mean(np.abs(self.missing(terms)) ** 2))),
            confidence=float(np.mean(met)),
        )

    def shift(self, terms: Complex) -> float:
        """How far `terms` (j,) lie from the design's in frequency, a fraction."""
        grid, count = self.question.frequencies, len(self.question.frequencies)
        return response_shift(grid, self.inferred.model.designed[:count], terms[:count])

    def missing(self, terms: Complex) -> Complex:
        """How far `terms` (j,) are from the design's, in and near the band (s,): reflections, then senses."""
        grid, count = self.question.frequencies, len(self.question.frequencies)
        low, high = self.choices.brief.target.band
        centre = self.choices.centre
        half = max(NEAR, 0.5 * (high - low) / centre + BESIDE)
        near = np.abs(grid / centre - 1.0) <= half
        off = terms - self.inferred.model.designed
        missing: Complex = np.concatenate([off[:count][near], off[count:]])
        return missing


NEAR, BESIDE = 0.06, 0.03
"""Of the centre, how far round the middle of the band, or beyond a wide band, a response is brought back."""


def built_board(inferred: Inferred, workers: Workers) -> Built:
    """The bench of the board `inferred`. Raises `SynthesisError` where it cannot be solved."""
    artwork = Artwork(inferred.model.question.dimensions)
    (coarse,) = _solved(inferred, [artwork], workers)
    if coarse is None:
        raise SynthesisError("the board found cannot be solved: measure its dimensions and thickness")
    return Built(inferred, artwork, inferred.drawn(SAMPLES, SEED), coarse, workers)


def _solved(inferred: Inferred, artworks: Sequence[Artwork], workers: Workers) -> list[Complex | None]:
    question, deviations = inferred.model.question, inferred.deviations
    tasks = []
    for artwork in artworks:
        choices, made = board_with(question.choices, artwork.dimensions, question.quantities, deviations)
        tasks.append((choices, replace(artwork, dimensions=made), question.effort, question))
    return workers.each(_terms, tasks)


def _terms(task: tuple[Choices, Artwork, Effort, Question]) -> Complex | None:
    """Terms (j,) of one board, None where it cannot be drawn or solved."""
    choices, artwork, effort, question = task
    try:
        return question.terms_of(solve_trial(choices, artwork.dimensions, effort, tabs=artwork.tabs).band)
    except (PlanarError, np.linalg.LinAlgError):
        return None


def _matched(grid: Array, reflected: Complex, choices: Choices) -> tuple[float, float] | None:
    """The matched band (low, high) Hz nearest the middle of the brief's."""
    target = choices.brief.target
    bands = Response(grid, reflected, target.impedance).band(target.match_db)
    return min(bands, key=lambda each: max(each[0] - choices.centre, choices.centre - each[1]), default=None)

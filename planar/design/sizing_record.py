"""How a design came to be: what was tried, how many boards were solved, what else was considered."""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True)
class Candidate:
    """One realisation: what it is, whether it `meets` the brief as sized coarsely, and what speaks against it.

    `margin` is the least distance, over the centre frequency, from the brief's band to the end of the match after
    tolerances; negative where tolerances eat it, None where it was not sized. `size` (width, height) m of the board.
    """

    family: str
    end: str | None
    shape: str
    meets: bool
    margin: float | None
    size: tuple[float, float] | None
    needs_balun: bool
    remark: str

    @property
    def name(self) -> str:
        """The realisation in words."""
        return ", ".join(each for each in (self.family, self.end and f"end {self.end}", self.shape) if each)


@dataclass(frozen=True)
class SizingRecord:
    """What sizing took: boards solved on the coarse and the fine mesh, field `solutions` in all.

    `width` of the span sized for, over the centre frequency; `held` dimensions at a bound; `candidates` where the brief
    left the family open, best first.
    """

    coarse_boards: int
    fine_boards: int
    solutions: int
    width: float
    held: tuple[str, ...]
    candidates: tuple[Candidate, ...]

"""What to do with the board and with the next one, in order, and what not to do.

A cut cannot be taken back: without a shift that is told to be one side of zero nothing is cut. The next spin costs
nothing to draw, so its best guess is always there, with how sure it is.
"""

from __future__ import annotations

from dataclasses import dataclass

from planar.design.retune.built import Built, Outlook
from planar.design.retune.cuts import CutNow, cut_now
from planar.design.retune.spin import NextSpin, Respin, next_spin
from planar.units import show

MEASURE_AGAIN = (
    "the measurement does not tell on which side of the design the board is: do not cut; measure again with the "
    "line in front taken off (short and open at its end), then decide"
)


GOOD = 0.95
"""Confidence that the brief is met from which on a board may stay as it is."""


@dataclass(frozen=True, eq=False)
class Advice:
    """`board`: the outlook of the board as it is; `cut` what can be cut off it now; `spin` what to draw next.

    `sure` says that the shift is told to be one side of zero; without it there is nothing in `cut`.
    """

    board: Outlook
    cut: CutNow
    spin: NextSpin
    sure: bool

    @property
    def best(self) -> Respin:
        """The next spin advised."""
        return self.spin.ways[0]


def advised(built: Built) -> Advice:
    """What to cut and what to draw next. Raises `SynthesisError` where no change can be solved."""
    sure = built.inferred.effect.sign != 0
    cut = cut_now(built) if sure else CutNow((), (("cutting", MEASURE_AGAIN),))
    return Advice(built.outlook(built.unchanged), cut, next_spin(built), sure)


def advice_sentences(advice: Advice) -> tuple[str, ...]:
    """The advice in words, first what to do."""
    said = [f"the board as it is: {spoken(advice.board)}"]
    if advice.board.confidence >= GOOD:
        said.append(
            "it meets the brief as it is: nothing has to be cut; cuts bring it back to the middle of its design"
        )
    for cut in advice.cut.ways:
        said.append(
            f"cut now: first {cut.begin}, then {spoken(cut.after_first)}; measure before cutting on; "
            f"after {cut.what} in all {spoken(cut.outlook)}"
        )
    if not advice.cut.ways:
        said.append(advice.cut.others[-1][1])
    for way in advice.spin.ways:
        moves = ", ".join(f"{name} from {_mm(old)} to {_mm(new)}" for name, (old, new) in way.moves.items())
        said.append(f"next spin: {way.what}: {moves or 'nothing moves'}; then {spoken(way.outlook)}")
    return tuple(said)


def spoken(outlook: Outlook) -> str:
    """An outlook in words."""
    parts = [f"response {100.0 * outlook.shift:+.2f} % from the design"]
    if outlook.best_match is not None:
        parts.append(f"best match at {show(outlook.best_match, 'frequency', 5)}")
    parts.append(f"worst {outlook.worst_db:.1f} dB in the band")
    if outlook.axial_db is not None:
        parts.append(f"axial ratio {outlook.axial_db:.1f} dB")
    return f"{', '.join(parts)}; the brief is met with {100.0 * outlook.confidence:.0f} % confidence"


def _mm(length: float) -> str:
    return f"{length * 1e3:.2f} mm"

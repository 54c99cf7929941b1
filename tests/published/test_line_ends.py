"""Open end and mitre of a microstrip against an older formula and the stated optimum (both from memory)."""

import math
from collections.abc import Callable

import pytest

from planar.lines.discontinuities import mitre_cut, open_end_extension
from planar.lines.microstrip import static_eps_eff


@pytest.mark.parametrize("ratio", [0.5, 1.0, 2.0])
@pytest.mark.parametrize("eps_r", [2.2, 4.4, 9.9])
def test_open_end(ratio: float, eps_r: float, evidence: Callable[..., None]) -> None:
    """Hammerstad & Bekkadal 1975: 0.412 h (e + 0.3)/(e - 0.258) (u + 0.264)/(u + 0.8)."""
    eps_eff = static_eps_eff(ratio, eps_r)
    older = 0.412 * (eps_eff + 0.3) / (eps_eff - 0.258) * (ratio + 0.264) / (ratio + 0.8)
    evidence(
        f"open end, eps_r {eps_r:g}, w/h 0.5 to 2: extension over height",
        source="Hammerstad & Bekkadal 1975 (M)",
        theirs=older,
        ours=open_end_extension(ratio, 1.0, eps_r, eps_eff),
        allowed="6 %",
        why="the older formula states 5 % of its own",
    )


def test_mitre(evidence: Callable[..., None]) -> None:
    evidence(
        "mitre, w = h: share of the diagonal cut off",
        source="Douville & James 1978, 0.52 + 0.65 exp(-1.35) (M)",
        theirs=0.6885,
        ours=mitre_cut(1e-3, 1e-3) / (math.sqrt(2.0) * 1e-3),
        allowed="0.01 %",
        why="the printed digits",
    )

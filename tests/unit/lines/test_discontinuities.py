"""Open end and mitre against a second published formula and stated limits."""

import math

import pytest

from planar.errors import RangeError
from planar.lines.discontinuities import mitre_cut, open_end_extension
from planar.lines.microstrip import static_eps_eff


@pytest.mark.parametrize("ratio", [0.5, 1.0, 2.0])
@pytest.mark.parametrize("eps_r", [2.2, 4.4, 9.9])
def test_open_end_near_the_older_formula(ratio: float, eps_r: float) -> None:
    """Hammerstad & Bekkadal 1975, 0.412 h (e + .3)/(e - .258) (u + .264)/(u + .8) (from memory), 5 % of its own."""
    eps_eff = static_eps_eff(ratio, eps_r)
    older = 0.412 * (eps_eff + 0.3) / (eps_eff - 0.258) * (ratio + 0.264) / (ratio + 0.8)
    assert open_end_extension(ratio, 1.0, eps_r, eps_eff) == pytest.approx(older, rel=6e-2)


def test_open_end_scales_with_height() -> None:
    assert open_end_extension(2e-3, 1e-3, 4.4, 3.34) == pytest.approx(1e-3 * open_end_extension(2.0, 1.0, 4.4, 3.34))


def test_mitre() -> None:
    """Douville & James 1978 (from memory): w = h cuts 0.52 + 0.65 exp(-1.35) = 68.9 % of the diagonal."""
    assert mitre_cut(1e-3, 1e-3) == pytest.approx(0.6885 * math.sqrt(2.0) * 1e-3, rel=1e-4)


def test_refusals() -> None:
    with pytest.raises(RangeError, match=r"width / height is 0\.1"):
        mitre_cut(0.1e-3, 1e-3)
    with pytest.raises(RangeError, match="eps_eff is 5"):
        open_end_extension(1e-3, 1e-3, 4.4, 5.0)

"""Where a microstrip ends or bends: the extra length of an open end, and the mitre of a corner.

Both are fits to full-wave or measured data; both matter where they exceed a few thousandths of a
quarter wave.
"""

from __future__ import annotations

import math

from planar.lines.ranges import require


def open_end_extension(width: float, height: float, eps_r: float, eps_eff: float) -> float:
    """Length in m by which the fringing field of an open end lengthens a microstrip.

    `width` and `height` in m, `eps_eff` of the line at frequency. Kirschning, Jansen & Koster, Electron.
    Lett. 17 (1981) 123, eqs. 1 to 6 (equation numbers from memory): within 2.5 % for w/h 0.01 to 100 and
    eps_r 1 to 50. Raises `RangeError` outside.
    """
    u = width / height
    require("width / height", u, (0.01, 100.0))
    require("eps_r", eps_r, (1.0, 50.0))
    require("eps_eff", eps_eff, (1.0, eps_r))
    power = eps_eff**0.81
    xi1 = 0.434907 * (power + 0.26) / (power - 0.189) * (u**0.8544 + 0.236) / (u**0.8544 + 0.87)
    xi2 = 1.0 + u**0.371 / (2.358 * eps_r + 1.0)
    xi3 = 1.0 + 0.5274 * math.atan(0.084 * u ** (1.9413 / xi2)) / eps_eff**0.9236
    xi4 = 1.0 + 0.0377 * math.atan(0.067 * u**1.456) * (6.0 - 5.0 * math.exp(0.036 * (1.0 - eps_r)))
    xi5 = 1.0 - 0.218 * math.exp(-7.5 * u)
    return float(height * xi1 * xi3 * xi5 / xi4)


def mitre_cut(width: float, height: float) -> float:
    """Length in m, along the diagonal of a right-angled corner, to cut off its outer side.

    The diagonal is sqrt(2) w; the best cut is 0.52 + 0.65 exp(-1.35 w/h) of it. Douville & James, IEEE Trans.
    MTT-26 (1978) 175 (from memory): w/h 0.25 to 2.75, eps_r 2.5 to 25. Raises `RangeError` outside.
    """
    ratio = width / height
    require("width / height", ratio, (0.25, 2.75))
    return math.sqrt(2.0) * width * (0.52 + 0.65 * math.exp(-1.35 * ratio))

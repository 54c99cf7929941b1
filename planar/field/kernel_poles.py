"""The TM0 surface wave of a lossless stack: the largest wavenumber at which its TM line resonates by itself.

Voltage and current of the line, taken upward from the lower end by the chain matrices of the layers, are real and
without poles on the real k axis above k0; the mismatch with the open air on top changes sign at each guided wave.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray
from scipy.optimize import brentq

from planar.errors import RangeError
from planar.field.medium import LayeredMedium, wavenumber

_SCAN = 2000
_LEAST = 1e-7


def tm0_pole(medium: LayeredMedium, frequency: float) -> float:
    """Radial wavenumber in rad/m of the TM0 surface wave at `frequency` (Hz), above k0.

    Source: transverse resonance, Y_up + Y_down = 0 of the TM line (Collin, Field Theory of Guided Waves, ch. 11).
    Raises `RangeError` for a lossy medium, whose pole is complex, and for one that guides no wave.
    """
    k0 = wavenumber(frequency)
    if any(complex(eps).imag != 0.0 for eps in medium.eps_r):
        raise RangeError("the medium has losses: its surface-wave poles are not on the real axis")
    steepest = k0 * np.sqrt(max(medium.eps_max - 1.0, 0.0))

    def mismatch(decay: float) -> float:
        return float(_mismatch(medium, k0, np.array([decay]))[0])

    grid = steepest * np.concatenate([np.geomspace(_LEAST, 1e-2, _SCAN), np.linspace(1e-2, 1.0, _SCAN)[1:]])
    signs = np.sign(_mismatch(medium, k0, grid))
    changes = np.flatnonzero(signs[1:] * signs[:-1] < 0.0)
    if not changes.size:
        raise RangeError("the medium guides no TM surface wave")
    last = int(changes[-1])
    decay = brentq(mismatch, grid[last], grid[last + 1], xtol=1e-300, rtol=1e-14)
    return float(np.hypot(k0, decay))


def _mismatch(medium: LayeredMedium, k0: float, decay: NDArray[np.float64]) -> NDArray[np.float64]:
    """V + gamma0 I at the top, with the line ended below by air (V = gamma0, I = 1) or metal (V = 0, I = 1).

    `decay` is gamma0 = sqrt(k^2 - k0^2) in air; I is in units of jw eps0, so that Y = eps/gamma.
    """
    voltage = np.zeros_like(decay) if medium.metal_backed else decay
    current = np.ones_like(decay)
    for thickness, eps in zip(medium.thicknesses, medium.eps_r, strict=True):
        relative = complex(eps).real
        gamma = np.sqrt((decay**2 - (relative - 1.0) * k0**2).astype(np.complex128))
        cosh = np.cosh(gamma * thickness).real
        small = np.where(gamma == 0.0, 1.0, gamma)
        sinh_over = np.where(gamma == 0.0, thickness, (np.sinh(gamma * thickness) / small).real)
        voltage, current = (
            voltage * cosh + current * (gamma**2).real * sinh_over / relative,
            current * cosh + voltage * relative * sinh_over,
        )
    return np.asarray(voltage + decay * current, dtype=np.float64)

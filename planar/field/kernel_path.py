"""The inverse Hankel transform as a sum over nodes that serve a whole sweep.

The integral over k is taken in overlapping bands. Up to a few k0, where poles and branch points lie, it runs on Gauss
panels over t + j d sin(pi t/k1) and on along the real axis. Above, where the kernel varies on the scale of k itself,
smooth windows cut it into octaves: a windowed octave from a on has a transform that has died out at rho = 36/a, and
the trapezoidal rule is exact to rounding on it (Trefethen & Weideman, SIAM Review 56 (2014) 385). So a thin layer
costs some eighty nodes for each octave it adds, and those for few rho only.
The nodes depend on the highest frequency of a sweep, the Bessel factors not on frequency at all.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.special import erfc, j0, jv

Floats = NDArray[np.float64]
Complexes = NDArray[np.complex128]

_GAUSS = 12
_WINDOW_SPAN = 4.0
_WINDOW_STEEPNESS = 5.0
_DIES_OUT = 36.0
_DEPTH = 0.35
_GROWTH = 3.0


@dataclass(frozen=True)
class PathLimits:
    """What shapes a path: `k0` in rad/m at the highest frequency, largest refractive `index` (1), `reach` in 1/m up to
    which the spectrum matters, and `refinement` of the nodes (1 for use, 2 to check)."""

    k0: float
    index: float
    reach: float
    refinement: float = 1.0

    @property
    def turn(self) -> float:
        """Where the contour comes back to the real axis, rad/m: above every pole and branch point."""
        return (1.3 * self.index + 0.2) * self.k0


@dataclass(frozen=True, eq=False)
class Band:
    """Nodes `first` to `last` of a path and their Bessel factors and weights as `matrix` (rows, last - first), for the
    first `rows` distances."""

    first: int
    last: int
    rows: int
    matrix: Floats | Complexes


@dataclass(frozen=True, eq=False)
class Path:
    """`nodes` (n,) in rad/m of all bands; a spectrum k G(k) on them becomes G(rho) by `transformed`."""

    nodes: Complexes
    bands: tuple[Band, ...]
    count: int

    def transformed(self, spectra: Complexes) -> Complexes:
        """(1/2 pi) times the integral of k G(k) J0(k rho): `spectra` (n, m) of k G to (count, m)."""
        result = np.zeros((self.count, spectra.shape[1]), dtype=np.complex128)
        for band in self.bands:
            part = np.ascontiguousarray(spectra[band.first : band.last])
            if np.iscomplexobj(band.matrix):
                result[: band.rows] += band.matrix @ part
            else:
                result[: band.rows] += (band.matrix @ part.view(np.float64)).view(np.complex128)
        return result


def hankel_path(rho: Floats, limits: PathLimits) -> Path:
    """Path for ascending distances `rho` (n,) in m."""
    pieces = [_contour(float(rho[-1]), limits), _low_band(float(rho[-1]), limits), *_octaves(limits)]
    bands = []
    first = 0
    for nodes, weights, farthest in pieces:
        rows = int(np.searchsorted(rho, farthest, side="right"))
        if rows:
            argument = rho[:rows, None] * nodes
            matrix = (jv(0, argument) if np.iscomplexobj(nodes) else j0(argument)) * (weights / (2.0 * np.pi))
            bands.append(Band(first, first + len(nodes), rows, np.ascontiguousarray(matrix)))
        first += len(nodes)
    nodes = np.concatenate([each[0] for each in pieces])
    return Path(np.asarray(nodes, dtype=np.complex128), tuple(bands), len(rho))


_Piece = tuple[Floats | Complexes, Floats | Complexes, float]


def _contour(farthest: float, limits: PathLimits) -> _Piece:
    """Arch over the poles; its height is limited by the growth of J0 at the farthest point."""
    depth = min(_DEPTH * limits.k0, _GROWTH / farthest)
    turn = limits.turn
    t, weights = _panels(0.0, turn, min(1.5 * np.pi / farthest, depth) / limits.refinement)
    angle = np.pi * t / turn
    slope = 1.0 + 1j * depth * np.pi / turn * np.cos(angle)
    return t + 1j * depth * np.sin(angle), weights * slope, np.inf


def _low_band(farthest: float, limits: PathLimits) -> _Piece:
    """Real axis from the end of the arch to where the first window has closed."""
    longest = min(1.5 * np.pi / farthest, 0.5 * limits.turn)
    k, weights = _panels(limits.turn, _WINDOW_SPAN * limits.turn, longest / limits.refinement)
    return k, weights * _window(k, limits.turn), np.inf


def _octaves(limits: PathLimits) -> list[_Piece]:
    """Difference of one window and the next an octave up, until the spectrum is negligible."""
    pieces: list[_Piece] = []
    start = limits.turn
    while start < limits.reach:
        step = np.pi / _DIES_OUT * start / limits.refinement
        k: Floats = start + step * np.arange(1.0, round((2.0 * _WINDOW_SPAN - 1.0) * start / step))
        pieces.append((k, step * (_window(k, 2.0 * start) - _window(k, start)), _DIES_OUT / start))
        start *= 2.0
    return pieces


def _window(k: Floats, start: float) -> Floats:
    """1 below `start`, 0 above `_WINDOW_SPAN` times that, to rounding, with the smoothest way between."""
    middle, half = 0.5 * (_WINDOW_SPAN + 1.0) * start, 0.5 * (_WINDOW_SPAN - 1.0) * start
    return np.asarray(0.5 * erfc(_WINDOW_STEEPNESS * (k - middle) / half), dtype=np.float64)


def _panels(start: float, stop: float, longest: float) -> tuple[Floats, Floats]:
    """Nodes and weights of equal Gauss panels no longer than `longest`."""
    edges = np.linspace(start, stop, max(1, int(np.ceil((stop - start) / longest))) + 1)
    x, w = np.polynomial.legendre.leggauss(_GAUSS)
    half = 0.5 * np.diff(edges)[:, None]
    middle = 0.5 * (edges[1:] + edges[:-1])[:, None]
    return (middle + half * x).ravel(), (half * w).ravel()

"""What only the field solution knows of a board, for pictures: pattern, gain over frequency, currents, losses.

A prediction holds single numbers; a portrait holds what is looked at. It is taken from the solution that verified the
board, nothing is solved again, and it is rounded to what is meaningful, so that two runs say the same and a page drawn
from the file is the page drawn from the run.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from planar.design.choices import Choices
from planar.design.trial import Trial
from planar.field.band import BandSolution
from planar.field.far_field import FarField, far_field
from planar.field.result import NORMAL, PointResult
from planar.field.solver import FieldProblem, FieldSolution

Array = NDArray[np.float64]
Complex = NDArray[np.complex128]
Indices = NDArray[np.int64]

STEP = 3
"""Degrees between two directions of a pattern cut."""
PLANES = (0, 90)
"""Degrees, azimuth of the two cuts: along x and along y of the board."""
FREQUENCIES = 41
"""Frequencies over the trusted span, an odd number: the centre is the middle one."""
FLOOR = -40.0
"""dBi, a gain below is given as this: in the nulls of a symmetric board there is only rounding."""
LINEAR = 40.0
"""dB, an axial ratio above is given as this: linear."""
DECIBEL_DIGITS, SHARE_DIGITS, METRE_DIGITS = 2, 4, 6
"""Decimals of decibels, of shares, of metres."""
CURRENT_DIGITS = 3
"""Significant digits of a relative current."""
LINEAR_PARTS = ("horizontal, along x", "vertical, along y")
CIRCULAR_PARTS = ("right-hand circular", "left-hand circular")


@dataclass(frozen=True, eq=False)
class PatternCut:
    """Gain in one plane through the normal, at `azimuth` degrees from the x axis, over `theta` (n,) degrees from the
    normal of the top side, -180 to 180: negative on the side of azimuth + 180.

    `gain_dbi` (n,) dBi of the whole field, `part_dbi` (2, n) of its two polarisations, `axial_ratio_db` (n,). NaN where
    there is no field: below a reflector; the axial ratio also where the gain is at its floor.
    """

    azimuth: float
    theta: Array
    gain_dbi: Array
    part_dbi: Array
    axial_ratio_db: Array


@dataclass(frozen=True, eq=False)
class CurrentMap:
    """Size of the surface current on the copper of one `level`: `points` (n, 2) m in board coordinates, `triangles`
    (m, 3) indices, `magnitude` (m,) sqrt(|Jx|^2 + |Jy|^2) at each centroid over the largest on any level."""

    level: str
    points: Array
    triangles: Indices
    magnitude: Array


@dataclass(frozen=True, eq=False)
class ModeImage:
    """A full-wave characteristic mode of the bare loop: line, pads and connector left out, gap closed, lossless; its
    `current` in coordinates round the loop's centre.

    `resonance` Hz and `quality` None where it does not resonate in the span looked at. `power_share` is its part of the
    power that a source across the gap radiates at the centre. `orientation` of its field, along x "horizontal".
    """

    orientation: str
    resonance: float | None
    quality: float | None
    power_share: float
    current: CurrentMap


@dataclass(frozen=True)
class Losses:
    """Where the power accepted at the centre goes, shares of 1: `guided` leaves in the slab, taken as endless."""

    radiated: float
    guided: float
    dielectric: float
    copper: float


@dataclass(frozen=True, eq=False)
class Portrait:
    """Field data of a board at its `centre`, Hz, and over `frequency` (f,) Hz.

    `parts` name the two polarisations of the `cuts`: right- and left-hand circular of a circular board (IEEE Std 145),
    else along x and along y of the board (Ludwig's third definition, IEEE Trans. AP-21 (1973) 116). `gain_dbi` (f,) and
    `axial_ratio_db` (f,) toward the top. `modes` are empty where the bare loop has none.
    """

    centre: float
    parts: tuple[str, str]
    cuts: tuple[PatternCut, ...]
    frequency: Array
    gain_dbi: Array
    axial_ratio_db: Array
    losses: Losses
    currents: tuple[CurrentMap, ...]
    modes: tuple[ModeImage, ...]

    @property
    def circular(self) -> bool:
        """Whether the board was asked to be circular."""
        return self.parts == CIRCULAR_PARTS


def portrait(
    choices: Choices, trial: Trial, *, centre: PointResult, span: tuple[float, float], modes: Sequence[ModeImage]
) -> Portrait:
    """Portrait of the board of `trial`, with what is known already: `centre`, the `modes`, the trusted `span` Hz."""
    band = trial.band
    frequency = np.round(np.linspace(*span, FREQUENCIES))
    frequency[FREQUENCIES // 2] = choices.centre
    gain, ratio = _toward_top(band, frequency)
    solution = band.solution(choices.centre)
    shares = (centre.radiated_share, centre.surface_wave_share, centre.dielectric_share, centre.copper_share)
    names = [level.value for level in trial.planned.layout.levels]
    return Portrait(
        choices.centre,
        CIRCULAR_PARTS if choices.circular else LINEAR_PARTS,
        tuple(_cut(solution, azimuth, circular=choices.circular) for azimuth in PLANES),
        _fixed(frequency),
        _decibels(gain),
        _fixed(np.round(np.minimum(ratio, LINEAR), DECIBEL_DIGITS)),
        Losses(*(round(share, SHARE_DIGITS) for share in shares)),
        current_maps(band.problem, solution.currents[:, 0], names),
        tuple(modes),
    )


def current_maps(problem: FieldProblem, current: Complex | Array, levels: Sequence[str]) -> tuple[CurrentMap, ...]:
    """Maps, one of each of the named `levels`, of `current` (n,) of the basis functions; source cells are left out."""
    mesh, basis = problem.mesh, problem.basis
    density = basis.density.T @ current
    flow_x = mesh.centroids[:, 0] * density - basis.anchor_x.T @ current
    flow_y = mesh.centroids[:, 1] * density - basis.anchor_y.T @ current
    size = np.hypot(np.abs(flow_x), np.abs(flow_y))
    size = size / size[~mesh.source].max()
    maps = []
    for number, level in enumerate(levels):
        here = (mesh.level == number) & ~mesh.source
        used, triangles = np.unique(mesh.triangles[here], return_inverse=True)
        maps.append(
            CurrentMap(
                level,
                _fixed(np.round(mesh.points[used], METRE_DIGITS)),
                triangles.reshape(-1, 3),
                _fixed(_significant(size[here])),
            )
        )
    return tuple(maps)


def _toward_top(band: BandSolution, frequency: Array) -> tuple[Array, Array]:
    """Gain as a ratio and axial ratio in dB toward the normal of the top side, (f,) each."""
    gain, ratio = np.empty(len(frequency)), np.empty(len(frequency))
    for number, each in enumerate(frequency.tolist()):
        solution = band.solution(each)
        field = far_field(solution.radiator, np.array([NORMAL]), np.zeros(1))
        gain[number] = 4.0 * math.pi * field.intensity[0] / solution.accepted_power
        ratio[number] = field.axial_ratio_db[0]
    return gain, ratio


def _cut(solution: FieldSolution, azimuth: int, *, circular: bool) -> PatternCut:
    theta = np.arange(-180.0, 180.0 + STEP, STEP)
    polar = np.clip(np.radians(np.abs(theta)), NORMAL, math.pi - NORMAL)
    around = np.full(len(theta), math.radians(azimuth))
    field = far_field(solution.radiator, polar, np.where(theta < 0.0, around + math.pi, around))
    scale = 4.0 * math.pi / solution.accepted_power
    none = (np.abs(theta) > 90.0) & solution.medium.metal_backed
    gain = _decibels(scale * field.intensity, none)
    whole = np.sum([np.abs(part) ** 2 for part in _parts(field, circular=circular)], axis=0)
    with np.errstate(invalid="ignore"):
        parts = [np.abs(part) ** 2 / whole * scale * field.intensity for part in _parts(field, circular=circular)]
    ratio = np.minimum(field.axial_ratio_db, LINEAR)
    ratio[none | (gain <= FLOOR)] = np.nan
    return PatternCut(
        float(azimuth),
        _fixed(theta),
        gain,
        _fixed(np.array([_decibels(part, none) for part in parts])),
        _fixed(np.round(ratio, DECIBEL_DIGITS)),
    )


def _parts(field: FarField, *, circular: bool) -> tuple[Complex, Complex]:
    """The two polarisations at each direction, (n,) V."""
    if circular:
        return field.circular
    cosine, sine = np.cos(field.phi), np.sin(field.phi)
    # Ludwig 1973, third definition: what a small source along x, or along y, would send there
    return field.e_theta * cosine - field.e_phi * sine, field.e_theta * sine + field.e_phi * cosine


def _significant(values: Array) -> Array:
    """Positive `values` (n,) to three significant digits; what is below 1e-9 is zero."""
    decimals = CURRENT_DIGITS - 1 - np.floor(np.log10(np.maximum(values, 1e-9))).astype(int)
    return np.array([round(value, digits) for value, digits in zip(values.tolist(), decimals.tolist(), strict=True)])


def _decibels(ratio: Array, none: NDArray[np.bool_] | None = None) -> Array:
    """Gains in dBi, no lower than the floor, NaN at `none`."""
    decibels = np.round(10.0 * np.log10(np.fmax(ratio, 10.0 ** (0.1 * FLOOR))), DECIBEL_DIGITS)
    if none is not None:
        decibels[none] = np.nan
    return _fixed(decibels)


def _fixed(values: ArrayLike) -> Array:
    array = np.array(values, dtype=np.float64)
    array.setflags(write=False)
    return array

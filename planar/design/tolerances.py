"""What differs from one made board to the next: each quantity with its range, its law and where they come from.

A tolerance is what a maker promises, so nothing lies beyond it. Within it what a process holds (permittivity,
thickness, etching) is bell-shaped, what is put together (gaps, walls) is even. Mask has its peak at the printed
thickness and thins out over the edges of copper, down to nothing: that one is lopsided. Which law fits which quantity
is common practice without a source.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray
from scipy.special import ndtr, ndtri

from planar.design.choices import Choices
from planar.library import WidebandDebye
from planar.stackup import Layer, LayerKind, Stackup, loss_tangent

Array = NDArray[np.float64]
Board = tuple[Choices, dict[str, float]]

SIGMAS = 2.0
"""Standard deviations at which a bell-shaped law ends: the tolerance (common practice, no source)."""
ASSEMBLY = 0.5e-3
"""m, what posts, warp and mouldings do to the distance of a cover or reflector (common practice, no source)."""
WALL = 0.10
"""Tolerance of a cover's thickness, a fraction (common practice, no source)."""
SOURCE = "common practice, no source"
COVER_GAP, COVER = "cover-gap", "cover"


def _bell(u: Array, ends: tuple[float, float]) -> Array:
    """Normal, its ends at two standard deviations, nothing beyond; 0 in the middle."""
    half = 0.5 * (ends[1] - ends[0])
    low, high = float(ndtr(-SIGMAS)), float(ndtr(SIGMAS))
    return np.asarray(0.5 * sum(ends) + half * ndtri(low + u * (high - low)) / SIGMAS, dtype=np.float64)


def _even(u: Array, ends: tuple[float, float]) -> Array:
    return ends[0] + u * (ends[1] - ends[0])


def _triangle(u: Array, ends: tuple[float, float]) -> Array:
    """Triangle from end to end with its peak at 0."""
    low, high = ends
    peak = -low / (high - low)
    rising = low + np.sqrt(u * (high - low) * -low)
    falling = high - np.sqrt((1.0 - u) * (high - low) * high)
    return np.where(u < peak, rising, falling)


def _either(u: Array, ends: tuple[float, float]) -> Array:
    """Half of the boards at one end, half at the other."""
    return np.where(u < 0.5, *ends)


BELL, EVEN, TRIANGLE, EITHER = "truncated-normal", "uniform", "triangular", "either-end"
LAWS: dict[str, Callable[[Array, tuple[float, float]], Array]] = {
    BELL: _bell,
    EVEN: _even,
    TRIANGLE: _triangle,
    EITHER: _either,
}
"""Name of a law -> its quantile function of u (n,) in 0 to 1 between two ends, the nominal at 0."""


@dataclass(frozen=True)
class Quantity:
    """One quantity that varies: `nominal`, smallest `low` and largest `high` value, in `unit` "m" or "", a pure number.

    `law` is a key of `LAWS`. `moves` is a key of `MOVES`: what makes the value part of a board; `layers` those moved.
    """

    name: str
    nominal: float
    low: float
    high: float
    unit: str
    law: str
    moves: str
    source: str
    layers: tuple[str, ...] = ()

    @property
    def scale(self) -> float:
        """Largest deviation either way, in the unit."""
        return max(self.high - self.nominal, self.nominal - self.low)

    @property
    def ends(self) -> tuple[float, float]:
        """Smallest and largest deviation over the scale, within -1 to 1."""
        return (self.low - self.nominal) / self.scale, (self.high - self.nominal) / self.scale

    def value(self, deviation: float) -> float:
        """The quantity at a `deviation` over the scale, in its unit."""
        return self.nominal + deviation * self.scale

    def quantile(self, u: Array) -> Array:
        """Deviation over the scale, (n,), below which the fraction `u` (n,) of all boards lies."""
        return LAWS[self.law](u, self.ends)

    def within(self, factor: float) -> Quantity:
        """The quantity with its range `factor` times as wide."""
        low, high = (self.nominal + factor * (end - self.nominal) for end in (self.low, self.high))
        return replace(self, low=low, high=high)


def varied_quantities(choices: Choices, dimensions: Mapping[str, float]) -> tuple[Quantity, ...]:
    """Everything a board of `choices` and `dimensions` (name -> m) varies in that the model sees, without what has no
    tolerance."""
    found = [
        *_laminate(choices),
        *_etching(choices),
        *_mask(choices),
        *_cover(choices),
        *_reflector(choices),
        *_via(choices, dimensions),
    ]
    return tuple(each for each in found if each.scale > 0.0)


def left_off(choices: Choices) -> tuple[Quantity, ...]:
    """The cover there or not, as often one as the other, for boards that must work both ways; none without a cover."""
    if choices.stackup.find(COVER) is None:
        return ()
    return (Quantity("cover left off", 0.0, 0.0, 1.0, "", EITHER, "left off", "asked for", (COVER,)),)


UNMODELLED = (
    ("outline", "the solver takes the slab as endless: the board's edge has no effect in it"),
    ("connector", "the reference plane is where the printed line starts; the part and its lands are left out"),
    ("finished copper thickness", "the solver takes copper as a sheet; its roughness is varied"),
    ("mask permittivity", "the library states no tolerance; the mask's thickness is varied down to nothing"),
    ("legend", "ink in patches, not solved"),
)
"""(what, why): varies on made boards and is left out here."""


def board_with(
    choices: Choices, dimensions: Mapping[str, float], quantities: Sequence[Quantity], deviations: Array
) -> Board:
    """The board of `choices` and `dimensions` (name -> m) with every one of `quantities` at its deviation (d,) over its
    scale. Those at 0 are left as they are."""
    board: Board = (choices, dict(dimensions))
    for quantity, deviation in zip(quantities, deviations.tolist(), strict=True):
        if deviation != 0.0:
            board = MOVES[quantity.moves](board, quantity, quantity.value(deviation))
    return board


def etched(choices: Choices, dimensions: Mapping[str, float], bias: float) -> dict[str, float]:
    """`dimensions`, m, where every edge of the copper has receded by `bias` m (negative: has grown outward)."""
    edges = choices.family.etched(choices.traits)
    return {name: value + edges.get(name, 0) * bias for name, value in dimensions.items()}


def _around(nominal: float, tolerance: float) -> tuple[float, float, float]:
    """Nominal, smallest and largest value at a tolerance that is a fraction."""
    return nominal, nominal * (1.0 - tolerance), nominal * (1.0 + tolerance)


def _laminate(choices: Choices) -> list[Quantity]:
    laminate, slab = choices.laminate, choices.stackup.substrate
    said = dict(laminate.sources)
    eps = slab.permittivity(choices.centre)
    rough = choices.stackup.conductor.roughness_rq

    def bell(name: str, around: tuple[float, float, float], unit: str, moves: str, key: str) -> Quantity:
        source = f"laminate {laminate.key}: {said.get(key, SOURCE)}"
        return Quantity(name, *around, unit, BELL, moves, source, (slab.name,))

    return [
        bell("laminate permittivity", _around(eps.real, slab.eps_r_tolerance), "", "permittivity", "eps_r"),
        bell("laminate loss tangent", _around(loss_tangent(eps), slab.tan_d_tolerance), "", "loss", "tan_d"),
        bell("dielectric thickness", _around(slab.thickness, slab.thickness_tolerance), "m", "thickness", "thickness"),
        bell("copper roughness", _around(rough, laminate.roughness_tolerance), "m", "roughness", "copper"),
    ]


def _etching(choices: Choices) -> list[Quantity]:
    fab = choices.fab
    source = f"fab {fab.key}: {dict(fab.sources).get('etch_tolerance', SOURCE)}"
    bias = fab.etch_tolerance
    return [Quantity("etch bias per edge", 0.0, -bias, bias, "m", BELL, "etch", source)]


def _mask(choices: Choices) -> list[Quantity]:
    layers = [layer for layer in choices.stackup.layers if layer.kind is LayerKind.MASK]
    if not layers:
        return []
    fab, printed = choices.fab, layers[0]
    source = f"fab {fab.key}: {dict(fab.sources).get('mask_thickness', SOURCE)}"
    high = printed.thickness * (1.0 + printed.thickness_tolerance)
    low = 0.0 if printed.thickness_tolerance > 0.0 else printed.thickness
    names = tuple(layer.name for layer in layers)
    return [Quantity("mask thickness", printed.thickness, low, high, "m", TRIANGLE, "thickness", source, names)]


def _cover(choices: Choices) -> list[Quantity]:
    wall = choices.stackup.find(COVER)
    if wall is None:
        return []
    eps = wall.permittivity(choices.centre)
    gap = choices.stackup.find(COVER_GAP)
    air = 0.0 if gap is None else gap.thickness
    assembled, stated = f"cover: {SOURCE}", f"{wall.material}: the library's tolerance"
    name = (wall.name,)
    ends = (max(0.0, air - ASSEMBLY), air + ASSEMBLY)
    return [
        Quantity(
            "cover permittivity", *_around(eps.real, wall.eps_r_tolerance), "", BELL, "permittivity", stated, name
        ),
        Quantity(
            "cover loss tangent", *_around(loss_tangent(eps), wall.tan_d_tolerance), "", BELL, "loss", stated, name
        ),
        Quantity("cover thickness", *_around(wall.thickness, WALL), "m", EVEN, "thickness", assembled, name),
        Quantity("cover gap", air, *ends, "m", EVEN, "cover gap", assembled, (COVER_GAP,)),
    ]


def _reflector(choices: Choices) -> list[Quantity]:
    gap = choices.stackup.find("reflector-gap")
    if gap is None:
        return []
    away = min(ASSEMBLY, 0.5 * gap.thickness)
    ends = (gap.thickness - away, gap.thickness + away)
    source = f"reflector: {SOURCE}"
    return [Quantity("reflector distance", gap.thickness, *ends, "m", EVEN, "thickness", source, (gap.name,))]


def _via(choices: Choices, dimensions: Mapping[str, float]) -> list[Quantity]:
    if "via" not in choices.traits:
        return []
    fab, drill = choices.fab, dimensions["via_drill"]
    source = f"fab {fab.key}: {dict(fab.sources).get('hole_tolerance', SOURCE)}"
    away = min(fab.hole_tolerance, 0.5 * drill)
    return [Quantity("via drill", drill, drill - away, drill + away, "m", BELL, "via", source)]


def _with_layer(board: Board, name: str, change: Callable[[Layer], Layer]) -> Board:
    choices, dimensions = board
    stackup = choices.stackup
    layers = tuple(change(layer) if layer.name == name else layer for layer in stackup.layers)
    return replace(choices, stackup=replace(stackup, layers=layers)), dimensions


def _thickness(board: Board, quantity: Quantity, value: float) -> Board:
    for name in quantity.layers:
        board = _with_layer(board, name, lambda layer: replace(layer, thickness=value))
    return board


def _permittivity(board: Board, quantity: Quantity, value: float) -> Board:
    choices, dimensions = board
    (name,) = quantity.layers
    return replace(choices, stackup=choices.stackup.varied(name, permittivity=value / quantity.nominal)), dimensions


def _loss(board: Board, quantity: Quantity, value: float) -> Board:
    """The loss tangent of a layer at the middle of the band, its permittivity there as it is."""
    centre = board[0].centre
    (name,) = quantity.layers

    def lossier(layer: Layer) -> Layer:
        real = layer.permittivity(centre).real
        return replace(layer, model=WidebandDebye.from_point(real, value, at=centre))

    return _with_layer(board, name, lossier)


def _cover_gap(board: Board, quantity: Quantity, value: float) -> Board:
    """The air below the cover; where the cover touches by design there is no such layer yet."""
    choices, dimensions = board
    stackup = choices.stackup
    if stackup.find(COVER_GAP) is not None:
        return _thickness(board, quantity, value)
    place = next(number for number, layer in enumerate(stackup.layers) if layer.name == COVER)
    air = Layer(COVER_GAP, LayerKind.AIR, "air", value, WidebandDebye.from_point(1.0, 0.0, at=1e9))
    layers = (*stackup.layers[:place], air, *stackup.layers[place:])
    return replace(choices, stackup=replace(stackup, layers=layers)), dimensions


def _left_off(board: Board, quantity: Quantity, value: float) -> Board:
    """The cover's wall on its way to air, which it is at 1."""
    centre = board[0].centre

    def thinner(layer: Layer) -> Layer:
        eps = layer.permittivity(centre)
        real = 1.0 + (1.0 - value) * (eps.real - 1.0)
        return replace(layer, model=WidebandDebye.from_point(real, (1.0 - value) * loss_tangent(eps), at=centre))

    return _with_layer(board, COVER, thinner)


def _roughness(board: Board, quantity: Quantity, value: float) -> Board:
    choices, dimensions = board
    rough: Stackup = replace(choices.stackup, conductor=replace(choices.stackup.conductor, roughness_rq=value))
    return replace(choices, stackup=rough), dimensions


def _etch(board: Board, quantity: Quantity, value: float) -> Board:
    choices, dimensions = board
    return choices, etched(choices, dimensions, value)


def _drill(board: Board, quantity: Quantity, value: float) -> Board:
    """Another hole in the same pad."""
    choices, dimensions = board
    wider = value - quantity.nominal
    moved = {"via_drill": dimensions["via_drill"] + wider, "via_ring": dimensions["via_ring"] - 0.5 * wider}
    return choices, dimensions | moved


MOVES: dict[str, Callable[[Board, Quantity, float], Board]] = {
    "permittivity": _permittivity,
    "loss": _loss,
    "thickness": _thickness,
    "etch": _etch,
    "cover gap": _cover_gap,
    "left off": _left_off,
    "roughness": _roughness,
    "via": _drill,
}
"""Key of what a quantity moves -> the board with the quantity at a value in its unit."""

"""What lies on what, bottom to top, and what a copper level sees below and above itself.

Interfaces are numbered bottom to top. A reflector lies below the bottom side, a cover above the top side. The
electrical view treats copper as having no thickness: mask lies flat on the dielectric beside the traces.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from enum import StrEnum

from planar.errors import GeometryError
from planar.library import WidebandDebye


class LayerKind(StrEnum):
    """What a layer is."""

    METAL_PLANE = "metal-plane"
    AIR = "air"
    MASK = "mask"
    COPPER = "copper"
    DIELECTRIC = "dielectric"
    COVER = "cover"
    LEGEND = "legend"


_BOARD = (LayerKind.COPPER, LayerKind.DIELECTRIC)
_ELECTRICAL = (LayerKind.AIR, LayerKind.MASK, LayerKind.DIELECTRIC, LayerKind.COVER)


@dataclass(frozen=True)
class Layer:
    """One layer; `name` is unique in a stackup.

    `thickness` in m (0 for legend, which lies in patches, and for the metal plane), its tolerance and those of
    permittivity and loss tangent as fractions. `model` is None for metal and legend.
    """

    name: str
    kind: LayerKind
    material: str
    thickness: float
    model: WidebandDebye | None = None
    thickness_tolerance: float = 0.0
    eps_r_tolerance: float = 0.0
    tan_d_tolerance: float = 0.0

    def permittivity(self, frequency: float) -> complex:
        """Relative permittivity eps' - j eps'' at `frequency` (Hz).

        Raises `GeometryError` for a layer that has none (metal, legend) and `RangeError` outside the model's range.
        """
        if self.model is None:
            raise GeometryError(f"layer {self.name} ({self.kind}) has no permittivity")
        return self.model.permittivity(frequency)


def loss_tangent(permittivity: complex) -> float:
    """eps''/eps' of a passive `permittivity` eps' - j eps''."""
    return abs(permittivity.imag) / permittivity.real


@dataclass(frozen=True)
class Slab:
    """Uniform dielectric: `thickness` in m, complex relative permittivity `eps_r` = eps' - j eps''."""

    thickness: float
    eps_r: complex


@dataclass(frozen=True)
class SlabStack:
    """Slabs on one side of a copper level, nearest first; behind the last one metal or open air."""

    slabs: tuple[Slab, ...]
    metal_backed: bool


@dataclass(frozen=True)
class Conductor:
    """The copper: foil `base_thickness` and added `plating` in m, `conductivity` in S/m, rms `roughness_rq` in m."""

    base_thickness: float
    plating: float
    conductivity: float
    roughness_rq: float

    @property
    def finished_thickness(self) -> float:
        """Foil and plating, m."""
        return self.base_thickness + self.plating


@dataclass(frozen=True)
class Stackup:
    """Layers bottom to top. Made by `build_stackup`.

    `board_tolerance` is the fab's tolerance of the total thickness, as a fraction.
    """

    layers: tuple[Layer, ...]
    conductor: Conductor
    board_tolerance: float

    @property
    def levels(self) -> tuple[str, ...]:
        """Copper levels bottom to top: ("bottom", "top"), or ("top",) where there is one."""
        names = tuple(layer.name for layer in self.layers if layer.kind is LayerKind.COPPER)
        return tuple(name.removeprefix("copper-") for name in names)

    @property
    def base_copper(self) -> float:
        """Foil thickness, m."""
        return self.conductor.base_thickness

    @property
    def finished_copper(self) -> float:
        """Thickness of the copper with its plating, m."""
        return self.conductor.finished_thickness

    @property
    def substrate(self) -> Layer:
        """The dielectric of the board."""
        return next(layer for layer in self.layers if layer.kind is LayerKind.DIELECTRIC)

    @property
    def total_thickness(self) -> float:
        """Board with copper, without mask, m: what a Gerber job file calls the board thickness."""
        return sum(layer.thickness for layer in self.layers if layer.kind in _BOARD)

    @property
    def masked_thickness(self) -> float:
        """Board with copper and mask, m."""
        return self.total_thickness + sum(layer.thickness for layer in self.layers if layer.kind is LayerKind.MASK)

    def find(self, name: str) -> Layer | None:
        """Layer of that name, None if the stackup has none."""
        return next((layer for layer in self.layers if layer.name == name), None)

    def varied(self, name: str, *, thickness: float = 1.0, permittivity: float = 1.0) -> Stackup:
        """The stackup with thickness and permittivity of the layer `name` times these factors.

        Raises `GeometryError` if there is no such layer or it has no permittivity to vary.
        """
        layer = self.find(name)
        if layer is None or (layer.model is None and permittivity != 1.0):
            raise GeometryError(f"no layer {name!r} whose permittivity could vary")
        model = layer.model if layer.model is None else layer.model.scaled(permittivity)
        changed = replace(layer, thickness=layer.thickness * thickness, model=model)
        return replace(self, layers=tuple(changed if each is layer else each for each in self.layers))

    def dielectrics_below(self, level: str, frequency: float) -> SlabStack:
        """What lies below the copper `level` at `frequency` (Hz), nearest first.

        Raises `GeometryError` if there is no such level, `RangeError` outside the range of a layer's model.
        """
        return _slab_stack(self.layers[: self._index(level)][::-1], frequency)

    def dielectrics_above(self, level: str, frequency: float) -> SlabStack:
        """What lies above the copper `level` at `frequency` (Hz), nearest first.

        Raises `GeometryError` if there is no such level, `RangeError` outside the range of a layer's model.
        """
        return _slab_stack(self.layers[self._index(level) + 1 :], frequency)

    def _index(self, level: str) -> int:
        for index, layer in enumerate(self.layers):
            if layer.name == f"copper-{level}":
                return index
        raise GeometryError(f"no copper level {level!r}; there are: {', '.join(self.levels)}")


def _slab_stack(layers: tuple[Layer, ...], frequency: float) -> SlabStack:
    slabs = tuple(Slab(layer.thickness, layer.permittivity(frequency)) for layer in layers if layer.kind in _ELECTRICAL)
    return SlabStack(slabs, metal_backed=any(layer.kind is LayerKind.METAL_PLANE for layer in layers))

"""What lies on what: board, mask, cover and reflector, with complex permittivity at any frequency."""

from planar.stackup.build import BoardChoice, CoverChoice, Surroundings, build_stackup
from planar.stackup.layers import Conductor, Layer, LayerKind, Slab, SlabStack, Stackup, loss_tangent

__all__ = [
    "BoardChoice",
    "Conductor",
    "CoverChoice",
    "Layer",
    "LayerKind",
    "Slab",
    "SlabStack",
    "Stackup",
    "Surroundings",
    "build_stackup",
    "loss_tangent",
]

"""Laminates, fabs, connectors, cover materials and antenna families, as frozen records read from TOML."""

from planar.library.dispersion import WidebandDebye
from planar.library.families import Family
from planar.library.inline import inline_laminate
from planar.library.records import Body, Connector, Cover, Fab, GroundTab, Laminate, LandHole, LandPad, Panelling
from planar.library.store import KINDS, Library

__all__ = [
    "KINDS",
    "Body",
    "Connector",
    "Cover",
    "Fab",
    "Family",
    "GroundTab",
    "Laminate",
    "LandHole",
    "LandPad",
    "Library",
    "Panelling",
    "WidebandDebye",
    "inline_laminate",
]

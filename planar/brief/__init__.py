"""The brief: one TOML file that says what antenna is wanted, validated and in SI."""

from planar.brief.measures import KnownKeys
from planar.brief.model import (
    Antenna,
    Board,
    Brief,
    CoverSpec,
    InlineLaminate,
    InlineMaterial,
    Make,
    Reflector,
    Surroundings,
    Target,
)
from planar.brief.reading import check_brief, parse_brief, read_brief
from planar.brief.writing import starter_brief, write_brief

__all__ = [
    "Antenna",
    "Board",
    "Brief",
    "CoverSpec",
    "InlineLaminate",
    "InlineMaterial",
    "KnownKeys",
    "Make",
    "Reflector",
    "Surroundings",
    "Target",
    "check_brief",
    "parse_brief",
    "read_brief",
    "starter_brief",
    "write_brief",
]

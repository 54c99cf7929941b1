"""Who made a fabrication file, for which project, when: the attributes every file of a set shares.

Nothing here depends on the clock or the machine, so that two runs give the same bytes: the date is that of
SOURCE_DATE_EPOCH or a fixed one, the identifiers follow from the design's hash. Authority: the Gerber layer format
specification, revision 2023.08 (attributes), and RFC 4122 (identifiers in the form of version 4).
"""

from __future__ import annotations

import os
import re
import uuid
from collections.abc import Mapping
from dataclasses import dataclass
from datetime import UTC, datetime

from planar import __version__
from planar.copper.layout import Kind
from planar.errors import HandoffError

FIXED_DATE = "2000-01-01T00:00:00+00:00"
"""Date of files where the environment names none."""
_HASH = re.compile(r"[0-9a-f]{32,}")
_ESCAPE = re.compile(r"\\u([0-9A-Fa-f]{4})")
_SPECIAL = frozenset("%*,\\")

PARTS = {Kind.SINGLE: "Single", Kind.ARRAY: "Array", Kind.COUPON: "Coupon"}
"""Kind of a layout -> value of the file attribute `.Part`."""

Fields = tuple[str, ...]
"""The fields of an attribute, as meant, not as written."""


@dataclass(frozen=True)
class ProjectFacts:
    """What identifies a set of fabrication files.

    `design_hash` is a hash of the design in lower-case hexadecimal digits, 32 or more; `created` an ISO 8601 date
    with zone, see `creation_date`. Raises `HandoffError` for others.
    """

    name: str
    revision: str
    design_hash: str
    created: str

    def __post_init__(self) -> None:
        if not _HASH.fullmatch(self.design_hash):
            raise HandoffError(f"design hash {self.design_hash!r}, expected 32 or more hexadecimal digits")
        try:
            zone = datetime.fromisoformat(self.created).tzinfo
        except ValueError:
            zone = None
        if zone is None:
            raise HandoffError(f"creation date {self.created!r}, expected ISO 8601 with zone such as {FIXED_DATE}")

    @property
    def guid(self) -> str:
        """Identifier of the project in the form of RFC 4122 version 4, the same for the same hash."""
        return str(uuid.UUID(hex=self.design_hash[:32], version=4))

    @property
    def software(self) -> Fields:
        """Vendor, application and version of what wrote the files."""
        return "planar", "planar", __version__


def creation_date() -> str:
    """Date of the files, ISO 8601 in UTC: SOURCE_DATE_EPOCH (seconds since 1970) of the environment, or a fixed date.

    Raises `HandoffError` where the variable holds something else.
    """
    seconds = os.environ.get("SOURCE_DATE_EPOCH")
    if seconds is None:
        return FIXED_DATE
    try:
        return datetime.fromtimestamp(int(seconds), UTC).isoformat()
    except (ValueError, OverflowError, OSError) as error:
        raise HandoffError(f"SOURCE_DATE_EPOCH is {seconds!r}, expected seconds since 1970") from error


def file_attributes(
    project: ProjectFacts, function: Fields, polarity: str, *, kind: Kind = Kind.SINGLE
) -> dict[str, Fields]:
    """Attributes of a file of a layout of `kind` by name, in the order they are written; `function` such as
    ("Copper", "L1", "Top")."""
    return {
        ".GenerationSoftware": project.software,
        ".CreationDate": (project.created,),
        ".ProjectId": (project.name, project.guid, project.revision),
        ".Part": (PARTS[kind],),
        ".SameCoordinates": (project.design_hash[:16],),
        ".FileFunction": function,
        ".FilePolarity": (polarity,),
    }


def attribute_text(name: str, fields: Fields) -> str:
    """Name and fields as a command carries them, in ASCII."""
    return ",".join([name, *(escaped(field) for field in fields)])


def attribute_fields(text: str) -> tuple[str, Fields]:
    """Name and fields of what `attribute_text` wrote."""
    name, *fields = text.split(",")
    return name, tuple(unescaped(field) for field in fields)


def escaped(field: str) -> str:
    r"""`field` in printable ASCII: what syntax or other alphabets forbid is written as \uXXXX.

    Characters above U+FFFF become two of them, as in JSON.
    """
    return "".join(c if c.isascii() and c.isprintable() and c not in _SPECIAL else _escape(c) for c in field)


def unescaped(field: str) -> str:
    """The text that `escaped` was given."""
    units = _ESCAPE.sub(lambda match: chr(int(match[1], 16)), field)
    return units.encode("utf-16-be", "surrogatepass").decode("utf-16-be", "replace")


def _escape(character: str) -> str:
    units = character.encode("utf-16-be")
    return "".join(f"\\u{units[i : i + 2].hex().upper()}" for i in range(0, len(units), 2))


def attribute_mismatches(got: Mapping[str, Fields], expected: Mapping[str, Fields]) -> list[str]:
    """What differs between two sets of file attributes; the signature `.MD5` belongs to the bytes and is left out."""
    names = [*expected, *(name for name in got if name not in expected and name != ".MD5")]
    shown = {name: [",".join(side[name]) if name in side else "missing" for side in (got, expected)] for name in names}
    return [f"{name} {here}, expected {right}" for name, (here, right) in shown.items() if here != right]

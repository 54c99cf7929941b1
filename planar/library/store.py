"""Where library entries are found: the user's folder first, then the shipped templates.

An entry is one TOML file `<kind>/<key>.toml`. A file is read when it is asked for, not before, so a slip in one
entry does not keep the others from use.
"""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path
from typing import Self

from planar.errors import Fault, LibraryError
from planar.library.entries import read_connector, read_cover, read_fab, read_laminate
from planar.library.families import Family, read_family
from planar.library.reading import nearest, parse
from planar.library.records import Connector, Cover, Fab, Laminate

KINDS: dict[str, str] = {
    "laminates": "laminate",
    "fabs": "fab",
    "connectors": "connector",
    "covers": "cover",
    "families": "family",
}
"""Folder of each kind of entry -> what one entry is called."""


@dataclass(frozen=True)
class Library:
    """Entries of the `folders`, the first folder that has a key wins. Made by `Library.open`."""

    folders: tuple[Path, ...]

    @classmethod
    def open(cls, user_folder: Path | None = None) -> Self:
        """Library of the shipped templates, with `user_folder` (same layout) searched first.

        Raises `LibraryError` if `user_folder` holds none of the folders in `KINDS`.
        """
        if user_folder is None:
            return cls((_shipped(),))
        if not any((user_folder / kind).is_dir() for kind in KINDS):
            expected = f"a folder with at least one of {', '.join(KINDS)} in it is needed"
            raise LibraryError([Fault("library", "folder", str(user_folder), expected)])
        return cls((user_folder, _shipped()))

    def keys(self, kind: str) -> list[str]:
        """Sorted keys of all entries of `kind`, a key of `KINDS`."""
        _check_kind(kind)
        return sorted({path.stem for folder in self.folders for path in (folder / kind).glob("*.toml")})

    def source(self, kind: str, key: str) -> Path:
        """File that the entry `key` of `kind` is read from.

        Raises `LibraryError` with the nearest and all valid keys if there is none.
        """
        known = self.keys(kind)
        if key not in known:
            expected = f"no such {KINDS[kind]}{nearest(key, known)}; there are: {', '.join(known) or 'none'}"
            raise LibraryError([Fault("library", KINDS[kind], f'"{key}"', expected)])
        return next(path for folder in self.folders if (path := folder / kind / f"{key}.toml").is_file())

    def laminate(self, key: str) -> Laminate:
        """Laminate of that key. Raises `LibraryError` if it is missing or malformed."""
        path = self.source("laminates", key)
        return read_laminate(key, parse(path), str(path))

    def fab(self, key: str) -> Fab:
        """Fab of that key. Raises `LibraryError` if it is missing or malformed."""
        path = self.source("fabs", key)
        return read_fab(key, parse(path), str(path))

    def connector(self, key: str) -> Connector:
        """Connector of that key. Raises `LibraryError` if it is missing or malformed."""
        path = self.source("connectors", key)
        return read_connector(key, parse(path), str(path))

    def cover(self, key: str) -> Cover:
        """Cover material of that key. Raises `LibraryError` if it is missing or malformed."""
        path = self.source("covers", key)
        return read_cover(key, parse(path), str(path))

    def family(self, key: str) -> Family:
        """Antenna family of that key. Raises `LibraryError` if it is missing or malformed."""
        path = self.source("families", key)
        return read_family(key, parse(path), str(path))


def _check_kind(kind: str) -> None:
    if kind not in KINDS:
        raise LibraryError([Fault("library", "kind", f'"{kind}"', f"one of {', '.join(KINDS)}{nearest(kind, KINDS)}")])


def _shipped() -> Path:
    """Templates inside the installed package, or beside the package in a checkout."""
    package = Path(__file__).resolve().parents[1]
    for folder in (package / "templates", package.parent / "templates"):
        if folder.is_dir():
            return folder
    raise LibraryError([Fault("library", "templates", str(package), "the installation is incomplete: no templates")])

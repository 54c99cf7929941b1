"""Files no reader is written for (pages, pictures, the drawing): written once more and compared byte for byte.

They depend on their arguments alone, so a difference is a fault in the file. What does not belong into a folder is
looked for here too: a stale file is built from as readily as a right one.
"""

from __future__ import annotations

import tempfile
from collections.abc import Callable, Collection, Iterator
from pathlib import Path


def fresh_mismatches(folder: Path, write: Callable[[Path], None]) -> list[str]:
    """Files that `write(fresh)` puts into an empty folder and that are missing or others in `folder`."""
    with tempfile.TemporaryDirectory() as fresh:
        write(Path(fresh))
        right = {path.name: path.read_bytes() for path in sorted(Path(fresh).iterdir())}
    return [text for name, content in right.items() for text in _differences(folder / name, content)]


def stale_mismatches(folder: Path, expected: Collection[str]) -> list[str]:
    """Everything in `folder` whose name is not among those `expected`."""
    names = {path.relative_to(folder).as_posix() for path in folder.rglob("*")}
    return [f"{name}: does not belong here" for name in sorted(names - set(expected))]


def _differences(path: Path, right: bytes) -> Iterator[str]:
    try:
        got = path.read_bytes()
    except OSError as error:
        yield f"{path.name} cannot be read: {error.strerror}"
        return
    if got != right:
        yield f"{path.name}: {_first_difference(got, right)}"


def _first_difference(got: bytes, right: bytes) -> str:
    """The first line that differs, or no more than that something does where the file is no text."""
    try:
        here, expected = got.decode("utf-8").splitlines(), right.decode("utf-8").splitlines()
    except ValueError:
        return "other bytes than are written for this layout"
    pairs = zip([*here, *[""] * len(expected)], [*expected, *[""] * len(here)], strict=True)
    for a, b in pairs:
        if a != b:
            return f"{a.strip()[:200]!r}, expected {b.strip()[:200]!r}"
    return "other line ends than are written for this layout"

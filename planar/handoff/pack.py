"""The result folder, replaced whole or not at all.

Everything is written into a folder beside the destination; only when all of it is there is the old
folder moved aside and the new one renamed into its place. `SHA256SUMS` lists what is ours: a folder
without it, with other files in it, or with files changed since, belongs to the user and is refused.
"""

from __future__ import annotations

import hashlib
import shutil
import tempfile
import zipfile
from collections import Counter
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

from planar.errors import HandoffError

MANIFEST = "SHA256SUMS"
"""Name of the list of our files, in the format `sha256sum -c` reads."""


ZIP_DATE = (1980, 1, 1, 0, 0, 0)
"""The first date an archive can hold: that of a file says nothing."""


@contextmanager
def packed(destination: Path) -> Iterator[Path]:
    """A folder to write into, which becomes `destination` when the block ends without an exception.

    On any exception the folder vanishes and an earlier result stays as it was. Raises `HandoffError` when
    the destination holds files that are not ours, or when the folder cannot be written.
    """
    destination = destination.absolute()
    _refuse_foreign(destination)
    created = [p for p in destination.parents if not p.exists()]  # innermost first
    try:
        destination.parent.mkdir(parents=True, exist_ok=True)
        # only its owner may enter the outer folder, the inner one gets everyday permissions
        work = Path(tempfile.mkdtemp(prefix=f".{destination.name}-", dir=destination.parent))
    except OSError as error:
        raise HandoffError(f"cannot write into {destination.parent}: {error.strerror}") from error
    try:
        fresh = work / "new"
        fresh.mkdir()
        yield fresh
        write_manifest(fresh)
        _swap(fresh, destination, aside=work / "old")
    except BaseException as error:
        shutil.rmtree(work / "new", ignore_errors=True)
        _remove_empty([work, *created])  # never the old result, should it have to stay aside
        if isinstance(error, OSError):
            raise HandoffError(f"cannot write {destination}: {error}") from error
        raise
    _remove_aside(work, destination)


@contextmanager
def renewed(pack: Path) -> Iterator[Path]:
    """A copy of the pack at `pack` to change, which takes its place when the block ends without an exception.

    Raises `HandoffError` as `packed`.
    """
    with packed(pack) as fresh:
        if pack.is_dir():
            shutil.copytree(pack, fresh, dirs_exist_ok=True, ignore=shutil.ignore_patterns(MANIFEST))
        yield fresh


@contextmanager
def extended(pack: Path, part: str) -> Iterator[Path]:
    """An empty folder `part` to write into, which joins the pack at `pack` when the block ends without an exception.

    The rest of the pack stays as it is, an earlier `part` is replaced. Raises `HandoffError` as `packed`.
    """
    with renewed(pack) as fresh:
        shutil.rmtree(fresh / part, ignore_errors=True)
        (fresh / part).mkdir()
        yield fresh / part


def check_destination(destination: Path) -> None:
    """Raise `HandoffError` where `packed` would refuse `destination`: worth asking before long work."""
    destination = destination.absolute()
    _refuse_foreign(destination)
    nearest = next(parent for parent in destination.parents if parent.exists())
    try:
        Path(tempfile.mkdtemp(prefix=f".{destination.name}-", dir=nearest)).rmdir()
    except OSError as error:
        raise HandoffError(f"cannot write into {destination.parent}: {error.strerror}") from error


def _swap(fresh: Path, destination: Path, *, aside: Path) -> None:
    """Put `fresh` in the place of `destination`, whose earlier content moves `aside`; undone when it fails."""
    _refuse_foreign(destination)  # again: hours may have passed
    replaced = destination.exists()
    if replaced:
        destination.rename(aside)
    try:
        fresh.rename(destination)
    except BaseException:
        if replaced:
            aside.rename(destination)
        raise


def _remove_aside(work: Path, destination: Path) -> None:
    try:
        shutil.rmtree(work)
    except OSError as error:
        raise HandoffError(f"{destination} is written, but {work} cannot be removed: {error.strerror}") from error


def _remove_empty(folders: list[Path]) -> None:
    for folder in folders:
        if not folder.is_dir() or any(folder.iterdir()):
            return
        folder.rmdir()


def is_pack(folder: Path) -> bool:
    """Whether `folder` holds a result of ours: it has the list of its files."""
    return (folder / MANIFEST).is_file()


def file_hashes(folder: Path) -> dict[str, str]:
    """Path relative to `folder` -> SHA-256 of every file in it but the list of them, sorted by path."""
    return {name: _hash(path) for name, path in _files(folder).items() if name != MANIFEST}


def write_manifest(folder: Path) -> None:
    """Write `SHA256SUMS`: hash and path of every other file in `folder`, sorted by path."""
    lines = [f"{digest}  {name}\n" for name, digest in file_hashes(folder).items()]
    (folder / MANIFEST).write_bytes("".join(lines).encode("utf-8"))


def write_zip(folder: Path, path: Path) -> None:
    """Write every file of `folder` into the archive `path`, sorted, with one date: the same files, the same bytes."""
    with zipfile.ZipFile(path, "w", zipfile.ZIP_DEFLATED, compresslevel=9) as archive:
        for name, file in _files(folder).items():
            entry = zipfile.ZipInfo(name, ZIP_DATE)
            entry.compress_type = zipfile.ZIP_DEFLATED
            entry.external_attr = 0o644 << 16
            archive.writestr(entry, file.read_bytes())


def check_zip(folder: Path, path: Path) -> None:
    """Raise `HandoffError` naming what is wrong unless the archive `path` holds the files of `folder`, each once, and
    no others."""
    try:
        with zipfile.ZipFile(path) as archive:
            names = archive.namelist()
            held = {name: archive.read(name) for name in names}
    except (OSError, zipfile.BadZipFile) as error:
        raise HandoffError(f"{path.name} cannot be read as an archive: {error}") from error
    right = {name: file.read_bytes() for name, file in _files(folder).items()}
    wrong = [
        *(f"lacks {name}" for name in right if name not in held),
        *(f"holds {name}, which is not there" for name in held if name not in right),
        *(f"holds another {name}" for name in held if name in right and held[name] != right[name]),
        *(f"holds {name} {count} times" for name, count in Counter(names).items() if count > 1),
    ]
    if wrong:
        raise HandoffError(f"{path.name} does not hold the files of {folder.name}: {'; '.join(wrong)}")


def read_manifest(folder: Path) -> dict[str, str]:
    """Path relative to `folder` -> SHA-256 as `SHA256SUMS` lists them. Raises `HandoffError` when it is none."""
    try:
        lines = (folder / MANIFEST).read_text(encoding="utf-8").splitlines()
        pairs = [line.split("  ", 1) for line in lines]
        return {name: digest for digest, name in pairs}
    except (OSError, ValueError) as error:
        raise HandoffError(f"{folder / MANIFEST} cannot be read: {error}") from error


def check_manifest(folder: Path) -> None:
    """Raise `HandoffError` naming what is wrong unless `folder` holds every file its `SHA256SUMS` lists, as listed, and
    nothing beside."""
    listed, files = read_manifest(folder), _files(folder)
    wrong = [
        *(f"{name}: listed, but not there" for name in listed if name not in files),
        *(f"{name}: there, but not listed" for name in files if name not in listed and name != MANIFEST),
        *(
            f"{n}: changed since it was listed"
            for n in sorted(listed.keys() & files)
            if not _is_ours(files[n], listed[n])
        ),
    ]
    if wrong:
        raise HandoffError("\n".join([f"{folder / MANIFEST} does not agree with the folder:", *wrong]))


def _files(folder: Path) -> dict[str, Path]:
    """Everything in `folder` but plain folders, by relative path, sorted."""
    paths = [p for p in folder.rglob("*") if p.is_symlink() or not p.is_dir()]
    return dict(sorted((p.relative_to(folder).as_posix(), p) for p in paths))


def _hash(path: Path) -> str:
    return hashlib.sha256(path.read_bytes()).hexdigest()


def _refuse_foreign(destination: Path) -> None:
    """Raise `HandoffError` when something is at `destination` that this program did not write."""
    if destination.is_symlink() or (destination.exists() and not destination.is_dir()):
        raise HandoffError(f"{destination} is no folder: move it away or choose another name")
    if not destination.exists():
        return
    files = _files(destination)
    if not files:
        return
    if MANIFEST not in files:
        raise HandoffError(f"{destination} holds files and no {MANIFEST}, so it is not ours to replace: move it away")
    listed = read_manifest(destination)
    foreign = [name for name, path in files.items() if name != MANIFEST and not _is_ours(path, listed.get(name))]
    if foreign:
        names = ", ".join(foreign[:5]) + (f" and {len(foreign) - 5} more" if len(foreign) > 5 else "")
        raise HandoffError(f"{destination} holds files added or changed since it was written: {names}; move them away")


def _is_ours(path: Path, digest: str | None) -> bool:
    return digest is not None and path.is_file() and not path.is_symlink() and _hash(path) == digest

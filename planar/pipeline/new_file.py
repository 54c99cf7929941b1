"""Files the user names himself: written once, never over what is there."""

from __future__ import annotations

from pathlib import Path

from planar.errors import HandoffError


def check_new(path: Path) -> None:
    """Raise `HandoffError` where there is something at `path` already: known before long work, not after it."""
    if path.exists():
        raise _there(path)


def write_new(text: str, path: Path) -> None:
    """Write `text` to `path`. Raises `HandoffError` where there is something already, or where it cannot be written."""
    try:
        with path.open("x", encoding="utf-8") as file:
            file.write(text)
    except FileExistsError as error:
        raise _there(path) from error
    except OSError as error:
        raise HandoffError(f"cannot write {path}: {error.strerror}") from error


def _there(path: Path) -> HandoffError:
    return HandoffError(f"{path} exists already: choose another name or remove it")

"""The nearest of the names that would have been right."""

from __future__ import annotations

import difflib
from collections.abc import Iterable


def nearest(name: str, known: Iterable[str]) -> str | None:
    """The one of `known` most like `name`, hyphens, underscores and case aside; None when none is like it.

    Where nothing is spelt alike, the first of `known` that begins with `name` is taken ("fr4" for "fr4-general").
    """
    wanted = _plain(name)
    plain = {_plain(candidate): candidate for candidate in known}
    matches = difflib.get_close_matches(wanted, plain, n=1, cutoff=0.6)
    matches = matches or [candidate for candidate in plain if wanted and candidate.startswith(wanted)]
    return plain[matches[0]] if matches else None


def did_you_mean(name: str, known: Iterable[str]) -> str:
    """`; did you mean "..."?` with the nearest of `known`, or an empty text."""
    near = nearest(name, known)
    return f'; did you mean "{near}"?' if near is not None else ""


def _plain(name: str) -> str:
    return name.lower().replace("-", "_").replace(" ", "_")

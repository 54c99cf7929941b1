"""Pictures on the page: SVG texts made fit to stand beside each other in one document.

A picture comes as a document of its own. Its prolog and metadata go, its ids and its style rules get the picture's name
in front, so that two of them cannot meet; one that would fetch something from elsewhere or run a script is refused.
"""

from __future__ import annotations

import re
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from itertools import groupby
from typing import Any

from markupsafe import Markup

from planar.errors import HandoffError
from planar.report.page_files import page_table

NARROW = "-narrow"
"""Behind the name of a picture: the one of it for a narrow screen."""
_PROLOG = re.compile(r"^.*?(?=<svg[\s>])", re.DOTALL)
_METADATA = re.compile(r"<metadata>.*?</metadata>|<!--.*?-->", re.DOTALL)
_STYLE = re.compile(r"(<style\b[^>]*>)(.*?)(</style>)", re.DOTALL)
_RULE = re.compile(r"([^{}@]+)(\{[^{}]*\})")
_ID = re.compile(r'(\s(?:id|aria-labelledby|aria-describedby)=")([^"]+)"')
_REFERENCE = re.compile(r'(url\(["\']?#|\s(?:xlink:)?href="#)')
_FOREIGN = re.compile(
    r"""(?:href|src)\s*=\s*["'](?!\#|data:)|url\(["']?(?!\#|data:)|@import|<script|<[^<>]*\son\w+\s*=""", re.IGNORECASE
)


@dataclass(frozen=True)
class Picture:
    """A picture with its words: `svg` is markup, `alt` is what a reader who cannot see it is told; `anchor` is its id
    on the page; `row` names what it is laid out with; `wide` takes the whole width, `half` half a column; `screen` is
    "narrow" or "roomy" where there is one for each, else empty.
    """

    name: str
    anchor: str
    section: str
    title: str
    caption: str
    alt: str
    svg: Markup
    row: str = ""
    wide: bool = False
    half: bool = False
    screen: str = ""


def placed(pictures: Mapping[str, str], prefix: str = "") -> tuple[Picture, ...]:
    """The `pictures` (name -> SVG text) in the order of pictures.toml, `prefix` in front of their ids.

    Raises `HandoffError` for a name that has no place there, and for a picture that is no SVG or not self-contained.
    """
    rows = page_table("pictures.toml")["picture"]
    pairs = [(row, name) for row in rows for name in pictures if name.split("-")[0] in row["names"]]
    homeless = sorted(set(pictures) - {name for _, name in pairs})
    if homeless:
        raise HandoffError(f"the page has no place for the picture {', '.join(homeless)}")
    return tuple(_placed(row, name, prefix, pictures) for row, name in pairs)


def laid_out(pictures: Sequence[Picture]) -> list[list[Picture]]:
    """The `pictures` in rows, each to be balanced in two columns: a picture that would stand alone in its row joins the
    next one, in the last row the one before."""
    rows: list[list[Picture]] = []
    for _, group in groupby(pictures, key=lambda each: each.row):
        own = list(group)
        if rows and len(rows[-1]) == 1:
            rows[-1] += own
        else:
            rows.append(own)
    if len(rows) > 1 and len(rows[-1]) == 1:
        rows[-2] += rows.pop()
    return rows


def _placed(row: Mapping[str, Any], name: str, prefix: str, pictures: Mapping[str, str]) -> Picture:
    words = {key: value for key, value in row.items() if key not in ("names", "titles")}
    which = name.removesuffix(NARROW).partition("-")[2]
    words["title"] = row.get("titles", {}).get(which, f"{row['title']}, {which}" if which else row["title"])
    words["screen"] = "narrow" if name.endswith(NARROW) else "roomy" if name + NARROW in pictures else ""
    return Picture(name, f"picture-{prefix}{name}", **words, svg=Markup(inline_svg(pictures[name], prefix + name)))


def inline_svg(text: str, name: str) -> str:
    """The SVG `text` as a part of an HTML page, everything in it that has a name prefixed with `name`.

    Raises `HandoffError` when it is no SVG, fetches something, or runs a script.
    """
    if "<svg" not in text:
        raise HandoffError(f"the picture {name} is no SVG")
    bare = _METADATA.sub("", _PROLOG.sub("", text, count=1)).strip()
    if _FOREIGN.search(bare):
        raise HandoffError(f"the picture {name} is not self-contained")
    named = _ID.sub(lambda m: f'{m[1]}{" ".join(f"{name}-{each}" for each in m[2].split())}"', bare)
    named = _REFERENCE.sub(lambda m: f"{m[1]}{name}-", named)
    return _STYLE.sub(lambda m: m[1] + _RULE.sub(lambda r: _scoped(r, name), m[2]) + m[3], named)


def _scoped(rule: re.Match[str], name: str) -> str:
    """A style rule that holds inside the figure of the picture only."""
    selectors = ", ".join(f"#picture-{name} {each.strip()}" for each in rule[1].split(","))
    return f"{selectors} {rule[2]}"

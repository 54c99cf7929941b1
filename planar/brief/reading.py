"""Reading a brief: file, TOML, model, and every fault in plain words.

A file that is no readable TOML gives one fault with its line, since nothing behind that line can
be trusted. From there on all faults are found before any is reported.
"""

from __future__ import annotations

import re
import tomllib
from collections.abc import Mapping
from pathlib import Path
from typing import Any

from pydantic import ValidationError

from planar.brief.faults import faults_of, one_line
from planar.brief.measures import KnownKeys
from planar.brief.model import Brief
from planar.brief.nearest import nearest
from planar.errors import BriefError, Fault

_SECTION = re.compile(r"\s*\[+\s*([^\]]+?)\s*\]+")
_ASSIGNMENT = re.compile(r"\s*([\w.-]+)\s*=\s*(.*?)\s*")
_POSITION = re.compile(r" \(at (?:line (\d+), column \d+|end of document)\)$")
_WORDS = {
    "Cannot overwrite a value": "the key is given twice: keep one of the two",
    "Cannot declare": "the table is begun twice: put its keys under one heading",
    "Cannot mutate immutable namespace": "the table is already written in one line: add the key there",
    "Unterminated string": "the closing quote is missing",
    "Illegal character": "the closing quote is missing, or a control character stands in the text",
    "Unclosed array": "the closing ] is missing",
    "Unclosed inline table": "the closing } is missing",
    "Invalid statement": "a line is [table], key = value or # comment",
    "Expected '=' after a key": "a key is followed by = and its value",
}
"""How tomllib begins its message -> what would be right."""
_UNFINISHED = "the file ends too early: a value, a closing quote or a closing bracket is missing"
_ANY_VALUE = 'a text or quantity in double quotes ("1.6 mm"), a bare number, true or false, or [a list]'


def read_brief(path: Path | str, library: KnownKeys) -> Brief:
    """The brief in the TOML file at `path`, its keys checked against `library`.

    Raises `BriefError` with all faults: the file is missing, no text or no TOML, a key is unknown,
    missing, of the wrong kind or out of range.
    """
    path = Path(path)
    if path.suffix == ".json":
        expected = "a brief (TOML): that of a pack is brief.toml beside its design.json, which planar solve reads"
        raise _file_fault(path, "a JSON file", expected)
    try:
        text = path.read_bytes().decode("utf-8-sig")
    except UnicodeDecodeError as error:
        line = error.object[: error.start].count(b"\n") + 1
        raise _file_fault(path, f"byte {error.start} (line {line})", "a text file in UTF-8") from error
    except OSError as error:
        raise _file_fault(path, *_why_unread(path, error)) from error
    return parse_brief(text, str(path), library)


def parse_brief(text: str, where: str, library: KnownKeys) -> Brief:
    """The brief in the TOML `text`; `where` is named as its file. Raises `BriefError` as `read_brief`."""
    try:
        data = tomllib.loads(text)
    except tomllib.TOMLDecodeError as error:
        raise BriefError([_syntax_fault(str(error), text, where)]) from error
    except RecursionError as error:
        raise BriefError([Fault(where, "file", "brackets nested too deep", "a few levels of brackets")]) from error
    return check_brief(data, where, library)


def check_brief(data: Mapping[str, Any], where: str, library: KnownKeys) -> Brief:
    """The brief in `data`, tables and texts as TOML gives them. Raises `BriefError` as `read_brief`."""
    # Empty tables stand in for missing ones, so that their missing keys are reported one by one.
    whole = {"target": {}, "board": {}, **data}
    try:
        return Brief.model_validate(whole, context={"library": library})
    except ValidationError as error:
        raise BriefError(faults_of(error, data, where)) from error


def _file_fault(path: Path, value: str, expected: str) -> BriefError:
    return BriefError([Fault(where=str(path), key="file", value=value, expected=expected)])


def _why_unread(path: Path, error: OSError) -> tuple[str, str]:
    """What is wrong with a file that does not open, and what would be right."""
    if isinstance(error, FileNotFoundError):
        near = nearest(path.name, sorted(found.name for found in path.parent.glob("*.toml")))
        return "no such file", f"did you mean {path.with_name(near)}?" if near else "the path of a brief (TOML)"
    if path.is_dir():
        return "a folder", "the path of a brief, a TOML file"
    return (error.strerror or "unreadable").lower(), "a file that can be read"


def _syntax_fault(message: str, text: str, where: str) -> Fault:
    """The fault for one message of tomllib: its line, the key on that line, what would be right."""
    lines = text.splitlines() or [""]
    position = _POSITION.search(message)
    at_end = position is not None and position[1] is None
    number = int(position[1]) if position and position[1] else len(lines)
    line = one_line(lines[min(number, len(lines)) - 1])
    usual = _UNFINISHED if at_end else _ANY_VALUE
    expected = next((words for start, words in _WORDS.items() if message.startswith(start)), usual)
    section = next((found[1] for above in reversed(lines[: number - 1]) if (found := _SECTION.match(above))), "")
    assignment = _ASSIGNMENT.fullmatch(line)
    key = assignment[1] if assignment else line.strip() or "end of file"
    inside = f"{section}.{key}" if section and assignment else key
    value = assignment[2] if assignment else "no TOML"
    return Fault(where=f"{where}:{number}", key=inside, value=value or "nothing", expected=expected)

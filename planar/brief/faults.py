"""From pydantic's errors to faults in plain words.

Each error type the model can raise has one function in `WORDS` that says what would be right. The
keys a brief knows are read off the model, so that an unknown key is answered with the nearest one
of its own table, or with the table it belongs in. Key and value are shown as the user wrote them.
"""

from __future__ import annotations

import json
from collections.abc import Callable, Iterator, Mapping
from functools import cache
from typing import Any, get_args

from pydantic import BaseModel, ValidationError
from pydantic.fields import FieldInfo
from pydantic_core import ErrorDetails

from planar.brief.model import BY_KEY, INLINE, Brief, ElsewhereError
from planar.brief.nearest import did_you_mean, nearest
from planar.errors import Fault

Path = tuple[str | int, ...]

NOT_GIVEN = "(not given)"
_LONGEST_VALUE = 80
_DEEPEST_VALUE = 4
_PARTICULAR_WORDS: dict[tuple[Path, str], str] = {
    (("target", "polarisation"), "circular"): 'with its sense: "circular-right" or "circular-left"',
    (("target", "polarisation"), "vertical"): '"linear"; how the board is mounted makes it vertical',
    (("target", "polarisation"), "horizontal"): '"linear"; how the board is mounted makes it horizontal',
}


def faults_of(error: ValidationError, data: Mapping[str, Any], where: str) -> list[Fault]:
    """One fault for each error, in the order of the model; `data` is what was validated, `where` the file."""
    return [_fault(details, data, where) for details in error.errors(include_url=False)]


def as_written(value: object) -> str:
    """`value` as TOML writes it, on one line."""
    return one_line(_toml(value))


def one_line(text: str) -> str:
    """`text` with unprintable characters blanked, cut to a length that fits a message."""
    text = _printable(text)
    return text if len(text) <= _LONGEST_VALUE else f"{text[: _LONGEST_VALUE - 3]}..."


def known_paths() -> tuple[tuple[str, ...], ...]:
    """Every key a brief knows, as a path from the root; tables stand before their keys."""
    return tuple(_fields())


def _fault(details: ErrorDetails, data: Mapping[str, Any], where: str) -> Fault:
    path: Path = tuple(step for step in details["loc"] if step not in {BY_KEY, INLINE, "[key]"})
    cause = details.get("ctx", {}).get("error")
    if isinstance(cause, ElsewhereError):
        path = cause.path
    expected = WORDS.get(details["type"], _not_read)(details, path)
    key, value = one_line(_dotted(path)), _value_at(data, path)
    return Fault(where=where, key=key, value=value, expected=_printable(expected))


def _printable(text: str) -> str:
    return "".join(character if character.isprintable() else " " for character in text)


def _dotted(path: Path) -> str:
    text = ""
    for step in path:
        text += f"[{step}]" if isinstance(step, int) else f".{_key(step)}" if text else _key(step)
    return text


def _key(step: str) -> str:
    return step if step.replace("_", "a").replace("-", "a").isalnum() else json.dumps(step, ensure_ascii=False)


def _value_at(data: object, path: Path) -> str:
    for step in path:
        try:
            data = data[step]  # type: ignore[index]
        except (KeyError, IndexError, TypeError):
            return NOT_GIVEN
    return as_written(data)


def _toml(value: object, levels: int = _DEEPEST_VALUE) -> str:
    if isinstance(value, bool):
        return str(value).lower()
    if isinstance(value, str):
        return json.dumps(value, ensure_ascii=False)
    if isinstance(value, list | dict) and value and levels == 0:
        return "..."
    if isinstance(value, list):
        return f"[{', '.join(_toml(item, levels - 1) for item in value)}]"
    if isinstance(value, dict):
        inside = ", ".join(f"{_key(key)} = {_toml(item, levels - 1)}" for key, item in value.items())
        return f"{{ {inside} }}" if inside else "{}"
    return str(value)


@cache
def _fields() -> Mapping[tuple[str, ...], FieldInfo]:
    return dict(_walk(Brief, ()))


def _walk(model: type[BaseModel], above: tuple[str, ...]) -> Iterator[tuple[tuple[str, ...], FieldInfo]]:
    for name, field in model.model_fields.items():
        path = (*above, field.alias or name)
        yield path, field
        for inner in _models_in(field.annotation):
            yield from _walk(inner, path)


def _models_in(annotation: Any) -> Iterator[type[BaseModel]]:
    if isinstance(annotation, type) and issubclass(annotation, BaseModel):
        yield annotation
    for argument in get_args(annotation):
        yield from _models_in(argument)


def _example(path: Path) -> str:
    """What stands as example beside the key at `path`, or a text that says nothing wrong."""
    field = _fields().get(tuple(step for step in path if isinstance(step, str)))
    return f", for instance {field.examples[0]}" if field is not None and field.examples else ""


def _missing(details: ErrorDetails, path: Path) -> str:
    if isinstance(path[-1], int):
        return f"two values are needed{_example(path)}"
    return f"needed{_example(path)}"


def _unknown_key(details: ErrorDetails, path: Path) -> str:
    name, table = str(path[-1]), path[:-1]
    here = [known[-1] for known in _fields() if known[:-1] == table]
    homes = [known for known in _fields() if known[-1] == name]
    if homes:
        return f"unknown here; {name} belongs in {_table(homes[0][:-1])}"
    near = nearest(name, here)
    if near is not None:
        return f'unknown key; did you mean "{near}"?'
    anywhere = {known[-1]: known for known in reversed(known_paths())}
    far = nearest(name, anywhere)
    if far is not None:
        return f'unknown key; did you mean "{far}" in {_table(anywhere[far][:-1])}?'
    return f"unknown key; {_table(table)} has {', '.join(here)}"


def _table(path: Path) -> str:
    return f"[{_dotted(path)}]" if path else "the top of the file"


def _said(details: ErrorDetails, path: Path) -> str:
    return str(details["ctx"]["error"])


def _one_of(details: ErrorDetails, path: Path) -> str:
    written = details["input"]
    particular = _PARTICULAR_WORDS.get((path, str(written)))
    if particular is not None:
        return particular
    field = _fields()[tuple(str(step) for step in path)]
    choices = [choice for choice in _choices(field.annotation) if isinstance(choice, str)]
    listed = ", ".join(f'"{choice}"' for choice in choices)
    return f"one of {listed}{did_you_mean(str(written), choices)}"


def _choices(annotation: Any) -> Iterator[object]:
    for argument in get_args(annotation):
        yield argument
        yield from _choices(argument)


def _a_table(details: ErrorDetails, path: Path) -> str:
    return f"a table of keys{_example(path) or f', headed by the line [{_dotted(path)}]'}"


def _two_values(details: ErrorDetails, path: Path) -> str:
    return f"two values in square brackets{_example(path)}"


def _whole_number(details: ErrorDetails, path: Path) -> str:
    return "a whole number, without quotes, point or unit"


def _true_or_false(details: ErrorDetails, path: Path) -> str:
    return "true or false, in small letters and without quotes"


def _text(details: ErrorDetails, path: Path) -> str:
    return "a text in double quotes"


def _key_or_table(details: ErrorDetails, path: Path) -> str:
    return f"a library key in quotes or a table of numbers{_example(path)}"


def _at_least(details: ErrorDetails, path: Path) -> str:
    return f"a whole number, at least {details['ctx']['ge']}"


def _at_most(details: ErrorDetails, path: Path) -> str:
    return f"a whole number, at most {details['ctx']['le']}"


def _not_read(details: ErrorDetails, path: Path) -> str:
    return f"cannot be read{_example(path)}"


WORDS: Mapping[str, Callable[[ErrorDetails, Path], str]] = {
    "missing": _missing,
    "extra_forbidden": _unknown_key,
    "value_error": _said,
    "literal_error": _one_of,
    "model_type": _a_table,
    "mapping_type": _a_table,
    "dict_type": _a_table,
    "tuple_type": _two_values,
    "too_short": _two_values,
    "too_long": _two_values,
    "int_type": _whole_number,
    "int_parsing_size": _whole_number,
    "bool_type": _true_or_false,
    "string_type": _text,
    "union_tag_not_found": _key_or_table,
    "greater_than_equal": _at_least,
    "less_than_equal": _at_most,
}
"""Error type -> words for what would be right."""

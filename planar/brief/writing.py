"""Writing a brief: the TOML text that reads back to the same brief, and the one to start from."""

from __future__ import annotations

from importlib import resources

import tomli_w

from planar.brief.measures import check_name
from planar.brief.model import Brief
from planar.errors import BriefError, Fault

_NAME_PLACE = "@NAME@"


def write_brief(brief: Brief) -> str:
    """Canonical TOML text of `brief`, defaults written out; `parse_brief` gives back an equal brief."""
    data = brief.model_dump(by_alias=True, exclude_none=True)
    if not data["antenna"]["dimensions"]:
        del data["antenna"]["dimensions"]
    return tomli_w.dumps({key: value for key, value in data.items() if value != {}})


def starter_brief(name: str) -> str:
    """TOML text of a commented brief called `name`, valid as it stands.

    Raises `BriefError` when `name` cannot name a folder.
    """
    try:
        check_name(name)
    except ValueError as error:
        raise BriefError([Fault(where="new brief", key="name", value=f'"{name}"', expected=str(error))]) from error
    text = resources.files("planar.brief").joinpath("starter.toml").read_text(encoding="utf-8")
    return text.replace(_NAME_PLACE, name)

"""What stands between the disk and the model: files that do not open, texts that are no TOML.

Authority: TOML v1.0.0 (keys once, tables once, basic strings) and the requirement that file and
line are named.
"""

from __future__ import annotations

import pytest
import tomli_w

from planar.brief import parse_brief, read_brief
from planar.errors import BriefError


def only_fault(caught):
    (fault,) = caught.value.faults
    return fault


@pytest.mark.parametrize(
    ("text", "line", "key", "says"),
    [
        ("[board]\nthickness = 1.6 mm\n", 2, "board.thickness", '("1.6 mm")'),
        ("[target]\ntransmit = True\n", 2, "target.transmit", "true or false"),
        ("[board]\nthickness = '1 mm'\nthickness = '2 mm'\n", 3, "board.thickness", "given twice"),
        ("[board]\nthickness = '1 mm'\nthickness = '2 mm'", 3, "board.thickness", "given twice"),
        ("[board]\n[make]\n[board]\n", 3, "[board]", "begun twice"),
        ('name = "gateway\n[board]\n', 1, "name", "closing quote"),
        ('[target]\nband = ["863 MHz", "870 MHz"', 2, "target.band", "closing ]"),
        ("[board", 1, "[board", "too early"),
        ("name\n", 1, "name", "followed by ="),
        ("!", 1, "!", "key = value"),
    ],
)
def test_no_toml_names_file_line_and_key(text, line, key, says, library):
    with pytest.raises(BriefError) as caught:
        parse_brief(text, "gateway.toml", library)
    fault = only_fault(caught)
    assert (fault.where, fault.key) == (f"gateway.toml:{line}", key)
    assert says in fault.expected


@pytest.mark.parametrize("depth", [50, 400, 5000])
def test_deep_brackets_are_refused(depth, library):
    with pytest.raises(BriefError):
        parse_brief(f"name = {'[' * depth}{']' * depth}", "gateway.toml", library)


def test_missing_file_names_its_neighbour(tmp_path, library):
    (tmp_path / "gateway.toml").write_text("")
    with pytest.raises(BriefError) as caught:
        read_brief(tmp_path / "gatway.toml", library)
    assert only_fault(caught).value == "no such file"
    assert str(tmp_path / "gateway.toml") in only_fault(caught).expected


def test_missing_folder(tmp_path, library):
    with pytest.raises(BriefError, match="no such file"):
        read_brief(tmp_path / "nowhere" / "gateway.toml", library)


def test_folder_is_no_brief(tmp_path, library):
    with pytest.raises(BriefError, match="a folder"):
        read_brief(tmp_path, library)


def test_other_encoding_names_its_line(tmp_path, library):
    path = tmp_path / "gateway.toml"
    path.write_bytes('name = "x"\n# für die Wiese\n'.encode("latin-1"))
    with pytest.raises(BriefError) as caught:
        read_brief(path, library)
    assert "line 2" in only_fault(caught).value
    assert "UTF-8" in only_fault(caught).expected


def test_byte_order_mark_and_carriage_returns_are_read(tmp_path, library, whole):
    path = tmp_path / "gateway.toml"
    text = tomli_w.dumps(whole)
    path.write_bytes(b"\xef\xbb\xbf" + text.replace("\n", "\r\n").encode())
    assert read_brief(path, library) == parse_brief(text, "gateway.toml", library)

"""One wrong key at a time: exactly one fault, on that key, saying what would be right.

Authority: the list of guards in the requirements (unit slips, swapped edges, unknown keys, missing
units). Conversions quoted in the messages: 1 inch = 25.4 mm exactly (international yard and pound
agreement, 1959). Ranges such as boards of 0.05 to 6.5 mm are common practice, no source.
"""

from __future__ import annotations

from typing import Any

import pytest
import tomli_w

from planar.brief import parse_brief
from planar.errors import BriefError

ABSENT = object()
INLINE = {"eps_r": 3.5, "tan_d": 0.0025, "at": "2.5 GHz"}

# id: (key changed, its wrong value, key reported or None for the same, what the message says)
WRONG: dict[str, tuple[str, Any, str | None, str]] = {
    # band
    "band in GHz": ("target.band", ["868 GHz", "870 GHz"], "target.band[0]", "did you mean 868 MHz?"),
    "band swapped": ("target.band", ["870 MHz", "863 MHz"], None, 'swap them: ["863 MHz", "870 MHz"]'),
    "band of no width": ("target.band", ["868 MHz", "868 MHz"], None, "lowest and its highest"),
    "band above an octave": ("target.band", ["400 MHz", "900 MHz"], None, "from 400 MHz up to 800 MHz"),
    "band as one text": ("target.band", "868 MHz", None, 'band = ["863 MHz", "870 MHz"]'),
    "band of one": ("target.band", ["868 MHz"], "target.band[1]", "two values"),
    "band of three": ("target.band", ["1 GHz", "1.1 GHz", "1.2 GHz"], None, "two values"),
    "band missing": ("target.band", ABSENT, None, 'band = ["863 MHz", "870 MHz"]'),
    "band in small letters": ("target.band", ["863 mhz", "870 MHz"], "target.band[0]", 'write "863 MHz"'),
    "band in millihertz": ("target.band", ["863 mHz", "870 MHz"], "target.band[0]", "did you mean 863 MHz?"),
    # other targets
    "match positive": (
        "target.match",
        "10 dB",
        None,
        "reflection is negative, from -40 dB to -1 dB: did you mean -10 dB?",
    ),
    "match zero": ("target.match", "0 dB", None, "from -40 dB to -1 dB"),
    "match beyond instruments": ("target.match", "-60 dB", None, "from -40 dB"),
    "match in per cent": ("target.match", "10 %", None, 'write "-10 dB"'),
    "impedance without unit": ("target.impedance", "50", None, 'the unit is missing, write "50 ohm"'),
    "impedance bare number": ("target.impedance", 50, None, 'a text with its unit, write "50 ohm"'),
    "impedance in kilohm": ("target.impedance", "50 kohm", None, "did you mean 50 ohm?"),
    "impedance too low": ("target.impedance", "1 ohm", None, "10 ohm to 600 ohm"),
    "polarisation without sense": ("target.polarisation", "circular", None, '"circular-right" or "circular-left"'),
    "polarisation misspelt": ("target.polarisation", "circular-rigth", None, 'did you mean "circular-right"?'),
    "polarisation by mounting": ("target.polarisation", "vertical", None, '"linear"'),
    "transmit as text": ("target.transmit", "true", None, "without quotes"),
    "transmit as number": ("target.transmit", 1, None, "true or false"),
    "transmit without power": ("target.power", ABSENT, None, 'power = "25 mW"'),
    "power though receiving": ("target.transmit", False, "target.power", "set transmit = true or leave power out"),
    "power in dBm": ("target.power", "14 dBm", None, "14 dBm is 25 mW"),
    "power in kilowatts": ("target.power", "25 kW", None, "did you mean 25 mW?"),
    # antenna
    "family unknown": ("antenna.family", "ring-guide", None, 'did you mean "ring-guided"?'),
    "family left out with dimensions": ("antenna.family", ABSENT, "antenna.end", 'family = "ring-guided"'),
    "shape unknown": ("antenna.shape", "squared", None, 'did you mean "square"?'),
    "shape far from any": ("antenna.shape", "hexagon", None, '"circle", "square", "rectangle"'),
    "corners of a circle": ("antenna.shape", "circle", "antenna.corner_radius", 'shape = "square"'),
    "corner radius negative": ("antenna.corner_radius", "-6 mm", None, "did you mean 6 mm?"),
    "aspect of a square": ("antenna.aspect_ratio", 1.5, None, 'shape = "rectangle"'),
    "trace of no width": ("antenna.trace_width", "0 mm", None, "20 um to 100 mm"),
    "trace in inches": ("antenna.trace_width", "8 inch", None, "8 inch is 203.2 mm"),
    "end of no line": ("antenna.family", "coplanar", "antenna.end", "ring-guided"),
    "end unknown": ("antenna.end", "short", None, '"via", "open"'),
    "dimension name": ("antenna.dimensions", {"LoopRadius": "50 mm"}, "antenna.dimensions.LoopRadius", '"loop_radius"'),
    "dimension negative": ("antenna.dimensions.gap", "-2 mm", None, "did you mean 2 mm?"),
    "dimension zero": ("antenna.dimensions.gap", "0 mm", None, "1 um to 10 m"),
    "dimension huge": ("antenna.dimensions.gap", "12 m", None, "did you mean 12 mm?"),
    "dimension bare": ("antenna.dimensions.gap", 2, None, 'write "2 mm"'),
    "dimension given twice": (
        "antenna.dimensions",
        {"trace_width": "5 mm"},
        "antenna.dimensions.trace_width",
        "antenna.trace_width",
    ),
    "dimensions no table": ("antenna.dimensions", "2 mm", None, "a table of keys"),
    # board
    "thickness in inches": (
        "board.thickness",
        "1.6 inch",
        None,
        "is 40.64 mm; boards are 50 um to 6.5 mm thick: did you mean 1.6 mm?",
    ),
    "thickness in mm for mil": ("board.thickness", "63 mm", None, "did you mean 63 mil?"),
    "thickness in volts": ("board.thickness", "1.6 V", None, "'V' is no unit of length, write \"1.6 mm\""),
    "thickness in nonsense": ("board.thickness", "1.6 mmm", None, 'write "1.6 mm"'),
    "thickness without unit": ("board.thickness", "1.6", None, 'the unit is missing, write "1.6 mm"'),
    "thickness bare": ("board.thickness", 1.6, None, 'a text with its unit, write "1.6 mm"'),
    "thickness with comma": ("board.thickness", "1,6 mm", None, "1.6 mm"),
    "thickness zero": ("board.thickness", "0 mm", None, "50 um to 6.5 mm"),
    "thickness negative": ("board.thickness", "-1.6 mm", None, "did you mean 1.6 mm?"),
    "thickness missing": ("board.thickness", ABSENT, None, 'thickness = "1.6 mm"'),
    "copper in mm": ("board.copper", "35 mm", None, "did you mean 35 um?"),
    "copper in ounces": ("board.copper", "1 oz", None, "1 oz is 35 um"),
    "mask unknown": ("board.mask", "botom", None, 'did you mean "bottom"?'),
    "mask as truth": ("board.mask", True, None, '"none", "top", "bottom", "both"'),
    "size limit tiny": ("board.size_limit", ["1 mm", "100 mm"], "board.size_limit[0]", "5 mm to 3000 mm"),
    "size limit of one": ("board.size_limit", "100 mm", None, 'size_limit = ["100 mm", "80 mm"]'),
    "laminate misspelt": ("board.laminate", "fr4-genral", None, 'did you mean "fr4-general"?'),
    "laminate abbreviated": ("board.laminate", "ptfe", None, 'did you mean "ptfe-glass-2.2"?'),
    "laminate far from any": ("board.laminate", "xyz", None, "alumina-96, fr4-general"),
    "laminate missing": ("board.laminate", ABSENT, None, 'laminate = "fr4-general"'),
    "laminate a number": ("board.laminate", 4.3, None, "a library key in quotes or a table"),
    "permittivity below air": ("board.laminate", INLINE | {"eps_r": 0.9}, "board.laminate.eps_r", "1 to 20"),
    "permittivity too high": ("board.laminate", INLINE | {"eps_r": 43}, "board.laminate.eps_r", "1 to 20"),
    "permittivity as text": ("board.laminate", INLINE | {"eps_r": "3.5"}, "board.laminate.eps_r", "without quotes"),
    "permittivity no number": ("board.laminate", INLINE | {"eps_r": float("nan")}, "board.laminate.eps_r", "1 to 20"),
    "loss in per cent": ("board.laminate", INLINE | {"tan_d": 2}, "board.laminate.tan_d", "did you mean 0.02"),
    "loss negative": ("board.laminate", INLINE | {"tan_d": -0.02}, "board.laminate.tan_d", "0 to 0.2"),
    "laminate frequency missing": (
        "board.laminate",
        {"eps_r": 3.5, "tan_d": 0.0025},
        "board.laminate.at",
        'at = "2.5 GHz"',
    ),
    "laminate key unknown": ("board.laminate", INLINE | {"tand": 0.01}, "board.laminate.tand", '"tan_d"'),
    # surroundings
    "cover unknown": ("surroundings.cover.material", "abz", None, 'did you mean "abs"?'),
    "cover thickness missing": ("surroundings.cover.thickness", ABSENT, None, 'thickness = "2.5 mm"'),
    "cover thickness zero": ("surroundings.cover.thickness", "0 mm", None, "10 um to 100 mm"),
    "cover a text": ("surroundings.cover", "abs", None, 'cover = { material = "abs"'),
    "air gap negative": ("surroundings.cover.air_gap", "-1 mm", None, "did you mean 1 mm?"),
    "reflector a length": ("surroundings.reflector", "40 mm", None, 'reflector = { distance = "40 mm" }'),
    "reflector zero": ("surroundings.reflector.distance", "0 mm", None, "0.1 mm to 30 m"),
    "reflector beyond a wavelength": (
        # c / 863 MHz = 347.4 mm
        "surroundings.reflector.distance",
        "400 mm",
        None,
        "one wavelength (347.4 mm)",
    ),
    # make
    "fab abbreviated": ("make.fab", "pool", None, 'did you mean "pool-two-layer"?'),
    "connector unknown": ("make.connector", "edge_coaxial", None, 'did you mean "edge-coax"?'),
    "quantity zero": ("make.quantity", 0, None, "at least 1"),
    "quantity broken": ("make.quantity", 2.5, None, "a whole number"),
    "quantity text": ("make.quantity", "5", None, "a whole number, without quotes"),
    "quantity truth": ("make.quantity", True, None, "a whole number"),
    "quantity endless": ("make.quantity", 10**9, None, "at most 1000000"),
    # keys
    "unknown key": ("target.polarization", "linear", None, 'did you mean "polarisation"?'),
    "key of another table": ("antenna.thickness", "1.6 mm", None, "belongs in [board]"),
    "key without table": ("thickness", "1.6 mm", None, "belongs in [board]"),
    "key like one elsewhere": ("antenna.laminat", "abs", None, '"laminate" in [board]'),
    "key like nothing": ("make.xyzzy", 1, None, "[make] has fab, connector, quantity"),
    "table misspelt": ("surrounding", {}, None, 'did you mean "surroundings"?'),
    "table a number": ("make", 3, None, "headed by the line [make]"),
    "table a list": ("surroundings", [{}], None, "headed by the line [surroundings]"),
    # name
    "name missing": ("name", ABSENT, None, 'name = "orchard-gateway"'),
    "name empty": ("name", "", None, "a name is needed"),
    "name a number": ("name", 868, None, "a text in double quotes"),
    "name long": ("name", "a" * 51, None, "at most 50 characters"),
    "name above the folder": ("name", "..", None, "no space or dot"),
    "name hidden": ("name", ".git", None, 'write "git"'),
    "name of a device": ("name", "con", None, '"con-antenna"'),
    **{
        f"name with {character!r}": ("name", f"a{character}b", None, "cannot stand in a folder name")
        for character in '/\\:*?"<>|\n\0'
    },
    "name with space at the end": ("name", "gateway ", None, 'write "gateway"'),
}


def spoiled(data: dict[str, Any], dotted: str, value: object) -> str:
    """TOML text of `data` with one key set, or taken out."""
    *tables, key = dotted.split(".")
    table = data
    for name in tables:
        table = table[name]
    if value is ABSENT:
        del table[key]
    else:
        table[key] = value
    return tomli_w.dumps(data)


@pytest.mark.parametrize("case", WRONG, ids=str)
def test_one_wrong_key_gives_its_one_message(case, whole, library):
    changed, value, reported, says = WRONG[case]
    with pytest.raises(BriefError) as caught:
        parse_brief(spoiled(whole, changed, value), "gateway.toml", library)
    faults = [fault for fault in caught.value.faults if fault.key == (reported or changed)]
    others = [fault for fault in caught.value.faults if fault not in faults]
    assert len(faults) == 1, caught.value
    assert says in faults[0].expected
    assert faults[0].where == "gateway.toml"
    # A band has two edges, and a family left out is missed by both end and dimensions: the only double faults.
    assert {fault.key for fault in others} <= {"target.band[1]", "antenna.family"}, caught.value


def test_value_is_shown_as_written(whole, library):
    with pytest.raises(BriefError) as caught:
        parse_brief(spoiled(whole, "board.thickness", "1.6 inch"), "gateway.toml", library)
    assert caught.value.faults[0].value == '"1.6 inch"'
    assert str(caught.value).startswith('gateway.toml: board.thickness = "1.6 inch": 1.6 inch is 40.64 mm')


def test_dimensions_need_a_family(whole, library):
    del whole["antenna"]["end"]
    with pytest.raises(BriefError) as caught:
        parse_brief(spoiled(whole, "antenna.family", ABSENT), "gateway.toml", library)
    (fault,) = caught.value.faults
    assert (fault.key, fault.value) == ("antenna.family", "(not given)")
    assert "needed where [antenna.dimensions] are given" in fault.expected


@pytest.mark.parametrize(("ratio", "says"), [(0.5, "1 to 3"), (3.5, "1 to 3"), ("2", "without quotes")])
def test_aspect_ratio_of_a_rectangle(ratio, says, whole, library):
    whole["antenna"]["shape"] = "rectangle"
    with pytest.raises(BriefError) as caught:
        parse_brief(spoiled(whole, "antenna.aspect_ratio", ratio), "gateway.toml", library)
    (fault,) = caught.value.faults
    assert fault.key == "antenna.aspect_ratio"
    assert says in fault.expected


def test_all_faults_come_at_once(whole, library):
    whole["name"] = "a/b"
    whole["target"]["band"] = ["870 MHz", "863 MHz"]
    whole["target"]["polarization"] = "linear"
    del whole["target"]["power"]
    whole["antenna"]["shape"] = "circle"
    whole["board"]["thickness"] = "1.6 inch"
    whole["board"]["laminate"] = "fr4"
    whole["make"]["quantity"] = 0
    with pytest.raises(BriefError) as caught:
        parse_brief(tomli_w.dumps(whole), "gateway.toml", library)
    assert {fault.key for fault in caught.value.faults} == {
        "name",
        "target.band",
        "target.polarization",
        "target.power",
        "antenna.corner_radius",
        "board.thickness",
        "board.laminate",
        "make.quantity",
    }
    assert len(str(caught.value).splitlines()) == 8


def test_empty_brief_asks_for_each_key_it_needs(library):
    with pytest.raises(BriefError) as caught:
        parse_brief("", "gateway.toml", library)
    assert [fault.key for fault in caught.value.faults] == [
        "name",
        "target.band",
        "board.laminate",
        "board.thickness",
    ]

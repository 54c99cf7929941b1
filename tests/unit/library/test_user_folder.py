"""A user's own library: searched first, read lazily, and every slip in it reported at once.

Authority: the demanded behaviour (file, key, value and what would be right, all faults of a file in one message).
"""

from pathlib import Path

import pytest

from planar.errors import LibraryError, RangeError
from planar.library import Library, inline_laminate

SHIPPED = Library.open()


def copy_of(kind: str, key: str, folder: Path, *changes: tuple[str, str], name: str | None = None) -> Path:
    """Shipped entry written into the user folder with texts replaced; each text must be there."""
    written = SHIPPED.source(kind, key).read_text(encoding="utf-8")
    for old, new in changes:
        assert old in written
        written = written.replace(old, new, 1)
    path = folder / kind / f"{name or key}.toml"
    path.parent.mkdir(exist_ok=True)
    path.write_text(written, encoding="utf-8")
    return path


def faults_of(library: Library, kind: str, key: str) -> dict[str, tuple[str, str]]:
    with pytest.raises(LibraryError) as caught:
        getattr(library, kind.removesuffix("s"))(key)
    assert {fault.where for fault in caught.value.faults} == {str(library.source(kind, key))}
    return {fault.key: (fault.value, fault.expected) for fault in caught.value.faults}


def test_user_folder_wins_and_adds(tmp_path: Path) -> None:
    copy_of("laminates", "fr4-general", tmp_path, ("value = 4.3", "value = 4.45"))
    copy_of("laminates", "fr4-general", tmp_path, name="my-batch")
    library = Library.open(tmp_path)
    assert library.laminate("fr4-general").eps_r == 4.45
    assert library.source("laminates", "fr4-general").is_relative_to(tmp_path)
    assert set(library.keys("laminates")) == {*SHIPPED.keys("laminates"), "my-batch"}
    assert library.fab("pool-two-layer") == SHIPPED.fab("pool-two-layer")


def test_a_fab_without_panelling_is_whole(tmp_path: Path) -> None:
    """A file from before there were panels still loads; `panelling` is then None."""
    path = copy_of("fabs", "pool-two-layer", tmp_path)
    path.write_text(path.read_text(encoding="utf-8").partition("[panelling]")[0], encoding="utf-8")
    assert Library.open(tmp_path).fab("pool-two-layer").panelling is None


def test_all_faults_of_a_laminate_at_once(tmp_path: Path) -> None:
    copy_of(
        "laminates",
        "fr4-general",
        tmp_path,
        ("value = 4.3", 'value = "4.3"'),
        ('at = "1 GHz"', 'at = "1"'),
        ('tolerance = "20 %"', 'tolerance = "20 mm"'),
        ('["0.2 mm", ', '["0.2 furlongs", '),
        ('base = ["18 um", "35 um", "70 um"]', "base = []"),
        ('roughness_rq = "1.0 um"', 'roughnes_rq = "1.0 um"'),
        ('conductivity = "5.8e7 S/m"\nsource = "typical of the class, common practice, no source"', 'source = " "'),
    )
    faults = faults_of(Library.open(tmp_path), "laminates", "fr4-general")
    assert set(faults) == {
        "eps_r.value",
        "eps_r.at",
        "tan_d.tolerance",
        "thickness.values",
        "copper.base",
        "copper.roughnes_rq",
        "copper.roughness_rq",
        "copper.conductivity",
        "copper.source",
    }
    assert faults["eps_r.value"] == ('"4.3"', "a number from 1 to 100 is needed, without unit and quotes")
    assert faults["eps_r.at"][1] == 'the unit is missing, write "868.3 MHz"'
    assert 'nearest is "roughness_rq"' in faults["copper.roughnes_rq"][1]
    assert faults["copper.conductivity"] == ("(not given)", "this key is needed")


@pytest.mark.parametrize(
    ("kind", "key", "change", "fault", "expected"),
    [
        ("laminates", "foam-core", ('["1.0 mm"', '["1.0 inch"'), "thickness.values", "out of range"),
        ("laminates", "foam-core", ("value = 1.07", "value = 0.9"), "eps_r.value", "from 1 to 100"),
        ("laminates", "foam-core", ("value = 0.001", "value = 0.4"), "tan_d.value", "too high for permittivity 1.07"),
        ("laminates", "foam-core", ('title = "', 'title = ""#'), "title", "a text is needed"),
        ("laminates", "foam-core", ("[tan_d]", "[tan-d]"), "tan_d", "this key is needed"),
        ("covers", "abs", ('source = "', 'sauce = "'), "eps_r.sauce", 'nearest is "source"'),
        ("covers", "abs", ('at = "1 GHz"', 'at = "1 kHz"'), "eps_r.at", "out of range"),
        (
            "fabs",
            "pool-two-layer",
            ("levels = { value = 2,", "levels = { value = 2.5,"),
            "levels.value",
            "whole number",
        ),
        ("fabs", "pool-two-layer", ("mask = { value = true", 'mask = { value = "yes"'), "mask.value", "true or false"),
        ("fabs", "pool-two-layer", ("mask = { value = true", "mask = { value = false"), "mask_web", "leave it out"),
        ("fabs", "pool-two-layer", ("mask_web =", "#"), "mask_web", "since mask is offered"),
        ("fabs", "pool-two-layer", ("min_gap = {", 'min_gap = "0.15 mm" #'), "min_gap", "a table is needed"),
        (
            "fabs",
            "pool-two-layer",
            ('max_hole = { value = "6.3', 'max_hole = { value = "0.2'),
            "max_hole.value",
            "min_",
        ),
        ("fabs", "pool-two-layer", ('["100 mm", "100 mm"]', '["100 mm"]'), "price_step.value", "a list of two"),
        (
            "fabs",
            "milled-single-sided",
            ("legend = { value = false", "legend = { value = true"),
            "legend_min_stroke",
            "is",
        ),
        ("fabs", "pool-two-layer", ("score_web =", "#"), "panelling.score_web", "since score is"),
        (
            "fabs",
            "pool-two-layer",
            ("count = { value = 5", "count = { value = 0"),
            "panelling.perforation_hole",
            "leave",
        ),
        ("fabs", "pool-two-layer", ("rail_width =", "rail_with ="), "panelling.rail_with", 'nearest is "rail_width"'),
        (
            "fabs",
            "pool-two-layer",
            ('opening = { value = "2', 'opening = { value = "0.2'),
            "panelling.fiducial_opening.value",
            "at",
        ),
        ("connectors", "edge-coax", ('net = "signal"', 'net = "signl"'), "pads[1].net", 'nearest is "signal"'),
        ("connectors", "edge-coax", ('net = "signal"', 'net = "ground"'), "pads", "one pad of the net signal"),
        ("connectors", "edge-coax", ('shape = "rectangle"', 'shape = "round"'), "pads[1].size", "equal"),
        ("connectors", "edge-coax", ("plated = true", "plated = false"), "holes[1].net", "an unplated one has none"),
        ("connectors", "edge-coax", ("[impedance]", "[impedence]"), "impedence", 'nearest is "impedance"'),
        ("connectors", "bare-pads", ("value = true", "value = false"), "pads", "needs its pads"),
    ],
)
def test_one_slip_gives_its_message(
    tmp_path: Path, kind: str, key: str, change: tuple[str, str], fault: str, expected: str
) -> None:
    copy_of(kind, key, tmp_path, change)
    assert expected in faults_of(Library.open(tmp_path), kind, key)[fault][1]


def test_rows_written_as_one_table_are_refused(tmp_path: Path) -> None:
    path = copy_of("connectors", "bare-pads", tmp_path)
    path.write_text(path.read_text(encoding="utf-8") + '\n[pads]\nname = "a"\n', encoding="utf-8")
    assert "[[pads]]" in faults_of(Library.open(tmp_path), "connectors", "bare-pads")["pads"][1]


def test_malformed_toml_names_file_and_line_and_spares_the_others(tmp_path: Path) -> None:
    path = copy_of("laminates", "fr4-general", tmp_path, ("value = 4.3", "value = = 4.3"))
    library = Library.open(tmp_path)
    with pytest.raises(LibraryError, match="line 7") as caught:
        library.laminate("fr4-general")
    assert caught.value.faults[0].where == str(path)
    assert library.laminate("fr4-high-tg") == SHIPPED.laminate("fr4-high-tg")


def test_a_file_that_is_no_text_is_refused(tmp_path: Path) -> None:
    path = copy_of("covers", "abs", tmp_path)
    path.write_bytes(b"title = '\xff'")
    with pytest.raises(LibraryError, match="UTF-8"):
        Library.open(tmp_path).cover("abs")


def test_unknown_key_gets_the_nearest_and_all_keys() -> None:
    with pytest.raises(LibraryError) as caught:
        SHIPPED.laminate("fr4-genral")
    message = str(caught.value)
    assert 'nearest is "fr4-general"' in message
    assert all(key in message for key in SHIPPED.keys("laminates"))


@pytest.mark.parametrize("key", ["", "../fabs/pool-two-layer", "*", "FR4-GENERAL"])
def test_keys_are_names_not_paths(key: str) -> None:
    with pytest.raises(LibraryError, match="no such laminate"):
        SHIPPED.laminate(key)


def test_unknown_kind_is_refused() -> None:
    with pytest.raises(LibraryError, match='nearest is "laminates"'):
        SHIPPED.keys("laminate")


def test_folder_without_library_layout_is_refused(tmp_path: Path) -> None:
    with pytest.raises(LibraryError, match="at least one of laminates, fabs"):
        Library.open(tmp_path)


def test_all_faults_of_a_family_at_once(tmp_path: Path) -> None:
    copy_of(
        "families",
        "plain",
        tmp_path,
        ("levels = 1", "levels = 3"),
        ('feed = "balanced"', 'feed = "balancd"'),
        ('value = "4 %"', 'value = "4"'),
        ('needs = ["rectangle"]', 'needs = ["rectangel"]'),
        ("value = 1.0,", "value = 9.0,"),
        name="spiral",
    )
    library = Library.open(tmp_path)
    assert "spiral" in library.keys("families")
    with pytest.raises(LibraryError) as caught:
        library.family("spiral")
    faults = {fault.key: fault.expected for fault in caught.value.faults}
    assert set(faults) == {
        "levels",
        "feed",
        "start.linear.frequency_error.value",
        "dimensions.loop_height.needs",
        "start.linear.perimeter_ratio.value",
    }
    assert {fault.where for fault in caught.value.faults} == {str(tmp_path / "families" / "spiral.toml")}
    assert 'nearest is "balanced"' in faults["feed"]
    with pytest.raises(LibraryError, match='no such family, nearest is "spiral"'):
        library.family("spirall")


def test_inline_laminate_states_what_it_assumes() -> None:
    """Exact at its point (Djordjevic et al. 2001); the copper is what a woven-glass board has, no source."""
    laminate = inline_laminate(3.5, 0.0025, at=2.5e9)
    assert laminate.model.permittivity(2.5e9) == pytest.approx(3.5 - 0.00875j, rel=1e-12)
    assert laminate.thicknesses == ()
    sources = dict(laminate.sources)
    assert "given in the brief" in sources["eps_r"]
    assert "no source" in sources["copper"]


def test_inline_laminate_no_model_goes_through_is_refused() -> None:
    with pytest.raises(RangeError):
        inline_laminate(0.5, 0.01, at=1e9)

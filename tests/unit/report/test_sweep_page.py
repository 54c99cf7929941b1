"""The page of a sweep held against its rows (as sweep.json has them) and against the HTML standard (html5lib, strict).

The rows are INVENTED: a design of an example, its prediction moved about by a formula without meaning.
"""

from __future__ import annotations

import copy
import itertools
import re
import time
from collections.abc import Callable, Iterator, Sequence
from pathlib import Path
from typing import Any
from xml.etree import ElementTree
from xml.etree.ElementTree import Element

import html5lib
import pytest

from planar.design.sweep_axes import Axis, read_axes
from planar.design.sweep_rows import row_columns
from planar.report.page_facts import page_facts
from planar.report.page_files import page_text
from planar.report.sweep_curves import axis_numbers, sweep_curves
from planar.report.sweep_facts import row_ranges
from planar.report.sweep_page import MULTIPLES, sweep_page
from planar.report.sweep_pictures import sweep_plot, sweep_plot_alone
from planar.report.sweep_plot import write_sweep_plots

Facts = dict[str, Any]
Rows = list[Facts]

REASON = "bench: this board cannot be made as asked:\n  size limit at board: 50 mm, limit <40 mm> & less"
LAMINATES = "board.laminate=fr4-general,fr4-high-tg,ptfe-glass-2-2"
AXES = read_axes((LAMINATES, "board.thickness=0.8 mm:1.6 mm:3"))
WORDS = read_axes((LAMINATES, "make.fab=pool-two-layer,fine-two-layer"))
SVG = "{http://www.w3.org/2000/svg}"


def rows_of(axes: Sequence[Axis], base: Facts) -> Rows:
    """Rows as in a sweep.json; of every eleven the fifth is refused and the ninth lost."""
    rows = []
    for i, chosen in enumerate(itertools.product(*(axis.texts for axis in axes))):
        row: Facts = {"row": i + 1, "settings": dict(zip((axis.key for axis in axes), chosen, strict=True))}
        ended = {4: ("refused", REASON), 8: ("lost", "the process died")}.get(i % 11)
        if ended:
            rows.append(row | {"status": ended[0], "reason": ended[1]})
            continue
        design = copy.copy(base)
        prediction = dict(base["prediction"])
        prediction["worst_reflection_db"] = -9.0 - (i * 7 % 13) * 0.61
        prediction["gain_dbi"] = 1.5 + (i * 5 % 17) * 0.113
        if prediction["worst_reflection_db"] > -10.0:
            prediction |= {"matched_band_hz": None, "margin_hz": None}
        if prediction["worst_axial_ratio_db"] is not None:
            prediction["worst_axial_ratio_db"] = 0.5 + (i * 3 % 7) * 0.47
            prediction["sense"] = ("right", "left")[i % 10 == 1]
        design["prediction"] = prediction
        rows.append(row | {"status": "designed", "reason": "", "design": design})
    return rows


@pytest.fixture(scope="module")
def linear(invented: Callable[[str], Facts]) -> Rows:
    return rows_of(AXES, invented("orchard-gateway"))


@pytest.fixture(scope="module")
def circular(invented: Callable[[str], Facts]) -> Rows:
    facts = invented("pass-tracker")
    assert facts["polarisation"] == "circular-right"
    return rows_of(AXES, facts)


def parsed(page: str) -> Element:
    """The document; raises on the first error a strict parser finds."""
    return html5lib.HTMLParser(strict=True, namespaceHTMLElements=False).parse(page)


def words(element: Element) -> str:
    return "".join(element.itertext())


def cells(document: Element) -> Iterator[tuple[int, str, str]]:
    """Number of the row, column and text of every cell that spans one column, in every table that can be sorted."""
    for table in document.iter("table"):
        if table.get("class") != "sortable":
            continue
        heads = [head.attrib["data-column"] for head in table.find("thead/tr")]  # type: ignore[union-attr]
        for row in table.findall("tbody/tr"):
            for column, cell in zip(heads[1:], list(row)[1:], strict=False):
                if "colspan" not in cell.attrib:
                    yield int(words(row[0])), column, words(cell)


def told(row: Facts) -> Facts:
    """What the tables have to say of a row: its columns, and what its match has to spare."""
    columns = row["settings"] | row_columns(row)
    if "design" in row:
        spare = row["design"]["target"]["match_db"] - row["design"]["prediction"]["worst_reflection_db"]
        columns["spare_db"] = spare
    return columns


def meets(row: Facts) -> bool:
    """The brief's own terms: reflection no worse than asked, and circular the way round that is asked."""
    if "design" not in row:
        return False
    target, prediction = row["design"]["target"], row["design"]["prediction"]
    ratio = prediction["worst_axial_ratio_db"]
    right = row["design"]["polarisation"] in ("linear", f"circular-{prediction['sense']}")
    return (
        prediction["worst_reflection_db"] <= target["match_db"]
        and right
        and (ratio is None or ratio <= target["axial_ratio_db"])
    )


@pytest.mark.parametrize("kind", ["linear", "circular"])
def test_every_number_of_the_tables_is_that_of_the_row(kind: str, request: pytest.FixtureRequest) -> None:
    rows: Rows = request.getfixturevalue(kind)
    units = {axis.key: numbers[1] for axis in AXES if (numbers := axis_numbers(axis))}
    compared = set()
    for number, column, text in cells(parsed(sweep_page(AXES, rows, name="x"))):
        if column == "result":
            continue
        value = told(rows[number - 1]).get(column)
        if isinstance(value, str):
            assert f"{text} {units[column]}" == value if column in units else text == value
        elif value is None:
            assert text == ""
        else:
            decimals = len(text.partition(".")[2])
            assert abs(float(text.replace("\N{MINUS SIGN}", "-")) - value) <= 0.5000001 * 10.0**-decimals
        compared.add((number, column))
    numbers = {
        (row["row"], name) for row in rows for name, value in told(row).items() if isinstance(value, int | float)
    }
    assert numbers <= compared  # nothing of the table is missing on the page


@pytest.mark.parametrize("kind", ["linear", "circular"])
def test_rows_are_judged_as_the_brief_asks(kind: str, request: pytest.FixtureRequest) -> None:
    rows: Rows = request.getfixturevalue(kind)
    page = sweep_page(AXES, rows, name="x")
    results = {number: text for number, column, text in cells(parsed(page)) if column == "result"}
    assert {number for number, text in results.items() if text == "meets"} == {row["row"] for row in rows if meets(row)}
    assert 0 < sum(map(meets, rows)) < sum("design" in row for row in rows)
    best = max((row for row in rows if meets(row)), key=lambda row: told(row)["spare_db"])
    assert f"<strong>Row {best['row']}</strong>" in page
    if kind == "circular":
        assert "misses: sense left" in results.values()


@pytest.mark.parametrize("kind", ["linear", "circular"])
def test_sentences_tell_the_best_row(kind: str, request: pytest.FixtureRequest) -> None:
    rows: Rows = request.getfixturevalue(kind)
    best = max((row for row in rows if meets(row)), key=lambda row: told(row)["spare_db"])
    ends = [row["status"] for row in rows]
    counts = {"rows": len(rows), "meets": sum(map(meets, rows))}
    facts = page_facts(best["design"]) | {"counts": counts | {each: ends.count(each) for each in set(ends)}}
    found = [each for each in parsed(sweep_page(AXES, rows, name="x")).iter() if "data-key" in each.attrib]
    assert len(found) >= 10
    for element in found:
        true: Any = facts
        for part in element.attrib["data-key"].split("."):
            true = true[int(part)] if isinstance(true, list | tuple) else true[part]
        shown = words(element).replace("\N{MINUS SIGN}", "-")
        error = abs(float(shown) - true * float(element.attrib["data-scale"]))
        assert error <= 0.5000001 * 10.0 ** -len(shown.partition(".")[2])


def test_rows_without_a_board_stay_with_the_whole_reason(linear: Rows) -> None:
    document = parsed(sweep_page(AXES, linear, name="x"))
    reasons = {
        words(row[0]): " ".join(words(row[-1]).split())
        for row in document.iter("tr")
        if row.find("td[@class='reason']") is not None
    }
    expected = {str(row["row"]): " ".join(row["reason"].split()) for row in linear if row["status"] != "designed"}
    assert len(expected) == 2
    assert reasons == expected


def test_nothing_but_refusals_is_a_page_too(linear: Rows) -> None:
    refused = [row | {"row": 1} for row in linear if row["status"] == "refused"][:1]
    page = sweep_page(
        read_axes(("board.thickness=1 mm",)), [refused[0] | {"settings": {"board.thickness": "1 mm"}}], name="x"
    )
    document = parsed(page)
    assert "No row gave a board" in page
    assert "<figure" not in page
    assert words(next(document.iter("tbody"))[0]).startswith("board.thickness")
    assert "limit <40 mm> & less" in words(document)


def test_where_no_row_meets_the_brief_the_nearest_is_told(linear: Rows) -> None:
    rows = [row for row in copy.deepcopy(linear) if "design" in row]
    for row in rows:
        row["design"]["target"]["match_db"] = -30.0
    page = sweep_page(AXES, rows, name="x")
    nearest = min(rows, key=lambda row: row["design"]["prediction"]["worst_reflection_db"])
    assert "No row meets the brief" in page
    assert f"<strong>Row {nearest['row']}</strong>" in page
    assert "comes nearest in reflection" in page


def test_a_row_that_misses_is_not_the_best_however_good_its_match(circular: Rows) -> None:
    rows = copy.deepcopy(circular)
    rows[0]["design"]["prediction"] |= {"worst_reflection_db": -40.0, "worst_axial_ratio_db": 9.0}
    page = sweep_page(AXES, rows, name="x")
    assert "<strong>Row 1</strong>" not in page
    first = next(row for row in parsed(page).iter("tr") if words(row[0]) == "1")
    assert [words(cell) for cell in first if cell.get("class") == "number missed"] == ["9.00"]


def test_names_cannot_break_the_page(linear: Rows) -> None:
    bad = '"<script>alert(1)</script>&"'
    axes = read_axes((f"board.laminate={bad},fr4-general",))
    rows = [
        row | {"row": i + 1, "settings": {"board.laminate": text}}
        for i, (row, text) in enumerate(zip(linear[:2], axes[0].texts, strict=True))
    ]
    page = sweep_page(axes, rows, name="<b>&amp;")
    document = parsed(page)
    assert [words(each) for each in document.iter("h1")] == ["<b>&amp;"]
    assert "alert(1)</script>&amp;" not in page
    assert len(list(document.iter("script"))) == 1
    assert (1, "board.laminate", bad) in list(cells(document))


def test_the_page_is_the_same_twice_and_fetches_nothing(circular: Rows) -> None:
    page = sweep_page(AXES, circular, name="x")
    assert page == sweep_page(AXES, circular, name="x")
    assert not re.search(r"""(?:href|src)\s*=\s*["'](?!#)|@import|url\(""", page)


def test_it_is_complete_without_its_script(linear: Rows) -> None:
    """Heads are plain words until the script makes buttons of them; nothing but the tools at the top waits for it."""
    document = parsed(sweep_page(AXES, linear, name="x"))
    assert {words(each) for each in document.iter("button")} == {"Dark", "All details"}
    assert not any("aria-sort" in each.attrib or "hidden" in each.attrib for each in document.iter())
    assert not re.search(r"#[0-9a-fA-F]{3,8}\b", page_text("sweep.css"))  # colours come from the palette


def test_a_thousand_rows_stay_small_and_quick(circular: Rows) -> None:
    """Under 2 MB and 3 s of the processor, what was asked of the page (requirement, no source)."""
    axes = read_axes(
        (LAMINATES.replace("fr4-high-tg,", ""), "board.thickness=0.4 mm:3 mm:25", "antenna.gap=1 mm:3 mm:20")
    )
    rows = rows_of(axes, circular[0]["design"])
    assert len(rows) == 1000
    start = time.process_time()
    page = sweep_page(axes, rows, name="x")
    assert time.process_time() - start < 3.0
    assert len(page.encode()) < 2_000_000


def table_of(rows: Rows) -> list[Facts]:
    return [{"row": row["row"], **row["settings"], **row_columns(row)} for row in rows]


def test_points_lie_where_the_scales_say(linear: Rows) -> None:
    """Numbers at the ticks against the points: both lie on one straight line, to the tenth of a px that is written."""
    drawing = ElementTree.fromstring(sweep_plot(AXES, table_of(linear), "gain_dbi", None))
    ticks = [
        (float(each.text.replace("\N{MINUS SIGN}", "-")), float(each.attrib["x"]), float(each.attrib["y"]))
        for each in drawing.iter(f"{SVG}text")
        if re.fullmatch(r"[\N{MINUS SIGN}\d.]+", each.text or "")
    ]
    lowest = max(y for *_, y in ticks)
    across = sorted((x, value) for value, x, y in ticks if y == lowest)
    # letters of the y scale stand 0.35 of their size, 13 px, below what they name
    up = sorted((y - 0.35 * 13.0, value) for value, _, y in ticks if y != lowest)
    spots = [each for each in drawing.iter(f"{SVG}circle") if each.attrib["fill"] == "transparent"]
    assert len(spots) == sum("design" in row for row in linear)
    for spot in spots:
        row = linear[int(re.match(r"row (\d+)", spot[0].text or "")[1]) - 1]  # type: ignore[index]
        for at, scale, value in (
            (float(spot.attrib["cx"]), across, float(row["settings"]["board.thickness"].removesuffix(" mm"))),
            (float(spot.attrib["cy"]), up, row["design"]["prediction"]["gain_dbi"]),
        ):
            (low, first), (high, last) = scale[0], scale[-1]
            assert low + (value - first) / (last - first) * (high - low) == pytest.approx(at, abs=0.11)


def joined(drawing: str) -> list[str]:
    """Paths of the curves: lines without a filling, in an accent."""
    return [
        each.attrib["d"]
        for each in ElementTree.fromstring(drawing).iter(f"{SVG}path")
        if each.attrib.get("fill") == "none" and "accent" in each.attrib["stroke"]
    ]


def test_a_refused_row_breaks_its_curve(linear: Rows) -> None:
    """Row 5 is the middle of its curve of three: no line is left of it. Row 9 is the end of the last."""
    lengths = sorted(path.count("L") for path in joined(sweep_plot(AXES, table_of(linear), "gain_dbi", None)))
    assert lengths == [1, 2]


def test_words_are_not_joined(invented: Callable[[str], Facts]) -> None:
    rows = rows_of(WORDS, invented("orchard-gateway"))
    drawing = sweep_plot(WORDS, table_of(rows), "gain_dbi", None)
    assert joined(drawing) == []
    shown = {each.text for each in ElementTree.fromstring(drawing).iter(f"{SVG}text")}
    assert set(WORDS[0].texts) <= shown


def test_page_and_file_show_the_same_drawing(linear: Rows, tmp_path: Path) -> None:
    table = table_of(linear)
    asked = {"worst_reflection_db": -10.0}
    for folder in (tmp_path / "one", tmp_path / "two"):
        folder.mkdir()
        write_sweep_plots(AXES, table, folder, ("worst_reflection_db", "loop_width_mm", "via_ohm"), asked=asked)
    files = {path.name: path.read_text(encoding="utf-8") for path in (tmp_path / "one").iterdir()}
    assert set(files) == {"worst_reflection_db.svg", "loop_width_mm.svg"}  # no row has the line
    assert files == {path.name: path.read_text(encoding="utf-8") for path in (tmp_path / "two").iterdir()}
    drawn = ElementTree.fromstring(files["worst_reflection_db.svg"])
    alone = {ElementTree.tostring(each) for each in drawn}
    on_page = ElementTree.fromstring(sweep_plot(AXES, table, "worst_reflection_db", -10.0))
    assert {ElementTree.tostring(each).strip() for each in on_page} <= {each.strip() for each in alone}
    legend = next(each for each in drawn if each.get("class") == "legend")
    assert {"fr4-general", "fr4-high-tg", "ptfe-glass-2-2"} <= {each.text for each in legend.iter(f"{SVG}text")}


def test_the_page_has_a_plot_for_each_quantity_there_is(linear: Rows, circular: Rows) -> None:
    for rows, missing in ((linear, {"worst_axial_ratio_db"}), (circular, set())):
        page = sweep_page(AXES, rows, name="x", plots=("loop_width_mm", "gain_dbi"))
        shown = re.findall(r'<figure id="picture-(\w+)"', page)
        assert shown == [each for each in (*MULTIPLES, "loop_width_mm") if each not in missing]
        figures = list(parsed(page).iter("figure"))
        assert [len(list(each.iter(f"{SVG}svg"))) for each in figures] == [1] * len(shown)


def test_every_curve_has_a_look_of_its_own_while_it_is_named() -> None:
    for texts in (
        ("a.b=1,2,3", LAMINATES),
        (LAMINATES, "c.d=x,y,z", "a.b=1,2,3,4"),
        ("c.d=x,y,z,u,v,w,s,t,q", "e.f=1,2"),
    ):
        curves = sweep_curves(read_axes(texts))
        assert len(set(curves.looks.values())) == len(curves.looks) == len(curves.legend)


def test_more_curves_than_looks_are_coloured_by_laminate() -> None:
    curves = sweep_curves(read_axes(("c.d=p,q,r,s,t,u,v,w", LAMINATES, "a.b=1,2,3")))
    assert (curves.along.key, curves.named_by, len(curves.looks)) == ("a.b", "board.laminate", 24)
    assert [words for _, words in curves.legend] == list(curves.others[0].texts)
    assert len({look.accent for look in curves.looks.values()}) == 3


@pytest.mark.parametrize(
    ("listed", "expected"),
    [
        ("0.8 mm,1.60 mm", ({"0.8 mm": "0.8", "1.60 mm": "1.60"}, "mm")),
        ("-6,1e1", ({"-6": "-6", "1e1": "1e1"}, "")),
        ("2 %,3 %", ({"2 %": "2", "3 %": "3"}, "%")),
        ("1 mm,1 cm", None),
        ("1 mm,wide", None),
        ('["40 mm", "40 mm"],["9 mm", "9 mm"]', None),
        ("2-layer,4-layer", None),
    ],
)
def test_an_axis_is_of_numbers_where_all_have_one_unit(listed: str, expected: object) -> None:
    assert axis_numbers(read_axes((f"a.b={listed}",))[0]) == expected


@pytest.mark.parametrize(
    ("numbers", "told"), [([], ""), ([4], "4"), ([3, 1, 2, 7], "1 to 3, 7"), ([1, 2, 5, 6, 7, 9], "1, 2, 5 to 7, 9")]
)
def test_runs_of_rows(numbers: list[int], told: str) -> None:
    assert row_ranges(numbers) == told


def test_the_file_alone_is_a_whole_document(linear: Rows) -> None:
    drawing = ElementTree.fromstring(sweep_plot_alone(AXES, table_of(linear), "gain_dbi"))
    view = [float(each) for each in drawing.attrib["viewBox"].split()]
    assert float(drawing.attrib["width"]) / float(drawing.attrib["height"]) == pytest.approx(
        view[2] / view[3], rel=0.01
    )
    assert [each.tag for each in list(drawing)[:2]] == [f"{SVG}title", f"{SVG}desc"]

"""report.html of real packs: held against design.json and the HTML standard, and opened in a real browser.

The browser runs without a window and without a driver: a copy of each page is given a script that works its buttons,
looks at its pictures and sends what it saw to the page it is framed in, whose text the browser then prints.
"""

import hashlib
import json
import os
import re
import shutil
import subprocess
import sys
from collections.abc import Iterator
from html import escape, unescape
from pathlib import Path
from typing import Any
from xml.etree.ElementTree import Element

import html5lib
import pytest

from planar.design.portrait_file import read_portrait
from planar.report.page_facts import page_facts
from planar.report.safety import known_gain

EXAMPLES = Path(__file__).resolve().parents[2] / "examples"
LARGEST = 2_000_000
"""Bytes of a page, as asked of it."""
BROWSER = next(filter(None, map(shutil.which, ("chromium", "chromium-browser", "google-chrome", "chrome"))), None)
WIDTHS = (1280, 360)
"""px: a desk, a telephone."""

WATCH = """<script>
window.seen = {errors: []};
window.addEventListener("error", function (e) { seen.errors.push("error: " + (e.message || e.target.src)); }, true);
window.addEventListener("unhandledrejection", function (e) { seen.errors.push("rejection: " + e.reason); });
document.addEventListener("securitypolicyviolation", function (e) { seen.errors.push("refused: " + e.blockedURI); });
["error", "warn"].forEach(function (name) {
  console[name] = function () { seen.errors.push(name + ": " + Array.from(arguments).join(" ")); };
});
</script>"""
WORK = """<script>
window.addEventListener("load", function () {
  const every = function (query) { return Array.from(document.querySelectorAll(query)); };
  const shown = function (each) { return each.getClientRects().length > 0; };
  const size = function (each) { const box = each.getBoundingClientRect(); return [box.width, box.height]; };
  const sides = function () {
    const boards = every("figure[data-name^=board_]").filter(shown);
    return boards.map(function (each) { return each.dataset.name; });
  };
  const paper = function () { return getComputedStyle(document.body).backgroundColor; };
  const pressed = function (button) {
    button.click();
    return [paper(), every("details").map(function (each) { return each.open; }), button.getAttribute("aria-pressed")];
  };
  const root = document.documentElement;
  seen.width = window.innerWidth;
  seen.overflow = root.scrollWidth - root.clientWidth;
  seen.fetched = performance.getEntriesByType("resource").map(function (each) { return each.name; });
  seen.figures = every("figure").filter(shown).map(function (each) { return each.dataset.name; });
  seen.pictures = every("figure .picture > svg, img").filter(function (each) {
    return shown(each) || !each.closest("figure.narrow, figure.roomy");
  }).map(function (each) {
    return {of: each.closest("figure").dataset.name, size: size(each), inside: each.querySelectorAll("*").length};
  });
  seen.paper = paper();
  seen.theme = [1, 2].map(function () { return pressed(document.getElementById("theme")); });
  const details = document.getElementById("details");
  seen.details = details ? [1, 2].map(function () { return pressed(details); }) : [];
  seen.sides = {};
  every("[data-show]").forEach(function (button) { button.click(); seen.sides[button.dataset.show] = sides(); });
  window.parent.postMessage(JSON.stringify(seen), "*");
});
</script>"""
FRAMES = """<!DOCTYPE html><html><head><title>frames</title></head><body><pre id="told"></pre><script>
const told = {};
window.addEventListener("message", function (e) {
  Array.from(document.querySelectorAll("iframe")).forEach(function (frame) {
    if (frame.contentWindow === e.source) { told[frame.name] = JSON.parse(e.data); }
  });
  document.getElementById("told").textContent = JSON.stringify(told);
});
</script>%s</body></html>"""


def page_of(pack: Path) -> str:
    return (pack / "report.html").read_text(encoding="utf-8")


def at(facts: Any, key: str) -> Any:
    for part in key.split("."):
        facts = facts[int(part)] if isinstance(facts, list) else facts[part]
    return facts


def differing(document: Element, facts: Any) -> Iterator[str]:
    """Every number and text of the page that is not its fact, rounded to the digits shown."""
    for element in document.iter():
        if "data-key" in element.attrib:
            key, shown = element.attrib["data-key"], "".join(element.itertext()).replace("\N{MINUS SIGN}", "-")
            half = 0.5000001 * 10.0 ** -len(shown.partition(".")[2])
            if abs(float(shown) - at(facts, key) * float(element.attrib["data-scale"])) > half:
                yield f"{key}: {shown} for {at(facts, key)}"
        if "data-text" in element.attrib and "".join(element.itertext()) != str(at(facts, element.attrib["data-text"])):
            yield element.attrib["data-text"]


def test_page_is_valid_small_and_says_what_the_design_says(pack: Path) -> None:
    """Valid by the parser of the HTML standard, strict; every number of the page is in design.json, or derived."""
    page = page_of(pack)
    assert len(page.encode("utf-8")) < LARGEST
    document = html5lib.HTMLParser(strict=True, namespaceHTMLElements=False).parse(page)
    facts = json.loads((pack / "design.json").read_bytes())
    portrait = read_portrait(pack / "field.json")
    assert list(differing(document, page_facts(facts, None, known_gain(portrait, facts["band_hz"])))) == []
    keys = {element.attrib["data-key"] for element in document.iter() if "data-key" in element.attrib}
    raw = {key for key in keys if not key.startswith(("derived.", "safety."))}
    assert all(isinstance(at(facts, key), int | float) for key in raw)
    assert {f"dimensions_mm.{name}" for name in facts["dimensions_mm"]} <= raw
    assert {"prediction.worst_reflection_db", "prediction.gain_dbi", "prediction.efficiency"} <= raw
    figures = {element.attrib["data-name"] for element in document.iter("figure")}
    levels = {island["level"] for island in facts["copper"]}
    expected = {"stackup", "reflection", "smith", "gain", "cut-0", "cut-90", "losses", "circuit"}
    expected |= {f"board_{level}" for level in levels} | {f"current-{level}" for level in levels}
    assert expected <= figures
    assert ("axial" in figures) == (facts["polarisation"] != "linear")


@pytest.mark.parametrize("pack", [EXAMPLES / "orchard-gateway.toml"], indirect=True, ids=["orchard-gateway"])
def test_page_made_anew_is_the_same(pack: Path, tmp_path: Path) -> None:
    copy = Path(shutil.copytree(pack, tmp_path / pack.name))
    (copy / "report.html").unlink()
    planar(tmp_path, "report", copy)
    assert page_of(copy) == page_of(pack)
    facts = json.loads((copy / "design.json").read_bytes()) | {"planar_version": "0.0.1"}
    rest = {key: value for key, value in facts.items() if key != "hash"}
    facts["hash"] = hashlib.sha256(json.dumps(rest, sort_keys=True).encode()).hexdigest()
    (copy / "design.json").write_text(json.dumps(facts), encoding="utf-8")
    planar(tmp_path, "report", copy, expect=1)  # another version may draw other copper from the same dimensions


@pytest.mark.parametrize("pack", [EXAMPLES / "orchard-gateway.toml"], indirect=True, ids=["orchard-gateway"])
def test_two_packs_side_by_side_replace_a_page_and_nothing_else(pack: Path, tmp_path: Path) -> None:
    """The same pack twice: valid by the HTML standard, no id twice, both best wherever one is."""
    planar(tmp_path, "compare", pack, pack)
    page = (tmp_path / "comparison.html").read_text(encoding="utf-8")
    document = html5lib.HTMLParser(strict=True, namespaceHTMLElements=False).parse(page)
    ids = [element.attrib["id"] for element in document.iter() if "id" in element.attrib]
    assert len(ids) == len(set(ids))
    assert page.count('<span class="best">') % 2 == 0
    notes = tmp_path / "notes.txt"
    notes.write_text("mine", encoding="utf-8")
    planar(tmp_path, "compare", pack, pack, "--page", notes, expect=1)
    assert notes.read_text(encoding="utf-8") == "mine"


def planar(folder: Path, *arguments: object, expect: int = 0) -> None:
    command = [sys.executable, "-m", "planar", *map(str, arguments)]
    env = os.environ | {"OPENBLAS_NUM_THREADS": "1"}
    done = subprocess.run(command, cwd=folder, env=env, capture_output=True, text=True, encoding="utf-8", check=False)
    assert done.returncode == expect, done.stderr


def opened(page: str, folder: Path) -> tuple[dict[int, Any], list[str]]:
    """What the scripts saw of `page` at each width, and the browser's console; files go into `folder`."""
    assert BROWSER is not None
    head, body = page.index("<title>"), page.rindex("</body>")
    watched = "".join((page[:head], WATCH, page[head:body], WORK, page[body:]))
    (folder / "page.html").write_text(watched, encoding="utf-8")
    frames = (f'<iframe src="page.html" name="{width}" width="{width}" height="900"></iframe>' for width in WIDTHS)
    (folder / "frames.html").write_text(FRAMES % "".join(frames), encoding="utf-8")
    options = ["headless", "no-sandbox", "disable-gpu", "no-first-run", "disable-background-networking", "disable-sync"]
    options += ["disable-component-update", "virtual-time-budget=8000", "enable-logging=stderr", "v=0", "dump-dom"]
    command = [BROWSER, f"--user-data-dir={folder / 'profile'}", *(f"--{each}" for each in options)]
    done = subprocess.run(
        [*command, (folder / "frames.html").as_uri()], capture_output=True, text=True, timeout=60, check=False
    )
    told = re.search(r'<pre id="told">(.*?)</pre>', done.stdout, re.DOTALL)
    assert told is not None, done.stderr
    seen = {int(width): each for width, each in json.loads(unescape(told[1])).items()}
    return seen, [line for line in done.stderr.splitlines() if "CONSOLE" in line]


def sound(page: str, folder: Path) -> dict[int, Any]:
    """What was seen of a page on which nothing is wrong, fetched or too wide, pictures are there, light and dark."""
    seen, console = opened(page, folder)
    assert console == []
    assert sorted(seen) == sorted(WIDTHS)
    for width, each in seen.items():
        assert each["width"] == width
        assert each["errors"] == []
        assert [name for name in each["fetched"] if not name.startswith("data:")] == []
        assert each["overflow"] <= 0
        assert all(min(picture["size"]) > 10.0 and picture["inside"] for picture in each["pictures"])
        (other, _, pressed), (back, _, released) = each["theme"]
        assert other != each["paper"] == back
        assert {pressed, released} == {"true", "false"}
    return seen


needs_browser = pytest.mark.skipif(BROWSER is None, reason="no chromium or chrome on PATH")


@needs_browser
@pytest.mark.parametrize(
    "pack",
    [EXAMPLES / "orchard-gateway.toml", EXAMPLES / "parcel-reader.toml"],
    indirect=True,
    ids=["linear", "circular"],
)
def test_page_of_a_design_in_a_browser(pack: Path, tmp_path: Path) -> None:
    for each in sound(page_of(pack), tmp_path).values():
        figures = each["figures"]
        assert len(figures) == len(set(figures))  # of a wide and a narrow variant one is shown
        assert {"board_top", "board_bottom", "reflection", "smith", "cut-0", "cut-90", "circuit"} <= set(figures)
        assert [picture["of"] for picture in each["pictures"]] == figures
        (_, all_open, told), (_, closed, untold) = each["details"]
        assert all_open
        assert all(all_open)
        assert not any(closed)
        assert (told, untold) == ("true", "false")
        both = ["board_top", "board_bottom"]
        assert each["sides"] == {"both": both, "top": both[:1], "bottom": both[1:]}


@needs_browser
def test_page_of_a_refusal_in_a_browser(tmp_path: Path) -> None:
    brief = EXAMPLES / "refused-weather-window.toml"
    planar(tmp_path, "make", brief, expect=1)
    page = page_of(tmp_path / "outputs" / "weather-window-refused")
    assert escape("band moved up to start at", quote=False) in page
    sound(page, tmp_path)


@needs_browser
def test_what_is_wrong_is_seen(tmp_path: Path) -> None:
    """A page that fetches, throws, complains and is too wide: each is found."""
    page = (
        '<!DOCTYPE html><html><head><title>x</title></head><body><button id="theme">x</button>'
        '<figure data-name="x"><img src="http://127.0.0.1:9/missing.png" alt=""></figure><p style="width: 2000px">w</p>'
        "<script>console.error('complaint'); nothing.here();</script></body></html>"
    )
    seen, console = opened(page, tmp_path)
    assert any("nothing is not defined" in line for line in console)
    for each in seen.values():
        assert any("nothing" in error for error in each["errors"])
        assert any("complaint" in error for error in each["errors"])
        assert any("missing.png" in error for error in each["errors"])
        assert each["fetched"] == ["http://127.0.0.1:9/missing.png"]
        assert each["overflow"] > 0

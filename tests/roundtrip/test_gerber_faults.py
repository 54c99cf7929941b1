"""Layer files spoilt one fault at a time: what our reader must refuse and the comparison must report.

Authority: the Gerber layer format specification, revision 2023.08 (commands, regions, attributes, signature), and the
list of what users lose when layer files go wrong.
"""

from __future__ import annotations

import hashlib
import itertools
import re
from collections.abc import Callable
from dataclasses import replace
from pathlib import Path
from typing import Any

import pytest

from planar.copper.layout import Layout, Level
from planar.copper.outline import Outline
from planar.copper.shapes import circle
from planar.handoff.gerber import write_gerber_files
from planar.handoff.gerber_attributes import ProjectFacts, creation_date
from planar.handoff.gerber_check import gerber_mismatches
from planar.handoff.gerber_content import (
    GerberFacts,
)

RING = 0.15e-3
HASH = hashlib.sha256(b"a design").hexdigest()


def facts_of(layout: Layout, **changed: Any) -> GerberFacts:
    project = ProjectFacts(layout.name, "A", HASH, creation_date())
    opened = {marking.level for marking in layout.mask_openings}
    masked = tuple(level for level in Level if level in opened | set(layout.levels))
    return replace(GerberFacts(project, masked, RING), **changed)


def written(layout: Layout, folder: Path) -> Path:
    write_gerber_files(layout, folder, facts=facts_of(layout))
    return folder


def mismatches(layout: Layout, folder: Path) -> str:
    return "\n".join(gerber_mismatches(layout, folder, facts=facts_of(layout)))


# faults planted one at a time


def signed(text: str) -> str:
    """`text` with its signature put right: over all characters before it but the line ends."""
    body = text[: text.rindex("%TF.MD5")] if "%TF.MD5" in text else text.removesuffix("M02*\n")
    digest = hashlib.md5(body.replace("\n", "").encode()).hexdigest()
    return f"{body}%TF.MD5,{digest}*%\nM02*\n"


def spoilt(path: Path, change: Callable[[str], str]) -> None:
    text = path.read_text(encoding="ascii")
    other = change(text)
    assert other != text
    path.write_text(signed(other), encoding="ascii")


def test_the_planted_signature_is_right(two_level: Layout, tmp_path: Path) -> None:
    for path in written(two_level, tmp_path).iterdir():
        assert signed(path.read_text(encoding="ascii")) == path.read_text(encoding="ascii")


def last_draw_lost(text: str) -> str:
    return re.sub(r"X-?\d+Y-?\d+(I-?\d+J-?\d+)?D01\*\nG37", "G37", text, count=1)


def three_arcs_in_one(text: str) -> str:
    """The first three arcs, all about the origin, drawn as one."""
    return re.sub(
        r"(G03\*\n)X\S+?(I-?\d+J-?\d+)D01\*\nX\S+D01\*\n(X-?\d+Y-?\d+)I\S+D01\*", r"\1\3\2D01*", text, count=1
    )


TEXT_FAULTS: list[tuple[str, Callable[[str], str], str]] = [
    ("copper-top", lambda t: t.replace("G03*", "G02*", 1), "expected at most 180"),
    ("copper-top", three_arcs_in_one, "expected at most 180"),
    ("copper-top", last_draw_lost, "an open contour from"),
    ("profile", lambda t: re.sub(r"X-?\d+Y-?\d+I-?\d+J-?\d+D01\*\n%TF.MD5", "%TF.MD5", t), "an open contour from"),
    ("copper-top", lambda t: t.replace("%MOMM*%", "%MOIN*%"), "25.4 times too large"),
    ("copper-top", lambda t: t.replace("FSLAX46Y46", "FSLAX36Y36"), "coordinate format"),
    ("copper-top", lambda t: re.sub(r"%TO.N,ANT\*%\n|%TD.N\*%\n", "", t), "net missing, expected ANT"),
    ("copper-top", lambda t: t.replace("%TO.C,ANT1*%\n", ""), "component missing, expected ANT1"),
    ("copper-top", lambda t: t.replace("EtchedComponent", "Conductor"), "function Conductor, expected EtchedComponent"),
    ("copper-top", lambda t: t.replace("SMDPad,CuDef", "ViaPad"), "no such flash"),
    ("copper-top", lambda t: t.replace("R,1.6X2", "R,1.5X2"), "no such flash"),
    ("copper-top", lambda t: t.replace("X2000000Y14800000D03*", "X2100000Y14800000D03*"), "no such flash"),
    ("copper-top", lambda t: t.replace("I16500000J0", "I16500000J5"), "nm, expected the same"),
    ("copper-top", lambda t: t.replace("G37*", "%TD*%\nG37*", 1), "inside a region"),
    ("copper-top", lambda t: t.replace("%LPD*%", "%LPC*%"), "command LPC"),
    ("copper-top", lambda t: t.replace("G75*\n", ""), "an arc before G75"),
    ("copper-top", lambda t: t.replace("G75*", "G74*"), "command 'G74'"),
    ("copper-top", lambda t: t.replace("X0Y-16500000I16500000J0D01*", "X-16500000Y0I0J0D01*"), "a draw of no length"),
    ("copper-top", lambda t: t.replace("Copper,L1,Top", "Copper,L1,Bot"), ".FileFunction Copper,L1,Bot"),
    ("copper-top", lambda t: t.replace("+00:00", ""), ".CreationDate"),
    ("mask-top", lambda t: t.replace("Negative", "Positive"), ".FilePolarity Positive, expected Negative"),
    ("mask-top", lambda t: t.replace("X2000000Y14800000D03*\n", ""), "1 outlines, expected 2"),
]


@pytest.mark.parametrize(("name", "change", "words"), TEXT_FAULTS, ids=lambda v: v if isinstance(v, str) else "")
def test_fault_in_a_file(
    name: str, change: Callable[[str], str], words: str, one_level: Layout, tmp_path: Path
) -> None:
    spoilt(written(one_level, tmp_path) / f"{name}.gbr", change)
    found = mismatches(one_level, tmp_path)
    assert words in found
    assert all(line.startswith(f"{name}.gbr: ") for line in found.splitlines())


def test_arc_turned_inside_out_where_it_is_half_a_circle(two_level: Layout, tmp_path: Path) -> None:
    """Half a circle stays half a circle: only the shape tells."""
    outlines = [circle((0.0, 0.0), 4e-3), circle((8e-3, 0.0), 4e-3)]
    board = replace(
        two_level, legend=tuple(replace(m, outline=o) for m, o in zip(two_level.legend, outlines, strict=False))
    )
    second = re.compile(r"(G03\*\n\S+D01\*\n)")
    spoilt(written(board, tmp_path) / "legend-top.gbr", lambda text: second.sub(r"\1G02*\n", text, count=1))
    assert "legend-top.gbr: area" in mismatches(board, tmp_path)


def test_file_cut_off_or_changed_or_unsigned(one_level: Layout, tmp_path: Path) -> None:
    path = written(one_level, tmp_path) / "copper-top.gbr"
    whole = path.read_text(encoding="ascii")
    path.write_text(whole[: len(whole) // 2], encoding="ascii")
    assert "no end M02" in mismatches(one_level, tmp_path)
    path.write_text(whole.replace("X2000000Y14800000D03*", "X2000001Y14800000D03*"), encoding="ascii")
    assert "the file was changed" in mismatches(one_level, tmp_path)
    path.write_text(re.sub(r"%TF.MD5.*%\n", "", whole), encoding="ascii")
    assert "no signature .MD5" in mismatches(one_level, tmp_path)
    path.write_text(whole + "X0Y0D03*\n", encoding="ascii")
    assert "after the end M02" in mismatches(one_level, tmp_path)
    path.write_text(whole.replace("\n", "\r\n"), encoding="ascii", newline="")
    assert mismatches(one_level, tmp_path) == ""  # the signature leaves line ends out


def test_every_line_counts(one_level: Layout, tmp_path: Path) -> None:
    """The copper file with one line left out or put in twice, signed again: each is reported, none stops the reader.

    Saying again what holds already changes nothing, nor does taking away an attribute that is set anew.
    """
    path = written(one_level, tmp_path) / "copper-top.gbr"
    lines = path.read_text(encoding="ascii").splitlines()[:-2]
    for i, line in enumerate(lines):
        path.write_text(signed("\n".join([*lines[:i], *lines[i + 1 :], "M02*", ""])), encoding="ascii")
        if not line.startswith(("%TD", "%LPD")):
            assert mismatches(one_level, tmp_path), f"without {line}"
        path.write_text(signed("\n".join([*lines[: i + 1], *lines[i:], "M02*", ""])), encoding="ascii")
        if line.endswith(("D01*", "D03*")) or line.startswith(("%TF", "%AD", "G36", "G37")):
            assert mismatches(one_level, tmp_path), f"twice {line}"


def with_copper(layout: Layout, level: Level, change: Callable[[Outline], Outline]) -> Layout:
    islands = [replace(i, outline=change(i.outline)) if i.level == level else i for i in layout.islands]
    return replace(layout, islands=tuple(islands))


def test_mirrored_bottom(two_level: Layout, tmp_path: Path) -> None:
    written(with_copper(two_level, Level.BOTTOM, Outline.mirrored), tmp_path)
    assert "copper-bottom.gbr: mirrored left to right" in mismatches(two_level, tmp_path)


@pytest.mark.parametrize(("factor", "words"), [(25.4, "25.4 times too large"), (1 / 25.4, "25.4 times too small")])
def test_wrong_scale(one_level: Layout, tmp_path: Path, factor: float, words: str) -> None:
    written(with_copper(one_level, Level.TOP, lambda o: Outline(o.vertices * (factor, factor, 1.0))), tmp_path)
    assert f"copper-top.gbr: {words}" in mismatches(one_level, tmp_path)


def test_arc_a_micrometre_off(one_level: Layout, tmp_path: Path) -> None:
    written(with_copper(one_level, Level.TOP, lambda o: Outline(o.vertices * (1.0, 1.0, 1.0001))), tmp_path)
    assert "copper-top.gbr: area" in mismatches(one_level, tmp_path)


@pytest.mark.parametrize("lost", [0, 1, 2])
def test_lost_island(two_level: Layout, tmp_path: Path, lost: int) -> None:
    level = two_level.islands[lost].level
    count = len(two_level.copper(level))
    written(replace(two_level, islands=two_level.islands[:lost] + two_level.islands[lost + 1 :]), tmp_path)
    assert f"copper-{level}.gbr: {count - 1} regions, expected {count}" in mismatches(two_level, tmp_path)


def test_swapped_nets_and_pins(two_level: Layout, tmp_path: Path) -> None:
    first, second, line = two_level.islands
    islands = (replace(first, net=second.net), replace(second, net=first.net), line)
    signal, ground = two_level.pads
    pads = (replace(signal, name=ground.name), replace(ground, name=signal.name))
    written(replace(two_level, islands=islands, pads=pads), tmp_path)
    found = mismatches(two_level, tmp_path)
    assert "net SIGNAL, expected RETURN" in found
    assert "net RETURN, expected SIGNAL" in found
    assert "pin ANT1-RET: a flash, expected none" in found


def test_land_that_adds_copper(ring_guided: Layout, tmp_path: Path) -> None:
    wide = facts_of(ring_guided, via_ring_m=2e-3)
    write_gerber_files(ring_guided, tmp_path, facts=wide)
    found = gerber_mismatches(ring_guided, tmp_path, facts=wide)
    assert any("beyond the copper of its net" in line for line in found)


def test_missing_file(two_level: Layout, tmp_path: Path) -> None:
    (written(two_level, tmp_path) / "mask-bottom.gbr").unlink()
    assert "mask-bottom.gbr cannot be read" in mismatches(two_level, tmp_path)


def mirrored_land(text: str) -> str:
    """The first polygon to flash with the signs of its x exchanged."""
    corners = re.compile(r"(4,1,\d+,)([-\d.,]+)(,0\*)")

    def other(match: re.Match[str]) -> str:
        numbers = [float(number) for number in match[2].split(",")]
        signs = itertools.cycle((-1.0, 1.0))
        return match[1] + ",".join(f"{sign * n:.6f}" for sign, n in zip(signs, numbers, strict=False)) + match[3]

    return corners.sub(other, text, count=1)


@pytest.mark.parametrize(
    ("change", "words"),
    [
        (mirrored_land, "no such flash, expected one"),
        (lambda text: re.sub(r"(4,1,\d+,)[-\d.]+,", r"\g<1>9.5,", text, count=1), "expected one closed outline"),
        (lambda text: re.sub(r"4,1,(\d+)", "4,1,5", text, count=1), "expected one closed outline"),
        (lambda text: text.replace("%AMLAND10*", "%AMLAND99*"), "a defined macro"),
    ],
)
def test_fault_in_a_land_of_another_shape(
    change: Callable[[str], str], words: str, plain: Layout, tmp_path: Path
) -> None:
    spoilt(written(plain, tmp_path) / "copper-top.gbr", change)
    assert words in mismatches(plain, tmp_path)

"""One complete pack, and one fault at a time planted in its fabrication files: the validator names file and mistake.

Files are changed the way a broken writer or a careless hand would, by text edits that know nothing of this program;
Gerber files are signed anew, so that not the signature tells. Authority: the list of what users lose when such files go
wrong, common practice of board fabrication.
"""

from __future__ import annotations

import hashlib
import json
import re
import shutil
from collections.abc import Callable
from pathlib import Path

import pytest

from planar.copper.layout import Layout
from planar.errors import HandoffError
from planar.handoff import FabricationFacts, fabrication_names, layout_names

Change = Callable[[Path], None]


def test_whole_pack_passes(whole: Path, checks: dict[str, Change]) -> None:
    for check in checks.values():
        check(whole)


def test_names_are_those_of_what_is_written(whole: Path, two_level: Layout, pack_facts: FabricationFacts) -> None:
    written = {part: {path.name for path in (whole / part).iterdir()} for part in ("layout", "fabrication")}
    assert written["layout"] == layout_names(two_level)
    assert written["fabrication"] == fabrication_names(two_level, pack_facts)


# the tools faults are planted with


def text_fault(change: Callable[[str], str], path: Path) -> None:
    """Change a text file; a Gerber file is signed anew, over all characters but line ends (specification, .MD5)."""
    before = path.read_text(encoding="utf-8")
    after = change(before)
    assert after != before, "nothing planted"
    if path.suffix == ".gbr":
        body = after[: after.rindex("%TF.MD5")]
        digest = hashlib.md5(body.replace("\n", "").encode()).hexdigest()
        after = f"{body}%TF.MD5,{digest}*%\nM02*\n"
    path.write_text(after, encoding="utf-8")


def text(file: str, change: Callable[[str], str]) -> Change:
    return lambda pack: text_fault(change, pack / "fabrication" / file)


# faults in Gerber files


def mirrored(gerber: str) -> str:
    """x turned round, and with it the direction of every arc."""
    head, body = gerber.split("%LPD*%", 1)
    body = re.sub(r"([XI])(-?)(\d+)", lambda m: m[1] + ("" if m[2] or m[3] == "0" else "-") + m[3], body)
    return head + "%LPD*%" + re.sub(r"G0([23])\*", lambda m: f"G0{_OTHER[m[1]]}*", body)


_OTHER = {"2": "3", "3": "2"}


def without_region(gerber: str) -> str:
    return re.sub(r"G36\*\n.*?G37\*\n", "", gerber, count=1, flags=re.DOTALL)


def without_last_draw(gerber: str) -> str:
    return re.sub(r"X-?\d+Y-?\d+(I-?\d+J-?\d+)?D01\*\nG37", "G37", gerber, count=1)


def with_first_arc_turned(gerber: str) -> str:
    """The other way about the same centre: less than half a circle becomes the rest of it."""
    first = re.search(r"G0([23])\*\nX.*?I.*?D01\*\n", gerber)
    assert first is not None
    turned = first[0].replace(f"G0{first[1]}", f"G0{_OTHER[first[1]]}")
    rest = gerber[first.end() :]
    back = "" if rest.startswith("G0") else f"G0{first[1]}*\n"
    return gerber[: first.start()] + turned + back + rest


def with_centre_across_the_chord(gerber: str) -> str:
    """The first arc bulges to the other side: centre mirrored at the chord, direction turned. Nothing else moves."""
    arc = re.search(r"X(-?\d+)Y(-?\d+)(?:D0[12])\*\n(G0([23]))\*\nX(-?\d+)Y(-?\d+)I(-?\d+)J(-?\d+)D01\*\n", gerber)
    assert arc is not None
    x0, y0, x1, y1, i, j = (int(arc[n]) for n in (1, 2, 5, 6, 7, 8))
    u, v = x1 - x0, y1 - y0
    along = 2.0 * (i * u + j * v) / (u * u + v * v)
    other = f"I{round(along * u - i)}J{round(along * v - j)}"
    turned = arc[0].replace(f"I{i}J{j}", other).replace(arc[3], f"G0{_OTHER[arc[4]]}")
    rest = gerber[arc.end() :]
    back = "" if rest.startswith("G0") else f"{arc[3]}*\n"
    return gerber[: arc.start()] + turned + back + rest


def other_legend(pack: Path) -> None:
    """The two legends printed on each other's side, the headers of the files left right."""
    paths = [pack / "fabrication" / f"legend-{side}.gbr" for side in ("top", "bottom")]
    (head, body), (other_head, other_body) = (p.read_text(encoding="ascii").split("%LPD*%", 1) for p in paths)
    for path, changed in zip(paths, (head + "%LPD*%" + other_body, other_head + "%LPD*%" + body), strict=True):
        text_fault(lambda _, changed=changed: changed, path)


GERBER_FAULTS: list[tuple[str, Change, str]] = [
    ("mirror one level", text("copper-bottom.gbr", mirrored), r"copper-bottom\.gbr: mirrored left to right"),
    ("drop an island", text("copper-bottom.gbr", without_region), r"copper-bottom\.gbr: 1 regions, expected 2"),
    ("open an outline", text("copper-top.gbr", without_last_draw), r"copper-top\.gbr: .*an open contour"),
    ("arc the long way round", text("copper-bottom.gbr", with_first_arc_turned), r"copper-bottom\.gbr: .*at most 180"),
    (
        "flip an arc",
        text("copper-bottom.gbr", with_centre_across_the_chord),
        r"copper-bottom\.gbr: (area|an outline that crosses)",
    ),
    (
        "inches for millimetres",
        text("copper-top.gbr", lambda t: t.replace("%MOMM*%", "%MOIN*%")),
        r"copper-top\.gbr: 25\.4 times too large",
    ),
    (
        "no net on the copper",
        text("copper-top.gbr", lambda t: re.sub(r"%TO\.N,SIGNAL\*%\n", "", t)),
        r"copper-top\.gbr: region at .*net missing, expected SIGNAL",
    ),
    (
        "land of another net",
        text("copper-bottom.gbr", lambda t: re.sub(r"%TO\.N,RETURN(\*%\n(?:%TO.*\n)*X.*D03)", r"%TO.N,SIGNAL\1", t)),
        r"copper-bottom\.gbr: .*net SIGNAL, pin ANT1-RET: a flash, expected none",
    ),
    (
        "mask opening lost",
        text("mask-top.gbr", lambda t: re.sub(r"X-?\d+Y-?\d+D03\*\n", "", t, count=1)),
        r"mask-top\.gbr: .*no such flash, expected one",
    ),
    ("legend on the other side", other_legend, r"legend-top\.gbr: extents"),
    (
        "square corners on the board edge",
        text("profile.gbr", lambda t: re.sub(r"G0[23]\*", "G01*", re.sub(r"I-?\d+J-?\d+D01", "D01", t))),
        r"profile\.gbr: area",
    ),
    (
        "attribute of the other side",
        text("copper-top.gbr", lambda t: t.replace("Copper,L1,Top", "Copper,L2,Bot")),
        r"copper-top\.gbr: \.FileFunction Copper,L2,Bot, expected Copper,L1,Top",
    ),
]


# faults in drills, netlist, job file, stackup


def shifted(drill: str) -> str:
    return re.sub(r"X(-?\d+\.\d+)", lambda m: f"X{float(m[1]) + 0.1:.3f}", drill)


def swapped_drills(pack: Path) -> None:
    one, other = (pack / "fabrication" / f"drill-{kind}.xnc" for kind in ("plated", "unplated"))
    content = one.read_bytes()
    one.write_bytes(other.read_bytes())
    other.write_bytes(content)


def stale_layer(pack: Path) -> None:
    shutil.copy(pack / "fabrication" / "copper-top.gbr", pack / "fabrication" / "copper-inner.gbr")


def one_letter(pack: Path) -> None:
    """As a careless hand would: the signature stays."""
    path = pack / "fabrication" / "copper-top.gbr"
    path.write_bytes(path.read_bytes().replace(b"TO.N,SIGNAL", b"TO.N,SIGNAI", 1))


def job(change: Callable[[dict[str, list[dict[str, object]]]], None]) -> Change:
    def planted(content: str) -> str:
        told = json.loads(content)
        change(told)
        return json.dumps(told, indent=2)

    return text("job.gbrjob", planted)


def thicker(told: dict[str, list[dict[str, object]]]) -> None:
    next(row for row in told["MaterialStackup"] if row["Type"] == "Dielectric")["Thickness"] = 1.5


OTHER_FAULTS: list[tuple[str, Change, str]] = [
    ("drills off by 0.1 mm", text("drill-plated.xnc", shifted), r"drill-plated\.xnc: hole at \(-24\.9"),
    (
        "mounting holes off by 0.1 mm",
        text("drill-unplated.xnc", shifted),
        r"drill-unplated\.xnc: hole at \(30\.1.*expected \(30\.0",
    ),
    (
        "plated and unplated swapped",
        swapped_drills,
        r"drill-plated\.xnc: \.FileFunction NonPlated,1,2,NPTH, expected Pl",
    ),
    (
        "holes said to be plated",
        text("drill-unplated.xnc", lambda t: t.replace("NonPlated,1,2,NPTH", "Plated,1,2,PTH")),
        r"drill-unplated\.xnc: \.FileFunction Plated,1,2,PTH, expected NonPlated",
    ),
    (
        "drills in inches",
        text("drill-plated.xnc", lambda t: t.replace("METRIC", "INCH")),
        r"drill-plated\.xnc: no METRIC",
    ),
    ("stale layer file", stale_layer, r"copper-inner\.gbr: does not belong here"),
    (
        "net lost",
        text("netlist.ipc", lambda t: re.sub(r"327RETURN.*\n", "", t)),
        r"netlist\.ipc: net RETURN is missing",
    ),
    (
        "land of another net in the netlist",
        text("netlist.ipc", lambda t: re.sub(r"327RETURN", "327SIGNAL", t)),
        r"netlist\.ipc: land ANT1-2 .*net SIGNAL, expected RETURN",
    ),
    ("netlist in other units", text("netlist.ipc", lambda t: t.replace("CUST 1", "CUST 0")), r"netlist\.ipc: .*CUST"),
    ("wrong total in the job file", job(thicker), r"job\.gbrjob: .*1\.586 mm together, board of 1\.686 mm"),
    (
        "job file without the mask",
        job(lambda told: told["MaterialStackup"].pop(1)),
        r"job\.gbrjob: stackup is",
    ),
    (
        "permittivity in the stackup",
        text("stackup.json", lambda t: re.sub(r'"eps_r": 4\.\d+', '"eps_r": 4.6', t)),
        r"stackup\.json: layers_top_to_bottom",
    ),
    (
        "file missing",
        lambda pack: (pack / "fabrication" / "mask-bottom.gbr").unlink(),
        r"mask-bottom\.gbr cannot be read",
    ),
    ("one letter in a signed file", one_letter, r"copper-top\.gbr: .*the file was changed"),
]


def with_byte(name: str) -> Change:
    """One byte more at the end."""

    def planted(pack: Path) -> None:
        path = pack / "fabrication" / name
        path.write_bytes(path.read_bytes() + b" ")

    return planted


def old_drawing(pack: Path) -> None:
    """The date another: the drawing of another day."""
    path = pack / "fabrication" / "drawing.pdf"
    path.write_bytes(path.read_bytes().replace(b"D:2000", b"D:2001"))


def stale_notes(pack: Path) -> None:
    (pack / "fabrication" / "notes.txt").write_bytes(b"call me")


def empty_folder(pack: Path) -> None:
    (pack / "fabrication" / "old").mkdir()


ATTRIBUTE = r"; #@! TF"
PAPER_FAULTS: list[tuple[str, Change, str]] = [
    (
        "project of another board",
        text("drill-plated.xnc", lambda t: re.sub(r"(\.ProjectId,)[^,]*", r"\1other", t)),
        r"drill-plated\.xnc: \.ProjectId other,",
    ),
    (
        "coordinates of another set",
        text("drill-unplated.xnc", lambda t: re.sub(r"(\.SameCoordinates,).{4}", r"\g<1>0000", t)),
        r"drill-unplated\.xnc: \.SameCoordinates 0000",
    ),
    (
        "no date",
        text("drill-plated.xnc", lambda t: re.sub(rf"{ATTRIBUTE}\.CreationDate.*\n", "", t)),
        r"drill-plated\.xnc: \.CreationDate missing",
    ),
    (
        "mask over the lands in the netlist",
        text("netlist.ipc", lambda t: re.sub(r"S2(?= {6}\n)", "S3", t)),
        r"netlist\.ipc: .*solder mask 3, expected",
    ),
    (
        "no mask in the netlist at all",
        text("netlist.ipc", lambda t: re.sub(r"S[123](?= {6}\n)", "S0", t)),
        r"netlist\.ipc: .*solder mask 0, expected",
    ),
    (
        "every ring in the netlist wider",
        text("netlist.ipc", lambda t: re.sub(r"^(317.{54}X)0600", r"\g<1>0800", t, flags=re.MULTILINE)),
        r"netlist\.ipc: plated hole .*width 0\.800 mm, expected 0\.600 mm",
    ),
    (
        "netlist of another job",
        text("netlist.ipc", lambda t: t.replace("P  JOB two level", "P  JOB two boards")),
        r"netlist\.ipc: job two boards, 868 MHz, expected two level",
    ),
    ("drawing of another day", old_drawing, r"drawing\.pdf: other bytes than are written"),
    ("drawing missing", lambda pack: (pack / "fabrication" / "drawing.pdf").unlink(), r"drawing\.pdf cannot be read"),
    (
        "other thickness on the page of the stackup",
        text("stackup.md", lambda t: t.replace("1.6 mm", "1.5 mm")),
        r"stackup\.md: .*1\.5 mm.*expected.*1\.6 mm",
    ),
    (
        "another page for the operator",
        text("README-cam.txt", lambda t: t.replace("35 um base", "70 um base")),
        r"README-cam\.txt: .*70 um.*expected.*35 um",
    ),
    (
        "no page for the builder",
        lambda pack: (pack / "fabrication" / "README-build.txt").unlink(),
        r"README-build\.txt cannot be read",
    ),
    ("blank at the end", with_byte("README-build.txt"), r"README-build\.txt: "),
    (
        "stale file of any kind",
        stale_notes,
        r"notes\.txt: does not belong here",
    ),
    ("folder of another time", empty_folder, r"old: does not belong here"),
]


@pytest.mark.parametrize(
    ("planted", "words"),
    [pytest.param(*fault[1:], id=fault[0]) for fault in GERBER_FAULTS + OTHER_FAULTS + PAPER_FAULTS],
)
def test_fault_in_the_fabrication_files(planted: Change, words: str, pack: Path, checks: dict[str, Change]) -> None:
    planted(pack)
    with pytest.raises(HandoffError) as caught:
        checks["fabrication"](pack)
    assert re.search(words, str(caught.value)), str(caught.value)

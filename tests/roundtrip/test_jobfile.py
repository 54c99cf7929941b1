"""The job file written, read again by our reader and by plain JSON, and spoilt one fault at a time.

Authority: the Gerber job file format specification (key names and values from memory of it), sums done by hand, and
the layer files themselves for what the job says of them.
"""

from __future__ import annotations

import json
from collections.abc import Callable
from dataclasses import replace
from pathlib import Path
from typing import Any

import pytest

from planar.copper.layout import Layout
from planar.errors import HandoffError
from planar.handoff.gerber import write_gerber_files
from planar.handoff.gerber_attributes import ProjectFacts
from planar.handoff.gerber_content import GerberFacts
from planar.handoff.gerber_reader import read_gerber
from planar.handoff.jobfile import Job, JobFacts, ListedFile, job_mismatches, listed, make_job, read_job, write_job
from planar.handoff.stackup_files import read_stackup_json, write_stackup_json
from planar.handoff.stackup_sheet import ImpedanceLine, SheetFacts, StackupSheet, stackup_sheet
from planar.library import WidebandDebye
from planar.stackup import Conductor, Layer, LayerKind, Stackup

FREQUENCY = 868.3e6
DRILLS = (ListedFile("drill-plated.xnc", "Plated,1,2,PTH", "Positive"),)
LINE = ImpedanceLine("feed line", "microstrip", 3.05e-3, None, "top", "bottom", 50.0, 5.0, True)
NAME = "job.gbrjob"


def sheet_of(layers: tuple[Layer, ...], *lines: ImpedanceLine, finish: str = "immersion silver") -> StackupSheet:
    conductor = Conductor(base_thickness=35e-6, plating=8e-6, conductivity=5.8e7, roughness_rq=0.4e-6)
    facts = SheetFacts("orchard", FREQUENCY, finish, None, 0.15e-3, dc_short=True)
    return stackup_sheet(Stackup(layers, conductor, 0.1), lines, facts=facts)


def board_layers() -> dict[str, Layer]:
    """Bottom to top, with a reflector below that no fab builds."""
    laminate = WidebandDebye.from_point(4.3, 0.02, at=FREQUENCY)
    mask = WidebandDebye.from_point(3.5, 0.025, at=FREQUENCY)
    air = WidebandDebye.from_point(1.0, 0.0, at=FREQUENCY)
    layers = (
        Layer("reflector", LayerKind.METAL_PLANE, "metal plane", 0.0),
        Layer("reflector-gap", LayerKind.AIR, "air", 40e-3, air),
        Layer("mask-bottom", LayerKind.MASK, "solder mask", 20e-6, mask),
        Layer("copper-bottom", LayerKind.COPPER, "copper", 43e-6),
        Layer("dielectric", LayerKind.DIELECTRIC, "glass epoxy", 1.6e-3, laminate),
        Layer("copper-top", LayerKind.COPPER, "copper", 43e-6),
        Layer("mask-top", LayerKind.MASK, "solder mask", 20e-6, mask),
        Layer("legend-top", LayerKind.LEGEND, "legend ink", 0.0),
    )
    return {layer.name: layer for layer in layers}


@pytest.fixture
def sheet() -> StackupSheet:
    return sheet_of(tuple(board_layers().values()))


@pytest.fixture
def project(two_level: Layout) -> ProjectFacts:
    return ProjectFacts(two_level.name, "B", "0123456789abcdef" * 4, "2000-01-01T00:00:00+00:00")


@pytest.fixture
def job(two_level: Layout, sheet: StackupSheet, project: ProjectFacts, tmp_path: Path) -> Job:
    """The job of the board in a folder that holds all its files, written."""
    files = write_gerber_files(two_level, tmp_path, facts=GerberFacts(project, two_level.levels, 0.15e-3))
    (tmp_path / DRILLS[0].path).write_text("M48\n", encoding="ascii")
    made = make_job(two_level, sheet, JobFacts(project, (*listed(files), *DRILLS), 0.15e-3, 0.2e-3))
    write_job(made, tmp_path / NAME)
    return made


def content(folder: Path) -> dict[str, Any]:
    data: dict[str, Any] = json.loads((folder / NAME).read_text(encoding="utf-8"))
    return data


def test_sections_and_values(job: Job, tmp_path: Path) -> None:
    data = content(tmp_path)
    assert list(data) == ["Header", "GeneralSpecs", "DesignRules", "FilesAttributes", "MaterialStackup"]
    general = data["GeneralSpecs"]
    assert general["Size"] == {"X": 125.0, "Y": 110.0}  # the edge from (-60, -55) to (65, 55) mm
    assert general["LayerNumber"] == 2
    assert general["BoardThickness"] == 1.686  # 1.6 + 2 x 0.043 mm, mask left out
    assert general["Finish"] == "Immersion silver"
    assert general["ImpedanceControlled"] is False
    assert data["Header"]["CreationDate"] == "2000-01-01T00:00:00+00:00"
    (rules,) = data["DesignRules"]
    assert (rules["Layers"], rules["MinLineWidth"], rules["TrackToTrack"]) == ("Outer", 0.15, 0.2)


def test_stackup_is_complete_and_adds_up_to_the_summary(job: Job, sheet: StackupSheet, tmp_path: Path) -> None:
    rows = content(tmp_path)["MaterialStackup"]
    kinds = ["Legend", "SolderMask", "Copper", "Dielectric", "Copper", "SolderMask"]
    assert [row["Type"] for row in rows] == kinds
    assert rows[3]["DielectricConstant"] == pytest.approx(4.3, abs=1e-6)  # the model goes through its data point
    assert rows[3]["LossTangent"] == pytest.approx(0.02, abs=1e-9)
    assert rows[3]["Material"] == "glass epoxy"
    write_stackup_json(sheet, tmp_path / "stackup.json")
    total = read_stackup_json(tmp_path / "stackup.json").total_thickness_m
    assert read_job(tmp_path / NAME).stackup_total_m == pytest.approx(total, abs=1e-12)
    assert sum(row["Thickness"] for row in rows if row["Type"] in ("Copper", "Dielectric")) == pytest.approx(1.686)


def test_files_are_listed_as_they_describe_themselves(job: Job, tmp_path: Path) -> None:
    listed_files = {row["Path"]: row for row in content(tmp_path)["FilesAttributes"]}
    assert set(listed_files) == {path.name for path in tmp_path.iterdir()} - {NAME}
    project = content(tmp_path)["GeneralSpecs"]["ProjectId"]
    for path in tmp_path.glob("*.gbr"):
        attributes = read_gerber(path).attributes
        assert listed_files[path.name]["FileFunction"] == ",".join(attributes[".FileFunction"])
        assert (listed_files[path.name]["FilePolarity"],) == attributes[".FilePolarity"]
        assert (project["Name"], project["GUID"], project["Revision"]) == attributes[".ProjectId"]


def test_read_back_and_same_bytes_twice(job: Job, tmp_path: Path) -> None:
    assert read_job(tmp_path / NAME) == job
    assert job_mismatches(job, tmp_path / NAME) == []
    first = (tmp_path / NAME).read_bytes()
    write_job(job, tmp_path / NAME)
    assert (tmp_path / NAME).read_bytes() == first


def test_controlled_line_and_other_finish(two_level: Layout, project: ProjectFacts) -> None:
    layers = tuple(board_layers().values())
    facts = JobFacts(project, (), 0.15e-3, 0.15e-3)
    assert make_job(two_level, sheet_of(layers, LINE), facts).impedance_controlled
    assert not make_job(two_level, sheet_of(layers, replace(LINE, controlled=False)), facts).impedance_controlled
    assert make_job(two_level, sheet_of(layers, finish="bees wax"), facts).finish == "User defined"


@pytest.mark.parametrize(
    ("lost", "words"),
    [
        ("copper-bottom", "1 copper layers, expected 2"),
        ("dielectric", "copper without a dielectric between"),
    ],
)
def test_partial_stackup_is_refused(
    lost: str, words: str, two_level: Layout, sheet: StackupSheet, project: ProjectFacts
) -> None:
    layers = tuple(layer for layer in sheet.layers if layer.name != lost)
    with pytest.raises(HandoffError, match=words):
        make_job(two_level, replace(sheet, layers=layers), JobFacts(project, (), 0.15e-3, 0.15e-3))


def test_stackup_must_add_up(two_level: Layout, sheet: StackupSheet, project: ProjectFacts) -> None:
    facts = JobFacts(project, (), 0.15e-3, 0.15e-3)
    with pytest.raises(HandoffError, match=r"layers of 1\.686 mm together, board of 1\.6 mm"):
        make_job(two_level, replace(sheet, total_thickness_m=1.6e-3), facts)
    bare = tuple(replace(layer, eps_r=None) for layer in sheet.layers)
    with pytest.raises(HandoffError, match="dielectric: no permittivity"):
        make_job(two_level, replace(sheet, layers=bare), facts)


FAULTS: list[tuple[Callable[[dict[str, Any]], Any], str]] = [
    (lambda d: d["GeneralSpecs"]["Size"].update(X=4.92126), "size_m is"),
    (lambda d: d["GeneralSpecs"].update(BoardThickness=1.6), "thickness_m is"),
    (lambda d: d["GeneralSpecs"].update(ImpedanceControlled=True), "impedance_controlled is True, expected False"),
    (lambda d: d["MaterialStackup"].pop(3), "copper without a dielectric between"),
    (lambda d: d["MaterialStackup"].reverse(), "stackup is"),
    (lambda d: d["FilesAttributes"][0].update(FileFunction="Copper,L2,Bot"), "files is"),
    (lambda d: d["FilesAttributes"][0].update(Path="old.gbr"), "lists old.gbr, which is not there"),
    (lambda d: d.pop("MaterialStackup"), "is no job file: KeyError"),
    (lambda d: d["DesignRules"][0].update(PadToPad=0.1), "is no job file: ValueError"),
]


@pytest.mark.parametrize(("change", "words"), FAULTS, ids=lambda value: value if isinstance(value, str) else "")
def test_fault_in_the_file(change: Callable[[dict[str, Any]], Any], words: str, job: Job, tmp_path: Path) -> None:
    data = content(tmp_path)
    change(data)
    (tmp_path / NAME).write_text(json.dumps(data), encoding="utf-8")
    assert any(words in line for line in job_mismatches(job, tmp_path / NAME))


def test_missing_file(job: Job, tmp_path: Path) -> None:
    (tmp_path / "profile.gbr").unlink()
    assert job_mismatches(job, tmp_path / NAME) == [f"{NAME}: lists profile.gbr, which is not there"]
    (tmp_path / NAME).unlink()
    assert "is no job file" in job_mismatches(job, tmp_path / NAME)[0]

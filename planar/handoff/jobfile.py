"""The job file (.gbrjob): what the set of fabrication files is, in JSON, with the complete stackup.

One record, `Job`, is made from layout, stackup sheet and the list of files; writer and reader put down and return the
same record. Lengths are SI in the record and millimetres in the file, as the format wants. A partial stackup is
refused. Authority: the Gerber job file format specification; key names and values from memory of it.
"""

from __future__ import annotations

import itertools
import json
import math
from collections.abc import Iterable
from dataclasses import dataclass, fields
from pathlib import Path
from typing import Any

from planar.copper.layout import Layout
from planar.errors import HandoffError
from planar.handoff.gerber_attributes import Fields, ProjectFacts
from planar.handoff.gerber_content import GerberFile
from planar.handoff.stackup_sheet import SheetLayer, StackupSheet

FINISHES = {
    "immersion gold on nickel": "ENIG",
    "immersion silver": "Immersion silver",
    "immersion tin": "Immersion tin",
    "organic preservative": "OSP",
    "lead-free solder levelling": "HAL lead-free",
    "bare copper": "None",
}
"""Finish in the words of the fab files -> value of the job file; another finish is "User defined"."""
_TYPES = {"legend": "Legend", "mask": "SolderMask", "copper": "Copper", "dielectric": "Dielectric"}
_THICKNESS_SLACK = 1e-9
_GAPS = ("PadToPad", "PadToTrack", "TrackToTrack", "TrackToRegion", "RegionToRegion")


@dataclass(frozen=True)
class ListedFile:
    """A file of the set: path relative to the job file, file function and polarity as in the file itself."""

    path: str
    function: str
    polarity: str


@dataclass(frozen=True)
class JobFacts:
    """What a job says beside layout and stackup: every file of the set but the job file, and the least track and gap
    the design keeps to, m."""

    project: ProjectFacts
    files: tuple[ListedFile, ...]
    min_track_m: float
    min_gap_m: float


@dataclass(frozen=True)
class JobLayer:
    """A layer of the stackup: `kind` Legend, SolderMask, Copper or Dielectric; None where the format wants no value."""

    kind: str
    name: str
    material: str | None
    thickness_m: float | None
    dielectric_constant: float | None
    loss_tangent: float | None


@dataclass(frozen=True)
class Job:
    """Everything a job file says. `size_m` is that of the board edge; `stackup` lists the layers top to bottom."""

    software: Fields
    created: str
    project: Fields
    size_m: tuple[float, float]
    levels: int
    thickness_m: float
    finish: str
    impedance_controlled: bool
    min_track_m: float
    min_gap_m: float
    files: tuple[ListedFile, ...]
    stackup: tuple[JobLayer, ...]

    @property
    def stackup_total_m(self) -> float:
        """Thickness of copper and dielectric together, mask left out, m."""
        return math.fsum(a.thickness_m or 0.0 for a in self.stackup if a.kind in ("Copper", "Dielectric"))


def listed(files: Iterable[GerberFile]) -> tuple[ListedFile, ...]:
    """Entries of layer files that lie beside the job file."""
    return tuple(ListedFile(file.name, ",".join(file.function), file.polarity) for file in files)


def make_job(layout: Layout, sheet: StackupSheet, facts: JobFacts) -> Job:
    """The job of a snapped `layout` on the stackup of `sheet`.

    Raises `HandoffError` when the stackup is not complete: other copper levels than the layout's, copper on copper,
    a layer without thickness or permittivity, or layers that do not add up to the board's thickness.
    """
    finish = sheet.facts.finish
    project = facts.project
    job = Job(
        software=project.software,
        created=project.created,
        project=(project.name, project.guid, project.revision),
        size_m=(_rounded(layout.size[0]), _rounded(layout.size[1])),
        levels=len(layout.levels),
        thickness_m=_rounded(sheet.total_thickness_m),
        finish=finish if finish in FINISHES.values() else FINISHES.get(finish, "User defined"),
        impedance_controlled=any(line.controlled for line in sheet.impedance_lines),
        min_track_m=_rounded(facts.min_track_m),
        min_gap_m=_rounded(facts.min_gap_m),
        files=facts.files,
        stackup=tuple(_job_layer(layer) for layer in sheet.layers),
    )
    faults = _stackup_faults(job)
    if faults:
        raise HandoffError("\n".join([f"{layout.name}: the stackup of the job file is not complete:", *faults]))
    return job


def _job_layer(layer: SheetLayer) -> JobLayer:
    kind = _TYPES[layer.kind]
    return JobLayer(
        kind,
        layer.name,
        None if kind == "Copper" else layer.material,
        _rounded(layer.thickness_m) if layer.thickness_m > 0.0 else None,
        None if layer.eps_r is None else round(layer.eps_r, 6),
        None if layer.tan_d is None else round(layer.tan_d, 9),
    )


def _stackup_faults(job: Job) -> list[str]:
    """What keeps a stackup from being complete."""
    body = [layer.kind for layer in job.stackup if layer.kind in ("Copper", "Dielectric")]
    faults = []
    if body.count("Copper") != job.levels:
        faults.append(f"{body.count('Copper')} copper layers, expected {job.levels}")
    if "Dielectric" not in body or ("Copper", "Copper") in itertools.pairwise(body):
        faults.append("copper without a dielectric between, expected one")
    for layer in job.stackup:
        if layer.kind != "Legend" and layer.thickness_m is None:
            faults.append(f"{layer.name}: no thickness")
        if layer.kind in ("SolderMask", "Dielectric") and None in (layer.dielectric_constant, layer.loss_tangent):
            faults.append(f"{layer.name}: no permittivity or no loss tangent")
    if abs(job.stackup_total_m - job.thickness_m) > _THICKNESS_SLACK * max(1, len(body)):
        faults.append(f"layers of {_mm(job.stackup_total_m)} mm together, board of {_mm(job.thickness_m)} mm")
    return faults


def write_job(job: Job, path: Path) -> None:
    """Write `job` as JSON. The same job gives the same bytes."""
    path.write_bytes((json.dumps(_content(job), indent=2, ensure_ascii=False) + "\n").encode("utf-8"))


def _content(job: Job) -> dict[str, Any]:
    return {
        "Header": {
            "GenerationSoftware": dict(zip(("Vendor", "Application", "Version"), job.software, strict=True)),
            "CreationDate": job.created,
        },
        "GeneralSpecs": {
            "ProjectId": dict(zip(("Name", "GUID", "Revision"), job.project, strict=True)),
            "Size": {"X": _mm(job.size_m[0]), "Y": _mm(job.size_m[1])},
            "LayerNumber": job.levels,
            "BoardThickness": _mm(job.thickness_m),
            "Finish": job.finish,
            "ImpedanceControlled": job.impedance_controlled,
        },
        "DesignRules": [
            {
                "Layers": "Outer",
                **{name: _mm(job.min_gap_m) for name in _GAPS},
                "MinLineWidth": _mm(job.min_track_m),
            }
        ],
        "FilesAttributes": [
            {"Path": file.path, "FileFunction": file.function, "FilePolarity": file.polarity} for file in job.files
        ],
        "MaterialStackup": [_layer_content(layer) for layer in job.stackup],
    }


def _layer_content(layer: JobLayer) -> dict[str, Any]:
    values = {
        "Type": layer.kind,
        "Thickness": None if layer.thickness_m is None else _mm(layer.thickness_m),
        "Material": layer.material,
        "DielectricConstant": layer.dielectric_constant,
        "LossTangent": layer.loss_tangent,
        "Name": layer.name,
    }
    return {key: value for key, value in values.items() if value is not None}


def read_job(path: Path) -> Job:
    """The job of a file of `write_job`. Raises `HandoffError` when it is none."""
    try:
        return _job(json.loads(path.read_text(encoding="utf-8")))
    except (OSError, ValueError, TypeError, KeyError, IndexError) as error:
        raise HandoffError(f"{path.name} is no job file: {type(error).__name__} {error}") from error


def _job(content: dict[str, Any]) -> Job:
    header, general, rules = content["Header"], content["GeneralSpecs"], content["DesignRules"][0]
    gaps = {rules[name] for name in _GAPS}
    if len(gaps) != 1:
        raise ValueError(f"gaps {sorted(gaps)}, expected the same between all kinds of copper")
    return Job(
        software=tuple(header["GenerationSoftware"][name] for name in ("Vendor", "Application", "Version")),
        created=header["CreationDate"],
        project=tuple(general["ProjectId"][name] for name in ("Name", "GUID", "Revision")),
        size_m=(_metres(general["Size"]["X"]), _metres(general["Size"]["Y"])),
        levels=general["LayerNumber"],
        thickness_m=_metres(general["BoardThickness"]),
        finish=general["Finish"],
        impedance_controlled=general["ImpedanceControlled"],
        min_track_m=_metres(rules["MinLineWidth"]),
        min_gap_m=_metres(gaps.pop()),
        files=tuple(
            ListedFile(row["Path"], row["FileFunction"], row["FilePolarity"]) for row in content["FilesAttributes"]
        ),
        stackup=tuple(_layer(row) for row in content["MaterialStackup"]),
    )


def _layer(row: dict[str, Any]) -> JobLayer:
    thickness = row.get("Thickness")
    return JobLayer(
        row["Type"],
        row["Name"],
        row.get("Material"),
        None if thickness is None else _metres(thickness),
        row.get("DielectricConstant"),
        row.get("LossTangent"),
    )


def job_mismatches(job: Job, path: Path) -> list[str]:
    """What the file at `path` says otherwise than `job`, and files it lists that are not beside it."""
    try:
        got = read_job(path)
    except HandoffError as error:
        return [str(error)]
    pairs = [(field.name, getattr(got, field.name), getattr(job, field.name)) for field in fields(Job)]
    missing = sorted(file.path for file in got.files if not (path.parent / file.path).is_file())
    return [
        *(f"{path.name}: {name} is {here}, expected {right}" for name, here, right in pairs if here != right),
        *(f"{path.name}: {fault}" for fault in _stackup_faults(got)),
        *(f"{path.name}: lists {name}, which is not there" for name in missing),
    ]


def _rounded(length: float) -> float:
    """A length as it comes back from the file, m."""
    return _metres(_mm(length))


def _mm(length: float) -> float:
    """A length in mm, rounded to 1 nm."""
    return round(length * 1e3, 6)


def _metres(length: float) -> float:
    return length * 1e-3

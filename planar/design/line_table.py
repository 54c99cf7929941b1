"""Widths of printed lines over laminates, thicknesses and impedances: the rows of `planar lines`.

A row that cannot be had stays in the table with the reason; a row the fab cannot etch is flagged.
"""

from __future__ import annotations

import itertools
from collections.abc import Iterable, Iterator
from dataclasses import dataclass, replace

from planar.design.line_size import STEP, LineSettings, strip_width_and_gap
from planar.errors import PlanarError, SynthesisError
from planar.library import Fab, Laminate
from planar.lines.line import Line
from planar.lines.records import Conductor, Substrate
from planar.lines.static_spectral import DielectricLayer
from planar.stackup import loss_tangent
from planar.units import show


@dataclass(frozen=True)
class Material:
    """A substrate by name: relative `eps_r` and `tan_d` at the frequency, `conductivity` S/m, roughness `rq` m."""

    name: str
    eps_r: float
    tan_d: float
    conductivity: float = 5.8e7
    rq: float = 0.0

    @classmethod
    def of(cls, laminate: Laminate, frequency: float) -> Material:
        """The laminate at `frequency` Hz."""
        eps = laminate.model.permittivity(frequency)
        return cls(laminate.key, eps.real, loss_tangent(eps), laminate.conductivity, laminate.roughness_rq)


@dataclass(frozen=True)
class LineRequest:
    """What every row shares: `kind` of line, `frequency` Hz, finished copper `thickness` m, `fab`, mask or none.

    `gap` m fixes the gap of coplanar strips; None takes the widest that gives a usable width.
    """

    kind: str
    frequency: float
    thickness: float
    fab: Fab
    masked: bool = False
    gap: float | None = None


@dataclass(frozen=True)
class LineRow:
    """One row; units in the names. Values are None where the line cannot be had, `note` then says why."""

    kind: str
    laminate: str
    height_mm: float
    frequency_ghz: float
    impedance_ohm: float
    width_mm: float | None = None
    gap_mm: float | None = None
    eps_eff: float | None = None
    quarter_wave_mm: float | None = None
    loss_db_per_m: float | None = None
    ohm_per_25_um_etch: float | None = None
    ohm_per_10_percent_height: float | None = None
    ohm_per_1_percent_eps_r: float | None = None
    makeable: bool = False
    note: str = ""


def line_rows(
    materials: Iterable[tuple[Material, float]], impedances: Iterable[float], request: LineRequest
) -> Iterator[LineRow]:
    """A row for each (material, height m) and impedance ohm."""
    for (material, height), impedance in itertools.product(materials, tuple(impedances)):
        yield _row(material, height, impedance, request)


def _row(material: Material, height: float, impedance: float, request: LineRequest) -> LineRow:
    head = LineRow(request.kind, material.name, height * 1e3, request.frequency / 1e9, impedance)
    settings = _settings(material, height, request)
    try:
        line = _line(impedance, settings, request)
        slopes = settings.sensitivities(line)
    except PlanarError as error:
        note = error.reason if isinstance(error, SynthesisError) else str(error)
        return replace(head, note=note)
    missed = _missed(line, request.fab)
    return replace(
        head,
        width_mm=line.width * 1e3,
        gap_mm=None if line.gap is None else line.gap * 1e3,
        eps_eff=line.eps_eff,
        quarter_wave_mm=line.quarter_wave * 1e3,
        loss_db_per_m=line.loss_db_per_m,
        ohm_per_25_um_etch=slopes.ohm_per_25_um_etch,
        ohm_per_10_percent_height=slopes.ohm_per_10_percent_height,
        ohm_per_1_percent_eps_r=slopes.ohm_per_1_percent_eps_r,
        makeable=not missed,
        note=missed,
    )


def _settings(material: Material, height: float, request: LineRequest) -> LineSettings:
    fab = request.fab
    cover: tuple[DielectricLayer, ...] = ()
    if request.masked and fab.mask:
        eps = fab.mask_model.permittivity(request.frequency)
        cover = (DielectricLayer(fab.mask_thickness, eps.real, loss_tangent(eps)),)
    substrate = Substrate(height, material.eps_r, material.tan_d, cover)
    return LineSettings(substrate, Conductor(request.thickness, material.conductivity, material.rq), request.frequency)


def _line(impedance: float, settings: LineSettings, request: LineRequest) -> Line:
    gap = request.gap
    if request.kind == "coplanar-strips" and gap is None:
        _, gap = strip_width_and_gap(impedance, settings, (request.fab.min_track, request.fab.min_gap))
    return settings.of_impedance(request.kind, impedance, gap=gap)


def _missed(line: Line, fab: Fab) -> str:
    """What the fab cannot etch of a line, in words; empty when it can."""
    missed = []
    if line.width < fab.min_track - 0.1 * STEP:
        missed.append(f"track below {show(fab.min_track, 'length')}")
    if line.gap is not None and line.gap < fab.min_gap - 0.1 * STEP:
        missed.append(f"gap below {show(fab.min_gap, 'length')}")
    return f"{' and '.join(missed)} of {fab.key}" if missed else ""

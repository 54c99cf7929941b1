"""Rows of line widths: nothing dropped, nothing unmakeable unmarked, numbers that the formulas stand behind."""

from __future__ import annotations

from dataclasses import replace

import pytest

from planar.design.line_table import LineRequest, LineRow, Material, line_rows
from planar.library import Library
from planar.lines.line import analyse
from planar.lines.records import Conductor, Substrate
from planar.units import SPEED_OF_LIGHT

MM = 1e-3
GLASS = Material("glass epoxy", 4.4, 0.02)


def request(library: Library, kind: str = "microstrip") -> LineRequest:
    return LineRequest(kind, 2.45e9, 35e-6, library.fab("pool-two-layer"))


def rows(asked: LineRequest, impedances: list[float], *, height: float = 1.6 * MM) -> list[LineRow]:
    return list(line_rows([(GLASS, height)], impedances, asked))


def test_widths_give_the_impedance_asked_for(library: Library) -> None:
    """Analysed again by the line formulas, which are checked against published tables elsewhere."""
    for row in rows(request(library), [35.0, 50.0, 100.0]):
        assert row.width_mm is not None
        line = analyse(
            "microstrip", row.width_mm * MM,
            substrate=Substrate(1.6 * MM, 4.4, 0.02, ()), conductor=Conductor(35e-6, 5.8e7, 0.0), frequency=2.45e9,
        )  # fmt: skip
        assert line.impedance == pytest.approx(row.impedance_ohm, rel=1e-6)
        assert row.quarter_wave_mm == pytest.approx(250 * SPEED_OF_LIGHT / 2.45e9 / row.eps_eff**0.5, rel=1e-6)
        assert row.makeable


def test_fifty_ohm_on_glass_epoxy_is_three_millimetres(library: Library) -> None:
    """Fact of the trade, common practice, no source: about 3 mm on 1.6 mm."""
    (row,) = rows(request(library), [50.0])
    assert row.width_mm == pytest.approx(3.0, abs=0.15)


def test_every_material_and_impedance_has_its_row(library: Library) -> None:
    materials = [Material.of(library.laminate(key), 2.45e9) for key in ("fr4-general", "alumina-96")]
    pairs = [(material, height * MM) for material in materials for height in (0.5, 1.0)]
    table = list(line_rows(pairs, [50.0, 75.0], request(library)))
    assert [(r.laminate, r.height_mm, r.impedance_ohm) for r in table] == [
        (m.name, pytest.approx(h / MM), z) for m, h in pairs for z in (50.0, 75.0)
    ]


@pytest.mark.parametrize(("kind", "impedance"), [("microstrip", 400.0), ("microstrip", 2.0), ("coplanar-strips", 20.0)])
def test_a_row_that_cannot_be_had_stays_with_its_reason(kind: str, impedance: float, library: Library) -> None:
    good, bad = rows(request(library, kind), [110.0, impedance])
    assert good.width_mm is not None
    assert (bad.width_mm, bad.eps_eff, bad.makeable) == (None, None, False)
    assert "ohm" in bad.note
    assert bad.impedance_ohm == impedance


def test_what_the_fab_cannot_etch_is_flagged_with_its_numbers(library: Library) -> None:
    """100 ohm on 0.3 mm is a track below 0.15 mm; a gap of 0.1 mm is below the fab's 0.15 mm."""
    (thin,) = rows(request(library), [100.0], height=0.3 * MM)
    assert thin.width_mm is not None
    assert thin.width_mm < 0.15
    assert not thin.makeable
    assert "track below 0.15 mm" in thin.note
    (close,) = rows(replace(request(library, "coplanar-strips"), gap=0.1 * MM), [90.0])
    assert close.gap_mm == pytest.approx(0.1)
    assert not close.makeable
    assert "gap below 0.15 mm" in close.note
    finer = library.fab("fine-two-layer")
    (fine,) = rows(replace(request(library), fab=finer), [100.0], height=0.3 * MM)
    assert fine.makeable
    assert fine.note == ""


@pytest.mark.parametrize("kind", ["microstrip", "coplanar-strips"])
def test_sensitivities_are_the_slopes_of_the_formulas(kind: str, library: Library) -> None:
    """Differences of the analysis itself: etch narrows a strip and widens a gap, which both raise the impedance."""
    (row,) = rows(request(library, kind), [110.0])
    assert row.width_mm is not None
    assert row.ohm_per_1_percent_eps_r is not None

    def impedance(width: float, gap: float | None, *, eps_r: float = 4.4, height: float = 1.6 * MM) -> float:
        line = analyse(
            kind, width, gap=gap, substrate=Substrate(height, eps_r, 0.02, ()),
            conductor=Conductor(35e-6, 5.8e7, 0.0), frequency=2.45e9,
        )  # fmt: skip
        return line.impedance

    width, gap = row.width_mm * MM, None if row.gap_mm is None else row.gap_mm * MM
    here = impedance(width, gap)
    by_eps = impedance(width, gap, eps_r=4.4 * 1.01) - here
    by_height = impedance(width, gap, height=1.76 * MM) - here
    etched = impedance(width - 25e-6, None if gap is None else gap + 25e-6) - here
    assert abs(row.ohm_per_1_percent_eps_r) == pytest.approx(abs(by_eps), rel=0.05)
    assert abs(row.ohm_per_10_percent_height or 0.0) == pytest.approx(abs(by_height), rel=0.10)
    assert abs(row.ohm_per_25_um_etch or 0.0) == pytest.approx(abs(etched), rel=0.10)
    assert etched > 0.0 > by_eps


def test_mask_lowers_the_impedance_of_a_width(library: Library) -> None:
    """So that a masked line of the same impedance is narrower."""
    (bare,), (masked,) = (rows(replace(request(library), masked=masked), [100.0]) for masked in (False, True))
    assert masked.width_mm is not None
    assert bare.width_mm is not None
    assert masked.width_mm < bare.width_mm

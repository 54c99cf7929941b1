"""Measurements that no board explains. Authority: the fault was put in."""

from dataclasses import replace

import numpy as np
import pytest

from planar.design.retune.misfit import compare_sweeps
from planar.design.retune.retuned import RetuneRequest, behind_standards, judged
from planar.design.retune.sweep import swept
from planar.design.retune.unknowns import COAX_SPEED, plane_of_standards, stated_plane, unstated_plane
from planar.errors import RangeError, Severity, SynthesisError
from planar.network.measured import Measured
from planar.network.plane import Launch
from planar.network.response import Response, reflection

LINE = Launch(0.03 / COAX_SPEED, 0.05, 1.85e9)


@pytest.fixture
def good(bench):
    return bench.measured(bench.deviations(laminate_permittivity=0.5), LINE)


def changed(measured, change):
    frequency = measured.response.frequency
    return Measured(Response(frequency, change(frequency, measured.reflection), 50.0), ())


def test_unrelated_antenna_is_refused(bench, good):
    frequency = good.response.frequency
    other = reflection(20.0 / (1.0 + 30j * (frequency / 1.7e9 - 1.7e9 / frequency)), 50.0)
    with pytest.raises(SynthesisError, match="no plausible board explains") as refused:
        bench.inferred(changed(good, lambda f, s: LINE.seen(f, other, 50.0)))
    assert "is this the file of this board" in str(refused.value)


def test_two_dips_are_the_cable(bench, good):
    def with_sleeve(frequency, s):
        # a second resonance in series, as the outside of a cable makes it
        z = 50.0 * (1.0 + s) / (1.0 - s)
        cable = 90.0 / (1.0 + 40j * (frequency / 1.93e9 - 1.93e9 / frequency))
        return reflection(z + cable, 50.0)

    with pytest.raises(SynthesisError, match="the cable is part of the antenna"):
        bench.inferred(changed(good, with_sleeve))


def test_calibration_is_named(bench, good):
    with pytest.raises(SynthesisError, match="calibrate again"):
        bench.inferred(changed(good, lambda f, s: 0.8 * s + (0.15 - 0.1j)))


def test_a_long_cable_has_to_be_stated(bench):
    cable = Launch(0.5 / COAX_SPEED, 0.3, 1.85e9)
    measured = bench.measured(bench.deviations(laminate_permittivity=0.5), cable)
    with pytest.raises(SynthesisError, match="state the length of the line in front") as refused:
        bench.inferred(measured)
    assert "about 5" in str(refused.value) or "about 4" in str(refused.value)  # 500 mm, roughly
    assert bench.inferred(measured, stated_plane(cable.delay, 0.3)).effect.sign == -1


def test_what_cannot_be_a_measurement_is_refused(model, good):
    band, asked = model.choices.brief.target.band, RetuneRequest(unstated_plane())
    with pytest.raises(SynthesisError, match="more comes back than went in"):
        judged(band, changed(good, lambda f, s: 1.3 * s / np.abs(s)), asked)
    slipped = Measured(Response(good.response.frequency * 1e3, good.reflection, 50.0), ())
    with pytest.raises(SynthesisError, match="the unit in the file is wrong"):
        judged(band, slipped, asked)
    few = Measured(Response(good.response.frequency[::45], good.reflection[::45], 50.0), ())
    with pytest.raises(SynthesisError, match="at least 11"):
        judged(band, few, asked)


def test_too_few_points_in_the_span_are_refused(model, good):
    far = Measured(Response(good.response.frequency[::45], good.reflection[::45], 50.0), ())
    with pytest.raises(RangeError, match="only 5 points"):
        swept(far, model.grid)


def test_sweeps_that_differ_mean_the_cable(model, good):
    other = changed(good, lambda f, s: s + 0.12 * np.exp(-(((f - 1.8e9) / 5e7) ** 2)))
    compared = compare_sweeps(good, other)
    assert compared.difference == pytest.approx(0.12, abs=0.02)
    assert compared.at == pytest.approx(1.8e9, rel=0.02)
    assert "the cable is part of the antenna" in compared.finding.advice
    with pytest.raises(SynthesisError, match="the cable is part of the antenna"):
        judged(model.choices.brief.target.band, good, RetuneRequest(unstated_plane(), other))


def test_sweeps_that_agree_are_noted(bench, model, good):
    again = bench.measured(bench.deviations(laminate_permittivity=0.5), LINE, seed=2)
    compared = compare_sweeps(good, again)
    assert compared.finding.severity is Severity.NOTE
    assert judged(model.choices.brief.target.band, good, RetuneRequest(unstated_plane(), again))[1] is not None


def test_sweeps_of_other_references_are_refused(good):
    other = Measured(replace(good.response, z0=75.0), ())
    with pytest.raises(RangeError, match="reference"):
        compare_sweeps(good, other)


def test_standards_take_the_line_off(bench, good):
    one = np.ones(len(good.reflection), dtype=complex)
    frequency = good.response.frequency
    short, opened = (
        Measured(Response(frequency, LINE.seen(frequency, sign * (1.0 - 1e-12) * one, 50.0), 50.0), ())
        for sign in (-1.0, 1.0)
    )
    behind = behind_standards(good, short, opened)
    np.testing.assert_allclose(behind.reflection, LINE.removed(frequency, good.reflection, 50.0), atol=1e-9)
    found = bench.inferred(behind, plane_of_standards())
    assert found.effect.sign == -1
    with pytest.raises(RangeError, match="measured twice"):
        behind_standards(good, short, short)

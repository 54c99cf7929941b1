"""Plots of a made-up board: places by hand, well-formed, self-contained, the same twice.

Authority: the definition of reflection for the chart (short, open, match, 50 + j50 by hand), geometry of the scales,
XML 1.0 as the standard library reads it, WCAG 2.1 for contrast (relative luminance and the ratio 3:1 of graphical
objects, 1.4.11), and for even colours CIE 1976 lightness.
"""

from __future__ import annotations

import re
from dataclasses import replace
from typing import Any
from xml.etree import ElementTree

import numpy as np
import pytest

from planar.design.portrait import (
    CIRCULAR_PARTS,
    LINEAR_PARTS,
    CurrentMap,
    Losses,
    ModeImage,
    PatternCut,
    Portrait,
)
from planar.network.response import Response, reflection
from planar.report.plots import plots_css, portrait_plots, response_plots
from planar.report.plots_axes import PLOT_PALETTE, Axis, Panel, round_ticks
from planar.report.plots_current import CLASSES, classes, shades, usual
from planar.report.plots_frequency import Asked, Spread, gain_plot, reflection_plot
from planar.report.plots_polar import CENTRE as POLE
from planar.report.plots_polar import RADIUS as REACH
from planar.report.plots_polar import outer_ring, polar_places
from planar.report.plots_smith import CENTRE, RADIUS, ohms, smith_places
from planar.report.svg import PALETTE, Box

NAMES = {"reflection", "smith", "gain", "cut-0", "cut-90", "axial", "current-top", "mode-1"}
SVG = "{http://www.w3.org/2000/svg}"
FREQUENCY = np.linspace(0.5e9, 1.5e9, 201)
FACTS: dict[str, Any] = {
    "band_hz": [0.95e9, 1.05e9],
    "target": {"match_db": -10.0, "impedance_ohm": 50.0, "axial_ratio_db": 3.0, "transmit": True, "power_w": 0.025},
    "prediction": {
        "trusted_hz": [0.85e9, 1.15e9],
        "matched_band_hz": [0.94e9, 1.06e9],
        "worst_reflection_db": -12.345,
        "input_impedance_ohm": [50.0, 50.0],
        "gap_impedance_ohm": [150.0, -5.0],
    },
}


def response() -> Response:
    """A resistance of 60 ohm with a reactance that is zero at 1 GHz."""
    return Response.from_impedance(FREQUENCY, 60.0 + 1j * 300.0 * (FREQUENCY / 1e9 - 1e9 / FREQUENCY), z0=50.0)


def portrait(*, circular: bool = True) -> Portrait:
    theta = np.arange(-180.0, 181.0, 3.0)
    gain = np.maximum(3.0 + 20.0 * np.log10(np.abs(np.cos(np.radians(theta))) + 1e-12), -40.0)
    ratio = np.where(gain > -40.0, 1.0 + np.abs(theta) / 30.0, np.nan)
    cuts = tuple(
        PatternCut(azimuth, theta, gain, np.array([gain - 0.1, gain - 17.0]), ratio) for azimuth in (0.0, 90.0)
    )
    square = np.array([[0.0, 0.0], [0.04, 0.0], [0.04, 0.03], [0.0, 0.03]])
    current = CurrentMap("top", square, np.array([[0, 1, 2], [0, 2, 3]]), np.array([1.0, 0.1]))
    frequency = np.linspace(0.85e9, 1.15e9, 41)
    return Portrait(
        1e9,
        CIRCULAR_PARTS if circular else LINEAR_PARTS,
        cuts,
        frequency,
        3.0 + (frequency - 1e9) / 1e9,
        np.abs(frequency - 1e9) / 2e7,
        Losses(0.7, 0.1, 0.15, 0.05),
        (current,),
        (ModeImage("horizontal", 0.98e9, 3.5, 0.981, current),),
    )


def plots() -> dict[str, str]:
    return response_plots(FACTS, response()) | portrait_plots(FACTS, portrait())


@pytest.mark.parametrize(
    ("impedance", "place"),
    [
        (1e-12 + 0j, (-1.0, 0.0)),
        (1e15 + 0j, (1.0, 0.0)),
        (50.0 + 0j, (0.0, 0.0)),
        (50.0 + 50.0j, (0.2, 0.4)),  # j50/(100 + j50) = j/(2 + j) = (1 + 2j)/5
        (0.0 - 50.0j, (0.0, -1.0)),
    ],
    ids=["short", "open", "match", "50+j50", "-j50"],
)
def test_chart_by_hand(impedance: complex, place: tuple[float, float]) -> None:
    x, y = smith_places(reflection([impedance], 50.0))[0]
    assert (x - CENTRE[0]) / RADIUS == pytest.approx(place[0], abs=1e-9)
    assert (CENTRE[1] - y) / RADIUS == pytest.approx(place[1], abs=1e-9)


def test_chart_marks_what_the_design_says() -> None:
    """The centre's mark stands where 50 + j50 belongs, with its value; the gap's beside it."""
    root = ElementTree.fromstring(response_plots(FACTS, response())["smith"])
    marks = {mark.findtext(f"{SVG}title"): mark.get("points") for mark in root.iter(f"{SVG}polygon")}
    points = np.array([[float(v) for v in pair.split(",")] for pair in marks["1000 MHz: 50.0 + j50.0 ohm"].split()])
    assert points.mean(axis=0) == pytest.approx((CENTRE[0] + 0.2 * RADIUS, CENTRE[1] - 0.4 * RADIUS), abs=0.1)
    assert "gap of the bare loop, 1000 MHz: 150.0 \N{MINUS SIGN} j5.0 ohm" in marks


def test_impedance_in_words() -> None:
    assert ohms(47.36 - 15.04j) == "47.4 \N{MINUS SIGN} j15.0 ohm"


def test_pattern_by_hand() -> None:
    """3 dBi: the outer ring is 5 dBi, the centre 30 dB less. Top up, positive angles right, the bottom down."""
    outer = outer_ring(portrait())
    assert outer == 5.0
    places = polar_places(np.array([0.0, 90.0, -90.0, 180.0, 0.0]), np.array([5.0, -10.0, -10.0, 5.0, -60.0]), outer)
    wanted = [(0.0, -REACH), (0.5 * REACH, 0.0), (-0.5 * REACH, 0.0), (0.0, REACH), (0.0, 0.0)]
    assert places - POLE == pytest.approx(np.array(wanted), abs=1e-9)


def test_panel_by_hand() -> None:
    """900 to 1100 MHz over 200 px, 0 to -20 dB over 100 px; what is deeper lies on the bottom."""
    panel = Panel(Box(50.0, 10.0, 250.0, 110.0), Axis(900.0, 1100.0, (), ""), Axis(-20.0, 0.0, (), ""))
    assert panel.across(950.0) == pytest.approx(100.0)
    assert [float(panel.down(value)) for value in (0.0, -5.0, -20.0, -90.0)] == pytest.approx(
        [10.0, 35.0, 110.0, 110.0]
    )


@pytest.mark.parametrize(
    ("low", "high", "ticks"),
    [(0.0, 12.0, (0.0, 2.0, 4.0, 6.0, 8.0, 10.0, 12.0)), (727.0, 1010.0, (750.0,)), (-1.0, 4.0, (-1.0, 0.0, 4.0))],
)
def test_ticks_are_round_and_inside(low: float, high: float, ticks: tuple[float, ...]) -> None:
    found = round_ticks(low, high, 6)
    steps = np.diff(found)
    assert set(ticks) <= set(found)
    assert 2 <= len(found) <= 7
    assert low <= found[0] <= found[-1] <= high
    assert steps == pytest.approx(steps[0])
    assert f"{steps[0]:.0e}"[0] in "125"


def test_curve_is_thick_where_the_mesh_is_fine_and_thin_outside() -> None:
    """Within 0.85 to 1.15 GHz the curve is solid; the dotted one lies outside and meets it."""
    root = ElementTree.fromstring(reflection_plot(response(), FACTS["prediction"], asked=Asked.of(FACTS)))
    curves = [
        path
        for path in root.iter(f"{SVG}path")
        if "curve-1" in path.get("stroke", "") and path.get("d", "").count("L") > 5
    ]
    solid = next(path for path in curves if "stroke-dasharray" not in path.attrib)
    dotted = next(path for path in curves if "stroke-dasharray" in path.attrib)
    first, last = re.findall(r"[ML]([\d.]+) ", solid.get("d", ""))[:: len(re.findall("[ML]", solid.get("d", ""))) - 1]
    assert dotted.get("d", "").count("M") == 2
    outside = [float(x) for x in re.findall(r"[ML]([\d.]+) ", dotted.get("d", ""))]
    assert not [x for x in outside if float(first) + 0.1 < x < float(last) - 0.1]
    assert {float(first), float(last)} <= set(outside)


def test_the_spread_is_named() -> None:
    nominal = response()
    spread = Spread(FREQUENCY, nominal.reflection_db - 1.0, nominal.reflection_db + 2.0, "90 % of <boards>")
    text = reflection_plot(nominal, FACTS["prediction"], asked=Asked.of(FACTS), spread=spread)
    words = [each.text for each in ElementTree.fromstring(text).iter(f"{SVG}text")]
    assert {"90 % of <boards>", "predicted"} <= set(words)
    assert "var(--spread-fill" in text


def test_a_perfect_match_stays_on_the_scale() -> None:
    """No reflection at one frequency is minus infinity in dB: drawn at the end of the scale, 40 dB down at most."""
    exact = response()
    s = exact.s[:, 0, 0].copy()
    s[100] = 0.0
    text = reflection_plot(Response(exact.frequency, s, 50.0), FACTS["prediction"], asked=Asked.of(FACTS))
    words = [each.text for each in ElementTree.fromstring(text).iter(f"{SVG}text")]
    assert "\N{MINUS SIGN}40" in words
    assert "inf" not in text


def test_nothing_matched_is_said() -> None:
    prediction = FACTS["prediction"] | {"matched_band_hz": None}
    text = reflection_plot(response(), prediction, asked=Asked.of(FACTS))
    assert "It is below that nowhere near the band." in text


def test_every_plot_is_there_and_says_what_it_shows() -> None:
    found = plots()
    assert found.keys() == NAMES
    for name, text in found.items():
        root = ElementTree.fromstring(text)
        assert root.tag == f"{SVG}svg", name
        assert root.get("role") == "img"
        assert root.findtext(f"{SVG}title"), name
        assert len(root.findtext(f"{SVG}desc") or "") > 40, name


def test_linear_board_has_no_axial_ratio() -> None:
    facts = FACTS | {"target": FACTS["target"] | {"axial_ratio_db": None}}
    found = portrait_plots(facts, portrait(circular=False))
    assert "axial" not in found
    assert "axial" not in found["gain"]
    assert "horizontal, along x" in found["cut-0"]


def test_nothing_is_drawn_below_a_reflector() -> None:
    """The lower half is NaN: no curve there, and the description says why."""
    shown = portrait(circular=False)
    cut = shown.cuts[0]
    below = np.abs(cut.theta) > 90.0
    half = replace(cut, gain_dbi=np.where(below, np.nan, cut.gain_dbi), part_dbi=np.where(below, np.nan, cut.part_dbi))
    text = portrait_plots(FACTS, replace(shown, cuts=(half,)))["cut-0"]
    assert "nothing below the metal plane" in text
    assert "nan" not in text
    curves = [path.get("d", "") for path in ElementTree.fromstring(text).iter(f"{SVG}path")]
    longest = max(curves, key=len)
    assert max(float(y) for y in re.findall(r" ([\d.]+)", longest)) < POLE[1] + 0.1


def test_self_contained_and_free_of_ids() -> None:
    """Several stand on one page: no id may come twice, nothing is fetched, nothing runs."""
    for name, text in plots().items():
        rest = text.replace('xmlns="http://www.w3.org/2000/svg"', "", 1)
        assert not re.search(r"https?:|url\(|href|<script|<style|<image|\bid=|\bon\w+=", rest), name
        assert "nan" not in rest.lower(), name


def test_the_same_twice_and_small() -> None:
    first = plots()
    assert first == plots()
    assert sum(len(text) for text in first.values()) < 200e3


def test_every_colour_has_its_declaration_in_both_modes() -> None:
    used = set(re.findall(r"var\(--([\w-]+),", "".join(plots().values())))
    for dark in (False, True):
        declared = set(re.findall(r"--([\w-]+):", plots_css(dark)))
        assert used <= declared | PALETTE.keys()


def luminance(shade: str) -> float:
    """Relative luminance, WCAG 2.1."""
    coded = np.array([int(shade[i : i + 2], 16) for i in (1, 3, 5)]) / 255.0
    linear = np.where(coded <= 0.04045, coded / 12.92, ((coded + 0.055) / 1.055) ** 2.4)
    return float(linear @ (0.2126, 0.7152, 0.0722))


def contrast(one: str, other: str) -> float:
    low, high = sorted((luminance(one), luminance(other)))
    return (high + 0.05) / (low + 0.05)


@pytest.mark.parametrize("dark", [False, True])
def test_curves_stand_out(dark: bool) -> None:
    """3:1 against the page and against the shaded band they run across (WCAG 2.1, 1.4.11)."""
    paper = PALETTE["paper"][dark]
    for name in ("curve-1", "curve-2", "curve-3", "asked"):
        assert contrast(PLOT_PALETTE[name][dark], paper) >= 4.5, name
        for ground in ("band-fill", "spread-fill"):
            assert contrast(PLOT_PALETTE[name][dark], PLOT_PALETTE[ground][dark]) >= 3.0, (name, ground)


@pytest.mark.parametrize("dark", [False, True])
def test_scale_of_currents_is_even(dark: bool) -> None:
    """CIE 1976 lightness, a scale apart from the one the colours are made on, runs one way in steps within a factor
    1.5 of each other; on a light page more is darker, on a dark page lighter."""
    found = shades(dark)
    assert len(found) == CLASSES
    lightness = np.array([116.0 * np.cbrt(luminance(shade)) - 16.0 for shade in found])
    steps = np.diff(lightness) * (-1.0 if dark else 1.0)
    assert steps.min() > 0.0
    assert steps.max() < 1.5 * steps.min()


def test_classes_by_hand() -> None:
    """0 dB and above, -2.1, -4.1, -17 and -60 dB: classes of 2 dB."""
    ratios = 10.0 ** (np.array([2.0, 0.0, -2.1, -4.1, -17.0, -60.0]) / 20.0)
    assert classes(0.5 * ratios, 0.5).tolist() == [0, 0, 1, 2, 8, 9]


def test_usual_current_is_that_of_all_but_a_tenth() -> None:
    """Forty triangles of one area, one a hundred times the others."""
    corners = np.array([[0.0, 0.0], [1.0, 0.0], [0.0, 1.0]])
    points = np.concatenate([corners + 2.0 * i for i in range(40)])
    magnitude = np.full(40, 0.01)
    magnitude[7] = 1.0
    current = CurrentMap("top", points, np.arange(120).reshape(40, 3), magnitude)
    assert usual(current) == 0.01


def test_gain_says_its_value_at_the_centre() -> None:
    text = gain_plot(portrait(), asked=Asked.of(FACTS))
    assert "Gain toward the top is 3.00 dBi at 1000 MHz, axial ratio 0.00 dB" in text

"""Exposure figures against hand calculations from the published formulas and levels.

Levels: ICNIRP 2020, Health Physics 118, 483, Table 5, general public; OET Bulletin 65, edition 97-01, Table 1 (B). Both
from memory, not re-read; the 4.5 and 9 W/m2 at 900 and 1800 MHz are the figures mobile operators state.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from types import SimpleNamespace
from typing import Any

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from planar.errors import RangeError
from planar.report import safety

ICNIRP, FCC = safety.exposure_limits()


@pytest.mark.parametrize(
    ("limit", "mhz", "w_m2"),
    [
        (ICNIRP, 30.0, 2.0),
        (ICNIRP, 400.0, 2.0),
        (ICNIRP, 900.0, 4.5),  # f/200
        (ICNIRP, 1800.0, 9.0),
        (ICNIRP, 2000.0, 10.0),
        (ICNIRP, 5800.0, 10.0),
        (FCC, 100.0, 2.0),  # 0.2 mW/cm2
        (FCC, 300.0, 2.0),
        (FCC, 900.0, 6.0),  # f/1500 mW/cm2
        (FCC, 1500.0, 10.0),
        (FCC, 2450.0, 10.0),  # 1 mW/cm2
    ],
)
def test_reference_level_is_the_published_one(limit: safety.Limit, mhz: float, w_m2: float) -> None:
    assert limit.reference_level(mhz * 1e6) == pytest.approx(w_m2, rel=1e-12)


@pytest.mark.parametrize("limit", [ICNIRP, FCC])
def test_ranges_meet_at_their_ends(limit: safety.Limit) -> None:
    for low, high in zip(limit.levels, limit.levels[1:], strict=False):
        edge = low.to_mhz
        assert high.from_mhz == edge
        assert low.w_m2 + low.w_m2_per_mhz * edge == pytest.approx(high.w_m2 + high.w_m2_per_mhz * edge)


@given(st.floats(30e6, 29e9), st.floats(1.0, 2.0))
def test_level_never_falls_so_the_low_end_of_a_band_is_the_strictest(frequency: float, ratio: float) -> None:
    for limit in (ICNIRP, FCC):
        assert limit.reference_level(frequency) <= limit.reference_level(frequency * ratio) * (1.0 + 1e-12)


@pytest.mark.parametrize("limit", [ICNIRP, FCC])
def test_no_level_is_made_up_where_the_edition_states_none(limit: safety.Limit) -> None:
    with pytest.raises(RangeError, match="states no power density at 14 MHz"):
        limit.reference_level(14e6)


def test_power_density_of_one_watt_alike_in_all_directions() -> None:
    assert safety.power_density(1.0, 0.0, 1.0) == pytest.approx(1.0 / (4.0 * math.pi))  # 0.0796 W/m2


def test_power_density_falls_with_the_square() -> None:
    assert safety.power_density(0.5, 6.0, 2.0) == pytest.approx(0.25 * safety.power_density(0.5, 6.0, 1.0))


def test_compliance_distance_by_hand() -> None:
    """100 W e.i.r.p. at 4.5 W/m2: r = sqrt(100 / (4 pi 4.5)) = 1.3298 m, on paper."""
    assert safety.compliance_distance(10.0, 10.0, 4.5) == pytest.approx(1.3298, abs=5e-5)


@given(st.floats(1e-6, 1e3), st.floats(-10.0, 15.0), st.floats(0.5, 20.0))
def test_at_the_compliance_distance_the_level_is_met(power: float, gain: float, level: float) -> None:
    reach = safety.compliance_distance(power, gain, level)
    assert safety.power_density(power, gain, reach) == pytest.approx(level)


def test_half_a_watt_erp_is_29_15_dbm_eirp() -> None:
    """27 dBm e.r.p. and 29.15 dBm e.i.r.p. are the same power (2.15 dB, ITU-R BS.561)."""
    power, gain = 0.5, safety.DIPOLE_DBI
    assert safety.dbm(safety.erp(power, gain)) == pytest.approx(26.99, abs=0.005)
    assert safety.dbm(safety.eirp(power, gain)) == pytest.approx(29.14, abs=0.005)


def test_erp_is_eirp_over_1_64() -> None:
    assert safety.eirp(1.0, 3.0) / safety.erp(1.0, 3.0) == pytest.approx(1.64, abs=0.001)


def test_floor_is_the_diameter_of_a_full_wave_loop_and_the_stored_field_of_a_smaller_one() -> None:
    frequency = 299_792_458.0  # wavelength 1 m
    assert safety.near_field_floor(1.0 / math.pi, frequency) == pytest.approx(1.0 / math.pi)
    assert safety.near_field_floor(0.1, frequency) == pytest.approx(1.0 / (2.0 * math.pi))


def test_facts_take_the_stronger_side_and_never_less_than_the_floor(invented: Callable[[str], Any]) -> None:
    facts = invented("orchard-gateway")
    told = safety.safety_facts(facts)
    assert told is not None
    assert told["gain_dbi"] == 2.301
    assert told["direction"].endswith("toward the bottom")
    assert told["eirp_w"] == pytest.approx(0.025 * 10.0**0.2301)
    sizes = facts["dimensions_mm"]
    assert told["floor_mm"] == pytest.approx(sizes["loop_width"] + sizes["trace_width"])
    for limit in told["limits"]:
        assert limit["floor_holds"]
        assert limit["distance_mm"] == told["floor_mm"]  # 2.7 cm by the far-field sum: inside the loop's diameter


def test_facts_take_the_strongest_direction_known(invented: Callable[[str], Any]) -> None:
    """3 dBi elsewhere: more than toward either side; the same in both is no other direction."""
    facts = invented("orchard-gateway")
    told, same = safety.safety_facts(facts, 3.0), safety.safety_facts(facts, 2.305)
    assert told is not None
    assert same is not None
    assert told["gain_dbi"] == 3.0
    assert "pattern cuts" in told["direction"]
    assert told["eirp_w"] == pytest.approx(0.025 * 10.0**0.3)
    assert same["gain_dbi"] == 2.301
    assert safety.safety_facts(facts, 1.0) == safety.safety_facts(facts)


def test_the_largest_gain_may_be_elsewhere_in_the_band_but_not_beyond_it() -> None:
    cut: Any = SimpleNamespace(gain_dbi=np.array([1.0, np.nan, 2.0]))
    portrait: Any = SimpleNamespace(
        cuts=(cut,), frequency=np.array([0.8e9, 0.9e9, 1e9]), gain_dbi=np.array([1, 2.5, 4])
    )
    assert safety.known_gain(portrait, (0.81e9, 0.9e9)) == 2.5
    assert safety.known_gain(portrait, (0.85e9, 0.86e9)) == 2.0  # 1.9 at its upper end


def test_facts_of_a_strong_transmitter_are_the_far_field_sum(invented: Callable[[str], Any]) -> None:
    facts = invented("orchard-gateway")
    facts["target"]["power_w"] = 100.0
    told = safety.safety_facts(facts)
    assert told is not None
    by_hand = math.sqrt(100.0 * 10.0**0.2301 / (4.0 * math.pi * 863.0 / 200.0))
    assert told["limits"][0]["distance_mm"] == pytest.approx(1e3 * by_hand)
    assert told["limits"][0]["reflected_mm"] == pytest.approx(2e3 * by_hand)


def test_no_figures_for_a_receiver_or_without_a_gain(first_order: Any, invented: Any) -> None:
    assert safety.safety_facts(invented("pass-tracker")) is None
    assert safety.safety_facts(first_order("orchard-gateway")) is None

"""Facts of examples as `make_design` gives them, and the same with an INVENTED prediction: plausible, not solved."""

from __future__ import annotations

import copy
from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest

from planar.brief import read_brief
from planar.design.design import make_design
from planar.design.design_file import design_facts
from planar.library import Library

EXAMPLES = Path(__file__).parents[3] / "examples"
Facts = dict[str, Any]

INVENTED = {
    "input_impedance_ohm": [48.61, -7.24],
    "gap_impedance_ohm": [163.2, -11.9],
    "worst_reflection_db": -17.46,
    "matched_band_hz": [702.31e6, 961.77e6],
    "margin_hz": [160.69e6, 91.77e6],
    "best_match_hz": 871.2e6,
    "gain_dbi": 2.137,
    "gain_below_dbi": 2.301,
    "efficiency": 0.8243,
    "axial_ratio_db": None,
    "worst_axial_ratio_db": None,
    "axial_ratio_band_hz": None,
    "sense": "linear",
    "quality": 5.31,
    "power_balance": 0.9034,
    "unknowns": 1511,
    "convergence": 0.0093,
    "trusted_hz": [730.0e6, 1000.0e6],
    "circuit_deviation": 0.0121,
}
ROUND = {"axial_ratio_db": 0.274, "worst_axial_ratio_db": 0.418, "axial_ratio_band_hz": [803.1e6, 918.4e6]}
SENSITIVITIES = [
    {"name": "loop_width", "value_mm": 96.0, "mhz_per_mm": -11.21, "ohm_per_mm": [5.8, 1.1]},
    {"name": "trace_width", "value_mm": 8.3, "mhz_per_mm": 11.87, "ohm_per_mm": [-7.0, -4.2]},
    {"name": "dielectric permittivity", "value": 4.308, "mhz_per_unit": -59.3, "ohm_per_unit": [32.1, -4.0]},
]


@pytest.fixture(scope="session")
def first_order() -> Callable[[str], Facts]:
    """Facts of the example of that name, without a prediction; every call gives facts of its own."""
    library, made = Library.open(), {}

    def facts(name: str) -> Facts:
        if name not in made:
            path = EXAMPLES / f"{name}.toml"
            made[name] = design_facts(make_design(read_brief(path, library), library, str(path)))
        return copy.deepcopy(made[name])

    return facts


@pytest.fixture(scope="session")
def invented(first_order: Callable[[str], Facts]) -> Callable[[str], Facts]:
    """The same with the invented prediction, for circular polarisation with an invented axial ratio."""

    def facts(name: str) -> Facts:
        told = first_order(name)
        prediction = copy.deepcopy(INVENTED)
        if told["polarisation"] != "linear":
            prediction |= ROUND | {"sense": told["polarisation"].removeprefix("circular-")}
        return told | {"prediction": prediction, "sensitivities": copy.deepcopy(SENSITIVITIES)}

    return facts


@pytest.fixture
def spread() -> Facts:
    """INVENTED content of a spread.json with the keys of a real one, circular polarisation."""
    frequencies = [850e6 + 5e6 * i for i in range(7)]
    result = {"worst_reflection_db": -17.5, "best_match_hz": 871.2e6, "shift_percent": 0.0, "worst_axial_ratio_db": 0.4}
    quantities = [("laminate permittivity", "", 4.31, 4.09, 4.52), ("etch bias per edge", "mm", 0.0, -0.05, 0.05)]
    shares = [(0.61, 0.42, 0.2), (0.35, 0.55, 0.3)]
    return {
        "name": "parcel-reader",
        "samples": 10000,
        "seed": 1,
        "tolerance_factor": 1.0,
        "half_uncovered": False,
        "band_hz": [865e6, 868e6],
        "match_db": -14.0,
        "axial_ratio_limit_db": 3.0,
        "yield": {
            "total": 0.9312,
            "match": 0.9412,
            "axial_ratio": 0.9891,
            "total_95_percent": [0.9261, 0.936],
            "total_if_model_errs": [0.9277, 0.9341],
        },
        "nominal": result,
        "percentiles": {
            "at_percent": [1.0, 5.0, 50.0, 95.0, 99.0],
            "worst_reflection_db": [-27.6, -25.5, -18.9, -13.8, -12.1],
            "best_match_hz": [862e6, 865e6, 871e6, 877e6, 880e6],
            "shift_percent": [-1.9, -1.5, 0.0, 1.5, 1.9],
            "worst_axial_ratio_db": [0.1, 0.2, 0.4, 1.9, 3.2],
        },
        "envelope": {
            "frequency_hz": frequencies,
            "at_percent": [5.0, 50.0, 95.0],
            "reflection_db": [[level + 0.1 * i for i in range(7)] for level in (-23.0, -18.0, -13.0)],
            "nominal_reflection_db": [-17.5] * 7,
            "axial_frequency_hz": None,
            "axial_ratio_db": None,
        },
        "contributors": [
            {
                "name": name,
                "match_share": match,
                "frequency_share": shift,
                "axial_ratio_share": axial,
                "at_low_end": {"worst_reflection_db": -15.8, "shift_percent": 1.3},
                "at_high_end": {"worst_reflection_db": -22.0, "shift_percent": -1.3},
            }
            for (name, *_), (match, shift, axial) in zip(quantities, shares, strict=True)
        ],
        "interactions": {"match_share": 0.04, "frequency_share": 0.03, "axial_ratio_share": 0.5},
        "corners": [
            {
                "name": "worst match, lowest frequency",
                "solved": result | {"worst_reflection_db": -11.3, "worst_axial_ratio_db": None},
                "modelled": result | {"worst_reflection_db": -11.1},
                "at": {"laminate_permittivity": 4.52, "etch_bias_per_edge_mm": -0.05},
            },
            {
                "name": "worst axial ratio",
                "solved": None,
                "modelled": result | {"worst_axial_ratio_db": 3.6},
                "at": {"laminate_permittivity": 4.09, "etch_bias_per_edge_mm": 0.05},
            },
        ],
        "model_error": {
            "boards_checked": 6,
            "reflection": 0.0031,
            "reflection_in_band": 0.0019,
            "axial_ratio_db": 0.014,
        },
        "quantities": [
            {
                "name": name,
                "unit": unit,
                "nominal": nominal,
                "low": low,
                "high": high,
                "distribution": "truncated-normal",
                "source": "invented",
            }
            for name, unit, nominal, low, high in quantities
        ],
        "laws": "truncated-normal: a bell.",
        "not_varied": [{"what": "outline", "why": "the slab is endless"}],
        "boards_solved": 24,
        "field_solutions": 77,
    }

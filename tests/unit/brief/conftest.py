"""A library of keys only, and a whole brief to spoil one key at a time."""

from __future__ import annotations

import pytest

KEYS = {
    "laminates": ["alumina-96", "fr4-general", "fr4-high-tg", "ptfe-glass-2.2"],
    "fabs": ["home-milled", "pool-two-layer"],
    "connectors": ["edge-coax", "pigtail-pads"],
    "covers": ["abs", "polycarbonate"],
    "families": ["coplanar", "plain", "ring-guided"],
}


class FakeLibrary:
    """The keys a brief may name, without entries behind them."""

    def keys(self, kind: str) -> list[str]:
        return KEYS[kind]


@pytest.fixture(scope="session")
def library() -> FakeLibrary:
    return FakeLibrary()


@pytest.fixture
def whole() -> dict:
    """Every key given, all of them right: the example of the design notes."""
    return {
        "name": "orchard-gateway",
        "target": {
            "band": ["863 MHz", "870 MHz"],
            "impedance": "50 ohm",
            "match": "-10 dB",
            "polarisation": "linear",
            "transmit": True,
            "power": "25 mW",
        },
        "antenna": {
            "family": "ring-guided",
            "shape": "square",
            "corner_radius": "6 mm",
            "trace_width": "5 mm",
            "end": "open",
            "dimensions": {"gap": "2 mm"},
        },
        "board": {
            "laminate": "fr4-general",
            "thickness": "1.6 mm",
            "copper": "35 um",
            "mask": "both",
            "size_limit": ["100 mm", "100 mm"],
        },
        "surroundings": {
            "cover": {"material": "abs", "air_gap": "6 mm", "thickness": "2.5 mm"},
            "reflector": {"distance": "40 mm"},
        },
        "make": {"fab": "pool-two-layer", "connector": "edge-coax", "quantity": 5},
    }

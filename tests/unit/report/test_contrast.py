"""The colours of the page by computation: contrast for weak eyes, distance for colour-blind ones, none left undefined.

Contrast: WCAG 2.1, relative luminance and success criteria 1.4.3 (text, 4.5) and 1.4.11 (graphics, 3). Colour
blindness: Machado, Oliveira, Fernandes, IEEE TVCG 15 (2009) 1291, matrices of severity 1. Lines of grids
and rules only help the eye and need no contrast.
"""

from __future__ import annotations

import itertools
import re

import numpy as np
import pytest

from planar.report.page_files import page_text
from planar.report.page_palette import PALETTE, palette_css

SIDES = {"light": 0, "dark": 1}
TEXT = ("ink", "muted", "link", "good", "warn", "bad")
GROUNDS = ("paper", "panel")
ACCENTS = tuple(f"accent-{n}" for n in range(1, 7))
GRAPHICS = (*ACCENTS, "edge", "keepout", "copper-top", "copper-bottom", "good", "warn", "bad", "muted", "ink")
APART = 15.0
"""CIE 1976 difference; 2.3 is just noticeable (Mahy, van Eycken, Oosterlinck 1994), and lines are thin."""
BLINDNESS = {
    "none": np.eye(3),
    "protanopia": np.array(
        [[0.152286, 1.052583, -0.204868], [0.114503, 0.786281, 0.099216], [-0.003882, -0.048116, 1.051998]]
    ),
    "deuteranopia": np.array(
        [[0.367322, 0.860646, -0.227968], [0.280085, 0.672501, 0.047413], [-0.011820, 0.042940, 0.968881]]
    ),
}
TO_XYZ = np.array([[0.4124, 0.3576, 0.1805], [0.2126, 0.7152, 0.0722], [0.0193, 0.1192, 0.9505]])
WHITE = np.array([0.9505, 1.0, 1.089])


def linear(colour: str) -> np.ndarray:
    """Linear sRGB of `#rrggbb` (IEC 61966-2-1)."""
    share = np.array([int(colour[i : i + 2], 16) / 255.0 for i in (1, 3, 5)])
    return np.where(share <= 0.04045, share / 12.92, ((share + 0.055) / 1.055) ** 2.4)


def contrast(one: str, other: str) -> float:
    dark, light = sorted(float(linear(colour) @ [0.2126, 0.7152, 0.0722]) for colour in (one, other))
    return (light + 0.05) / (dark + 0.05)


def lab(rgb: np.ndarray) -> np.ndarray:
    """CIE L*a*b* of linear sRGB."""
    share = TO_XYZ @ np.clip(rgb, 0.0, 1.0) / WHITE
    f = np.where(share > 0.008856, np.cbrt(share), 7.787 * share + 16.0 / 116.0)
    return np.array([116.0 * f[1] - 16.0, 500.0 * (f[0] - f[1]), 200.0 * (f[1] - f[2])])


def test_contrast_is_the_published_one() -> None:
    assert contrast("#ffffff", "#000000") == pytest.approx(21.0)
    assert contrast("#777777", "#ffffff") == pytest.approx(4.48, abs=0.005)  # just fails, as W3C's notes say


@pytest.mark.parametrize("theme", SIDES)
@pytest.mark.parametrize("ground", GROUNDS)
@pytest.mark.parametrize("name", TEXT)
def test_text_can_be_read(name: str, ground: str, theme: str) -> None:
    side = SIDES[theme]
    assert contrast(PALETTE[name][side], PALETTE[ground][side]) >= 4.5


@pytest.mark.parametrize("theme", SIDES)
def test_pressed_buttons_can_be_read(theme: str) -> None:
    side = SIDES[theme]
    assert contrast(PALETTE["paper"][side], PALETTE["ink"][side]) >= 4.5


@pytest.mark.parametrize("theme", SIDES)
@pytest.mark.parametrize("name", GRAPHICS)
def test_graphics_can_be_seen(name: str, theme: str) -> None:
    side = SIDES[theme]
    assert contrast(PALETTE[name][side], PALETTE["paper"][side]) >= 3.0


@pytest.mark.parametrize("theme", SIDES)
@pytest.mark.parametrize("eyes", BLINDNESS)
def test_accents_are_told_apart(eyes: str, theme: str) -> None:
    seen = [lab(BLINDNESS[eyes] @ linear(PALETTE[name][SIDES[theme]])) for name in ACCENTS]
    assert min(float(np.linalg.norm(a - b)) for a, b in itertools.combinations(seen, 2)) >= APART


@pytest.mark.parametrize("eyes", BLINDNESS)
def test_colour_blindness_leaves_grey_alone(eyes: str) -> None:
    assert BLINDNESS[eyes].sum(axis=1) == pytest.approx(1.0, abs=2e-6)


def declared(block: str) -> dict[str, str]:
    return dict(re.findall(r"--([a-z0-9-]+):(#[0-9a-f]{6})", block))


def test_every_theme_sets_every_colour() -> None:
    """Light, dark by the system, dark by the toggle, paper: the same names; the two ways to dark are the same."""
    light, by_system, by_toggle, paper = [declared(line) for line in palette_css().strip().splitlines()]
    assert set(light) == set(by_system) >= set(PALETTE)
    assert by_system == by_toggle
    assert light == paper
    assert all(light[name] != by_system[name] for name in ("paper", "ink", "muted", "good"))


def test_style_uses_no_colour_that_is_not_set() -> None:
    used = set(re.findall(r"var\(--([a-z0-9-]+)", page_text("page.css")))
    assert used - {"tone"} <= set(PALETTE)  # tone is set by the classes good, warn and bad
    assert not re.findall(r"#[0-9a-fA-F]{3,8}\b(?![^{]*\{)", page_text("page.css"))

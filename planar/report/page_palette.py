"""The colours of the page, light and dark, as CSS variables that its pictures use too.

The pictures' own names come from `svg` and `plots`, those of the page are added here; contrast and distance for
colour-blind eyes are computed in a test. The accents differ in lightness as well as in hue.
"""

from __future__ import annotations

from collections.abc import Mapping

from planar.report import svg
from planar.report.plots import plots_css

ADDED: Mapping[str, tuple[str, str]] = {
    "panel": ("#f4f5f1", "#1d2327"),
    "rule": ("#d9dcd4", "#343c41"),
    "link": ("#1f5f86", "#8cc6e6"),
    "edge": ("#3a464c", "#aab5ba"),
    "accent-1": ("#2b629c", "#9accf3"),
    "accent-2": ("#8f3f16", "#c8874f"),
    "accent-3": ("#16958a", "#abecd6"),
    "accent-4": ("#8f3fce", "#b06ee6"),
    "accent-5": ("#8f8412", "#dcba24"),
    "accent-6": ("#4f1a33", "#c4468f"),
    "good": ("#1f6b4a", "#6cc79a"),
    "warn": ("#8a5a00", "#e2b04a"),
    "bad": ("#a8262b", "#f0857d"),
}
"""Name of a colour -> (on a light page, on a dark one)."""
PALETTE: Mapping[str, tuple[str, str]] = {**svg.PALETTE, **ADDED}
"""Colours of page and drawings; plots bring more of their own."""


def palette_css() -> str:
    """Rules that set the variables: light, dark where the reader's system is or the toggle says so, light on paper."""
    light, dark = (_declarations(side) for side in (0, 1))
    return (
        f":root{{color-scheme:light;{light}}}\n"
        f"@media (prefers-color-scheme: dark){{:root:not([data-theme=light]){{color-scheme:dark;{dark}}}}}\n"
        f":root[data-theme=dark]{{color-scheme:dark;{dark}}}\n"
        f"@media print{{:root:root,:root[data-theme][data-theme]{{color-scheme:light;{light}}}}}\n"
    )


def _declarations(side: int) -> str:
    return plots_css(bool(side)) + "".join(f"--{name}:{pair[side]};" for name, pair in PALETTE.items())

"""Every plot of a design's field data, from what its files hold: one place that knows which plots there are."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from planar.design.portrait import Portrait
from planar.network.response import Response
from planar.report.plots_axes import plot_palette_css
from planar.report.plots_current import current_plot, level_palette_css, mode_plot
from planar.report.plots_frequency import Asked, Spread, gain_plot, reflection_plot
from planar.report.plots_polar import axial_cut_plot, cut_plot
from planar.report.plots_smith import smith_plot


def response_plots(facts: Mapping[str, Any], response: Response, spread: Spread | None = None) -> dict[str, str]:
    """SVG texts `reflection` and `smith` of a design with a prediction; `facts` as in `design.json`."""
    asked, prediction = Asked.of(facts), facts["prediction"]
    return {
        "reflection": reflection_plot(response, prediction, asked=asked, spread=spread),
        "smith": smith_plot(response, prediction, asked=asked),
    }


def portrait_plots(facts: Mapping[str, Any], portrait: Portrait) -> dict[str, str]:
    """SVG texts of the field data: `gain`, `cut-0` and `cut-90`, `current-<level>`, `mode-<n>` for each mode there is,
    and `axial` of a circular board."""
    asked = Asked.of(facts)
    plots = {"gain": gain_plot(portrait, asked=asked)}
    plots |= {f"cut-{cut.azimuth:g}": cut_plot(portrait, cut) for cut in portrait.cuts}
    if portrait.circular:
        plots["axial"] = axial_cut_plot(portrait, asked=asked)
    plots |= {f"current-{each.level}": current_plot(portrait, each) for each in portrait.currents}
    plots |= {f"mode-{number}": mode_plot(mode) for number, mode in enumerate(portrait.modes, 1)}
    return plots


def plots_css(dark: bool) -> str:
    """Declarations of every colour the plots use beside those of `svg.PALETTE`, for a `dark` page or a light one."""
    return plot_palette_css(dark) + level_palette_css(dark)

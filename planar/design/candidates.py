"""Which antenna, when the brief leaves it open: every realisation sized on a coarse mesh and ranked.

First what meets the brief, then what needs no balun, then the widest margin that is left after tolerances: the match
held to what the etched line may be off, less the frequency by which laminate and thickness may move the loop. A
quarter-wave line off by a fraction of its impedance turns its load into one off by twice that, and the reflection by
about that fraction.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Iterator, Mapping
from dataclasses import dataclass

from planar.brief import Brief
from planar.copper.rules import fab_findings
from planar.design.choices import COAX_IMPEDANCES, Choices
from planar.design.design import Design
from planar.design.first_order import loop_shape
from planar.design.line_size import design_lines, line_settings
from planar.design.loop_size import LoopSurroundings, resonant_frequency
from planar.design.sizing import Sized
from planar.design.sizing_record import Candidate
from planar.design.trial import draw
from planar.errors import PlanarError, RangeError, Severity, SynthesisError
from planar.network.quality import margins
from planar.network.response import Response
from planar.units import show

NEARLY = 1.3
"""Worst term in the band over its limit, on the coarse mesh, up to which the fine one is expected to meet the brief:
the limits in the band are stricter than the brief by more than that."""
USUAL_SPREAD = 0.011
"""Fraction by which fabrication moves the frequency where the formulas cannot say (common practice, no source)."""


@dataclass(frozen=True, eq=False)
class Ranked:
    """The table of `candidates`, best first, and those of them that were `sized`, with design and coarse sizing."""

    candidates: tuple[Candidate, ...]
    sized: tuple[tuple[Candidate, Design, Sized], ...]


SizeFirst = Callable[[Brief], tuple[Design, Sized]]


def rank(brief: Brief, size: SizeFirst, progress: Callable[[str], None]) -> Ranked:
    """Size every realisation of `brief` with `size` and rank them."""
    sized: list[tuple[Candidate, Design, Sized]] = []
    refused: list[Candidate] = []
    for changed in realisations(brief):
        antenna = changed.antenna
        progress(f"sizing {antenna.family}{f', end {antenna.end}' if antenna.end else ''}, {antenna.shape}")
        try:
            design, outcome = size(changed)
            sized.append((_judged(design, outcome), design, outcome))
        except PlanarError as error:
            refused.append(_refused(changed, _reason(error, brief.name)))
    sized.sort(key=lambda each: _order(each[0]))
    return Ranked((*(each[0] for each in sized), *refused), tuple(sized))


def _reason(error: PlanarError, name: str) -> str:
    if isinstance(error, SynthesisError) and error.findings:
        return str(error.findings[0])
    return str(error).splitlines()[0].removeprefix(f"{name}: ")


def realisations(brief: Brief) -> Iterator[Brief]:
    """Every family and end the brief could mean; with no shape stated, the rectangle that needs no line too."""
    coax = COAX_IMPEDANCES[0] <= brief.target.impedance <= COAX_IMPEDANCES[1]
    if coax:
        for end in ("open", "via"):
            yield _changed(brief, {"family": "ring-guided", "end": end})
    yield _changed(brief, {"family": "coplanar"})
    yield _changed(brief, {"family": "plain"})
    if "shape" not in brief.antenna.model_fields_set and brief.target.polarisation == "linear":
        yield _changed(brief, {"family": "plain", "shape": "rectangle"})


def _changed(brief: Brief, values: dict[str, object]) -> Brief:
    return brief.model_copy(update={"antenna": brief.antenna.model_copy(update=values)})


def _order(candidate: Candidate) -> tuple[bool, bool, float]:
    return not candidate.meets, candidate.needs_balun, -(candidate.margin or 0.0)


def _refused(brief: Brief, reason: str) -> Candidate:
    antenna = brief.antenna
    return Candidate(str(antenna.family), antenna.end, antenna.shape, False, None, None, False, reason)


def _judged(design: Design, sized: Sized) -> Candidate:
    choices = design.choices
    target, antenna = choices.brief.target, choices.brief.antenna
    coax = COAX_IMPEDANCES[0] <= target.impedance <= COAX_IMPEDANCES[1]
    error, remark = line_error(choices, sized.dimensions)
    level = 10.0 ** (target.match_db / 20.0)
    goal = sized.bench.goal
    response = Response(goal.frequencies, sized.model.values[: len(goal.frequencies)], target.impedance)
    held = margins(response, target.band, 20.0 * math.log10(max(1e-3, level - error)))
    spread = frequency_spread(choices, sized.dimensions)
    least = -math.inf if held.below is None or held.above is None else min(held.below, held.above)
    margin = max(-1.0, least / choices.centre - spread)
    worst = goal.worst(sized.model.values, 0.0)
    layout = draw(choices, sized.dimensions, lettered_board=False).layout
    makeable = not any(
        finding.severity is Severity.REFUSE
        for finding in fab_findings(layout, choices.fab, choices.brief.board.size_limit)
    )
    return Candidate(
        choices.family.key,
        choices.end,
        antenna.shape,
        makeable and worst < NEARLY,
        margin,
        layout.size,
        choices.family.feed == "balanced" and coax,
        remark,
    )


def line_error(choices: Choices, dimensions: dict[str, float]) -> tuple[float, str]:
    """Relative error of the worst line's impedance at the fab's and laminate's tolerances, and what causes it."""
    lines = design_lines(dimensions, choices, line_settings(choices))
    if not lines:
        return 0.0, "no line to go wrong"
    worst = max(lines, key=lambda each: each.tolerance_ohm / each.line.impedance)
    error = worst.tolerance_ohm / worst.line.impedance
    narrow = worst.line.gap if worst.line.gap is not None else worst.line.width
    what = "gap" if worst.line.gap is not None else "track"
    etch = show(choices.fab.etch_tolerance, "length", 2)
    return (
        error,
        f"{show(narrow, 'length', 3)} {what}: +-{etch} an edge, with laminate, is +-{100 * error:.0f} % of its ohms",
    )


def frequency_spread(choices: Choices, dimensions: Mapping[str, float]) -> float:
    """Fraction by which permittivity and thickness of the board at their tolerances move the bare loop, by formulas."""
    slab, shape = choices.stackup.substrate, loop_shape(choices, dimensions)
    perimeter, trace = shape.perimeter(dimensions["loop_width"]), dimensions["trace_width"]

    def resonance(thickness: float, permittivity: float) -> float:
        stackup = choices.stackup.varied(slab.name, thickness=thickness, permittivity=permittivity)
        around = LoopSurroundings.of(stackup, choices.levels[-1], choices.centre)
        return resonant_frequency(perimeter, trace, shape, around).frequency

    try:
        nominal = resonance(1.0, 1.0)
        thicker = resonance(1.0 + slab.thickness_tolerance, 1.0) / nominal - 1.0
        denser = resonance(1.0, 1.0 + slab.eps_r_tolerance) / nominal - 1.0
    except RangeError:
        return USUAL_SPREAD
    return math.hypot(thicker, denser)

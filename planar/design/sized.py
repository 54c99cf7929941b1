"""From a brief to a design that meets it by computation, or the reason why none does.

First dimensions come from formulas, the field solver sizes them, and what it says of the final copper is held against
the brief. Dimensions given in the brief are solved as they are.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping
from dataclasses import replace

import numpy as np

from planar.brief import Brief
from planar.copper.rules import fab_findings
from planar.design.candidates import Ranked, rank
from planar.design.choices import Choices
from planar.design.design import Design, connector_impedance, make_design
from planar.design.line_size import design_lines, line_settings
from planar.design.prediction import Prediction, predict, solver_findings, unmet, wide_response
from planar.design.sizing import Sized, Verified, size_coarsely, size_finely, verifying_effort
from planar.design.sizing_record import Candidate, SizingRecord
from planar.design.trial import Trial, draw, solve_trial
from planar.design.trim import Cut, cut_table, trim_finding
from planar.design.variables import variables_of
from planar.design.workers import Workers, workers
from planar.errors import Finding, Severity, SynthesisError
from planar.library import Library

Progress = Callable[[str], None]

OVERSIZE = 0.12
"""Fraction by which a board of first dimensions may exceed its size limit: sizing may make it smaller."""


def sized_design(brief: Brief, library: Library, where: str, progress: Progress = lambda stage: None) -> Design:
    """Design of `brief`, read from the file `where`, with the prediction for its copper.

    Raises `BriefError`, `LibraryError`, and `SynthesisError` where no such board can be made or none that was found
    meets the brief: with what is missed, the best reached and what limits it.
    """
    if brief.antenna.dimensions:
        return _analysed(make_design(brief, library, where), progress)
    with workers() as shared:

        def sized_coarsely(changed: Brief) -> tuple[Design, Sized]:
            first = make_design(changed, library, where, oversize=OVERSIZE)
            return first, size_coarsely(variables_of(first.choices, first.dimensions, _room(first)), shared)

        if brief.antenna.family is not None:
            progress("sizing on a coarse mesh")
            return _verified(*sized_coarsely(brief), (), progress)
        ranked = rank(brief, sized_coarsely, progress)
        if ranked.best is None:
            make_design(brief, library, where)  # says why, with the nearest changes
            raise SynthesisError(f"{brief.name}: no family could be sized", _candidate_findings(ranked))
        return _verified(*ranked.best, ranked.candidates, progress)


def _room(first: Design) -> float:
    """How much wider the loop may become before the board exceeds its limit or the fab's, m; negative where it does."""
    limit, size = first.choices.brief.board.size_limit, first.layout.size
    fab = first.choices.fab.max_board  # a board may be turned on the fab's panel, not in its place
    rooms = [most - side for most, side in zip(sorted(fab), sorted(size), strict=True)]
    rooms += [] if limit is None else [most - side for most, side in zip(limit, size, strict=True)]
    return min(rooms)


def _verified(first: Design, coarse: Sized, candidates: tuple[Candidate, ...], progress: Progress) -> Design:
    """The design finished on the fine mesh. Raises `SynthesisError` where it misses the brief or a rule."""
    choices = first.choices
    progress(f"verifying on the fine mesh: {coarse.boards} boards solved so far")
    early = coarse.bench.workers.beside(wide_response, (choices, coarse.rounded))
    fine = size_finely(coarse)
    trial = replace(fine.trial, planned=draw(choices, fine.trial.dimensions))
    solutions = coarse.solutions + fine.sized.solutions
    record = SizingRecord(coarse.boards, fine.sized.boards, solutions, fine.sized.width, fine.held, candidates)
    progress("predicting")
    wide = early()
    if wide.dimensions != trial.dimensions:
        wide = wide_response((choices, trial.dimensions))
    prediction = predict(choices, trial, wide)
    rules = (*trial.planned.findings, *fab_findings(trial.planned.layout, choices.fab, choices.brief.board.size_limit))
    missed = [*unmet(choices, prediction, Severity.REFUSE), *(f for f in rules if f.severity is Severity.REFUSE)]
    if missed:
        raise SynthesisError(
            f"{first.name}: no {choices.family.key} board was found that meets the brief; the best reached:",
            (*missed, *_limits(fine, choices), *_context(prediction, choices)),
            _within_reach(prediction, choices, trial),
        )
    dimensions = {name: trial.dimensions[name] for name in choices.family.needed(choices.traits)}
    cuts = _cuts(choices, dimensions, coarse.bench.workers, progress)
    return replace(
        first,
        choices=_with_reasons(choices, candidates),
        dimensions=dimensions,
        layout=trial.planned.layout,
        bare_loop=None,
        lines=design_lines(dimensions, choices, line_settings(choices)),
        findings=(
            *connector_impedance(choices),
            *solver_findings(prediction),
            *_trimming(cuts),
            *_limits(fine, choices),
            *rules,
        ),
        prediction=prediction,
        sizing=record,
        cuts=cuts,
    )


def _analysed(design: Design, progress: Progress) -> Design:
    """A design of given dimensions with its prediction."""
    choices = design.choices
    progress("solving the given dimensions")
    with workers() as shared:
        wide = shared.beside(wide_response, (choices, design.dimensions))
        trial = solve_trial(choices, design.dimensions, verifying_effort(choices))
        prediction = predict(choices, trial, wide())
        cuts = _cuts(choices, design.dimensions, shared, progress)
    said = (*unmet(choices, prediction, Severity.WARN), *solver_findings(prediction), *_trimming(cuts))
    kept = [f for f in design.findings if f.rule not in {"match", "resonance", "polarisation", "axial ratio"}]
    return replace(design, findings=(*said, *kept), prediction=prediction, cuts=cuts)


def _cuts(choices: Choices, dimensions: Mapping[str, float], shared: Workers, progress: Progress) -> tuple[Cut, ...]:
    """The cut table of a brief that asks for trim tabs."""
    if not choices.brief.antenna.trim:
        return ()
    progress("trying every cut")
    return cut_table(choices, dimensions, shared)


def _trimming(cuts: tuple[Cut, ...]) -> tuple[Finding, ...]:
    return (trim_finding(cuts),) if cuts else ()


def _with_reasons(choices: Choices, candidates: tuple[Candidate, ...]) -> Choices:
    if not candidates:
        return choices
    others = ", ".join(each.name for each in candidates[1:]) or "nothing else"
    reason = f"{candidates[0].name} chosen over {others}: the widest margin after tolerances among those that fit best"
    return replace(choices, reasons=(*choices.reasons, reason))


def _limits(fine: Verified, choices: Choices) -> tuple[Finding, ...]:
    """A note for each dimension that sizing would have moved further."""
    findings = []
    for name in fine.held:
        value = fine.trial.dimensions[name]
        limit = f"a bound of sizing, set by {choices.fab.key} or by the trace"
        advice = "a finer fab, a wider trace or another thickness gives room"
        findings.append(Finding("bound", name, f"{value * 1e3:.3f} mm", limit, advice, Severity.NOTE))
    return tuple(findings)


def _context(prediction: Prediction, choices: Choices) -> list[Finding]:
    """What explains a miss: the impedance the copper came to, and a poor efficiency."""
    z = prediction.centre.input_impedance_ohm
    got = f"{z.real:.0f}{z.imag:+.0f}j ohm at the centre"
    note = Finding("impedance", "pads", got, f"{choices.brief.target.impedance:g} ohm", "", Severity.NOTE)
    return [note, *(each for each in solver_findings(prediction) if each.severity is Severity.WARN)]


def _within_reach(prediction: Prediction, choices: Choices, trial: Trial) -> tuple[str, ...]:
    """What of the brief this copper does meet, as changes to it; every one was solved."""
    target, spare, changes = choices.brief.target, prediction.margins, []
    if spare.spare_db < 0.0 and spare.worst_db < -3.0:
        changes.append(f'target.match = "{math.ceil(spare.worst_db * 10.0 + 1e-9) / 10.0:g} dB", what it reaches')
    band = spare.band
    if spare.spare_db < 0.0 and band is not None and band.low < choices.centre < band.high:
        low, high = max(band.low, target.band[0]), min(band.high, target.band[1])
        changes.append(f'target.band = ["{low / 1e6:.5g} MHz", "{high / 1e6:.5g} MHz"], the part this copper matches')
    port = round(abs(prediction.centre.input_impedance_ohm))
    impedance = trial.band.impedance(np.linspace(*target.band, 21))
    reflection = float(np.max(np.abs((impedance - port) / (impedance + port))))
    if spare.spare_db < 0.0 and reflection <= 10.0 ** (target.match_db / 20.0) and choices.family.feed == "balanced":
        changes.append(f'target.impedance = "{port} ohm", at which it reflects {20.0 * math.log10(reflection):.1f} dB')
    return tuple(changes)


def _candidate_findings(ranked: Ranked) -> tuple[Finding, ...]:
    return tuple(
        Finding("family", each.name, each.remark, "the brief", "", Severity.REFUSE) for each in ranked.candidates
    )

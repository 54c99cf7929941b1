"""From a brief to a design that meets it by computation, or the reason why none does.

First dimensions come from formulas, the field solver sizes them, and what it says of the final copper is held against
the brief. Dimensions given in the brief are solved as they are.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping, Sequence
from dataclasses import replace

import numpy as np

from planar.brief import Brief
from planar.copper.rules import fab_findings
from planar.design.accuracy import circuit_findings, power_findings
from planar.design.candidates import Ranked, rank
from planar.design.choices import Choices
from planar.design.design import Design, connector_impedance, make_design
from planar.design.line_size import design_lines, line_settings
from planar.design.portrait import portrait
from planar.design.portrait_modes import loop_modes
from planar.design.prediction import Prediction, predict, unmet, wide_response
from planar.design.sizing import Sized, Verified, size_coarsely, size_finely, verifying_effort
from planar.design.sizing_record import Candidate, SizingRecord
from planar.design.trial import Trial, draw, solve_trial
from planar.design.trim import Cut, cut_table, trim_finding
from planar.design.variables import variables_of
from planar.design.workers import Workers, workers
from planar.errors import Finding, RangeError, Severity, SynthesisError
from planar.library import Library
from planar.network.response import reflection

Progress = Callable[[str], None]

PORTS = (10, 600)
"""ohm, port impedances a brief may ask for."""
OVERSIZE = 0.2
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
            return first, size_coarsely(variables_of(first.choices, first.dimensions), shared)

        if brief.antenna.family is not None:
            progress("sizing on a coarse mesh")
            return _verified(*sized_coarsely(brief), (), progress)
        found = _best_verified(brief, rank(brief, sized_coarsely, progress), progress)
        return replace(found, asked=brief)


def _best_verified(brief: Brief, ranked: Ranked, progress: Progress) -> Design:
    """The first of the candidates, best first, that meets the brief on the fine mesh too."""
    misses: list[tuple[str, SynthesisError]] = []
    for number, (candidate, design, coarse) in enumerate(ranked.sized):
        if number > 0 and not candidate.meets:
            break
        rest = tuple(each for each in ranked.candidates if each is not candidate)
        try:
            return _verified(design, coarse, (replace(candidate, meets=True), *rest), progress)
        except (SynthesisError, RangeError) as error:
            misses.append((candidate.name, error if isinstance(error, SynthesisError) else SynthesisError(str(error))))
    told = tuple(
        Finding("family", each.name, each.remark, "the brief", "", Severity.NOTE) for each in ranked.candidates
    )
    if not misses:
        raise SynthesisError(f"{brief.name}: no family could be sized:", told)
    name, first = misses[0]
    raise SynthesisError(
        f"{brief.name}: nothing that was tried meets the brief; best was {name}:",
        (*first.findings, *told),
        first.changes,
    )


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
    modes = coarse.bench.workers.beside(loop_modes, (choices, trial.dimensions))
    same = trial.dimensions == coarse.rounded
    prediction = predict(choices, trial, early() if same else wide_response((choices, trial.dimensions)))
    rules = (*trial.planned.findings, *fab_findings(trial.planned.layout, choices.fab, choices.brief.board.size_limit))
    missed = [*unmet(choices, prediction, Severity.REFUSE), *(f for f in rules if f.severity is Severity.REFUSE)]
    if missed:
        told = (*missed, *_limits(fine), *_context(prediction, choices))
        reason = f"{first.name}: no {choices.family.key} board was found that meets the brief; the best reached:"
        raise SynthesisError(reason, told, _within_reach(prediction, choices, trial) if _only_match(missed) else ())
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
            *power_findings([prediction.centre]),
            *circuit_findings(prediction.circuit.deviation),
            *_trimming(cuts, asked=choices.brief.antenna.trim),
            *_limits(fine),
            *rules,
        ),
        prediction=prediction,
        sizing=record,
        cuts=cuts,
        portrait=portrait(choices, trial, centre=prediction.centre, span=prediction.trusted, modes=modes()),
    )


def _analysed(design: Design, progress: Progress) -> Design:
    """A design of given dimensions with its prediction."""
    choices = design.choices
    progress("solving the given dimensions")
    with workers() as shared:
        wide = shared.beside(wide_response, (choices, design.dimensions))
        modes = shared.beside(loop_modes, (choices, design.dimensions))
        trial = solve_trial(choices, design.dimensions, verifying_effort(choices))
        prediction = predict(choices, trial, wide())
        shown = portrait(choices, trial, centre=prediction.centre, span=prediction.trusted, modes=modes())
        cuts = _cuts(choices, design.dimensions, shared, progress)
    said = (
        *unmet(choices, prediction, Severity.WARN),
        *power_findings([prediction.centre]),
        *circuit_findings(prediction.circuit.deviation),
        *_trimming(cuts, asked=choices.brief.antenna.trim),
    )
    kept = [f for f in design.findings if f.rule not in {"match", "resonance", "polarisation", "axial ratio"}]
    return replace(design, findings=(*said, *kept), prediction=prediction, cuts=cuts, portrait=shown)


def _cuts(choices: Choices, dimensions: Mapping[str, float], shared: Workers, progress: Progress) -> tuple[Cut, ...]:
    """The cut table of a brief that asks for trim tabs."""
    if not choices.brief.antenna.trim:
        return ()
    progress("trying every cut")
    return cut_table(choices, dimensions, shared)


def _trimming(cuts: tuple[Cut, ...], *, asked: bool) -> tuple[Finding, ...]:
    return (trim_finding(cuts),) if asked else ()


def _with_reasons(choices: Choices, candidates: tuple[Candidate, ...]) -> Choices:
    if not candidates:
        return choices
    others = "; ".join(each.name for each in candidates[1:] if each.margin is not None) or "nothing else that fits"
    reason = f"{candidates[0].name} chosen over {others}: it meets the brief, first without a balun, then by its margin"
    return replace(choices, reasons=(*choices.reasons, reason))


def _limits(fine: Verified) -> tuple[Finding, ...]:
    """A note for each dimension that sizing would have moved further."""
    findings = []
    for name in fine.held:
        got = f"{fine.trial.dimensions[name] * 1e3:.3f} mm"
        limit = "as far as sizing may move it: the fab, the line formulas, or half the trace above which it runs"
        advice = "a finer fab, a wider trace or another thickness gives room"
        findings.append(Finding("bound", name, got, limit, advice, Severity.NOTE))
    return tuple(findings)


def _only_match(missed: Sequence[Finding]) -> bool:
    return all(finding.rule == "match over the band" for finding in missed)


def _context(prediction: Prediction, choices: Choices) -> list[Finding]:
    """What explains a miss: the impedance the copper came to, and a poor efficiency."""
    z = prediction.centre.input_impedance_ohm
    got = f"{z.real:.0f}{z.imag:+.0f}j ohm at the centre"
    limit = f"for information; the port is {choices.brief.target.impedance:g} ohm"
    note = Finding("impedance", "pads", got, limit, "", Severity.NOTE)
    return [note, *(each for each in power_findings([prediction.centre]) if each.severity is Severity.WARN)]


def _within_reach(prediction: Prediction, choices: Choices, trial: Trial) -> tuple[str, ...]:
    """Changes to the brief for which the copper found, as solved, would pass; sizing for them anew does no worse."""
    target, spare, changes = choices.brief.target, prediction.margins, []
    level = 10.0 ** (target.match_db / 20.0)
    if spare.spare_db < 0.0 and spare.worst_db < -3.0:
        kept = math.ceil(spare.worst_db * 10.0 + 1e-9) / 10.0
        changes.append(f'target.match = "{kept:g} dB", which this copper keeps; sized for that it may do better')
    band = spare.band
    if spare.spare_db < 0.0 and band is not None and band.low < choices.centre < band.high:
        low, high = math.ceil(max(band.low, target.band[0]) / 1e5), math.floor(min(band.high, target.band[1]) / 1e5)
        changes.append(f'target.band = ["{low / 10:g} MHz", "{high / 10:g} MHz"], the part this copper matches')
    port = min(max(round(abs(prediction.centre.input_impedance_ohm)), PORTS[0]), PORTS[1])
    worst = float(np.max(np.abs(reflection(trial.band.impedance(np.linspace(*target.band, 21)), port))))
    if spare.spare_db < 0.0 and worst <= level and choices.family.feed == "balanced":
        changes.append(f'target.impedance = "{port} ohm", at which it reflects {20.0 * math.log10(worst):.1f} dB')
    return tuple(changes)

"""What is computed and not written: `size` a board, `solve` a field problem.

Nothing here needs the writers of files or of pages, so that these commands start without them.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import asdict, dataclass, replace
from pathlib import Path
from typing import Any

from planar import __version__
from planar.brief import Brief, read_brief
from planar.design.design import Design, make_design
from planar.design.design_file import read_design
from planar.design.field_solution import Solution, solve_design
from planar.design.sensitivity import sensitivities
from planar.design.sized import sized_design
from planar.design.solve_question import SolveQuestion, read_question
from planar.design.workers import workers
from planar.errors import Finding, GeometryError, HandoffError, RangeError, SynthesisError
from planar.field.result import PointResult
from planar.library import Library
from planar.network.touchstone import write_touchstone
from planar.pipeline.design_paths import design_file

Progress = Callable[[str], None]


@dataclass(frozen=True)
class Solved:
    """A design and its field solution."""

    design: Design
    solution: Solution


def size(path: Path, library: Library, *, sensitive: bool = False, progress: Progress = lambda stage: None) -> Design:
    """Dimensions, copper and prediction of a brief, on wish with the table of sensitivities, nothing written.

    Raises `PlanarError`.
    """
    progress("reading the brief")
    design = designed(read_brief(path, library), library, path, progress)
    return with_sensitivities(design, progress) if sensitive else design


def with_sensitivities(design: Design, progress: Progress) -> Design:
    """`design` with its table of sensitivities, or with a finding that says why there is none."""
    progress("trying every dimension and layer both ways")
    with workers() as shared:
        found = sensitivities(design.choices, design.dimensions, shared)
    if found:
        return replace(design, sensitivities=found)
    missed = Finding("sensitivities", "dimensions", "the board could not be solved for them", "a table", "")
    return replace(design, findings=(*design.findings, missed))


def solve(path: Path, library: Library, question: SolveQuestion, progress: Progress = lambda stage: None) -> Solved:
    """Field solution of a brief's design, or of the design in a design.json or a pack's folder.

    Raises `PlanarError`; nothing is then written.
    """
    path = design_file(path)
    if path.suffix == ".json":
        design = read_design(path, library)
        frequencies, sweep = read_question(question, design.choices.brief)
    else:
        brief = read_brief(path, library)
        frequencies, sweep = read_question(question, brief)
        given = bool(brief.antenna.dimensions)
        design = make_design(brief, library, str(path)) if given else designed(brief, library, path, progress)
    try:
        solution = solve_design(design, frequencies, sweep=sweep, progress=progress)
    except GeometryError as error:
        raise SynthesisError(f"{path}: the field solver cannot take this copper: {error}") from error
    if question.s1p is not None and solution.sweep is not None:
        try:
            solved = (
                f"Field solution of the copper as drawn, {solution.unknowns} unknowns; the input impedance moves by "
                f"{100.0 * solution.convergence:.1f} % from a coarser mesh. Nominal board, no tolerances."
            )
            write_touchstone(solution.sweep, question.s1p, comments=(design.name, solved))
        except OSError as error:
            raise HandoffError(f"cannot write {question.s1p}: {error.strerror}") from error
    return Solved(design, solution)


def designed(brief: Brief, library: Library, path: Path, progress: Progress) -> Design:
    """The design of `brief`, read from the file at `path`. Raises `PlanarError`; a refusal names the file."""
    try:
        return sized_design(brief, library, str(path), progress)
    except SynthesisError as error:  # a refusal names the file, as a fault does
        raise SynthesisError(f"{path}: {error.reason}", error.findings, error.changes) from error
    except (RangeError, GeometryError) as error:
        raise SynthesisError(f"{path}: {brief.name}: {error}") from error


def solution_facts(solved: Solved) -> dict[str, Any]:
    """A field solution in plain types, units in the names: what `planar solve --json` says."""
    solution, reference = solved.solution, solved.design.choices.brief.target.impedance
    facts: dict[str, Any] = {
        "name": solved.design.name,
        "planar_version": __version__,
        "reference_ohm": reference,
        "unknowns": solution.unknowns,
        "convergence": solution.convergence,
        "power_balance": solution.points[len(solution.points) // 2].power_balance,
        "points": [
            _point_facts(point, gap, reference)
            for point, gap in zip(solution.points, solution.gap_impedance_ohm, strict=True)
        ],
        "findings": [asdict(finding) for finding in solution.findings],
    }
    if solution.sweep is not None:
        z = solution.sweep.z[:, 0, 0]
        facts["sweep"] = {
            "frequency_hz": solution.sweep.frequency.tolist(),
            "input_impedance_ohm": [[value.real, value.imag] for value in z.tolist()],
            "reflection_db": solution.sweep.reflection_db.tolist(),
            "best_match_hz": solution.sweep.best_match,
        }
    return facts


def _point_facts(point: PointResult, gap: complex, reference: float) -> dict[str, Any]:
    facts = asdict(point)
    z = point.input_impedance_ohm
    linear = point.sense == "linear"
    return facts | {
        "input_impedance_ohm": [z.real, z.imag],
        "gap_impedance_ohm": [gap.real, gap.imag],
        "reflection_db": point.reflection_db(reference),
        "axial_ratio_db": None if linear else point.axial_ratio_db,
        "power_balance": point.power_balance,
    }

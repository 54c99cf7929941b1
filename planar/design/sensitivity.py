"""What each dimension and each layer does to the antenna: finite differences on the field solver.

A change moves the response along the frequency axis, see `planar.design.shift`, and changes the impedance, which is
told at the centre. Every step is taken both ways: how far the two differ tells how linear it is.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from planar.design.bare_loop import has_line
from planar.design.choices import Choices
from planar.design.shift import comparing_effort, shift, shift_frequencies
from planar.design.trial import solve_trial
from planar.design.workers import Workers
from planar.errors import PlanarError
from planar.field.modes import modes_over
from planar.field.solver import FieldProblem
from planar.stackup import LayerKind

Array = NDArray[np.float64]
Complex = NDArray[np.complex128]

MODE_SHARES = (0.88, 0.96, 1.04, 1.12)
"""Frequencies, over the centre, the mode is followed through."""
DIMENSION_STEPS = {"loop_width": 0.03, "loop_height": 0.03, "second_gap": 0.25}
USUAL_STEP = 0.08
"""Relative steps of dimensions: large beside what the mesh makes of them."""
LEAST_STEP = 2e-5
"""m, no dimension moves by less."""
PERMITTIVITY_STEP, THICKNESS_STEP = 0.04, 0.08
"""Relative steps of layers."""
TRIED = frozenset({LayerKind.DIELECTRIC, LayerKind.MASK, LayerKind.COVER, LayerKind.AIR})


@dataclass(frozen=True)
class Sensitivity:
    """The effect of one quantity. `name` of the dimension, or layer and property; `value` in m or a pure number.

    `hz_per_unit` shifts the response, `ohm_per_unit` changes the input impedance at the centre; the unit is 1 m, or 1
    of a permittivity. `mode_hz_per_unit` is the shift of the loop's own resonance, that of its characteristic mode;
    None where a line hangs on the loop or a second gap splits the mode. `asymmetry` is the difference of the shifts of
    the two ways over their mean: 0 is linear, None where only one way could be drawn.
    """

    name: str
    value: float
    step: float
    hz_per_unit: float
    ohm_per_unit: complex
    mode_hz_per_unit: float | None
    asymmetry: float | None


@dataclass(frozen=True)
class _Change:
    """One quantity and what it makes of the board when it moves by the fraction `part`."""

    name: str
    value: float
    relative: float
    layer: str | None = None
    permittivity: bool = False

    def applied(
        self, choices: Choices, dimensions: Mapping[str, float], part: float
    ) -> tuple[Choices, Mapping[str, float]]:
        factor = 1.0 + part * self.relative
        if self.layer is None:
            return choices, dict(dimensions) | {self.name: self.value * factor}
        factors = {"permittivity": factor} if self.permittivity else {"thickness": factor}
        return replace(choices, stackup=choices.stackup.varied(self.layer, **factors)), dimensions


def sensitivities(choices: Choices, dimensions: Mapping[str, float], workers: Workers) -> tuple[Sensitivity, ...]:
    """The effect of every dimension and layer on the board of `dimensions`, in their order."""
    changes = [*_dimension_changes(choices, dimensions), *_layer_changes(choices)]
    tasks = [(choices, dimensions)]
    tasks += [change.applied(choices, dimensions, part) for change in changes for part in (1.0, -1.0)]
    here, *moved = workers.each(_solved, tasks)
    if here is None:
        return ()
    pairs = zip(changes, moved[::2], moved[1::2], strict=True)
    found = (_effect(change, here, (more, less), choices) for change, more, less in pairs)
    return tuple(each for each in found if each is not None)


def _dimension_changes(choices: Choices, dimensions: Mapping[str, float]) -> list[_Change]:
    changes = []
    for name in choices.family.needed(choices.traits):
        value = dimensions[name]
        relative = max(DIMENSION_STEPS.get(name, USUAL_STEP), LEAST_STEP / value)
        changes.append(_Change(name, value, relative))
    return changes


def _layer_changes(choices: Choices) -> list[_Change]:
    changes = []
    for layer in choices.stackup.layers:
        if layer.kind not in TRIED or layer.thickness == 0.0:
            continue
        changes.append(_Change(f"{layer.name} thickness", layer.thickness, THICKNESS_STEP, layer.name))
        if layer.kind is not LayerKind.AIR:
            eps = layer.permittivity(choices.centre).real
            changes.append(_Change(f"{layer.name} permittivity", eps, PERMITTIVITY_STEP, layer.name, permittivity=True))
    return changes


@dataclass(frozen=True, eq=False)
class _Answer:
    """Impedance at the centre, over the span, and a little beside it both ways; the mode's resonance in Hz."""

    impedance: Complex
    resonance: float | None


def _solved(task: tuple[Choices, Mapping[str, float]]) -> _Answer | None:
    """The board of these dimensions, None where it cannot be drawn or solved."""
    choices, dimensions = task
    centre = choices.centre
    try:
        band = solve_trial(choices, dimensions, comparing_effort(centre)).band
    except PlanarError:
        return None
    bare = not choices.circular and not has_line(dimensions)
    return _Answer(band.impedance(shift_frequencies(centre)), _mode_resonance(band.problem, centre) if bare else None)


def _mode_resonance(problem: FieldProblem, centre: float) -> float | None:
    """Resonance, Hz, of the full-wave mode the port drives most, None where there is none near the centre."""
    tracks = modes_over(problem, centre * np.array(MODE_SHARES)).full_wave()
    driven = [track for track in tracks if track.resonance is not None]
    return max(driven, key=lambda track: abs(track.nearest.drive)).resonance if driven else None


def _effect(
    change: _Change, here: _Answer, moved: tuple[_Answer | None, _Answer | None], choices: Choices
) -> Sensitivity | None:
    reference = choices.brief.target.impedance
    shifts, ohms, modes = [], [], []
    for sign, there in zip((1.0, -1.0), moved, strict=True):
        if there is None:
            continue
        shifts.append(sign * shift(here.impedance, there.impedance, reference) / change.relative)
        ohms.append(sign * (there.impedance[0] - here.impedance[0]) / change.relative)
        if there.resonance is not None and here.resonance is not None:
            modes.append(sign * (there.resonance - here.resonance) / change.relative)
    if not shifts:
        return None
    mean, ohm = sum(shifts) / len(shifts), complex(sum(ohms) / len(ohms))
    both = len(shifts) == 2 and mean != 0.0
    asymmetry = (shifts[0] - shifts[1]) / mean if both else None
    step = change.relative * change.value
    per_unit = 1.0 / change.value
    mode = sum(modes) / len(modes) * per_unit if modes else None
    return Sensitivity(
        change.name, change.value, step, choices.centre * mean * per_unit, ohm * per_unit, mode, asymmetry
    )

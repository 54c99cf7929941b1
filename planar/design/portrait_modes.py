"""The two full-wave characteristic modes of the bare loop, for pictures: why it resonates and how wide it can be.

They need neither line nor port, so a mesh twice as coarse as the default tells them to a few parts in a thousand, in
about a second and beside other work.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import replace

import numpy as np

from planar.design.bare_loop import bare_loop_layout
from planar.design.choices import Choices
from planar.design.portrait import SHARE_DIGITS, ModeImage, current_maps
from planar.design.trial import MIRRORED, draw
from planar.errors import GeometryError, RangeError
from planar.field.handedness import mirrored_layout
from planar.field.modes import ModeTrack, modes_over
from planar.field.solver import FieldProblem, default_settings

COARSER = 2.0
"""Step of the modes' mesh over the default."""
SHARES = (0.7, 0.8, 0.9, 1.0, 1.1, 1.2, 1.3)
"""Of the centre frequency, where the modes are solved for."""
RESONANCE_DIGITS, QUALITY_DIGITS = -4, 2
"""Decimals of a mode's resonance in Hz and of its Q: more would be the mesh's."""


def loop_modes(task: tuple[Choices, Mapping[str, float]]) -> tuple[ModeImage, ...]:
    """The two, or fewer, full-wave modes of the loop of these dimensions, the better driven one at the centre first.

    Empty where the solver does not take the bare loop by itself.
    """
    choices, dimensions = task
    bare = bare_loop_layout(choices, dimensions, draw(choices, dimensions, lettered_board=False).layout)
    if choices.brief.target.polarisation == MIRRORED:
        bare = mirrored_layout(bare)
    frequencies = choices.centre * np.array(SHARES)
    settings = replace(default_settings(bare, choices.stackup, choices.centre, coarser=COARSER), crossed=False)
    try:
        problem = FieldProblem.prepare(bare, choices.stackup, float(frequencies[-1]), settings)
        tracks = modes_over(problem, frequencies).full_wave()
    except (GeometryError, RangeError):
        return ()
    level = choices.levels[-1].value
    images = (_image(problem, track, choices.centre, level=level) for track in tracks)
    return tuple(sorted(images, key=lambda image: -image.power_share))


def _image(problem: FieldProblem, track: ModeTrack, centre: float, *, level: str) -> ModeImage:
    """The mode of `track` as it is nearest to `centre` Hz."""
    mode = min(track.modes, key=lambda each: abs(each.frequency - centre))
    (current,) = current_maps(problem, mode.current, [level])
    return ModeImage(
        mode.orientation,
        None if track.resonance is None else float(round(track.resonance, RESONANCE_DIGITS)),
        None if track.quality is None else round(track.quality, QUALITY_DIGITS),
        round(mode.power_share, SHARE_DIGITS),
        current,
    )

"""Reads Gerber layer files again, strictly: the subset our own writer uses, and a fault for everything else.

The text is cut into commands, each of which changes the state of the image or puts down an object. Nothing is
repaired: an open contour, an arc whose radii differ or that turns through more than half a circle, a draw of no
length, an attribute inside a region, a wrong signature are named in `faults`, and what is open is left out.
"""

from __future__ import annotations

import hashlib
import math
import re
from collections.abc import Callable
from pathlib import Path

import numpy as np

from planar.copper.outline import GRID, Outline
from planar.errors import HandoffError
from planar.handoff.gerber_attributes import Fields, attribute_fields
from planar.handoff.gerber_content import Aperture, Flash, GerberContent, Region, Stroke, Tags, Track

RADIUS_SLACK = 2.0
"""nm by which the two radii of an arc may differ; rounding the centre alone makes 1.4."""
_TOKEN = re.compile(r"%([^%]*)%|([^%*]*)\*")
_OPERATION = re.compile(r"(?:X([+-]?\d+))?(?:Y([+-]?\d+))?(?:I([+-]?\d+)J([+-]?\d+))?D0?([123])")
_SELECT = re.compile(r"D([1-9]\d+)")
_APERTURE = re.compile(r"ADD([1-9]\d+)(?:(C|R),(\d+\.?\d*)(?:X(\d+\.?\d*))?|([A-Z]+\d+))")
_MACRO = re.compile(r"AM([A-Z]+\d+)\*4,1,(\d+),(-?\d+\.?\d*(?:,-?\d+\.?\d*)*),0")
_SIZES = {"C": 1, "R": 2}
_FEWEST_CORNERS = 3
_SIGNED_END = re.compile(r"%TF\.MD5,([0-9a-f]{32})\*%M02\*")
_FORMAT = "FSLAX46Y46"
_INCH = 25.4

_Place = tuple[int, int]
_Step = tuple[_Place, float]
"""A corner of a contour and the bulge of the edge that leads to it."""


def read_gerber(path: Path) -> GerberContent:
    """What a layer file holds, lengths in m, with everything the standard or the house rules forbid in `faults`.

    Raises `HandoffError` when the file cannot be read.
    """
    try:
        data = path.read_bytes()
    except OSError as error:
        raise HandoffError(f"{path.name} cannot be read: {error.strerror}") from error
    return gerber_from_text(data.decode("ascii", "replace"))


def gerber_from_text(text: str) -> GerberContent:
    """What the `text` of a layer file holds; see `read_gerber`."""
    image = _Image()
    joined = text.replace("\r", "").replace("\n", "")
    image.faults += ["characters beyond ASCII"] if "\ufffd" in joined else []
    position = 0
    while match := _TOKEN.match(joined, position):
        image.take(match[1], match[2])
        position = match.end()
    if joined[position:]:
        image.faults.append(f"{joined[position:][:20]!r} after the last command")
    image.finish()
    image.faults += _signature_faults(joined)
    return GerberContent(
        image.file_attributes,
        tuple(image.regions),
        tuple(image.flashes),
        tuple(image.tracks),
        tuple(image.faults),
        tuple(image.strokes),
    )


def _signature_faults(joined: str) -> list[str]:
    """The signature is over everything before its own command, line ends left out, and stands before the end."""
    start = joined.rfind("%TF.MD5,")
    end = _SIGNED_END.fullmatch(joined, start) if start >= 0 else None
    if end is None:
        return ["no signature .MD5 right before the end M02"]
    digest = hashlib.md5(joined[:start].encode("ascii", "replace"), usedforsecurity=False).hexdigest()
    return [] if digest == end[1] else [f".MD5 {end[1]}, expected {digest}: the file was changed"]


class _Image:
    """The state of the image while its commands are taken one by one, and the objects so far."""

    def __init__(self) -> None:
        self.file_attributes: dict[str, Fields] = {}
        self.regions: list[Region] = []
        self.flashes: list[Flash] = []
        self.tracks: list[Track] = []
        self.strokes: list[Stroke] = []
        self.faults: list[str] = []
        self._attributes: dict[str, Fields] = {}
        self._macros: dict[str | None, tuple[float, ...]] = {}
        self._apertures: dict[int, tuple[Aperture, str]] = {}
        self._aperture: tuple[Aperture, str] | None = None
        self._scale: float | None = None
        self._format = ""
        self._at: _Place | None = None
        self._start: _Place | None = None
        self._steps: list[_Step] = []
        self._mode = ""
        self._multi_quadrant = False
        self._in_region = False
        self._contours = 0
        self._ended = False
        self._words: dict[str, Callable[[], None]] = {"G36": self._open_region, "G37": self._close_region}

    def take(self, extended: str | None, word: str | None) -> None:
        """Take one command: the inside of a pair of percent signs, or a `word` without its asterisk."""
        if self._ended:
            self.faults.append(f"{extended or word} after the end M02")
        elif extended is not None:
            self._extended(extended)
        else:
            self._word(word or "")

    def finish(self) -> None:
        """Close what is open at the end of the file."""
        if self._in_region:
            self.faults.append("a region that is not closed by G37")
        self._end_contour()
        if not self._ended:
            self.faults.append("no end M02: the file is cut off")

    def _word(self, word: str) -> None:
        if word.startswith("G04"):
            return
        if word == "M02":
            self._ended = True
        elif word in ("G01", "G02", "G03"):
            self._mode = word
        elif word == "G75":
            self._multi_quadrant = True
        elif word in self._words:
            self._words[word]()
        elif match := _SELECT.fullmatch(word):
            self._select(int(match[1]))
        elif match := _OPERATION.fullmatch(word):
            self._operate(match)
        else:
            self.faults.append(f"command {word!r}, which these files do not use")

    def _extended(self, body: str) -> None:
        command = body.removesuffix("*")
        code = command[:2]
        if not body.endswith("*") or ("*" in command and code != "AM"):
            self.faults.append(f"{body!r}, expected one command between percent signs, ended by an asterisk")
        if self._in_region:
            self.faults.append(f"{command} inside a region")
        if code == "FS":
            self._format = command
            self.faults += [] if command == _FORMAT else [f"coordinate format {command}, expected {_FORMAT}"]
        elif code == "MO":
            self._scale = _INCH if command == "MOIN" else 1.0
            self.faults += [] if command == "MOMM" else [f"units {command}, expected MOMM"]
        elif code in ("TF", "TO", "TA", "TD"):
            self._attribute(code, command[2:])
        elif code == "AM":
            self._macro(command)
        elif code == "AD":
            self._define(command)
        elif command != "LPD":
            self.faults.append(f"command {command}, which these files do not use")

    def _attribute(self, code: str, text: str) -> None:
        name, fields = attribute_fields(text)
        if code == "TF":
            if name in self.file_attributes:
                self.faults.append(f"file attribute {name} given twice")
            self.file_attributes[name] = fields
        elif code == "TD":
            for each in [name] if name else [*self._attributes]:
                self._attributes.pop(each, None)
        else:
            self._attributes[name] = fields

    def _macro(self, command: str) -> None:
        """A macro of one outline: its corners, the last of them the first again."""
        match = _MACRO.fullmatch(command)
        values = [] if match is None else match[3].split(",")
        if (
            match is None
            or len(values) != 2 * int(match[2]) + 2
            or values[:2] != values[-2:]
            or len(values) < 2 * _FEWEST_CORNERS + 2
        ):
            self.faults.append(f"macro {command[:20]!r}, expected one closed outline")
        else:
            self._macros[match[1]] = self._lengths(values[:-2])

    def _define(self, command: str) -> None:
        match = _APERTURE.fullmatch(command)
        number, kind, *sizes, macro = ("0", None, None, None, None) if match is None else match.groups()
        given = [size for size in sizes if size is not None]
        if int(number) in self._apertures:
            self.faults.append(f"aperture {number} defined twice")
        if kind and len(given) == _SIZES[kind]:
            aperture = Aperture(kind, self._lengths(given))
        elif macro in self._macros:
            aperture = Aperture("P", self._macros[macro])
        else:
            self.faults.append(f"aperture {command}, expected a circle, a rectangle or a defined macro")
            return
        self._apertures[int(number)] = aperture, self._function()

    def _lengths(self, numbers: list[str]) -> tuple[float, ...]:
        return tuple(round(float(number) * 1e6) * GRID * (self._scale or 1.0) for number in numbers)

    def _function(self) -> str:
        return ",".join(self._attributes.get(".AperFunction", ()))

    def _select(self, number: int) -> None:
        self._end_contour()
        self._aperture = self._apertures.get(number)
        if self._aperture is None:
            self.faults.append(f"aperture {number}, which is not defined")

    def _open_region(self) -> None:
        self._end_contour()
        self.faults += ["G36 inside a region"] if self._in_region else []
        self._in_region, self._contours = True, 0

    def _close_region(self) -> None:
        if not self._in_region:
            self.faults.append("G37 without G36")
        self._end_contour()
        if self._contours != 1:
            self.faults.append(f"a region of {self._contours} contours, expected one")
        self._in_region = False

    def _operate(self, match: re.Match[str]) -> None:
        x, y, i, j, operation = match.groups()
        if x is None or y is None:
            self.faults.append(f"{match[0]}: a coordinate left out")
            return
        if self._scale is None or not self._format:
            self.faults.append(f"{match[0]} before units and coordinate format")
        place = int(x), int(y)
        if operation == "1":
            self._draw(place, None if i is None else (int(i), int(j)))
        else:
            self._end_contour()
            if operation == "3":
                self._flash(place)
        self._at = place

    def _flash(self, place: _Place) -> None:
        if self._in_region:
            self.faults.append(f"a flash inside a region at {self._shown(place)}")
        elif self._aperture is None:
            self.faults.append(f"a flash without aperture at {self._shown(place)}")
        else:
            aperture, function = self._aperture
            self.flashes.append(Flash(self._point(place), aperture, self._tags(function)))

    def _draw(self, place: _Place, offset: _Place | None) -> None:
        if self._at is None:
            self.faults.append(f"a draw to {self._shown(place)} from nowhere")
            return
        if place == self._at:
            self.faults.append(f"a draw of no length at {self._shown(place)}")
            return
        if self._start is None:
            self._start = self._at
        self._steps.append((place, self._bulge(self._at, place, offset)))

    def _bulge(self, start: _Place, end: _Place, offset: _Place | None) -> float:
        """Bulge of the edge from `start` to `end` in the present mode, tan of a quarter of the angle."""
        if self._mode == "G01" and offset is None:
            return 0.0
        where = f"the edge from {self._shown(start)} to {self._shown(end)}"
        if self._mode not in ("G02", "G03") or offset is None:
            self.faults.append(f"{where}: {'a centre' if offset else 'no centre'} in mode {self._mode or 'unset'}")
            return 0.0
        if not self._multi_quadrant:
            self.faults.append(f"{where}: an arc before G75")
        ax, ay = -offset[0], -offset[1]
        bx, by = end[0] - start[0] + ax, end[1] - start[1] + ay
        radius, other = math.hypot(ax, ay), math.hypot(bx, by)
        if abs(radius - other) > RADIUS_SLACK:
            self.faults.append(f"{where}: radii of {radius:.1f} and {other:.1f} nm, expected the same")
        turn = math.atan2(ax * by - ay * bx, ax * bx + ay * by)
        turn = turn % math.tau if self._mode == "G03" else -(-turn % math.tau)
        if abs(turn) > math.pi + 2.0 * RADIUS_SLACK / max(radius, 1.0):
            self.faults.append(f"{where}: an arc of {math.degrees(abs(turn)):.1f} degrees, expected at most 180")
        return math.tan(0.25 * turn)

    def _end_contour(self) -> None:
        """Make a region, a track or a stroke of the edges drawn since the last move; name it when it is open."""
        start, steps = self._start, self._steps
        self._start, self._steps = None, []
        if start is None:
            return
        self._contours += 1
        if len(steps) == 1 and steps[0][1] == 0.0 and not self._in_region and self._aperture is not None:
            aperture, function = self._aperture
            ends = self._point(start), self._point(steps[0][0])
            self.strokes.append(Stroke(*ends, aperture, self._tags(function)))
        elif steps[-1][0] != start:
            self.faults.append(f"an open contour from {self._shown(start)} to {self._shown(steps[-1][0])}")
        elif len(steps) < _FEWEST_CORNERS and not any(bulge for _, bulge in steps):
            self.faults.append(f"a contour without area at {self._shown(start)}")
        else:
            self._put_down(start, steps)

    def _put_down(self, start: _Place, steps: list[_Step]) -> None:
        """Make a region or a track of a closed contour."""
        corners = [start, *(place for place, _ in steps[:-1])]
        rows = [(*self._point(corner), bulge) for corner, (_, bulge) in zip(corners, steps, strict=True)]
        outline = Outline(np.array(rows))
        if self._in_region:
            self.regions.append(Region(outline, self._tags(self._function())))
        elif self._aperture is None:
            self.faults.append(f"a line without aperture from {self._shown(start)}")
        else:
            aperture, function = self._aperture
            self.tracks.append(Track(outline, aperture, self._tags(function)))

    def _tags(self, function: str) -> Tags:
        given = self._attributes
        component, pin = (*given.get(".P", ()), *given.get(".C", ()), "", "")[:2]
        net = (*given.get(".N", ()), "")[0]
        return Tags(function, net, component, pin)

    def _point(self, place: _Place) -> tuple[float, float]:
        scale = self._scale or 1.0
        return place[0] * GRID * scale, place[1] * GRID * scale

    def _shown(self, place: _Place) -> str:
        x, y = self._point(place)
        return f"({1e3 * x:.6f}, {1e3 * y:.6f}) mm"

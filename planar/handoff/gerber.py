"""Layer files for the fab in the Gerber layer format, revision 2023.08, with its X2 attributes.

The subset every reader understands: millimetres in whole nanometres, regions of one contour with true arcs, circles,
rectangles and polygons to flash, dark polarity throughout. End points are rounded to the grid first and the centre of
an arc after them, so that its two radii differ by less than two nanometres. Bytes depend on layout and facts alone.
"""

from __future__ import annotations

import hashlib
import itertools
import math
from collections.abc import Iterable, Iterator
from pathlib import Path

from planar.copper.arc import Edge, Point
from planar.copper.layout import Layout
from planar.copper.outline import GRID, Outline
from planar.errors import HandoffError
from planar.handoff.gerber_attributes import attribute_text
from planar.handoff.gerber_content import (
    Aperture,
    GerberContent,
    GerberFacts,
    GerberFile,
    Tags,
    gerber_content,
    gerber_files,
)

LARGEST_RADIUS = 5.0
"""m; flatter arcs are drawn as chords no further than the grid from them: the format ends at ten metres."""
_LARGEST = 9_999_999_999
"""Largest coordinate of four integer and six decimal digits, in nanometres."""
_FIRST_APERTURE = 10

_Place = tuple[int, int]


def write_gerber_files(layout: Layout, folder: Path, *, facts: GerberFacts) -> tuple[GerberFile, ...]:
    """Write every layer file of a snapped `layout` into `folder` and return which they are.

    Raises `HandoffError` when the format cannot hold the layout.
    """
    files = gerber_files(layout, facts)
    for file in files:
        write_gerber(layout, file, folder / file.name, facts=facts)
    return files


def write_gerber(layout: Layout, file: GerberFile, path: Path, *, facts: GerberFacts) -> None:
    """Write what `file` holds of a snapped `layout`. The same layout and facts give the same bytes.

    Raises `HandoffError` when the format cannot hold the layout.
    """
    path.write_bytes(gerber_text(gerber_content(layout, file, facts)).encode("ascii"))


def gerber_text(content: GerberContent) -> str:
    """`content` as the text of a file, signed. Raises `HandoffError` when it lies beyond the format's ten metres."""
    apertures = _numbered(content)
    lines = [
        *(_command("TF", name, *fields) for name, fields in content.attributes.items()),
        "%FSLAX46Y46*%",
        "%MOMM*%",
        *(line for key, number in apertures.items() for line in _definition(*key, number)),
        "G75*",
        "%LPD*%",
        *_objects(content, apertures),
    ]
    digest = hashlib.md5("".join(lines).encode("ascii"), usedforsecurity=False).hexdigest()
    return "\n".join([*lines, _command("TF", ".MD5", digest), "M02*", ""])


def _command(code: str, name: str, *fields: str) -> str:
    return f"%{code}{attribute_text(name, fields)}*%"


def _numbered(content: GerberContent) -> dict[tuple[Aperture, str], int]:
    """Apertures and their functions with their numbers, in the order of use."""
    drawn = [(track.aperture, track.tags.function) for track in content.tracks]
    drawn += [(stroke.aperture, stroke.tags.function) for stroke in content.strokes]
    flashed = [(flash.aperture, flash.tags.function) for flash in content.flashes]
    used = dict.fromkeys([*drawn, *flashed])
    return {key: number for number, key in enumerate(used, start=_FIRST_APERTURE)}


def _definition(aperture: Aperture, function: str, number: int) -> list[str]:
    sizes = [_mm(size) for size in aperture.size]
    if aperture.kind == "P":  # a macro of one outline, which ends where it starts
        macro = [f"%AMLAND{number}*4,1,{len(sizes) // 2},{','.join([*sizes, *sizes[:2]])},0*%"]
        definition = f"%ADD{number}LAND{number}*%"
    else:
        macro, definition = [], f"%ADD{number}{aperture.kind},{'X'.join(sizes)}*%"
    return [*macro, *_set("TA", ".AperFunction", function), definition, "%TD.AperFunction*%"]


def _set(code: str, name: str, text: str) -> list[str]:
    """The command that sets an attribute of comma-separated fields."""
    return [_command(code, name, *text.split(","))]


def _objects(content: GerberContent, apertures: dict[tuple[Aperture, str], int]) -> Iterator[str]:
    for region in content.regions:
        yield from _tagged(region.tags, ["G36*", *_contour(region.outline), "G37*"], in_region=True)
    for track in content.tracks:
        yield f"D{apertures[track.aperture, track.tags.function]}*"
        yield from _tagged(track.tags, _contour(track.outline))
    for stroke in content.strokes:
        yield f"D{apertures[stroke.aperture, stroke.tags.function]}*"
        ends = [_at(_place(end)) for end in (stroke.start, stroke.end)]
        yield from _tagged(stroke.tags, [f"{ends[0]}D02*", "G01*", f"{ends[1]}D01*"])
    selected = 0
    for flash in content.flashes:
        number = apertures[flash.aperture, flash.tags.function]
        if number != selected:
            yield f"D{number}*"
            selected = number
        yield from _tagged(flash.tags, [f"{_at(_place(flash.centre))}D03*"])


def _tagged(tags: Tags, lines: Iterable[str], *, in_region: bool = False) -> Iterator[str]:
    """`lines` between the commands that set the object's attributes and take them away again.

    A region has no aperture: its function comes from the dictionary.
    """
    names = [".AperFunction"] if in_region and tags.function else []
    if names:
        yield from _set("TA", ".AperFunction", tags.function)
    for name, fields in _object_attributes(tags).items():
        names.append(name)
        yield _command("TO", name, *fields)
    yield from lines
    yield from (f"%TD{name}*%" for name in names)


def _object_attributes(tags: Tags) -> dict[str, tuple[str, ...]]:
    found: dict[str, tuple[str, ...]] = {}
    if tags.net:
        found[".N"] = (tags.net,)
    if tags.pin:
        found[".P"] = (tags.component, tags.pin)
    elif tags.component:
        found[".C"] = (tags.component,)
    return found


def _contour(outline: Outline) -> Iterator[str]:
    """A move to the start of `outline` and the draws round it, which end exactly there."""
    pieces = [piece for edge in outline.edges for piece in _pieces(edge) if _place(piece.start) != _place(piece.end)]
    yield f"{_at(_place(pieces[0].start))}D02*"
    mode = ""
    for piece in pieces:
        start, end = _place(piece.start), _place(piece.end)
        turn = "G01*" if piece.bulge == 0.0 else "G03*" if piece.bulge > 0.0 else "G02*"
        if turn != mode:
            yield turn
            mode = turn
        yield f"{_at(end)}{_centre(start, end, piece.bulge)}D01*"


def _pieces(edge: Edge) -> list[Edge]:
    """`edge` in pieces the format can hold: no arc above half a circle, chords instead of the flattest arcs."""
    if edge.bulge == 0.0:
        return [edge]
    if edge.radius > LARGEST_RADIUS:
        rise = 0.5 * abs(edge.bulge) * edge.chord
        count = math.ceil(math.sqrt(rise / GRID))  # the rise of a chord falls with the square of their number
        points = [edge.point(i / count) for i in range(count + 1)]
        return [Edge(a, b) for a, b in itertools.pairwise(points)]
    return [edge.part(0.0, 0.5), edge.part(0.5, 1.0)] if abs(edge.bulge) > 1.0 else [edge]


def _centre(start: _Place, end: _Place, bulge: float) -> str:
    """Offset of an arc's centre from its `start`, "" for a segment; from the rounded ends, so that radii agree."""
    if bulge == 0.0:
        return ""
    x, y = Edge((0.0, 0.0), (end[0] - start[0], end[1] - start[1]), bulge).centre
    return f"I{_held(round(x))}J{_held(round(y))}"


def _place(point: Point) -> _Place:
    """`point` in whole nanometres."""
    return round(point[0] / GRID), round(point[1] / GRID)


def _at(place: _Place) -> str:
    return f"X{_held(place[0])}Y{_held(place[1])}"


def _held(number: int) -> int:
    if abs(number) > _LARGEST:
        raise HandoffError(f"a coordinate of {number * GRID:.3f} m, the format ends at 10 m")
    return number


def _mm(length: float) -> str:
    """A length in mm to the nanometre, without trailing zeros."""
    return f"{round(length * 1e3, 6) + 0.0:.6f}".rstrip("0").rstrip(".")  # + 0.0 makes minus zero zero

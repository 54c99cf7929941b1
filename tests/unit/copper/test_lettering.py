"""Letters drawn as strokes: their size, place and legibility as far as shapes can tell.

Authority: what the docstring promises (height, centre, mirror image), measured with shapely.
"""

from __future__ import annotations

import string

import pytest
from shapely import symmetric_difference
from shapely.affinity import scale
from shapely.geometry import MultiPolygon, Polygon
from shapely.ops import unary_union

from planar.copper.lettering import lettered, text_width

MM = 1e-3
PRINTED = string.ascii_uppercase + string.digits + "-+.:/_=(),?"


def written(text: str, *, mirrored: bool = False) -> Polygon | MultiPolygon:
    strokes = lettered(text, (3 * MM, -2 * MM), 2 * MM, stroke=0.2 * MM, mirrored=mirrored)
    return unary_union([stroke.shape() for stroke in strokes])


def test_text_is_as_tall_and_wide_as_asked_and_centred() -> None:
    """H reaches every corner of its cell."""
    x0, y0, x1, y1 = written("HELLH").bounds
    assert y1 - y0 == pytest.approx(2 * MM, abs=1e-6)
    assert x1 - x0 == pytest.approx(text_width("HELLH", 2 * MM, stroke=0.2 * MM), abs=1e-6)
    assert (0.5 * (x0 + x1), 0.5 * (y0 + y1)) == pytest.approx((3 * MM, -2 * MM), abs=1e-6)


def test_mirrored_text_is_the_mirror_image() -> None:
    image = scale(written("F7K"), -1.0, 1.0, origin=(3 * MM, -2 * MM))
    assert symmetric_difference(image, written("F7K", mirrored=True), grid_size=1e-10).area < 1e-6 * image.length


@pytest.mark.parametrize("letter", PRINTED)
def test_letters_differ_from_each_other(letter: str) -> None:
    """Any two differ by at least the area of half a cell unit of stroke."""
    shape = written(letter)
    for other in PRINTED:
        if other != letter:
            assert shape.symmetric_difference(written(other)).area > 0.15 * MM * 0.2 * MM


def test_small_letters_are_capitals_and_unknown_ones_question_marks() -> None:
    assert written("abc").equals(written("ABC"))
    assert written("ä").equals(written("?"))


def test_a_blank_has_no_strokes_but_a_width() -> None:
    assert lettered(" ", (0.0, 0.0), 2 * MM, stroke=0.2 * MM) == []
    widths = [text_width(t, 2 * MM, stroke=0.2 * MM) for t in ("AB", "A B")]
    assert widths[1] - widths[0] == pytest.approx(1.8 * MM, rel=1e-12)

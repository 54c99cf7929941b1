"""Order, totals and the view from each copper level.

Authorities: addition of thicknesses; Gerber job format (board thickness includes copper and excludes mask);
Djordjevic et al. 2001 for the permittivity of the dielectric (value computed separately).
"""

import dataclasses

import pytest

from planar.errors import GeometryError, RangeError, SynthesisError
from planar.library import Library, inline_laminate
from planar.stackup import BoardChoice, CoverChoice, LayerKind, Stackup, Surroundings, build_stackup

LIBRARY = Library.open()
POOL = LIBRARY.fab("pool-two-layer")
MILLED = LIBRARY.fab("milled-single-sided")
FR4 = inline_laminate(4.4, 0.02, at=1e9)
BOARD = BoardChoice(FR4, 1.6e-3, 35e-6, levels=2, mask="both")
ABS = LIBRARY.cover("abs")
BOXED = Surroundings(CoverChoice(ABS, 6e-3, 2.5e-3), reflector=40e-3)


def boxed() -> Stackup:
    return build_stackup(BOARD, POOL, surroundings=BOXED)


def test_layers_lie_bottom_to_top() -> None:
    assert [layer.name for layer in boxed().layers] == [
        "reflector",
        "reflector-gap",
        "legend-bottom",
        "mask-bottom",
        "copper-bottom",
        "dielectric",
        "copper-top",
        "mask-top",
        "legend-top",
        "cover-gap",
        "cover",
    ]
    assert boxed().levels == ("bottom", "top")


def test_totals() -> None:
    """1.6 mm dielectric, twice 35 um foil with 20 um plating, twice 25 um mask; cover and reflector do not count."""
    stackup = boxed()
    assert stackup.base_copper == 35e-6
    assert stackup.finished_copper == pytest.approx(55e-6, rel=1e-12)
    assert stackup.total_thickness == pytest.approx(1.71e-3, rel=1e-12)
    assert stackup.masked_thickness == pytest.approx(1.76e-3, rel=1e-12)
    assert stackup.substrate.thickness == 1.6e-3


def test_view_from_the_top_level() -> None:
    stackup = boxed()
    above, below = stackup.dielectrics_above("top", 2.45e9), stackup.dielectrics_below("top", 2.45e9)
    assert [slab.thickness for slab in above.slabs] == pytest.approx([25e-6, 6e-3, 2.5e-3])
    assert not above.metal_backed
    assert [slab.thickness for slab in below.slabs] == pytest.approx([1.6e-3, 25e-6, 40e-3])
    assert below.metal_backed
    assert below.slabs[0].eps_r.real == pytest.approx(4.34977, abs=5e-6)
    assert -below.slabs[0].eps_r.imag / below.slabs[0].eps_r.real == pytest.approx(0.020212, abs=5e-7)
    assert below.slabs[2].eps_r == above.slabs[1].eps_r == 1.0


def test_view_from_the_bottom_level_is_the_rest() -> None:
    stackup = boxed()
    above, below = stackup.dielectrics_above("bottom", 1e9), stackup.dielectrics_below("bottom", 1e9)
    assert [slab.thickness for slab in above.slabs] == pytest.approx([1.6e-3, 25e-6, 6e-3, 2.5e-3])
    assert [slab.thickness for slab in below.slabs] == pytest.approx([25e-6, 40e-3])
    assert above.slabs[0].eps_r == pytest.approx(4.4 - 0.088j, rel=1e-12)
    assert below.slabs[0].eps_r.real == pytest.approx(POOL.mask_eps_r, rel=1e-12)


def test_bare_single_level_board() -> None:
    stackup = build_stackup(dataclasses.replace(BOARD, levels=1, mask="none"), MILLED)
    assert [layer.name for layer in stackup.layers] == ["dielectric", "copper-top"]
    assert stackup.levels == ("top",)
    assert stackup.finished_copper == 35e-6
    assert stackup.total_thickness == stackup.masked_thickness == pytest.approx(1.635e-3, rel=1e-12)
    assert stackup.dielectrics_above("top", 1e9).slabs == ()
    with pytest.raises(GeometryError, match="there are: top"):
        stackup.dielectrics_below("bottom", 1e9)


@pytest.mark.parametrize(("mask", "names"), [("top", ["mask-top"]), ("bottom", ["mask-bottom"]), ("none", [])])
def test_mask_lies_where_it_was_asked_for(mask: str, names: list[str]) -> None:
    stackup = build_stackup(dataclasses.replace(BOARD, mask=mask), POOL)
    assert [layer.name for layer in stackup.layers if layer.kind is LayerKind.MASK] == names


def test_cover_that_touches_leaves_no_air() -> None:
    stackup = build_stackup(BOARD, POOL, surroundings=Surroundings(CoverChoice(ABS, 0.0, 2e-3)))
    assert stackup.find("cover-gap") is None
    assert [slab.thickness for slab in stackup.dielectrics_above("top", 1e9).slabs] == pytest.approx([25e-6, 2e-3])


def test_tolerances_come_along() -> None:
    layers = {layer.name: layer for layer in boxed().layers}
    assert layers["dielectric"].eps_r_tolerance == FR4.eps_r_tolerance
    assert layers["cover"].eps_r_tolerance == ABS.eps_r_tolerance
    assert layers["mask-top"].thickness_tolerance == POOL.mask_thickness_tolerance
    assert boxed().board_tolerance == POOL.thickness_tolerance


def test_all_reasons_against_a_stackup_at_once() -> None:
    board = BoardChoice(FR4, -1.6e-3, 0.0, levels=2, mask="both")
    around = Surroundings(CoverChoice(ABS, -1e-3, 0.0), reflector=0.0)
    with pytest.raises(SynthesisError) as caught:
        build_stackup(board, MILLED, surroundings=around)
    assert [finding.rule for finding in caught.value.findings] == [
        "copper levels",
        "mask",
        "board thickness",
        "base copper",
        "cover thickness",
        "reflector distance",
        "cover air gap",
    ]


def test_unknown_mask_is_refused() -> None:
    with pytest.raises(SynthesisError, match="one of none, top, bottom, both"):
        build_stackup(dataclasses.replace(BOARD, mask="left"), POOL)


def test_metal_has_no_permittivity_and_models_keep_their_range() -> None:
    stackup = boxed()
    copper = stackup.find("copper-top")
    assert copper is not None
    with pytest.raises(GeometryError, match="copper-top"):
        copper.permittivity(1e9)
    with pytest.raises(RangeError):
        stackup.dielectrics_below("top", 10.0)

"""What the library hands out: laminates, fabs, connectors and covers as frozen records in SI units.

Every record carries `sources`: the words that stand beside each value in its file. A tolerance is a fraction, one
sided (0.05 means 5 % either way). Nothing here reads files.
"""

from __future__ import annotations

from dataclasses import dataclass

from planar.library.dispersion import WidebandDebye

Sources = tuple[tuple[str, str], ...]
"""(key, source) pairs in the order of the file."""


@dataclass(frozen=True)
class Laminate:
    """A class of board material with its copper foil.

    `copper_sides` is 2 unless it is sold with copper on one side only. `eps_r` and `tan_d` hold at the
    frequency `at` (Hz). `thicknesses` (m) and `base_coppers` (m) are the usual
    ones; empty means that none are listed. `roughness_rq` is the rms roughness of the foil (m), `conductivity` its
    bulk conductivity (S/m).
    """

    key: str
    title: str
    material_class: str
    specification: str | None
    copper_sides: int
    eps_r: float
    eps_r_tolerance: float
    tan_d: float
    tan_d_tolerance: float
    at: float
    thicknesses: tuple[float, ...]
    thickness_tolerance: float
    base_coppers: tuple[float, ...]
    base_copper_tolerance: float
    roughness_rq: float
    roughness_tolerance: float
    conductivity: float
    sources: Sources

    @property
    def model(self) -> WidebandDebye:
        """Complex permittivity against frequency."""
        return WidebandDebye.from_point(self.eps_r, self.tan_d, at=self.at)


@dataclass(frozen=True)
class Cover:
    """A plastic the housing may be made of; `eps_r` and `tan_d` hold at the frequency `at` (Hz)."""

    key: str
    title: str
    eps_r: float
    eps_r_tolerance: float
    tan_d: float
    tan_d_tolerance: float
    at: float
    sources: Sources

    @property
    def model(self) -> WidebandDebye:
        """Complex permittivity against frequency."""
        return WidebandDebye.from_point(self.eps_r, self.tan_d, at=self.at)


@dataclass(frozen=True)
class Panelling:
    """How a board maker joins boards in a panel. Lengths in m, holes are finished diameters.

    `score` says whether boards can be scored apart; `score_web` is then the part of the thickness left between the
    two cuts, `score_least_thickness` the thinnest board that can be scored, `score_least_panel` the smallest panel
    (x, y) the scoring line takes; all are 0 where nothing is scored. A tab is `tab_width` at its narrowest and there
    is at least one on each `tab_stretch` of a side. `perforation_count` holes stand on each break line, none where it
    is 0; `perforation_wall` is the least board between two of them and between one and the slot.
    """

    rail_width: float
    tooling_hole: float
    fiducial: float
    fiducial_opening: float
    score: bool
    score_web: float
    score_least_thickness: float
    score_least_panel: tuple[float, float]
    tab_width: float
    tab_stretch: float
    perforation_count: int
    perforation_hole: float
    perforation_pitch: float
    perforation_wall: float


@dataclass(frozen=True)
class Fab:
    """What a board maker can do. Lengths in m, holes are finished diameters.

    `levels` is the highest number of copper levels; `plating` the copper added on outer levels; `etch_tolerance`
    holds per conductor edge. Sizes are (x, y). Without mask (`mask` false) its thickness is 0 and its permittivity
    that of air; without legend its stroke is 0. `impedance_tolerance` is None where no controlled impedance is
    offered, `panelling` where the file does not say how boards are joined in a panel.
    """

    key: str
    title: str
    levels: int
    min_track: float
    min_gap: float
    min_hole: float
    max_hole: float
    hole_tolerance: float
    plated_holes: bool
    min_annular_ring: float
    hole_to_edge: float
    copper_to_routed_edge: float
    copper_to_score: float
    open_frame_web: float
    edge_radius: float
    etch_tolerance: float
    outline_tolerance: float
    thickness_tolerance: float
    impedance_tolerance: float | None
    plating: float
    max_board: tuple[float, float]
    panel: tuple[float, float]
    panel_border: float
    price_step: tuple[float, float]
    mask: bool
    mask_thickness: float
    mask_thickness_tolerance: float
    mask_eps_r: float
    mask_tan_d: float
    mask_at: float
    mask_expansion: float
    mask_web: float
    legend: bool
    legend_min_stroke: float
    finishes: tuple[str, ...]
    panelling: Panelling | None
    sources: Sources

    @property
    def mask_model(self) -> WidebandDebye:
        """Complex permittivity of the solder mask against frequency."""
        return WidebandDebye.from_point(self.mask_eps_r, self.mask_tan_d, at=self.mask_at)


@dataclass(frozen=True)
class LandPad:
    """A pad of a land pattern: `net` "signal" or "ground", `level` "top" or "bottom", `shape` "rectangle" or "round".

    `centre` (x, y) and `size` (along x, along y) in m.
    """

    name: str
    net: str
    level: str
    shape: str
    centre: tuple[float, float]
    size: tuple[float, float]


@dataclass(frozen=True)
class LandHole:
    """A hole of a land pattern: finished `diameter` in m, `purpose` "via" or "mount", `net` None where unplated."""

    centre: tuple[float, float]
    diameter: float
    plated: bool
    net: str | None
    purpose: str


@dataclass(frozen=True)
class Body:
    """Rectangle over connector and cable, to be kept free of other parts: `centre` (x, y), `size` (x, y) in m."""

    centre: tuple[float, float]
    size: tuple[float, float]


@dataclass(frozen=True)
class GroundTab:
    """Bottom ground area under a connector: x from -`length` to 0, y from -`half_width` to `half_width`, in m."""

    half_width: float
    length: float


@dataclass(frozen=True)
class Connector:
    """How the line meets the outside, as a land pattern on the top level.

    The origin is where the printed line starts, +x points into the board toward the antenna, +y to its left.
    `edge_distance` is the distance (m) from the origin to the board edge in -x, None if it may sit anywhere.
    `board_thickness` is the range (m) of boards the part fits, None if any. `impedance` in ohm, None where the
    antenna itself sets it.
    """

    key: str
    title: str
    balanced: bool
    impedance: float | None
    edge_distance: float | None
    board_thickness: tuple[float, float] | None
    pads: tuple[LandPad, ...]
    holes: tuple[LandHole, ...]
    body: Body | None
    ground_tab: GroundTab | None
    sources: Sources

    @property
    def reach(self) -> float:
        """Width of the land pattern across the line, m; 0 without lands."""
        return max((2.0 * (abs(pad.centre[1]) + 0.5 * pad.size[1]) for pad in self.pads), default=0.0)

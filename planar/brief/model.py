"""The brief: what the user asks for, validated, in SI.

Each table of the TOML file is one frozen record. Building a record from texts reads the units and
checks the ranges; its attributes are SI numbers. Checks that need two keys run on the later key,
so that one wrong key hides none of the others' faults. `examples` of a field are what a message
about a missing key shows.
"""

from __future__ import annotations

from collections.abc import Mapping
from typing import Annotated, Any, Literal

from pydantic import (
    AfterValidator,
    BaseModel,
    ConfigDict,
    Discriminator,
    Field,
    StrictBool,
    StrictInt,
    Tag,
    ValidationInfo,
    field_validator,
)

from planar.brief.measures import LibraryKey, Measure, Number, check_dimension_name, check_name
from planar.units import SPEED_OF_LIGHT, show

FAMILIES_WITH_END = ("ring-guided",)
"""Families whose line runs past the gap and ends in a via or open."""
WIDEST_BAND = 2.0
"""Highest over lowest frequency of a band: above an octave one resonant loop is no answer."""
BY_KEY = "(by key)"
INLINE = "(inline)"

Frequency = Annotated[float, Measure("frequency", 10e6, 30e9, "loops are designed from {low} to {high}")]
DataFrequency = Annotated[float, Measure("frequency", 1e3, 100e9, "laminate data stand between {low} and {high}")]
Impedance = Annotated[float, Measure("impedance", 10.0, 600.0, "a port has {low} to {high}")]
Match = Annotated[float, Measure("decibel", -40.0, -1.0, "reflection is negative, from {low} to {high}")]
Power = Annotated[float, Measure("power", 1e-6, 1e3, "the power is {low} to {high}")]
BoardThickness = Annotated[float, Measure("length", 0.05e-3, 6.5e-3, "boards are {low} to {high} thick")]
CopperThickness = Annotated[float, Measure("length", 5e-6, 210e-6, "copper is {low} to {high} thick")]
BoardSize = Annotated[float, Measure("length", 5e-3, 3.0, "a board measures {low} to {high}")]
TraceWidth = Annotated[float, Measure("length", 0.02e-3, 0.1, "a trace is {low} to {high} wide")]
CornerRadius = Annotated[float, Measure("length", 0.0, 1.0, "a corner radius is {low} to {high}")]
Dimension = Annotated[float, Measure("length", 1e-6, 10.0, "a dimension is {low} to 10 m")]
CoverThickness = Annotated[float, Measure("length", 0.01e-3, 0.1, "a cover is {low} to {high} thick")]
AirGap = Annotated[float, Measure("length", 0.0, 1.0, "an air gap is {low} to {high}")]
Distance = Annotated[float, Measure("length", 0.1e-3, 30.0, "a reflector stands {low} to 30 m away")]
Permittivity = Annotated[float, Number(1.0, 20.0, "a relative permittivity is {low} to {high}")]
LossTangent = Annotated[float, Number(0.0, 0.2, "a loss tangent is {low} to {high}")]
AspectRatio = Annotated[float, Number(1.0, 3.0, "the longer side over the shorter is {low} to {high}")]
DimensionName = Annotated[str, AfterValidator(check_dimension_name)]


class ElsewhereError(ValueError):
    """A fault found on one key that lies in another, `path`."""

    def __init__(self, path: tuple[str, ...], expected: str) -> None:
        self.path = path
        super().__init__(expected)


class _Record(BaseModel):
    model_config = ConfigDict(frozen=True, extra="forbid", use_attribute_docstrings=True)


def _by_key_or_inline(value: object) -> str | None:
    """Which of the two ways of naming a material `value` is."""
    if isinstance(value, str):
        return BY_KEY
    return INLINE if isinstance(value, dict | BaseModel) else None


class InlineLaminate(_Record):
    """A laminate by its numbers: relative permittivity and loss tangent at one frequency."""

    eps_r: Permittivity = Field(examples=["eps_r = 3.5"])
    tan_d: LossTangent = Field(examples=["tan_d = 0.0025"])
    at: DataFrequency = Field(examples=['at = "2.5 GHz", the frequency of the two numbers'])
    """Hz."""


class InlineMaterial(_Record):
    """A cover material by its numbers: relative permittivity and loss tangent."""

    eps_r: Permittivity = Field(examples=["eps_r = 2.8"])
    tan_d: LossTangent = Field(examples=["tan_d = 0.01"])


LaminateChoice = Annotated[
    Annotated[str, LibraryKey("laminates"), Tag(BY_KEY)] | Annotated[InlineLaminate, Tag(INLINE)],
    Discriminator(_by_key_or_inline),
]
MaterialChoice = Annotated[
    Annotated[str, LibraryKey("covers"), Tag(BY_KEY)] | Annotated[InlineMaterial, Tag(INLINE)],
    Discriminator(_by_key_or_inline),
]


class Target(_Record):
    """What the antenna must do. Default: linear, 50 ohm, -10 dB, receive only."""

    band: tuple[Frequency, Frequency] = Field(examples=['band = ["863 MHz", "870 MHz"]'])
    """Lowest and highest frequency, Hz."""
    impedance: Impedance = 50.0
    """Of the port, ohm."""
    match_db: Match = Field(default=-10.0, alias="match")
    """Worst reflection allowed over the band, dB (negative)."""
    polarisation: Literal["linear", "circular-right", "circular-left"] = "linear"
    transmit: StrictBool = False
    power: Power | None = Field(default=None, validate_default=True)
    """Transmit power at the port, W; given exactly when `transmit` is true."""

    @field_validator("band")
    @classmethod
    def _band_in_order(cls, band: tuple[float, float]) -> tuple[float, float]:
        low, high = (show(edge, "frequency") for edge in band)
        if band[0] > band[1]:
            raise ValueError(f'the low edge comes first, swap them: ["{high}", "{low}"]')
        if band[0] == band[1]:
            raise ValueError("a band has some width: write its lowest and its highest frequency")
        if band[1] > WIDEST_BAND * band[0]:
            widest = show(WIDEST_BAND * band[0], "frequency")
            raise ValueError(f"at most an octave, from {low} up to {widest}: one loop has one band")
        return band

    @field_validator("power")
    @classmethod
    def _power_when_transmitting(cls, power: float | None, info: ValidationInfo) -> float | None:
        transmit = info.data.get("transmit")
        if transmit is True and power is None:
            raise ValueError('needed with transmit = true, for the exposure figures: power = "25 mW"')
        if transmit is False and power is not None:
            raise ValueError("an antenna that only receives has no power: set transmit = true or leave power out")
        return power


class Antenna(_Record):
    """The loop. Default: a circle; family and dimensions are chosen unless stated."""

    family: Annotated[str, LibraryKey("families")] | None = None
    shape: Literal["circle", "square", "rectangle"] = "circle"
    aspect_ratio: AspectRatio | None = None
    """Longer over shorter side of a rectangle."""
    corner_radius: CornerRadius | None = None
    """m."""
    trace_width: TraceWidth | None = None
    """Of the loop, m."""
    end: Literal["via", "open"] | None = None
    """How the line of a ring-guided loop ends past the gap."""
    trim: StrictBool = False
    """Tabs on the loop to cut off where the built board comes out low; linear polarisation only."""
    dimensions: Mapping[DimensionName, Dimension] = {}
    """Dimensions given outright, not sized: name -> m. The family says which names there are."""

    @field_validator("aspect_ratio")
    @classmethod
    def _aspect_of_rectangle(cls, ratio: float | None, info: ValidationInfo) -> float | None:
        if info.data.get("shape") in {"circle", "square"}:
            raise ValueError(f'only a rectangle has one: write shape = "rectangle" or leave it out ({_shape(info)})')
        return ratio

    @field_validator("corner_radius")
    @classmethod
    def _corners_of_polygon(cls, radius: float | None, info: ValidationInfo) -> float | None:
        if info.data.get("shape") == "circle":
            raise ValueError(f'a circle has no corners: write shape = "square" or leave it out ({_shape(info)})')
        return radius

    @field_validator("end")
    @classmethod
    def _end_of_line(cls, end: str | None, info: ValidationInfo) -> str | None:
        if "family" in info.data and info.data["family"] not in FAMILIES_WITH_END:
            raise ValueError(f'only family = "{FAMILIES_WITH_END[0]}" has a line to end: state it or leave end out')
        return end

    @field_validator("dimensions")
    @classmethod
    def _dimensions_of_a_family(cls, given: Mapping[str, float], info: ValidationInfo) -> Mapping[str, float]:
        if given and "family" in info.data and info.data["family"] is None:
            raise ElsewhereError(
                ("antenna", "family"), 'needed where [antenna.dimensions] are given, for instance "ring-guided"'
            )
        for name in sorted(given):
            if info.data.get(name) is not None:
                raise ElsewhereError(
                    ("antenna", "dimensions", name), f"given twice: leave out this one or antenna.{name}"
                )
        return given


def _shape(info: ValidationInfo) -> str:
    return f'the shape is "{info.data["shape"]}"'


class Board(_Record):
    """The bare board. Default: 35 um copper, solder mask on both sides where the fab prints one."""

    laminate: LaminateChoice = Field(
        examples=['laminate = "fr4-general" or { eps_r = 3.5, tan_d = 0.0025, at = "2.5 GHz" }']
    )
    thickness: BoardThickness = Field(examples=['thickness = "1.6 mm"'])
    """Of the dielectric between the copper planes, m."""
    copper: CopperThickness = 35e-6
    """Base foil, m; the fab's plating comes on top."""
    mask: Literal["none", "top", "bottom", "both"] | None = None
    """Sides under solder mask; left out, what the fab offers: both sides, or none."""
    size_limit: tuple[BoardSize, BoardSize] | None = Field(default=None, examples=['size_limit = ["100 mm", "80 mm"]'])
    """Largest extent in x and y, m."""


class CoverSpec(_Record):
    """A dielectric sheet over the top of the board."""

    material: MaterialChoice = Field(examples=['material = "abs" or { eps_r = 2.8, tan_d = 0.01 }'])
    air_gap: AirGap = Field(examples=['air_gap = "6 mm"'])
    """Between board and cover, m."""
    thickness: CoverThickness = Field(examples=['thickness = "2.5 mm"'])
    """m."""


class Reflector(_Record):
    """A metal plane under the board."""

    distance: Distance = Field(examples=['distance = "40 mm"'])
    """From the bottom of the board, m."""


class Surroundings(_Record):
    """What stands near the board. Default: nothing."""

    cover: CoverSpec | None = Field(
        default=None, examples=['cover = { material = "abs", air_gap = "6 mm", thickness = "2.5 mm" }']
    )
    reflector: Reflector | None = Field(default=None, examples=['reflector = { distance = "40 mm" }'])


class Make(_Record):
    """Who makes it, and how many. Default: five from a two-layer pool, no connector."""

    fab: Annotated[str, LibraryKey("fabs")] = "pool-two-layer"
    connector: Annotated[str, LibraryKey("connectors")] | None = None
    quantity: Annotated[StrictInt, Field(ge=1, le=1_000_000)] = 5


class Brief(_Record):
    """One request for one antenna. Raises pydantic's ValidationError; `read_brief` turns that into plain words."""

    name: Annotated[str, AfterValidator(check_name)] = Field(examples=['name = "orchard-gateway"'])
    target: Target
    antenna: Antenna = Antenna()
    board: Board
    surroundings: Surroundings = Surroundings()
    make: Make = Make()

    @field_validator("antenna")
    @classmethod
    def _trimmed_where_linear(cls, antenna: Antenna, info: ValidationInfo) -> Antenna:
        target: Any = info.data.get("target")
        if antenna.trim and target is not None and target.polarisation != "linear":
            expected = (
                f'only with polarisation = "linear", not "{target.polarisation}": tabs pull the two modes apart and '
                "cutting them upsets the axial ratio; leave trim out"
            )
            raise ElsewhereError(("antenna", "trim"), expected)
        return antenna

    @field_validator("surroundings")
    @classmethod
    def _reflector_within_a_wavelength(cls, surroundings: Surroundings, info: ValidationInfo) -> Surroundings:
        target: Any = info.data.get("target")
        if surroundings.reflector is None or target is None:
            return surroundings
        wavelength = SPEED_OF_LIGHT / target.band[0]
        if surroundings.reflector.distance > wavelength:
            expected = f"within one wavelength ({show(wavelength, 'length', 4)}): leave out a plane further off"
            raise ElsewhereError(("surroundings", "reflector", "distance"), expected)
        return surroundings

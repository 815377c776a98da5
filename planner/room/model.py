"""The room as a person describes it: the schema of ``room.toml``, frozen, in SI units.

Lengths are metres inside. A file with ``units = "ft"`` is converted while it is read (the unit is
handed down as validation context, see `planner.room.files`), and converted back when it is written.
Geometry that cannot be is refused by `planner.room.checks`.
"""

from __future__ import annotations

from typing import Annotated, Any, Literal, Self

import numpy as np
from numpy.typing import NDArray
from pydantic import (
    AfterValidator,
    BaseModel,
    BeforeValidator,
    ConfigDict,
    Field,
    PlainSerializer,
    SerializationInfo,
    ValidationInfo,
    field_validator,
    model_validator,
)

from planner import air as physics
from planner.bands import OCTAVES
from planner.errors import RoomError
from planner.room.lengths import METRES_PER, parse_length

RECTANGLE_WALLS: tuple[str, ...] = ("left", "back", "right", "front")
"""Walls of a rectangular room in the order of its footprint's edges; x = 0 is the front."""


def _length(value: Any, info: ValidationInfo) -> float:
    return parse_length(value, (info.context or {}).get("units", "m"))


def _area(value: Any, info: ValidationInfo) -> Any:
    if isinstance(value, bool) or not isinstance(value, int | float):
        raise RoomError(
            f"{value!r} is not an area", cure="Write a number in square metres or feet."
        )
    return value * METRES_PER[(info.context or {}).get("units", "m")] ** 2


def _length_out(value: float, info: SerializationInfo) -> float:
    return round(value / METRES_PER[(info.context or {}).get("units", "m")], 9)


def _area_out(value: float, info: SerializationInfo) -> float:
    return round(value / METRES_PER[(info.context or {}).get("units", "m")] ** 2, 9)


def _share(value: float) -> float:
    if value > 1:
        raise RoomError(
            f"a share of {value:g} is more than the whole surface",
            cure=f"Write a number from 0 to 1; for {value:g} % write {value / 100:g}.",
        )
    return value


Number = Annotated[float, Field(allow_inf_nan=False)]
Length = Annotated[Number, BeforeValidator(_length), PlainSerializer(_length_out)]
"""A length in metres. [m]"""
Area = Annotated[Number, BeforeValidator(_area), PlainSerializer(_area_out)]
"""An area in square metres. [m²]"""
Share = Annotated[Number, Field(ge=0), AfterValidator(_share)]
"""A part of a whole, 0 to 1. [-]"""
Point = tuple[Length, Length, Length]
"""x, y, z. [m]"""
Identifier = Annotated[str, Field(min_length=1, max_length=80)]
Text = Annotated[str, Field(max_length=500)]


class _Part(BaseModel):
    model_config = ConfigDict(frozen=True, extra="forbid", str_strip_whitespace=True)


class AirState(_Part):
    """The air in the room."""

    temperature_c: Annotated[Number, Field(ge=-20, le=50)] = 20.0
    """[°C]"""
    humidity_percent: Annotated[Number, Field(ge=0, le=100)] = 50.0
    """[%]"""
    pressure_kpa: Annotated[Number, Field(ge=50, le=120)] = physics.REFERENCE_PRESSURE_KPA
    """[kPa]"""


class Shape(_Part):
    """Length and width, or the corners of a footprint; one height."""

    length: Length | None = None
    """Along x, from the front wall to the back. [m]"""
    width: Length | None = None
    """Along y, from the left wall to the right. [m]"""
    footprint: tuple[tuple[Length, Length], ...] | None = None
    """Corners in plan, anticlockwise. [m]"""
    height: Length
    """[m]"""
    uncertainty: Annotated[Length, Field(ge=0)] = 0.01
    """Standard uncertainty of each dimension. [m]"""

    @model_validator(mode="after")
    def _one_way_to_say_it(self) -> Self:
        given = (self.length is not None, self.width is not None, self.footprint is not None)
        if given not in ((True, True, False), (False, False, True)):
            raise RoomError(
                "the shape is neither a rectangle nor a footprint",
                where="[shape]",
                cure="Give length, width and height, or footprint and height.",
            )
        return self


class Surfaces(_Part):
    """Which material each surface is made of."""

    floor: Identifier
    ceiling: Identifier
    walls: Identifier | dict[str, Identifier] | tuple[Identifier, ...]
    """One material for all walls, a table by wall name, or a list in the footprint's order."""


class Opening(_Part):
    """A door, window or other thing with a material of its own set into a surface."""

    wall: Identifier
    kind: Literal["door", "window", "hatch", "vent", "opening"] = "opening"
    material: Identifier
    left: Length
    """From the wall's left end as seen from inside. [m]"""
    bottom: Length = 0.0
    """From the floor. [m]"""
    width: Annotated[Length, Field(gt=0)]
    """[m]"""
    height: Annotated[Length, Field(gt=0)]
    """[m]"""

    @property
    def area(self) -> float:
        """[m²]."""
        return self.width * self.height


class Patch(_Part):
    """Something that already covers part of a surface, by area or as a rectangle."""

    on: Identifier
    material: Identifier
    area: Annotated[Area, Field(gt=0)] | None = None
    """[m²]"""
    left: Length | None = None
    """[m]"""
    bottom: Length | None = None
    """[m]"""
    width: Annotated[Length, Field(gt=0)] | None = None
    """[m]"""
    height: Annotated[Length, Field(gt=0)] | None = None
    """[m]"""

    @model_validator(mode="after")
    def _area_or_rectangle(self) -> Self:
        rectangle = (self.left, self.bottom, self.width, self.height)
        whole = all(value is not None for value in rectangle)
        if (self.area is None) != whole or (not whole and any(v is not None for v in rectangle)):
            raise RoomError(
                "a patch has either an area or a place",
                cure="Give area, or all of left, bottom, width and height.",
            )
        return self

    @property
    def covered(self) -> float:
        """Area it covers. [m²]."""
        if self.area is not None:
            return self.area
        assert self.width is not None
        assert self.height is not None
        return self.width * self.height


class KeepOut(_Part):
    """A rectangle on a surface where nothing may be mounted."""

    on: Identifier
    left: Length
    bottom: Length
    width: Annotated[Length, Field(gt=0)]
    height: Annotated[Length, Field(gt=0)]
    why: Text = ""


class Furnishing(_Part):
    """Things or people standing in the room, as absorption area per item."""

    item: Identifier
    count: Annotated[int, Field(ge=1, le=10_000)] = 1
    volume: Annotated[Number, Field(ge=0)] | None = None
    """Volume that one item takes from the room, always in cubic metres. [m³]"""


class Positions(_Part):
    """Where one listens, where the loudspeakers stand, where it was measured."""

    seat: Point | None = None
    loudspeakers: tuple[Point, ...] = ()
    sources: dict[str, Point] = Field(default_factory=dict)
    """Source positions of a measurement, by the names used in survey.csv."""
    microphones: dict[str, Point] = Field(default_factory=dict)
    """Microphone positions of a measurement, by the names used in survey.csv."""


def _band_numbers(value: Any) -> Any:
    """Keys ``125``, ``"125"`` or ``"1k"`` as nominal octave bands."""
    if not isinstance(value, dict):
        return value
    numbers: dict[int, Any] = {}
    for key, entry in value.items():
        text = str(key).strip().lower().removesuffix("hz").strip()
        try:
            band = float(text[:-1]) * 1000 if text.endswith("k") else float(text)
        except ValueError:
            band = 0.0
        if band not in OCTAVES:
            raise RoomError(
                f"{key!r} is not an octave band",
                cure=f"Use {', '.join(str(hz) for hz in OCTAVES)} (Hz).",
            )
        numbers[int(band)] = entry
    return numbers


Bandwise = Annotated[dict[int, Number], BeforeValidator(_band_numbers)]
"""One number per octave band, keyed by nominal midband. [Hz] → value"""


class Target(_Part):
    """What the reverberation time is to be: a published use, or limits of one's own."""

    use: Identifier | None = None
    low: Bandwise = Field(default_factory=dict)
    """[s]"""
    high: Bandwise = Field(default_factory=dict)
    """[s]"""

    @model_validator(mode="after")
    def _sensible(self) -> Self:
        if self.use is None and not (self.low or self.high):
            raise RoomError("says nothing", where="[target]", cure="Give use, or low and high.")
        for band in self.low.keys() & self.high.keys():
            if self.low[band] > self.high[band]:
                raise RoomError(
                    f"at {band} Hz the lower limit {self.low[band]:g} s is above the upper limit "
                    f"{self.high[band]:g} s",
                    where="[target]",
                    cure="Exchange the two.",
                )
        for name, limits in (("low", self.low), ("high", self.high)):
            for band, value in limits.items():
                if not 0 < value <= 20:
                    raise RoomError(
                        f"{value:g} s is no reverberation time to aim for",
                        where=f"[target] {name}, {band}",
                        cure="Write seconds, for example 0.35.",
                    )
        return self


class TreatmentLimits(_Part):
    """What a treatment may cost and where it may go."""

    budget: Annotated[Number, Field(ge=0)] | None = None
    """In `currency`."""
    currency: Annotated[str, Field(min_length=1, max_length=8)] = "EUR"
    formula: Literal["eyring", "sabine", "both"] = "eyring"
    """Which formula must meet the target."""
    keep_clear: tuple[Identifier, ...] = ()
    """Surfaces that stay as they are."""
    max_cover: dict[str, Share] = Field(default_factory=dict)
    """Largest share of a surface's free area that panels may cover. [-]"""
    symmetric: tuple[tuple[Identifier, Identifier], ...] = ()
    """Pairs of walls that get the same panels."""
    max_weight_kg: dict[str, Annotated[Number, Field(gt=0)]] = Field(default_factory=dict)
    """Largest weight that a surface may carry. [kg]"""
    min_thickness_mm: Annotated[Number, Field(ge=0)] | None = None
    """Thinnest build-up wanted, thickness and gap together. [mm]"""
    max_depth_mm: Annotated[Number, Field(gt=0)] | None = None
    """Deepest build-up allowed, thickness and gap together. [mm]"""
    max_products: Annotated[int, Field(ge=1)] | None = None
    """How many different products at most."""
    cover_first_reflections: bool = False
    """Panels must cover the first reflections between loudspeakers and seat."""
    evenness: Annotated[Number, Field(ge=1)] | None = None
    """Largest ratio of mean absorption between two axes, 500 Hz to 4 kHz. [-]"""
    panel_gap: Annotated[Length, Field(ge=0)] = 0.02
    """Least distance between neighbouring panels and to edges. [m]"""
    wall_type: Literal["plasterboard", "masonry", "timber", "concrete", "unknown"] = "unknown"
    """What the fixings go into."""
    rented: bool = False
    """Nothing may be screwed to walls or ceiling."""


class OwnMaterial(_Part):
    """A material of one's own, usable by its id in this room."""

    id: Identifier
    description: Text = ""
    alpha: Bandwise = Field(default_factory=dict)
    """Absorption coefficient per band. [-]"""
    u: Number | Bandwise | None = None
    """Standard uncertainty, one number or per band. [-]"""
    build_up: tuple[dict[str, Any], ...] | None = None
    """Layers from the front to the wall, instead of coefficients."""
    source: Text = ""

    @model_validator(mode="after")
    def _one_way_to_say_it(self) -> Self:
        if bool(self.alpha) == bool(self.build_up):
            raise RoomError(
                "has neither coefficients nor a build-up, or both",
                where=f"[[material]] {self.id!r}",
                cure="Give alpha = { 125 = 0.18, … } or build_up = [ … ].",
            )
        return self


class Room(_Part):
    """One room: air, shape, surfaces, what stands in it, where one listens, what is wanted."""

    model_config = ConfigDict(
        frozen=True, extra="forbid", str_strip_whitespace=True, populate_by_name=True
    )

    name: Annotated[str, Field(min_length=1, max_length=200)]
    units: Literal["m", "ft"] = "m"
    """Unit of every length in the file; inside, lengths are metres."""
    state: Literal["empty", "furnished", "occupied"] | None = None
    """State that is described; worked out from the furnishings where it is not given."""
    air: AirState = AirState()
    shape: Shape
    surfaces: Surfaces
    openings: tuple[Opening, ...] = Field(default=(), alias="opening")
    patches: tuple[Patch, ...] = Field(default=(), alias="patch")
    keep_outs: tuple[KeepOut, ...] = Field(default=(), alias="keep_out")
    furnishings: tuple[Furnishing, ...] = Field(default=(), alias="furnishing")
    positions: Positions = Positions()
    target: Target | None = None
    treatment: TreatmentLimits = TreatmentLimits()
    materials: tuple[OwnMaterial, ...] = Field(default=(), alias="material")

    @field_validator("materials")
    @classmethod
    def _unique(cls, materials: tuple[OwnMaterial, ...]) -> tuple[OwnMaterial, ...]:
        seen: set[str] = set()
        for material in materials:
            if material.id in seen:
                raise RoomError(
                    f"the id {material.id!r} is used twice",
                    where="[[material]]",
                    cure="Rename one.",
                )
            seen.add(material.id)
        return materials

    @model_validator(mode="after")
    def _possible(self) -> Self:
        from planner.room.checks import check_room

        check_room(self)
        return self

    @property
    def is_rectangle(self) -> bool:
        """Described by length and width (walls are then front, right, back and left)."""
        return self.shape.footprint is None

    @property
    def height(self) -> float:
        """[m]."""
        return self.shape.height

    @property
    def dimensions(self) -> tuple[float, float, float]:
        """Length, width and height of the room or of its bounding box. [m]."""
        length, width = np.ptp(self.footprint, axis=0)
        return float(length), float(width), self.height

    @property
    def footprint(self) -> NDArray[np.float64]:
        """Corners in plan, anticlockwise, shape ``(corner, 2)``. [m]."""
        if self.shape.footprint is not None:
            return np.array(self.shape.footprint, float)
        length, width = self.shape.length, self.shape.width
        return np.array([(0, 0), (length, 0), (length, width), (0, width)], float)

    @property
    def wall_names(self) -> tuple[str, ...]:
        """Names of the walls in the order of the footprint's edges."""
        if self.is_rectangle:
            return RECTANGLE_WALLS
        return tuple(f"wall-{number}" for number in range(1, len(self.footprint) + 1))

    @property
    def surface_names(self) -> tuple[str, ...]:
        """``floor``, ``ceiling`` and the walls."""
        return ("floor", "ceiling", *self.wall_names)

    @property
    def surface_materials(self) -> dict[str, str]:
        """Material of every surface, by its name."""
        walls = self.surfaces.walls
        if isinstance(walls, str):
            by_wall = dict.fromkeys(self.wall_names, walls)
        elif isinstance(walls, dict):
            by_wall = {name: walls[name] for name in self.wall_names}
        else:
            by_wall = dict(zip(self.wall_names, walls, strict=True))
        return {"floor": self.surfaces.floor, "ceiling": self.surfaces.ceiling, **by_wall}

    @property
    def described_state(self) -> str:
        """``empty``, ``furnished`` or ``occupied``."""
        if self.state:
            return self.state
        if any("person" in thing.item or "musician" in thing.item for thing in self.furnishings):
            return "occupied"
        return "furnished" if self.furnishings else "empty"

    def air_state(self) -> physics.Air:
        """The air as the formulas take it."""
        return physics.Air(self.air.temperature_c, self.air.humidity_percent, self.air.pressure_kpa)

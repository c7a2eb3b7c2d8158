"""The keys of a scene file: names, types, units, defaults and single-value limits, as pydantic models.

Quantities stand as text with a unit and come out as plain numbers (M, rad, µas, Mpc, solar masses, Hz, Jy). Unknown keys, missing
units and values of another type are refused; what several keys must satisfy together is checked in `scene.py`.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Annotated, Any, Literal

from pydantic import (
    AfterValidator,
    BaseModel,
    BeforeValidator,
    ConfigDict,
    Field,
    GetCoreSchemaHandler,
    GetJsonSchemaHandler,
    WithJsonSchema,
)
from pydantic_core import CoreSchema, core_schema

from emission.disk import SPECTRAL_INDEX_RANGE
from ringwright.units import KINDS, parse_given, shown

FEWEST_PIXELS, MOST_PIXELS = 8, 16384
MOST_ORDERS = 6
# Light is followed, and tested, for impact parameters from 1e-3 M to 1e6 M; wider or smaller pictures are mistaken units.
NARROWEST_FIELD, FARTHEST = 1e-2, 1e6
NARROWEST_RING = 1e-3  # FWHM [M]; far below any pixel, far above the spacing of doubles at FARTHEST
WEAKEST, STRONGEST = 1e-12, 1e12  # only ratios of strengths matter; these keep products far from overflow


@dataclass(frozen=True)
class Given:
    """What makes a float a quantity of one kind in a file, with limits in the unit that it is kept in."""

    kind: str
    low: float | None = None
    high: float | None = None
    above: bool = False

    def __get_pydantic_core_schema__(self, source: Any, handler: GetCoreSchemaHandler) -> CoreSchema:
        return core_schema.no_info_plain_validator_function(self.read)

    def __get_pydantic_json_schema__(
        self, schema: CoreSchema, handler: GetJsonSchemaHandler
    ) -> dict[str, Any]:
        return {
            "type": "string",
            "description": f"{self.kind}: a number and a unit",
            "examples": [KINDS[self.kind][1]],
        }

    def read(self, value: object) -> float:
        """The quantity as a plain number, or a ValueError that says what is accepted."""
        number = parse_given(value, self.kind)
        unit = KINDS[self.kind][0]
        name, scale = ("deg", math.degrees(1.0)) if unit == "rad" else (unit, 1.0)
        if self.low is not None and (number < self.low or (self.above and number == self.low)):
            limit = "more than" if self.above else "at least"
            raise ValueError(f"{shown(value)} is too small; {limit} {self.low * scale:g} {name} is accepted")
        if self.high is not None and number > self.high:
            raise ValueError(f"{shown(value)} is too large; at most {self.high * scale:g} {name} is accepted")
        return number


def _read_field(value: object) -> tuple[str, float]:
    """Side of the image: an angle on the sky, or a length in M."""
    kind = "length" if isinstance(value, str) and value.strip().endswith("M") else "sky angle"
    number = parse_given(value, kind)
    if number <= 0.0:
        raise ValueError(
            f'{shown(value)} is too small; a field has a positive side, like "170 uas" or "40 M"'
        )
    return KINDS[kind][0], number


Inclination = Annotated[float, Given("angle", 0.0, math.pi * (1.0 + 1e-15))]
Angle = Annotated[float, Given("angle")]
Declination = Annotated[float, Given("angle", -math.pi / 2, math.pi / 2)]
SkyAngle = Annotated[float, Given("sky angle", 0.0, above=True)]
Mass = Annotated[float, Given("mass", 0.0, above=True)]
Distance = Annotated[float, Given("distance", 0.0, above=True)]
Frequency = Annotated[float, Given("frequency", 0.0, above=True)]
FluxDensity = Annotated[float, Given("flux density", 0.0, above=True)]
Radius = Annotated[float, Given("length", 2.0, FARTHEST)]
Length = Annotated[float, Given("length", 0.0, FARTHEST)]
Width = Annotated[float, Given("length", NARROWEST_RING, FARTHEST)]
Side = Annotated[
    tuple[str, float],
    BeforeValidator(_read_field),
    WithJsonSchema({"type": "string", "examples": ["170 uas", "40 M"]}),
]


Name = Annotated[
    str, Field(pattern=r"^[A-Za-z0-9][A-Za-z0-9._-]*$", max_length=100, examples=['"my-nucleus"'])
]


class Strict(BaseModel):
    """A table of which every key is known."""

    model_config = ConfigDict(
        extra="forbid", strict=True, frozen=True, allow_inf_nan=False, validate_default=True
    )


class Hole(Strict):
    """The hole: mass and distance, or theta_g, or neither where M suffices."""

    spacetime: str = "schwarzschild"
    mass: Mass | None = None
    distance: Distance | None = None
    theta_g: SkyAngle | None = None


class View(Strict):
    """From where, how wide and how fine."""

    inclination: Annotated[Inclination, Field(examples=['"30 deg"'])]
    position_angle: Angle = "0 deg"  # type: ignore[assignment]
    frequency: Frequency | None = None
    field: Annotated[Side, Field(examples=['"170 uas"', '"40 M"'])]
    pixels: Annotated[int, Field(ge=FEWEST_PIXELS, le=MOST_PIXELS, examples=[256])]
    orders: Annotated[int, Field(ge=1, le=MOST_ORDERS)] = 3


class Source(Strict):
    """What is known of the source on the sky."""

    total_flux: FluxDensity | None = None
    right_ascension: Angle | None = None
    declination: Declination | None = None


class PowerLawProfile(Strict):
    """Brightness falls as r^-slope between two edges."""

    kind: Literal["power-law"]
    inner: Annotated[Radius, Field(examples=['"3 M"'])]
    outer: Annotated[Radius, Field(examples=['"50 M"'])]
    slope: Annotated[float, Field(examples=[3.7])]
    edge_width: Length = "0 M"  # type: ignore[assignment]


class GaussianRingProfile(Strict):
    """A Gaussian in radius; width is its FWHM."""

    kind: Literal["gaussian-ring"]
    radius: Annotated[Radius, Field(examples=['"5 M"'])]
    width: Annotated[Width, Field(examples=['"2 M"'])]


class PageThorneProfile(Strict):
    """Bolometric flux of a thin accretion disk (Page & Thorne 1974)."""

    kind: Literal["page-thorne"]
    outer: Annotated[Radius, Field(examples=['"30 M"'])]


class TableProfile(Strict):
    """Brightness against radius from a file beside the scene."""

    kind: Literal["table"]
    file: Annotated[str, Field(examples=['"brightness.csv"'])]


class StaticFlow(Strict):
    """Gas at rest."""

    kind: Literal["static"]


class CircularFlow(Strict):
    """Circular orbits, and the plunge inside the innermost stable one (Cunningham 1975)."""

    kind: Literal["circular"]


class BlendFlow(Strict):
    """Slower than circular in turning, on the way to free fall in falling."""

    kind: Literal["blend"]
    orbit_fraction: Annotated[float, Field(ge=0.0, le=1.0, examples=[0.7])]
    fall_fraction: Annotated[float, Field(ge=0.0, le=1.0, examples=[0.5])]


class RadialFallFlow(Strict):
    """Free fall from rest far away."""

    kind: Literal["radial-fall"]


AnyProfile = Annotated[
    PowerLawProfile | GaussianRingProfile | PageThorneProfile | TableProfile, Field(discriminator="kind")
]
AnyFlow = Annotated[StaticFlow | CircularFlow | BlendFlow | RadialFallFlow, Field(discriminator="kind")]


def _in_proportion(value: float) -> float:
    if value and value < WEAKEST:
        raise ValueError(f"{value!r} is not accepted; 0, or {WEAKEST:g} to {STRONGEST:g}, is")
    return value


Strength = Annotated[float, Field(ge=0.0, le=STRONGEST), AfterValidator(_in_proportion)]
SpectralIndex = Annotated[float, Field(ge=SPECTRAL_INDEX_RANGE[0], le=SPECTRAL_INDEX_RANGE[1])]


class ThinDiskEmitter(Strict):
    """A thin disk in the equatorial plane."""

    kind: Literal["thin-disk"]
    strength: Strength = 1.0
    spectral_index: SpectralIndex = 0.0
    opaque: bool = False
    slant: bool = False
    profile: Annotated[
        AnyProfile, Field(examples=['{ kind = "power-law", inner = "3 M", outer = "50 M", slope = 3.7 }'])
    ]
    flow: Annotated[AnyFlow, Field(examples=['{ kind = "circular" }'])]


class BackdropEmitter(Strict):
    """Uniform light from behind, far away."""

    kind: Literal["backdrop"]
    strength: Strength = 1.0


AnyEmitter = Annotated[ThinDiskEmitter | BackdropEmitter, Field(discriminator="kind")]


class SceneFile(Strict):
    """A whole scene file."""

    name: Name
    hole: Hole = Field(default_factory=Hole)
    view: View
    source: Source = Field(default_factory=Source)
    emitter: Annotated[list[AnyEmitter], Field(min_length=1)]

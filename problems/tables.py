"""The tables of a case file: their keys, the rule and default of each, and what must fit together.

Tables are in SI once read. Which tables a kind of case has is for `schema`, what it aims at for
`goals`.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Annotated, Literal, TypeVar

from pydantic import BaseModel, ConfigDict, Field, ValidationInfo, field_validator

from problems.rules import (
    Choice,
    Foreign,
    Number,
    Place,
    Position,
    Range,
    Series,
    Span,
    Text,
    fault,
)
from problems.units import format_value

Value = TypeVar("Value")

ASK_TURBULENCE = (
    "where the layer turns is never assumed: give turbulence, the level in the free stream (about "
    '"0.5 %" to "1 %" in a quiet open room, "3 %" to "5 %" behind a blower or in a duct), or '
    "critical_reynolds in its place (the common 5e5 belongs to a stream of about 1.2 %)"
)

# Pairs of which one key excludes the other
EITHER = {
    "fluid.turbulence": "fluid.critical_reynolds",
    "fluid.pressure": "fluid.altitude",
    "plates.height": "plates.count",
    "plates.surface.temperature": "plates.surface.flux",
}


@dataclass(frozen=True)
class Assumed:
    """Why a default is what it is."""

    why: str


_TEMPERATURE = Number("a temperature", '"25 degC"', "K", 123.15, 1473.15)
_ALTITUDE = Number("a height above sea level", '"350 m"', "m", -500.0, 9000.0)
_PRESSURE = Number("an absolute pressure", '"101.325 kPa"', "Pa", 1e3, 1e8)
_CRITICAL = Number("a Reynolds number on the length", "5e5", "1", 1e4, 1e7)
_TURBULENCE = Number('a level such as "1.2 %" or, bare, a fraction', "0.012", "1", 1e-4, 0.2)
_HUMIDITY = Number("a relative humidity", '"50 %"', "1", 0.0, 1.0)
_WIDTH = Number("a width", '"0.6 m"', "m", 0.0, 100.0, open_low=True)
_HEIGHT = Number("a height", '"0.4 m"', "m", 0.0, 100.0, open_low=True)
_COUNT = Number("a number of plates", "40", "1", 1.0, 1e6)
_THICKNESS = Number("a thickness", '"1 mm"', "m", 0.0, 0.1)
_LENGTH = Number("a length", '"0.3 m"', "m", 0.0, 100.0, open_low=True)
_GAP = Number("a length", '"8 mm"', "m", 0.0, 1.0, open_low=True)
_FLUX = Number("a heat flux", '"400 W/m2"', "W/m2", -1e7, 1e7, but=0.0)
_ROUGHNESS = Number("a height of sand grain", '"0.05 mm"', "m", 0.0, 0.01)
_DENSITY = Number("a density", '"2700 kg/m3"', "kg/m3", 1.0, 25000.0)
_VELOCITY = Number("a velocity", '"5 m/s"', "m/s", 0.0, 340.0, open_low=True)
_SHARE = Number("a share of the length", '"6 %"', "1", 0.0, 1.0, open_low=True)
_DISTANCE = Number("a distance", '"30 mm"', "m", 0.0, 100.0, open_low=True)
_WIRE = Number("a wire diameter", '"1 mm"', "m", 0.0, 0.1)
_WIRE_DRAG = Number("a drag coefficient", "1.0", "1", 0.5, 2.0)
_STOCK = Number("a wire diameter", '"0.8 mm"', "m", 0.0, 0.1, open_low=True)
# Wire that one can expect to find: preferred numbers R10 of ISO 3 (from memory), 0.2 to 6.3 mm
STOCK = tuple(
    1e-3 * size
    for size in (
        *(0.2, 0.25, 0.315, 0.4, 0.5, 0.63, 0.8, 1.0),
        *(1.25, 1.6, 2.0, 2.5, 3.15, 4.0, 5.0, 6.3),
    )
)
_DROP = Number("a pressure drop", '"60 Pa"', "Pa", 0.0, 1e5, open_low=True)
_FLOW = Number("a volume flow", '"3000 m3/h"', "m3/s", 0.0, 1e4, open_low=True)
_CLOGGED = Number("a rise", '"100 %"', "1", 0.0, 10.0)
_MARGIN = Number("a share of the flow", '"10 %"', "1", 0.0, 0.9)
_PRICE = Number("a price per kWh", "0.25", "1", 0.0, 1e6)
_HOURS = Number("hours in a year", "4000", "1", 0.0, 8784.0, open_low=True)
_AREA_PRICE = Number("a price per m2", "30", "1", 0.0, 1e9)
_LIFE = Number("years", "15", "1", 0.0, 200.0, open_low=True)
_INTEREST = Number("interest a year", '"4 %"', "1", 0.0, 1.0)
_EFFICIENCY = Number("an efficiency", "0.55", "1", 0.0, 1.0, open_low=True)


class Table(BaseModel):
    """A table of the case file; frozen, SI, no unknown keys."""

    model_config = ConfigDict(frozen=True, extra="forbid")


def _either(value: Value, info: ValidationInfo, other: str, ask: str) -> Value:
    """Refuses `value` beside the key `other`, read before it, and the lack of both."""
    if other in info.data and (value is None) == (info.data[other] is None):
        raise fault(ask if value is None else f"give this or {other}, not both")
    return value


class Fluid(Table):
    """The stream as it arrives; `turbulence` in percent of its velocity."""

    name: Annotated[str, Text('"air", "humid air", "water" or a fluid that CoolProp knows')]
    temperature: Annotated[float, _TEMPERATURE]
    altitude: Annotated[float | None, _ALTITUDE] = None
    pressure: Annotated[float, _PRESSURE, Assumed("standard atmosphere")] = Field(
        default=None, validate_default=True
    )
    critical_reynolds: Annotated[float | None, _CRITICAL] = None
    turbulence: Annotated[float | None, _TURBULENCE] = Field(default=None, validate_default=True)
    humidity: Annotated[float | None, _HUMIDITY] = Field(default=None, validate_default=True)

    @field_validator("name")
    @classmethod
    def _known(cls, name: str) -> str:
        if name.casefold() in ("air", "humid air", "water"):
            return name.casefold()
        from problems.convection.fluids import FluidError, check_name

        try:
            check_name(name)
        except FluidError as error:
            raise fault(error.allowed) from error
        return name

    @field_validator("pressure", mode="before")
    @classmethod
    def _at_altitude(cls, pressure: object, info: ValidationInfo) -> object:
        from problems.convection.fluids import standard_pressure

        if pressure is not None and info.data.get("altitude") is not None:
            raise fault("give this or altitude, not both")
        if pressure is not None:
            return pressure
        return float(standard_pressure(info.data.get("altitude") or 0.0))

    @field_validator("turbulence")
    @classmethod
    def _onset_stated(cls, turbulence: float | None, info: ValidationInfo) -> float | None:
        _either(turbulence, info, "critical_reynolds", ASK_TURBULENCE)
        return None if turbulence is None else 100.0 * turbulence

    @field_validator("humidity")
    @classmethod
    def _of_humid_air(cls, humidity: float | None, info: ValidationInfo) -> float | None:
        humid = info.data.get("name") == "humid air"
        if humid and humidity is None:
            raise fault(_HUMIDITY.allowed)
        if "name" in info.data and not humid and humidity is not None:
            raise fault(f'only for name = "humid air"; take it out, or not {info.data["name"]}')
        return humidity


class Surface(Table):
    """Both faces at one temperature [K], or under one flux [W/m2] (negative: cooled)."""

    flux: Annotated[float | None, _FLUX] = None
    temperature: Annotated[float | None, _TEMPERATURE] = Field(default=None, validate_default=True)

    @field_validator("temperature")
    @classmethod
    def _stated(cls, temperature: float | None, info: ValidationInfo) -> float | None:
        return _either(temperature, info, "flux", f"{_TEMPERATURE.allowed}; or flux in its place")


class Plates(Table):
    """The plates; what a kind does not have keeps its default. Lengths in m."""

    width: Annotated[float, _WIDTH]
    thickness: Annotated[float, _THICKNESS, Assumed("common sheet")] = 0.001
    length: Annotated[Span, Range(_LENGTH, '["0.05 m", "1.2 m"]')]
    gap: Annotated[Span | None, Range(_GAP, '["3 mm", "40 mm"]')] = None
    count: Annotated[float | None, _COUNT] = None
    height: Annotated[float | None, _HEIGHT] = None
    surface: Surface
    roughness: Annotated[float, _ROUGHNESS, Assumed("ordinary sheet is smooth")] = 0.0
    ends: Annotated[Literal["sharp", "smooth", "none"], Choice(("sharp", "smooth", "none"))] = (
        "sharp"
    )
    feed: Annotated[Literal["duct", "plenum"], Choice(("duct", "plenum"))] = "duct"
    faces: Annotated[Literal[1, 2], Choice((1, 2))] = 2
    material_density: Annotated[float, _DENSITY, Assumed("aluminium")] = 2700.0


_NO_STACK = Foreign('kind "plate" has a single plate')
_BOTH_FACES = Foreign('kind "stack" is swept on both faces of every plate')


class SinglePlate(Plates):
    """One plate in a free stream."""

    gap: Annotated[None, _NO_STACK] = None
    count: Annotated[None, _NO_STACK] = None
    height: Annotated[None, _NO_STACK] = None
    ends: Annotated[Literal["sharp"], _NO_STACK] = "sharp"
    feed: Annotated[Literal["duct"], _NO_STACK] = "duct"
    faces: Annotated[Literal[1, 2], Choice((1, 2)), Assumed("swept on both faces")] = 2


class StackPlates(Plates):
    """Parallel plates, all gaps alike."""

    gap: Annotated[Span, Range(_GAP, '["3 mm", "40 mm"]')]
    height: Annotated[float | None, _HEIGHT] = Field(default=None, validate_default=True)
    ends: Annotated[
        Literal["sharp", "smooth", "none"],
        Choice(("sharp", "smooth", "none")),
        Assumed("sheared edges"),
    ] = "sharp"
    feed: Annotated[
        Literal["duct", "plenum"],
        Choice(("duct", "plenum")),
        Assumed("ducts of the stack's own section before and behind it"),
    ] = "duct"
    faces: Annotated[Literal[2], _BOTH_FACES] = 2

    @field_validator("height")
    @classmethod
    def _holds_a_plate(cls, height: float | None, info: ValidationInfo) -> float | None:
        _either(height, info, "count", f"{_HEIGHT.allowed}; or count in its place")
        gap, thickness = info.data.get("gap"), info.data.get("thickness")
        if height is not None and gap is not None and thickness is not None:
            pitch = gap.low + thickness
            if height < pitch:
                least = format_value(pitch, "m")
                raise fault(f"at least {least}, one plate with its smallest gap")
        return height


class Flow(Table):
    """Velocity [m/s]: of the free stream, or for a stack the mean in the gap at inlet density."""

    velocity: Annotated[Span, Range(_VELOCITY, '["1 m/s", "15 m/s"]')]


class Trip(Table):
    """Wires across the flow; height 0 is no wire.

    `wires` of them in a row, `spacing` apart (as `position`, a share of the length or metres);
    `sort` "grit" is a strip of three-dimensional grit of that height; `walls` says whether both
    walls of a gap (both faces of a plate) carry them or one, and `facing` whether the wires of a
    gap stand opposite each other or staggered.
    """

    position: Annotated[
        Position, Place(Range(_SHARE, '["1 %", "90 %"]'), Range(_DISTANCE, '["5 mm", "200 mm"]'))
    ]
    height: Annotated[Span, Range(_WIRE, '["0.2 mm", "4 mm"]')]
    drag_coefficient: Annotated[float, _WIRE_DRAG, Assumed("wire on a wall, 0.6 to 1.2")] = 1.0
    sort: Annotated[Literal["wire", "grit"], Choice(("wire", "grit"))] = "wire"
    wires: Annotated[Literal[1, 2, 3], Choice((1, 2, 3))] = 1
    spacing: Annotated[
        Position | None,
        Place(Range(_SHARE, '["5 %", "40 %"]'), Range(_DISTANCE, '["10 mm", "200 mm"]')),
    ] = Field(default=None, validate_default=True)
    walls: Annotated[Literal["both", "one"], Choice(("both", "one"))] = "both"
    facing: Annotated[Literal["opposite", "staggered"], Choice(("opposite", "staggered"))] = (
        "opposite"
    )
    stock: Annotated[tuple[float, ...], Series(_STOCK, '["0.5 mm", "0.8 mm", "1 mm"]')] = STOCK

    @field_validator("spacing")
    @classmethod
    def _between_several(cls, spacing: Position | None, info: ValidationInfo) -> Position | None:
        count = info.data.get("wires")
        if count is not None and (count > 1) != (spacing is not None):
            says = (
                'a spacing such as "20 %" when wires is 2 or 3'
                if count > 1
                else ("only with wires = 2 or 3; take it out")
            )
            raise fault(says)
        return spacing

    @property
    def position_is_share(self) -> bool:
        """Whether `position` is a fraction of the length; metres otherwise."""
        return self.position.is_share


class Resistance(Table):
    """A resistance in series with the plates: a pressure drop [Pa] at a volume flow [m3/s]."""

    pressure_drop: Annotated[float, _DROP]
    flow: Annotated[float, _FLOW]


class Filter(Resistance):
    """A filter, laminar: its drop goes with the flow. `clogged` is the share it rises by."""

    clogged: Annotated[float, _CLOGGED, Assumed("changed at twice its clean drop")] = 1.0


class Fan(Table):
    """What drives the flow.

    Without a catalogue `efficiency` is that of fan or pump, drive and motor together. With one
    the fan is chosen from it, `parallel` at most of one sort, holding `margin` to its peak.
    """

    efficiency: Annotated[float, _EFFICIENCY, Assumed("fan, drive and motor together")] = 0.55
    catalogue: Annotated[str | None, Text("a ready-made catalogue, a CSV file or a folder")] = None
    drive: Annotated[
        Literal["variable speed", "fixed speed"], Choice(("variable speed", "fixed speed"))
    ] = "variable speed"
    margin: Annotated[float, _MARGIN] = 0.10
    parallel: Annotated[Literal[1, 2, 3, 4, 6, 8], Choice((1, 2, 3, 4, 6, 8))] = 1
    external: Resistance | None = None
    filter: Filter | None = None


class Money(Table):
    """What things cost, in one currency: per kWh, per m2 of swept plate area; years, a year."""

    electricity: Annotated[float, _PRICE]
    hours: Annotated[float, _HOURS]
    plate_price: Annotated[float, _AREA_PRICE] = 0.0
    life: Annotated[float, _LIFE, Assumed("years")] = 15.0
    interest: Annotated[float, _INTEREST, Assumed("a year, real")] = 0.04
    currency: Annotated[str, Text("a currency")] = "money"

"""What a case may say: its tables, keys, rules and defaults, and what must fit together.

A new kind of surface is a subclass of `Case` in `SCHEMAS`. Where a case comes from and how its
faults are told is for `case` and `faults`.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass
from typing import Annotated, Any, Literal, TypeVar

from pydantic import BaseModel, ConfigDict, Field, PrivateAttr, ValidationInfo, field_validator

from problems.kinds.outcomes import OUTCOMES, SETTINGS
from problems.problem import Aim, Limit, Outcome
from problems.rules import (
    Choice,
    Fault,
    Foreign,
    Number,
    Place,
    Position,
    Range,
    Rule,
    Span,
    Text,
    fault,
    faults,
    nearest,
)
from problems.units import format_value, to_si

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

MOST_AIMS = 5


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
    """A wire across the flow on each swept face; height 0 is no wire."""

    position: Annotated[
        Position, Place(Range(_SHARE, '["1 %", "90 %"]'), Range(_DISTANCE, '["5 mm", "200 mm"]'))
    ]
    height: Annotated[Span, Range(_WIRE, '["0.2 mm", "4 mm"]')]
    drag_coefficient: Annotated[float, _WIRE_DRAG, Assumed("wire on a wall, 0.6 to 1.2")] = 1.0

    @property
    def position_is_share(self) -> bool:
        """Whether `position` is a fraction of the length; metres otherwise."""
        return self.position.is_share


class Fan(Table):
    """What drives the flow; efficiency of fan or pump, drive and motor together."""

    efficiency: Annotated[float, _EFFICIENCY, Assumed("fan, drive and motor together")] = 0.55


@dataclass(frozen=True)
class Aims(Rule):
    """The table [aims] of a kind."""

    kind: str

    @property
    def allowed(self) -> str:
        return (
            "a table with most = [...], least = [...] or both, one to five outcomes in all, "
            'such as most = ["heat"], least = ["fan_power"]'
        )

    def read(self, value: object) -> tuple[Aim, ...]:
        if not isinstance(value, Mapping):
            raise ValueError(value)
        known = [outcome.name for outcome in OUTCOMES[self.kind]]
        found: list[Fault] = []
        aims: dict[str, Aim] = {}
        for sense, names in value.items():
            if sense not in ("most", "least") or not isinstance(names, list):
                found.append(((sense,), names, self.allowed))
                continue
            for name in names:
                if name not in known:
                    found.append(((sense,), name, nearest(name, known)))
                elif name in aims:
                    found.append(((sense,), name, "each outcome is named once"))
                aims[str(name)] = Aim(str(name), sense)
        if not found and not 1 <= len(aims) <= MOST_AIMS:
            raise ValueError(value)
        if found:
            raise faults(found)
        return tuple(aims.values())


@dataclass(frozen=True)
class Limits(Rule):
    """The table [limits] of a kind."""

    kind: str

    @property
    def allowed(self) -> str:
        return 'a table of limits such as pressure_drop = { at_most = "150 Pa" }'

    def read(self, value: object) -> tuple[Limit, ...]:
        if not isinstance(value, Mapping):
            raise ValueError(value)
        known = {item.name: item for item in (*OUTCOMES[self.kind], *SETTINGS[self.kind])}
        found: list[Fault] = []
        limits = []
        for name, bounds in value.items():
            if name not in known:
                found.append(((name,), bounds, nearest(name, known)))
                continue
            numbers, wrong = _bounds(bounds, known[name])
            found += [((name, *loc), given, says) for loc, given, says in wrong]
            limits.append(Limit(name, **numbers))
        if found:
            raise faults(found)
        return tuple(limits)


def _bounds(bounds: object, of: Outcome) -> tuple[dict[str, float], list[Fault]]:
    """The numbers of one limit in SI by key, and what is wrong with it."""
    example = {"K": '"60 degC"', "delta K": '"5 K"', "1": "2"}.get(of.unit, f'"150 {of.unit}"')
    table = f"a table with at_least, at_most or both, such as {{ at_most = {example} }}"
    if not isinstance(bounds, Mapping) or not bounds or bounds.keys() - {"at_least", "at_most"}:
        return {}, [((), bounds, table)]
    numbers: dict[str, float] = {}
    found: list[Fault] = []
    for key, value in bounds.items():
        try:
            numbers[key] = to_si(value, of.unit)
        except ValueError:
            found.append(((key,), value, f"{of.meaning}: a quantity such as {example}"))
    if len(numbers) == 2 and numbers["at_least"] > numbers["at_most"]:
        found.append(((), bounds, "at_least must not be above at_most"))
    return numbers, found


class Case(Table):
    """One problem as the user states it, checked, frozen, in SI.

    `name` is that of the ready-made case or the file, `source` the text as given.
    """

    title: Annotated[str, Text("what the case is about")]
    kind: Literal["plate", "stack"]
    fluid: Fluid
    plates: Plates
    flow: Flow
    trip: Trip | None = None
    fan: Fan = Fan()
    aims: tuple[Aim, ...]
    limits: tuple[Limit, ...] = ()

    _name: str = PrivateAttr("")
    _source: str = PrivateAttr("")

    @classmethod
    def read(cls, raw: Mapping[str, Any], name: str, source: str) -> Case:
        """The case that the tables of a file give. Raises pydantic's ValidationError."""
        case = cls.model_validate(raw)
        case._name, case._source = name, source
        return case

    @property
    def name(self) -> str:
        """Name of the ready-made case, or of the file without its ending."""
        return self._name

    @property
    def source(self) -> str:
        """The text of the case as given."""
        return self._source

    @property
    def spans(self) -> dict[str, Span]:
        """Every quantity that may be searched, by its short name, fixed or free."""
        found = {"length": self.plates.length, "gap": self.plates.gap}
        found["velocity"] = self.flow.velocity
        if self.trip is not None:
            found |= {"trip_position": self.trip.position, "trip_height": self.trip.height}
        return {name: span for name, span in found.items() if span is not None}

    @property
    def free(self) -> tuple[str, ...]:
        """Short names of the quantities that are left to the search."""
        return tuple(name for name, span in self.spans.items() if not span.fixed)

    @property
    def assumed(self) -> tuple[tuple[str, str], ...]:
        """What the case does not say and the program assumes: (key, value and reason)."""
        return tuple(_assumed(self))

    @field_validator("plates")
    @classmethod
    def _heat_to_pass(cls, plates: Plates, info: ValidationInfo) -> Plates:
        fluid = info.data.get("fluid")
        if fluid is not None and plates.surface.temperature == fluid.temperature:
            says = "another temperature than the fluid's, or no heat passes"
            raise faults([(("surface", "temperature"), None, says)])
        return plates

    @field_validator("trip")
    @classmethod
    def _room_for_wires(cls, trip: Trip | None, info: ValidationInfo) -> Trip | None:
        plates = info.data.get("plates")
        if trip is None or plates is None or plates.gap is None:
            return trip
        if trip.height.low >= 0.5 * plates.gap.high:
            widest = format_value(plates.gap.high, "m")
            says = f"below half of the widest gap, {widest}: each gap carries a wire on both faces"
            raise faults([(("height",), None, says)])
        return trip


class PlateCase(Case):
    """One plate in a free stream."""

    kind: Annotated[Literal["plate"], Choice(("plate",))]
    plates: SinglePlate
    aims: Annotated[tuple[Aim, ...], Aims("plate")]
    limits: Annotated[tuple[Limit, ...], Limits("plate")] = ()


class StackCase(Case):
    """Parallel plates with fluid between them."""

    kind: Annotated[Literal["stack"], Choice(("stack",))]
    plates: StackPlates
    aims: Annotated[tuple[Aim, ...], Aims("stack")]
    limits: Annotated[tuple[Limit, ...], Limits("stack")] = ()


SCHEMAS: dict[str, type[Case]] = {"plate": PlateCase, "stack": StackCase}


def _assumed(table: Table, path: str = "") -> Iterator[tuple[str, str]]:
    """Defaults that stand in `table`, at any depth."""
    for key, field in type(table).model_fields.items():
        value = getattr(table, key)
        if isinstance(value, Table):
            yield from _assumed(value, f"{path}{key}.")
        elif key not in table.model_fields_set:
            for why in (m.why for m in field.metadata if isinstance(m, Assumed)):
                if isinstance(table, Fluid) and table.altitude is not None:
                    why = f"{why} at {table.altitude:g} m"
                yield f"{path}{key}", f"{_shown(value, field.metadata)} ({why})"


def _shown(value: object, rules: Sequence[Any]) -> str:
    """A value of the case for the eye."""
    unit = next((rule.unit for rule in rules if isinstance(rule, Number)), None)
    return format_value(value, unit) if unit and isinstance(value, float) else str(value)

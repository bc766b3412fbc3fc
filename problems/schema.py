"""What a case is: the tables of each kind, what must fit between them, what is assumed.

A new kind of surface is a subclass of `Case` in `SCHEMAS`. The keys of each table are in `tables`;
where a case comes from and how its faults are told is for `case` and `faults`.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from typing import Annotated, Any, Literal, Self

from pydantic import PrivateAttr, ValidationInfo, field_validator

from problems.goals import Aims, Limits
from problems.problem import Aim, Limit
from problems.rules import Choice, Foreign, Number, Span, Text, faults
from problems.spreads import Uncertainties, misplaced
from problems.tables import (
    Assumed,
    Fan,
    Flow,
    Fluid,
    Money,
    Plates,
    SinglePlate,
    StackPlates,
    Table,
    Trip,
)
from problems.units import format_value


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
    money: Money | None = None
    uncertain: Annotated[Uncertainties | None, Foreign("this kind has no uncertain inputs")] = None
    aims: tuple[Aim, ...]
    limits: tuple[Limit, ...] = ()

    _name: str = PrivateAttr("")
    _source: str = PrivateAttr("")
    _folder: str = PrivateAttr(".")

    @classmethod
    def read(cls, raw: Mapping[str, Any], name: str, source: str, folder: str = ".") -> Self:
        """The case that the tables of a file give. Raises pydantic's ValidationError."""
        case = cls.model_validate(raw)
        case._name, case._source, case._folder = name, source, folder
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
    def folder(self) -> str:
        """The folder that other files of the case are looked for in."""
        return self._folder

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

    @property
    def cautions(self) -> tuple[str, ...]:
        """Sentences on what the ranges of the case allow and no design will want."""
        return tuple(_cautions(self))

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

    @field_validator("uncertain")
    @classmethod
    def _about_what_there_is(
        cls, uncertain: Uncertainties | None, info: ValidationInfo
    ) -> Uncertainties | None:
        read = info.data
        if uncertain is None or not {"fluid", "plates", "trip", "fan"} <= read.keys():
            return uncertain
        found = misplaced(
            uncertain,
            read["plates"].gap is not None,
            read["trip"] is not None,
            read["fluid"].turbulence is not None,
            read["fan"].catalogue is not None,
        )
        if found:
            raise faults(found)
        return uncertain


class PlateCase(Case):
    """One plate in a free stream."""

    kind: Annotated[Literal["plate"], Choice(("plate",))]
    plates: SinglePlate
    uncertain: Uncertainties | None = None
    aims: Annotated[tuple[Aim, ...], Aims("plate")]
    limits: Annotated[tuple[Limit, ...], Limits("plate")] = ()


class StackCase(Case):
    """Parallel plates with fluid between them."""

    kind: Annotated[Literal["stack"], Choice(("stack",))]
    plates: StackPlates
    uncertain: Uncertainties | None = None
    aims: Annotated[tuple[Aim, ...], Aims("stack")]
    limits: Annotated[tuple[Limit, ...], Limits("stack")] = ()


SCHEMAS: dict[str, type[Case]] = {"plate": PlateCase, "stack": StackCase}


def _cautions(case: Case) -> Iterator[str]:
    """What the ranges allow and the engineer may not want."""
    if not case.free:
        yield "Nothing is left to search: every quantity is fixed. point shows the one design."
    if case.trip is None:
        return
    highest = format_value(case.trip.height.high, "m")
    gap, length, position = case.plates.gap, case.plates.length, case.trip.position
    if gap is not None and case.trip.height.high >= 0.5 * gap.low:
        yield (
            f"Wires of up to {highest} on both faces do not fit the smallest gap, "
            f"{format_value(gap.low, 'm')}: such designs are refused."
        )
    if not position.is_share and position.high > length.low:
        yield (
            f"A wire at up to {format_value(position.high, 'm')} may stand behind the end of a "
            f"plate of {format_value(length.low, 'm')}: it then does nothing."
        )


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

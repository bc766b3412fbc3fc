"""The table [uncertain] of a case file: which inputs may be uncertain and how a spread is written.

A spread is a range, so much either way, or a factor either way, with a shape. What it means for an
evaluation, and what is taken where the table is missing, is for `kinds.doubts`.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Annotated, Literal

from problems.rules import Choice, Fault, Number, Rule
from problems.tables import Table
from problems.uncertain import SHAPES, Shape
from problems.units import QuantityError

_FORMS = ("range", "plus_minus", "factor")
_HALF = Number("a share", '"10 %"', "1", 0.0, 0.9)
_FACTOR = Number("a factor", "1.5", "1", 1.0, 10.0)


@dataclass(frozen=True)
class Spread:
    """How one input is spread, as the case states it.

    `form` "range": from `low` to `high`, SI; "plus_minus": `low` below 0 to `high` above it, in
    SI or, if `relative`, as shares of the nominal value; "factor": shares of it, below and above 1.
    """

    form: Literal["range", "plus_minus", "factor"]
    low: float
    high: float
    relative: bool
    shape: Shape


@dataclass(frozen=True)
class SpreadRule(Rule):
    """One key of [uncertain]: what may be stated of it beside a share or a factor either way.

    `value` is the rule of its absolute values if a range makes sense, `step` that of a change in
    its own unit; `relative` says whether shares and factors of the nominal value make sense.
    """

    what: str
    value: Number | None = None
    values: str = ""
    step: Number | None = None
    relative: bool = True

    @property
    def allowed(self) -> str:
        steps = [] if self.step is None else [self.step.example]
        steps += ['"5 %"'] if self.relative else []
        forms = [f"{' or '.join(steps)} either way"] if steps else []
        forms += ["{ factor = 1.5 } either way, at most 10"] if self.relative else []
        if self.value is not None:
            bounds = ", ".join(("", *self.value.bounds()))
            forms.append(f"a range such as {self.values}{bounds}")
        key, example = ("plus_minus", steps[0]) if steps else ("range", self.values)
        shapes = ", ".join(f'"{shape}"' for shape in SHAPES)
        return (
            f"{self.what}: {'; or '.join(forms)}; with a shape as {{ {key} = {example}, shape = "
            f'"normal" }}, one of {shapes} (those with log only for what stays above 0)'
        )

    def read(self, value: object) -> Spread:
        if isinstance(value, list | tuple):
            return self._of({"range": value})
        if isinstance(value, Mapping):
            return self._of(value)
        return self._of({"plus_minus": value})

    def _of(self, stated: Mapping[str, object]) -> Spread:
        forms = [form for form in _FORMS if form in stated]
        if len(forms) != 1 or stated.keys() - {*forms, "shape"}:
            raise ValueError(stated)
        usual: Shape = "log-uniform" if forms[0] == "factor" else "uniform"
        shape = stated.get("shape", usual)
        if shape not in SHAPES:
            raise ValueError(shape)
        read = {"range": self._range, "plus_minus": self._either_way, "factor": self._factor}
        spread = read[forms[0]](stated[forms[0]], next(s for s in SHAPES if s == shape))
        lowest = 1.0 + spread.low if spread.form == "plus_minus" and spread.relative else spread.low
        if spread.shape.startswith("log-") and lowest <= 0.0:
            raise ValueError(spread)
        return spread

    def _range(self, value: object, shape: Shape) -> Spread:
        if self.value is None or not isinstance(value, list | tuple) or len(value) != 2:
            raise ValueError(value)
        low, high = map(self.value.read, value)
        if low > high:
            raise ValueError(value)
        return Spread("range", low, high, False, shape)

    def _either_way(self, value: object, shape: Shape) -> Spread:
        bare = isinstance(value, int | float)
        share = isinstance(value, str) and value.strip().endswith("%")
        if self.relative and (share or (bare and self.step is None)):
            half, relative = _HALF.read(value), True
        elif self.step is not None:
            half, relative = self.step.read(value), False
        else:
            raise QuantityError(value)
        return Spread("plus_minus", -half, half, relative, shape)

    def _factor(self, value: object, shape: Shape) -> Spread:
        if not self.relative:
            raise ValueError(value)
        factor = _FACTOR.read(value)
        return Spread("factor", 1.0 / factor, factor, True, shape)


def _step(what: str, example: str, unit: str, high: float) -> Number:
    return Number(what, example, unit, 0.0, high)


_LEVEL = Number("a level", '"4 %"', "1", 1e-4, 0.2)
_TEMPERATURE = Number("a temperature", '"25 degC"', "K", 123.15, 1473.15)
_FOULING = Number("a thermal resistance", '"2e-4 m2 K/W"', "m2 K/W", 0.0, 0.1)
_EFFICIENCY = Number("an efficiency", "0.55", "1", 0.0, 1.0, open_low=True)
_DRAG = Number("a drag coefficient", "1.0", "1", 0.5, 2.0)
_SMALL = _step("a length", '"0.2 mm"', "m", 0.1)
_PLACE = _step("a length", '"2 mm"', "m", 10.0)
_KELVINS = _step("a difference", '"5 K"', "delta K", 300.0)

MEANINGS = {
    "onset": "where natural transition begins (Re_x)",
    "turbulence": "turbulence of the free stream",
    "inlet": "temperature of the stream as it arrives",
    "velocity": "velocity of the stream",
    "gap": "all gaps together, of as many plates as drawn, at the flow asked for",
    "wire": "diameter of the wire",
    "wire_place": "place of the wire",
    "wire_drag": "drag coefficient of the wire",
    "wire_criterion": "wire Reynolds number from which a wire trips",
    "laminar_heat": "law of laminar heat transfer",
    "turbulent_heat": "law of turbulent heat transfer",
    "laminar_friction": "law of laminar friction",
    "turbulent_friction": "law of turbulent friction",
    "fouling": "thermal resistance of what settles on the plates",
    "fan_efficiency": "efficiency of fan, drive and motor together",
}


def _rule(
    key: str,
    value: Number | None = None,
    values: str = "",
    step: Number | None = None,
    relative: bool = True,
) -> SpreadRule:
    return SpreadRule(MEANINGS[key], value, values, step, relative)


class Uncertainties(Table):
    """Inputs that are not known exactly; None for what is. `others` says of what is not named
    whether it is exact or as uncertain as is usual.
    """

    others: Annotated[Literal["exact", "usual"], Choice(("exact", "usual"))] = "exact"
    onset: Annotated[Spread | None, _rule("onset")] = None
    turbulence: Annotated[Spread | None, _rule("turbulence", _LEVEL, '["1 %", "5 %"]')] = None
    inlet: Annotated[
        Spread | None,
        _rule("inlet", _TEMPERATURE, '["15 degC", "35 degC"]', _KELVINS, relative=False),
    ] = None
    velocity: Annotated[Spread | None, _rule("velocity")] = None
    gap: Annotated[Spread | None, _rule("gap", step=_SMALL)] = None
    wire: Annotated[Spread | None, _rule("wire", step=_SMALL)] = None
    wire_place: Annotated[Spread | None, _rule("wire_place", step=_PLACE)] = None
    wire_drag: Annotated[Spread | None, _rule("wire_drag", _DRAG, "[0.6, 1.2]")] = None
    wire_criterion: Annotated[Spread | None, _rule("wire_criterion")] = None
    laminar_heat: Annotated[Spread | None, _rule("laminar_heat")] = None
    turbulent_heat: Annotated[Spread | None, _rule("turbulent_heat")] = None
    laminar_friction: Annotated[Spread | None, _rule("laminar_friction")] = None
    turbulent_friction: Annotated[Spread | None, _rule("turbulent_friction")] = None
    fouling: Annotated[
        Spread | None,
        _rule("fouling", _FOULING, '["0 m2 K/W", "2e-4 m2 K/W"]', relative=False),
    ] = None
    fan_efficiency: Annotated[
        Spread | None, _rule("fan_efficiency", _EFFICIENCY, "[0.45, 0.6]")
    ] = None

    @property
    def stated(self) -> dict[str, Spread]:
        """The spreads that the case states, by key."""
        found = {key: getattr(self, key) for key in MEANINGS}
        return {key: spread for key, spread in found.items() if spread is not None}


def misplaced(
    table: Uncertainties, has_gap: bool, has_wire: bool, has_level: bool, has_catalogue: bool
) -> list[Fault]:
    """What the table says of things that the case has not."""
    found: list[Fault] = []
    for key, spread in table.stated.items():
        if key == "gap" and not has_gap:
            found.append(((key,), None, "only a stack has gaps; take the line out"))
        if key.startswith("wire") and not has_wire:
            found.append(((key,), None, "the case has no [trip]; take the line out"))
        if key == "turbulence" and not has_level:
            says = "the case gives critical_reynolds and no turbulence; take onset in its place"
            found.append(((key,), None, says))
        if key == "fan_efficiency" and has_catalogue and spread.form == "range":
            says = 'a share either way such as "5 %": the catalogue gives the efficiency'
            found.append(((key,), None, says))
    return found

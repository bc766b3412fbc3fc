"""What drives a stack: an assumed efficiency, or a fan of a catalogue at its duty point; the money.

Turns the balance of the plates into power, fan and cost. Curves and duty points are in
`problems.fans`, annuities in `problems.costs`.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass
from functools import cached_property
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from problems import costs
from problems.case import Case
from problems.fans.catalogue import Catalogue, read_catalogue
from problems.fans.choice import (
    Choice,
    choose_fixed,
    choose_variable,
    hold_fixed,
    hold_variable,
)
from problems.fans.curves import Curves, Ints, curves
from problems.fans.systems import SampledSystem, System
from problems.fans.terms import Drive
from problems.problem import Floats

_READINGS = 9  # velocities at which a stack is read before a fan at fixed speed is met

Outcomes = dict[str, Floats]


@dataclass(frozen=True)
class Blower:
    """How the stack of a case is driven."""

    case: Case

    @cached_property
    def catalogue(self) -> Catalogue | None:
        """The fans to choose from, None with an assumed efficiency."""
        name = self.case.fan.catalogue
        return None if name is None else read_catalogue(name, self.case.folder)

    def files(self) -> tuple[tuple[str, Path], ...]:
        """The catalogue's files if they lie beside the case: path from there, and place."""
        name, beside = self.case.fan.catalogue, Path(self.case.folder)
        if name is None or self.catalogue is None or Path(name).is_absolute() or ".." in name:
            return ()
        place = beside / name
        found = sorted(place.glob("*.csv")) if place.is_dir() else [place]
        return tuple((str(path.relative_to(beside)), path) for path in found if path.is_file())

    @cached_property
    def curves(self) -> Curves:
        """Curves of all fans, alone and in parallel."""
        if self.catalogue is None:
            raise ValueError("the case names no catalogue")
        return curves(self.catalogue.fans, range(1, self.case.fan.parallel + 1))

    @property
    def drive(self) -> Drive:
        """How the fans are driven, and the margin asked for."""
        return Drive(self.case.fan.drive, self.case.fan.margin)

    @property
    def fixed(self) -> bool:
        """Whether the fan decides the velocity."""
        return self.catalogue is not None and self.case.fan.drive == "fixed speed"

    def outside(self) -> System:
        """External resistance and clean filter."""
        found, fan = System(), self.case.fan
        if fan.external is not None:
            found += System.turbulent(fan.external.flow, fan.external.pressure_drop)
        if fan.filter is not None:
            found += System.laminar(fan.filter.flow, fan.filter.pressure_drop)
        return found

    def powered(self, outcomes: Outcomes, choice: Choice | None) -> Outcomes:
        """Fan power and what goes with it, from the balance of the plates; shape (n,)."""
        flow = outcomes["flow_rate"]
        pressure = outcomes["system_pressure"]
        if self.catalogue is None:
            power = pressure * flow / self.case.fan.efficiency
            return {"fan_power": power, "specific_fan_power": power / flow}
        if choice is None:
            density = outcomes["mass_flow"] / flow
            choice = choose_variable(self.curves, flow, pressure, density, self.drive)
        duty = choice.duty
        return {
            "fan_power": duty.electrical_power,
            "specific_fan_power": duty.electrical_power / flow,
            "fan_speed": duty.speed,
            "fan_count": choice.count.astype(float),
            "fan_margin": duty.margin,
            "fan_best_share": duty.best_share,
        }

    def chosen(self, outcomes: Outcomes, rows: Ints | None = None) -> Choice | None:
        """The fan of each design whose velocity is given; None without a catalogue.

        `rows` (n,) are the fans where they have been bought already.
        """
        if self.catalogue is None:
            return None
        flow = outcomes["flow_rate"]
        density = outcomes["mass_flow"] / flow
        pressure = outcomes["system_pressure"]
        if rows is not None:
            return hold_variable(self.curves, rows, flow, pressure, density, self.drive)
        return choose_variable(self.curves, flow, pressure, density, self.drive)

    def met(
        self, given: Mapping[str, Floats], balance: Callable[[Mapping[str, Floats]], Outcomes]
    ) -> tuple[Floats, Choice, NDArray[np.bool_]]:
        """Velocity at which each design meets the fan that serves it with least power.

        The velocity in `given` is the least that is wanted. `balance` gives the outcomes of
        settings; the stack is read at several velocities of its range, and the third item tells
        where the duty point lies between them. Fans that have been bought already ("fan_row" in
        `given`) stay, whatever they deliver.
        """
        velocities = np.geomspace(*_ends(self.case), _READINGS)
        read = [balance({**given, "velocity": np.full_like(given["gap"], v)}) for v in velocities]
        flow = np.stack([outcomes["flow_rate"] for outcomes in read])
        drop = np.stack([np.maximum(outcomes["system_pressure"], 1e-6) for outcomes in read])
        density = read[0]["mass_flow"] / read[0]["flow_rate"]
        system = SampledSystem(flow, drop)
        least = given["velocity"] * flow[0] / velocities[0]
        rows = bought(given)
        if rows is None:
            choice = choose_fixed(self.curves, system, density, self.drive, least)
        else:
            choice = hold_fixed(self.curves, rows, system, density, self.drive)
        between = system.covers(choice.duty.flow)
        velocity = choice.duty.flow * velocities[0] / flow[0]
        return np.clip(velocity, velocities[0], velocities[-1]), choice, between

    def priced(self, outcomes: Outcomes, choice: Choice | None) -> Outcomes:
        """Yearly energy and cost, and present value; nothing where the case names no prices."""
        money = self.case.money
        if money is None:
            return {}
        energy = costs.yearly_energy(outcomes["fan_power"], money.hours)
        price = np.zeros_like(energy)
        if choice is not None and self.catalogue is not None:
            price = np.asarray(self.catalogue.prices)[choice.fan] * choice.count
        terms = costs.Money(money.electricity, money.plate_price, money.life, money.interest)
        found = costs.costs(terms, energy, outcomes["plate_area"], price)
        return {
            "yearly_energy": energy,
            "yearly_cost": found.yearly_cost,
            "present_value": found.present_value,
        }

    def names(self, choice: Choice | None) -> dict[str, NDArray[np.str_]]:
        """The fan of each design in words; empty without a catalogue."""
        if choice is None or self.catalogue is None:
            return {}
        names = np.array([fan.name for fan in self.catalogue.fans])[choice.fan]
        many = np.char.add(np.char.add(choice.count.astype(int).astype(str), " x "), names)
        return {"fan": np.asarray(np.where(choice.count > 1, many, names), dtype=np.str_)}


def bought(given: Mapping[str, Floats]) -> Ints | None:
    """The fans that designs have already, None where they are to be chosen."""
    return given["fan_row"].astype(np.intp) if "fan_row" in given else None


def reasons_of(choice: Choice) -> NDArray[np.str_]:
    """Why no fan can serve each design; empty where one does."""
    from problems.fans.terms import Reason

    texts = np.array(["", *(f"no fan: the nearest {reason.says}" for reason in list(Reason)[1:])])
    return np.asarray(texts[choice.duty.reason.astype(int)], dtype=np.str_)


def _ends(case: Case) -> tuple[float, float]:
    velocity = case.flow.velocity
    return 0.5 * velocity.low, 2.0 * velocity.high

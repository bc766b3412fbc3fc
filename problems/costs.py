"""Energy and money in a year: electricity, plates, fans, annuity and present value.

Energy is in kWh, time in h and years and money in the user's currency, as bills are written; power
is in W. All functions work on arrays and know nothing of fans or plates.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike

from problems.problem import Floats

HOURS_OF_YEAR = 8760.0


@dataclass(frozen=True)
class Profile:
    """Hours in a year at each share of the full flow; for the rest of the year the fan stands."""

    share: tuple[float, ...]
    hours: tuple[float, ...]

    @property
    def total_hours(self) -> float:
        """Hours in a year that the fan runs."""
        return sum(self.hours)

    @staticmethod
    def steady(hours: float) -> Profile:
        """Full flow for `hours` in a year."""
        return Profile((1.0,), (hours,))


@dataclass(frozen=True)
class Money:
    """What things cost: per kWh, per m2 of swept plate area; `life` in years, `interest` a year.

    Interest is a share (0.04 for 4 %), real interest where prices are to stay as they are today.
    """

    electricity_price: float = 0.0
    plate_price: float = 0.0
    life: float = 15.0
    interest: float = 0.04
    currency: str = ""


@dataclass(frozen=True)
class Costs:
    """Costs of n designs, every array of shape (n,): once, in a year, and over the life."""

    investment: Floats
    yearly_energy_cost: Floats
    yearly_cost: Floats
    present_value: Floats


def annuity(interest: ArrayLike, life: ArrayLike) -> Floats:
    """Share of an investment to be paid each year of `life` at `interest`: i/(1 - (1 + i)^-n).

    The usual annuity formula, payments at the end of each year; 1/n without interest.
    """
    i, n = np.broadcast_arrays(np.asarray(interest, dtype=float), np.asarray(life, dtype=float))
    paid_back = -np.expm1(-n * np.log1p(i))
    free = paid_back == 0.0
    return np.where(free, 1.0 / n, i / np.where(free, 1.0, paid_back))


def present_value(yearly: ArrayLike, interest: ArrayLike, life: ArrayLike) -> Floats:
    """What equal payments at the end of each year of `life` are worth today."""
    return np.asarray(np.asarray(yearly, dtype=float) / annuity(interest, life))


def yearly_energy(power: ArrayLike, hours: ArrayLike) -> Floats:
    """Energy [kWh] of an electrical `power` [W] over `hours` [h] in a year."""
    return np.asarray(np.multiply(power, hours, dtype=float) / 1000.0)


def costs(money: Money, energy: Floats, plate_area: Floats, fan_price: Floats) -> Costs:
    """Costs of designs that take `energy` [kWh] a year, shapes (n,).

    `plate_area` [m2] is what `money.plate_price` counts, `fan_price` that of all fans of a design.
    `yearly_cost` is energy plus the annuity of the investment, `present_value` the investment plus
    what the energy of the whole life is worth today.
    """
    investment = np.asarray(money.plate_price * plate_area + fan_price)
    bill = np.asarray(money.electricity_price * energy)
    return Costs(
        investment=investment,
        yearly_energy_cost=bill,
        yearly_cost=bill + investment * annuity(money.interest, money.life),
        present_value=investment + present_value(bill, money.interest, money.life),
    )

"""Why this fan, in plain words: the choice beside the next best, the largest and the cheapest.

Sentences from duty points already found; tables and pictures are for the command line.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from problems.costs import Money, yearly_energy
from problems.fans.catalogue import Catalogue
from problems.fans.curves import Curves, Ints
from problems.fans.terms import CAUTIONS, Duty
from problems.units import format_number, format_value


@dataclass(frozen=True)
class Ranked:
    """Every fan of a catalogue at one duty: `duty` (A,) of all arrangements, `order` (F,) of rows.

    `order` is what `choice.ranking` gives; the first one is the choice where it holds the point.
    """

    catalogue: Catalogue
    curves: Curves
    duty: Duty
    order: Ints

    def name(self, row: int) -> str:
        """The arrangement in words."""
        count = int(self.curves.count[row])
        name = self.catalogue.fans[self.curves.fan[row]].name
        return name if count == 1 else f"{count} {name} in parallel"

    def price(self, row: int) -> float | None:
        """Price of all fans of an arrangement, None where the catalogue gives none."""
        price = self.catalogue.fans[self.curves.fan[row]].price
        return None if price is None else price * float(self.curves.count[row])

    @property
    def holders(self) -> list[int]:
        """The rows of `order` that hold the point, cheapest to run first."""
        return [int(row) for row in self.order if self.duty.holds[row]]

    @property
    def largest(self) -> int:
        """The row of `order` whose fan moves most air by itself."""
        each = self.curves.end[self.order] / self.curves.count[self.order]
        return int(self.order[np.argmax(each)])

    @property
    def cheapest(self) -> int | None:
        """The row that costs least to buy of those that hold the point; None without prices."""
        priced = {row: price for row in self.holders if (price := self.price(row)) is not None}
        return min(priced, key=lambda row: priced[row]) if priced else None


def speed_text(speed: float) -> str:
    """A speed [1/s] as it stands on a nameplate."""
    return f"{format_number(round(60.0 * speed))} rpm"


def justification(ranked: Ranked, hours: float, money: Money) -> str:
    """One paragraph: the choice, its cost in a year of `hours` [h], and the others beside it."""
    if not ranked.holders:
        return _nobody(ranked)
    best, *others = ranked.holders
    parts = [_chosen(ranked, best, hours, money)]
    if others:
        parts.append(f"Next best is {_beside(ranked, others[0], best)}.")
    else:
        parts.append("No other fan of the catalogue holds this point.")
    if ranked.largest not in (best, *others[:1]):
        parts.append(_largest(ranked, best))
    parts += _bought(ranked, best, hours, money)
    parts += [text for name, text in CAUTIONS.items() if getattr(ranked.duty, name)[best]]
    return " ".join(parts)


def _nobody(ranked: Ranked) -> str:
    nearest = int(ranked.order[0])
    says = ranked.duty.why(nearest).says
    return f"No fan of the catalogue can serve. The nearest is {ranked.name(nearest)}: {says}."


def _chosen(ranked: Ranked, row: int, hours: float, money: Money) -> str:
    duty = ranked.duty.at(row)
    flow, pressure, power = (
        format_value(float(value), unit)
        for value, unit in (
            (duty.flow, "m3/s"),
            (duty.pressure, "Pa"),
            (duty.electrical_power, "W"),
        )
    )
    energy = yearly_energy(duty.electrical_power, hours)
    bill = energy * money.electricity_price
    cost = f" and {format_number(float(bill))} {money.currency}".rstrip() if bill > 0.0 else ""
    return (
        f"{ranked.name(row)} at {speed_text(float(duty.speed))} moves {flow} against {pressure} "
        f"with {_percent(duty.margin)} of the flow to spare before the peak of its curve, at "
        f"{_percent(duty.best_share)} of its best flow, and draws {power}, the least of the "
        f"{len(ranked.holders)} of {len(ranked.order)} fans that hold the point: "
        f"{format_number(float(energy))} kWh{cost} in {format_number(hours)} hours a year."
    )


def _percent(share: object) -> str:
    return f"{100.0 * float(np.asarray(share)):.0f} %"


def _beside(ranked: Ranked, row: int, best: int) -> str:
    """Another arrangement that holds the point, with what it draws more than the best."""
    power = ranked.duty.electrical_power
    more = float(power[row] - power[best])
    return (
        f"{ranked.name(row)}, which draws {format_value(float(power[row]), 'W')}, "
        f"{format_value(more, 'W')} or {_percent(more / power[best])} more"
    )


def _largest(ranked: Ranked, best: int) -> str:
    if ranked.duty.holds[ranked.largest]:
        return f"The largest is {_beside(ranked, ranked.largest, best)}."
    says = ranked.duty.why(ranked.largest).says.split(":")[0]
    return f"The largest, {ranked.name(ranked.largest)}, cannot serve: {says}."


def _bought(ranked: Ranked, best: int, hours: float, money: Money) -> list[str]:
    """How the choice compares with the cheapest to buy; nothing where prices are not known."""
    cheapest, price = ranked.cheapest, ranked.price(best)
    if cheapest is None or price is None:
        return []
    if cheapest == best:
        return ["It is also the cheapest to buy of those."]
    saved = price - (ranked.price(cheapest) or 0.0)
    of = f"{format_number(saved)} {money.currency or ranked.catalogue.currency}".rstrip()
    words = f"The cheapest to buy, {of} less, is {_beside(ranked, cheapest, best)}"
    if cheapest == ranked.holders[1]:
        words = f"That one is also the cheapest to buy, {of} less"
    power = ranked.duty.electrical_power
    bill = float(yearly_energy(power[cheapest] - power[best], hours)) * money.electricity_price
    if bill > 0.0:
        words += f"; the choice pays its higher price back in {format_number(saved / bill)} years"
    return [f"{words}."]

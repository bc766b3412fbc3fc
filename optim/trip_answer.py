"""Does forcing transition pay: the answer in one sentence with its numbers.

The figures come from a `TripStudy`; only how they are said is decided here.
"""

from __future__ import annotations

import numpy as np

from optim.contest import Design
from optim.trip_study import AT_POWER, PAYS, POWER, TripStudy
from problems.problem import Bools
from problems.units import format_value, shown

_NUMBERS = {1: "one", 2: "two", 3: "three"}
_HOLE = 4  # steps of the curve that a gap in what pays must be wide to be told


def answer(study: TripStudy) -> str:
    """The answer in one sentence."""
    if not any(len(front) for front in study.fronts.values()):
        return "Neither a plain nor a tripped surface meets the limits."
    if not study.references:
        return _only_tripped(study)
    if study.most <= PAYS:
        return _no(study)
    return f"{_yes(study)}{_from_stock(study)}{_where(study)}."


def intervals(study: TripStudy) -> list[tuple[float, float]]:
    """Fan powers [W] between which the best way gains more than counts, along the plain front."""
    powers, gains = study.curve
    if not gains:
        return []
    paying = np.max(list(gains.values()), axis=0) > PAYS
    return [(float(powers[a]), float(powers[b])) for a, b in _runs(paying)]


def way_in_words(study: TripStudy, design: Design) -> str:
    """A design's wires in words: "one 0.9 mm wire at 6 % of the length"."""
    trip = next(way.case.trip for way in study.ways if way.name == design.entry)
    height, length = design.settings["trip_height"], design.settings["length"]
    if trip is None or height == 0.0:
        return "no wire"
    place = f"{_digits(100 * design.settings['trip_position'] / length)} % of the length"
    size = _short(height, "m")
    if trip.sort == "grit":
        return f"a strip of {size} grit at {place}"
    if trip.wires == 1:
        return f"one {size} wire at {place}"
    pitch = _digits(100 * design.settings["trip_pitch"] / length)
    return f"{_NUMBERS[trip.wires]} {size} wires from {place} on, {pitch} % apart,"


def _yes(study: TripStudy) -> str:
    won = study.winners[study.shown, AT_POWER, study.best]
    plain = study.winners[study.shown, AT_POWER, "plain"]
    power = _short(study.references[study.shown][POWER], "W")
    plural = "give" if way_in_words(study, won).endswith(",") else "gives"
    gain, sure = study.gain(study.shown, study.best), study.guaranteed(study.shown, study.best)
    told = f"At {power} of fan power {way_in_words(study, won)} "
    if study.merit.outcome != "hottest_wall":
        what = "more heat" if study.merit.outcome == "heat" else "more mean coefficient"
        return (
            f"{told}{plural} {percent(gain)} {what} than the best plain surface "
            f"({_sure(sure)} over the onset band)"
        )
    inlet = study.case.fluid.temperature
    verb = plural.replace("give", "lower")
    ends = " to ".join(celsius(design["hottest_wall"]) for design in (plain, won))
    return (
        f"{told}{verb} the hottest wall from {ends}: its excess over the inlet, "
        f"{_short(plain['hottest_wall'] - inlet, 'delta K')} on the best plain surface, falls by "
        f"{percent(gain / (1.0 + gain))} ({_sure(sure / (1.0 + sure))} over the onset band)"
    )


def _sure(gain: float) -> str:
    return f"at least {percent(gain)}" if gain > PAYS else f"but only {percent(max(gain, 0.0))}"


def _from_stock(study: TripStudy) -> str:
    """What a wire from stock with a margin gives, where the answer is a wire."""
    wire = study.stocked
    if wire is None or study.wire_way != study.best:
        return ""
    gain = wire.gain / (1.0 + wire.gain) if study.merit.outcome == "hottest_wall" else wire.gain
    size = format_value(wire.height, "m")
    return f"; {size} from stock, which trips with a margin, makes it {percent(max(gain, 0.0))}"


def _where(study: TripStudy) -> str:
    """Between which fan powers it pays, as the end of the sentence."""
    found, powers = intervals(study), study.curve[0]
    if not found:
        return ""
    low, high = found[0][0], found[-1][1]
    if len(found) > 1:
        each = " and ".join(f"from {_short(a, 'W')} to {_short(b, 'W')}" for a, b in found)
        return f"; it pays {each}"
    told = []
    if low > powers[0]:
        told.append(f"below {_short(low, 'W')} it never pays")
    if high < powers[-1]:
        told.append(f"above {_short(high, 'W')} no longer")
    if not told:
        return f"; it pays from {_short(low, 'W')} to {_short(high, 'W')}, all of the plain front"
    return f"; {', '.join(told)}"


def _no(study: TripStudy) -> str:
    from problems.trip_verdicts import why_not

    plain = [study.winners[place, AT_POWER, "plain"] for place in range(len(study.references))]
    why = why_not(study.case, [{**one.settings, **one.outcomes} for one in plain])
    most = max(study.most, 0.0)
    gains = (
        f"no wire gains as much as {percent(0.001)}"
        if most < 0.001
        else (f"the best of them gains at most {percent(most)}")
    )
    ends = " to ".join(_short(study.references[place][POWER], "W") for place in (0, -1))
    return f"Tripping does not pay here: at equal fan power, {ends}, {gains}, {why}."


def _only_tripped(study: TripStudy) -> str:
    least = {
        entry.name: float(study.fronts[entry.name].table["fan_power_W"].min())
        for entry in study.entries
        if len(study.fronts[entry.name])
    }
    name = min(least, key=lambda one: least[one])
    return (
        "Only a tripped surface meets the limits here, no plain one does: the least fan power is "
        f"{_short(least[name], 'W')}, with {name}."
    )


def _runs(mask: Bools) -> list[tuple[int, int]]:
    """First and last place of each stretch where `mask` holds; short holes are passed over."""
    places = np.flatnonzero(mask)
    if not places.size:
        return []
    parts = np.split(places, np.flatnonzero(np.diff(places) > _HOLE) + 1)
    return [(int(part[0]), int(part[-1])) for part in parts]


def celsius(kelvin: float) -> str:
    """A temperature to a tenth of a degree."""
    label, factor, offset = shown("K")
    return f"{kelvin * factor + offset:.1f} {label}"


def percent(share: float) -> str:
    """A share as a percentage with no more digits than it deserves."""
    value = 100.0 * share
    return f"{_digits(value)} %" if abs(value) >= 0.05 else "0 %"


def _digits(value: float) -> str:
    return f"{value:.0f}" if abs(value) >= 9.95 else f"{value:.1f}".removesuffix(".0")


def _short(value: float, unit: str) -> str:
    return format_value(float(f"{value:.2g}"), unit)

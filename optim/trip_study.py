"""The study behind `trips`: fronts of all ways to trip, the contest between them, band, map, wire.

Gathers; what is said of it is in `trip_account`, what is drawn in `trip_pictures`. Outcomes are
known by name only, the physics is asked of `problems.trips`.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from optim.contest import (
    Criterion,
    Design,
    Entry,
    Told,
    Winners,
    feasible,
    fronts,
    hold,
    spread_along,
)
from optim.front import Front
from optim.picks import column, designs
from problems.problem import Aim, Floats

if TYPE_CHECKING:
    from problems.case import Case
    from problems.trip_band import Banded
    from problems.trips import Strategy, TripMap, WireChoice

POWER, AREA = "fan_power", "plate_area"
AT_POWER, AT_MERIT, AT_AREA, EVEN = "equal power", "equal merit", "equal area", "even"
PAYS = 0.01  # a smaller gain is none: models and makers do not come nearer
_SHARES = (0.1, 0.3, 0.5, 0.7, 0.9)  # of the plain front's power, by ratio: the references
_AS_GOOD = 0.005  # of gain: a simpler way that comes so near is preferred
_STILL = 0.98  # of the merit that the most even design must keep
_CURVE = 240  # powers at which fronts are compared
STEPS = 6 * (len(_SHARES) * 3 + 2)  # that `told` hears of at most


@dataclass(frozen=True)
class Stocked:
    """A wire with the next stock diameter [m] in place of the one searched.

    `gain` and `guaranteed` at the power that it draws, `fails_below` as in `WireChoice`.
    """

    height: float
    gain: float
    guaranteed: float
    fails_below: float


@dataclass(frozen=True, eq=False)
class TripStudy:
    """Everything found about forcing transition in a case.

    `entries` are the ways, the plain one first; `winners` by place of the reference, key of the
    criterion and name of the way; `bands` by place and name, of the winners at equal power;
    `shown` is the reference that is told of; `best` the way to take there, `wire` and `wire_way`
    its wire, `stocked` the same from stock, or None. `curve` holds fan powers and the gain of
    each way at them.
    """

    case: Case
    ways: tuple[Strategy, ...]
    entries: tuple[Entry, ...]
    merit: Aim
    levels: tuple[float, float] | None
    seed: int
    fronts: dict[str, Front]
    references: tuple[Design, ...]
    winners: Winners
    bands: dict[tuple[int, str], Banded]
    shown: int
    best: str
    curve: tuple[Floats, dict[str, Floats]]
    maps: tuple[TripMap, ...]
    wire_way: str | None
    wire: WireChoice | None
    stocked: Stocked | None

    def worth(self, design: Design) -> float:
        """The merit of a design as a positive figure to be had most of."""
        return _worth(self.case, self.merit, design)

    def gain(self, place: int, name: str, key: str = AT_POWER) -> float:
        """Gain of a way by a criterion: merit over the plain one's, or power saved, as a share."""
        won, plain = self.winners[place, key, name], self.winners[place, key, "plain"]
        if key == AT_MERIT:
            return 1.0 - won[POWER] / plain[POWER]
        return self.worth(won) / self.worth(plain) - 1.0

    def guaranteed(self, place: int, name: str) -> float:
        """Least gain at equal power over the band of onsets, the given one included."""
        nominal = self.gain(place, name)
        if (place, name) not in self.bands:
            return nominal
        return min(nominal, float(self.bands[place, name].gain.min()))

    @property
    def names(self) -> list[str]:
        """The ways that force transition, without the plain one."""
        return [entry.name for entry in self.entries[1:]]

    @property
    def most(self) -> float:
        """The greatest gain at equal power of any way at any reference."""
        places = range(len(self.references))
        return max((self.gain(place, name) for place in places for name in self.names), default=0.0)


def studied(
    case: Case,
    levels: tuple[float, float] | None = None,
    seed: int = 1,
    told: Told = lambda: None,
) -> TripStudy:
    """Study forcing transition in a case of kind `plate` or `stack`.

    `levels` are the least and greatest free-stream turbulence [%] that may occur; without them
    onset is taken as uncertain by a factor. `told` is called after each step.
    """
    from problems.kinds.statement import build
    from problems.trips import merit, strategies

    ways = strategies(case)
    entries = tuple(Entry(way.name, build(way.case)) for way in ways)
    aim = Aim(*merit(case))
    known = fronts(entries, (aim, Aim(POWER, "least")), seed, told)
    references = spread_along(entries[0], known["plain"], POWER, _SHARES)
    winners = hold(entries, known, references, criteria(aim), seed, told)
    gains = [
        {name: _gain(case, aim, winners, place, name) for name in known}
        for place in range(len(references))
    ]
    shown = _shown(gains)
    best = _simplest(gains[shown], list(known)) if gains else ""
    winners |= _most_even(entries, known, references, winners, aim, shown, seed, told)
    wire_way, wire = _wire(ways, winners, shown, best, gains)
    return TripStudy(
        case,
        ways,
        entries,
        aim,
        levels,
        seed,
        known,
        references,
        winners,
        _bands(ways, winners, len(references), levels),
        shown,
        best,
        _curve(case, aim, entries, known, winners),
        _maps(case, winners, shown, wire_way),
        wire_way,
        wire,
        _stocked(ways, winners, shown, wire_way, wire, levels),
    )


def criteria(merit: Aim) -> tuple[Criterion, ...]:
    """The three ways to compare on equal terms."""
    return (
        Criterion(AT_POWER, merit, at_most=(POWER,)),
        Criterion(AT_MERIT, Aim(POWER, "least"), no_worse=(merit,)),
        Criterion(AT_AREA, merit, at_most=(POWER, AREA)),
    )


def _worth(case: Case, merit: Aim, design: Design) -> float:
    from problems.trips import merit_values

    return float(merit_values(case, {merit.outcome: np.array([design[merit.outcome]])})[0])


def _gain(case: Case, merit: Aim, winners: Winners, place: int, name: str) -> float:
    won, plain = (_worth(case, merit, winners[place, AT_POWER, n]) for n in (name, "plain"))
    return won / plain - 1.0


def _shown(gains: Sequence[Mapping[str, float]]) -> int:
    """The middle reference if tripping pays there or nowhere, else the one where it pays most."""
    if not gains:
        return 0
    most = [max(one.values()) for one in gains]
    middle = len(gains) // 2
    return middle if most[middle] > PAYS or max(most) <= PAYS else int(np.argmax(most))


def _simplest(gains: Mapping[str, float], names: Sequence[str]) -> str:
    """The first way in order that comes near the best; the plain one where none pays."""
    enough = max(gains.values()) - _AS_GOOD
    if max(gains.values()) <= PAYS:
        return "plain"
    return next(name for name in names if gains[name] >= enough)


def _most_even(
    entries: Sequence[Entry],
    known: Mapping[str, Front],
    references: Sequence[Design],
    winners: Winners,
    merit: Aim,
    shown: int,
    seed: int,
    told: Told,
) -> Winners:
    """The most even design of every way at the power and near the merit of the shown reference.

    Where the merit is the hottest wall itself, that is the winner at equal power.
    """
    if not references:
        return {}
    if merit.outcome == "hottest_wall":
        return {
            (shown, EVEN, entry.name): winners[shown, AT_POWER, entry.name] for entry in entries
        }
    even = Criterion(EVEN, Aim("evenness", "most"), (POWER,), (merit,), _STILL)
    found = hold(entries, known, [references[shown]], [even], seed, told)
    return {(shown, EVEN, name): design for (_, _, name), design in found.items()}


def _bands(
    ways: Sequence[Strategy],
    winners: Winners,
    references: int,
    levels: tuple[float, float] | None,
) -> dict[tuple[int, str], Banded]:
    """What each winner at equal power gives over the band of onsets."""
    from problems.trip_band import over_band

    cases = {way.name: way.case for way in ways}
    found = {}
    for place in range(references):
        plain = winners[place, AT_POWER, "plain"]
        for way in ways:
            won = winners[place, AT_POWER, way.name]
            found[place, way.name] = over_band(
                cases[won.entry], cases["plain"], won.settings, plain.settings, levels
            )
    return found


def _wire(
    ways: Sequence[Strategy],
    winners: Winners,
    shown: int,
    best: str,
    gains: Sequence[Mapping[str, float]],
) -> tuple[str | None, WireChoice | None]:
    """The way whose wire is told of and its wire: of the best way, or of the best of wires."""
    from problems.trips import wire_choice

    wired = {
        way.name: way
        for way in ways
        if way.case.trip is not None
        and way.case.trip.sort == "wire"
        and gains
        and winners[shown, AT_POWER, way.name].entry == way.name
        and winners[shown, AT_POWER, way.name].settings["trip_height"] > 0.0
    }
    if not wired:
        return None, None
    name = best if best in wired else max(wired, key=lambda one: gains[shown][one])
    design = winners[shown, AT_POWER, name]
    return name, wire_choice(wired[name].case, design.settings, way=wired[name])


def _stocked(
    ways: Sequence[Strategy],
    winners: Winners,
    shown: int,
    wire_way: str | None,
    wire: WireChoice | None,
    levels: tuple[float, float] | None,
) -> Stocked | None:
    """What the wire gives with the next diameter in stock that trips with the margin."""
    from problems.trip_band import over_band
    from problems.trips import wire_choice

    if wire is None or not wire.stock:
        return None
    way = next(way for way in ways if way.name == wire_way)
    design, plain = winners[shown, AT_POWER, way.name], winners[shown, AT_POWER, "plain"]
    settings = {**design.settings, "trip_height": wire.stock[0]}
    given = over_band(way.case, ways[0].case, settings, plain.settings, levels)
    nominal = over_band(way.case, ways[0].case, settings, plain.settings, None)
    gain = float(nominal.gain[len(nominal.gain) // 2])
    again = wire_choice(way.case, settings, way=way)
    return Stocked(wire.stock[0], gain, min(gain, float(given.gain.min())), again.fails_below)


def _maps(case: Case, winners: Winners, shown: int, wire_way: str | None) -> tuple[TripMap, ...]:
    """The map over velocity and place, for a stack over velocity and gap too."""
    from problems.trips import trip_map

    won = winners.get((shown, AT_POWER, wire_way or "plain"))
    if won is None:
        return ()
    rows = ("trip_share",) if case.plates.gap is None else ("trip_share", "gap")
    return tuple(trip_map(case, won.settings, name) for name in rows)


def _curve(
    case: Case,
    merit: Aim,
    entries: Sequence[Entry],
    known: Mapping[str, Front],
    winners: Winners,
) -> tuple[Floats, dict[str, Floats]]:
    """Fan powers along the plain front and the gain of every other way at each of them."""
    if not len(known["plain"]):
        return np.empty(0), {}
    bare = [_without(entries[0], merit, front) for front in known.values() if len(front)]
    base = _envelope(case, merit, "plain", winners, bare)
    powers = np.geomspace(base[0][0], base[0][-1], _CURVE) if base[0][0] > 0.0 else base[0]
    plain = _at(powers, base)
    gains = {}
    for entry in entries[1:]:
        found = _of_front(entry, merit, known[entry.name])
        other = _envelope(case, merit, entry.name, winners, [found])
        reached = _at(powers, other) if len(other[0]) else plain
        gains[entry.name] = np.maximum(reached / plain - 1.0, 0.0)
    return powers, gains


def _without(base: Entry, merit: Aim, front: Front) -> tuple[Floats, Floats]:
    """Fan powers and merit outcome of the designs of any front with their wires left away."""
    rows = designs(front, base.problem)
    given = base.problem.evaluate(rows)
    sound = feasible(base.problem, given)
    return given.outcomes[POWER][sound], given.outcomes[merit.outcome][sound]


def _of_front(entry: Entry, merit: Aim, front: Front) -> tuple[Floats, Floats]:
    return column(front, entry.problem, POWER), column(front, entry.problem, merit.outcome)


def _envelope(
    case: Case,
    merit: Aim,
    name: str,
    winners: Winners,
    found: Sequence[tuple[Floats, Floats]],
) -> tuple[Floats, Floats]:
    """Fan powers and merit of a way's best designs, both rising: none that a cheaper one beats."""
    from problems.trips import merit_values

    named = [
        won
        for (_, key, of), won in winners.items()
        if of == name and won.entry == name and key in (AT_POWER, AT_MERIT)
    ]
    own = [np.array([won[outcome] for won in named]) for outcome in (POWER, merit.outcome)]
    powers = np.concatenate([own[0], *(one[0] for one in found)])
    figures = np.concatenate([own[1], *(one[1] for one in found)])
    worth = merit_values(case, {merit.outcome: figures})
    order = np.lexsort((-worth, powers))
    powers, worth = powers[order], worth[order]
    so_far = np.maximum.accumulate(np.concatenate([[-np.inf], worth[:-1]]))
    return powers[worth > so_far], worth[worth > so_far]


def _at(powers: Floats, envelope: tuple[Floats, Floats]) -> Floats:
    """The most merit at these powers, by ratio between designs; none below the first of them."""
    known, worth = envelope
    found = np.exp(np.interp(np.log(powers), np.log(known), np.log(worth)))
    return np.where(powers < known[0], 0.0, found)

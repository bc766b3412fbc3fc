"""Does forcing transition pay: the ways to do it, the map over speed and place, the wire itself.

States each way as a case of its own and evaluates grids of designs; the searches that compare the
ways on equal terms are for `optim`.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Literal

import numpy as np
from numpy.typing import NDArray

from problems.case import Case
from problems.convection import passage, transition
from problems.kinds.statement import SweptPlates
from problems.kinds.swept import free_stream_turbulence
from problems.problem import Evaluation, Floats
from problems.rules import Position, Span
from problems.tables import STOCK, Trip

ONSET_BAND = 1.5  # an honest band on the onset Re_x, either way
_EDGE_SHARE = 0.03  # "at the leading edge": the first per cents of the length
_PITCH = Position(0.03, 0.4, True)
_TALLEST = 5e-3  # m, wire searched where the case names none
_FITTING = {"opposite": 0.36, "alone": 0.45}  # share of the gap that one wire may take in a map


@dataclass(frozen=True)
class Strategy:
    """One way to force transition, or none: a name, a line of meaning, and the case of it."""

    name: str
    meaning: str
    case: Case


def strategies(case: Case) -> tuple[Strategy, ...]:
    """The ways to compare for `case`, the plain one first; all else as the case has it.

    Places and diameters stay within what the case allows, so a wire at the leading edge stands as
    near to it as the case lets it.
    """
    trip = case.trip or _any_wire(case)
    one = trip.model_copy(update={"wires": 1, "spacing": None, "sort": "wire"})

    def way(name: str, meaning: str, **update: object) -> Strategy:
        changed = one.model_copy(update=update)
        return Strategy(name, meaning, case.model_copy(update={"trip": changed}))

    pitch = trip.spacing or _PITCH
    return (
        Strategy("plain", "no wire", case.model_copy(update={"trip": None})),
        way("one wire", "one wire, place and diameter free"),
        way("edge wire", "one wire at the leading edge", position=_edge(trip)),
        way("two wires", "two wires in a row", wires=2, spacing=pitch),
        way("three wires", "three wires in a row", wires=3, spacing=pitch),
        way("grit strip", "a strip of three-dimensional grit", sort="grit"),
    )


def with_onset(case: Case, factor: float) -> Case:
    """The same case with natural onset moved to `factor` times its Re_x."""
    _, natural = free_stream_turbulence(case)
    update = {"turbulence": None, "critical_reynolds": natural * factor}
    return case.model_copy(update={"fluid": case.fluid.model_copy(update=update)})


def with_turbulence(case: Case, percent: float) -> Case:
    """The same case in a stream of another turbulence level [%]."""
    update = {"turbulence": percent, "critical_reynolds": None}
    return case.model_copy(update={"fluid": case.fluid.model_copy(update=update)})


def band(case: Case, low: float | None = None, high: float | None = None) -> tuple[Case, ...]:
    """Cases over what is uncertain in the onset, from early to late, the given one in the middle.

    Between the turbulence levels `low` and `high` [%] where they are given, else a factor 1.5 in
    Re_x either way.
    """
    if low is None or high is None:
        factors = np.geomspace(1.0 / ONSET_BAND, ONSET_BAND, 5)
        return tuple(with_onset(case, float(factor)) for factor in factors)
    return tuple(with_turbulence(case, float(level)) for level in np.geomspace(high, low, 7))


def _any_wire(case: Case) -> Trip:
    """A wire to try where the case names none."""
    gap = case.plates.gap
    tallest = _TALLEST if gap is None else min(_TALLEST, 0.35 * gap.high)
    return Trip.model_validate(
        {"position": ["1 %", "90 %"], "height": ["0 mm", f"{1e3 * tallest} mm"]}
    )


def _edge(trip: Trip) -> Position:
    """The places nearest to the leading edge that the case allows."""
    place = trip.position
    far = max(_EDGE_SHARE, place.low) if place.is_share else 2.0 * place.low
    return Position(place.low, min(far, place.high), place.is_share)


@dataclass(frozen=True)
class TripMap:
    """Gain by tripping over two settings: arrays of shape (rows, columns).

    `gain` compares `merit` with that of the plain surface at the fan power of the wired one;
    `sort` tells why there is none (see `SORTS`); `columns` and `rows` name the settings [SI], a
    place as share of the length; `height` is the wire [m] that was taken; `fixed` is the rest.
    """

    merit: str
    columns: tuple[str, Floats]
    rows: tuple[str, Floats]
    gain: Floats
    sort: NDArray[np.intp]
    height: Floats
    fixed: dict[str, float]


SORTS = (
    "a wire changes the flow",
    "turbulent ahead of the wire",
    "the gap cannot keep up turbulence",
    "a wire that trips does not fit",
)
CHANGES, TURBULENT_AHEAD, NOT_KEPT, NO_ROOM = range(4)


def trip_map(case: Case, base: Mapping[str, float], rows: str, points: int = 220) -> TripMap:
    """The map over velocity and `rows` ("trip_share" or "gap") around the settings `base`.

    Every point carries the smallest wire that trips there (U k/nu = 900), the largest that fits
    where that one does not, or the case's own where its height is fixed. Plain surfaces are taken
    at the velocity that draws the same fan power.
    """
    one = strategies(case)[1].case
    wired, plain = SweptPlates(one), SweptPlates(strategies(case)[0].case)
    speeds = _spread(case.flow.velocity, points)
    levels = _spread(_rows_of(one, rows), points)
    speed, level = (grid.ravel() for grid in np.meshgrid(speeds, levels))
    given = _around(base, speed.size) | {"velocity": speed}
    share = base["trip_position"] / base["length"] or 0.05
    given |= {"gap": level} if rows == "gap" else {}
    given["trip_position"] = (level if rows == "trip_share" else share) * given["length"]
    wanted = _smallest(wired, case, given)
    given["trip_height"] = np.minimum(wanted, _room(one, given))
    got = wired.evaluate_settings(given)
    sort = _sorts(wired, given, got, wanted)
    gain = _gain_at_equal_power(plain, given, got, points)
    gain = np.where(got.possible & np.isfinite(gain), gain, np.nan)
    shape = (points, points)
    return TripMap(
        merit(case)[0],
        ("velocity", speeds),
        (rows, levels),
        gain.reshape(shape),
        sort.reshape(shape),
        given["trip_height"].reshape(shape),
        {name: value for name, value in base.items() if name not in (rows, "velocity")},
    )


def merit(case: Case) -> tuple[str, Literal["most", "least"]]:
    """What forcing transition is for, as an aim.

    Most heat, into the surface where that is the colder one; under a given flux the least hottest
    wall; under one that cools the fluid most mean coefficient.
    """
    flux, wall = case.plates.surface.flux, case.plates.surface.temperature
    if flux is None:
        return "heat", "least" if (wall or 0.0) < case.fluid.temperature else "most"
    return ("hottest_wall", "least") if flux > 0.0 else ("mean_h", "most")


def merit_values(case: Case, outcomes: Mapping[str, Floats]) -> Floats:
    """The merit as a positive figure to be had most of: heat, or 1 over the wall's excess [1/K]."""
    name, _ = merit(case)
    if name == "hottest_wall":
        return 1.0 / np.maximum(outcomes[name] - case.fluid.temperature, 1e-9)
    return np.abs(outcomes[name])


def _spread(span: Span, points: int) -> Floats:
    """Points over a range by ratio; around a fixed value from a third to three times of it."""
    low, high = (span.low / 3.0, 3.0 * span.high) if span.fixed else (span.low, span.high)
    return np.geomspace(low, high, points)


def _rows_of(case: Case, rows: str) -> Span:
    if rows == "gap":
        return case.plates.gap or Span(1e-3, 1e-2)
    return Span(0.01, 0.95)


def _around(base: Mapping[str, float], count: int) -> dict[str, Floats]:
    """The settings of one design, repeated."""
    return {name: np.full(count, value) for name, value in base.items()}


def _smallest(problem: SweptPlates, case: Case, given: dict[str, Floats]) -> Floats:
    """The smallest wire that trips (U k/nu = 900) at each design; the case's own if fixed."""
    if case.trip is not None and case.trip.height.fixed:
        return np.full(given["length"].shape, case.trip.height.low)
    height = np.full(given["length"].shape, 1e-3)
    for _ in range(3):  # the film temperature moves a little with the wire
        got = problem.evaluate_settings({**given, "trip_height": height})
        reached = np.maximum(got.outcomes["wire_reynolds"], 1e-3)
        height = np.minimum(height * transition.WIRE_DESIGN / reached, 0.1)
    return height


def _room(case: Case, given: dict[str, Floats]) -> Floats:
    """The tallest wire [m] that a gap takes at each design."""
    if "gap" not in given or case.trip is None:
        return np.full(given["length"].shape, np.inf)
    opposite = case.trip.walls == "both" and case.trip.facing == "opposite"
    return _FITTING["opposite" if opposite else "alone"] * given["gap"]


def _sorts(
    problem: SweptPlates, given: dict[str, Floats], got: Evaluation, wanted: Floats
) -> NDArray[np.intp]:
    """Why a wire changes nothing at each design; see `SORTS`."""
    bare = problem.evaluate_settings({**given, "trip_height": 0.0 * given["length"]})
    sort = np.full(given["length"].shape, CHANGES)
    sort[(wanted > given["trip_height"]) | ~got.possible] = NO_ROOM
    sort[bare.outcomes["onset"] < 1.0001 * given["trip_position"]] = TURBULENT_AHEAD
    if "gap" in given:
        sort[got.outcomes["gap_reynolds"] < passage.BAND_LOW] = NOT_KEPT
    return sort


def _gain_at_equal_power(
    plain: SweptPlates, given: dict[str, Floats], got: Evaluation, points: int
) -> Floats:
    """Merit of the wired designs over that of plain ones at the same fan power, less one.

    Plain surfaces differ along the rows only by the gap: one curve over velocity for each row.
    """
    rows = given["length"].reshape(points, points).shape[0]
    speeds = np.geomspace(0.25 * given["velocity"].min(), 4.0 * given["velocity"].max(), 2 * points)
    first = {name: values.reshape(rows, points)[:, :1] for name, values in given.items()}
    curve = {name: np.repeat(values, speeds.size, axis=1).ravel() for name, values in first.items()}
    none = np.zeros(rows * speeds.size)
    curve |= {"velocity": np.tile(speeds, rows), "trip_height": none, "trip_position": none}
    bare = plain.evaluate_settings(curve)
    power = np.log(bare.outcomes["fan_power"]).reshape(rows, -1)
    value = np.log(merit_values(plain.case, bare.outcomes)).reshape(rows, -1)
    wanted = np.log(got.outcomes["fan_power"]).reshape(rows, points)
    reached = np.log(merit_values(plain.case, got.outcomes)).reshape(rows, points)
    equal = np.stack([np.interp(w, p, v) for w, p, v in zip(wanted, power, value, strict=True)])
    return np.asarray(np.expm1(reached - equal)).ravel()


@dataclass(frozen=True)
class WireChoice:
    """The wire of one design: lengths in m, `speed` and the like as shares of the design's.

    `smallest` trips with the stated margin; behind `enough` more height only adds drag; `stock`
    are the next sizes to be had from `smallest` upward; `fails_below` is the share of the velocity
    under which the wire no longer trips (0 if it never fails, 1 if it does not trip at all);
    `tolerance` the changes of merit and fan power over the mounting tolerances, as shares.
    `merit` and `power` run over `heights`, the first of which is no wire; `turned_down` and
    `turned_down_bare` are the merit with the wire and without over `speeds`, shares of the
    design's velocity.
    """

    margin: float
    smallest: float | None
    enough: float
    stock: tuple[float, ...]
    fails_below: float
    tolerance: Mapping[str, tuple[float, float]]
    heights: Floats
    merit: Floats
    power: Floats
    speeds: Floats
    turned_down: Floats
    turned_down_bare: Floats


def wire_choice(
    case: Case,
    base: Mapping[str, float],
    margin: float = 1.1,
    place_tolerance: float = 2e-3,
    height_tolerance: float = 0.1,
    way: Strategy | None = None,
) -> WireChoice:
    """What wire the design with the settings `base` wants; its place stays as it is.

    `margin` is on U k/nu over 900; tolerances are on the place [m] and, as a share, the diameter;
    `way` is the strategy of the design, one wire by default (a strip of grit is no wire).
    """
    problem = SweptPlates((way or strategies(case)[1]).case)
    tallest = min(0.39 * base.get("gap", 1.0), 8e-3)
    heights = np.linspace(0.0, tallest, 801)
    got = problem.evaluate_settings(_around(base, heights.size) | {"trip_height": heights})
    value = merit_values(case, got.outcomes)
    trips = got.outcomes["wire_reynolds"] >= margin * transition.WIRE_DESIGN
    holds = trips & (got.outcomes["onset"] <= 1.02 * base["trip_position"])
    smallest = float(heights[np.argmax(holds)]) if holds.any() else None
    best = value[0] + 0.995 * (value.max() - value[0])
    stock = case.trip.stock if case.trip is not None else STOCK
    speeds, fails_below, wired, bare = _turndown(problem, base)
    fitting = [size for size in stock if smallest is not None and smallest <= size <= tallest]
    return WireChoice(
        margin,
        smallest,
        float(heights[np.argmax(value >= best)]),
        tuple(fitting[:3]),
        fails_below,
        _tolerances(problem, base, place_tolerance, height_tolerance),
        heights,
        value,
        got.outcomes["fan_power"],
        speeds,
        wired,
        bare,
    )


def _turndown(
    problem: SweptPlates, base: Mapping[str, float]
) -> tuple[Floats, float, Floats, Floats]:
    """Shares of the design velocity, the one under which the wire does not set the onset, and
    the merit with the wire and without at each.
    """
    share = np.linspace(0.05, 1.0, 400)
    given = _around(base, share.size) | {"velocity": share * base["velocity"]}
    got = problem.evaluate_settings(given)
    bare = problem.evaluate_settings({**given, "trip_height": 0.0 * share})
    tripped = (got.outcomes["onset"] <= 1.25 * base["trip_position"]) & (
        got.outcomes["wire_reynolds"] >= transition.WIRE_LOW
    )
    failing = np.flatnonzero(~tripped)
    return (
        share,
        float(share[failing[-1]]) if failing.size else 0.0,
        merit_values(problem.case, got.outcomes),
        merit_values(problem.case, bare.outcomes),
    )


def _tolerances(
    problem: SweptPlates, base: Mapping[str, float], place: float, height: float
) -> dict[str, tuple[float, float]]:
    """Least and greatest relative change of merit and fan power over the mounting tolerances."""
    moves, sizes = np.meshgrid(np.linspace(-place, place, 9), np.linspace(-height, height, 9))
    given = _around(base, moves.size)
    given["trip_position"] = np.maximum(given["trip_position"] + moves.ravel(), 1e-5)
    given["trip_height"] = given["trip_height"] * (1.0 + sizes.ravel())
    nominal = problem.evaluate_settings(_around(base, 1)).outcomes
    got = problem.evaluate_settings(given).outcomes
    merits = merit_values(problem.case, got) / merit_values(problem.case, nominal)[0] - 1.0
    powers = got["fan_power"] / nominal["fan_power"][0] - 1.0
    return {
        name: (float(change.min()), float(change.max()))
        for name, change in (("merit", merits), ("fan_power", powers))
    }

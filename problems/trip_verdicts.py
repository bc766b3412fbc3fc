"""Plain verdicts on tripping: what in a case makes no sense, and why a wire does not pay.

Reads off the model's own outcomes; decides nothing that the search has not found.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence

import numpy as np

from problems.case import Case
from problems.convection import transition
from problems.convection.passage import BAND_LOW
from problems.kinds.statement import SweptPlates
from problems.kinds.swept import free_stream_turbulence
from problems.problem import Evaluation, Limit
from problems.trips import strategies
from problems.units import format_value

_FULL = 0.8  # share of the gap that the wires of one section may fill
_EARLY = 0.5  # a layer that turns within this share of the length turns by itself


def meaningless(case: Case) -> tuple[str, ...]:
    """What the wires that a case allows cannot do, one sentence each; none for a case without."""
    return tuple(_verdicts(case)) if case.trip is not None else ()


def _verdicts(case: Case) -> Iterator[str]:
    trip = case.trip
    if trip is None:
        return
    if (gap := case.plates.gap) is not None:
        room = gap.high * _FULL / (2.0 if _opposite(case) else 1.0)
        if trip.height.low > min(room, 0.5 * gap.high):
            yield (
                f"A wire of {_mm(trip.height.low)} is too tall for every gap up to "
                f"{_mm(gap.high)}: wires may fill {_FULL:.0%} of a gap between them, and one "
                "taller than half the gap would throttle it."
            )
            return
    if not trip.position.is_share and trip.position.low >= case.plates.length.high:
        yield (
            f"The wire stands {_mm(trip.position.low)} from the leading edge, behind the end of "
            f"the plate ({_mm(case.plates.length.high)} at most): it can do nothing."
        )
        return
    yield from _too_small(case)
    yield from _turbulent_already(case)


def _opposite(case: Case) -> bool:
    trip = case.trip
    return trip is not None and trip.walls == "both" and trip.facing == "opposite"


def _too_small(case: Case) -> Iterator[str]:
    """Where even the tallest wire at the highest velocity does not trip."""
    one = strategies(case)[1].case
    if one.trip is None or one.trip.height.high == 0.0:
        return
    tallest, reach = one.trip.height.high, one.trip.position.high
    length = one.plates.length.high
    place = min(reach * length if one.trip.position.is_share else reach, 0.9 * length)
    got = _corner(one, length, one.flow.velocity.high, trip_height=tallest, trip_position=place)
    reached = float(got.outcomes["wire_reynolds"][0])
    if reached < transition.WIRE_LOW and (case.trip is None or case.trip.sort == "wire"):
        yield (
            f"No wire of the case trips: the tallest, {_mm(tallest)}, comes to U k/nu = "
            f"{reached:.0f} at the highest velocity, under {transition.WIRE_LOW:.0f}."
        )


def _turbulent_already(case: Case) -> Iterator[str]:
    """Where the layer turns by itself ahead of the nearest place of the wire, at every speed."""
    trip, length = case.trip, case.plates.length
    if trip is None:
        return
    nearest = trip.position.low * (length.low if trip.position.is_share else 1.0)
    got = _corner(strategies(case)[0].case, length.high, case.flow.velocity.low)
    onset = float(got.outcomes["onset"][0])
    if onset < min(nearest, length.high):
        yield (
            f"The layer is turbulent already where the wire may stand: it turns by itself "
            f"{_mm(onset)} from the leading edge even at the lowest velocity, the wire stands at "
            f"{_mm(nearest)} or behind: it only adds drag."
        )


def _corner(case: Case, length: float, velocity: float, **wire: float) -> Evaluation:
    """One design with the widest gap; without a wire unless given."""
    given = {
        "length": length,
        "velocity": velocity,
        "width": case.plates.width,
        "thickness": case.plates.thickness,
        "trip_height": 0.0,
        "trip_position": 0.0,
        "trip_pitch": 0.0,
        **({} if case.plates.gap is None else {"gap": case.plates.gap.high}),
        **wire,
    }
    return SweptPlates(case).evaluate_settings({k: np.array([v]) for k, v in given.items()})


def why_not(case: Case, plain: Sequence[Mapping[str, float]]) -> str:
    """Why no wire pays, as the end of a sentence.

    `plain` are settings and outcomes of the best plain designs, over the powers that matter.
    """
    early = [one["onset"] / one["length"] for one in plain if one["onset"] < one["length"]]
    turned = [share for share in early if share < _EARLY]
    reynolds = [one["gap_reynolds"] for one in plain if "gap_reynolds" in one]
    weak = [value for value in reynolds if value < BAND_LOW]
    if plain and len(weak) == len(plain):
        return f"because the gap cannot keep up turbulence ({_from_to(weak, 'Re_D')})"
    if plain and len(turned) == len(plain):
        return f"because the layer is turbulent already: it turns by itself at {_shares(turned)}"
    if weak and turned and len(weak) + len(turned) == len(plain):
        return (
            f"because narrow gaps cannot keep up turbulence ({_from_to(weak, 'Re_D')}) and in "
            f"wide ones the layer turns by itself at {_shares(turned)}"
        )
    if any(_too_small(case)):
        return "because no wire that the case allows is tall enough to trip"
    if weak:
        return (
            f"because narrow gaps cannot keep up turbulence ({_from_to(weak, 'Re_D')}) and in "
            "wide ones the drag costs what the turbulence brings"
        )
    return "because the drag costs what the turbulence brings"


def fixed_speed(case: Case, limits: Sequence[Limit]) -> str:
    """What a fixed velocity means for a comparison at equal power; empty where it is free."""
    if not case.flow.velocity.fixed:
        return ""
    also = " and some outcomes are limited" if limits else ""
    return (
        "The velocity is fixed"
        f"{also}: a wire always draws more power than the same plate without one, so at equal "
        "power it can only win with a shorter plate or a wider gap. Give a range to compare fairly."
    )


def onset_told(case: Case, levels: tuple[float, float] | None, factor: float) -> str:
    """The band of natural onset as a note: Re_x from early to late."""
    if levels is not None:
        return f"free-stream turbulence {levels[0]:.3g} to {levels[1]:.3g} %"
    _, natural = free_stream_turbulence(case)
    return (
        f"natural onset at Re_x = {natural / factor:.2g} to {natural * factor:.2g}, a factor "
        f"{factor:g} either way"
    )


def _from_to(values: Sequence[float], name: str) -> str:
    low, high = (float(f"{end:.2g}") for end in (min(values), max(values)))
    return f"{name} {low:.0f}" if low == high else f"{name} {low:.0f} to {high:.0f}"


def _shares(values: Sequence[float]) -> str:
    low, high = f"{100 * min(values):.0f}", f"{100 * max(values):.0f}"
    return f"{low} % of the length" if low == high else f"{low} to {high} % of the length"


def _mm(value: float) -> str:
    return format_value(float(f"{value:.3g}"), "m")

"""Designs under draws of what is uncertain: all designs at all draws, walked in even chunks.

What an uncertain input changes in the settings of a design. How draws are made, and what is made
of the figures, is for `optim`.
"""

from __future__ import annotations

from collections.abc import Callable, Collection, Mapping
from typing import TYPE_CHECKING

import numpy as np

from problems.case import Case
from problems.kinds.swept import CHUNK, LAWS, settings
from problems.problem import Bools, Floats
from problems.uncertain import Sampled, Uncertain

if TYPE_CHECKING:
    from problems.kinds.statement import SweptPlates

Given = dict[str, Floats]
DIRECT = (*LAWS, "fouling", "wire_criterion")  # what is drawn stands in the settings as it is
_NEAREST = 1e-5  # m, of a wire to the leading edge
_LESS = 1.0 - 1e-6  # of a velocity that a fan has decided, so that it finds the same fan again


def sampled(
    problem: SweptPlates,
    designs: Floats,
    draws: Mapping[str, Floats],
    names: Collection[str] | None = None,
) -> Sampled:
    """What `designs` give at `draws`; see `Problem.sampled`.

    A fan of a catalogue is chosen once for each design, under nominal inputs, and kept.
    """
    inputs = {known.name: known for known in problem.uncertain}
    used = {inputs[name]: np.asarray(values, dtype=float) for name, values in draws.items()}
    drawn = problem.for_inlets(_inlets(problem.case, used))
    given = settings(problem.case, designs)
    given |= _bought(problem, given)
    count = max((len(values) for values in used.values()), default=1)
    total = len(designs) * count
    parts: list[tuple[Given, Bools]] = []
    for start in range(0, max(total, 1), CHUNK):
        row, column = np.divmod(np.arange(start, min(start + CHUNK, total)), count)
        some = {name: values[row] for name, values in given.items()}
        for known, values in used.items():
            _put(problem.case, some, known, values[column])
        figures, possible = drawn.figures(some)
        kept = figures if names is None else {name: figures[name] for name in names}
        parts.append((kept, possible))
    shape = (len(designs), count)
    return Sampled(
        {
            name: np.concatenate([kept[name] for kept, _ in parts]).reshape(shape)
            for name in parts[0][0]
        },
        np.concatenate([possible for _, possible in parts]).reshape(shape),
    )


def _inlets(case: Case, used: Mapping[Uncertain, Floats]) -> tuple[float, float]:
    """Lowest and highest inlet temperature [K] that can be drawn."""
    for known in used:
        if known.name == "inlet":
            low, high = known.ends
            base = case.fluid.temperature if known.sort == "change" else 0.0
            return min(base + low, case.fluid.temperature), max(base + high, case.fluid.temperature)
    return case.fluid.temperature, case.fluid.temperature


def _bought(problem: SweptPlates, given: Given) -> Given:
    """The fan of each design under nominal inputs; nothing without a catalogue."""
    if problem.blower.catalogue is None:
        return {}
    if problem.blower.fixed:
        given = {**given, "velocity": _LESS * given["velocity"]}
    count = len(given["length"])
    rows = []
    for start in range(0, max(count, 1), CHUNK):
        some = {name: values[start : start + CHUNK] for name, values in given.items()}
        rows.append(problem.fan_rows(some))
    return {"fan_row": np.concatenate(rows).astype(float)}


def _put(case: Case, given: Given, known: Uncertain, values: Floats) -> None:
    """Change the settings `given` as the drawn `values` of an input want it."""
    moved = _MOVES[known.sort]
    if known.name in DIRECT:
        given[known.name] = values
    else:
        _SETTERS[known.name](case, given, lambda base: moved(base, values))


_MOVES: dict[str, Callable[[Floats | float, Floats], Floats]] = {
    "value": lambda base, drawn: drawn + 0.0 * base,
    "change": lambda base, drawn: base + drawn,
    "factor": lambda base, drawn: base * drawn,
}

Moved = Callable[[Floats | float], Floats]


def _onset(case: Case, given: Given, moved: Moved) -> None:
    given["onset_factor"] = moved(1.0)


def _turbulence(case: Case, given: Given, moved: Moved) -> None:
    given["turbulence"] = 100.0 * moved(0.01 * (case.fluid.turbulence or 0.0))


def _inlet(case: Case, given: Given, moved: Moved) -> None:
    given["inlet"] = moved(case.fluid.temperature)


def _velocity(case: Case, given: Given, moved: Moved) -> None:
    given["velocity"] = moved(given["velocity"])


def _gap(case: Case, given: Given, moved: Moved) -> None:
    given["gap_change"] = moved(given["gap"]) - given["gap"]


def _wire(case: Case, given: Given, moved: Moved) -> None:
    there = given["trip_height"] > 0.0
    given["trip_height"] = np.where(there, np.maximum(moved(given["trip_height"]), 0.0), 0.0)


def _wire_place(case: Case, given: Given, moved: Moved) -> None:
    there = given["trip_height"] > 0.0
    place = np.maximum(moved(given["trip_position"]), _NEAREST)
    given["trip_position"] = np.where(there, place, 0.0)


def _wire_drag(case: Case, given: Given, moved: Moved) -> None:
    given["wire_drag"] = moved(1.0 if case.trip is None else case.trip.drag_coefficient)


def _fan_efficiency(case: Case, given: Given, moved: Moved) -> None:
    given["efficiency"] = moved(case.fan.efficiency) / case.fan.efficiency


_SETTERS: dict[str, Callable[[Case, Given, Moved], None]] = {
    "onset": _onset,
    "turbulence": _turbulence,
    "inlet": _inlet,
    "velocity": _velocity,
    "gap": _gap,
    "wire": _wire,
    "wire_place": _wire_place,
    "wire_drag": _wire_drag,
    "fan_efficiency": _fan_efficiency,
}

"""What a design gives over the uncertainty of natural onset, beside the plain one at equal power.

Evaluates given designs over the cases of `trips.band`; which designs, and what follows from the
figures, is for the caller.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np

from problems.case import Case
from problems.kinds.statement import SweptPlates
from problems.problem import Evaluation, Floats
from problems.trips import band, merit, merit_values

_SPEEDS = np.geomspace(0.3, 3.5, 321)  # of the plain design's velocity


@dataclass(frozen=True)
class Banded:
    """A design and the plain one over one band of onsets, from early to late; arrays (m,).

    `merit` is the outcome that tripping is for [its SI unit], `power` the fan power [W]; the same
    of the plain design under `plain_`. `gain` is what the design gives over the plain one run at
    the velocity at which it draws the same power, less one; both meet the same onset.
    """

    merit: Floats
    power: Floats
    plain_merit: Floats
    plain_power: Floats
    gain: Floats


def over_band(
    way: Case,
    plain: Case,
    design: Mapping[str, float],
    plain_design: Mapping[str, float],
    levels: tuple[float, float] | None = None,
) -> Banded:
    """The design with the settings `design` of the case `way` over what is uncertain in onset.

    `plain_design` are the settings of the design of the case `plain` it is compared with;
    `levels` the least and greatest turbulence level [%], else see `trips.band`.
    """
    low, high = levels or (None, None)
    rows = [
        _member(one, bare, design, plain_design)
        for one, bare in zip(band(way, low, high), band(plain, low, high), strict=True)
    ]
    return Banded(*(np.array(column) for column in zip(*rows, strict=True)))


def _member(
    way: Case, plain: Case, design: Mapping[str, float], plain_design: Mapping[str, float]
) -> tuple[float, float, float, float, float]:
    name, _ = merit(way)
    got = _evaluated(way, design, np.ones(1))
    bare = _evaluated(plain, plain_design, np.array([1.0, *_SPEEDS]))
    power, worth = bare.outcomes["fan_power"][1:], merit_values(plain, bare.outcomes)[1:]
    wanted = got.outcomes["fan_power"][0]
    equal = np.exp(np.interp(np.log(wanted), np.log(power), np.log(worth)))
    return (
        float(got.outcomes[name][0]),
        float(wanted),
        float(bare.outcomes[name][0]),
        float(bare.outcomes["fan_power"][0]),
        float(merit_values(way, got.outcomes)[0] / equal - 1.0),
    )


def _evaluated(case: Case, design: Mapping[str, float], speeds: Floats) -> Evaluation:
    """One design at shares `speeds` of its velocity."""
    given = {name: np.full(speeds.size, value) for name, value in design.items()}
    return SweptPlates(case).evaluate_settings({**given, "velocity": design["velocity"] * speeds})

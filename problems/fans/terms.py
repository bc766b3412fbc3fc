"""The words of duty points: how fans are driven, what a duty point is, why a fan cannot serve.

Data only, in arrays; how a duty point is found is for `duty`.
"""

from __future__ import annotations

from dataclasses import dataclass
from enum import IntEnum
from typing import Literal

import numpy as np
from numpy.typing import NDArray

from problems.fans.curves import Ints
from problems.fans.motors import DRIVE_EFFICIENCY, Motor, ordinary_motor
from problems.problem import Bools, Floats


class Reason(IntEnum):
    """Why a fan cannot serve; HOLDS where it can. `says` tells what to do."""

    HOLDS = 0
    NO_DUTY = 1
    STALL = 2
    UNTESTED = 3
    MARGIN = 4
    BEYOND = 5
    TOO_FAST = 6
    TOO_SLOW = 7
    TOO_LITTLE = 8

    @property
    def says(self) -> str:
        """What is the matter and what to do."""
        return _SAYS[self]


_SAYS = {
    Reason.HOLDS: "holds the duty point with the margin asked for",
    Reason.NO_DUTY: "no duty: flow, pressure and density must be above 0",
    Reason.STALL: (
        "duty point left of the peak, where the fan stalls: take a smaller fan, fewer in "
        "parallel or less resistance"
    ),
    Reason.UNTESTED: (
        "duty point left of the first tested point: take a smaller fan, or add points at "
        "lower flow from the data sheet"
    ),
    Reason.MARGIN: (
        "duty point too near to the peak for the margin asked for: take a smaller fan, fewer "
        "in parallel or less resistance, or ask for less margin"
    ),
    Reason.BEYOND: (
        "duty point right of the last tested point: take a larger fan, more in parallel or "
        "more resistance, or add points at higher flow from the data sheet"
    ),
    Reason.TOO_FAST: (
        "needs a higher speed than the fan may run at: take a larger fan, more in parallel or "
        "less resistance"
    ),
    Reason.TOO_SLOW: (
        "needs a lower speed than the fan may run at: take a smaller fan or fewer in parallel"
    ),
    Reason.TOO_LITTLE: (
        "delivers less than the flow asked for: take a larger fan, more in parallel or less "
        "resistance"
    ),
}


@dataclass(frozen=True)
class Drive:
    """How the fans are driven and what is asked of them.

    `margin` is the share of the flow that may be lost before the peak of the curve is reached
    (10 to 20 % is a rule of thumb: common practice). `motor` and `efficiency` (belt, converter)
    act on fans of which the shaft power is known; None takes what is usual for the `sort`.
    """

    sort: Literal["variable speed", "fixed speed"] = "variable speed"
    margin: float = 0.10
    motor: Motor | None = None
    efficiency: float | None = None

    def electrical(self, shaft_power: Floats) -> Floats:
        """Electrical power [W] for a shaft power [W] above 0, any shape."""
        motor = ordinary_motor() if self.motor is None else self.motor
        drive = DRIVE_EFFICIENCY[self.sort] if self.efficiency is None else self.efficiency
        return shaft_power / (motor(shaft_power) * drive)


@dataclass(frozen=True)
class Duty:
    """Duty points; every array has the shape of the arrangements against the designs.

    Where the reason is not HOLDS the figures are those of the nearest tested point, finite but not
    the fan's. `flow` [m3/s] of all fans, `pressure` [Pa] static, `speed` [1/s], `shaft_power` [W]
    of one fan (0 where only its electrical power is known), `electrical_power` [W] of all fans,
    `efficiency` air power over electrical power, `margin` share of the flow right of the peak,
    `best_share` flow over that of best efficiency at this speed. `short_by` is 0 where the fan
    holds the point and grows smoothly above it elsewhere: the logarithm of the ratio by which
    resistance, speed or flow miss what the fan can do. `second` tells that the system meets the
    curve left of its peak too, `uneven` that fans in parallel stand above the lowest pressure
    left of their peak, so that one of them may fall back into stall.
    """

    flow: Floats
    pressure: Floats
    speed: Floats
    shaft_power: Floats
    electrical_power: Floats
    efficiency: Floats
    margin: Floats
    best_share: Floats
    reason: NDArray[np.int8]
    short_by: Floats
    second: Bools
    uneven: Bools

    @property
    def holds(self) -> Bools:
        """Where the fan can serve."""
        return np.asarray(self.reason == Reason.HOLDS)

    def at(self, index: Ints | int | tuple[object, ...]) -> Duty:
        """The duty points at `index` of every array."""
        return Duty(**{name: getattr(self, name)[index] for name in self.__dataclass_fields__})

    def why(self, index: int | tuple[int, ...]) -> Reason:
        """The reason of one duty point, with its text in `says`."""
        return Reason(int(self.reason[index]))


CAUTIONS = {
    "second": (
        "The system meets the fan curve left of its peak too: start the fan with the resistance "
        "low, so that it settles on the stable side, and check with the maker."
    ),
    "uneven": (
        "Fans in parallel work above the lowest pressure of the stall region: one may fall back "
        "into stall. Give each its own damper and start them one after the other."
    ),
}


VARIABLE, FIXED = Drive("variable speed"), Drive("fixed speed")

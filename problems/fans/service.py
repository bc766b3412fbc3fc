"""What becomes of a chosen fan in service: part load, a clogged filter, thin and dense air.

Each is the duty point of the same fan against a changed flow, system or density; choosing is for
`choice`, money for `costs`.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike

from problems.costs import Profile
from problems.fans.curves import Curves, Ints
from problems.fans.duty import fixed_speed, throttled, variable_speed
from problems.fans.systems import System
from problems.fans.terms import Drive, Duty
from problems.problem import Bools, Floats

GAS_CONSTANT = 287.05287  # J/(kg K) of dry air, ISO 2533 (from memory)


def air_density(temperature: ArrayLike, pressure: ArrayLike) -> Floats:
    """Density [kg/m3] of dry air at `temperature` [K] and `pressure` [Pa], as an ideal gas.

    Within 0.1 % from -40 to 100 degC near sea level; humid air at 30 degC is up to 2 % lighter.
    """
    return np.asarray(pressure, dtype=float) / (GAS_CONSTANT * np.asarray(temperature, dtype=float))


def in_service(
    curves: Curves, row: Ints, flow: ArrayLike, system: System, density: ArrayLike, drive: Drive
) -> Duty:
    """The duty of arrangement `row` against `system`, shapes as for `variable_speed`.

    A `variable speed` drive holds `flow` [m3/s]; at `fixed speed` the flow follows and `flow` is
    not looked at.
    """
    if drive.sort == "fixed speed":
        return fixed_speed(curves, row, system, density, drive)
    return variable_speed(curves, row, flow, system(np.asarray(flow, dtype=float)), density, drive)


def clogged(
    curves: Curves,
    row: Ints,
    flow: ArrayLike,
    system: System,
    part: System,
    rise: float,
    density: ArrayLike,
    drive: Drive,
) -> Duty:
    """The duty when the resistance of `part` has risen by the share `rise`.

    `part` (a filter, or all of `system`) is in `system` already, as clean.
    """
    return in_service(curves, row, flow, system + part.times(rise), density, drive)


def at_density(
    curves: Curves,
    row: Ints,
    flow: ArrayLike,
    system: System,
    density: ArrayLike,
    other: ArrayLike,
    drive: Drive,
) -> Duty:
    """The duty when the air at the fan has the density `other` instead of `density` [kg/m3].

    A `variable speed` drive holds the mass flow, and so the heat; at `fixed speed` the volume flow
    stays nearly as it is. Viscosity is taken as unchanged.
    """
    ratio = np.asarray(other, dtype=float) / density
    moved = np.asarray(flow, dtype=float) / ratio
    return in_service(curves, row, moved, system.at_density(ratio), other, drive)


@dataclass(frozen=True)
class PartLoad:
    """A year by a profile: `share` (S,) of the flow, `hours` (S,), `duty` of shape (S, n).

    `energy` [kWh] a year of shape (n,) counts every step, with the nearest tested point where the
    fan cannot hold one; `held` (n,) tells where it holds all of them.
    """

    share: Floats
    hours: Floats
    duty: Duty
    energy: Floats
    held: Bools


def part_load(
    curves: Curves,
    row: Ints,
    flow: Floats,
    system: System,
    density: Floats,
    profile: Profile,
    drive: Drive,
) -> PartLoad:
    """A year of arrangement `row` of shape (n,) that runs at shares of `flow` [m3/s], shape (n,).

    A `variable speed` drive follows the system curve down; at `fixed speed` a damper takes up what
    the system does not need.
    """
    share, hours = np.array(profile.share), np.array(profile.hours)
    flows = share[:, np.newaxis] * flow
    if drive.sort == "fixed speed":
        duty = throttled(curves, row, flows, density, drive)
    else:
        duty = variable_speed(curves, row, flows, system(flows), density, drive)
    energy = hours @ duty.electrical_power / 1000.0
    return PartLoad(share, hours, duty, energy, np.asarray(duty.holds.all(axis=0)))

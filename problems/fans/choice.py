"""Which fan serves a design with least electrical power, and by how far it is missed if none does.

Chooses among all arrangements (a fan, or several alike in parallel) for many designs at once, and
ranks them for one. Curves are in `curves`, duty points in `duty`, files in `catalogue`.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike

from problems.fans.curves import Curves, Ints
from problems.fans.duty import fixed_speed, variable_speed
from problems.fans.meeting import on_parabola
from problems.fans.systems import SampledSystem, System
from problems.fans.terms import FIXED, VARIABLE, Drive, Duty
from problems.problem import Floats

_BLOCK = 1 << 16  # pairs of arrangement and design worked on at a time: they stay in the cache


@dataclass(frozen=True)
class Choice:
    """The fan of each of n designs, every array of shape (n,).

    `row` is the arrangement, `fan` its place in the catalogue, `count` how many of them in
    parallel, `duty` its duty point. Where `duty.holds` is false no fan can serve: the row is then
    the nearest one, `duty.reason` says why it cannot, `duty.short_by` (above 0) how far off it is.
    """

    row: Ints
    fan: Ints
    count: Floats
    duty: Duty


def choose_variable(
    curves: Curves, flow: Floats, pressure: Floats, density: Floats, drive: Drive = VARIABLE
) -> Choice:
    """The fan with least electrical power for each design, its speed following the duty.

    `flow` [m3/s] of all fans together, static `pressure` [Pa] and `density` [kg/m3], shape (n,).
    """
    n = len(flow)
    rows = np.empty(n, dtype=np.intp)
    asked = (flow > 0.0) & (pressure > 0.0) & (density > 0.0)
    wanted = np.where(asked, [flow, pressure, density], 1.0)
    for part in _blocks(n, len(curves)):
        flow_of, pressure_of, density_of = wanted[:, part]
        rows[part] = _least(*_variable(curves, flow_of, pressure_of, density_of, drive))
    return _choice(curves, rows, variable_speed(curves, rows, flow, pressure, density, drive))


def choose_fixed(
    curves: Curves,
    system: System | SampledSystem,
    density: Floats,
    drive: Drive = FIXED,
    least_flow: ArrayLike = 0.0,
) -> Choice:
    """The fan with least electrical power for each design, run at its tested speed.

    `system` holds n designs, `density` [kg/m3] is of shape (n,), `least_flow` [m3/s] (a number or
    (n,)) what the fan must deliver.
    """
    n = len(density)
    least = np.broadcast_to(np.asarray(least_flow, dtype=float), n)
    rows = np.empty(n, dtype=np.intp)
    for part in _blocks(n, len(curves)):
        of = system.of(part, n)
        duty = fixed_speed(curves, curves.every, of, density[part], drive, least[part])
        rows[part] = _least(np.where(duty.holds, duty.electrical_power, np.inf), duty.short_by)
    return _choice(curves, rows, fixed_speed(curves, rows, system, density, drive, least))


def hold_variable(
    curves: Curves,
    rows: Ints,
    flow: Floats,
    pressure: Floats,
    density: Floats,
    drive: Drive = VARIABLE,
) -> Choice:
    """The same fans `rows` (n,) at another duty, their speed following it."""
    return _choice(curves, rows, variable_speed(curves, rows, flow, pressure, density, drive))


def hold_fixed(
    curves: Curves,
    rows: Ints,
    system: System | SampledSystem,
    density: Floats,
    drive: Drive = FIXED,
) -> Choice:
    """The same fans `rows` (n,) on another system, at their tested speed."""
    return _choice(curves, rows, fixed_speed(curves, rows, system, density, drive))


def _choice(curves: Curves, rows: Ints, duty: Duty) -> Choice:
    return Choice(rows, curves.fan[rows], curves.count[rows], duty)


def _blocks(n: int, arrangements: int) -> Iterator[slice]:
    size = max(_BLOCK // arrangements, 1)
    return (slice(start, start + size) for start in range(0, n, size))


def _least(power: Floats, short: Floats) -> Ints:
    """Row of least power in each column, of the least shortfall where no power is finite."""
    best = np.argmin(power, axis=0)
    served = np.isfinite(power[best, np.arange(power.shape[1])])
    return np.asarray(np.where(served, best, np.argmin(short, axis=0)))


def _variable(
    curves: Curves, flow: Floats, pressure: Floats, density: Floats, drive: Drive
) -> tuple[Floats, Floats]:
    """Electrical power (infinite where a fan cannot serve) and shortfall, both (A, n).

    The figures of `variable_speed`, without those that no choice depends on; a test holds the two
    together.
    """
    row = curves.every
    denser = density / curves.density[row]
    place = on_parabola(curves, row, pressure / (flow**2 * denser), drive.margin)
    faster = flow / place.flow
    speed = curves.speed[row] * faster
    fast, slow = speed / curves.highest_speed[row], curves.lowest_speed[row] / speed
    short = place.short_by + np.log(np.maximum(np.maximum(fast, slow), 1.0))
    at, design = np.nonzero(short <= 0.0)
    taken = curves.power(at, place.flow[at, design]) * faster[at, design] ** 3 * denser[at, design]
    power = np.full(short.shape, np.inf)
    mains = curves.electrical[at]
    each = np.where(mains, taken, drive.electrical(taken))
    power[at, design] = each * curves.count[at]
    return power, short


# W/(m3/s) between classes 1 to 7 of EN 13779; class 1 is below its bound, the others up to theirs
CLASS_BOUNDS = (500.0, 750.0, 1250.0, 2000.0, 3000.0, 4500.0)


def specific_power(electrical_power: Floats, flow: Floats) -> Floats:
    """Specific fan power [W/(m3/s)]: electrical power over volume flow, EN 13779."""
    return np.asarray(electrical_power / flow)


def specific_power_class(specific: Floats) -> Ints:
    """Class 1 to 7 of a specific fan power [W/(m3/s)] by EN 13779, any shape."""
    above = np.searchsorted(CLASS_BOUNDS, specific, side="left")
    return np.asarray(1 + above + (np.asarray(specific) == CLASS_BOUNDS[0]))


def ranking(curves: Curves, duty: Duty) -> Ints:
    """One arrangement of each fan, shape (F,), best first, from the duties (A,) of one design.

    Those that hold the point come first, by electrical power; the others by how far they are off.
    """
    order = np.lexsort((duty.electrical_power, duty.short_by, ~duty.holds))
    _, first = np.unique(curves.fan[order], return_index=True)
    return np.asarray(order[np.sort(first)])

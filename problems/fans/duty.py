"""Where a fan works: the duty point of many fans against many designs at once.

`variable_speed` finds the speed at which a fan passes through a wanted point, `fixed_speed` the
point in which its curve meets a system. Which fan is then best is for `choice`.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

from problems.fans.curves import Curves, Ints, affinity
from problems.fans.meeting import meet, met_on_the_left, on_parabola
from problems.fans.roots import falling_root
from problems.fans.systems import Drop, System
from problems.fans.terms import FIXED, VARIABLE, Drive, Duty, Reason
from problems.problem import Bools, Floats


def variable_speed(
    curves: Curves,
    row: Ints,
    flow: ArrayLike,
    pressure: ArrayLike,
    density: ArrayLike,
    drive: Drive = VARIABLE,
) -> Duty:
    """The speed at which each arrangement `row` passes through the wanted point; its duty there.

    `flow` [m3/s] at the fan, static `pressure` [Pa] and `density` [kg/m3] at the fan broadcast
    against `row`: `curves.every` (A, 1) against (n,) gives (A, n), a row of shape (n,) gives (n,).
    """
    flow, pressure, density = np.broadcast_arrays(*map(_array, (flow, pressure, density)))
    asked = (flow > 0.0) & (pressure > 0.0) & (density > 0.0)
    flow, pressure, density = (np.where(asked, x, 1.0) for x in (flow, pressure, density))
    denser = density / curves.density[row]
    ratio = pressure / (flow**2 * denser)
    place = on_parabola(curves, row, ratio, drive.margin)
    faster = flow / place.flow
    speed = curves.speed[row] * faster
    fast, slow = speed / curves.highest_speed[row], curves.lowest_speed[row] / speed
    reason = np.select(
        [
            ~np.broadcast_to(asked, faster.shape),
            place.left & curves.untested_left[row],
            place.left,
            (place.short_by > 0.0) & (place.flow < curves.end[row]),
            place.short_by > 0.0,
            fast > 1.0,
            slow > 1.0,
        ],
        [
            Reason.NO_DUTY, Reason.UNTESTED, Reason.STALL, Reason.MARGIN, Reason.BEYOND,
            Reason.TOO_FAST, Reason.TOO_SLOW,
        ],
        Reason.HOLDS,
    )  # fmt: skip
    short = place.short_by + np.log(np.maximum(fast, 1.0)) + np.log(np.maximum(slow, 1.0))
    second = (ratio > curves.dip_ratio[row]) & ~place.left
    return _duty(curves, row, drive, place.flow, faster, denser, reason, short, second)


def fixed_speed(
    curves: Curves,
    row: Ints,
    system: System | Drop,
    density: ArrayLike,
    drive: Drive = FIXED,
    least_flow: ArrayLike = 0.0,
) -> Duty:
    """Where each arrangement `row`, at its tested speed, meets `system` on its stable side.

    `system` gives the pressure drop [Pa] for flows [m3/s] of the shape of the result; `density`
    [kg/m3] at the fan and `least_flow` [m3/s] wanted broadcast against `row` as it does. Of several
    meeting points the stable one right of the peak is taken, and `second` says so.
    """
    denser = _array(density) / curves.density[row]
    least = np.minimum(curves.least_flow(drive.margin), curves.end)[row]
    peak, end = curves.peak[row], curves.end[row]

    def excess(flow: Floats) -> Floats:
        return np.asarray(curves.pressure(row, flow) * denser - system(flow))

    shape = np.broadcast_shapes(np.shape(row), np.shape(denser), excess(peak).shape)
    peak, least, end = (np.broadcast_to(x, shape) for x in (peak, least, end))
    if isinstance(system, System):
        flow = meet(curves, row, System(*(part / denser for part in system.parts)))
    else:
        flow = falling_root(excess, peak, end)
    at_peak, at_least, at_end = excess(peak), excess(least), excess(end)
    asked, wanted = (system(end) > 0.0) & (denser > 0.0), _array(least_flow)
    never = curves.least_flow(drive.margin)[row] / end  # above 1: the margin lies beyond the curve
    reason = np.select(
        [
            ~asked,
            (at_peak < 0.0) & curves.untested_left[row],
            at_peak < 0.0,
            at_end > 0.0,
            (at_least < 0.0) | (never > 1.0),
            flow < wanted,
        ],
        [
            Reason.NO_DUTY, Reason.UNTESTED, Reason.STALL, Reason.BEYOND, Reason.MARGIN,
            Reason.TOO_LITTLE,
        ],
        Reason.HOLDS,
    )  # fmt: skip
    missing = _log_ratio(system(least), at_least) + _log_ratio(at_end + system(end), -at_end)
    short = missing + np.log(np.maximum(never, 1.0)) + np.log(np.maximum(wanted / flow, 1.0))
    second = met_on_the_left(curves, row, system, denser, shape) & (at_peak >= 0.0)
    return _duty(curves, row, drive, flow, np.ones(shape), denser, reason, short, second)


def throttled(
    curves: Curves,
    row: Ints,
    flow: ArrayLike,
    density: ArrayLike,
    drive: Drive = FIXED,
) -> Duty:
    """The duty of each arrangement `row` at its tested speed when a damper sets `flow` [m3/s].

    The pressure is that of the fan; shapes as for `variable_speed`.
    """
    flow, density = np.broadcast_arrays(_array(flow), _array(density))
    asked = (flow > 0.0) & (density > 0.0)
    flow = np.where(asked, flow, 1.0)
    denser = np.where(asked, density, 1.0) / curves.density[row]
    least = curves.least_flow(drive.margin)[row]
    over, under = flow / curves.end[row], least / flow
    reason = np.select(
        [
            ~np.broadcast_to(asked, over.shape),
            (flow < curves.peak[row]) & curves.untested_left[row],
            flow < curves.peak[row],
            over > 1.0,
            under > 1.0,
        ],
        [Reason.NO_DUTY, Reason.UNTESTED, Reason.STALL, Reason.BEYOND, Reason.MARGIN],
        Reason.HOLDS,
    )
    short = np.log(np.maximum(over, 1.0)) + np.log(np.maximum(under, 1.0))
    flow = np.clip(flow, curves.peak[row], curves.end[row])
    same = np.ones(flow.shape)
    return _duty(curves, row, drive, flow, same, denser, reason, short, same < 0.0)


def _array(values: ArrayLike) -> Floats:
    return np.asarray(values, dtype=float)


def _log_ratio(part: Floats, excess: Floats) -> Floats:
    """ln(part / (part + excess)) where `excess` is below 0, else 0; `part` is above 0 there."""
    lacking = excess < 0.0
    rest = np.where(lacking, np.maximum(part + excess, 1e-3 * part), 1.0)
    return np.log(np.where(lacking, part, 1.0) / rest)


def _duty(
    curves: Curves,
    row: Ints,
    drive: Drive,
    flow: Floats,
    faster: Floats,
    denser: Floats,
    reason: NDArray[np.int_],
    short: Floats,
    second: Bools,
) -> Duty:
    """The duty at `flow` of the tested curve, run `faster` and in `denser` air than that."""
    tested = curves.pressure(row, flow)
    delivered, pressure, taken = affinity(
        flow, tested, curves.power(row, flow), faster, np.broadcast_to(denser, flow.shape)
    )
    from_mains = curves.electrical[row] & np.ones(flow.shape, dtype=bool)
    each = np.where(from_mains, taken, drive.electrical(taken))
    electrical = each * curves.count[row]
    return Duty(
        flow=delivered,
        pressure=pressure,
        speed=curves.speed[row] * faster,
        shaft_power=np.where(from_mains, 0.0, taken),
        electrical_power=electrical,
        efficiency=delivered * pressure / electrical,
        margin=1.0 - curves.peak[row] / flow,
        best_share=flow / curves.best[row],
        reason=reason.astype(np.int8),
        short_by=np.where((reason == Reason.NO_DUTY) & (short <= 0.0), 1.0, short),
        second=second,
        uneven=(curves.count[row] > 1.0) & (tested > curves.dip_pressure[row]),
    )

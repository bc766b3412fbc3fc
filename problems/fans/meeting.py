"""Where fan curves, as tested, meet systems and parabolas on their stable side.

Flows at the tested speed and density only; speeds, densities and reasons are for `duty`.
"""

from __future__ import annotations

from typing import NamedTuple

import numpy as np

from problems.fans.curves import LEFT_SAMPLES, Curves, Ints
from problems.fans.roots import falling_cubic_root
from problems.fans.systems import Drop, System
from problems.problem import Bools, Floats


class Place(NamedTuple):
    """Where on its tested curve a fan works, as it would at the tested speed and density."""

    flow: Floats
    pressure: Floats
    left: Bools  # of the peak
    short_by: Floats  # of the curve: margin and end, 0 between them


def on_parabola(curves: Curves, row: Ints, ratio: Floats, margin: float) -> Place:
    """Where pressure over flow squared is `ratio` [Pa s2/m6] at the tested speed and density.

    Affinity leaves this ratio as it is whatever the speed: all points of one fan that it can be
    brought to lie on such parabolas.
    """
    least = curves.least_flow(margin)
    with np.errstate(divide="ignore"):
        most = np.log(curves.pressure(np.arange(len(curves)), least)) - 2.0 * np.log(least)
        lowest = np.log(curves.end_pressure) - 2.0 * np.log(curves.end)
        peak = np.log(curves.pressure(np.arange(len(curves)), curves.peak)) - 2.0 * np.log(
            curves.peak
        )
    asked = np.log(ratio)
    flow = meet(curves, row, System(square=ratio))
    short = np.maximum(asked - most[row], 0.0) + np.maximum(lowest[row] - asked, 0.0)
    return Place(flow, ratio * flow**2, asked > peak[row], short)


def meet(curves: Curves, row: Ints, system: System) -> Floats:
    """Flow [m3/s] at which curves, as tested, meet a system on the stable side.

    Clipped to the peak and to the last tested point where they do not meet. The stretch between
    two tested points is found first, then the root of its cubic.
    """
    constant, linear, square = system.parts
    steps = np.arange(curves.knots.shape[1])
    column = np.minimum(curves.peak_knot[:, np.newaxis] + steps, steps[-1])
    knots = np.take_along_axis(curves.knots, column, axis=1)
    pressure = np.take_along_axis(curves.knot_pressure, column, axis=1)
    segment = curves.peak_knot[row]
    for k in range(1, 1 + int((curves.last - curves.peak_knot).max())):
        q = knots[row, k]
        segment = segment + (pressure[row, k] > (square * q + linear) * q + constant)
    segment = np.minimum(segment, curves.last[row])
    place = row * steps[-1] + segment
    c0, c1, c2, c3 = (term.ravel().take(place) for term in curves.pressure_terms)
    start = curves.knots[:, :-1].ravel().take(place)
    width = np.diff(curves.knots, axis=1).ravel().take(place)
    slope = 2.0 * square * start + linear
    c0 = c0 - ((square * start + linear) * start + constant)
    return np.asarray(start + falling_cubic_root(c0, c1 - slope, c2 - square, c3, width))


def met_on_the_left(
    curves: Curves, row: Ints, system: Drop, denser: Floats, shape: tuple[int, ...]
) -> Bools:
    """Whether the system is above the curve anywhere left of the peak."""
    met = np.zeros(shape, dtype=bool)
    for sample in range(LEFT_SAMPLES - 1):
        flow = np.broadcast_to(curves.left_flow[row, sample], shape)
        met |= system(flow) > curves.left_pressure[row, sample] * denser
    return met & (curves.peak_knot[row] > 0)

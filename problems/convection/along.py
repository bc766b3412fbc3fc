"""What happens along one plate, station by station, for pictures and as a check of the fast sums.

Uses the local laws of `sweep`, but marches the momentum thickness in small steps instead of by the
closed forms that make `sweep` fast.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from problems.convection import flat_plate, transition
from problems.convection.sweep import (
    Surface,
    Sweep,
    laminar_layer,
    laminar_thickness,
    mixed,
    wire_steps,
)

Floats = NDArray[np.float64]


@dataclass(frozen=True)
class Along:
    """Local values at stations Re_x along one design; shape (m,).

    `friction` and `stanton` on nominal velocity; `re_theta` the momentum-thickness Reynolds number;
    `gamma` the share of turbulence in force there; `thickness` delta_99 over theta.
    """

    re_x: Floats
    friction: Floats
    stanton: Floats
    re_theta: Floats
    gamma: Floats
    thickness: Floats


def along(surface: Surface, sweep: Sweep, stations: int = 600) -> Along:
    """Local values along the first design of `surface`, whose walk gave `sweep`."""
    columns = surface.part(np.array([0]))
    end = float(surface.re_l[0])
    onset, length = float(sweep.onset.re_x[0]), float(sweep.onset.length[0])
    re_x = _stations(end, onset, length, stations)
    layer = transition.mixing_weight((re_x - onset) / length)
    re_theta = _march(surface, sweep, re_x, layer, onset)
    laminar = laminar_layer(columns)
    gamma = layer * float(sweep.sustains[0])
    friction, stanton = mixed(columns, laminar, re_x[None], re_theta[None], gamma[None])
    laminar_ratio = 4.91 / flat_plate.BLASIUS
    ratio = laminar_ratio + gamma * (1.0 / flat_plate.THETA_OVER_DELTA - laminar_ratio)
    return Along(re_x, friction[0], stanton[0], re_theta, gamma, ratio)


def _stations(end: float, onset: float, length: float, count: int) -> Floats:
    """Stations crowded at the leading edge and through transition."""
    share = np.linspace(0.0, 1.0, count)[1:]
    crowd = end * share**2
    if onset < end:
        through = np.linspace(onset, min(end, onset + 5.0 * length), count)
        crowd = np.union1d(crowd, through)
    return crowd


def _march(surface: Surface, sweep: Sweep, re_x: Floats, layer: Floats, onset: float) -> Floats:
    """Re_theta by the trapezoidal rule along the stations, every wire a step."""
    steps = [
        (min(float(wire.re_x[0]), onset), float(carried[0]))
        for wire, (_, carried) in wire_steps(sweep.wires, sweep.onset)
        if float(wire.re_x[0]) < float(surface.re_l[0])
    ]
    out = laminar_thickness(re_x, surface.re_d)
    here = min([onset, *(place for place, _ in steps)])
    theta = float(laminar_thickness(np.array([here]), surface.re_d)[0])
    for station in range(int(np.searchsorted(re_x, here)), re_x.size):
        there = float(re_x[station])
        while steps and steps[0][0] <= there:
            place, carried = steps.pop(0)
            theta = _grown(theta, here, place - here, 0.0) + carried
            here = place
        theta = _grown(theta, here, there - here, float(layer[station]))
        here = there
        out[station] = theta
    return out


def _grown(theta: float, here: float, run: float, gamma: float) -> float:
    """Re_theta a `run` further on; while laminar the momentum integral in closed form."""
    if gamma == 0.0:
        return float(np.hypot(theta, flat_plate.BLASIUS * np.sqrt(max(run, 0.0))))
    return _one_step(theta, here, run, gamma)


def _one_step(theta: float, here: float, run: float, gamma: float) -> float:
    """Heun's step of d Re_theta / d Re_x = cf/2 with the mixed friction factor."""

    def slope(value: float, place: float) -> float:
        calm = float(flat_plate.laminar_friction(np.array(place)))
        full = float(flat_plate.turbulent_friction(np.array(value)))
        return 0.5 * (calm + gamma * (full - calm))

    first = slope(theta, max(here, 1.0))
    second = slope(theta + run * first, here + run)
    return theta + 0.5 * run * (first + second)

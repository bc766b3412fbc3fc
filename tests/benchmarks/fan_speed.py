"""How quickly fans are chosen: 1,000 fans against 10,000 designs, and against a scalar script.

The script is what an engineer would write for one fan and one design: an interpolator and a root
finder of a general library. Run in one process after the other; quote the ratio, not the seconds.

    python -m tests.benchmarks.fan_speed
"""

from __future__ import annotations

import time
import tracemalloc
from collections.abc import Callable

import numpy as np
from scipy.interpolate import PchipInterpolator
from scipy.optimize import brentq

from problems.fans.catalogue import read_catalogue
from problems.fans.choice import choose_fixed, choose_variable
from problems.fans.curves import Fan, curves
from problems.fans.motors import ordinary_motor
from problems.fans.systems import System
from tests.problems.fans.made import random_fans

_FANS, _DESIGNS, _SCRIPTED = 1000, 10_000, 2000


def scripted(fan: Fan, flow: float, pressure: float) -> float:
    """Electrical power of one fan at one point, infinite where it cannot serve; scalar calls."""
    static = PchipInterpolator(fan.flow, fan.pressure)
    low, high, ratio = fan.flow[fan.peak] / 0.9, fan.flow[-1], pressure / flow**2

    def excess(q: float) -> float:
        return float(static(q)) - ratio * q * q

    if low >= high or excess(low) < 0.0 or excess(high) > 0.0:
        return np.inf
    faster = flow / brentq(excess, low, high)
    if not fan.lowest_speed <= fan.speed * faster <= fan.highest_speed:
        return np.inf
    shaft = float(PchipInterpolator(fan.flow, fan.power)(flow / faster)) * faster**3
    return shaft / (0.97 * float(ordinary_motor()(np.array(shaft))))


def seconds(call: Callable[[], object]) -> float:
    """Median time of three calls after one to warm up."""
    call()
    taken = []
    for _ in range(3):
        started = time.perf_counter()
        call()
        taken.append(time.perf_counter() - started)
    return float(np.median(taken))


def main() -> None:
    """Print seconds, pairs a second, the memory at its highest and the ratio to the script."""
    rng = np.random.default_rng(3)
    fans = random_fans(_FANS, seed=1)
    flow, pressure = 10 ** rng.uniform(-1, 1, _DESIGNS), 10 ** rng.uniform(1.3, 2.9, _DESIGNS)
    density, system = np.full(_DESIGNS, 1.2), System.turbulent(flow, pressure)
    many, three = curves(fans), curves(fans, parallel=(1, 2, 3))
    few = curves(read_catalogue("workshop-fans").fans, parallel=(1, 2, 3))
    calls = {
        "variable speed": (many, lambda: choose_variable(many, flow, pressure, density)),
        "variable, 1 to 3": (three, lambda: choose_variable(three, flow, pressure, density)),
        "fixed speed": (many, lambda: choose_fixed(many, system, density)),
        "workshop, 1 to 3": (few, lambda: choose_variable(few, flow, pressure, density)),
    }
    for name, (made, call) in calls.items():
        taken, pairs = seconds(call), len(made) * _DESIGNS
        print(f"{name:18s} {pairs:12,d} pairs {taken:8.2f} s {pairs / taken:14,.0f} pairs a second")
        if name == "variable speed":
            quick = pairs / taken
    tracemalloc.start()
    choose_variable(many, flow, pressure, density)
    print(
        f"memory at its highest, variable speed: {tracemalloc.get_traced_memory()[1] / 1e6:.0f} MB"
    )
    tracemalloc.stop()
    started = time.perf_counter()
    for pair in range(_SCRIPTED):
        scripted(fans[pair % _FANS], flow[pair], pressure[pair])
    script = _SCRIPTED / (time.perf_counter() - started)
    print(f"scalar script      {script:,.0f} pairs a second: {quick / script:,.0f} times slower")


if __name__ == "__main__":
    main()

"""How many designs a second the model evaluates, against a script that takes them one by one.

The script is what an engineer would write with a scalar library of correlations: film temperature
by a few rounds, one property call per property, one correlation per regime. Run in one process
after the other on one core; quote the ratio, not the seconds.

    python -m tests.benchmarks.evaluation_speed
"""

from __future__ import annotations

import time

import numpy as np
from CoolProp.CoolProp import PropsSI
from fluids import friction_factor
from ht.conv_external import Nu_external_horizontal_plate
from ht.conv_internal import Nu_conv_internal

from problems import build, load_case, ready_made
from problems.problem import Floats, Problem

_DESIGNS = 40_000
_SCRIPTED = 300


def random_designs(problem: Problem, count: int) -> Floats:
    """Designs spread over the ranges of a problem, shape (count, number of variables)."""
    low = np.array([variable.low for variable in problem.variables])
    high = np.array([variable.high for variable in problem.variables])
    return low + (high - low) * np.random.default_rng(1).random((count, low.size))


def scripted(length: float, gap: float, velocity: float) -> tuple[float, float]:
    """Heat and fan power of the stack of the default case, one design, scalar calls only."""
    inlet, wall, pressure = 298.15, 353.15, 101325.0
    count = 0.4 / (gap + 0.001)
    outlet = 0.5 * (inlet + wall)
    rho_in = PropsSI("D", "T", inlet, "P", pressure, "Air")
    for _ in range(3):
        film = 0.5 * (wall + 0.5 * (inlet + outlet))
        rho, mu, k, cp = (PropsSI(name, "T", film, "P", pressure, "Air") for name in "DVLC")
        flux = rho_in * velocity
        re_d, pr = flux * 2.0 * gap / mu, mu * cp / k
        if length / (2.0 * gap * re_d) < 0.01:
            nu = Nu_external_horizontal_plate(Re=flux * length / mu, Pr=pr) * 2.0 * gap / length
        else:
            nu = Nu_conv_internal(Re=re_d, Pr=pr, Di=2.0 * gap, x=length)
        units = 2.0 * nu * k / (2.0 * gap) * length / (flux * gap * cp)
        outlet = wall - (wall - inlet) * np.exp(-units)
    heat = flux * gap * 0.6 * count * cp * (outlet - inlet)
    drop = friction_factor(Re=re_d) * length / (2.0 * gap) * flux**2 / (2.0 * rho)
    drop += 1.5 * flux**2 / (2.0 * rho)
    return heat, drop * velocity * gap * 0.6 * count / 0.55


def main() -> None:
    """Print designs a second of every ready-made case and the ratio to the script."""
    rates = {}
    for entry in ready_made():
        problem = build(load_case(entry.name))
        designs = random_designs(problem, _DESIGNS)
        problem.evaluate(designs[:2000])
        seconds = []
        for _ in range(5):
            started = time.perf_counter()
            problem.evaluate(designs)
            seconds.append(time.perf_counter() - started)
        rates[entry.name] = _DESIGNS / float(np.median(seconds))
        print(f"{entry.name:16s} {rates[entry.name]:12,.0f} designs a second")
    rng = np.random.default_rng(2)
    rows = rng.uniform([0.05, 0.003, 1.0], [1.2, 0.04, 15.0], (_SCRIPTED, 3))
    scripted(*rows[0])
    started = time.perf_counter()
    for row in rows:
        scripted(*row)
    script = _SCRIPTED / (time.perf_counter() - started)
    print(f"{'scalar script':16s} {script:12,.0f} designs a second")
    print(f"hulling-stack is {rates['hulling-stack'] / script:,.0f} times the scalar script")


if __name__ == "__main__":
    main()

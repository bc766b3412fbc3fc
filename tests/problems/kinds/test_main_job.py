"""The main job against the world outside: the search finds published optima by itself."""

from __future__ import annotations

import numpy as np
import pytest
from numpy.testing import assert_allclose

from optim import search
from problems import build
from problems.case import parse_case

_BLOCK = """
title = "Most heat from a block of fixed height and pressure drop"
kind = "stack"
[fluid]
name = "air"
temperature = 300
turbulence = "1 %"
[plates]
width = 1.0
height = 1.0
thickness = 0.0
length = {length}
gap = ["{narrow} mm", "{wide} mm"]
surface = {{ temperature = 300.5 }}
ends = "none"
[flow]
velocity = ["0.2 m/s", "12 m/s"]
[aims]
most = ["heat"]
[limits]
pressure_drop = {{ at_most = {drop} }}
"""


@pytest.mark.parametrize(
    ("length", "drop", "narrow", "wide"), [(0.1, 10.0, 0.8, 8.0), (0.2, 3.0, 2.0, 15.0)]
)
def test_search_finds_the_published_spacing_of_isothermal_plates(length, drop, narrow, wide):
    # Bejan and Sciubba 1992, Int. J. Heat Mass Transfer 35, 3259-3264 (abstract read); the exact
    # optimum at Pr 0.7 computed by marching: s/L Be^1/4 = 3.034, Q 0.476 (computed)
    text = _BLOCK.format(length=length, drop=drop, narrow=narrow, wide=wide)
    stated = build(parse_case(text, "block"))
    best = search(stated, seed=1).table.iloc[0]
    air = stated.fluid.at(np.array([300.25]))
    rho, mu, k, cp = (float(values[0]) for values in (air.rho, air.mu, air.k, air.cp))
    bejan = drop * length**2 / (mu * k / (rho * cp))
    assert_allclose(best["gap_m"] / length * bejan**0.25, 3.034, rtol=0.02)
    scale = cp * 0.5 * np.sqrt(rho * drop / (mu * cp / k))
    assert_allclose(best["heat_W"] / scale, 0.476, rtol=0.015)


def test_worked_point_of_the_published_optimum():
    # air 300 K, 1 atm, L 0.1 m, 10 Pa: s_opt 2.43 mm, u 2.18 m/s, Re_D 675, 1956 W/m2K (computed)
    text = _BLOCK.format(length=0.1, drop=10.0, narrow=0.8, wide=8.0)
    best = search(build(parse_case(text, "block")), seed=2).table.iloc[0]
    assert_allclose(best["gap_m"], 2.43e-3, rtol=0.02)
    assert_allclose(best["velocity_m_s"], 2.18, rtol=0.02)
    assert_allclose(best["gap_reynolds"], 675.0, rtol=0.03)
    assert_allclose(best["heat_W"] / 0.5, 1956.0, rtol=0.015)


def test_at_fixed_mass_flow_the_search_runs_to_the_narrowest_gap():
    # no interior optimum: heat rises as the gap falls (Bejan and Sciubba 1992)
    text = _BLOCK.format(length=0.1, drop=1e9, narrow=0.8, wide=8.0)
    text += "mass_flow = { at_most = 0.5 }\n"
    best = search(build(parse_case(text, "block")), seed=1).table.iloc[0]
    assert_allclose(best["gap_m"], 0.8e-3, rtol=1e-3)


_TWO = """
title = "Two variables, two aims"
kind = "stack"
[fluid]
name = "air"
temperature = "25 degC"
turbulence = "3 %"
[plates]
width = "0.5 m"
height = "0.3 m"
thickness = "1 mm"
length = "0.4 m"
gap = ["3 mm", "30 mm"]
surface = { temperature = "70 degC" }
[flow]
velocity = ["1 m/s", "12 m/s"]
[aims]
most = ["heat"]
least = ["fan_power"]
[limits]
pressure_drop = { at_most = "120 Pa" }
"""


@pytest.mark.slow
def test_front_agrees_with_a_dense_grid_of_a_million_designs():
    import moocore

    stated = build(parse_case(_TWO, "two"))
    names = [variable.name for variable in stated.variables]
    axes = [np.geomspace(v.low, v.high, 1000) for v in stated.variables]
    grid = np.stack(np.meshgrid(*axes, indexing="ij"), axis=-1).reshape(-1, len(names))
    got = stated.evaluate(grid)
    allowed = got.outcomes["pressure_drop"] <= 120.0
    dense = np.stack([-got.outcomes["heat"], got.outcomes["fan_power"]], axis=1)[allowed]
    table = search(stated, seed=1).table
    found = np.stack([-table["heat_W"], table["fan_power_W"]], axis=1)
    low, high = dense[moocore.is_nondominated(dense)].min(0), dense.max(0)
    high = dense[moocore.is_nondominated(dense)].max(0)

    def volume(points):
        return moocore.hypervolume((points - low) / (high - low), ref=[1.0, 1.0])

    assert_allclose(volume(found), volume(dense), rtol=3e-3)


def test_same_seed_gives_the_same_front_of_a_real_case():
    stated = build(parse_case(_TWO, "two"))
    first, second = (search(stated, seed=5, evaluations=8000).table for _ in range(2))
    assert first.equals(second)

"""The plate and the stack as problems: balances, words, smoothness over the ready-made cases."""

from __future__ import annotations

from functools import cache

import numpy as np
import pytest
from numpy.testing import assert_allclose

from problems import build, load_case, ready_made
from problems.case import parse_case
from problems.kinds import cautions
from problems.problem import Problem

NAMES = tuple(entry.name for entry in ready_made())
# outcomes that may pass through zero are compared with the size of their whole
WHOLE = {
    "wire_drag": "drag",
    "wire_drop": "pressure_drop",
    "entrance_drop": "pressure_drop",
    "exit_drop": "pressure_drop",
    "development_drop": "pressure_drop",
    "heating_drop": "pressure_drop",
    "shear_drop": "pressure_drop",
}
# shares are compared with one, temperatures with the difference between wall and inlet
SHARES = ("turbulent_share",)
TEMPERATURES = ("hottest_wall", "outlet_temperature", "film_temperature")


@cache
def problem(name: str) -> Problem:
    return build(load_case(name))


def designs(stated: Problem, count: int, seed: int = 3) -> np.ndarray:
    low = np.array([variable.low for variable in stated.variables])
    high = np.array([variable.high for variable in stated.variables])
    logs = np.array([variable.scale == "log" for variable in stated.variables])
    share = np.random.default_rng(seed).random((count, low.size))
    linear = low + (high - low) * share
    ratio = np.where(low > 0.0, high / np.where(low > 0.0, low, 1.0), 1.0)
    return np.where(logs, low * ratio**share, linear)


def moved(stated: Problem, base: np.ndarray, axis: int, step: float) -> np.ndarray:
    variable = stated.variables[axis]
    out = base.copy()
    out[:, axis] = np.clip(out[:, axis] * (1.0 + step), variable.low, variable.high)
    return out


def differences(stated, before, after):
    """Relative change of every outcome, by name."""
    drive = np.abs(before.outcomes["hottest_wall"] - stated.case.fluid.temperature)
    for name, old in before.outcomes.items():
        scale = np.abs(before.outcomes[WHOLE.get(name, name)])
        if name in TEMPERATURES:
            scale = drive
        elif name in SHARES:
            scale = np.ones_like(old)
        elif name == "approach":  # vanishes in a long passage
            scale = np.maximum(scale, 1e-3 * drive)
        yield name, np.abs(after.outcomes[name] - old) / np.maximum(scale, 1e-9)


@pytest.mark.parametrize("name", NAMES)
def test_no_outcome_jumps_at_random_points(name):
    stated = problem(name)
    base = designs(stated, 20000)
    before = stated.evaluate(base)
    for axis in range(len(stated.variables)):
        after = stated.evaluate(moved(stated, base, axis, 1e-4))
        for outcome, change in differences(stated, before, after):
            assert change.max() < 1e-2, (stated.variables[axis].name, outcome)


@pytest.mark.parametrize("name", NAMES)
def test_no_outcome_jumps_along_lines_through_every_border(name):
    stated = problem(name)
    for axis, variable in enumerate(stated.variables):
        low = max(variable.low, 1e-3 * variable.high)
        steps = int(np.log(variable.high / low) / 1e-4) + 2
        line = np.geomspace(low, variable.high, min(steps, 40000))
        ratio = line[1] / line[0] - 1.0
        for start in designs(stated, 3, seed=axis):
            rows = np.repeat(start[None], line.size, axis=0)
            rows[:, axis] = line
            got = stated.evaluate(rows)
            ahead = stated.evaluate(rows[:-1])
            after = stated.evaluate(rows[1:])
            for outcome, change in differences(stated, ahead, after):
                assert change.max() < 1e-2 * max(ratio / 1e-4, 1.0), (variable.name, outcome)
            assert len(got) == line.size


@pytest.mark.parametrize("name", NAMES)
def test_nothing_is_ever_nan_or_infinite(name):
    stated = problem(name)
    corners = (
        np.array(np.meshgrid(*[(variable.low, variable.high) for variable in stated.variables]))
        .reshape(len(stated.variables), -1)
        .T
    )
    got = stated.evaluate(np.vstack([corners, designs(stated, 5000)]))
    for values in (*got.outcomes.values(), *got.settings.values(), got.impossible_by):
        assert np.all(np.isfinite(values))
    assert np.all((got.reasons == "") == got.possible)


@pytest.mark.parametrize("name", NAMES)
def test_many_designs_give_what_each_gives_alone(name):
    stated = problem(name)
    base = designs(stated, 40)
    together = stated.evaluate(base)
    alone = stated.evaluate(base[17])
    for outcome, values in together.outcomes.items():
        assert_allclose(values[17], alone.outcomes[outcome][0], rtol=1e-5)


@pytest.mark.parametrize("name", [n for n in NAMES if problem(n).kind == "stack"])
def test_stack_balances_close(name):
    stated = problem(name)
    got = stated.evaluate(designs(stated, 500))
    out, given = got.outcomes, got.settings
    parts = ("entrance", "shear", "development", "heating", "wire", "exit")
    total = sum(out[f"{part}_drop"] for part in parts)
    assert_allclose(out["pressure_drop"], total, rtol=1e-12)
    # the walls and wires of all gaps carry what the shear and wire parts of the drop push
    section = given["gap"] * given["width"] * given["count"]
    assert_allclose((out["shear_drop"] + out["wire_drop"]) * section, out["drag"], rtol=1e-9)
    assert_allclose(out["flow_rate"], given["velocity"] * section, rtol=1e-12)
    pitch = given["gap"] + given["thickness"]
    assert_allclose(given["count"] * pitch, given["height"], rtol=1e-12)


@pytest.mark.parametrize("name", NAMES)
def test_words_and_pictures_exist_for_random_designs(name):
    stated = problem(name)
    for design in designs(stated, 12):
        assert stated.remarks(design)[0]
        profile = stated.profile(design)
        assert all(np.all(np.isfinite(curve.values)) for curve in profile.curves)
        assert profile.regions[0].start == 0.0
        assert profile.regions[-1].end == pytest.approx(profile.x[-1])
        sketch = stated.sketch(design)
        assert {shape.part for shape in sketch.shapes} >= {"plate"}


def test_profile_and_outcomes_tell_the_same_story():
    stated = problem("hulling-stack")
    base = designs(stated, 20)
    got = stated.evaluate(base)
    for row, design in enumerate(base):
        curves = {curve.name: curve.values for curve in stated.profile(design).curves}
        outlet = got.outcomes["outlet_temperature"][row]
        inlet = stated.profile(design).curves[5].values[0]
        rise = curves["stream temperature"][-1] - inlet
        assert_allclose(rise, outlet - inlet, rtol=0.02, atol=0.05)
        assert curves["heat transfer coefficient"].min() == pytest.approx(
            got.outcomes["least_h"][row], rel=0.03
        )


def test_whole_number_of_plates_keeps_the_gap():
    stated = problem("hulling-stack")
    design = designs(stated, 1)[0]
    found = stated.whole(design)
    assert found is not None
    built = found[0].evaluate(found[1])
    assert built.settings["count"][0] == np.round(stated.evaluate(design).settings["count"][0])
    assert_allclose(built.settings["gap"], stated.evaluate(design).settings["gap"])


_COOLED = """
title = "Cold plates in a warm stream"
kind = "{kind}"
[fluid]
name = "{fluid}"
temperature = "{inlet} degC"
turbulence = "3 %"
{humidity}
[plates]
width = "0.5 m"
{height}
length = {length}
{gap}
surface = {{ {surface} }}
[flow]
velocity = ["0.5 m/s", "8 m/s"]
[aims]
most = ["mean_h"]
"""


def cooled(
    kind: str,
    surface: str,
    fluid: str = "air",
    inlet: float = 25.0,
    humidity: str = "",
    length: str = '["0.1 m", "1 m"]',
):
    stack = kind == "stack"
    height = 'height = "0.3 m"' if stack else ""
    gap = 'gap = ["3 mm", "20 mm"]' if stack else ""
    text = _COOLED.format(
        kind=kind,
        fluid=fluid,
        inlet=inlet,
        humidity=humidity,
        surface=surface,
        length=length,
        height=height,
        gap=gap,
    )
    return build(parse_case(text, "cooled"))


@pytest.mark.parametrize("kind", ["plate", "stack"])
def test_wall_under_a_cooling_flux_is_as_cold_as_its_layer_makes_it(kind):
    stated = cooled(kind, 'flux = "-150 W/m2"')
    got = stated.evaluate(designs(stated, 300))
    assert np.all(got.outcomes["hottest_wall"] == 298.15)
    assert np.all(got.outcomes["coldest_wall"] < 298.15 - 150.0 / got.outcomes["mean_h"])
    warm = cooled(kind, 'flux = "150 W/m2"').evaluate(designs(stated, 300))
    assert_allclose(
        298.15 - got.outcomes["coldest_wall"], warm.outcomes["hottest_wall"] - 298.15, rtol=0.25
    )


def test_wall_colder_than_the_fluid_can_be_is_impossible_and_says_why():
    stated = cooled("stack", 'flux = "-90 kW/m2"', fluid="water")
    got = stated.evaluate(designs(stated, 300))
    frozen = got.outcomes["coldest_wall"] < 273.15
    assert frozen.any()
    assert not np.any(got.possible & frozen)
    assert "freezes" in got.reasons[frozen][0]


def test_wall_hotter_than_boiling_is_impossible_and_says_why():
    stated = cooled("stack", 'temperature = "110 degC"', fluid="water")
    got = stated.evaluate(designs(stated, 20))
    assert not got.possible.any()
    assert "boils at 100.0 degC" in got.reasons[0]


def test_surface_under_the_dew_point_is_possible_and_cautioned():
    stated = cooled("stack", 'temperature = "8 degC"', "humid air", 25.0, 'humidity = "60 %"')
    got = stated.evaluate(designs(stated, 50))
    assert got.possible.all()
    assert got.cautions[cautions.WET].all()


def test_buoyancy_is_seen_under_a_cooling_flux():
    stated = cooled("plate", 'flux = "-150 W/m2"')
    slow = np.array([[1.0, 0.5]])
    assert stated.evaluate(slow).cautions[cautions.BUOYANT].all()


def test_fan_power_stays_positive_where_cooled_gas_recovers_static_pressure():
    stated = cooled("stack", 'temperature = "30 degC"', inlet=800.0, length='["0.02 m", "0.4 m"]')
    got = stated.evaluate(designs(stated, 4000))
    assert np.any(got.outcomes["pressure_drop"] < 0.2 * got.outcomes["shear_drop"])
    assert np.all(got.outcomes["fan_power"] > 0.0)


def test_momentum_of_the_passage_balances():
    # pressure force = walls and wires + momentum leaving at outlet density - momentum arriving
    stated = problem("hulling-stack")
    got = stated.evaluate(designs(stated, 200))
    out, given = got.outcomes, got.settings
    walked = stated.batch(designs(stated, 200)).walked
    inside = sum(out[f"{part}_drop"] for part in ("shear", "wire", "development", "heating"))
    rho_in = stated.fluid.at(np.array([298.15])).rho
    rho_out = stated.fluid.at(out["outlet_temperature"]).rho
    square = (rho_in * given["velocity"]) ** 2
    leaving = walked.sweep.momentum_factor * square / rho_out - square / rho_in
    section = given["gap"] * given["width"] * given["count"]
    assert_allclose(inside * section, out["drag"] + leaving * section, rtol=1e-9)

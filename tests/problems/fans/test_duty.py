"""Duty points against hand-worked ones and against an independent root finder."""

import numpy as np
import pytest
from scipy.interpolate import PchipInterpolator
from scipy.optimize import brentq

from problems.fans.curves import curves
from problems.fans.duty import fixed_speed, throttled, variable_speed
from problems.fans.meeting import meet
from problems.fans.motors import Motor, ordinary_motor
from problems.fans.roots import falling_cubic_root, falling_root
from problems.fans.systems import SampledSystem, System
from problems.fans.terms import Drive, Reason
from tests.problems.fans.made import dipped_fan, fan, quadratic_fan, random_fans
from tests.published_data import published

OF_FANS = published("fans").set_index("quantity")
ROW = np.array([0])


def reasons(duty):
    return [Reason(value).name for value in duty.reason.ravel()]


def test_the_hand_worked_duty_point_is_met():
    duty = fixed_speed(curves([quadratic_fan(401)]), ROW, System(square=900.0), 1.2)
    assert duty.holds.all()
    for name in ("flow", "pressure"):
        stated = OF_FANS.loc[f"duty_{name}"]
        assert getattr(duty, name)[0] == pytest.approx(stated.value, rel=stated.tolerance)


def test_random_systems_agree_with_an_independent_root_finder():
    rng = np.random.default_rng(11)
    fans = random_fans(60, seed=7)
    made = curves(fans)
    constant, linear, square = (
        rng.uniform(0, 20, 80),
        10 ** rng.uniform(0, 2, 80),
        10 ** rng.uniform(0, 4, 80),
    )
    system = System(constant, linear, square)
    duty = fixed_speed(made, made.every, system, 1.1)
    compared = 0
    for row, one in enumerate(fans):
        curve = PchipInterpolator(one.flow, np.array(one.pressure) * 1.1 / 1.2)
        for n in range(80):

            def excess(q, n=n, curve=curve):
                return curve(q) - (constant[n] + linear[n] * q + square[n] * q * q)

            low, high = one.flow[one.peak], one.flow[-1]
            if excess(low) <= 0.0:
                assert duty.why((row, n)) in (Reason.STALL, Reason.UNTESTED)
            elif excess(high) >= 0.0:
                assert duty.why((row, n)) is Reason.BEYOND
            else:
                compared += 1
                root = brentq(excess, low, high, xtol=1e-14, rtol=1e-13)
                assert duty.flow[row, n] == pytest.approx(root, rel=1e-6)
                assert duty.pressure[row, n] == pytest.approx(float(system(root)[n]), rel=1e-6)
    assert compared > 1000


def test_a_system_given_as_a_function_meets_the_curve_where_its_formula_does():
    rng = np.random.default_rng(4)
    made = curves(random_fans(50, seed=8), parallel=(1, 2))
    system = System(linear=10 ** rng.uniform(0, 2, 60), square=10 ** rng.uniform(0, 4, 60))
    formula = fixed_speed(made, made.every, system, 1.0)
    function = fixed_speed(made, made.every, lambda flow: system(flow), 1.0)
    assert function.flow == pytest.approx(formula.flow, rel=1e-9)
    assert np.array_equal(function.reason, formula.reason)
    assert np.array_equal(function.second, formula.second)


def test_the_wanted_point_lies_on_the_affine_curve_at_the_speed_found():
    rng = np.random.default_rng(2)
    fans = random_fans(40, seed=9)
    made = curves(fans)
    flow, pressure, density = (
        10 ** rng.uniform(-1, 1, 50),
        10 ** rng.uniform(1, 3, 50),
        rng.uniform(0.8, 1.3, 50),
    )
    duty = variable_speed(made, made.every, flow, pressure, density, Drive(margin=0.1))
    found = np.argwhere(duty.holds)
    assert len(found) > 100
    for row, n in found:
        one, ratio = fans[row], duty.speed[row, n] / fans[row].speed
        at = flow[n] / ratio
        static = PchipInterpolator(one.flow, one.pressure)(at)
        shaft = PchipInterpolator(one.flow, one.power)(at) * ratio**3 * density[n] / 1.2
        assert static * ratio**2 * density[n] / 1.2 == pytest.approx(pressure[n], rel=1e-6)
        assert duty.shaft_power[row, n] == pytest.approx(shaft, rel=1e-6)
        assert at >= one.flow[one.peak] / 0.9 * (1 - 1e-9)
        assert duty.margin[row, n] == pytest.approx(1.0 - one.flow[one.peak] / at, abs=1e-6)
    assert duty.flow[duty.holds] == pytest.approx(
        np.broadcast_to(flow, duty.flow.shape)[duty.holds]
    )


def test_paired_rows_give_the_same_as_all_against_all():
    rng = np.random.default_rng(5)
    made = curves(random_fans(7, seed=1), parallel=(1, 2))
    row = rng.integers(0, len(made), 30)
    flow, pressure = 10 ** rng.uniform(-1, 1, 30), 10 ** rng.uniform(1, 3, 30)
    paired = variable_speed(made, row, flow, pressure, 1.2)
    every = variable_speed(made, made.every, flow, pressure, 1.2).at((row, np.arange(30)))
    for name in paired.__dataclass_fields__:
        assert np.array_equal(getattr(paired, name), getattr(every, name)), name


@pytest.mark.parametrize("shape", [(), (12,), (3, 4)])
def test_duties_of_an_array_equal_those_taken_one_by_one(shape):
    rng = np.random.default_rng(6)
    made = curves([dipped_fan()])
    flow, pressure = rng.uniform(0.3, 1.6, shape), rng.uniform(30, 600, shape)
    row = np.zeros(shape, dtype=int)
    together = variable_speed(made, row, flow, pressure, 1.2)
    assert together.speed.shape == shape
    for index in np.ndindex(shape):
        alone = variable_speed(made, np.array(0), flow[index], pressure[index], 1.2)
        assert together.speed[index] == pytest.approx(float(alone.speed), rel=1e-12)
        assert together.reason[index] == alone.reason


def test_two_meeting_points_resolve_to_the_stable_one_and_say_so():
    # 330 Pa held and a little resistance: the dip to 300 Pa lies below it
    system = System(constant=330.0, square=20.0)
    duty = fixed_speed(curves([dipped_fan()]), ROW, system, 1.2)
    one = dipped_fan()
    curve = PchipInterpolator(one.flow, one.pressure)

    def excess(q):
        return curve(q) - 330.0 - 20.0 * q * q

    assert excess(0.2) > 0.0 > excess(0.4)
    assert duty.second[0]
    assert duty.holds[0]
    assert duty.flow[0] == pytest.approx(brentq(excess, 0.8, 1.6), rel=1e-9)


def test_a_system_that_clears_the_dip_has_one_meeting_point():
    duty = fixed_speed(curves([dipped_fan()]), ROW, System(square=250.0), 1.2)
    assert duty.holds[0]
    assert not duty.second[0]


def test_a_deep_dip_is_told_for_a_variable_speed_too():
    deep = fan([0, 0.5, 0.7, 1.0, 1.2, 1.6], [450, 60, 200, 400, 380, 20], [600] * 6)
    made = curves([deep])
    assert made.dip_ratio[0] < 400.0
    duty = variable_speed(made, ROW, 1.1, 1.1**2 * 330.0, 1.2, Drive(margin=0.05))
    assert duty.holds[0]
    assert duty.second[0]


def test_parallel_fans_above_the_dip_are_told_to_share_unevenly():
    made = curves([dipped_fan()], parallel=(2,))
    above = variable_speed(made, ROW, 2.1, 360.0, 1.2)
    below = variable_speed(made, ROW, 2.6, 250.0, 1.2)
    assert above.holds[0]
    assert above.uneven[0]
    assert below.holds[0]
    assert not below.uneven[0]
    assert not variable_speed(curves([dipped_fan()]), ROW, 1.05, 360.0, 1.2).uneven[0]


@pytest.mark.parametrize(
    ("flow", "pressure", "reason"),
    [
        (1.2, 300.0, "HOLDS"),
        (0.5, 300.0, "STALL"),
        (0.86, 390.0, "MARGIN"),
        (1.6, 10.0, "BEYOND"),
        (1.7, 600.0, "TOO_FAST"),
        (0.3, 19.0, "TOO_SLOW"),
        (0.0, 100.0, "NO_DUTY"),
        (1.0, -1.0, "NO_DUTY"),
    ],
)  # fmt: skip
def test_a_variable_speed_fan_tells_why_it_cannot_serve(flow, pressure, reason):
    duty = variable_speed(curves([dipped_fan()]), ROW, flow, pressure, 1.2)
    assert reasons(duty) == [reason]
    assert (duty.short_by[0] > 0.0) == (reason != "HOLDS")
    assert all(np.isfinite(getattr(duty, name)).all() for name in duty.__dataclass_fields__)


@pytest.mark.parametrize(
    ("square", "least", "reason"),
    [
        (208.3, 0.0, "HOLDS"),
        (208.3, 1.5, "TOO_LITTLE"),
        (1000.0, 0.0, "STALL"),
        (520.0, 0.0, "MARGIN"),
        (2.0, 0.0, "BEYOND"),
        (0.0, 0.0, "NO_DUTY"),
    ],
)
def test_a_fixed_speed_fan_tells_why_it_cannot_serve(square, least, reason):
    duty = fixed_speed(curves([dipped_fan()]), ROW, System(square=square), 1.2, least_flow=least)
    assert reasons(duty) == [reason]
    assert (duty.short_by[0] > 0.0) == (reason != "HOLDS")
    assert all(np.isfinite(getattr(duty, name)).all() for name in duty.__dataclass_fields__)


@pytest.mark.parametrize(
    ("flow", "reason"),
    [(1.2, "HOLDS"), (0.5, "STALL"), (0.85, "MARGIN"), (1.7, "BEYOND"), (0.0, "NO_DUTY")],
)
def test_a_throttled_fan_works_on_its_own_curve(flow, reason):
    duty = throttled(curves([dipped_fan()]), ROW, flow, 0.6)
    assert reasons(duty) == [reason]
    if reason == "HOLDS":
        assert duty.pressure[0] == pytest.approx(300.0 / 2.0)
        assert duty.shaft_power[0] == pytest.approx(600.0 / 2.0)


def test_a_curve_that_starts_late_is_untested_on_its_left():
    late = fan([0.8, 1.0, 1.2, 1.4], [400, 380, 300, 180], [600] * 4)
    assert reasons(variable_speed(curves([late]), ROW, 0.5, 300.0, 1.2)) == ["UNTESTED"]
    assert reasons(fixed_speed(curves([late]), ROW, System(square=2000.0), 1.2)) == ["UNTESTED"]


def test_shortfall_is_smooth_along_a_path_that_leaves_and_comes_back():
    made = curves([dipped_fan()])
    flow = np.geomspace(0.05, 8.0, 4000)
    for duty in (
        variable_speed(made, made.every, flow, np.full(4000, 250.0), 1.2),
        fixed_speed(made, made.every, System(square=250.0 / flow**2), 1.2),
    ):
        short = duty.short_by[0]
        assert np.array_equal(short > 0.0, ~duty.holds[0])
        assert np.abs(np.diff(short)).max() < 0.03
        outside = np.flatnonzero(duty.holds[0])
        assert np.all(np.diff(short[: outside[0]]) < 0.0)
        assert np.all(np.diff(short[outside[-1] + 1 :]) > 0.0)


def test_density_moves_pressure_and_power_but_not_flow_at_one_speed():
    made = curves([quadratic_fan()])
    dense = fixed_speed(made, ROW, System(square=900.0), 1.2)
    thin = fixed_speed(made, ROW, System(square=450.0), 0.6)
    assert thin.flow == pytest.approx(dense.flow, rel=1e-12)
    assert thin.pressure == pytest.approx(dense.pressure / 2.0, rel=1e-12)
    assert thin.shaft_power == pytest.approx(dense.shaft_power / 2.0, rel=1e-12)


def test_electrical_power_holds_motor_and_drive_once():
    drive = Drive(motor=Motor.constant(0.8), efficiency=0.95)
    shaft, mains = quadratic_fan(), quadratic_fan(electrical=True)
    duty = variable_speed(curves([shaft, mains]), np.array([0, 1]), 0.6, 350.0, 1.2, drive)
    assert duty.electrical_power[0] == pytest.approx(duty.shaft_power[0] / 0.76)
    assert duty.electrical_power[1] == pytest.approx(duty.shaft_power[0])
    assert duty.shaft_power[1] == 0.0
    assert duty.efficiency == pytest.approx(0.6 * 350.0 / duty.electrical_power)


def test_the_ordinary_motor_is_better_the_larger_it_is():
    power = np.geomspace(5.0, 1e5, 2000)
    efficiency = ordinary_motor()(power)
    assert np.all(np.diff(efficiency) >= 0.0)
    assert np.all(np.diff(power / efficiency) > 0.0)
    assert ordinary_motor()(np.array([1100.0]))[0] == pytest.approx(0.841, abs=1e-3)


def test_a_sampled_system_goes_through_its_readings_and_follows_power_laws():
    flow = np.geomspace(0.2, 2.0, 6)[:, np.newaxis] * np.array([1.0, 3.0])
    system = SampledSystem(flow, 40.0 * flow**1.7)
    assert system(flow) == pytest.approx(40.0 * flow**1.7)
    between = np.array([[0.11, 0.3], [0.5, 2.2], [4.0, 9.0]])
    assert system(between) == pytest.approx(40.0 * between**1.7)
    assert system.covers(between).tolist() == [[False, False], [True, True], [False, False]]


def test_a_sampled_system_meets_fans_near_the_formula_it_was_read_from():
    made = curves(random_fans(30, seed=12))
    formula = System(linear=np.array([40.0, 5.0]), square=np.array([30.0, 400.0]))
    flow = np.geomspace(0.02, 20.0, 12)[:, np.newaxis] * np.ones(2)
    sampled = fixed_speed(made, made.every, SampledSystem(flow, formula(flow)), 1.2)
    exact = fixed_speed(made, made.every, formula, 1.2)
    both = sampled.holds & exact.holds
    assert both.sum() > 10
    assert sampled.flow[both] == pytest.approx(exact.flow[both], rel=0.01)


def test_a_system_between_two_readings_passes_through_both():
    made = System.between(np.array([2.0]), np.array([60.0]), np.array([1.0]), np.array([20.0]))
    assert (made.linear, made.square) == (pytest.approx([10.0]), pytest.approx([10.0]))
    steep = System.between(np.array([2.0]), np.array([60.0]), np.array([1.0]), np.array([1.0]))
    assert steep(np.array([2.0])) == pytest.approx([60.0])
    assert np.all(steep.linear >= 0.0)


def test_series_and_clogging_add_up():
    filtered = System.laminar(0.5, 40.0)
    both = System.turbulent(0.5, 100.0) + filtered
    assert both(np.array(1.0)) == pytest.approx(400.0 + 80.0)
    assert (both + filtered.times(1.0))(np.array(0.5)) == pytest.approx(180.0)
    assert both.at_density(0.5)(np.array(1.0)) == pytest.approx(200.0 + 80.0)


def test_cubic_roots_agree_with_the_general_root_finder():
    rng = np.random.default_rng(0)
    width = rng.uniform(0.1, 2.0, 3000)
    c1, c3 = -rng.uniform(0.0, 3.0, 3000), -rng.uniform(0.0, 3.0, 3000)
    c2 = rng.uniform(-1, 1, 3000) * np.sqrt(3.0 * c1 * c3)  # no turning point: falls everywhere
    c0 = rng.uniform(-1.0, 6.0, 3000)

    def cubic(x):
        return ((c3 * x + c2) * x + c1) * x + c0

    quick = falling_cubic_root(c0, c1, c2, c3, width)
    assert quick == pytest.approx(falling_root(cubic, np.zeros(3000), width), rel=1e-9, abs=1e-9)
    inside = (quick > 0.0) & (quick < width)
    assert 500 < inside.sum() < 2900
    assert np.abs(cubic(quick)[inside]).max() < 1e-11


@pytest.mark.parametrize("power", [1, 3, 9, 31])
def test_the_bracketing_root_finder_holds_for_awkward_shapes(power):
    at = np.array([[0.003, 0.2], [0.5, 0.98]])
    found = falling_root(lambda x: at**power - x**power, np.zeros((2, 2)), np.ones((2, 2)))
    assert found == pytest.approx(at, rel=1e-9)


def test_meeting_points_outside_the_stable_side_are_clipped_to_it():
    made = curves([dipped_fan()])
    flow = meet(made, made.every, System(square=np.array([1e5, 0.0])))
    assert flow == pytest.approx(np.array([[0.8, 1.6]]))

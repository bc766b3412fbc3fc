"""Curves keep the shape of the tested points, and the affinity laws hold."""

import numpy as np
import pytest
from scipy.interpolate import PchipInterpolator

from problems.fans.curves import affinity, curves, peak_of
from tests.problems.fans.made import dipped_fan, fan, quadratic_fan, random_fans
from tests.published_data import published

OF_FANS = published("fans").set_index("quantity")


@pytest.mark.parametrize("which", ["flow", "pressure", "power"])
def test_affinity_follows_the_fan_laws(which):
    stated = OF_FANS.loc[f"affinity_{which}"]
    changed = dict(
        zip(("flow", "pressure", "power"), affinity(1.0, 1.0, 1.0, stated.a, stated.b), strict=True)
    )
    assert changed[which] == pytest.approx(stated.value, rel=stated.tolerance)


def test_curves_of_many_fans_agree_with_an_independent_interpolation():
    fans = random_fans(40, seed=3)
    made = curves(fans)
    share = np.linspace(0.0, 1.0, 101)
    flow = made.end[:, np.newaxis] * share
    pressure, power = made.pressure(made.every, flow), made.power(made.every, flow)
    for row, one in enumerate(fans):
        assert pressure[row] == pytest.approx(
            PchipInterpolator(one.flow, one.pressure)(flow[row]), abs=1e-9
        )
        assert power[row] == pytest.approx(
            PchipInterpolator(one.flow, one.power)(flow[row]), abs=1e-9
        )


def test_no_curve_overshoots_its_tested_points():
    made = curves([dipped_fan()])
    seen = made.pressure(made.every, np.linspace(0.0, 0.8, 500))
    assert seen.min() >= 300.0
    assert made.pressure(made.every, np.linspace(0.4, 1.6, 500)).max() <= 400.0


def test_a_curve_is_never_read_beyond_its_tested_points():
    made = curves([quadratic_fan()])
    assert made.pressure(made.every, np.array([9.0])) == pytest.approx(500 - 128 - 307.2)


def test_the_peak_is_where_the_last_fall_begins():
    assert peak_of([450, 380, 300, 340, 400, 380, 20]) == 4
    assert peak_of([5, 4, 3, 2]) == 0
    assert peak_of([5, 4, 4, 2]) == 2
    assert peak_of([1, 2, 3]) == 2


def test_dip_and_peak_of_a_stalling_fan_are_found():
    made = curves([dipped_fan()])
    assert made.peak[0] == pytest.approx(0.8)
    assert made.dip_pressure[0] == pytest.approx(300.0, rel=2e-3)


def test_best_efficiency_is_found_between_tested_points():
    flow = np.linspace(0.0, 1.0, 11)
    made = curves([fan(flow, 100.0 * (1.0 - flow**2), [80.0] * 11)])
    assert made.best[0] == pytest.approx(1.0 / np.sqrt(3.0), abs=0.01)
    assert made.best_efficiency[0] == pytest.approx(
        100.0 * 2.0 / 3.0 / np.sqrt(3.0) / 80.0, rel=2e-3
    )


def test_fans_in_parallel_give_as_much_more_flow_at_the_same_pressure():
    made = curves([dipped_fan()], parallel=(1, 3))
    assert made.count.tolist() == [1.0, 3.0]
    assert made.fan.tolist() == [0, 0]
    flow = np.linspace(0.0, 1.6, 50)
    single = made.pressure(np.zeros(50, dtype=int), flow)
    assert made.pressure(np.ones(50, dtype=int), 3.0 * flow) == pytest.approx(single)


def test_a_curve_at_another_speed_is_the_affine_curve():
    made = curves(random_fans(6, seed=5))
    faster = made.at_speed(made.speed * 1.3)
    flow = made.end[:, np.newaxis] * np.linspace(0.0, 1.0, 40)
    expected = affinity(
        flow, made.pressure(made.every, flow), made.power(made.every, flow), 1.3, 1.0
    )
    assert faster.pressure(faster.every, expected[0]) == pytest.approx(expected[1], rel=1e-9)
    assert faster.power(faster.every, expected[0]) == pytest.approx(expected[2], rel=1e-9)
    assert faster.end == pytest.approx(made.end * 1.3)

"""The fan chosen is the cheapest to run of those that hold the point, for every design."""

import numpy as np
import pytest

from problems.fans.catalogue import read_catalogue
from problems.fans.choice import (
    choose_fixed,
    choose_variable,
    ranking,
    specific_power,
    specific_power_class,
)
from problems.fans.curves import curves
from problems.fans.duty import fixed_speed, variable_speed
from problems.fans.systems import SampledSystem, System
from problems.fans.terms import CAUTIONS, Drive, Reason
from tests.problems.fans.made import dipped_fan, quadratic_fan
from tests.published_data import published

OF_FANS = published("fans").set_index("quantity")


@pytest.fixture(scope="module")
def workshop():
    return read_catalogue("workshop-fans")


def designs(count, seed):
    rng = np.random.default_rng(seed)
    flow, pressure = 10 ** rng.uniform(-1.5, 1.2, count), 10 ** rng.uniform(1.0, 3.2, count)
    return flow, pressure, rng.uniform(0.8, 1.3, count)


@pytest.mark.parametrize("margin", [0.0, 0.1, 0.4])
def test_no_other_arrangement_that_holds_the_point_takes_less_power(workshop, margin):
    made = curves(workshop.fans, parallel=(1, 2, 3))
    drive = Drive(margin=margin)
    flow, pressure, density = designs(1500, seed=1)
    choice = choose_variable(made, flow, pressure, density, drive)
    every = variable_speed(made, made.every, flow, pressure, density, drive)
    least = np.where(every.holds, every.electrical_power, np.inf).min(axis=0)
    served = np.isfinite(least)
    assert 200 < served.sum() < 1500
    assert np.array_equal(choice.duty.holds, served)
    assert choice.duty.electrical_power[served] == pytest.approx(least[served], rel=1e-12)
    assert choice.duty.short_by[~served] == pytest.approx(every.short_by.min(axis=0)[~served])
    assert np.array_equal(choice.fan, made.fan[choice.row])
    assert np.array_equal(choice.count, made.count[choice.row])


def test_at_fixed_speed_the_least_power_that_delivers_the_flow_is_chosen(workshop):
    made = curves(workshop.fans, parallel=(1, 2))
    flow, pressure, density = designs(800, seed=2)
    system = System.turbulent(flow, pressure)
    choice = choose_fixed(made, system, density, least_flow=0.9 * flow)
    every = fixed_speed(made, made.every, system, density, least_flow=0.9 * flow)
    least = np.where(every.holds, every.electrical_power, np.inf).min(axis=0)
    assert np.array_equal(choice.duty.holds, np.isfinite(least))
    assert choice.duty.electrical_power[choice.duty.holds] == pytest.approx(
        least[np.isfinite(least)]
    )
    assert np.all(choice.duty.flow[choice.duty.holds] >= 0.9 * flow[choice.duty.holds])


def test_at_fixed_speed_readings_of_a_model_serve_as_well(workshop):
    made = curves(workshop.fans)
    flow, pressure, density = designs(300, seed=3)
    steps = np.geomspace(0.01, 40.0, 9)[:, np.newaxis] * np.ones(300)
    formula = System.turbulent(flow, pressure)
    read = choose_fixed(made, SampledSystem(steps, formula(steps)), density)
    assert np.array_equal(read.row, choose_fixed(made, formula, density).row)


def test_the_nearest_fan_and_its_reason_stand_where_none_can_serve():
    made = curves([dipped_fan(), quadratic_fan(name="other")])
    choice = choose_variable(
        made, np.array([60.0, 0.0]), np.array([300.0, 10.0]), np.array([1.2, 1.2])
    )
    assert not choice.duty.holds.any()
    assert choice.duty.why(0) is Reason.BEYOND
    assert choice.duty.why(1) is Reason.NO_DUTY
    assert np.all(choice.duty.short_by > 0.0)
    assert np.all(np.isfinite(choice.duty.electrical_power))


def test_the_answer_does_not_depend_on_how_many_designs_are_asked_at_once(workshop):
    made = curves(workshop.fans, parallel=(1, 2))
    flow, pressure, density = designs(3000, seed=4)
    together = choose_variable(made, flow, pressure, density)
    parts = [
        choose_variable(made, flow[i : i + 7], pressure[i : i + 7], density[i : i + 7])
        for i in range(0, 70, 7)
    ]
    assert np.array_equal(together.row[:70], np.concatenate([part.row for part in parts]))


def test_two_in_parallel_are_taken_where_one_is_too_small():
    made = curves([quadratic_fan()], parallel=(1, 2))
    choice = choose_variable(made, np.array([0.6, 2.4]), np.array([350.0, 300.0]), np.full(2, 1.2))
    assert choice.count.tolist() == [1.0, 2.0]
    assert choice.duty.holds.all()


def test_a_ranking_lists_every_fan_once_and_the_cheapest_first(workshop):
    made = curves(workshop.fans, parallel=(1, 2))
    duty = variable_speed(made, np.arange(len(made)), 1.0, 200.0, 1.2)
    order = ranking(made, duty)
    assert sorted(made.fan[order]) == list(range(len(workshop)))
    held = duty.holds[order]
    assert 3 < held.sum() < len(workshop)
    assert not np.any(np.diff(held.astype(int)) > 0)
    assert np.all(np.diff(duty.electrical_power[order][held]) >= 0.0)
    assert np.all(np.diff(duty.short_by[order][~held]) >= 0.0)
    chosen = choose_variable(made, np.array([1.0]), np.array([200.0]), np.array([1.2]))
    assert chosen.row[0] == order[0]


def test_classes_of_specific_fan_power_are_those_of_the_standard():
    stated = OF_FANS.loc["class"]
    assert specific_power_class(stated.a.to_numpy()).tolist() == stated.value.tolist()


def test_specific_fan_power_is_power_over_flow():
    assert specific_power(np.array([1500.0]), np.array([2.0])) == pytest.approx([750.0])


@pytest.mark.parametrize("reason", list(Reason))
def test_every_reason_says_what_to_do(reason):
    assert reason.says
    assert (reason <= Reason.NO_DUTY) or ": " in reason.says


def test_every_caution_belongs_to_a_flag_of_a_duty_point():
    duty = variable_speed(curves([dipped_fan()]), np.array([0]), 1.0, 300.0, 1.2)
    assert all(getattr(duty, name).dtype == bool for name in CAUTIONS)


def test_the_workshop_fans_span_what_ready_made_cases_need(workshop):
    made = curves(workshop.fans)
    assert len(workshop) >= 24
    assert {"axial", "centrifugal"} <= {fan.sort for fan in workshop.fans}
    assert np.all((made.best_efficiency > 0.3) & (made.best_efficiency < 0.75))
    assert (made.dip_pressure < 0.95 * made.pressure(np.arange(len(made)), made.peak)).sum() >= 8
    flow = np.geomspace(200.0, 20000.0, 12) / 3600.0
    at_low = choose_variable(made, flow, np.full(12, 20.0), np.full(12, 1.2))
    assert at_low.duty.holds.all()
    high = flow[(flow > 0.2) & (flow < 3.0)]
    assert choose_variable(
        made, high, np.full(len(high), 600.0), np.full(len(high), 1.2)
    ).duty.holds.all()

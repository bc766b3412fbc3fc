"""Which designs are shown by name."""

from __future__ import annotations

import numpy as np
import pytest

from optim import Front, picks
from problems.problem import Aim
from tests.optim import fake

MOST_HEAT, LEAST_POWER = Aim("heat", "most"), Aim("fan_power", "least")


@pytest.fixture(scope="module", params=[2, 3], ids=["two aims", "three aims"])
def problem(request: pytest.FixtureRequest) -> fake.FakePlates:
    return fake.FakePlates(aims=(MOST_HEAT, LEAST_POWER, Aim("drag", "least"))[: request.param])


@pytest.fixture(scope="module")
def front(problem: fake.FakePlates) -> Front:
    return fake.sampled(problem)


def test_ends_are_the_best_of_the_leading_aims_and_the_middle_lies_between(problem, front):
    low, middle, high = picks.picked(front, problem)
    heat = picks.column(front, problem, "heat")
    power = picks.column(front, problem, "fan_power")
    assert (low.letter, low.label, low.row) == ("A", "least fan power", np.argmin(power))
    assert (high.letter, high.label, high.row) == ("C", "most heat", np.argmax(heat))
    assert heat[low.row] < heat[middle.row] < heat[high.row]
    assert power[low.row] < power[middle.row] < power[high.row]


def test_the_middle_is_beaten_by_none_in_the_two_leading_aims(problem, front):
    row = picks.picked(front, problem)[1].row
    heat = picks.column(front, problem, "heat")
    power = picks.column(front, problem, "fan_power")
    assert not np.any((heat > heat[row]) & (power < power[row]))


def test_the_spread_runs_from_the_least_power_and_holds_the_picked_designs(problem, front):
    rows = picks.spread(front, problem)
    power = picks.column(front, problem, "fan_power")
    assert len(set(rows.tolist())) == 7
    assert rows[0] == np.argmin(power)
    assert np.all(np.diff(power[rows]) > 0)
    assert {pick.row for pick in picks.picked(front, problem)} <= set(rows.tolist())


def test_designs_are_those_that_give_the_table(problem, front):
    given = problem.evaluate(picks.designs(front, problem))
    assert np.allclose(given.outcomes["heat"], front.table["heat_W"])


def test_one_aim_has_one_pick():
    problem = fake.FakePlates(aims=(MOST_HEAT,))
    front = fake.sampled(problem)
    assert [pick.label for pick in picks.picked(front, problem)] == ["most heat"]


def test_a_front_of_two_has_two_picks_and_one_of_one_has_one(problem, front):
    ends = [picks.picked(front, problem)[0].row, picks.picked(front, problem)[2].row]
    two = Front(front.table.iloc[ends].reset_index(drop=True), {}, "")
    assert [pick.letter for pick in picks.picked(two, problem)] == ["A", "B"]
    one = Front(front.table.iloc[:1], {}, "")
    assert [pick.row for pick in picks.picked(one, problem)] == [0]


def test_an_empty_front_has_none(problem, front):
    empty = Front(front.table.iloc[:0], {}, "")
    assert picks.picked(empty, problem) == ()
    assert len(picks.spread(empty, problem)) == 0

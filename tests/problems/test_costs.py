"""Energy and money against figures worked by hand and the textbook's annuity tables."""

import numpy as np
import pytest

from problems.costs import Money, Profile, annuity, costs, present_value, yearly_energy
from tests.published_data import published

OF_FANS = published("fans").set_index("quantity")


def test_annuities_are_those_of_the_tables():
    for stated in OF_FANS.loc["annuity"].itertuples():
        assert annuity(stated.a, stated.b) == pytest.approx(stated.value, rel=stated.tolerance)


def test_the_annuity_pays_the_investment_back_year_by_year():
    debt = 1000.0
    for _ in range(12):
        debt = debt * 1.06 - 1000.0 * float(annuity(0.06, 12.0))
    assert debt == pytest.approx(0.0, abs=1e-9)


def test_the_annuity_has_no_jump_at_no_interest():
    assert annuity(1e-12, 20.0) == pytest.approx(float(annuity(0.0, 20.0)), rel=1e-9)


def test_present_value_is_the_sum_of_discounted_payments():
    by_hand = sum(250.0 / 1.04**year for year in range(1, 16))
    assert present_value(250.0, 0.04, 15.0) == pytest.approx(by_hand)


def test_a_kilowatt_for_a_thousand_hours_is_a_thousand_kilowatt_hours():
    assert yearly_energy(np.array([1000.0]), 1000.0) == pytest.approx([1000.0])


def test_costs_of_a_design_worked_by_hand():
    # 10 m2 at 30 and a fan at 200: 500 once; 2000 kWh at 0.25: 500 a year; 10 years, no interest
    made = costs(
        Money(0.25, 30.0, 10.0, 0.0), np.array([2000.0]), np.array([10.0]), np.array([200.0])
    )
    assert made.investment == pytest.approx([500.0])
    assert made.yearly_energy_cost == pytest.approx([500.0])
    assert made.yearly_cost == pytest.approx([550.0])
    assert made.present_value == pytest.approx([5500.0])


def test_present_value_is_the_yearly_cost_of_the_whole_life():
    money = Money(0.3, 25.0, 12.0, 0.05)
    made = costs(money, np.array([4000.0]), np.array([30.0]), np.array([900.0]))
    assert present_value(made.yearly_cost, 0.05, 12.0) == pytest.approx(made.present_value)


def test_a_profile_knows_its_hours():
    assert Profile((1.0, 0.5), (2000.0, 3000.0)).total_hours == 5000.0
    assert Profile.steady(4000.0) == Profile((1.0,), (4000.0,))

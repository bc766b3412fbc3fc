"""The paragraph that justifies a fan says what the figures say."""

import numpy as np
import pytest

from problems.costs import Money
from problems.fans.catalogue import Catalogue
from problems.fans.choice import ranking
from problems.fans.curves import curves
from problems.fans.duty import variable_speed
from problems.fans.motors import Motor
from problems.fans.terms import Drive
from problems.fans.words import Ranked, justification
from tests.problems.fans.made import fan, quadratic_fan

LOSSLESS = Drive(motor=Motor.constant(0.8), efficiency=1.0)


def ranked(fans, flow=0.66, pressure=392.0, parallel=(1,)):
    made = curves(fans, parallel)
    duty = variable_speed(made, np.arange(len(made)), flow, pressure, 1.2, LOSSLESS)
    return Ranked(Catalogue("made", tuple(fans), "EUR"), made, duty, ranking(made, duty))


def hungry(extra, **changes):
    base = quadratic_fan()
    return fan(base.flow, base.pressure, np.array(base.power) * (1.0 + extra), **changes)


@pytest.fixture
def workshop():
    large = fan(
        np.linspace(0, 40, 9),
        np.linspace(900, 100, 9),
        [20000.0] * 9,
        name="Vast",
        price=9000.0,
        lowest_speed=23.0,
    )
    thrifty = quadratic_fan(name="Thrifty", price=500.0)
    fans = [hungry(0.5, name="Hungry", price=300.0), thrifty, hungry(0.1, name="Next", price=600.0)]
    return ranked([*fans, large])


def test_the_choice_stands_beside_next_best_largest_and_cheapest(workshop):
    # 500 - 80 q - 120 q^2 = (392 / 0.66^2) q^2 gives q 0.66205; (200 + 300 q) (0.66 / q)^3 is
    # 394.92 W at the shaft, 493.7 W from the mains; the others draw 10 and 50 % more
    text = justification(workshop, 4000.0, Money(electricity_price=0.25, currency="EUR"))
    assert text.startswith("Thrifty at 14")
    assert "2376 m³/h against 392 Pa" in text
    assert "the least of the 3 of 4 fans that hold the point" in text
    assert "1975 kWh and 493.7 EUR in 4000 hours a year" in text
    assert "Next best is Next, which draws 543 W, 49.37 W or 10 % more." in text
    assert "The largest, Vast, cannot serve: needs a lower speed" in text
    assert "The cheapest to buy, 200 EUR less, is Hungry" in text
    assert "pays its higher price back in 0.8103 years" in text


def test_without_prices_nothing_is_said_of_buying():
    text = justification(ranked([quadratic_fan(name="Only")]), 1000.0, Money())
    assert "No other fan of the catalogue holds this point." in text
    assert "buy" not in text
    assert "nan" not in text


def test_where_none_can_serve_the_nearest_and_its_reason_are_named():
    text = justification(ranked([quadratic_fan(name="Only")], flow=9.0), 1000.0, Money())
    assert text.startswith(
        "No fan of the catalogue can serve. The nearest is Only: duty point right"
    )


def test_fans_in_parallel_are_counted_and_priced_together():
    pair = ranked([quadratic_fan(name="Twin", price=100.0)], flow=1.32, parallel=(1, 2))
    row = pair.holders[0]
    assert pair.name(row) == "2 Twin in parallel"
    assert pair.price(row) == 200.0

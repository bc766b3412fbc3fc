"""Problems compared on equal terms: toys whose best designs are known in closed form."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from numpy.testing import assert_allclose

from optim.contest import (
    Criterion,
    Design,
    Entry,
    combined,
    feasible,
    fronts,
    hold,
    restated,
    spread_along,
)
from problems.problem import Aim, Limit
from tests.optim.toy import Toy, plain

_MOST, _LEAST = Aim("output", "most"), Aim("effort", "least")
_CRITERIA = (
    Criterion("equal effort", _MOST, at_most=("effort",)),
    Criterion("equal output", _LEAST, no_worse=(_MOST,)),
    Criterion("equal effort and size", _MOST, at_most=("effort", "size")),
)


def bench(gain: float, cost: float = 0.0) -> Toy:
    """output = (1 + gain) sqrt(effort), effort = pull + cost; size is the other variable, which
    is worth a little: output grows with its tenth power.
    """
    return Toy(
        variables=plain("pull", "size", low=0.1, high=2.0),
        formulas={
            "output": lambda x: (1.0 + gain) * np.sqrt(x["pull"]) * x["size"] ** 0.1,
            "effort": lambda x: x["pull"] + cost,
            "size": lambda x: x["size"],
        },
        aims=(_MOST, _LEAST),
    )


@pytest.fixture(scope="module")
def held():
    entries = (Entry("base", bench(0.0)), Entry("better", bench(0.2)), Entry("worse", bench(-0.1)))
    known = fronts(entries, (_MOST, _LEAST))
    references = spread_along(entries[0], known["base"], "effort", (0.2, 0.5, 0.8))
    return entries, references, hold(entries, known, references, _CRITERIA)


def test_gains_are_those_of_the_formulas(held):
    _, references, winners = held
    assert len(references) == 3
    for place in range(3):
        base, better = (
            winners[place, "equal effort", name]["output"] for name in ("base", "better")
        )
        assert_allclose(better / base, 1.2, rtol=2e-3)
        saved = (
            winners[place, "equal output", "better"]["effort"]
            / winners[place, "equal output", "base"]["effort"]
        )
        assert_allclose(saved, 1.0 / 1.44, rtol=5e-3)


def test_no_entry_ever_loses_to_the_base(held):
    _, references, winners = held
    for place in range(len(references)):
        for key, sign, what in (
            ("equal effort", 1.0, "output"),
            ("equal output", -1.0, "effort"),
            ("equal effort and size", 1.0, "output"),
        ):
            base = winners[place, key, "base"][what]
            for name in ("better", "worse"):
                assert sign * (winners[place, key, name][what] - base) >= 0.0
            assert winners[place, key, "worse"].entry == "base"


def test_what_is_held_equal_is_kept(held):
    _, references, winners = held
    for (place, key, _), won in winners.items():
        assert won["effort"] <= references[place]["effort"] * (1.0 + 1e-6)
        if key == "equal effort and size":
            assert won["size"] <= references[place]["size"] * (1.0 + 1e-6)
        if key == "equal output":
            assert won["output"] >= references[place]["output"] * (1.0 - 1e-6)


def test_an_entry_without_a_front_gives_way_to_the_base():
    never = replace(bench(0.5), wrong=lambda x: np.ones(x["pull"].shape))
    entries = (Entry("base", bench(0.0)), Entry("never", never))
    known = fronts(entries, (_MOST, _LEAST))
    references = spread_along(entries[0], known["base"], "effort", (0.5,))
    winners = hold(entries, known, references, _CRITERIA[:1])
    assert len(known["never"]) == 0
    assert winners[0, "equal effort", "never"].entry == "base"
    assert spread_along(entries[1], known["never"], "effort", (0.5,)) == ()


def test_limits_of_one_outcome_are_joined_to_the_tightest():
    joined = combined(
        [Limit("a", at_most=3.0), Limit("b", at_least=1.0), Limit("a", at_least=0.5, at_most=2.0)]
    )
    assert joined == (Limit("a", at_least=0.5, at_most=2.0), Limit("b", at_least=1.0))


def test_restating_leaves_the_problem_as_it_is():
    first = bench(0.0)
    other = restated(first, (_MOST,), (Limit("size", at_most=1.0),))
    assert first.aims == (_MOST, _LEAST)
    assert first.limits == ()
    assert other.aims == (_MOST,)
    rows = np.array([[1.0, 0.5], [1.0, 1.5]])
    assert feasible(other, other.evaluate(rows)).tolist() == [True, False]
    assert feasible(first, first.evaluate(rows)).tolist() == [True, True]


def test_a_criterion_with_less_asked_is_looser():
    power, _, area = _CRITERIA
    assert power.looser_than(area)
    assert not area.looser_than(power)
    assert not power.looser_than(replace(area, aim=_LEAST))


def test_a_share_of_what_is_asked_is_enough():
    near = Criterion("near", _LEAST, no_worse=(_MOST,), share=0.9)
    (limit,) = near.limits({"output": 10.0})
    assert_allclose(limit.at_least, 9.0)
    cold = Criterion("cold", _MOST, no_worse=(_LEAST,), share=0.9)
    (limit,) = cold.limits({"effort": 10.0})
    assert_allclose(limit.at_most, 11.0)


def test_settings_and_outcomes_of_a_design_are_read_by_name():
    design = Design("one", np.zeros(1), {"pull": 1.0}, {"output": 2.0}, "plain")
    assert (design["pull"], design["output"]) == (1.0, 2.0)
    with pytest.raises(KeyError):
        design["nothing"]

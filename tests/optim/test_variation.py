"""New designs stay in the box, and the better of old ones survive."""

from __future__ import annotations

import numpy as np
import pytest

from optim.variation import (
    about,
    between_neighbours,
    differences,
    first_sample,
    offspring,
    survivors,
)

RNG_SEED = 4


def test_first_sample_fills_every_stratum_and_the_corners():
    sample = first_sample(400, 9, np.random.default_rng(RNG_SEED))
    assert (np.sort((sample * 400).astype(int), axis=0) == np.arange(400)[:, None]).all()
    corners = first_sample(400, 3, np.random.default_rng(RNG_SEED))[:8]
    assert len(np.unique(corners, axis=0)) == 8
    assert set(corners.ravel()) == {0.0, 1.0}


@pytest.mark.parametrize("free", [1, 2, 7])
def test_new_designs_stay_in_the_box_and_differ(free):
    rng = np.random.default_rng(RNG_SEED)
    units = rng.random((50, free))
    aims = np.stack([units[:, 0], 1.0 - units[:, 0]], axis=1)
    for made in (
        offspring(units, 301, rng),
        between_neighbours(units, aims, 301, rng),
        about(units, 301, rng),
        differences(units, 301, rng),
    ):
        assert made.shape == (301, free)
        assert made.min() >= 0.0
        assert made.max() <= 1.0
        assert len(np.unique(made, axis=0)) > 100


def test_designs_between_neighbours_follow_the_front():
    rng = np.random.default_rng(RNG_SEED)
    line = np.linspace(0.2, 0.8, 300)
    units = np.stack([line, 0.5 * line], axis=1)
    made = between_neighbours(units, np.stack([line, 1.0 - line], axis=1), 500, rng)
    assert np.abs(made[:, 1] - 0.5 * made[:, 0]).max() < 1e-12


@pytest.mark.parametrize("aims", [1, 2, 3, 4, 5])
def test_designs_that_break_nothing_survive_first_and_the_rest_by_violation(aims):
    rng = np.random.default_rng(RNG_SEED)
    figures, violation = rng.random((60, aims)), np.maximum(rng.normal(size=60), 0.0)
    order = survivors(figures, violation, 60)
    assert sorted(order) == list(range(60))
    assert (np.diff(violation[order]) >= 0.0).all()


@pytest.mark.parametrize("aims", [2, 3, 4, 5])
def test_designs_near_a_front_survive_those_behind_it(aims):
    rng = np.random.default_rng(RNG_SEED)
    front = np.abs(rng.normal(size=(200, aims))) + 0.02
    front /= np.linalg.norm(front, axis=1, keepdims=True)
    figures = np.concatenate([front * 1.5, front])
    rows = survivors(figures, np.zeros(400), 100)
    assert (rows >= 200).mean() > 0.95

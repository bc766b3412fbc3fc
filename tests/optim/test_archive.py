"""What is kept of many designs, against slow and plain ways to say the same."""

from __future__ import annotations

import numpy as np
import pytest

from optim.archive import (
    extremes,
    nondominated,
    normalised,
    thin_coarsely,
    thin_evenly,
    within_tolerance,
)
from problems.problem import Floats


def cloud(rows: int, aims: int, seed: int = 1) -> Floats:
    """Random figures with some ties."""
    return np.random.default_rng(seed).random((rows, aims)).round(2)


def sphere(rows: int, aims: int) -> Floats:
    """Rows none of which beats another."""
    points = np.abs(np.random.default_rng(2).normal(size=(rows, aims)))
    return 1.0 - points / np.linalg.norm(points, axis=1, keepdims=True)


@pytest.mark.parametrize("aims", [1, 2, 3, 4, 5])
def test_kept_rows_are_those_that_no_other_beats(aims):
    figures = cloud(200, aims)
    kept = nondominated(figures)
    better = (figures[:, None] <= figures[None]).all(-1) & (figures[:, None] < figures[None]).any(
        -1
    )
    unbeaten = ~better.any(axis=0)
    assert {tuple(row) for row in figures[kept]} == {tuple(row) for row in figures[unbeaten]}
    assert len(np.unique(figures[kept], axis=0)) == kept.sum()


def test_neighbours_of_the_best_lie_within_the_tolerance():
    assert within_tolerance(np.array([[-100.0], [-99.0], [-98.9]]), 0.01).tolist() == [1, 1, 0]
    assert within_tolerance(np.array([[100.0], [101.0], [101.1]]), 0.01).tolist() == [1, 1, 0]


def test_column_that_does_not_run_becomes_nought():
    assert normalised(np.array([[1.0, 7.0], [3.0, 7.0]])).tolist() == [[0.0, 0.0], [1.0, 0.0]]


@pytest.mark.parametrize("thin", [thin_evenly, thin_coarsely])
@pytest.mark.parametrize("aims", [2, 3, 5])
def test_thinning_keeps_the_best_of_each_aim_and_the_size(thin, aims):
    figures = sphere(3000, aims)
    rows = thin(figures, 100)
    assert len(rows) <= 100 + aims
    assert len(rows) > 40
    assert len(np.unique(rows)) == len(rows)
    assert set(extremes(figures)) <= set(rows)


def test_even_thinning_leaves_no_row_far_from_a_kept_one():
    figures = sphere(3000, 2)
    places = normalised(figures)
    kept = places[thin_evenly(figures, 50)]
    far = np.linalg.norm(places[:, None] - kept[None], axis=-1).min(axis=1).max()
    near = np.linalg.norm(np.diff(kept[np.argsort(kept[:, 0])], axis=0), axis=1).min()
    assert near >= far * (1 - 1e-12)  # what taking the farthest each time promises


def test_thinning_of_equal_rows_keeps_one():
    assert len(thin_evenly(np.ones((50, 2)), 10)) == 1
    assert len(thin_coarsely(np.ones((50, 2)), 10)) == 1


def test_few_rows_are_all_kept():
    assert thin_evenly(cloud(5, 3), 10).tolist() == [0, 1, 2, 3, 4]
    assert thin_coarsely(cloud(5, 3), 10).tolist() == [0, 1, 2, 3, 4]

"""The hypervolume against areas and volumes worked out by hand."""

from __future__ import annotations

import numpy as np
import pytest

from optim.stopping import hypervolume

LOW, HIGH = np.zeros(2), np.ones(2)


def test_one_design_in_the_best_corner_beats_the_whole_box():
    assert hypervolume(np.array([[0.0, 0.0]]), LOW, HIGH) == pytest.approx(1.0)


def test_steps_are_added_up():
    # the box ends at 1.1: 1.1 x 0.1 + 0.6 x 0.5 + 0.1 x 0.5, by hand
    steps = np.array([[0.0, 1.0], [0.5, 0.5], [1.0, 0.0]])
    assert hypervolume(steps, LOW, HIGH) == pytest.approx((0.11 + 0.30 + 0.05) / 1.21)


def test_box_may_lie_anywhere():
    steps = np.array([[0.0, 1.0], [0.5, 0.5], [1.0, 0.0]])
    low, high = np.array([-300.0, 2e-5]), np.array([-100.0, 7e-5])
    moved = low + steps * (high - low)
    assert hypervolume(moved, low, high) == pytest.approx(hypervolume(steps, LOW, HIGH))


def test_designs_beyond_the_box_count_for_nothing():
    assert hypervolume(np.array([[2.0, 0.5]]), LOW, HIGH) == 0.0


def test_aim_that_does_not_run_is_left_out():
    figures = np.array([[0.0, 7.0], [1.0, 7.0]])
    still = hypervolume(figures, np.array([0.0, 7.0]), np.array([1.0, 7.0]))
    assert still == pytest.approx(hypervolume(figures[:, :1], LOW[:1], HIGH[:1]))


def test_nothing_beats_nothing():
    assert hypervolume(np.empty((0, 2)), LOW, HIGH) == 0.0

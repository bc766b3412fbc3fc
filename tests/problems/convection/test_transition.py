"""Onset, intermittency and trip wires against published laws and tables."""

from __future__ import annotations

import numpy as np
import pytest
from numpy.testing import assert_allclose

from problems.convection import flat_plate, transition
from problems.convection.transition import Wire
from tests.published_data import published


def _wire(re_x, re_height, re_theta=None):
    re_x, re_height = np.broadcast_arrays(np.atleast_1d(re_x), np.atleast_1d(re_height))
    theta = flat_plate.laminar_re_theta(re_x) if re_theta is None else re_theta
    one = np.ones(re_x.shape)
    return Wire(re_x, re_height, one, theta, 0.0 * one, one, 1.0)


def test_onset_is_that_of_the_published_table():
    table = published("onset")
    tu = table["tu_percent"].to_numpy(dtype=float)
    assert_allclose(transition.onset_re_theta(tu), table["re_theta"], atol=0.051)
    assert_allclose(transition.onset_re_x(tu), table["re_x"], rtol=5e-3)


def test_quiet_stream_is_capped_at_the_measured_limit():
    re_x = transition.onset_re_x(np.array([0.0, 0.01]))
    assert np.all((re_x > 2.6e6) & (re_x <= 2.8e6))


def test_common_critical_reynolds_number_is_a_stream_of_about_one_percent():
    # Re_x 5e5 is common practice
    assert 1.1 < transition.equivalent_turbulence(5e5) < 1.25


@pytest.mark.parametrize("re_x", [6.5e4, 1e5, 5e5, 2e6])
def test_equivalent_turbulence_inverts_the_onset_law(re_x):
    tu = np.array([transition.equivalent_turbulence(re_x)])
    assert_allclose(transition.onset_re_x(tu), re_x, rtol=0.01)


def test_second_opinions_bracket_the_common_value():
    opinions = transition.onset_second_opinions(1.0)
    assert all(3e5 < value < 1e6 for value in opinions.values())


def test_intermittency_has_its_published_values():
    # Dhawan and Narasimha 1958 (read in a secondary text)
    xi = np.array([-1.0, 0.5, 1.0, 1.8343, 3.3433])
    expected = [0.0, 0.0979, 0.3377, 0.75, 0.99]
    assert_allclose(transition.intermittency(xi), expected, atol=6e-5)


def test_wire_at_the_tripping_limit_gives_the_computed_table():
    table = published("wire_at_826")
    wire = _wire(table["re_xk"].to_numpy(dtype=float), 826.0)
    before = wire.re_theta
    after = before + wire.thickening(np.zeros(len(table)))
    assert_allclose(wire.height_over_displacement, table["k_over_delta_star"], rtol=5e-3)
    assert_allclose(before, table["re_theta_before"], atol=0.6)
    assert_allclose(after, table["re_theta_after"], rtol=5e-3)


def test_wire_diameter_that_trips_in_air_is_the_computed_one():
    # 2.5 mm at 5 m/s, 1.24 mm at 10 m/s: 826 nu/U with nu 1.5e-5 m2/s (computed)
    assert_allclose(
        transition.WIRE_LOW * 1.5e-5 / np.array([5.0, 10.0]), [2.5e-3, 1.24e-3], rtol=0.01
    )


def test_wire_that_trips_and_holds_sets_the_onset_where_it_stands():
    wire = _wire(5e4, 1000.0)
    onset = transition.onset(np.array([1.35e6]), 0.5, [wire])
    assert_allclose(onset.re_x, 5e4, rtol=1e-6)
    # full turbulence 2e4 behind the wire (Kraemer 1961, from memory)
    assert_allclose(onset.length * transition.COMPLETE, 2e4)


def test_wire_too_small_to_trip_moves_onset_upstream_but_not_past_itself():
    re_k = np.linspace(1.0, 600.0, 50)
    onset = transition.onset(np.full(50, 1.35e6), 0.5, [_wire(np.full(50, 1e5), re_k)])
    assert_allclose(onset.re_x[0], 1.35e6, rtol=1e-9)
    assert np.all(np.diff(onset.re_x) <= 0.0)
    assert np.all(onset.re_x >= 1e5)
    # Dryden 1958 at the end of its range, k/delta* 0.8: like 2.25 % turbulence, Re_x 1.6e5
    assert_allclose(onset.re_x[-1], transition.onset_re_x(np.array([2.3])), rtol=0.05)


def test_wire_behind_natural_onset_changes_nothing():
    onset = transition.onset(np.array([1e5]), 3.0, [_wire(2e5, 1500.0)])
    assert_allclose(onset.re_x, 1e5)
    assert_allclose(onset.length, transition.length_scale(np.array([1e5])))


def test_wire_on_a_layer_too_thin_to_hold_gets_no_credit():
    wire = _wire(100.0, 300.0)
    assert wire.re_theta + wire.thickening(np.zeros(1)) < 200.0
    onset = transition.onset(np.array([1.35e6]), 0.5, [wire])
    assert onset.forced == 0.0


def test_wire_force_is_its_drag_coefficient_on_the_profile():
    wire = _wire(1e5, 900.0)
    step = wire.thickening(np.zeros(1))
    mean_square = flat_plate.profile_mean_square(flat_plate.BLASIUS * wire.height_over_theta)
    assert_allclose(step, 0.5 * 900.0 * mean_square)

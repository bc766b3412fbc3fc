"""The walk along the plate: limits, measured transition, marched layers, no jumps."""

from __future__ import annotations

import numpy as np
import pytest
from numpy.testing import assert_allclose

from problems.convection import entrance, flat_plate, passage, transition
from problems.convection.along import along
from problems.convection.sweep import Surface, sweep
from tests.published_data import published

PR = 0.7


def _surface(re_l, pr=PR, natural=6.4e5, turbulence=1.0, flux=False, **arrays):
    re_l = np.atleast_1d(np.asarray(re_l, dtype=float))
    given = {
        name: np.broadcast_to(np.asarray(value, dtype=float), re_l.shape)
        for name, value in arrays.items()
        if value is not None
    }
    return Surface(re_l, np.full_like(re_l, pr), natural, turbulence, flux=flux, **given)


def _local_friction(natural, turbulence, re_x):
    """cf at re_x: derivative of the friction summed from the edge."""
    step = 1e-4
    ends = np.concatenate([re_x * (1.0 - step), re_x * (1.0 + step)])
    total = sweep(_surface(ends, natural=natural, turbulence=turbulence)).friction * ends
    below, above = np.split(total, 2)
    return (above - below) / (2.0 * step * re_x)


def test_laminar_plate_is_blasius_and_pohlhausen():
    re = np.array([1e4, 1e5])
    got = sweep(_surface(re))
    assert_allclose(got.friction, 1.32823 / np.sqrt(re), rtol=1e-5)
    constant = flat_plate.laminar_heat_constant(np.array(PR), flux=False)
    assert_allclose(got.stanton, 2.0 * constant / PR / np.sqrt(re), rtol=1e-9)


def test_flux_gives_the_mean_wall_excess_of_the_classical_law():
    # mean wall-to-stream of uniform flux: 0.6795 Re^1/2 Pr^1/3 (from memory), Pr about 1
    re = np.array([1e5])
    nusselt = sweep(_surface(re, pr=1.0, flux=True)).stanton * re
    assert_allclose(nusselt, 0.6795 * np.sqrt(re), rtol=0.015)


@pytest.mark.parametrize(
    ("plate", "natural", "bound"),
    [("ercoftac_T3A", 1.348e5, 0.065), ("ercoftac_T3AM", 1.6e6, 0.05)],
)
def test_friction_through_measured_transition_with_the_measured_onset(plate, natural, bound):
    # ERCOFTAC T3A and T3A- (Roach and Brierley 1990), root-mean-square over all stations
    data = published(plate)
    re_x, cf = data["Re_x"].to_numpy(), data["cf"].to_numpy()
    error = _local_friction(natural, 2.5 if natural < 1e6 else 0.5, re_x) / cf - 1.0
    assert np.sqrt(np.mean(error**2)) < bound


def test_friction_through_measured_transition_with_the_onset_law():
    # T3A, turbulence averaged from the leading edge to onset: about 2.6 %
    data = published("ercoftac_T3A")
    re_x, cf = data["Re_x"].to_numpy(), data["cf"].to_numpy()
    ahead = data.query("Re_x < 1.4e5")["Tu_local_percent"].mean()
    natural = float(transition.onset_re_x(np.array([ahead]))[0])
    error = _local_friction(natural, ahead, re_x) / cf - 1.0
    assert abs(natural / 1.348e5 - 1.0) < 0.15
    assert np.sqrt(np.mean(error**2)) < 0.10


def test_plate_friction_is_twice_the_momentum_thickness():
    re = np.geomspace(1e5, 1e7, 20)
    got = sweep(_surface(re))
    assert_allclose(got.friction, 2.0 * got.re_theta_end / re, rtol=1e-3)


def test_wide_gap_recovers_the_plate():
    re = np.geomspace(2e4, 3e6, 12)
    for flux in (False, True):
        plate = sweep(_surface(re, flux=flux))
        gap = sweep(_surface(re, re_d=1e4 * re, flux=flux))
        for name in ("friction", "stanton", "least_stanton", "wall_high", "turbulent_share"):
            assert_allclose(getattr(gap, name), getattr(plate, name), rtol=2e-3, atol=1e-12)


def test_wide_gap_with_a_wire_recovers_the_plate():
    re = np.geomspace(2e5, 1e6, 5)
    wire = {"wire_x": 5e4, "wire_k": 1000.0}
    plate, gap = sweep(_surface(re, **wire)), sweep(_surface(re, re_d=1e4 * re, **wire))
    for name in ("friction", "stanton", "wire_friction"):
        assert_allclose(getattr(gap, name), getattr(plate, name), rtol=3e-3)


def test_long_laminar_passage_recovers_developed_flow():
    re_d = np.array([500.0, 1500.0])
    got = sweep(_surface(200.0 * re_d**2, re_d=re_d))
    assert_allclose(got.friction * re_d, 24.0, rtol=1e-3)
    assert_allclose(got.stanton * re_d * PR, 7.5407, rtol=1e-3)
    assert_allclose(got.momentum_factor, 1.2, rtol=1e-4)


def test_long_turbulent_passage_recovers_developed_flow():
    re_d = np.array([1e4, 1e5])
    got = sweep(_surface(3000.0 * re_d, re_d=re_d, natural=1e5, turbulence=3.0))
    zero = np.zeros(2)
    assert_allclose(got.friction, passage.developed_friction(re_d, zero), rtol=0.01)
    nusselt = passage.developed_nusselt(re_d, np.full(2, PR), zero)
    assert_allclose(got.stanton * re_d * PR, nusselt, rtol=0.01)


def test_turbulent_passage_has_about_gnielinskis_entrance_gain():
    # mean over developed: 1 + (D_h/L)^(2/3), Gnielinski 1976; tripped at the edge
    re_d = np.full(4, 3e4)
    long = np.array([10.0, 20.0, 50.0, 100.0])
    wire = {"wire_x": 5e3, "wire_k": 1000.0}
    got = sweep(_surface(long * re_d, re_d=re_d, natural=1e5, turbulence=5.0, **wire))
    nusselt = passage.developed_nusselt(re_d, np.full(4, PR), np.zeros(4))
    gain = got.stanton * re_d * PR / nusselt
    assert_allclose(gain, 1.0 + long ** (-2.0 / 3.0), rtol=0.12)


def test_laminar_passage_is_the_entrance_solution():
    x_star = np.array([1e-3, 1e-2, 0.1])
    re_d = np.full(3, 1000.0)
    got = sweep(_surface(x_star * PR * re_d**2, re_d=re_d))
    exact = entrance.nusselt_temperature(np.full(3, PR)).mean(np.sqrt(x_star))
    assert_allclose(got.stanton * re_d * PR, exact, rtol=1e-9)


def test_wire_in_a_passage_that_cannot_keep_turbulence_costs_drag_and_gives_nothing():
    re_d = np.array([1800.0])
    plain = sweep(_surface(60.0 * re_d, re_d=re_d))
    wired = sweep(_surface(60.0 * re_d, re_d=re_d, wire_x=6.0 * re_d, wire_k=0.25 * re_d))
    assert_allclose(wired.stanton, plain.stanton)
    assert wired.wire_friction > 0.05 * plain.friction


@pytest.mark.parametrize("re_d", [None, 6e3, 4e4])
@pytest.mark.parametrize("wire", [None, (3e4, 1000.0), (1e5, 500.0)])
def test_sums_agree_with_the_layer_marched_station_by_station(re_d, wire):
    wired = {} if wire is None else {"wire_x": wire[0], "wire_k": wire[1]}
    surface = _surface(6e5, natural=2e5, turbulence=2.0, re_d=re_d, **wired)
    got = sweep(surface)
    local = along(surface, got, 3000)
    root = np.sqrt(local.re_x)
    for values, mean in ((local.friction, got.friction), (local.stanton, got.stanton)):
        area = 2.0 * values[0] * local.re_x[0] + np.trapezoid(2.0 * values * root, root)
        assert_allclose(area / 6e5, mean[0], rtol=4e-3)


def test_heat_gains_less_than_friction_from_tripping_in_air():
    # about 0.91 of the gain in friction, before the wire's own drag (computed with these laws)
    re = np.array([5e5])
    plain = sweep(_surface(re, natural=2e6, turbulence=0.3))
    wired = sweep(_surface(re, natural=2e6, turbulence=0.3, wire_x=2e4, wire_k=950.0))
    heat, friction = wired.stanton / plain.stanton, wired.friction / plain.friction
    assert 1.5 < friction < 3.5
    assert 0.85 < heat / friction < 0.97


@pytest.mark.parametrize("name", ["friction", "stanton", "least_stanton", "wire_friction"])
@pytest.mark.parametrize("moved", ["re_l", "re_d", "wire_x", "wire_k"])
def test_nothing_jumps_along_any_line(name, moved):
    rng = np.random.default_rng(7)
    steps = np.exp(np.linspace(0.0, np.log(30.0), 34014))  # relative steps of 1e-4
    for _ in range(6):
        start = {
            "re_l": 10 ** rng.uniform(4.5, 5.8),
            "re_d": 10 ** rng.uniform(2.8, 4.2),
            "wire_x": 10 ** rng.uniform(3.0, 4.5),
            "wire_k": 10 ** rng.uniform(1.5, 2.6),
        }
        values = {key: np.full(steps.size, value) for key, value in start.items()}
        values[moved] = values[moved] * steps
        got = sweep(_surface(natural=1e5, turbulence=3.0, **values))
        size = getattr(got, name)
        if name == "wire_friction":
            size = size + got.friction
        jump = np.abs(np.diff(getattr(got, name))) / size[:-1]
        assert jump.max() < 1e-2

"""One plate: the laws against similarity solutions, published correlations and worked examples."""

from __future__ import annotations

import numpy as np
import pytest
from numpy.testing import assert_allclose
from scipy.integrate import solve_ivp

from problems.convection import flat_plate
from tests.published_data import published

_CURVATURE = 0.33205733621519630  # f''(0) of the Blasius equation; Boyd 2008 (from memory)


@pytest.fixture(scope="module")
def blasius():
    """f, f', f'' and the integral of f'^2 over eta = 0..20."""

    def slopes(_, y):
        return [y[1], y[2], -0.5 * y[0] * y[2], y[1] ** 2]

    start = [0.0, 0.0, _CURVATURE, 0.0]
    return solve_ivp(
        slopes, (0.0, 20.0), start, rtol=1e-11, atol=1e-13, dense_output=True, max_step=0.1
    )


def _pohlhausen(blasius, pr: float, flux: bool) -> float:
    """Nu_x / Re_x^1/2 of the similarity solution; wall temperature rising as x^1/2 for flux."""
    power = 0.5 if flux else 0.0

    def slopes(eta, y):
        f, speed = blasius.sol(eta)[:2]
        return [y[1], -0.5 * pr * f * y[1] + power * pr * speed * y[0]]

    end = min(12.0 / pr ** (1 / 3), 20.0) if pr > 1 else 15.0
    ones = [
        solve_ivp(slopes, (0.0, end), start, rtol=1e-9, atol=1e-12).y[0, -1]
        for start in ([1.0, 0.0], [0.0, 1.0])
    ]
    return ones[0] / ones[1]


def test_blasius_friction_follows_from_the_similarity_equation(blasius):
    assert abs(blasius.y[1, -1] - 1.0) < 1e-6
    assert_allclose(flat_plate.BLASIUS, 2.0 * _CURVATURE, rtol=5e-4)
    displacement = blasius.t[-1] - blasius.y[0, -1]
    assert_allclose(flat_plate.DISPLACEMENT, displacement, rtol=5e-4)


@pytest.mark.parametrize("pr", [0.7, 1.0, 5.0, 50.0, 1000.0])
@pytest.mark.parametrize("flux", [False, True])
def test_laminar_heat_follows_from_the_similarity_equation(blasius, pr, flux):
    exact = _pohlhausen(blasius, pr, flux)
    law = flat_plate.laminar_heat_constant(np.array(pr), flux)
    assert_allclose(law, exact, rtol=1e-3)


def test_mean_square_of_the_profile_is_that_of_blasius(blasius):
    eta = np.geomspace(0.02, 19.0, 200)
    assert_allclose(flat_plate.profile_mean_square(eta), blasius.sol(eta)[3] / eta, rtol=2e-3)


def test_turbulent_run_is_the_integral_of_the_friction_law():
    re_theta = np.linspace(300.0, 5000.0, 20001)
    slope = 2.0 / flat_plate.turbulent_friction(re_theta)
    area = np.trapezoid(slope, re_theta)
    run = flat_plate.turbulent_run(re_theta)
    assert_allclose(run[-1] - run[0], area, rtol=1e-7)


def test_turbulent_growth_inverts_the_run():
    start, distance = np.geomspace(60.0, 1e5, 60), np.geomspace(10.0, 1e8, 60)
    grown = flat_plate.turbulent_growth(start[:, None], distance)
    run = flat_plate.turbulent_run(grown) - flat_plate.turbulent_run(start[:, None])
    assert_allclose(run, np.broadcast_to(distance, run.shape), rtol=1e-6, atol=1e-5)


def test_turbulent_friction_lies_below_whites_law_as_measurements_do():
    # White 2006: cf = 0.455 / ln^2(0.06 Re_x), from memory; reads 5 % high on Wieghardt's plate
    re_x = np.geomspace(1e6, 1e8, 30)
    cf = flat_plate.turbulent_friction(flat_plate.turbulent_growth(np.full(30, 60.0), re_x))
    ratio = cf * np.log(0.06 * re_x) ** 2 / 0.455
    assert np.all((ratio > 0.935) & (ratio < 0.98))


def test_turbulent_heat_in_gases_agrees_with_the_power_law_within_its_scatter():
    # Nu_x = 0.0296 Re_x^0.8 Pr^0.6, gases (Lienhard 2020, from memory; data within 11 %)
    re_x = np.geomspace(2e5, 5e6, 20)
    cf = flat_plate.turbulent_friction(flat_plate.turbulent_growth(np.full(20, 60.0), re_x))
    nu = flat_plate.turbulent_stanton(cf, np.array(0.71)) * re_x * 0.71
    assert_allclose(nu, 0.0296 * re_x**0.8 * 0.71**0.6, rtol=0.085)


def test_tripped_plate_friction_matches_wieghardts_measurements():
    plate = published("wieghardt_flatplate_ident1400").query("x_m > 0.6")
    cf = flat_plate.turbulent_friction(plate["Re_theta"].to_numpy())
    error = cf / plate["cf"].to_numpy() - 1.0
    assert np.sqrt(np.mean(error**2)) < 0.012


def test_growth_along_wieghardts_plate_follows_the_momentum_integral():
    plate = published("wieghardt_flatplate_ident1400").query("x_m > 0.6")
    re_x, re_theta = plate["Re_x"].to_numpy(), plate["Re_theta"].to_numpy()
    grown = flat_plate.turbulent_growth(np.full_like(re_x, re_theta[0]), re_x - re_x[0])
    assert_allclose(grown, re_theta, rtol=0.03)


def test_laminar_worked_examples():
    values = published("worked_examples").set_index("quantity")["value"]
    re = 1.5 * 0.5 / 1.566e-5
    assert_allclose(4.91 * 0.5 / np.sqrt(re), values["delta_m"], rtol=3e-3)
    friction = 2.0 * flat_plate.laminar_friction(np.array(re))
    assert_allclose(friction, values["mean_friction"], rtol=3e-3)
    assert_allclose(0.5 * 1.183 * 1.5**2 * friction, values["mean_shear_Pa"], rtol=4e-3)
    re = 15.0 * 0.5 / 1.94e-5
    nusselt = 2.0 * flat_plate.laminar_heat_constant(np.array(0.707), False) * np.sqrt(re)
    assert_allclose(nusselt, values["mean_nusselt"], rtol=0.01)
    assert_allclose(nusselt * 0.02885 / 0.5 * 0.25 * 90.0, values["heat_W"], rtol=0.01)


def test_turbulent_water_worked_example():
    # Lienhard and Lienhard example 6.9: turbulent from the edge, h 5729 or 6843 by two laws
    re = 2.572 / 1.085e-6
    cf = flat_plate.turbulent_friction(flat_plate.turbulent_growth(np.array(60.0), np.array(re)))
    assert_allclose(cf, 0.00323, rtol=0.05)
    h = flat_plate.turbulent_stanton(cf, np.array(7.66)) * 998.8 * 4187.0 * 2.572
    assert 5729.0 < h < 6843.0


def test_rough_friction_is_smooth_below_five_and_the_rough_law_above_seventy():
    re_x, cf = np.full(2, 2e6), np.full(2, 0.0035)
    got, share = flat_plate.rough_friction(cf, re_x, np.array([20.0, 8000.0]))
    assert got[0] == cf[0]
    assert share[0] == 0.0
    assert share[1] == 1.0
    assert_allclose(got[1], (2.87 + 1.58 * np.log10(2e6 / 8000.0)) ** -2.5)

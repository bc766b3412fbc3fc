"""The closed entrance laws: against the march and published values, limits, slopes, shapes."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from numpy.testing import assert_allclose
from scipy.interpolate import CubicSpline
from scipy.optimize import brentq, minimize_scalar

from problems.convection import entrance, fit_entrance, flat_plate
from problems.convection.march import Developing, extrapolated
from tests.published_data import published

# between the nodes of the fit as well as near them, and at both ends
PR = np.array([0.5, 0.61, 0.7, 0.95, 1.6, 3.4, 6.4, 9.3, 40.0, 130.0, 900.0, 5300.0, 1e4, 9e4])
DISTANCES = np.geomspace(1e-6, 0.29, 120)
EVERYWHERE = np.geomspace(1e-7, 1e3, 8000)


@pytest.fixture(scope="module")
def flow() -> Developing:
    return extrapolated(PR)


def _heat_of_march(flow: Developing, name: str, place: int) -> np.ndarray:
    x_star = np.log(flow.x_plus / flow.pr[place])
    return CubicSpline(x_star, getattr(flow, name)[:, place])(np.log(DISTANCES))


def apparent(z):
    """f_app Re_D as a caller puts it together."""
    return entrance.shear_mean(z) + (entrance.momentum_factor(z) - 1.0) / (2.0 * z**2)


LAWS = {
    "apparent_friction": apparent,
    "local_shear": entrance.shear_local,
    "core_velocity": entrance.core_velocity,
    "momentum_factor": entrance.momentum_factor,
}


@pytest.mark.parametrize("place", range(len(PR)))
def test_heat_at_one_wall_temperature_follows_the_march(flow, place):
    law, z = entrance.nusselt_temperature(PR[place]), np.sqrt(DISTANCES)
    assert_allclose(law.mean(z), _heat_of_march(flow, "nu_temperature_mean", place), rtol=1e-3)
    assert_allclose(law.local(z), _heat_of_march(flow, "nu_temperature", place), rtol=3e-3)


@pytest.mark.parametrize("place", range(len(PR)))
def test_heat_at_uniform_flux_follows_the_march(flow, place):
    law, z = entrance.resistance_flux(PR[place]), np.sqrt(DISTANCES)
    assert_allclose(law.mean(z), _heat_of_march(flow, "resistance_flux_mean", place), rtol=1e-3)
    assert_allclose(law.local(z), _heat_of_march(flow, "resistance_flux", place), rtol=3e-3)


@pytest.mark.parametrize(
    ("law", "name"),
    [
        (entrance.shear_mean, "shear_mean"),
        (entrance.shear_local, "shear"),
        (entrance.momentum_factor, "momentum"),
        (entrance.core_velocity, "core"),
        (apparent, "apparent"),
    ],
)
def test_flow_follows_the_march(flow, law, name):
    x_plus = np.geomspace(1e-7, 10.0, 150)
    assert_allclose(law(np.sqrt(x_plus)), flow.at(name, x_plus), rtol=5e-4)


@pytest.mark.parametrize("quantity", LAWS)
def test_flow_meets_the_published_table(quantity):
    table = published("parallel_plates_entrance").query("quantity == @quantity")
    found = LAWS[quantity](np.sqrt(table["at"].to_numpy()))
    assert_allclose(found, table["value"], rtol=0.003)


@pytest.mark.parametrize("pr", [0.7, np.inf])
def test_heat_meets_the_published_tables(pr):
    """The Graetz series (parabolic velocity) stands for high Pr: here 1e5."""
    table = published("parallel_plates_entrance").query("pr == @pr")
    temperature = entrance.nusselt_temperature(min(pr, 1e5))
    flux = entrance.resistance_flux(min(pr, 1e5))
    laws = {
        "nusselt_local_temperature": temperature.local,
        "nusselt_mean_temperature": temperature.mean,
        "nusselt_local_flux": lambda z: 1.0 / flux.local(z),
    }
    for quantity, law in laws.items():
        rows = table[table["quantity"] == quantity]
        assert len(rows) >= 4
        assert_allclose(law(np.sqrt(rows["at"].to_numpy())), rows["value"], rtol=0.003)


def test_wide_gaps_recover_the_single_plate():
    """z goes to 0 where the gap grows: mean values become those of one plate, exactly."""
    z = np.array([1e-9])
    assert_allclose(entrance.shear_mean(z) * z, 2.0 * flat_plate.BLASIUS, rtol=1e-6)
    assert_allclose(entrance.shear_local(z) * z, flat_plate.BLASIUS, rtol=1e-6)
    for pr in PR:
        temperature = flat_plate.laminar_heat_constant(pr, False) / np.sqrt(pr)
        flux = flat_plate.laminar_heat_constant(pr, True) / np.sqrt(pr)
        nusselt, resistance = entrance.nusselt_temperature(pr), entrance.resistance_flux(pr)
        assert_allclose(nusselt.mean(z) * z, 2.0 * temperature, rtol=2e-5)
        assert_allclose(nusselt.local(z) * z, temperature, rtol=2e-5)
        assert_allclose(resistance.mean(z) / z, 2.0 / (3.0 * flux), rtol=2e-5)
        assert_allclose(resistance.local(z) / z, 1.0 / flux, rtol=2e-5)


def test_core_and_momentum_factor_start_with_the_displacement_of_one_plate():
    """Exact to first order: core excess 2 delta*/s, Kd - 1 = 2 (delta* - theta)/s, z in D_h."""
    z = np.array([1e-7])
    displaced = 4.0 * flat_plate.DISPLACEMENT * z
    assert_allclose(entrance.core_velocity(z) - 1.0, displaced, rtol=1e-4)
    held = 4.0 * (flat_plate.DISPLACEMENT - flat_plate.BLASIUS) * z
    assert_allclose(entrance.momentum_factor(z) - 1.0, held, rtol=1e-4)


def test_long_passages_recover_developed_flow():
    """Exact: 24, 6/5, 3/2, 7.5407 (Graetz) and 140/17."""
    z = np.array([100.0])
    assert_allclose(entrance.shear_mean(z), 24.0, rtol=1e-5)
    assert_allclose(entrance.shear_local(z), 24.0, rtol=1e-7)
    assert_allclose(entrance.momentum_factor(z), 1.2, rtol=1e-5)
    assert_allclose(entrance.core_velocity(z), 1.5, rtol=1e-5)
    for pr in PR:
        assert_allclose(entrance.nusselt_temperature(pr).local(z), 7.5407, rtol=1e-5)
        assert_allclose(entrance.resistance_flux(pr).local(z), 17.0 / 140.0, rtol=1e-6)


def test_a_mean_tends_to_its_end_as_one_over_length():
    for pr in (0.7, 7.0, 1000.0):
        law = entrance.nusselt_temperature(pr)
        left = (law.mean(np.array([2.0, 4.0])) - entrance.NU_TEMPERATURE) * np.array([4.0, 16.0])
        assert_allclose(left[1], left[0], rtol=0.05)  # 0.005 % of the mean itself


@pytest.mark.parametrize("pr", [0.5, 0.7, 6.4, 130.0, 1e4, 1e5])
def test_local_values_are_derivatives_of_the_sums(pr):
    x = np.geomspace(1e-6, 1.0, 60)
    step = 1e-4 * x

    def derivative(mean):
        above, below = x + step, x - step
        return (above * mean(np.sqrt(above)) - below * mean(np.sqrt(below))) / (2.0 * step)

    for law in (entrance.nusselt_temperature(pr), entrance.resistance_flux(pr)):
        assert_allclose(law.local(np.sqrt(x)), derivative(law.mean), rtol=1e-6)
    shear = derivative(entrance.shear_mean)
    assert_allclose(entrance.shear_local(np.sqrt(x)), shear, rtol=1e-6)


@pytest.mark.parametrize("pr", [0.5, 0.7, 3.4, 6.4, 130.0, 900.0, 1e4])
def test_heat_falls_along_the_passage(pr):
    """Means without exception; local values but for the fit's ripple of 0.02 % before the end."""
    nusselt = entrance.nusselt_temperature(pr)
    resistance = entrance.resistance_flux(pr)
    short = EVERYWHERE[EVERYWHERE < 100.0]  # beyond, changes drown in rounding
    assert np.all(np.diff(nusselt.mean(short)) < 0.0)
    assert np.all(np.diff(resistance.mean(short)) > 0.0)
    for local in (nusselt.local(EVERYWHERE), 1.0 / resistance.local(EVERYWHERE)):
        lowest = np.minimum.accumulate(local)
        assert np.all(local <= lowest * (1.0 + 2e-4))
        assert local.min() > local[-1] * (1.0 - 2e-4)


def test_flow_develops_one_way():
    assert np.all(np.diff(entrance.shear_mean(EVERYWHERE[EVERYWHERE < 100.0])) < 0.0)
    local = entrance.shear_local(EVERYWHERE)
    assert np.all(local <= np.minimum.accumulate(local) * (1.0 + 2e-5))
    for law, end in ((entrance.momentum_factor, 1.2), (entrance.core_velocity, 1.5)):
        values = law(EVERYWHERE)
        assert np.all(values >= np.maximum.accumulate(values) - 1e-5)
        assert values.max() < end + 1e-5


@given(
    pr=st.floats(0.5, 1e5),
    power=st.floats(-7.0, 2.5),
    move=st.sampled_from([-1e-4, 1e-4]),
)
def test_a_small_move_moves_little(pr, power, move):
    """No jump in Pr (table rows, ends) nor along z: 1e-4 of either moves values by no more."""
    z = np.array([10.0**power])
    for make in (entrance.nusselt_temperature, entrance.resistance_flux):
        for side in ("mean", "local"):
            here = getattr(make(pr), side)(z)
            assert here > 0.0
            assert_allclose(getattr(make(pr * (1.0 + move)), side)(z), here, rtol=1e-4)
            assert_allclose(getattr(make(pr), side)(z * (1.0 + move)), here, rtol=1.1e-4)


def test_stations_of_many_designs_equal_one_design_at_a_time():
    rng = np.random.default_rng(3)
    pr = rng.uniform(0.5, 20.0, 12)
    z = rng.uniform(1e-4, 0.5, (12, 4))
    for make in (entrance.nusselt_temperature, entrance.resistance_flux):
        columns, row = make(pr[:, None]), make(pr)
        for side in ("mean", "local"):
            whole = getattr(columns, side)(z)
            assert whole.shape == (12, 4)
            assert_allclose(getattr(row, side)(z[:, 2]), whole[:, 2], rtol=1e-13)
            single = getattr(make(pr[5]), side)(z[5, 1])
            assert_allclose(single, whole[5, 1], rtol=1e-13)


def test_beyond_its_range_of_prandtl_numbers_the_nearer_end_is_used():
    z = np.array([0.01, 0.1])
    for make in (entrance.nusselt_temperature, entrance.resistance_flux):
        assert_allclose(make(0.1).mean(z), make(0.5).mean(z))
        assert_allclose(make(1e7).mean(z), make(1e5).mean(z))


@pytest.mark.parametrize("pr", [0.7, 1.0])
def test_optimum_of_a_stack_comes_out_of_the_fitted_laws(pr):
    """Best gap and most heat at a given pressure drop: slopes matter as much as values."""
    known = published("parallel_plates_optimum").set_index("pr").loc[pr]
    gap, heat = _optimum(pr, length=0.1, drop=10.0)
    assert_allclose(gap, known["gap_over_length_be14"], rtol=0.01)
    assert_allclose(heat, known["heat"], rtol=0.005)


def _optimum(pr: float, length: float, drop: float) -> tuple[float, float]:
    """Gap over length times Be^1/4 and heat over (H W) cp dT sqrt(rho dp / Pr) at the optimum."""
    rho, nu = 1.177, 1.575e-5

    def velocity(gap: float) -> float:
        def missing(u: float) -> float:
            re_d = 2.0 * gap * u / nu
            z = np.sqrt(length / (2.0 * gap * re_d))
            friction = apparent(z) / re_d
            return friction * 4.0 * length / (2.0 * gap) * 0.5 * rho * u**2 - drop

        return brentq(missing, 1e-4, 1e2, xtol=1e-12)

    def heat(gap: float) -> float:
        u = velocity(gap)
        x_star = length / (2.0 * gap) / (2.0 * gap * u / nu * pr)
        units = 4.0 * entrance.nusselt_temperature(pr).mean(np.sqrt(x_star)) * x_star
        return rho * u * -np.expm1(-units) / np.sqrt(rho * drop / pr)

    best = minimize_scalar(lambda s: -heat(s), (1e-3, 2.5e-3, 6e-3), tol=1e-9)
    bejan = drop * length**2 * pr / (rho * nu**2)
    return best.x / length * bejan**0.25, -best.fun


@pytest.mark.slow
def test_refitting_gives_the_committed_coefficients(flow):
    """The file is what `fit_entrance` makes: wall shear anew, from the first guess."""
    target = fit_entrance.shear_target(flow)
    found = fit_entrance.fit(target, fit_entrance.first_guess(target), 1e-3)
    form = fit_entrance.form_of(found, target)
    z = np.geomspace(1e-4, 10.0, 50)
    assert_allclose(form.value(z), entrance.shear_mean(z), rtol=1e-5)


def test_the_file_holds_every_node_once():
    written = entrance.COEFFICIENTS.read_text(encoding="utf-8").splitlines()[1:]
    heat = [line.split(",")[:2] for line in written]
    for law in ("temperature", "flux"):
        pr = [float(cell) for name, cell in heat if name == law]
        assert_allclose(pr, fit_entrance.NODES, rtol=1e-9)
    assert [name for name, _ in heat[:3]] == ["shear", "momentum", "core"]

"""The march between two plates: published values, exact limits, balances, convergence."""

from __future__ import annotations

import numpy as np
import pytest
from numpy.testing import assert_allclose

from problems.convection.march import Developing, extrapolated, march
from problems.convection.similarity import Similarity
from tests.published_data import published

PR = np.array([0.7, 1.0, 7.0, 1000.0, 1e4])
AIR, LAST = 0, 4  # places of Pr 0.7 and 1e4

NAMES = {
    "apparent_friction": "apparent",
    "local_shear": "shear",
    "core_velocity": "core",
    "momentum_factor": "momentum",
    "nusselt_local_temperature": "nu_temperature",
    "nusselt_mean_temperature": "nu_temperature_mean",
    "nusselt_local_flux": "resistance_flux",
}


@pytest.fixture(scope="module")
def flow() -> Developing:
    return extrapolated(PR)


def _marched(flow: Developing, quantity: str, x_plus: np.ndarray) -> np.ndarray:
    values = flow.at(NAMES[quantity], x_plus)
    return 1.0 / values if quantity.endswith("flux") else values


@pytest.mark.parametrize(
    "quantity", ["apparent_friction", "local_shear", "core_velocity", "momentum_factor"]
)
def test_velocity_meets_the_published_table(flow, quantity):
    table = published("parallel_plates_entrance").query("quantity == @quantity and at <= 0.1")
    found = _marched(flow, quantity, table["at"].to_numpy())
    assert_allclose(found, table["value"], rtol=0.003)


@pytest.mark.parametrize(
    "quantity",
    ["nusselt_local_temperature", "nusselt_mean_temperature", "nusselt_local_flux"],
)
def test_heat_at_pr_07_meets_the_published_table(flow, quantity):
    table = published("parallel_plates_entrance").query(
        "quantity == @quantity and pr == 0.7 and at <= 0.1"
    )
    found = _marched(flow, quantity, 0.7 * table["at"].to_numpy())[:, AIR]
    assert_allclose(found, table["value"], rtol=0.003)


@pytest.mark.parametrize(
    "quantity",
    ["nusselt_local_temperature", "nusselt_mean_temperature", "nusselt_local_flux"],
)
def test_high_prandtl_number_meets_the_series_for_parabolic_velocity(flow, quantity):
    """At Pr 1e4 the short stretch of developing velocity still leaves 0.08 % in the mean."""
    table = published("parallel_plates_entrance").query("quantity == @quantity and pr == inf")
    found = _marched(flow, quantity, 1e4 * table["at"].to_numpy())[:, LAST]
    assert_allclose(found, table["value"], rtol=1e-3)


def test_flow_ends_fully_developed(flow):
    """Exact: parabola between plates; Nu by Graetz' series (7.5407) and 140/17."""
    assert_allclose(flow.shear[-1], 24.0, rtol=1e-6)
    assert_allclose(flow.core[-1], 1.5, rtol=1e-6)
    assert_allclose(flow.momentum[-1], 1.2, rtol=1e-6)
    assert_allclose(flow.theta[-1], 1.0 / 15.0, rtol=1e-6)
    assert_allclose(flow.displacement[-1], 1.0 / 6.0, rtol=1e-6)
    assert_allclose(flow.nu_temperature[-1], 7.540700874, rtol=1e-6)
    assert_allclose(flow.resistance_flux[-1], 17.0 / 140.0, rtol=1e-6)


def test_momentum_balance_joins_pressure_drop_and_wall_shear(flow):
    later = flow.x_plus > 1e-6
    rise = (flow.momentum - 1.0) / (2.0 * flow.x_plus)
    balance = flow.shear_mean + rise
    assert_allclose(flow.apparent[later], balance[later], rtol=2e-4)


def test_energy_balance_joins_bulk_temperature_and_mean_nusselt_number(flow):
    for k, pr in enumerate(flow.pr):
        x_star = flow.x_plus / pr
        kept = (x_star > 1e-5) & (x_star < 0.1)
        exact = -np.log(flow.bulk[kept, k]) / (4.0 * x_star[kept])
        assert_allclose(flow.nu_temperature_mean[kept, k], exact, rtol=4e-4)


def test_flow_starts_as_two_separate_plates(flow):
    """One plate is met as z = sqrt(x+) goes to 0; two stations remove the first power of z."""

    def lead(name: str, power: int) -> np.ndarray:
        x = np.array([2e-7, 8e-7])
        near, far = flow.at(name, x)
        return 2.0 * near * x[0] ** (0.5 * power) - far * x[1] ** (0.5 * power)

    assert_allclose(lead("shear", 1), 0.664115, rtol=1e-3)
    assert_allclose(lead("displacement", -1), 2.0 * 1.720788, rtol=1e-3)
    assert_allclose(lead("theta", -1), 2.0 * 0.664115, rtol=1e-3)
    plate = Similarity()
    for k, pr in enumerate(PR[:3]):
        for name, power, flux in (("nu_temperature", 1, False), ("resistance_flux", -1, True)):
            assert_allclose(lead(name, power)[k] ** power, plate.heat_constant(pr, flux), rtol=1e-3)


def test_halving_cells_and_steps_cuts_the_error_fourfold(flow):
    stations = np.geomspace(1e-5, 1e-2, 12)
    air = np.array([0.7])
    errors = []
    for cells, step in ((125, 0.08), (250, 0.04)):
        rough = march(air, cells=cells, step=step, end=0.02)
        found = rough.at("nu_temperature_mean", stations)[:, 0]
        exact = flow.at("nu_temperature_mean", stations)[:, AIR]
        errors.append(np.abs(found / exact - 1.0).max())
    assert errors[0] < 0.01
    assert errors[0] / errors[1] > 3.0


@pytest.mark.parametrize("place", [0, 1, 2, 3])
def test_mean_heat_agrees_with_the_heat_atlas(flow, place):
    """VDI Heat Atlas, parallel plates, Pr 0.1 to 1000 (read): blends exact asymptotes, 6 % off."""
    x = np.geomspace(1e-5, 0.2, 30)
    found = flow.at("nu_temperature_mean", x * PR[place])[:, place]
    assert_allclose(found, _atlas(x, PR[place]), rtol=0.062)


def test_mean_heat_of_air_agrees_with_the_mean_of_two_correlations(flow):
    """Stephan 1959 (read in a secondary text) and the Heat Atlas miss on opposite sides."""
    x = np.geomspace(1e-4, 0.2, 30)
    stephan = 7.55 + 0.024 * x**-1.14 / (1.0 + 0.0358 * 0.7**0.17 * x**-0.64)
    found = flow.at("nu_temperature_mean", 0.7 * x)[:, AIR]
    assert_allclose(found, 0.5 * (stephan + _atlas(x, 0.7)), rtol=0.016)


def _atlas(x: np.ndarray, pr: float) -> np.ndarray:
    inlet = (2.0 / (1.0 + 22.0 * pr)) ** (1.0 / 6.0) * x**-0.5
    return np.cbrt(7.541**3 + 1.841**3 / x + inlet**3)


def test_apparent_friction_agrees_with_shah(flow):
    """Shah 1978, J. Fluids Eng. 100, 177-179: within 2.4 % (abstract read, constants memory)."""
    x = np.geomspace(1e-5, 1.0, 40)
    shah = 3.44 / np.sqrt(x) + (24.0 + 0.674 / (4.0 * x) - 3.44 / np.sqrt(x)) / (
        1.0 + 0.000029 * x**-2
    )
    assert_allclose(flow.at("apparent", x), shah, rtol=0.024)


def test_velocity_does_not_depend_on_the_prandtl_numbers_asked_for():
    one = march(np.array([0.7]), cells=100, step=0.1, end=0.1)
    many = march(np.array([5.0, 0.7]), cells=100, step=0.1, end=0.1)
    assert_allclose(one.shear, many.shear, rtol=1e-12)
    assert_allclose(one.nu_temperature[:, 0], many.nu_temperature[:, 1], rtol=1e-10)

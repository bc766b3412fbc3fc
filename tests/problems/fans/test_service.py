"""Part load, a clogged filter and thin air, against what follows by hand."""

import numpy as np
import pytest

from problems.costs import Profile
from problems.fans.curves import curves
from problems.fans.motors import Motor
from problems.fans.service import air_density, at_density, clogged, in_service, part_load
from problems.fans.systems import System
from problems.fans.terms import Drive, Reason
from tests.problems.fans.made import dipped_fan, quadratic_fan
from tests.published_data import published

ROW, FLOW = np.array([0]), np.array([0.66])
LOSSLESS = Drive(motor=Motor.constant(0.8), efficiency=1.0)
FIXED = Drive("fixed speed", motor=Motor.constant(0.8), efficiency=1.0)
SYSTEM = System(square=np.array([900.0]))


def test_on_a_square_system_power_falls_with_the_cube_of_the_flow():
    year = part_load(
        curves([quadratic_fan()]),
        ROW,
        FLOW,
        SYSTEM,
        np.array([1.2]),
        Profile((1.0, 0.5), (1000.0, 3000.0)),
        LOSSLESS,
    )
    full, half = year.duty.electrical_power[:, 0]
    assert half == pytest.approx(full / 8.0)
    assert year.energy == pytest.approx([(full * 1000.0 + half * 3000.0) / 1000.0])
    assert year.held.all()


def test_part_load_below_the_lowest_speed_is_told():
    year = part_load(
        curves([quadratic_fan()]),
        ROW,
        FLOW,
        SYSTEM,
        np.array([1.2]),
        Profile((1.0, 0.1), (1.0, 1.0)),
        LOSSLESS,
    )
    assert not year.held[0]
    assert year.duty.why((1, 0)) is Reason.TOO_SLOW


def test_part_load_along_a_held_pressure_runs_into_stall():
    year = part_load(
        curves([dipped_fan()]),
        ROW,
        np.array([1.2]),
        System(constant=290.0),
        1.2,
        Profile((1.0, 0.5), (1.0, 1.0)),
        LOSSLESS,
    )
    assert year.duty.why((0, 0)) is Reason.HOLDS
    assert year.duty.why((1, 0)) is Reason.STALL


def test_a_damper_saves_less_than_a_speed_control():
    profile, fans = Profile((0.7,), (1000.0,)), curves([quadratic_fan()])
    by_speed = part_load(fans, ROW, FLOW, SYSTEM, np.array([1.2]), profile, LOSSLESS)
    by_damper = part_load(fans, ROW, FLOW, SYSTEM, np.array([1.2]), profile, FIXED)
    assert by_damper.energy[0] == pytest.approx((200.0 + 300.0 * 0.7 * 0.66) / 0.8, rel=1e-6)
    assert by_speed.energy[0] < 0.6 * by_damper.energy[0]


def test_a_clogged_filter_costs_speed_or_flow():
    fans, part = curves([quadratic_fan()]), System.laminar(0.66, 60.0)
    system = System(square=700.0) + part
    arguments = (fans, ROW, FLOW, system)
    held = clogged(*arguments, part, 0.5, 1.2, LOSSLESS)
    assert held.pressure[0] == pytest.approx(700.0 * 0.66**2 + 90.0)
    assert held.flow == pytest.approx(FLOW)
    assert held.speed[0] > in_service(*arguments, 1.2, LOSSLESS).speed[0]
    lost = clogged(*arguments, part, 0.5, 1.2, FIXED)
    assert lost.flow[0] < in_service(*arguments, 1.2, FIXED).flow[0]


def test_thin_air_at_fixed_speed_leaves_the_flow_and_halves_the_power():
    arguments = (curves([quadratic_fan()]), ROW, FLOW, SYSTEM)
    dense, thin = in_service(*arguments, 1.2, FIXED), at_density(*arguments, 1.2, 0.6, FIXED)
    assert thin.flow == pytest.approx(dense.flow)
    assert thin.electrical_power == pytest.approx(dense.electrical_power / 2.0)


def test_a_speed_control_holds_the_mass_flow_in_thin_air():
    # q ~ 1/rho and dp ~ rho q^2 ~ 1/rho: speed ~ 1/rho, power ~ q dp ~ 1/rho^2
    arguments = (curves([quadratic_fan()]), ROW, 0.5 * FLOW, SYSTEM)
    dense, thin = in_service(*arguments, 1.2, LOSSLESS), at_density(*arguments, 1.2, 0.8, LOSSLESS)
    assert thin.flow == pytest.approx(1.5 * dense.flow)
    assert thin.speed == pytest.approx(1.5 * dense.speed)
    assert thin.electrical_power == pytest.approx(2.25 * dense.electrical_power)


def test_air_density_is_that_of_the_standard_atmosphere():
    for stated in published("fans").query("quantity == 'air_density'").itertuples():
        assert air_density(stated.a, stated.b) == pytest.approx(stated.value, rel=stated.tolerance)

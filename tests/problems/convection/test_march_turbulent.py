"""The march of one swept wall: exact limits, laws, measured plates, balances, convergence."""

from __future__ import annotations

from dataclasses import replace
from functools import cache

import numpy as np
import pytest
from numpy.testing import assert_allclose

from problems.convection import eddy, flat_plate, passage
from problems.convection.march_surface import Marched, march_surface
from problems.convection.similarity import Similarity
from problems.convection.sweep import Surface, sweep
from tests.published_data import published

PR = np.array([0.7, 7.0, 100.0])
LAMINAR = 1e12  # onset far behind every plate


def _march(surface: Surface, **grid: int) -> Marched:
    marched = march_surface(surface, sweep(surface), **grid)
    assert marched.converged.all()
    return marched


def _at(marched: Marched, values: np.ndarray, re_x: np.ndarray, design: int = 0) -> np.ndarray:
    return np.interp(re_x, marched.re_x[design], values[design])


@pytest.mark.parametrize("flux", [False, True])
def test_laminar_plate_is_the_similarity_solution(flux):
    """Blasius 1908 and Pohlhausen 1921 (computed here from their equations)."""
    surface = Surface(np.full(3, 1e5), PR, LAMINAR, 1.0, flux=flux)
    found = _march(surface)
    root = np.sqrt(1e5)
    assert_allclose(found.cf[:, -1] * root, flat_plate.BLASIUS, rtol=1e-3)
    assert_allclose(found.re_theta[:, -1] / root, flat_plate.BLASIUS, rtol=1e-3)
    assert_allclose(found.re_displacement[:, -1] / root, flat_plate.DISPLACEMENT, rtol=1e-3)
    exact = Similarity()
    for design, pr in enumerate(PR):
        nusselt = found.st[design, -1] * pr * root
        assert_allclose(nusselt, exact.heat_constant(pr, flux), rtol=1e-3)


def test_laminar_passage_meets_the_published_table():
    table = published("parallel_plates_entrance")
    found = _march(Surface(np.array([1e5]), PR[:1], LAMINAR, 1.0, re_d=np.array([1000.0])))
    for name, values in (("local_shear", 1e3 * found.cf), ("momentum_factor", found.kd)):
        rows = table[(table["quantity"] == name) & table["at"].between(1e-4, 0.1)]
        x = rows["at"].to_numpy() * 1e6
        assert_allclose(_at(found, values, x), rows["value"], rtol=0.003)
    rows = table.query("quantity == 'nusselt_local_temperature' and pr == 0.7 and at <= 0.1")
    x = rows["at"].to_numpy() * 0.7e6
    assert_allclose(_at(found, 700.0 * found.st, x), rows["value"], rtol=0.005)


@cache
def _developed() -> tuple[Surface, Marched]:
    re_d = np.repeat([1e4, 3e4, 1e5], 3)
    surface = Surface(100.0 * re_d, np.tile(PR, 3), 6e4, 4.0, re_d=re_d)
    return surface, _march(surface)


def test_developed_turbulent_friction_between_plates_is_within_5_percent_of_two_laws():
    """Petukhov at 2/3 Re (Jones 1976) and Dean 1978, all from memory."""
    surface, found = _developed()
    law = passage.developed_friction(surface.re_d, np.zeros(9))
    assert_allclose(found.cf[:, -1], law, rtol=0.05)
    assert_allclose(found.cf[:, -1], 0.0868 * surface.re_d**-0.25, rtol=0.05)


def test_developed_core_velocity_follows_dean():
    """Dean 1978: core over mean velocity 1.28 Re^-0.0116, Re on gap and mean (from memory)."""
    surface, found = _developed()
    assert_allclose(found.core[:, -1], 1.28 * (0.5 * surface.re_d) ** -0.0116, rtol=0.035)


def test_developed_turbulent_heat_between_plates_follows_gnielinski():
    """Law read; it is the round tube's, and at Re 1e4 plates drag 9 % more than a tube: 10 %."""
    surface, found = _developed()
    nusselt = found.st[:, -1] * surface.re_d * surface.pr
    law = passage.developed_nusselt(surface.re_d, surface.pr, np.zeros(9))
    tolerance = np.where(surface.re_d < 2e4, 0.10, 0.05)
    assert np.all(np.abs(nusselt / law - 1.0) < tolerance)


@cache
def _plate() -> Marched:
    return _march(Surface(np.full(3, 1.1e7), PR, 2e4, 5.0))


@pytest.mark.parametrize("re_x", [2e5, 5e5, 1e6, 3e6, 1e7])
def test_turbulent_plate_is_within_5_percent_of_the_laws(re_x):
    """Karman and Schoenherr (read); Lienhard 2020 (memory), in which Pr 100 reads 5.1 % higher."""
    found = _plate()
    for design, tolerance in enumerate((0.05, 0.05, 0.055)):
        re_theta, cf, st = (
            _at(found, values, np.array([re_x]), design)
            for values in (found.re_theta, found.cf, found.st)
        )
        law = flat_plate.turbulent_friction(re_theta)
        assert_allclose(cf, law, rtol=0.05)
        assert_allclose(st, flat_plate.turbulent_stanton(law, PR[design]), rtol=tolerance)


def test_friction_follows_wieghardts_plate():
    """Wieghardt and Tillmann 1944, cf by Coles (data file); at the same Re_theta, from 2860 on."""
    data = published("wieghardt_flatplate_ident1400").query("x_m > 0.6")
    re_theta, cf = data["Re_theta"].to_numpy(), data["cf"].to_numpy()
    found = _plate()
    inside = re_theta < found.re_theta[0, -1]
    marched = np.interp(re_theta[inside], found.re_theta[0], found.cf[0])
    assert _rms(marched, cf[inside]) < 0.02
    shape = np.interp(re_theta, found.re_theta[0], (found.re_displacement / found.re_theta)[0])
    assert _rms(shape[inside], data["H"].to_numpy()[inside]) < 0.02


@pytest.mark.parametrize(
    ("file", "onset", "turbulence", "measured_rms"),
    [("ercoftac_T3A", 1.348e5, 2.0, 0.075), ("ercoftac_T3AM", 1.6e6, 0.5, 0.06)],
)
def test_measured_transition_is_met(file, onset, turbulence, measured_rms):
    """Roach and Brierley 1990, onset as measured: 7.2 % and 5.6 % rms over all stations."""
    data = published(file)
    re_x = data["Re_x"].to_numpy()
    found = _march(Surface(1.05 * re_x[-1:], PR[:1], onset, turbulence))
    assert _rms(_at(found, found.cf, re_x), data["cf"].to_numpy()) < measured_rms


def _rms(found: np.ndarray, expected: np.ndarray) -> float:
    return float(np.sqrt(np.mean((found / expected - 1.0) ** 2)))


WIRED_GAP = Surface(
    re_l=np.array([2e4, 1e5, 1e6, 4e5]),
    pr=np.array([0.7, 7.0, 0.7, 50.0]),
    natural=6e4,
    turbulence=4.0,
    re_d=np.array([1500.0, 5000.0, 2e4, 8e4]),
    wire_x=np.array([2e3, 1e4, 3e5, 9e5]),
    wire_k=np.array([120.0, 400.0, 900.0, 900.0]),
)


def test_pressure_drop_is_shear_and_wires_and_momentum():
    found = _march(WIRED_GAP)
    drag = 4.0 * (found.friction + found.wire_friction) * found.length / WIRED_GAP.re_d
    assert_allclose(found.drop[:, -1], drag + 2.0 * (found.kd[:, -1] - 1.0), rtol=1e-3)


def test_a_wire_behind_the_plate_does_nothing():
    plain = _march(replace(WIRED_GAP, wire_x=None, wire_k=None))
    wired = _march(WIRED_GAP)
    assert wired.drag[3] == 0.0
    for name in ("friction", "stanton"):
        assert_allclose(getattr(wired, name)[3], getattr(plain, name)[3], rtol=2e-3)


def test_momentum_thickness_grows_by_shear_and_jumps_by_the_wires_drag():
    surface = Surface(
        re_l=np.array([1e5, 1e6, 3e6]),
        pr=PR,
        natural=6e5,
        turbulence=1.0,
        wire_x=np.array([2e4, 1e5, 2e6]),
        wire_k=np.array([400.0, 900.0, 900.0]),
    )
    found = _march(surface)
    grown = found.re_theta[:, 0] + 0.5 * np.diff(found.summed(found.cf, -0.5)[:, [0, -1]])[:, 0]
    assert_allclose(found.re_theta[:, -1], grown + found.drag, rtol=1e-3)
    wire = np.argmin(np.diff(found.re_x), axis=1)[:, None]  # its place is there twice
    jump = np.take_along_axis(np.diff(found.re_theta), wire, axis=1)[:, 0]
    assert_allclose(jump, found.drag, rtol=1e-6)


def test_two_wires_jump_twice():
    surface = replace(WIRED_GAP, wires=2, wire_spacing=np.array([3e3, 1e4, 1e5, 1e5]))
    found = _march(surface)
    assert np.all(np.count_nonzero(np.diff(found.re_x) == 0.0, axis=1) == 2)
    assert np.all(found.drop[:3, -1] > _march(WIRED_GAP).drop[:3, -1])


def test_heat_taken_up_is_what_the_walls_gave():
    given = _march(replace(WIRED_GAP, flux=True))
    assert_allclose(given.bulk[:, -1], 4.0 * WIRED_GAP.re_l / WIRED_GAP.re_d, rtol=1e-3)
    cooled = _march(WIRED_GAP)
    units = 4.0 * cooled.stanton * WIRED_GAP.re_l / WIRED_GAP.re_d
    assert_allclose(-np.log(cooled.bulk[:, -1]), units, rtol=2e-3)


def test_order_of_convergence_is_two_and_the_default_grid_within_half_a_percent():
    plate = Surface(np.array([1e6]), np.array([7.0]), 2e5, 2.0)
    for surface in (plate, WIRED_GAP):
        runs = [_march(surface, cells=c, stations=10 * c // 3) for c in (60, 120, 240)]
        heat, drag = (np.array([getattr(run, n) for run in runs]) for n in ("stanton", "friction"))
        for values in (heat, drag):
            first, second = np.diff(values, axis=0)
            limit = values[2] + second / 3.0
            order = np.log2(np.abs(first / second))
            assert np.median(order) > 1.7
            assert_allclose(values[1], limit, rtol=0.005)


def test_designs_do_not_feel_each_other():
    alone = _march(replace(WIRED_GAP, **_only(2)))
    assert_allclose(alone.st[0], _march(WIRED_GAP).st[2], rtol=1e-4)


def _only(design: int) -> dict[str, np.ndarray]:
    names = ("re_l", "pr", "re_d", "wire_x", "wire_k")
    return {name: getattr(WIRED_GAP, name)[design : design + 1] for name in names}


def test_a_rough_wall_is_refused():
    rough = replace(WIRED_GAP, re_rough=np.full(4, 300.0))
    with pytest.raises(ValueError, match="rough walls are not marched: U k_s/nu 300"):
        march_surface(rough, sweep(rough))


def test_a_smooth_sheet_is_not_refused():
    sheet = replace(WIRED_GAP, re_rough=np.full(4, 50.0))
    march_surface(sheet, sweep(sheet), cells=60, stations=60)


def test_intermittency_mixes_developed_friction_and_heat_linearly():
    """What the power of the intermittency in the eddy viscosity is chosen for; air, 0.03."""
    share = np.array([0.0, 0.25, 0.5, 0.75, 1.0])
    surface = Surface(np.full(5, 6e5), np.full(5, 0.7), 6e4, 4.0, re_d=np.full(5, 4000.0))
    found = march_surface(surface, replace(sweep(surface), sustains=share))
    for values in (found.cf[:, -1], found.st[:, -1]):
        mixed = (values - values[0]) / (values[-1] - values[0])
        assert_allclose(mixed, share, atol=0.03)


def test_mixing_length_has_its_limits():
    y = np.array([[1e-3, 0.1, 0.5, 1.0]])
    ones, thin = np.ones((1, 1)), np.full((1, 1), 1e4)
    filled = eddy.mixing_length(y, np.ones_like(y), thin, 0.95 * ones, ones)
    assert_allclose(filled[0, 0], eddy.KAPPA * 1e-3, rtol=0.01)
    assert_allclose(filled[0, -1], 0.14 * eddy.KAPPA / 0.4, rtol=1e-12)  # Nikuradse, middle
    layer = eddy.mixing_length(y, np.ones_like(y), thin, ones, None)
    assert_allclose(layer[0, -1], 0.09, rtol=0.002)


def test_turbulent_prandtl_number_is_09_away_from_the_wall():
    assert_allclose(eddy.turbulent_prandtl(np.full((3, 1), 1e3), PR[:, None]), 0.9, rtol=1e-6)

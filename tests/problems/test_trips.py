"""Forced transition: the ways, the map, the wire and the band against direct evaluation."""

from __future__ import annotations

import numpy as np
import pytest
from numpy.testing import assert_allclose
from scipy.optimize import brentq

from problems import load_case
from problems.case import Case, parse_case
from problems.kinds.statement import SweptPlates
from problems.trip_band import over_band
from problems.trip_verdicts import meaningless
from problems.trips import (
    CHANGES,
    NOT_KEPT,
    TURBULENT_AHEAD,
    band,
    merit,
    merit_values,
    strategies,
    trip_map,
    wire_choice,
    with_onset,
    with_turbulence,
)

_KILN = {
    "length": 1.0,
    "velocity": 8.0,
    "width": 1.5,
    "thickness": 2e-3,
    "trip_position": 0.1,
    "trip_height": 2e-3,
    "trip_pitch": 0.0,
}
_GAP = {
    "length": 0.8,
    "gap": 0.02,
    "velocity": 8.0,
    "width": 0.6,
    "height": 0.4,
    "thickness": 1e-3,
    "trip_position": 0.04,
    "trip_height": 1.5e-3,
    "trip_pitch": 0.0,
}


def evaluated(case: Case, settings: dict[str, float], **changed: float) -> dict[str, float]:
    given = {name: np.array([value]) for name, value in {**settings, **changed}.items()}
    got = SweptPlates(case).evaluate_settings(given)
    return {name: float(values[0]) for name, values in got.outcomes.items()}


def changed(name: str, *swaps: tuple[str, str]) -> Case:
    """A ready-made case with parts of its text replaced."""
    text = load_case(name).source
    for old, new in swaps:
        assert text.count(old) == 1
        text = text.replace(old, new)
    return parse_case(text, "changed")


def test_ways_keep_to_what_the_case_allows():
    case = load_case("kiln-shield")
    ways = {way.name: way.case.trip for way in strategies(case)}
    assert list(ways) == [
        "plain",
        "one wire",
        "edge wire",
        "two wires",
        "three wires",
        "grit strip",
    ]
    assert ways["plain"] is None
    assert ways["edge wire"].position.low == pytest.approx(0.02)
    assert ways["edge wire"].position.high == pytest.approx(0.03)
    assert [ways[name].wires for name in ("one wire", "two wires", "three wires")] == [1, 2, 3]
    assert ways["grit strip"].sort == "grit"
    assert all(trip.height == case.trip.height for trip in ways.values() if trip is not None)


def test_a_case_without_a_wire_is_given_one_that_fits_its_gap():
    case = parse_case(_without_trip(load_case("hulling-stack").source), "bare")
    wire = strategies(case)[1].case.trip
    assert wire.height.low == 0.0
    assert 1e-3 < wire.height.high <= 0.35 * case.plates.gap.high
    assert wire.position.is_share


def _without_trip(text: str) -> str:
    before, after = text.split("[trip]")
    return before + after[after.index("[fan]") :]


@pytest.mark.parametrize("factor", [1.0 / 1.5, 1.0, 1.5])
def test_a_moved_onset_moves_the_onset_by_the_factor(factor):
    case = load_case("kiln-shield")
    plain = strategies(case)[0].case
    base = {**_KILN, "velocity": 14.0, "trip_height": 0.0, "length": 3.0}
    here, moved = (evaluated(with_onset(plain, f), base)["onset"] for f in (1.0, factor))
    assert_allclose(moved / here, factor, rtol=0.02)


def test_the_band_runs_from_early_to_late_with_the_given_onset_in_the_middle():
    case = load_case("hulling-stack")
    onsets = [one.fluid.critical_reynolds for one in band(case)]
    assert onsets == sorted(onsets)
    assert_allclose(onsets[-1] / onsets[0], 1.5**2)
    assert_allclose(
        evaluated(band(case)[2], _GAP)["heat"], evaluated(case, _GAP)["heat"], rtol=1e-3
    )
    levels = [one.fluid.turbulence for one in band(case, 0.5, 4.0)]
    assert levels[0] == pytest.approx(4.0)
    assert levels[-1] == pytest.approx(0.5)


def test_tripping_is_for_what_the_surface_is_for():
    assert merit(load_case("kiln-shield")) == ("heat", "most")
    heated = 'surface = { temperature = "90 degC" }'
    assert merit(changed("kiln-shield", (heated, 'surface = { temperature = "5 degC" }'))) == (
        "heat",
        "least",
    )
    flux = changed("kiln-shield", (heated, 'surface = { flux = "300 W/m2" }'))
    assert merit(flux) == ("hottest_wall", "least")
    # 1 over the excess of the hottest wall over the inlet
    got = merit_values(flux, {"hottest_wall": np.array([flux.fluid.temperature + 20.0])})
    assert_allclose(got, 0.05)


@pytest.mark.parametrize(
    ("name", "base", "rows"),
    [
        ("kiln-shield", _KILN, "trip_share"),
        ("hulling-stack", _GAP, "trip_share"),
        ("hulling-stack", _GAP, "gap"),
    ],
)
def test_points_of_the_map_agree_with_a_root_finder_on_single_designs(name, base, rows):
    case = load_case(name)
    chart = trip_map(case, base, rows)
    assert chart.gain.shape[0] >= 200
    assert chart.gain.shape[1] >= 200
    plain, one = strategies(case)[0].case, strategies(case)[1].case
    rng = np.random.default_rng(5)
    checked = 0
    for row, column in rng.integers(0, 220, (60, 2)):
        if not np.isfinite(chart.gain[row, column]):
            continue
        level = float(chart.rows[1][row])
        share = level if rows == "trip_share" else base["trip_position"] / base["length"]
        given = {
            **base,
            "velocity": float(chart.columns[1][column]),
            "trip_position": share * base["length"],
            "trip_height": float(chart.height[row, column]),
            **({"gap": level} if rows == "gap" else {}),
        }
        wired = evaluated(one, given)

        def short(log_speed: float, given=given, wanted=wired["fan_power"]) -> float:
            bare = {**given, "trip_height": 0.0, "velocity": float(np.exp(log_speed))}
            return float(np.log(evaluated(plain, bare)["fan_power"] / wanted))

        ends = np.log(given["velocity"]) + np.array([-1.2, 1.2])
        speed = float(np.exp(brentq(short, *ends, xtol=1e-10)))
        bare = evaluated(plain, {**given, "trip_height": 0.0, "velocity": speed})
        assert_allclose(chart.gain[row, column], wired["heat"] / bare["heat"] - 1.0, atol=1.5e-3)
        checked += 1
    assert checked > 20


def test_the_map_tells_why_a_wire_brings_nothing():
    narrow = trip_map(
        load_case("lamp-stack"),
        {**_GAP, "width": 0.25, "height": 0.08, "length": 0.2, "gap": 4e-3, "trip_height": 1e-3},
        "gap",
    )
    low = narrow.sort == NOT_KEPT
    assert low.mean() > 0.5
    assert np.nanmax(narrow.gain[low]) <= 1e-3
    rough = trip_map(load_case("hulling-stack"), _GAP, "trip_share")
    ahead = rough.sort == TURBULENT_AHEAD
    assert ahead.any()
    assert np.nanmax(rough.gain[ahead]) <= 5e-3
    # behind natural onset: the far, fast corner of the map
    assert ahead[-1, -1]
    quiet = trip_map(load_case("kiln-shield"), _KILN, "trip_share")
    assert (quiet.sort == CHANGES).mean() > 0.9
    assert np.nanmax(quiet.gain) > 0.2


def test_the_smallest_wire_just_trips_with_its_margin():
    case = load_case("kiln-shield")
    one = strategies(case)[1].case
    wire = wire_choice(case, _KILN, margin=1.2)
    at = evaluated(one, {**_KILN, "trip_height": wire.smallest})
    # 900: wires that trip at once, Gibbings 1959 and Braslow and Knox 1958 (from memory)
    assert_allclose(at["wire_reynolds"], 1.2 * 900.0, rtol=0.02)
    assert at["wire_reynolds"] >= 1.2 * 900.0
    below = evaluated(one, {**_KILN, "trip_height": wire.smallest - 2e-5})
    assert below["wire_reynolds"] < 1.2 * 900.0
    assert wire_choice(case, _KILN, margin=1.5).smallest > wire.smallest
    assert list(wire.stock) == sorted(wire.stock)
    assert wire.stock[0] >= wire.smallest


def test_behind_enough_more_wire_adds_drag_and_no_heat():
    case = load_case("kiln-shield")
    one = strategies(case)[1].case
    wire = wire_choice(case, _KILN)
    enough, more = (
        evaluated(one, {**_KILN, "trip_height": height})
        for height in (wire.enough, 1.5 * wire.enough)
    )
    assert more["drag"] > 1.03 * enough["drag"]
    assert more["heat"] < 1.006 * enough["heat"]


def test_a_wire_fails_below_its_turndown():
    case = load_case("kiln-shield")
    one = strategies(case)[1].case
    base = {**_KILN, "trip_height": 3e-3}
    wire = wire_choice(case, base)
    assert 0.2 < wire.fails_below < 1.0
    above, under = (
        evaluated(one, {**base, "velocity": base["velocity"] * wire.fails_below * share})
        for share in (1.01, 0.97)
    )
    assert above["wire_reynolds"] >= 826.0 > under["wire_reynolds"]
    tiny = wire_choice(case, {**_KILN, "trip_height": 2e-4})
    assert tiny.fails_below == 1.0


def test_tolerances_hold_no_change_and_grow_with_the_tolerance():
    case = load_case("kiln-shield")
    fine, coarse = (
        wire_choice(case, {**_KILN, "trip_height": 2.4e-3}, height_tolerance=share).tolerance
        for share in (0.02, 0.2)
    )
    for name in fine:
        assert coarse[name][0] <= fine[name][0] <= 0.0 <= fine[name][1] <= coarse[name][1]
    low, high = coarse[next(iter(coarse))]
    assert high - low > 1e-3


def test_a_gap_that_cannot_keep_turbulence_has_no_wire_that_helps():
    case = load_case("lamp-stack")
    base = {**_GAP, "width": 0.25, "height": 0.08, "length": 0.2, "gap": 4e-3, "velocity": 2.0}
    wire = wire_choice(case, {**base, "trip_height": 1e-3})
    assert wire.smallest is None
    assert wire.stock == ()
    assert wire.merit.max() <= wire.merit[0] * (1.0 + 2e-3)


def test_a_band_holds_the_plain_design_against_itself_at_no_gain():
    case = load_case("hulling-stack")
    plain = strategies(case)[0].case
    settings = {**_GAP, "trip_height": 0.0, "trip_position": 0.0}
    same = over_band(plain, plain, settings, settings)
    assert_allclose(same.gain, 0.0, atol=2e-4)
    assert_allclose(same.merit, same.plain_merit)
    # onset from early to late: less heat, less power
    assert np.all(np.diff(same.merit) < 0.0)
    assert np.all(np.diff(same.power) < 0.0)


def test_a_wire_makes_the_heat_certain():
    case = load_case("kiln-shield")
    ways = strategies(case)
    bare = {**_KILN, "velocity": 14.0, "trip_height": 0.0}
    wired = {**bare, "trip_height": 2e-3, "trip_position": 0.04}
    got = over_band(ways[1].case, ways[0].case, wired, bare, (0.2, 3.0))
    spread, plain_spread = (np.ptp(v) / v.mean() for v in (got.merit, got.plain_merit))
    assert plain_spread > 0.3
    assert spread < 0.2 * plain_spread
    # worst where the stream is so rough that the plain layer turns early by itself
    assert np.argmin(got.gain) == 0


@pytest.mark.parametrize(
    ("swaps", "said"),
    [
        ((('height = ["0 mm", "4 mm"]', 'height = "19 mm"'),), "too tall for every gap"),
        (
            (('position = ["1 %", "90 %"]         # share of the length', 'position = "1.3 m"'),),
            "behind the end of the plate",
        ),
        ((('height = ["0 mm", "4 mm"]', 'height = "0.1 mm"'),), "No wire of the case trips"),
        (
            (
                ('turbulence = "4 %"  ', "critical_reynolds = 1e4 "),
                ('velocity = ["1 m/s", "15 m/s"]', 'velocity = ["12 m/s", "15 m/s"]'),
                ('length = ["0.05 m", "1.2 m"]', 'length = ["1.1 m", "1.2 m"]'),
                ('position = ["1 %", "90 %"]', 'position = ["40 %", "90 %"]'),
            ),
            "turbulent already",
        ),
    ],
)
def test_wires_that_make_no_sense_get_a_verdict(swaps, said):
    assert any(said in one for one in meaningless(changed("hulling-stack", *swaps)))


@pytest.mark.parametrize("name", ["kiln-shield", "hulling-stack"])
def test_sensible_wires_get_none(name):
    assert meaningless(load_case(name)) == ()


def test_rough_streams_leave_a_wire_less_to_gain():
    case = load_case("kiln-shield")
    ways = strategies(case)
    bare = {**_KILN, "trip_height": 0.0, "velocity": 12.0}
    gains = [
        over_band(
            with_turbulence(ways[1].case, level),
            with_turbulence(ways[0].case, level),
            {**_KILN, "velocity": 12.0},
            bare,
        ).gain[2]
        for level in (0.5, 1.5, 4.0)
    ]
    assert gains == sorted(gains, reverse=True)

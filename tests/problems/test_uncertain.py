"""What is uncertain: distributions against scipy's, draws against cases that say the same.

A draw must give what the case would have given had it been stated so.
"""

from __future__ import annotations

import re
from dataclasses import replace

import numpy as np
import pytest
from scipy import stats

from problems import build, load_case, ready_made
from problems.case import parse_case, ready_made_text
from problems.convection.flat_plate import laminar_heat_constant
from problems.kinds.statement import SweptPlates
from problems.trips import with_onset, with_turbulence
from problems.uncertain import Uncertain

NAMES = [entry.name for entry in ready_made()]
SILENT = [name for name in NAMES if load_case(name).uncertain is None]
SHARE = np.linspace(0.001, 0.999, 57)
ALL = """
[uncertain]
onset = { factor = 1.5 }
turbulence = ["1 %", "6 %"]
inlet = ["5 degC", "40 degC"]
velocity = "10 %"
laminar_heat = "10 %"
turbulent_heat = "10 %"
laminar_friction = "10 %"
turbulent_friction = "10 %"
fouling = ["0 m2 K/W", "1e-2 m2 K/W"]
fan_efficiency = "10 %"
"""
STACK = 'gap = "10 %"\n'
WIRE = 'wire = "10 %"\nwire_place = "2 mm"\nwire_drag = [0.6, 1.2]\nwire_criterion = "10 %"\n'


def known(shape: str, low: float = 2.0, high: float = 5.0) -> Uncertain:
    return Uncertain("x", "1", "", "value", 3.0, low, high, shape, "")


def problem_of(name: str, tables: str = "") -> SweptPlates:
    text = re.sub(r"(?ms)^\[uncertain\].*?(?=^\[)", "", ready_made_text(name))
    found = build(parse_case(text + tables, name))
    assert isinstance(found, SweptPlates)
    return found


def doubtful(name: str) -> SweptPlates:
    """A ready-made case in which everything that can be is uncertain."""
    case = load_case(name)
    tables = ALL + (STACK if case.plates.gap is not None else "")
    return problem_of(name, tables + (WIRE if case.trip is not None else ""))


def designs_of(problem: SweptPlates, count: int = 40) -> np.ndarray:
    low = np.array([variable.low for variable in problem.variables])
    high = np.array([variable.high for variable in problem.variables])
    return low + (high - low) * np.random.default_rng(3).random((count, low.size))


def one(problem: SweptPlates, designs: np.ndarray, **draws: float) -> dict[str, np.ndarray]:
    got = problem.sampled(designs, {name: np.array([value]) for name, value in draws.items()})
    return {name: values[:, 0] for name, values in got.outcomes.items()}


def test_a_uniform_and_a_log_uniform_input_have_the_quantiles_of_scipy():
    uniform = stats.uniform(2.0, 3.0).ppf(SHARE)
    assert known("uniform").drawn(SHARE) == pytest.approx(uniform, rel=1e-12)
    by_ratio = stats.loguniform(2.0, 5.0).ppf(SHARE)
    assert known("log-uniform").drawn(SHARE) == pytest.approx(by_ratio, rel=1e-12)


def test_a_normal_input_holds_95_per_cent_between_its_ends_and_is_cut_at_three_deviations():
    deviation = 1.5 / stats.norm.ppf(0.975)
    wanted = stats.truncnorm(-3.0, 3.0, loc=3.5, scale=deviation)
    assert known("normal").drawn(SHARE) == pytest.approx(wanted.ppf(SHARE), rel=1e-9)
    assert known("normal").ends == pytest.approx((3.5 - 3 * deviation, 3.5 + 3 * deviation))
    inside = wanted.cdf(5.0) - wanted.cdf(2.0)
    assert inside == pytest.approx(0.95, abs=0.003)


def test_a_log_normal_input_is_normal_in_its_logarithm():
    plain = known("normal", np.log(2.0), np.log(5.0)).drawn(SHARE)
    assert np.log(known("log-normal").drawn(SHARE)) == pytest.approx(plain, rel=1e-12)


@pytest.mark.parametrize("name", SILENT)
def test_without_a_table_what_is_usual_is_taken_and_marked_with_its_source(name):
    problem, case = build(load_case(name)), load_case(name)
    names = {item.name for item in problem.uncertain}
    assert names >= {"onset", "laminar_heat", "turbulent_heat", "laminar_friction"}
    assert ("gap" in names) == (case.plates.gap is not None)
    assert ("wire" in names) == (case.trip is not None)
    assert all(item.usual and item.source for item in problem.uncertain)
    assert {"inlet", "fouling", "velocity"} <= set(problem.exact)
    assert not names & set(problem.exact)


def test_with_a_table_only_what_it_names_is_uncertain_unless_the_others_are_usual():
    alone = problem_of("hulling-stack", '[uncertain]\ngap = "1 %"\n')
    assert [item.name for item in alone.uncertain] == ["gap"]
    assert not alone.uncertain[0].usual
    both = problem_of("hulling-stack", '[uncertain]\ngap = "1 %"\nothers = "usual"\n')
    named = {item.name: item for item in both.uncertain}
    assert (named["gap"].low, named["gap"].high) == pytest.approx((0.99, 1.01))
    assert named["onset"].usual
    assert not named["gap"].usual


def test_what_is_stated_to_be_exact_is_left_out():
    quiet = problem_of("hulling-stack", '[uncertain]\nothers = "usual"\nonset = "0 %"\n')
    assert "onset" not in {item.name for item in quiet.uncertain}
    assert "onset" in quiet.exact


@pytest.mark.parametrize("name", NAMES)
def test_nominal_draws_of_everything_give_the_nominal_figures(name):
    problem = doubtful(name)
    exact = problem_of(name)  # its property table is not as wide: 1e-6 apart
    designs = designs_of(problem)
    draws = {item.name: item.nominal for item in problem.uncertain}
    if "gap" in draws:
        draws["gap"] = 1.0
    got = one(problem, designs, **{k: v for k, v in draws.items() if k != "inlet"})
    wanted = problem.evaluate(designs)
    for outcome in problem.outcomes:
        assert got[outcome.name] == pytest.approx(wanted.outcomes[outcome.name], rel=1e-9, abs=1e-9)
    wide = one(problem, designs, **draws)
    near = exact.evaluate(designs)
    for outcome in ("heat", "drag", "fan_power"):
        assert wide[outcome] == pytest.approx(near.outcomes[outcome], rel=1e-4)


@pytest.mark.parametrize("name", ["hulling-stack", "kiln-shield", "summit-cover"])
def test_a_drawn_onset_and_turbulence_are_those_of_a_case_that_states_them(name):
    problem = doubtful(name)
    designs = designs_of(problem)
    for got, case in (
        (one(problem, designs, onset=0.7), with_onset(problem.case, 0.7)),
        (one(problem, designs, turbulence=0.03), with_turbulence(problem.case, 3.0)),
    ):
        wanted = SweptPlates(case).evaluate(designs)
        plain = wanted.group == "plain"
        for outcome in ("heat", "drag"):
            within = 1e-9 if outcome == "drag" else 1e-6
            assert got[outcome][plain] == pytest.approx(wanted.outcomes[outcome][plain], rel=within)


@pytest.mark.parametrize("name", ["hulling-stack", "kiln-shield", "summit-cover", "cellar-water"])
def test_a_drawn_inlet_is_that_of_a_case_that_states_it(name):
    problem = doubtful(name)
    designs = designs_of(problem)
    other = build(load_case(name, {"fluid.temperature": "30 degC"}))
    got, wanted = one(problem, designs, inlet=303.15), other.evaluate(designs)
    for outcome in ("heat", "drag", "fan_power", "hottest_wall"):
        assert got[outcome] == pytest.approx(wanted.outcomes[outcome], rel=2e-4), outcome


def test_a_drawn_wire_drag_is_that_of_a_case_that_states_it():
    problem = doubtful("kiln-shield")
    designs = designs_of(problem)
    other = build(load_case("kiln-shield", {"drag_coefficient": 0.8}))
    got, wanted = one(problem, designs, wire_drag=0.8), other.evaluate(designs)
    assert got["drag"] == pytest.approx(wanted.outcomes["drag"], rel=1e-12)


def test_a_wider_gap_keeps_the_plates_and_the_flow_and_makes_the_stack_higher():
    problem = doubtful("hulling-stack")
    designs = designs_of(problem)
    nominal, got = problem.evaluate(designs), one(problem, designs, gap=1.1)
    assert got["count"] == pytest.approx(nominal.settings["count"], rel=1e-12)
    assert got["gap"] == pytest.approx(1.1 * nominal.settings["gap"], rel=1e-12)
    assert got["flow_rate"] == pytest.approx(nominal.outcomes["flow_rate"], rel=1e-9)
    pitch = 1.1 * nominal.settings["gap"] + 1e-3
    assert got["height"] == pytest.approx(nominal.settings["count"] * pitch, rel=1e-12)
    changed = replace(next(item for item in problem.uncertain if item.name == "gap"), sort="change")
    problem.uncertain = (changed,)
    by_length = one(problem, designs, gap=2e-4)
    assert by_length["gap"] == pytest.approx(nominal.settings["gap"] + 2e-4, rel=1e-12)


def test_the_scatter_of_a_law_multiplies_what_it_gives():
    plain = parse_case(
        ready_made_text("kiln-shield").split("[trip]")[0]
        + '[aims]\nmost = ["heat"]\nleast = ["drag"]\n'
        + '[uncertain]\nlaminar_heat = "10 %"\nlaminar_friction = "10 %"\n'
        + 'turbulent_heat = "10 %"\nturbulent_friction = "10 %"\n',
        "plain",
        {"length": 0.1, "velocity": 1.0},
    )
    problem = build(plain)
    bare = np.empty((1, 0))
    nominal = {name: values[0] for name, values in problem.evaluate(bare).outcomes.items()}
    assert nominal["turbulent_share"] == 0.0
    got = one(problem, bare, laminar_heat=1.07, laminar_friction=0.9)
    assert got["heat"][0] == pytest.approx(1.07 * nominal["heat"], rel=1e-9)
    assert got["drag"][0] == pytest.approx(0.9 * nominal["drag"], rel=1e-9)
    for name in ("turbulent_heat", "turbulent_friction"):
        untouched = one(problem, bare, **{name: 1.1})
        assert untouched["heat"][0] == pytest.approx(nominal["heat"], rel=1e-12)


def test_all_four_laws_together_scale_a_plate_of_any_regime():
    problem = doubtful("kiln-shield")
    designs = designs_of(problem)
    nominal = problem.evaluate(designs)
    both = one(problem, designs, laminar_heat=1.08, turbulent_heat=1.08)
    assert both["heat"] == pytest.approx(1.08 * nominal.outcomes["heat"], rel=1e-9)
    both = one(problem, designs, laminar_friction=1.05, turbulent_friction=1.05)
    shear = nominal.outcomes["drag"] - nominal.outcomes["wire_drag"]
    assert both["drag"] - both["wire_drag"] == pytest.approx(1.05 * shear, rel=1e-9)


def test_fouling_stands_in_series_with_the_film():
    problem = doubtful("kiln-shield")  # uniform wall temperature, no duct
    designs = designs_of(problem)
    resistance = 2e-3
    got = one(problem, designs, fouling=resistance)
    excess = problem.case.plates.surface.temperature - problem.case.fluid.temperature
    wanted = excess / (1.0 / got["mean_h"] + resistance)
    assert got["heat_flux"] == pytest.approx(wanted, rel=1e-9)
    hot = doubtful("summit-cover")  # a given flux: the wall under the dirt gets hotter by q R
    designs = designs_of(hot)
    warmer = one(hot, designs, fouling=resistance)["hottest_wall"]
    clean = hot.evaluate(designs).outcomes["hottest_wall"]
    assert warmer - clean == pytest.approx(450.0 * resistance, rel=1e-6)


def test_fouling_of_a_stack_lowers_the_transfer_units_as_resistances_in_series_do():
    problem = doubtful("hulling-stack")
    designs = designs_of(problem)
    resistance = 5e-3
    got = one(problem, designs, fouling=resistance)
    area, capacity = got["plate_area"], got["mass_flow"] * 1008.0
    units = area / capacity / (1.0 / got["mean_h"] + resistance)
    wanted = 80.0 - 55.0 * np.exp(-units)
    assert got["outlet_temperature"] - 273.15 == pytest.approx(wanted, abs=0.1)


def test_a_better_fan_draws_less_and_a_faster_stream_is_faster():
    problem = doubtful("hulling-stack")
    designs = designs_of(problem)
    nominal = problem.evaluate(designs)
    got = one(problem, designs, fan_efficiency=1.1)
    assert got["fan_power"] == pytest.approx(nominal.outcomes["fan_power"] / 1.1, rel=1e-9)
    faster = one(problem, designs, velocity=1.05)
    assert faster["velocity"] == pytest.approx(1.05 * nominal.settings["velocity"], rel=1e-12)


def test_laws_of_laminar_heat_scale_the_published_constant():
    # Pohlhausen's 0.332 Pr^(1/3) (any textbook) within 1 % at Pr 0.7, scattered by 10 %
    constant = float(laminar_heat_constant(np.array([0.7]), False)[0])
    assert 1.1 * constant == pytest.approx(1.1 * 0.332 * 0.7 ** (1 / 3), rel=0.01)


def test_a_wire_that_the_criterion_fails_no_longer_trips():
    problem = doubtful("kiln-shield")
    base = {"length": 1.0, "velocity": 4.0, "trip_position": 0.2, "trip_height": 5e-3}
    given = {name: np.array([value]) for name, value in base.items()}
    given |= {name: np.array([1.0]) for name in ("width", "thickness", "trip_pitch")}
    tripped = problem.evaluate_settings(given).outcomes["onset"][0]
    failing = given | {"wire_criterion": np.array([2.0])}
    assert tripped < 0.21
    assert problem.evaluate_settings(failing).outcomes["onset"][0] > 1.5 * tripped


@pytest.mark.parametrize("drive", ["variable speed", "fixed speed"])
def test_a_fan_of_a_catalogue_is_bought_once(drive):
    fan = f'[fan]\ncatalogue = "workshop-fans"\ndrive = "{drive}"\n'
    text = ready_made_text("hulling-stack").replace("[fan]\nefficiency = 0.55\n", fan)
    assert fan in text
    problem = build(parse_case(text, "fans"))
    designs = designs_of(problem, 200)
    nominal = problem.evaluate(designs)
    served = nominal.possible
    assert served.any()
    known_draws = {item.name: np.array([item.nominal]) for item in problem.uncertain}
    known_draws["gap"] = np.zeros(1)
    again = problem.sampled(designs, known_draws)
    for name in ("fan_power", "fan_speed", "velocity"):
        wanted = {**nominal.outcomes, **nominal.settings}[name]
        assert again.outcomes[name][served, 0] == pytest.approx(wanted[served], rel=1e-9)
    rough = {"turbulent_friction": np.array([1.3]), "laminar_friction": np.array([1.3])}
    moved = problem.sampled(designs, rough)
    same = moved.outcomes["fan_count"][served, 0]
    assert same == pytest.approx(nominal.outcomes["fan_count"][served])
    if drive == "fixed speed":
        slower = moved.outcomes["flow_rate"][served, 0] < nominal.outcomes["flow_rate"][served]
        assert slower.all()
        assert moved.possible[served].mean() > 0.9


def test_every_design_meets_the_same_draws_whatever_its_company():
    problem = doubtful("hulling-stack")
    designs = designs_of(problem, 50)
    rng = np.random.default_rng(2)
    draws = {item.name: item.drawn(rng.random(300)) for item in problem.uncertain}
    together = problem.sampled(designs, draws, ["heat", "fan_power"])
    alone = problem.sampled(designs[17:18], draws, ["heat", "fan_power"])
    assert set(together.outcomes) == {"heat", "fan_power"}
    for name in together.outcomes:
        assert together.outcomes[name][17] == pytest.approx(alone.outcomes[name][0], rel=1e-12)


def test_a_draw_of_something_that_is_not_uncertain_is_refused():
    problem = problem_of("hulling-stack", '[uncertain]\ngap = "1 %"\n')
    with pytest.raises(KeyError, match="inlet"):
        problem.sampled(designs_of(problem), {"inlet": np.array([300.0])})


@pytest.mark.parametrize("name", NAMES)
def test_draws_never_give_a_nan(name):
    problem = doubtful(name)
    rng = np.random.default_rng(4)
    draws = {item.name: item.drawn(rng.random(64)) for item in problem.uncertain}
    got = problem.sampled(designs_of(problem, 100), draws)
    for name_of, values in got.outcomes.items():
        assert np.isfinite(values).all(), name_of

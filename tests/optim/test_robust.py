"""A front under what is uncertain: closed forms, published indices, the command and its folder."""

from __future__ import annotations

import json
from pathlib import Path

import numpy as np
import pandas as pd
import pytest
from matplotlib.image import imread
from scipy import stats

from optim import Front, search
from optim.bands import Terms, banded
from optim.cli import main
from optim.crew import crew
from optim.draws import shared
from optim.errors import RunError
from optim.influence import influences
from optim.picks import designs as designs_of
from optim.robust import studied
from optim.robust_account import of_study, tables
from optim.robust_problem import Confident
from optim.robust_text import of_study as as_text
from problems import build, load_case
from problems.case import parse_case, ready_made_text
from problems.problem import Aim, Limit, Variable
from tests.optim.doubtful import Doubtful, doubtful, ishigami, linear, spread
from tests.published_data import published

FEW = {"samples": 256, "evaluations": 3000}


def terms(problem: Doubtful, samples: int = 4096, confidence: float = 0.9) -> Terms:
    return Terms(shared(problem.uncertain, samples, 1), confidence)


def column(*values: float) -> np.ndarray:
    return np.array(values)[:, None]


# bands and chances


@pytest.mark.parametrize("shape", ["uniform", "normal"])
def test_bands_of_a_linear_outcome_are_the_percentiles_in_closed_form(shape):
    problem = linear(shape)
    found = banded(problem, column(0.2, 0.8), terms(problem))
    if shape == "uniform":
        ends = np.array([-0.9, 0.0, 0.9])
    else:
        deviation = 1.0 / stats.norm.ppf(0.975)
        ends = stats.truncnorm(-3, 3, scale=deviation).ppf([0.05, 0.5, 0.95])
    for row, x in enumerate((0.2, 0.8)):
        assert found.band["gain"][row] == pytest.approx(10.0 * x + ends, abs=2e-3)
        assert found.band["cost"][row] == pytest.approx(x * (1.0 + 0.2 * ends), abs=5e-4)
        assert found.band["x"][row] == pytest.approx([x, x, x])


def test_an_aim_at_a_confidence_is_the_percentile_on_its_unfavourable_side():
    problem = linear()
    found = banded(problem, column(0.5), terms(problem, confidence=0.8))
    gain, cost = found.assured[0]
    assert gain == pytest.approx(5.0 - 0.6, abs=2e-3)  # in 80 % of the draws at least that
    assert cost == pytest.approx(0.5 * (1.0 + 0.12), abs=5e-4)  # in 80 % at most that


def test_chances_of_limits_are_the_distributions_of_what_they_bound():
    problem = linear(limits=(Limit("gain", at_least=5.5), Limit("cost", at_most=0.55)))
    found = banded(problem, column(0.5, 0.6), terms(problem))
    # gain = 10 x + a: P(a >= 5.5 - 10 x); cost: P(b <= 0.55/x - 1); a and b independent
    by_gain = np.array([0.25, 0.75])
    by_cost = np.array([0.75, (0.55 / 0.6 - 1.0 + 0.2) / 0.4])
    assert found.chance[:, 0] == pytest.approx(by_gain, abs=2e-3)
    assert found.chance[:, 1] == pytest.approx(by_cost, abs=2e-3)
    assert found.chance_of_all == pytest.approx(by_gain * by_cost, abs=3e-3)


def test_the_excess_is_above_zero_exactly_where_the_chance_falls_short():
    problem = linear(limits=(Limit("gain", at_least=5.5), Limit("cost", at_most=0.75)))
    x = np.linspace(0.4, 0.8, 400)[:, None]
    for confidence in (0.5, 0.77, 0.9, 0.99):
        found = banded(problem, x, terms(problem, 256, confidence))
        assert ((found.excess <= 0.0) == (found.chance_of_all >= confidence)).all()
    assert (found.chance_of_all > 0.5).any()


def test_draws_under_which_a_design_cannot_exist_meet_no_limit_and_are_left_out_of_bands():
    problem = linear(limits=(Limit("cost", at_most=9.0),), cannot=lambda v, u: u["a"] - 0.5)
    found = banded(problem, column(0.5), terms(problem))
    assert found.possible == pytest.approx(0.75, abs=1e-3)
    assert found.chance_of_all == pytest.approx(0.75, abs=1e-3)
    assert found.band["gain"][0] == pytest.approx(5.0 + np.array([-0.925, -0.25, 0.425]), abs=3e-3)
    assert found.excess[0] > 0.0


def test_without_uncertain_inputs_bands_are_the_nominal_figures():
    problem = linear()
    found = banded(problem, column(0.3), Terms({}, 0.9))
    assert found.band["gain"][0] == pytest.approx([3.0] * 3, abs=1e-12)
    assert found.assured[0] == pytest.approx([3.0, 0.3], abs=1e-12)


@pytest.mark.parametrize("name", ["hulling-stack", "kiln-shield"])
def test_a_case_with_no_spread_gives_its_nominal_figures(name):
    none = '[uncertain]\nonset = "0 %"\nlaminar_heat = "0 %"\ninlet = { plus_minus = "0 K" }\n'
    problem = build(parse_case(ready_made_text(name) + none, name))
    assert problem.uncertain == ()
    low, high = (np.array([getattr(v, end) for v in problem.variables]) for end in ("low", "high"))
    chosen = low + (high - low) * np.random.default_rng(1).random((30, low.size))
    found = banded(problem, chosen, Terms(shared(problem.uncertain, 64, 1), 0.9))
    nominal = problem.evaluate(chosen)
    for outcome in problem.outcomes:
        wanted = np.repeat(nominal.outcomes[outcome.name][:, None], 3, axis=1)
        assert found.band[outcome.name] == pytest.approx(wanted, rel=1e-9, abs=1e-9)


def test_blocks_and_company_change_nothing():
    problem = build(load_case("hulling-stack"))
    low, high = (np.array([getattr(v, end) for v in problem.variables]) for end in ("low", "high"))
    chosen = low + (high - low) * np.random.default_rng(1).random((90, low.size))
    draws = Terms(shared(problem.uncertain, 512, 1), 0.9)
    whole = banded(problem, chosen, draws)
    alone = banded(problem, chosen[70:71], draws)
    for name, values in whole.band.items():
        assert values[70] == pytest.approx(alone.band[name][0], rel=1e-12), name
    assert whole.chance_of_all[70] == alone.chance_of_all[0]


# draws and indices


def test_draws_are_the_same_for_the_same_seed_and_others_for_another():
    inputs = linear().uncertain
    first, again, other = (shared(inputs, 64, seed) for seed in (1, 1, 2))
    for name in ("a", "b"):
        assert (first[name] == again[name]).all()
        assert not (first[name] == other[name]).any()
    longer = shared(inputs, 256, 1)
    assert (longer["a"][:64] == first["a"]).all()


def test_draws_fill_every_even_stretch_of_an_input_evenly():
    draws = shared((spread("a", 0.0, 1.0), spread("b", 0.0, 1.0)), 256, 3)
    counts, _ = np.histogram(draws["b"], bins=256, range=(0.0, 1.0))
    assert (counts == 1).all()


def test_indices_of_the_function_of_ishigami_are_the_published_ones():
    problem = ishigami()
    found = influences(problem, column(0.1, 0.9), ["wave", "still"], 1 << 14, 1)
    wanted = published("ishigami").set_index("input")
    for row in range(2):
        for place, name in enumerate(found.inputs):
            assert found.first[row, 0, place] == pytest.approx(wanted["first"][name], abs=0.01)
            assert found.total[row, 0, place] == pytest.approx(wanted["total"][name], abs=0.01)
    variance = 7.0**2 / 8 + 0.1 * np.pi**4 / 5 + 0.1**2 * np.pi**8 / 18 + 0.5
    assert found.spread[:, 0] == pytest.approx(np.sqrt(variance), rel=0.01)
    assert (found.first[:, 1] == 0.0).all()
    assert list(found.share("wave")) == ["x1", "x2", "x3"]


def test_indices_of_a_linear_outcome_are_shares_of_its_variance():
    problem = doubtful(
        (Variable("x", "m", 0.0, 1.0, "x"),),
        (spread("a", -1.0, 1.0), spread("b", -3.0, 3.0)),
        {"y": lambda v, u: v["x"] + u["a"] + u["b"]},
        (Aim("y", "least"),),
    )
    found = influences(problem, column(0.4), ["y"], 1024, 1)
    assert found.first[0, 0] == pytest.approx([0.1, 0.9], abs=0.01)
    assert found.total[0, 0] == pytest.approx([0.1, 0.9], abs=0.01)


# the front at a confidence


def test_the_search_at_a_confidence_finds_the_design_that_just_meets_its_limit():
    # most x with x + a <= 1 in 90 % of the draws, a even from -0.2 to 0.2: x = 1 - 0.16
    problem = doubtful(
        (Variable("x", "m", 0.0, 2.0, "x"),),
        (spread("a", -0.2, 0.2),),
        {"y": lambda v, u: v["x"] + u["a"], "z": lambda v, u: v["x"] + 0.0 * u["a"]},
        (Aim("z", "most"),),
        (Limit("y", at_most=1.0),),
    )
    draws = Terms(shared(problem.uncertain, 1024, 1), 0.9, bands=False)
    found = search(Confident(problem, draws), seed=1, evaluations=4000)
    assert found.table["x_m"][0] == pytest.approx(0.84, abs=2e-3)


def test_a_front_at_a_confidence_moves_off_a_cliff_that_the_nominal_front_stands_on():
    # cost falls with x, but past x = 0.6 + a it jumps: nominally the best x is 0.6
    problem = doubtful(
        (Variable("x", "m", 0.0, 1.0, "x"), Variable("y", "m", 0.0, 1.0, "y")),
        (spread("a", -0.1, 0.1),),
        {
            "cost": lambda v, u: 1.0 - v["x"] + 5.0 * (v["x"] > 0.6 + u["a"]) + v["y"],
            "waste": lambda v, u: 1.0 - v["y"] + 0.0 * u["a"],
        },
        (Aim("cost", "least"), Aim("waste", "least")),
    )
    front = search(problem, seed=1, evaluations=20_000)
    study = studied(problem, front, samples=256)
    assert designs_of(front, problem)[:, 0] == pytest.approx(0.6, abs=0.01)
    assert not study.unbeaten.any()
    assert study.anew.all()
    x = study.robust_table["x_m"].to_numpy()
    assert x == pytest.approx(0.52, abs=0.01)  # 0.6 less what 90 % of the draws leave
    assert study.robust.assured[:, 0] == pytest.approx(1.48 - study.robust.assured[:, 1], abs=0.03)
    assert study.volume is not None
    assert study.volume[1] > study.volume[0]


def test_designs_at_a_limit_do_not_survive_and_those_well_inside_do():
    problem = linear(limits=(Limit("gain", at_least=5.0),))
    front = search(problem, seed=1, evaluations=3000)
    study = studied(problem, front, **FEW)
    x = designs_of(front, problem)[:, 0]
    assert (study.survives == (x >= 0.58)).mean() > 0.98  # 5 + 0.8 of a's 1 over 10
    assert study.given.chance_of_all[np.argmin(x)] == pytest.approx(0.5, abs=0.01)
    robust = study.robust_table["x_m"].to_numpy()
    assert robust.min() == pytest.approx(0.58, abs=0.003)
    assert study.near[study.survives].all()
    assert (study.robust.chance_of_all >= 0.9).all()


def test_nothing_on_the_front_at_a_confidence_beats_anything_else_on_it():
    problem = linear(limits=(Limit("gain", at_least=5.0),))
    study = studied(problem, search(problem, seed=1, evaluations=3000), **FEW)
    least = study.robust.assured * np.array([-1.0, 1.0])
    better = (least[None] < least[:, None]).all(axis=2)
    assert not better.any()


def test_the_same_seed_gives_the_same_study_and_another_seed_nearly_so():
    problem = linear(limits=(Limit("gain", at_least=5.0),))
    front = search(problem, seed=1, evaluations=3000)
    one, two, other = (studied(problem, front, seed=seed, **FEW) for seed in (4, 4, 5))
    pd.testing.assert_frame_equal(tables(one), tables(two))
    assert of_study(one) == of_study(two)
    assert (one.given.band["gain"] != other.given.band["gain"]).any()
    assert one.given.band["gain"] == pytest.approx(other.given.band["gain"], abs=0.03)


def test_a_limit_that_no_design_meets_often_enough_is_answered_with_no():
    problem = linear(limits=(Limit("gain", at_least=9.9),))
    front = search(problem, seed=1, evaluations=3000)
    study = studied(problem, front, **FEW)
    account = of_study(study)
    assert not account["answered"]
    assert not len(study.robust)
    assert "No other design does either" in account["answer"]
    assert "No other design does either" in " ".join(as_text(account, problem).split())


def test_one_aim_gives_the_best_design_at_the_confidence():
    problem = doubtful(
        (Variable("x", "m", 0.0, 1.0, "x"),),
        (spread("a", 0.4, 0.8),),
        {"cost": lambda v, u: np.abs(v["x"] - u["a"])},
        (Aim("cost", "least"),),
    )
    front = search(problem, seed=1, evaluations=2000)
    study = studied(problem, front, **FEW)
    assert study.robust_table["x_m"].tolist() == [pytest.approx(0.6, abs=0.01)]
    assert study.robust.assured[0, 0] == pytest.approx(0.18, abs=0.005)


def test_workers_change_nothing():
    case = load_case("kiln-shield")
    problem = build(case)
    front = search(problem, seed=1, evaluations=3000)
    alone = studied(problem, front, samples=64, evaluations=1500)
    with crew(case, problem, 2) as each:
        together = studied(problem, front, samples=64, evaluations=1500, each=each)
    pd.testing.assert_frame_equal(tables(alone), tables(together))


@pytest.mark.parametrize(
    ("wrong", "says"),
    [
        ({"samples": 100}, "samples: 100; a power of 2"),
        ({"confidence": 1.0}, "confidence: 1.0; from 0.5"),
    ],
)
def test_wrong_arguments_are_refused(wrong, says):
    problem = linear()
    front = search(problem, seed=1, evaluations=1000)
    with pytest.raises(RunError, match=says):
        studied(problem, front, **wrong)


# the command


@pytest.fixture(scope="module")
def runs(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """Short runs of two ready-made cases, and what `robust` leaves beside them."""
    place = tmp_path_factory.mktemp("runs")
    for name in ("hulling-stack", "summit-cover"):
        few = ["--evaluations", "4000", "--out", str(place / name)]
        assert main(["search", name, *few]) == 0
        few = ["--evaluations", "1500", "--samples", "64"]
        assert main(["robust", str(place / name), *few]) == 0
    return place


@pytest.mark.parametrize("name", ["hulling-stack", "summit-cover"])
def test_a_run_gets_a_table_an_account_and_pictures(runs, name):
    folder = runs / name
    account = json.loads((folder / "robust.json").read_text("utf-8"))
    assert set(account["files"]) <= {path.name for path in folder.iterdir()}
    table = pd.read_csv(folder / "robust.csv")
    front = Front.load(folder)
    assert (table["front"] != "robust").sum() == len(front) == account["front"]["designs"]
    assert {"both", "given", "robust"} >= set(table["front"])
    given = table[table["front"] != "robust"]
    assert given["fan_power_W"].to_numpy() == pytest.approx(front.table["fan_power_W"].to_numpy())
    assert (table["fan_power_p5_W"] <= table["fan_power_p50_W"]).all()
    assert (table["fan_power_p50_W"] <= table["fan_power_p95_W"]).all()
    assert table["chance_of_all"].between(0.0, 1.0).all()
    assured = table["fan_power_at_90_W"]
    assert assured.between(table["fan_power_p50_W"], table["fan_power_p95_W"]).all()
    for name_of in ("robust-front.png", "robust-inputs.png", "robust-limits.png"):
        assert imread(folder / name_of).std() > 0.02
    assert account["all_usual"]
    assert {known["name"] for known in account["inputs"]} >= {"onset", "laminar_heat", "wire"}
    for one in account["influence"]:
        for known in one["inputs"]:
            assert -0.3 < known["first"] < 1.3
            assert -0.01 < known["total"] < 1.5
    assert not [path for path in folder.iterdir() if path.name.startswith(".")]


def robust(*argv: object) -> int:
    return main(["robust", *map(str, argv), "--evaluations", "500", "--samples", "32"])


def test_nothing_is_replaced_without_force(runs, capsys):
    folder = runs / "summit-cover"
    before = (folder / "robust.csv").read_bytes()
    assert robust(folder) == 2
    assert "nothing is replaced without --force" in capsys.readouterr().err
    assert (folder / "robust.csv").read_bytes() == before


def test_another_folder_another_confidence_and_what_is_set_by_hand(runs, tmp_path, capsys):
    folder = runs / "summit-cover"
    asked = ["--out", tmp_path / "o", "--confidence", "95%", "--json"]
    assert robust(folder, *asked, "--set", "uncertain.inlet=0 degC..20 degC") == 0
    account = json.loads(capsys.readouterr().out)
    assert account["confidence"] == pytest.approx(0.95)
    assert [known["name"] for known in account["inputs"]] == ["inlet"]
    assert not account["all_usual"]
    assert "onset" in account["exact"]
    assert (tmp_path / "o" / "robust.json").is_file()
    assert "hottest_wall_at_95_K" in account["shown"][0]


def test_the_text_tells_the_answer_the_inputs_and_that_they_are_the_usual_ones(
    runs, tmp_path, capsys
):
    assert robust(runs / "hulling-stack", "--out", tmp_path / "o") == 0
    out = " ".join(capsys.readouterr().out.split())
    assert "meet all limits with a chance of 90 % or more" in out
    assert "The case states nothing in [uncertain]: what is usual was taken" in out
    assert "x 0.6667 to x 1.5 log-uniform" in out
    assert "from memory" in out
    assert "What matters" in out
    assert "Hot surfaces burn" in out


@pytest.mark.parametrize(
    ("argv", "says"),
    [
        (["--confidence", "30%"], "a share from 50% to 99.9%"),
        (["--samples", "1000"], "a power of 2 from 16"),
        (["--set", "length=0.3"], "only what is uncertain can be set here"),
        (["--set", "uncertain.heat=3%"], "unknown; the nearest is"),
        (["--set", "uncertain.gap=3%"], "only a stack has gaps"),
        (["--workers", "0"], "a whole number, 1 or more"),
    ],
)
def test_what_cannot_be_followed_is_refused_in_one_message(runs, argv, says, capsys):
    assert main(["robust", str(runs / "summit-cover"), *argv]) == 2
    told = capsys.readouterr().err
    assert says in told
    assert "Traceback" not in told


def test_a_folder_without_a_run_is_refused(tmp_path, capsys):
    assert robust(tmp_path) == 2
    assert "holds no run" in capsys.readouterr().err


def test_where_no_design_is_sure_enough_the_answer_is_no(tmp_path, capsys):
    text = ready_made_text("summit-cover").replace('"60 degC"', '"26 degC"')
    (tmp_path / "hard.toml").write_text(text, encoding="utf-8")
    few = ["--evaluations", "4000", "--out", str(tmp_path / "run")]
    assert main(["search", str(tmp_path / "hard.toml"), *few]) == 0
    sure = ["--set", "uncertain.inlet=0 degC..30 degC", "--confidence", "99%"]
    assert robust(tmp_path / "run", *sure) == 1
    assert "No other design does either" in " ".join(capsys.readouterr().out.split())
    assert (tmp_path / "run" / "robust.json").is_file()


def test_a_run_whose_case_names_a_catalogue_beside_it_can_be_taken_up_from_its_folder(
    tmp_path, capsys
):
    fans = Path(ready_made_text.__code__.co_filename).parent / "cases" / "workshop-fans.csv"
    (tmp_path / "my").mkdir()
    (tmp_path / "my" / "fans.csv").write_bytes(fans.read_bytes())
    table = '[fan]\ncatalogue = "my/fans.csv"\n'
    text = ready_made_text("hulling-stack").replace("[fan]\nefficiency = 0.55\n", table)
    (tmp_path / "own.toml").write_text(text, encoding="utf-8")
    few = ["--evaluations", "2500", "--out", str(tmp_path / "run")]
    assert main(["search", str(tmp_path / "own.toml"), *few]) == 0
    assert (tmp_path / "run" / "my" / "fans.csv").read_bytes() == fans.read_bytes()
    assert robust(tmp_path / "run") == 0
    names = {
        known["name"]
        for known in json.loads((tmp_path / "run" / "robust.json").read_text())["inputs"]
    }
    assert "fan_efficiency" in names


def test_check_tells_what_is_uncertain(capsys):
    assert main(["check", "kiln-shield"]) == 0
    out = capsys.readouterr().out
    assert "Uncertain, for robust" in out
    assert "x 0.6667 to x 1.5" in out
    assert main(["check", "kiln-shield", "--json"]) == 0
    assert json.loads(capsys.readouterr().out)["uncertain"][0]["name"] == "onset"


def test_a_search_broken_off_by_the_user_ends_the_study(monkeypatch):
    problem = linear()
    front = search(problem, seed=1, evaluations=1000)

    heard = 0

    def impatient() -> None:
        nonlocal heard
        heard += 1
        if heard > 30:  # in the middle of the search
            raise KeyboardInterrupt

    with pytest.raises(KeyboardInterrupt):
        studied(problem, front, told=impatient, **FEW)


def test_a_design_that_stands_on_a_limit_meets_it_whatever_the_rounding():
    problem = doubtful(
        (Variable("x", "m", 0.0, 1.0, "x"),),
        (spread("a", 0.9, 1.1),),
        {"flow": lambda v, u: (v["x"] / u["a"]) * u["a"], "cost": lambda v, u: v["x"] + u["a"]},
        (Aim("cost", "least"),),
        (Limit("flow", at_least=0.3, at_most=0.3),),
    )
    assert banded(problem, column(0.3), terms(problem)).chance_of_all == pytest.approx(1.0)
    assert banded(problem, column(0.3001), terms(problem)).chance_of_all == pytest.approx(0.0)


def test_bands_agree_with_plain_monte_carlo_on_a_ready_made_case():
    problem = build(load_case("hulling-stack"))
    middle = np.array([[np.sqrt(v.low * v.high) if v.low else 1e-3 for v in problem.variables]])
    sobol = banded(problem, middle, Terms(shared(problem.uncertain, 1024, 1), 0.9))
    rng = np.random.default_rng(7)
    draws = {known.name: known.drawn(rng.random(20_000)) for known in problem.uncertain}
    plain = problem.sampled(middle, draws, ["heat", "drag", "fan_power"])
    for name, values in plain.outcomes.items():
        wanted = np.percentile(values[0], [5.0, 50.0, 95.0])
        spread_of = wanted[2] - wanted[0]
        assert sobol.band[name][0] == pytest.approx(wanted, abs=0.03 * spread_of), name

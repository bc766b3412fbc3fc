"""The search against problems whose answers are known beforehand."""

from __future__ import annotations

import subprocess
import sys
from dataclasses import replace
from pathlib import Path

import numpy as np
import pandas as pd
import pytest
from scipy.optimize import brentq, minimize_scalar

from optim import course, search
from optim.archive import nondominated
from optim.errors import CheckpointError, RunError
from optim.search import Progress
from optim.stopping import hypervolume
from problems.problem import Aim, Floats, Limit, Variable
from tests.optim import toy

FEW = 8000  # evaluations, where a test needs only a search of some length


def grid_front(problem: toy.Toy, per_side: int) -> Floats:
    """Aims of the non-dominated designs on a dense grid of two variables, to be minimised."""
    axes = [
        np.geomspace(v.low, v.high, per_side)
        if v.scale == "log"
        else np.linspace(v.low, v.high, per_side)
        for v in problem.variables
    ]
    designs = np.stack(np.meshgrid(*axes), axis=-1).reshape(-1, 2)
    given = problem.evaluate(designs)
    sound = given.possible.copy()
    for limit in problem.limits:
        values = given.outcomes[limit.outcome]
        sound &= values >= (-np.inf if limit.at_least is None else limit.at_least)
        sound &= values <= (np.inf if limit.at_most is None else limit.at_most)
    aims = signed(problem, given.outcomes)[sound]
    return aims[nondominated(aims)]


def signed(problem: toy.Toy, outcomes: dict) -> Floats:
    """Aims as columns to be minimised."""
    return np.stack(
        [np.asarray(outcomes[a.outcome]) * (1 if a.sense == "least" else -1) for a in problem.aims],
        axis=1,
    )


def table_aims(problem: toy.Toy, table: pd.DataFrame) -> Floats:
    """Aims of a table's rows as columns to be minimised."""
    return signed(problem, {o.name: table[o.column].to_numpy() for o in problem.outcomes})


@pytest.mark.parametrize("make", [toy.trade, toy.binh_korn])
def test_front_of_two_variables_agrees_with_a_grid_of_a_million_designs(make):
    problem = make()
    exact = grid_front(problem, 1000)
    found = table_aims(problem, search(problem).table)
    low = np.minimum(exact.min(axis=0), found.min(axis=0))
    high = np.maximum(exact.max(axis=0), found.max(axis=0))
    ratio = hypervolume(found, low, high) / hypervolume(exact, low, high)
    assert ratio == pytest.approx(1.0, abs=0.003)


@pytest.mark.parametrize("aims", [3, 4, 5])
def test_front_of_spheres_lies_on_the_sphere(aims):
    # the front of the second problem of Deb et al. 2002 is the unit sphere (from memory)
    problem = toy.sphere(aims)
    found = table_aims(problem, search(problem).table)
    radius = np.linalg.norm(found, axis=1)
    assert radius.min() >= 1.0 - 1e-12
    assert np.median(radius) < 1.003


def test_front_in_pieces_is_found_in_all_five_pieces():
    # first aim of the five pieces (Zitzler, Deb and Thiele 2000; from memory)
    pieces = [(0.0, 0.0830), (0.1823, 0.2577), (0.4094, 0.4538), (0.6184, 0.6525), (0.8233, 0.8518)]
    found = search(toy.broken_front()).table["f0"].to_numpy()
    within = [((found >= low - 2e-3) & (found <= high + 2e-3)) for low, high in pieces]
    assert all(piece.sum() > 5 for piece in within)
    assert np.any(within, axis=0).all()


def test_nothing_in_the_table_is_beaten_or_breaks_a_limit():
    problem = toy.binh_korn()
    table = search(problem, evaluations=FEW).table
    assert nondominated(table_aims(problem, table)).all()
    assert (table["g1"] <= 25.0).all()
    assert (table["g2"] >= 7.7).all()


@pytest.mark.parametrize("aims", [2, 3, 4, 5])
def test_front_is_thinned_to_its_size_and_keeps_the_best_of_each_aim(aims):
    problem = toy.sphere(aims)
    table = search(problem, evaluations=FEW, size=50).table
    found = table_aims(problem, table)
    assert len(table) == 50
    assert found.min(axis=0) == pytest.approx(np.zeros(aims), abs=0.01)


def test_front_is_spread_evenly():
    problem = toy.trade()
    places = table_aims(problem, search(problem, size=100).table)
    places = (places - places.min(axis=0)) / np.ptp(places, axis=0)
    gaps = np.linalg.norm(np.diff(places[np.argsort(places[:, 0])], axis=0), axis=1)
    assert gaps.max() < 2.5 * np.median(gaps)


def test_rows_run_from_the_least_of_the_last_aim_to_have_least_of():
    table = search(toy.trade(), evaluations=FEW).table
    assert table["effort_W"].is_monotonic_increasing


def test_rows_run_upward_in_the_first_aim_where_all_are_to_have_most_of():
    problem = toy.Toy(
        toy.plain("x", "y"),
        {"a": lambda v: v["x"] - v["y"], "b": lambda v: 1 - v["x"] ** 2},
        (Aim("a", "most"), Aim("b", "most")),
    )
    assert search(problem, evaluations=FEW).table["a"].is_monotonic_increasing


def duct_optimum() -> tuple[float, float]:
    """Best gap and value on the active limit drop = 10, by a search along the limit."""

    def lost(log_gap: float) -> float:
        gap = np.exp(log_gap)
        return -10.0 * gap**2 * (1.0 - np.exp(-4.0 / gap**4))

    best = minimize_scalar(lost, bounds=(-1.0, 2.0), method="bounded", options={"xatol": 1e-10})
    return float(np.exp(best.x)), -float(best.fun)


def test_duct_optimum_satisfies_its_own_equation():
    # with z = 4/gap^4 the value gap^2 (1 - exp(-z)) is best where exp(z) = 1 + 2 z
    z = brentq(lambda z: np.exp(z) - 1.0 - 2.0 * z, 0.5, 3.0)
    assert duct_optimum()[0] == pytest.approx((4.0 / z) ** 0.25, rel=1e-6)


@pytest.mark.parametrize("seed", [1, 2, 3])
def test_one_aim_finds_a_nearly_flat_best_on_an_active_limit(seed):
    gap, value = duct_optimum()
    front = search(toy.duct(), seed=seed)
    first = front.table.iloc[0]
    assert first["carried_W"] == pytest.approx(value, rel=1e-7)
    assert first["gap_m"] == pytest.approx(gap, rel=5e-4)
    assert first["drop_Pa"] <= 10.0


def test_one_aim_survives_small_kinks():
    def kinked(v):
        clean = toy.duct().formulas["carried"](v)
        return clean * (1.0 + 2e-6 * np.abs(np.sin(300.0 * np.log(v["gap"]))))

    problem = toy.duct(formulas={**toy.duct().formulas, "carried": kinked})
    gap, value = duct_optimum()
    first = search(problem).table.iloc[0]
    assert first["carried_W"] >= value
    assert first["gap_m"] == pytest.approx(gap, rel=5e-3)


def test_one_aim_gives_neighbours_within_one_percent_best_first():
    table = search(toy.duct()).table
    best = table["carried_W"].iloc[0]
    assert len(table) > 100
    assert (table["carried_W"] >= 0.99 * best).all()
    assert table["carried_W"].is_monotonic_decreasing
    assert np.ptp(table["gap_m"]) > 0.1


def test_one_aim_to_have_least_of_runs_to_the_bound():
    problem = toy.Toy(
        toy.plain("x", "y"), {"f": lambda v: 2.0 + v["x"] + v["y"] ** 2}, toy.least("f")
    )
    first = search(problem, evaluations=FEW).table.iloc[0]
    assert first["f"] == pytest.approx(2.0, abs=1e-12)


def test_one_aim_among_many_variables_finds_the_valley():
    # Rosenbrock 1960, Computer J. 3, 175-184 (from memory): 0 at (1, ..., 1)
    names = tuple(f"x{i}" for i in range(6))

    def valley(v):
        x = np.stack([v[name] for name in names])
        return 1.0 + (100.0 * (x[1:] - x[:-1] ** 2) ** 2 + (1.0 - x[:-1]) ** 2).sum(axis=0)

    problem = toy.Toy(toy.plain(*names, low=-2.0, high=2.0), {"f": valley}, toy.least("f"))
    first = search(problem).table.iloc[0]
    assert [first[f"{name}_m"] for name in names] == pytest.approx([1.0] * 6, abs=1e-3)


def test_aims_that_agree_give_a_front_of_one_design():
    problem = toy.Toy(
        toy.plain("x", "y"),
        {"f": lambda v: v["x"] + v["y"], "g": lambda v: 3.0 * (v["x"] + v["y"])},
        toy.least("f", "g"),
    )
    table = search(problem, evaluations=FEW).table
    assert len(table) == 1
    assert table["x_m"].iloc[0] == pytest.approx(0.0, abs=1e-9)


def test_aim_that_never_moves_does_no_harm():
    problem = toy.Toy(
        toy.plain("x", "y"),
        {"f": lambda v: v["x"], "g": lambda v: 1 - v["x"] ** 2, "h": lambda v: 0.0 * v["x"] + 7.0},
        toy.least("f", "g", "h"),
    )
    table = search(problem, evaluations=FEW).table
    assert len(table) > 100
    assert (table["h"] == 7.0).all()


def test_fixed_variable_stays_where_it_is():
    problem = toy.trade()
    length, speed = problem.variables
    fixed = toy.trade(variables=(replace(length, low=0.3, high=0.3), speed))
    table = search(fixed, evaluations=FEW).table
    assert (table["length_m"] == 0.3).all()
    assert table["speed_m_s"].nunique() > 100


def test_without_a_free_variable_the_one_design_is_evaluated():
    still = tuple(replace(v, low=2.0, high=2.0) for v in toy.trade().variables)
    front = search(toy.trade(variables=still))
    assert len(front) == 1
    assert front.provenance["stopped_because"].startswith("no variable is free")
    assert front.provenance["evaluations"] == 1


def test_without_a_free_variable_one_aim_and_a_miss_are_told_as_well():
    still = tuple(replace(v, low=2.0, high=2.0) for v in toy.trade().variables)
    best = search(toy.trade(variables=still, aims=(Aim("output", "most"),)))
    miss = search(toy.trade(variables=still, limits=(Limit("strain", at_most=1.0),)))
    assert len(best) == 1
    assert miss.provenance["nearest_miss"]["design"]["settings"] == {
        "length_m": 2.0,
        "speed_m_s": 2.0,
    }


def test_impossible_designs_are_kept_out_and_the_edge_is_reached():
    problem = toy.Toy(
        toy.plain("x", "y"),
        {"f": lambda v: v["x"], "g": lambda v: v["y"]},
        toy.least("f", "g"),
        wrong=lambda v: 1.0 - v["x"] - v["y"],
    )
    table = search(problem).table
    total = table["x_m"] + table["y_m"]
    assert (total >= 1.0).all()
    assert total.max() < 1.003


def test_small_possible_corner_is_found():
    problem = toy.Toy(
        tuple(Variable(f"x{i}", "m", 0.0, 1.0, "x") for i in range(6)),
        {"f": lambda v: v["x0"], "g": lambda v: 1.0 - v["x0"] + v["x5"]},
        toy.least("f", "g"),
        wrong=lambda v: sum(np.abs(v[f"x{i}"] - 0.3) for i in range(1, 6)) - 0.1,
    )
    assert len(search(problem).table) > 50


def test_narrow_band_between_two_limits_is_found():
    problem = toy.trade(limits=(Limit("strain", at_least=20.0, at_most=20.02),))
    table = search(problem).table
    assert len(table) > 50
    assert table["strain_Pa"].between(20.0, 20.02).all()


def test_same_seed_gives_the_same_front_bit_for_bit():
    one, other = (search(toy.osyczka_kundu(), seed=5, evaluations=FEW).table for _ in range(2))
    pd.testing.assert_frame_equal(one, other, check_exact=True)


def test_other_seed_gives_another_front():
    one, other = (search(toy.trade(), seed=seed, evaluations=FEW).table for seed in (1, 2))
    assert not one.equals(other)


def test_search_leaves_the_global_random_state_alone():
    before = np.random.get_state()[1].copy()  # noqa: NPY002 - the state that must not be used
    search(toy.trade(), evaluations=FEW)
    assert (np.random.get_state()[1] == before).all()  # noqa: NPY002


@pytest.mark.parametrize("evaluations", [1, 7, 100, 1500, 5001])
def test_search_makes_no_more_evaluations_than_allowed(evaluations):
    problem = toy.trade(limits=())
    front = search(problem, evaluations=evaluations)
    assert 0 < front.provenance["evaluations"] <= evaluations
    assert len(front) >= 1


def test_search_stops_by_itself_and_says_why():
    front = search(toy.trade(), evaluations=1_000_000)
    assert front.provenance["evaluations"] < 200_000
    assert "hypervolume had grown by less than" in front.provenance["stopped_because"]


def test_search_that_runs_out_says_so():
    front = search(toy.osyczka_kundu(), evaluations=FEW)
    assert front.provenance["stopped_because"] == f"all {FEW} evaluations were used"
    assert front.provenance["evaluations"] == FEW


def test_history_rises_to_the_last_front():
    history = search(toy.osyczka_kundu(), evaluations=FEW).provenance["history"]
    volumes = [row["hypervolume"] for row in history]
    assert [row["generation"] for row in history] == list(range(1, len(history) + 1))
    assert np.all(np.diff(volumes) > -1e-3)
    assert volumes[-1] == max(volumes) > 0.1
    assert history[-1]["evaluations"] == FEW


def test_progress_is_told_each_generation():
    news: list[Progress] = []
    front = search(toy.trade(), evaluations=FEW, on_progress=news.append)
    history = front.provenance["history"]
    assert [one.generation for one in news] == [row["generation"] for row in history]
    assert {one.of for one in news} == {FEW}
    assert news[-1].front_size == history[-1]["front_size"]
    assert news[-1].hypervolume == pytest.approx(history[-1]["hypervolume"])


def test_progress_with_one_aim_tells_the_best_value():
    news: list[Progress] = []
    front = search(toy.duct(), evaluations=FEW, on_progress=news.append)
    assert news[-1].hypervolume == pytest.approx(front.table["carried_W"].iloc[0], rel=0.01)


def breaking_off(at: int, fault: type[BaseException]):
    """A listener that raises `fault` at generation `at`."""

    def listen(news: Progress) -> None:
        if news.generation == at:
            raise fault

    return listen


def test_interrupt_keeps_what_was_found():
    front = search(toy.trade(), on_progress=breaking_off(4, KeyboardInterrupt))
    assert len(front) > 50
    assert front.provenance["stopped_because"].startswith("interrupted")
    assert len(front.provenance["history"]) == 4


class KilledError(Exception):
    """Stands for whatever ends a search from outside."""


@pytest.mark.parametrize("make", [toy.osyczka_kundu, toy.duct, lambda: toy.sphere(5)])
def test_search_taken_up_after_a_kill_gives_the_same_front(make, tmp_path, monkeypatch):
    monkeypatch.setattr(course, "CHECKPOINT_EVERY", 0.0)
    path = tmp_path / "checkpoint.npz"
    with pytest.raises(KilledError):
        search(make(), 3, FEW, breaking_off(5, KilledError), path)
    problem = make()
    resumed = search(problem, 3, FEW, checkpoint=path, resume=True)
    whole = search(make(), 3, FEW)
    pd.testing.assert_frame_equal(resumed.table, whole.table, check_exact=True)
    assert resumed.provenance["history"] == whole.provenance["history"]
    assert resumed.provenance["evaluations"] == whole.provenance["evaluations"]
    assert problem.designs_seen < FEW


def test_search_taken_up_after_an_interrupt_gives_the_same_front(tmp_path):
    path = tmp_path / "checkpoint.npz"
    search(toy.trade(), 1, FEW, breaking_off(3, KeyboardInterrupt), path)
    resumed = search(toy.trade(), 1, FEW, checkpoint=path, resume=True)
    pd.testing.assert_frame_equal(resumed.table, search(toy.trade(), 1, FEW).table)


def test_search_taken_up_while_nothing_was_feasible_gives_the_same_front(tmp_path):
    def make():
        return toy.trade(limits=(Limit("strain", at_least=20.0, at_most=20.001),))

    path = tmp_path / "checkpoint.npz"
    search(make(), 1, FEW, breaking_off(1, KeyboardInterrupt), path)
    resumed = search(make(), 1, FEW, checkpoint=path, resume=True)
    pd.testing.assert_frame_equal(resumed.table, search(make(), 1, FEW).table)


def test_missing_checkpoint_means_starting_from_the_beginning(tmp_path):
    path = tmp_path / "checkpoint.npz"
    resumed = search(toy.trade(), 1, FEW, checkpoint=path, resume=True)
    pd.testing.assert_frame_equal(resumed.table, search(toy.trade(), 1, FEW).table)
    assert path.exists()


@pytest.mark.parametrize("resume", [True, False])
def test_checkpoint_of_another_case_is_refused(tmp_path, resume):
    path = tmp_path / "checkpoint.npz"
    search(toy.trade(), evaluations=FEW, checkpoint=path)
    other = toy.trade(limits=(Limit("strain", at_most=41.0),), title="other toy")
    with pytest.raises(CheckpointError, match="another case"):
        search(other, evaluations=FEW, checkpoint=path, resume=resume)


def test_checkpoint_of_another_seed_is_refused(tmp_path):
    path = tmp_path / "checkpoint.npz"
    search(toy.trade(), 1, FEW, checkpoint=path)
    with pytest.raises(CheckpointError, match="seed 1, not 2"):
        search(toy.trade(), 2, FEW, checkpoint=path, resume=True)


@pytest.mark.parametrize("resume", [True, False])
def test_file_that_is_no_checkpoint_is_neither_read_nor_replaced(tmp_path, resume):
    path = tmp_path / "letter.txt"
    path.write_text("dear all")
    with pytest.raises(CheckpointError, match="not a checkpoint"):
        search(toy.trade(), evaluations=FEW, checkpoint=path, resume=resume)
    assert path.read_text() == "dear all"


def test_checkpoint_with_pickled_objects_is_refused(tmp_path):
    path = tmp_path / "checkpoint.npz"
    np.savez(path, header=np.array([{"format": 1}], dtype=object))
    with pytest.raises(CheckpointError, match="not a checkpoint"):
        search(toy.trade(), evaluations=FEW, checkpoint=path, resume=True)


def test_resuming_without_naming_a_checkpoint_is_refused():
    with pytest.raises(RunError, match="no checkpoint named"):
        search(toy.trade(), resume=True)


def test_limit_out_of_reach_is_named_with_what_can_be_reached():
    front = search(toy.trade(limits=(Limit("output", at_least=9.0),)))
    miss = front.provenance["nearest_miss"]
    most = np.sqrt(1.2) * 15.0**0.6
    assert front.table.empty
    assert "output_W" in front.table.columns
    assert miss["limits"][0]["best"] == pytest.approx(most, rel=1e-9)
    assert miss["limits"][0]["nearest"] == pytest.approx(most, rel=1e-3)
    assert miss["limits"][0]["broken_share"] == 1.0
    assert miss["limits"][0]["out_of_reach"]
    assert "output at least 9 W (best reached 5.562 W)" in miss["sentence"]
    assert miss["design"]["settings"]["speed_m_s"] == pytest.approx(15.0, rel=1e-3)


def test_limits_that_exclude_each_other_are_told_apart_from_ones_out_of_reach():
    limits = (Limit("strain", at_most=2.0), Limit("output", at_least=2.0))
    miss = search(toy.trade(limits=limits)).provenance["nearest_miss"]
    assert not any(limit["out_of_reach"] for limit in miss["limits"])
    assert any(limit["stands_in_the_way"] for limit in miss["limits"])
    assert miss["sentence"].startswith("Each limit can be met alone, but no design meets all")


def test_search_without_a_feasible_design_stops_when_it_comes_no_nearer():
    front = search(toy.trade(limits=(Limit("output", at_least=9.0),)), evaluations=10_000_000)
    assert front.provenance["evaluations"] < 200_000
    assert "no nearer" in front.provenance["stopped_because"]


def test_ranges_without_a_possible_design_are_told_with_reasons_and_counts():
    front = search(toy.trade(wrong=lambda v: 1.0 + v["length"]), evaluations=FEW)
    miss = front.provenance["nearest_miss"]
    assert front.table.empty
    assert miss["possible_share"] == 0.0
    assert miss["impossible_because"] == [{"text": "does not fit", "designs": miss["sampled"]}]
    assert "does not fit" in miss["sentence"]


@pytest.mark.parametrize(
    ("change", "message"),
    [
        ({"evaluations": 0}, "evaluations: 0"),
        ({"size": 0}, "size: 0"),
        ({"seed": -1}, "seed: -1"),
    ],
)
def test_argument_outside_its_range_is_named_with_its_value(change, message):
    with pytest.raises(RunError, match=message):
        search(toy.trade(), **change)


@pytest.mark.parametrize("aims", [(), toy.least("output") * 6])
def test_number_of_aims_outside_one_to_five_is_refused(aims):
    with pytest.raises(RunError, match="allowed are 1 to 5"):
        search(toy.trade(aims=aims))


def test_asking_for_the_search_imports_no_numerics():
    code = "import sys, optim; print([m for m in ('numpy', 'pandas', 'pymoo') if m in sys.modules])"
    root = Path(__file__).parents[2]
    told = subprocess.run(
        [sys.executable, "-c", code], cwd=root, capture_output=True, text=True, check=True
    )
    assert told.stdout.strip() == "[]"


def test_search_stays_a_function_after_its_module_is_imported():
    import importlib

    import optim

    importlib.import_module("optim.search")
    assert callable(optim.search)


def test_front_still_a_point_is_not_taken_for_a_settled_one():
    # both aims agree and the best lies inside, so the front is one design that keeps moving
    def far(v):
        return 1.0 + sum((v[f"x{i}"] - 0.37) ** 2 for i in range(8))

    problem = toy.Toy(
        toy.plain(*(f"x{i}" for i in range(8))),
        {"f": far, "g": lambda v: 3.0 * far(v)},
        toy.least("f", "g"),
    )
    assert search(problem).table["f"].iloc[0] == pytest.approx(1.0, abs=1e-5)


def test_thinning_is_told_with_what_it_costs():
    told = search(toy.trade(), size=40).provenance["thinned"]
    assert told["to"] == 40
    assert told["from"] > 1000
    assert 0.95 < told["hypervolume_kept"] < 1.0


def test_long_history_keeps_its_end_whole_and_stays_short():
    settled = search(toy.trade(), evaluations=400_000, stop_when_settled=False)
    told = [row["generation"] for row in settled.provenance["history"]]
    assert told[-1] == 400
    assert len(told) <= 240
    assert told[-80:] == list(range(321, 401))


def test_designs_that_are_known_are_tried_first_and_never_lost():
    problem = toy.trade()
    known = np.array([[1.2, 15.0 * 0.35], [0.05, 1.0]])
    front = search(problem, seed=2, evaluations=40, start=known)
    found = front.table[["length_m", "speed_m_s"]].to_numpy()
    assert np.isclose(found, known[1]).all(axis=1).any()  # the least effort of all
    plain = search(problem, seed=2, evaluations=40)
    assert not np.isclose(plain.table["length_m"], 0.05, atol=1e-6).any()

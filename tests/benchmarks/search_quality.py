"""How near the search comes to what twenty times the evaluations find, and to plain NSGA-II.

Run by hand: `python tests/benchmarks/search_quality.py [name ...]`. Every figure is a ratio of
hypervolumes in one box (from the best to a tenth beyond the worst corner of all fronts compared).
Without names the toy problems and all ready-made cases are taken.
"""

from __future__ import annotations

import sys
import time
from pathlib import Path

import numpy as np

sys.path.insert(0, str(Path(__file__).parents[2]))

from optim import search
from optim.archive import nondominated
from optim.front import Front
from optim.search import EVALUATIONS
from optim.stopping import hypervolume
from optim.task import Task, raw_excess, sensible_scales, task_of
from optim.variation import first_sample
from problems.problem import Floats, Problem
from tests.optim import toy

TOYS = {
    "toy trade": toy.trade,
    "toy binh_korn": toy.binh_korn,
    "toy osyczka_kundu": toy.osyczka_kundu,
    "toy broken_front": toy.broken_front,
    "toy sphere 3": lambda: toy.sphere(3),
    "toy sphere 4": lambda: toy.sphere(4),
    "toy sphere 5": lambda: toy.sphere(5),
}
MORE = 20
WIDE = 3000  # designs in the front against which the loss by thinning is told
HEAD = "case                      aims evals  time s | of 20x  of 20x wide | over NSGA-II 100  300"


def cases() -> dict[str, Problem]:
    """The ready-made cases, as problems."""
    from problems import build, load_case
    from problems.case import ready_made

    return {str(one.name): build(load_case(str(one.name))) for one in ready_made()}


def aims_of(front: Front, task: Task) -> Floats:
    """The aims of a front's rows, to be minimised, shape (n, m)."""
    columns = [task.problem.outcome(name).column for name, _ in task.aims]
    return front.table[columns].to_numpy() * np.array([sign for _, sign in task.aims])


def plain_nsga2(task: Task, evaluations: int, population: int, seed: int) -> Floats:
    """Aims of the feasible part of the final population of pymoo's NSGA-II, as it comes."""
    from pymoo.algorithms.moo.nsga2 import NSGA2
    from pymoo.core.problem import Problem as Stated
    from pymoo.optimize import minimize

    class Wrapped(Stated):
        def __init__(self) -> None:
            super().__init__(n_var=task.free, n_obj=len(task.aims), n_ieq_constr=1, xl=0.0, xu=1.0)

        def _evaluate(self, x: Floats, out: dict, *_: object, **__: object) -> None:
            scores = task.score(x)
            out["F"], out["G"] = scores.aims, scores.violation[:, None]

    result = minimize(
        Wrapped(), NSGA2(pop_size=population), ("n_eval", evaluations), seed=seed, verbose=False
    )
    sound = result.pop.get("CV")[:, 0] <= 0.0
    return np.asarray(result.pop.get("F")[sound], dtype=float)


def with_scales(task: Task) -> Task:
    """The task with each bound on the scale that the search itself would give it."""
    from dataclasses import replace

    units = first_sample(1000, task.free, np.random.default_rng(1))
    given = task.problem.evaluate(task.designs(units))
    excess = raw_excess(task.bounds, given)
    return replace(task, scales=sensible_scales(excess, given.possible, task.bounds))


def line(name: str, problem: Problem, seed: int) -> str:
    """One line of the table."""
    task = with_scales(task_of(problem))
    started = time.perf_counter()
    front = search(problem, seed=seed)
    seconds = time.perf_counter() - started
    if len(task.aims) == 1 or not len(front):
        return f"{name:26}{len(task.aims)}    one aim or nothing feasible"
    used = int(front.provenance["evaluations"])
    many = MORE * EVALUATIONS
    more = search(problem, seed=seed + 1, evaluations=many, stop_when_settled=False)
    wide = search(problem, seed=seed + 1, evaluations=many, stop_when_settled=False, size=WIDE)
    fronts = [aims_of(one, task) for one in (front, more, wide)]
    fronts += [plain_nsga2(task, used, population, seed) for population in (100, 300)]
    every = np.concatenate(fronts)
    best = every[nondominated(every)]
    low, high = best.min(axis=0), best.max(axis=0)
    ours, twenty, wider, small, large = (hypervolume(one, low, high) for one in fronts)
    return (
        f"{name:26}{len(task.aims)}  {used:6d} {seconds:6.2f}  | {ours / twenty:.4f}   "
        f"{ours / wider:.4f}     | {ours / small:.4f}        {ours / large:.4f}"
    )


def main(names: list[str]) -> None:
    """Print the table for the named problems, or for all."""
    known: dict[str, Problem] = {name: make() for name, make in TOYS.items()}
    if not names or any(name not in known for name in names):
        known |= cases()
    print(HEAD)
    for name in names or list(known):
        print(line(name, known[name], seed=1), flush=True)


if __name__ == "__main__":
    main(sys.argv[1:])

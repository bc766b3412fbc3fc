"""What stands in the way when no design meets the limits, and how near the best one came.

Each limit is asked what it could reach if it stood alone; the nearest design is the one that
breaks the limits least, each on its own scale.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import Any

import numpy as np

from optim.steps import Plan, State, advance, begin
from optim.task import Bound, Task, values
from optim.variation import first_sample
from problems.problem import Evaluation, Floats, Problem

_SAMPLE = 2000
_PLAN = Plan(first=500, children=150, lines=150, near=100)
_GENERATIONS = 12  # of the search for what one limit could reach alone


@dataclass(frozen=True)
class Miss:
    """`story` for run.json, the nearest design (1, number of variables), evaluations made."""

    story: dict[str, Any]
    design: Floats
    evaluations: int


def nearest_miss(task: Task, state: State, seed: int) -> Miss:
    """Why nothing that a search ended at `state` has seen may be kept."""
    sample = first_sample(_SAMPLE if task.free else 1, task.free, np.random.default_rng(seed))
    seen = task.problem.evaluate(task.designs(sample))
    alone = [_alone(task, bound, seed) for bound in task.bounds]
    trial = np.concatenate([state.ranked_units, *[end.ranked_units for end in alone]])
    nearest = task.designs(trial[[np.argmin(task.score(trial).violation)]])
    given = task.problem.evaluate(nearest)
    limits = [_told(task, place, end, seen, given) for place, end in enumerate(alone)]
    effort = len(sample) + len(trial) + sum(end.evaluations for end in alone)
    possible = float(seen.possible.mean())
    reasons = _reasons(seen)
    story = {
        "sentence": _sentence(task, limits, given, reasons),
        "limits": limits,
        "design": _design(task.problem, nearest, given),
        "sampled": len(sample),
        "possible_share": possible,
        "impossible_because": reasons,
    }
    return Miss(story, nearest, effort)


def _alone(task: Task, bound: Bound, seed: int) -> State:
    """A search for the most or least of one limited outcome, all limits left out."""
    free = replace(task, aims=((bound.outcome, bound.sign),), bounds=(), scales=np.empty(0))
    free, state = begin(free, _PLAN.within(4 * _PLAN.first, task.free), seed)
    for _ in range(_GENERATIONS if task.free else 0):
        state = advance(free, _PLAN, state, state.evaluations + _PLAN.first)
    return state


def _told(
    task: Task, place: int, end: State, seen: Evaluation, nearest: Evaluation
) -> dict[str, Any]:
    bound = task.bounds[place]
    reached = np.append(end.kept_aims[:, 0], np.inf).min() * bound.sign
    value = float(values(nearest, bound.outcome)[0])
    found = values(seen, bound.outcome)[seen.possible]
    broken = bound.sign * (found - bound.bound) > 0.0
    return {
        "outcome": bound.outcome,
        "unit": task.problem.outcome(bound.outcome).unit,
        "side": bound.side,
        "bound": bound.bound,
        "best": float(reached) if np.isfinite(reached) else None,
        "nearest": value if nearest.possible[0] else None,
        "broken_share": float(broken.mean()) if len(broken) else None,
        "out_of_reach": bool(bound.sign * (reached - bound.bound) > 0.0),
        "stands_in_the_way": bool(bound.sign * (value - bound.bound) > 0.0),
    }


def _reasons(seen: Evaluation) -> list[dict[str, Any]]:
    texts, counts = np.unique(seen.reasons[~seen.possible], return_counts=True)
    order = np.argsort(-counts, kind="stable")
    return [{"text": str(texts[row]), "designs": int(counts[row])} for row in order]


def _design(problem: Problem, design: Floats, given: Evaluation) -> dict[str, Any]:
    shown = {s.column: float(given.settings[s.name][0]) for s in problem.settings}
    for variable, value in zip(problem.variables, design[0], strict=True):
        shown.setdefault(variable.column, float(value))
    figures = {o.column: float(given.outcomes[o.name][0]) for o in problem.outcomes}
    return {
        "settings": shown,
        "outcomes": {name: value for name, value in figures.items() if np.isfinite(value)},
        "possible": bool(given.possible[0]),
        "reason": str(given.reasons[0]),
    }


def _sentence(
    task: Task, limits: list[dict[str, Any]], given: Evaluation, reasons: list[dict[str, Any]]
) -> str:
    if not given.possible[0]:
        why = f": {given.reasons[0]}" if given.reasons[0] else ""
        return f"No possible design was found in the given ranges; the nearest fails{why}."
    beyond = [limit for limit in limits if limit["out_of_reach"]]
    if beyond:
        parts = [f"{_bounded(limit)} (best reached {_quantity(limit, 'best')})" for limit in beyond]
        return f"No design meets the limits: out of reach by itself is {'; '.join(parts)}."
    parts = [
        f"{_bounded(limit)} (nearest design {_quantity(limit, 'nearest')})"
        for limit in limits
        if limit["stands_in_the_way"]
    ]
    return f"Each limit can be met alone, but no design meets all: broken is {'; '.join(parts)}."


def _bounded(limit: dict[str, Any]) -> str:
    return f"{limit['outcome']} {limit['side'].replace('_', ' ')} {_quantity(limit, 'bound')}"


def _quantity(limit: dict[str, Any], which: str) -> str:
    unit = "" if limit["unit"] == "1" else f" {limit['unit']}"
    return f"{limit[which]:.4g}{unit}"

"""One generation of the search after another, as a pure function from state to state.

A `State` is all there is to know at the end of a generation, random numbers included, so a
checkpoint is a state written down. When to stop is for `optim.stopping`.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field, replace
from typing import Any

import numpy as np
from numpy.random import Generator

from optim.archive import Indices, nondominated, thin_coarsely, thin_evenly, within_tolerance
from optim.task import Scores, Task, raw_excess, sensible_scales
from optim.variation import (
    about,
    between_neighbours,
    differences,
    first_sample,
    offspring,
    survivors,
)
from problems.problem import Floats

TOLERANCE = 0.01  # with one aim: how far from the best a neighbour may be, of the best value
MEASURED_IN_PART = 4  # aims from which only `_SNAPSHOT` designs of a front are remembered
_SNAPSHOT = 300
_TRAIL, _TRAIL_LATEST = 240, 80  # generations remembered, and of them the latest without gaps


@dataclass(frozen=True)
class Plan:
    """How many designs of which sort a generation tries, and how many are kept."""

    first: int = 1000
    population: int = 400
    children: int = 700
    lines: int = 200
    near: int = 100
    keep: int = 6000

    def within(self, evaluations: int, free: int) -> Plan:
        """The plan cut down to a small number of evaluations or to nothing that can move."""
        return replace(self, first=max(1, min(self.first, evaluations // 4)) if free else 1)


@dataclass(frozen=True)
class Mark:
    """What is remembered of a generation.

    `size` is the number of designs in the archive, `front` (n, m) their aims or, with four aims
    and more, those of an even part; with one aim only the best. `violation` is the least so far.
    """

    generation: int
    evaluations: int
    size: int
    violation: float
    front: Floats = field(repr=False)


@dataclass(frozen=True)
class State:
    """A search at the end of a generation.

    `ranked_*` is the population, best first; `kept_*` the archive of designs that break nothing;
    `trail` the generations remembered: the latest all, of older ones fewer as they grow many.
    """

    generation: int
    evaluations: int
    ranked_units: Floats
    ranked_aims: Floats
    ranked_violation: Floats
    kept_units: Floats
    kept_aims: Floats
    scales: Floats
    trail: tuple[Mark, ...]
    rng: Mapping[str, Any] = field(repr=False)


def begin(task: Task, plan: Plan, seed: int, known: Floats | None = None) -> tuple[Task, State]:
    """The first generation: a sample of the whole box, from which bounds get their scales.

    Positions `known` (n, free) take the place of as many of it, of half of it at most.
    """
    rng = np.random.default_rng(seed)
    units = first_sample(plan.first, task.free, rng)
    if known is not None and task.free:
        units[: plan.first // 2][: len(known)] = known[: plan.first // 2]
    given = task.problem.evaluate(task.designs(units))
    excess = raw_excess(task.bounds, given)
    task = replace(task, scales=sensible_scales(excess, given.possible, task.bounds))
    none = np.empty((0, task.free)), np.empty((0, len(task.aims)))
    empty = State(0, 0, *none, np.empty(0), *none, task.scales, (), {})
    return task, _taken_in(empty, plan, units, task.judge(given), rng)


def advance(task: Task, plan: Plan, state: State, evaluations: int) -> State:
    """The state one generation on, trying no more designs than `evaluations` allow in all."""
    rng = np.random.default_rng()
    rng.bit_generator.state = state.rng
    units = _proposed(plan, state, rng)[: evaluations - state.evaluations]
    return _taken_in(state, plan, units, task.score(units), rng)


def _proposed(plan: Plan, state: State, rng: Generator) -> Floats:
    ranked, kept = state.ranked_units, state.kept_units
    parts = [offspring(ranked, plan.children, rng)]
    one_aim = state.ranked_aims.shape[1] == 1
    if one_aim or len(kept) < 3:
        parts.append(differences(ranked, plan.lines, rng))
    else:
        parts.append(between_neighbours(kept, state.kept_aims, plan.lines, rng))
    parts.append(about(kept if len(kept) else ranked, plan.near, rng))
    return rng.permutation(np.concatenate(parts))


def _taken_in(state: State, plan: Plan, units: Floats, scores: Scores, rng: Generator) -> State:
    kept_units, kept_aims = _kept(state, plan, units, scores)
    every = np.concatenate([state.ranked_units, units])
    aims = np.concatenate([state.ranked_aims, scores.aims])
    violation = np.concatenate([state.ranked_violation, scores.violation])
    single = _first_of_each(every)
    best = single[survivors(aims[single], violation[single], plan.population)]
    mark = Mark(
        state.generation + 1,
        state.evaluations + len(units),
        len(kept_aims),
        float(violation[best].min()),
        _snapshot(kept_aims),
    )
    return State(
        mark.generation,
        mark.evaluations,
        every[best],
        aims[best],
        violation[best],
        kept_units,
        kept_aims,
        state.scales,
        _remembered((*state.trail, mark)),
        rng.bit_generator.state,
    )


def _kept(state: State, plan: Plan, units: Floats, scores: Scores) -> tuple[Floats, Floats]:
    sound = scores.violation <= 0.0
    units = np.concatenate([state.kept_units, units[sound]])
    aims = np.concatenate([state.kept_aims, scores.aims[sound]])
    if not len(aims):
        return units, aims
    rows = np.flatnonzero(nondominated(aims) if aims.shape[1] > 1 else _near_best(units, aims))
    if len(rows) > plan.keep:
        spread = aims[rows] if aims.shape[1] > 1 else units[rows]
        rows = rows[_thinned(spread, aims[rows], plan.keep)]
    return units[rows], aims[rows]


def _near_best(units: Floats, aims: Floats) -> np.ndarray[Any, np.dtype[np.bool_]]:
    near = within_tolerance(aims, TOLERANCE)
    single = np.zeros(len(aims), dtype=bool)
    single[_first_of_each(units)] = True
    return near & single


def _thinned(spread: Floats, aims: Floats, keep: int) -> Indices:
    rows = thin_coarsely(spread, keep // 2)
    return np.union1d(rows, [np.argmin(aims[:, 0])]).astype(np.intp)


def _remembered(trail: tuple[Mark, ...]) -> tuple[Mark, ...]:
    if len(trail) <= _TRAIL:
        return trail
    old, new = trail[:-_TRAIL_LATEST], trail[-_TRAIL_LATEST:]
    return (*old[::2], *new)


def _snapshot(aims: Floats) -> Floats:
    if not len(aims):
        return aims
    if aims.shape[1] == 1:
        return np.asarray(aims.min(axis=0, keepdims=True))
    in_part = aims.shape[1] >= MEASURED_IN_PART
    return aims[thin_evenly(aims, _SNAPSHOT)] if in_part else aims


def _first_of_each(units: Floats) -> Indices:
    weights = np.sqrt(np.arange(2.0, 2.0 + units.shape[1]))
    return np.sort(np.unique(units @ weights, return_index=True)[1]).astype(np.intp)

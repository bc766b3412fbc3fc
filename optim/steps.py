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
_SNAPSHOT = 300  # rows of the front remembered with four aims and more


@dataclass(frozen=True)
class Plan:
    """How many designs of which sort a generation tries, and how many are kept."""

    first: int = 1000
    population: int = 200
    children: int = 200
    lines: int = 600
    near: int = 200
    keep: int = 4000

    def within(self, evaluations: int) -> Plan:
        """The plan cut down to a small number of evaluations."""
        first = max(1, min(self.first, evaluations // 4))
        return replace(self, first=first)


@dataclass(frozen=True)
class State:
    """A search at the end of a generation.

    `ranked_*` is the population, best first; `kept_*` the archive of designs that break nothing;
    `trail` the aims of the archive as they stood after each generation.
    """

    generation: int
    evaluations: int
    ranked_units: Floats
    ranked_aims: Floats
    ranked_violation: Floats
    kept_units: Floats
    kept_aims: Floats
    scales: Floats
    trail: tuple[Floats, ...]
    counts: tuple[int, ...]  # evaluations after each generation
    sizes: tuple[int, ...]  # designs in the archive after each generation
    rng: Mapping[str, Any] = field(repr=False)


def begin(task: Task, plan: Plan, seed: int) -> tuple[Task, State]:
    """The first generation: a sample of the whole box, from which bounds get their scales."""
    rng = np.random.default_rng(seed)
    units = first_sample(plan.first, task.free, rng)
    given = task.problem.evaluate(task.designs(units))
    excess = raw_excess(task.bounds, given)
    task = replace(task, scales=sensible_scales(excess, given.possible, task.bounds))
    none = np.empty((0, task.free)), np.empty((0, len(task.aims)))
    empty = State(0, 0, *none, np.empty(0), *none, task.scales, (), (), (), {})
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
    evaluations = state.evaluations + len(units)
    kept_units, kept_aims = _kept(state, plan, units, scores)
    every = np.concatenate([state.ranked_units, units])
    aims = np.concatenate([state.ranked_aims, scores.aims])
    violation = np.concatenate([state.ranked_violation, scores.violation])
    single = _first_of_each(every)
    best = single[survivors(aims[single], violation[single], plan.population)]
    return State(
        state.generation + 1,
        evaluations,
        every[best],
        aims[best],
        violation[best],
        kept_units,
        kept_aims,
        state.scales,
        (*state.trail, _snapshot(kept_aims)),
        (*state.counts, evaluations),
        (*state.sizes, len(kept_aims)),
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


def _snapshot(aims: Floats) -> Floats:
    if not len(aims):
        return aims
    if aims.shape[1] == 1:
        return np.asarray(aims.min(axis=0, keepdims=True))
    return aims if aims.shape[1] < 4 else aims[thin_evenly(aims, _SNAPSHOT)]


def _first_of_each(units: Floats) -> Indices:
    weights = np.sqrt(np.arange(2.0, 2.0 + units.shape[1]))
    return np.sort(np.unique(units @ weights, return_index=True)[1]).astype(np.intp)

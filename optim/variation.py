"""New designs from old ones, and which of many survive; positions in the unit box throughout.

The genetic operators, the sorting into ranks and the crowding distance are pymoo's, called on
whole arrays; the loop around them (`optim.steps`) holds nothing but arrays, so that it can be
stopped and taken up again exactly.
"""

from __future__ import annotations

from functools import cache

import numpy as np
from numpy.random import Generator

from optim.archive import Indices, normalised
from problems.problem import Floats

_CROSSOVER_ETA = 15.0
_MUTATION_ETA = 20.0
_CROSSOVER_SHARE = 0.9
_NEIGHBOURS = 12
_MOST_AIMS_RANKED = 3
_PARTITIONS = {4: 9, 5: 6}  # of each aim: 220 and 210 reference directions
_OFF_DIRECTION = 5.0
_ALL_CORNERS_TO = 6  # free variables; beyond that the corners outnumber the sample


def first_sample(count: int, free: int, rng: Generator) -> Floats:
    """`count` positions (count, free): the corners of the box if few, then a Latin hypercube."""
    if not free:
        return np.empty((count, 0))
    strata = np.tile(np.arange(count, dtype=float)[:, None], (1, free))
    sample = (rng.permuted(strata, axis=0) + rng.random((count, free))) / count
    corners = 2**free if free <= _ALL_CORNERS_TO else 0
    if 0 < corners <= count // 4:
        sample[:corners] = np.indices((2,) * free).reshape(free, -1).T
    return sample


def survivors(aims: Floats, violation: Floats, size: int) -> Indices:
    """The `size` best rows in order of merit, best first.

    Designs that break nothing come first, the others by violation (Deb et al. 2002, IEEE Trans.
    Evol. Comput. 6, 182-197, from memory). Up to three aims merit is the non-domination rank and
    then the crowding distance of the same source; with more, where nearly everything is
    non-dominated, it is the place in the niche of a reference direction.
    """
    sound = np.flatnonzero(violation <= 0.0)
    broken = np.flatnonzero(violation > 0.0)
    order = [sound[_merit(aims[sound], size)]] if len(sound) else []
    order.append(broken[np.argsort(violation[broken], kind="stable")])
    return np.asarray(np.concatenate(order)[:size], dtype=np.intp)


def _merit(aims: Floats, size: int) -> Indices:
    if aims.shape[1] == 1:
        return np.argsort(aims[:, 0], kind="stable")
    return _ranks(aims, size) if aims.shape[1] <= _MOST_AIMS_RANKED else _niches(aims)


def _niches(aims: Floats) -> Indices:
    """Rows in order of merit: the best of each niche, then the second of each, and so on.

    A niche is a reference direction with the rows that lie nearest to it; in it the distance
    along the direction counts, and five times the distance from it (Yuan et al. 2016, IEEE Trans.
    Evol. Comput. 20, 16-37, from memory).
    """
    ways = _directions(aims.shape[1])
    places = _between_corners(aims)
    along = places @ ways.T
    off = np.sqrt(np.maximum((places**2).sum(axis=1)[:, None] - along**2, 0.0))
    niche = off.argmin(axis=1)
    rows = np.arange(len(aims))
    cost = along[rows, niche] + _OFF_DIRECTION * off[rows, niche]
    order = np.lexsort((cost, niche))
    starts = np.searchsorted(niche[order], niche[order])
    turn = np.arange(len(order)) - starts
    return np.asarray(order[np.lexsort((cost[order], turn))], dtype=np.intp)


def _between_corners(aims: Floats) -> Floats:
    """`aims` stretched from 0, the best of each, to 1, the worst among the ends of the front."""
    places = normalised(aims)
    weights = np.where(np.eye(aims.shape[1], dtype=bool), 1.0, 1e6)
    ends = (places[:, None, :] * weights).max(axis=2).argmin(axis=0)
    worst = places[ends].max(axis=0)
    return np.asarray(places / np.where(worst > 1e-6, worst, 1.0))


@cache
def _directions(aims: int) -> Floats:
    """Unit vectors spread evenly over the positive part of the sphere (Das and Dennis 1998)."""
    from pymoo.util.ref_dirs import get_reference_directions

    ways = get_reference_directions("das-dennis", aims, n_partitions=_PARTITIONS[aims])
    return np.asarray(ways / np.linalg.norm(ways, axis=1, keepdims=True), dtype=float)


def _ranks(aims: Floats, size: int) -> Indices:
    from pymoo.operators.survival.rank_and_crowding.metrics import calc_crowding_distance
    from pymoo.util.nds.non_dominated_sorting import NonDominatedSorting

    fronts = NonDominatedSorting().do(aims, n_stop_if_ranked=size)
    ordered = []
    for front in fronts:
        crowding = calc_crowding_distance(aims[front]) if len(front) > 2 else np.zeros(len(front))
        ordered.append(front[np.argsort(-crowding, kind="stable")])
    return np.asarray(np.concatenate(ordered), dtype=np.intp)


def offspring(ranked: Floats, count: int, rng: Generator) -> Floats:
    """`count` children of `ranked` (n, free), best first: tournament, crossover, mutation."""
    from pymoo.operators.crossover.sbx import cross_sbx
    from pymoo.operators.mutation.pm import mut_pm

    pairs = (count + 1) // 2
    free = ranked.shape[1]
    low, high = np.zeros(free), np.ones(free)
    parents = ranked[rng.integers(len(ranked), size=(2, 2, pairs)).min(axis=0)]
    crossed = cross_sbx(
        parents,
        low,
        high,
        np.full((pairs, 1), _CROSSOVER_ETA),
        0.5,
        np.full((pairs, 1), 0.5),
        random_state=rng,
    )
    mixed = rng.random(pairs) < _CROSSOVER_SHARE
    children = np.where(mixed[None, :, None], crossed, parents).reshape(-1, free)[:count]
    eta = np.full(count, _MUTATION_ETA)
    share = np.full(count, min(0.5, 1.0 / free))
    mutated = mut_pm(children, low, high, eta, share, at_least_once=False, random_state=rng)
    return np.asarray(mutated, dtype=float)


def between_neighbours(units: Floats, aims: Floats, count: int, rng: Generator) -> Floats:
    """`count` positions on and about the lines between neighbours on a front.

    A kept design is moved by a random multiple of the difference between two of its nearest
    neighbours in the space of aims (differential variation: Storn and Price 1997, J. Global
    Optimization 11, 341-359, from memory), which follows the front; what would leave the box
    stops at its side.
    """
    from scipy.spatial import cKDTree

    places = normalised(aims)
    nearest = min(_NEIGHBOURS, len(units) - 1)
    base = rng.integers(len(units), size=count)
    near = np.asarray(cKDTree(places).query(places[base], k=nearest + 1)[1], dtype=np.intp)
    rows = np.arange(count)
    one = near[rows, rng.integers(nearest + 1, size=count)]
    other = near[rows, rng.integers(nearest + 1, size=count)]
    step = rng.normal(0.0, 0.7, size=(count, 1)) * (units[one] - units[other])
    jitter = rng.normal(0.0, 0.1, size=(count, 1)) * (units[base] - units[one])
    return np.asarray(np.clip(units[base] + step + jitter, 0.0, 1.0))


def about(units: Floats, count: int, rng: Generator) -> Floats:
    """`count` positions near kept ones: one variable or all moved, by steps of all sizes."""
    rows, free = count, units.shape[1]
    base = units[rng.integers(len(units), size=rows)]
    size = 10.0 ** rng.uniform(-4.0, -0.5, size=(rows, 1))
    moved = rng.random((rows, free)) < 1.0 / free
    moved[np.arange(rows), rng.integers(free, size=rows)] = True
    return np.asarray(np.clip(base + size * rng.normal(size=(rows, free)) * moved, 0.0, 1.0))


def differences(ranked: Floats, count: int, rng: Generator) -> Floats:
    """`count` positions by differential variation in a population `ranked`, best first.

    Good designs are moved by differences between others: steps that shrink and turn as the
    population does, also along a narrow valley (the same source as `between_neighbours`).
    """
    base = ranked[rng.integers(len(ranked), size=(2, count)).min(axis=0)]
    one, other = ranked[rng.integers(len(ranked), size=(2, count))]
    best = ranked[rng.integers(max(1, len(ranked) // 20), size=count)]
    pull = rng.random((count, 1)) * (rng.random((count, 1)) < 0.5)
    step = rng.normal(0.0, 0.7, size=(count, 1)) * (one - other)
    return np.asarray(np.clip(base + pull * (best - base) + step, 0.0, 1.0))

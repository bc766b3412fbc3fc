"""Which uncertain input matters: variance-based first-order and total indices.

Saltelli's design on a scrambled Sobol sample, estimated by scipy. The draws are made here because
many designs share them.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np

from optim.draws import drawn, pair
from problems.problem import Floats, Problem

_STILL = 1e-9  # of its size: an outcome that spreads less does not move


@dataclass(frozen=True)
class Influence:
    """Sobol' indices of some outcomes of some designs, shape (designs, outcomes, inputs).

    `first` is the share of the variance that an input explains alone, `total` the share that is
    gone were it known; `spread` (designs, outcomes) the standard deviation [SI]. An outcome that
    does not move has indices 0.
    """

    inputs: tuple[str, ...]
    outcomes: tuple[str, ...]
    first: Floats
    total: Floats
    spread: Floats

    def share(self, outcome: str) -> dict[str, float]:
        """Total index of each input on one outcome, mean over the designs, greatest first."""
        place = self.outcomes.index(outcome)
        mean = self.total[:, place].mean(axis=0)
        order = np.argsort(-mean, kind="stable")
        return {self.inputs[column]: float(mean[column]) for column in order}


def influences(
    problem: Problem,
    designs: Floats,
    outcomes: Sequence[str],
    count: int,
    seed: int,
    told: Callable[[float], object] = lambda share: None,
) -> Influence:
    """Indices of `outcomes` of designs (n, number of variables) from `count` (a power of 2) pairs.

    Sobol' 1993, Saltelli et al. 2010 (first-order) and Jansen 1999 (total), as in
    `scipy.stats.sobol_indices`, which names them; count (inputs + 2) evaluations for each design.
    """
    inputs = problem.uncertain
    first, second = pair(inputs, count, seed)
    mixed = [
        np.where(np.arange(len(inputs)) == place, second, first) for place in range(len(inputs))
    ]
    draws = drawn(inputs, np.concatenate([first, second, *mixed]))
    found = []
    for place, design in enumerate(designs):
        given = problem.sampled(design[None], draws, outcomes)
        found.append([_indices(given.outcomes[name][0], count) for name in outcomes])
        told((place + 1) / len(designs))
    parts = [np.array([[one[k] for one in row] for row in found]) for k in range(3)]
    return Influence(tuple(known.name for known in inputs), tuple(outcomes), *parts)


def _indices(values: Floats, count: int) -> tuple[Floats, Floats, float]:
    """First-order and total indices (inputs,) and the standard deviation of one outcome."""
    from scipy.stats import sobol_indices

    parts = values.reshape(-1, count)
    both = parts[:2]
    spread = float(both.std())
    if spread <= _STILL * float(np.abs(both).max()):
        return np.zeros(len(parts) - 2), np.zeros(len(parts) - 2), spread
    twice = np.stack([parts, parts], axis=1)  # of one outcome alone scipy makes a scalar and fails
    func: Any = {"f_A": twice[0], "f_B": twice[1], "f_AB": twice[2:]}
    found = sobol_indices(func=func, n=count)
    first, total = (
        np.asarray(indices).reshape(2, -1)[0] for indices in (found.first_order, found.total_order)
    )
    return first, total, spread

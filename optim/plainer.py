"""Designs rid of the parts that do nothing for them, before a front is shown.

Which parts may be left out is for the problem to say; whether they earn their place is judged here.
"""

from __future__ import annotations

import numpy as np

from optim.archive import nondominated
from optim.task import Task, units_of
from problems.problem import Floats

_EARNS = 1e-3  # of the span of an aim along the front: what a part must bring to stay


def plainer(task: Task, units: Floats, aims: Floats) -> tuple[Floats, Floats, int]:
    """The archive with every design tried without the parts that may be left out.

    `units` (n, free), `aims` (n, m). A part that earns less than a thousandth of the span of
    every aim is left out. Returns positions, aims and the number of evaluations.
    """
    chosen = task.designs(units)
    bare = task.problem.plainer(chosen)
    changed = np.any(bare != chosen, axis=1)
    if not changed.any():
        return units, aims, 0
    trial = units_of(task.problem, bare[changed])
    scores = task.score(trial)
    sound = scores.violation <= 0.0
    slack = _EARNS * (aims.max(axis=0) - aims.min(axis=0))
    idle = np.zeros(len(units), dtype=bool)
    idle[changed] = sound & np.all(scores.aims <= aims[changed] + slack, axis=1)
    units = np.concatenate([trial[sound], units[~idle]])
    aims = np.concatenate([scores.aims[sound], aims[~idle]])
    if aims.shape[1] > 1:
        kept = nondominated(aims)
        units, aims = units[kept], aims[kept]
    return units, aims, len(trial)

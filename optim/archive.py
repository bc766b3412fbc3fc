"""Which of many designs are worth keeping: non-dominated ones, evenly spread, or near the best.

Works on arrays of figures to be minimised; knows nothing of how designs are made.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from problems.problem import Bools, Floats

Indices = NDArray[np.intp]


def nondominated(aims: Floats) -> Bools:
    """Which rows of `aims` (n, m) no other row beats; of equal rows the first."""
    if aims.shape[1] == 1:
        best = np.zeros(len(aims), dtype=bool)
        best[np.argmin(aims[:, 0])] = True
        return best
    import moocore

    return np.asarray(moocore.is_nondominated(aims, keep_weakly=False), dtype=bool)


def within_tolerance(aims: Floats, tolerance: float) -> Bools:
    """Which rows of one aim (n, 1) lie within `tolerance` times the best value of the best."""
    best = aims[:, 0].min()
    return np.asarray(aims[:, 0] <= best + tolerance * abs(best))


def normalised(aims: Floats) -> Floats:
    """`aims` (n, m) stretched so that each column runs from 0 to 1 (0 where it does not run)."""
    low = aims.min(axis=0)
    span = aims.max(axis=0) - low
    return np.asarray((aims - low) / np.where(span > 0.0, span, 1.0))


def extremes(aims: Floats) -> Indices:
    """The row that is best in each column, ties settled by the sum of the others."""
    total = normalised(aims).sum(axis=1)
    best = [np.lexsort((total, column))[0] for column in aims.T]
    return np.unique(np.array(best, dtype=np.intp))


def thin_evenly(aims: Floats, size: int, first: Indices | None = None) -> Indices:
    """At most `size` rows of `aims` (n, m) spread as evenly as they come, best of each kept.

    Each row taken is the one farthest from those already taken (Gonzalez 1985, Theoretical
    Computer Science 38, 293-306, from memory), after each column is stretched from 0 to 1.
    `first` names the rows taken before all others; by default the best of each column.
    """
    if len(aims) <= size:
        return np.arange(len(aims))
    columns = np.ascontiguousarray(normalised(aims).T)
    start = list(extremes(aims) if first is None else first)[:size]
    taken: list[int] = []
    gap = np.full(len(aims), np.inf)
    while len(taken) < size and gap.max() > 0.0:
        row = int(start.pop(0) if start else np.argmax(gap))
        taken.append(row)
        apart = columns - columns[:, row, None]
        np.minimum(gap, np.einsum("ij,ij->j", apart, apart), out=gap)
    return np.sort(np.array(taken, dtype=np.intp))


def thin_coarsely(aims: Floats, size: int) -> Indices:
    """At most about `size` rows of `aims` (n, m): one in each cell of a grid, best of each kept.

    Much quicker than `thin_evenly` and good enough while a search is under way.
    """
    if len(aims) <= size:
        return np.arange(len(aims))
    places = normalised(aims)
    order = np.argsort(places.sum(axis=1), kind="stable")
    places = places[order]
    fine, coarse = float(size), 1.0
    for _ in range(12):
        middle = np.sqrt(fine * coarse)
        if len(_one_per_cell(places, middle)) > size:
            fine = middle
        else:
            coarse = middle
    chosen = order[_one_per_cell(places, coarse)]
    return np.union1d(chosen, extremes(aims))


def _one_per_cell(places: Floats, cells: float) -> Indices:
    cell = np.minimum(np.floor(places * cells), cells).astype(np.int64)
    base = int(cells) + 2
    if float(base) ** places.shape[1] < 2.0**62:
        keys = cell @ (base ** np.arange(places.shape[1], dtype=np.int64))
        return np.asarray(np.unique(keys, return_index=True)[1], dtype=np.intp)
    return np.asarray(np.unique(cell, axis=0, return_index=True)[1], dtype=np.intp)

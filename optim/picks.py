"""Which designs of a front are shown by name: its ends, its middle, a few spread along it.

Tables and pictures of a run use the same ones. Choosing one to build is left to the engineer.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from optim.archive import Indices, nondominated, thin_evenly
from optim.front import Front
from optim.text import words
from problems.problem import Aim, Floats, Problem

_USUAL = ("heat", "fan_power")  # the two that an engineer looks at first, where both are aims


@dataclass(frozen=True)
class Pick:
    """Design in row `row` of a front's table, its letter in tables and pictures, why it is one."""

    letter: str
    row: int
    label: str


def leading(problem: Problem) -> tuple[Aim, ...]:
    """The aims, those first that the two axes of the front's picture show."""
    usual = [aim for name in _USUAL for aim in problem.aims if aim.outcome == name]
    if len(usual) < len(_USUAL):
        return problem.aims
    return (*usual, *(aim for aim in problem.aims if aim not in usual))


def column(front: Front, problem: Problem, name: str) -> Floats:
    """The outcome or setting called `name` of every design of a front, shape (n,), SI."""
    return front.table[problem.outcome(name).column].to_numpy(dtype=float)


def designs(front: Front, problem: Problem) -> Floats:
    """The designs of a front as `problem` takes them, shape (n, number of variables)."""
    names = [variable.column for variable in problem.variables]
    return front.table[names].to_numpy(dtype=float).reshape(len(front), len(names))


def picked(front: Front, problem: Problem) -> tuple[Pick, ...]:
    """The design with most (or least) of each leading aim and one between, at most three.

    Fewer where they coincide; one for a single aim; none for an empty front. The middle is the
    middle one, by rank, of the designs that nothing beats in the two leading aims alone.
    """
    if not len(front):
        return ()
    first, *others = leading(problem)
    aims = _to_be_least(front, problem)
    named = {_best(aims, 0): words(f"{first.sense} {first.outcome}")}
    if others:
        second = others[0]
        low, high = _best(aims, 1), _best(aims, 0)
        middle = _middle(aims[:, :2], {low, high})
        named = {
            low: words(f"{second.sense} {second.outcome}"),
            **({} if middle is None else {middle: "middle"}),
            **({} if high == low else named),
        }
    chosen = zip("ABC", named.items(), strict=False)
    return tuple(Pick(letter, row, label) for letter, (row, label) in chosen)


def spread(front: Front, problem: Problem, count: int = 7) -> Indices:
    """At most `count` rows of a front's table, the picked ones among them.

    In the order of the second leading aim (of the only one, where there is one), best first.
    """
    if not len(front):
        return np.empty(0, dtype=np.intp)
    first = np.array([pick.row for pick in picked(front, problem)], dtype=np.intp)
    aims = _to_be_least(front, problem)[:, :2]
    rows = thin_evenly(_ranks(aims), count, first)
    return rows[np.argsort(aims[rows, -1], kind="stable")]


def _to_be_least(front: Front, problem: Problem) -> Floats:
    signs = [1.0 if aim.sense == "least" else -1.0 for aim in leading(problem)]
    columns = [column(front, problem, aim.outcome) for aim in leading(problem)]
    return np.asarray(np.column_stack(columns) * np.array(signs), dtype=np.float64)


def _best(aims: Floats, place: int) -> int:
    """The row with the least of column `place`, ties settled by the other columns' ranks."""
    return int(np.lexsort((_ranks(aims).sum(axis=1), aims[:, place]))[0])


def _ranks(aims: Floats) -> Floats:
    order = np.argsort(aims, axis=0, kind="stable")
    ranks = np.empty_like(aims)
    np.put_along_axis(ranks, order, np.arange(len(aims), dtype=float)[:, None], axis=0)
    return np.asarray(ranks / max(len(aims) - 1, 1), dtype=np.float64)


def _middle(aims: Floats, ends: set[int]) -> int | None:
    unbeaten = np.flatnonzero(nondominated(aims))
    ordered = [int(row) for row in unbeaten[np.argsort(aims[unbeaten, 0])] if row not in ends]
    if ordered:
        return ordered[len(ordered) // 2]
    between = np.abs(_ranks(aims) - 0.5).sum(axis=1)
    between[list(ends)] = np.inf
    row = int(np.argmin(between))
    return None if row in ends else row

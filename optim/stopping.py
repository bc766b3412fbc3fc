"""When a search has found what there is to find, told by the hypervolume of its front.

Hypervolume: the share of the box between the best and the worst corner of a front that the front
beats (Zitzler and Thiele 1999, IEEE Trans. Evol. Comput. 3, 257-271, from memory).
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from optim.steps import MEASURED_IN_PART, Mark, State
from optim.task import IMPOSSIBLE
from problems.problem import Floats

_BEYOND = 0.1  # the reference lies this share of the front's extent beyond its worst corner


@dataclass(frozen=True)
class Patience:
    """Settled: growth below `growth` over the last `generations`.

    With four aims and more, where only part of the front is measured, `part_growth` between the
    means of the last `generations` and of as many before, looked at every `part_every`.
    """

    generations: int = 20
    growth: float = 1e-4
    part_growth: float = 5e-4
    part_every: int = 5
    one_aim_growth: float = 1e-7
    miss_generations: int = 30
    nearer: float = 1e-3


def hypervolume(aims: Floats, low: Floats, high: Floats) -> float:
    """Share, 0 to 1, of the box around a front that the rows of `aims` (n, m) beat.

    The box runs from `low` to a tenth beyond `high` (m,); aims that do not run are left out.
    """
    runs = high > low
    if not len(aims) or not runs.any():
        return float(len(aims) > 0)
    places = (aims[:, runs] - low[runs]) / (high[runs] - low[runs])
    reference = np.full(places.shape[1], 1.0 + _BEYOND)
    if places.shape[1] == 1:
        return float(np.clip(reference[0] - places.min(), 0.0, None) / reference[0])
    import moocore

    volume = moocore.hypervolume(np.ascontiguousarray(places), ref=reference)
    return float(volume / reference.prod())


def measured(trail: tuple[Mark, ...]) -> list[float]:
    """Hypervolume of each remembered front in the box of the last one."""
    fronts = [mark.front for mark in trail]
    last = fronts[-1]
    if not len(last):
        return [0.0] * len(trail)
    low, high = _box(last, next(front for front in fronts if len(front)))
    return [hypervolume(front, low, high) for front in fronts]


def _box(now: Floats, then: Floats) -> tuple[Floats, Floats]:
    """Corners of the front `now`; where it is but a point, as far as the earlier one `then`."""
    low, high = now.min(axis=0), now.max(axis=0)
    return low, np.where(high > low, high, np.maximum(high, then.max(axis=0)))


def settled(state: State, patience: Patience) -> str | None:
    """Why the search may stop, in plain words; None while it still gains."""
    span = patience.generations
    if not state.trail[-1].size:
        return _stalled(state, patience)
    if len(state.trail) <= span or not state.trail[-1 - span].size:
        return None
    now, then = state.trail[-1].front, state.trail[-1 - span].front
    if now.shape[1] == 1:
        gain, least = float((then - now)[0, 0]), patience.one_aim_growth
        if gain > least * abs(float(now[0, 0])):
            return None
        return f"the best value had not moved by more than {least:g} of itself {_over(span)}"
    if now.shape[1] >= MEASURED_IN_PART:
        return _settled_in_part(state, patience)
    low, high = _box(now, then)
    grown = 1.0 - hypervolume(then, low, high) / hypervolume(now, low, high)
    if grown > patience.growth:
        return None
    return f"the hypervolume had grown by less than {patience.growth:.2%} {_over(span)}"


def _settled_in_part(state: State, patience: Patience) -> str | None:
    span = patience.generations
    if len(state.trail) < 2 * span or state.generation % patience.part_every:
        return None
    volumes = np.array(measured(state.trail[-2 * span :]))
    grown = 1.0 - volumes[:span].mean() / volumes[span:].mean()
    if grown > patience.part_growth:
        return None
    return f"the hypervolume had grown by less than {patience.part_growth:.2%} {_over(span)}"


def _stalled(state: State, patience: Patience) -> str | None:
    span = patience.miss_generations
    if len(state.trail) <= span:
        return None
    now, then = state.trail[-1].violation, state.trail[-1 - span].violation
    base = IMPOSSIBLE if now >= IMPOSSIBLE else 0.0
    if now - base < (then - base) * (1.0 - patience.nearer):
        return None
    return f"nothing feasible was found, and the search came no nearer to it {_over(span)}"


def _over(span: int) -> str:
    return f"over the last {span} generations"

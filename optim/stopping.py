"""When a search has found what there is to find, told by the hypervolume of its front.

Hypervolume: the share of the box between the best and the worst corner of a front that the front
beats (Zitzler and Thiele 1999, IEEE Trans. Evol. Comput. 3, 257-271, from memory).
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from optim.steps import State
from problems.problem import Floats

_BEYOND = 0.1  # the reference lies this share of the front's extent beyond its worst corner


@dataclass(frozen=True)
class Patience:
    """Settled: growth below `growth` over the last `generations`."""

    generations: int = 15
    growth: float = 2e-4
    one_aim_growth: float = 1e-7
    violation: float = 1e-3


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


def measured(trail: tuple[Floats, ...]) -> list[float]:
    """Hypervolume of each remembered front in the box of the last one."""
    if not len(trail[-1]):
        return [0.0] * len(trail)
    last = trail[-1]
    low, high = last.min(axis=0), last.max(axis=0)
    if last.shape[1] == 1:
        first = next(front for front in trail if len(front))
        high = first.max(axis=0)
    return [hypervolume(front, low, high) for front in trail]


def settled(state: State, patience: Patience) -> str | None:
    """Why the search may stop, in plain words; None while it still gains."""
    span = patience.generations
    if len(state.trail) <= span or not len(state.trail[-1 - span]):
        return None
    now, then = state.trail[-1], state.trail[-1 - span]
    if now.shape[1] == 1:
        gain, least = float((then - now)[0, 0]), patience.one_aim_growth
        if gain > least * abs(float(now[0, 0])):
            return None
        return f"the best value had not moved by more than {least:g} of itself {_over(span)}"
    low, high = now.min(axis=0), now.max(axis=0)
    grown = 1.0 - hypervolume(then, low, high) / hypervolume(now, low, high)
    if grown > patience.growth:
        return None
    return f"the hypervolume had grown by less than {patience.growth:.2%} {_over(span)}"


def _over(span: int) -> str:
    return f"over the last {span} generations"

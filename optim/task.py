"""A problem as a search needs it: free variables from 0 to 1, figures to be minimised, violations.

Knows how designs are scaled and judged; knows nothing of how new designs are thought of.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from problems.problem import Bools, Evaluation, Floats, Limit, Problem

IMPOSSIBLE = 1e6  # added to the violation of an impossible design, so that it ranks last
_MOST_TOLD = 1e5  # beyond this, how impossible a design is no longer matters


@dataclass(frozen=True)
class Bound:
    """One side of a limit: `sign * (value - bound)` above 0 breaks it."""

    outcome: str
    bound: float
    sign: float

    @property
    def side(self) -> str:
        return "at_most" if self.sign > 0 else "at_least"


@dataclass(frozen=True)
class Scores:
    """What n designs are worth to a search.

    `aims` (n, m) are to be minimised; `excess` (n, k) is how far each bound is broken, in units
    of its scale, negative inside; `violation` (n,) is 0 for a design that may be kept.
    """

    aims: Floats
    excess: Floats
    violation: Floats


@dataclass(frozen=True)
class Task:
    """A problem with its aims and bounds, and the scale of each bound."""

    problem: Problem
    aims: tuple[tuple[str, float], ...]
    bounds: tuple[Bound, ...]
    scales: Floats

    @property
    def free(self) -> int:
        """Number of variables that can move."""
        return int(_movable(self.problem).sum())

    def designs(self, units: Floats) -> Floats:
        """Designs (n, number of variables) in SI from positions (n, free) in the unit box."""
        return designs(self.problem, units)

    def score(self, units: Floats) -> Scores:
        """Evaluate positions (n, free) in the unit box."""
        return self.judge(self.problem.evaluate(self.designs(units)))

    def judge(self, given: Evaluation) -> Scores:
        """Aims, excess and violation of designs already evaluated."""
        aims = _stacked([sign * values(given, name) for name, sign in self.aims], len(given))
        excess = raw_excess(self.bounds, given) / self.scales
        broken = np.maximum(excess, 0.0).sum(axis=1)
        hopeless = IMPOSSIBLE + np.clip(given.impossible_by, 0.0, _MOST_TOLD)
        sound = given.possible & np.isfinite(aims).all(axis=1) & np.isfinite(broken)
        return Scores(aims, excess, np.where(sound, broken, hopeless))


def task_of(problem: Problem) -> Task:
    """The task that the aims and limits of `problem` state, each bound on its own scale."""
    aims = tuple((aim.outcome, 1.0 if aim.sense == "least" else -1.0) for aim in problem.aims)
    bounds = tuple(bound for limit in problem.limits for bound in _sides(limit))
    return Task(problem, aims, bounds, np.ones(len(bounds)))


def values(given: Evaluation, name: str) -> Floats:
    """The outcome or setting called `name` of each design, shape (n,)."""
    return given.outcomes[name] if name in given.outcomes else given.settings[name]


def raw_excess(bounds: tuple[Bound, ...], given: Evaluation) -> Floats:
    """How far each bound is broken (n, k), in the unit of its outcome; negative inside."""
    parts = [bound.sign * (values(given, bound.outcome) - bound.bound) for bound in bounds]
    return _stacked(parts, len(given))


def sensible_scales(excess: Floats, possible: Bools, bounds: tuple[Bound, ...]) -> Floats:
    """The median distance of possible designs from each bound: one unit of its violation."""
    sizes = np.array([abs(bound.bound) or 1.0 for bound in bounds])
    if not possible.any():
        return sizes
    typical = np.median(np.abs(excess[possible]), axis=0)
    return np.where(np.isfinite(typical) & (typical > 1e-9 * sizes), typical, sizes)


def designs(problem: Problem, units: Floats) -> Floats:
    """Designs (n, number of variables) in SI from positions (n, free) in the unit box."""
    low, high = _ends(problem)
    logarithmic = np.array([v.scale == "log" and v.low > 0.0 for v in problem.variables], bool)
    share = np.zeros((len(units), len(low)))
    share[:, _movable(problem)] = units
    straight = low + share * (high - low)
    safe_low, safe_high = np.where(logarithmic, low, 1.0), np.where(logarithmic, high, 1.0)
    curved = safe_low * (safe_high / safe_low) ** share
    return np.clip(np.where(logarithmic, curved, straight), low, high)


def units_of(problem: Problem, chosen: Floats) -> Floats:
    """Positions (n, free) in the unit box of designs (n, number of variables) in SI."""
    low, high = _ends(problem)
    logarithmic = np.array([v.scale == "log" and v.low > 0.0 for v in problem.variables], bool)
    span = np.where(high > low, high - low, 1.0)
    share = (chosen - low) / span
    safe_low, safe_high = np.where(logarithmic, low, 1.0), np.where(logarithmic, high, 2.0)
    safe = np.where(logarithmic, chosen, 1.0)
    curved = np.log(safe / safe_low) / np.log(
        np.where(safe_high > safe_low, safe_high / safe_low, 2.0)
    )
    units = np.where(logarithmic, curved, share)[:, _movable(problem)]
    return np.clip(units, 0.0, 1.0)


def _sides(limit: Limit) -> list[Bound]:
    sides = []
    if limit.at_least is not None:
        sides.append(Bound(limit.outcome, limit.at_least, -1.0))
    if limit.at_most is not None:
        sides.append(Bound(limit.outcome, limit.at_most, 1.0))
    return sides


def _ends(problem: Problem) -> tuple[Floats, Floats]:
    low = np.array([variable.low for variable in problem.variables], dtype=float)
    high = np.array([variable.high for variable in problem.variables], dtype=float)
    return low, high


def _movable(problem: Problem) -> Bools:
    low, high = _ends(problem)
    return high > low


def _stacked(parts: list[Floats], rows: int) -> Floats:
    return np.stack(parts, axis=1) if parts else np.empty((rows, 0))

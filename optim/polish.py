"""The last digits of a best design, where one aim is all there is.

Sequential quadratic programming (Kraft 1988, DFVLR-FB 88-28, from memory; scipy's SLSQP) from
several good starts, with every limit that holds the design back kept active.
"""

from __future__ import annotations

from dataclasses import dataclass, field, replace

import numpy as np

from optim.archive import Indices, thin_evenly, within_tolerance
from optim.steps import TOLERANCE, State
from optim.task import IMPOSSIBLE, Scores, Task
from problems.problem import Floats

_STARTS = 4
_STEP = 1e-5  # of the box, for the differences
_INSIDE = 1e-9  # of a bound: how far inside it the polished design stays
_ROUNDS = 60
_PATIENCE, _GAIN = 25, 1e-8  # positions tried without such a gain (of the aim's size) end a climb
_FORFEIT = 10.0  # of the aim's size: what breaking a bound by its own size counts in a climb


def polished(task: Task, state: State) -> tuple[Floats, Floats, int]:
    """The archive of a search with one aim and its best design made better.

    Returns positions (n, free), aims (n, 1) and the number of evaluations that it took.
    """
    units, aims = state.kept_units, state.kept_aims
    if not task.free:
        return units, aims, 0
    slope = _Slopes(_by_bound(task), abs(float(aims.min())) or 1.0)
    found = [_climbed(slope, units[row]) for row in _starts(units, aims)]
    trial = _pulled_back(np.array(found), units[np.argmin(aims[:, 0])])
    scores = task.score(trial)
    sound = scores.violation <= 0.0
    units = np.concatenate([units, trial[sound]])
    aims = np.concatenate([aims, scores.aims[sound]])
    near = within_tolerance(aims, TOLERANCE)
    return units[near], aims[near], slope.evaluations + len(trial)


def _by_bound(task: Task) -> Task:
    sizes = np.array([abs(bound.bound) for bound in task.bounds])
    return replace(task, scales=np.where(sizes > 0.0, sizes, task.scales))


def _starts(units: Floats, aims: Floats) -> Indices:
    best = np.argsort(aims[:, 0], kind="stable")[: max(_STARTS, len(aims) // 2)]
    spread = thin_evenly(units[best], _STARTS, first=np.array([0]))
    return np.asarray(best[spread], dtype=np.intp)


def _pulled_back(found: Floats, safe: Floats) -> Floats:
    """`found` designs and ever larger steps back from them to a design known to be feasible."""
    back = np.concatenate([[0.0], np.logspace(-12.0, -1.0, 23)])
    trial = found[:, None, :] + back[None, :, None] * (safe - found[:, None, :])
    return np.clip(trial.reshape(-1, found.shape[1]), 0.0, 1.0)


class _StalledError(Exception):
    """A climb that gets no further, as beside a kink, where slopes mislead."""


@dataclass
class _Slopes:
    """Aim, room under each bound and their slopes at one position, from one batch of designs.

    Remembers the best position since `begin`; raises _StalledError where none better is found.
    """

    task: Task
    size: float
    evaluations: int = 0
    last: tuple[bytes, Scores, Floats] | None = field(default=None, repr=False)
    best: Floats = field(default_factory=lambda: np.empty(0), repr=False)
    worth: float = np.inf
    tried: int = 0

    def begin(self, start: Floats) -> None:
        """Forget the climb before this one."""
        self.best, self.worth, self.tried, self.last = start, np.inf, 0, None

    def _judge(self, place: Floats, scores: Scores) -> None:
        worth = scores.aims[0, 0] / self.size + _FORFEIT * scores.violation[0]
        if worth < self.worth - _GAIN:
            self.best, self.worth, self.tried = place.copy(), float(worth), 0
            return
        self.tried += 1
        if self.tried > _PATIENCE:
            raise _StalledError

    def around(self, place: Floats) -> tuple[Scores, Floats]:
        """Scores at `place` and on both sides of it in each variable, with the distances."""
        key = place.tobytes()
        if self.last is None or self.last[0] != key:
            steps = _STEP * np.eye(len(place))
            batch = np.clip(np.concatenate([place[None], place + steps, place - steps]), 0.0, 1.0)
            scores = self.task.score(batch)
            self.evaluations += len(batch)
            half = len(place) + 1
            self.last = key, scores, np.diagonal(batch[1:half] - batch[half:])
            self._judge(place, scores)
        return self.last[1], self.last[2]

    def aim(self, place: Floats) -> float:
        scores, _ = self.around(place)
        lost = 1.0 if scores.violation[0] >= IMPOSSIBLE else 0.0
        return float(scores.aims[0, 0] / self.size + lost)

    def aim_slope(self, place: Floats) -> Floats:
        scores, apart = self.around(place)
        return np.asarray(self._slope(scores.aims, apart)[0] / self.size)

    def room(self, place: Floats) -> Floats:
        scores, _ = self.around(place)
        return np.asarray(-scores.excess[0] - _INSIDE)

    def room_slope(self, place: Floats) -> Floats:
        scores, apart = self.around(place)
        return -self._slope(scores.excess, apart)

    def _slope(self, figures: Floats, apart: Floats) -> Floats:
        half = len(apart) + 1
        return np.asarray((figures[1:half] - figures[half:]).T / apart)


def _climbed(slopes: _Slopes, start: Floats) -> Floats:
    from scipy.optimize import Bounds, NonlinearConstraint, minimize

    room = NonlinearConstraint(slopes.room, 0.0, np.inf, jac=slopes.room_slope)
    slopes.begin(start)
    try:
        end = minimize(
            slopes.aim,
            start,
            jac=slopes.aim_slope,
            method="SLSQP",
            bounds=Bounds(0.0, 1.0),
            constraints=[room] if slopes.task.bounds else [],
            options={"maxiter": _ROUNDS, "ftol": 1e-13},
        )
    except _StalledError:
        return slopes.best
    place = np.asarray(end.x, dtype=float)
    return np.clip(place, 0.0, 1.0) if np.isfinite(place).all() else start

"""The course of a search from its arguments to its front: the loop, the checkpoints, the end.

The generations are `optim.steps`, the reasons to stop `optim.stopping`, what is told when nothing
is feasible `optim.misses`.
"""

from __future__ import annotations

import os
import time
from collections.abc import Callable
from dataclasses import dataclass, replace
from typing import Any

import numpy as np

from optim import checkpoint as checkpoints
from optim.archive import Indices, thin_evenly
from optim.errors import RunError
from optim.front import Front, tabulated
from optim.misses import nearest_miss
from optim.plainer import plainer
from optim.polish import polished
from optim.provenance import provenance
from optim.search import Progress
from optim.steps import MEASURED_IN_PART, Plan, State, advance, begin
from optim.stopping import Patience, hypervolume, settled
from optim.task import Task, task_of, units_of
from problems.problem import Evaluation, Floats, Problem

CHECKPOINT_EVERY = 2.0  # s
_MOST_AIMS = 5
INTERRUPTED = "interrupted; what was found until then was kept"


def run(
    problem: Problem,
    seed: int,
    evaluations: int,
    on_progress: Callable[[Progress], object] | None,
    checkpoint: str | os.PathLike[str] | None,
    resume: bool,
    size: int,
    stop_when_settled: bool,
    start: Floats | None = None,
) -> Front:
    """What `optim.search.search` promises."""
    _check(problem, seed, evaluations, size)
    started = time.perf_counter()
    task = task_of(problem)
    loop = _Loop(
        task,
        Plan().within(evaluations, task.free),
        seed,
        evaluations,
        on_progress,
        checkpoint,
        Patience() if stop_when_settled else None,
        None if start is None else units_of(problem, start),
    )
    task, state, reason = loop.run(resume)
    found = bool(len(state.kept_aims))
    front = (
        _front(task, state, reason, seed, size) if found else _nothing(task, state, reason, seed)
    )
    return replace(
        front,
        provenance={**front.provenance, "wall_time_s": time.perf_counter() - started},
    )


@dataclass(frozen=True)
class _Loop:
    task: Task
    plan: Plan
    seed: int
    evaluations: int
    on_progress: Callable[[Progress], object] | None
    checkpoint: str | os.PathLike[str] | None
    patience: Patience | None
    first: Floats | None = None  # positions (n, free) to begin with

    def run(self, resume: bool) -> tuple[Task, State, str]:
        """The task with its scales, the last state, and why it is the last."""
        task, state = self._start(resume)
        written = time.perf_counter()
        try:
            self._tell(state)
            while (reason := self._finished(task, state)) is None:
                state = advance(task, self.plan, state, self.evaluations)
                if time.perf_counter() - written > CHECKPOINT_EVERY:
                    self._write(state)
                    written = time.perf_counter()
                self._tell(state)
        except KeyboardInterrupt:
            reason = INTERRUPTED
        self._write(state)
        return task, state, reason

    def _start(self, resume: bool) -> tuple[Task, State]:
        problem = self.task.problem
        if self.checkpoint is not None:
            if resume and os.path.exists(self.checkpoint):
                state = checkpoints.read(self.checkpoint, problem, self.seed)
                return replace(self.task, scales=state.scales), state
            checkpoints.guard(self.checkpoint, problem)
        elif resume:
            raise RunError("resume: no checkpoint named to go on from")
        return begin(self.task, self.plan, self.seed, self.first)

    def _finished(self, task: Task, state: State) -> str | None:
        if not task.free:
            return "no variable is free: the one design was evaluated"
        if self.patience is not None and (reason := settled(state, self.patience)):
            return reason
        if state.evaluations >= self.evaluations:
            return f"all {self.evaluations} evaluations were used"
        return None

    def _write(self, state: State) -> None:
        if self.checkpoint is not None:
            checkpoints.write(self.checkpoint, self.task.problem, self.seed, state)

    def _tell(self, state: State) -> None:
        if self.on_progress is None:
            return
        self.on_progress(
            Progress(
                state.generation,
                state.evaluations,
                self.evaluations,
                len(state.kept_aims),
                _figure(self.task, state),
            )
        )


def _figure(task: Task, state: State) -> float | None:
    front = state.trail[-1].front
    if not len(front):
        return None
    if front.shape[1] == 1:
        return float(front.min()) * task.aims[0][1]
    return hypervolume(front, front.min(axis=0), front.max(axis=0))


def _front(task: Task, state: State, reason: str, seed: int, size: int) -> Front:
    if len(task.aims) == 1:
        units, aims, extra = polished(task, state)
        units, aims, tried = plainer(task, units, aims)
        rows = thin_evenly(units, size, first=np.array([np.argmin(aims[:, 0])]))
    else:
        units, aims, extra = state.kept_units, state.kept_aims, 0
        units, aims, tried = plainer(task, units, aims)
        rows = thin_evenly(aims, size)
    thinned = _thinned(aims, rows)
    rows = rows[_reading_order(task, aims[rows])]
    designs, given = _evaluated_again(task, units[rows])
    facts = provenance(task, state, reason, seed, state.evaluations + extra + tried, given)
    facts["thinned"] = thinned
    return Front(tabulated(task.problem, designs, given), facts, task.problem.source)


def _thinned(aims: Floats, rows: Indices) -> dict[str, Any]:
    """From how many designs the front was thinned, and the share of their hypervolume it keeps."""
    told: dict[str, Any] = {"from": len(aims), "to": len(rows)}
    if 1 < aims.shape[1] < MEASURED_IN_PART:
        low, high = aims.min(axis=0), aims.max(axis=0)
        whole = hypervolume(aims, low, high)
        told["hypervolume_kept"] = hypervolume(aims[rows], low, high) / whole
    return told


def _evaluated_again(task: Task, units: Floats) -> tuple[Floats, Evaluation]:
    """Designs in full; any that a last digit has carried over a limit are left out."""
    chosen = task.designs(units)
    given = task.problem.evaluate(chosen)
    sound = task.judge(given).violation <= 0.0
    if sound.all() or not sound.any():
        return chosen, given
    return chosen[sound], task.problem.evaluate(chosen[sound])


def _nothing(task: Task, state: State, reason: str, seed: int) -> Front:
    miss = nearest_miss(task, state, seed)
    given = task.problem.evaluate(miss.design)
    facts = provenance(task, state, reason, seed, state.evaluations + miss.evaluations, given)
    facts |= {"designs": 0, "cautions": [], "outside": [], "nearest_miss": miss.story}
    table = tabulated(task.problem, miss.design, given).iloc[:0]
    return Front(table, facts, task.problem.source)


def _reading_order(task: Task, aims: Floats) -> Indices:
    """Ascending in the last aim to have least of, or else in the first; one aim best first."""
    least = [place for place, (_, sign) in enumerate(task.aims) if sign > 0.0]
    column = least[-1] if least else 0
    sign = 1.0 if least or len(task.aims) == 1 else -1.0
    return np.argsort(sign * aims[:, column], kind="stable")


def _check(problem: Problem, seed: int, evaluations: int, size: int) -> None:
    if not 1 <= len(problem.aims) <= _MOST_AIMS:
        raise RunError(f"aims: {len(problem.aims)} given; allowed are 1 to {_MOST_AIMS}")
    if evaluations < 1:
        raise RunError(f"evaluations: {evaluations}; at least 1 is needed")
    if size < 1:
        raise RunError(f"size: {size}; a front holds at least 1 design")
    if seed < 0:
        raise RunError(f"seed: {seed}; must be 0 or more")

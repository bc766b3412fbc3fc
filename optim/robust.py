"""A front under what is uncertain: bands, chances, what matters, and the front at a confidence.

The designs of a run meet one shared sample; then the same aims are searched at their unfavourable
percentile, beginning with those designs. How it is told is in `robust_account`, drawn in
`robust_pictures`.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
import pandas as pd

from optim.archive import Indices, nondominated, thin_evenly
from optim.bands import Bands, Each, Terms, banded, joined
from optim.course import INTERRUPTED
from optim.draws import shared
from optim.errors import RunError
from optim.front import Front, tabulated
from optim.influence import Influence, influences
from optim.picks import designs, spread
from optim.robust_problem import Confident
from optim.search import FRONT_SIZE, Progress, search
from optim.stopping import hypervolume
from optim.task import task_of
from problems.problem import Bools, Floats, Problem

SAMPLES, CONFIDENCE = 1024, 0.9
STEPS = 100  # of progress
EVALUATIONS = 12_000  # designs searched at the confidence
_SEARCH_SAMPLES = 128  # draws that they meet; the best meet the whole sample afterwards
_MARGIN = 1.0  # draws by which that search is surer, since it fits itself to its few draws
_SHARES = (0.2, 0.7, 0.85, 1.0)  # of the progress: bands, search, bands of what it found, indices
_SHOWN = 7
_NEAR = 0.01  # of the length of the front in an aim
_MEASURABLE = 3  # aims up to which hypervolumes are told


@dataclass(frozen=True)
class Study:
    """What became of a front of n designs under uncertainty.

    `given` are the bands of its designs, in the order of its table; `robust_table`, `robust` those
    of the front at the confidence. `survives` (n,) marks the designs that meet the limits with
    that confidence, `unbeaten` (n,) those which the front at the confidence holds, `near` (n,)
    those that it beats by no more than 1 % of its length in every aim, `anew` the designs of the
    front at the confidence that were searched for it; `held` is how many it held before it was
    thinned. `volume` are the hypervolumes, in one box, of the surviving designs and of the front
    at the confidence.
    `influence` is on the rows `shown` of the given front.
    """

    problem: Problem
    front: Front
    terms: Terms
    samples: int
    seed: int
    given: Bands
    robust_table: pd.DataFrame
    robust: Bands
    survives: Bools
    unbeaten: Bools
    near: Bools
    anew: Bools
    held: int
    volume: tuple[float, float] | None
    influence: Influence
    shown: Indices
    evaluations: int


def studied(
    problem: Problem,
    front: Front,
    samples: int = SAMPLES,
    confidence: float = CONFIDENCE,
    seed: int = 1,
    each: Each | None = None,
    told: Callable[[], object] = lambda: None,
    evaluations: int = EVALUATIONS,
) -> Study:
    """The study of a front of `problem` over `samples` (a power of 2) shared draws.

    `each` shares the work out, `told` is called about `STEPS` times. The same seed gives the same
    study. Raises RunError where nothing is uncertain or the front is not of this problem.
    """
    _check(problem, front, samples, confidence)
    steps = _Steps(told)
    terms = Terms(shared(problem.uncertain, samples, seed), confidence)
    known = designs(front, problem)
    given = banded(problem, known, terms, each, steps.phase(0))
    found, tried = _searched(problem, known, confidence, samples, seed, each, evaluations, steps)
    fresh = banded(problem, found, terms, each, steps.phase(2))
    every = joined([given, fresh])
    kept = _unbeaten(problem, every, confidence)
    rows = _thinned(problem, every, kept)
    shown = spread(front, problem, _SHOWN)
    names = list(dict.fromkeys([aim.outcome for aim in problem.aims] + _limited(problem)))
    base = min(samples, SAMPLES)
    influence = influences(problem, known[shown], names, base, seed, steps.phase(3))
    survives = given.chance_of_all >= confidence
    return Study(
        problem,
        front,
        terms,
        samples,
        seed,
        given,
        _table(problem, front, found, rows),
        every.rows(rows),
        survives,
        np.isin(np.arange(len(known)), kept),
        survives & _near(problem, given.assured, every.assured[kept]),
        rows >= len(known),
        len(kept),
        _volumes(problem, given.assured[survives], every.assured[kept]),
        influence,
        shown,
        (len(known) + len(found)) * samples
        + tried * min(_SEARCH_SAMPLES, samples)
        + len(shown) * base * (len(problem.uncertain) + 2),
    )


def to_be_least(problem: Problem, assured: Floats) -> Floats:
    """Aims (n, aims) with the sign that makes less better."""
    return np.asarray(assured * np.array([sign for _, sign in task_of(problem).aims]))


class _Steps:
    """Progress in shares, told in steps."""

    def __init__(self, told: Callable[[], object]) -> None:
        self._told, self._done = told, 0

    def phase(self, place: int) -> Callable[[float], None]:
        """What a phase calls with its own share."""
        start = _SHARES[place - 1] if place else 0.0

        def reach(share: float) -> None:
            whole = start + (_SHARES[place] - start) * min(share, 1.0)
            while self._done < int(STEPS * whole + 1e-9):
                self._done += 1
                self._told()

        return reach


def _searched(
    problem: Problem,
    known: Floats,
    confidence: float,
    samples: int,
    seed: int,
    each: Each | None,
    evaluations: int,
    steps: _Steps,
) -> tuple[Floats, int]:
    """Designs that nothing beats at the confidence on a small sample, and how many were tried."""
    count = min(_SEARCH_SAMPLES, samples)
    surer = min(confidence + _MARGIN / count, 1.0 - 1.0 / count)
    draws = shared(problem.uncertain, count, seed)
    terms = Terms(draws, max(surer, confidence), bands=False)
    reach = steps.phase(1)

    def news(progress: Progress) -> None:
        reach(progress.evaluations / progress.of)

    found = search(
        Confident(problem, terms, each), seed, evaluations, news, size=FRONT_SIZE, start=known
    )
    if found.provenance["stopped_because"] == INTERRUPTED:
        raise KeyboardInterrupt
    reach(1.0)
    return designs(found, problem), int(found.provenance["evaluations"])


def _unbeaten(problem: Problem, every: Bands, confidence: float) -> Indices:
    """Rows of the designs that meet the limits with the confidence and that none beats at it."""
    sound = np.flatnonzero(every.chance_of_all >= confidence)
    if not sound.size:
        return sound
    return np.asarray(
        sound[nondominated(to_be_least(problem, every.assured[sound]))], dtype=np.intp
    )


def _near(problem: Problem, given: Floats, robust: Floats) -> Bools:
    """Which given designs no design of the robust front beats by over 1 % of its length in all."""
    if not len(robust):
        return np.zeros(len(given), dtype=bool)
    given, robust = to_be_least(problem, given), to_be_least(problem, robust)
    step = _NEAR * np.ptp(robust, axis=0)
    beaten = (robust[None] < (given - step)[:, None]).all(axis=2).any(axis=1)
    return np.asarray(~beaten)


def _thinned(problem: Problem, every: Bands, kept: Indices) -> Indices:
    """At most as many of them as a front holds, in reading order."""
    if not kept.size:
        return kept
    aims = to_be_least(problem, every.assured[kept])
    rows = thin_evenly(aims, FRONT_SIZE)
    return np.asarray(kept[rows[np.argsort(aims[rows, -1], kind="stable")]], dtype=np.intp)


def _table(problem: Problem, front: Front, found: Floats, rows: Indices) -> pd.DataFrame:
    """The designs of the front at the confidence as a table like that of the given front."""
    both = front.table
    if len(found):
        fresh = tabulated(problem, found, problem.evaluate(found))
        both = pd.concat([front.table, fresh[list(front.table.columns)]], ignore_index=True)
    return both.iloc[rows].reset_index(drop=True)


def _limited(problem: Problem) -> list[str]:
    return [limit.outcome for limit in problem.limits]


def _volumes(problem: Problem, given: Floats, robust: Floats) -> tuple[float, float] | None:
    if not 2 <= len(problem.aims) <= _MEASURABLE or not len(given) or len(robust) < 2:
        return None
    given, robust = to_be_least(problem, given), to_be_least(problem, robust)
    both = np.concatenate([given, robust])
    low, high = both.min(axis=0), both.max(axis=0)
    best = given[nondominated(given)]
    return hypervolume(best, low, high), hypervolume(robust, low, high)


def _check(problem: Problem, front: Front, samples: int, confidence: float) -> None:
    if not problem.uncertain:
        raise RunError(
            f"{problem.title}: nothing is uncertain -- name it in [uncertain] of the case"
        )
    if not len(front):
        raise RunError(f"{problem.title}: the front holds no design")
    if samples < 2 or samples & (samples - 1):
        raise RunError(f"samples: {samples}; a power of 2 such as {SAMPLES} is needed")
    if not 0.5 <= confidence < 1.0:
        raise RunError(f"confidence: {confidence}; from 0.5 to below 1")
    lacking = [v.column for v in problem.variables if v.column not in front.table]
    if lacking:
        raise RunError(f"front.csv: no column {', '.join(lacking)}; not a front of this case")

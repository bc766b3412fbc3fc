"""The search as a caller sees it: a problem in, a front out, news of progress on the way.

Kept free of heavy imports. How a generation is made stands in `optim.steps`, when to stop in
`optim.stopping`, the loop around both in `optim.course`.
"""

from __future__ import annotations

import os
from collections.abc import Callable
from dataclasses import dataclass
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from optim.front import Front
    from problems.problem import Floats, Problem

EVALUATIONS = 100_000
FRONT_SIZE = 300


@dataclass(frozen=True)
class Progress:
    """How far a search has come: `evaluations` made `of` those allowed.

    `hypervolume` is the share (0 to 1) of the box around the front that the front beats; with one
    aim it is the best value so far. None while nothing feasible has been found.
    """

    generation: int
    evaluations: int
    of: int
    front_size: int
    hypervolume: float | None


def search(
    problem: Problem,
    seed: int = 1,
    evaluations: int = EVALUATIONS,
    on_progress: Callable[[Progress], object] | None = None,
    checkpoint: str | os.PathLike[str] | None = None,
    resume: bool = False,
    *,
    size: int = FRONT_SIZE,
    stop_when_settled: bool = True,
    start: Floats | None = None,
) -> Front:
    """Find the designs of `problem` that nothing beats.

    With two to five aims the front holds at most `size` designs, evenly spread; with one aim the
    best design, first, and neighbours within 1 % of its value. The search stops when the
    hypervolume no longer grows (unless `stop_when_settled` is false) or when `evaluations` are
    used up. The same seed gives the same front, also when the search was broken off and taken up
    again with `resume` from the file `checkpoint`, which is written about every two seconds (and
    left for the caller to remove). A missing checkpoint means starting from the beginning.
    `start` are designs (n, number of variables) that are tried first, beside a sample of the box.

    Ctrl-C ends the search and keeps what was found. If no design meets the limits the table is
    empty and `provenance["nearest_miss"]` says what stands in the way.

    Raises RunError for arguments outside their range, CheckpointError for a checkpoint that is
    not of this problem and seed.
    """
    from optim.course import run

    return run(
        problem,
        seed,
        evaluations,
        on_progress,
        checkpoint,
        resume,
        size,
        stop_when_settled,
        start,
    )

"""What designs give over shared draws: percentile bands, chances of meeting limits, figures at a
stated confidence.

One pass over blocks of designs, so that memory stays small; blocks may be shared among workers.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Iterator
from dataclasses import dataclass, field, fields
from typing import Any

import numpy as np

from optim.draws import Draws
from optim.task import Bound, task_of
from problems.problem import Bools, Floats, Problem
from problems.uncertain import Sampled

BAND = (5.0, 50.0, 95.0)  # percentiles of the bands
_ROUNDING = 1e-9  # of a limit: a design that stands on it meets it
_BLOCK = 1 << 14  # evaluations at a time


@dataclass(frozen=True)
class Terms:
    """The draws that designs meet, the confidence asked for, and whether bands are wanted."""

    draws: Draws
    confidence: float
    bands: bool = True


@dataclass(frozen=True)
class Bands:
    """What n designs give over the draws of some `Terms`.

    `band` maps an outcome or setting to its percentiles, shape (n, 3); `assured` (n, aims) is what
    each aim amounts to at the confidence asked for, its percentile on the unfavourable side;
    `chance` (n, bounds) and `chance_of_all` (n,) are shares of draws that meet each side of a limit
    and all of them; `excess` (n,) is how far the limits are broken at that confidence, as a share
    of the limit, 0 or below where they are met; `possible` (n,) the share of draws under which the
    design can exist and be driven.
    """

    assured: Floats
    chance: Floats
    chance_of_all: Floats
    excess: Floats
    possible: Floats
    band: dict[str, Floats] = field(default_factory=dict)

    def __len__(self) -> int:
        return len(self.possible)

    def rows(self, chosen: Any) -> Bands:
        """The same of some of the designs."""
        taken = {f.name: getattr(self, f.name)[chosen] for f in fields(self) if f.name != "band"}
        return Bands(**taken, band={name: values[chosen] for name, values in self.band.items()})


Block = tuple[Floats, Terms]
Each = Callable[[Callable[[Problem, Block], Bands], Iterable[Block]], Iterator[Bands]]


def in_turn(problem: Problem) -> Each:
    """One block after the other, here."""
    return lambda work, blocks: (work(problem, block) for block in blocks)


def banded(
    problem: Problem,
    designs: Floats,
    terms: Terms,
    each: Each | None = None,
    told: Callable[[float], object] = lambda share: None,
) -> Bands:
    """Bands of designs of shape (n, number of variables).

    `each` shares blocks out, `told` is called with the share that is done.
    """
    parts: list[Bands] = []
    done = 0
    for part in (each or in_turn(problem))(of_block, _blocks(designs, terms)):
        parts.append(part)
        done += len(part)
        told(done / max(len(designs), 1))
    return joined(parts)


def _blocks(designs: Floats, terms: Terms) -> list[Block]:
    count = max((len(values) for values in terms.draws.values()), default=1)
    size = max(_BLOCK // count, 1)
    return [
        (designs[start : start + size], terms) for start in range(0, max(len(designs), 1), size)
    ]


def joined(parts: list[Bands]) -> Bands:
    """Bands of consecutive designs as one."""
    whole = {
        f.name: np.concatenate([getattr(part, f.name) for part in parts])
        for f in fields(Bands)
        if f.name != "band"
    }
    names = parts[0].band
    return Bands(
        **whole, band={name: np.concatenate([part.band[name] for part in parts]) for name in names}
    )


def of_block(problem: Problem, block: Block) -> Bands:
    """Bands of a block of designs, all at once."""
    designs, terms = block
    task = task_of(problem)
    wanted = {name for name, _ in task.aims} | {bound.outcome for bound in task.bounds}
    given = problem.sampled(designs, terms.draws, None if terms.bands else wanted)
    rate = 100.0 * terms.confidence
    assured = [
        _percentiles(given, name, [rate if sign > 0.0 else 100.0 - rate])[:, 0]
        for name, sign in task.aims
    ]
    excess = _excess(task.bounds, given)
    met = (excess <= 0.0) & given.possible[..., None]
    names = [*problem.outcomes, *problem.settings] if terms.bands else []
    return Bands(
        assured=np.stack(assured, axis=1),
        chance=met.mean(axis=1),
        chance_of_all=(met.all(axis=2) & given.possible).mean(axis=1),
        excess=_at_confidence(excess, given.possible, terms.confidence),
        possible=given.possible.mean(axis=1),
        band={named.name: _percentiles(given, named.name, list(BAND)) for named in names},
    )


def _excess(bounds: tuple[Bound, ...], given: Sampled) -> Floats:
    """How far each bound is broken, as a share of it, (n, m, bounds); below 0 inside."""
    if not bounds:
        return np.empty((*given.possible.shape, 0))
    parts = [
        bound.sign * (given.outcomes[bound.outcome] - bound.bound) / (abs(bound.bound) or 1.0)
        - _ROUNDING
        for bound in bounds
    ]
    return np.stack(parts, axis=2)


def _at_confidence(excess: Floats, possible: Bools, confidence: float) -> Floats:
    """The worst excess that is not surpassed with the given confidence, shape (n,).

    The least of the draws that leaves enough of them at or below it, so that it is above 0 exactly
    where too few draws meet all limits. An impossible draw counts as all limits broken by as much
    as they hold.
    """
    worst = excess.max(axis=2, initial=-1.0)
    worst = np.where(possible, worst, np.maximum(worst, 1.0))
    rank = int(np.ceil(confidence * worst.shape[1] - 1e-9)) - 1
    return np.asarray(np.partition(worst, rank, axis=1)[:, rank])


def _percentiles(given: Sampled, name: str, rates: list[float]) -> Floats:
    """Percentiles over the possible draws, (n, rates); over all where none is possible."""
    values, possible = given.outcomes[name], given.possible
    found = np.percentile(values, rates, axis=1).T
    some = possible.any(axis=1) & ~possible.all(axis=1)
    if some.any():
        kept = np.where(possible[some], values[some], np.nan)
        found[some] = np.nanpercentile(kept, rates, axis=1).T
    return np.asarray(found)

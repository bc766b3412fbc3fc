"""Several problems compared on equal terms: each searched for the best under the same criterion.

Knows outcomes only by the names it is given. What a criterion is called and what follows from the
figures is for the caller.
"""

from __future__ import annotations

import copy
from collections.abc import Callable, Iterator, Mapping, Sequence
from dataclasses import dataclass, field

import numpy as np

from optim.course import INTERRUPTED
from optim.front import Front
from optim.picks import column, designs
from optim.search import search
from optim.task import task_of, values
from problems.problem import Aim, Bools, Evaluation, Floats, Limit, Problem

FRONT_EVALUATIONS, EVALUATIONS = 40_000, 6000
_SLACK = 1e-9  # of a figure of the reference: room for its last digits
_EARNS = 1e-4  # of the best of the base: what a design must be better by to be told from it
Told = Callable[[], object]


@dataclass(frozen=True)
class Entry:
    """One of the problems compared, by name; the first of a contest is the base."""

    name: str
    problem: Problem


@dataclass(frozen=True)
class Criterion:
    """One way to compare: `aim` is what to have most or least of; of a reference design the
    outcomes `at_most` may not be passed and what it gives by the aims `no_worse` must be reached.
    """

    key: str
    aim: Aim
    at_most: tuple[str, ...] = ()
    no_worse: tuple[Aim, ...] = ()
    share: float = 1.0  # of what the aims `no_worse` ask for, enough is this

    def limits(self, reference: Mapping[str, float]) -> tuple[Limit, ...]:
        """The limits that a reference with these outcomes sets."""
        most = [Limit(name, at_most=_above(reference[name])) for name in self.at_most]
        return (*most, *(self._reached(aim, reference[aim.outcome]) for aim in self.no_worse))

    def looser_than(self, other: Criterion) -> bool:
        """Whether this asks for the same and sets no limit that `other` does not set."""
        return (self.aim, self.no_worse, self.share) == (
            other.aim,
            other.no_worse,
            other.share,
        ) and set(self.at_most) <= set(other.at_most)

    def _reached(self, aim: Aim, value: float) -> Limit:
        less = value - (1.0 - self.share) * abs(value)
        more = value + (1.0 - self.share) * abs(value)
        if aim.sense == "most":
            return Limit(aim.outcome, at_least=-_above(-less))
        return Limit(aim.outcome, at_most=_above(more))


@dataclass(frozen=True)
class Design:
    """A design of the entry `entry` in full; settings and outcomes by name, SI."""

    entry: str
    variables: Floats = field(repr=False)
    settings: Mapping[str, float]
    outcomes: Mapping[str, float]
    group: str
    cautions: tuple[str, ...] = ()

    def __getitem__(self, name: str) -> float:
        return self.outcomes[name] if name in self.outcomes else self.settings[name]


# what won: by place of the reference, key of the criterion and name of the entry
Winners = dict[tuple[int, str, str], Design]


def restated(problem: Problem, aims: Sequence[Aim], limits: Sequence[Limit] = ()) -> Problem:
    """The same problem with other aims, and `limits` beside its own."""
    other = copy.copy(problem)
    other.aims, other.limits = tuple(aims), combined((*problem.limits, *limits))
    return other


def combined(limits: Sequence[Limit]) -> tuple[Limit, ...]:
    """One limit for each outcome, as tight as the tightest on either side."""
    found: dict[str, Limit] = {}
    for limit in limits:
        other = found.get(limit.outcome, Limit(limit.outcome))
        low = [end for end in (limit.at_least, other.at_least) if end is not None]
        high = [end for end in (limit.at_most, other.at_most) if end is not None]
        found[limit.outcome] = Limit(
            limit.outcome, max(low) if low else None, min(high) if high else None
        )
    return tuple(found.values())


def fronts(
    entries: Sequence[Entry], aims: Sequence[Aim], seed: int = 1, told: Told = lambda: None
) -> dict[str, Front]:
    """The front of every entry under `aims` and its own limits, by name; empty ones too."""
    found = {}
    for entry in entries:
        stated = restated(entry.problem, aims)
        found[entry.name] = _searched(stated, seed, FRONT_EVALUATIONS, 300)
        told()
    return found


def spread_along(
    entry: Entry, front: Front, outcome: str, shares: Sequence[float]
) -> tuple[Design, ...]:
    """Designs of a front at these shares of the range of `outcome`, by ratio where above 0.

    Fewer where the front has not so many; none of an empty front.
    """
    if not len(front):
        return ()
    figures = column(front, entry.problem, outcome)
    scaled = np.log(figures) if figures.min() > 0.0 else figures
    wanted = scaled.min() + np.asarray(shares) * np.ptp(scaled)
    rows = np.unique(np.abs(scaled[:, None] - wanted).argmin(axis=0))
    rows = rows[np.argsort(figures[rows], kind="stable")]
    return _described(entry, designs(front, entry.problem)[rows])


def hold(
    entries: Sequence[Entry],
    known: Mapping[str, Front],
    references: Sequence[Design],
    criteria: Sequence[Criterion],
    seed: int = 1,
    told: Told = lambda: None,
) -> Winners:
    """The best design of every entry by every criterion at every reference.

    `known` are the fronts of the entries: what they hold is considered beside what is searched,
    and an entry with an empty one is not searched. `references` are designs of the base, the first
    entry. Its best is inside the range of every entry and stands wherever nothing beats it by more
    than a search can tell, so no entry ever loses to it. `told` is called after each comparison.
    """
    winners: Winners = {}
    for place, reference in enumerate(references):
        for number, criterion in enumerate(criteria):
            limits, stands = criterion.limits(reference.outcomes), reference
            for entry in entries:
                looser = [
                    winners[place, other.key, entry.name]
                    for other in criteria[:number]
                    if other.looser_than(criterion)
                ]
                stated = restated(entry.problem, (criterion.aim,), limits)
                base = entry is entries[0]
                earns = 0.0 if base else _EARNS
                best = _best(entry, stated, known[entry.name], stands, looser, seed, earns)
                winners[place, criterion.key, entry.name] = best
                stands = best if base else stands
                told()
    return winners


def _best(
    entry: Entry,
    stated: Problem,
    front: Front,
    stands: Design,
    looser: Sequence[Design],
    seed: int,
    earns: float,
) -> Design:
    """The best design of an entry for the one aim of `stated`, or the one that stands.

    `looser` are its best where less was asked for: one that meets what is asked here is the best
    here too. `earns` is what a design must be better by, of the value of the one that stands.
    """
    for design in looser:
        own = design.entry == entry.name or design is stands
        if own and all(_met(design, limit) for limit in stated.limits):
            return design
    if not len(front):
        return stands
    first = _searched(stated, seed, EVALUATIONS, 1)
    rows = [designs(one, entry.problem) for one in (front, first) if len(one)]
    found = _leader(entry, stated, np.concatenate(rows))
    aim = stated.aims[0]
    sign = 1.0 if aim.sense == "most" else -1.0
    value = stands[aim.outcome]
    if found is not None and sign * (found[aim.outcome] - value) > earns * abs(value):
        return found
    return stands


def _leader(entry: Entry, stated: Problem, rows: Floats) -> Design | None:
    """The best of `rows` (n, number of variables) by the one aim of `stated` within its limits."""
    given = stated.evaluate(rows)
    sound = feasible(stated, given)
    if not sound.any():
        return None
    aim = stated.aims[0]
    figures = values(given, aim.outcome) * (-1.0 if aim.sense == "most" else 1.0)
    best = int(np.argmin(np.where(sound, figures, np.inf)))
    return next(_each(entry, rows[[best]], stated.evaluate(rows[[best]])))


def feasible(problem: Problem, given: Evaluation) -> Bools:
    """Which of the designs evaluated are possible and meet the limits of `problem`."""
    return np.asarray(task_of(problem).judge(given).violation <= 0.0)


def _met(design: Design, limit: Limit) -> bool:
    value = design[limit.outcome]
    room = _SLACK * abs(value)
    return (limit.at_least is None or value >= limit.at_least - room) and (
        limit.at_most is None or value <= limit.at_most + room
    )


def _searched(problem: Problem, seed: int, evaluations: int, size: int) -> Front:
    front = search(problem, seed=seed, evaluations=evaluations, size=size)
    if front.provenance["stopped_because"] == INTERRUPTED:
        raise KeyboardInterrupt  # one search of many: there is nothing whole to show
    return front


def _described(entry: Entry, rows: Floats) -> tuple[Design, ...]:
    """Designs of shape (n, number of variables) in full."""
    return tuple(_each(entry, rows, entry.problem.evaluate(rows)))


def _each(entry: Entry, rows: Floats, given: Evaluation) -> Iterator[Design]:
    for place, row in enumerate(rows):
        yield Design(
            entry.name,
            row,
            {name: float(figures[place]) for name, figures in given.settings.items()},
            {name: float(figures[place]) for name, figures in given.outcomes.items()},
            str(given.group[place]),
            tuple(text for text, applies in given.cautions.items() if applies[place]),
        )


def _above(value: float) -> float:
    return value + _SLACK * abs(value)

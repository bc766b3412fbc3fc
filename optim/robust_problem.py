"""The same problem at a stated confidence: aims at their unfavourable percentile, limits met with
that chance.

A `Problem` like any other, so that it is searched like any other.
"""

from __future__ import annotations

import numpy as np

from optim.bands import Each, Terms, banded
from problems.problem import Evaluation, Floats, Limit, Outcome, Problem, Profile, Sketch

EXCESS = Outcome("limit_excess", "1", "how far limits are broken at the confidence, as a share")


class Confident(Problem):
    """`base` over the draws of `terms`; outcomes are the aims at the confidence asked for."""

    def __init__(self, base: Problem, terms: Terms, each: Each | None = None) -> None:
        self.base, self.terms, self.each = base, terms, each
        self.title, self.kind, self.source = base.title, base.kind, base.source
        self.variables, self.aims = base.variables, base.aims
        self.settings: tuple[Outcome, ...] = ()
        self.outcomes = (*(base.outcome(aim.outcome) for aim in base.aims), EXCESS)
        self.limits = (Limit(EXCESS.name, at_most=0.0),) if base.limits else ()
        self.laws, self.notes = base.laws, base.notes

    def evaluate(self, designs: Floats) -> Evaluation:
        """Aims and excess at the confidence; see `Problem.evaluate`."""
        given = self.base.evaluate(designs)
        found = banded(self.base, designs, self.terms, self.each)
        seldom = np.maximum(self.terms.confidence - found.possible, 0.0)
        impossible_by = given.impossible_by + seldom
        possible = given.possible & (seldom <= 0.0)
        outcomes = {aim.outcome: found.assured[:, place] for place, aim in enumerate(self.aims)}
        reasons = np.where(seldom > 0.0, "not under enough of the draws", given.reasons)
        return Evaluation(
            settings={},
            outcomes={**outcomes, EXCESS.name: found.excess},
            possible=possible,
            impossible_by=np.where(possible, 0.0, impossible_by),
            reasons=np.asarray(reasons, dtype=np.str_),
            group=given.group,
        )

    def profile(self, design: Floats) -> Profile:
        """As the base problem has it."""
        return self.base.profile(design)

    def sketch(self, design: Floats) -> Sketch:
        """As the base problem has it."""
        return self.base.sketch(design)

    def remarks(self, design: Floats) -> tuple[str, ...]:
        """As the base problem has it."""
        return self.base.remarks(design)

    def plainer(self, designs: Floats) -> Floats:
        """As the base problem has it."""
        return self.base.plainer(designs)

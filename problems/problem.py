"""The one interface between what is designed (`problems`) and how it is searched (`optim`).

A `Problem` names its variables and outcomes and evaluates many designs at once. It draws no
picture and knows no search; `optim` in turn knows nothing of heat, only what stands here.
"""

from __future__ import annotations

from abc import ABC, abstractmethod
from collections.abc import Collection, Mapping
from dataclasses import dataclass, field
from pathlib import Path
from typing import Literal

import numpy as np
from numpy.typing import NDArray

from problems.uncertain import Sampled, Uncertain
from problems.units import suffix

Floats = NDArray[np.float64]
Bools = NDArray[np.bool_]


@dataclass(frozen=True)
class Variable:
    """A quantity that the search may move, in SI, between `low` and `high`.

    `only_with` names another variable without which (at 0) this one means nothing.
    """

    name: str
    unit: str
    low: float
    high: float
    meaning: str
    scale: Literal["linear", "log"] = "linear"
    only_with: str | None = None

    @property
    def column(self) -> str:
        """Name with its unit suffix, as in front.csv."""
        return self.name + suffix(self.unit)


@dataclass(frozen=True)
class Outcome:
    """A figure that a design gives, in the SI unit `unit`, with one line of meaning."""

    name: str
    unit: str
    meaning: str

    @property
    def column(self) -> str:
        """Name with its unit suffix, as in front.csv."""
        return self.name + suffix(self.unit)


@dataclass(frozen=True)
class Aim:
    """An outcome to be had most or least of."""

    outcome: str
    sense: Literal["most", "least"]


@dataclass(frozen=True)
class Limit:
    """A bound on an outcome, in SI; at least one side is given."""

    outcome: str
    at_least: float | None = None
    at_most: float | None = None


@dataclass(frozen=True)
class Law:
    """A published relation used in an evaluation: what it is, where from, where it holds."""

    name: str
    source: str
    valid: str


@dataclass(frozen=True)
class Evaluation:
    """What n designs give.

    Every array has shape (n,). `settings` holds the geometry and flow of each design in full,
    fixed values as well as searched ones, keyed by the names in `Problem.settings`; `outcomes`
    is keyed by the names in `Problem.outcomes`. Neither ever holds a NaN. `possible` is false
    where the design cannot exist or cannot be evaluated, with the reason in `reasons` (an empty
    string elsewhere). `impossible_by` says how far such a design is from existing: 0 where it
    is possible, growing smoothly above 0 elsewhere, so that a search finds its way back.
    `outside` maps a law's name to the designs that lie outside its range of validity;
    `cautions` maps one sentence for the engineer to the designs it applies to. `group` names
    the sort of design, for telling them apart in pictures ("plain", "tripped"); `labels` holds
    other words about each design by column ("fan": the fan chosen for it).
    """

    settings: Mapping[str, Floats]
    outcomes: Mapping[str, Floats]
    possible: Bools
    impossible_by: Floats
    reasons: NDArray[np.str_]
    group: NDArray[np.str_]
    outside: Mapping[str, Bools] = field(default_factory=dict)
    cautions: Mapping[str, Bools] = field(default_factory=dict)
    labels: Mapping[str, NDArray[np.str_]] = field(default_factory=dict)

    def __len__(self) -> int:
        return len(self.possible)


@dataclass(frozen=True)
class Curve:
    """One quantity along the plate, for a picture and a table."""

    name: str
    unit: str
    values: Floats
    meaning: str


@dataclass(frozen=True)
class Region:
    """A named stretch along the plate, from `start` to `end` in m."""

    name: str
    start: float
    end: float


@dataclass(frozen=True)
class Profile:
    """What happens along one plate of one design: curves over `x` (m, shape (m,))."""

    x: Floats
    curves: tuple[Curve, ...]
    regions: tuple[Region, ...]
    marks: Mapping[str, float] = field(default_factory=dict)


@dataclass(frozen=True)
class Shape:
    """A filled outline to scale, metres: corners of shape (k, 2), x along the flow."""

    part: Literal["plate", "wire", "layer"]
    corners: Floats


@dataclass(frozen=True)
class Sketch:
    """A side view of a design to scale: outlines, the size of the view, a line of dimensions.

    `repeats` tells how often one passage stands in the whole (1 for a single plate), `pitch` how
    far apart the repeats stand.
    """

    shapes: tuple[Shape, ...]
    width: float
    height: float
    caption: str
    repeats: float = 1.0
    pitch: float = 0.0


class Problem(ABC):
    """A case made ready to evaluate. Designs are rows of an array in the order of `variables`."""

    title: str
    kind: str
    variables: tuple[Variable, ...]
    settings: tuple[Outcome, ...]
    outcomes: tuple[Outcome, ...]
    aims: tuple[Aim, ...]
    limits: tuple[Limit, ...]
    laws: tuple[Law, ...]
    notes: tuple[str, ...]
    source: str  # the case as given, for the run folder
    files: tuple[tuple[str, Path], ...] = ()  # what the case needs beside it: its name, its place
    uncertain: tuple[Uncertain, ...] = ()  # inputs that are not known exactly
    exact: tuple[str, ...] = ()  # inputs that might be uncertain and are taken as exact

    @abstractmethod
    def evaluate(self, designs: Floats) -> Evaluation:
        """Evaluate `designs` of shape (n, number of variables), SI, inside the ranges.

        Never raises for a design inside the ranges and never returns NaN.
        """

    @abstractmethod
    def profile(self, design: Floats) -> Profile:
        """What happens along the plate of one design of shape (number of variables,)."""

    @abstractmethod
    def sketch(self, design: Floats) -> Sketch:
        """A side view to scale of one design of shape (number of variables,)."""

    @abstractmethod
    def remarks(self, design: Floats) -> tuple[str, ...]:
        """Plain sentences about one design of shape (number of variables,): regimes, verdicts."""

    def sampled(
        self,
        designs: Floats,
        draws: Mapping[str, Floats],
        names: Collection[str] | None = None,
    ) -> Sampled:
        """What designs of shape (n, number of variables) give at draws of the uncertain inputs.

        `draws` holds for some of `uncertain`, by name, m values each, shape (m,); the others are
        taken as nominal (m is 1 without draws). Every design meets the same draws. `names` are
        the outcomes and settings that are wanted, all by default.

        Raises KeyError for a draw of something that is not uncertain here.
        """
        for name in draws:
            raise KeyError(name)
        given = self.evaluate(designs)
        found = {**given.settings, **given.outcomes}
        wanted = found if names is None else names
        return Sampled({name: found[name][:, None] for name in wanted}, given.possible[:, None])

    def plainer(self, designs: Floats) -> Floats:
        """The same designs, shape (n, number of variables), without parts that may do nothing.

        A search tries them beside what it found; as given where nothing can be left out.
        """
        return designs

    def whole(self, design: Floats) -> tuple[Problem, Floats] | None:
        """A problem and design that can be built, with the nearest whole count of what repeats.

        None where nothing repeats or the count is whole already.
        """
        return None

    def outcome(self, name: str) -> Outcome:
        """The outcome or setting called `name`.

        Raises KeyError where there is none.
        """
        for known in (*self.outcomes, *self.settings):
            if known.name == name:
                return known
        raise KeyError(name)

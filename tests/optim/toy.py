"""Small analytic problems for the tests of the search: everything about them is known."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass, field

import numpy as np

from problems.problem import (
    Aim,
    Evaluation,
    Floats,
    Limit,
    Outcome,
    Problem,
    Profile,
    Sketch,
    Variable,
)

Formula = Callable[[Mapping[str, Floats]], Floats]


def nowhere(given: Mapping[str, Floats]) -> Floats:
    """Every design is possible."""
    return np.zeros(len(next(iter(given.values()))))


@dataclass
class Toy(Problem):
    """A problem out of formulas; `wrong` is above 0 where a design cannot exist."""

    variables: tuple[Variable, ...]
    formulas: Mapping[str, Formula]
    aims: tuple[Aim, ...]
    limits: tuple[Limit, ...] = ()
    wrong: Formula = nowhere
    units: Mapping[str, str] = field(default_factory=dict)
    title: str = "toy"
    kind: str = "toy"
    source: str = 'title = "toy"\r\n# as given\n'
    laws: tuple = ()
    notes: tuple[str, ...] = ("a note",)
    calls: int = 0
    designs_seen: int = 0

    def __post_init__(self) -> None:
        self.settings = tuple(
            Outcome(variable.name, variable.unit, variable.meaning) for variable in self.variables
        )
        self.outcomes = tuple(
            Outcome(name, self.units.get(name, "1"), f"what {name} is") for name in self.formulas
        )

    def evaluate(self, designs: Floats) -> Evaluation:
        self.calls += 1
        self.designs_seen += len(designs)
        given = {v.name: designs[:, place] for place, v in enumerate(self.variables)}
        wrong = np.maximum(self.wrong(given), 0.0)
        first = designs[:, 0]
        return Evaluation(
            settings=given,
            outcomes={name: formula(given) for name, formula in self.formulas.items()},
            possible=wrong <= 0.0,
            impossible_by=wrong,
            reasons=np.where(wrong > 0.0, "does not fit", ""),
            group=np.where(
                first > np.median([self.variables[0].low, self.variables[0].high]), "large", "small"
            ),
            outside={"law one": first < 0.1, "law two": first < 0.2},
            cautions={"mind the edge": first > 0.9},
        )

    def profile(self, design: Floats) -> Profile:
        raise NotImplementedError

    def sketch(self, design: Floats) -> Sketch:
        raise NotImplementedError

    def remarks(self, design: Floats) -> tuple[str, ...]:
        return ()


def plain(*names: str, low: float = 0.0, high: float = 1.0) -> tuple[Variable, ...]:
    """Linear variables from `low` to `high`."""
    return tuple(Variable(name, "m", low, high, name) for name in names)


def least(*names: str) -> tuple[Aim, ...]:
    """Aims to have least of `names`."""
    return tuple(Aim(name, "least") for name in names)


def trade(**changes: object) -> Toy:
    """A made-up plate: much against little, two variables, one on a log scale, a limit.

    output = length^0.5 speed^0.6, effort = length speed^2.2, strain = effort/length at most 40.
    """
    return Toy(
        **{
            "variables": (
                Variable("length", "m", 0.05, 1.2, "length"),
                Variable("speed", "m/s", 1.0, 15.0, "speed", "log"),
            ),
            "formulas": {
                "output": lambda x: np.sqrt(x["length"]) * x["speed"] ** 0.6,
                "effort": lambda x: x["length"] * x["speed"] ** 2.2,
                "strain": lambda x: x["speed"] ** 2.2,
            },
            "units": {"output": "W", "effort": "W", "strain": "Pa"},
            "aims": (Aim("output", "most"), Aim("effort", "least")),
            "limits": (Limit("strain", at_most=40.0),),
            **changes,
        }
    )


def binh_korn() -> Toy:
    """Binh and Korn 1997, two variables, two constraints (from memory)."""
    return Toy(
        variables=(Variable("x", "m", 0.0, 5.0, "x"), Variable("y", "m", 0.0, 3.0, "y")),
        formulas={
            "f1": lambda v: 4.0 * v["x"] ** 2 + 4.0 * v["y"] ** 2,
            "f2": lambda v: (v["x"] - 5.0) ** 2 + (v["y"] - 5.0) ** 2,
            "g1": lambda v: (v["x"] - 5.0) ** 2 + v["y"] ** 2,
            "g2": lambda v: (v["x"] - 8.0) ** 2 + (v["y"] + 3.0) ** 2,
        },
        aims=least("f1", "f2"),
        limits=(Limit("g1", at_most=25.0), Limit("g2", at_least=7.7)),
    )


def osyczka_kundu() -> Toy:
    """Osyczka and Kundu 1995, six variables, six constraints, a front in pieces (from memory)."""
    spans = ((0, 10), (0, 10), (1, 5), (0, 6), (1, 5), (0, 10))
    return Toy(
        variables=tuple(
            Variable(f"x{i + 1}", "1", float(a), float(b), "x") for i, (a, b) in enumerate(spans)
        ),
        formulas={
            "f1": lambda v: (
                -(
                    25 * (v["x1"] - 2) ** 2
                    + (v["x2"] - 2) ** 2
                    + (v["x3"] - 1) ** 2
                    + (v["x4"] - 4) ** 2
                    + (v["x5"] - 1) ** 2
                )
            ),
            "f2": lambda v: sum(v[f"x{i}"] ** 2 for i in range(1, 7)),
            "c1": lambda v: v["x1"] + v["x2"],
            "c2": lambda v: v["x2"] - v["x1"],
            "c3": lambda v: v["x1"] - 3 * v["x2"],
            "c4": lambda v: (v["x3"] - 3) ** 2 + v["x4"],
            "c5": lambda v: (v["x5"] - 3) ** 2 + v["x6"],
        },
        aims=least("f1", "f2"),
        limits=(
            Limit("c1", at_least=2.0, at_most=6.0),
            Limit("c2", at_most=2.0),
            Limit("c3", at_most=2.0),
            Limit("c4", at_most=4.0),
            Limit("c5", at_least=4.0),
        ),
    )


def sphere(aims: int, free: int = 6) -> Toy:
    """The second problem of Deb, Thiele, Laumanns and Zitzler 2002 (from memory).

    The front is the positive part of the unit sphere.
    """
    names = tuple(f"x{i}" for i in range(free))

    def distance(v: Mapping[str, Floats]) -> Floats:
        return 1.0 + sum((v[name] - 0.5) ** 2 for name in names[aims - 1 :])

    def part(place: int) -> Formula:
        def formula(v: Mapping[str, Floats]) -> Floats:
            value = distance(v)
            for name in names[: aims - 1 - place]:
                value = value * np.cos(v[name] * np.pi / 2)
            if place:
                value = value * np.sin(v[names[aims - 1 - place]] * np.pi / 2)
            return value

        return formula

    formulas = {f"f{place}": part(place) for place in range(aims)}
    return Toy(plain(*names), formulas, least(*formulas))


def broken_front(free: int = 8) -> Toy:
    """The third problem of Zitzler, Deb and Thiele 2000 (from memory): a front in five pieces."""
    names = tuple(f"x{i}" for i in range(free))

    def second(v: Mapping[str, Floats]) -> Floats:
        g = 1.0 + 9.0 * sum(v[name] for name in names[1:]) / (free - 1)
        share = v["x0"] / g
        return g * (1.0 - np.sqrt(share) - share * np.sin(10.0 * np.pi * v["x0"]))

    return Toy(plain(*names), {"f0": lambda v: v["x0"] * 1.0, "f1": second}, least("f0", "f1"))


def duct(**changes: object) -> Toy:
    """The best gap between plates at a fixed pressure drop, in its simplest form.

    Warmth carried off by a slug flow, q = gap speed (1 - exp(-length / (gap^2 speed 40))) per
    height gap, with drop = speed length / gap^2 at most 10: nearly flat in the gap at its best.
    """

    def carried(v: Mapping[str, Floats]) -> Floats:
        return v["speed"] * (1.0 - np.exp(-v["length"] * 40.0 / (v["gap"] ** 2 * v["speed"])))

    return Toy(
        **{
            "variables": (
                Variable("gap", "m", 0.2, 20.0, "gap", "log"),
                Variable("speed", "m/s", 0.01, 100.0, "speed", "log"),
                Variable("length", "m", 1.0, 1.0, "length"),
            ),
            "formulas": {
                "carried": carried,
                "drop": lambda v: v["speed"] * v["length"] / v["gap"] ** 2,
            },
            "units": {"carried": "W", "drop": "Pa"},
            "aims": (Aim("carried", "most"),),
            "limits": (Limit("drop", at_most=10.0),),
            **changes,
        }
    )

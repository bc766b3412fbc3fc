"""Analytic problems with uncertain inputs for the tests: what comes out is known in closed form."""

from __future__ import annotations

from collections.abc import Callable, Collection, Mapping
from dataclasses import dataclass, field

import numpy as np

from problems.problem import Aim, Floats, Limit, Variable
from problems.uncertain import Sampled, Uncertain
from tests.optim.toy import Toy

Drawn = Callable[[Mapping[str, Floats], Mapping[str, Floats]], Floats]


@dataclass
class Doubtful(Toy):
    """A toy whose formulas, `drawn`, take the draws of uncertain inputs too.

    The plain formulas are those at the nominal inputs. `cannot` is above 0 where a design cannot
    exist under a draw.
    """

    uncertain: tuple[Uncertain, ...] = ()
    exact: tuple[str, ...] = ("the weather",)
    drawn: Mapping[str, Drawn] = field(default_factory=dict)
    cannot: Drawn = lambda v, u: 0.0 * next(iter(v.values()))

    def sampled(
        self,
        designs: Floats,
        draws: Mapping[str, Floats],
        names: Collection[str] | None = None,
    ) -> Sampled:
        given = {v.name: designs[:, [place]] for place, v in enumerate(self.variables)}
        used = {known.name: np.array([known.nominal]) for known in self.uncertain} | dict(draws)
        count = max((len(values) for values in used.values()), default=1)
        shape = (len(designs), count)
        found = {name: np.broadcast_to(f(given, used), shape) for name, f in self.drawn.items()}
        found |= {name: np.broadcast_to(values, shape) for name, values in given.items()}
        impossible = np.broadcast_to(self.cannot(given, used), shape)
        kept = found if names is None else {name: found[name] for name in names}
        return Sampled(kept, impossible <= 0.0)


def spread(name: str, low: float, high: float, shape: str = "uniform") -> Uncertain:
    """An input about the middle of its ends."""
    middle = 0.5 * (low + high)
    return Uncertain(name, "1", f"what {name} is", "value", middle, low, high, shape, "made up")


def doubtful(
    variables: tuple[Variable, ...],
    uncertain: tuple[Uncertain, ...],
    drawn: Mapping[str, Drawn],
    aims: tuple[Aim, ...],
    limits: tuple[Limit, ...] = (),
    **more: object,
) -> Doubtful:
    """A problem with the nominal formulas that belong to the drawn ones."""
    nominal = {known.name: np.array([known.nominal]) for known in uncertain}

    def plain(formula: Drawn) -> Callable[[Mapping[str, Floats]], Floats]:
        return lambda given: formula(given, nominal) + 0.0 * next(iter(given.values()))

    formulas = {name: plain(formula) for name, formula in drawn.items()}
    return Doubtful(variables, formulas, aims, limits, uncertain=uncertain, drawn=drawn, **more)


def linear(shape: str = "uniform", **more: object) -> Doubtful:
    """gain = 10 x + a and cost = x (1 + b), a from -1 to 1, b from -0.2 to 0.2; x from 0 to 1."""
    return doubtful(
        (Variable("x", "m", 0.0, 1.0, "x"),),
        (spread("a", -1.0, 1.0, shape), spread("b", -0.2, 0.2, shape)),
        {
            "gain": lambda v, u: 10.0 * v["x"] + u["a"],
            "cost": lambda v, u: v["x"] * (1.0 + u["b"]),
        },
        (Aim("gain", "most"), Aim("cost", "least")),
        **more,
    )


def ishigami() -> Doubtful:
    """Ishigami and Homma's function of three angles; x does nothing, still never moves."""
    angle = np.pi
    return doubtful(
        (Variable("x", "m", 0.0, 1.0, "x"),),
        tuple(spread(name, -angle, angle) for name in ("x1", "x2", "x3")),
        {
            "wave": lambda v, u: (
                np.sin(u["x1"])
                + 7.0 * np.sin(u["x2"]) ** 2
                + 0.1 * u["x3"] ** 4 * np.sin(u["x1"])
                + 0.0 * v["x"]
            ),
            "still": lambda v, u: 3.0 + 0.0 * v["x"] + 0.0 * u["x1"],
        },
        (Aim("wave", "least"),),
    )

"""A small Problem with invented numbers that behave like a stack of plates.

For tests of what is shown, where real physics would only cost time. Nothing here is a law.
"""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np

from optim.front import Front, tabulated
from problems.problem import (
    Aim,
    Curve,
    Evaluation,
    Floats,
    Law,
    Limit,
    Outcome,
    Problem,
    Profile,
    Region,
    Shape,
    Sketch,
    Variable,
)

THICKNESS, HEIGHT = 1e-3, 0.4

LENGTH = Variable("length", "m", 0.05, 1.2, "plate length along the flow", "log")
GAP = Variable("gap", "m", 3e-3, 40e-3, "clear gap between plates", "log")
VELOCITY = Variable("velocity", "m/s", 1.0, 15.0, "velocity of the stream", "log")
SHARE = Variable("trip_share", "1", 0.01, 0.9, "trip wire, share of the length", "log")
WIRE = Variable("trip_height", "m", 0.2e-3, 4e-3, "diameter of the trip wire", "log")

SETTINGS = (
    Outcome("length", "m", "plate length along the flow"),
    Outcome("gap", "m", "clear gap between plates"),
    Outcome("velocity", "m/s", "mean velocity in the gap"),
    Outcome("trip_height", "m", "wire diameter; 0 without a wire"),
    Outcome("count", "1", "number of plates"),
)
OUTCOMES = (
    Outcome("heat", "W", "heat from surface to fluid"),
    Outcome("drag", "N", "force of the flow on the plates"),
    Outcome("fan_power", "W", "power that the fan draws"),
    Outcome("pressure_drop", "Pa", "static pressure drop"),
    Outcome("outlet_temperature", "K", "mixed temperature of the fluid leaving"),
    Outcome("plate_mass", "kg", "mass of the plates"),
)


class FakePlates(Problem):
    """Five free variables at most; whatever is not free stands at the middle of its range."""

    title = "Cooling stack for an invented walnut-hulling line"
    kind = "stack"
    settings, outcomes = SETTINGS, OUTCOMES
    laws = (Law("flat plate", "invented for tests", "Re below 1e6"),)
    notes = ("Numbers are invented for tests.",)
    source = 'title = "fake"\nkind = "stack"\n'

    def __init__(
        self,
        variables: tuple[Variable, ...] = (LENGTH, GAP, VELOCITY, SHARE, WIRE),
        aims: tuple[Aim, ...] = (
            Aim("heat", "most"),
            Aim("drag", "least"),
            Aim("fan_power", "least"),
        ),
        limits: tuple[Limit, ...] = (),
    ) -> None:
        self.variables, self.aims, self.limits = variables, aims, limits

    def _values(self, designs: Floats) -> dict[str, Floats]:
        designs = np.atleast_2d(designs)
        values = {
            item.name: np.full(len(designs), (item.low * item.high) ** 0.5)
            for item in (LENGTH, GAP, VELOCITY, SHARE, WIRE)
        }
        columns = zip(self.variables, designs.T, strict=True)
        return values | {item.name: column for item, column in columns}

    def evaluate(self, designs: Floats) -> Evaluation:
        given = self._values(designs)
        length, gap, velocity = given["length"], given["gap"], given["velocity"]
        count = HEIGHT / (gap + THICKNESS)
        reynolds = velocity * length / 1.6e-5
        tripped = (velocity * given["trip_height"] / 1.6e-5 > 900.0) & (reynolds > 5e4)
        friction = np.where(tripped, 0.074 * reynolds**-0.2, 1.328 * reynolds**-0.5)
        area = 2.0 * count * length * 0.6
        mass = 1.18 * velocity * gap * count * 0.6
        drag = friction * 0.59 * velocity**2 * area
        share = -np.expm1(-0.6 * friction * area / (gap * count * 0.6))
        pressure_drop = drag / (gap * count * 0.6) + 0.4 * velocity**2
        outcomes: Mapping[str, Floats] = {
            "heat": share * mass * 1007.0 * 55.0,
            "drag": drag,
            "fan_power": pressure_drop * mass / 1.18 / 0.55,
            "pressure_drop": pressure_drop,
            "outlet_temperature": 298.15 + 55.0 * share,
            "plate_mass": 0.5 * area * THICKNESS * 2700.0,
        }
        settings = {name: given[name] for name in ("length", "gap", "velocity", "trip_height")}
        return Evaluation(
            settings=settings | {"count": count},
            outcomes=outcomes,
            possible=given["trip_height"] < 0.4 * gap,
            impossible_by=np.maximum(given["trip_height"] / gap - 0.4, 0.0),
            reasons=np.where(given["trip_height"] < 0.4 * gap, "", "the wires fill the gap"),
            group=np.where(tripped, "tripped", "plain"),
            outside={"flat plate": reynolds > 1e6},
            cautions={"the stream is fast": velocity > 12.0},
        )

    def profile(self, design: Floats) -> Profile:
        given = {name: float(values[0]) for name, values in self._values(design).items()}
        length, velocity = given["length"], given["velocity"]
        x = np.geomspace(1e-3, 1.0, 300) * length
        wire = given["trip_share"] * length
        reynolds = velocity * x / 1.6e-5
        weight = 1.0 / (1.0 + np.exp(-(x - 1.2 * wire) / (0.05 * wire)))
        h = 0.0263 / x * (0.29 * reynolds**0.5 * (1 - weight) + 0.0259 * reynolds**0.8 * weight)
        layer = x * (4.91 * reynolds**-0.5 * (1 - weight) + 0.37 * reynolds**-0.2 * weight)
        curves = (
            Curve("h", "W/(m2 K)", h, "local heat transfer coefficient"),
            Curve("shear", "Pa", h * velocity / 1007.0, "wall shear"),
            Curve("layer", "m", layer, "boundary-layer thickness"),
            Curve("momentum", "m", layer * 0.12, "momentum thickness"),
            Curve("wall", "K", np.full_like(x, 353.15), "wall temperature"),
            Curve("fluid", "K", 298.15 + 20.0 * x / length, "mixed temperature of the fluid"),
        )
        regions = (
            Region("laminar", 0.0, wire),
            Region("transitional", wire, min(1.4 * wire, length)),
            Region("turbulent", min(1.4 * wire, length), length),
        )
        return Profile(x, curves, regions, {"trip wire": wire, "onset": wire})

    def sketch(self, design: Floats) -> Sketch:
        given = {name: float(values[0]) for name, values in self._values(design).items()}
        length, gap, wire = given["length"], given["gap"], given["trip_height"]
        turn = np.linspace(0.0, 2.0 * np.pi, 25)[:-1]
        middle = np.array([given["trip_share"] * length, THICKNESS + 0.5 * wire])
        circle = middle + 0.5 * wire * np.column_stack((np.cos(turn), np.sin(turn)))
        plate = np.array([[0, 0], [length, 0], [length, THICKNESS], [0, THICKNESS]], dtype=float)
        caption = f"length {1e3 * length:.0f} mm, gap {1e3 * gap:.1f} mm, wire {1e3 * wire:.2f} mm"
        return Sketch(
            shapes=(Shape("plate", plate), Shape("wire", circle)),
            width=length,
            height=gap + THICKNESS,
            caption=caption,
            repeats=HEIGHT / (gap + THICKNESS),
            pitch=gap + THICKNESS,
        )

    def remarks(self, design: Floats) -> tuple[str, ...]:
        given = self.evaluate(design)
        return (f"The layer is {given.group[0]}.",)


def sampled(problem: Problem, count: int = 4000, keep: int = 60, seed: int = 1) -> Front:
    """A Front of non-dominated designs out of a random sample of `problem`."""
    from optim.archive import nondominated, thin_evenly

    rng = np.random.default_rng(seed)
    low = np.array([variable.low for variable in problem.variables])
    high = np.array([variable.high for variable in problem.variables])
    designs = low * (high / low) ** rng.random((count, len(low)))
    designs = designs[problem.evaluate(designs).possible]
    given = problem.evaluate(designs)
    signs = [1.0 if aim.sense == "least" else -1.0 for aim in problem.aims]
    names = [aim.outcome for aim in problem.aims]
    aims = np.column_stack([s * given.outcomes[n] for s, n in zip(signs, names, strict=True)])
    rows = np.flatnonzero(nondominated(aims))
    rows = rows[thin_evenly(aims[rows], keep)]
    chosen = designs[rows]
    table = tabulated(problem, chosen, problem.evaluate(chosen))
    return Front(table, {"seed": seed, "evaluations": count}, problem.source)

"""A case of kind `plate` or `stack` made ready to search: the `Problem` that `optim` sees.

Joins variables, physics, ranges of validity, cautions and words. The balances themselves are in
`plate` and `stack`.
"""

from __future__ import annotations

from collections.abc import Collection, Mapping
from copy import copy
from dataclasses import dataclass
from typing import TypeVar

import numpy as np
from numpy.typing import NDArray

from problems import CaseError
from problems.case import Case
from problems.convection import fluids
from problems.convection.flat_plate import smooth_step
from problems.convection.fluids import Fluid, FluidError
from problems.fans.choice import Choice
from problems.kinds import cautions, laws, pictures, plate, possible, stack, words
from problems.kinds import sampled as under_draws
from problems.kinds.blown import Blower, bought
from problems.kinds.doubts import doubts, taken_as_exact
from problems.kinds.outcomes import OPTIONAL, OUTCOMES, SETTINGS
from problems.kinds.swept import CHUNK, Settings, Walked, settings, variables
from problems.problem import Bools, Evaluation, Floats, Outcome, Problem, Profile, Sketch
from problems.uncertain import Sampled

_Scalar = TypeVar("_Scalar", bound=np.generic)

_REACH = 300.0  # K from the inlet that a wall under a flux may reach


@dataclass(frozen=True)
class Batch:
    """Designs walked together: settings, walk, outcomes; arrays of shape (n,)."""

    settings: dict[str, Floats]
    walked: Walked
    outcomes: dict[str, Floats]
    choice: Choice | None = None
    met: NDArray[np.bool_] | None = None


def build(case: Case) -> SweptPlates:
    """The Problem of a case of kind `plate` or `stack`.

    Raises CaseError where the fluid has no properties at the case's temperatures.
    """
    try:
        return SweptPlates(case)
    except FluidError as error:
        value = f"{error.value:g}" if isinstance(error.value, float) else error.value
        fault = f"fluid.{error.key}: {value} -- {error.allowed}"
        raise CaseError(f"{case.name}: 1 fault\n  {fault}") from error


class SweptPlates(Problem):
    """A plate in a free stream or a stack of plates; see `Problem`."""

    def __init__(self, case: Case) -> None:
        self.case = case
        self.title, self.kind, self.source = case.title, case.kind, case.source
        self.variables = variables(case)
        self.settings = SETTINGS[case.kind]
        self.outcomes = _given(case)
        self.aims, self.limits = case.aims, case.limits
        self._ranges = laws.in_use(
            passage=case.kind == "stack",
            trip=None if case.trip is None else case.trip.sort,
            rough=case.plates.roughness > 0.0,
            ends=case.kind == "stack" and case.plates.ends != "none",
        )
        self.laws = tuple(law for law, _ in self._ranges)
        self.fluid = _fluid(case)
        self.blower = Blower(case)
        if self.blower.catalogue is not None and self.fluid.phase == "liquid":
            raise CaseError(
                f"{case.name}: fan.catalogue -- fans move gases; take efficiency of a pump"
            )
        self.notes = words.notes(case, self.fluid)
        self.files = self.blower.files()
        self.uncertain, self.exact = doubts(case), taken_as_exact(case)

    def evaluate(self, designs: Floats) -> Evaluation:
        """Evaluate designs of shape (n, number of variables); see `Problem.evaluate`."""
        designs = np.asarray(designs, dtype=float)
        if designs.ndim != 2:
            designs = designs.reshape(-1, len(self.variables))
        return self.evaluate_settings(settings(self.case, designs))

    def evaluate_settings(self, given: Settings) -> Evaluation:
        """Evaluate designs given by their settings in full: the free ones of `swept.settings`.

        Every array has shape (n,); ranges of the case do not bind here.
        """
        count = len(given["length"])
        parts = []
        for start in range(0, max(count, 1), CHUNK):
            some = {name: values[start : start + CHUNK] for name, values in given.items()}
            parts.append(self._evaluate(self._balanced(some)))
        return joined(parts) if len(parts) > 1 else parts[0]

    def _evaluate(self, batch: Batch) -> Evaluation:
        impossible_by, reasons = possible.impossible(self.fluid, batch)
        if batch.choice is not None:
            impossible_by, reasons = possible.unserved(batch, batch.choice, impossible_by, reasons)
        walk = laws.Walk(batch.walked.surface, batch.walked.sweep)
        return Evaluation(
            settings=batch.settings,
            outcomes=batch.outcomes,
            possible=impossible_by == 0.0,
            impossible_by=impossible_by,
            reasons=reasons,
            group=words.groups(batch.settings, walk),
            outside={law.name: test(walk) for law, test in self._ranges},
            cautions=cautions.found(
                self.case, self.fluid, batch.settings, batch.walked, batch.outcomes
            ),
            labels=self.blower.names(batch.choice),
        )

    def sampled(
        self,
        designs: Floats,
        draws: Mapping[str, Floats],
        names: Collection[str] | None = None,
    ) -> Sampled:
        """What designs give at draws of the uncertain inputs; see `Problem.sampled`."""
        return under_draws.sampled(self, designs, draws, names)

    def for_inlets(self, inlets: tuple[float, float]) -> SweptPlates:
        """The same with properties known for inlet temperatures from low to high [K]."""
        wider = copy(self)
        if inlets[0] < inlets[1]:
            wider.fluid = _fluid(self.case, inlets)
        return wider

    def figures(self, given: Settings) -> tuple[dict[str, Floats], Bools]:
        """Outcomes and settings of a chunk of designs, and whether each is possible."""
        batch = self._balanced(given)
        impossible_by, reasons = possible.impossible(self.fluid, batch)
        if batch.choice is not None:
            impossible_by, _ = possible.unserved(batch, batch.choice, impossible_by, reasons)
        there = impossible_by == 0.0
        if "inlet" in given:
            there &= (given["inlet"] >= self.fluid.low) & (given["inlet"] <= self.fluid.high)
        return {**batch.settings, **batch.outcomes}, there

    def fan_rows(self, given: Settings) -> NDArray[np.intp]:
        """The fan chosen for each of a chunk of designs, as a row of the blower's curves."""
        choice = self._balanced(given).choice
        if choice is None:
            raise ValueError("the case names no catalogue")
        return choice.row

    def batch(self, designs: Floats) -> Batch:
        """Walk along designs of shape (n, number of variables) and balance them."""
        return self._balanced(settings(self.case, designs))

    def _balanced(self, given: Settings) -> Batch:
        if self.kind == "stack":
            return self._blown(stack.complete(self.case, dict(given)))
        walked, outcomes = plate.balance(self.case, self.fluid, given)
        return self._batch(given, walked, outcomes | self.blower.priced(outcomes, None))

    def _blown(self, given: Settings) -> Batch:
        """A stack with what drives it; at fixed speed the fan decides the velocity."""
        choice, met = None, None
        if self.blower.fixed:
            velocity, choice, met = self.blower.met(
                given, lambda some: stack.balance(self.case, self.fluid, some, self.blower)[1]
            )
            # where no fan serves, the least velocity wanted stands, so that all stays smooth
            velocity = np.where(choice.duty.holds, velocity, given["velocity"])
            given = {**given, "velocity": velocity}
        walked, outcomes = stack.balance(self.case, self.fluid, given, self.blower)
        if choice is None:
            choice = self.blower.chosen(outcomes, bought(given))
        outcomes |= self.blower.powered(outcomes, choice)
        if "efficiency" in given:
            for name in ("fan_power", "specific_fan_power"):
                outcomes[name] = outcomes[name] / given["efficiency"]
        outcomes |= self.blower.priced(outcomes, choice)
        return self._batch(given, walked, outcomes, choice, met)

    def _batch(
        self,
        given: Settings,
        walked: Walked,
        outcomes: dict[str, Floats],
        choice: Choice | None = None,
        met: NDArray[np.bool_] | None = None,
    ) -> Batch:
        outcomes = outcomes | _common(self.case, given, walked, outcomes)
        ordered = {outcome.name: outcomes[outcome.name] for outcome in self.outcomes}
        shown = {setting.name: given[setting.name] for setting in self.settings}
        return Batch(shown, walked, ordered, choice, met)

    def profile(self, design: Floats) -> Profile:
        """Curves along the plate of one design; see `Problem.profile`."""
        return pictures.profile(self.case, self.batch(np.atleast_2d(design)))

    def sketch(self, design: Floats) -> Sketch:
        """Side view to scale of one design; see `Problem.sketch`."""
        return pictures.sketch(self.case, self.batch(np.atleast_2d(design)))

    def remarks(self, design: Floats) -> tuple[str, ...]:
        """Plain sentences about one design; see `Problem.remarks`."""
        return words.remarks(self.case, self.batch(np.atleast_2d(design)))

    def plainer(self, designs: Floats) -> Floats:
        """The same designs without a wire, where the case lets the wire be left away."""
        plain = np.array(designs, dtype=float)
        for axis, variable in enumerate(self.variables):
            if variable.name == "trip_height" and variable.low == 0.0:
                plain[:, axis] = 0.0
        return plain

    def whole(self, design: Floats) -> tuple[Problem, Floats] | None:
        """The same design with a whole number of plates, or None where it has one already."""
        if self.kind != "stack" or self.case.plates.count is not None:
            return None
        count = float(self.batch(np.atleast_2d(design)).settings["count"][0])
        plates = self.case.plates.model_copy(update={"height": None, "count": max(round(count), 1)})
        return SweptPlates(self.case.model_copy(update={"plates": plates})), design


def _given(case: Case) -> tuple[Outcome, ...]:
    """The outcomes that a case has: those of fans and of money only where it names them.

    Raises CaseError where an aim or a limit names one that it has not.
    """
    tables = {"fan.catalogue": case.fan.catalogue is not None, "money": case.money is not None}
    named = {aim.outcome for aim in case.aims} | {limit.outcome for limit in case.limits}
    for name in sorted(named):
        if not tables.get(OPTIONAL.get(name, ""), True):
            raise CaseError(f"{case.name}: 1 fault\n  {name} -- needs {OPTIONAL[name]} in the case")
    return tuple(o for o in OUTCOMES[case.kind] if tables.get(OPTIONAL.get(o.name, ""), True))


def _common(
    case: Case, given: Settings, walked: Walked, outcomes: dict[str, Floats]
) -> dict[str, Floats]:
    """The outcomes that follow in the same way for every kind."""
    sweep = walked.sweep
    wired, margin = np.zeros_like(walked.h), np.zeros_like(walked.h)
    if sweep.wire is not None:
        wired, margin = sweep.wire.reynolds, sweep.wire.margin
    sides = case.plates.faces if case.kind == "plate" else 2
    one_side = outcomes["plate_area"] / sides
    capacity = walked.flux_density * walked.properties.cp
    return {
        "heat_flux": outcomes["heat"] / outcomes["plate_area"],
        "mean_h": walked.h,
        "least_h": sweep.least_stanton * capacity,
        "evenness": sweep.evenness,
        "heat_per_power": np.abs(outcomes["heat"]) / np.maximum(outcomes["fan_power"], 1e-12),
        "film_temperature": walked.film,
        "plate_mass": one_side * given["thickness"] * case.plates.material_density,
        "onset": _onset(walked) * given["length"],
        "turbulent_share": sweep.turbulent_share,
        "length_reynolds": walked.surface.re_l,
        "wire_reynolds": wired,
        "wire_margin": margin,
    }


def _onset(walked: Walked) -> Floats:
    """Where transition begins, as a share of the length; 1 where the plate stays laminar."""
    share = np.minimum(walked.sweep.onset.re_x / walked.surface.re_l, 1.0)
    return np.asarray(share ** smooth_step(walked.sweep.sustains, 0.0, 0.5))


def _fluid(case: Case, inlets: tuple[float, float] | None = None) -> Fluid:
    """Property table over all temperatures that the case can meet, at its inlet or others."""
    inlet, wall = case.fluid.temperature, case.plates.surface.temperature
    cold, hot = inlets or (inlet, inlet)
    if wall is not None:
        low, high = min(cold, wall), max(hot, wall)
    elif (case.plates.surface.flux or 0.0) > 0.0:
        low, high = cold, hot + _REACH
    else:
        low, high = max(cold - _REACH, 0.5 * cold), hot
    return fluids.fluid(
        case.fluid.name,
        case.fluid.pressure,
        low,
        high,
        humidity=case.fluid.humidity,
        reference_temperature=inlet,
    )


def joined(parts: list[Evaluation]) -> Evaluation:
    """Evaluations of consecutive designs as one."""
    first = parts[0]
    return Evaluation(
        settings={key: _end_to_end([p.settings[key] for p in parts]) for key in first.settings},
        outcomes={key: _end_to_end([p.outcomes[key] for p in parts]) for key in first.outcomes},
        possible=_end_to_end([p.possible for p in parts]),
        impossible_by=_end_to_end([p.impossible_by for p in parts]),
        reasons=_end_to_end([p.reasons for p in parts]),
        group=_end_to_end([p.group for p in parts]),
        outside={key: _end_to_end([p.outside[key] for p in parts]) for key in first.outside},
        cautions={key: _end_to_end([p.cautions[key] for p in parts]) for key in first.cautions},
        labels={key: _end_to_end([p.labels[key] for p in parts]) for key in first.labels},
    )


def _end_to_end(arrays: list[NDArray[_Scalar]]) -> NDArray[_Scalar]:
    return np.concatenate(arrays)

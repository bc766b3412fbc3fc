"""Fits the closed forms of `entrance` to the marched equations and writes their coefficients.

Run as `python -m problems.convection.fit_entrance`: marches, fits, writes entrance.csv, prints the
deviations. Not used at run time; the forms themselves stand in `entrance`.
"""

from __future__ import annotations

import csv
import os
from collections.abc import Iterator
from dataclasses import dataclass
from pathlib import Path

import numpy as np
from numpy.typing import NDArray
from scipy.interpolate import CubicSpline
from scipy.optimize import least_squares

from problems.convection import entrance
from problems.convection.entrance import Entrance, Nusselt, Resistance
from problems.convection.march import Developing, extrapolated

Floats = NDArray[np.float64]

NODES = np.geomspace(entrance.PR_LOW, entrance.PR_HIGH, 99)
_MIDDLE = 40  # the node from which the fits are continued to both ends, Pr about 70
_DISTANCES = np.geomspace(3e-8, 10.0, 150)  # x+ or x* of the fitted points
_PAIRS = 3  # complex pairs among the roots of D; with one real root the degree is 7
_KEEP = {1: 0.03, -1: 1.0}  # pull to what the last nodes foresee, for smoothness; up, down in Pr
_LOCAL = 0.6  # weight of a local deviation against one of a mean
_RISE = 30.0  # weight of a local value that rises where it should fall
_WATCHED = np.geomspace(1e-3, 10.0, 300)  # z where that is watched


@dataclass(frozen=True)
class Target:
    """What one fit must meet: z, values (m,) of the form itself, local values if it has any."""

    kind: type[Nusselt] | type[Resistance] | None
    lead: float
    base: float
    z: Floats
    mean: Floats
    local: Floats

    def deviations(self, form: Entrance) -> tuple[Floats, Floats]:
        """Relative deviations of the form and of its local values."""
        if self.kind is None:
            return form.value(self.z) / self.mean - 1.0, np.zeros(1)
        law = self.kind(form)
        return law.mean(self.z) / self.mean - 1.0, law.local(self.z) / self.local - 1.0

    def rises(self, form: Entrance) -> Floats:
        """How far the local Nusselt number or friction factor rises from one z to the next."""
        if self.kind is None:
            local = form.value(_WATCHED)
        else:
            local = self.kind(form).local(_WATCHED)
            local = 1.0 / local if self.kind is Resistance else local
        return np.maximum(np.diff(local), 0.0) / self.base


def heat_target(flow: Developing, index: int, flux: bool) -> Target:
    """Heat transfer at one Prandtl number of the march, carried on to long passages."""
    pr = flow.pr[index]
    means = flow.resistance_flux_mean if flux else flow.nu_temperature_mean
    locals_ = flow.resistance_flux if flux else flow.nu_temperature
    base = entrance.NU_FLUX if flux else entrance.NU_TEMPERATURE
    mean, local = _sampled(flow.x_plus / pr, means[:, index], locals_[:, index])
    return Target(
        kind=Resistance if flux else Nusselt,
        lead=float(entrance.lead_heat(pr, flux)),
        base=base,
        z=np.sqrt(_DISTANCES),
        mean=mean,
        local=local,
    )


def shear_target(flow: Developing) -> Target:
    """Wall shear of the march."""
    mean, local = _sampled(flow.x_plus, flow.shear_mean, flow.shear)
    z = np.sqrt(_DISTANCES)
    return Target(Nusselt, entrance.LEAD_SHEAR, entrance.SHEAR_DEVELOPED, z, mean, local)


def plain_target(flow: Developing, values: Floats, lead: float, base: float) -> Target:
    """One over the excess of `values` above 1."""
    inside = _DISTANCES[_DISTANCES < 0.05]
    value = CubicSpline(np.log(flow.x_plus), 1.0 / (values - 1.0))(np.log(inside))
    value = np.concatenate([value, np.full(_DISTANCES.size - inside.size, base)])
    return Target(None, lead, base, np.sqrt(_DISTANCES), value, value)


def _sampled(x: Floats, mean: Floats, local: Floats) -> tuple[Floats, Floats]:
    """Mean and local values at the fitted distances; behind x 0.29 the flow is developed."""
    long = 0.29
    inside = np.minimum(_DISTANCES, long)
    here = CubicSpline(np.log(x), local)(np.log(inside))
    summed = CubicSpline(np.log(x), mean * x)(np.log(inside))
    summed = summed + here * (_DISTANCES - inside)
    return summed / _DISTANCES, here


def form_of(parameters: Floats, target: Target) -> Entrance:
    """The closed form with these parameters.

    Logarithms of the real root and of size and damping of the pairs, which keep D positive; then
    the coefficients of N in units of the geometric mean of the roots.
    """
    bottom = np.array([1.0, np.exp(-parameters[0])])
    for log_size, log_damping in parameters[1 : 1 + 2 * _PAIRS].reshape(-1, 2):
        inverse = np.exp(-log_size)
        bottom = np.convolve(bottom, [1.0, (np.exp(log_damping) - 2.0) * inverse, inverse**2])
    top = parameters[1 + 2 * _PAIRS :] * _scales(bottom)
    return Entrance(target.base, np.array([target.lead, *top]), bottom[1:])


def _scales(bottom: Floats) -> Floats:
    degree = bottom.size - 1
    return np.asarray(bottom[-1] ** (np.arange(1, degree) / degree))


def fit(target: Target, guess: Floats, keep: float) -> Floats:
    """Parameters that meet the target best in least squares, near `guess`, local values falling."""

    def misses(parameters: Floats) -> Floats:
        form = form_of(parameters, target)
        mean, local = target.deviations(form)
        ripple = _RISE * target.rises(form)
        drift = keep * (parameters - guess)
        return np.concatenate([1e3 * mean, 1e3 * _LOCAL * local, 1e3 * ripple, drift])

    return np.asarray(least_squares(misses, guess, x_scale="jac", max_nfev=3000).x)


def first_guess(target: Target) -> Floats:
    """Roots spread over the entrance length, N by linear least squares."""
    roots = np.array([-5.5, -4.0, 0.7, -2.5, 0.3, -2.2, -1.5])
    empty = form_of(np.concatenate([roots, np.zeros(2 * _PAIRS)]), target)
    below = 1.0 / (empty.value(target.z) - target.base) * target.lead  # z D
    columns = target.z[:, None] ** np.arange(1, 2 * _PAIRS + 1) / below[:, None]
    columns *= _scales(np.array([1.0, *empty.bottom]))
    mean = 1.0 / target.mean if target.kind is Resistance else target.mean
    rest = mean - empty.value(target.z)
    top = np.linalg.lstsq(columns / mean[:, None], rest / mean, rcond=None)[0]
    return np.concatenate([roots, top])


def continued(targets: list[Target]) -> list[Floats]:
    """Parameters for every node, from the middle one to both ends, each foreseen from the last."""
    found = {_MIDDLE: fit(targets[_MIDDLE], first_guess(targets[_MIDDLE]), 1e-3)}
    for way in (1, -1):
        index = _MIDDLE + way
        while 0 <= index < len(targets):
            last = found[index - way]
            foreseen = 2.0 * last - found.get(index - 2 * way, last)
            found[index] = fit(targets[index], foreseen, _KEEP[way])
            index += way
    return [found[index] for index in range(len(targets))]


def all_fits(flow: Developing) -> Iterator[tuple[str, float | None, Target, Entrance]]:
    """Every fit: law, Prandtl number if it has one, what it had to meet and the form."""
    singles = {
        "shear": shear_target(flow),
        "momentum": plain_target(flow, flow.momentum, entrance.LEAD_MOMENTUM, 5.0),
        "core": plain_target(flow, flow.core, entrance.LEAD_CORE, 2.0),
    }
    for law, target in singles.items():
        yield law, None, target, form_of(fit(target, first_guess(target), 1e-3), target)
    for law in ("temperature", "flux"):
        targets = [heat_target(flow, i, law == "flux") for i in range(flow.pr.size)]
        for pr, target, parameters in zip(flow.pr, targets, continued(targets), strict=True):
            yield law, float(pr), target, form_of(parameters, target)


def write(rows: list[list[str]], path: Path) -> None:
    """Write the coefficients as a whole or not at all."""
    degree = 2 * _PAIRS + 1
    names = [f"n{k}" for k in range(1, degree)] + [f"d{k}" for k in range(1, degree + 1)]
    draft = path.with_suffix(".tmp")
    with draft.open("w", newline="", encoding="utf-8") as lines:
        writer = csv.writer(lines, lineterminator="\n")
        writer.writerow(["law", "pr", *names])
        writer.writerows(rows)
    os.replace(draft, path)


def main() -> None:
    """March, fit, write, report."""
    rows = []
    for law, pr, target, form in all_fits(extrapolated(NODES)):
        numbers = [*form.top[1:], *form.bottom]
        rows.append([law, "" if pr is None else f"{pr:.10g}", *(f"{x:.12g}" for x in numbers)])
        mean, local = (100.0 * np.abs(part).max() for part in target.deviations(form))
        shown = "" if pr is None else f"{pr:.4g}"
        print(f"{law:12s} {shown:>8s}  mean within {mean:.3f} %, local within {local:.3f} %")
    write(rows, entrance.COEFFICIENTS)


if __name__ == "__main__":
    main()

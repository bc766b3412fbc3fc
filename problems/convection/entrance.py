"""Laminar flow developing between two plates, in closed forms that are cheap on arrays.

Friction, heat, core velocity and momentum factor from separate layers to developed flow, fitted
by `fit_entrance` to the equations marched in `march`. Turbulence is left to `passage`.

Range of validity: uniform inlet stream, constant properties, Re_D from 50 or so, Pr 0.5 to 1e5.
"""

from __future__ import annotations

import csv
from collections.abc import Sequence
from dataclasses import dataclass
from functools import cache
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from problems.convection import flat_plate

Floats = NDArray[np.float64]

COEFFICIENTS = Path(__file__).with_name("entrance.csv")
PR_LOW, PR_HIGH = 0.5, 1e5
NU_TEMPERATURE = 7.540700874  # developed, both walls at one temperature; Graetz, computed
NU_FLUX = 140.0 / 17.0  # developed, uniform flux from both walls; exact
SHEAR_DEVELOPED = 24.0  # f Re_D of the parabola; exact
# Near the inlet each wall is one plate under a core that makes room for the layers: mean shear,
# and one over what core velocity and Kd exceed 1 by, times z (half a gap is a quarter of D_h).
LEAD_SHEAR = 2.0 * flat_plate.BLASIUS
LEAD_CORE = 0.25 / flat_plate.DISPLACEMENT
LEAD_MOMENTUM = 0.25 / (flat_plate.DISPLACEMENT - flat_plate.BLASIUS)
_FINE = 16  # rows of the working table to one row of the file


@dataclass(frozen=True)
class Entrance:
    """A quantity that falls as `lead`/z at first and tends to `base` as 1/z^2 in the end.

    base + N(z)/(z D(z)), coefficients lowest power first, the constant term of D being 1. A mean
    from the inlet approaches its end value as one over distance, hence the degrees of N and D.
    Coefficients are arrays that broadcast against z.
    """

    base: float
    top: Sequence[Floats] | Floats
    bottom: Sequence[Floats] | Floats

    def value(self, z: Floats) -> Floats:
        """The quantity at z > 0."""
        return self.base + _horner(self.top, z) / (z * _denominator(self.bottom, z))

    def value_and_slope(self, z: Floats) -> tuple[Floats, Floats]:
        """The quantity and z times its derivative at z > 0."""
        below = _denominator(self.bottom, z)
        above = _horner(self.top, z)
        rise = _horner([k * c for k, c in enumerate(self.top)][1:], z) * z
        growth = _horner([k * c for k, c in enumerate(self.bottom, 1)], z) * z
        share = 1.0 / (z * below)
        return self.base + above * share, (rise - above * (1.0 + growth / below)) * share


@dataclass(frozen=True)
class Nusselt:
    """Nusselt number on D_h for uniform wall temperature, wall less bulk, at z = sqrt(x*)."""

    form: Entrance

    def mean(self, z: Floats) -> Floats:
        """Mean from the inlet."""
        return self.form.value(z)

    def local(self, z: Floats) -> Floats:
        """Local value: the derivative of the mean times x."""
        value, slope = self.form.value_and_slope(z)
        return value + 0.5 * slope


@dataclass(frozen=True)
class Resistance:
    """One over the Nusselt number on D_h for uniform wall flux, at z = sqrt(x*).

    Its mean is what the mean of wall less bulk temperature under a uniform flux follows.
    """

    form: Entrance

    def mean(self, z: Floats) -> Floats:
        """Mean from the inlet."""
        return 1.0 / self.form.value(z)

    def local(self, z: Floats) -> Floats:
        """Local value: the derivative of the mean times x."""
        value, slope = self.form.value_and_slope(z)
        return (value - 0.5 * slope) / value**2


def shear_mean(z: Floats) -> Floats:
    """Mean wall shear from the inlet, Fanning f Re_D [-], at z = sqrt(x+).

    Pressure drop is more than that: f_app Re_D = shear_mean + (momentum_factor - 1)/(2 z^2).
    """
    return _shear().value(z)


def shear_local(z: Floats) -> Floats:
    """Local wall shear, Fanning f Re_D [-], at z = sqrt(x+)."""
    value, slope = _shear().value_and_slope(z)
    return value + 0.5 * slope


def momentum_factor(z: Floats) -> Floats:
    """Momentum factor Kd [-], mean of (u/u_mean)^2, at z = sqrt(x+): from 1 to 6/5."""
    return 1.0 + 1.0 / _momentum().value(z)


def core_velocity(z: Floats) -> Floats:
    """Velocity in the middle of the gap over mean velocity [-] at z = sqrt(x+): from 1 to 3/2."""
    return 1.0 + 1.0 / _core().value(z)


def nusselt_temperature(pr: Floats) -> Nusselt:
    """Heat transfer with both walls at one temperature; `pr` (n,) or (n, 1) against z (n, m).

    Beyond Pr 0.5 to 1e5 the nearer end of that range is used.
    """
    pr = np.clip(pr, PR_LOW, PR_HIGH)
    return Nusselt(_heat("temperature", pr, NU_TEMPERATURE))


def resistance_flux(pr: Floats) -> Resistance:
    """Thermal resistance with uniform flux from both walls; `pr` as in `nusselt_temperature`."""
    pr = np.clip(pr, PR_LOW, PR_HIGH)
    return Resistance(_heat("flux", pr, NU_FLUX))


def lead_heat(pr: Floats, flux: bool) -> Floats:
    """What the mean tends to at the inlet, times z: the law of one plate.

    Nu_m = 2 c/(sqrt(Pr) z) for wall temperature; one over the mean resistance,
    1.5 c/(sqrt(Pr) z), for wall flux.
    """
    share = 1.5 if flux else 2.0
    return share * flat_plate.laminar_heat_constant(pr, flux) / np.sqrt(pr)


def _heat(law: str, pr: Floats, base: float) -> Entrance:
    """Coefficients for each Prandtl number, linear in ln Pr on the working table."""
    table = _working_table(law)
    place = np.log(pr / PR_LOW) * ((table.shape[1] - 1) / np.log(PR_HIGH / PR_LOW))
    row = np.minimum(place.astype(np.intp), table.shape[1] - 2)
    share = place - row
    low = np.take(table, row, axis=1)
    found = low + share * (np.take(table, row + 1, axis=1) - low)
    half = table.shape[0] // 2
    return Entrance(base, [lead_heat(pr, law == "flux"), *found[:half]], found[half:])


def _denominator(bottom: Sequence[Floats] | Floats, z: Floats) -> Floats:
    return 1.0 + z * _horner(bottom, z)


def _horner(coefficients: Sequence[Floats] | Floats, z: Floats) -> Floats:
    """The polynomial with these coefficients, lowest power first."""
    total = coefficients[-1] * z
    for coefficient in coefficients[-2:0:-1]:
        total += coefficient
        total *= z
    total += coefficients[0]
    return total


@cache
def _shear() -> Entrance:
    return _single("shear", SHEAR_DEVELOPED, LEAD_SHEAR)


@cache
def _momentum() -> Entrance:
    """One over Kd - 1."""
    return _single("momentum", 5.0, LEAD_MOMENTUM)


@cache
def _core() -> Entrance:
    """One over the core's excess velocity."""
    return _single("core", 2.0, LEAD_CORE)


def _single(law: str, base: float, lead: float) -> Entrance:
    row = _read()[law][:, 0]
    half = len(row) // 2
    return Entrance(base, np.array([lead, *row[:half]]), row[half:])


@cache
def _working_table(law: str) -> Floats:
    """Coefficients (2 d - 1, rows) on a fine uniform grid of ln Pr, by cubics through four rows."""
    nodes = _read()[law]
    count = nodes.shape[1]
    place = np.linspace(0.0, count - 1.0, _FINE * (count - 1) + 1)
    first = np.clip(place.astype(np.intp) - 1, 0, count - 4)
    s = place - first
    weights = (
        -(s - 1.0) * (s - 2.0) * (s - 3.0) / 6.0,
        s * (s - 2.0) * (s - 3.0) / 2.0,
        -s * (s - 1.0) * (s - 3.0) / 2.0,
        s * (s - 1.0) * (s - 2.0) / 6.0,
    )
    return sum((w * nodes[:, first + k] for k, w in enumerate(weights)), np.zeros(1))


@cache
def _read() -> dict[str, Floats]:
    """Coefficients of each law in the file, (2 d - 1, number of Pr), numerator first."""
    laws: dict[str, list[list[float]]] = {}
    with COEFFICIENTS.open(newline="", encoding="utf-8") as lines:
        for row in csv.DictReader(lines):
            numbers = [float(text) for name, text in row.items() if name[0] in "nd" and text]
            laws.setdefault(row["law"], []).append(numbers)
    return {law: np.array(rows).T for law, rows in laws.items()}

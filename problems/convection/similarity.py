"""The exact laminar layer on one plate, from its similarity equations.

Blasius 1908 for velocity, Pohlhausen 1921 for a wall temperature and the like for a wall flux.
Computed, not fitted: the start of `march` and a reference for the laws of `flat_plate`.
"""

from __future__ import annotations

from functools import cached_property

import numpy as np
from numpy.typing import NDArray
from scipy.integrate import solve_ivp
from scipy.linalg import solve_banded

Floats = NDArray[np.float64]

FAR = 14.0  # outer edge of the solutions, in x Re_x^-1/2
_BLASIUS_WALL = 0.33205733621519630  # f''(0), Blasius 1908; computed


class Similarity:
    """The layer on one plate: Blasius' velocity, Pohlhausen's temperature and the flux case."""

    def __init__(self, points: int = 8000) -> None:
        self.eta = FAR * np.expm1(8.0 * np.linspace(0.0, 1.0, points)) / np.expm1(8.0)
        solution = solve_ivp(
            lambda _, f: (f[1], f[2], -0.5 * f[0] * f[2]),
            (0.0, FAR),
            (0.0, 0.0, _BLASIUS_WALL),
            t_eval=self.eta,
            rtol=1e-12,
            atol=1e-14,
            method="DOP853",
        )
        self.stream, self.velocity, _ = solution.y

    @cached_property
    def displacement(self) -> float:
        """delta* over x Re_x^-1/2."""
        return float(self.eta[-1] - self.stream[-1])

    def temperature(self, pr: float) -> Floats:
        """Temperature over wall temperature, stream 1; at `eta`."""
        return 1.0 - self._conduction(pr, flux=False)

    def excess(self, pr: float) -> Floats:
        """Temperature over stream temperature above a wall of unit slope -1 in eta; at `eta`."""
        return self._conduction(pr, flux=True)

    def heat_constant(self, pr: float, flux: bool) -> float:
        """Constant c of Nu_x = c Re_x^1/2 on one plate."""
        if flux:
            return float(1.0 / self.excess(pr)[0])
        a, b = self.eta[1:3]
        low, high = self.temperature(pr)[1:3]
        return float((low * b / a - high * a / b) / (b - a))

    def _conduction(self, pr: float, flux: bool) -> Floats:
        """Solve t'' + Pr/2 (f t' - f' t) = 0, the last term with `flux` alone, zero far out."""
        before, after = np.diff(self.eta)[:-1], np.diff(self.eta)[1:]
        span = before + after
        drift = 0.5 * pr * self.stream[1:-1]
        bands = np.zeros((3, self.eta.size))
        bands[0, 2:] = 2.0 / (after * span) + drift * before / (after * span)
        bands[2, :-2] = 2.0 / (before * span) - drift * after / (before * span)
        bands[1, 1:-1] = -2.0 / (before * after) + drift * (after - before) / (before * after)
        if flux:
            bands[1, 1:-1] -= 0.5 * pr * self.velocity[1:-1]
        bands[1, [0, -1]] = 1.0
        known = np.zeros(self.eta.size)
        known[0] = 1.0
        if flux:  # t''(0) = 0: the wall cell's slope is the wall's own to second order
            bands[0, 1] = -1.0
            known[0] = self.eta[1]
        return np.asarray(solve_banded((1, 1), bands, known))

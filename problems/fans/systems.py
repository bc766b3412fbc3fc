"""What the fan has to overcome: pressure over flow of plates, ducts and filters.

`System` is the usual sum of a held, a linear and a square part; `SampledSystem` goes through
readings of a model. Where a fan curve meets it is for `duty`.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike

from problems.problem import Floats

Drop = Callable[[Floats], Floats]


@dataclass(frozen=True)
class System:
    """dp = constant + linear q + square q^2, in Pa and m3/s; each a number or of shape (n,).

    `square` is turbulent resistance (ducts, bends, ends), `linear` laminar (narrow gaps, most
    filter media), `constant` a pressure held whatever the flow. None is below 0.
    """

    constant: ArrayLike = 0.0
    linear: ArrayLike = 0.0
    square: ArrayLike = 0.0

    def __call__(self, flow: Floats) -> Floats:
        """Pressure drop [Pa] at `flow` [m3/s], any shape that broadcasts."""
        constant, linear, square = self.parts
        return np.asarray((square * flow + linear) * flow + constant)

    @property
    def parts(self) -> tuple[Floats, Floats, Floats]:
        """The three factors as arrays."""
        return np.asarray(self.constant), np.asarray(self.linear), np.asarray(self.square)

    def of(self, index: slice, n: int) -> System:
        """The system of some of the n designs."""
        return System(*(np.broadcast_to(part, n)[index] for part in self.parts))

    def __add__(self, other: System) -> System:
        """Both in series."""
        return System(*(mine + its for mine, its in zip(self.parts, other.parts, strict=True)))

    def times(self, factor: ArrayLike) -> System:
        """The same with `factor` times the resistance; a held pressure stays."""
        constant, linear, square = self.parts
        return System(constant, linear * np.asarray(factor), square * np.asarray(factor))

    def at_density(self, ratio: ArrayLike) -> System:
        """The same swept by a fluid `ratio` times as dense and as viscous as before."""
        constant, linear, square = self.parts
        return System(constant, linear, square * np.asarray(ratio))

    @staticmethod
    def turbulent(flow: ArrayLike, drop: ArrayLike) -> System:
        """A resistance of `drop` [Pa] at `flow` [m3/s] that grows with the square of the flow."""
        return System(square=np.asarray(drop) / np.asarray(flow) ** 2)

    @staticmethod
    def laminar(flow: ArrayLike, drop: ArrayLike) -> System:
        """A resistance of `drop` [Pa] at `flow` [m3/s] that grows in proportion to the flow."""
        return System(linear=np.asarray(drop) / np.asarray(flow))

    @staticmethod
    def between(flow: Floats, drop: Floats, less_flow: Floats, less_drop: Floats) -> System:
        """The system through two readings, shape (n,); exact at `flow`, the larger one.

        Where no linear and square parts of 0 or more pass through the second reading, the nearest
        of the two pure laws is taken.
        """
        slope, less_slope = drop / flow, less_drop / less_flow
        square = np.clip((slope - less_slope) / (flow - less_flow), 0.0, slope / flow)
        return System(linear=slope - square * flow, square=square)


@dataclass(frozen=True)
class SampledSystem:
    """Pressure drop through J readings of each of n designs, shapes (J, n).

    Between readings a cubic in ln dp over ln q; outside them the power law of the nearest reading
    goes on, so ask `covers`. Readings stand at flows that rise by the same factor.
    """

    flow: Floats
    drop: Floats

    def of(self, index: slice, n: int) -> SampledSystem:
        """The system of some of the n designs."""
        return SampledSystem(self.flow[:, index], self.drop[:, index])

    def covers(self, flow: Floats) -> np.ndarray[tuple[int, ...], np.dtype[np.bool_]]:
        """Whether `flow`, shape (..., n), lies between the readings."""
        return np.asarray((flow >= self.flow[0]) & (flow <= self.flow[-1]))

    def __call__(self, flow: Floats) -> Floats:
        """Pressure drop [Pa] at `flow` [m3/s] of shape (..., n), above 0."""
        x, y = np.log(self.flow), np.log(self.drop)
        step = (x[-1] - x[0]) / (len(x) - 1)
        slope = np.gradient(y, axis=0)
        with np.errstate(divide="ignore"):
            at = (np.log(flow) - x[0]) / step
        node = np.clip(np.nan_to_num(at, neginf=0.0), 0, len(x) - 2).astype(np.intp)
        inside = np.clip(at, 0.0, len(x) - 1.0)
        t, design = inside - node, np.arange(x.shape[1])
        y0, y1, s0, s1 = (
            y[node, design],
            y[node + 1, design],
            slope[node, design],
            slope[node + 1, design],
        )
        rise = y1 - y0
        cubic = y0 + t * (s0 + t * (3.0 * rise - 2.0 * s0 - s1 + t * (s0 + s1 - 2.0 * rise)))
        return np.asarray(np.exp(cubic + (at - inside) * np.where(at > inside, s1, s0)))

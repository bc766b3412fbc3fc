"""Inputs that are not known exactly: how each is spread, and what designs give over a sample.

Data and quantile functions only. What a case says of its uncertain inputs is read in `spreads`,
what an input changes in an evaluation is for the kinds, how samples are drawn for `optim`.
"""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass
from typing import Literal

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]
Bools = NDArray[np.bool_]
Shape = Literal["uniform", "normal", "log-uniform", "log-normal"]
SHAPES: tuple[Shape, ...] = ("uniform", "normal", "log-uniform", "log-normal")

HELD = 0.95  # share of a normal distribution between the two ends that are stated
_CUT = 3.0  # standard deviations at which a normal distribution is cut off


@dataclass(frozen=True)
class Uncertain:
    """An input that is not known exactly, in the SI unit `unit`.

    What is drawn is the `value` itself, a `change` that is added to the design's own, or a
    `factor` that multiplies it; `nominal` is the one that stands for the case as it is. `low` and
    `high` are the ends of a uniform shape and hold 95 % of a normal one, which is cut off at three
    standard deviations; the shapes that begin with "log-" are so in the logarithm. `usual` tells
    that the program assumed it, and `source` why.
    """

    name: str
    unit: str
    meaning: str
    sort: Literal["value", "change", "factor"]
    nominal: float
    low: float
    high: float
    shape: Shape
    source: str
    usual: bool = False

    @property
    def exact(self) -> bool:
        """Whether there is nothing uncertain about it."""
        return self.low == self.high

    @property
    def ends(self) -> tuple[float, float]:
        """The least and the greatest that can be drawn."""
        low, high = self.drawn(np.array([0.0, 1.0]))
        return float(low), float(high)

    def drawn(self, share: Floats) -> Floats:
        """The quantile at `share` (any shape, 0 to 1): what a sample of the unit cube means."""
        low, high = self.low, self.high
        if self.shape.startswith("log-"):
            low, high = math.log(low), math.log(high)
        if self.shape.endswith("normal"):
            found = 0.5 * (low + high) + 0.5 * (high - low) * _deviates(share)
        else:
            found = low + (high - low) * np.asarray(share, dtype=float)
        return np.exp(found) if self.shape.startswith("log-") else np.asarray(found)


def _deviates(share: Floats) -> Floats:
    """Quantiles of the normal distribution, cut off, in units of half the stated band."""
    from scipy.special import ndtr, ndtri

    tail = float(ndtr(-_CUT))
    inside = tail + (1.0 - 2.0 * tail) * np.asarray(share, dtype=float)
    return np.asarray(ndtri(inside) / float(ndtri(0.5 + 0.5 * HELD)))


@dataclass(frozen=True)
class Sampled:
    """What n designs give at each of m draws of the uncertain inputs; arrays of shape (n, m).

    `outcomes` holds outcomes and settings by name, without a NaN; `possible` is false where the
    design cannot exist or cannot be driven under that draw: its figures mean nothing there.
    """

    outcomes: Mapping[str, Floats]
    possible: Bools

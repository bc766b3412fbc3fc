"""Roots of falling functions, every element of an array at once, each kept in its bracket.

Pure numerics; what falls and why is for the callers.
"""

from __future__ import annotations

from collections.abc import Callable

import numpy as np

from problems.problem import Floats

_ROUNDS = 60  # of Newton's steps; a dozen do, the rest is for curves with corners
_CLOSE = 1e-13  # last step over the width of the bracket


def falling_cubic_root(c0: Floats, c1: Floats, c2: Floats, c3: Floats, width: Floats) -> Floats:
    """Root between 0 and `width` of a cubic that falls there; the nearer end where it has none.

    Newton's steps from the secant, halving the bracket wherever one would leave it.
    """
    at_end = ((c3 * width + c2) * width + c1) * width + c0
    low, high = np.zeros_like(width), width
    inside = (c0 > 0.0) & (at_end < 0.0)
    x = np.where(
        inside, width * c0 / np.where(inside, c0 - at_end, 1.0), np.where(c0 > 0.0, width, 0.0)
    )
    with np.errstate(divide="ignore", invalid="ignore"):
        for _ in range(_ROUNDS):
            value = ((c3 * x + c2) * x + c1) * x + c0
            step = x - value / ((3.0 * c3 * x + 2.0 * c2) * x + c1)
            right = value > 0.0
            low, high = np.where(right, x, low), np.where(right, high, x)
            step = np.where((step >= low) & (step <= high), step, 0.5 * (low + high))
            step = np.where(inside, step, x)
            done = np.abs(step - x) <= _CLOSE * width
            x = step
            if done.all():
                break
    return x


def falling_root(function: Callable[[Floats], Floats], low: Floats, high: Floats) -> Floats:
    """Where `function`, falling in each element, passes 0 between `low` and `high`, any shape.

    The nearer end where it does not. False position after Anderson and Björck 1973, with a halving
    wherever three rounds have not halved the bracket.
    """
    f_low, f_high = function(low), function(high)
    none, all_below = f_high >= 0.0, f_low <= 0.0
    end = np.where(none, high, low)
    fixed = none | all_below
    before, x = high - low, end
    side = np.zeros(low.shape, dtype=np.int8)
    for turn in range(_ROUNDS * 2):
        gap = np.where(fixed, 1.0, f_low - f_high)
        new = low + (high - low) * np.where(fixed, 0.5, f_low / gap)
        if turn % 3 == 2:
            new = np.where(high - low > 0.5 * before, 0.5 * (low + high), new)
            before = high - low
        value = function(np.where(fixed, end, new))
        right = value > 0.0
        old = np.where(right, f_low, f_high)
        shrink = 1.0 - value / np.where(old == 0.0, 1.0, old)
        shrink = np.where(shrink > 0.0, shrink, 0.5)
        f_high = np.where(right, np.where(side == 1, f_high * shrink, f_high), value)
        f_low = np.where(right, value, np.where(side == -1, f_low * shrink, f_low))
        low, high = np.where(right, new, low), np.where(right, high, new)
        side = np.where(right, 1, -1).astype(np.int8)
        moved, x = np.abs(new - x), new
        near = (moved <= 1e-12 * high) | (value == 0.0)
        if np.all(fixed | near):
            break
    return np.where(fixed, end, x)

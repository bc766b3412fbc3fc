"""Roots of falling functions, every element of an array at once, each kept in its bracket.

Pure numerics; what falls and why is for the callers.
"""

from __future__ import annotations

from collections.abc import Callable

import numpy as np

from problems.problem import Floats

_ROUNDS = 80  # a dozen do, the rest is for curves with corners
_CLOSE = 1e-13  # last step over the width of the bracket


def falling_cubic_root(c0: Floats, c1: Floats, c2: Floats, c3: Floats, width: Floats) -> Floats:
    """Root between 0 and `width` of cubics that fall there; the nearer end where there is none.

    Newton's steps from the secant, halving the bracket wherever one would leave it; work stops on
    what is found. All of one shape.
    """
    at_end = ((c3 * width + c2) * width + c1) * width + c0
    root = np.where(c0 > 0.0, width, 0.0)
    left = np.flatnonzero((c0 > 0.0) & (at_end < 0.0))
    c0, c1, c2, c3, high = (x.ravel().take(left) for x in (c0, c1, c2, c3, width))
    x = high * c0 / (c0 - at_end.ravel().take(left))
    low, close = np.zeros_like(high), _CLOSE * high
    found = root.ravel()
    for turn in range(_ROUNDS):
        with np.errstate(divide="ignore", invalid="ignore"):
            value = ((c3 * x + c2) * x + c1) * x + c0
            step = x - value / ((3.0 * c3 * x + 2.0 * c2) * x + c1)
        right = value > 0.0
        low, high = np.where(right, x, low), np.where(right, high, x)
        step = np.where((step >= low) & (step <= high), step, 0.5 * (low + high))
        moving = np.abs(step - x) > close
        x = step
        if turn % 3 == 2 or turn == _ROUNDS - 1:
            found[left] = x
            still = np.flatnonzero(moving)
            if not still.size:
                break
            left, close = left.take(still), close.take(still)
            x, low, high = x.take(still), low.take(still), high.take(still)
            c0, c1, c2, c3 = (term.take(still) for term in (c0, c1, c2, c3))
    return found.reshape(root.shape)


def falling_root(function: Callable[[Floats], Floats], low: Floats, high: Floats) -> Floats:
    """Where `function`, falling in each element, passes 0 between `low` and `high`, any shape.

    The nearer end where it does not. Inverse quadratic steps where they are safe, halving where
    not: Chandrupatla 1997, Adv. Eng. Softw. 28, 145-149 (from memory).
    """
    f_low, f_high = function(low), function(high)
    beyond, below = f_high >= 0.0, f_low <= 0.0
    fixed, end = beyond | below, np.where(beyond, high, low)
    # a: newest, b: on the other side of the root, c: the one before
    a, fa, b, fb = high, f_high, low, f_low
    c, fc, t = a, fa, np.full(np.shape(low), 0.5)
    done = fixed
    for _ in range(_ROUNDS):
        x = np.where(done, a, a + t * (b - a))
        fx = function(np.where(fixed, end, x))
        same = (fx > 0.0) == (fa > 0.0)
        c, fc = np.where(same, a, b), np.where(same, fa, fb)
        b, fb = np.where(same, b, a), np.where(same, fb, fa)
        a, fa = x, fx
        near = 2.0 * _CLOSE * np.maximum(np.abs(a), np.abs(b))
        done = done | (fa == 0.0) | (np.abs(b - a) <= 2.0 * near)
        if done.all():
            break
        t = _next_step(a, b, c, fa, fb, fc)
        with np.errstate(divide="ignore", invalid="ignore"):
            least = np.where(done, 0.5, near / np.abs(b - a))
        t = np.clip(t, least, 1.0 - least)
    return np.where(fixed, end, a)


def _next_step(a: Floats, b: Floats, c: Floats, fa: Floats, fb: Floats, fc: Floats) -> Floats:
    """Share of the way from `a` to `b` at which to look next."""
    with np.errstate(all="ignore"):
        xi, phi = (a - b) / (c - b), (fa - fb) / (fc - fb)
        curved = fa / (fb - fa) * fc / (fb - fc)
        curved = curved + (c - a) / (b - a) * fa / (fc - fa) * fb / (fc - fb)
        safe = (phi**2 < xi) & ((1.0 - phi) ** 2 < 1.0 - xi) & np.isfinite(curved)
    return np.where(safe, curved, 0.5)

"""Draws of uncertain inputs: one scrambled Sobol sample that every design shares.

Shared draws make designs comparable: each meets the same days, the same laws, the same tolerances.
How an input is spread is known to the problem.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence

import numpy as np

from problems.problem import Floats
from problems.uncertain import Uncertain

Draws = Mapping[str, Floats]


def shared(inputs: Sequence[Uncertain], count: int, seed: int) -> dict[str, Floats]:
    """`count` draws (a power of 2) of each input, shape (count,), by name.

    Sobol's sequence, scrambled by Owen's method (scipy); the first 2^k draws of a sample are the
    sample of 2^k. Without inputs there are no draws.
    """
    if not inputs:
        return {}
    return drawn(inputs, _sobol(len(inputs), count, seed))


def pair(inputs: Sequence[Uncertain], count: int, seed: int) -> tuple[Floats, Floats]:
    """Two independent samples of the unit cube (count, inputs), as Saltelli's design wants them."""
    both = _sobol(2 * len(inputs), count, seed)
    return both[:, : len(inputs)], both[:, len(inputs) :]


def drawn(inputs: Sequence[Uncertain], cube: Floats) -> dict[str, Floats]:
    """What a sample of the unit cube (count, inputs) means, by name."""
    return {known.name: known.drawn(cube[:, place]) for place, known in enumerate(inputs)}


def _sobol(dimensions: int, count: int, seed: int) -> Floats:
    from scipy.stats import qmc

    rng = np.random.default_rng(seed)
    return np.asarray(qmc.Sobol(dimensions, scramble=True, seed=rng, bits=62).random(count))

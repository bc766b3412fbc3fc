"""Turbulent mixing by algebra: an eddy viscosity and a turbulent Prandtl number.

A mixing length, damped at the wall, that holds on one plate and grows into that of a full gap. The
equations that use it are marched in `march_surface`; intermittency comes from `transition`.

Range of validity: smooth wall, weak pressure gradients, Re_theta from 200 or so, Pr 0.5 to 100.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from problems.convection.flat_plate import smooth_step

Floats = NDArray[np.float64]

KAPPA = 0.41  # constant of the logarithmic law
DAMPING = 25.0  # A+ that goes with this kappa (Kays and Crawford, from memory)
_OUTER = 0.09  # outer mixing length over delta_99, Patankar and Spalding and others (from memory)
_OUTER_LOW = 0.25  # times Re_theta^-1/8 where that is more: thin layers, Crawford and Kays (memory)
_FILLING, _FULL = 0.4, 0.85  # delta_99 over half gap while the length grows into that of the gap
_INTERMITTENT = 1.5  # power of the intermittency that weighs the eddy viscosity
_PRANDTL = 0.9  # turbulent Prandtl number away from the wall, common practice
# damping of heat, Na and Habib 1973 (from memory; they looked at Pr up to 15)
_HEAT_DAMPING = (34.96, 28.79, 33.95, 6.33, -1.186)


def mixing_length(
    y: Floats, damping: Floats, re_theta: Floats, thickness: Floats, half_gap: Floats | None
) -> Floats:
    """Mixing length at y (n, m) in a layer of `re_theta` and delta_99 `thickness` (n, 1).

    kappa y times `damping` at the wall (n, m); further out a share of delta_99, 0.09 or in thin
    layers 0.25 Re_theta^-1/8. In a gap it goes over into Nikuradse's l/h = 0.14 - 0.08 r^2 -
    0.06 r^4, r = 1 - y/h, as the layers fill the half gap h (n, 1); the way over is our choice.
    """
    inner = KAPPA * y * damping
    level = np.maximum(_OUTER, _OUTER_LOW * np.maximum(re_theta, 50.0) ** -0.125) * thickness
    ratio = (inner / level) ** 2
    layer = inner / np.sqrt(np.sqrt(1.0 + ratio * ratio))  # the lesser of both, corner rounded
    if half_gap is None:
        return np.asarray(layer)
    square = (1.0 - y / half_gap) ** 2
    filled = (KAPPA / 0.4) * half_gap * (0.14 - (0.08 + 0.06 * square) * square) * damping
    return np.asarray(layer + smooth_step(thickness / half_gap, _FILLING, _FULL) * (filled - layer))


def wall_damping(y_plus: Floats) -> Floats:
    """Share of the mixing length that the wall leaves, 1 - exp(-y+/A+); Van Driest 1956."""
    return np.asarray(-np.expm1(y_plus / -DAMPING))


def eddy_viscosity(
    y: Floats,
    slope: Floats,
    shear: Floats,
    layer: tuple[Floats, Floats],
    half_gap: Floats | None,
    gamma: Floats,
) -> Floats:
    """Eddy over molecular viscosity at y (n, m) with velocity slope (n, m) there.

    Lengths in nu/U and velocities in U, one U for a design; `shear` (n, 1) is the velocity slope
    at the wall, `layer` Re_theta and delta_99, `half_gap` (n, 1), `gamma` (n, 1) the share of time
    that the layer is turbulent. Friction and heat mix with that share if the eddy viscosity does
    with its power 1.5 (ours: within 0.03 in developed flow between plates; with power 1 they
    would rise too early, 0.13 at a half).
    """
    damping = wall_damping(y * np.sqrt(shear))
    length = mixing_length(y, damping, *layer, half_gap)
    return np.asarray(gamma**_INTERMITTENT * length**2 * np.abs(slope))


def turbulent_prandtl(y_plus: Floats, pr: Floats) -> Floats:
    """Turbulent Prandtl number at y+ (n, m) > 0 for Prandtl numbers (n, 1); Na and Habib 1973.

    0.9 (1 - exp(-y+/A+))/(1 - exp(-y+/B+)), Pr^1/2 B+ a quartic in log10 Pr: 0.9 away from the
    wall, and at the wall what lets heat through at high Pr.
    """
    quartic = np.polynomial.polynomial.polyval(np.log10(pr), _HEAT_DAMPING)
    heat = -np.expm1(-y_plus * np.sqrt(pr) / quartic)
    return np.asarray(_PRANDTL * wall_damping(y_plus) / heat)

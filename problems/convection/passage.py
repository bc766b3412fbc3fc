"""Flow between two plates: fully developed turbulence, the band below it, merging, ends.

Pure functions on arrays. Reynolds numbers stand on the hydraulic diameter (twice the gap) and the
mean velocity. Laminar entrance flow is in `entrance`, the walk along the plate in `sweep`.
"""

from __future__ import annotations

from typing import Literal

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]

BAND_LOW, BAND_HIGH = 2300.0, 4000.0  # Gnielinski 2013
_CORNER = 0.06  # share of the band over which its two corners are rounded
_JONES = 2.0 / 3.0  # laminar-equivalent Reynolds number of parallel plates, Jones 1976 (memory)


def sustains(re_d: Floats) -> Floats:
    """Share [-] of turbulence that a passage can keep up: 0 below the band, 1 above.

    Linear in Re from 2300 to 4000 (Gnielinski 2013), corners rounded; the same weight is used
    for friction, which is an engineering choice.
    """
    share = (re_d - BAND_LOW) / (BAND_HIGH - BAND_LOW)
    return _ramp(share) - _ramp(share - 1.0)


def _ramp(share: Floats) -> Floats:
    """The positive part of `share` with a rounded corner, exact outside the corner."""
    near = np.clip(share + _CORNER, 0.0, 2.0 * _CORNER)
    return np.maximum(share - _CORNER, 0.0) + near**2 / (4.0 * _CORNER)


def darcy_friction(re_d: Floats) -> Floats:
    """Darcy friction factor [-] of a smooth round tube; Petukhov, Re 3e3 to 5e6."""
    return (0.790 * np.log(re_d) - 1.64) ** -2


def developed_friction(re_d: Floats, relative_roughness: Floats) -> Floats:
    """Fanning friction factor [-] of developed turbulent flow between plates.

    Petukhov's law at two thirds of Re (Jones 1976, from memory); rough walls by the ratio of
    Haaland's 1983 friction factors (from memory), `relative_roughness` k_s over 2 s.
    """
    equivalent = _JONES * re_d
    smooth = 0.25 * darcy_friction(equivalent)
    return smooth * roughness_ratio(equivalent, relative_roughness)


def roughness_ratio(re_d: Floats, relative_roughness: Floats) -> Floats:
    """Rough over smooth friction factor [-] by Haaland 1983 (from memory), roughness under 0.05."""
    if not np.any(relative_roughness > 0.0):
        return np.ones_like(re_d)
    rough = np.log10(6.9 / re_d + (np.minimum(relative_roughness, 0.05) / 3.7) ** 1.11)
    return (np.log10(6.9 / re_d) / rough) ** 2


def developed_nusselt(re_d: Floats, pr: Floats, relative_roughness: Floats) -> Floats:
    """Nusselt number [-] far downstream in turbulent flow between plates, on 2 s.

    Gnielinski 1976, Pr 0.5 to 2000, Re 3e3 to 5e6; in and below the band its value at the upper
    end is used (Gnielinski 2013). Rough walls by Norris: (f/f0)^(0.68 Pr^0.215), exponent up
    to 1, f/f0 up to 4 (from memory).
    """
    re = np.maximum(re_d, BAND_HIGH)
    eighth = darcy_friction(re) / 8.0
    core = 1.0 + 12.7 * np.sqrt(eighth) * (np.cbrt(pr) ** 2 - 1.0)
    smooth = eighth * (re - 1000.0) * pr / core
    if not np.any(relative_roughness > 0.0):
        return smooth
    ratio = np.minimum(roughness_ratio(re, relative_roughness), 4.0)
    return np.asarray(smooth * ratio ** np.minimum(0.68 * pr**0.215, 1.0))


def local_entrance(diameters: Floats) -> Floats:
    """Local over developed Nusselt number [-] at a distance of so many hydraulic diameters.

    The derivative of Gnielinski's mean factor 1 + (D_h/L)^(2/3) is 1 + (D_h/x)^(2/3) / 3; one
    diameter is added to x (our choice) so that a layer which a wire has thickened at the very
    inlet gets a finite gain.
    """
    return 1.0 + np.cbrt(diameters + 1.0) ** -2 / 3.0


def merged(re_theta: Floats, re_d: Floats) -> Floats:
    """Smooth share [-] of fully developed flow where turbulent layers have grown to Re_theta.

    The layers of both walls fill the gap where Re_theta is 0.031 Re_D: momentum thickness 7/72 of
    half the gap (one-seventh power profile) under a core 15 % faster than the mean, thinned by
    that acceleration. Walls feel each other earlier; one half at 0.018 Re_D keeps the mean heat
    near Gnielinski's entrance factor. That and the fourth power are fitted choices.
    """
    ratio = (re_theta / (MERGING * re_d)) ** 4
    return ratio / (1.0 + ratio)


MERGING = 0.018  # Re_theta over Re_D where a turbulent passage is half developed


def core_speed_up(re_theta: Floats, re_d: Floats) -> Floats:
    """Core velocity over mean velocity [-] between two turbulent layers of Re_theta.

    Continuity with a displacement thickness of 1.4 theta while thin; levels off at the ratio of
    developed flow, 1.28 (Re_D/2)^-0.0116 (Dean 1978, from memory). How the two are joined is
    fitted to the marched equations.
    """
    loss = 5.6 * re_theta / re_d
    most = 1.28 * (0.5 * re_d) ** -0.0116 - 1.0
    return np.asarray(1.0 + ((loss * (1.0 + loss)) ** -4 + most**-4) ** -0.25)


def turbulent_momentum_factor(re_theta: Floats, re_d: Floats, fanning: Floats) -> Floats:
    """Momentum factor Kd [-] at a place where turbulent layers have grown to Re_theta.

    From thin layers, 1.6 theta over the gap's D_h, to developed flow, f (1.73 + 471 f); both and
    their joint are fitted to the marched equations, Re_D 3e3 to 1e5.
    """
    thin = 1.6 * re_theta / re_d
    developed = (1.73 + 471.0 * fanning) * fanning
    return np.asarray(1.0 + (thin**-6 + developed**-6) ** (-1.0 / 6.0))


def contraction(porosity: Floats, ends: Literal["sharp", "smooth", "none"]) -> Floats:
    """Contraction coefficient Cc [-] of a slot of free share `porosity` = s/(s + t).

    Sharp: 1/Cc = 1 + (2/pi) (1 - z^2)/z atan z with z = Cc porosity (plane jet from a slot, from
    memory; 0.611 to 1), here a polynomial in (1 - porosity)^1/2 within 1e-5 of its solution.
    Smooth ends do not contract the stream.
    """
    if ends != "sharp":
        return np.ones_like(porosity)
    root = np.sqrt(np.maximum(1.0 - porosity, 0.0))
    inner = ((0.123225479 * root - 0.419972218) * root + 0.754744239) * root - 0.902746373
    return 1.0 + ((inner * root + 0.993451335) * root - 0.937694105) * root


def entrance_loss(porosity: Floats, ends: Literal["sharp", "smooth", "none"]) -> Floats:
    """Static pressure drop at the entrance over rho u^2/2 [-]: 1 - sigma^2 + Kc, Kays 1950.

    Kc with a flat profile, since the developing pressure drop already holds the momentum rise.
    """
    if ends == "none":
        return np.zeros_like(porosity)
    cc = contraction(porosity, ends)
    return 1.0 - porosity**2 + (1.0 / cc - 1.0) ** 2


def exit_recovery(
    porosity: Floats, momentum_factor: Floats, ends: Literal["sharp", "smooth", "none"]
) -> Floats:
    """Static pressure recovered at the exit over rho u^2/2 [-]: 1 - sigma^2 - Ke, Kays 1950.

    Ke = 1 - 2 Kd sigma + sigma^2 with the outlet's own momentum factor Kd.
    """
    if ends == "none":
        return np.zeros_like(porosity)
    return 2.0 * porosity * (momentum_factor - porosity)

"""The boundary layer on one plate, laminar and turbulent: friction, heat, thicknesses.

Pure functions on arrays, constant properties, Reynolds numbers on the free stream. Where one
regime gives way to the other is the business of `transition`; the far wall is that of `passage`.

Range of validity: steady low-speed stream without pressure gradient, Pr from 0.5 upward.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]

BLASIUS = 0.664115  # 2 f''(0) of the similarity solution, Blasius 1908; computed
DISPLACEMENT = 1.720788  # delta* / (x Re^-1/2) of the same solution; computed
SHAPE_LAMINAR = DISPLACEMENT / BLASIUS
SHAPE_TURBULENT = 1.4  # common practice, zero pressure gradient
THETA_OVER_DELTA = 7.0 / 72.0  # one-seventh power profile, computed

# Karman and Schoenherr: 1/cf as a quadratic in log10(Re_theta), here in the natural logarithm
_KS2, _KS1, _KS0 = 17.08 / np.log(10.0) ** 2, 25.11 / np.log(10.0), 6.012
# first guess of ln(Re_theta) from ln of the integral of 2/cf: least squares, 0.3 %
_KS_GUESS = (-3.47006438e-04, 2.22246701e-02, 3.92073995e-01, -1.04638848)


def laminar_friction(re_x: Floats) -> Floats:
    """Local friction factor cf [-] of the laminar layer at Re_x; Blasius 1908."""
    return BLASIUS / np.sqrt(re_x)


def laminar_re_theta(re_x: Floats) -> Floats:
    """Momentum-thickness Reynolds number [-] of the laminar layer at Re_x; Blasius 1908."""
    return BLASIUS * np.sqrt(re_x)


def laminar_heat_constant(pr: Floats, flux: bool) -> Floats:
    """Constant c of the laminar law Nu_x = c Re_x^1/2.

    `flux`: uniform wall flux instead of uniform wall temperature. The form is that of Churchill
    and Ozoe 1973 (from memory), its constants fitted anew to the similarity solution, which theirs
    miss by 1.1 % in gases: within 0.03 % for Pr 0.5 to 1e4.
    """
    lead, spread, power = (0.463686, 0.0414537, 0.957806) if flux else (0.338734, 0.082067, 0.93591)
    return np.asarray(lead * np.cbrt(pr) / (1.0 + spread * pr**-power) ** 0.25)


def turbulent_friction(re_theta: Floats) -> Floats:
    """Local friction factor cf [-] of a turbulent layer at Re_theta; Karman and Schoenherr.

    1/cf = 17.08 (log10 Re_theta)^2 + 25.11 log10 Re_theta + 6.012.
    """
    log = np.log(re_theta)
    return np.asarray(1.0 / ((_KS2 * log + _KS1) * log + _KS0))


def turbulent_run(re_theta: Floats) -> Floats:
    """Distance Re_x [-] in which a turbulent layer grows from nothing to Re_theta.

    The integral of 2/cf dRe_theta with the law of `turbulent_friction`, in closed form.
    """
    log = np.log(re_theta)
    square = _KS2 * ((log - 2.0) * log + 2.0)
    return np.asarray(2.0 * re_theta * (square + _KS1 * (log - 1.0) + _KS0))


def turbulent_growth(re_theta: Floats, distance: Floats) -> Floats:
    """Re_theta [-] of a turbulent layer a `distance` (in Re_x) behind where it was `re_theta`.

    Inverts `turbulent_run` by Newton's method from a fitted first guess (three steps, 1e-9).
    """
    run = turbulent_run(re_theta) + distance
    log_run = np.log(run)
    g3, g2, g1, g0 = _KS_GUESS
    grown = np.exp(((g3 * log_run + g2) * log_run + g1) * log_run + g0)
    for _ in range(3):
        grown = grown - 0.5 * turbulent_friction(grown) * (turbulent_run(grown) - run)
    return grown


def turbulent_stanton(cf: Floats, pr: Floats) -> Floats:
    """Local Stanton number [-] of a smooth turbulent layer, wall temperature or wall flux.

    St = (cf/2) / [1 + 12.7 (Pr^2/3 - 1) sqrt(cf/2)], Lienhard 2020 (from memory), Pr 0.5 to 257.
    """
    half = 0.5 * cf
    return half / (1.0 + 12.7 * (np.cbrt(pr) ** 2 - 1.0) * np.sqrt(half))


def rough_friction(cf_smooth: Floats, re_x: Floats, re_roughness: Floats) -> tuple[Floats, Floats]:
    """Local friction factor [-] of a turbulent layer on a sand-rough wall, and its roughness share.

    `re_roughness` is U k_s / nu. Smooth up to k_s+ 5, fully rough above 70 (Nikuradse's limits,
    from memory), there cf = (2.87 + 1.58 log10(x/k_s))^-2.5 (Prandtl and Schlichting); between
    them a smooth weight in ln k_s+ is our choice.
    """
    ratio = np.maximum(re_x / re_roughness, 3.0)  # the law has no meaning within a few k_s
    cf_rough = (2.87 + 1.58 * np.log10(ratio)) ** -2.5
    height = re_roughness * np.sqrt(0.5 * np.maximum(cf_smooth, cf_rough))
    share = smooth_step(np.log(np.maximum(height, 1e-9)), np.log(5.0), np.log(70.0))
    return cf_smooth + share * np.maximum(cf_rough - cf_smooth, 0.0), share


def rough_stanton(cf: Floats, pr: Floats, re_roughness: Floats) -> Floats:
    """Local Stanton number [-] of a fully rough turbulent layer.

    St = (cf/2) / [1 + sqrt(cf/2) (5.19 k_s+^0.2 Pr^0.44 - 8.48)], Dipprey and Sabersky 1963, Pr 1.2
    to 6; in gases not above Kays and Crawford, 0.9 + sqrt(cf/2) k_s+^0.2 Pr^0.44 / 0.8 below the
    line (both from memory).
    """
    shear = np.sqrt(0.5 * cf)
    grain = np.maximum(re_roughness * shear, 1.0) ** 0.2 * pr**0.44
    liquids, gases = 1.0 + shear * (5.19 * grain - 8.48), 0.9 + shear * grain / 0.8
    return shear**2 / np.maximum(liquids, gases)


def profile_mean_square(eta: Floats) -> Floats:
    """Mean of (u/U)^2 [-] of the laminar profile from the wall to y = eta sqrt(nu x / U).

    Closed form fitted to the Blasius profile, within 0.13 % for every eta; the limits
    f''(0)^2 eta^2 / 3 at the wall and 1 - 2.3849/eta far out are exact.
    """
    eta = np.maximum(eta, 1e-9)
    top = (((1.31513735e-03 * eta + 0.1120967) * eta + 0.468429098) * eta - 1.96396727) * eta
    base = ((5.51442857e-4 * eta + 0.0491142) * eta - 0.07218370) * eta + 1.0
    return eta**2 / (eta**2 + (top + 27.2079046) / base)


def profile_velocity(eta: Floats) -> Floats:
    """u/U [-] of the laminar profile at y = eta sqrt(nu x / U); fitted to Blasius within 0.008."""
    slope = 0.5 * BLASIUS * eta
    cube = np.minimum(slope, 4.0) ** 3
    return np.tanh(slope * (1.0 + 0.41617852 * cube / (1.0 + 0.56579575 * cube)))


def turbulent_mean_square(share: Floats) -> Floats:
    """Mean of (u/U)^2 [-] of the one-seventh power profile up to `share` of its thickness."""
    inside = 7.0 / 9.0 * np.minimum(share, 1.0) ** (2.0 / 7.0)
    return np.where(share < 1.0, inside, 1.0 - 2.0 / 9.0 / np.maximum(share, 1.0))


def smooth_step(value: Floats, low: float, high: float) -> Floats:
    """0 below `low`, 1 above `high`, a cubic without kinks between them."""
    share = np.clip((value - low) / (high - low), 0.0, 1.0)
    return share * share * (3.0 - 2.0 * share)

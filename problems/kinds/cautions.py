"""Where the assumptions of the model end, design by design, and the usual cautions of the trade.

Masks, and in `GENERAL` the words of safety that go with every sized surface.
"""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np

from problems.case import Case
from problems.convection.flat_plate import DISPLACEMENT
from problems.convection.fluids import Fluid
from problems.kinds.swept import GRAVITY, Walked
from problems.problem import Bools, Floats

GENERAL = (
    "Correlations are within 10 to 25 % of measurements at best: check the chosen design by test.",
    "Hot surfaces burn and fans injure: guard both, and lock the drive out before work on it.",
    "Ducts and casings under pressure, and liquids in closed circuits, need relief and inspection.",
    "Local codes and licensed practice decide; this is a sizing aid, not an approval.",
)

BUOYANT = (
    "buoyancy counts beside the forced flow (Gr/Re^2 over 0.1): whether it helps, hinders or "
    "crosses the stream is not told apart"
)
FAST = "the stream is somewhere so fast that compressibility counts (Mach over 0.3)"
CONDUCTIVE = "conduction along the stream counts (Peclet number under 100)"
SPENT = "the outlet is within 1 % of the wall temperature: the last part of the plate does nothing"
WET = "moisture condenses: a surface lies under the dew point"
NEAR_BOILING = "a wall is within 5 K of boiling"
VARIABLE = (
    "wall and stream differ so much (absolute temperatures by over a quarter, or a liquid's "
    "viscosity by over a factor 2) that film properties are only a rough guide"
)
RUBBED = "friction warms the fluid noticeably (Brinkman number over 0.1)"
STUBBY = "the plates are shorter than ten times their thickness: the edges are not thin"
TALL = "the wire is taller than the boundary layer: it over-trips, and its drag is uncertain"
DOUBTFUL = "turbulence behind the wire may not hold (Re_theta 200 to 320)"
MARGINAL = "the wire is marginal: U k/nu between 826 and 900"
SMALL = "the wire is under U k/nu 826: it moves transition upstream, by how much is uncertain"
BAND = "the passage lies in the transitional band (Re_D 2300 to 4000), where flow is unsteady"
ROUGH = "the surface is rough enough to move transition upstream (U k_s/nu over 100)"
DENSE = "the pressure drop is over 5 % of the absolute pressure: density varies more than assumed"


def found(
    case: Case,
    fluid: Fluid,
    settings: Mapping[str, Floats],
    walked: Walked,
    outcomes: Mapping[str, Floats],
) -> dict[str, Bools]:
    """The cautions with the designs they apply to; masks of shape (n,)."""
    masks = _stream(case, fluid, settings, walked, outcomes) | _wire(walked)
    surface = walked.surface
    if surface.re_rough is not None:
        masks[ROUGH] = surface.re_rough > 100.0
    if surface.re_d is not None:
        masks[BAND] = (surface.re_d > 2300.0) & (surface.re_d < 4000.0)
        if fluid.phase == "gas":
            masks[DENSE] = outcomes["pressure_drop"] > 0.05 * case.fluid.pressure
        if case.plates.surface.temperature is not None:
            masks[SPENT] = walked.units > np.log(100.0)
    return masks


def _stream(
    case: Case,
    fluid: Fluid,
    settings: Mapping[str, Floats],
    walked: Walked,
    outcomes: Mapping[str, Floats],
) -> dict[str, Bools]:
    """Cautions on the stream as a whole."""
    inlet = case.fluid.temperature
    cold, hot = outcomes["coldest_wall"], outcomes["hottest_wall"]
    difference = np.maximum(np.abs(hot - inlet), np.abs(cold - inlet))
    reach = 2.0 * settings["gap"] if "gap" in settings else settings["length"]
    lift = GRAVITY * fluid.expansion(walked.film) * difference * reach
    peclet = walked.surface.re_l if walked.surface.re_d is None else walked.surface.re_d
    properties = walked.properties
    heating = properties.mu * walked.speed**2 / (properties.k * np.maximum(difference, 1e-9))
    masks = {
        BUOYANT: np.abs(lift) > 0.1 * walked.speed**2,
        FAST: _fastest(fluid, walked, outcomes) > 0.3 * fluid.sound_speed(walked.film),
        CONDUCTIVE: peclet * properties.pr < 100.0,
        VARIABLE: _variable(fluid, cold, hot, 2.0 * walked.film),
        RUBBED: heating > 0.1,
        STUBBY: settings["length"] < 10.0 * settings["thickness"],
    }
    if fluid.dew_point is not None:
        masks[WET] = np.minimum(cold, walked.film) < fluid.dew_point
    boiling = fluid.saturation_temperature
    if fluid.phase == "liquid" and boiling is not None:
        masks[NEAR_BOILING] = hot > boiling - 5.0
    return masks


def _fastest(fluid: Fluid, walked: Walked, outcomes: Mapping[str, Floats]) -> Floats:
    """Highest velocity [m/s]: where the fluid is thinnest, past the wires."""
    rho = walked.properties.rho
    if "outlet_temperature" in outcomes:
        outlet = np.clip(outcomes["outlet_temperature"], fluid.low, fluid.high)
        rho = np.minimum(rho, fluid.at(outlet).rho)
    wire = walked.sweep.wire
    free = 1.0 if wire is None else 1.0 - np.minimum(wire.blockage, 0.9)
    return walked.flux_density / (rho * free)


def _variable(fluid: Fluid, cold: Floats, hot: Floats, twice_film: Floats) -> Bools:
    """Whether properties change too much between wall and stream for one film temperature."""
    worst = np.zeros(hot.shape, dtype=bool)
    for wall in (cold, hot):
        stream = np.clip(twice_film - wall, fluid.low, fluid.high)
        if fluid.phase == "gas":
            ratio = wall / stream
            worst |= (ratio < 0.8) | (ratio > 1.25)
        else:
            thin = fluid.at(np.clip(wall, fluid.low, fluid.high)).mu / fluid.at(stream).mu
            worst |= (thin < 0.5) | (thin > 2.0)
    return worst


def _wire(walked: Walked) -> dict[str, Bools]:
    """Cautions on the trip wires, judged by the first."""
    wire, onset = walked.sweep.wire, walked.sweep.onset
    if wire is None:
        return {}
    there = (wire.re_x < np.minimum(onset.natural, walked.surface.re_l)) & (wire.re_height > 1.0)
    behind = walked.sweep.behind_wires
    layers = 4.91 / DISPLACEMENT
    masks = {TALL: there & (wire.height_over_displacement > layers)}
    doubtful = there & (behind > 200.0) & (behind < 320.0)
    if wire.grit:
        return masks | {DOUBTFUL: doubtful & (wire.top_reynolds > 500.0)}
    return masks | {
        SMALL: there & (wire.reynolds < 826.0) & (onset.re_x < 0.95 * onset.natural),
        MARGINAL: there & (wire.reynolds > 826.0) & (wire.reynolds < 900.0),
        DOUBTFUL: doubtful & (wire.reynolds > 826.0),
    }

"""Kind `stack`: parallel plates with fluid between them, all gaps alike.

Every gap is swept on both faces and carries a wire on both. The stack count is a real number while
searching: one plate with its gap, repeated over the height.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from problems.case import Case
from problems.convection import passage
from problems.convection.fluids import Fluid
from problems.kinds.blown import Blower
from problems.kinds.plate import walls_under_flux
from problems.kinds.swept import Settings, Walked, inlet_of, walk

Floats = NDArray[np.float64]

_LEAST_GAP = 0.05  # of the gap as drawn that is left however wrong it is made


def complete(case: Case, given: dict[str, Floats]) -> dict[str, Floats]:
    """The settings with height and count, of which the case gives one."""
    pitch = given["gap"] + given["thickness"]
    if "gap_change" in given:  # built with as many plates, higher or lower than drawn
        drawn = complete(case, {k: v for k, v in given.items() if k != "gap_change"})
        gap = np.maximum(given["gap"] + given["gap_change"], _LEAST_GAP * given["gap"])
        height = drawn["count"] * (gap + given["thickness"])
        # the fan is set to the flow that was asked for
        velocity = given["velocity"] * given["gap"] / gap
        return {**drawn, "gap": gap, "height": height, "velocity": velocity}
    if case.plates.count is not None:
        count = np.full_like(pitch, float(case.plates.count))
        return {**given, "count": count, "height": count * pitch}
    height = np.full_like(pitch, float(case.plates.height or 0.0))
    return {**given, "height": height, "count": height / pitch}


def balance(
    case: Case, fluid: Fluid, given: Settings, blower: Blower
) -> tuple[Walked, dict[str, Floats]]:
    """Walk along the gaps and balance heat, force, pressure and power; outcomes by name."""
    wall = case.plates.surface.temperature
    flux = case.plates.surface.flux or 0.0

    def film_of(walked: Walked, some: Settings) -> Floats:
        if wall is not None:
            units = np.maximum(walked.units, 1e-12)
            below = (wall - inlet_of(case, some)) * -np.expm1(-units) / units
            return wall - (1.0 - 0.5 * walked.film_share) * below
        return inlet_of(case, some) + 0.5 * _rise(walked, some, flux) + 0.5 * flux / walked.h

    inlet = inlet_of(case, given)
    start = np.full_like(given["gap"], inlet if wall is None else wall - 0.4 * (wall - inlet))
    walked = walk(case, fluid, given, film_of, start)
    if wall is not None:
        outlet = wall - (wall - inlet) * np.exp(-walked.units)
        coldest = hottest = outlet_wall = np.full_like(outlet, wall)
    else:
        outlet = inlet + _rise(walked, given, flux)
        coldest, hottest = walls_under_flux(walked, given, inlet, flux)
        local = walked.sweep.outlet_stanton * walked.flux_density * walked.properties.cp
        outlet_wall = outlet + flux * (1.0 / local + given.get("fouling", 0.0))
    passages = given["count"] * given["width"]
    mass_flow = walked.flux_density * given["gap"] * passages
    flow_rate = given["velocity"] * given["gap"] * passages
    area = 2.0 * passages * given["length"]
    dynamic = 0.5 * walked.flux_density * walked.speed
    drops = _drops(case, fluid, given, walked, outlet)
    pressure_drop = sum(drops.values(), np.zeros_like(outlet))
    return walked, {
        "heat": mass_flow * walked.properties.cp * (outlet - inlet),
        "drag": (walked.sweep.friction + walked.sweep.wire_friction) * dynamic * area,
        "wire_drag": walked.sweep.wire_friction * dynamic * area,
        "system_pressure": _spent(case, fluid, given, walked, outlet, pressure_drop)
        + blower.outside()(flow_rate),
        "hottest_wall": hottest,
        "coldest_wall": coldest,
        "plate_area": area,
        "pressure_drop": pressure_drop,
        **drops,
        "flow_rate": flow_rate,
        "mass_flow": mass_flow,
        "outlet_temperature": outlet,
        "approach": np.abs(outlet_wall - outlet),
        "gap_reynolds": np.asarray(walked.surface.re_d),
        "volume": given["length"] * given["width"] * given["height"],
    }


def _rise(walked: Walked, given: Settings, flux: float) -> Floats:
    """Temperature rise [K] of the fluid over the length under a uniform flux on both faces."""
    capacity = walked.flux_density * walked.properties.cp * given["gap"]
    return 2.0 * flux * given["length"] / capacity


def _porosity(given: Settings) -> Floats:
    """Free share of the section of the stack."""
    return given["gap"] / (given["gap"] + given["thickness"])


def _densities(case: Case, fluid: Fluid, given: Settings, outlet: Floats) -> tuple[Floats, Floats]:
    """Density at the inlet and at the outlet [kg/m3]."""
    inlet_rho = fluid.at(np.atleast_1d(inlet_of(case, given))).rho
    return inlet_rho, fluid.at(np.clip(outlet, fluid.low, fluid.high)).rho


def _spent(
    case: Case, fluid: Fluid, given: Settings, walked: Walked, outlet: Floats, drop: Floats
) -> Floats:
    """Total pressure [Pa] that the fan has to make up for: static drop and what is left of the
    dynamic head of the ducts, whose density changes. A still plenum upstream has no head.
    """
    inlet_rho, outlet_rho = _densities(case, fluid, given, outlet)
    porosity = np.ones_like(drop) if case.plates.ends == "none" else _porosity(given)
    head = 0.5 * (walked.flux_density * porosity) ** 2
    arriving = 0.0 if case.plates.feed == "plenum" else head / inlet_rho
    leaving = 0.0 if case.plates.feed == "plenum" else head / outlet_rho
    return np.maximum(drop + arriving - leaving, 0.0)


def _drops(
    case: Case, fluid: Fluid, given: Settings, walked: Walked, outlet: Floats
) -> dict[str, Floats]:
    """The parts of the static pressure drop [Pa], from duct to duct of the stack's own section.

    Fed from a still plenum the stream has to be brought to the velocity of that duct first.
    """
    inlet_rho, outlet_rho = _densities(case, fluid, given, outlet)
    square = walked.flux_density**2
    dynamic = 0.5 * square / walked.properties.rho
    walls = 2.0 * given["length"] / given["gap"]
    porosity, momentum = _porosity(given), walked.sweep.momentum_factor
    ends = case.plates.ends
    recovered = passage.exit_recovery(porosity, momentum, ends)
    entrance = passage.entrance_loss(porosity, ends)
    if case.plates.feed == "plenum" and ends != "none":
        entrance = entrance + porosity**2
    return {
        "entrance_drop": 0.5 * square / inlet_rho * entrance,
        "shear_drop": walked.sweep.friction * dynamic * walls,
        "development_drop": square / outlet_rho * (momentum - 1.0),
        "heating_drop": square * (1.0 / outlet_rho - 1.0 / inlet_rho),
        "wire_drop": walked.sweep.wire_friction * dynamic * walls,
        "exit_drop": -0.5 * square / outlet_rho * recovered,
    }
